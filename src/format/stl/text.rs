//! Text STL, read in parallel pieces that begin at `facet` lines.

use std::ops::Range;

use crate::error::{Error, Kind, Result};
use crate::format::chunk::{self, Fault, Interner};
use crate::format::number::{
    MAX_COORDINATE, Written, is_blank, not_a_number, real, skip_blank, token_at, word_end,
};
use crate::mesh::{ReaderNote, Soup, Triangles};

/// Where the text begins, after a byte-order mark and blanks.
pub(super) fn beginning(bytes: &[u8]) -> usize {
    let start = if bytes.starts_with(b"\xef\xbb\xbf") {
        3
    } else {
        0
    };
    skip_blank(bytes, start)
}

/// Whether the first word is `solid` or `facet`, and the first kilobyte is text. Binary files
/// have a NUL there: the high byte of a count below 2²⁴, or of a short header.
pub(super) fn looks_like(bytes: &[u8]) -> bool {
    let at = beginning(&bytes[..bytes.len().min(4096)]);
    let first = word(bytes, at, b"solid").or_else(|| word(bytes, at, b"facet"));
    first.is_some() && memchr::memchr(0, &bytes[..bytes.len().min(1024)]).is_none()
}

/// Reads a text STL. Each `solid` block is a name; blocks of one name are one entry of
/// [`Soup::names`]. Normals are not kept. Key words may be in any case; numbers are the f64
/// nearest to what is written.
///
/// # Errors
/// `bad-number`, `not-finite`, `count-mismatch` (a facet without three corners), `truncated`,
/// `unknown-format` (a word that no STL has) and `empty`, each with its line.
pub fn parse(bytes: &[u8]) -> Result<Soup> {
    let start = beginning(bytes);
    let ending = chunk::line_ending(bytes);
    let mut pieces = chunk::pieces(bytes, chunk::PIECE, |at| next_facet_line(bytes, at, ending));
    if let Some(first) = pieces.first_mut() {
        first.start = start.min(first.end);
    }
    let parts = chunk::read_pieces(bytes, &pieces, |range| read_piece(bytes, range, ending))?;

    let mut names = Interner::default();
    let mut runs = Vec::new();
    let mut current = None;
    let mut ended = false;
    for part in &parts {
        let mut done = 0;
        let mut advance = |to: usize, name: &Option<String>| {
            if to > done {
                chunk::extend_runs(&mut runs, to - done, names.number(name), None);
                done = to;
            }
        };
        for event in &part.events {
            advance(event.triangle, &current);
            current = event.name.and_then(chunk::name_of);
            ended = event.name.is_none();
        }
        advance(part.triangles.len(), &current);
        if part
            .events
            .last()
            .is_none_or(|e| e.triangle < part.triangles.len())
        {
            ended = false;
        }
    }
    let triangles = chunk::join(
        parts.into_iter().map(|p| p.triangles).collect(),
        [[0.0; 3]; 3],
    );
    if triangles.is_empty() {
        return Err(Error::new(
            Kind::Empty,
            "the file holds no triangle: no facet stands in it",
            "export the mesh again with the bodies selected",
        ));
    }
    let mut notes = Vec::new();
    if !ended {
        notes.push(ReaderNote {
            kind: "endsolid-missing",
            message: "the text does not end with endsolid; all complete facets were read".into(),
            line: Some(chunk::line_of(bytes, bytes.len())),
            advice: "if the file may have been cut off, export or copy it again",
        });
    }
    Ok(Soup {
        triangles: Triangles::Loose(triangles),
        names: names.list,
        runs,
        notes,
        ..Soup::default()
    })
}

/// A `solid` (with its name) or `endsolid` (without) before a triangle of the piece.
struct Event<'a> {
    triangle: usize,
    name: Option<&'a [u8]>,
}

pub(super) struct Piece<'a> {
    pub(super) triangles: Vec<[[f64; 3]; 3]>,
    events: Vec<Event<'a>>,
}

/// The beginning of the next line after `at` whose first word is `facet`. No such line can be
/// the name of a solid, so a piece that begins there begins between facets (or inside one that
/// lacks its end, which is an error either way).
pub(super) fn next_facet_line(text: &[u8], mut at: usize, ending: u8) -> Option<usize> {
    loop {
        at = chunk::line_end(text, at, ending);
        let first = skip_blank(text, at);
        if first >= text.len() {
            return None;
        }
        if word(text, first, b"facet").is_some() {
            return Some(first);
        }
        at = first;
    }
}

/// The end of the word `expected` (lower case) at `at`, if it stands there alone, in any case.
#[inline(always)]
pub(super) fn word(text: &[u8], at: usize, expected: &[u8]) -> Option<usize> {
    let end = at + expected.len();
    let found = text.get(at..end)?;
    if found != expected && !found.eq_ignore_ascii_case(expected) {
        return None;
    }
    text.get(end).is_none_or(|&b| is_blank(b)).then_some(end)
}

