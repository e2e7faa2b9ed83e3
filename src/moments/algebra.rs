//! The additive type and its algebra.

use nalgebra::{Matrix3, Vector3};

/// Zeroth, first and second moments of a weight `w` over a thing, about a point near it.
///
/// `zeroth` = ∫ w, `first` = ∫ w·d, `second` = ∫ w·d·dᵀ with d measured from `about`. The weight
/// decides what they mean: 1 gives volume and centroid, density gives mass and centre of mass.
/// Units are those of the weight × volume, times length, times length².
///
/// Second moments are never held about a far origin, where their digits die: keep `about` in or
/// near the thing, and let [`Moments::shifted`] move it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Moments {
    /// The point that d is measured from.
    pub about: Vector3<f64>,
    /// ∫ w.
    pub zeroth: f64,
    /// ∫ w·d.
    pub first: Vector3<f64>,
    /// ∫ w·d·dᵀ, symmetric.
    pub second: Matrix3<f64>,
}

/// A rigid placement, mirror included: x ↦ `turn`·x + `at`, with `turn` orthogonal (det ±1).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Placement {
    /// Orthogonal matrix; determinant −1 where mirrored.
    pub turn: Matrix3<f64>,
    /// Translation.
    pub at: Vector3<f64>,
}

impl Placement {
    /// Nothing moves.
    pub fn identity() -> Self {
        Self {
            turn: Matrix3::identity(),
            at: Vector3::zeros(),
        }
    }

    /// This placement applied first, then `outer` (a part's placement, then its group's).
    #[must_use]
    pub fn then(&self, outer: &Self) -> Self {
        Self {
            turn: outer.turn * self.turn,
            at: outer.turn * self.at + outer.at,
        }
    }

    /// Where the point `p` goes.
    pub fn apply(&self, p: &Vector3<f64>) -> Vector3<f64> {
        self.turn * p + self.at
    }
}

impl Moments {
    /// Nothing, held about `about`.
    pub fn zero(about: Vector3<f64>) -> Self {
        Self {
            about,
            zeroth: 0.0,
            first: Vector3::zeros(),
            second: Matrix3::zeros(),
        }
    }

    /// A point of weight `w` at `at`.
    pub fn point(at: Vector3<f64>, w: f64) -> Self {
        Self {
            zeroth: w,
            ..Self::zero(at)
        }
    }

    /// The same thing held about another point: the parallel-axis rule in its general form,
    /// valid also where `about` is not the centre.
    #[must_use]
    pub fn shifted(&self, about: Vector3<f64>) -> Self {
        let s = self.about - about;
        let first = self.first + self.zeroth * s;
        let cross = s * self.first.transpose();
        // Bracketed so that each step is symmetric to the last bit.
        let second = self.second + (cross + cross.transpose()) + self.zeroth * (s * s.transpose());
        Self {
            about,
            zeroth: self.zeroth,
            first,
            second,
        }
    }

    /// Both things together, held about this one's point.
    #[must_use]
    pub fn plus(&self, other: &Self) -> Self {
        let o = other.shifted(self.about);
        Self {
            about: self.about,
            zeroth: self.zeroth + o.zeroth,
            first: self.first + o.first,
            second: self.second + o.second,
        }
    }

    /// The weight multiplied by `k`: volume moments × density are mass moments; −1 takes away.
    #[must_use]
    pub fn weighted(&self, k: f64) -> Self {
        Self {
            about: self.about,
            zeroth: self.zeroth * k,
            first: self.first * k,
            second: self.second * k,
        }
    }

    /// All lengths multiplied by `k` > 0 with the weight per volume unchanged: k³, k⁴, k⁵. This
    /// converts volume moments from one length unit to another.
    #[must_use]
    pub fn scaled(&self, k: f64) -> Self {
        let k3 = k * k * k;
        Self {
            about: self.about * k,
            zeroth: self.zeroth * k3,
            first: self.first * (k3 * k),
            second: self.second * (k3 * k * k),
        }
    }

    /// The thing after a rigid motion or a mirroring; its weight stays.
    #[must_use]
    pub fn placed(&self, p: &Placement) -> Self {
        let second = p.turn * self.second * p.turn.transpose();
        Self {
            about: p.apply(&self.about),
            zeroth: self.zeroth,
            first: p.turn * self.first,
            // Rounding leaves the two halves an ulp apart.
            second: (second + second.transpose()) * 0.5,
        }
    }

    /// The weighted mean position, or `None` where the weight is zero or not finite.
    pub fn centre(&self) -> Option<Vector3<f64>> {
        let c = self.about + self.first / self.zeroth;
        (self.zeroth != 0.0 && c.iter().all(|x| x.is_finite())).then_some(c)
    }

    /// The inertia tensor about `about`, in the current axes: diagonal ∫(y²+z²), off-diagonal
    /// −∫xy (the tensor's own elements).
    pub fn inertia_here(&self) -> Matrix3<f64> {
        Matrix3::identity() * self.second.trace() - self.second
    }

    /// The inertia tensor about the centre, or `None` where there is none.
    pub fn inertia(&self) -> Option<Matrix3<f64>> {
        let c = self.centre()?;
        Some(self.shifted(c).inertia_here())
    }
}
