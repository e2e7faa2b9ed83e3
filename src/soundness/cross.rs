//! Whether triangles cut or touch each other elsewhere than at what they share, exactly.

use crate::geometry::{Point, is_flat, plane_side, turn_2d};

/// A triangle with the numbers of its vertices, by which neighbours are known.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Facet {
    pub(crate) ids: [u32; 3],
    pub(crate) at: [Point; 3],
}

/// Whether two triangles meet anywhere but in the vertices and edges that they share. Triangles
/// without area meet nothing.
pub(crate) fn cross(s: &Facet, t: &Facet) -> bool {
    let apart = (0..3).any(|k| {
        let span = |f: &Facet| {
            let x = f.at.map(|p| p[k]);
            (x[0].min(x[1]).min(x[2]), x[0].max(x[1]).max(x[2]))
        };
        let (a, b) = (span(s), span(t));
        a.1 < b.0 || b.1 < a.0
    });
    if apart || is_flat(&s.at) || is_flat(&t.at) {
        return false;
    }
    let own = |f: &Facet, other: &Facet| -> Vec<usize> {
        (0..3).filter(|&i| !other.ids.contains(&f.ids[i])).collect()
    };
    let (a, b) = (own(s, t), own(t, s));
    let opposite = |f: &Facet, shared: usize| {
        let (i, j) = ((shared + 1) % 3, (shared + 2) % 3);
        (f.at[i], f.at[j])
    };
    match (&a[..], &b[..]) {
        // One edge in common: they overlap only where one is folded onto the other.
        (&[i], &[j]) => {
            let (p, q) = opposite(s, i);
            plane_side(&s.at[0], &s.at[1], &s.at[2], &t.at[j]) == 0
                && same_side(&p, &q, &s.at[i], &t.at[j])
        }
        // One vertex in common: what they share beyond it ends at an opposite edge.
        (&[_, _], &[_, _]) => {
            let shared = |own: &[usize]| 3 - own[0] - own[1];
            let (e, f) = (opposite(s, shared(&a)), opposite(t, shared(&b)));
            hits(&e.0, &e.1, &t.at) || hits(&f.0, &f.1, &s.at)
        }
        (&[_, _, _], &[_, _, _]) => (0..3).any(|i| {
            let j = (i + 1) % 3;
            hits(&s.at[i], &s.at[j], &t.at) || hits(&t.at[i], &t.at[j], &s.at)
        }),
        _ => true,
    }
}

/// Whether x and y lie strictly on one side of the line p q, all four in one plane.
fn same_side(p: &Point, q: &Point, x: &Point, y: &Point) -> bool {
    [(0, 1), (1, 2), (2, 0)].iter().any(|&(u, v)| {
        let (a, b) = (turn_2d(p, q, x, u, v), turn_2d(p, q, y, u, v));
        a != 0 && a == b
    })
}

/// Whether the closed segment p q meets the closed triangle, which has area.
fn hits(p: &Point, q: &Point, t: &[Point; 3]) -> bool {
    let [a, b, c] = t;
    let (sp, sq) = (plane_side(a, b, c, p), plane_side(a, b, c, q));
    if sp == 0 && sq == 0 {
        return hits_in_plane(p, q, t);
    }
    if sp == sq {
        return false;
    }
    let s = [
        plane_side(p, q, a, b),
        plane_side(p, q, b, c),
        plane_side(p, q, c, a),
    ];
    s.iter().all(|&x| x >= 0) || s.iter().all(|&x| x <= 0)
}

fn hits_in_plane(p: &Point, q: &Point, t: &[Point; 3]) -> bool {
    let [a, b, c] = t;
    let Some((u, v)) = [(0, 1), (1, 2), (2, 0)]
        .into_iter()
        .find(|&(u, v)| turn_2d(a, b, c, u, v) != 0)
    else {
        return false;
    };
    let inside = |p: &Point| {
        let s = [
            turn_2d(a, b, p, u, v),
            turn_2d(b, c, p, u, v),
            turn_2d(c, a, p, u, v),
        ];
        s.iter().all(|&x| x >= 0) || s.iter().all(|&x| x <= 0)
    };
    inside(p)
        || inside(q)
        || [(a, b), (b, c), (c, a)]
            .iter()
            .any(|(x, y)| segments_meet(p, q, x, y, u, v))
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
        let strange = facet(
            [7, 8, 9],
            [[0.2, 0.2, 0.0], [5.0, 5.0, 1.0], [5.0, 6.0, 1.0]],
        );
        assert!(cross(&s, &strange));
        let facets = [strange, facet([2, 1, 3], [y, x, [1.0, 1.0, 0.0]])];
        assert_eq!(Tree::over(&facets).crossed(&s, None), Some(0));
        assert_eq!(Tree::over(&facets).crossed(&s, Some(0)), None);
    }
}
