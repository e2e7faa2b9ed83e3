//! Liquid at rest in a vessel: the part of a closed mesh that lies below a level plane.
//!
//! **No cap is needed.** The liquid is bounded by the wetted parts of the facets and by the free
//! surface, which lies in the cutting plane. Its moments are sums over its boundary of signed
//! tetrahedra from a common apex (as for the solid, see [`integrate`]). With the apex *on the
//! cutting plane* every tetrahedron over a piece of the free surface is flat: its volume, and with
//! it each of its moments, is exactly zero. The clipped facets alone therefore give the exact
//! moments of the liquid, however many loops the free surface has and however they nest.
//!
//! **Volume below a level.** Over a facet with corner heights z₀ ≤ z₁ ≤ z₂ and signed area a of its
//! projection along `up` (negative where it faces down), the liquid column above it has the volume
//! −a·f(h), f being the mean over the facet of max(h − z, 0):
//!
//! ```text
//! z₀ < h ≤ z₁   f = (h−z₀)³ / (3 (z₁−z₀)(z₂−z₀))
//! z₁ < h < z₂   f = (h−z̄) + (z₂−h)³ / (3 (z₂−z₀)(z₂−z₁))
//! z₂ ≤ h        f = h − z̄
//! ```
//!
//! (a cubic per piece, by integrating the section's width twice; our own derivation, checked
//! against the clipped tetrahedra in the tests). Its derivative is the area of the free surface, so
//! Newton's method, kept inside a bracket, finds the level of a volume.
//!
//! **Derivatives.** Adding dV of liquid puts it on the free surface: d(first moment)/dV is the
//! centroid of the free surface and d(second)/dV is its second moment over its area, exactly.
//!
//! The liquid is at rest: neither sloshing nor its freedom to stay behind when the vessel turns is
//! in these figures.

mod pools;

use std::collections::HashMap;

use nalgebra::{Matrix3, Vector3};

pub use pools::Pool;

use super::{Moments, integrate};
use crate::geometry::eft::Sum;
use crate::geometry::{LooseFacets, Select};

/// The inside of a tank: a closed mesh that faces outward, welded by equal coordinates.
#[derive(Clone, Debug)]
pub struct Vessel {
    /// Corners, seen from `middle`.
    points: Vec<Vector3<f64>>,
    triangles: Vec<[u32; 3]>,
    /// Middle of its box, in its own frame.
    middle: Vector3<f64>,
    whole: Moments,
}

/// A vessel with a direction that counts as up.
#[derive(Clone, Debug)]
pub struct Levelled<'v> {
    vessel: &'v Vessel,
    up: Vector3<f64>,
    /// Height of each corner above `middle`.
    heights: Vec<f64>,
    columns: Vec<Column>,
    low: f64,
    high: f64,
}

/// A facet as the foot of a column of liquid: its corner heights in ascending order, and minus the
/// signed area of its projection along `up`.
#[derive(Clone, Copy, Debug)]
struct Column {
    z: [f64; 3],
    area: f64,
}

/// The free surface.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Surface {
    /// Its area: dV/dh.
    pub area: f64,
    /// Its centroid: the derivative of the liquid's first moment by its volume.
    pub centroid: Vector3<f64>,
    /// ∫ d·dᵀ over it with d from `centroid`; over the area, with the centroid's own part, this is
    /// the derivative of the second moment by volume.
    pub second: Matrix3<f64>,
}

/// Liquid up to a level.
#[derive(Clone, Debug, PartialEq)]
pub struct Liquid {
    /// Moments of its volume in the vessel's frame.
    pub moments: Moments,
    /// None where the vessel is empty or full to its highest point.
    pub surface: Option<Surface>,
    /// Box in the axes of the vessel's frame turned by the turn that was asked for; none if empty.
    pub bounds: Option<[[f64; 3]; 2]>,
}

