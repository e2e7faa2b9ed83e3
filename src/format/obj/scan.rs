//! First pass over an OBJ: the statements of one piece, without what the pieces before it hold.

use std::borrow::Cow;
use std::ops::Range;

use crate::error::{Error, Kind};
use crate::format::chunk::{self, Fault};
use crate::format::number::{MAX_COORDINATE, Written, not_a_number, real, token_at};

/// What one piece of the text holds.
#[derive(Default)]
pub(super) struct Piece<'a> {
    pub(super) vertices: Vec<[f64; 3]>,
    /// How finely the coordinates are written.
    pub(super) written: Written,
    /// Corners of all faces: the index in the file less 1, or, where listed in `relative`, the
    /// index (as i32) counted from the first vertex of the piece.
    pub(super) corners: Vec<u32>,
    /// Positions in `corners` of indices that were negative in the file.
    pub(super) relative: Vec<u32>,
    /// Faces of more than three corners; all others have three.
    pub(super) polygons: Vec<Polygon>,
    /// Triangles that the faces give.
    pub(super) triangles: usize,
    pub(super) names: Vec<Name<'a>>,
    pub(super) passed_over: PassedOver,
}

/// A face of more than three corners.
#[derive(Clone, Copy)]
pub(super) struct Polygon {
    /// Its first corner in [`Piece::corners`].
    pub(super) first: u32,
    /// Number of corners.
    pub(super) size: u32,
    /// Byte of its statement, from the beginning of the piece.
    pub(super) at: u32,
}

/// Which statement gives a name.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Naming {
    Object,
    Group,
    Material,
}

/// A name that begins to be in force.
pub(super) struct Name<'a> {
    /// The first triangle of the piece that it is in force for.
    pub(super) triangle: usize,
    pub(super) naming: Naming,
    pub(super) text: Cow<'a, [u8]>,
}

/// Statements that make no triangle but could be missed; each with its count and first byte.
#[derive(Default)]
pub(super) struct PassedOver {
    /// Faces of fewer than three corners.
    pub(super) faces: Option<(usize, usize)>,
    /// Curves and free-form surfaces.
    pub(super) curves: Option<(usize, usize)>,
    /// Unknown key words; at most [`UNKNOWN_KEPT`] distinct ones.
    pub(super) unknown: Vec<(String, usize)>,
}

/// How many distinct unknown key words are remembered.
pub(super) const UNKNOWN_KEPT: usize = 5;

/// A scanned piece, and the byte of the corner that was asked for.
pub(super) struct Scanned<'a> {
    pub(super) piece: Piece<'a>,
    pub(super) found: Option<usize>,
}

/// Free-form geometry: holds volume in other programs, none here.
const CURVES: &[&[u8]] = &[
    b"bmat", b"bsp", b"bzp", b"cdc", b"cdp", b"con", b"cstype", b"ctech", b"curv", b"curv2",
    b"deg", b"end", b"hole", b"parm", b"res", b"scrv", b"sp", b"step", b"stech", b"surf", b"trim",
];

/// Statements that say nothing about where the surface is.
const SKIPPED: &[&[u8]] = &[
    b"bevel",
    b"c_interp",
    b"d_interp",
    b"l",
    b"lod",
    b"maplib",
    b"mg",
    b"mtllib",
    b"p",
    b"s",
    b"shadow_obj",
    b"trace_obj",
    b"usemap",
    b"vn",
    b"vp",
    b"vt",
];

/// Whether `word` is a key word of OBJ.
pub(crate) fn is_keyword(word: &[u8]) -> bool {
    matches!(word, b"v" | b"f" | b"fo" | b"o" | b"g" | b"usemtl")
        || SKIPPED.contains(&word)
        || CURVES.contains(&word)
}

/// Where the cursor stands after blanks.
enum Next {
    /// At a word.
    Word(usize),
    /// At the end of the statement (line end, comment or end of text).
    End(usize),
}

/// Skips blanks and continued line ends inside a statement.
#[inline(always)]
fn within(text: &[u8], mut at: usize, ending: u8) -> Next {
    loop {
        match text.get(at) {
            None => return Next::End(at),
            Some(&b) if b == ending => return Next::End(at),
            Some(b'#') => return Next::End(at),
            Some(b'\\') => match continued(text, at, ending) {
                Some(next) => at = next,
                None => return Next::Word(at),
            },
            Some(&b) if b <= b' ' => at += 1,
            Some(_) => return Next::Word(at),
        }
    }
}

/// Where the statement goes on, if the `\` at `at` ends its line.
#[cold]
fn continued(text: &[u8], at: usize, ending: u8) -> Option<usize> {
    let mut end = at + 1;
    while let Some(&b) = text.get(end)
        && b != ending
        && b <= b' '
    {
        end += 1;
    }
    match text.get(end) {
        None => Some(end),
        Some(&b) if b == ending => Some(end + 1),
        Some(_) => None,
    }
}

