//! Boundary loops covered with triangles of their own vertices.

use crate::format::obj::triangulate;
use crate::geometry::{Point, turn_2d};
use crate::soundness::cross::segments_meet;

/// Most vertices for which all triangulations of a loop that is not flat are compared.
pub(crate) const COMPARED: usize = 300;
/// Most vertices of a loop that is not flat.
pub(crate) const MOST: usize = 30_000;

/// Triangles that span one loop, or an outer loop and the loops within it in its plane.
#[derive(Clone, Debug)]
pub(super) struct Cover {
    /// Positions in the loops' points, one loop after the other.
    pub(super) triangles: Vec<[u32; 3]>,
    pub(super) area: f64,
}

/// A plane that a loop lies in, to the rounding of its coordinates.
#[derive(Clone, Copy, Debug)]
pub(super) struct Plane {
    pub(super) normal: Point,
    pub(super) through: Point,
    /// Largest distance of a vertex from it.
    pub(super) deviation: f64,
    /// What was allowed.
    pub(super) tolerance: f64,
    /// Axes of the projection that loses least, in the order in which the loop turns left.
    pub(super) axes: (usize, usize),
    /// Whether the loop is a line there and back.
    pub(super) line: bool,
}

pub(super) fn minus(a: &Point, b: &Point) -> Point {
    [0, 1, 2].map(|k| a[k] - b[k])
}