impl Vessel {
    /// Of the facets of a closed solid, facing outward, in any unit. Nothing is checked here.
    pub fn new(facets: &[[[f64; 3]; 3]]) -> Self {
        let corners = facets.iter().flatten();
        let (lo, hi) = corners.fold(
            ([f64::INFINITY; 3], [f64::NEG_INFINITY; 3]),
            |(lo, hi): ([f64; 3], [f64; 3]), p| {
                (
                    std::array::from_fn(|k| lo[k].min(p[k])),
                    std::array::from_fn(|k| hi[k].max(p[k])),
                )
            },
        );
        let middle = match facets.is_empty() {
            true => Vector3::zeros(),
            false => (Vector3::from(lo) + Vector3::from(hi)) / 2.0,
        };
        let mut seen = HashMap::new();
        let mut points = Vec::new();
        let triangles = facets.iter().map(|t| {
            t.map(|p| {
                // −0 is 0.
                let key = p.map(|x| (x + 0.0).to_bits());
                *seen.entry(key).or_insert_with(|| {
                    points.push(Vector3::from(p) - middle);
                    (points.len() - 1) as u32
                })
            })
        });
        let triangles = triangles.collect();
        let whole = integrate(
            &LooseFacets(facets),
            Select::All,
            middle.into(),
            middle.into(),
        );
        Self {
            points,
            triangles,
            middle,
            whole: whole.moments,
        }
    }

    /// Moments of its whole volume.
    pub fn whole(&self) -> &Moments {
        &self.whole
    }

    /// What it holds when full.
    pub fn volume(&self) -> f64 {
        self.whole.zeroth
    }

    /// The same vessel with the unit vector `up` (in its own frame) as the direction up.
    pub fn levelled(&self, up: Vector3<f64>) -> Levelled<'_> {
        let heights: Vec<f64> = self.points.iter().map(|p| p.dot(&up)).collect();
        let columns = self.triangles.iter().map(|t| {
            let [a, b, c] = t.map(|i| self.points[i as usize]);
            let mut z = t.map(|i| heights[i as usize]);
            z.sort_by(f64::total_cmp);
            Column {
                z,
                area: -(b - a).cross(&(c - a)).dot(&up) / 2.0,
            }
        });
        let columns = columns.collect();
        let low = heights.iter().copied().fold(f64::INFINITY, f64::min);
        let high = heights.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        Levelled {
            vessel: self,
            up,
            heights,
            columns,
            low,
            high,
        }
    }
}

impl Column {
    /// The column's volume up to `h`, and its derivative by h.
    fn below(&self, h: f64) -> (f64, f64) {
        let [z0, z1, z2] = self.z;
        let (mean, slope) = if h <= z0 {
            (0.0, 0.0)
        } else if h >= z2 {
            (h - (z0 + z1 + z2) / 3.0, 1.0)
        } else if h <= z1 {
            let part = (h - z0) / (z1 - z0) * ((h - z0) / (z2 - z0));
            (part * (h - z0) / 3.0, part)
        } else {
            let part = (z2 - h) / (z2 - z0) * ((z2 - h) / (z2 - z1));
            let mean = (h - z0) + (h - z1) + (h - z2);
            ((mean + part * (z2 - h)) / 3.0, 1.0 - part)
        };
        (self.area * mean, self.area * slope)
    }
}

