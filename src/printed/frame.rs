//! The frame of a print: third axis up, the others on the bed.

use nalgebra::{Matrix3, Unit, Vector3};

/// Rows are the print's axes in the facets' axes, right-handed, the last one `up`.
///
/// Where `up` is an axis the others are axes too, so that turning into the frame rounds nothing.
pub(super) fn frame(up: &Unit<Vector3<f64>>) -> Matrix3<f64> {
    let w = up.into_inner();
    // The axis least along `up`, the first of equals.
    let mut least = 0;
    for k in 1..3 {
        if w[k].abs() < w[least].abs() {
            least = k;
        }
    }
    let mut e = Vector3::zeros();
    e[least] = 1.0;
    let u = (e - w * w[least]).normalize();
    let v = w.cross(&u);
    Matrix3::from_rows(&[u.transpose(), v.transpose(), w.transpose()])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn frames_are_right_handed_and_exact_for_axes() {
        for up in [
            [0.0, 0.0, 1.0],
            [0.0, 0.0, -1.0],
            [1.0, 0.0, 0.0],
            [0.0, -1.0, 0.0],
            [0.3, -0.2, 0.7],
        ] {
            let up = Unit::new_normalize(Vector3::from(up));
            let f = frame(&up);
            assert!((f.determinant() - 1.0).abs() < 1e-15);
            assert!((f * f.transpose() - Matrix3::identity()).norm() < 1e-15);
            assert_eq!(f.row(2).transpose(), up.into_inner());
            if up.iter().any(|x| x.abs() == 1.0) {
                assert!(f.iter().all(|x| x.abs() == 1.0 || *x == 0.0), "{f}");
            }
        }
    }
}