/// The beginning of the next statement, from inside one.
#[inline]
fn skip_statement(text: &[u8], mut at: usize, ending: u8) -> usize {
    loop {
        let end = chunk::line_end(text, at, ending);
        let line = text[at..end].trim_ascii_end();
        if line.last() != Some(&b'\\') || end >= text.len() {
            return (end + 1).min(text.len());
        }
        at = end + 1;
    }
}

/// Reads the statements of `range`. It stops after the face that holds corner `stop_at`, to say
/// where that corner is.
pub(super) fn scan(
    whole: &[u8],
    range: Range<usize>,
    ending: u8,
    stop_at: usize,
) -> Result<Scanned<'_>, Fault> {
    let text = &whole[..range.end];
    let base = range.start;
    let mut piece = Piece {
        vertices: Vec::with_capacity(range.len() / 64),
        corners: Vec::with_capacity(range.len() / 12),
        ..Piece::default()
    };
    let mut at = base;
    while at < text.len() {
        let byte = text[at];
        if byte <= b' ' {
            at += 1;
            continue;
        }
        let blank_follows = text.get(at + 1).is_none_or(|&b| b <= b' ' || b == b'\\');
        // `fo` is the older spelling of `f`.
        let old = byte == b'f'
            && text.get(at + 1) == Some(&b'o')
            && text.get(at + 2).is_none_or(|&b| b <= b' ' || b == b'\\');
        at = match byte {
            b'v' if blank_follows => vertex(text, at + 1, ending, &mut piece)?,
            b'f' if blank_follows || old => {
                let first = piece.corners.len();
                let next = face(
                    text,
                    at,
                    at + 1 + usize::from(old),
                    base,
                    ending,
                    &mut piece,
                )?;
                if piece.corners.len() > stop_at {
                    let k = stop_at.saturating_sub(first);
                    let found = corner_at(text, at, k, ending);
                    return Ok(Scanned {
                        piece,
                        found: Some(found),
                    });
                }
                next
            }
            b'#' => chunk::line_end(text, at, ending),
            _ => other(text, at, ending, &mut piece),
        };
    }
    Ok(Scanned { piece, found: None })
}

/// `v x y z`; a weight or a colour after them is passed over.
#[inline]
fn vertex(text: &[u8], mut at: usize, ending: u8, piece: &mut Piece) -> Result<usize, Fault> {
    let mut vertex = [0.0; 3];
    for (axis, value) in vertex.iter_mut().enumerate() {
        let what = || format!("{} of a vertex", ["x", "y", "z"][axis]);
        let word = match within(text, at, ending) {
            Next::Word(p) => p,
            Next::End(p) => {
                let error = Error::new(
                    Kind::BadNumber,
                    format!("a vertex has {axis} numbers, where it must have 3"),
                    "export the mesh again",
                );
                return Err(Fault {
                    at: p.min(text.len().saturating_sub(1)),
                    error,
                });
            }
        };
        match real(text, word, &mut piece.written) {
            Some((x, end))
                if x.abs() <= MAX_COORDINATE
                    && text
                        .get(end)
                        .is_none_or(|&b| b <= b' ' || b == b'#' || b == b'\\') =>
            {
                *value = x;
                at = end;
            }
            _ => {
                return Err(Fault {
                    at: word,
                    error: not_a_number(text, word, &what()),
                });
            }
        }
    }
    piece.vertices.push(vertex);
    // Most lines end here; a weight or colour makes the rest of the line longer.
    if text.get(at) == Some(&ending) {
        return Ok(at + 1);
    }
    Ok(skip_statement(text, at, ending))
}