impl Levelled<'_> {
    /// Height of the lowest point above that of the middle of the vessel's box; heights of levels
    /// are counted from there too.
    pub fn low(&self) -> f64 {
        self.low
    }

    /// Height of the highest point.
    pub fn high(&self) -> f64 {
        self.high
    }

    /// The heights of all corners, ascending: between two of them every figure is smooth in the
    /// level.
    pub fn corner_heights(&self) -> Vec<f64> {
        let mut heights = self.heights.clone();
        heights.sort_by(f64::total_cmp);
        heights.dedup();
        heights
    }

    /// Volume below the level `h`, and the area of the free surface there.
    pub fn below(&self, h: f64) -> (f64, f64) {
        if h >= self.high {
            return (self.vessel.volume(), 0.0);
        }
        let (mut volume, mut area) = (Sum::ZERO, Sum::ZERO);
        for column in &self.columns {
            let (v, a) = column.below(h);
            volume.add(v);
            area.add(a);
        }
        (volume.value(), area.value())
    }

    /// The level that `volume` reaches, to 1e-13 of the vessel's volume; the lowest point for
    /// nothing (or less), the highest for all that it holds (or more).
    pub fn level(&self, volume: f64) -> f64 {
        let whole = self.vessel.volume();
        if volume <= 0.0 || volume.is_nan() {
            return self.low;
        }
        if volume >= whole {
            return self.high;
        }
        let (mut lo, mut hi) = (self.low, self.high);
        let mut h = lo + (hi - lo) * (volume / whole);
        // Bisection alone would end within 60 steps of this loop; Newton ends it after a few.
        for _ in 0..200 {
            let (v, area) = self.below(h);
            let off = v - volume;
            if off.abs() <= 1e-15 * whole {
                break;
            }
            if off > 0.0 {
                hi = h;
            } else {
                lo = h;
            }
            let newton = h - off / area;
            let next = if newton > lo && newton < hi {
                newton
            } else {
                lo + (hi - lo) / 2.0
            };
            if next == h || !(next > lo && next < hi) {
                break;
            }
            h = next;
        }
        h
    }

    /// The liquid below the level `h`. Its box is taken after `turn`.
    pub fn liquid(&self, h: f64, turn: &Matrix3<f64>) -> Liquid {
        let vessel = self.vessel;
        if h <= self.low {
            // The first drop would lie on the lowest corner.
            let lowest = self.heights.iter().position(|z| *z <= self.low);
            let lowest = lowest.map_or_else(Vector3::zeros, |n| vessel.points[n]);
            return Liquid {
                moments: Moments::zero(vessel.middle + lowest),
                surface: None,
                bounds: None,
            };
        }
        // The foot of the middle on the cutting plane.
        let apex = self.up * h;
        if h >= self.high {
            let all = vessel.points.iter();
            return Liquid {
                moments: vessel.whole,
                surface: None,
                bounds: self.boxed(all.copied(), turn),
            };
        }
        let (wetted, rim) = self.clipped(h);
        let mut moments =
            integrate(&LooseFacets(&wetted), Select::All, apex.into(), apex.into()).moments;
        moments.about += vessel.middle;
        let surface = self.surface(&rim, &apex);
        let corners = wetted.iter().flatten().map(|p| Vector3::from(*p));
        let bounds = self.boxed(corners, turn);
        Liquid {
            moments,
            surface,
            bounds,
        }
    }

    fn boxed(
        &self,
        points: impl Iterator<Item = Vector3<f64>>,
        turn: &Matrix3<f64>,
    ) -> Option<[[f64; 3]; 2]> {
        let middle = turn * self.vessel.middle;
        let mut around: Option<[Vector3<f64>; 2]> = None;
        for p in points {
            let p = turn * p + middle;
            around = Some(match around {
                Some([lo, hi]) => [lo.inf(&p), hi.sup(&p)],
                None => [p, p],
            });
        }
        around.map(|b| b.map(Into::into))
    }

    /// Where the edge from the corner `below` to the corner `above` meets the level. Both facets of
    /// the edge ask for it in the same order, so that they get the same bits.
    fn crossing(&self, below: u32, above: u32, h: f64) -> Vector3<f64> {
        let (b, a) = (below as usize, above as usize);
        let (p, q) = (self.vessel.points[b], self.vessel.points[a]);
        let t = (h - self.heights[b]) / (self.heights[a] - self.heights[b]);
        p + (q - p) * t
    }

    /// What lies below of facet `t`: its corners, and the piece of the rim of the free surface
    /// that it holds, as edges (below, above), in the sense in which the surface seen from above
    /// runs counter-clockwise. A corner exactly at the level counts as above it.
    fn cut(&self, t: &[u32; 3], h: f64) -> Cut {
        let under = t.map(|i| self.heights[i as usize] < h);
        let count = under.iter().filter(|u| **u).count();
        match count {
            0 => Cut::Dry,
            3 => Cut::Wet,
            1 => {
                // a below; b, c above.
                let k = under.iter().position(|u| *u).unwrap_or(0);
                let [a, b, c] = [t[k], t[(k + 1) % 3], t[(k + 2) % 3]];
                Cut::Corner {
                    a,
                    rim: [(a, c), (a, b)],
                }
            }
            _ => {
                // c above; a, b below.
                let k = under.iter().position(|u| !*u).unwrap_or(0);
                let [c, a, b] = [t[k], t[(k + 1) % 3], t[(k + 2) % 3]];
                Cut::Edge {
                    a,
                    b,
                    rim: [(a, c), (b, c)],
                }
            }
        }
    }

    /// The wetted parts of all facets as triangles, and the rim of the free surface, all seen from
    /// the middle.
    fn clipped(&self, h: f64) -> (Vec<[[f64; 3]; 3]>, Vec<Edge>) {
        let points = &self.vessel.points;
        let p = |i: u32| points[i as usize];
        let mut wetted = Vec::with_capacity(self.vessel.triangles.len());
        let mut rim = Vec::new();
        for t in &self.vessel.triangles {
            match self.cut(t, h) {
                Cut::Dry => {}
                Cut::Wet => wetted.push(t.map(|i| p(i).into())),
                Cut::Corner { a, rim: [from, to] } => {
                    let (q, r) = (
                        self.crossing(to.0, to.1, h),
                        self.crossing(from.0, from.1, h),
                    );
                    wetted.push([p(a).into(), q.into(), r.into()]);
                    rim.push([r, q]);
                }
                Cut::Edge {
                    a,
                    b,
                    rim: [from, to],
                } => {
                    let (r, q) = (
                        self.crossing(from.0, from.1, h),
                        self.crossing(to.0, to.1, h),
                    );
                    wetted.push([p(a).into(), p(b).into(), q.into()]);
                    wetted.push([p(a).into(), q.into(), r.into()]);
                    rim.push([r, q]);
                }
            }
        }
        (wetted, rim)
    }

    /// The wetted parts of the facets below the level `h`, in the vessel's frame, with a point of
    /// the level plane: tetrahedra from there need no free surface.
    pub fn wetted(&self, h: f64) -> (Vec<[[f64; 3]; 3]>, [f64; 3]) {
        let middle = self.vessel.middle;
        let lift = |p: [f64; 3]| (Vector3::from(p) + middle).into();
        let mut facets = self.clipped(h.min(self.high)).0;
        if h >= self.high {
            let all = self.vessel.triangles.iter();
            facets = all
                .map(|t| t.map(|i| self.vessel.points[i as usize].into()))
                .collect();
        }
        let facets = facets.into_iter().map(|t| t.map(lift)).collect();
        (facets, (self.up * h + middle).into())
    }

    /// The free surface from its rim, by signed triangles from `from` in the plane.
    fn surface(&self, rim: &[Edge], from: &Vector3<f64>) -> Option<Surface> {
        let mut area = Sum::ZERO;
        let mut first = [Sum::ZERO; 3];
        let mut second = [Sum::ZERO; 6];
        const PAIRS: [(usize, usize); 6] = [(0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)];
        for [p, q] in rim {
            let (p, q) = (p - from, q - from);
            let d = p.cross(&q).dot(&self.up);
            let s = p + q;
            area.add(d / 2.0);
            for k in 0..3 {
                first[k].add(d * s[k] / 6.0);
            }
            for (sum, (i, j)) in second.iter_mut().zip(PAIRS) {
                sum.add(d * (p[i] * p[j] + q[i] * q[j] + s[i] * s[j]) / 24.0);
            }
        }
        let area = area.value();
        if area <= 0.0 {
            return None;
        }
        let v = second.map(Sum::value);
        let about = Moments {
            about: from + self.vessel.middle,
            zeroth: area,
            first: Vector3::from(first.map(Sum::value)),
            second: Matrix3::new(v[0], v[3], v[4], v[3], v[1], v[5], v[4], v[5], v[2]),
        };
        let centroid = about.centre()?;
        Some(Surface {
            area,
            centroid,
            second: about.shifted(centroid).second,
        })
    }
}

/// A piece of the rim of the free surface.
type Edge = [Vector3<f64>; 2];

/// How a facet lies to the level. `rim` runs from the first crossing to the second.
enum Cut {
    Dry,
    Wet,
    Corner {
        a: u32,
        rim: [(u32, u32); 2],
    },
    Edge {
        a: u32,
        b: u32,
        rim: [(u32, u32); 2],
    },
}

#[cfg(test)]
mod tests;
