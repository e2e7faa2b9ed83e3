//! Sections of a closed mesh at many heights.
//!
//! A corner counts as above a section where it lies in it: each facet then crosses a section in
//! one segment or not at all, whatever lies flat in it. The end of a segment is computed from the
//! lower and upper corner of its edge, the same for both facets of the edge to the last bit, so
//! that segments of a closed surface join into closed contours without a tolerance.

use nalgebra::{Matrix3, Vector3};
use rayon::prelude::*;

use super::region::{Corner, Grid, Region};
use crate::error::{Error, Kind, Result};
use crate::geometry::Corners;

/// Segments in all sections together, at most: their contours take 16 bytes each.
const MOST_SEGMENTS: u64 = 1 << 28;
/// Layers, at most.
const MOST_LAYERS: f64 = 1_000_000.0;

/// Where the layers of a print lie.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stack {
    /// Rows are the print's axes.
    pub(super) frame: Matrix3<f64>,
    /// Height of the bed along the last of them.
    pub(super) bed: f64,
    pub(super) height: f64,
    pub(super) count: usize,
    /// Box of the facets in the print's frame.
    low: [f64; 3],
    high: [f64; 3],
}

impl Stack {
    /// The stack of layers of `height` under all facets. A last layer is laid where the part
    /// reaches its middle.
    ///
    /// # Errors
    /// `too-large` for too many layers, `not-finite` for a box that is no box.
    pub(super) fn under(facets: &impl Corners, frame: Matrix3<f64>, height: f64) -> Result<Self> {
        const NONE: [[f64; 3]; 2] = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
        // Smallest and largest are the same in any grouping.
        let [low, high] = (0..facets.count())
            .into_par_iter()
            .with_min_len(4096)
            .fold(
                || NONE,
                |[mut low, mut high], i| {
                    for p in facets.triangle(i) {
                        let q = turned(&frame, p);
                        for k in 0..3 {
                            low[k] = low[k].min(q[k]);
                            high[k] = high[k].max(q[k]);
                        }
                    }
                    [low, high]
                },
            )
            .reduce(
                || NONE,
                |a, b| {
                    [
                        [0, 1, 2].map(|k| a[0][k].min(b[0][k])),
                        [0, 1, 2].map(|k| a[1][k].max(b[1][k])),
                    ]
                },
            );
        let count = ((high[2] - low[2]) / height).round();
        if !count.is_finite() || (0..2).any(|k| !(high[k] - low[k]).is_finite()) {
            return Err(Error::new(
                Kind::NotFinite,
                "the part's box cannot be divided into layers",
                "check the unit of the mesh and the layer height",
            ));
        }
        if count > MOST_LAYERS {
            return Err(Error::new(
                Kind::TooLarge,
                format!("the part would have {count} layers, and at most {MOST_LAYERS} are cut"),
                "check the unit of the mesh and the layer height",
            ));
        }
        Ok(Self {
            frame,
            bed: low[2],
            height,
            count: count as usize,
            low,
            high,
        })
    }

    /// The height at which layer `k` is cut: its middle.
    pub(super) fn middle(&self, k: usize) -> f64 {
        self.bed + (k as f64 + 0.5) * self.height
    }

    pub(super) fn grid(&self) -> Grid {
        let flat = |p: &[f64; 3]| [p[0], p[1]];
        Grid::over(flat(&self.low), flat(&self.high))
    }

    /// The layers whose sections a facet between two heights crosses.
    fn crossed(&self, low: f64, high: f64) -> (u32, u32) {
        let guess = |z: f64| ((z - self.bed) / self.height - 0.5).max(0.0) as usize;
        // The division may round past a layer; the comparison that counts is the one below.
        let first_from = |z: f64, above: fn(f64, f64) -> bool| {
            let mut k = guess(z).saturating_sub(1).min(self.count);
            while k < self.count && !above(self.middle(k), z) {
                k += 1;
            }
            k as u32
        };
        (
            first_from(low, |m, z| m > z),
            first_from(high, |m, z| m > z),
        )
    }
}

fn turned(frame: &Matrix3<f64>, p: [f64; 3]) -> [f64; 3] {
    (frame * Vector3::from(p)).into()
}

/// Which facets cross which section.
pub(super) struct Crossings {
    facets: Vec<u32>,
    starts: Vec<usize>,
}

