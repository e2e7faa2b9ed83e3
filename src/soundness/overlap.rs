//! Surfaces that cut each other, or cover each other in one plane: space that is counted twice.
//!
//! A pair of triangles overlaps where
//! - each passes through the other's interior along a segment of positive length, or
//! - they share a positive area of one plane and face the same way, or belong to one shell, or
//! - an edge of one runs inside the other, or along an edge of it, and its triangle reaches from
//!   there into the other's material (for a void: into its hollow).
//!
//! Nothing else does: in a sound solid the space in front of each facet is empty and the space
//! behind it is filled, so that a surface that touches from outside, at points, along edges or
//! with opposed faces in contact, shares no volume with what it touches. Facets that share all
//! three corners are reported as duplicates, within a name; triangles without area never count.
//! The signs are exact, and so are the counts.

use std::collections::{BTreeMap, BTreeSet, HashMap};

use super::filled::filled_bodies;
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use super::shared_space::common_space_of_bodies;
use super::tally::{CutBodies, Cuts, Marks, Sink, Tallies};
use crate::geometry::{
    BoxTree, Corners, Meeting, Point, Select, meeting, meeting_point, meeting_sharing, unfolded,
};
use crate::mesh::{Body, Mesh, NestedRule, Part, each, strictly_inside};
use crate::progress::Progress;

/// Pairs of bodies that get a finding of their own; the rest is counted in one more.
const MOST_PAIRS: usize = 100;
/// Up to this many bodies, all pairs are among those.
const FEW_BODIES: usize = 14;
/// Of those, how many have their shared volume estimated.
const MOST_VOLUMES: usize = 20;
/// The error that an estimated volume is refined to, as a part of the body's volume.
const TOLERANCE: f64 = 1e-4;

/// Findings of overlap.
#[derive(Clone, Debug, Default)]
pub struct OverlapFindings {
    /// Bodies that overlap each other: one finding a pair of bodies.
    pub file: Vec<Finding>,
    /// Bodies that overlap themselves, in the order of bodies.
    pub bodies: Vec<Vec<Finding>>,
}

/// Pairs of triangles that overlap, by the bodies they belong to (lower index first; twice the same
/// for a body with itself). Each entry lists up to `places` pairs.
pub fn cuts(mesh: &Mesh, places: usize) -> BTreeMap<(usize, usize), Cuts> {
    let homes = Homes::of(mesh);
    each!(&mesh.soup.triangles, f => counted(mesh, &homes, f, places))
}

/// Which bodies cut themselves, and whether anything overlaps at all: what [`cuts`] would have
/// entries for, without counting. Once one pair shows, no further pair of the same is judged.
pub fn cut_bodies(mesh: &Mesh) -> CutBodies {
    let homes = Homes::of(mesh);
    let marks = Marks::new(mesh.bodies().len());
    each!(&mesh.soup.triangles, f => search(mesh, &homes, f, &marks));
    marks.into_bodies()
}

/// As [`cuts`]; where there are very many bodies, only the first hundred pairs of them, and bodies
/// with themselves, list any places.
fn cuts_listed(mesh: &Mesh, places: usize) -> BTreeMap<(usize, usize), Cuts> {
    let mut homes = Homes::of(mesh);
    each!(&mesh.soup.triangles, f => {
        if mesh.bodies().len() <= FEW_BODIES || places == 0 {
            return counted(mesh, &homes, f, places);
        }
        // Of very many pairs only the first are listed with their places: counts come first.
        let mut found = counted(mesh, &homes, f, 0);
        let listed = |pairs: &BTreeMap<(usize, usize), Cuts>| -> Vec<(usize, usize)> {
            let selves = pairs.keys().filter(|(a, b)| a == b);
            let others = pairs.keys().filter(|(a, b)| a != b).take(MOST_PAIRS);
            selves.chain(others).copied().collect()
        };
        let wanted = listed(&found);
        let bodies: BTreeSet<usize> = wanted.iter().flat_map(|&(a, b)| [a, b]).collect();
        homes.members = Some(triangles_of(mesh, bodies.iter().map(|&b| &mesh.bodies()[b])));
        let mut places = counted(mesh, &homes, f, places);
        for key in wanted {
            if let (Some(cuts), Some(first)) = (found.get_mut(&key), places.remove(&key)) {
                cuts.pairs = first.pairs;
            }
        }
        found
    })
}

/// Triangles of bodies, ascending.
fn triangles_of<'a>(mesh: &Mesh, bodies: impl Iterator<Item = &'a Body>) -> Vec<u32> {
    let mut all: Vec<u32> = bodies.flat_map(|b| mesh.members(b)).collect();
    all.sort_unstable();
    all
}

