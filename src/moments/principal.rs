//! Principal moments and axes of an inertia tensor.

use nalgebra::{Matrix3, Vector3};

/// Moments within this of each other, relative to the largest, count as equal: the axes between
/// them are free.
const EQUAL: f64 = 1e-9;

/// Principal moments in ascending order, with their axes.
#[derive(Clone, Debug, PartialEq)]
pub struct Principal {
    /// The three moments, ascending.
    pub moments: [f64; 3],
    /// The axes as rows, right-handed. In each of the first two the largest component is positive
    /// (the first such on ties); the third is their cross product.
    pub axes: [[f64; 3]; 3],
    /// Indices of the axes that may turn freely among each other, since their moments agree.
    pub free: Vec<usize>,
}

/// Principal moments and axes of a symmetric tensor.
///
/// Where moments agree to 1e-9 their axes are not determined by the body; then the free ones are
/// laid along the coordinate axes as nearly as they go, so that equal bodies give equal rows.
/// A tensor with a NaN or an infinity gives NaN moments and the coordinate axes, all free.
pub fn principal(tensor: &Matrix3<f64>) -> Principal {
    let identity = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]];
    if tensor.iter().any(|x| !x.is_finite()) {
        return Principal {
            moments: [f64::NAN; 3],
            axes: identity,
            free: vec![0, 1, 2],
        };
    }
    let scale = tensor.amax();
    if scale == 0.0 {
        return Principal {
            moments: [0.0; 3],
            axes: identity,
            free: vec![0, 1, 2],
        };
    }
    // Scaled by a power of two so that neither tiny nor huge bodies leave the range of squares.
    let unit = 2f64.powi(-(scale.log2().floor().clamp(-1000.0, 1000.0) as i32));
    let eigen = (tensor * unit).symmetric_eigen();
    let mut order = [0, 1, 2];
    order.sort_by(|&i, &j| eigen.eigenvalues[i].total_cmp(&eigen.eigenvalues[j]));
    let moments = order.map(|i| eigen.eigenvalues[i] / unit);
    let mut axes = order.map(|i| eigen.eigenvectors.column(i).into_owned());

    let equal = |i: usize, j: usize| (moments[j] - moments[i]).abs() <= EQUAL * moments[2].abs();
    let free = match (equal(0, 1), equal(1, 2)) {
        (true, true) => vec![0, 1, 2],
        (true, false) => vec![0, 1],
        (false, true) => vec![1, 2],
        (false, false) => vec![],
    };
    match free.as_slice() {
        [0, 1, 2] => axes = [Vector3::x(), Vector3::y(), Vector3::z()],
        [i, j] => {
            let fixed = axes[3 - i - j];
            let (p, q) = canonical_plane(&fixed);
            axes[*i] = p;
            axes[*j] = q;
        }
        _ => {}
    }
    let first = facing(axes[0]);
    let second = facing((axes[1] - first * first.dot(&axes[1])).normalize());
    let third = first.cross(&second);
    Principal {
        moments,
        axes: [first, second, third].map(|a| [a.x + 0.0, a.y + 0.0, a.z + 0.0]),
        free,
    }
}

/// Two directions that span the plane across `normal`: the first is the coordinate axis that lies
/// nearest in that plane, brought into it.
fn canonical_plane(normal: &Vector3<f64>) -> (Vector3<f64>, Vector3<f64>) {
    let mut best = 0;
    for k in 1..3 {
        // Clearly smaller: rounding must not choose between axes that are equally near.
        if normal[k].abs() < normal[best].abs() - 1e-9 {
            best = k;
        }
    }
    let mut e = Vector3::zeros();
    e[best] = 1.0;
    let p = (e - normal * normal.dot(&e)).normalize();
    (p, normal.cross(&p))
}

/// `axis` or its opposite: the one whose largest component is positive.
fn facing(axis: Vector3<f64>) -> Vector3<f64> {
    let mut largest = 0;
    for k in 1..3 {
        // On ties the first component decides; rounding must not break a tie.
        if axis[k].abs() > axis[largest].abs() * (1.0 + 1e-12) {
            largest = k;
        }
    }
    // Adding zero turns −0 into 0.
    (if axis[largest] < 0.0 { -axis } else { axis }).map(|x| x + 0.0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn the_published_tetrahedron_has_its_principal_moments() {
        // Tonon, J. Math. Stat. 1(1):8–11 (2005 [2004]); principal moments recomputed exactly.
        let t = Matrix3::new(
            43520.33328539,
            -11996.20139323,
            46343.16738139,
            -11996.20139323,
            194711.29259079,
            -4417.66156969,
            46343.16738139,
            -4417.66156969,
            191168.76488608,
        );
        let p = principal(&t);
        for (got, want) in p.moments.iter().zip([29535.43, 191103.65, 208761.31]) {
            // The reference is printed to two decimals.
            assert!((got - want).abs() <= 0.005, "{got} {want}");
        }
        assert!(p.free.is_empty());
    }

    #[test]
    fn equal_moments_leave_axes_free_and_lay_them_along_the_frame() {
        let p = principal(&Matrix3::from_diagonal(&Vector3::new(2.0, 5.0, 2.0)));
        assert_eq!(p.free, [0, 1]);
        assert_eq!(p.moments, [2.0, 2.0, 5.0]);
        assert_eq!(p.axes[0], [1.0, 0.0, 0.0]);
        let cube = principal(&(Matrix3::identity() * 7.0));
        assert_eq!(cube.free, [0, 1, 2]);
        assert_eq!(
            cube.axes,
            [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]]
        );
    }

    proptest! {
        #[test]
        fn axes_rebuild_the_tensor(v in prop::array::uniform6(-1.0..1.0f64), e in -200i32..200) {
            let k = 2f64.powi(e);
            let t = Matrix3::new(v[0], v[3], v[4], v[3], v[1], v[5], v[4], v[5], v[2]) * k;
            let p = principal(&t);
            let q = Matrix3::from_fn(|i, j| p.axes[i][j]);
            let back = q.transpose() * Matrix3::from_diagonal(&Vector3::from(p.moments)) * q;
            // Jacobi/QR eigenvalues are good to a few ulp of the norm; free axes to 1e-9 of it.
            let tolerance = if p.free.is_empty() { 1e-14 } else { 1e-8 };
            prop_assert!((back - t).amax() <= tolerance * t.norm());
            prop_assert!((q.determinant() - 1.0).abs() < 1e-12);
            prop_assert!(p.moments[0] <= p.moments[1] && p.moments[1] <= p.moments[2]);
            for axis in &p.axes[..2] {
                let largest = axis.iter().fold(0.0f64, |m, x| m.max(x.abs()));
                prop_assert!(axis.contains(&largest));
            }
        }
    }
}
