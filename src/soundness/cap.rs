//! Open bodies: caps over their boundary loops, and how far the capped solid's figures can be off.
//!
//! # The assumption
//! Of each cap, of area A: the missing surface has at most the area 2·A, lies on one side of the
//! cap, and stays within the reach ρ = 2·√(A/π) of the loop's centre (its centre by length), or
//! within the loop's own farthest vertex where that is farther. Nothing in the file says that it
//! is so; every figure that rests on it says "if".
//!
//! # The bounds
//! Let S be the missing surface and D the cap, with the same rim. S − D is closed; its winding
//! number w is what the true solid has more than the capped one, so ΔV = ∫w. Surfaces of area P
//! have |∫w| ≤ ∫|w| ≤ P^1.5/(6√π) (the isoperimetric inequality, equality for the sphere; for
//! winding numbers other than 0 and 1 it holds of each level set, and the sums only gain).
//!
//! * Any loop: P ≤ 2A + A, so |ΔV| ≤ (3A)^1.5/(6√π).
//! * A flat loop: S − D and its mirror image in the plane of D together are a closed surface of
//!   area at most 4A, from which D has gone, and twice the volume: |ΔV| ≤ (2/3)·A^1.5/√π. A
//!   half-sphere on a disc attains it. Vertices off the plane by up to h (rounding) add the strip
//!   between rim and plane: 2A becomes 2A + h·L with L the rim's length, and h·A is added.
//! * Loops add in absolute value: B = ΣBᵢ.
//! * A true solid holds no less than nothing and no more than the box round the body and every
//!   reach: |ΔV| ≤ max(V, V_box − V) too.
//! * Centre: w lives within ρᵢ of each loop's centre gᵢ, hence within dᵢ = |gᵢ − c| + ρᵢ of the
//!   capped solid's centre c, and Δc = ∫w·(x − c)/(V + ΔV): |Δc| ≤ ΣBᵢdᵢ/(V − B), and never more
//!   than the farthest corner of that box.
//! * Inertia about the own centre: each component, and each principal moment, changes by at most
//!   ΣBᵢdᵢ² + (ΣBᵢdᵢ)²/(V − B): the second moments of w about c, and the parallel-axis term of the
//!   moved centre.

mod bound;
mod cover;

use std::collections::HashSet;

use rayon::prelude::*;

use super::cross::{Facet, Tree};
use crate::geometry::{Corners, LooseFacets, Point, Select};
use crate::mesh::{Body, Mesh, NestedRule, Part, Shell, each};
use crate::moments::{Moments, SolidIntegrals, integrate};
use cover::{Cover, Plane, length, minus};

pub use bound::{Bounds, any_bound, bounds, flat_bound, reach};
pub(crate) use cover::MOST as MOST_VERTICES;

/// A cap over one boundary loop, or over an outer loop and the loops within it in its plane. In
/// the file's unit.
#[derive(Clone, Debug)]
pub struct Cap {
    /// Its triangles, as the numbers that welding gives the vertices, facing as the body faces.
    pub(crate) triangles: Vec<[u32; 3]>,
    /// Name of the shell, as an index into the soup's names.
    pub(crate) name: u32,
    /// A triangle of the mesh along its rim.
    pub(crate) beside: u32,
    /// How many loops it closes.
    pub loops: usize,
    /// Its area A.
    pub area: f64,
    /// Whether the loop is flat to the rounding of its coordinates.
    pub flat: bool,
    /// Centre of the (outer) loop by length.
    pub centre: [f64; 3],
    /// How far from the centre the missing surface is taken to stay.
    pub reach: f64,
    /// The most that the volume can differ by, either way.
    pub volume_bound: f64,
}

impl Cap {
    /// The corners of its triangles (file unit), of the mesh that it was made for.
    pub fn corners(&self, mesh: &Mesh) -> Vec<[[f64; 3]; 3]> {
        let vertex = |v: u32| mesh.soup.triangles.vertex(v);
        self.triangles.iter().map(|t| t.map(vertex)).collect()
    }
}

/// Why a body has no estimate.
#[derive(Clone, Debug, PartialEq)]
pub struct NoCap {
    /// In words, to follow "it cannot be capped: ".
    pub reason: String,
    /// Where (file unit).
    pub at: [f64; 3],
}

