//! Integration over tetrahedra by product rules.

use nalgebra::Vector3;

/// Gauss–Legendre points on (0, 1) with their weights.
#[derive(Clone, Debug)]
pub struct Rule {
    points: Vec<(f64, f64)>,
}

impl Rule {
    /// With `n` points a direction. On a tetrahedron it is exact for polynomials of degree 2n − 3
    /// (two degrees go to the collapse of a cube into the tetrahedron).
    pub fn new(n: usize) -> Self {
        // Newton on the Legendre polynomial from the usual first guess (textbook).
        let points = (0..n).map(|k| {
            let mut x = (std::f64::consts::PI * (k as f64 + 0.75) / (n as f64 + 0.5)).cos();
            let mut slope = 1.0;
            for _ in 0..20 {
                let (mut p, mut before) = (1.0, 0.0);
                for j in 0..n {
                    let j = j as f64;
                    (p, before) = (((2.0 * j + 1.0) * x * p - j * before) / (j + 1.0), p);
                }
                slope = n as f64 * (x * p - before) / (x * x - 1.0);
                let step = p / slope;
                x -= step;
                if step.abs() < 1e-16 {
                    break;
                }
            }
            ((1.0 - x) / 2.0, 1.0 / ((1.0 - x * x) * slope * slope))
        });
        Self {
            points: points.collect(),
        }
    }

    /// The points and weights on (0, 1).
    pub fn points(&self) -> &[(f64, f64)] {
        &self.points
    }
}

/// Hands each point of the tetrahedron over `corners` from `apex` to `at`, with its share of the
/// signed volume: positive where the corners run counter-clockwise seen from outside.
pub fn tetrahedron(
    rule: &Rule,
    apex: &Vector3<f64>,
    corners: &[Vector3<f64>; 3],
    at: &mut impl FnMut(Vector3<f64>, f64),
) {
    let [a, b, c] = corners.map(|p| p - apex);
    let six = a.dot(&(b - a).cross(&(c - a)));
    if six == 0.0 {
        return;
    }
    for &(u, wu) in &rule.points {
        for &(v, wv) in &rule.points {
            for &(w, ww) in &rule.points {
                // The cube collapsed into the tetrahedron: u from the apex, v and w on the section.
                let x = (a + ((b - a) + (c - b) * w) * v) * u;
                at(apex + x, six * wu * wv * ww * u * u * v);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_rule_is_exact_to_its_degree_and_no_further() {
        // ∫ over the corner tetrahedron of x^i y^j z^k = i!j!k!/(i+j+k+3)! (textbook).
        let factorial = |n: u32| f64::from((1..=n).product::<u32>().max(1));
        let corners = [Vector3::x(), Vector3::y(), Vector3::z()];
        let off = |n: usize, e: [u32; 3]| {
            let mut sum = 0.0;
            tetrahedron(&Rule::new(n), &Vector3::zeros(), &corners, &mut |p, w| {
                sum += w * p.x.powi(e[0] as i32) * p.y.powi(e[1] as i32) * p.z.powi(e[2] as i32);
            });
            let want = factorial(e[0]) * factorial(e[1]) * factorial(e[2])
                / factorial(e.iter().sum::<u32>() + 3);
            (sum - want).abs() / want
        };
        for e in [[0, 0, 0], [1, 2, 2], [5, 0, 0], [0, 0, 5], [0, 4, 1]] {
            assert!(off(4, e) < 1e-14, "{e:?}: {}", off(4, e));
        }
        assert!(off(4, [0, 6, 0]) > 1e-8 || off(4, [6, 0, 0]) > 1e-8);
        for e in [[9, 0, 0], [0, 9, 0], [0, 0, 9], [3, 3, 3]] {
            assert!(off(8, e) < 1e-13, "{e:?}: {}", off(8, e));
        }
        let weights: f64 = Rule::new(8).points().iter().map(|p| p.1).sum();
        assert!((weights - 1.0).abs() < 1e-15);
    }
}
