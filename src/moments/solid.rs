//! Integrals over the solid that a closed triangle surface bounds, by signed tetrahedra.
//!
//! Each triangle and a common apex span a tetrahedron whose volume carries the triangle's sign;
//! over a closed surface they sum to the solid (the divergence theorem; see Mirtich, "Fast and
//! accurate computation of polyhedral mass properties", J. Graphics Tools 1(2), 1996, and Eberly,
//! "Polyhedral mass properties", 2002). With a, b, c the corners seen from the apex, s = a+b+c and
//! d = a·(b×c) = a·((b−a)×(c−a)):
//!
//! ```text
//! ∫ 1 = Σ d/6     ∫ x = Σ d·s/24     ∫ x xᵀ = Σ d·(aaᵀ + bbᵀ + ccᵀ + ssᵀ)/120
//! ```
//!
//! d is the only step that cancels within a triangle: for a thin plate that stands askew its
//! rounding would be far larger than the volume's. It is therefore formed in twice the working
//! precision, from differences that carry their own rounding errors. The sums are compensated
//! over chunks of a fixed number of triangles, and those of chunks are added without any rounding
//! ([`TotalSums`]), so that the bits depend neither on the number of threads nor on which process
//! summed which chunk.

use nalgebra::{Matrix3, Vector3};
use rayon::prelude::*;

use super::{Moments, TotalSums};
use crate::geometry::eft::{Fused, Product, Split, Sum, two_diff, two_sum};
use crate::geometry::{BLOCK, Block, Coordinate, Corners, LANES, Lane, Level, Select};

/// Triangles in one chunk. Part of the definition of the result's bits: a different number would
/// round differently in the last place.
pub const CHUNK: usize = 4096;

/// Compensated sums of one chunk: volume, first (3), second (6: xx yy zz xy xz yz), area.
pub(super) const SUMS: usize = 11;

/// What one pass over the triangles of a solid yields, in the file's unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SolidIntegrals {
    /// Moments of volume about the apex.
    pub moments: Moments,
    /// Surface area.
    pub area: f64,
    /// K: the volume's sum with absolute values, about `middle`.
    pub absolute_volume: f64,
}

impl SolidIntegrals {
    /// K/|V|: how many times larger the terms are than their sum. `None` where V is zero.
    pub fn condition(&self) -> Option<f64> {
        let c = self.absolute_volume / self.moments.zeroth.abs();
        c.is_finite().then_some(c)
    }
}

/// The compensated sums of one chunk.
#[derive(Clone, Copy, Debug)]
pub struct ChunkSums {
    sums: [Sum; SUMS],
    absolute: f64,
}

impl ChunkSums {
    /// Nothing.
    pub const ZERO: Self = Self {
        sums: [Sum::ZERO; SUMS],
        absolute: 0.0,
    };

    /// Surface area.
    pub fn area(&self) -> f64 {
        self.sums[SUMS - 1].value() / 2.0
    }

    /// What stands for each sum: its value and what that has lost; of the last, which is K, the
    /// value alone.
    pub(super) fn parts(&self) -> [(f64, f64); SUMS + 1] {
        let mut out = [(self.absolute, 0.0); SUMS + 1];
        for (to, sum) in out.iter_mut().zip(&self.sums) {
            *to = sum.parts();
        }
        out
    }

    /// The integrals, with `apex` the point that the sums were taken about.
    pub fn finish(&self, apex: [f64; 3]) -> SolidIntegrals {
        // Rounded once, as sums of several chunks are.
        SolidIntegrals::of_sums(self.parts().map(|(high, low)| high + low), apex)
    }
}

impl SolidIntegrals {
    /// From the values of all sums, in their order, K last.
    pub(super) fn of_sums(v: [f64; SUMS + 1], apex: [f64; 3]) -> Self {
        let s = |i: usize| v[i] / 120.0;
        Self {
            moments: Moments {
                about: Vector3::from(apex),
                zeroth: v[0] / 6.0,
                first: Vector3::new(v[1], v[2], v[3]) / 24.0,
                second: Matrix3::new(s(4), s(7), s(8), s(7), s(5), s(9), s(8), s(9), s(6)),
            },
            area: v[10] / 2.0,
            absolute_volume: v[SUMS] / 6.0,
        }
    }
}

