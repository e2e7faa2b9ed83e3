//! Text cut at line ends into pieces of a fixed size, read in parallel, joined in file order.

use std::ops::Range;

use rayon::prelude::*;

use crate::error::{Error, Result};

/// Bytes of text in a piece. Fixed, so that nothing depends on the number of threads.
pub(crate) const PIECE: usize = 512 * 1024;

/// An error at a byte of a text; becomes a line when it is reported.
#[derive(Debug)]
pub(crate) struct Fault {
    /// Byte offset in the whole text.
    pub(crate) at: usize,
    /// The error, without its line.
    pub(crate) error: Error,
}

/// The byte that ends lines: a line feed, or a carriage return in a text without any line feed.
pub(crate) fn line_ending(text: &[u8]) -> u8 {
    if memchr::memchr(b'\n', text).is_some() || memchr::memchr(b'\r', text).is_none() {
        b'\n'
    } else {
        b'\r'
    }
}

/// The line (from 1) that holds the byte at `at`.
pub(crate) fn line_of(text: &[u8], at: usize) -> u64 {
    let before = &text[..at.min(text.len())];
    let ending = line_ending(text);
    1 + before
        .par_chunks(PIECE)
        .map(|c| memchr::memchr_iter(ending, c).count() as u64)
        .sum::<u64>()
}

/// Cuts `text` into pieces of about `size` bytes. `next(at)` is the first position from `at` on
/// where a piece may begin, if there is one.
pub(crate) fn pieces(
    text: &[u8],
    size: usize,
    next: impl Fn(usize) -> Option<usize>,
) -> Vec<Range<usize>> {
    let mut out = Vec::with_capacity(text.len() / size.max(1) + 1);
    let mut begin = 0;
    while text.len() - begin > size {
        match next(begin + size) {
            Some(cut) if cut > begin && cut < text.len() => {
                out.push(begin..cut);
                begin = cut;
            }
            _ => break,
        }
    }
    out.push(begin..text.len());
    out
}

/// Reads all pieces in parallel. If several fail, the fault that comes first in the file is
/// reported, with its line.
pub(crate) fn read_pieces<T: Send>(
    text: &[u8],
    pieces: &[Range<usize>],
    read: impl Fn(Range<usize>) -> Result<T, Fault> + Sync,
) -> Result<Vec<T>> {
    let all: Vec<Result<T, Fault>> = pieces.par_iter().map(|r| read(r.clone())).collect();
    all.into_iter()
        .collect::<Result<Vec<T>, Fault>>()
        .map_err(|fault| fault.error.at_line(line_of(text, fault.at)))
}

/// The end of the line that holds `at` (the position of its line end, or the end of the text).
#[inline]
pub(crate) fn line_end(text: &[u8], at: usize, ending: u8) -> usize {
    match text.get(at..).and_then(|rest| memchr::memchr(ending, rest)) {
        Some(n) => at + n,
        None => text.len(),
    }
}

/// A name as the file has it: trimmed, and what is not UTF-8 replaced; `None` if nothing is left.
pub(crate) fn name_of(bytes: &[u8]) -> Option<String> {
    let text = String::from_utf8_lossy(bytes);
    let text = text.trim_matches(|c: char| c.is_whitespace() || c.is_control());
    (!text.is_empty()).then(|| text.to_string())
}

/// Hands out one number for each distinct name, in order of first appearance.
#[derive(Debug, Default)]
pub(crate) struct Interner<K: std::hash::Hash + Eq + Clone> {
    seen: std::collections::HashMap<K, u32>,
    /// The distinct names.
    pub(crate) list: Vec<K>,
}

impl<K: std::hash::Hash + Eq + Clone> Interner<K> {
    /// The number of `name`. Names are fewer than bytes of text, and texts that would hold 2³²
    /// of them are refused earlier by the number of their vertices or facets.
    pub(crate) fn number(&mut self, name: &K) -> u32 {
        if let Some(&n) = self.seen.get(name) {
            return n;
        }
        let n = u32::try_from(self.list.len()).unwrap_or(u32::MAX);
        self.seen.insert(name.clone(), n);
        self.list.push(name.clone());
        n
    }
}

/// Adds `count` triangles of `name` and `material` to `runs`, which cover all before.
pub(crate) fn extend_runs(
    runs: &mut Vec<crate::mesh::Run>,
    count: usize,
    name: u32,
    material: Option<u32>,
) {
    if count == 0 {
        return;
    }
    match runs.last_mut() {
        Some(last) if last.name == name && last.material == material => last.count += count,
        last => {
            let first = last.map_or(0, |r| r.first + r.count);
            runs.push(crate::mesh::Run {
                first,
                count,
                name,
                material,
            });
        }
    }
}

/// The parts joined into one list, in order, copied in parallel and freed on the way.
pub(crate) fn join<T: Copy + Send + Sync>(parts: Vec<Vec<T>>, zero: T) -> Vec<T> {
    let mut out = vec![zero; parts.iter().map(Vec::len).sum()];
    let mut slices = Vec::with_capacity(parts.len());
    let mut rest = out.as_mut_slice();
    for part in parts {
        let (head, tail) = rest.split_at_mut(part.len());
        slices.push((head, part));
        rest = tail;
    }
    slices
        .into_par_iter()
        .for_each(|(to, from)| to.copy_from_slice(&from));
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pieces_cover_the_text_once() {
        let text = b"aa\nbbb\ncccc\nddddd\n";
        let cuts = pieces(text, 4, |at| {
            memchr::memchr(b'\n', &text[at..]).map(|n| at + n + 1)
        });
        assert_eq!(cuts, vec![0..7, 7..12, 12..18]);
        assert_eq!(pieces(b"", 4, |_| None), vec![0..0]);
        assert_eq!(line_of(text, 0), 1);
        assert_eq!(line_of(text, 7), 3);
        assert_eq!(line_of(b"a\rb\rc", 4), 3);
    }

    #[test]
    fn joined_in_order() {
        assert_eq!(join(vec![vec![1, 2], vec![], vec![3]], 0), vec![1, 2, 3]);
    }
}
