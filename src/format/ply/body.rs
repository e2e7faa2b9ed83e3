//! The values of a PLY, in whichever way they are written.

use super::AGAIN;
use super::header::{Element, Property, Scalar};
use crate::error::{Error, Kind, Result};
use crate::format::chunk::{line_ending, line_of};
use crate::format::number::{self, MAX_COORDINATE, Written, not_a_number, token_at, word_end};

/// Where something stands.
#[derive(Clone, Copy)]
pub(super) enum Place<'a> {
    Line(&'a [u8], usize),
    Byte(usize),
}

impl Place<'_> {
    /// The byte.
    pub(super) fn at(self) -> usize {
        match self {
            Self::Line(_, at) | Self::Byte(at) => at,
        }
    }

    /// The error, at this place.
    pub(super) fn mark(self, error: Error) -> Error {
        match self {
            Self::Line(text, at) => error.at_line(line_of(text, at)),
            Self::Byte(at) => error.at_byte(at as u64),
        }
    }
}

/// One value after the other. An entry of an element is begun, its properties are taken in order,
/// and it is finished.
pub(super) trait Values<'a> {
    const BINARY: bool;
    fn begin(&mut self, element: &Element) -> Result<Place<'a>>;
    fn finish(&mut self) -> Result<()>;
    fn coordinate(&mut self, property: &Property, written: &mut Written) -> Result<f64>;
    /// The length of a list.
    fn length(&mut self, property: &Property) -> Result<u64>;
    /// A value of a list of indices.
    fn index(&mut self, property: &Property) -> Result<(i64, Place<'a>)>;
    fn skip(&mut self, property: &Property) -> Result<()>;
    /// Nothing may stand after the last element.
    fn end(&mut self) -> Result<()>;
}

fn cut_off(element: &str) -> Error {
    Error::new(
        Kind::Truncated,
        format!("the file ends before the last entry of its element \"{element}\""),
        AGAIN,
    )
}

fn goes_on() -> Error {
    Error::new(
        Kind::CountMismatch,
        "the file goes on after the last entry that its header declares",
        "export the file again; a count is wrong",
    )
}

fn bad_length(length: i64) -> Error {
    Error::new(
        Kind::BadNumber,
        format!("a list has a length of {length}"),
        AGAIN,
    )
}

/// Words in lines, an entry a line.
pub(super) struct Text<'a> {
    text: &'a [u8],
    at: usize,
    ending: u8,
    /// End of the line of the entry that was begun.
    end: usize,
}

impl<'a> Text<'a> {
    pub(super) fn new(text: &'a [u8], at: usize) -> Self {
        Self {
            text,
            at,
            ending: line_ending(text),
            end: at,
        }
    }

    fn fail<T>(&self, at: usize, error: Error) -> Result<T> {
        Err(error.at_line(line_of(self.text, at)))
    }

    /// The next word of the line.
    fn word(&mut self) -> Result<(usize, &'a [u8])> {
        let begin = number::skip_blank(&self.text[..self.end], self.at);
        if begin >= self.end {
            let error = Error::new(
                Kind::CountMismatch,
                "the line has fewer values than the header declares",
                AGAIN,
            );
            return self.fail(self.end.saturating_sub(1).max(self.at.min(self.end)), error);
        }
        let end = word_end(&self.text[..self.end], begin);
        self.at = end;
        Ok((begin, &self.text[begin..end]))
    }

    fn real(&mut self, what: &str, written: &mut Written) -> Result<f64> {
        let (at, word) = self.word()?;
        match number::real(self.text, at, written) {
            Some((x, end)) if end == at + word.len() && x.abs() <= MAX_COORDINATE => Ok(x),
            _ => self.fail(at, not_a_number(self.text, at, what)),
        }
    }

    fn whole(&mut self) -> Result<(i64, usize)> {
        let (at, word) = self.word()?;
        let parsed = std::str::from_utf8(word).ok().and_then(|w| w.parse().ok());
        match parsed {
            Some(n) => Ok((n, at)),
            None => {
                let error = Error::new(
                    Kind::BadNumber,
                    format!(
                        "\"{}\" is not a whole number, which must stand here",
                        token_at(self.text, at)
                    ),
                    AGAIN,
                );
                self.fail(at, error)
            }
        }
    }
}

impl<'a> Values<'a> for Text<'a> {
    const BINARY: bool = false;

    fn begin(&mut self, element: &Element) -> Result<Place<'a>> {
        let begin = number::skip_blank(self.text, self.at);
        if begin >= self.text.len() {
            return self.fail(self.text.len(), cut_off(&element.name));
        }
        self.at = begin;
        self.end = crate::format::chunk::line_end(self.text, begin, self.ending);
        Ok(Place::Line(self.text, begin))
    }

    fn finish(&mut self) -> Result<()> {
        let next = number::skip_blank(&self.text[..self.end], self.at);
        if next < self.end {
            let error = Error::new(
                Kind::CountMismatch,
                format!(
                    "the line goes on with \"{}\" after the last value that the header declares",
                    token_at(self.text, next)
                ),
                AGAIN,
            );
            return self.fail(next, error);
        }
        self.at = self.end;
        Ok(())
    }

    fn coordinate(&mut self, property: &Property, written: &mut Written) -> Result<f64> {
        self.real(&format_axis(property), written)
    }

    fn length(&mut self, _: &Property) -> Result<u64> {
        let (n, at) = self.whole()?;
        u64::try_from(n).or_else(|_| self.fail(at, bad_length(n)))
    }

    fn index(&mut self, _: &Property) -> Result<(i64, Place<'a>)> {
        let (n, at) = self.whole()?;
        Ok((n, Place::Line(self.text, at)))
    }

    fn skip(&mut self, property: &Property) -> Result<()> {
        let count = match property.list {
            Some(_) => self.length(property)?,
            None => 1,
        };
        for _ in 0..count {
            self.word()?;
        }
        Ok(())
    }

    fn end(&mut self) -> Result<()> {
        let next = number::skip_blank(self.text, self.at);
        if next < self.text.len() {
            return self.fail(next, goes_on());
        }
        Ok(())
    }
}

