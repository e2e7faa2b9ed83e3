//! Sums of moments that keep their digits.

use nalgebra::{Matrix3, Vector3};

use crate::moments::Moments;

/// A compensated sum (Neumaier 1974): the error stays at one rounding of the result for any
/// number of terms that are not astronomically ill-conditioned.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Sum {
    sum: f64,
    lost: f64,
}

impl Sum {
    pub(super) fn add(&mut self, x: f64) {
        let sum = self.sum + x;
        self.lost += if self.sum.abs() >= x.abs() {
            (self.sum - sum) + x
        } else {
            (x - sum) + self.sum
        };
        self.sum = sum;
    }

    pub(super) fn value(self) -> f64 {
        self.sum + self.lost
    }
}

/// A compensated sum of numbers, in their order.
pub(super) fn sum(numbers: impl IntoIterator<Item = f64>) -> f64 {
    let mut total = Sum::default();
    for x in numbers {
        total.add(x);
    }
    total.value()
}

/// The sum of mass moments, held about their common centre and added in their order. Held there,
/// second moments are as small as they can be and nothing cancels later.
pub(super) fn total<'m>(things: impl Iterator<Item = &'m Moments> + Clone) -> Moments {
    let mass = sum(things.clone().map(|m| m.zeroth));
    // The first thing's point is near; offsets from it lose nothing to a far origin.
    let Some(near) = things.clone().next().map(|m| m.about) else {
        return Moments::zero(Vector3::zeros());
    };
    let first = |axis: usize| {
        sum(things
            .clone()
            .map(|m| m.zeroth * (m.about[axis] - near[axis]) + m.first[axis]))
    };
    let offset = Vector3::new(first(0), first(1), first(2)) / mass;
    let about = if offset.iter().all(|x| x.is_finite()) {
        near + offset
    } else {
        near
    };
    let shifted: Vec<Moments> = things.map(|m| m.shifted(about)).collect();
    let first = Vector3::from_fn(|r, _| sum(shifted.iter().map(|m| m.first[r])));
    let second = Matrix3::from_fn(|r, c| {
        let (r, c) = (r.min(c), r.max(c));
        sum(shifted.iter().map(|m| m.second[(r, c)]))
    });
    Moments {
        about,
        zeroth: mass,
        first,
        second,
    }
}
