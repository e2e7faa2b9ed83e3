//! `weigh --whole`: totals in one reading, with little memory.

use std::fs::File;
use std::io::{Cursor, Read};
use std::path::PathBuf;

use sha2::{Digest, Sha256};

use super::beside::Beside;
use super::inputs::{self, Input, MeshArgs, digest, said};
use crate::error::{Error, Kind, Result, Warning};
use crate::format::{self, Bytes, Format, HEAD};
use crate::masses::{Figures, Substance};
use crate::mesh::{ReaderNote, each};
use crate::moments::SolidIntegrals;
use crate::quantity::LengthUnit;
use crate::report::weigh::{WeighedFile, Whole};
use crate::report::{InputFact, path_hex};
use crate::stream::{self, Keys, Totals};

/// Refuses inputs that pick a body: the whole knows none.
///
/// # Errors
/// `usage`.
pub(super) fn without_picks(inputs: &[(PathBuf, Result<Input>)]) -> Result<()> {
    let picked = inputs.iter().find_map(|(path, input)| {
        let pick = input.as_ref().ok()?.pick.as_ref()?;
        Some((path, pick))
    });
    let Some((path, pick)) = picked else {
        return Ok(());
    };
    Err(Error::new(
        Kind::Usage,
        format!("--whole tells no bodies apart and cannot pick \"{pick}\""),
        "leave out --whole, or the part from # on",
    )
    .in_file(path))
}

/// Totals of one input with what is said of it.
struct Told {
    totals: Totals,
    format: Format,
    unit: Option<LengthUnit>,
    notes: Vec<ReaderNote>,
    beside: Vec<InputFact>,
    /// What was read whole, where it could be thought to stream.
    not_streamed: Option<&'static str>,
}

/// The answer about one input.
#[allow(clippy::type_complexity, reason = "what `gather` takes")]
pub(super) fn answer(
    input: &Input,
    args: &MeshArgs,
    substance: Option<&Substance>,
    about: impl Fn(LengthUnit) -> Result<Option<[f64; 3]>>,
) -> (
    Option<InputFact>,
    Result<(WeighedFile, Vec<Warning>, Vec<InputFact>)>,
) {
    // Drawn anew, so that no file can have been made to pass.
    let keys = Keys::random();
    match read(input, args, &keys) {
        Err(e) => (None, Err(e.in_file(&input.path))),
        Ok((fact, Err(e))) => (Some(fact), Err(e.in_file(&input.path))),
        Ok((fact, Ok(read))) => {
            let told = tell(&read, input, args, substance, about);
            let told = told.map(|(file, warnings)| (file, warnings, read.beside));
            (Some(fact), told)
        }
    }
}

type Reading = Result<(InputFact, Result<Told>)>;

fn read(input: &Input, args: &MeshArgs, keys: &Keys) -> Reading {
    if input.path.as_os_str() == "-" {
        return of_stream(std::io::stdin(), input, args, keys);
    }
    let is_stream = |m: std::fs::Metadata| !m.is_file() && !m.is_dir();
    if std::fs::metadata(&input.path).is_ok_and(is_stream) {
        let file = File::open(&input.path).map_err(|e| unreadable(&e))?;
        return of_stream(file, input, args, keys);
    }
    let bytes = Bytes::open(&input.path)?;
    let fact = fact_of(&bytes, input, args);
    Ok((fact, of_bytes(bytes, input, args, keys)))
}

fn fact_of(bytes: &[u8], input: &Input, args: &MeshArgs) -> InputFact {
    let hash = args.hash.then(|| digest(bytes));
    InputFact::new(&input.path, Some(bytes.len() as u64), hash)
}

fn unreadable(e: &std::io::Error) -> Error {
    Error::new(
        Kind::NotFound,
        format!("cannot read the input: {e}"),
        "check the path and the permissions",
    )
}

fn of_bytes(bytes: Bytes, input: &Input, args: &MeshArgs, keys: &Keys) -> Result<Told> {
    let packed = format::gzip::is_gzip(&bytes);
    let bytes = format::unpack(bytes, &input.path)?;
    let format = format::detect(&bytes, &input.path, args.format)?;
    if format == Format::StlBinary {
        let totals = match bytes {
            Bytes::Owned(all) => stream::of_memory(&all, keys)?,
            Bytes::Mapped(_) => {
                let file = File::open(&input.path).map_err(|e| unreadable(&e))?;
                stream::of_file(&file, keys)?
            }
        };
        return Ok(Told {
            not_streamed: packed.then_some("a packed file"),
            ..binary(totals)
        });
    }
    let beside = Beside::of(&input.path, args.hash);
    let soup = format::read_unchecked(bytes, &input.path, format, &|name| beside.open(name))?;
    let totals = each!(&soup.triangles, f => stream::of_corners(f, keys));
    Ok(Told {
        totals,
        format,
        unit: soup.unit,
        notes: soup.notes,
        beside: beside.read().into_iter().map(inputs::fact_of).collect(),
        not_streamed: match format {
            _ if packed => Some("a packed file"),
            Format::StlBinary | Format::StlText | Format::Obj => None,
            other => Some(other.family().title()),
        },
    })
}

