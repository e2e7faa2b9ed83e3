//! From text to a quantity, with the place of every fault.

use std::ops::Range;

use num_rational::BigRational;
use num_traits::{Signed, Zero};

use super::dimension::{Dimension, SPECIFIC_WEIGHT, any_of, name_of, such_as};
use super::error::QuantityError;
use super::unit::LengthUnit;
use super::value::{Coverage, Quantity, Tolerance};
use super::{exact, symbols};
use crate::error::Kind;

/// The longest text read as a quantity, in bytes: far more than anyone writes, little enough that
/// exact arithmetic on it costs nothing.
const LONGEST: usize = 200;

/// The signs that part a value from its tolerance.
const PLUS_MINUS: [&str; 5] = ["±", "+/-", "+/\u{2212}", "+-", "+\u{2212}"];

/// A number and the unit expression after it, before it is known what they must measure.
struct Term {
    number: BigRational,
    /// `None` where the number is bare.
    unit: Option<symbols::Expression>,
    at: Range<usize>,
}

/// One text, and what it may be.
pub(super) struct Reader<'a> {
    pub(super) text: &'a str,
    pub(super) dimensions: &'a [Dimension],
    pub(super) bare: Option<LengthUnit>,
}

impl Reader<'_> {
    pub(super) fn read(&self) -> Result<(Dimension, Quantity), QuantityError> {
        let text = self.text;
        if text.len() > LONGEST {
            return Err(self.bad(
                format!("a text of {} bytes is too long for a quantity", text.len()),
                0..text.len(),
            ));
        }
        if text.trim().is_empty() {
            return Err(self.bad(
                format!(
                    "nothing stands where {} is expected",
                    any_of(self.dimensions)
                ),
                0..text.len(),
            ));
        }
        let split = PLUS_MINUS
            .iter()
            .filter_map(|s| text.find(s).map(|at| (at, at + s.len())))
            .min();
        let Some((value_end, tolerance_start)) = split else {
            let term = self.term(0..text.len())?;
            let (dimension, value) = self.value(&term)?;
            return Ok((dimension, Quantity::exact(value)));
        };
        let term = self.term(0..value_end)?;
        let (dimension, value) = self.value(&term)?;
        let tolerance = self.tolerance(tolerance_start..text.len(), &term, dimension, value)?;
        Ok((
            dimension,
            Quantity {
                value,
                tolerance: Some(tolerance),
            },
        ))
    }

    /// The number and unit in `range` of the text.
    fn term(&self, range: Range<usize>) -> Result<Term, QuantityError> {
        let at = trimmed(self.text, range);
        let part = &self.text[at.clone()];
        if part.is_empty() {
            return Err(self.bad(format!("a number is missing in `{}`", self.text.trim()), at));
        }
        let (number, used) = exact::read(part).map_err(|fault| match fault {
            exact::Fault::NotANumber => self.bad(
                format!(
                    "`{part}` does not begin with a number, where {} is expected",
                    self.wanted()
                ),
                at.clone(),
            ),
            exact::Fault::Range => self.bad(
                format!("`{part}` is outside the range of numbers held here"),
                at.clone(),
            ),
        })?;
        let rest = part[used..].trim_start();
        let rest_at = at.end - rest.len()..at.end;
        if rest.is_empty() {
            return Ok(Term {
                number,
                unit: None,
                at,
            });
        }
        if rest.starts_with([',', '\'', '_', '.', '\u{2019}'])
            || rest.starts_with(|c: char| c.is_ascii_digit())
        {
            return Err(QuantityError {
                kind: Kind::BadNumber,
                message: format!("`{part}` can be read as more than one number"),
                advice: "write a decimal point, and no commas, spaces or marks between digits"
                    .into(),
                at,
            });
        }
        let unit = symbols::read(rest).map_err(|fault| QuantityError {
            kind: Kind::Unit,
            message: format!("{} in `{}`", fault.what, self.text.trim()),
            advice: fault.advice.unwrap_or_else(|| self.advice()),
            at: rest_at.start + fault.at.start..rest_at.start + fault.at.end,
        })?;
        Ok(Term {
            number,
            unit: Some(unit),
            at,
        })
    }

    /// Which of the wanted dimensions the term is of, and its value in SI.
    fn value(&self, term: &Term) -> Result<(Dimension, f64), QuantityError> {
        let quoted = &self.text[term.at.clone()];
        let (dimension, factor) = match (&term.unit, self.bare) {
            (Some(unit), _) => {
                let found = self.dimensions.iter().find(|d| d.powers() == unit.powers);
                let dimension = found.ok_or_else(|| self.other_dimension(term, unit))?;
                (*dimension, unit.factor.clone())
            }
            (None, Some(bare)) if self.dimensions.contains(&Dimension::Length) => {
                (Dimension::Length, bare.factor())
            }
            (None, _) => {
                return Err(QuantityError {
                    kind: Kind::Unit,
                    message: format!(
                        "`{quoted}` has no unit, where {} is expected",
                        self.wanted()
                    ),
                    advice: self.advice(),
                    at: term.at.clone(),
                });
            }
        };
        if term.number.is_negative() && dimension.is_never_negative() {
            return Err(self.bad(
                format!(
                    "`{quoted}` is negative, which {} cannot be",
                    dimension.name()
                ),
                term.at.clone(),
            ));
        }
        let value = self.double(&(&term.number * factor), &term.at)?;
        Ok((dimension, value))
    }

    fn tolerance(
        &self,
        range: Range<usize>,
        of: &Term,
        dimension: Dimension,
        value: f64,
    ) -> Result<Tolerance, QuantityError> {
        let (range, coverage) = self.coverage(range)?;
        let term = self.term(range)?;
        let quoted = &self.text[term.at.clone()];
        if term.number.is_negative() {
            return Err(self.bad(
                format!("the tolerance `{quoted}` is negative"),
                term.at.clone(),
            ));
        }
        let percent = Dimension::Fraction.powers();
        let relative = dimension != Dimension::Fraction
            && term.unit.as_ref().is_some_and(|u| u.powers == percent);
        let amount = match &term.unit {
            Some(unit) if relative => {
                let whole = exact::of(value).unwrap_or_else(BigRational::zero).abs();
                if whole.is_zero() && !term.number.is_zero() {
                    return Err(QuantityError {
                        kind: Kind::Unit,
                        message: format!("`{quoted}` of zero is no tolerance"),
                        advice: format!(
                            "give the tolerance as {}, such as `{}`",
                            dimension.name(),
                            dimension.examples()[0]
                        ),
                        at: term.at,
                    });
                }
                whole * &term.number * &unit.factor
            }
            Some(unit) if unit.powers == dimension.powers() => &term.number * &unit.factor,
            Some(unit) => {
                return Err(QuantityError {
                    kind: Kind::Unit,
                    message: format!(
                        "the tolerance `{quoted}` is {}, where a percentage or {} is expected",
                        name_of(unit.powers),
                        dimension.name()
                    ),
                    advice: tolerance_advice(dimension),
                    at: term.at,
                });
            }
            None => &term.number * self.bare_tolerance(of, &term, dimension)?,
        };
        Ok(Tolerance {
            amount: self.double(&amount, &term.at)?,
            relative,
            coverage,
        })
    }

    /// The factor of a tolerance without a unit. It is a length in the bare unit if the value is
    /// one too; beside a value in another unit it could be meant in either, so it is refused.
    fn bare_tolerance(
        &self,
        of: &Term,
        term: &Term,
        dimension: Dimension,
    ) -> Result<BigRational, QuantityError> {
        let same = match (&of.unit, self.bare) {
            _ if dimension != Dimension::Length => None,
            (None, Some(bare)) => Some(bare.factor()),
            (Some(unit), Some(bare)) if unit.factor == bare.factor() => Some(bare.factor()),
            _ => None,
        };
        same.ok_or_else(|| QuantityError {
            kind: Kind::Unit,
            message: format!(
                "the tolerance `{}` has no unit, where a percentage or {} is expected",
                &self.text[term.at.clone()],
                dimension.name()
            ),
            advice: tolerance_advice(dimension),
            at: term.at.clone(),
        })
    }

    /// Takes `(k=2)` off the end of a tolerance.
    fn coverage(&self, range: Range<usize>) -> Result<(Range<usize>, Coverage), QuantityError> {
        let part = &self.text[range.clone()];
        let Some(open) = part.find('(') else {
            return Ok((range, Coverage::HalfWidth));
        };
        let at = range.start + open..range.end;
        let inside: String = part[open..]
            .chars()
            .filter(|c| !c.is_whitespace())
            .collect();
        let factor = inside
            .strip_prefix("(k=")
            .and_then(|t| t.strip_suffix(')'))
            .and_then(|t| t.parse::<f64>().ok())
            .filter(|k| k.is_finite() && *k > 0.0);
        match factor {
            Some(k) => Ok((range.start..at.start, Coverage::Standard { k })),
            None => Err(QuantityError {
                kind: Kind::BadNumber,
                message: format!(
                    "`{}` does not say how many standard deviations a tolerance covers",
                    &self.text[at.clone()]
                ),
                advice:
                    "write `(k=1)` or `(k=2)`, or leave it out for the half-width of an interval"
                        .into(),
                at,
            }),
        }
    }

    fn double(&self, value: &BigRational, at: &Range<usize>) -> Result<f64, QuantityError> {
        exact::nearest(value).ok_or_else(|| {
            self.bad(
                format!(
                    "`{}` is outside the range of numbers held here",
                    &self.text[at.clone()]
                ),
                at.clone(),
            )
        })
    }

    fn other_dimension(&self, term: &Term, unit: &symbols::Expression) -> QuantityError {
        let quoted = &self.text[term.at.clone()];
        let gravity = BigRational::new(980_665.into(), 100_000.into());
        let masslike = |d: Dimension, powers| self.dimensions.contains(&d) && unit.powers == powers;
        let advice = if masslike(Dimension::Density, SPECIFIC_WEIGHT)
            || masslike(Dimension::Mass, Dimension::Force.powers())
        {
            let (what, symbol) = if unit.powers == SPECIFIC_WEIGHT {
                ("specific weight is not density", "kg/m3")
            } else {
                ("weight is not mass", "kg")
            };
            let held = exact::nearest(&(&term.number * &unit.factor / gravity));
            let figure = held.map_or_else(String::new, |v| {
                format!(", which gives {} {symbol}", four_digits(v))
            });
            format!("{what}: divide by standard gravity, 9.80665 m/s2{figure}")
        } else {
            self.advice()
        };
        QuantityError {
            kind: Kind::Unit,
            message: format!(
                "`{quoted}` is {}, where {} is expected",
                name_of(unit.powers),
                self.wanted()
            ),
            advice,
            at: term.at.clone(),
        }
    }

    fn wanted(&self) -> String {
        any_of(self.dimensions)
    }

    fn advice(&self) -> String {
        format!(
            "write {} with its unit, {}",
            self.wanted(),
            such_as(self.dimensions)
        )
    }

    fn bad(&self, message: String, at: Range<usize>) -> QuantityError {
        QuantityError {
            kind: Kind::BadNumber,
            message,
            advice: self.advice(),
            at,
        }
    }
}

fn tolerance_advice(dimension: Dimension) -> String {
    format!(
        "write the tolerance with a unit: `± 1 %` or `± 1 {}`",
        dimension.symbol()
    )
}

/// Four significant digits, for advice.
fn four_digits(v: f64) -> String {
    let rounded: f64 = format!("{v:.3e}").parse().unwrap_or(v);
    format!("{rounded}")
}

/// `range` without the white space at its ends.
fn trimmed(text: &str, range: Range<usize>) -> Range<usize> {
    let part = &text[range.clone()];
    let start = range.start + (part.len() - part.trim_start().len());
    let end = range.end - (part.len() - part.trim_end().len());
    if start >= end {
        range.end..range.end
    } else {
        start..end
    }
}
