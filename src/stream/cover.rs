//! Which shares of a mesh have been summed.

use std::cmp::Ordering;
use std::fmt;
use std::ops::Range;

use serde::{Deserialize, Deserializer, Serialize, Serializer, de};

/// A place in a mesh as a part of it, from 0 to 1, in lowest terms.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Share {
    k: u64,
    n: u64,
}

impl Share {
    pub(super) const BEGIN: Self = Self { k: 0, n: 1 };
    pub(super) const END: Self = Self { k: 1, n: 1 };

    /// k/n, for k ≤ n and n > 0.
    pub(super) fn new(k: u64, n: u64) -> Self {
        let (mut a, mut b) = (k, n);
        while b != 0 {
            (a, b) = (b, a % b);
        }
        Self { k: k / a, n: n / a }
    }
}

impl Ord for Share {
    fn cmp(&self, other: &Self) -> Ordering {
        let cross = |a: u64, b: u64| u128::from(a) * u128::from(b);
        cross(self.k, other.n).cmp(&cross(other.k, self.n))
    }
}

impl PartialOrd for Share {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl fmt::Display for Share {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/{}", self.k, self.n)
    }
}

impl Serialize for Share {
    fn serialize<S: Serializer>(&self, s: S) -> Result<S::Ok, S::Error> {
        [self.k, self.n].serialize(s)
    }
}

impl<'de> Deserialize<'de> for Share {
    fn deserialize<D: Deserializer<'de>>(d: D) -> Result<Self, D::Error> {
        let [k, n] = <[u64; 2]>::deserialize(d)?;
        if n == 0 || k > n {
            return Err(de::Error::custom("a share is k/n of the mesh, from 0 to 1"));
        }
        Ok(Self::new(k, n))
    }
}

/// A stretch of a mesh that has been summed. It may hold no triangle: a mesh can be cut into more
/// slices than it has chunks.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Stretch {
    pub(super) from: Share,
    pub(super) to: Share,
    /// In file order.
    pub(super) triangles: Range<u64>,
}

/// Why two lists of stretches cannot be one.
#[derive(Debug)]
pub(super) enum Clash {
    /// They share this.
    Overlap(Share, Share),
    /// One ends at the first of these triangles, and the next begins at the second.
    Seam(u64, u64),
}

/// Both lists in order, with stretches that meet made one.
pub(super) fn together(a: &[Stretch], b: &[Stretch]) -> Result<Vec<Stretch>, Clash> {
    let mut all = [a, b].concat();
    all.sort_by_key(|s| (s.from, s.to));
    let mut out: Vec<Stretch> = Vec::with_capacity(all.len());
    for next in all {
        match out.last_mut() {
            Some(last) if next.from < last.to => {
                return Err(Clash::Overlap(next.from, next.to.min(last.to)));
            }
            Some(last) if next.triangles.start < last.triangles.end => {
                return Err(Clash::Seam(last.triangles.end, next.triangles.start));
            }
            Some(last) if next.from == last.to => {
                if next.triangles.start != last.triangles.end {
                    return Err(Clash::Seam(last.triangles.end, next.triangles.start));
                }
                last.to = next.to;
                last.triangles.end = next.triangles.end;
            }
            _ => out.push(next),
        }
    }
    Ok(out)
}

/// The first stretch that is missing, if any is.
pub(super) fn gap(list: &[Stretch]) -> Option<(Share, Share)> {
    let mut at = Share::BEGIN;
    for s in list {
        if s.from > at {
            return Some((at, s.from));
        }
        at = s.to;
    }
    (at < Share::END).then_some((at, Share::END))
}
