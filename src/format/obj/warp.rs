//! Polygons whose corners are not flat: how far from flat, and what that can do to the volume.

use robust::{Coord3D, orient3d};

use super::triangulate::newell;
use crate::format::chunk;
use crate::format::number::Written;
use crate::mesh::WarpedPolygon;

/// Most corners for which all triangulations are compared; above, a bound is given.
const COMPARED: usize = 64;
/// The same for polygons that rounding explains, which are many and small.
const COMPARED_ROUNDED: usize = 12;

/// One polygon that is not exactly flat.
#[derive(Clone, Copy, Debug)]
pub(in crate::format) struct Warp {
    /// Byte of its statement.
    pub(in crate::format) at: usize,
    /// Its first triangle.
    pub(in crate::format) first: usize,
    count: usize,
    corner: [f64; 3],
    deviation: f64,
    low: f64,
    high: f64,
    within_rounding: bool,
}

/// Those of one piece: each that is beyond rounding, and one entry for all that are not.
#[derive(Debug, Default)]
pub(in crate::format) struct Gathered {
    beyond: Vec<Warp>,
    within: Option<Warp>,
}

impl Gathered {
    pub(in crate::format) fn add(&mut self, warp: Warp) {
        if !warp.within_rounding {
            self.beyond.push(warp);
            return;
        }
        self.within = Some(match self.within.take() {
            None => warp,
            Some(all) => {
                let worst = if warp.deviation > all.deviation {
                    warp
                } else {
                    all
                };
                Warp {
                    low: all.low + warp.low,
                    high: all.high + warp.high,
                    ..worst
                }
            }
        });
    }
}

/// The polygons of all pieces in file order; the entry for those within rounding, if any, is the
/// last. It names the one of largest deviation and holds the sum of all their volumes. Without a
/// `text` they have no lines.
pub(in crate::format) fn gather(text: Option<&[u8]>, pieces: Vec<Gathered>) -> Vec<WarpedPolygon> {
    let mut all = Gathered::default();
    for piece in pieces {
        piece
            .beyond
            .into_iter()
            .chain(piece.within)
            .for_each(|w| all.add(w));
    }
    // Lines are counted once along the text, not from its beginning for each polygon.
    let ending = text.map(chunk::line_ending);
    let (mut line, mut from) = (1u64, 0);
    let mut out = Vec::with_capacity(all.beyond.len() + 1);
    for w in all.beyond.into_iter().chain(all.within) {
        if let (Some(text), Some(ending)) = (text, ending) {
            if w.at < from {
                (line, from) = (1, 0);
            }
            line += memchr::memchr_iter(ending, &text[from..w.at]).count() as u64;
            from = w.at;
        }
        out.push(WarpedPolygon {
            line: text.map(|_| line),
            first: w.first,
            count: w.count,
            at: w.corner,
            deviation: w.deviation,
            volume_low: w.low,
            volume_high: w.high,
            within_rounding: w.within_rounding,
        });
    }
    out
}

