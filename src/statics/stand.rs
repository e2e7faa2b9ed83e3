//! Supports and what each of them carries.

use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::hull::hull;
use super::{across, nnls};
use crate::error::{Error, Kind, Result};

/// The most supports of one stand: their triples are gone through one by one.
const MOST: usize = 64;

/// A foot, wheel or scale under the thing.
#[derive(Clone, Debug, PartialEq)]
pub struct Support {
    /// Its name.
    pub name: String,
    /// Where it touches, m.
    pub at: Vector3<f64>,
}

/// Three or more supports that can hold a thing up against gravity.
#[derive(Clone, Debug, PartialEq)]
pub struct Stand {
    supports: Vec<Support>,
    up: Vector3<f64>,
}

/// What one support carries.
#[derive(Clone, Debug, PartialEq)]
pub struct Reaction {
    /// Its name.
    pub support: String,
    /// N, upward. Of three supports exactly, negative where the support would have to pull; of
    /// more by equal one-sided springs, `None` where no forces that only push hold the thing.
    pub force: Option<f64>,
    /// The least over all equilibria in which no support pulls; `None` where there is none.
    pub least: Option<f64>,
    /// The most over them.
    pub most: Option<f64>,
}

/// What all supports carry.
#[derive(Clone, Debug, PartialEq)]
pub struct Reactions {
    /// In the order of the supports.
    pub reactions: Vec<Reaction>,
    /// The centre stands outside of the support polygon.
    pub tips: bool,
    /// More than three supports: how a rigid load is shared is not fixed by statics.
    pub indeterminate: bool,
}

impl Stand {
    /// Supports of a thing on which gravity acts along −`up` (any length but zero).
    ///
    /// # Errors
    /// `usage` for fewer than three supports or supports in one line as seen along gravity, which
    /// hold nothing upright; `too-large` for more than 64.
    pub fn new(supports: Vec<Support>, up: Vector3<f64>) -> Result<Self> {
        let n = supports.len();
        if n < 3 {
            return Err(Error::new(
                Kind::Usage,
                format!(
                    "{n} support{} cannot hold a thing upright",
                    if n == 1 { "" } else { "s" }
                ),
                "state three supports or more that do not stand in one line",
            ));
        }
        if n > MOST {
            return Err(Error::new(
                Kind::TooLarge,
                format!("{n} supports are more than the {MOST} that are worked out"),
                "join supports that stand close together",
            ));
        }
        if supports.iter().any(|s| s.at.iter().any(|x| !x.is_finite())) {
            return Err(Error::new(
                Kind::NotFinite,
                "the place of a support is not finite",
                "check its `at`",
            ));
        }
        let stand = Self {
            supports,
            up: up.normalize(),
        };
        let flat = stand.flat(&stand.up);
        let corners = hull(&flat);
        let size = flat.iter().flatten().fold(0.0_f64, |m, x| m.max(x.abs()));
        if corners.len() < 3 || area(&flat, &corners) <= 1e-9 * size * size {
            return Err(Error::new(
                Kind::Usage,
                "all supports stand in one line as seen along gravity, and a thing on a line falls over",
                "move a support out of the line, or state one more",
            ));
        }
        Ok(stand)
    }

    /// The supports.
    pub fn supports(&self) -> &[Support] {
        &self.supports
    }

    /// Against gravity, a unit vector.
    pub fn up(&self) -> Vector3<f64> {
        self.up
    }

    /// The supports as seen along `up`, about their mean.
    pub(super) fn flat(&self, up: &Vector3<f64>) -> Vec<[f64; 2]> {
        let (e, f) = across(up);
        let mean = self.mean();
        let flat = self.supports.iter().map(|s| {
            let d = s.at - mean;
            [d.dot(&e), d.dot(&f)]
        });
        flat.collect()
    }

    pub(super) fn mean(&self) -> Vector3<f64> {
        let sum: Vector3<f64> = self.supports.iter().map(|s| s.at).sum();
        sum / self.supports.len() as f64
    }

    /// The corners of the support polygon as seen along `up`, counter-clockwise from above.
    pub(super) fn corners(&self, up: &Vector3<f64>) -> Vec<usize> {
        hull(&self.flat(up))
    }

