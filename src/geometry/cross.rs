//! How two triangles in space meet, exactly.
//!
//! Only meetings that can share volume matter here. Surfaces that merely touch (a vertex on a
//! face, an edge on an edge or a face from outside, opposed faces in contact) bound no space
//! twice: the winding number of the space around stays 0 or 1, so no volume changes. What does
//! bound space twice passes through somewhere along a segment of positive length, or covers a
//! positive area in one plane. Of such a segment each point lies inside both triangles, or on an
//! edge of one or of both; the last two are told apart from the first, because which of them is
//! contact depends on the triangles beyond the edge.
//!
//! The order of the four points where two pairs of edges pierce the line of both planes follows
//! from orientation signs alone (after Guigue and Devillers, "Fast and robust triangle-triangle
//! overlap test using orientation predicates", Journal of Graphics Tools 8(1), 2003).

use super::{Point, is_flat, plane_side, turn_2d};

/// How two triangles meet. Triangles without area meet nothing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Meeting {
    /// They share no segment of positive length and no area: apart, or touching at points.
    Apart,
    /// Each passes through the other's interior along a segment of positive length.
    Crosses,
    /// An edge of one runs through the other's interior along a segment of positive length.
    EdgeOn {
        /// Whether the edge is the first triangle's.
        first: bool,
        /// Where the edge's triangle lies: in front (+1) or behind (−1) of the other.
        side: i8,
    },
    /// Edges of both share a segment of positive length; the planes differ.
    EdgeOnEdge {
        /// Which edge of each: 0 from corner 0 to 1, 1 from 1 to 2, 2 from 2 to 0.
        edges: [usize; 2],
    },
    /// They share an area of one plane.
    Coplanar {
        /// Whether they face opposite ways.
        opposed: bool,
    },
}

/// Meets the triangles `t` and `u`.
pub fn meeting(t: &[Point; 3], u: &[Point; 3]) -> Meeting {
    meeting_sharing(t, u, [false; 3], [false; 3])
}

/// As [`meeting`], where the marked corners of `t` are known to be corners of `u` and the other
/// way round: this only saves work.
pub fn meeting_sharing(
    t: &[Point; 3],
    u: &[Point; 3],
    t_shared: [bool; 3],
    u_shared: [bool; 3],
) -> Meeting {
    if seen_apart(t, u, t_shared, u_shared) {
        return Meeting::Apart;
    }
    let of_t = sides(u, t, t_shared);
    if one_side(&of_t) {
        return Meeting::Apart;
    }
    let of_u = sides(t, u, u_shared);
    if one_side(&of_u) {
        return Meeting::Apart;
    }
    if of_t == [0; 3] || of_u == [0; 3] {
        return in_one_plane(t, u);
    }
    let (Some(a), Some(b)) = (Passage::of(&of_t), Passage::of(&of_u)) else {
        return Meeting::Apart;
    };
    if !share_length(t, u, a, b) {
        return Meeting::Apart;
    }
    match (a.edge, b.edge) {
        (None, None) => Meeting::Crosses,
        (Some(_), None) => Meeting::EdgeOn {
            first: true,
            side: of_t[a.lone],
        },
        (None, Some(_)) => Meeting::EdgeOn {
            first: false,
            side: of_u[b.lone],
        },
        (Some(e), Some(f)) => Meeting::EdgeOnEdge { edges: [e, f] },
    }
}

/// Whether neighbours across an edge do no more than that: `t` and `u` share two corners, and their
/// third corners are `a` of `t` and `b` of `u`. False only where one is folded onto the other, or
/// one has no area.
pub fn unfolded(t: &[Point; 3], u: &[Point; 3], a: usize, b: usize) -> bool {
    if quick_side(t, &u[b]).is_some() {
        return true;
    }
    // Nearly in one plane: third corners on different sides of the edge settle it.
    let (x, y) = widest(t);
    let edge = (&t[(a + 1) % 3], &t[(a + 2) % 3]);
    let mine = turn_2d(edge.0, edge.1, &t[a], x, y);
    if mine != 0 && turn_2d(edge.0, edge.1, &u[b], x, y) == -mine {
        return true;
    }
    plane_side(&t[0], &t[1], &t[2], &u[b]) != 0
}

/// Whether floating-point bounds or turns in a plane already show that the triangles share no
/// length and no area. Triangles that lie nearly in one plane would else ask for exact arithmetic
/// at every pair of neighbours.
#[inline(always)]
fn seen_apart(t: &[Point; 3], u: &[Point; 3], t_shared: [bool; 3], u_shared: [bool; 3]) -> bool {
    let quick = |plane: &[Point; 3], of: &[Point; 3], known_zero: [bool; 3]| {
        let (mut front, mut behind, mut zero) = (0, 0, 0);
        for k in 0..3 {
            match known_zero[k] {
                true => zero += 1,
                false => match quick_side(plane, &of[k]) {
                    Some(1) => front += 1,
                    Some(_) => behind += 1,
                    None => return false,
                },
            }
        }
        zero <= 1 && (front == 0 || behind == 0)
    };
    quick(u, t, t_shared) || quick(t, u, u_shared) || parted_in_shadow(t, u)
}