/// Tests every body against itself and against the others of the file.
///
/// `metres` is the length of the file's unit; `places` the most places that a finding lists. The
/// effect on the volume is what counting each region once would change, estimated (see
/// [`filled_bodies`] and [`shared_spaces`](super::shared_spaces)), for closed bodies; with solids
/// nested in the body it is not given, since their finding states it.
pub fn self_overlap(mesh: &Mesh, metres: f64, places: usize) -> OverlapFindings {
    self_overlap_watched(mesh, metres, places, Progress::NONE)
}

/// As [`self_overlap`], and says how far it is.
pub(super) fn self_overlap_watched(
    mesh: &Mesh,
    metres: f64,
    places: usize,
    progress: Progress<'_>,
) -> OverlapFindings {
    let mut out = OverlapFindings {
        file: Vec::new(),
        bodies: vec![Vec::new(); mesh.bodies().len()],
    };
    let mut rest = (0u64, 0u64);
    let cubed = metres.powi(3);
    let found = {
        let _stage = progress.stage("seeking surfaces that cut each other", 0);
        cuts_listed(mesh, places)
    };
    let stage = progress.stage("measuring what counts twice", found.len());
    for ((a, b), cuts) in found {
        stage.advance(1);
        let (x, y) = (&mesh.bodies()[a], &mesh.bodies()[b]);
        if a == b {
            let once = once_counted(mesh, x);
            let said = once.map_or(String::new(), |(_, v, error)| {
                let (v, error) = (v * cubed, error * cubed);
                format!(" (counted once the volume is {v:.6e} m3 ± {error:.1e} m3)")
            });
            let advice = format!(
                "the surface passes through itself, and the space inside both parts counts twice{said}: unite the parts in the model and export again"
            );
            let effect = once.map(|o| o.0 * cubed);
            out.bodies[a].push(finding(mesh, metres, &cuts, effect, advice));
        } else if out.file.len() < MOST_PAIRS {
            let shared = (out.file.len() < MOST_VOLUMES)
                .then(|| twice_counted(mesh, x, y))
                .flatten();
            let said = shared.map_or(String::new(), |(v, error)| {
                let (v, error) = (v * cubed, error * cubed);
                format!(" of {v:.6e} m3 ± {error:.1e} m3")
            });
            let advice = format!(
                "\"{}\" and \"{}\" occupy the same space{said}, which counts twice: part them, or cut one out of the other",
                x.id, y.id
            );
            let effect = shared.map(|s| 0.0 - s.0 * cubed);
            out.file.push(finding(mesh, metres, &cuts, effect, advice));
        } else {
            rest.0 += 1;
            rest.1 += cuts.count;
        }
    }
    if rest.0 > 0 {
        let cuts = Cuts {
            count: rest.1,
            pairs: Vec::new(),
        };
        let advice = format!("{} further pairs of bodies occupy the same space", rest.0);
        out.file.push(finding(mesh, metres, &cuts, None, advice));
    }
    out
}

/// What counting once changes a body's volume by, the volume then, and its error (file unit³).
fn once_counted(mesh: &Mesh, body: &Body) -> Option<(f64, f64, f64)> {
    let raw = mesh.solid(body, None).ok()?.moments.zeroth;
    let once = filled_bodies(mesh, &[body], TOLERANCE, Progress::NONE).ok()?;
    let volume = once.moments.zeroth;
    Some((volume - raw, volume, once.volume_error))
}

/// The volume that two bodies share, and its error (file unit³).
fn twice_counted(mesh: &Mesh, a: &Body, b: &Body) -> Option<(f64, f64)> {
    let smaller = [a, b]
        .map(|x| mesh.solid(x, Some(NestedRule::Sum)).ok())
        .into_iter()
        .try_fold(f64::INFINITY, |least, s| {
            s.map(|s| least.min(s.moments.zeroth.abs()))
        })?;
    let (m, error) = common_space_of_bodies(mesh, a, b, TOLERANCE * smaller, 128)?;
    Some((m.zeroth, error))
}

fn finding(mesh: &Mesh, metres: f64, cuts: &Cuts, effect: Option<f64>, advice: String) -> Finding {
    let places: Vec<Place> = each!(&mesh.soup.triangles, f => {
        cuts.pairs
            .iter()
            .map(|&(t, u)| Place {
                at_m: meeting_point(&f.triangle(t as usize), &f.triangle(u as usize))
                    .map(|x| x * metres),
                triangles: vec![t, u],
                line: None,
                length_m: None,
                edges: None,
            })
            .collect()
    });
    Finding {
        kind: FindingKind::SelfOverlap,
        severity: Severity::Doubts,
        count: cuts.count,
        places_shown: places.len(),
        places,
        volume_effect_m3: effect,
        volume_effect_is: effect.map(|_| EffectIs::Estimate),
        join_m: None,
        advice,
    }
}

