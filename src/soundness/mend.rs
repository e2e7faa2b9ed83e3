//! Mending: only what is provably harmless, each step with what it does to the volume.
//!
//! Facets that stand twice and were set aside are dropped, facets with two corners in one place
//! are dropped, flat holes are capped, shells that face the wrong way as a whole are turned. A
//! hole that is not flat, facets in conflict, a solid within a solid are left to the person who
//! knows the part: then nothing is mended at all, and the reasons are given.

use super::cap::{Cap, caps, cuts_mesh, facets_of};
use super::{Depth, Finding, FindingKind, Severity, audit, rounded_up};
use crate::error::Result;
use crate::geometry::{Corners, LooseFacets, Select};
use crate::mesh::{Mesh, Run, Soup, Triangles, each};
use crate::moments::integrate;

/// One thing that was done.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    /// What.
    pub action: Action,
    /// The body, where it was one.
    pub body: Option<String>,
    /// How many facets were dropped, vertices moved, polygons cut, holes capped or shells turned.
    pub count: u64,
    /// What the file's signed volume, summed about its first vertex, changed by (file unit³).
    pub volume_change: f64,
    /// What the true volume can differ by for it, under the assumption of [`super::cap`] (file
    /// unit³); only of capped holes.
    pub volume_bound: Option<f64>,
}

/// Kinds of steps.
#[derive(Clone, Copy, Debug, PartialEq, Eq, serde::Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Action {
    /// Vertices on open edges were made one, within the distance that was asked for.
    VerticesJoined,
    /// Polygons that are not flat stand as the triangles that they were cut into.
    PolygonsCut,
    /// Facets that repeat or face another one in the same place.
    DuplicatesDropped,
    /// Facets with two corners in one place.
    DegenerateDropped,
    /// Flat holes.
    HolesCapped,
    /// Shells that faced inward.
    ShellsTurned,
}

/// A mended copy.
#[derive(Debug)]
pub struct Mended {
    /// Its triangles: what stayed, in file order, then the caps.
    pub soup: Soup,
    /// What was done, in order.
    pub steps: Vec<Step>,
}

struct Work {
    triangles: Vec<[[f64; 3]; 3]>,
    names: Vec<(u32, Option<u32>)>,
}

impl Work {
    fn of(soup: &Soup) -> Self {
        let triangles =
            each!(&soup.triangles, f => (0..f.count()).map(|t| f.triangle(t)).collect());
        let mut names = vec![(0, None); soup.triangles.count()];
        for run in &soup.runs {
            names[run.first..run.first + run.count].fill((run.name, run.material));
        }
        Self { triangles, names }
    }

    fn drop_listed(&mut self, gone: &[u32]) {
        let mut at = 0u32;
        let mut keep = || {
            at += 1;
            gone.binary_search(&(at - 1)).is_err()
        };
        let kept: Vec<bool> = (0..self.triangles.len()).map(|_| keep()).collect();
        let mut k = kept.iter();
        self.triangles.retain(|_| k.next() == Some(&true));
        let mut k = kept.iter();
        self.names.retain(|_| k.next() == Some(&true));
    }

    fn into_soup(self, like: &Soup) -> Soup {
        let mut runs: Vec<Run> = Vec::new();
        for (t, (name, material)) in self.names.into_iter().enumerate() {
            match runs.last_mut() {
                Some(r) if (r.name, r.material) == (name, material) => r.count += 1,
                _ => runs.push(Run {
                    first: t,
                    count: 1,
                    name,
                    material,
                }),
            }
        }
        Soup {
            triangles: Triangles::Loose(self.triangles),
            names: like.names.clone(),
            materials: like.materials.clone(),
            runs,
            unit: like.unit,
            warped: Vec::new(),
            notes: Vec::new(),
        }
    }
}