pub(super) fn cross_product(a: &Point, b: &Point) -> Point {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

pub(super) fn dot(a: &Point, b: &Point) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

pub(super) fn length(a: &Point) -> f64 {
    dot(a, a).sqrt()
}

pub(super) fn area(t: &[Point; 3]) -> f64 {
    length(&cross_product(&minus(&t[1], &t[0]), &minus(&t[2], &t[0]))) / 2.0
}

/// Twice the loop's area as a vector (Newell), about its first vertex.
fn vector_area(points: &[Point]) -> Point {
    let mut sum = [0.0; 3];
    for i in 1..points.len().saturating_sub(1) {
        let n = cross_product(
            &minus(&points[i], &points[0]),
            &minus(&points[i + 1], &points[0]),
        );
        for k in 0..3 {
            sum[k] += n[k];
        }
    }
    sum
}

/// The spacing of the numbers that the coordinates were written with: of f32 where all are f32,
/// else of the decimals that the longest of them needs, and never more than six digits leave.
pub(super) fn spacing(points: &[Point]) -> f64 {
    let largest = points.iter().flatten().fold(0.0f64, |m, x| m.max(x.abs()));
    let all_f32 = points.iter().flatten().all(|&x| f64::from(x as f32) == x);
    if all_f32 {
        return largest * f64::from(f32::EPSILON);
    }
    let decimals = points
        .iter()
        .flatten()
        .map(|x| x.to_string().split_once('.').map_or(0, |(_, d)| d.len()))
        .max()
        .unwrap_or(0);
    let grid = 10f64.powi(-(decimals.min(300) as i32));
    grid.clamp(largest * f64::EPSILON, largest * 1e-5)
}

/// The plane of a loop, if it lies in one to the rounding of its coordinates.
pub(super) fn plane_of(points: &[Point]) -> Option<Plane> {
    let n = points.len() as f64;
    let through = [0, 1, 2].map(|k| points.iter().map(|p| p[k]).sum::<f64>() / n);
    // Each coordinate is off by half a spacing; the plane, found from such points, by as much.
    let tolerance = 2.0 * spacing(points);
    let far = points
        .iter()
        .map(|p| minus(p, &through))
        .max_by(|a, b| dot(a, a).total_cmp(&dot(b, b)))?;
    let sum = vector_area(points);
    let size = length(&sum);
    let along = far.map(|x| x / length(&far));
    let off_line = points
        .iter()
        .map(|p| {
            let d = minus(p, &through);
            length(&minus(&d, &along.map(|x| x * dot(&d, &along))))
        })
        .fold(0.0, f64::max);
    let line = off_line.is_nan() || off_line <= tolerance;
    let normal = if line {
        [0.0, 0.0, 1.0]
    } else {
        sum.map(|x| x / size)
    };
    if normal.iter().any(|x| !x.is_finite()) {
        return None;
    }
    let deviation = if line {
        off_line.max(0.0)
    } else {
        points
            .iter()
            .map(|p| dot(&minus(p, &through), &normal).abs())
            .fold(0.0, f64::max)
    };
    if deviation > tolerance {
        return None;
    }
    let drop = (0..3)
        .max_by(|&i, &j| normal[i].abs().total_cmp(&normal[j].abs()))
        .unwrap_or(2);
    let (u, v) = ((drop + 1) % 3, (drop + 2) % 3);
    let axes = if normal[drop] < 0.0 { (v, u) } else { (u, v) };
    Some(Plane {
        normal,
        through,
        deviation,
        tolerance,
        axes,
        line,
    })
}

/// Covers flat loops: the first runs round the others, which run the other way. `None` where they
/// cross or touch themselves or each other in the plane.
///
/// The triangles turn the first loop's way, none is degenerate, and their edges cancel but for the
/// loops': then each point within the loops is covered exactly once and none outside (the winding
/// numbers of the boundary), so that the cover never leaves the loop's polygon.
pub(super) fn cover_flat(loops: &[&[Point]], plane: &Plane) -> Option<Cover> {
    let (u, v) = plane.axes;
    if plane.line {
        return match loops {
            [one] => cover_least(one),
            _ => None,
        };
    }
    if !simple(loops, u, v) {
        return None;
    }
    let points: Vec<Point> = loops.iter().flat_map(|l| l.iter().copied()).collect();
    let triangles = match loops {
        [one] => triangulate(one),
        _ => {
            let flat = points.iter().map(|p| [p[u], p[v]]);
            let mut starts = Vec::new();
            let mut at = loops[0].len() as u32;
            for hole in &loops[1..] {
                starts.push(at);
                at += hole.len() as u32;
            }
            let mut out: Vec<u32> = Vec::new();
            earcut::Earcut::new().earcut(flat, &starts, &mut out);
            let mut triangles = out.as_chunks::<3>().0.to_vec();
            for t in &mut triangles {
                let [a, b, c] = t.map(|i| points[i as usize]);
                if turn_2d(&a, &b, &c, u, v) < 0 {
                    t.swap(1, 2);
                }
            }
            triangles
        }
    };
    let corners = |t: &[u32; 3]| t.map(|i| points[i as usize]);
    let turns_left = triangles.iter().all(|t| {
        let [a, b, c] = corners(t);
        turn_2d(&a, &b, &c, u, v) > 0
    });
    if !turns_left || !bounds_loops(&triangles, loops) {
        return None;
    }
    let area = triangles.iter().map(|t| area(&corners(t))).sum();
    Some(Cover { triangles, area })
}

/// Whether the edges of the triangles cancel but for those of the loops.
fn bounds_loops(triangles: &[[u32; 3]], loops: &[&[Point]]) -> bool {
    let mut edges: std::collections::HashMap<(u32, u32), i32> = std::collections::HashMap::new();
    let mut see = |a: u32, b: u32, n: i32| {
        *edges.entry((a.min(b), a.max(b))).or_default() += if a < b { n } else { -n };
    };
    for t in triangles {
        for i in 0..3 {
            see(t[i], t[(i + 1) % 3], 1);
        }
    }
    let mut start = 0;
    for l in loops {
        let n = l.len() as u32;
        for i in 0..n {
            see(start + i, start + (i + 1) % n, -1);
        }
        start += n;
    }
    edges.values().all(|&n| n == 0)
}

/// Whether no two edges of the loops meet but neighbours in their vertex.
fn simple(loops: &[&[Point]], u: usize, v: usize) -> bool {
    struct Edge {
        p: Point,
        q: Point,
        of: usize,
        i: usize,
        low: f64,
        high: f64,
    }
    let mut edges: Vec<Edge> = Vec::new();
    for (of, l) in loops.iter().enumerate() {
        for i in 0..l.len() {
            let (p, q) = (l[i], l[(i + 1) % l.len()]);
            let (low, high) = (p[u].min(q[u]), p[u].max(q[u]));
            edges.push(Edge {
                p,
                q,
                of,
                i,
                low,
                high,
            });
        }
    }
    edges.sort_unstable_by(|a, b| a.low.total_cmp(&b.low).then((a.of, a.i).cmp(&(b.of, b.i))));
    for (k, a) in edges.iter().enumerate() {
        let n = loops[a.of].len();
        for b in edges[k + 1..].iter().take_while(|b| b.low <= a.high) {
            let next = a.of == b.of && (a.i + 1) % n == b.i;
            let before = a.of == b.of && (b.i + 1) % n == a.i;
            let bad = if next || before {
                // Neighbours must not run back over each other; a triangle has no room to.
                let (x, y, z) = if next {
                    (a.p, a.q, b.q)
                } else {
                    (b.p, b.q, a.q)
                };
                n > 3
                    && turn_2d(&x, &y, &z, u, v) == 0
                    && (x[u] - y[u]) * (z[u] - y[u]) + (x[v] - y[v]) * (z[v] - y[v]) > 0.0
            } else {
                segments_meet(&a.p, &a.q, &b.p, &b.q, u, v)
            };
            if bad {
                return false;
            }
        }
    }
    true
}

/// Covers a loop with the triangles of least total area among all triangulations by its own
/// vertices (Gilbert 1979; Klincsek 1980: dynamic programming over sub-chains, O(n³)), ties by
/// the first apex.
///
/// Above [`COMPARED`] vertices the loop is first cut into chains of equal numbers of edges, at
/// most that many; each chain with its chord, and the polygon of the chords, are covered so. The
/// result is a cover like any other, but not always the least. Above [`MOST`]: `None`.
pub(super) fn cover_least(points: &[Point]) -> Option<Cover> {
    let n = points.len();
    let all: Vec<u32> = (0..n as u32).collect();
    let mut triangles = Vec::new();
    let mut total = 0.0;
    if !(3..=MOST).contains(&n) {
        return None;
    } else if n <= COMPARED {
        total += least(points, &all, &mut triangles);
    } else {
        let step = n.div_ceil(COMPARED);
        let corners: Vec<u32> = all.iter().copied().step_by(step).collect();
        total += least(points, &corners, &mut triangles);
        for &c in &corners {
            let mut chain: Vec<u32> = (c..=(c + step as u32).min(n as u32)).collect();
            if let Some(last) = chain.last_mut().filter(|l| **l == n as u32) {
                *last = 0;
            }
            if chain.len() > 2 {
                total += least(points, &chain, &mut triangles);
            }
        }
    }
    Some(Cover {
        triangles,
        area: total,
    })
}

fn least(points: &[Point], ring: &[u32], out: &mut Vec<[u32; 3]>) -> f64 {
    let n = ring.len();
    let at = |i: usize| &points[ring[i] as usize];
    // cost[i][j]: least area of the sub-chain i…j closed by its chord.
    let mut cost = vec![0.0f64; n * n];
    let mut apex = vec![0u32; n * n];
    for span in 2..n {
        for i in 0..n - span {
            let j = i + span;
            let mut best = (f64::INFINITY, i + 1);
            for k in i + 1..j {
                let sides = cost[i * n + k] + cost[k * n + j];
                if sides >= best.0 {
                    continue;
                }
                let c = sides + area(&[*at(i), *at(k), *at(j)]);
                if c < best.0 {
                    best = (c, k);
                }
            }
            (cost[i * n + j], apex[i * n + j]) = (best.0, best.1 as u32);
        }
    }
    let mut todo = vec![(0, n - 1)];
    while let Some((i, j)) = todo.pop() {
        if j - i < 2 {
            continue;
        }
        let k = apex[i * n + j] as usize;
        out.push([ring[i], ring[k], ring[j]]);
        todo.push((k, j));
        todo.push((i, k));
    }
    cost[n - 1]
}

/// Whether `p` lies in the polygon in the plane of the axes; `None` on its rim.
pub(super) fn in_polygon(p: &Point, polygon: &[Point], u: usize, v: usize) -> Option<bool> {
    let mut inside = false;
    for (i, a) in polygon.iter().enumerate() {
        let b = &polygon[(i + 1) % polygon.len()];
        if segments_meet(p, p, a, b, u, v) {
            return None;
        }
        if (a[v] > p[v]) != (b[v] > p[v]) {
            let left = turn_2d(a, b, p, u, v) > 0;
            if left == (b[v] > a[v]) {
                inside = !inside;
            }
        }
    }
    Some(inside)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn flat(points: &[[f64; 2]]) -> Vec<Point> {
        points.iter().map(|p| [p[0], p[1], 7.0]).collect()
    }

    #[test]
    fn a_concave_flat_loop_is_covered_exactly() {
        // A U: 3 × 3 less the 1 × 2 notch from above.
        let u = flat(&[
            [0.0, 0.0],
            [3.0, 0.0],
            [3.0, 3.0],
            [2.0, 3.0],
            [2.0, 1.0],
            [1.0, 1.0],
            [1.0, 3.0],
            [0.0, 3.0],
        ]);
        let plane = plane_of(&u).unwrap();
        assert_eq!(plane.deviation, 0.0);
        assert_eq!(cover_flat(&[&u], &plane).unwrap().area, 7.0);
        assert_eq!(cover_least(&u).unwrap().area, 7.0);
    }

    #[test]
    fn a_loop_within_a_loop_is_left_open() {
        let outer = flat(&[[0.0, 0.0], [4.0, 0.0], [4.0, 4.0], [0.0, 4.0]]);
        let hole = flat(&[[1.0, 1.0], [1.0, 2.0], [2.0, 2.0], [2.0, 1.0]]);
        let plane = plane_of(&outer).unwrap();
        let cover = cover_flat(&[&outer, &hole], &plane).unwrap();
        assert_eq!((cover.area, cover.triangles.len()), (15.0, 8));
        let apart = flat(&[[3.5, 1.0], [3.5, 2.0], [4.5, 2.0]]);
        assert!(cover_flat(&[&outer, &apart], &plane).is_none());
    }

    #[test]
    fn a_loop_that_crosses_itself_is_refused() {
        let eight = flat(&[[0.0, 0.0], [2.0, 2.0], [2.0, 0.0], [0.0, 3.0]]);
        let plane = plane_of(&eight).unwrap();
        assert!(cover_flat(&[&eight], &plane).is_none());
    }

    #[test]
    fn long_loops_are_cut_into_chains() {
        let n = 1001;
        let ring: Vec<Point> = (0..n)
            .map(|i| {
                let a = std::f64::consts::TAU * f64::from(i) / f64::from(n);
                [a.cos(), a.sin(), 0.01 * (3.0 * a).cos()]
            })
            .collect();
        assert!(plane_of(&ring).is_none());
        let cover = cover_least(&ring).unwrap();
        assert_eq!(cover.triangles.len(), ring.len() - 2);
        assert!(bounds_loops(&cover.triangles, &[&ring]));
        assert!(
            (cover.area / std::f64::consts::PI - 1.0).abs() < 0.01,
            "{}",
            cover.area
        );
    }
}
