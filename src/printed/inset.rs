//! A region moved inward by a distance: what is left of it at least that far from its boundary.
//!
//! Along each edge lies a strip of the distance's width, cut at convex corners along the bisector
//! (a mitre) and joined around reflex corners by a sector (the nearest point there is the corner
//! itself, so the boundary is an arc). The contour drawn along the far sides winds around a point
//! once if it is in the region, less once for each strip and sector that covers it. Strips cover
//! nothing that is farther from the boundary than the distance, and together all that is nearer:
//! the inset is therefore exactly where the contour winds at least once, however the strips of
//! thin places cross. A mitre would cut more than half of an edge only where edges are short
//! against the distance; there the strips keep their square ends, and the contour runs back to the
//! corner between them, which the same count covers.
//!
//! The overlay crate draws insets too, with square ends at every corner: the same areas to 1e-12,
//! measured, and slower by far, as each of its spikes crosses its neighbours.

use super::region::{Corner, Region};

/// The longest step around a reflex corner. The area of the sector is kept; only where its matter
/// lies is rounded, by less than 1e-6 of it.
const STEP: f64 = std::f64::consts::PI / 32.0;

/// The contour along the far sides of the strips of `region`, `distance` in grid steps. What it
/// winds around at least once is the inset. Corners of the region must be distinct neighbours.
pub(super) fn inset_contour(region: &Region, distance: f64) -> Region {
    let mut out = Region {
        points: Vec::with_capacity(region.points.len() + 8),
        ranges: Vec::with_capacity(region.ranges.len()),
    };
    for range in &region.ranges {
        let from = out.points.len();
        contour(&region.points[range.clone()], distance, &mut out.points);
        out.ranges.push(from..out.points.len());
    }
    out
}

/// An edge seen from its start: unit direction and length in grid steps.
#[derive(Clone, Copy)]
struct Edge {
    by: [i64; 2],
    along: [f64; 2],
    length: f64,
}

fn edge(from: Corner, to: Corner) -> Edge {
    let by = [to.x - from.x, to.y - from.y];
    let (x, y) = (by[0] as f64, by[1] as f64);
    let length = x.hypot(y);
    Edge {
        by,
        along: [x / length, y / length],
        length,
    }
}

fn contour(corners: &[Corner], w: f64, out: &mut Vec<Corner>) {
    let n = corners.len();
    if n < 3 {
        return;
    }
    let mut before = edge(corners[n - 1], corners[0]);
    for (i, &corner) in corners.iter().enumerate() {
        let after = edge(corner, corners[(i + 1) % n]);
        joint(corner, &before, &after, w, out);
        before = after;
    }
}

/// The contour around one corner, the region to the left.
fn joint(corner: Corner, before: &Edge, after: &Edge, w: f64, out: &mut Vec<Corner>) {
    let mut push = |x: f64, y: f64| {
        let p = Corner::new(corner.x + x.round() as i64, corner.y + y.round() as i64);
        if out.last() != Some(&p) {
            out.push(p);
        }
    };
    let wide = |i: usize| (i128::from(before.by[i]), i128::from(after.by[i]));
    let ((bx, ax), (by, ay)) = (wide(0), wide(1));
    let turn = bx * ay - by * ax;
    // Unit normals to the left.
    let n = [-before.along[1], before.along[0]];
    let m = [-after.along[1], after.along[0]];
    let cos = n[0] * m[0] + n[1] * m[1];
    let sin = n[0] * m[1] - n[1] * m[0];
    if turn > 0 {
        // The mitre takes w·tan(half the turn) off both edges.
        let cut = w * sin / (1.0 + cos);
        if cut <= before.length / 2.0 && cut <= after.length / 2.0 {
            let k = w / (1.0 + cos);
            push((n[0] + m[0]) * k, (n[1] + m[1]) * k);
        } else {
            push(n[0] * w, n[1] * w);
            push(0.0, 0.0);
            push(m[0] * w, m[1] * w);
        }
        return;
    }
    push(n[0] * w, n[1] * w);
    let straight = turn == 0 && cos > 0.0;
    if !straight {
        // Around the corner clockwise, as far as the normals turn.
        let angle = (-sin).atan2(cos).abs();
        let steps = (angle / STEP).ceil();
        let step = angle / steps;
        // The fan has the sector's area: its inner corners stand out by a little.
        let (s, rest) = (step.sin(), steps - 2.0);
        let radius = if rest < 0.5 {
            w * angle / (2.0 * s)
        } else {
            w * ((s * s + rest * s * angle).sqrt() - s) / (rest * s)
        };
        for i in 1..steps as u32 {
            let (sin, cos) = (-step * f64::from(i)).sin_cos();
            push(
                radius * (n[0] * cos - n[1] * sin),
                radius * (n[0] * sin + n[1] * cos),
            );
        }
    }
    push(m[0] * w, m[1] * w);
}