/// Mends a mesh, or says all that stands against it. `stem` names unnamed bodies.
///
/// The copy is checked as any mesh is before it is handed out: it is sound.
///
/// # Errors
/// `too-large`, of the copy; the inner error lists reasons to leave the mesh alone.
pub fn mend(mesh: &Mesh, stem: &str) -> Result<std::result::Result<Mended, Vec<String>>> {
    let soup = &mesh.soup;
    let mut steps = Vec::new();
    let mut work = Work::of(soup);
    let Some(&[apex, ..]) = work.triangles.first() else {
        return Ok(Err(vec!["there is no facet".to_owned()]));
    };
    let sum = |list: &[[[f64; 3]; 3]]| {
        integrate(&LooseFacets(list), Select::All, apex, apex)
            .moments
            .zeroth
    };
    if let Some(joined) = mesh.joined().filter(|j| j.vertices > 0) {
        steps.push(Step {
            action: Action::VerticesJoined,
            body: None,
            count: joined.vertices as u64,
            volume_change: joined.volume_change,
            volume_bound: None,
        });
    }
    let warped = soup.warped.iter().filter(|w| !w.within_rounding).count();
    if warped > 0 {
        steps.push(Step {
            action: Action::PolygonsCut,
            body: None,
            count: warped as u64,
            volume_change: 0.0,
            volume_bound: None,
        });
    }
    // Caps first, while vertices have their numbers; they are added behind.
    let mut reasons = Vec::new();
    let mut added: Vec<(String, Vec<Cap>)> = Vec::new();
    let cracked = cracked(mesh);
    for (b, body) in mesh.bodies().iter().enumerate().filter(|(_, b)| !b.closed) {
        if let Some(distance) = cracked[b] {
            reasons.push(format!(
                "{} is cracked: --join {} (in the mesh's unit) joins its rims, which a cap would leave apart",
                body.id,
                rounded_up(distance)
            ));
            continue;
        }
        match caps(mesh, body) {
            Err(e) => reasons.push(format!(
                "{} cannot be closed: {} near {}",
                body.id,
                e.reason,
                at(&e.at)
            )),
            Ok(list) => {
                for c in list.iter().filter(|c| !c.flat) {
                    reasons.push(format!(
                        "{} has a hole that is not flat, at {}: what belongs there would be a guess",
                        body.id,
                        at(&c.centre)
                    ));
                }
                added.push((body.id.clone(), list));
            }
        }
    }
    let all: Vec<Cap> = added.iter().flat_map(|(_, c)| c.iter().cloned()).collect();
    if let (true, Some(p)) = (reasons.is_empty() && !all.is_empty(), cuts_mesh(mesh, &all)) {
        reasons.push(format!(
            "a cap would cut through the surface near {}",
            at(&p)
        ));
    }
    if !reasons.is_empty() {
        return Ok(Err(reasons));
    }
    let found = mesh.found();
    let mut doubles: Vec<u32> = found.duplicates.opposed.iter().copied().collect();
    doubles.extend(&found.dropped);
    doubles.sort_unstable();
    let gone =
        |list: &[u32]| -> Vec<_> { list.iter().map(|&t| work.triangles[t as usize]).collect() };
    for (action, list) in [
        (Action::DuplicatesDropped, &doubles),
        (Action::DegenerateDropped, &found.collapsed),
    ] {
        if !list.is_empty() {
            steps.push(Step {
                action,
                body: None,
                count: list.len() as u64,
                volume_change: 0.0 - sum(&gone(list)),
                volume_bound: None,
            });
        }
    }
    let mut all_gone = doubles;
    all_gone.extend(&found.collapsed);
    all_gone.sort_unstable();
    all_gone.dedup();
    for (id, list) in added {
        let facets: Vec<_> = facets_of(mesh, &list).iter().map(|f| f.at).collect();
        steps.push(Step {
            action: Action::HolesCapped,
            body: Some(id),
            count: list.iter().map(|c| c.loops as u64).sum(),
            volume_change: sum(&facets),
            volume_bound: Some(list.iter().map(|c| c.volume_bound).sum()),
        });
        let names: Vec<_> = list
            .iter()
            .flat_map(|c| {
                let material = work.names[c.beside as usize].1;
                vec![(c.name, material); c.triangles.len()]
            })
            .collect();
        work.triangles.extend(facets);
        work.names.extend(names);
    }
    work.drop_listed(&all_gone);
    let mut copy = Mesh::new(work.into_soup(soup), stem)?;
    if let Some(turned) = turn(&copy, &mut steps) {
        copy = Mesh::new(turned, stem)?;
    }
    let left = unsound(&copy);
    Ok(if left.is_empty() {
        Ok(Mended {
            soup: copy.soup,
            steps,
        })
    } else {
        Err(left)
    })
}

/// For each body the distance that closes its cracks (file unit), where it has any.
fn cracked(mesh: &Mesh) -> Vec<Option<f64>> {
    if mesh.bodies().iter().all(|b| b.closed) {
        return vec![None; mesh.bodies().len()];
    }
    let crack = |list: &Vec<Finding>| {
        let mut cracks = list
            .iter()
            .filter(|f| (f.kind, f.severity) == (FindingKind::Crack, Severity::Blocks));
        cracks.find_map(|f| f.join_m)
    };
    let found = audit(mesh, 1.0, 1, Depth::Figures);
    found.bodies.iter().map(crack).collect()
}

/// What would still be wrong with a mesh, in words; nothing where it is sound.
pub fn unsound(mesh: &Mesh) -> Vec<String> {
    let found = audit(mesh, 1.0, 1, Depth::Full);
    let of_bodies = mesh
        .bodies()
        .iter()
        .zip(&found.bodies)
        .flat_map(|(b, list)| list.iter().map(move |f| (b.id.as_str(), f)));
    found
        .file
        .iter()
        .map(|f| ("the file", f))
        .chain(of_bodies)
        .filter(|(_, f)| f.severity < Severity::Notes)
        .map(|(id, f)| {
            let kind = serde_json::to_value(f.kind).unwrap_or_default();
            let place = f
                .places
                .first()
                .map_or(String::new(), |p| format!(" near {}", at(&p.at_m)));
            format!(
                "{id}: {} {}{place} would be left",
                f.count,
                kind.as_str().unwrap_or("finding"),
            )
        })
        .collect()
}

/// The soup with inverted shells turned, if there are any.
fn turn(mesh: &Mesh, steps: &mut Vec<Step>) -> Option<Soup> {
    let mut work: Option<Work> = None;
    for body in mesh.bodies() {
        let turned: Vec<_> = body.roles().iter().filter(|r| r.turned).collect();
        if turned.is_empty() || !body.closed {
            continue;
        }
        let work = work.get_or_insert_with(|| Work::of(&mesh.soup));
        let mut change = 0.0;
        for role in &turned {
            let shell = &mesh.found().shells[role.shell];
            change -= 2.0 * shell.solid.moments.zeroth;
            let select = shell.members.select();
            for i in 0..select.len(work.triangles.len()) {
                work.triangles[select.get(i)].swap(1, 2);
            }
        }
        steps.push(Step {
            action: Action::ShellsTurned,
            body: Some(body.id.clone()),
            count: turned.len() as u64,
            volume_change: change,
            volume_bound: None,
        });
    }
    work.map(|w| w.into_soup(&mesh.soup))
}

/// A point of the file, in its own unit.
fn at(p: &[f64; 3]) -> String {
    format!("({:.6}, {:.6}, {:.6})", p[0], p[1], p[2])
}