/// Integrates over the solid bounded by the chosen triangles, in parallel.
///
/// `apex` should lie in or near the solid; `middle` is the point about which the absolute sum K is
/// taken (the middle of the bounding box). Nothing is checked here: only for a closed, consistently
/// wound surface is the result the solid's.
pub fn integrate(
    facets: &impl Corners,
    select: Select<'_>,
    apex: [f64; 3],
    middle: [f64; 3],
) -> SolidIntegrals {
    let n = select.len(facets.count());
    let chunk = |k: usize| {
        let range = k * CHUNK..n.min((k + 1) * CHUNK);
        chunk_sums(facets, select, range, apex, middle)
    };
    let chunks = n.div_ceil(CHUNK);
    if chunks <= 1 {
        return chunk(0).finish(apex);
    }
    let parts: Vec<ChunkSums> = (0..chunks).into_par_iter().map(chunk).collect();
    let mut total = TotalSums::ZERO;
    parts.iter().for_each(|part| total.add(part));
    total.finish(apex)
}

/// The sums over the positions `range` of the selection, by the fastest kernel that this
/// processor runs; all kernels give the same bits.
pub fn chunk_sums<C: Corners>(
    facets: &C,
    select: Select<'_>,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    middle: [f64; 3],
) -> ChunkSums {
    match Level::of_processor() {
        // SAFETY: the processor has just been asked for the features.
        #[cfg(target_arch = "x86_64")]
        #[allow(unsafe_code)]
        Level::Wide512 => unsafe { wide512(facets, select, range, apex, middle) },
        // SAFETY: as above.
        #[cfg(target_arch = "x86_64")]
        #[allow(unsafe_code)]
        Level::Wide256 => unsafe { wide256(facets, select, range, apex, middle) },
        Level::Fused => kernel::<C, Fused>(facets, select, range, apex, middle),
        Level::Plain => kernel::<C, Split>(facets, select, range, apex, middle),
    }
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f,avx512dq,avx512vl,avx512bw,avx2,fma")]
fn wide512<C: Corners>(
    facets: &C,
    select: Select<'_>,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    middle: [f64; 3],
) -> ChunkSums {
    kernel::<C, Fused>(facets, select, range, apex, middle)
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn wide256<C: Corners>(
    facets: &C,
    select: Select<'_>,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    middle: [f64; 3],
) -> ChunkSums {
    kernel::<C, Fused>(facets, select, range, apex, middle)
}

/// Sums that grow by a block of triangles at a time.
pub(crate) struct Running {
    high: [Lane; SUMS],
    low: [Lane; SUMS],
    absolute: Lane,
    /// What the triangles of the last block have added.
    terms: [[f64; BLOCK]; TERMS],
}

impl Running {
    /// Nothing.
    pub(crate) const ZERO: Self = Self {
        high: [[0.0; LANES]; SUMS],
        low: [[0.0; LANES]; SUMS],
        absolute: [0.0; LANES],
        terms: [[0.0; BLOCK]; TERMS],
    };

    /// Adds the triangles of a block, seen from `apex`; `m` leads from there to the point of the
    /// absolute sum.
    #[allow(
        clippy::needless_range_loop,
        reason = "one index runs over several arrays"
    )]
    #[inline(always)]
    pub(crate) fn add<T: Coordinate, P: Product>(
        &mut self,
        block: &Block<T>,
        apex: [f64; 3],
        m: [f64; 3],
    ) {
        // One loop over plain numbers: this is what compilers turn into vector code best.
        for l in 0..BLOCK {
            let mut x = [[0.0; 3]; 3];
            for k in 0..3 {
                for i in 0..3 {
                    x[k][i] = block.at[k][i][l].wide();
                }
            }
            let of = terms_of::<P>(&x, apex, m);
            for i in 0..TERMS {
                self.terms[i][l] = of[i];
            }
        }
        for group in 0..BLOCK / LANES {
            for i in 0..SUMS {
                for l in 0..LANES {
                    let (s, e) = two_sum(self.high[i][l], self.terms[i][group * LANES + l]);
                    self.high[i][l] = s;
                    self.low[i][l] += e;
                }
            }
        }
        for group in 0..BLOCK / LANES {
            for l in 0..LANES {
                self.low[0][l] += self.terms[VOLUME_LOW][group * LANES + l];
                self.absolute[l] += self.terms[ABSOLUTE][group * LANES + l];
            }
        }
    }

    /// The lanes joined in their order.
    pub(crate) fn finish(&self) -> ChunkSums {
        let mut out = ChunkSums::ZERO;
        for i in 0..SUMS {
            for l in 0..LANES {
                out.sums[i].join(Sum::from_parts(self.high[i][l], self.low[i][l]));
            }
        }
        out.absolute = self.absolute.iter().sum();
        out
    }
}

