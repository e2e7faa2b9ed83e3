//! What a limit asks of the masses that are added, as rows ‖v(x)‖ ≤ t(x) with t and v affine.

use nalgebra::{Matrix3, Vector3};

use super::{Place, State};
use crate::limits::{End, Gradient, Limit, Measured, Plane};
use crate::moments::Moments;

/// constant + slope·x over the places.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Affine {
    pub(super) constant: f64,
    pub(super) slope: Vec<f64>,
}

impl Affine {
    pub(super) fn constant(n: usize, value: f64) -> Self {
        Self {
            constant: value,
            slope: vec![0.0; n],
        }
    }

    pub(super) fn at(&self, x: &[f64]) -> f64 {
        self.constant + self.slope.iter().zip(x).map(|(a, x)| a * x).sum::<f64>()
    }

    pub(super) fn times(mut self, k: f64) -> Self {
        self.constant *= k;
        self.slope.iter_mut().for_each(|a| *a *= k);
        self
    }
}

/// ‖v(x)‖ ≤ t(x); linear where v is empty.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Row {
    pub(super) t: Affine,
    pub(super) v: Vec<Affine>,
    /// Change of t and of each v when the bound is loosened by one unit of the limit.
    pub(super) loosen_t: Affine,
    pub(super) loosen_v: Vec<Affine>,
    /// Index of the limit, and of the state.
    pub(super) of: (usize, usize),
    /// Errors are among its v already.
    pub(super) sure: bool,
    /// The other end of the band is in the same place.
    pub(super) equality: bool,
}

impl Row {
    /// t − ‖v‖: not negative where the row holds.
    pub(super) fn slack(&self, x: &[f64]) -> f64 {
        self.t.at(x) - self.v.iter().map(|v| v.at(x).powi(2)).sum::<f64>().sqrt()
    }

    /// The gradient of the slack.
    pub(super) fn gradient(&self, x: &[f64]) -> Vec<f64> {
        let v: Vec<f64> = self.v.iter().map(|v| v.at(x)).collect();
        let norm = v.iter().map(|v| v * v).sum::<f64>().sqrt();
        let mut g = self.t.slope.clone();
        if norm > 0.0 {
            for (a, v) in self.v.iter().zip(&v) {
                g.iter_mut()
                    .zip(&a.slope)
                    .for_each(|(g, s)| *g -= s * v / norm);
            }
        }
        g
    }

    /// How much slack one unit of the limit's bound is worth at `x`.
    pub(super) fn loosened(&self, x: &[f64]) -> f64 {
        let v: Vec<f64> = self.v.iter().map(|v| v.at(x)).collect();
        let norm = v.iter().map(|v| v * v).sum::<f64>().sqrt();
        let of_v: f64 = self.loosen_v.iter().zip(&v).map(|(a, v)| a.at(x) * v).sum();
        self.loosen_t.at(x) - if norm > 0.0 { of_v / norm } else { 0.0 }
    }

    /// What one unit of the bound is worth in cost, at multipliers.
    pub(super) fn price(&self, x: &[f64], dual: &[f64]) -> f64 {
        let of_v: f64 = self
            .loosen_v
            .iter()
            .zip(&dual[1..])
            .map(|(a, z)| a.at(x) * z)
            .sum();
        dual[0] * self.loosen_t.at(x) + of_v
    }

    /// A size of its numbers, over masses of the size `mass`.
    pub(super) fn size(&self, mass: f64) -> f64 {
        let of = |a: &Affine| {
            a.slope
                .iter()
                .fold(a.constant.abs(), |m, s| m.max(s.abs() * mass))
        };
        self.v
            .iter()
            .map(of)
            .fold(of(&self.t), f64::max)
            .max(f64::MIN_POSITIVE)
    }
}

/// What one end of a limit asks in one state.
#[derive(Clone, Debug)]
pub(super) struct Demand {
    /// One of these lists must hold in full; one list as a rule.
    pub(super) any: Vec<Vec<Row>>,
    /// The rows do not say all: the margin itself must be checked.
    pub(super) checked: bool,
    pub(super) limit: usize,
    pub(super) state: usize,
    pub(super) end: End,
}