fn binary(totals: Totals) -> Told {
    Told {
        totals,
        format: Format::StlBinary,
        unit: None,
        notes: Vec::new(),
        beside: Vec::new(),
        not_streamed: None,
    }
}

/// Binary STL goes through; text is read whole first.
fn of_stream(mut from: impl Read + Send, input: &Input, args: &MeshArgs, keys: &Keys) -> Reading {
    let mut head = Vec::with_capacity(HEAD);
    from.by_ref()
        .take(HEAD as u64)
        .read_to_end(&mut head)
        .map_err(|e| unreadable(&e))?;
    if format::head_is_binary_stl(&head) {
        let mut through = Through {
            from: Cursor::new(head).chain(from),
            bytes: 0,
            hash: args.hash.then(Sha256::new),
        };
        let totals = stream::of_stream(&mut through, keys);
        let hash = through.hash.map(|h| hex(&h.finalize()));
        let fact = InputFact::new(&input.path, Some(through.bytes), hash);
        return Ok((fact, totals.map(|(totals, _)| binary(totals))));
    }
    from.read_to_end(&mut head).map_err(|e| unreadable(&e))?;
    let fact = fact_of(&head, input, args);
    Ok((fact, of_bytes(Bytes::Owned(head), input, args, keys)))
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}

/// Counts, and hashes where asked to, what passes.
struct Through<R> {
    from: R,
    bytes: u64,
    hash: Option<Sha256>,
}

impl<R: Read> Read for Through<R> {
    fn read(&mut self, to: &mut [u8]) -> std::io::Result<usize> {
        let n = self.from.read(to)?;
        self.bytes += n as u64;
        if let Some(hash) = &mut self.hash {
            hash.update(&to[..n]);
        }
        Ok(n)
    }
}

fn tell(
    read: &Told,
    input: &Input,
    args: &MeshArgs,
    substance: Option<&Substance>,
    about: impl Fn(LengthUnit) -> Result<Option<[f64; 3]>>,
) -> Result<(WeighedFile, Vec<Warning>)> {
    let (unit, unit_assumed, mut warnings) = said(read.unit, &read.notes, input, args);
    let path = input.path.to_string_lossy().into_owned();
    if let Some(what) = read.not_streamed {
        warnings.push(Warning {
            kind: "not-streamed".to_owned(),
            message: format!("{what} is not streamed: it was read into memory whole"),
            path: Some(path.clone()),
            line: None,
            advice: "binary STL streams, from a file or from standard input".to_owned(),
        });
    }
    let (whole, turned, closed) = judge(
        &read.totals,
        unit,
        &path,
        substance,
        about(unit)?,
        &mut warnings,
    );
    let file = WeighedFile {
        path: path.clone(),
        path_hex: path_hex(&input.path),
        format: Some(read.format.name()),
        triangles: Some(read.totals.triangles),
        unit: Some(unit.symbol()),
        unit_assumed,
        error: None,
        findings: Vec::new(),
        overlap: "untested",
        bodies: None,
        turned: whole.is_some().then_some(turned),
        whole,
        whole_missing: Vec::new(),
        proved: Some(closed.then_some("edges-cancel")),
    };
    Ok((file, warnings))
}

/// What totals come to: the figures, whether the surface was turned, whether its edges cancel.
/// What speaks against them is added to the warnings, as of `path`.
pub(super) fn judge(
    totals: &Totals,
    unit: LengthUnit,
    path: &str,
    substance: Option<&Substance>,
    about: Option<[f64; 3]>,
    warnings: &mut Vec<Warning>,
) -> (Option<Whole>, bool, bool) {
    let mut warn = |kind: &str, message: &str, advice: &str| {
        warnings.push(Warning {
            kind: kind.to_owned(),
            message: message.to_owned(),
            path: Some(path.to_owned()),
            line: None,
            advice: advice.to_owned(),
        });
    };
    let closed = totals.certificate.cancels();
    let turned = closed && totals.solid.moments.zeroth < 0.0;
    let mut whole = None;
    if !closed {
        warn(
            "not-closed",
            "the directed edges do not cancel: there is no volume",
            "`bismar check` says where the surface is open",
        );
    } else if !totals.has_volume() {
        warn(
            "degenerate",
            "the surface is closed but holds no volume beyond rounding",
            "export the solid, not a sheet; `bismar check` says what there is",
        );
    } else if let Some(bounds) = &totals.bounds {
        if turned {
            warn(
                "inside-out",
                "the volume is negative: the surface faces inward as a whole, and was turned",
                "export it with its normals outward; weigh it without --whole if there are several shells",
            );
        }
        let sign = if turned { -1.0 } else { 1.0 };
        let solid = SolidIntegrals {
            moments: totals.solid.moments.weighted(sign),
            ..totals.solid
        };
        whole = Some(Whole {
            figures: Figures {
                // K about the middle of the box is not known after one reading.
                condition: None,
                ..Figures::of(&solid, bounds, unit.metres(), substance, about)
            },
            made: None,
            estimate: None,
            uncertainty: super::weigh::uncertainty(
                &solid.moments.scaled(unit.metres()),
                substance,
                None,
            ),
        });
    }
    (whole, turned, closed)
}
