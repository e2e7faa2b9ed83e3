//! What parts and items add, and how tolerances act on them.

use nalgebra::{Matrix3, Vector3};

use super::model::{Response, Values, VariableId};
use crate::moments::Moments;

/// Mass of one body or item, in the model's axes.
#[derive(Clone, Debug)]
pub struct Piece {
    /// As stated.
    pub moments: Moments,
    /// Factors 1 + c·δ on its weight: density, thickness of a sheet.
    pub scales: Vec<(VariableId, f64)>,
    /// Moments that are added δ times: per kg of a stated mass; the bias of facets, by a variable
    /// of an [`super::Distribution::Interval`] from 0 to 1; a hole that was capped.
    pub additions: Vec<(VariableId, Moments)>,
}

/// A change of place or shape that keeps the mass.
#[derive(Clone, Debug)]
pub enum Motion {
    /// Moved by δ along this vector.
    Shift {
        /// By how much.
        by: VariableId,
        /// Displacement for each unit of it.
        along: Vector3<f64>,
    },
    /// Turned by δ radians, right-handed.
    Turn {
        /// By how much.
        by: VariableId,
        /// Unit vector.
        axis: Vector3<f64>,
        /// A point of the axis.
        pivot: Vector3<f64>,
    },
    /// Stretched: x ↦ pivot + (1 + δ·G)(x − pivot).
    Stretch {
        /// By how much.
        by: VariableId,
        /// G, for each unit of it.
        gradient: Matrix3<f64>,
        /// The point that stays.
        pivot: Vector3<f64>,
    },
}

/// A part or an item: pieces, weighed together or not, that move together.
#[derive(Clone, Debug)]
pub struct Contribution {
    pieces: Vec<Piece>,
    /// The sum of the pieces keeps its mass whatever they do: it was put on the scale.
    weighed: bool,
    scales: Vec<(VariableId, f64)>,
    motions: Vec<Motion>,
}

impl Contribution {
    /// A thing of one piece that nothing acts on yet.
    pub fn new(moments: Moments) -> Self {
        Self::of(vec![Piece {
            moments,
            scales: Vec::new(),
            additions: Vec::new(),
        }])
    }

    /// A thing of these pieces.
    pub fn of(pieces: Vec<Piece>) -> Self {
        Self {
            pieces,
            weighed: false,
            scales: Vec::new(),
            motions: Vec::new(),
        }
    }

    /// Its mass is that of the scale: what acts on pieces moves mass between them, and no more.
    #[must_use]
    pub fn weighed(mut self) -> Self {
        self.weighed = true;
        self
    }

    /// The weight of the whole has a factor 1 + `per_unit`·δ.
    #[must_use]
    pub fn scaled(mut self, by: VariableId, per_unit: f64) -> Self {
        self.scales.push((by, per_unit));
        self
    }

    /// `per_unit` is added δ times to its first piece.
    #[must_use]
    pub fn adding(mut self, by: VariableId, per_unit: Moments) -> Self {
        if let Some(piece) = self.pieces.first_mut() {
            piece.additions.push((by, per_unit));
        }
        self
    }

    /// It moves so, after all motions given before.
    #[must_use]
    pub fn moving(mut self, motion: Motion) -> Self {
        self.motions.push(motion);
        self
    }

    fn stated(&self) -> Moments {
        sum(self.pieces.iter().map(|p| p.moments))
    }
}

impl Piece {
    fn at(&self, values: &Values) -> Moments {
        let mut m = self.moments;
        for (by, addition) in &self.additions {
            m = m.plus(&addition.weighted(values.of(*by)));
        }
        m.weighted(factor(&self.scales, values))
    }

    fn tangent(&self, by: VariableId) -> Moments {
        let mut rate = self.moments.weighted(coefficient(&self.scales, by));
        for (v, addition) in &self.additions {
            if *v == by {
                rate = rate.plus(addition);
            }
        }
        rate
    }
}

