//! What a limit is on, and its value.

use nalgebra::{Matrix3, Vector3};

use super::envelope::Envelope;
use super::rotor::{Plane, Rotor};
use crate::moments::{Moments, principal};
use crate::statics::Edge;

/// A point and a direction through it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    /// m.
    pub at: Vector3<f64>,
    /// A unit vector.
    pub along: Vector3<f64>,
}

/// Edges of a support polygon that a thing may tip over when it leans.
#[derive(Clone, Debug, PartialEq)]
pub struct Tipping {
    /// The edges.
    pub edges: Vec<Edge>,
    /// Unit vector across gravity in which it leans; straight over each edge where `None`.
    pub towards: Option<Vector3<f64>>,
}

/// The share of the weight that one of exactly three supports carries.
#[derive(Clone, Debug, PartialEq)]
pub struct SupportShare {
    /// Name of the support.
    pub support: String,
    /// With `b`: the share is a·c + b of the centre c.
    pub a: Vector3<f64>,
    /// See `a`.
    pub b: f64,
    /// m/s².
    pub gravity: f64,
}

/// What a limit is on.
#[derive(Clone, Debug, PartialEq)]
pub enum Measured {
    /// The total mass, kg.
    Mass,
    /// A component of the centre of mass, 0 to 2 for x to z, m.
    Centre(usize),
    /// How far along from a datum the centre stands, m.
    Station(Axis),
    /// The same as a fraction of a reference length from the datum.
    Percent {
        /// The datum and the direction.
        from: Axis,
        /// The reference length, m.
        length: f64,
    },
    /// Distance of the centre from a point, m.
    FromPoint(Vector3<f64>),
    /// Distance of the centre from a line, m.
    FromLine(Axis),
    /// Distance of the centre from a plane through a point across a direction, m; positive on the
    /// side that the direction points to.
    FromPlane(Axis),
    /// Station of the centre, within an outline that depends on the total mass, m.
    Envelope(Box<Envelope>),
    /// An element of the inertia tensor (off-diagonals −∫xy dm), kg m².
    Inertia {
        /// 0 to 2.
        row: usize,
        /// 0 to 2, not below `row`.
        column: usize,
        /// About this point; about the centre of mass where `None`.
        about: Option<Vector3<f64>>,
    },
    /// Ratio of two principal moments, as a number.
    Ratio {
        /// 0 to 2 in ascending order.
        of: usize,
        /// 0 to 2 in ascending order.
        to: usize,
    },
    /// The least slope at which the thing, frozen, tips over one of some edges, rad.
    Tip(Box<Tipping>),
    /// What a support carries, N.
    Reaction(Box<SupportShare>),
    /// Unbalance of a rotor in one of its two correction planes, kg m.
    Unbalance(Box<Rotor>, Plane),
}

/// How a quantity changes with the moments of the whole: the change of the value is
/// `zeroth`·δm₀ + `first`·δm₁ + `second`:δm₂ with the moments held about `about`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gradient {
    /// The point that moments are held about: the centre of mass.
    pub about: Vector3<f64>,
    /// Per kg.
    pub zeroth: f64,
    /// Per kg m.
    pub first: Vector3<f64>,
    /// Per kg m², symmetric.
    pub second: Matrix3<f64>,
}

impl Gradient {
    pub(super) fn none(about: Vector3<f64>) -> Self {
        Self {
            about,
            zeroth: 0.0,
            first: Vector3::zeros(),
            second: Matrix3::zeros(),
        }
    }

    /// The change, to first order, for a small change of the moments of the whole.
    pub fn of(&self, change: &Moments) -> f64 {
        let c = change.shifted(self.about);
        self.zeroth * c.zeroth + self.first.dot(&c.first) + self.second.dot(&c.second)
    }

    /// This one minus `other`, both about the same point.
    #[must_use]
    pub(super) fn minus(self, other: Self) -> Self {
        Self {
            about: self.about,
            zeroth: self.zeroth - other.zeroth,
            first: self.first - other.first,
            second: self.second - other.second,
        }
    }

    /// Of a quadratic form G in the second moments about a point s from the centre (s = centre −
    /// point): δ(G:S) = G:δm₂ + 2·(G·s)·δm₁ + sᵀ·G·s·δm₀.
    pub(super) fn about_point(centre: Vector3<f64>, s: Vector3<f64>, g: Matrix3<f64>) -> Self {
        Self {
            about: centre,
            zeroth: (s.transpose() * g * s)[(0, 0)],
            first: g * s * 2.0,
            second: g,
        }
    }
}

