//! OFF, the object file format of the Geometry Center (manual of Geomview 1.9), as text.
//!
//! A first word of `OFF` with any of the prefixes `ST`, `C` and `N` (texture, colours, normals,
//! which are passed over), or none; counts of vertices, faces and edges (the last unused); a vertex
//! a line; a face a line: how many corners, their indices from 0, and colours that are passed
//! over. `#` begins a comment. The file names no bodies and states no unit.

use crate::error::{Error, Kind, Result};
use crate::format::chunk::{line_end, line_ending, line_of};
use crate::format::faces::Faces;
use crate::format::number::{
    MAX_COORDINATE, Written, is_blank, not_a_number, real, skip_blank, token_at, word_end,
};
use crate::mesh::{Run, Soup, Triangles};

const AGAIN: &str = "export or copy the file again";

/// Whether a first word is one of an OFF, also of the kinds that are refused.
pub(crate) fn is_keyword(word: &[u8]) -> bool {
    let Some(prefix) = word.strip_suffix(b"OFF") else {
        return word == b"OFFBIN";
    };
    let mut rest = prefix.strip_prefix(b"ST").unwrap_or(prefix);
    for letter in [b"C".as_slice(), b"N", b"4", b"n"] {
        rest = rest.strip_prefix(letter).unwrap_or(rest);
    }
    rest.is_empty()
}

/// The lines that hold something, comments cut off.
struct Lines<'a> {
    text: &'a [u8],
    at: usize,
    ending: u8,
}

impl<'a> Lines<'a> {
    /// Begin and words of the next line; none at the end.
    fn next(&mut self) -> Option<Words<'a>> {
        while self.at < self.text.len() {
            let begin = self.at;
            let end = line_end(self.text, begin, self.ending);
            self.at = end + 1;
            let line = &self.text[begin..end];
            let end = memchr::memchr(b'#', line).map_or(end, |n| begin + n);
            let first = skip_blank(&self.text[..end], begin);
            if first < end {
                return Some(Words {
                    text: self.text,
                    at: first,
                    end,
                });
            }
        }
        None
    }
}

/// The words of one line.
struct Words<'a> {
    text: &'a [u8],
    at: usize,
    end: usize,
}

impl<'a> Words<'a> {
    fn fail<T>(&self, error: Error) -> Result<T> {
        Err(error.at_line(line_of(self.text, self.at.min(self.end - 1))))
    }

    fn peek(&mut self) -> Option<&'a [u8]> {
        self.at = skip_blank(&self.text[..self.end], self.at);
        let end = word_end(&self.text[..self.end], self.at);
        (self.at < self.end).then(|| &self.text[self.at..end])
    }

    fn skip(&mut self) {
        self.at = word_end(&self.text[..self.end], self.at);
    }

    fn whole<T: std::str::FromStr>(&mut self, what: &str) -> Result<T> {
        let word = self.peek().unwrap_or_default();
        let parsed = std::str::from_utf8(word).ok().and_then(|w| w.parse().ok());
        match parsed {
            Some(n) => {
                self.skip();
                Ok(n)
            }
            None => {
                let found = if word.is_empty() {
                    "the line ends".to_owned()
                } else {
                    format!("\"{}\" stands", token_at(word, 0))
                };
                self.fail(Error::new(
                    Kind::BadNumber,
                    format!("{found} where {what} must stand"),
                    AGAIN,
                ))
            }
        }
    }

    fn coordinate(&mut self, axis: &str, written: &mut Written) -> Result<f64> {
        let word = self.peek().unwrap_or_default();
        match real(word, 0, written) {
            Some((x, end)) if end == word.len() && x.abs() <= MAX_COORDINATE => {
                self.skip();
                Ok(x)
            }
            _ => {
                let error = not_a_number(word, 0, &format!("{axis} of a vertex"));
                self.fail(error)
            }
        }
    }
}

