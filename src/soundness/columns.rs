//! Volume integrals of regions that surfaces bound by their winding numbers, by columns of rays.
//!
//! Along each ray of a square lattice the surfaces are crossed at points that are sorted; between
//! two of them the winding numbers are constant and the integral is exact. Over the lattice the sum
//! is an estimate. Turning the body and shifting the lattice at random makes it unbiased, and eight
//! such estimates that know nothing of each other show by their spread how far off their mean may
//! be (randomly shifted lattices: Cranley and Patterson, "Randomization of number theoretic methods
//! for multiple integration", SIAM J. Numer. Anal. 13(6), 1976). The turns and shifts are drawn
//! from fixed seeds: the same input gives the same bits.
//!
//! The length of a column through a polyhedron in general attitude is continuous and piecewise
//! linear over the lattice, so that the error falls about as the square of the lattice's step.
//!
//! Which rays cross which triangles is decided by exact signs with ties broken alike for all
//! triangles, so that a closed surface is left as often as it is entered on every ray.

use nalgebra::{Matrix3, Quaternion, UnitQuaternion, Vector3};
use rayon::prelude::*;

use crate::geometry::{Corners, Point, Position, Select, ray_crossing};
use crate::moments::{Moments, Placement};

/// Estimates that know nothing of each other.
pub(crate) const REPLICATES: usize = 8;
/// Lattice points that one task works on.
const BAND: usize = 1 << 14;

/// A surface and how it counts.
#[derive(Clone, Copy)]
pub(crate) struct Piece<'a> {
    pub(crate) facets: &'a dyn Corners,
    pub(crate) select: Select<'a>,
    /// What a passage into it adds to the winding number: 1, or −1 where it is turned about.
    pub(crate) weight: i32,
    /// Which of the two winding numbers it adds to.
    pub(crate) group: usize,
}

/// How finely to look, and where.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Lattice {
    /// The box outside which nothing is to be integrated.
    pub(crate) bounds: [Point; 2],
    /// Lattice points along a side of a square of the same area.
    pub(crate) side: usize,
}

/// What the replicates say.
pub(crate) struct Estimates {
    /// Moments, one estimate for each replicate, held about the middle of the box.
    pub(crate) replicates: [Moments; REPLICATES],
    /// Volume that a part of the region may have which no ray has met, at odds of 20 to 1: a part
    /// whose shadow is 3/8 of a lattice cell escapes eight lattices with that chance (the rule of
    /// three), and it is no longer than the box.
    pub(crate) unseen: f64,
    /// How often rays passed through surfaces, over all replicates.
    pub(crate) passages: u64,
}

impl Estimates {
    /// How far off the mean volume may be: three standard errors, and what may be unseen.
    pub(crate) fn volume_error(&self) -> f64 {
        three_errors(&self.replicates, |m| Vector3::new(m.zeroth, 0.0, 0.0)) + self.unseen
    }
}

