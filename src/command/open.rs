//! `--accept-open PERCENT`: open bodies as capped solids, or refused with the bound named.

use crate::mesh::{Body, Mesh, NestedRule, Refusal};
use crate::soundness::cap::{Estimate, NoCap, estimate};

/// Reads a percentage such as `2`, `0.5%` or `2 %`.
///
/// # Errors
/// What is wrong with it.
pub(super) fn parse_percent(text: &str) -> Result<f64, String> {
    let number = text.trim().trim_end_matches('%').trim_end();
    match number.parse::<f64>() {
        Ok(p) if p.is_finite() && p >= 0.0 => Ok(p),
        _ => Err("give a percentage of the volume, such as 2 or \"2 %\"".to_owned()),
    }
}

/// What a body that is not closed comes to.
pub(super) enum Opened {
    /// Its bound is small enough.
    Accepted(Box<Estimate>),
    /// It is not weighed; the refusal says what would have been.
    Refused(Refusal),
}

/// Judges an open body: accepted where the bound on its volume is at most `percent` of the volume.
pub(super) fn judge(
    mesh: &Mesh,
    body: &Body,
    nested: Option<NestedRule>,
    percent: Option<f64>,
    refusal: Refusal,
) -> Opened {
    if refusal.kind != "not-closed" {
        return Opened::Refused(refusal);
    }
    let said = match estimate(mesh, body, nested) {
        Ok(e) => {
            let bound = 100.0 * e.bounds.volume / e.solid.moments.zeroth;
            if percent.is_some_and(|p| bound <= p) {
                return Opened::Accepted(Box::new(e));
            }
            // Rounded up, so that the percentage named is one that would be accepted.
            let named = (bound * 1000.0).ceil() / 1000.0;
            match percent {
                Some(p) => format!(
                    "capped, its volume could be off by {named} %, more than the {p} % accepted, even if the missing surface is no larger than twice its flat cap"
                ),
                None => format!(
                    "or weigh it capped with --accept-open {named}: the volume is then within {named} % if the missing surface is no larger than twice its flat cap"
                ),
            }
        }
        Err(NoCap { reason, .. }) => match percent {
            Some(_) => format!("it cannot be capped: {reason}"),
            None => return Opened::Refused(refusal),
        },
    };
    Opened::Refused(Refusal {
        advice: format!("{}; {said}", refusal.advice),
        ..refusal
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentages_are_read_with_and_without_the_sign() {
        for text in ["2", "2%", "2 %", " 2.0 % "] {
            assert_eq!(parse_percent(text), Ok(2.0));
        }
        for text in ["", "%", "-1", "nan", "inf", "two", "2 mm"] {
            assert!(parse_percent(text).is_err(), "{text}");
        }
    }
}
