//! Polygons cut into triangles of their own corners by clipping ears.

use robust::{Coord, orient2d};

/// Corners looked at for one polygon (a second or so) before the rest of it is cut as a fan. Only
/// polygons of tens of thousands of corners with long thin arms, or ones that cross themselves,
/// come near.
const TESTS: u64 = 100_000_000;

/// Memory that is used again from polygon to polygon.
#[derive(Debug, Default)]
pub(crate) struct Scratch {
    flat: Vec<Coord<f64>>,
    previous: Vec<u32>,
    next: Vec<u32>,
    /// Corners that were not strictly convex in the beginning, by x: only they can lie in an ear.
    blunt: Vec<u32>,
    /// Whether a corner is still there and not strictly convex.
    is_blunt: Vec<bool>,
    triangles: Vec<[u32; 3]>,
}

/// Cuts a polygon of `n` corners (three coordinates each, in any one unit) into `n` − 2 triangles,
/// given by the numbers of their corners, with the polygon's own direction.
///
/// Every edge of the polygon is the edge of exactly one triangle, whatever the polygon: corners on
/// a straight line are kept, so that neighbours still meet edge to edge. If the polygon is simple
/// in its projection along the largest component of its normal (Newell's, as in Sutherland,
/// Sproull and Schumacker 1974), the triangles do not overlap and none is degenerate; this is the
/// two-ears theorem (Meisters 1975) with exact signs (Shewchuk 1997, the `robust` crate). A
/// polygon that crosses itself gives overlapping triangles with the same boundary. Convex polygons
/// become fans from their first corner.
///
/// Fewer than three corners give no triangle.
pub fn triangulate(points: &[[f64; 3]]) -> Vec<[u32; 3]> {
    triangulate_into(points, &mut Scratch::default()).to_vec()
}

/// [`triangulate`] with memory of the caller's.
pub(crate) fn triangulate_into<'a>(points: &[[f64; 3]], s: &'a mut Scratch) -> &'a [[u32; 3]] {
    s.triangles.clear();
    match points.len() {
        0..=2 => {}
        3 => s.triangles.push([0, 1, 2]),
        4 => {
            project(points, &mut s.flat);
            let turn = |a: usize, b: usize, c: usize| orient2d(s.flat[a], s.flat[b], s.flat[c]);
            let split = turn(0, 1, 2) > 0.0 && turn(0, 2, 3) > 0.0
                || !(turn(0, 1, 3) > 0.0 && turn(1, 2, 3) > 0.0);
            s.triangles.extend(if split {
                [[0, 1, 2], [0, 2, 3]]
            } else {
                [[0, 1, 3], [1, 2, 3]]
            });
        }
        _ => {
            project(points, &mut s.flat);
            clip_ears(s);
        }
    }
    &s.triangles
}

/// Twice the area of a polygon as a vector, along its normal (Newell), about its first corner.
pub(super) fn newell(points: &[[f64; 3]]) -> [f64; 3] {
    let mut sum = [0.0; 3];
    let Some(o) = points.first() else { return sum };
    let rel = |p: &[f64; 3]| [p[0] - o[0], p[1] - o[1], p[2] - o[2]];
    for pair in points[1..].windows(2) {
        let (a, b) = (rel(&pair[0]), rel(&pair[1]));
        for (k, s) in sum.iter_mut().enumerate() {
            let (i, j) = ((k + 1) % 3, (k + 2) % 3);
            *s += a[i] * b[j] - a[j] * b[i];
        }
    }
    sum
}

/// Drops the coordinate that the normal is largest in, so that the polygon turns left. Dropping
/// rounds nothing, so that signs in the plane are exact.
fn project(points: &[[f64; 3]], flat: &mut Vec<Coord<f64>>) {
    let normal = newell(points);
    let size = normal.map(f64::abs);
    let axis = if size[0] > size[1] && size[0] > size[2] {
        0
    } else if size[1] > size[2] {
        1
    } else {
        2
    };
    let (mut i, mut j) = ((axis + 1) % 3, (axis + 2) % 3);
    if normal[axis] < 0.0 {
        std::mem::swap(&mut i, &mut j);
    }
    flat.clear();
    flat.extend(points.iter().map(|p| Coord { x: p[i], y: p[j] }));
}

