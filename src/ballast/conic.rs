//! One convex program: least cost under rows and bounds, with a lower bound that does not rest on
//! the solver's tolerances.

use clarabel::algebra::CscMatrix;
use clarabel::solver::{
    DefaultSettings, DefaultSolver, IPSolver, NonnegativeConeT, SecondOrderConeT, SolverStatus,
    SupportedConeT,
};

use super::row::Row;

/// What came of it.
#[derive(Clone, Debug)]
pub(super) enum Solved {
    /// An answer to the solver's tolerance.
    Found(Point),
    /// There is none.
    Infeasible,
    /// The solver gave up.
    Unknown,
}

/// An answer.
#[derive(Clone, Debug)]
pub(super) struct Point {
    pub(super) x: Vec<f64>,
    /// The least cost is at least this.
    pub(super) bound: f64,
    /// Multipliers of each row: of t, then of each v, in the row's own units.
    pub(super) dual: Vec<Vec<f64>>,
}

/// Least cost·x with lo ≤ x ≤ hi (finite) and every row; `mass` is the size of x.
///
/// The bound is the Lagrangian at the solver's multipliers, brought into the dual cone, with the
/// box minimised exactly (as Neumaier & Shcherbina 2004 for linear programs): valid whatever the
/// solver's residuals.
pub(super) fn solve(cost: &[f64], lo: &[f64], hi: &[f64], rows: &[&Row], mass: f64) -> Solved {
    let n = cost.len();
    let free: Vec<usize> = (0..n).filter(|&j| hi[j] > lo[j]).collect();
    let base: Vec<f64> = (0..n)
        .map(|j| if hi[j] > lo[j] { 0.0 } else { lo[j] })
        .collect();
    if free.is_empty() {
        let holds = rows.iter().all(|r| r.slack(lo) >= -1e-9 * r.size(mass));
        return if holds {
            let bound = cost.iter().zip(lo).map(|(c, x)| c * x).sum();
            let dual = rows.iter().map(|r| vec![0.0; 1 + r.v.len()]).collect();
            Solved::Found(Point {
                x: lo.to_vec(),
                bound,
                dual,
            })
        } else {
            Solved::Infeasible
        };
    }
    let k = free.len();
    let (mut dense, mut b): (Vec<Vec<f64>>, Vec<f64>) = (Vec::new(), Vec::new());
    let mut cones: Vec<SupportedConeT<f64>> = Vec::new();
    let mut scales = Vec::new();
    let mut starts = Vec::new();
    for row in rows {
        let scale = 1.0 / row.size(mass);
        scales.push(scale);
        starts.push(b.len());
        for a in std::iter::once(&row.t).chain(&row.v) {
            b.push(a.at(&base) * scale);
            dense.push(free.iter().map(|&j| -a.slope[j] * mass * scale).collect());
        }
        cones.push(if row.v.is_empty() {
            NonnegativeConeT(1)
        } else {
            SecondOrderConeT(1 + row.v.len())
        });
    }
    for (c, &j) in free.iter().enumerate() {
        for (sign, end) in [(-1.0, -lo[j]), (1.0, hi[j])] {
            let mut line = vec![0.0; k];
            line[c] = sign;
            dense.push(line);
            b.push(end / mass);
        }
        cones.push(NonnegativeConeT(2));
    }
    let a = CscMatrix::from(&dense);
    let p = CscMatrix::zeros((k, k));
    let q: Vec<f64> = free.iter().map(|&j| cost[j]).collect();
    let settings = DefaultSettings {
        verbose: false,
        max_iter: 200,
        tol_gap_abs: 1e-11,
        tol_gap_rel: 1e-11,
        tol_feas: 1e-11,
        ..DefaultSettings::default()
    };
    let Ok(mut solver) = DefaultSolver::new(&p, &q, &a, &b, &cones, settings) else {
        return Solved::Unknown;
    };
    solver.solve();
    let s = &solver.solution;
    match s.status {
        SolverStatus::PrimalInfeasible | SolverStatus::AlmostPrimalInfeasible => {
            return Solved::Infeasible;
        }
        SolverStatus::Solved | SolverStatus::AlmostSolved => {}
        // Close to the end tolerances of 1e-11 may stay out of reach: judged by what it found.
        SolverStatus::InsufficientProgress
        | SolverStatus::NumericalError
        | SolverStatus::MaxIterations => {
            let good = |r: f64| r.is_finite() && r < 1e-6;
            if !(good(s.r_prim) && good(s.r_dual)) {
                return Solved::Unknown;
            }
        }
        _ => return Solved::Unknown,
    }
    let mut x = base;
    for (c, &j) in free.iter().enumerate() {
        x[j] = (s.x[c] * mass).clamp(lo[j], hi[j]);
    }
    // The objective was in units of `mass`: rows scaled, x scaled. In the row's own units a
    // multiplier is z·scale·mass.
    let dual: Vec<Vec<f64>> = rows
        .iter()
        .enumerate()
        .map(|(r, row)| {
            let z = &s.z[starts[r]..starts[r] + 1 + row.v.len()];
            let norm = z[1..].iter().map(|w| w * w).sum::<f64>().sqrt();
            let first = z[0].max(norm).max(0.0);
            std::iter::once(first)
                .chain(z[1..].iter().copied())
                .map(|w| w * scales[r] * mass)
                .collect()
        })
        .collect();
    let bound = lagrangian(cost, lo, hi, rows, &dual);
    Solved::Found(Point { x, bound, dual })
}

/// min over the box of cost·x − Σ z·(t, v)(x).
fn lagrangian(cost: &[f64], lo: &[f64], hi: &[f64], rows: &[&Row], dual: &[Vec<f64>]) -> f64 {
    let mut reduced = cost.to_vec();
    let mut constant = 0.0;
    for (row, z) in rows.iter().zip(dual) {
        for (a, z) in std::iter::once(&row.t).chain(&row.v).zip(z) {
            constant -= z * a.constant;
            for (r, s) in reduced.iter_mut().zip(&a.slope) {
                *r -= z * s;
            }
        }
    }
    let ends = reduced.iter().zip(lo.iter().zip(hi));
    constant + ends.map(|(r, (lo, hi))| (r * lo).min(r * hi)).sum::<f64>()
}
