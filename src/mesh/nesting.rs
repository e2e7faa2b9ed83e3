//! Which shells lie inside which, by exact predicates.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::Triangles;
use super::each;
use super::shells::Shell;
use crate::geometry::{Corners, Point, Position, RationalPoint, ray_crossing};

/// Triangles that one task looks at.
const BLOCK: usize = 8192;

/// For each of `shells` (of one name), the others of them that contain it, ascending.
///
/// A closed shell contains another when the surface winds about a point of the other: crossings of
/// a ray are counted with their sign, exactly. A point that lies on the surface decides nothing;
/// then other vertices and middles of facets are asked, and a shell that lies in the other's
/// surface altogether counts as outside it.
pub(crate) fn containers(triangles: &Triangles, shells: &[&Shell]) -> Vec<Vec<usize>> {
    each!(triangles, f => containers_in(f, shells))
}

fn encloses(outer: &Shell, inner: &Shell) -> bool {
    (0..3).all(|k| {
        outer.bounds[0][k] <= inner.bounds[0][k] && inner.bounds[1][k] <= outer.bounds[1][k]
    })
}

fn containers_in(f: &impl Corners, shells: &[&Shell]) -> Vec<Vec<usize>> {
    let n = shells.len();
    let mut out = vec![Vec::new(); n];
    // Few shells: most files show by their boxes alone that nothing is nested.
    let may_be_inside = |a: usize| {
        n > 2000 || (0..n).any(|b| b != a && shells[b].closed() && encloses(shells[b], shells[a]))
    };
    let asked: Vec<(usize, Point)> = (0..n)
        .into_par_iter()
        .filter(|&a| may_be_inside(a))
        .map(|a| (a, foremost(f, shells[a])))
        .collect();
    if asked.is_empty() {
        return out;
    }
    let grid = Grid::over(asked);
    let blocks: Vec<(usize, usize)> = (0..n)
        .filter(|&b| shells[b].closed())
        .flat_map(|b| (0..shells[b].count.div_ceil(BLOCK)).map(move |k| (b, k)))
        .collect();
    let mut hits: Vec<(usize, usize, Position)> = blocks
        .into_par_iter()
        .flat_map_iter(|(b, k)| {
            let select = shells[b].members.select();
            let mut hits = Vec::new();
            for i in k * BLOCK..shells[b].count.min((k + 1) * BLOCK) {
                let t = f.triangle(select.get(i));
                grid.near(&t, |a, p| {
                    let under = |k: usize| {
                        t[0][k].min(t[1][k]).min(t[2][k]) <= p[k]
                            && p[k] <= t[0][k].max(t[1][k]).max(t[2][k])
                    };
                    if under(1) && under(2) && a != b && encloses(shells[b], shells[a]) {
                        match ray_crossing(p, &t) {
                            Position::Misses => {}
                            hit => hits.push((a, b, hit)),
                        }
                    }
                });
            }
            hits
        })
        .collect();
    hits.sort_unstable_by_key(|h| (h.0, h.1));
    for of_pair in hits.chunk_by(|x, y| (x.0, x.1) == (y.0, y.1)) {
        let (a, b, _) = of_pair[0];
        let inside = match winding(of_pair.iter().map(|h| h.2)) {
            Some(w) => w != 0,
            None => inside_by_other_points(f, shells[a], shells[b]),
        };
        if inside {
            out[a].push(b);
        }
    }
    out
}

/// Signed crossings, or `None` where the point lies on the surface.
fn winding(hits: impl Iterator<Item = Position>) -> Option<i64> {
    let mut total = 0;
    for hit in hits {
        match hit {
            Position::On => return None,
            Position::Crosses(s) => total += i64::from(s),
            Position::Misses => {}
        }
    }
    Some(total)
}

/// The vertex that lies furthest along +x (then +y, then +z, so that the order of the file decides
/// nothing): its ray meets the fewest triangles.
fn foremost(f: &impl Corners, shell: &Shell) -> Point {
    let select = shell.members.select();
    let mut best = f.triangle(shell.first as usize)[0];
    for i in 0..shell.count {
        for p in f.triangle(select.get(i)) {
            if p > best {
                best = p;
            }
        }
    }
    best
}