/// Reads an OFF. Polygons are cut as those of an OBJ are.
///
/// # Errors
/// `unknown-format` for kinds that are not read, `truncated`, `count-mismatch`, `bad-number`,
/// `not-finite`, `bad-index`, `too-large` with the line, and `empty`.
pub fn parse(bytes: &[u8]) -> Result<Soup> {
    let start = if bytes.starts_with(b"\xef\xbb\xbf") {
        3
    } else {
        0
    };
    let mut lines = Lines {
        text: bytes,
        at: start,
        ending: line_ending(bytes),
    };
    let cut_off = |what: &str| {
        Error::new(
            Kind::Truncated,
            format!("the file ends before its last {what}"),
            AGAIN,
        )
        .at_line(line_of(bytes, bytes.len()))
    };
    let Some(mut head) = lines.next() else {
        return Err(Error::new(
            Kind::Empty,
            "the file holds no line but comments",
            "export the mesh again",
        ));
    };
    let mut more_a_vertex = false;
    let word = head.peek().unwrap_or_default();
    if is_keyword(word) || word.first().is_some_and(|b| !b.is_ascii_digit()) {
        more_a_vertex = keyword(&mut head, word)?;
    }
    if head.peek().is_none() {
        head = lines.next().ok_or_else(|| cut_off("count"))?;
    }
    let count: u32 = head.whole("the number of vertices")?;
    let faces_count: u64 = head.whole("the number of faces")?;
    if head.peek().is_some() {
        head.whole::<u64>("the number of edges")?;
    }
    if head.peek().is_some() || count == u32::MAX {
        return head.fail(Error::new(
            Kind::BadNumber,
            "the counts of vertices, faces and edges must stand here alone",
            AGAIN,
        ));
    }
    let rest = bytes.len() - lines.at.min(bytes.len());
    let mut written = Written::default();
    // A vertex takes six bytes at least, a face as many.
    let mut vertices = Vec::with_capacity((count as usize).min(rest / 6 + 1));
    for _ in 0..count {
        let mut line = lines.next().ok_or_else(|| cut_off("vertex"))?;
        let mut point = [0.0; 3];
        for (x, axis) in point.iter_mut().zip(["x", "y", "z"]) {
            *x = line.coordinate(axis, &mut written)?;
        }
        if line.peek().is_some() && !more_a_vertex {
            return line.fail(Error::new(
                Kind::CountMismatch,
                "a vertex of an OFF is three numbers on a line of their own",
                "a file with colours begins with COFF, one with normals with NOFF; export it again",
            ));
        }
        vertices.push(point);
    }
    let mut faces = Faces::with_room(
        usize::try_from(faces_count).map_or(rest, |n| n.min(rest / 6 + 1)),
        rest,
    );
    let mut indices = Vec::new();
    for face in 0..faces_count {
        let mut line = lines.next().ok_or_else(|| cut_off("face"))?;
        let begin = line.at;
        let size: u64 = line.whole("the number of corners of a face")?;
        indices.clear();
        for _ in 0..size {
            let index: i64 = line.whole("the index of a vertex")?;
            match u32::try_from(index) {
                Ok(index) if index < count => indices.push(index),
                _ => {
                    return line.fail(Error::new(
                        Kind::BadIndex,
                        format!(
                            "face {face} refers to vertex {index}; vertices count from 0 and there \
                             are {count}"
                        ),
                        "export or copy the file again; vertices are missing or the index is wrong",
                    ));
                }
            }
        }
        if let Err(e) = faces.push(&indices, begin) {
            return line.fail(e);
        }
    }
    if let Some(line) = lines.next() {
        return line.fail(Error::new(
            Kind::CountMismatch,
            format!("the file goes on after the {faces_count} faces that it declares"),
            "export the file again; a count is wrong",
        ));
    }
    if faces.triangles() == 0 {
        return Err(Error::new(
            Kind::Empty,
            format!("the file holds no face of three or more corners ({count} vertices)"),
            "export the mesh again with its faces; points enclose nothing",
        ));
    }
    let notes = faces.note(|at| Some(line_of(bytes, at)));
    let (corners, warped) = faces.cut(&vertices, written, Some(bytes));
    Ok(Soup {
        names: vec![None],
        runs: vec![Run {
            first: 0,
            count: corners.len(),
            name: 0,
            material: None,
        }],
        triangles: Triangles::Indexed { vertices, corners },
        warped,
        notes: notes.into_iter().collect(),
        ..Soup::default()
    })
}

/// Takes the first word; whether vertices have more than three numbers.
fn keyword(head: &mut Words<'_>, word: &[u8]) -> Result<bool> {
    let refuse = |what: &str, advice: &str| {
        Error::new(
            Kind::UnknownFormat,
            format!("{what}, which is not read"),
            advice,
        )
    };
    const TEXT: &str = "export the mesh as text OFF, or as binary PLY or STL";
    if !is_keyword(word) {
        let e = refuse(&format!("this begins with \"{}\"", token_at(word, 0)), TEXT);
        return head.fail(e);
    }
    if word == b"OFFBIN" {
        return head.fail(refuse("this is a binary OFF", TEXT));
    }
    if word.contains(&b'4') || word.contains(&b'n') {
        let e = refuse("this OFF has vertices of other than three dimensions", TEXT);
        return head.fail(e);
    }
    head.skip();
    if head
        .peek()
        .is_some_and(|w| w.eq_ignore_ascii_case(b"binary"))
    {
        return head.fail(refuse("this is a binary OFF", TEXT));
    }
    Ok(word != b"OFF")
}

