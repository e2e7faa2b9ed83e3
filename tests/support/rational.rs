//! Moments of a closed triangle surface by exact arithmetic: integers for the sums, rationals for
//! what is derived of them.

use bismar::mesh::Triangles;
use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{Signed, ToPrimitive, Zero};

/// A triangle in the units of its file.
type Tri = [[f64; 3]; 3];

/// Corners of all triangles, as the reader gave them.
pub(crate) fn coordinates(triangles: &Triangles) -> Vec<Tri> {
    match triangles {
        Triangles::Loose(list) => list.clone(),
        Triangles::Indexed { vertices, corners } => corners
            .iter()
            .map(|c| c.map(|i| vertices[i as usize]))
            .collect(),
        Triangles::Records(r) => (0..r.count)
            .map(|i| {
                let at = 84 + 50 * i + 12;
                let single = |k: usize| {
                    let b = &r.bytes[at + 4 * k..at + 4 * k + 4];
                    f64::from(f32::from_le_bytes([b[0], b[1], b[2], b[3]]))
                };
                [0, 1, 2].map(|c| [0, 1, 2].map(|k| single(3 * c + k)))
            })
            .collect(),
    }
}

/// Exact sums over a surface.
pub(crate) struct Exact {
    volume: BigRational,
    centroid: [BigRational; 3],
    /// About the centroid.
    inertia: [[BigRational; 3]; 3],
    absolute: BigRational,
}

/// (mantissa, exponent) with x = mantissa·2^exponent.
fn parts(x: f64) -> (i64, i32) {
    if x == 0.0 {
        return (0, 0);
    }
    let bits = x.to_bits();
    let field = ((bits >> 52) & 0x7ff) as i32;
    let low = (bits & ((1 << 52) - 1)) as i64;
    let (m, e) = if field == 0 {
        (low, -1074)
    } else {
        (low | 1 << 52, field - 1075)
    };
    let zeros = m.trailing_zeros();
    (
        (if x < 0.0 { -1 } else { 1 }) * (m >> zeros),
        e + zeros as i32,
    )
}

fn power(e: i32) -> BigRational {
    let p = BigRational::from_integer(BigInt::from(1) << e.unsigned_abs() as usize);
    if e < 0 { p.recip() } else { p }
}

fn rational(x: f64) -> BigRational {
    let (m, e) = parts(x);
    BigRational::from_integer(m.into()) * power(e)
}

fn size(x: &BigRational) -> f64 {
    x.abs().to_f64().unwrap_or(f64::INFINITY)
}

impl Exact {
    /// Sums over the triangles, about the origin of the file; nothing is lost there.
    pub(crate) fn of(triangles: &[Tri]) -> Self {
        let flat = || triangles.iter().flatten().flatten();
        // One less, so that the middle of the box is a whole number too.
        let unit = flat()
            .filter(|x| **x != 0.0)
            .map(|x| parts(*x).1)
            .min()
            .unwrap_or(0)
            - 1;
        let whole = |x: f64| {
            let (m, e) = parts(x);
            if m == 0 {
                BigInt::zero()
            } else {
                BigInt::from(m) << (e - unit) as usize
            }
        };
        let middle: [BigInt; 3] = std::array::from_fn(|k| {
            let of = || triangles.iter().flatten().map(|p| p[k]);
            let (lo, hi) = (
                of().fold(f64::INFINITY, f64::min),
                of().fold(f64::NEG_INFINITY, f64::max),
            );
            (whole(lo) + whole(hi)) / 2
        });
        let mut v = BigInt::zero();
        let mut absolute = BigInt::zero();
        let mut first: [BigInt; 3] = Default::default();
        let mut second: [[BigInt; 3]; 3] = Default::default();
        for t in triangles {
            let p: [[BigInt; 3]; 3] = t.map(|c| c.map(whole));
            let d = det(&p);
            absolute +=
                det(&[0, 1, 2].map(|c: usize| std::array::from_fn(|k| &p[c][k] - &middle[k])))
                    .abs();
            let s: [BigInt; 3] = std::array::from_fn(|k| &p[0][k] + &p[1][k] + &p[2][k]);
            for i in 0..3 {
                first[i] += &d * &s[i];
                for j in i..3 {
                    let sum: BigInt =
                        p.iter().map(|c| &c[i] * &c[j]).sum::<BigInt>() + &s[i] * &s[j];
                    second[i][j] += &d * sum;
                }
            }
            v += d;
        }
        let scaled = |n: &BigInt, by: i64, times: i32| {
            BigRational::new(n.clone(), by.into()) * power(unit * times)
        };
        let volume = scaled(&v, 6, 3);
        let centroid: [BigRational; 3] =
            std::array::from_fn(|i| scaled(&first[i], 24, 4) / &volume);
        let central: [[BigRational; 3]; 3] = std::array::from_fn(|i| {
            std::array::from_fn(|j| {
                scaled(&second[i.min(j)][i.max(j)], 120, 5) - &volume * &centroid[i] * &centroid[j]
            })
        });
        let trace = &central[0][0] + &central[1][1] + &central[2][2];
        let inertia = std::array::from_fn(|i| {
            std::array::from_fn(|j| {
                if i == j {
                    &trace - &central[i][j]
                } else {
                    -central[i][j].clone()
                }
            })
        });
        Self {
            volume,
            centroid,
            inertia,
            absolute: scaled(&absolute, 6, 3),
        }
    }

    /// V, to a rounding.
    pub(crate) fn volume(&self) -> f64 {
        self.volume.to_f64().unwrap_or(f64::NAN)
    }

    /// K about the exact middle of the box.
    pub(crate) fn absolute(&self) -> f64 {
        size(&self.absolute)
    }

    /// How far a volume is off.
    pub(crate) fn volume_error(&self, got: f64) -> f64 {
        size(&(rational(got) - &self.volume))
    }

    /// How far each coordinate of a centroid is off.
    pub(crate) fn centroid_error(&self, got: [f64; 3]) -> [f64; 3] {
        std::array::from_fn(|k| size(&(rational(got[k]) - &self.centroid[k])))
    }

    /// The largest error of an element of the tensor about the centroid, and its Frobenius norm.
    pub(crate) fn inertia_error(&self, got: &[[f64; 3]; 3]) -> (f64, f64) {
        let (mut worst, mut norm) = (0.0_f64, 0.0);
        for (row, want) in got.iter().zip(&self.inertia) {
            for (x, w) in row.iter().zip(want) {
                worst = worst.max(size(&(rational(*x) - w)));
                norm += size(w).powi(2);
            }
        }
        (worst, norm.sqrt())
    }
}

fn det(p: &[[BigInt; 3]; 3]) -> BigInt {
    let [a, b, c] = p;
    &a[0] * (&b[1] * &c[2] - &b[2] * &c[1])
        + &a[1] * (&b[2] * &c[0] - &b[0] * &c[2])
        + &a[2] * (&b[0] * &c[1] - &b[1] * &c[0])
}
