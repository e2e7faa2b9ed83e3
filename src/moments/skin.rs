//! Integrals over a surface itself: area, centre of the surface, second moments of the skin.
//!
//! For a triangle with corners a, b, c, s = a+b+c and area A (as for the solid, from the apex):
//!
//! ```text
//! ∫ 1 = A     ∫ x = A·s/3     ∫ x xᵀ = A·(aaᵀ + bbᵀ + ccᵀ + ssᵀ)/12
//! ```
//!
//! (the exact quadrature of a quadratic over a triangle; textbook result). No closedness is needed.
//! Nothing here cancels but the sums, which are compensated in fixed chunks as the solid's are.

use nalgebra::{Matrix3, Vector3};
use rayon::prelude::*;

use super::{CHUNK, Moments};
use crate::geometry::eft::Sum;
use crate::geometry::{Corners, Select};

/// Moments of area of the chosen triangles about `apex`, in the file's unit: area, first and
/// second moment of the skin. Times a thickness and a density they are those of thin sheet.
pub fn integrate_skin(facets: &impl Corners, select: Select<'_>, apex: [f64; 3]) -> Moments {
    let n = select.len(facets.count());
    let about = Vector3::from(apex);
    let chunk = |k: usize| {
        let mut sums = [Sum::ZERO; 10];
        for i in k * CHUNK..n.min((k + 1) * CHUNK) {
            let [a, b, c] = facets
                .triangle(select.get(i))
                .map(|p| Vector3::from(p) - about);
            let area = (b - a).cross(&(c - a)).norm() / 2.0;
            let s = a + b + c;
            let second =
                a * a.transpose() + b * b.transpose() + c * c.transpose() + s * s.transpose();
            let terms = [
                1.0,
                s.x / 3.0,
                s.y / 3.0,
                s.z / 3.0,
                second[(0, 0)] / 12.0,
                second[(1, 1)] / 12.0,
                second[(2, 2)] / 12.0,
                second[(0, 1)] / 12.0,
                second[(0, 2)] / 12.0,
                second[(1, 2)] / 12.0,
            ];
            for (sum, term) in sums.iter_mut().zip(terms) {
                sum.add(area * term);
            }
        }
        sums
    };
    let parts: Vec<[Sum; 10]> = (0..n.div_ceil(CHUNK)).into_par_iter().map(chunk).collect();
    let mut total = [Sum::ZERO; 10];
    for part in &parts {
        for (sum, more) in total.iter_mut().zip(part) {
            sum.join(*more);
        }
    }
    let v = total.map(Sum::value);
    Moments {
        about,
        zeroth: v[0],
        first: Vector3::new(v[1], v[2], v[3]),
        second: Matrix3::new(v[4], v[7], v[8], v[7], v[5], v[9], v[8], v[9], v[6]),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::LooseFacets;

    #[test]
    fn a_square_plate_has_its_closed_form() {
        // Side 2 in the plane z = 1, far from the origin: area 4, inertia about the centre
        // 4·(2²)/12 in the plane's axes and twice that across it (textbook).
        let at = 1e5;
        let p = |x: f64, y: f64| [at + x, at + y, at + 1.0];
        let square = [
            [p(0.0, 0.0), p(2.0, 0.0), p(2.0, 2.0)],
            [p(0.0, 0.0), p(2.0, 2.0), p(0.0, 2.0)],
        ];
        let m = integrate_skin(&LooseFacets(&square), Select::All, square[0][0]);
        assert_eq!(m.zeroth, 4.0);
        assert_eq!(
            m.centre().unwrap(),
            Vector3::new(at + 1.0, at + 1.0, at + 1.0)
        );
        let i = m.inertia().unwrap();
        for (got, want) in [
            (i[(0, 0)], 4.0 / 3.0),
            (i[(1, 1)], 4.0 / 3.0),
            (i[(2, 2)], 8.0 / 3.0),
        ] {
            // A few roundings of numbers of about ten.
            assert!((got - want).abs() < 1e-14, "{got} {want}");
        }
    }

    #[test]
    fn a_fine_sphere_tends_to_the_thin_shell() {
        // 2mR²/3 for a thin spherical shell (textbook); facets fall short of it by O(h²).
        let error = |n: usize| {
            let mut facets = Vec::new();
            let p = |i: usize, j: usize| {
                let (t, f) = (
                    std::f64::consts::PI * i as f64 / n as f64,
                    std::f64::consts::TAU * (j % (2 * n)) as f64 / (2 * n) as f64,
                );
                [t.sin() * f.cos(), t.sin() * f.sin(), t.cos()]
            };
            for i in 0..n {
                for j in 0..2 * n {
                    facets.push([p(i, j), p(i + 1, j), p(i + 1, j + 1)]);
                    facets.push([p(i, j), p(i + 1, j + 1), p(i, j + 1)]);
                }
            }
            let m = integrate_skin(&LooseFacets(&facets), Select::All, [0.0; 3]);
            1.0 - m.inertia().unwrap()[(2, 2)] / m.zeroth / (2.0 / 3.0)
        };
        let ratio = error(16) / error(32);
        assert!((3.9..4.1).contains(&ratio), "{ratio}");
    }
}