/// Whether the bytes begin with a first word of an OFF.
pub(crate) fn begins(rest: &[u8]) -> bool {
    let word = &rest[..word_end(rest, 0)];
    is_keyword(word) && rest.get(word.len()).is_none_or(|&b| is_blank(b))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const CUBE: &str = "OFF # by hand\n# a cube\n8 6 0\n\n0 0 0\n1 0 0 # corner\n1 1 0\n0 1 0\n0 0 0.1\n1 0 0.1\n\
        1 1 0.1\n0 1 0.1\n4 0 3 2 1\n4 4 5 6 7 255 0 0\n4 0 1 5 4\n4 1 2 6 5\n4 2 3 7 6\n4 3 0 4 7\n";

    fn parts(soup: &Soup) -> (&[[f64; 3]], &[[u32; 3]]) {
        match &soup.triangles {
            Triangles::Indexed { vertices, corners } => (vertices, corners),
            _ => unreachable!(),
        }
    }

    #[test]
    fn variants_say_the_same() {
        let soup = parse(CUBE.as_bytes()).unwrap();
        let (vertices, corners) = parts(&soup);
        assert_eq!((vertices.len(), corners.len()), (8, 12));
        assert_eq!(vertices[6], [1.0, 1.0, 0.1]);
        let coloured = CUBE
            .replacen("OFF", "COFF", 1)
            .replace("1 0 0 # corner", "1 0 0 255 0 0 255");
        let normals = coloured.replacen("COFF", "STCNOFF", 1);
        let one_line = CUBE.replacen("OFF # by hand\n# a cube\n8 6 0", "OFF 8 6 12", 1);
        let bare = CUBE.replacen("OFF # by hand\n", "", 1);
        let two_counts = CUBE.replacen("8 6 0", "8 6", 1);
        let returns = CUBE.replace('\n', "\r");
        for text in [coloured, normals, one_line, bare, two_counts, returns] {
            let other = parse(text.as_bytes()).unwrap();
            assert_eq!(parts(&other), (vertices, corners), "{text}");
        }
    }

    #[test]
    fn faults_have_a_kind_and_a_line() {
        let e = |from: &str, to: &str| {
            assert!(CUBE.contains(from), "{from}");
            let e = parse(CUBE.replacen(from, to, 1).as_bytes()).unwrap_err();
            (e.kind, e.line)
        };
        assert_eq!(e("4 0 3 2 1", "4 0 3 2 8"), (Kind::BadIndex, Some(13)));
        assert_eq!(e("4 0 3 2 1", "4 0 3 2"), (Kind::BadNumber, Some(13)));
        assert_eq!(e("1 1 0.1", "1 1 inf"), (Kind::NotFinite, Some(11)));
        assert_eq!(e("1 1 0.1", "1 1"), (Kind::BadNumber, Some(11)));
        assert_eq!(e("1 1 0.1", "1 1 0.1 5"), (Kind::CountMismatch, Some(11)));
        assert_eq!(e("8 6 0", "8 7 0").0, Kind::Truncated);
        assert_eq!(e("8 6 0", "8 5 0"), (Kind::CountMismatch, Some(18)));
        assert_eq!(e("8 6 0", "8 x 0"), (Kind::BadNumber, Some(3)));
        assert_eq!(e("8 6 0", "4294967295 6 0"), (Kind::BadNumber, Some(3)));
        assert_eq!(
            e("8 6 0", "4294967290 99999999999 0").0,
            Kind::CountMismatch
        );
        assert_eq!(e("OFF", "OFF BINARY"), (Kind::UnknownFormat, Some(1)));
        assert_eq!(e("OFF", "4OFF"), (Kind::UnknownFormat, Some(1)));
        assert_eq!(e("OFF", "nOFF"), (Kind::UnknownFormat, Some(1)));
        assert_eq!(e("OFF", "PUFF"), (Kind::UnknownFormat, Some(1)));
        assert_eq!(parse(b"# nothing\n").unwrap_err().kind, Kind::Empty);
        assert_eq!(parse(b"OFF\n1 0 0\n0 0 0\n").unwrap_err().kind, Kind::Empty);
        assert_eq!(parse(b"OFF\n").unwrap_err().kind, Kind::Truncated);
    }

    proptest! {
        #[test]
        fn round_trip(
            vertices in prop::collection::vec(prop::array::uniform3(-1e9f64..1e9), 3..20),
            picks in prop::collection::vec(prop::array::uniform3(0u32..1000), 1..20),
        ) {
            let n = vertices.len() as u32;
            let faces: Vec<[u32; 3]> = picks.iter().map(|f| f.map(|i| i % n)).collect();
            let mut text = format!("OFF\n{n} {} 0\n", faces.len());
            for [x, y, z] in &vertices { text += &format!("{x} {y} {z:e}\n"); }
            for [a, b, c] in &faces { text += &format!("3 {a} {b} {c}\n"); }
            let soup = parse(text.as_bytes()).unwrap();
            prop_assert_eq!(parts(&soup), (&vertices[..], &faces[..]));
        }
    }
}
