//! Principal moments and axes of an inertia tensor, by one rule, so that two runs agree.

use nalgebra::{Matrix3, SymmetricEigen, Vector3};

/// Principal moments and the axes that go with them.
#[derive(Clone, Debug, PartialEq)]
pub struct Principal {
    /// Ascending; in the unit of the tensor.
    pub moments: [f64; 3],
    /// Rows are unit vectors, right-handed: in each of the first two the largest component is
    /// positive (the first on ties), the third is their cross product.
    pub axes: [[f64; 3]; 3],
    /// Indices (from 0, ascending) of moments within 1e-9 of another, relative to the largest:
    /// their axes may be any in the plane or space that they span, and a canonical choice is given.
    pub free: Vec<usize>,
}

/// Moments closer than this, relative to the largest, leave their axes free.
const SAME: f64 = 1e-9;

/// Diagonalises a symmetric tensor.
pub fn principal(tensor: &Matrix3<f64>) -> Principal {
    let largest = tensor.iter().fold(0.0_f64, |a, x| a.max(x.abs()));
    if largest == 0.0 || !largest.is_finite() {
        let moment = if largest == 0.0 { 0.0 } else { f64::NAN };
        return Principal {
            moments: [moment; 3],
            axes: rows([Vector3::x(), Vector3::y(), Vector3::z()]),
            free: vec![0, 1, 2],
        };
    }
    let scaled = tensor / largest;
    let off = scaled[(0, 1)].abs() + scaled[(0, 2)].abs() + scaled[(1, 2)].abs();
    let mut pairs: Vec<(f64, Vector3<f64>)> = if off == 0.0 {
        // Already diagonal: nothing is gained by rounding.
        let unit = [Vector3::x(), Vector3::y(), Vector3::z()];
        (0..3).map(|n| (scaled[(n, n)], unit[n])).collect()
    } else {
        let eigen = SymmetricEigen::new(scaled);
        let vectors = eigen.eigenvectors;
        (0..3)
            .map(|n| (eigen.eigenvalues[n], vectors.column(n).into_owned()))
            .collect()
    };
    pairs.sort_by(|a, b| a.0.total_cmp(&b.0));
    let values = [pairs[0].0, pairs[1].0, pairs[2].0];
    let span = SAME * values[0].abs().max(values[2].abs());
    let low = values[1] - values[0] <= span;
    let high = values[2] - values[1] <= span;
    let (first, second) = match (low, high) {
        (true, true) => (Vector3::x(), Vector3::y()),
        (true, false) => {
            let first = in_plane(&pairs[2].1);
            (first, oriented(pairs[2].1.cross(&first)))
        }
        (false, true) => {
            let first = oriented(pairs[0].1);
            (first, in_plane(&first))
        }
        (false, false) => (oriented(pairs[0].1), oriented(pairs[1].1)),
    };
    let free = match (low, high) {
        (true, true) => vec![0, 1, 2],
        (true, false) => vec![0, 1],
        (false, true) => vec![1, 2],
        (false, false) => Vec::new(),
    };
    let first = first.normalize();
    let second = (second - first * first.dot(&second)).normalize();
    Principal {
        moments: values.map(|v| v * largest),
        axes: rows([first, second, first.cross(&second)]),
        free,
    }
}

/// The unit vector in the plane with this normal that is nearest to a coordinate axis, the first
/// such axis on ties.
fn in_plane(normal: &Vector3<f64>) -> Vector3<f64> {
    let n = normal.normalize();
    let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
    let [x, y, z] = axes.map(|a: Vector3<f64>| a - n * n.dot(&a));
    let mut best = x;
    for candidate in [y, z] {
        if candidate.norm() > best.norm() * (1.0 + SAME) {
            best = candidate;
        }
    }
    oriented(best.normalize())
}

/// The vector or its opposite, so that its largest component is positive. Components within a
/// billionth count as tied: which of them rounding made larger means nothing.
fn oriented(v: Vector3<f64>) -> Vector3<f64> {
    let largest = v.amax();
    let lead = v.iter().find(|x| x.abs() >= largest * (1.0 - SAME));
    if lead.is_some_and(|x| *x < 0.0) {
        -v
    } else {
        v
    }
}

fn rows(axes: [Vector3<f64>; 3]) -> [[f64; 3]; 3] {
    // −0 is written as 0.
    axes.map(|a| [a.x + 0.0, a.y + 0.0, a.z + 0.0])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn diagonal_in_any_order() {
        let p = principal(&Matrix3::from_diagonal(&Vector3::new(3.0, 1.0, 2.0)));
        assert_eq!(p.moments, [1.0, 2.0, 3.0]);
        assert_eq!(p.axes, [[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [1.0, 0.0, 0.0]]);
        assert!(p.free.is_empty());
    }

    #[test]
    fn signs_at_ties_and_handedness() {
        // Eigenvectors (1,−1,0)/√2 and (1,1,0)/√2, by hand.
        let p = principal(&Matrix3::new(2.0, 1.0, 0.0, 1.0, 2.0, 0.0, 0.0, 0.0, 5.0));
        let h = 0.5_f64.sqrt();
        let wanted = [[h, -h, 0.0], [h, h, 0.0], [0.0, 0.0, 1.0]];
        for (row, wanted) in p.axes.iter().zip(&wanted) {
            for (a, b) in row.iter().zip(wanted) {
                assert!((a - b).abs() < 1e-15, "{:?}", p.axes);
            }
        }
    }

    #[test]
    fn free_planes_are_canonical() {
        let p = principal(&Matrix3::from_diagonal(&Vector3::new(2.0, 2.0, 1.0)));
        assert_eq!(p.free, [1, 2]);
        assert_eq!(p.axes, [[0.0, 0.0, 1.0], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]]);
        let p = principal(&Matrix3::identity());
        assert_eq!((p.free.len(), p.axes[0]), (3, [1.0, 0.0, 0.0]));
        let p = principal(&Matrix3::zeros());
        assert_eq!((p.free.len(), p.moments), (3, [0.0; 3]));
    }

    proptest::proptest! {
        #[test]
        fn rebuilds_the_tensor(v in proptest::array::uniform6(-1.0_f64..1.0)) {
            let [a, b, c, d, e, f] = v;
            let tensor = Matrix3::new(a, d, e, d, b, f, e, f, c);
            let p = principal(&tensor);
            let q = Matrix3::from_fn(|r, c| p.axes[r][c]);
            let back = q.transpose() * Matrix3::from_diagonal(&p.moments.into()) * q;
            // Within a few roundings; free axes may add the 1e-9 that makes them free.
            let allowed = if p.free.is_empty() { 1e-14 } else { 2e-9 };
            assert!((back - tensor).amax() < allowed * 3.0);
            assert!((q.determinant() - 1.0).abs() < 1e-14);
            assert!(p.moments[0] <= p.moments[1] && p.moments[1] <= p.moments[2]);
        }
    }
}
