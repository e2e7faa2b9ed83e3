//! Figures that follow from the moments of the whole, with their exact derivatives.

use crate::moments::Moments;

/// A figure of the whole that a limit may be on. Moments are given about the centre of mass of the
/// whole as stated.
pub trait Figure: Sync {
    /// Its value.
    fn value(&self, whole: &Moments) -> f64;

    /// Its derivative when the moments of the whole, about the point that they are held about,
    /// change at this rate.
    fn slope(&self, whole: &Moments, rate: &Moments) -> f64;
}

/// The mass, kg.
#[derive(Clone, Copy, Debug)]
pub struct Mass;

impl Figure for Mass {
    fn value(&self, whole: &Moments) -> f64 {
        whole.zeroth
    }

    fn slope(&self, _: &Moments, rate: &Moments) -> f64 {
        rate.zeroth
    }
}

/// A component of the centre of mass, 0 to 2 for x to z, m.
#[derive(Clone, Copy, Debug)]
pub struct Centre(pub usize);

impl Figure for Centre {
    fn value(&self, whole: &Moments) -> f64 {
        whole.about[self.0] + whole.first[self.0] / whole.zeroth
    }

    /// X = ∫x dm / M, so dX = (d∫x dm − X dM)/M, with x and X measured from where it is held.
    fn slope(&self, whole: &Moments, rate: &Moments) -> f64 {
        let rate = rate.shifted(whole.about);
        let x = whole.first[self.0] / whole.zeroth;
        (rate.first[self.0] - x * rate.zeroth) / whole.zeroth
    }
}