pub(super) fn read_piece(text: &[u8], range: Range<usize>, ending: u8) -> Result<Piece<'_>, Fault> {
    let last = range.end == text.len();
    // The piece alone, so that a facet cannot run on into the next one.
    let piece = &text[..range.end];
    let mut out = Piece {
        triangles: Vec::with_capacity(range.len() / 240),
        events: Vec::new(),
    };
    let mut at = skip_blank(piece, range.start);
    while at < piece.len() {
        if let Some(end) = word(piece, at, b"facet") {
            let (triangle, next) = facet(piece, at, end, ending, last)?;
            out.triangles.push(triangle);
            at = skip_blank(piece, next);
        } else {
            let (name, end) = if let Some(end) = word(piece, at, b"endsolid") {
                (None, end)
            } else if let Some(end) = word(piece, at, b"solid") {
                (Some(end), end)
            } else if let Some(end) = word(piece, at, b"end") {
                (None, end)
            } else {
                return Err(stranger(piece, at, last));
            };
            let stop = chunk::line_end(piece, end, ending);
            out.events.push(Event {
                triangle: out.triangles.len(),
                name: name.map(|from| &piece[from..stop]),
            });
            at = skip_blank(piece, stop);
        }
    }
    Ok(out)
}

/// One facet, whose first word ends at `at`, and where it ends.
#[inline]
fn facet(
    text: &[u8],
    begin: usize,
    at: usize,
    ending: u8,
    last: bool,
) -> Result<([[f64; 3]; 3], usize), Fault> {
    // Usually the normal ends its line; it is not read.
    let mut p = skip_blank(text, chunk::line_end(text, at, ending));
    let mut outer = word(text, p, b"outer");
    if outer.is_none() {
        p = skip_blank(text, at);
        for _ in 0..6 {
            outer = word(text, p, b"outer");
            if outer.is_some() || p >= text.len() {
                break;
            }
            p = skip_blank(text, word_end(text, p));
        }
    }
    let Some(end) = outer else {
        return Err(unfinished(text, begin, p, 0, last));
    };
    p = skip_blank(text, end);
    p = word(text, p, b"loop").ok_or_else(|| unfinished(text, begin, p, 0, last))?;
    let mut corners = [[0.0; 3]; 3];
    for (k, corner) in corners.iter_mut().enumerate() {
        p = skip_blank(text, p);
        p = word(text, p, b"vertex").ok_or_else(|| unfinished(text, begin, p, k, last))?;
        for (axis, value) in corner.iter_mut().enumerate() {
            p = skip_blank(text, p);
            match real(text, p, &mut Written::default()) {
                Some((x, end))
                    if x.abs() <= MAX_COORDINATE && text.get(end).is_none_or(|&b| is_blank(b)) =>
                {
                    *value = x;
                    p = end;
                }
                _ => return Err(bad_coordinate(text, begin, p, axis, k, last)),
            }
        }
    }
    p = skip_blank(text, p);
    p = word(text, p, b"endloop").ok_or_else(|| unfinished(text, begin, p, 3, last))?;
    p = skip_blank(text, p);
    p = word(text, p, b"endfacet").ok_or_else(|| unfinished(text, begin, p, 3, last))?;
    Ok((corners, p))
}

/// The words inside a facet.
const WORDS: [&[u8]; 5] = [b"outer", b"loop", b"vertex", b"endloop", b"endfacet"];

fn cut_off(text: &[u8], begin: usize) -> Fault {
    let error = Error::new(
        Kind::Truncated,
        format!(
            "the text ends inside a facet that begins {} bytes before",
            text.len() - begin
        ),
        "export or copy the file again; triangles are missing",
    );
    Fault {
        at: text.len(),
        error,
    }
}

#[cold]
#[inline(never)]
fn bad_coordinate(
    text: &[u8],
    begin: usize,
    at: usize,
    axis: usize,
    corner: usize,
    last: bool,
) -> Fault {
    if last && word_end(text, at) >= text.len() {
        return cut_off(text, begin);
    }
    let what = format!("{} of corner {corner} of a facet", ["x", "y", "z"][axis]);
    Fault {
        at,
        error: not_a_number(text, at, &what),
    }
}

/// Something else than the next word of a facet that has `corners` corners so far.
#[cold]
#[inline(never)]
fn unfinished(text: &[u8], begin: usize, at: usize, corners: usize, last: bool) -> Fault {
    // A beginning of a word at the end of the text was cut; a whole word is in the wrong place.
    let end = word_end(text, at);
    let begun = |word: &[u8]| {
        let found = &text[at.min(end)..end];
        word.len() > found.len() && word[..found.len()].eq_ignore_ascii_case(found)
    };
    if last && end >= text.len() && WORDS.iter().any(|w| begun(w)) {
        return cut_off(text, begin);
    }
    let found = if at >= text.len() {
        "facet".to_string()
    } else {
        token_at(text, at)
    };
    let message = if corners == 3 && word(text, at, b"vertex").is_some() {
        "a facet has more than 3 corners".to_string()
    } else if corners == 3 {
        format!("\"{found}\" stands where a facet must end")
    } else {
        format!("a facet has {corners} corners before \"{found}\", where it must have 3")
    };
    let error = Error::new(
        Kind::CountMismatch,
        message,
        "a facet is: facet normal, outer loop, three vertex lines, endloop, endfacet; export the \
         mesh again",
    );
    Fault { at, error }
}

#[cold]
#[inline(never)]
fn stranger(text: &[u8], at: usize, last: bool) -> Fault {
    let end = word_end(text, at);
    let found = &text[at..end];
    let begun =
        |word: &[u8]| word.len() > found.len() && word[..found.len()].eq_ignore_ascii_case(found);
    if last && end >= text.len() && (begun(b"endsolid") || begun(b"facet") || begun(b"solid")) {
        return cut_off(text, at);
    }
    let error = Error::new(
        Kind::UnknownFormat,
        format!(
            "\"{}\" stands where a text STL has facet, solid or endsolid",
            token_at(text, at)
        ),
        "export the mesh again as binary STL, text STL or OBJ",
    );
    Fault { at, error }
}
