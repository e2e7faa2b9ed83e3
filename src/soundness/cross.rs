//! Whether triangles cut each other elsewhere than at what they share, and which of many do.

use crate::geometry::{Meeting, Point, is_flat, meeting_sharing, turn_2d, unfolded};

/// A triangle with the numbers of its vertices, by which neighbours are known.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Facet {
    pub(crate) ids: [u32; 3],
    pub(crate) at: [Point; 3],
}

/// Whether two triangles share a length or an area besides the vertices and edges that they have in
/// common. Triangles without area share nothing, and touching at a point is none of it: neither
/// bounds any space twice.
pub(crate) fn cross(s: &Facet, t: &Facet) -> bool {
    let apart = (0..3).any(|k| {
        let span = |f: &Facet| {
            let x = f.at.map(|p| p[k]);
            (x[0].min(x[1]).min(x[2]), x[0].max(x[1]).max(x[2]))
        };
        let (a, b) = (span(s), span(t));
        a.1 < b.0 || b.1 < a.0
    });
    if apart {
        return false;
    }
    let shared = |f: &Facet, other: &Facet| f.ids.map(|id| other.ids.contains(&id));
    let (of_s, of_t) = (shared(s, t), shared(t, s));
    let alone = |shared: &[bool; 3]| shared.iter().position(|known| !known);
    match (count(&of_s), count(&of_t)) {
        // Across a common edge they overlap only where one is folded onto the other.
        (2, 2) => match (alone(&of_s), alone(&of_t)) {
            (Some(a), Some(b)) if !is_flat(&s.at) && !is_flat(&t.at) => {
                !unfolded(&s.at, &t.at, a, b)
            }
            _ => false,
        },
        (3, _) | (_, 3) => !is_flat(&s.at) && !is_flat(&t.at),
        _ => meeting_sharing(&s.at, &t.at, of_s, of_t) != Meeting::Apart,
    }
}

fn count(shared: &[bool; 3]) -> usize {
    shared.iter().filter(|known| **known).count()
}

/// Whether two closed segments meet in the plane of the axes `u` and `v`.
pub(crate) fn segments_meet(
    p: &Point,
    q: &Point,
    x: &Point,
    y: &Point,
    u: usize,
    v: usize,
) -> bool {
    let between = |p: &Point, q: &Point, x: &Point| {
        [u, v]
            .iter()
            .all(|&k| p[k].min(q[k]) <= x[k] && x[k] <= p[k].max(q[k]))
    };
    let (a, b) = (turn_2d(p, q, x, u, v), turn_2d(p, q, y, u, v));
    let (c, d) = (turn_2d(x, y, p, u, v), turn_2d(x, y, q, u, v));
    if a * b < 0 && c * d < 0 {
        return true;
    }
    (a == 0 && between(p, q, x))
        || (b == 0 && between(p, q, y))
        || (c == 0 && between(x, y, p))
        || (d == 0 && between(x, y, q))
}

/// Boxes over triangles, halved at the middle of their longest side: finds those near another.
#[derive(Debug)]
pub(crate) struct Tree<'a> {
    facets: &'a [Facet],
    order: Vec<u32>,
    /// Boxes in the order of a complete binary tree: children of i at 2i + 1 and 2i + 2.
    boxes: Vec<[Point; 2]>,
}

const LEAF: usize = 4;

impl<'a> Tree<'a> {
    pub(crate) fn over(facets: &'a [Facet]) -> Self {
        let mut order: Vec<u32> = (0..facets.len() as u32).collect();
        let depth = facets.len().div_ceil(LEAF).next_power_of_two().ilog2();
        let mut boxes = vec![[[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]]; (2 << depth) - 1];
        fill(facets, &mut order, 0, &mut boxes);
        Self {
            facets,
            order,
            boxes,
        }
    }