#[cfg(test)]
mod tests {
    use super::super::region::{Flat, Grid, Overlayer};
    use super::*;
    use i_overlay::mesh::int::arc::ArcOptions;
    use i_overlay::mesh::int::outline::offset::IntOutlineOffset;
    use i_overlay::mesh::int::style::{IntLineJoin, IntOutlineStyle};
    use i_overlay::mesh::math::MathMode;
    use proptest::prelude::*;

    fn region(contours: &[Vec<[f64; 2]>], grid: &Grid) -> Region {
        let mut out = Region::default();
        for contour in contours {
            let from = out.points.len();
            out.points
                .extend(contour.iter().map(|p| grid.corner(p[0], p[1])));
            out.ranges.push(from..out.points.len());
        }
        Overlayer::new().wound(&out)
    }

    fn area(contours: &[Vec<[f64; 2]>], w: f64) -> f64 {
        let grid = Grid::over([-100.0; 2], [100.0; 2]);
        let raw = inset_contour(&region(contours, &grid), grid.steps(w));
        Flat::of(&Overlayer::new().wound(&raw), &grid).area
    }

    #[test]
    fn convex_corners_are_mitred_and_reflex_ones_rounded() {
        let square = vec![[0.0, 0.0], [20.0, 0.0], [20.0, 20.0], [0.0, 20.0]];
        assert!((area(std::slice::from_ref(&square), 1.5) - 17.0 * 17.0).abs() < 1e-9);
        // Nothing is left of it from half its width on.
        assert_eq!(area(std::slice::from_ref(&square), 10.0), 0.0);
        // A square hole grows by four sides and a circle.
        let hole = vec![[8.0, 8.0], [8.0, 12.0], [12.0, 12.0], [12.0, 8.0]];
        let want = 289.0 - (16.0 + 4.0 * 4.0 * 1.5 + std::f64::consts::PI * 2.25);
        assert!((area(&[square, hole], 1.5) - want).abs() < 1e-9);
    }

    #[test]
    fn a_fine_circle_shrinks_to_its_parallel() {
        let n = 720_u32;
        let at = |r: f64| -> Vec<[f64; 2]> {
            (0..n)
                .map(|i| {
                    let (s, c) = (std::f64::consts::TAU * f64::from(i) / f64::from(n)).sin_cos();
                    [r * c, r * s]
                })
                .collect()
        };
        let half = std::f64::consts::PI / f64::from(n);
        // The polygon's own closed form: its apothem shrinks by w.
        let of = |r: f64, w: f64| f64::from(n) * half.tan() * (r * half.cos() - w).powi(2);
        for w in [0.4, 5.0, 39.0, 49.0] {
            assert!((area(&[at(50.0)], w) - of(50.0, w)).abs() < 1e-8, "{w}");
        }
    }

    #[test]
    fn a_thin_place_is_filled_once_and_parts_the_core() {
        // Two squares of 10 joined by a bridge 1 wide and 10 long; walls of 0.8 meet in it.
        let dumbbell = vec![
            [0.0, 0.0],
            [10.0, 0.0],
            [10.0, 4.5],
            [20.0, 4.5],
            [20.0, 0.0],
            [30.0, 0.0],
            [30.0, 10.0],
            [20.0, 10.0],
            [20.0, 5.5],
            [10.0, 5.5],
            [10.0, 10.0],
            [0.0, 10.0],
        ];
        let w = 0.8_f64;
        // Beside the mouth of the bridge the wall is the discs around its two corners, which
        // overlap: what lies within w of the middle of the mouth and left of the parallel line.
        let half = 0.5_f64;
        // The corners' discs cross on the axis, √(w² − ½²) from the mouth. The core gains what
        // lies between the parallel line at w and the arcs: ∫ (w − √(w² − y²)) over |y| < ½.
        let arc = half * (w * w - half * half).sqrt() + w * w * (half / w).asin();
        let gain = 2.0 * half * w - arc;
        let want = 2.0 * ((10.0 - 2.0 * w).powi(2) + gain);
        let got = area(&[dumbbell], w);
        // Arcs are chords: of the gain alone, a few per mille.
        assert!((got - want).abs() < 2e-3 * gain, "{got} {want}");
    }