/// What must be known of the shell that a triangle belongs to.
#[derive(Clone, Copy)]
struct Home {
    shell: u32,
    body: u32,
    name: u32,
    void: bool,
    closed: bool,
    turned: bool,
}

/// Which triangles take part, and the shell of each.
struct Homes {
    /// By shell.
    of_shell: Vec<Home>,
    /// The shell of each triangle, where there are several.
    shell_of: Option<Vec<u32>>,
    /// The triangles of all shells, ascending; `None` for all of the file.
    members: Option<Vec<u32>>,
}

impl Homes {
    fn of(mesh: &Mesh) -> Self {
        let shells = &mesh.found().shells;
        let mut of_shell: Vec<Home> = (0..shells.len())
            .map(|i| Home {
                shell: i as u32,
                body: 0,
                name: shells[i].name,
                void: false,
                closed: shells[i].closed(),
                turned: false,
            })
            .collect();
        for (b, body) in mesh.bodies().iter().enumerate() {
            for role in body.roles() {
                let home = &mut of_shell[role.shell];
                home.body = b as u32;
                home.void = role.part == Part::Void;
                home.turned = role.turned;
            }
        }
        let n = mesh.soup.triangles.count();
        let held: usize = shells.iter().map(|s| s.count).sum();
        let members = (held != n).then(|| triangles_of(mesh, mesh.bodies().iter()));
        let shell_of = (shells.len() > 1).then(|| {
            let mut shell_of = vec![0u32; n];
            for (i, shell) in shells.iter().enumerate() {
                let select = shell.members.select();
                for k in 0..shell.count {
                    shell_of[select.get(k)] = i as u32;
                }
            }
            shell_of
        });
        Self {
            of_shell,
            shell_of,
            members,
        }
    }

    fn select(&self) -> Select<'_> {
        match &self.members {
            Some(list) => Select::List(list),
            None => Select::All,
        }
    }

    #[inline(always)]
    fn home(&self, t: u32) -> &Home {
        let shell = self.shell_of.as_ref().map_or(0, |s| s[t as usize]);
        &self.of_shell[shell as usize]
    }
}

/// What one part of the work found.
#[derive(Default)]
struct Found {
    /// Triangles that meet others along edges of both.
    along: Vec<u32>,
    /// How long that list may grow before it is freed of repetitions.
    limit: usize,
}

impl Found {
    fn note_along(&mut self, t: u32, u: u32) {
        self.along.extend([t, u]);
        if self.along.len() > self.limit.max(1 << 12) {
            self.along.sort_unstable();
            self.along.dedup();
            self.limit = 2 * self.along.len();
        }
    }
}

/// All pairs of triangles that overlap, handed to `sink` as far as it wants them.
fn search(mesh: &Mesh, homes: &Homes, facets: &impl Corners, sink: &impl Sink) {
    if homes.of_shell.is_empty() {
        return;
    }
    let ids = &mesh.found().corners;
    let tree = BoxTree::new(facets, homes.select());
    let parts = tree.pairs_within(facets, |found: &mut Found, t, u, p, q| {
        let (a, b) = (homes.home(t), homes.home(u));
        if !sink.wants(a.body, b.body) {
            return;
        }
        match judged(ids, t, u, p, q, a, b) {
            Judged::Free => {}
            Judged::Overlap => sink.put(a.body, b.body, (t, u)),
            Judged::AlongEdges => found.note_along(t, u),
        }
    });
    let mut along: Vec<u32> = parts.into_iter().flat_map(|p: Found| p.along).collect();
    along.sort_unstable();
    along.dedup();
    if !along.is_empty() {
        along_edges(homes, facets, ids, &along, sink);
    }
}

fn counted(
    mesh: &Mesh,
    homes: &Homes,
    facets: &impl Corners,
    places: usize,
) -> BTreeMap<(usize, usize), Cuts> {
    let tallies = Tallies::new(places);
    search(mesh, homes, facets, &tallies);
    tallies.into_cuts()
}

enum Judged {
    Free,
    Overlap,
    /// To be settled by the triangles beyond the edges.
    AlongEdges,
}

