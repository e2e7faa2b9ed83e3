//! Signs that are exact, after Shewchuk, "Adaptive precision floating-point arithmetic and fast
//! robust geometric predicates", Discrete & Computational Geometry 18 (1997).

use robust::{Coord, Coord3D, orient2d, orient3d};

/// A point in the file's unit.
pub type Point = [f64; 3];

fn at3(p: &Point) -> Coord3D<f64> {
    Coord3D {
        x: p[0],
        y: p[1],
        z: p[2],
    }
}

/// On which side of the plane through a, b, c the point p lies: positive where (b−a)×(c−a)
/// points, negative behind, zero exactly on it.
pub fn plane_side(a: &Point, b: &Point, c: &Point, p: &Point) -> i8 {
    sign(-orient3d(at3(a), at3(b), at3(c), at3(p)))
}

/// The turn a → b → c in the plane of the axes `u` and `v`: positive when it turns from u
/// towards v, zero exactly when the three lie on one line there.
pub fn turn_2d(a: &Point, b: &Point, c: &Point, u: usize, v: usize) -> i8 {
    let at = |p: &Point| Coord { x: p[u], y: p[v] };
    sign(orient2d(at(a), at(b), at(c)))
}

/// Whether three corners lie on one line, exactly.
#[inline(always)]
pub fn is_flat(t: &[Point; 3]) -> bool {
    let [a, b, c] = t;
    let (u, v) = (
        [0, 1, 2].map(|k| b[k] - a[k]),
        [0, 1, 2].map(|k| c[k] - a[k]),
    );
    let n = [
        u[1] * v[2] - u[2] * v[1],
        u[2] * v[0] - u[0] * v[2],
        u[0] * v[1] - u[1] * v[0],
    ];
    let size = |w: &[f64; 3]| w[0].abs().max(w[1].abs()).max(w[2].abs());
    // Rounding of the differences and products is below 16 ulp of the edges' product plus what
    // the coordinates' own size loses; past that the area is certainly not zero.
    let doubt = 16.0 * f64::EPSILON * size(&u) * size(&v);
    if size(&n) > doubt {
        return false;
    }
    [(0, 1), (1, 2), (2, 0)]
        .iter()
        .all(|&(i, j)| turn_2d(a, b, c, i, j) == 0)
}

fn sign(x: f64) -> i8 {
    i8::from(x > 0.0) - i8::from(x < 0.0)
}

/// How a ray from a point along +x meets a triangle.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Position {
    /// It does not meet it.
    Misses,
    /// It leaves through the front (+1) or enters through the back (−1).
    Crosses(i8),
    /// The point lies on the triangle, rim included.
    On,
}

/// Meets the ray from `p` along +x with the triangle `t`.
///
/// A ray that grazes an edge or a corner is decided as if p were moved by an infinitesimal
/// (0, ε, ε²) (simulation of simplicity, Edelsbrunner & Mücke 1990), the same for every triangle,
/// so that over a closed surface each passage counts once.
pub fn ray_crossing(p: &Point, t: &[Point; 3]) -> Position {
    let [a, b, c] = t;
    if a[0].max(b[0]).max(c[0]) < p[0] {
        return Position::Misses;
    }
    for k in 1..3 {
        let (low, high) = (a[k].min(b[k]).min(c[k]), a[k].max(b[k]).max(c[k]));
        if p[k] < low || p[k] > high {
            return Position::Misses;
        }
    }
    let raw = [
        turn_2d(a, b, p, 1, 2),
        turn_2d(b, c, p, 1, 2),
        turn_2d(c, a, p, 1, 2),
    ];
    let grazes = raw.contains(&0);
    if grazes {
        // On the rim, or in a triangle that is seen edge-on: the point may lie on it.
        let one_sided = raw.iter().all(|&s| s >= 0) || raw.iter().all(|&s| s <= 0);
        if one_sided && plane_side(a, b, c, p) == 0 && in_closed_triangle(p, t) {
            return Position::On;
        }
    }
    let moved = [(0, a, b), (1, b, c), (2, c, a)].map(|(i, from, to)| {
        if raw[i] != 0 {
            return raw[i];
        }
        // Derivative of the turn from→to→p by p's y, then by its z.
        match sign(from[2] - to[2]) {
            0 => sign(to[1] - from[1]),
            s => s,
        }
    });
    if moved[0] == 0 || moved[0] != moved[1] || moved[1] != moved[2] {
        return Position::Misses;
    }
    match plane_side(a, b, c, p) {
        0 => Position::On,
        s if s == moved[0] => Position::Misses,
        _ => Position::Crosses(moved[0]),
    }
}

/// Whether p, known to lie in the triangle's plane, lies in the triangle or on its rim.
fn in_closed_triangle(p: &Point, t: &[Point; 3]) -> bool {
    let [a, b, c] = t;
    for (u, v) in [(1, 2), (2, 0), (0, 1)] {
        if turn_2d(a, b, c, u, v) == 0 {
            continue;
        }
        let s = [
            turn_2d(a, b, p, u, v),
            turn_2d(b, c, p, u, v),
            turn_2d(c, a, p, u, v),
        ];
        return s.iter().all(|&x| x >= 0) || s.iter().all(|&x| x <= 0);
    }
    // No area at all: the triangle is a segment; p lies on it if within its box and collinear,
    // which the caller's turns and box test have shown in (y, z); x remains.
    let (low, high) = (a[0].min(b[0]).min(c[0]), a[0].max(b[0]).max(c[0]));
    (low..=high).contains(&p[0])
        && [(1, 2), (2, 0), (0, 1)]
            .iter()
            .all(|&(u, v)| turn_2d(a, b, p, u, v) == 0 && turn_2d(b, c, p, u, v) == 0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn side_is_positive_where_the_normal_points() {
        let (a, b, c) = ([0.0; 3], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]);
        assert_eq!(plane_side(&a, &b, &c, &[0.2, 0.2, 1.0]), 1);
        assert_eq!(plane_side(&a, &b, &c, &[0.2, 0.2, -1e-300]), -1);
        assert_eq!(plane_side(&a, &b, &c, &[5.0, 5.0, 0.0]), 0);
    }

    #[test]
    fn a_ray_through_a_shared_edge_counts_once() {
        // Two triangles of a square in the plane x = 1, seen from the origin; the ray runs
        // exactly along their shared diagonal's middle.
        let (p, q, r, s) = (
            [1.0, -1.0, -1.0],
            [1.0, 1.0, -1.0],
            [1.0, 1.0, 1.0],
            [1.0, -1.0, 1.0],
        );
        let hits = [
            ray_crossing(&[0.0; 3], &[p, q, r]),
            ray_crossing(&[0.0; 3], &[p, r, s]),
        ];
        assert_eq!(
            hits.iter().filter(|h| **h == Position::Crosses(1)).count(),
            1
        );
        assert_eq!(hits.iter().filter(|h| **h == Position::Misses).count(), 1);
        assert_eq!(ray_crossing(&[1.0, 0.0, 0.0], &[p, q, r]), Position::On);
        assert_eq!(ray_crossing(&[2.0, 0.0, 0.0], &[p, q, r]), Position::Misses);
    }
}