    /// A polygon that sees the origin: radii at equal angles.
    fn star() -> impl Strategy<Value = Vec<[f64; 2]>> {
        prop::collection::vec(2.0..40.0_f64, 3..40).prop_map(|radii| {
            let n = radii.len() as f64;
            let at = |(i, r): (usize, &f64)| {
                let (s, c) = (std::f64::consts::TAU * i as f64 / n).sin_cos();
                [r * c, r * s]
            };
            radii.iter().enumerate().map(at).collect()
        })
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(200))]
        #[test]
        fn the_overlay_crate_draws_the_same_inset(p in star(), w in 0.05..8.0_f64) {
            let grid = Grid::over([-40.0; 2], [40.0; 2]);
            let region = region(&[p], &grid);
            let raw = inset_contour(&region, grid.steps(w));
            let ours = Flat::of(&Overlayer::new().wound(&raw), &grid).area;
            let style = IntOutlineStyle::<i64>::new(-(grid.steps(w).round() as i64))
                .math(MathMode::Float)
                .line_join(IntLineJoin::Round(ArcOptions {
                    max_step: ArcOptions::MIN_STEP,
                    rotation_precision: 32,
                }));
            let mut theirs = Region::default();
            region.outline_into(&style, &mut theirs).unwrap();
            let theirs = Flat::of(&theirs, &grid).area;
            // Its arcs are chords of 1/1024 turn: at most w² · 2π · 3e-6 of area for each reflex
            // corner; ours keep a whole sector's area, not that of a part cut off: 1e-3 of w².
            let allowed = 3e-3 * w * w * 20.0;
            prop_assert!((ours - theirs).abs() <= allowed, "{ours} {theirs}");
        }

        #[test]
        fn each_point_is_in_the_inset_if_it_is_far_enough_from_every_edge(
            p in star(), w in 0.05..6.0_f64, probes in prop::collection::vec((-40.0..40.0_f64, -40.0..40.0_f64), 60),
        ) {
            let grid = Grid::over([-40.0; 2], [40.0; 2]);
            let region = region(std::slice::from_ref(&p), &grid);
            let raw = inset_contour(&region, grid.steps(w));
            let inset = Overlayer::new().wound(&raw);
            let winding = |contours: &Region, q: (f64, f64)| {
                let c = grid.corner(q.0, q.1);
                let mut winding = 0;
                for range in &contours.ranges {
                    let points = &contours.points[range.clone()];
                    for i in 0..points.len() {
                        let (a, b) = (points[i], points[(i + 1) % points.len()]);
                        let side = i128::from(b.x - a.x) * i128::from(c.y - a.y)
                            - i128::from(b.y - a.y) * i128::from(c.x - a.x);
                        if a.y <= c.y && b.y > c.y && side > 0 { winding += 1; }
                        if a.y > c.y && b.y <= c.y && side < 0 { winding -= 1; }
                    }
                }
                winding
            };
            let distance = |q: (f64, f64)| {
                (0..p.len()).map(|i| {
                    let (a, b) = (p[i], p[(i + 1) % p.len()]);
                    let (ux, uy) = (b[0] - a[0], b[1] - a[1]);
                    let t = ((q.0 - a[0]) * ux + (q.1 - a[1]) * uy) / (ux * ux + uy * uy);
                    let t = t.clamp(0.0, 1.0);
                    (q.0 - a[0] - t * ux).hypot(q.1 - a[1] - t * uy)
                }).fold(f64::INFINITY, f64::min)
            };
            for q in probes {
                let d = distance(q);
                // Arcs drawn as chords leave a band of w·STEP²/4 undecided.
                if (d - w).abs() < 0.003 * w + 1e-6 { continue; }
                let want = winding(&region, q) > 0 && d > w;
                prop_assert_eq!(winding(&inset, q) > 0, want, "{:?} {} {}", q, d, w);
            }
        }
    }
}