/// The form whose product with the second moments is the tensor's element.
pub(super) fn element(row: usize, column: usize) -> Matrix3<f64> {
    let mut g = if row == column {
        Matrix3::identity()
    } else {
        Matrix3::zeros()
    };
    g[(row, column)] -= 0.5;
    g[(column, row)] -= 0.5;
    g
}

impl Measured {
    /// The name of [`Measured::Percent`].
    pub const PERCENT: &'static str = "percent";

    /// Its name in files and results.
    pub fn name(&self) -> &'static str {
        match self {
            Self::Mass => "mass",
            Self::Centre(0) => "centre.x",
            Self::Centre(1) => "centre.y",
            Self::Centre(_) => "centre.z",
            Self::Station(_) => "station",
            Self::Percent { .. } => Self::PERCENT,
            Self::FromPoint(_) => "distance.point",
            Self::FromLine(_) => "distance.line",
            Self::FromPlane(_) => "distance.plane",
            Self::Envelope(_) => "envelope",
            Self::Inertia { row, column, .. } => match (row, column) {
                (0, 0) => "inertia.xx",
                (1, 1) => "inertia.yy",
                (2, 2) => "inertia.zz",
                (0, 1) => "inertia.xy",
                (0, _) => "inertia.xz",
                _ => "inertia.yz",
            },
            Self::Ratio { .. } => "ratio",
            Self::Tip(_) => "tip",
            Self::Reaction(_) => "reaction",
            Self::Unbalance(_, Plane::A) => "unbalance.a",
            Self::Unbalance(_, Plane::B) => "unbalance.b",
        }
    }

    /// The SI unit that values and bounds are in; `1` for a number or a fraction.
    pub fn unit(&self) -> &'static str {
        match self {
            Self::Mass => "kg",
            Self::Centre(_)
            | Self::Station(_)
            | Self::FromPoint(_)
            | Self::FromLine(_)
            | Self::FromPlane(_)
            | Self::Envelope(_) => "m",
            Self::Percent { .. } | Self::Ratio { .. } => "1",
            Self::Inertia { .. } => "kg m2",
            Self::Tip(_) => "rad",
            Self::Reaction(_) => "N",
            Self::Unbalance(..) => "kg m",
        }
    }

    /// Whether the value is measured from an origin that has a meaning of its own, so that a
    /// margin may be given in per cent of a single end.
    pub(super) fn is_absolute(&self) -> bool {
        matches!(
            self,
            Self::Mass
                | Self::FromPoint(_)
                | Self::FromLine(_)
                | Self::Ratio { .. }
                | Self::Reaction(_)
                | Self::Unbalance(..)
        ) || matches!(self, Self::Inertia { row, column, .. } if row == column)
    }

    /// The value for a whole of these mass moments; `None` where it has no mass, or too little of
    /// something to have the value (a ratio to no inertia).
    pub fn value(&self, m: &Moments) -> Option<f64> {
        let c = m.centre()?;
        let value = match self {
            Self::Mass => m.zeroth,
            Self::Centre(axis) => c[*axis],
            Self::Station(a) | Self::FromPlane(a) => a.along.dot(&(c - a.at)),
            Self::Percent { from, length } => from.along.dot(&(c - from.at)) / length,
            Self::FromPoint(p) => (c - p).norm(),
            Self::FromLine(a) => across(a, &c).norm(),
            Self::Envelope(e) => e.axis.along.dot(&(c - e.axis.at)),
            Self::Inertia { row, column, about } => {
                m.shifted(about.unwrap_or(c)).inertia_here()[(*row, *column)]
            }
            Self::Ratio { of, to } => {
                let p = principal(&m.inertia()?).moments;
                if p[*to] <= 0.0 {
                    return None;
                }
                p[*of] / p[*to]
            }
            Self::Tip(t) => t.least(&c).1,
            Self::Reaction(s) => m.zeroth * (s.a.dot(&c) + s.b) * s.gravity,
            Self::Unbalance(rotor, plane) => rotor.unbalance(m, *plane).norm(),
        };
        value.is_finite().then_some(value)
    }

    /// The exact gradient of the value with respect to the moments of the whole.
    ///
    /// A distance of nothing, two equal principal moments, and a lean that is as near to two edges
    /// have none; there the gradient of one side is given (nothing for a distance).
    pub fn gradient(&self, m: &Moments) -> Option<Gradient> {
        let c = m.centre()?;
        let none = Gradient::none(c);
        // A component of the centre changes by the first moment alone, since it is held there.
        let of_centre = |g: Vector3<f64>| Gradient {
            first: g / m.zeroth,
            ..none
        };
        let unit = |v: Vector3<f64>| {
            let n = v.norm();
            if n > 0.0 { v / n } else { Vector3::zeros() }
        };
        Some(match self {
            Self::Mass => Gradient {
                zeroth: 1.0,
                ..none
            },
            Self::Centre(axis) => of_centre(Vector3::ith(*axis, 1.0)),
            Self::Station(a) | Self::FromPlane(a) => of_centre(a.along),
            Self::Percent { from, length } => of_centre(from.along / *length),
            Self::FromPoint(p) => of_centre(unit(c - p)),
            Self::FromLine(a) => of_centre(unit(across(a, &c))),
            Self::Envelope(e) => of_centre(e.axis.along),
            Self::Inertia { row, column, about } => {
                let s = about.map_or(Vector3::zeros(), |p| c - p);
                Gradient::about_point(c, s, element(*row, *column))
            }
            Self::Ratio { of, to } => {
                let p = principal(&m.inertia()?);
                let form = |k: usize| {
                    let v = Vector3::from(p.axes[k]);
                    Matrix3::identity() - v * v.transpose()
                };
                let r = p.moments[*of] / p.moments[*to];
                Gradient {
                    second: (form(*of) - form(*to) * r) / p.moments[*to],
                    ..none
                }
            }
            Self::Tip(t) => {
                let (edge, _) = t.least(&c);
                let (n, up) = edge.leaning(&t.towards.unwrap_or(edge.outward));
                let (a, b) = (n.dot(&(edge.at - c)), up.dot(&(c - edge.at)));
                // θ = atan2(a, b), δa = −n·δc, δb = up·δc.
                of_centre((-n * b - up * a) / (a * a + b * b))
            }
            Self::Reaction(s) => Gradient {
                zeroth: (s.a.dot(&c) + s.b) * s.gravity,
                first: s.a * s.gravity,
                ..none
            },
            Self::Unbalance(rotor, plane) => rotor.gradient(m, c, *plane),
        })
    }

    /// How far arithmetic alone may move the value of a whole of this box diagonal: a mass is good
    /// to 1e-13 of itself, a place to 1e-13 of the diagonal or 4 units in the last place.
    pub fn rounding(&self, m: &Moments, diagonal: f64) -> f64 {
        let value = self.value(m).unwrap_or(0.0);
        let place = |at: f64| (1e-13 * diagonal).max(4.0 * f64::EPSILON * at.abs());
        match self {
            Self::Mass => 1e-13 * m.zeroth,
            Self::Centre(_)
            | Self::Station(_)
            | Self::FromPoint(_)
            | Self::FromLine(_)
            | Self::FromPlane(_)
            | Self::Envelope(_) => place(value),
            Self::Percent { length, .. } => place(value * length) / length,
            Self::Inertia { about, .. } => {
                let c = m.centre().unwrap_or(m.about);
                1e-13 * m.shifted(about.unwrap_or(c)).inertia_here().norm()
            }
            Self::Ratio { .. } => 1e-12 * value.abs(),
            Self::Tip(t) => {
                let c = m.centre().unwrap_or(m.about);
                let (edge, _) = t.least(&c);
                let (n, up) = edge.leaning(&t.towards.unwrap_or(edge.outward));
                let arm = n.dot(&(edge.at - c)).hypot(up.dot(&(c - edge.at)));
                (place(arm) / arm).clamp(4.0 * f64::EPSILON, 1.0)
            }
            Self::Reaction(s) => 1e-13 * m.zeroth * s.gravity * (1.0 + s.a.norm() * diagonal),
            Self::Unbalance(..) => 1e-13 * m.zeroth * diagonal,
        }
    }
}

/// The part of centre − axis that stands across the axis.
pub(super) fn across(a: &Axis, c: &Vector3<f64>) -> Vector3<f64> {
    let d = c - a.at;
    d - a.along * a.along.dot(&d)
}

impl Tipping {
    /// The edge that is tipped over first, and the slope.
    pub(super) fn least(&self, c: &Vector3<f64>) -> (&Edge, f64) {
        let angle = |e: &Edge| e.angle(&self.towards.unwrap_or(e.outward), c);
        let mut best = (&self.edges[0], angle(&self.edges[0]));
        for e in &self.edges[1..] {
            let a = angle(e);
            if a < best.1 {
                best = (e, a);
            }
        }
        best
    }

    /// Edges with the lean that may tip over them: a lean away from an edge never does.
    ///
    /// `None` where no edge is left.
    pub fn new(edges: Vec<Edge>, towards: Option<Vector3<f64>>) -> Option<Self> {
        let edges: Vec<Edge> = edges
            .into_iter()
            .filter(|e| towards.is_none_or(|u| u.dot(&e.outward) > 1e-9))
            .collect();
        (!edges.is_empty()).then_some(Self { edges, towards })
    }
}
