//! A part of a text STL, from one `facet` line to another, and where it can be cut.

use std::ops::Range;

use rayon::prelude::*;

use super::text::{beginning, next_facet_line, read_piece, word};
use crate::error::{Error, Kind, Result};
use crate::format::chunk;
use crate::format::number::skip_blank;

/// Where a text may be cut so that every part but the last holds a whole number of `every` facets.
pub(crate) struct Cuts<'a> {
    text: &'a [u8],
    ending: u8,
    every: u64,
}

impl<'a> Cuts<'a> {
    /// Of a text STL.
    pub(crate) fn new(text: &'a [u8], every: u64) -> Self {
        Self {
            text,
            ending: chunk::line_ending(text),
            every,
        }
    }

    /// The cut at or after the byte `at`, and the number of facets before it: the same for the same
    /// text whoever asks. Lines are looked at, not read: where facets do not each begin a line,
    /// the number differs from what the parts then hold.
    pub(crate) fn after(&self, at: usize) -> (usize, u64) {
        if at == 0 {
            return (0, 0);
        }
        let end = self.text.len();
        // The first facet from here on, then as many more as the count asks for.
        let Some(mut cut) = next_facet_line(self.text, at.min(end), self.ending) else {
            return (end, self.facets_before(end));
        };
        let before = self.facets_before(cut);
        let more = before.next_multiple_of(self.every) - before;
        for done in 0..more {
            match next_facet_line(self.text, cut, self.ending) {
                Some(next) => cut = next,
                None => return (end, before + done + 1),
            }
        }
        (cut, before + more)
    }

    /// Lines before `end` whose first word is `facet`.
    fn facets_before(&self, end: usize) -> u64 {
        let pieces = chunk::pieces(&self.text[..end], chunk::PIECE, |at| {
            memchr::memchr(self.ending, &self.text[at..end]).map(|n| at + n + 1)
        });
        let of_piece = |range: &Range<usize>| {
            let piece = &self.text[range.clone()];
            let from = if range.start == 0 {
                beginning(piece)
            } else {
                0
            };
            let mut at = skip_blank(piece, from.min(piece.len()));
            let mut count = 0;
            while at < piece.len() {
                count += u64::from(word(piece, at, b"facet").is_some());
                at = skip_blank(piece, chunk::line_end(piece, at, self.ending));
            }
            count
        };
        pieces.par_iter().map(of_piece).sum()
    }
}

/// The triangles of a part that begins at the beginning of the text or at a cut, and ends at a cut
/// or at the end.
///
/// # Errors
/// As [`parse_text`](super::parse_text), with the line in the whole text; `empty` only where the
/// whole text is the part.
pub(crate) fn parse_range(text: &[u8], range: Range<usize>) -> Result<Vec<[[f64; 3]; 3]>> {
    let ending = chunk::line_ending(text);
    let part = &text[..range.end];
    let mut pieces: Vec<Range<usize>> = chunk::pieces(&part[range.start..], chunk::PIECE, |at| {
        next_facet_line(part, range.start + at, ending).map(|cut| cut - range.start)
    })
    .into_iter()
    .map(|r| r.start + range.start..r.end + range.start)
    .collect();
    if range.start == 0
        && let Some(first) = pieces.first_mut()
    {
        first.start = beginning(text).min(first.end);
    }
    let read = |r: Range<usize>| read_piece(text, r, ending).map(|piece| piece.triangles);
    let parts = chunk::read_pieces(text, &pieces, read)?;
    let all = chunk::join(parts, [[0.0; 3]; 3]);
    if all.is_empty() && range == (0..text.len()) {
        return Err(Error::new(
            Kind::Empty,
            "the file holds no triangle: no facet stands in it",
            "export the mesh again with the bodies selected",
        ));
    }
    Ok(all)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn text(facets: usize, indent: &str, end: &str) -> Vec<u8> {
        let mut out = format!("solid facet of words{end}");
        for i in 0..facets {
            if i == facets / 2 {
                out += &format!("endsolid facet{end}solid b{end}");
            }
            out += &format!(
                "{indent}facet normal 0 0 1{end}outer loop{end}vertex {i} 0 0{end}vertex 1 {i}.5 0{end}\
                 vertex 0 0 1{end}endloop{end}endfacet{end}"
            );
        }
        (out + &format!("endsolid b{end}")).into_bytes()
    }

    #[test]
    fn parts_between_cuts_hold_every_facet_once_and_in_order() {
        for (indent, end) in [("", "\n"), ("  ", "\r\n"), ("\t", "\r"), ("\n\n ", "\n")] {
            let text = text(103, indent, end);
            let whole = parse_range(&text, 0..text.len()).unwrap();
            assert_eq!(whole.len(), 103);
            let cuts = Cuts::new(&text, 8);
            for n in [1, 2, 3, 7, 40] {
                let at: Vec<_> = (0..=n).map(|k| cuts.after(text.len() * k / n)).collect();
                let mut all = Vec::new();
                for pair in at.windows(2) {
                    assert_eq!(all.len() as u64, pair[0].1);
                    assert!(pair[0].1 % 8 == 0 || pair[0].1 == 103);
                    all.extend(parse_range(&text, pair[0].0..pair[1].0).unwrap());
                }
                assert_eq!(all, whole, "{n} {indent:?} {end:?}");
                assert_eq!(at[n], (text.len(), 103));
            }
        }
    }

    #[test]
    fn a_fault_in_a_part_has_its_line_in_the_whole() {
        let text = String::from_utf8(text(40, "", "\n")).unwrap();
        let bad = text.replacen("vertex 30 0 0", "vertex x 0 0", 1);
        let line = 1 + bad[..bad.find("vertex x").unwrap()].matches('\n').count() as u64;
        let cuts = Cuts::new(bad.as_bytes(), 8);
        let (from, _) = cuts.after(bad.len() / 2);
        let e = parse_range(bad.as_bytes(), from..bad.len()).unwrap_err();
        assert_eq!((e.kind, e.line), (Kind::BadNumber, Some(line)));
    }
}