/// A linear functional of moments, made of forms of the state and the places.
pub(super) struct Forms<'a> {
    pub(super) state: &'a State,
    pub(super) places: &'a [Place],
    /// How the errors of the state and of the places enter, times the factor of certainty.
    pub(super) sure: Option<f64>,
    /// A length of the whole, m.
    pub(super) size: f64,
}

fn form(about: Vector3<f64>, zeroth: f64, first: Vector3<f64>) -> Gradient {
    Gradient {
        about,
        zeroth,
        first,
        second: Matrix3::zeros(),
    }
}

impl Forms<'_> {
    pub(super) fn affine(&self, f: &Gradient, constant: f64) -> Affine {
        Affine {
            constant: f.of(&self.state.moments) + constant,
            slope: self.places.iter().map(|p| f.of(&p.per_kg)).collect(),
        }
    }

    /// Standard deviations of a functional, one for each source of error: affine in the masses.
    pub(super) fn errors(&self, f: &Gradient, factor: f64) -> Vec<Affine> {
        let n = self.places.len();
        let drivers = self.state.drivers.iter();
        let mut out: Vec<Affine> = drivers
            .map(|d| Affine::constant(n, f.of(d) * factor))
            .filter(|a| a.constant != 0.0)
            .collect();
        for (j, p) in self.places.iter().enumerate() {
            let per_kg = f.of(&p.per_kg) * factor;
            if p.relative > 0.0 && per_kg != 0.0 {
                let mut a = Affine::constant(n, 0.0);
                a.slope[j] = per_kg * p.relative;
                out.push(a);
            }
            if p.absolute > 0.0 && per_kg != 0.0 {
                out.push(Affine::constant(n, per_kg * p.absolute));
            }
        }
        out
    }

    /// f + constant ≥ 0, whose bound loosens by `loosen`.
    fn linear(&self, f: &Gradient, constant: f64, loosen: Affine, of: (usize, usize)) -> Row {
        Row {
            t: self.affine(f, constant),
            v: self.sure.map_or_else(Vec::new, |k| self.errors(f, k)),
            loosen_t: loosen,
            loosen_v: Vec::new(),
            of,
            sure: self.sure.is_some(),
            equality: false,
        }
    }

    /// The rows of one end of a limit.
    pub(super) fn demand(&self, limit: &Limit, end: End, of: (usize, usize)) -> Option<Demand> {
        let n = self.places.len();
        let origin = Vector3::zeros();
        let bound = match end {
            End::From => limit.from,
            End::To => limit.to,
        };
        let sign = match end {
            End::From => 1.0,
            End::To => -1.0,
        };
        let mass = form(origin, 1.0, origin);
        let total = self.affine(&mass, 0.0);
        let one = Affine::constant(n, 1.0);
        let demand = |any: Vec<Vec<Row>>, checked: bool| {
            Some(Demand {
                any,
                checked,
                limit: of.0,
                state: of.1,
                end,
            })
        };
        // sign·(n·(c − p) − b)·m ≥ 0 with the first moments about p.
        let place = |p: Vector3<f64>, n: Vector3<f64>, b: f64, scale: f64| {
            let f = form(p, -sign * b * scale, n * sign);
            demand(
                vec![vec![self.linear(&f, 0.0, total.clone().times(scale), of)]],
                false,
            )
        };
        match &limit.quantity {
            Measured::Mass => {
                let f = form(origin, sign, origin);
                demand(vec![vec![self.linear(&f, -sign * bound?, one, of)]], false)
            }
            Measured::Centre(axis) => place(origin, Vector3::ith(*axis, 1.0), bound?, 1.0),
            Measured::Station(a) | Measured::FromPlane(a) => place(a.at, a.along, bound?, 1.0),
            Measured::Percent { from, length } => place(from.at, from.along, bound?, *length),
            Measured::Reaction(s) => {
                let f = form(origin, sign * s.gravity * s.b, s.a * (sign * s.gravity));
                demand(vec![vec![self.linear(&f, -sign * bound?, one, of)]], false)
            }
            Measured::Inertia {
                row,
                column,
                about: Some(p),
            } => {
                let mut f = form(*p, 0.0, origin);
                f.second = element(*row, *column) * sign;
                demand(vec![vec![self.linear(&f, -sign * bound?, one, of)]], false)
            }
            Measured::Tip(t) if end == End::From => {
                let (sin, cos) = bound?.sin_cos();
                let rows = t.edges.iter().map(|e| {
                    let (out, up) = e.leaning(&t.towards.unwrap_or(e.outward));
                    let f = form(e.at, 0.0, -(out * cos + up * sin));
                    let looser = form(e.at, 0.0, up * cos - out * sin);
                    self.linear(&f, 0.0, self.affine(&looser, 0.0), of)
                });
                demand(vec![rows.collect()], false)
            }
            Measured::FromPoint(p) if end == End::To => {
                let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
                demand(vec![vec![self.round(*p, &axes, bound?, of)]], false)
            }
            Measured::FromLine(a) if end == End::To => {
                let (e, f) = basis(&a.along);
                demand(vec![vec![self.round(a.at, &[e, f], bound?, of)]], false)
            }
            Measured::FromPoint(_) | Measured::FromLine(_) if bound? <= 0.0 => None,
            Measured::Unbalance(rotor, plane) if end == End::To => {
                let (e, f) = basis(&rotor.axis.along);
                let gap = rotor.planes[1] - rotor.planes[0];
                let [k, s] = match plane {
                    Plane::A => [-rotor.planes[1], -1.0],
                    Plane::B => [rotor.planes[0], 1.0],
                };
                let u = [e, f].map(|n| {
                    let mut g = form(rotor.axis.at, 0.0, n * (-k / gap));
                    let a = rotor.axis.along;
                    g.second = (n * a.transpose() + a * n.transpose()) * (0.5 * s / gap);
                    g
                });
                let per_kg = rotor.grade / rotor.speed;
                let lever = match plane {
                    Plane::A => form(
                        rotor.axis.at,
                        rotor.planes[1] / gap,
                        -rotor.axis.along / gap,
                    ),
                    Plane::B => form(
                        rotor.axis.at,
                        -rotor.planes[0] / gap,
                        rotor.axis.along / gap,
                    ),
                };
                let row = |t: Affine| Row {
                    t: t.times(per_kg),
                    v: u.iter().map(|g| self.affine(g, 0.0)).collect(),
                    loosen_t: one.clone(),
                    loosen_v: Vec::new(),
                    of,
                    sure: false,
                    equality: false,
                };
                // max(0.3, min(0.7, lever)) of what is permitted: either both or the floor.
                let both = vec![row(self.affine(&lever, 0.0)), row(total.clone().times(0.7))];
                let floor = vec![row(total.times(0.3))];
                demand(vec![both, floor], false)
            }
            Measured::Inertia {
                row,
                column,
                about: None,
            } if row == column && end == End::From => {
                // (S_jj + S_kk − L)·m ≥ F_j² + F_k²: a rotated cone, with lengths over `size`.
                let c = self.state.moments.centre()?;
                let mut s = form(c, 0.0, origin);
                s.second = element(*row, *column);
                let l = self.size;
                let u = self.affine(&s, -bound?);
                let w = self.affine(&form(c, l * l, origin), 0.0);
                let sum = |k: f64| Affine {
                    constant: u.constant + k * w.constant,
                    slope: u
                        .slope
                        .iter()
                        .zip(&w.slope)
                        .map(|(a, b)| a + k * b)
                        .collect(),
                };
                let mut v: Vec<Affine> = (0..3)
                    .filter(|k| k != row)
                    .map(|k| self.affine(&form(c, 0.0, Vector3::ith(k, 2.0 * l)), 0.0))
                    .collect();
                v.push(sum(-1.0));
                let zero = Affine::constant(n, 0.0);
                let rows = vec![Row {
                    t: sum(1.0),
                    v,
                    loosen_t: one.clone(),
                    loosen_v: vec![zero.clone(), zero, one],
                    of,
                    sure: false,
                    equality: false,
                }];
                demand(vec![rows], false)
            }
            Measured::Envelope(e) => {
                if end == End::To {
                    // Both ends stand in the rows of the lower one.
                    return demand(vec![Vec::new()], !e.is_convex() || self.bends(e));
                }
                if !e.is_convex() {
                    return demand(vec![Vec::new()], true);
                }
                demand(vec![self.outline(e, of)], self.bends(e))
            }
            _ => {
                bound?;
                demand(vec![Vec::new()], true)
            }
        }
    }

    /// ‖first moments about p along some axes‖ ≤ b·m.
    fn round(&self, p: Vector3<f64>, axes: &[Vector3<f64>], b: f64, of: (usize, usize)) -> Row {
        let origin = Vector3::zeros();
        Row {
            t: self.affine(&form(p, b, origin), 0.0),
            v: axes
                .iter()
                .map(|n| self.affine(&form(p, 0.0, *n), 0.0))
                .collect(),
            loosen_t: self.affine(&form(p, 1.0, origin), 0.0),
            loosen_v: Vec::new(),
            of,
            sure: false,
            equality: false,
        }
    }

    /// The sides of a convex outline as (α, β, γ): α·m + β·x + γ ≥ 0 inside.
    fn sides(e: &crate::limits::Envelope) -> Vec<[f64; 3]> {
        let o = e.outline();
        let n = o.len();
        let area: f64 = (0..n)
            .map(|i| o[i][0] * o[(i + 1) % n][1] - o[i][1] * o[(i + 1) % n][0])
            .sum();
        let turn = area.signum();
        (0..n)
            .map(|i| {
                let (p, q) = (o[i], o[(i + 1) % n]);
                let (a, b) = (-(q[1] - p[1]) * turn, (q[0] - p[0]) * turn);
                [a, b, -(a * p[0] + b * p[1])]
            })
            .collect()
    }

    /// Whether a side of a convex outline is not convex in mass and first moment.
    fn bends(&self, e: &crate::limits::Envelope) -> bool {
        Self::sides(e).iter().any(|[a, b, _]| *a > 0.0 && *b != 0.0)
    }

    /// Times the mass a side reads α·m² + β·f + γ·m ≥ 0: linear for α = 0, a rotated cone for
    /// α < 0; a side along stations is a bound of the mass.
    fn outline(&self, e: &crate::limits::Envelope, of: (usize, usize)) -> Vec<Row> {
        let n = self.places.len();
        let origin = Vector3::zeros();
        let mass = self.affine(&form(origin, 1.0, origin), 0.0);
        let zero = Affine::constant(n, 0.0);
        let mut rows = Vec::new();
        for [a, b, c] in Self::sides(e) {
            if b == 0.0 {
                // The masses are a limit of their own.
                continue;
            }
            let size = b.abs();
            let (a, b, c) = (a / size, b / size, c / size);
            let f = form(e.axis.at, c, e.axis.along * b);
            if a == 0.0 {
                rows.push(self.linear(&f, 0.0, mass.clone(), of));
            } else if a < 0.0 {
                // (√−α·m)² ≤ u·1, with 1 as a mass times length of the size of u.
                let u = self.affine(&f, 0.0);
                let one = u.constant.abs().max(self.size).max(f64::MIN_POSITIVE);
                let shift = |k: f64| Affine {
                    constant: u.constant + k,
                    slope: u.slope.clone(),
                };
                rows.push(Row {
                    t: shift(one),
                    v: vec![mass.clone().times(2.0 * (-a * one).sqrt()), shift(-one)],
                    loosen_t: mass.clone(),
                    loosen_v: vec![zero.clone(), mass.clone()],
                    of,
                    sure: false,
                    equality: false,
                });
            }
        }
        rows
    }
}

fn element(row: usize, column: usize) -> Matrix3<f64> {
    let mut g = if row == column {
        Matrix3::identity()
    } else {
        Matrix3::zeros()
    };
    g[(row, column)] -= 0.5;
    g[(column, row)] -= 0.5;
    g
}

fn basis(along: &Vector3<f64>) -> (Vector3<f64>, Vector3<f64>) {
    crate::statics::across(along)
}

/// Moments of a state with masses added.
pub(super) fn laden(state: &State, places: &[Place], x: &[f64]) -> Moments {
    let added = places.iter().zip(x).filter(|(_, x)| **x != 0.0);
    added.fold(state.moments, |m, (p, x)| m.plus(&p.per_kg.weighted(*x)))
}