/// Measures a polygon of more than three corners, cut into the `chosen` triangles; `None` if it is
/// exactly flat.
///
/// The deviation is the largest distance of a corner from the plane through the mean of the
/// corners along Newell's normal. Rounding explains it if the corners, each moved by at most half
/// a step of the last digit written along each axis, could have been flat: that moves a corner by
/// at most √3/2 steps, which is all of it for four corners (whose distances from the plane are
/// equal); for more, the plane may tilt as well, and twice as much is allowed.
///
/// The volume is compared over all triangulations of the corners in their order, by dynamic
/// programming (Klincsek 1980), up to [`COMPARED`] corners. Above, and for polygons of more than
/// [`COMPARED_ROUNDED`] corners that rounding explains, it is bounded by what lies between two
/// surfaces over the polygon within the deviation of its plane: twice deviation times area.
pub(in crate::format) fn measure(
    points: &[[f64; 3]],
    chosen: &[[u32; 3]],
    written: Written,
) -> Option<Warp> {
    if is_flat(points) {
        return None;
    }
    let n = points.len() as f64;
    let o = points[0];
    let rel = |p: [f64; 3]| [p[0] - o[0], p[1] - o[1], p[2] - o[2]];
    let normal = newell(points);
    let length = normal.iter().map(|x| x * x).sum::<f64>().sqrt();
    let mut mean = [0.0; 3];
    for p in points {
        (0..3).for_each(|k| mean[k] += rel(*p)[k] / n);
    }
    let (mut deviation, mut corner, mut size) = (0.0f64, o, 0.0f64);
    for &p in points {
        let d = rel(p);
        let height: f64 = (0..3).map(|k| (d[k] - mean[k]) * normal[k]).sum::<f64>() / length;
        // A polygon without area has no plane; then the distance from the mean is all there is.
        let away = if length > 0.0 {
            height.abs()
        } else {
            (0..3).map(|k| (d[k] - mean[k]).powi(2)).sum::<f64>().sqrt()
        };
        if away > deviation {
            (deviation, corner) = (away, p);
        }
        size = p.iter().fold(size, |m, x| m.max(x.abs()));
    }
    let steps = 3f64.sqrt() / 2.0 * if points.len() == 4 { 1.0 } else { 2.0 };
    // The deviation itself is computed with a few roundings of the coordinates' differences.
    let within_rounding = deviation <= steps * written.step(size) * (1.0 + 1e-9);
    let most = if within_rounding {
        COMPARED_ROUNDED
    } else {
        COMPARED
    };
    let (low, high) = if points.len() <= most {
        let relative: Vec<[f64; 3]> = points.iter().map(|&p| rel(p)).collect();
        volumes(&relative, chosen)
    } else {
        let bound = deviation * length;
        (-bound, bound)
    };
    Some(Warp {
        at: 0,
        first: 0,
        count: chosen.len(),
        corner,
        deviation,
        low,
        high,
        within_rounding,
    })
}

/// Whether all corners lie in one plane, exactly.
fn is_flat(points: &[[f64; 3]]) -> bool {
    if (0..3).any(|k| points.iter().all(|p| p[k] == points[0][k])) {
        return true;
    }
    let c = |p: [f64; 3]| Coord3D {
        x: p[0],
        y: p[1],
        z: p[2],
    };
    let side = |a, b, d, e| orient3d(c(a), c(b), c(d), c(e));
    if let [a, b, d, e] = *points {
        return side(a, b, d, e) == 0.0;
    }
    // Three corners that span the plane well: the first, the farthest from it, and the one
    // farthest from the line through both.
    let a = points[0];
    let minus = |p: [f64; 3]| [p[0] - a[0], p[1] - a[1], p[2] - a[2]];
    let square = |v: [f64; 3]| v[0] * v[0] + v[1] * v[1] + v[2] * v[2];
    let farthest = |key: &dyn Fn([f64; 3]) -> f64| {
        points.iter().copied().fold((a, 0.0), |best, p| {
            let d = key(p);
            if d > best.1 { (p, d) } else { best }
        })
    };
    let (b, _) = farthest(&|p| square(minus(p)));
    let u = minus(b);
    let (d, spread) = farthest(&|p| {
        let v = minus(p);
        square([
            u[1] * v[2] - u[2] * v[1],
            u[2] * v[0] - u[0] * v[2],
            u[0] * v[1] - u[1] * v[0],
        ])
    });
    spread == 0.0 || points.iter().all(|&e| side(a, b, d, e) == 0.0)
}

/// Six times the signed volume of the tetrahedron from the origin.
fn six(a: [f64; 3], b: [f64; 3], c: [f64; 3]) -> f64 {
    a[0] * (b[1] * c[2] - b[2] * c[1])
        + a[1] * (b[2] * c[0] - b[0] * c[2])
        + a[2] * (b[0] * c[1] - b[1] * c[0])
}