#[inline(always)]
fn kernel<C: Corners, P: Product>(
    facets: &C,
    select: Select<'_>,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    middle: [f64; 3],
) -> ChunkSums {
    // From the apex to the middle of the box.
    let m = [0, 1, 2].map(|i| middle[i] - apex[i]);
    // Lanes past the end hold one corner three times: a triangle that adds exactly nothing.
    match (facets.as_records(), select) {
        (Some(records), Select::All) => blocks::<f32, P>(range, apex, m, |part, block| {
            block.records(&records, part, [0.0; 3]);
        }),
        _ => blocks::<f64, P>(range, apex, m, |part, block| {
            block.triangles(facets, select, part, apex);
        }),
    }
}

/// Sums over `range`, laid out by `fill` a block at a time.
#[inline(always)]
fn blocks<T: Coordinate, P: Product>(
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    m: [f64; 3],
    fill: impl Fn(std::ops::Range<usize>, &mut Block<T>),
) -> ChunkSums {
    let mut running = Running::ZERO;
    let mut block = Block::<T>::new();
    let mut at = range.start;
    while at < range.end {
        let end = range.end.min(at + BLOCK);
        fill(at..end, &mut block);
        running.add::<T, P>(&block, apex, m);
        at = end;
    }
    running.finish()
}

/// Terms of one triangle: those of the sums, then what the first one has beyond f64, then that of K.
const TERMS: usize = SUMS + 2;
const VOLUME_LOW: usize = SUMS;
const ABSOLUTE: usize = SUMS + 1;

