//! Facets with their neighbours: welded corners, facet normals, and how far each edge turns.

use nalgebra::Vector3;

use crate::error::Result;
use crate::mesh::{Triangles, weld};

/// A point or direction.
pub(super) type V = Vector3<f64>;

/// Of a half-edge without a partner.
pub(super) const NONE: u32 = u32::MAX;

/// The sides of a facet: half-edge `3 t + k` runs from corner `k` of facet `t` to corner `k + 1`.
pub(super) const NEXT: [usize; 3] = [1, 2, 0];

/// A triangle surface with what holds at single facets and edges.
pub(super) struct Surface {
    /// Distinct corners, seen from the middle of their box.
    pub(super) points: Vec<V>,
    /// The middle of the box.
    pub(super) middle: V,
    /// Indices into `points`.
    pub(super) corners: Vec<[u32; 3]>,
    /// Unit normals; a sliver has that of the facet on its longest side, or zero.
    pub(super) normal: Vec<V>,
    /// Areas.
    pub(super) area: Vec<f64>,
    /// Partner of each half-edge, where exactly one facet runs each way.
    pub(super) opposite: Vec<u32>,
    /// Signed angle between the normals on both sides of each half-edge, positive where convex;
    /// NaN without a partner.
    pub(super) turn: Vec<f64>,
    /// How far coordinates may be off by rounding to single precision.
    pub(super) grain: f64,
}

impl Surface {
    pub(super) fn of(facets: &[[[f64; 3]; 3]]) -> Result<Self> {
        let (low, high) = facets.iter().flatten().fold(
            (V::repeat(f64::INFINITY), V::repeat(f64::NEG_INFINITY)),
            |(low, high), p| (low.inf(&V::from(*p)), high.sup(&V::from(*p))),
        );
        let middle = low + (high - low) / 2.0;
        let grain = f64::from(f32::EPSILON) * low.abs().sup(&high.abs()).max();
        let (mut corners, _) = weld(&Triangles::Loose(facets.to_vec()))?;
        // A corner's number is the place where its point stands first; here they are counted on.
        let mut points = Vec::with_capacity(facets.len() / 2 + 3);
        let mut number = vec![NONE; facets.len() * 3];
        for (t, c) in corners.iter_mut().enumerate() {
            for (k, place) in c.iter_mut().enumerate() {
                let n = &mut number[*place as usize];
                if *n == NONE {
                    *n = points.len() as u32;
                    points.push(V::from(facets[t][k]) - middle);
                }
                *place = *n;
            }
        }
        drop(number);
        let opposite = opposites(&corners, points.len());
        let mut out = Self {
            points,
            middle,
            normal: Vec::with_capacity(corners.len()),
            area: Vec::with_capacity(corners.len()),
            corners,
            opposite,
            turn: Vec::new(),
            grain,
        };
        out.measure();
        out.turn = (0..out.opposite.len()).map(|h| out.turn_at(h)).collect();
        Ok(out)
    }

    /// Corner `k` of facet `t`.
    pub(super) fn at(&self, t: usize, k: usize) -> V {
        self.points[self.corners[t][k] as usize]
    }

    /// From the start of a half-edge to its end.
    pub(super) fn along(&self, h: usize) -> V {
        self.at(h / 3, NEXT[h % 3]) - self.at(h / 3, h % 3)
    }

    /// Height of the facet over one of its sides.
    pub(super) fn width(&self, h: usize) -> f64 {
        let length = self.along(h).norm();
        if length > 0.0 {
            2.0 * self.area[h / 3] / length
        } else {
            0.0
        }
    }

    /// The angle at an edge below which rounding leaves open whether its facets are coplanar.
    pub(super) fn level(&self, h: usize) -> f64 {
        let least = |t: usize| {
            (0..3)
                .map(|k| self.width(3 * t + k))
                .fold(f64::INFINITY, f64::min)
        };
        let (a, b) = (least(h / 3), least(self.opposite[h] as usize / 3));
        1e-5 + 2.0 * self.grain * (1.0 / a + 1.0 / b).min(1e300)
    }

    fn measure(&mut self) {
        let mut slivers = Vec::new();
        for (t, c) in self.corners.iter().enumerate() {
            let [a, b, d] = c.map(|i| self.points[i as usize]);
            let cross = (b - a).cross(&(d - a));
            let longest = (b - a).norm().max((d - b).norm()).max((a - d).norm());
            let double = cross.norm();
            self.area.push(double / 2.0);
            if double > 8.0 * self.grain * longest {
                self.normal.push(cross / double);
            } else {
                slivers.push(t);
                self.normal.push(V::zeros());
            }
        }
        // Rounding decides where a sliver's normal points: it takes its neighbour's. Slivers lie
        // beside slivers, so there are a few rounds.
        for _ in 0..4 {
            let mut left = Vec::new();
            let mut found = Vec::new();
            for &t in &slivers {
                let side = (0..3).max_by(|&i, &j| {
                    let l = |k| self.along(3 * t + k).norm_squared();
                    l(i).total_cmp(&l(j))
                });
                let beside = side.map_or(NONE, |k| self.opposite[3 * t + k]);
                if beside != NONE && self.normal[beside as usize / 3] != V::zeros() {
                    found.push((t, self.normal[beside as usize / 3]));
                } else {
                    left.push(t);
                }
            }
            for (t, n) in found {
                self.normal[t] = n;
            }
            slivers = left;
        }
    }

    fn turn_at(&self, h: usize) -> f64 {
        let o = self.opposite[h];
        if o == NONE {
            return f64::NAN;
        }
        let (a, b) = (self.normal[h / 3], self.normal[o as usize / 3]);
        let e = self.along(h);
        if a == V::zeros() || b == V::zeros() {
            return f64::NAN;
        }
        let sine = a.cross(&b);
        let size = sine.norm().atan2(a.dot(&b));
        if sine.dot(&e) < 0.0 { -size } else { size }
    }
}

/// Pairs the half-edges of edges that exactly two facets use, one each way.
fn opposites(corners: &[[u32; 3]], points: usize) -> Vec<u32> {
    let ends = |h: usize| (corners[h / 3][h % 3], corners[h / 3][NEXT[h % 3]]);
    let mut start = vec![0u32; points + 1];
    for h in 0..3 * corners.len() {
        let (a, b) = ends(h);
        start[a.min(b) as usize + 1] += 1;
    }
    for i in 0..points {
        start[i + 1] += start[i];
    }
    let mut fill = start.clone();
    let mut list = vec![(0u32, 0u32); 3 * corners.len()];
    for h in 0..3 * corners.len() {
        let (a, b) = ends(h);
        let at = &mut fill[a.min(b) as usize];
        list[*at as usize] = (a.max(b), h as u32);
        *at += 1;
    }
    let mut opposite = vec![NONE; 3 * corners.len()];
    for i in 0..points {
        let of_point = &mut list[start[i] as usize..start[i + 1] as usize];
        of_point.sort_unstable();
        for edge in of_point.chunk_by(|x, y| x.0 == y.0) {
            if let [(_, g), (_, h)] = *edge
                && ends(g as usize).0 == ends(h as usize).1
                && g / 3 != h / 3
            {
                opposite[g as usize] = h;
                opposite[h as usize] = g;
            }
        }
    }
    opposite
}
