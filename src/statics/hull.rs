//! The convex hull of points in a plane.

use robust::{Coord, orient2d};

fn turn(a: [f64; 2], b: [f64; 2], c: [f64; 2]) -> f64 {
    let coord = |p: [f64; 2]| Coord { x: p[0], y: p[1] };
    orient2d(coord(a), coord(b), coord(c))
}

/// Indices of the corners of the hull, counter-clockwise from the leftmost lowest; points on an
/// edge between two corners are no corners, and of points in one place the first counts. Fewer
/// than three corners: all points stand on one line. Monotone chain (Andrew 1979), with exact
/// orientation.
pub(super) fn hull(points: &[[f64; 2]]) -> Vec<usize> {
    let mut order: Vec<usize> = (0..points.len()).collect();
    order.sort_by(|&a, &b| {
        let (p, q) = (points[a], points[b]);
        p[0].total_cmp(&q[0])
            .then(p[1].total_cmp(&q[1]))
            .then(a.cmp(&b))
    });
    order.dedup_by(|b, a| points[*a] == points[*b]);
    if order.len() < 3 {
        return order;
    }
    let chain = |order: &mut dyn Iterator<Item = usize>| {
        let mut out: Vec<usize> = Vec::new();
        for i in order {
            while let [.., a, b] = out[..]
                && turn(points[a], points[b], points[i]) <= 0.0
            {
                out.pop();
            }
            out.push(i);
        }
        out.pop();
        out
    };
    let mut lower = chain(&mut order.iter().copied());
    lower.extend(chain(&mut order.iter().rev().copied()));
    lower
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn corners_only_and_in_order() {
        let p = [
            [0.0, 0.0],
            [2.0, 0.0],
            [1.0, 0.0],
            [2.0, 2.0],
            [0.0, 2.0],
            [1.0, 1.0],
            [2.0, 0.0],
        ];
        assert_eq!(hull(&p), [0, 1, 3, 4]);
        assert_eq!(hull(&[[0.0, 0.0], [1.0, 1.0], [2.0, 2.0]]).len(), 2);
        assert_eq!(hull(&[[1.0, 1.0], [1.0, 1.0]]), [0]);
    }
}
