//! What a slice comes to, to be added to the others.

use std::ops::{Add, Range};

use serde::{Deserialize, Deserializer, Serialize, Serializer, de};

use super::cover::{Clash, Share, Stretch, gap, together};
use super::kernel::{NOWHERE, Total};
use super::{Certificate, Totals};
use crate::error::{Error, Kind, Result};
use crate::moments::TotalSums;
use crate::quantity::LengthUnit;

/// Which mesh a slice is of.
///
/// Two files are taken as one where format, length and fingerprint agree. The fingerprint is the
/// SHA-256 of the length and of 64 windows of 4096 bytes, spread evenly from the first byte to the
/// last (of the whole of a file of at most 256 KiB): each slice can form it without reading what is
/// not its own. A file of the same length that differs between the windows alone is not told apart
/// by it; where the difference moves a surface across the cut of a slice, the certificate fails.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Identity {
    /// `binary stl`, `text stl`, or `triangles` for those of arrays.
    pub format: String,
    /// Length of the file, bytes.
    pub bytes: u64,
    /// In hexadecimal.
    pub fingerprint: String,
}

/// The sums of some triangles of a mesh, exact, with the certificate over them: a few hundred
/// bytes whatever the size of the slice.
///
/// Partials of one mesh add ([`Partial::plus`], `+`, [`Partial::sum`]) in any order and grouping,
/// to the same bits, because the sums of chunks are added without rounding. Serialises to JSON that
/// carries every bit. Coordinates and sums are in the file's unit.
#[derive(Clone, Debug, PartialEq)]
pub struct Partial {
    of: Identity,
    /// Triangles of the whole mesh, where this is known.
    whole: Option<u64>,
    /// What has been summed, apart from each other and ascending.
    covers: Vec<Stretch>,
    apex: [f64; 3],
    total: Total,
    /// The unit of the coordinates, where somebody has stated it.
    pub unit: Option<LengthUnit>,
}

impl Partial {
    pub(super) fn new(
        of: Identity,
        whole: Option<u64>,
        stretch: Stretch,
        apex: [f64; 3],
        total: Total,
    ) -> Self {
        Self {
            of,
            whole,
            covers: vec![stretch],
            apex,
            total,
            unit: None,
        }
    }

    /// Which mesh it is of.
    pub fn identity(&self) -> &Identity {
        &self.of
    }

    /// The ranges of triangles that it covers, in file order, ascending; empty ones of slices that
    /// hold none among them.
    pub fn ranges(&self) -> impl Iterator<Item = Range<u64>> {
        self.covers.iter().map(|s| s.triangles.clone())
    }

    /// How many triangles it covers.
    pub fn triangles(&self) -> u64 {
        self.ranges().map(|r| r.end - r.start).sum()
    }

    /// How many triangles the mesh has, where this is known: of a text only its last slice tells.
    pub fn triangles_of_mesh(&self) -> Option<u64> {
        self.whole
    }