#[inline(always)]
fn terms_of<P: Product>(x: &[[f64; 3]; 3], apex: [f64; 3], m: [f64; 3]) -> [f64; TERMS] {
    // a, b, c: corners seen from the apex; u = b−a, v = c−a: edges; each with its rounding error.
    let mut a = [0.0; 3];
    let mut al = [0.0; 3];
    let mut b = [0.0; 3];
    let mut c = [0.0; 3];
    let mut u = [0.0; 3];
    let mut ul = [0.0; 3];
    let mut v = [0.0; 3];
    let mut vl = [0.0; 3];
    for i in 0..3 {
        (a[i], al[i]) = two_diff(x[0][i], apex[i]);
        (u[i], ul[i]) = two_diff(x[1][i], x[0][i]);
        (v[i], vl[i]) = two_diff(x[2][i], x[0][i]);
        b[i] = x[1][i] - apex[i];
        c[i] = x[2][i] - apex[i];
    }
    // n = u × v, twice the area vector.
    let mut n = [0.0; 3];
    let mut nl = [0.0; 3];
    for i in 0..3 {
        let (j, k) = ((i + 1) % 3, (i + 2) % 3);
        let (p, pe) = P::two_prod(u[j], v[k]);
        let (q, qe) = P::two_prod(u[k], v[j]);
        let (h, e) = two_diff(p, q);
        n[i] = h;
        nl[i] = e + ((pe - qe) + ((ul[j] * v[k] + u[j] * vl[k]) - (ul[k] * v[j] + u[k] * vl[j])));
    }
    // d = a · n, as a value and its rest.
    let (p0, e0) = P::two_prod(a[0], n[0]);
    let (p1, e1) = P::two_prod(a[1], n[1]);
    let (p2, e2) = P::two_prod(a[2], n[2]);
    let (s, f0) = two_sum(p0, p1);
    let (s, f1) = two_sum(s, p2);
    let rest = (f0 + f1)
        + ((e0 + e1) + e2)
        + ((a[0] * nl[0] + a[1] * nl[1] + a[2] * nl[2])
            + (al[0] * n[0] + al[1] * n[1] + al[2] * n[2]));
    let (d, dl) = two_sum(s, rest);
    let mut out = [0.0; TERMS];
    out[0] = d;
    let mut s = [0.0; 3];
    for i in 0..3 {
        s[i] = a[i] + b[i] + c[i];
        out[1 + i] = d * s[i];
    }
    let second = [(0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)];
    for k in 0..6 {
        let (i, j) = second[k];
        out[4 + k] = d * ((a[i] * a[j] + b[i] * b[j]) + (c[i] * c[j] + s[i] * s[j]));
    }
    // The area vector rounded once: of a long thin facet the first part alone is off by far more.
    let w = [n[0] + nl[0], n[1] + nl[1], n[2] + nl[2]];
    out[10] = (w[0] * w[0] + w[1] * w[1] + w[2] * w[2]).sqrt();
    out[VOLUME_LOW] = dl;
    out[ABSOLUTE] = (d - (m[0] * w[0] + m[1] * w[1] + m[2] * w[2])).abs();
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::LooseFacets;

    /// Corner tetrahedron with legs 5, 4, 3 on x, y, z (exact in rationals: V 10, centroid
    /// (5/4, 1, 3/4), Ixx 75/8, Iyy 51/4, Izz 123/8, tensor xy +5/2, xz +15/8, yz +3/2).
    fn corner_tetrahedron(at: [f64; 3]) -> Vec<[[f64; 3]; 3]> {
        let p = [[0.0; 3], [5.0, 0.0, 0.0], [0.0, 4.0, 0.0], [0.0, 0.0, 3.0]]
            .map(|q| [q[0] + at[0], q[1] + at[1], q[2] + at[2]]);
        [[0, 2, 1], [0, 1, 3], [1, 2, 3], [0, 3, 2]]
            .iter()
            .map(|f| f.map(|i| p[i]))
            .collect()
    }

    #[test]
    fn the_corner_tetrahedron_has_its_closed_form_also_far_away() {
        for at in [[0.0; 3], [1e6, -2e6, 5e6]] {
            let facets = corner_tetrahedron(at);
            let r = integrate(&LooseFacets(&facets), Select::All, at, at);
            let i = r.moments.inertia().unwrap();
            assert_eq!(r.moments.zeroth, 10.0);
            assert_eq!(r.area * 2.0, 12.0 + 15.0 + 20.0 + 769f64.sqrt());
            for (got, want) in [
                (i[(0, 0)], 75.0 / 8.0 * 10.0 / 10.0),
                (i[(1, 1)], 51.0 / 4.0),
                (i[(2, 2)], 123.0 / 8.0),
                (i[(0, 1)], 2.5),
                (i[(0, 2)], 1.875),
                (i[(1, 2)], 1.5),
            ] {
                // A handful of roundings, none of which cancel by more than a factor of ten.
                assert!((got - want).abs() < 1e-13, "{got} {want}");
            }
        }
    }

    #[test]
    fn all_kernels_give_the_same_bits() {
        let mut x = 0x9e37_79b9_7f4a_7c15u64;
        let mut next = || {
            x ^= x << 13;
            x ^= x >> 7;
            x ^= x << 17;
            (x >> 11) as f64 / (1u64 << 53) as f64 - 0.5
        };
        let facets: Vec<[[f64; 3]; 3]> = (0..1003)
            .map(|_| [(); 3].map(|()| [(); 3].map(|()| next())))
            .collect();
        let f = LooseFacets(&facets);
        let (apex, middle) = (facets[0][0], [0.01, 0.02, 0.03]);
        let plain = kernel::<_, Split>(&f, Select::All, 0..1003, apex, middle).finish(apex);
        let fused = kernel::<_, Fused>(&f, Select::All, 0..1003, apex, middle).finish(apex);
        let chosen = chunk_sums(&f, Select::All, 0..1003, apex, middle).finish(apex);
        assert_eq!(plain, fused);
        assert_eq!(plain, chosen);
    }
}