/// Least and most volume of any triangulation, less that of the chosen one. `points` are about the
/// first corner.
fn volumes(points: &[[f64; 3]], chosen: &[[u32; 3]]) -> (f64, f64) {
    let n = points.len();
    if let [_, p, q, r] = *points {
        // Against the diagonal 0-2 the diagonal 1-3 adds the tetrahedron of the four corners.
        let other = six(p, q, r) / 6.0 * if chosen[0] == [0, 1, 2] { 1.0 } else { -1.0 };
        return (other.min(0.0), other.max(0.0));
    }
    let own: f64 = chosen
        .iter()
        .map(|t| {
            let [a, b, c] = t.map(|k| points[k as usize]);
            six(a, b, c)
        })
        .sum();
    // best[i * n + j]: the polygon of corners i..=j.
    let mut best = vec![(0.0f64, 0.0f64); n * n];
    for gap in 2..n {
        for i in 0..n - gap {
            let j = i + gap;
            let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
            for k in i + 1..j {
                let v = six(points[i], points[k], points[j]);
                let (a, b) = (best[i * n + k], best[k * n + j]);
                low = low.min(a.0 + b.0 + v);
                high = high.max(a.1 + b.1 + v);
            }
            best[i * n + j] = (low, high);
        }
    }
    let (low, high) = best[n - 1];
    (((low - own) / 6.0).min(0.0), ((high - own) / 6.0).max(0.0))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::format::obj::triangulate;

    fn coarse() -> Written {
        Written {
            decimals: 2,
            digits: 999,
            single: false,
        }
    }

    #[test]
    fn a_quad_spans_a_tetrahedron() {
        // Corner 2 lifted by 1: the two triangulations differ by the tetrahedron of the corners,
        // of volume 1/6; all four are 1/4 from the plane (closed form; times its cosine).
        let points = [[0., 0., 0.], [1., 0., 0.], [1., 1., 1.], [0., 1., 0.]];
        let chosen = triangulate(&points);
        let w = measure(&points, &chosen, coarse()).unwrap();
        assert!((w.high - w.low - 1.0 / 6.0).abs() < 1e-15, "{w:?}");
        assert!(w.low == 0.0 || w.high == 0.0);
        let cosine = 1.0 / (1.0f64 + 0.25 + 0.25).sqrt();
        assert!((w.deviation - 0.25 * cosine).abs() < 1e-15, "{w:?}");
        assert!(!w.within_rounding);
    }

    #[test]
    fn rounding_explains_small_deviations_only() {
        let quad = |lift: f64| [[0., 0., 0.], [1., 0., 0.], [1., 1., lift], [0., 1., 0.1]];
        let one = |lift| {
            let points = quad(lift);
            measure(&points, &triangulate(&points), coarse())
        };
        assert!(one(0.1).is_none());
        assert!(one(0.11).unwrap().within_rounding);
        assert!(!one(0.2).unwrap().within_rounding);
    }

    #[test]
    fn hexagon_against_all_fourteen_triangulations() {
        // Enumerated by recursion, independently of the dynamic program.
        fn all(i: usize, j: usize, p: &[[f64; 3]]) -> Vec<f64> {
            if j < i + 2 {
                return vec![0.0];
            }
            let mut out = Vec::new();
            for k in i + 1..j {
                for a in all(i, k, p) {
                    for b in all(k, j, p) {
                        out.push(a + b + six(p[i], p[k], p[j]) / 6.0);
                    }
                }
            }
            out
        }
        let points: Vec<[f64; 3]> = (0..6)
            .map(|k| f64::from(k) * std::f64::consts::TAU / 6.0)
            .map(|a| [a.cos() - 1.0, a.sin(), 0.3 * (2.3 * a).sin()])
            .collect();
        let chosen = triangulate(&points);
        let own: f64 = chosen
            .iter()
            .map(|t| {
                let [a, b, c] = t.map(|k| points[k as usize]);
                six(a, b, c) / 6.0
            })
            .sum();
        let every = all(0, 5, &points);
        assert_eq!(every.len(), 14);
        let low = every.iter().fold(f64::INFINITY, |m, v| m.min(v - own));
        let high = every.iter().fold(f64::NEG_INFINITY, |m, v| m.max(v - own));
        let w = measure(&points, &chosen, coarse()).unwrap();
        assert!(
            (w.low - low).abs() < 1e-14 && (w.high - high).abs() < 1e-14,
            "{w:?} {low} {high}"
        );
    }
}