    /// Both together.
    ///
    /// # Errors
    /// `slices` where they are of different meshes or units, or share a triangle.
    pub fn plus(&self, other: &Self) -> Result<Self> {
        let foreign = |what: String| {
            Err(Error::new(
                Kind::Slices,
                what,
                "add the slices of one file, weighed while it does not change",
            ))
        };
        if self.of != other.of {
            let what = |i: &Identity| {
                let print: String = i.fingerprint.chars().take(12).collect();
                format!("{}, {} bytes, {print}…", i.format, i.bytes)
            };
            return foreign(format!(
                "the slices are of different files: one of {}, one of {}",
                what(&self.of),
                what(&other.of)
            ));
        }
        // The same identity with another first vertex: one of them has been written by hand.
        if self.apex != other.apex || self.whole.zip(other.whole).is_some_and(|(a, b)| a != b) {
            return foreign("the slices disagree about the file that they are of".into());
        }
        if self.unit != other.unit {
            let word = |u: Option<LengthUnit>| u.map_or("no unit", LengthUnit::symbol);
            return foreign(format!(
                "the slices were weighed in different units: {} and {}",
                word(self.unit),
                word(other.unit)
            ));
        }
        let covers = match together(&self.covers, &other.covers) {
            Ok(covers) => covers,
            Err(Clash::Overlap(from, to)) => {
                return Err(Error::new(
                    Kind::Slices,
                    format!(
                        "slices overlap: what lies from {from} to {to} of the mesh is in two of them"
                    ),
                    "give each slice once; slices run from 1/N to N/N with one N",
                ));
            }
            Err(Clash::Seam(end, begin)) => {
                return Err(Error::new(
                    Kind::Slices,
                    format!(
                        "a slice ends at triangle {end}, and the next begins at triangle {begin}"
                    ),
                    "the file has changed between slices, or its facets do not each begin a line: weigh it in one piece, or as binary STL",
                ));
            }
        };
        let mut total = self.total.clone();
        total.join(&other.total);
        Ok(Self {
            of: self.of.clone(),
            whole: self.whole.or(other.whole),
            covers,
            apex: self.apex,
            total,
            unit: self.unit,
        })
    }

    /// All together.
    ///
    /// # Errors
    /// As [`Partial::plus`]; `slices` for none.
    pub fn sum<'a>(all: impl IntoIterator<Item = &'a Self>) -> Result<Self> {
        let mut all = all.into_iter();
        let first = all.next().ok_or_else(|| {
            Error::new(
                Kind::Slices,
                "there is no slice to add",
                "weigh the slices first with `bismar weigh --whole --slice K/N FILE -o PARTIAL`",
            )
        })?;
        all.try_fold(first.clone(), |sum, next| sum.plus(next))
    }

    /// The totals of the whole mesh: the bits that one process gives.
    ///
    /// # Errors
    /// `slices` where triangles are missing, with which.
    pub fn totals(&self) -> Result<Totals> {
        let missing = |what: String| {
            Error::new(
                Kind::Slices,
                what,
                "weigh the missing slice too; slices run from 1/N to N/N with one N",
            )
        };
        if let Some((from, to)) = gap(&self.covers) {
            return Err(missing(format!(
                "what lies from {from} to {to} of the mesh is in no slice"
            )));
        }
        let count = self.triangles();
        // Without a gap the last slice is there, which knows; unless it was written by hand.
        if self.whole != Some(count) {
            return Err(missing("the slices do not hold all triangles".into()));
        }
        Ok(Totals::new(count, self.apex, &self.total))
    }
}

/// Name and version of the JSON form.
pub const PARTIAL_SCHEMA: &str = "bismar/partial/1";

impl Partial {
    /// From a document of `bismar weigh --whole --slice`, or from [`Partial::to_document`].
    ///
    /// # Errors
    /// `unknown-format` where it is none, with what is wrong in it.
    pub fn from_document(text: &[u8]) -> Result<Self> {
        let fail = |what: String| {
            Error::new(
                Kind::UnknownFormat,
                what,
                "give files that `bismar weigh --whole --slice K/N FILE -o PARTIAL` wrote",
            )
        };
        let mut doc: serde_json::Value = serde_json::from_slice(text)
            .map_err(|e| fail(format!("this is no partial: it is not JSON ({e})")))?;
        if doc.get("schema").and_then(|s| s.as_str()) != Some(PARTIAL_SCHEMA) {
            return Err(fail(format!(
                "this is no partial: its \"schema\" is not \"{PARTIAL_SCHEMA}\""
            )));
        }
        // What every document carries is not the partial's own.
        if let Some(fields) = doc.as_object_mut() {
            for head in ["schema", "program", "exit", "warnings", "inputs"] {
                fields.remove(head);
            }
        }
        serde_json::from_value(doc).map_err(|e| fail(format!("this partial is damaged: {e}")))
    }