/// The side of a plane, where rounding leaves no doubt of it and it is not zero (Shewchuk's first
/// filter).
#[inline(always)]
fn quick_side(plane: &[Point; 3], p: &Point) -> Option<i8> {
    // (7 + 56 ε) ε with ε = 2⁻⁵³, and room for what underflows.
    const BOUND: f64 = 7.771_561_172_376_103e-16;
    let d = [0, 1, 2].map(|i| [0, 1, 2].map(|k| plane[i][k] - p[k]));
    let pairs = |i: usize, j: usize| (d[i][0] * d[j][1], d[j][0] * d[i][1]);
    let (ab, bc, ca) = (pairs(0, 1), pairs(1, 2), pairs(2, 0));
    let det = d[0][2] * (bc.0 - bc.1) + d[1][2] * (ca.0 - ca.1) + d[2][2] * (ab.0 - ab.1);
    let size = d[0][2].abs() * (bc.0.abs() + bc.1.abs())
        + d[1][2].abs() * (ca.0.abs() + ca.1.abs())
        + d[2][2].abs() * (ab.0.abs() + ab.1.abs());
    // det is (a−p)·((b−p)×(c−p)): positive where p lies behind.
    (det.abs() > BOUND * size + f64::MIN_POSITIVE).then_some(if det > 0.0 { -1 } else { 1 })
}

/// The two axes of the coordinate plane in which the triangle is widest.
#[inline(always)]
fn widest(t: &[Point; 3]) -> (usize, usize) {
    let e = [1, 2].map(|i| [0, 1, 2].map(|k| t[i][k] - t[0][k]));
    let n = [(1, 2), (2, 0), (0, 1)].map(|(i, j)| (e[0][i] * e[1][j] - e[0][j] * e[1][i]).abs());
    if n[0] >= n[1] && n[0] >= n[2] {
        (1, 2)
    } else if n[1] >= n[2] {
        (2, 0)
    } else {
        (0, 1)
    }
}

/// Whether, seen along an axis, an edge of one parts them: they then share at most what lies on
/// the plane of that edge and the axis, which is a corner, or edges that do not overlap.
fn parted_in_shadow(t: &[Point; 3], u: &[Point; 3]) -> bool {
    let (x, y) = widest(t);
    parted_by_edge(t, u, x, y) || parted_by_edge(u, t, x, y)
}

fn parted_by_edge(t: &[Point; 3], u: &[Point; 3], x: usize, y: usize) -> bool {
    let s = turn_2d(&t[0], &t[1], &t[2], x, y);
    s != 0
        && (0..3).any(|k| {
            let (a, b) = (&t[k], &t[(k + 1) % 3]);
            let mut on = [a; 2];
            let mut count = 0;
            for p in u {
                let turn = if p == a || p == b {
                    0
                } else {
                    turn_2d(a, b, p, x, y)
                };
                if turn == s {
                    return false;
                }
                if turn == 0 {
                    if count == 2 {
                        return false;
                    }
                    on[count] = p;
                    count += 1;
                }
            }
            // Two corners on the line: apart where their stretch of it lies beyond the edge.
            let beyond = |axis: usize| {
                let (p, q) = (on[0][axis], on[1][axis]);
                let (low, high) = (a[axis].min(b[axis]), a[axis].max(b[axis]));
                low != high && (p.max(q) <= low || p.min(q) >= high)
            };
            count < 2 || beyond(x) || beyond(y)
        })
}

/// Sides of the corners of `of` against the plane of `plane`.
#[inline(always)]
fn sides(plane: &[Point; 3], of: &[Point; 3], known_zero: [bool; 3]) -> [i8; 3] {
    [0, 1, 2].map(|k| {
        if known_zero[k] {
            0
        } else {
            plane_side(&plane[0], &plane[1], &plane[2], &of[k])
        }
    })
}

/// Whether the plane is met at no more than one corner.
#[inline(always)]
fn one_side(s: &[i8; 3]) -> bool {
    let (front, behind) = (
        s.iter().filter(|&&x| x > 0).count(),
        s.iter().filter(|&&x| x < 0).count(),
    );
    front + behind >= 2 && (front == 0 || behind == 0)
}

/// How a triangle passes through a plane along a segment.
#[derive(Clone, Copy, Debug)]
struct Passage {
    /// A corner off the plane, of which both edges reach the plane.
    lone: usize,
    /// The edge that lies in the plane, if one does.
    edge: Option<usize>,
}

impl Passage {
    /// From the sides of its corners, not all zero; `None` where it meets the plane in a point.
    fn of(s: &[i8; 3]) -> Option<Self> {
        let lone =
            (0..3).find(|&k| s[k] != 0 && s[(k + 1) % 3] != s[k] && s[(k + 2) % 3] != s[k])?;
        let (next, last) = (s[(lone + 1) % 3], s[(lone + 2) % 3]);
        Some(Self {
            lone,
            edge: (next == 0 && last == 0).then_some((lone + 1) % 3),
        })
    }
}