/// Figures of the capped solid, with their bounds, in the file's unit.
#[derive(Clone, Debug)]
pub struct Estimate {
    /// Integrals of the capped solid.
    pub solid: SolidIntegrals,
    /// How far off they can be, under the assumption.
    pub bounds: Bounds,
    /// The caps.
    pub caps: Vec<Cap>,
}

/// A boundary loop in the direction in which a cap runs along it.
struct Rim {
    ids: Vec<u32>,
    points: Vec<Point>,
    name: u32,
    beside: u32,
    plane: Option<Plane>,
}

/// Caps for every boundary loop of a body.
///
/// # Errors
/// Where an open edge is no rim (facets in conflict, more than two at an edge, doubled facets), a
/// loop crosses itself or is too long, caps cut each other, or another open surface of the same
/// name stands where it may belong to the same opening.
pub fn caps(mesh: &Mesh, body: &Body) -> Result<Vec<Cap>, NoCap> {
    let shells: Vec<&Shell> = body
        .roles()
        .iter()
        .map(|r| &mesh.found().shells[r.shell])
        .collect();
    stands_alone(mesh, &shells)?;
    let mut rims = Vec::new();
    for shell in &shells {
        rims.extend(rims_of(mesh, shell)?);
    }
    let groups = group_by_plane(&rims);
    let covered: Vec<Result<Cap, NoCap>> = groups.par_iter().map(|g| cap(&rims, g)).collect();
    let caps = covered.into_iter().collect::<Result<Vec<Cap>, NoCap>>()?;
    let facets = facets_of(mesh, &caps);
    let tree = Tree::over(&facets);
    let of: Vec<usize> = (0..)
        .zip(&caps)
        .flat_map(|(c, cap)| std::iter::repeat_n(c, cap.triangles.len()))
        .collect();
    let crossing = facets
        .par_iter()
        .enumerate()
        .find_map_first(|(i, f)| tree.crossed(f, Some(i)).map(|j| (i, j)));
    if let Some((i, j)) = crossing {
        return Err(NoCap {
            reason: if of[i] == of[j] {
                "the cap of a loop would cut itself".into()
            } else {
                "the caps of two loops would cut each other".into()
            },
            at: facets[i].at[0],
        });
    }
    Ok(caps)
}

/// The triangles of the caps with their coordinates.
pub(crate) fn facets_of(mesh: &Mesh, caps: &[Cap]) -> Vec<Facet> {
    let vertex = |v: u32| mesh.soup.triangles.vertex(v);
    caps.iter()
        .flat_map(|c| &c.triangles)
        .map(|&ids| Facet {
            ids,
            at: ids.map(vertex),
        })
        .collect()
}

/// Other open surfaces of the name, near enough to share an opening, forbid a cap: the face that
/// is missing may run from one to the other (a pipe's ring between its outer and inner wall).
fn stands_alone(mesh: &Mesh, shells: &[&Shell]) -> Result<(), NoCap> {
    for s in shells.iter().filter(|s| !s.closed()) {
        for other in &mesh.found().shells {
            let ours = shells.iter().any(|x| std::ptr::eq(*x, other));
            let near = (0..3).all(|k| {
                s.bounds[0][k] <= other.bounds[1][k] && other.bounds[0][k] <= s.bounds[1][k]
            });
            if !ours && !other.closed() && other.name == s.name && near {
                return Err(NoCap {
                    reason: "another open surface stands within its box, and what is missing may join the two".into(),
                    at: mesh.soup.triangles.vertex(other.open[0].from),
                });
            }
        }
    }
    Ok(())
}

