//! The edges that are not plain: duplicates are set aside, wedges paired, the rest left open.

use std::collections::{HashMap, HashSet};

use super::Triangles;
use super::edges::Half;
use super::union::Sets;
use super::wedge::{Leaf, pair_across_solid};

/// Facets that stand in one place with others, by what is to be done with them.
#[derive(Debug, Default)]
pub(crate) struct Duplicates {
    /// Places: the facets that share three vertices, in file order, at least two each.
    pub(crate) places: Vec<Vec<u32>>,
    /// Facets that face each other, pair by pair: they add nothing.
    pub(crate) opposed: HashSet<u32>,
    /// Facets beyond the first that face the same way, with the one they repeat.
    pub(crate) surplus: HashMap<u32, u32>,
}

impl Duplicates {
    /// Finds them among the triangles that touch the given passages.
    ///
    /// A facet that repeats another has only busy edges; one that faces another and shares no
    /// busy edge with it makes a shell of just the two, which is looked for elsewhere.
    pub(crate) fn among(
        odd: &[Half],
        corners: &[[u32; 3]],
        name_of: &(dyn Fn(u32) -> u32 + Sync),
    ) -> Self {
        let mut touched: Vec<u32> = odd.iter().map(|h| h.triangle).collect();
        touched.sort_unstable();
        touched.dedup();
        let mut keyed: Vec<(u32, [u32; 3], u32)> = touched
            .into_iter()
            .map(|t| {
                let mut key = corners[t as usize];
                key.sort_unstable();
                (name_of(t), key, t)
            })
            .collect();
        keyed.sort_unstable();
        let mut found = Self::default();
        for place in keyed
            .chunk_by(|a, b| (a.0, a.1) == (b.0, b.1))
            .filter(|p| p.len() > 1)
        {
            found.add(place.iter().map(|p| p.2).collect(), corners);
        }
        found
    }

    /// Adds one place with its facets in file order.
    pub(crate) fn add(&mut self, facets: Vec<u32>, corners: &[[u32; 3]]) {
        let (even, odd): (Vec<u32>, Vec<u32>) =
            facets.iter().partition(|&&t| is_even(corners[t as usize]));
        let pairs = even.len().min(odd.len());
        // The facet that stays is the first of those that face the prevailing way.
        let more = if even.len() > odd.len() { &even } else { &odd };
        let kept = more[..more.len() - pairs].to_vec();
        self.surplus
            .extend(kept.iter().skip(1).map(|&t| (t, kept[0])));
        self.opposed
            .extend(facets.iter().filter(|t| !kept.contains(t)));
        self.places.push(facets);
    }
}

/// Whether the corners are an even permutation of their ascending order.
fn is_even(c: [u32; 3]) -> bool {
    (c[0] < c[1]) ^ (c[1] < c[2]) ^ (c[0] < c[2])
}

/// Joins triangles at the edges that are not plain, leaving out those that `left_out` names.
///
/// Two triangles of one name are joined whichever way they run. Where more meet and their
/// directions cancel, they are paired across the solid between them. Else nothing is joined.
pub(crate) fn join_at_odd_edges(
    odd: &[Half],
    triangles: &Triangles,
    corners: &[[u32; 3]],
    name_of: &(dyn Fn(u32) -> u32 + Sync),
    left_out: &dyn Fn(u32) -> bool,
    sets: &Sets,
) {
    for group in odd.chunk_by(|a, b| (a.low, a.high) == (b.low, b.high)) {
        let mut rest: Vec<(u32, Half)> = group
            .iter()
            .filter(|h| !left_out(h.triangle))
            .map(|h| (name_of(h.triangle), *h))
            .collect();
        rest.sort_unstable();
        for of_name in rest.chunk_by(|a, b| a.0 == b.0) {
            let forward = of_name.iter().filter(|(_, h)| h.forward).count();
            if of_name.len() == 2 {
                sets.join(of_name[0].1.triangle, of_name[1].1.triangle);
            } else if of_name.len() > 2 && forward * 2 == of_name.len() {
                let (low, high) = (group[0].low, group[0].high);
                let leaves: Vec<Leaf> = of_name
                    .iter()
                    .map(|(_, h)| Leaf {
                        apex: triangles.vertex(apex(corners[h.triangle as usize], low, high)),
                        forward: h.forward,
                    })
                    .collect();
                let (p, q) = (triangles.vertex(low), triangles.vertex(high));
                for (i, j) in pair_across_solid(&p, &q, &leaves) {
                    sets.join(of_name[i].1.triangle, of_name[j].1.triangle);
                }
            }
        }
    }
}

/// The corner that is neither of the two.
fn apex(c: [u32; 3], low: u32, high: u32) -> u32 {
    c.into_iter()
        .find(|&v| v != low && v != high)
        .unwrap_or(low)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn facets_of_one_place_are_told_apart() {
        let corners = [[5, 7, 9], [7, 9, 5], [5, 9, 7], [9, 5, 7], [1, 2, 3]];
        let mut d = Duplicates::default();
        d.add(vec![0, 1, 2, 3], &corners);
        // Three face one way and one the other: a pair goes, one stays, one is surplus.
        assert_eq!(d.opposed.len(), 2);
        assert_eq!(d.surplus.len(), 1);
        assert!(is_even([1, 2, 3]) && is_even([2, 3, 1]) && is_even([3, 1, 2]));
        assert!(!is_even([2, 1, 3]) && !is_even([1, 3, 2]) && !is_even([3, 2, 1]));
    }
}
