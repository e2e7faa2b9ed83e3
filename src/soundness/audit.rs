//! The audit: from what welding and matching found to findings with places.

use std::collections::BTreeMap;

use super::cap::{self, centre_of_polyline};
use super::facets::{OddFacets, odd_facets};
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use super::gaps::{Gaps, report_joined};
use super::sizes::tiny_shells;
use crate::geometry::Corners;
use crate::mesh::{Body, Loop, Mesh, NestedRule, Part, Pinch, Shell, each, pinches};

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
    look.degenerate(&home, &mut put);
    look.duplicates(&home, &mut put);
    look.warped(&home, &mut put);
    look.gaps.report(&look, &home, &mut put);
    report_joined(&look, &home, &mut put);
    look.notes(&home, &mut put);
    if depth == Depth::Full {
        let found = super::overlap::self_overlap(mesh, metres, places);
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

/// Triangles that one place lists: enough to find it by, little where thousands meet.
const MOST_TRIANGLES: usize = 64;

pub(super) struct Look<'a> {
    pub(super) mesh: &'a Mesh,
    pub(super) metres: f64,
    pub(super) places: usize,
    pub(super) odd: OddFacets,
    pub(super) pinches: Vec<Pinch>,
    /// Stray fragments, as places in the list of shells.
    pub(super) tiny: Vec<usize>,
    gaps: Gaps,
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

    /// Holes, winding conflicts, and what is said of whole shells.
    fn shells_of(&self, body: &Body, put: &mut dyn FnMut(Finding)) {
        let shells = body.roles().iter().map(|r| r.shell);
        let mut holes = Vec::new();
        let mut conflicts = Vec::new();
        for place in shells {
            let shell: &Shell = &self.mesh.found().shells[place];
            let unexplained = |l: &&Loop| !l.conflict && !self.gaps.explains(place, &l.vertices);
            holes.extend(shell.loops.iter().filter(unexplained));
            let doubled = shell
                .open
                .iter()
                .filter(|e| e.surplus == 2 && e.triangles.len() == 2);
            conflicts.extend(doubled);
        }
        if !holes.is_empty() {
            let places = holes
                .iter()
                .take(self.places)
                .map(|l| {
                    let points: Vec<[f64; 3]> =
                        l.vertices.iter().map(|&v| self.vertex(v)).collect();
                    let (centre, length) = centre_of_polyline(&points);
                    Place {
                        at_m: centre,
                        triangles: l.triangles.iter().copied().take(64).collect(),
                        line: None,
                        length_m: Some(length),
                        edges: Some(l.vertices.len()),
                    }
                })
                .collect();
            // What capping leaves open, under the assumption that the caps state.
            let bound = cap::estimate(self.mesh, body, None)
                .ok()
                .map(|e| (e.bounds.volume * self.metres.powi(3), EffectIs::Bound));
            put(self.finding(
                FindingKind::Hole,
                Severity::Blocks,
                holes.len() as u64,
                places,
                bound,
                "the surface is open here: look for a missing or unstitched face in the model, and export again",
            ));
        }
        if !conflicts.is_empty() {
            let places = conflicts
                .iter()
                .take(self.places)
                .map(|e| self.place(self.middle_of_edge(e.from, e.to), e.triangles.clone()))
                .collect();
            put(self.finding(
                FindingKind::WindingConflict,
                Severity::Blocks,
                conflicts.len() as u64,
                places,
                None,
                "neighbouring facets face opposite ways: turn the facets that face inward, or export again with consistent normals",
            ));
        }
        if body.closed && self.mesh.solid_by(body, NestedRule::Sum).moments.zeroth == 0.0 {
            put(self.finding(
                FindingKind::Degenerate,
                Severity::Blocks,
                1,
                vec![self.place(self.corner(body.first), vec![body.first])],
                None,
                "the surface is closed but holds no volume: export the solid, not a sheet",
            ));
        }
        self.inside_out(body, put);
        self.nested(body, put);
        if body.joined.len() > 1 {
            let names = body
                .joined
                .iter()
                .map(|n| format!("\"{n}\""))
                .collect::<Vec<_>>();
            put(self.finding(
                FindingKind::NameSplit,
                Severity::Notes,
                1,
                vec![self.place(self.corner(body.first), vec![body.first])],
                None,
                format!(
                    "the surface of one solid is spread over the names {}: it was joined under the first; give the solid one name",
                    names.join(", ")
                ),
            ));
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

    fn inside_out(&self, body: &Body, put: &mut dyn FnMut(Finding)) {
        let turned: Vec<_> = body.roles().iter().filter(|r| r.turned).collect();
        if turned.is_empty() {
            return;
        }
        let shells = &self.mesh.found().shells;
        let m3 = self.metres.powi(3);
        let effect: f64 = turned
            .iter()
            .map(|r| -2.0 * shells[r.shell].solid.moments.zeroth)
            .sum();
        let places = turned
            .iter()
            .take(self.places)
            .map(|r| {
                let t = shells[r.shell].first;
                self.place(self.corner(t), vec![t])
            })
            .collect();
        // The exactness is the volume's own; a body that is not closed has none.
        let effect = body.closed.then_some((effect * m3, EffectIs::Exact));
        put(self.finding(
            FindingKind::InsideOut,
            Severity::Doubts,
            turned.len() as u64,
            places,
            effect,
            "the shell faces inward: it was turned; export it with its normals outward",
        ));
    }

    fn nested(&self, body: &Body, put: &mut dyn FnMut(Finding)) {
        let nested: Vec<_> = body
            .roles()
            .iter()
            .filter(|r| r.part == Part::Nested)
            .collect();
        if nested.is_empty() {
            return;
        }
        let shells = &self.mesh.found().shells;
        let places = nested
            .iter()
            .take(self.places)
            .map(|r| {
                let t = shells[r.shell].first;
                self.place(self.corner(t), vec![t])
            })
            .collect();
        let effect = body.closed.then(|| {
            let v = |rule| self.mesh.solid_by(body, rule).moments.zeroth * self.metres.powi(3);
            let (sum, union, void) = (
                v(NestedRule::Sum),
                v(NestedRule::Union),
                v(NestedRule::Void),
            );
            (sum, union, void)
        });
        let said = effect.map_or(String::new(), |(sum, union, void)| {
            format!(
                " (sum {:.4} cm3, union {:.4} cm3, void {:.4} cm3)",
                sum * 1e6,
                union * 1e6,
                void * 1e6
            )
        });
        put(self.finding(
            FindingKind::NestedSolid,
            Severity::Doubts,
            nested.len() as u64,
            places,
            // Counted once instead of twice.
            effect.map(|(sum, union, _)| (union - sum, EffectIs::Exact)),
            format!(
                "a solid lies inside another{said}: if it is a hollow, turn it inward; else remove it, or say how to count it with --nested"
            ),
        ));
    }

    /// Edges at which more than two triangles of one name meet.
    fn busy_edges(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        let found = self.mesh.found();
        let mut by_body: BTreeMap<(Option<usize>, Severity), Vec<Place>> = BTreeMap::new();
        let mut counts: BTreeMap<(Option<usize>, Severity), u64> = BTreeMap::new();
        for edge in found
            .odd
            .chunk_by(|a, b| (a.low, a.high) == (b.low, b.high))
        {
            let mut of_name: BTreeMap<u32, (i64, Vec<u32>)> = BTreeMap::new();
            for h in edge.iter().filter(|h| !found.is_set_aside(h.triangle)) {
                let e = of_name.entry(found.name_of(h.triangle)).or_default();
                e.0 += if h.forward { 1 } else { -1 };
                e.1.push(h.triangle);
            }
            for (net, triangles) in of_name.into_values().filter(|(_, t)| t.len() > 2) {
                let severity = if net == 0 {
                    Severity::Notes
                } else {
                    Severity::Blocks
                };
                let mut homes: Vec<Option<usize>> = triangles.iter().map(|&t| home.of(t)).collect();
                homes.sort_unstable();
                homes.dedup();
                for h in homes {
                    *counts.entry((h, severity)).or_default() += 1;
                    let places = by_body.entry((h, severity)).or_default();
                    if places.len() < self.places {
                        let at = self.middle_of_edge(edge[0].low, edge[0].high);
                        let first = triangles.iter().copied().take(MOST_TRIANGLES).collect();
                        places.push(self.place(at, first));
                    }
                }
            }
        }
        for ((body, severity), places) in by_body {
            let count = counts[&(body, severity)];
            let advice = if severity == Severity::Notes {
                "more than two facets meet at an edge where solids touch: harmless to the volume; part the solids or join them into one"
            } else {
                "more than two facets meet at an edge and do not cancel: look for a stray or missing face there"
            };
            put(
                body,
                self.finding(
                    FindingKind::NonManifoldEdge,
                    severity,
                    count,
                    places,
                    None,
                    advice,
                ),
            );
        }
    }

    /// Triangles without area.
    fn degenerate(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        self.by_body(
            home,
            &self.odd.flat,
            |t| self.place(self.corner(t), vec![t]),
            &mut |body, count, places| {
                put(
                    body,
                    self.finding(
                        FindingKind::Degenerate,
                        Severity::Notes,
                        count,
                        places,
                        Some((0.0, EffectIs::Exact)),
                        "these facets have no area and add nothing: a finer or cleaner export leaves them out",
                    ),
                );
            },
        );
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

    /// Facets that stand in one place.
    fn duplicates(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        let found = self.mesh.found();
        struct Of {
            count: u64,
            places: Vec<Place>,
            dropped: Vec<u32>,
            stays: bool,
        }
        let mut by_body: BTreeMap<Option<usize>, Of> = BTreeMap::new();
        let mut places: Vec<&Vec<u32>> = found.duplicates.places.iter().collect();
        places.sort();
        for place in places {
            // The facet that stays knows the body; of opposed pairs, a neighbour does.
            let body = place
                .iter()
                .find_map(|&t| home.of(t))
                .or_else(|| self.neighbour_body(home, place));
            let of = by_body.entry(body).or_insert_with(|| Of {
                count: 0,
                places: Vec::new(),
                dropped: Vec::new(),
                stays: false,
            });
            of.count += place.len() as u64 - 1;
            of.dropped.extend(
                place
                    .iter()
                    .filter(|t| found.dropped.binary_search(t).is_ok()),
            );
            of.stays |= place
                .iter()
                .any(|t| found.shells.iter().any(|s| s.doubled.contains(t)));
            if of.places.len() < self.places {
                of.places
                    .push(self.place(self.corner(place[0]), place.clone()));
            }
        }
        for (body, of) in by_body {
            let effect =
                (!of.stays).then(|| (self.dropped_volume(body, &of.dropped), EffectIs::Exact));
            let advice = if of.stays {
                "facets stand twice and dropping one opens the surface: a solid is drawn over another; unite them in the model"
            } else if of.dropped.is_empty() {
                "facets face each other in one place and add nothing: solids touch there; unite them or part them"
            } else {
                "facets stand twice; the repeated ones were left out: export each face once"
            };
            put(
                body,
                self.finding(
                    FindingKind::Duplicate,
                    Severity::Doubts,
                    of.count,
                    of.places,
                    effect,
                    advice,
                ),
            );
        }
    }

    /// The body of a triangle that shares an edge with an opposed pair.
    fn neighbour_body(&self, home: &Home, place: &[u32]) -> Option<usize> {
        let found = self.mesh.found();
        let c = found.corners[place[0] as usize];
        let edges = [(c[0], c[1]), (c[1], c[2]), (c[2], c[0])];
        edges.iter().find_map(|&(a, b)| {
            let key = (a.min(b), a.max(b));
            let from = found.odd.partition_point(|h| (h.low, h.high) < key);
            found.odd[from..]
                .iter()
                .take_while(|h| (h.low, h.high) == key)
                .find_map(|h| home.of(h.triangle))
        })
    }

    /// What dropping the facets changes the file's signed volume by, m³: taken about the body's
    /// first vertex, as the rest of it is.
    fn dropped_volume(&self, body: Option<usize>, dropped: &[u32]) -> f64 {
        let apex = body.map_or_else(
            || dropped.first().map_or([0.0; 3], |&t| self.raw_corner(t)),
            |b| self.raw_corner(self.mesh.bodies()[b].first),
        );
        let mut list = dropped.to_vec();
        list.sort_unstable();
        each!(&self.mesh.soup.triangles, f => {
            let s = crate::moments::integrate(f, crate::geometry::Select::List(&list), apex, apex);
            0.0 - s.moments.zeroth * self.metres.powi(3)
        })
    }

    fn raw_corner(&self, t: u32) -> [f64; 3] {
        each!(&self.mesh.soup.triangles, f => f.triangle(t as usize)[0])
    }

    /// Polygons whose corners are not flat.
    fn warped(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        struct Of {
            count: u64,
            places: Vec<Place>,
            most: f64,
        }
        let mut by_body: BTreeMap<(Option<usize>, Severity), Of> = BTreeMap::new();
        for w in &self.mesh.soup.warped {
            let severity = if w.within_rounding {
                Severity::Notes
            } else {
                Severity::Doubts
            };
            let of = by_body
                .entry((home.of(w.first as u32), severity))
                .or_insert_with(|| Of {
                    count: 0,
                    places: Vec::new(),
                    most: 0.0,
                });
            of.count += 1;
            of.most += w.volume_high.max(-w.volume_low);
            if of.places.len() < self.places {
                of.places.push(Place {
                    at_m: w.at.map(|x| x * self.metres),
                    triangles: (w.first..w.first + w.count)
                        .take(64)
                        .map(|t| t as u32)
                        .collect(),
                    line: w.line,
                    length_m: None,
                    edges: Some(w.count + 2),
                });
            }
        }
        for ((body, severity), of) in by_body {
            let advice = if severity == Severity::Notes {
                "polygons are flat to the rounding of the written numbers: export more digits or triangles to be rid of the doubt"
            } else {
                "polygons whose corners are not flat have no one surface: export triangles"
            };
            let effect = Some((of.most * self.metres.powi(3), EffectIs::Bound));
            put(
                body,
                self.finding(
                    FindingKind::WarpedPolygon,
                    severity,
                    of.count,
                    of.places,
                    effect,
                    advice,
                ),
            );
        }
    }
}
