//! The header of a PLY: what the elements are and how their values are written.

use super::AGAIN;
use crate::error::{Error, Kind, Result};
use crate::format::number::token_at;

/// Most elements and properties; each may cost a little time for each entry.
const MOST: usize = 1024;

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Encoding {
    Text,
    LittleEndian,
    BigEndian,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Scalar {
    I8,
    U8,
    I16,
    U16,
    I32,
    U32,
    F32,
    F64,
}

impl Scalar {
    fn of(name: &str) -> Option<Self> {
        Some(match name {
            "char" | "int8" => Self::I8,
            "uchar" | "uint8" => Self::U8,
            "short" | "int16" => Self::I16,
            "ushort" | "uint16" => Self::U16,
            "int" | "int32" => Self::I32,
            "uint" | "uint32" => Self::U32,
            "float" | "float32" => Self::F32,
            "double" | "float64" => Self::F64,
            _ => return None,
        })
    }

    /// Bytes of one value.
    pub(super) fn size(self) -> usize {
        match self {
            Self::I8 | Self::U8 => 1,
            Self::I16 | Self::U16 => 2,
            Self::I32 | Self::U32 | Self::F32 => 4,
            Self::F64 => 8,
        }
    }
}

#[derive(Debug)]
pub(super) struct Property {
    pub(super) name: String,
    /// Type of the value, or of the values of the list.
    pub(super) scalar: Scalar,
    /// Type of the length, of a list.
    pub(super) list: Option<Scalar>,
}

#[derive(Debug)]
pub(super) struct Element {
    pub(super) name: String,
    pub(super) count: u64,
    pub(super) properties: Vec<Property>,
    pub(super) line: u64,
}

impl Element {
    /// Bytes of the least entry in a binary file.
    pub(super) fn least_size(&self) -> usize {
        let size = |p: &Property| p.list.unwrap_or(p.scalar).size();
        self.properties.iter().map(size).sum()
    }
}

#[derive(Debug)]
pub(super) struct Header {
    pub(super) encoding: Encoding,
    pub(super) elements: Vec<Element>,
    /// Where the values begin.
    pub(super) end: usize,
}

fn bad(line: u64, message: impl Into<String>) -> Error {
    Error::new(Kind::UnknownFormat, message, AGAIN).at_line(line)
}

/// Reads the header, up to the line end after `end_header`.
pub(super) fn parse(bytes: &[u8]) -> Result<Header> {
    let mut at = 0;
    let mut number = 0;
    let mut encoding = None;
    let mut elements: Vec<Element> = Vec::new();
    // Whoever ends the first line by a carriage return alone does so with all of them.
    let first = bytes.iter().position(|b| matches!(b, b'\n' | b'\r'));
    let alone = first.is_some_and(|i| bytes[i] == b'\r' && bytes.get(i + 1) != Some(&b'\n'));
    let ending = if alone { b'\r' } else { b'\n' };
    loop {
        number += 1;
        let Some(length) = memchr::memchr(ending, &bytes[at..]) else {
            // Nothing but a header may end without a line end.
            let ends = bytes[at..].trim_ascii() == b"end_header";
            if !ends {
                return Err(Error::new(
                    Kind::Truncated,
                    "the file ends inside the header of a PLY: there is no \"end_header\"",
                    AGAIN,
                )
                .at_line(number));
            }
            at = bytes.len();
            break;
        };
        let line = String::from_utf8_lossy(&bytes[at..at + length]);
        at += length + 1;
        let words: Vec<&str> = line.split_ascii_whitespace().collect();
        match words[..] {
            ["ply"] if number == 1 => {}
            _ if number == 1 => return Err(bad(1, "a PLY begins with a line \"ply\"")),
            [] | ["comment" | "obj_info", ..] => {}
            ["format", kind, version] => {
                if encoding.is_some() {
                    return Err(bad(number, "the header states its format twice"));
                }
                encoding = Some(match kind {
                    "ascii" => Encoding::Text,
                    "binary_little_endian" => Encoding::LittleEndian,
                    "binary_big_endian" => Encoding::BigEndian,
                    other => return Err(bad(number, format!("\"{other}\" is no format of PLY"))),
                });
                if version != "1.0" {
                    return Err(bad(number, format!("PLY {version} is not read, only 1.0")));
                }
            }
            ["element", name, count] => {
                let Ok(count) = count.parse::<u64>() else {
                    return Err(Error::new(
                        Kind::BadNumber,
                        format!("\"{count}\" is not a count of the element \"{name}\""),
                        AGAIN,
                    )
                    .at_line(number));
                };
                if elements.iter().any(|e| e.name == name) {
                    return Err(bad(
                        number,
                        format!("the element \"{name}\" is declared twice"),
                    ));
                }
                elements.push(Element {
                    name: name.to_owned(),
                    count,
                    properties: Vec::new(),
                    line: number,
                });
            }
            ["property", "list", length, scalar, name] => {
                push(&mut elements, number, Some(length), scalar, name)?;
            }
            ["property", scalar, name] => push(&mut elements, number, None, scalar, name)?,
            ["end_header"] => break,
            _ => {
                let word = token_at(line.trim_start().as_bytes(), 0);
                return Err(bad(
                    number,
                    format!("\"{word}\" begins no line that a PLY header has"),
                ));
            }
        }
        let properties: usize = elements.iter().map(|e| e.properties.len()).sum();
        if elements.len() + properties > MOST {
            return Err(Error::new(
                Kind::TooLarge,
                format!("the header declares more than {MOST} elements and properties"),
                AGAIN,
            )
            .at_line(number));
        }
    }
    let Some(encoding) = encoding else {
        return Err(bad(number, "the header states no format (ascii or binary)"));
    };
    if let Some(e) = elements
        .iter()
        .find(|e| e.properties.is_empty() && e.count > 0)
    {
        return Err(bad(
            e.line,
            format!("the element \"{}\" has no properties", e.name),
        ));
    }
    Ok(Header {
        encoding,
        elements,
        end: at,
    })
}

fn push(
    elements: &mut [Element],
    line: u64,
    length: Option<&str>,
    scalar: &str,
    name: &str,
) -> Result<()> {
    let of = |word: &str| {
        Scalar::of(word).ok_or_else(|| bad(line, format!("\"{word}\" is no type of PLY")))
    };
    let list = length.map(of).transpose()?;
    if matches!(list, Some(Scalar::F32 | Scalar::F64)) {
        return Err(bad(
            line,
            format!("the list \"{name}\" has a length that is no whole number"),
        ));
    }
    let scalar = of(scalar)?;
    let Some(element) = elements.last_mut() else {
        return Err(bad(line, "a property stands before any element"));
    };
    if element.properties.iter().any(|p| p.name == name) {
        return Err(bad(
            line,
            format!("the property \"{name}\" is declared twice"),
        ));
    }
    element.properties.push(Property {
        name: name.to_owned(),
        scalar,
        list,
    });
    Ok(())
}