    /// As JSON that [`Partial::from_document`] and `bismar add` read.
    pub fn to_document(&self) -> String {
        let mut doc = serde_json::to_value(self).unwrap_or_default();
        if let Some(fields) = doc.as_object_mut() {
            fields.insert("schema".into(), PARTIAL_SCHEMA.into());
        }
        doc.to_string()
    }
}

impl Add for Partial {
    type Output = Result<Self>;
    fn add(self, other: Self) -> Result<Self> {
        self.plus(&other)
    }
}

impl Add<&Partial> for Result<Partial> {
    type Output = Self;
    fn add(self, other: &Partial) -> Self {
        self.and_then(|sum| sum.plus(other))
    }
}

/// The JSON form, version 1.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Written {
    of: Identity,
    triangles: Option<u64>,
    covers: Vec<Stretch>,
    unit: Option<LengthUnit>,
    apex: [f64; 3],
    bounds: Option<[[f64; 3]; 2]>,
    sums: Sums,
    certificate: [String; 2],
}

/// Numbers that add up to each sum exactly.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Sums {
    volume: Vec<f64>,
    first: [Vec<f64>; 3],
    second: [Vec<f64>; 6],
    area: Vec<f64>,
    absolute: Vec<f64>,
}

impl Serialize for Partial {
    fn serialize<S: Serializer>(&self, s: S) -> Result<S::Ok, S::Error> {
        let [volume, x, y, z, xx, yy, zz, xy, xz, yz, area, absolute] = self.total.sums.parts();
        let written = Written {
            of: self.of.clone(),
            triangles: self.whole,
            covers: self.covers.clone(),
            unit: self.unit,
            apex: self.apex,
            bounds: (self.triangles() > 0).then_some(self.total.bounds),
            sums: Sums {
                volume,
                first: [x, y, z],
                second: [xx, yy, zz, xy, xz, yz],
                area,
                absolute,
            },
            certificate: self.total.certificate.words().map(|w| format!("{w:016x}")),
        };
        written.serialize(s)
    }
}

impl<'de> Deserialize<'de> for Partial {
    fn deserialize<D: Deserializer<'de>>(d: D) -> Result<Self, D::Error> {
        let w = Written::deserialize(d)?;
        let fail = |what: &str| Err(de::Error::custom(what));
        let fine = |s: &Stretch| {
            let (from, to) = (s.triangles.start, s.triangles.end);
            // Nothing before the beginning; what reaches the end knows where that is.
            s.from < s.to
                && from <= to
                && w.triangles.is_none_or(|n| to <= n)
                && (s.from != Share::BEGIN || from == 0)
                && (s.to != Share::END || w.triangles == Some(to))
        };
        if !w.covers.iter().all(fine) || together(&w.covers, &[]).ok().as_ref() != Some(&w.covers) {
            return fail("`covers` are not ascending stretches that stand apart");
        }
        let none = w.covers.iter().all(|s| s.triangles.is_empty());
        let word = |hex: &String| {
            let plain = hex.len() == 16 && hex.bytes().all(|b| b.is_ascii_hexdigit());
            u64::from_str_radix(hex, 16).ok().filter(|_| plain)
        };
        let [Some(one), Some(two)] = w.certificate.each_ref().map(word) else {
            return fail("`certificate` is not two words of 16 hexadecimal digits");
        };
        if w.bounds.is_none() != none {
            return fail("`bounds` are there exactly where triangles are");
        }
        let Sums {
            volume,
            first: [x, y, z],
            second: [xx, yy, zz, xy, xz, yz],
            area,
            absolute,
        } = w.sums;
        let sums = [volume, x, y, z, xx, yy, zz, xy, xz, yz, area, absolute];
        Ok(Self {
            of: w.of,
            whole: w.triangles,
            covers: w.covers,
            apex: w.apex,
            total: Total {
                sums: TotalSums::from_parts(&sums),
                certificate: Certificate::from_words([one, two]),
                bounds: w.bounds.unwrap_or(NOWHERE),
            },
            unit: w.unit,
        })
    }
}