    /// One of the triangles that cross `f`; `except` is left out.
    pub(crate) fn crossed(&self, f: &Facet, except: Option<usize>) -> Option<usize> {
        let b = box_of(std::iter::once(&f.at));
        let mut todo = vec![(0usize, 0usize, self.order.len())];
        while let Some((node, from, to)) = todo.pop() {
            let n = &self.boxes[node];
            if from == to || (0..3).any(|k| n[1][k] < b[0][k] || b[1][k] < n[0][k]) {
                continue;
            }
            if 2 * node + 2 >= self.boxes.len() {
                let hit = self.order[from..to]
                    .iter()
                    .map(|&i| i as usize)
                    .find(|&i| Some(i) != except && cross(f, &self.facets[i]));
                if hit.is_some() {
                    return hit;
                }
                continue;
            }
            let middle = from + (to - from) / 2;
            todo.push((2 * node + 1, from, middle));
            todo.push((2 * node + 2, middle, to));
        }
        None
    }
}

fn fill(facets: &[Facet], order: &mut [u32], node: usize, boxes: &mut [[Point; 2]]) {
    let b = box_of(order.iter().map(|&i| &facets[i as usize].at));
    boxes[node] = b;
    if 2 * node + 2 >= boxes.len() || order.is_empty() {
        return;
    }
    let k = (0..3)
        .max_by(|&i, &j| (b[1][i] - b[0][i]).total_cmp(&(b[1][j] - b[0][j])))
        .unwrap_or(0);
    let key = |i: u32| facets[i as usize].at.iter().map(|p| p[k]).sum::<f64>();
    order.sort_unstable_by(|&i, &j| key(i).total_cmp(&key(j)).then(i.cmp(&j)));
    let (low, high) = order.split_at_mut(order.len() / 2);
    fill(facets, low, 2 * node + 1, boxes);
    fill(facets, high, 2 * node + 2, boxes);
}

fn box_of<'a>(triangles: impl Iterator<Item = &'a [Point; 3]>) -> [Point; 2] {
    let mut b = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    for p in triangles.flatten() {
        for k in 0..3 {
            b[0][k] = b[0][k].min(p[k]);
            b[1][k] = b[1][k].max(p[k]);
        }
    }
    b
}

#[cfg(test)]
mod tests {
    use super::*;

    fn facet(ids: [u32; 3], at: [Point; 3]) -> Facet {
        Facet { ids, at }
    }

    #[test]
    fn neighbours_do_not_cross_unless_they_are_folded_together() {
        let (o, x, y) = ([0.0; 3], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]);
        let s = facet([0, 1, 2], [o, x, y]);
        // Over the shared edge x–y: beyond it, folded back onto it, and upright on it.
        for (p, want) in [
            ([1.0, 1.0, 0.0], false),
            ([0.1, 0.1, 0.0], true),
            ([0.5, 0.5, 1.0], false),
        ] {
            assert_eq!(cross(&s, &facet([2, 1, 3], [y, x, p])), want, "{p:?}");
        }
        // At the shared vertex o: pointing away, overlapping in the plane, and piercing.
        for (p, q, want) in [
            ([-1.0, 0.0, 0.0], [0.0, -1.0, 0.0], false),
            ([0.9, 0.2, 0.0], [0.2, 0.9, 0.0], true),
            ([0.2, 0.2, -1.0], [0.2, 0.2, 1.0], true),
            ([2.0, 2.0, -1.0], [-2.0, 2.0, 1.0], true),
            ([2.0, 2.0, 1.0], [-2.0, 2.0, 1.0], false),
        ] {
            assert_eq!(cross(&s, &facet([0, 4, 5], [o, p, q])), want, "{p:?} {q:?}");
        }
        // A corner on the face touches; one behind it pierces.
        let tip = |z: f64| facet([7, 8, 9], [[0.2, 0.2, z], [5.0, 5.0, 1.0], [5.0, 6.0, 1.0]]);
        assert!(!cross(&s, &tip(0.0)));
        let strange = tip(-0.01);
        assert!(cross(&s, &strange));
        let facets = [strange, facet([2, 1, 3], [y, x, [1.0, 1.0, 0.0]])];
        assert_eq!(Tree::over(&facets).crossed(&s, None), Some(0));
        assert_eq!(Tree::over(&facets).crossed(&s, Some(0)), None);
    }
}
