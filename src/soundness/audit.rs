//! The audit: from what welding and matching found to findings with places.

use std::collections::BTreeMap;

use super::facets::{OddFacets, odd_facets};
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use super::gaps::{Gaps, report_joined};
use super::sizes::tiny_shells;
use crate::geometry::Corners;
use crate::mesh::{Mesh, Pinch, each, pinches};
use crate::progress::Progress;

/// Findings of a mesh: those of each body, in the order of bodies, and those of no one body.
#[derive(Clone, Debug, Default)]
pub struct Audit {
    /// Findings that belong to no single body.
    pub file: Vec<Finding>,
    /// Findings of each body.
    pub bodies: Vec<Vec<Finding>>,
}

impl Audit {
    /// Whether nothing blocks and nothing doubts.
    pub fn is_sound(&self) -> bool {
        self.file
            .iter()
            .chain(self.bodies.iter().flatten())
            .all(|f| !f.is_unsound())
    }
}

/// How far an audit goes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Depth {
    /// What bears on the figures: all that blocks or doubts, short of surfaces that cut each
    /// other. Weighing needs no more, and waits for no more.
    Figures,
    /// All but surfaces that cut each other.
    Surface,
    /// All, with surfaces that cut each other, which costs more than the rest.
    Full,
}

/// Everything that is wrong with the mesh, in a fixed order: by kind, places in file order.
///
/// `metres` is the length of the file's unit; `places` the most places that a finding lists.
pub fn audit(mesh: &Mesh, metres: f64, places: usize, depth: Depth) -> Audit {
    audit_watched(mesh, metres, places, depth, Progress::NONE)
}

/// As [`audit`], and says how far it is.
pub fn audit_watched(
    mesh: &Mesh,
    metres: f64,
    places: usize,
    depth: Depth,
    progress: Progress<'_>,
) -> Audit {
    let stage = progress.stage("looking for faults of the surface", 0);
    let look = Look {
        mesh,
        metres,
        places,
        odd: if depth == Depth::Figures {
            OddFacets::default()
        } else {
            odd_facets(mesh)
        },
        pinches: if depth == Depth::Figures {
            Vec::new()
        } else {
            pinches(&mesh.soup.triangles, mesh.found())
        },
        tiny: tiny_shells(&mesh.found().shells),
        gaps: Gaps::of(mesh),
    };
    let home = look.home_of_triangles();
    let mut out = Audit {
        file: Vec::new(),
        bodies: vec![Vec::new(); mesh.bodies().len()],
    };
    let mut put = |body: Option<usize>, finding: Finding| match body {
        Some(b) => out.bodies[b].push(finding),
        None => out.file.push(finding),
    };
    for (b, body) in mesh.bodies().iter().enumerate() {
        look.shells_of(body, &mut |f| put(Some(b), f));
    }
    look.busy_edges(&home, &mut put);
    if depth != Depth::Full {
        look.written_twice(&home, &mut put);
    }
    look.degenerate(&home, &mut put);
    look.duplicates(&home, &mut put);
    look.warped(&home, &mut put);
    look.gaps.report(&look, &home, &mut put);
    report_joined(&look, &home, &mut put);
    look.notes(&home, &mut put);
    drop(stage);
    if depth == Depth::Full {
        let found = super::overlap::self_overlap_watched(mesh, metres, places, progress);
        out.file.extend(found.file);
        for (list, more) in out.bodies.iter_mut().zip(found.bodies) {
            list.extend(more);
        }
    }
    out.file.sort_by_key(|f| (f.kind, f.severity));
    for list in &mut out.bodies {
        list.sort_by_key(|f| (f.kind, f.severity));
    }
    out
}

pub(super) struct Look<'a> {
    pub(super) mesh: &'a Mesh,
    pub(super) metres: f64,
    pub(super) places: usize,
    pub(super) odd: OddFacets,
    pub(super) pinches: Vec<Pinch>,
    /// Stray fragments, as places in the list of shells.
    pub(super) tiny: Vec<usize>,
    pub(super) gaps: Gaps,
}

/// Which body a triangle belongs to, for the few that are asked about.
pub(super) struct Home {
    /// (triangle, body) of the listed members, sorted; empty where one body holds all.
    of: Vec<(u32, u32)>,
    all: Option<usize>,
}

impl Home {
    pub(super) fn of(&self, t: u32) -> Option<usize> {
        self.all.or_else(|| {
            let at = self.of.binary_search_by_key(&t, |&(t, _)| t).ok()?;
            Some(self.of[at].1 as usize)
        })
    }
}

impl Look<'_> {
    fn home_of_triangles(&self) -> Home {
        let bodies = self.mesh.bodies();
        if bodies.len() == 1 {
            return Home {
                of: Vec::new(),
                all: Some(0),
            };
        }
        let found = self.mesh.found();
        // Only what stands at a busy edge, has collapsed or is doubled is asked about.
        let asks = !found.odd.is_empty()
            || !self.odd.is_empty()
            || !self.pinches.is_empty()
            || self.mesh.joined().is_some()
            || !found.duplicates.places.is_empty()
            || !self.mesh.soup.warped.is_empty();
        let mut of = Vec::new();
        if asks {
            for (b, body) in bodies.iter().enumerate() {
                of.extend(self.mesh.members(body).map(|t| (t, b as u32)));
            }
            of.sort_unstable();
        }
        Home { of, all: None }
    }

    pub(super) fn vertex(&self, id: u32) -> [f64; 3] {
        self.mesh.soup.triangles.vertex(id).map(|x| x * self.metres)
    }

    pub(super) fn corner(&self, t: u32) -> [f64; 3] {
        each!(&self.mesh.soup.triangles, f => f.triangle(t as usize)[0]).map(|x| x * self.metres)
    }

    pub(super) fn middle_of_edge(&self, a: u32, b: u32) -> [f64; 3] {
        let (p, q) = (self.vertex(a), self.vertex(b));
        [0, 1, 2].map(|k| p[k] + (q[k] - p[k]) / 2.0)
    }

    pub(super) fn finding(
        &self,
        kind: FindingKind,
        severity: Severity,
        count: u64,
        places: Vec<Place>,
        effect: Option<(f64, EffectIs)>,
        advice: impl Into<String>,
    ) -> Finding {
        Finding {
            kind,
            severity,
            count,
            places_shown: places.len(),
            places,
            volume_effect_m3: effect.map(|e| e.0),
            volume_effect_is: effect.map(|e| e.1),
            join_m: None,
            advice: advice.into(),
        }
    }

    pub(super) fn place(&self, at_m: [f64; 3], triangles: Vec<u32>) -> Place {
        Place {
            at_m,
            triangles,
            line: None,
            length_m: None,
            edges: None,
        }
    }

    pub(super) fn by_body(
        &self,
        home: &Home,
        triangles: &[u32],
        place: impl Fn(u32) -> Place,
        put: &mut dyn FnMut(Option<usize>, u64, Vec<Place>),
    ) {
        let mut sorted: BTreeMap<Option<usize>, (u64, Vec<Place>)> = BTreeMap::new();
        for &t in triangles {
            let entry = sorted.entry(home.of(t)).or_default();
            entry.0 += 1;
            if entry.1.len() < self.places {
                entry.1.push(place(t));
            }
        }
        for (body, (count, places)) in sorted {
            put(body, count, places);
        }
    }
}