/// Whether `a` lies inside `b`, asked of further points of `a`.
fn inside_by_other_points(f: &impl Corners, a: &Shell, b: &Shell) -> bool {
    const VERTICES: usize = 256;
    const FACETS: usize = 64;
    let (of_a, of_b) = (a.members.select(), b.members.select());
    let of_b = |i: usize| f.triangle(of_b.get(i));
    // In the order of coordinates, so that the file's order has no say.
    let mut facets: Vec<[Point; 3]> = (0..a.count)
        .map(|i| {
            let mut t = f.triangle(of_a.get(i));
            t.sort_by(compare);
            t
        })
        .collect();
    facets.sort_by(|s, t| {
        compare(&s[2], &t[2])
            .then(compare(&s[1], &t[1]))
            .then(compare(&s[0], &t[0]))
    });
    let spread = |most: usize| {
        let most = most.min(facets.len());
        (0..most).map(move |k| k * a.count / most)
    };
    for k in spread(VERTICES) {
        for p in facets[k] {
            if let Some(w) = winding((0..b.count).map(|i| ray_crossing(&p, &of_b(i)))) {
                return w != 0;
            }
        }
    }
    for k in spread(FACETS) {
        let p = RationalPoint::middle(&facets[k]);
        if let Some(w) = winding((0..b.count).map(|i| p.ray_crossing(&of_b(i)))) {
            return w != 0;
        }
    }
    false
}

fn compare(p: &Point, q: &Point) -> std::cmp::Ordering {
    (0..3)
        .map(|k| p[k].total_cmp(&q[k]))
        .find(|o| o.is_ne())
        .unwrap_or(std::cmp::Ordering::Equal)
}

/// Points sorted into square cells of the (y, z) plane.
struct Grid {
    low: [f64; 2],
    high: [f64; 2],
    per_unit: [f64; 2],
    side: usize,
    cells: BTreeMap<usize, Vec<(usize, Point)>>,
}

impl Grid {
    fn over(points: Vec<(usize, Point)>) -> Self {
        let side = ((points.len() as f64).sqrt().ceil() as usize).clamp(1, 4096);
        let bound = |k: usize, pick: fn(f64, f64) -> f64| {
            points.iter().map(|(_, p)| p[k]).reduce(pick).unwrap_or(0.0)
        };
        let low = [bound(1, f64::min), bound(2, f64::min)];
        let high = [bound(1, f64::max), bound(2, f64::max)];
        let per_unit = [0, 1].map(|k| {
            let width = high[k] - low[k];
            if width > 0.0 {
                side as f64 / width
            } else {
                0.0
            }
        });
        let mut grid = Self {
            low,
            high,
            per_unit,
            side,
            cells: BTreeMap::new(),
        };
        for (a, p) in points {
            let cell = grid.row(0, p[1]) * side + grid.row(1, p[2]);
            grid.cells.entry(cell).or_default().push((a, p));
        }
        grid
    }

    /// Which row holds the coordinate; monotone, so that a range of coordinates is a range of rows.
    fn row(&self, k: usize, x: f64) -> usize {
        // The cast saturates, also for NaN from infinite widths.
        (((x - self.low[k]) * self.per_unit[k]) as usize).min(self.side - 1)
    }

    /// Calls `found` with the points that the triangle may cover, seen along x.
    #[inline(always)]
    fn near(&self, t: &[Point; 3], mut found: impl FnMut(usize, &Point)) {
        let span = |k: usize| {
            let low = t[0][k + 1].min(t[1][k + 1]).min(t[2][k + 1]);
            let high = t[0][k + 1].max(t[1][k + 1]).max(t[2][k + 1]);
            (self.row(k, low), self.row(k, high))
        };
        // Most triangles of most meshes cover none of the points.
        let outside = |k: usize| {
            let low = t[0][k + 1].min(t[1][k + 1]).min(t[2][k + 1]);
            let high = t[0][k + 1].max(t[1][k + 1]).max(t[2][k + 1]);
            high < self.low[k] || low > self.high[k]
        };
        if outside(0) || outside(1) {
            return;
        }
        let ((y0, y1), (z0, z1)) = (span(0), span(1));
        for y in y0..=y1 {
            for (_, points) in self.cells.range(y * self.side + z0..=y * self.side + z1) {
                for (a, p) in points {
                    found(*a, p);
                }
            }
        }
    }
}

/// How often the surface winds about `p`, by solid angles (Van Oosterom & Strackee, "The solid
/// angle of a plane triangle", IEEE Trans. Biomed. Eng. 30, 1983). Near ±1 inside and 0 outside
/// even where the surface has holes (the generalised winding number of Jacobson et al. 2013).
pub(crate) fn winding_number(triangles: &Triangles, shell: &Shell, p: &Point) -> f64 {
    each!(triangles, f => {
        let select = shell.members.select();
        let mut total = crate::geometry::eft::Sum::ZERO;
        for i in 0..shell.count {
            let [a, b, c] = f
                .triangle(select.get(i))
                .map(|q| nalgebra::Vector3::new(q[0] - p[0], q[1] - p[1], q[2] - p[2]));
            let (la, lb, lc) = (a.norm(), b.norm(), c.norm());
            let down = la * lb * lc + a.dot(&b) * lc + b.dot(&c) * la + c.dot(&a) * lb;
            total.add(2.0 * a.dot(&b.cross(&c)).atan2(down));
        }
        total.value() / (4.0 * std::f64::consts::PI)
    })
}
