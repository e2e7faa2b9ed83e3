//! How far an assembly may lean before it tips, with its liquid level at every slope.

use std::f64::consts::PI;

use nalgebra::Vector3;

use super::{Service, Snapshot, State};
use crate::error::Result;
use crate::gravity::STANDARD_GRAVITY;
use crate::limits::{Judged, Limit, Measured, Tipping};
use crate::moments::Moments;
use crate::statics::{self, Stand};

/// What a state makes of limits beyond its moments.
#[derive(Clone, Copy, Debug, Default)]
pub struct Seen {
    /// Mass with all growth allowances, kg; none where nothing carries one.
    pub predicted_kg: Option<f64>,
    /// The slope at which it tips, rad, for a limit on that; none where it follows from the centre
    /// of mass as it stands.
    pub slope: Option<f64>,
}

impl Seen {
    /// The verdict on a whole of these moments, with a box of this diagonal, m.
    ///
    /// The greatest mass is held against the predicted mass, the least against the basic one: growth
    /// is not there yet.
    pub(in crate::assembly) fn judge(
        &self,
        limit: &Limit,
        moments: &Moments,
        diagonal: f64,
    ) -> Judged {
        let stated = limit.judge_whole(moments, diagonal);
        let rounding = limit.quantity.rounding(moments, diagonal);
        match (self.predicted_kg, self.slope) {
            (Some(predicted), _) if limit.quantity == Measured::Mass && limit.to.is_some() => {
                let grown = Judged {
                    basic: Some(stated.value),
                    ..limit.judge(predicted, rounding)
                };
                let below = limit.from.map(|from| stated.value - from);
                let above = limit.to.map(|to| to - predicted);
                if below < above && below.is_some() {
                    stated
                } else {
                    grown
                }
            }
            (_, Some(slope)) => limit.judge(slope, rounding),
            _ => stated,
        }
    }
}

impl Service {
    /// The centre of mass when effective gravity acts along the unit vector `down` of the
    /// assembly's axes, m: liquid finds its level at every attitude.
    ///
    /// # Errors
    /// As [`Service::at`].
    pub fn centre_when(&self, state: &State, down: &Vector3<f64>) -> Result<Vector3<f64>> {
        let size = state.effective.map_or(STANDARD_GRAVITY, |g| g.norm());
        let leaning = State {
            effective: Some(down * size),
            ..state.clone()
        };
        let total = self.at(&leaning)?.total;
        Ok(total.centre().unwrap_or(total.about))
    }

    /// What `limit` needs to know of a state beyond its moments.
    ///
    /// # Errors
    /// As [`Service::at`].
    pub fn seen(
        &self,
        limit: &Limit,
        state: &State,
        snapshot: &Snapshot,
        stand: Option<&Stand>,
    ) -> Result<Seen> {
        let slope = match (&limit.quantity, stand) {
            (Measured::Tip(tip), Some(stand)) if !self.tanks.is_empty() => {
                Some(self.slope(state, stand, tip)?)
            }
            _ => None,
        };
        Ok(Seen {
            predicted_kg: snapshot.predicted_kg,
            slope,
        })
    }

    /// The least slope at which it tips, rad; half a turn where it never does.
    fn slope(&self, state: &State, stand: &Stand, tip: &Tipping) -> Result<f64> {
        let mut centre_at = |down: &Vector3<f64>| self.centre_when(state, down);
        let least = match &tip.towards {
            Some(towards) => statics::tip_towards(stand, towards, &mut centre_at)?,
            None => statics::tip_edges(stand, &mut centre_at)?
                .into_iter()
                .filter_map(|e| e.angle)
                .min_by(f64::total_cmp),
        };
        Ok(least.unwrap_or(PI))
    }
}