impl Crossings {
    /// # Errors
    /// `too-large` where the sections together would have too many segments.
    pub(super) fn of(facets: &impl Corners, stack: &Stack) -> Result<Self> {
        let spans: Vec<(u32, u32)> = (0..facets.count())
            .into_par_iter()
            .with_min_len(4096)
            .map(|i| {
                let z = facets.triangle(i).map(|p| turned(&stack.frame, p)[2]);
                let low = z[0].min(z[1]).min(z[2]);
                let high = z[0].max(z[1]).max(z[2]);
                stack.crossed(low, high)
            })
            .collect();
        let segments: u64 = spans.iter().map(|s| u64::from(s.1 - s.0)).sum();
        if segments > MOST_SEGMENTS {
            return Err(Error::new(
                Kind::TooLarge,
                format!(
                    "the layers would have {segments} segments together, and at most {MOST_SEGMENTS} are kept"
                ),
                "take thicker layers, or a coarser mesh",
            ));
        }
        let mut starts = vec![0_usize; stack.count + 1];
        for &(from, to) in &spans {
            for k in from..to {
                starts[k as usize + 1] += 1;
            }
        }
        for k in 0..stack.count {
            starts[k + 1] += starts[k];
        }
        let mut next = starts.clone();
        let mut crossing = vec![0_u32; segments as usize];
        for (i, &(from, to)) in spans.iter().enumerate() {
            for k in from..to {
                let at = &mut next[k as usize];
                crossing[*at] = i as u32;
                *at += 1;
            }
        }
        Ok(Self {
            facets: crossing,
            starts,
        })
    }

    /// The contours of section `k`, the solid to their left seen from above.
    ///
    /// # Errors
    /// `not-closed` where they do not close, which the section of a closed mesh always does.
    pub(super) fn contours(
        &self,
        facets: &impl Corners,
        stack: &Stack,
        grid: &Grid,
        k: usize,
    ) -> Result<Region> {
        let z = stack.middle(k);
        let mut segments = Vec::new();
        for &t in &self.facets[self.starts[k]..self.starts[k + 1]] {
            let p = facets.triangle(t as usize).map(|p| turned(&stack.frame, p));
            let above = p.map(|q| q[2] >= z);
            let (mut down, mut up) = (None, None);
            for i in 0..3 {
                let j = (i + 1) % 3;
                match (above[i], above[j]) {
                    (true, false) => down = Some(between(&p[j], &p[i], z)),
                    (false, true) => up = Some(between(&p[i], &p[j], z)),
                    _ => {}
                }
            }
            let (Some(d), Some(u)) = (down, up) else {
                continue;
            };
            let (a, b) = (grid.corner(d[0], d[1]), grid.corner(u[0], u[1]));
            if a != b {
                segments.push((a, b));
            }
        }
        joined(&mut segments).ok_or_else(|| {
            Error::new(
                Kind::NotClosed,
                format!("the section at {z} above the bed's origin does not close"),
                "close the surface in the program that made it and export again",
            )
        })
    }
}

/// Where the edge from `low`, below z, to `high`, not below, crosses it.
fn between(low: &[f64; 3], high: &[f64; 3], z: f64) -> [f64; 2] {
    let part = (z - low[2]) / (high[2] - low[2]);
    [0, 1].map(|k| low[k] + (high[k] - low[k]) * part)
}

/// Segments strung into closed contours; which of several at one corner follows which makes no
/// difference to what they wind around.
fn joined(segments: &mut [(Corner, Corner)]) -> Option<Region> {
    let key = |c: &Corner| (c.x, c.y);
    segments.sort_unstable_by_key(|(a, b)| (key(a), key(b)));
    let mut used = vec![false; segments.len()];
    // For each first segment of a corner, how many of it have been used.
    let mut taken = vec![0_u32; segments.len()];
    let mut out = Region {
        points: Vec::with_capacity(segments.len()),
        ranges: Vec::new(),
    };
    for first in 0..segments.len() {
        if used[first] {
            continue;
        }
        let from = out.points.len();
        let start = segments[first].0;
        let mut corner = start;
        loop {
            let run = segments.partition_point(|(a, _)| key(a) < key(&corner));
            let at = run + *taken.get(run)? as usize;
            if segments.get(at)?.0 != corner {
                return None;
            }
            taken[run] += 1;
            used[at] = true;
            out.points.push(corner);
            corner = segments[at].1;
            if corner == start {
                break;
            }
        }
        out.ranges.push(from..out.points.len());
    }
    Some(out)
}
