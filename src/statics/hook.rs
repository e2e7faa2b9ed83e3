//! Where a hook comes to stand over a thing that hangs from it by lines of fixed length.

use nalgebra::{Matrix3, Vector3};

/// A place of the hook that the thing can hang at.
#[derive(Clone, Debug)]
pub(super) struct Hung {
    /// Where the hook is, in the thing's frame.
    pub(super) hook: Vector3<f64>,
    /// The lines that carry.
    pub(super) taut: Vec<usize>,
    /// Tension of each line for a weight of 1; 0 where slack.
    pub(super) shares: Vec<f64>,
}

/// All places of the hook at which a thing with its centre at `c` hangs from lines of the given
/// lengths at `at`, at most three of them carrying.
///
/// In the thing's frame the hook stays within each line's length of its end; the thing hangs where
/// its centre lies deepest below the hook, so a place is one where the distance from the centre
/// has a stationary value and every carrying line pulls: H − c = Σ μ·(H − a), μ ≥ 0. One carrying
/// line: H on the ray from the centre through its end. Two: H in the plane of both ends and the
/// centre. Three: H where the drawn lengths meet.
pub(super) fn places(c: &Vector3<f64>, at: &[Vector3<f64>], length: &[f64]) -> Vec<Hung> {
    let n = at.len();
    let size = length.iter().fold(0.0_f64, |m, l| m.max(*l));
    let mut out = Vec::new();
    let mut consider = |hook: Vector3<f64>, taut: &[usize]| {
        let reach = |i: usize| (hook - at[i]).norm() <= length[i] + 1e-9 * size;
        if !hook.iter().all(|x| x.is_finite()) || !(0..n).all(|i| taut.contains(&i) || reach(i)) {
            return;
        }
        if let Some(shares) = pull(&hook, c, at, taut) {
            out.push(Hung {
                hook,
                taut: taut.to_vec(),
                shares,
            });
        }
    };
    for i in 0..n {
        let away = at[i] - c;
        if away.norm() > 0.0 {
            consider(at[i] + away.normalize() * length[i], &[i]);
        }
        for j in i + 1..n {
            for hook in of_two(c, at[i], at[j], length[i], length[j]) {
                consider(hook, &[i, j]);
            }
            for k in j + 1..n {
                for hook in of_three([at[i], at[j], at[k]], [length[i], length[j], length[k]]) {
                    consider(hook, &[i, j, k]);
                }
            }
        }
    }
    out
}

/// Tensions of the taut lines for a weight of 1 with gravity from the hook to the centre, where
/// none of them pushes.
fn pull(
    hook: &Vector3<f64>,
    c: &Vector3<f64>,
    at: &[Vector3<f64>],
    taut: &[usize],
) -> Option<Vec<f64>> {
    let up = hook - c;
    if up.norm() == 0.0 {
        return None;
    }
    let up = up.normalize();
    let a = nalgebra::DMatrix::from_fn(3, taut.len(), |r, k| (hook - at[taut[k]]).normalize()[r]);
    let b = nalgebra::DVector::from_column_slice(up.as_slice());
    let x = super::nnls::least_squares(&a, &b);
    let holds = (&a * &x - b).amax() <= 1e-9 && x.iter().all(|t| *t >= -1e-12);
    let mut shares = vec![0.0; at.len()];
    for (k, &i) in taut.iter().enumerate() {
        shares[i] = x[k].max(0.0);
    }
    holds.then_some(shares)
}

/// The hook where the lines of two ends meet in the plane of both ends and the centre.
fn of_two(
    c: &Vector3<f64>,
    a: Vector3<f64>,
    b: Vector3<f64>,
    la: f64,
    lb: f64,
) -> Vec<Vector3<f64>> {
    let d = (b - a).norm();
    if d == 0.0 {
        return Vec::new();
    }
    let e = (b - a) / d;
    // Foot of the hook on the line of both ends, and its distance from it.
    let x = (d * d + la * la - lb * lb) / (2.0 * d);
    let height = la * la - x * x;
    let out = a - c + e * (c - a).dot(&e);
    if height < 0.0 || out.norm() <= 1e-12 * d {
        return Vec::new();
    }
    let out = out.normalize() * height.sqrt();
    vec![a + e * x + out, a + e * x - out]
}

/// The two hooks at given distances from three ends.
fn of_three(at: [Vector3<f64>; 3], length: [f64; 3]) -> Vec<Vector3<f64>> {
    let (u, v) = (at[1] - at[0], at[2] - at[0]);
    let n = u.cross(&v);
    if n.norm() <= 1e-12 * u.norm() * v.norm() {
        return Vec::new();
    }
    let n = n.normalize();
    let half = |w: &Vector3<f64>, l: f64| (w.norm_squared() + length[0] * length[0] - l * l) / 2.0;
    let rows = Matrix3::from_rows(&[u.transpose(), v.transpose(), n.transpose()]);
    let Some(foot) = rows
        .lu()
        .solve(&Vector3::new(half(&u, length[1]), half(&v, length[2]), 0.0))
    else {
        return Vec::new();
    };
    let height = length[0] * length[0] - foot.norm_squared();
    if height < 0.0 {
        return Vec::new();
    }
    let up = n * height.sqrt();
    vec![at[0] + foot + up, at[0] + foot - up]
}