impl Response for Contribution {
    fn variables(&self) -> Vec<VariableId> {
        let pieces = self.pieces.iter().flat_map(|p| {
            let scales = p.scales.iter().map(|(v, _)| *v);
            scales.chain(p.additions.iter().map(|(v, _)| *v))
        });
        let scales = self.scales.iter().map(|(v, _)| *v);
        let all = pieces
            .chain(scales)
            .chain(self.motions.iter().map(Motion::by));
        let mut all: Vec<VariableId> = all.collect();
        all.sort_unstable();
        all.dedup();
        all
    }

    fn moments(&self, values: &Values) -> Moments {
        let mut m = sum(self.pieces.iter().map(|p| p.at(values)));
        if self.weighed && m.zeroth != 0.0 {
            let stated: f64 = self.pieces.iter().map(|p| p.moments.zeroth).sum();
            m = m.weighted(stated / m.zeroth);
        }
        m = m.weighted(factor(&self.scales, values));
        for motion in &self.motions {
            m = motion.moved(&m, values);
        }
        m
    }

    fn tangent(&self, by: VariableId) -> Moments {
        let stated = self.stated();
        let mut rate = sum(self.pieces.iter().map(|p| p.tangent(by)));
        if self.weighed && stated.zeroth != 0.0 {
            let kept = stated.weighted(-rate.zeroth / stated.zeroth);
            rate = rate.plus(&kept);
        }
        rate = rate.plus(&stated.weighted(coefficient(&self.scales, by)));
        for motion in self.motions.iter().filter(|m| m.by() == by) {
            rate = rate.plus(&motion.rate(&stated));
        }
        rate
    }
}

impl Motion {
    fn by(&self) -> VariableId {
        match self {
            Self::Shift { by, .. } | Self::Turn { by, .. } | Self::Stretch { by, .. } => *by,
        }
    }

    fn moved(&self, m: &Moments, values: &Values) -> Moments {
        let delta = values.of(self.by());
        if delta == 0.0 {
            return *m;
        }
        match self {
            Self::Shift { along, .. } => Moments {
                about: m.about + along * delta,
                ..*m
            },
            Self::Turn { axis, pivot, .. } => {
                // Rodrigues' rotation.
                let (sin, cos) = delta.sin_cos();
                let turn = Matrix3::identity() * cos
                    + axis.cross_matrix() * sin
                    + axis * axis.transpose() * (1.0 - cos);
                mapped(m, &turn, pivot)
            }
            Self::Stretch {
                gradient, pivot, ..
            } => mapped(m, &(Matrix3::identity() + gradient * delta), pivot),
        }
    }

    /// The rate of moments held about a point that stays, from the velocity field G(x − p).
    fn rate(&self, m: &Moments) -> Moments {
        let (gradient, here) = match self {
            Self::Shift { along, .. } => (Matrix3::zeros(), *along),
            Self::Turn { axis, pivot, .. } => {
                let spin = axis.cross_matrix();
                (spin, spin * (m.about - pivot))
            }
            Self::Stretch {
                gradient, pivot, ..
            } => (*gradient, gradient * (m.about - pivot)),
        };
        let moved = here * m.first.transpose() + gradient * m.second;
        Moments {
            about: m.about,
            zeroth: 0.0,
            first: here * m.zeroth + gradient * m.first,
            second: moved + moved.transpose(),
        }
    }
}

/// The thing after x ↦ p + A(x − p), its mass kept.
fn mapped(m: &Moments, a: &Matrix3<f64>, p: &Vector3<f64>) -> Moments {
    let second = a * m.second * a.transpose();
    Moments {
        about: p + a * (m.about - p),
        zeroth: m.zeroth,
        first: a * m.first,
        second: (second + second.transpose()) * 0.5,
    }
}

fn factor(scales: &[(VariableId, f64)], values: &Values) -> f64 {
    let factors = scales.iter().map(|(by, c)| 1.0 + c * values.of(*by));
    factors.product()
}

fn coefficient(scales: &[(VariableId, f64)], by: VariableId) -> f64 {
    let own = scales.iter().filter(|(v, _)| *v == by).map(|(_, c)| c);
    own.sum()
}

/// All of them, held about the first one's point.
pub(super) fn sum(mut all: impl Iterator<Item = Moments>) -> Moments {
    let first = all
        .next()
        .unwrap_or_else(|| Moments::zero(Vector3::zeros()));
    all.fold(first, |sum, m| sum.plus(&m))
}
