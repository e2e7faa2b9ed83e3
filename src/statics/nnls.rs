//! Least squares with unknowns that are not negative, and least distance under inequalities.

use nalgebra::{DMatrix, DVector};

/// Least squares by singular values; parts below 1e-12 of the largest count as zero.
pub(crate) fn least_squares(a: &DMatrix<f64>, b: &DVector<f64>) -> DVector<f64> {
    let svd = a.clone().svd(true, true);
    let least = svd.singular_values.iter().fold(0.0_f64, |m, s| m.max(*s)) * 1e-12;
    // Both factors were asked for, so this cannot fail; zeros are a valid, if poor, answer.
    svd.solve(b, least)
        .unwrap_or_else(|_| DVector::zeros(a.ncols()))
}

/// min ‖E·u − f‖ over u ≥ 0: Lawson & Hanson, Solving Least Squares Problems (1974), algorithm
/// NNLS of chapter 23.
///
/// It ends: each outer round lowers the residual strictly, and the residual is fixed by the set of
/// unknowns that are free, of which there are finitely many, so no set comes twice. A round whose
/// gain drowns in rounding ends it too.
fn nnls(e: &DMatrix<f64>, f: &DVector<f64>) -> DVector<f64> {
    let n = e.ncols();
    let mut u = DVector::zeros(n);
    let mut free = vec![false; n];
    let scale = e.amax() * f.amax().max(f64::MIN_POSITIVE);
    let mut residual = f.norm();
    loop {
        let w = e.transpose() * (f - e * &u);
        let candidate = (0..n)
            .filter(|&j| !free[j] && w[j] > 1e-14 * scale)
            .max_by(|&a, &b| w[a].total_cmp(&w[b]).then(b.cmp(&a)));
        let Some(t) = candidate else { return u };
        let before = (u.clone(), free.clone());
        free[t] = true;
        loop {
            let set: Vec<usize> = (0..n).filter(|&j| free[j]).collect();
            let s = least_squares(&e.select_columns(&set), f);
            if s.iter().all(|x| *x > 0.0) {
                u.fill(0.0);
                for (k, &j) in set.iter().enumerate() {
                    u[j] = s[k];
                }
                break;
            }
            let mut step = 1.0_f64;
            for (k, &j) in set.iter().enumerate() {
                if s[k] <= 0.0 {
                    step = step.min(u[j] / (u[j] - s[k]));
                }
            }
            let step = if step.is_finite() { step } else { 0.0 };
            let mut dropped = false;
            for (k, &j) in set.iter().enumerate() {
                u[j] += step * (s[k] - u[j]);
                if s[k] <= 0.0 && u[j] <= 1e-15 * scale.max(1.0) {
                    u[j] = 0.0;
                    free[j] = false;
                    dropped = true;
                }
            }
            if !dropped {
                // Rounding kept the blocking unknown above zero by a hair: the least goes.
                let least = set
                    .iter()
                    .enumerate()
                    .filter(|(k, _)| s[*k] <= 0.0)
                    .min_by(|a, b| u[*a.1].total_cmp(&u[*b.1]))
                    .map(|(_, &j)| j);
                if let Some(j) = least {
                    u[j] = 0.0;
                    free[j] = false;
                }
            }
        }
        let now = (e * &u - f).norm();
        if now >= residual {
            return before.0;
        }
        residual = now;
    }
}

/// The x ≥ 0 of least norm with A·x = b, or `None` where there is none: the forces of equal
/// one-sided springs. By the least-distance method of Lawson & Hanson (1974), chapter 23: with the
/// two-sided answer x₀ and an orthonormal basis N of the null space, x = x₀ + N·z and N·z ≥ −x₀.
pub(super) fn least_norm(a: &DMatrix<f64>, b: &DVector<f64>) -> Option<DVector<f64>> {
    let n = a.ncols();
    let x0 = least_squares(a, b);
    let size = x0.amax();
    if (a * &x0 - b).amax() > 1e-9 * b.amax() {
        return None;
    }
    if x0.iter().all(|x| *x >= -1e-14 * size) {
        return Some(x0.map(|x| x.max(0.0)));
    }
    // Null space: what the projection on the rows leaves of the unit vectors.
    let gram = DMatrix::identity(n, n) - a.clone().pseudo_inverse(1e-12 * a.amax()).ok()? * a;
    let eigen = ((&gram + gram.transpose()) * 0.5).symmetric_eigen();
    let kept: Vec<usize> = (0..n).filter(|&k| eigen.eigenvalues[k] > 0.5).collect();
    if kept.is_empty() {
        return None;
    }
    let basis = eigen.eigenvectors.select_columns(&kept);
    let k = kept.len();
    let e = DMatrix::from_fn(
        k + 1,
        n,
        |r, c| {
            if r < k { basis[(c, r)] } else { -x0[c] / size }
        },
    );
    let mut f = DVector::zeros(k + 1);
    f[k] = 1.0;
    let u = nnls(&e, &f);
    let r = &e * u - f;
    if r.norm() <= 1e-10 {
        return None;
    }
    let z = DVector::from_fn(k, |j, _| -r[j] / r[k] * size);
    let rough = &x0 + basis * z;
    // Solved once more on the springs that carry, so that no digit of the detour is left.
    let free: Vec<usize> = (0..n).filter(|&i| rough[i] > 1e-9 * size).collect();
    let exact = least_squares(&a.select_columns(&free), b);
    let mut x = DVector::zeros(n);
    for (k, &i) in free.iter().enumerate() {
        x[i] = exact[k].max(0.0);
    }
    ((a * &x - b).amax() <= 1e-9 * b.amax()).then_some(x)
}