#[inline(always)]
fn judged(
    ids: &[[u32; 3]],
    t: u32,
    u: u32,
    p: &[Point; 3],
    q: &[Point; 3],
    a: &Home,
    b: &Home,
) -> Judged {
    let (c, d) = (&ids[t as usize], &ids[u as usize]);
    let c_shared = c.map(|v| d.contains(&v));
    let d_shared = d.map(|v| c.contains(&v));
    let shared = c_shared.iter().filter(|&&s| s).count();
    let one_shell = a.shell == b.shell;
    let met = match shared {
        0 => meeting(p, q),
        // Neighbours across an edge overlap only where one is folded onto the other.
        2 if one_shell && goes_on(p, q, c_shared, d_shared) => return Judged::Free,
        3 if a.name == b.name => return Judged::Free,
        _ => meeting_sharing(p, q, c_shared, d_shared),
    };
    let overlap = match met {
        Meeting::Apart => false,
        Meeting::Crosses => true,
        Meeting::Coplanar { opposed } => one_shell || (opposed == (a.turned != b.turned)),
        Meeting::EdgeOn { first, side } => {
            let face = if first { b } else { a };
            let side = if face.turned { -side } else { side };
            a.closed && b.closed && side == wrong_side(a, b)
        }
        Meeting::EdgeOnEdge { .. } => {
            let neighbours = one_shell && shared == 2;
            if a.closed && b.closed && !neighbours {
                return Judged::AlongEdges;
            }
            false
        }
    };
    if overlap {
        Judged::Overlap
    } else {
        Judged::Free
    }
}

/// Whether neighbours across an edge share nothing but the edge.
#[inline(always)]
fn goes_on(p: &[Point; 3], q: &[Point; 3], p_shared: [bool; 3], q_shared: [bool; 3]) -> bool {
    let third = |shared: [bool; 3]| shared.iter().position(|s| !s);
    match (third(p_shared), third(q_shared)) {
        (Some(a), Some(b)) => unfolded(p, q, a, b),
        _ => false,
    }
}

/// Where nothing of the other surface may be: behind a facet, in its material; but the surfaces
/// of voids of one body lie in material, and must not enter the hollow in front.
fn wrong_side(a: &Home, b: &Home) -> i8 {
    if a.body == b.body && (a.void || b.void) {
        1
    } else {
        -1
    }
}

/// Settles pairs that meet along edges of both: such a pair overlaps where one triangle lies
/// strictly inside the wedge of material (of a void: of hollow) at the other's edge.
fn along_edges(
    homes: &Homes,
    facets: &impl Corners,
    ids: &[[u32; 3]],
    along: &[u32],
    sink: &impl Sink,
) {
    // By edge: the triangles that pass it, and whether they do so from low to high.
    let mut at_edge: HashMap<(u32, u32), Vec<(u32, bool)>> = HashMap::new();
    for &t in along {
        let c = ids[t as usize];
        for k in 0..3 {
            let (from, to) = (c[k], c[(k + 1) % 3]);
            at_edge
                .entry((from.min(to), from.max(to)))
                .or_default()
                .push((t, from < to));
        }
    }
    // Whether the apex of one lies inside the wedge at edge `f` of triangle `u`.
    let enters = |apex: &Point, u: u32, f: usize, hollow: bool| {
        let (from, to) = (ids[u as usize][f], ids[u as usize][(f + 1) % 3]);
        let home = homes.home(u);
        let Some(leaves) = at_edge.get(&(from.min(to), from.max(to))) else {
            return false;
        };
        let mut of_shell = leaves
            .iter()
            .filter(|(t, _)| homes.home(*t).shell == home.shell);
        let (Some(&x), Some(&y), None) = (of_shell.next(), of_shell.next(), of_shell.next()) else {
            // An edge of more wedges than one is reported as such.
            return false;
        };
        let far = |(t, _): (u32, bool)| {
            let c = ids[t as usize];
            let k = (0..3).find(|&k| c[k] != from && c[k] != to).unwrap_or(0);
            facets.triangle(t as usize)[k]
        };
        if x.1 == y.1 {
            return false;
        }
        let corners = facets.triangle(u as usize);
        let (low, high) = if from < to {
            (corners[f], corners[(f + 1) % 3])
        } else {
            (corners[(f + 1) % 3], corners[f])
        };
        // A facet that passes from high to low has its material ahead.
        let (opens, closes) = if x.1 != home.turned { (y, x) } else { (x, y) };
        let (from, to) = if hollow {
            (closes, opens)
        } else {
            (opens, closes)
        };
        strictly_inside(&low, &high, &far(from), &far(to), apex)
    };
    let tree = BoxTree::new(facets, Select::List(along));
    tree.pairs_within(facets, |_: &mut (), t, u, p, q| {
        let (a, b) = (homes.home(t), homes.home(u));
        if !sink.wants(a.body, b.body)
            || !matches!(judged(ids, t, u, p, q, a, b), Judged::AlongEdges)
        {
            return;
        }
        let Meeting::EdgeOnEdge { edges: [e, f] } = meeting(p, q) else {
            return;
        };
        let hollow = wrong_side(a, b) > 0;
        if enters(&p[(e + 2) % 3], u, f, hollow) || enters(&q[(f + 2) % 3], t, e, hollow) {
            sink.put(a.body, b.body, (t, u));
        }
    });
}

#[cfg(test)]
#[path = "overlap_tests.rs"]
mod tests;