/// Moments of `value(winding numbers)` over the box. Every surface must be closed.
pub(crate) fn integrate(
    pieces: &[Piece<'_>],
    lattice: Lattice,
    value: &(impl Fn([i32; 2]) -> f64 + Sync),
) -> Estimates {
    let mut random = SplitMix(0x6269_736d_6172_0001);
    // Drawn in order, whatever the threads do.
    let draws: [View; REPLICATES] = std::array::from_fn(|_| View::draw(&mut random, &lattice));
    let unseen = draws
        .iter()
        .map(|view| 0.375 * view.step * view.step * view.depth)
        .fold(0.0, f64::max);
    let mut passages = 0;
    let replicates = draws.map(|view| {
        let (moments, passed) = view.integrate(pieces, value);
        passages += passed;
        moments
    });
    Estimates {
        replicates,
        unseen,
        passages,
    }
}

/// The generator of Steele, Lea and Flood, "Fast splittable pseudorandom number generators",
/// OOPSLA 2014.
struct SplitMix(u64);

impl SplitMix {
    /// Uniform in [0, 1).
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// One attitude with its lattice: rays run along +x of the turned frame.
struct View {
    turn: Matrix3<f64>,
    middle: Vector3<f64>,
    /// First lattice point (y, z) in the turned frame about the middle.
    first: [f64; 2],
    step: f64,
    /// Length of the box along the rays.
    depth: f64,
    /// Lattice points along y and z.
    count: [usize; 2],
    /// A coordinate before everything along the rays.
    before: f64,
}

/// A ray's passage through a triangle.
#[derive(Clone, Copy)]
struct Hit {
    column: u32,
    x: f64,
    group: u8,
    /// What the winding number changes by.
    change: i32,
}

impl View {
    fn draw(random: &mut SplitMix, lattice: &Lattice) -> Self {
        use std::f64::consts::TAU;
        // A turn that is uniform over all (Shoemake, "Uniform random rotations", Graphics Gems III,
        // 1992).
        let (u, v, w) = (random.next(), random.next(), random.next());
        let (a, b) = ((1.0 - u).sqrt(), u.sqrt());
        let turn = *UnitQuaternion::from_quaternion(Quaternion::new(
            b * (TAU * w).cos(),
            a * (TAU * v).sin(),
            a * (TAU * v).cos(),
            b * (TAU * w).sin(),
        ))
        .to_rotation_matrix()
        .matrix();
        let [low, high] = lattice.bounds.map(Vector3::from);
        let middle = low + (high - low) / 2.0;
        let half = (high - low) / 2.0;
        // The box's shadow: half widths along the turned axes.
        let shadow: Vector3<f64> = turn.abs() * half;
        let (width, height) = (2.0 * shadow[1], 2.0 * shadow[2]);
        let step = (width * height).sqrt() / lattice.side as f64;
        let count = [width, height].map(|w| ((w / step) as usize).min(lattice.side * 64) + 2);
        let first = [shadow[1], shadow[2]].map(|s| -s + (random.next() - 1.0) * step);
        Self {
            turn,
            middle,
            first,
            step,
            depth: 2.0 * shadow[0],
            count,
            before: f64::NEG_INFINITY,
        }
    }

    /// The point seen from the middle in the turned frame. The same point gives the same bits, so
    /// that closed surfaces stay closed.
    #[inline(always)]
    fn seen(&self, t: [Point; 3]) -> [Point; 3] {
        t.map(|p| (self.turn * (Vector3::from(p) - self.middle)).into())
    }

    /// Indices of the lattice lines within the triangle along an axis (0 for y, 1 for z).
    #[inline(always)]
    fn lines(&self, t: &[Point; 3], axis: usize) -> std::ops::Range<usize> {
        let k = axis + 1;
        let place = |x: f64| (x - self.first[axis]) / self.step;
        let low = place(t[0][k].min(t[1][k]).min(t[2][k]));
        let high = place(t[0][k].max(t[1][k]).max(t[2][k]));
        // Room for rounding; the signs decide. The casts saturate.
        let from = (low - 1e-6).ceil().max(0.0) as usize;
        let to = ((high + 1e-6).floor() + 1.0).max(0.0) as usize;
        from..to.min(self.count[axis])
    }

    fn integrate(
        mut self,
        pieces: &[Piece<'_>],
        value: &(impl Fn([i32; 2]) -> f64 + Sync),
    ) -> (Moments, u64) {
        let rows = (BAND / self.count[0]).max(1);
        let bands = self.count[1].div_ceil(rows);
        // Which triangles each band of rows meets, in order, and where everything begins.
        let mut sorted: Vec<Vec<(u16, u32)>> = vec![Vec::new(); bands];
        let mut least = 0.0f64;
        for (p, piece) in pieces.iter().enumerate() {
            let n = piece.select.len(piece.facets.count());
            const CHUNK: usize = 1 << 16;
            let parts: Vec<(f64, Vec<(u32, u32)>)> = (0..n.div_ceil(CHUNK))
                .into_par_iter()
                .map(|c| {
                    let mut met = Vec::new();
                    let mut least = 0.0f64;
                    for i in c * CHUNK..n.min((c + 1) * CHUNK) {
                        let t = piece.select.get(i);
                        let seen = self.seen(piece.facets.triangle(t));
                        let across = self.lines(&seen, 1);
                        if across.is_empty() || self.lines(&seen, 0).is_empty() {
                            continue;
                        }
                        least = least.min(seen[0][0]).min(seen[1][0]).min(seen[2][0]);
                        for band in across.start / rows..=(across.end - 1) / rows {
                            met.push((band as u32, t as u32));
                        }
                    }
                    (least, met)
                })
                .collect();
            for (begins, met) in parts {
                least = least.min(begins);
                for (band, t) in met {
                    sorted[band as usize].push((p as u16, t));
                }
            }
        }
        self.before = least - 1.0 - least.abs();
        let sums: Vec<(Moments, u64)> = sorted
            .par_iter()
            .enumerate()
            .map(|(band, met)| self.band(band * rows, rows, met, pieces, value))
            .collect();
        let zero = Moments::zero(Vector3::zeros());
        let total = sums.iter().fold(zero, |sum, next| sum.plus(&next.0));
        let passages = sums.iter().map(|s| s.1).sum();
        let back = Placement {
            turn: self.turn.transpose(),
            at: self.middle,
        };
        let moments = total.weighted(self.step * self.step).placed(&back);
        (moments, passages)
    }

    /// The sum over the lattice points of the rows from `row` on, without the factor of the step.
    fn band(
        &self,
        row: usize,
        rows: usize,
        met: &[(u16, u32)],
        pieces: &[Piece<'_>],
        value: &(impl Fn([i32; 2]) -> f64 + Sync),
    ) -> (Moments, u64) {
        let end = self.count[1].min(row + rows);
        let mut hits: Vec<Hit> = Vec::new();
        for &(p, t) in met {
            let piece = &pieces[p as usize];
            let seen = self.seen(piece.facets.triangle(t as usize));
            let (ys, zs) = (self.lines(&seen, 0), self.lines(&seen, 1));
            for j in zs.start.max(row)..zs.end.min(end) {
                for i in self.across(&seen, j, ys.clone()) {
                    let from = [self.before, self.at(0, i), self.at(1, j)];
                    if let Position::Crosses(s) = ray_crossing(&from, &seen) {
                        hits.push(Hit {
                            column: ((j - row) * self.count[0] + i) as u32,
                            x: pierced(&seen, from[1], from[2]),
                            group: piece.group as u8,
                            change: -i32::from(s) * piece.weight,
                        });
                    }
                }
            }
        }
        let passages = hits.len() as u64;
        let (mut hits, starts) = by_column(hits, rows * self.count[0]);
        let mut sum = Moments::zero(Vector3::zeros());
        for (c, range) in starts.windows(2).enumerate() {
            let column = &mut hits[range[0]..range[1]];
            if column.is_empty() {
                continue;
            }
            // Ties are ordered too, so that the sum is the same every time.
            column.sort_unstable_by(|a, b| {
                (a.x.total_cmp(&b.x)).then((a.group, a.change).cmp(&(b.group, b.change)))
            });
            let (y, z) = (
                self.at(0, c % self.count[0]),
                self.at(1, row + c / self.count[0]),
            );
            let mut winding = [0i32; 2];
            let (mut zeroth, mut first, mut second) = (0.0, 0.0, 0.0);
            for pair in column.windows(2) {
                winding[usize::from(pair[0].group)] += pair[0].change;
                let v = value(winding);
                if v != 0.0 {
                    let (a, b) = (pair[0].x, pair[1].x);
                    let (half, mid) = ((b - a) / 2.0, a + (b - a) / 2.0);
                    let length = v * (b - a);
                    zeroth += length;
                    first += length * mid;
                    second += length * (mid * mid + half * half / 3.0);
                }
            }
            sum.zeroth += zeroth;
            sum.first += Vector3::new(first, y * zeroth, z * zeroth);
            let (xy, xz, yz) = (y * first, z * first, y * z * zeroth);
            sum.second += Matrix3::new(
                second,
                xy,
                xz,
                xy,
                y * y * zeroth,
                yz,
                xz,
                yz,
                z * z * zeroth,
            );
        }
        (sum, passages)
    }

    fn at(&self, axis: usize, i: usize) -> f64 {
        self.first[axis] + i as f64 * self.step
    }

    /// Which of the lattice points `ys` of row `j` the triangle may cover.
    #[inline(always)]
    fn across(
        &self,
        t: &[Point; 3],
        j: usize,
        ys: std::ops::Range<usize>,
    ) -> std::ops::Range<usize> {
        if ys.len() <= 8 {
            return ys;
        }
        let z = self.at(1, j);
        let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
        for k in 0..3 {
            let (a, b) = (&t[k], &t[(k + 1) % 3]);
            let (below, above) = (a[2].min(b[2]), a[2].max(b[2]));
            // A hair beyond the ends, so that a row that grazes a corner is not lost.
            let hair = 1e-9 * self.step;
            if z < below - hair || z > above + hair {
                continue;
            }
            let part = ((z - a[2]) / (b[2] - a[2])).clamp(0.0, 1.0);
            let ends = if above - below > 1e-6 * self.step && part.is_finite() {
                let y = a[1] + (b[1] - a[1]) * part;
                [y, y]
            } else {
                [a[1], b[1]]
            };
            for y in ends {
                low = low.min(y);
                high = high.max(y);
            }
        }
        let place = |y: f64| (y - self.first[0]) / self.step;
        // One point more on each side: the exact signs decide.
        let from = (place(low).floor() - 1.0).max(0.0) as usize;
        let to = (place(high).ceil() + 2.0).max(0.0) as usize;
        from.max(ys.start)..to.min(ys.end)
    }
}

/// The hits of each column together, and where each column's begin: a counting sort, since a
/// column holds few of them and there are many columns.
fn by_column(hits: Vec<Hit>, columns: usize) -> (Vec<Hit>, Vec<usize>) {
    let mut starts = vec![0usize; columns + 1];
    for h in &hits {
        starts[h.column as usize + 1] += 1;
    }
    for c in 0..columns {
        starts[c + 1] += starts[c];
    }
    let mut next = starts.clone();
    let mut out = hits.clone();
    for h in hits {
        let at = &mut next[h.column as usize];
        out[*at] = h;
        *at += 1;
    }
    (out, starts)
}

/// Where the line along x at (y, z), which passes through the triangle, pierces it.
fn pierced(t: &[Point; 3], y: f64, z: f64) -> f64 {
    let d = t.map(|p| [p[1] - y, p[2] - z]);
    let share = |i: usize, j: usize| d[i][0] * d[j][1] - d[j][0] * d[i][1];
    let w = [share(1, 2), share(2, 0), share(0, 1)];
    let x = (w[0] * t[0][0] + w[1] * t[1][0] + w[2] * t[2][0]) / (w[0] + w[1] + w[2]);
    let (low, high) = (
        t[0][0].min(t[1][0]).min(t[2][0]),
        t[0][0].max(t[1][0]).max(t[2][0]),
    );
    // Of a triangle seen edge-on the quotient is no number; its middle is as good as any point.
    if x.is_finite() {
        x.clamp(low, high)
    } else {
        low + (high - low) / 2.0
    }
}

/// A lattice fine enough that an error, which falls as the square of the step, comes from `error`
/// down to `wanted`: at least twice as fine as `side`, at most `finest`.
pub(crate) fn finer(side: usize, error: f64, wanted: f64, finest: usize) -> usize {
    let ratio = (error / wanted).sqrt();
    let times = if ratio.is_finite() {
        ratio.min(4096.0)
    } else {
        4096.0
    };
    let times = (times.ceil() as usize).next_power_of_two().max(2);
    side.saturating_mul(times).min(finest)
}

/// Mean of the replicates.
pub(crate) fn mean(replicates: &[Moments; REPLICATES]) -> Moments {
    let zero = Moments::zero(replicates[0].about);
    let sum = replicates.iter().fold(zero, |s, m| s.plus(m));
    sum.weighted(1.0 / REPLICATES as f64)
}

/// Three standard errors of the mean of what `of` takes from each replicate, as a distance.
pub(crate) fn three_errors(
    replicates: &[Moments; REPLICATES],
    of: impl Fn(&Moments) -> Vector3<f64>,
) -> f64 {
    let n = REPLICATES as f64;
    let values: Vec<Vector3<f64>> = replicates.iter().map(of).collect();
    let mean = values.iter().sum::<Vector3<f64>>() / n;
    let spread: f64 = values.iter().map(|v| (v - mean).norm_squared()).sum();
    3.0 * (spread / (n * (n - 1.0))).sqrt()
}