    /// Rows 1, x, y over the supports, with x and y divided by their largest size, and the same
    /// for the centre.
    fn balance(&self, centre: &Vector3<f64>) -> (DMatrix<f64>, DVector<f64>) {
        let flat = self.flat(&self.up);
        let size = flat.iter().flatten().fold(0.0_f64, |m, x| m.max(x.abs()));
        let a = DMatrix::from_fn(3, flat.len(), |r, c| match r {
            0 => 1.0,
            r => flat[c][r - 1] / size,
        });
        let (e, f) = across(&self.up);
        let d = centre - self.mean();
        let b = DVector::from_vec(vec![1.0, d.dot(&e) / size, d.dot(&f) / size]);
        (a, b)
    }

    /// Of three supports: the share of the weight that support `i` carries, as λ = a·c + b of the
    /// centre c. `None` where the supports are not three, or there is no such support.
    pub fn share(&self, i: usize) -> Option<(Vector3<f64>, f64)> {
        let [p, q] = match (self.supports.len(), i) {
            (3, 0) => [1, 2],
            (3, 1) => [2, 0],
            (3, 2) => [0, 1],
            _ => return None,
        }
        .map(|k| self.supports[k].at);
        // The share falls from one at the support to nothing on the line of the other two.
        let n = self.up.cross(&(q - p));
        let height = n.dot(&(self.supports[i].at - p));
        let a = n / height;
        Some((a, -a.dot(&p)))
    }

    /// What each support carries of a `weight` (N) whose centre is at `centre`.
    ///
    /// Three supports: exactly, from statics alone. More: as equal springs that only push (the
    /// non-negative forces of least sum of squares), with the least and most of each over all
    /// equilibria without pull, which stand at triples of supports that carry alone.
    pub fn reactions(&self, centre: &Vector3<f64>, weight: f64) -> Reactions {
        let n = self.supports.len();
        let (a, b) = self.balance(centre);
        let mut least = vec![f64::INFINITY; n];
        let mut most = vec![f64::NEG_INFINITY; n];
        let mut any = false;
        for i in 0..n {
            for j in i + 1..n {
                for k in j + 1..n {
                    let Some(share) = triple(&a, &b, [i, j, k]) else {
                        continue;
                    };
                    any = true;
                    for m in 0..n {
                        let s = [i, j, k]
                            .iter()
                            .position(|x| *x == m)
                            .map_or(0.0, |p| share[p]);
                        least[m] = least[m].min(s);
                        most[m] = most[m].max(s);
                    }
                }
            }
        }
        let forces: Option<Vec<f64>> = if n == 3 {
            let shares = (0..3).map(|i| self.share(i).map(|(g, at)| g.dot(centre) + at));
            shares.collect()
        } else if any {
            nnls::least_norm(&a, &b).map(|x| x.iter().copied().collect())
        } else {
            None
        };
        let reactions = self.supports.iter().enumerate().map(|(i, s)| Reaction {
            support: s.name.clone(),
            force: forces.as_ref().map(|f| f[i] * weight),
            least: any.then(|| least[i] * weight),
            most: any.then(|| most[i] * weight),
        });
        Reactions {
            reactions: reactions.collect(),
            tips: !any,
            indeterminate: n > 3,
        }
    }
}

/// Shares of three supports that carry alone, where they can and none of them pulls.
fn triple(a: &DMatrix<f64>, b: &DVector<f64>, at: [usize; 3]) -> Option<[f64; 3]> {
    let m = Matrix3::from_fn(|r, c| a[(r, at[c])]);
    // The rows are of order one, so this is the triangle's area against the whole.
    if m.determinant().abs() <= 1e-12 {
        return None;
    }
    let share = m.lu().solve(&Vector3::new(b[0], b[1], b[2]))?;
    let lowest = share.min();
    (lowest >= -1e-12).then(|| [0, 1, 2].map(|k| share[k].max(0.0)))
}

fn area(flat: &[[f64; 2]], corners: &[usize]) -> f64 {
    let pairs = corners.iter().zip(corners.iter().cycle().skip(1));
    let sum: f64 = pairs
        .map(|(&i, &j)| flat[i][0] * flat[j][1] - flat[i][1] * flat[j][0])
        .sum();
    sum / 2.0
}

#[cfg(test)]
#[path = "stand_tests.rs"]
mod tests;