fn clip_ears(s: &mut Scratch) {
    let n = s.flat.len() as u32;
    s.previous.clear();
    s.previous.extend((0..n).map(|i| (i + n - 1) % n));
    s.next.clear();
    s.next.extend((0..n).map(|i| (i + 1) % n));
    s.is_blunt.clear();
    for i in 0..n {
        let blunt = turn(s, i) <= 0.0;
        s.is_blunt.push(blunt);
    }
    s.blunt.clear();
    s.blunt.extend((0..n).filter(|&i| s.is_blunt[i as usize]));
    s.blunt
        .sort_unstable_by(|&i, &j| s.flat[i as usize].x.total_cmp(&s.flat[j as usize].x));
    let mut left = n;
    let mut at = 1 % n;
    let mut refused = 0;
    let mut tests = 0;
    while left > 3 {
        // Those that are gone are dropped from the list now and then.
        if left.is_power_of_two() {
            let Scratch {
                blunt, is_blunt, ..
            } = &mut *s;
            blunt.retain(|&k| is_blunt[k as usize]);
        }
        if tests > TESTS || is_ear(s, at, Closed::Yes, &mut tests) {
            at = clip(s, at);
            (left, refused) = (left - 1, 0);
            continue;
        }
        at = s.next[at as usize];
        refused += 1;
        if refused == left {
            // No simple polygon comes here.
            at = least_bad(s, at, left, &mut tests);
            at = clip(s, at);
            (left, refused) = (left - 1, 0);
        }
    }
    let (before, after) = (s.previous[at as usize], s.next[at as usize]);
    s.triangles.push([before, at, after]);
}

/// Twice the signed area at corner `i`: positive if it is convex.
fn turn(s: &Scratch, i: u32) -> f64 {
    let (p, q) = (s.previous[i as usize], s.next[i as usize]);
    orient2d(s.flat[p as usize], s.flat[i as usize], s.flat[q as usize])
}

/// Whether corners on the border of the triangle forbid an ear.
#[derive(Clone, Copy, PartialEq)]
enum Closed {
    Yes,
    No,
}

fn is_ear(s: &Scratch, i: u32, closed: Closed, tests: &mut u64) -> bool {
    if turn(s, i) <= 0.0 {
        return false;
    }
    let (p, q) = (s.previous[i as usize], s.next[i as usize]);
    let [a, b, c] = [p, i, q].map(|k| s.flat[k as usize]);
    let (x0, x1) = (a.x.min(b.x).min(c.x), a.x.max(b.x).max(c.x));
    let (y0, y1) = (a.y.min(b.y).min(c.y), a.y.max(b.y).max(c.y));
    let begin = s.blunt.partition_point(|&k| s.flat[k as usize].x < x0);
    s.blunt[begin..]
        .iter()
        .map(|&k| (k, s.flat[k as usize]))
        .take_while(|(_, r)| r.x <= x1)
        .all(|(k, r)| {
            *tests += 1;
            // Corners in the place of the triangle's own are the two sides of a bridge to a hole;
            // their edges lie outside of the corner's angle.
            if !s.is_blunt[k as usize] || r.y < y0 || r.y > y1 || r == a || r == b || r == c {
                return true;
            }
            let sides = [orient2d(a, b, r), orient2d(b, c, r), orient2d(c, a, r)];
            match closed {
                Closed::Yes => sides.iter().any(|&x| x < 0.0),
                Closed::No => sides.iter().any(|&x| x <= 0.0),
            }
        })
}

/// Takes corner `i` off and returns the next one to look at.
fn clip(s: &mut Scratch, i: u32) -> u32 {
    let (p, q) = (s.previous[i as usize], s.next[i as usize]);
    s.triangles.push([p, i, q]);
    s.next[p as usize] = q;
    s.previous[q as usize] = p;
    s.is_blunt[i as usize] = false;
    for k in [p, q] {
        // A convex corner stays convex when an ear beside it goes.
        if s.is_blunt[k as usize] {
            s.is_blunt[k as usize] = turn(s, k) <= 0.0;
        }
    }
    q
}

