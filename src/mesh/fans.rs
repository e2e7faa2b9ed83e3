//! Vertices at which the triangles of one name form more than one fan.

use std::collections::{BTreeMap, HashMap};

use rayon::prelude::*;

use super::Triangles;
use super::boundary::Merge;
use super::buckets::{Buckets, Hash};
use super::shells::{Members, Shells};

/// A vertex with its triangles, of one name, ascending.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Pinch {
    pub(crate) vertex: u32,
    pub(crate) triangles: Vec<u32>,
}

/// All of them, by vertex, then name. A fan is what hangs together across edges at the vertex,
/// plain or not: where solids touch along a whole edge, its ends are one fan each.
pub(crate) fn pinches(triangles: &Triangles, found: &Shells) -> Vec<Pinch> {
    if all_spheres(triangles, found) {
        return Vec::new();
    }
    let names = names(found);
    let aside = !found.duplicates.opposed.is_empty() || !found.duplicates.surplus.is_empty();
    let corners = |t: usize| {
        let [a, b, c] = found.corners[t];
        let counts = a != b && b != c && c != a && !(aside && found.is_set_aside(t as u32));
        counts.then_some([[a, b, c], [b, c, a], [c, a, b]])
    };
    let n = found.corners.len();
    let mut at: Vec<(u32, u32)> = match &names {
        None => split_links::<3>(n, corners, |[v, ..]| (v, 0)),
        Some(names) => split_links::<4>(
            n,
            |t| {
                let name = names[t];
                corners(t).map(|c| c.map(|[v, a, b]| [name, v, a, b]))
            },
            |[name, v, ..]| (v, name),
        ),
    };
    if at.is_empty() {
        return Vec::new();
    }
    at.par_sort_unstable();
    let places: HashMap<(u32, u32), usize> = at.iter().enumerate().map(|(i, &k)| (k, i)).collect();
    let name_of = |t: usize| names.as_ref().map_or(0, |n| n[t]);
    let mut out: Vec<Pinch> = at
        .iter()
        .map(|&(vertex, _)| Pinch {
            vertex,
            triangles: Vec::new(),
        })
        .collect();
    for t in 0..n {
        for [v, ..] in corners(t).into_iter().flatten() {
            if let Some(&i) = places.get(&(v, name_of(t))) {
                out[i].triangles.push(t as u32);
            }
        }
    }
    out
}

/// Whether counting alone shows that there are none. With E edges of two triangles each and F
/// triangles, the fans of closed shells are Σχ + E − F = Σχ + F/2, and no shell has χ above 2; a
/// vertex of several fans counts once among the vertices. So V = 2·shells + F/2 leaves no room
/// for one (Euler's formula; it holds for shells without handles, which most parts are not).
fn all_spheres(triangles: &Triangles, found: &Shells) -> bool {
    found.odd.is_empty()
        && found.collapsed.is_empty()
        && found.names.is_none()
        && found.duplicates.places.is_empty()
        && 2 * found.shells.len() + found.corners.len() / 2 == vertices(triangles, found)
}

/// How many vertices the triangles have.
fn vertices(triangles: &Triangles, found: &Shells) -> usize {
    if let Triangles::Indexed { vertices, .. } = triangles {
        let mut used = vec![false; vertices.len()];
        for &v in found.corners.as_flattened() {
            used[v as usize] = true;
        }
        return used.iter().filter(|u| **u).count();
    }
    // A vertex is named after the first corner that it stands at.
    found
        .corners
        .as_flattened()
        .par_iter()
        .enumerate()
        .filter(|(i, v)| *i as u32 == **v)
        .count()
}

/// The name of each triangle's shell, where there are several.
fn names(found: &Shells) -> Option<Vec<u32>> {
    let mut names = found.names.clone()?;
    for shell in found.shells.iter().filter(|s| !s.joined.is_empty()) {
        if let Members::Listed(list) = &shell.members {
            for &t in list {
                names[t as usize] = shell.name;
            }
        }
    }
    Some(names)
}

/// Sorts corners into buckets by what stands before their last two words, and returns, by `key`,
/// those whose links do not hang together.
fn split_links<const W: usize>(
    n: usize,
    items: impl Fn(usize) -> Option<[[u32; W]; 3]> + Sync,
    key: impl Fn([u32; W]) -> (u32, u32) + Sync,
) -> Vec<(u32, u32)> {
    let hash = Hash::<3>::default();
    let hash = |item: &[u32; W]| {
        let (v, name) = key(*item);
        hash.of(&[v, name, 0])
    };
    let buckets = Buckets::<W>::fill_by(n, Vec::new(), items, hash);
    (0..buckets.count())
        .into_par_iter()
        .map_init(Links::default, |links, b| {
            links.clear(buckets.len(b));
            buckets.each(b, |item| links.see(key(*item), item[W - 2], item[W - 1]));
            links.split()
        })
        .flatten_iter()
        .collect()
}