fn format_axis(property: &Property) -> String {
    format!("{} of a vertex", property.name)
}

/// Values of fixed sizes, one behind the other.
pub(super) struct Binary<'a, const BIG: bool> {
    bytes: &'a [u8],
    at: usize,
    element: String,
}

impl<'a, const BIG: bool> Binary<'a, BIG> {
    pub(super) fn new(bytes: &'a [u8], at: usize) -> Self {
        Self {
            bytes,
            at,
            element: String::new(),
        }
    }

    fn take<const N: usize>(&mut self) -> Result<[u8; N]> {
        let Some(found) = self.bytes[self.at..].first_chunk::<N>() else {
            return Err(cut_off(&self.element).at_byte(self.bytes.len() as u64));
        };
        self.at += N;
        let mut value = *found;
        if BIG {
            value.reverse();
        }
        Ok(value)
    }

    fn whole(&mut self, scalar: Scalar) -> Result<i64> {
        Ok(match scalar {
            Scalar::I8 => i8::from_le_bytes(self.take()?).into(),
            Scalar::U8 => u8::from_le_bytes(self.take()?).into(),
            Scalar::I16 => i16::from_le_bytes(self.take()?).into(),
            Scalar::U16 => u16::from_le_bytes(self.take()?).into(),
            Scalar::I32 => i32::from_le_bytes(self.take()?).into(),
            Scalar::U32 => u32::from_le_bytes(self.take()?).into(),
            Scalar::F32 | Scalar::F64 => {
                let at = self.at;
                let x = self.real(scalar)?;
                if x.fract() != 0.0 || x.abs() > 4e9 {
                    return Err(Error::new(
                        Kind::BadNumber,
                        format!("{x} is not a whole number, which must stand here"),
                        AGAIN,
                    )
                    .at_byte(at as u64));
                }
                x as i64
            }
        })
    }

    fn real(&mut self, scalar: Scalar) -> Result<f64> {
        Ok(match scalar {
            Scalar::F32 => f32::from_le_bytes(self.take()?).into(),
            Scalar::F64 => f64::from_le_bytes(self.take()?),
            whole => self.whole(whole)? as f64,
        })
    }
}

impl<'a, const BIG: bool> Values<'a> for Binary<'a, BIG> {
    const BINARY: bool = true;

    fn begin(&mut self, element: &Element) -> Result<Place<'a>> {
        if self.element != element.name {
            self.element.clone_from(&element.name);
        }
        Ok(Place::Byte(self.at))
    }

    fn finish(&mut self) -> Result<()> {
        Ok(())
    }

    fn coordinate(&mut self, property: &Property, _: &mut Written) -> Result<f64> {
        let at = self.at;
        let x = self.real(property.scalar)?;
        if x.abs() <= MAX_COORDINATE {
            return Ok(x);
        }
        let why = if x.is_nan() {
            "not a number"
        } else if x.is_infinite() {
            "infinite"
        } else {
            "too large for its moments to be finite"
        };
        Err(Error::new(
            Kind::NotFinite,
            format!("{} is {why}", format_axis(property)),
            "export the mesh again; the program that wrote it could not compute this coordinate",
        )
        .at_byte(at as u64))
    }

    fn length(&mut self, property: &Property) -> Result<u64> {
        let at = self.at;
        let n = self.whole(property.list.unwrap_or(property.scalar))?;
        u64::try_from(n).map_err(|_| bad_length(n).at_byte(at as u64))
    }

    fn index(&mut self, property: &Property) -> Result<(i64, Place<'a>)> {
        let at = self.at;
        Ok((self.whole(property.scalar)?, Place::Byte(at)))
    }

    fn skip(&mut self, property: &Property) -> Result<()> {
        let count = match property.list {
            Some(_) => self.length(property)?,
            None => 1,
        };
        // A length has at most 32 bits.
        let size = count.saturating_mul(property.scalar.size() as u64);
        let left = (self.bytes.len() - self.at) as u64;
        if size > left {
            return Err(cut_off(&self.element).at_byte(self.bytes.len() as u64));
        }
        self.at += size as usize;
        Ok(())
    }

    fn end(&mut self) -> Result<()> {
        if self.at < self.bytes.len() {
            return Err(goes_on().at_byte(self.at as u64));
        }
        Ok(())
    }
}
