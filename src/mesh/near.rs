//! Which of many points lie near a point or a segment: a balanced tree of boxes.

use super::shells::middle;
use crate::geometry::Point;

type Box3 = [Point; 2];

/// Points in a tree.
pub(crate) struct Near<'a> {
    points: &'a [Point],
    /// Numbers of the points; each node of the tree is a stretch of it.
    order: Vec<u32>,
    /// Box of node `i`; its children are `2i + 1` and `2i + 2`.
    boxes: Vec<Box3>,
}

/// Points of a leaf.
const LEAF: usize = 8;

impl<'a> Near<'a> {
    /// Of all the points.
    pub(crate) fn new(points: &'a [Point]) -> Self {
        // Halving rounds up, so the depth is that of the next power of two.
        let leaves = points.len().div_ceil(LEAF).next_power_of_two();
        let mut out = Self {
            points,
            order: (0..points.len() as u32).collect(),
            boxes: vec![[[0.0; 3]; 2]; 2 * leaves - 1],
        };
        if !points.is_empty() {
            build(points, &mut out.order, 0, &mut out.boxes);
        }
        out
    }

    /// Calls `see` with the points at most `radius` from `p`, itself included.
    pub(crate) fn ball(&self, p: &Point, radius: f64, mut see: impl FnMut(u32, f64)) {
        let reaches = |b: &Box3| {
            let outside = [0, 1, 2].map(|k| (b[0][k] - p[k]).max(p[k] - b[1][k]).max(0.0));
            length(&outside) <= radius
        };
        self.visit(0, 0..self.order.len(), &reaches, &mut |i| {
            let d = distance(p, &self.points[i as usize]);
            if d <= radius {
                see(i, d);
            }
        });
    }

    /// Calls `see` with points that may be within `radius` of the segment p–q, and all that are.
    pub(crate) fn segment(&self, p: &Point, q: &Point, radius: f64, mut see: impl FnMut(u32)) {
        let half = [0, 1, 2].map(|k| (q[k] - p[k]) / 2.0);
        let centre = middle(&[*p, *q]);
        let slack = radius * (1.0 + 1e-9);
        let reaches = |b: &Box3| {
            // Separating axes of a box and a segment: the three of the box, and the cross
            // products of those with the segment.
            let c = middle(b);
            let h = [0, 1, 2].map(|k| (b[1][k] - b[0][k]) / 2.0 + slack);
            let d = [0, 1, 2].map(|k| centre[k] - c[k]);
            let rounding = 1e-9 * (length(&half) + length(&h)) * length(&half);
            (0..3).all(|k| d[k].abs() <= (h[k] + half[k].abs()) * (1.0 + 1e-9))
                && [(0, 1), (1, 2), (2, 0)].iter().all(|&(i, j)| {
                    (d[i] * half[j] - d[j] * half[i]).abs()
                        <= h[i] * half[j].abs() + h[j] * half[i].abs() + rounding
                })
        };
        self.visit(0, 0..self.order.len(), &reaches, &mut see);
    }

    fn visit(
        &self,
        node: usize,
        range: std::ops::Range<usize>,
        reaches: &dyn Fn(&Box3) -> bool,
        see: &mut dyn FnMut(u32),
    ) {
        if range.is_empty() || !reaches(&self.boxes[node]) {
            return;
        }
        if range.len() <= LEAF {
            self.order[range].iter().for_each(|&i| see(i));
            return;
        }
        let mid = range.start + range.len().div_ceil(2);
        self.visit(2 * node + 1, range.start..mid, reaches, see);
        self.visit(2 * node + 2, mid..range.end, reaches, see);
    }
}

fn build(points: &[Point], order: &mut [u32], node: usize, boxes: &mut [Box3]) {
    let mut b = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    for &i in order.iter() {
        let p = &points[i as usize];
        for k in 0..3 {
            b[0][k] = b[0][k].min(p[k]);
            b[1][k] = b[1][k].max(p[k]);
        }
    }
    boxes[node] = b;
    if order.len() <= LEAF {
        return;
    }
    let side = |k: usize| b[1][k] - b[0][k];
    let axis = if side(0) >= side(1) && side(0) >= side(2) {
        0
    } else if side(1) >= side(2) {
        1
    } else {
        2
    };
    let mid = order.len().div_ceil(2);
    order.select_nth_unstable_by(mid - 1, |&i, &j| {
        points[i as usize][axis]
            .total_cmp(&points[j as usize][axis])
            .then(i.cmp(&j))
    });
    let (left, right) = order.split_at_mut(mid);
    build(points, left, 2 * node + 1, boxes);
    build(points, right, 2 * node + 2, boxes);
}

/// Euclidean length.
pub(crate) fn length(v: &Point) -> f64 {
    (v[0] * v[0] + v[1] * v[1] + v[2] * v[2]).sqrt()
}

/// Euclidean distance; the same whichever comes first.
pub(crate) fn distance(p: &Point, q: &Point) -> f64 {
    length(&[0, 1, 2].map(|k| q[k] - p[k]))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn point() -> impl Strategy<Value = Point> {
        [-8i8..=8, -8i8..=8, -8i8..=8].prop_map(|p| p.map(|x| f64::from(x) * 0.37))
    }

    fn from_segment(p: &Point, q: &Point, x: &Point) -> f64 {
        let (u, w) = (
            [0, 1, 2].map(|k| q[k] - p[k]),
            [0, 1, 2].map(|k| x[k] - p[k]),
        );
        let uu: f64 = u.iter().map(|x| x * x).sum();
        let s = if uu > 0.0 {
            (u[0] * w[0] + u[1] * w[1] + u[2] * w[2]) / uu
        } else {
            0.0
        };
        let s = s.clamp(0.0, 1.0);
        length(&[0, 1, 2].map(|k| w[k] - s * u[k]))
    }

    proptest! {
        #[test]
        fn none_is_missed(
            points in prop::collection::vec(point(), 0..200), p in point(), q in point(), r in 0.0f64..3.0
        ) {
            let near = Near::new(&points);
            let mut got = Vec::new();
            near.ball(&p, r, |i, _| got.push(i));
            got.sort_unstable();
            let want: Vec<u32> =
                (0..points.len() as u32).filter(|&i| distance(&p, &points[i as usize]) <= r).collect();
            prop_assert_eq!(got, want);
            let mut seen = Vec::new();
            near.segment(&p, &q, r, |i| seen.push(i));
            for (i, x) in points.iter().enumerate() {
                if from_segment(&p, &q, x) <= r {
                    prop_assert!(seen.contains(&(i as u32)));
                }
            }
        }
    }
}