/// Whether the segments that the triangles cut from the line of both planes share a length.
///
/// With p a corner of `t` off the plane of `u` and q one of `u` off the plane of `t`, the sign of
/// the tetrahedron (p, p′, q, q′) tells in which order the edges pp′ and qq′ pierce the line, and
/// is zero exactly where they pierce it at one point.
fn share_length(t: &[Point; 3], u: &[Point; 3], a: Passage, b: Passage) -> bool {
    let (p, q) = (&t[a.lone], &u[b.lone]);
    let (mut ahead, mut back) = (false, false);
    for i in 1..3 {
        for j in 1..3 {
            match plane_side(p, &t[(a.lone + i) % 3], q, &u[(b.lone + j) % 3]) {
                1 => ahead = true,
                -1 => back = true,
                _ => {}
            }
        }
    }
    ahead && back
}

/// Of triangles of which one lies in the other's plane.
fn in_one_plane(t: &[Point; 3], u: &[Point; 3]) -> Meeting {
    if is_flat(t) || is_flat(u) {
        return Meeting::Apart;
    }
    for (x, y) in [(0, 1), (1, 2), (2, 0)] {
        let (st, su) = (
            turn_2d(&t[0], &t[1], &t[2], x, y),
            turn_2d(&u[0], &u[1], &u[2], x, y),
        );
        if st != 0 && su != 0 {
            let apart = beyond_an_edge(t, st, u, x, y) || beyond_an_edge(u, su, t, x, y);
            return if apart {
                Meeting::Apart
            } else {
                Meeting::Coplanar { opposed: st != su }
            };
        }
    }
    Meeting::Apart
}

/// Whether `u` lies beyond or on an edge of `t`, whose turn is `s`. Convex figures whose interiors
/// are disjoint are parted by an edge of one of them.
fn beyond_an_edge(t: &[Point; 3], s: i8, u: &[Point; 3], x: usize, y: usize) -> bool {
    (0..3).any(|k| {
        let (a, b) = (&t[k], &t[(k + 1) % 3]);
        u.iter().all(|p| turn_2d(a, b, p, x, y) != s)
    })
}

/// A point of what the triangles share, to rounding: the middle of the segment, or the mean corner
/// of the area. Meaningful where [`meeting`] is not `Apart`.
pub fn meeting_point(t: &[Point; 3], u: &[Point; 3]) -> Point {
    // The part of t within u's slab of edge planes, cut by u's plane where the planes differ.
    let sub = |a: &Point, b: &Point| [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
    let cross = |a: [f64; 3], b: [f64; 3]| {
        [
            a[1] * b[2] - a[2] * b[1],
            a[2] * b[0] - a[0] * b[2],
            a[0] * b[1] - a[1] * b[0],
        ]
    };
    let dot = |a: [f64; 3], b: [f64; 3]| a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
    let n = cross(sub(&u[1], &u[0]), sub(&u[2], &u[0]));
    let of_t = sides(u, t, [false; 3]);
    let mut shape: Vec<Point> = match Passage::of(&of_t) {
        Some(a) if of_t != [0; 3] => {
            let p = t[a.lone];
            let height = dot(n, sub(&p, &u[0])).abs();
            [1, 2]
                .map(|i| {
                    let k = (a.lone + i) % 3;
                    let q = t[k];
                    if of_t[k] == 0 {
                        return q;
                    }
                    let other = dot(n, sub(&q, &u[0])).abs();
                    let part = height / (height + other);
                    let part = if part.is_finite() { part } else { 0.5 };
                    [0, 1, 2].map(|c| p[c] + (q[c] - p[c]) * part)
                })
                .to_vec()
        }
        _ => t.to_vec(),
    };
    for k in 0..3 {
        let (a, b) = (&u[k], &u[(k + 1) % 3]);
        let inward = cross(n, sub(b, a));
        let depth = |p: &Point| dot(inward, sub(p, a));
        let mut kept = Vec::with_capacity(shape.len() + 1);
        for (i, p) in shape.iter().enumerate() {
            let next = &shape[(i + 1) % shape.len()];
            let (d, e) = (depth(p), depth(next));
            if d >= 0.0 {
                kept.push(*p);
            }
            if d * e < 0.0 {
                kept.push([0, 1, 2].map(|c| p[c] + (next[c] - p[c]) * (d / (d - e))));
            }
        }
        if kept.is_empty() {
            break;
        }
        shape = kept;
    }
    let share = 1.0 / shape.len() as f64;
    let mean = [0, 1, 2].map(|c| shape.iter().map(|p| p[c] * share).sum::<f64>());
    // Planes that are nearly one leave the point loose along them: it is in both boxes for certain.
    let end =
        |t: &[Point; 3], c: usize, pick: fn(f64, f64) -> f64| pick(pick(t[0][c], t[1][c]), t[2][c]);
    [0, 1, 2].map(|c| {
        let low = end(t, c, f64::min).max(end(u, c, f64::min));
        let high = end(t, c, f64::max).min(end(u, c, f64::max));
        mean[c].max(low).min(high)
    })
}

#[cfg(test)]
#[path = "cross_tests.rs"]
mod tests;