/// The links of the vertices of one bucket.
#[derive(Default)]
struct Links {
    hash: Hash<3>,
    /// Open addressing: place in `keys`, plus one.
    slots: Vec<u32>,
    keys: Vec<((u32, u32), u32)>,
    /// Vertex (as a place in `keys`) and the edge of the link across from it.
    edges: Vec<(u32, [u32; 2])>,
    sorted: Vec<[u32; 2]>,
    starts: Vec<u32>,
}

impl Links {
    fn clear(&mut self, items: usize) {
        self.slots.clear();
        // At least twice the vertices, of which there are at most as many as corners.
        self.slots
            .resize((items * 2).next_power_of_two().max(16), 0);
        self.keys.clear();
        self.edges.clear();
    }

    #[inline(always)]
    fn see(&mut self, key: (u32, u32), a: u32, b: u32) {
        let mask = self.slots.len() - 1;
        let mut at = (self.hash.of(&[key.0, key.1, 0]) >> 32) as usize & mask;
        let place = loop {
            match self.slots[at] {
                0 => {
                    self.keys.push((key, 0));
                    self.slots[at] = self.keys.len() as u32;
                    break self.keys.len() - 1;
                }
                s if self.keys[s as usize - 1].0 == key => break s as usize - 1,
                _ => at = (at + 1) & mask,
            }
        };
        self.keys[place].1 += 1;
        self.edges.push((place as u32, [a, b]));
    }

    /// The vertices whose links are in pieces.
    fn split(&mut self) -> Vec<(u32, u32)> {
        self.starts.clear();
        let mut sum = 0;
        for k in &self.keys {
            self.starts.push(sum);
            sum += k.1;
        }
        self.sorted.clear();
        self.sorted.resize(self.edges.len(), [0; 2]);
        for (place, edge) in &self.edges {
            let next = &mut self.starts[*place as usize];
            self.sorted[*next as usize] = *edge;
            *next += 1;
        }
        let mut out = Vec::new();
        let mut from = 0;
        for (key, count) in &self.keys {
            let link = &self.sorted[from..from + *count as usize];
            from += *count as usize;
            if !is_ring(link) && !hangs_together(link) {
                out.push(*key);
            }
        }
        out
    }
}

/// Whether the directed edges form one ring: the plain case, told without any memory.
fn is_ring(link: &[[u32; 2]]) -> bool {
    // Looking for each next edge is quadratic; large fans go the other way.
    if link.len() > 32 {
        return false;
    }
    let first = link[0][0];
    let mut at = link[0][1];
    for _ in 1..link.len() {
        match link.iter().find(|e| e[0] == at) {
            Some(e) if at != first => at = e[1],
            _ => return false,
        }
    }
    at == first
}

/// Whether the edges, in whatever direction, are one piece.
fn hangs_together(link: &[[u32; 2]]) -> bool {
    let mut places: BTreeMap<u32, u32> = BTreeMap::new();
    for &v in link.as_flattened() {
        let next = places.len() as u32;
        places.entry(v).or_insert(next);
    }
    let mut sets = Merge::new(places.len());
    for [a, b] in link {
        sets.join(places[a], places[b]);
    }
    (0..places.len() as u32).all(|i| sets.find(i) == 0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rings_and_pieces_are_told_apart() {
        assert!(is_ring(&[[1, 2], [3, 1], [2, 3]]));
        assert!(!is_ring(&[[1, 2], [2, 1], [3, 4], [4, 3]]));
        assert!(!is_ring(&[[1, 2], [2, 3]]));
        assert!(hangs_together(&[[1, 2], [3, 2]]));
        assert!(!hangs_together(&[[1, 2], [3, 4]]));
        let wheel: Vec<[u32; 2]> = (0..100).map(|i| [i, (i + 1) % 100]).collect();
        assert!(!is_ring(&wheel) && hangs_together(&wheel));
        let two: Vec<[u32; 2]> = wheel
            .iter()
            .copied()
            .chain([[200, 201], [201, 200]])
            .collect();
        assert!(!hangs_together(&two));
    }
}