/// `f` with corners `v`, `v/vt`, `v//vn` or `v/vt/vn`.
#[inline]
fn face(
    text: &[u8],
    begin: usize,
    mut at: usize,
    base: usize,
    ending: u8,
    piece: &mut Piece,
) -> Result<usize, Fault> {
    let first = piece.corners.len();
    loop {
        let word = match within(text, at, ending) {
            Next::Word(p) => p,
            Next::End(p) => {
                at = p;
                break;
            }
        };
        let negative = text[word] == b'-';
        let digits = word + usize::from(negative);
        let mut p = digits;
        let mut index = 0u64;
        while let Some(d) = text.get(p).map(|b| b.wrapping_sub(b'0'))
            && d < 10
        {
            index = index.saturating_mul(10).saturating_add(u64::from(d));
            p += 1;
        }
        let after = p;
        while let Some(b'/' | b'0'..=b'9' | b'-') = text.get(p) {
            p += 1;
        }
        if after == digits
            || (p > after && text[after] != b'/')
            || text
                .get(p)
                .is_some_and(|&b| b > b' ' && b != b'#' && b != b'\\')
        {
            return Err(not_an_index(text, word));
        }
        at = p;
        // Indices that no file can have become the largest number, which is never in range:
        // the second pass knows how many vertices there are, and says so.
        if negative {
            let local = piece.vertices.len() as i64 - i64::try_from(index).unwrap_or(i64::MAX);
            let local = i32::try_from(local)
                .ok()
                .filter(|_| index > 0)
                .unwrap_or(i32::MIN);
            piece.relative.push(piece.corners.len() as u32);
            piece.corners.push(local as u32);
        } else {
            piece
                .corners
                .push(u32::try_from(index.wrapping_sub(1)).unwrap_or(u32::MAX));
        }
    }
    let size = piece.corners.len() - first;
    if size == 3 {
        piece.triangles += 1;
    } else if size < 3 {
        piece.corners.truncate(first);
        while piece.relative.last().is_some_and(|&r| r as usize >= first) {
            piece.relative.pop();
        }
        count(&mut piece.passed_over.faces, begin);
    } else if size > super::MAX_CORNERS {
        let error = Error::new(
            Kind::TooLarge,
            format!(
                "a polygon has {size} corners; at most {} are read",
                super::MAX_CORNERS
            ),
            "export the mesh as triangles",
        );
        return Err(Fault { at: begin, error });
    } else {
        // Pieces are shorter than 4 GiB and a corner takes two bytes, so these fit.
        piece.polygons.push(Polygon {
            first: first as u32,
            size: size as u32,
            at: (begin - base) as u32,
        });
        piece.triangles += size - 2;
    }
    Ok(match text.get(at) {
        Some(&b) if b == ending => at + 1,
        Some(_) => skip_statement(text, at, ending),
        None => at,
    })
}

fn count(of: &mut Option<(usize, usize)>, at: usize) {
    match of {
        Some((n, _)) => *n += 1,
        None => *of = Some((1, at)),
    }
}

/// Every statement that is neither `v` nor `f`.
#[inline(never)]
fn other<'a>(text: &'a [u8], at: usize, ending: u8, piece: &mut Piece<'a>) -> usize {
    let mut end = at;
    while let Some(&b) = text.get(end)
        && b > b' '
        && b != b'\\'
    {
        end += 1;
    }
    let naming = match &text[at..end] {
        b"vn" | b"vt" | b"s" => return skip_statement(text, end, ending),
        b"o" => Naming::Object,
        b"g" => Naming::Group,
        b"usemtl" => Naming::Material,
        word => {
            if CURVES.contains(&word) {
                count(&mut piece.passed_over.curves, at);
            } else if !SKIPPED.contains(&word) {
                let unknown = &mut piece.passed_over.unknown;
                if unknown.len() < UNKNOWN_KEPT {
                    let shown = token_at(text, at);
                    if unknown.iter().all(|(w, _)| *w != shown) {
                        unknown.push((shown, at));
                    }
                }
            }
            return skip_statement(text, end, ending);
        }
    };
    let next = skip_statement(text, end, ending);
    let line = &text[end..next];
    let name = if memchr::memchr(ending, line.trim_ascii()).is_some() {
        Cow::Owned(without_continuations(line, ending))
    } else {
        Cow::Borrowed(line)
    };
    piece.names.push(Name {
        triangle: piece.triangles,
        naming,
        text: name,
    });
    next
}

/// A statement over several lines as one line.
#[cold]
fn without_continuations(line: &[u8], ending: u8) -> Vec<u8> {
    let mut out = Vec::with_capacity(line.len());
    for part in line.split(|&b| b == ending) {
        let part = part.trim_ascii();
        out.extend_from_slice(part.strip_suffix(b"\\").unwrap_or(part).trim_ascii());
        out.push(b' ');
    }
    out
}

#[cold]
#[inline(never)]
fn not_an_index(text: &[u8], at: usize) -> Fault {
    let error = Error::new(
        Kind::BadNumber,
        format!("\"{}\" is not the corner of a face", token_at(text, at)),
        "a corner is v, v/vt, v//vn or v/vt/vn with whole numbers; export the mesh again",
    );
    Fault { at, error }
}

/// The byte of corner `k` of the face statement at `at`.
fn corner_at(text: &[u8], mut at: usize, k: usize, ending: u8) -> usize {
    // The key word is word 0.
    for _ in 0..=k {
        let Next::Word(word) = within(text, at, ending) else {
            break;
        };
        at = word;
        while text.get(at).is_some_and(|&b| b > b' ' && b != b'\\') {
            at += 1;
        }
    }
    match within(text, at, ending) {
        Next::Word(p) | Next::End(p) => p,
    }
}