/// The corner to clip from a polygon without ears: one without area, or one with nothing strictly
/// inside, or the next.
fn least_bad(s: &Scratch, at: u32, left: u32, tests: &mut u64) -> u32 {
    let mut k = at;
    let mut second = None;
    for _ in 0..left {
        if turn(s, k) == 0.0 {
            return k;
        }
        if second.is_none() && is_ear(s, k, Closed::No, tests) {
            second = Some(k);
        }
        k = s.next[k as usize];
    }
    second.unwrap_or(at)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::collections::HashMap;

    /// Fails unless the directed edges of the triangles, after cancelling, are the polygon's.
    fn boundary(n: usize, triangles: &[[u32; 3]]) {
        assert_eq!(triangles.len(), n - 2);
        let mut sum = HashMap::<(u32, u32), i32>::new();
        let mut uses = HashMap::<(u32, u32), i32>::new();
        for t in triangles {
            for k in 0..3 {
                let (a, b) = (t[k], t[(k + 1) % 3]);
                *sum.entry((a.min(b), a.max(b))).or_default() += if a < b { 1 } else { -1 };
                *uses.entry((a.min(b), a.max(b))).or_default() += 1;
            }
        }
        for i in 0..n as u32 {
            let j = (i + 1) % n as u32;
            let key = (i.min(j), i.max(j));
            assert_eq!(uses.get(&key), Some(&1), "edge {i}-{j} of {triangles:?}");
            assert_eq!(sum.remove(&key), Some(if i < j { 1 } else { -1 }));
        }
        assert!(sum.values().all(|&v| v == 0), "{triangles:?}");
    }

    /// Area of the polygon by the shoelace formula, and of the triangles, all of which must turn
    /// left strictly (in the xy plane).
    fn areas(points: &[[f64; 3]], triangles: &[[u32; 3]]) -> (f64, f64) {
        let n = points.len();
        let cross = |a: [f64; 3], b: [f64; 3]| a[0] * b[1] - a[1] * b[0];
        let shoelace = (0..n)
            .map(|i| cross(points[i], points[(i + 1) % n]))
            .sum::<f64>()
            / 2.0;
        let mut sum = 0.0;
        for t in triangles {
            let [a, b, c] = t.map(|k| points[k as usize]);
            let xy = |p: [f64; 3]| Coord { x: p[0], y: p[1] };
            let area = orient2d(xy(a), xy(b), xy(c)) / 2.0;
            assert!(area > 0.0, "{t:?} of {points:?}");
            sum += area;
        }
        (shoelace, sum)
    }

    fn check(points: &[[f64; 2]]) {
        let points: Vec<_> = points.iter().map(|p| [p[0], p[1], 0.0]).collect();
        let triangles = triangulate(&points);
        boundary(points.len(), &triangles);
        let (shoelace, sum) = areas(&points, &triangles);
        // All terms are positive, so the sum errs by a few roundings of itself.
        let size = points.iter().flatten().fold(0.0f64, |m, x| m.max(x.abs()));
        let slack = 1e-15 * points.len() as f64 * (sum + size * size);
        assert!((shoelace - sum).abs() <= slack, "{shoelace} {sum}");
    }

    #[test]
    fn shapes_by_hand() {
        check(&[[0., 0.], [2., 0.], [2., 2.], [0., 2.]]);
        // An arrow whose notch is corner 2, then corner 3, 0, 1.
        let arrow = [[0., 0.], [4., 0.], [1., 1.], [0., 4.]];
        for turn in 0..4 {
            let mut a = arrow;
            a.rotate_left(turn);
            check(&a);
        }
        // Corners in the middle of sides; a triangle with many on one side.
        check(&[
            [0., 0.],
            [1., 0.],
            [2., 0.],
            [2., 1.],
            [2., 2.],
            [1., 2.],
            [0., 2.],
            [0., 1.],
        ]);
        check(&[[0., 0.], [1., 0.], [2., 0.], [3., 0.], [4., 0.], [2., 3.]]);
        check(&[[0., 0.], [1., 0.], [4., 0.], [2., 3.]]);
        // A comb and a plus.
        let mut comb = vec![[20., -1.], [20., 0.]];
        (0..10).for_each(|i| {
            comb.extend([
                [19.5 - 2. * f64::from(i), 5.],
                [19. - 2. * f64::from(i), 0.],
            ])
        });
        comb.push([0., -1.]);
        check(&comb);
        check(&[
            [1., 0.],
            [2., 0.],
            [2., 1.],
            [3., 1.],
            [3., 2.],
            [2., 2.],
            [2., 3.],
            [1., 3.],
            [1., 2.],
            [0., 2.],
            [0., 1.],
            [1., 1.],
        ]);
    }

    #[test]
    fn a_long_spiral() {
        let arm = |k: i32, r: f64| {
            let t = f64::from(k) * 0.05;
            [(t + r) * t.cos(), (t + r) * t.sin()]
        };
        let outer = (0..2000).map(|k| arm(k, 3.0));
        check(
            &outer
                .chain((0..2000).rev().map(|k| arm(k, 1.0)))
                .collect::<Vec<_>>(),
        );
    }

    #[test]
    fn a_hole_joined_by_a_bridge() {
        check(&[
            [0., 0.],
            [6., 0.],
            [6., 6.],
            [0., 6.],
            [0., 0.],
            [2., 2.],
            [2., 4.],
            [4., 4.],
            [4., 2.],
            [2., 2.],
        ]);
    }

    #[test]
    fn convex_polygons_are_fans() {
        let hexagon: Vec<[f64; 3]> = (0..6)
            .map(|k| f64::from(k) * std::f64::consts::TAU / 6.0)
            .map(|a| [3.0, a.cos(), a.sin()])
            .collect();
        assert_eq!(
            triangulate(&hexagon),
            [[0, 1, 2], [0, 2, 3], [0, 3, 4], [0, 4, 5]]
        );
    }

    #[test]
    fn what_is_no_simple_polygon_keeps_its_boundary() {
        for points in [
            vec![[0., 0., 0.]; 7],
            vec![
                [0., 0., 0.],
                [1., 0., 0.],
                [2., 0., 0.],
                [3., 0., 0.],
                [4., 0., 0.],
            ],
            vec![[0., 0., 0.], [2., 2., 0.], [2., 0., 0.], [0., 2., 0.]],
            vec![
                [0., 1., 0.],
                [4., 1., 0.],
                [1., 4., 0.],
                [2., 0., 0.],
                [3., 4., 0.],
            ],
        ] {
            boundary(points.len(), &triangulate(&points));
        }
    }

    proptest! {
        // Star-shaped about the origin: simple, and the area is known to be positive.
        #[test]
        fn star_shaped(radii in prop::collection::vec(0.1f64..10.0, 5..60), extra in prop::collection::vec(any::<u8>(), 60)) {
            let n = radii.len();
            let corner = |i: usize| { let a = i as f64 / n as f64 * std::f64::consts::TAU; [radii[i] * a.cos(), radii[i] * a.sin()] };
            check(&(0..n).map(corner).collect::<Vec<_>>());
            // On a grid of whole numbers times 4, with corners in the middle of some sides: exactly straight.
            let whole: Vec<[f64; 2]> = (0..n).map(|i| corner(i).map(|x| (x * 1e6).round() * 4.0)).collect();
            let mut all = Vec::new();
            for i in 0..n {
                let (a, b) = (whole[i], whole[(i + 1) % n]);
                all.push(a);
                for k in 1..=(extra[i] % 4) { let k = f64::from(k); if extra[i] % 4 < 3 || k != 2.0 { all.push([a[0] + (b[0] - a[0]) * k / 4.0, a[1] + (b[1] - a[1]) * k / 4.0]); } }
            }
            check(&all);
        }

        // Columns of a skyline: rectilinear, full of straight corners.
        #[test]
        fn skyline(heights in prop::collection::vec(1i32..6, 2..40), turn in 0usize..200) {
            let n = heights.len();
            let mut all: Vec<[f64; 2]> = (0..=n).map(|i| [i as f64, 0.0]).collect();
            for i in (0..n).rev() {
                all.push([i as f64 + 1.0, f64::from(heights[i])]);
                all.push([i as f64, f64::from(heights[i])]);
            }
            all.dedup();
            let k = turn % all.len();
            all.rotate_left(k);
            check(&all);
        }

        #[test]
        fn any_corners_keep_their_boundary(points in prop::collection::vec(prop::array::uniform3(-3i8..3), 3..30)) {
            let points: Vec<[f64; 3]> = points.iter().map(|p| p.map(f64::from)).collect();
            boundary(points.len(), &triangulate(&points));
        }
    }
}
