//! Exact rational arithmetic, for the rare questions that floating-point filters leave open.

use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{Signed, Zero};

use super::{Corners, Point, Position, Select};

/// The exact value of a finite f64.
fn exact(x: f64) -> BigRational {
    BigRational::from_float(x).unwrap_or_else(BigRational::zero)
}

/// The sign of the exact signed volume of the chosen triangles: +1 where they face outward, −1
/// inward, 0 where the volume is exactly zero. Slow (microseconds a triangle); for shells whose
/// float volume lies within its own error bound.
pub fn exact_volume_sign(facets: &impl Corners, select: Select<'_>) -> i8 {
    let n = select.len(facets.count());
    if n == 0 {
        return 0;
    }
    // Integers of a common power of two are far cheaper than fractions that are kept reduced.
    let smallest = (0..n)
        .flat_map(|i| facets.triangle(select.get(i)).into_iter().flatten())
        .filter(|x| *x != 0.0)
        .map(lowest_bit)
        .min()
        .unwrap_or(0);
    let whole = |x: f64| -> BigInt {
        let (m, e) = mantissa(x);
        if m == 0 {
            BigInt::zero()
        } else {
            BigInt::from(m) << (e - smallest) as usize
        }
    };
    let mut total = BigInt::zero();
    for i in 0..n {
        let [a, b, c] = facets.triangle(select.get(i)).map(|p| p.map(whole));
        total += &a[0] * (&b[1] * &c[2] - &b[2] * &c[1])
            + &a[1] * (&b[2] * &c[0] - &b[0] * &c[2])
            + &a[2] * (&b[0] * &c[1] - &b[1] * &c[0]);
    }
    i8::from(total.is_positive()) - i8::from(total.is_negative())
}

/// x = mantissa · 2^exponent.
fn mantissa(x: f64) -> (i64, i32) {
    let bits = x.to_bits();
    let exponent = ((bits >> 52) & 0x7ff) as i32;
    let fraction = (bits & ((1 << 52) - 1)) as i64;
    let (m, e) = match exponent {
        0 => (fraction, -1074),
        e => (fraction | 1 << 52, e - 1075),
    };
    (if x < 0.0 { -m } else { m }, e)
}

/// The exponent of the lowest set bit of a non-zero x, or a lower bound of it.
fn lowest_bit(x: f64) -> i32 {
    mantissa(x).1
}

/// A point with exact coordinates, such as the middle of a facet.
#[derive(Clone, Debug)]
pub struct RationalPoint([BigRational; 3]);

impl RationalPoint {
    /// The centroid of a triangle.
    pub fn middle(t: &[Point; 3]) -> Self {
        let third = BigRational::new(1.into(), 3.into());
        Self([0, 1, 2].map(|k| (exact(t[0][k]) + exact(t[1][k]) + exact(t[2][k])) * &third))
    }

    /// As [`ray_crossing`](super::ray_crossing), from this point.
    pub fn ray_crossing(&self, t: &[Point; 3]) -> Position {
        let [a, b, c] = t.map(|p| p.map(exact));
        let p = &self.0;
        let turn = |a: &[BigRational; 3], b: &[BigRational; 3]| {
            let s = (&b[1] - &a[1]) * (&p[2] - &a[2]) - (&b[2] - &a[2]) * (&p[1] - &a[1]);
            let s = signum(&s);
            // The same infinitesimal move of p as in the floating-point predicate.
            let moved = match (s, signum(&(&a[2] - &b[2])), signum(&(&b[1] - &a[1]))) {
                (0, 0, last) => last,
                (0, first, _) => first,
                (s, ..) => s,
            };
            (s, moved)
        };
        let turns = [turn(&a, &b), turn(&b, &c), turn(&c, &a)];
        let side = {
            let sub = |q: &[BigRational; 3]| [&q[0] - &a[0], &q[1] - &a[1], &q[2] - &a[2]];
            let (u, v, w) = (sub(&b), sub(&c), sub(p));
            signum(
                &(&w[0] * (&u[1] * &v[2] - &u[2] * &v[1])
                    + &w[1] * (&u[2] * &v[0] - &u[0] * &v[2])
                    + &w[2] * (&u[0] * &v[1] - &u[1] * &v[0])),
            )
        };
        let closed = turns.iter().all(|t| t.0 >= 0) || turns.iter().all(|t| t.0 <= 0);
        if side == 0 && closed && turns.iter().any(|t| t.0 != 0) {
            return Position::On;
        }
        let s = turns[0].1;
        if s == 0 || turns.iter().any(|t| t.1 != s) || side == s || side == 0 {
            return Position::Misses;
        }
        Position::Crosses(s)
    }
}

fn signum(x: &BigRational) -> i8 {
    i8::from(x.is_positive()) - i8::from(x.is_negative())
}

#[cfg(test)]
mod tests {
    use super::super::{LooseFacets, ray_crossing};
    use super::*;
    use proptest::prelude::*;

    fn small() -> impl Strategy<Value = Point> {
        // Few distinct values, so that grazing and coplanar cases are common.
        [-2i8..=2, -2i8..=2, -2i8..=2].prop_map(|p| p.map(f64::from))
    }

    #[test]
    fn the_sign_of_a_sliver_of_volume_is_found() {
        let e = f64::MIN_POSITIVE;
        let t = [[0.0; 3], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, e]];
        let facets = [
            [t[0], t[2], t[1]],
            [t[0], t[1], t[3]],
            [t[1], t[2], t[3]],
            [t[0], t[3], t[2]],
        ];
        assert_eq!(exact_volume_sign(&LooseFacets(&facets), Select::All), 1);
        let turned = facets.map(|[a, b, c]| [a, c, b]);
        assert_eq!(exact_volume_sign(&LooseFacets(&turned), Select::All), -1);
        let both: Vec<_> = facets.iter().chain(&turned).copied().collect();
        assert_eq!(exact_volume_sign(&LooseFacets(&both), Select::All), 0);
    }

    proptest! {
        #[test]
        fn the_rational_ray_agrees_with_the_filtered_one(a in small(), b in small(), c in small()) {
            // The centroid of (0,0,0), (3,0,0), (0,3,0) style triangles is a float point too.
            let mid = RationalPoint::middle(&[[0.0; 3], [3.0, 0.0, 3.0], [0.0, 3.0, 0.0]]);
            let p = [1.0, 1.0, 1.0];
            let exact = mid.ray_crossing(&[a, b, c]);
            let fast = ray_crossing(&p, &[a, b, c]);
            // Segments that hold the point are `On` only for the filtered one.
            if fast != Position::On || exact == Position::On {
                prop_assert_eq!(exact, fast);
            }
        }
    }
}