fn rims_of(mesh: &Mesh, shell: &Shell) -> Result<Vec<Rim>, NoCap> {
    let vertex = |v: u32| mesh.soup.triangles.vertex(v);
    let no = |reason: &str, v: u32| {
        Err(NoCap {
            reason: reason.to_owned(),
            at: vertex(v),
        })
    };
    if let Some(e) = shell.open.iter().find(|e| e.surplus > 1) {
        return no("facets face opposite ways at an edge", e.from);
    }
    if let Some(e) = shell.open.iter().find(|e| e.triangles.len() > 1) {
        return no("more than two facets meet at an open edge", e.from);
    }
    if let (false, Some(e)) = (shell.doubled.is_empty(), shell.open.first()) {
        return no("facets stand twice in it", e.from);
    }
    let edges: HashSet<(u32, u32)> = shell.open.iter().map(|e| (e.from, e.to)).collect();
    let mut rims = Vec::new();
    for l in &shell.loops {
        let n = l.vertices.len();
        let whole = (0..n).all(|i| edges.contains(&(l.vertices[i], l.vertices[(i + 1) % n])));
        if n < 3 || !whole {
            return no("open edges do not close into a loop", l.vertices[0]);
        }
        if n > MOST_VERTICES {
            return no(
                &format!("a loop has {n} edges, more than {MOST_VERTICES}"),
                l.vertices[0],
            );
        }
        let ids: Vec<u32> = l.vertices.iter().rev().copied().collect();
        let points: Vec<Point> = ids.iter().map(|&v| vertex(v)).collect();
        rims.push(Rim {
            plane: cover::plane_of(&points),
            ids,
            points,
            name: shell.name,
            beside: l.triangles.first().copied().unwrap_or(shell.first),
        });
    }
    Ok(rims)
}

/// Which loops are closed together: each outer loop with the flat loops directly within it that
/// lie in its plane and run the other way. Indices, the outer one first.
fn group_by_plane(rims: &[Rim]) -> Vec<Vec<usize>> {
    /// Loops that are compared with each other; the work grows with the square.
    const FEW: usize = 2000;
    let n = rims.len();
    let mut within: Vec<Vec<usize>> = vec![Vec::new(); n];
    if n <= FEW {
        for (a, ra) in rims.iter().enumerate() {
            for (b, rb) in rims.iter().enumerate() {
                if a != b && lies_within(ra, rb) {
                    within[a].push(b);
                }
            }
        }
    }
    let mut groups: Vec<Vec<usize>> = Vec::new();
    let is_hole = |a: usize| within[a].len() % 2 == 1;
    for a in (0..n).filter(|&a| !is_hole(a)) {
        let mut group = vec![a];
        group.extend((0..n).filter(|&h| {
            is_hole(h) && within[h].contains(&a) && within[h].len() == within[a].len() + 1
        }));
        groups.push(group);
    }
    let taken: HashSet<usize> = groups.iter().flatten().copied().collect();
    groups.extend((0..n).filter(|a| !taken.contains(a)).map(|a| vec![a]));
    groups.sort_by_key(|g| g.iter().min().copied());
    groups
}

/// Whether flat loop `a` lies in the plane of `b`, inside it, and runs the other way or is nested
/// deeper.
fn lies_within(a: &Rim, b: &Rim) -> bool {
    let (Some(pa), Some(pb)) = (&a.plane, &b.plane) else {
        return false;
    };
    if pa.line || pb.line || a.name != b.name {
        return false;
    }
    let tolerance = pa.tolerance + pb.tolerance;
    let coplanar = a
        .points
        .iter()
        .all(|p| cover::dot(&minus(p, &pb.through), &pb.normal).abs() <= tolerance);
    let (u, v) = pb.axes;
    coplanar
        && a.points
            .iter()
            .find_map(|p| cover::in_polygon(p, &b.points, u, v))
            == Some(true)
}

fn cap(rims: &[Rim], group: &[usize]) -> Result<Cap, NoCap> {
    let outer = &rims[group[0]];
    let loops: Vec<&[Point]> = group.iter().map(|&i| &rims[i].points[..]).collect();
    let cover: Option<Cover> = match &outer.plane {
        Some(plane) => cover::cover_flat(&loops, plane),
        None => cover::cover_least(&outer.points),
    };
    let Some(cover) = cover else {
        return Err(NoCap {
            reason: if group.len() == 1 {
                "a loop crosses or touches itself".into()
            } else {
                "loops in one plane could not be closed together".into()
            },
            at: outer.points[0],
        });
    };
    let ids: Vec<u32> = group
        .iter()
        .flat_map(|&i| rims[i].ids.iter().copied())
        .collect();
    let (centre, rim) = centre_of_polyline(&outer.points);
    let farthest = outer
        .points
        .iter()
        .map(|p| length(&minus(p, &centre)))
        .fold(0.0, f64::max);
    let rim: f64 = rim
        + loops[1..]
            .iter()
            .map(|l| centre_of_polyline(l).1)
            .sum::<f64>();
    let deviation = outer.plane.map(|p| p.deviation);
    Ok(Cap {
        triangles: cover
            .triangles
            .iter()
            .map(|t| t.map(|i| ids[i as usize]))
            .collect(),
        name: outer.name,
        beside: outer.beside,
        loops: group.len(),
        area: cover.area,
        flat: deviation.is_some(),
        centre,
        reach: reach(cover.area).max(farthest),
        volume_bound: match deviation {
            Some(h) => flat_bound(cover.area + h * rim / 2.0) + h * cover.area,
            None => any_bound(cover.area),
        },
    })
}

/// The capped solid of an open body, with its bounds.
///
/// # Errors
/// As [`caps`]; and where a solid nested in it needs a rule, or the capped surface faces inward.
pub fn estimate(mesh: &Mesh, body: &Body, nested: Option<NestedRule>) -> Result<Estimate, NoCap> {
    let caps = caps(mesh, body)?;
    let first = mesh
        .soup
        .triangles
        .vertex(mesh.found().corners[body.first as usize][0]);
    if nested.is_none() && body.has_nested() {
        return Err(NoCap {
            reason: "a solid lies inside it; say how to count it with --nested".into(),
            at: first,
        });
    }
    let solid = capped(mesh, body, nested.unwrap_or(NestedRule::Sum), &caps, first);
    let volume = solid.moments.zeroth;
    if volume.is_nan() || volume <= 0.0 {
        return Err(NoCap {
            reason: "its surface faces inward".into(),
            at: first,
        });
    }
    let bounds = bounds(&caps, &solid.moments, body.bounds);
    Ok(Estimate {
        solid,
        bounds,
        caps,
    })
}

/// Integrals of the body's shells and caps together, about `apex`.
fn capped(mesh: &Mesh, body: &Body, rule: NestedRule, caps: &[Cap], apex: Point) -> SolidIntegrals {
    let middle = crate::mesh::middle(&body.bounds);
    let mut moments = Moments::zero(nalgebra::Vector3::from(apex));
    let (mut area, mut absolute) = (0.0, 0.0);
    for role in body.roles() {
        let shell = &mesh.found().shells[role.shell];
        let sign = if role.turned { -1.0 } else { 1.0 };
        let weight = match (role.part, rule) {
            (Part::Nested, NestedRule::Union) => continue,
            (Part::Nested, NestedRule::Void) => -sign,
            _ => sign,
        };
        // Open shells only sum to a solid with their caps, and only about one point.
        let s = if shell.closed() {
            shell.solid
        } else {
            each!(&mesh.soup.triangles, f => integrate(f, shell.members.select(), apex, middle))
        };
        moments = moments.plus(&s.moments.weighted(weight));
        area += s.area;
        absolute += s.absolute_volume;
    }
    let list: Vec<[Point; 3]> = facets_of(mesh, caps).iter().map(|f| f.at).collect();
    let s = integrate(&LooseFacets(&list), Select::All, apex, middle);
    SolidIntegrals {
        moments: moments.plus(&s.moments),
        area: area + s.area,
        absolute_volume: absolute + s.absolute_volume,
    }
}

/// Whether a cap meets a facet of the mesh elsewhere than along its rim.
pub(crate) fn cuts_mesh(mesh: &Mesh, caps: &[Cap]) -> Option<Point> {
    let facets = facets_of(mesh, caps);
    let tree = Tree::over(&facets);
    each!(&mesh.soup.triangles, f => {
        (0..f.count()).into_par_iter().find_map_first(|t| {
            let at = f.triangle(t);
            let ids = mesh.found().corners[t];
            tree.crossed(&Facet { ids, at }, None).map(|_| at[0])
        })
    })
}

/// Centre of a closed polyline by its length, and the length.
pub(super) fn centre_of_polyline(points: &[Point]) -> (Point, f64) {
    let mut total = 0.0;
    let mut weighted = [0.0; 3];
    for (i, p) in points.iter().enumerate() {
        let q = &points[(i + 1) % points.len()];
        let l = length(&minus(q, p));
        total += l;
        for k in 0..3 {
            weighted[k] += l * (p[k] + (q[k] - p[k]) / 2.0);
        }
    }
    if total > 0.0 {
        (weighted.map(|w| w / total), total)
    } else {
        (points[0], 0.0)
    }
}
