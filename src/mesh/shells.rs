//! Shells: triangles that hang together across edges, each with what is known of it.

use std::collections::{BTreeMap, HashMap};

use rayon::prelude::*;

use super::edges::{Half, match_edges};
use super::loops::{Loop, OpenEdge, loops};
use super::tangle::{Duplicates, join_at_odd_edges};
use super::union::Sets;
use super::weld::weld;
use super::{Soup, each};
use crate::error::Result;
use crate::geometry::{Corners, Select, exact_volume_sign};
use crate::moments::{SolidIntegrals, integrate};

/// A set of triangles of a mesh, ascending.
#[derive(Clone, Debug)]
pub(crate) enum Members {
    All,
    Listed(Vec<u32>),
}

impl Members {
    pub(crate) fn select(&self) -> Select<'_> {
        match self {
            Self::All => Select::All,
            Self::Listed(list) => Select::List(list),
        }
    }
}

/// One shell.
#[derive(Clone, Debug)]
pub(crate) struct Shell {
    /// Index into the soup's names.
    pub(crate) name: u32,
    /// All names that were joined to make it, where more than one, in file order.
    pub(crate) joined: Vec<u32>,
    /// Its triangles.
    pub(crate) members: Members,
    /// How many they are.
    pub(crate) count: usize,
    /// The first of them.
    pub(crate) first: u32,
    /// Edges at which the passages do not cancel.
    pub(crate) open: Vec<OpenEdge>,
    /// Those edges strung together.
    pub(crate) loops: Vec<Loop>,
    /// Same-facing facets in it of which none could be dropped.
    pub(crate) doubled: Vec<u32>,
    /// Lower and upper corner (file unit).
    pub(crate) bounds: [[f64; 3]; 2],
    /// Integrals about its first vertex; meaningful where it is closed.
    pub(crate) solid: SolidIntegrals,
    /// +1 where it faces outward, −1 inward, 0 where its volume is exactly zero or it is open.
    pub(crate) facing: i8,
}

impl Shell {
    pub(crate) fn closed(&self) -> bool {
        self.open.is_empty()
    }

    /// Σ|imbalance| over undirected edges.
    pub(crate) fn open_edges(&self) -> u64 {
        self.open.iter().map(|e| u64::from(e.surplus)).sum()
    }
}

/// What matching the edges of a soup found.
#[derive(Debug)]
pub(crate) struct Shells {
    pub(crate) corners: Vec<[u32; 3]>,
    pub(crate) shells: Vec<Shell>,
    /// Passages along edges that are not plain.
    pub(crate) odd: Vec<Half>,
    pub(crate) duplicates: Duplicates,
    /// Same-facing duplicates that were dropped, ascending.
    pub(crate) dropped: Vec<u32>,
    /// Triangles in which two corners are one vertex, ascending.
    pub(crate) collapsed: Vec<u32>,
    /// Name of each triangle, where there are several.
    pub(crate) names: Option<Vec<u32>>,
}

impl Shells {
    /// Name of a triangle, as an index into the soup's names.
    pub(crate) fn name_of(&self, t: u32) -> u32 {
        self.names.as_ref().map_or(0, |n| n[t as usize])
    }

    /// Whether the facet was set aside as a duplicate.
    pub(crate) fn is_set_aside(&self, t: u32) -> bool {
        self.duplicates.opposed.contains(&t) || self.duplicates.surplus.contains_key(&t)
    }

    /// Welds the soup and finds its shells.
    pub(crate) fn of(soup: &Soup) -> Result<Self> {
        let (corners, scratch) = weld(&soup.triangles)?;
        let n = corners.len();
        let names = (soup.names.len() > 1).then(|| {
            let mut names = vec![0u32; n];
            for run in &soup.runs {
                names[run.first..run.first + run.count].fill(run.name);
            }
            names
        });
        let name_of = |t: u32| names.as_ref().map_or(0, |n| n[t as usize]);
        let mut sets = Sets::new(n);
        let odd = match_edges(&corners, &name_of, &sets, scratch);
        let mut duplicates = Duplicates::among(&odd, &corners, &name_of);
        // Facets that stand twice and stay, with those that they repeat.
        let mut doubled: Vec<u32> = Vec::new();
        if !odd.is_empty() {
            let plain = (!duplicates.surplus.is_empty()).then(|| sets.copy());
            let join = |sets: &Sets, left_out: &dyn Fn(u32) -> bool| {
                join_at_odd_edges(&odd, &soup.triangles, &corners, &name_of, left_out, sets);
            };
            let left_out =
                |t: u32| duplicates.opposed.contains(&t) || duplicates.surplus.contains_key(&t);
            join(&sets, &left_out);
            if let Some(plain) = plain {
                let open = open_edges(&odd, &left_out, &sets);
                let restored: Vec<(u32, u32)> = duplicates
                    .surplus
                    .iter()
                    .filter(|(_, kept)| open.contains_key(&sets.find(**kept)))
                    .map(|(&t, &kept)| (t, kept))
                    .collect();
                doubled = restored.iter().flat_map(|&(t, kept)| [t, kept]).collect();
                doubled.sort_unstable();
                doubled.dedup();
                if !restored.is_empty() {
                    // Dropping them closes nothing: they stay, and the shell says so.
                    sets = plain;
                    for (t, _) in &restored {
                        duplicates.surplus.remove(t);
                    }
                    let left_out = |t: u32| {
                        duplicates.opposed.contains(&t) || duplicates.surplus.contains_key(&t)
                    };
                    join(&sets, &left_out);
                }
            }
        }
        let collapsed: Vec<u32> = (0..n as u32)
            .into_par_iter()
            .filter(|&t| {
                let c = corners[t as usize];
                c[0] == c[1] || c[1] == c[2] || c[2] == c[0]
            })
            .collect();
        let mut groups = group(&sets, n, &collapsed, &duplicates);
        // A closed shell of two facets is one facet and its opposite.
        groups.retain(|(first, members)| {
            let two = match members {
                Members::All => (0..n as u32)
                    .filter(|t| collapsed.binary_search(t).is_err())
                    .take(3)
                    .collect(),
                Members::Listed(list) => list[..list.len().min(3)].to_vec(),
            };
            if two.len() != 2 || odd.iter().any(|h| h.triangle == *first) {
                return true;
            }
            duplicates.add(two, &corners);
            false
        });
        let left_out =
            |t: u32| duplicates.opposed.contains(&t) || duplicates.surplus.contains_key(&t);
        let mut open = open_edges(&odd, &left_out, &sets);
        let drafts: Vec<Draft> = groups
            .into_iter()
            .map(|(first, members)| Draft {
                name: name_of(first),
                joined: Vec::new(),
                open: open.remove(&first).unwrap_or_default(),
                doubled: doubled
                    .iter()
                    .copied()
                    .filter(|&t| sets.find(t) == first)
                    .collect(),
                // The whole file is measured from its first vertex, as a single reading of it is,
                // even where its first triangles have collapsed.
                first: if matches!(members, Members::All) {
                    0
                } else {
                    first
                },
                members,
            })
            .collect();
        let drafts = join_names(drafts);
        let shells = drafts.into_par_iter().map(|d| d.finish(soup)).collect();
        let mut dropped: Vec<u32> = duplicates.surplus.keys().copied().collect();
        dropped.sort_unstable();
        Ok(Self {
            corners,
            shells,
            odd,
            duplicates,
            dropped,
            collapsed,
            names,
        })
    }
}

/// The triangles of each set, by least member; left out are collapsed and set-aside ones.
fn group(sets: &Sets, n: usize, collapsed: &[u32], duplicates: &Duplicates) -> Vec<(u32, Members)> {
    let label: Vec<u32> = (0..n as u32)
        .into_par_iter()
        .map(|t| sets.find(t))
        .collect();
    let aside = duplicates.opposed.len() + duplicates.surplus.len();
    let Some(&root) = label.first() else {
        return Vec::new();
    };
    if aside == 0 && collapsed.is_empty() && label.par_iter().all(|&l| l == root) {
        return vec![(root, Members::All)];
    }
    let mut left_out: Vec<u32> = collapsed.to_vec();
    left_out.extend(&duplicates.opposed);
    left_out.extend(duplicates.surplus.keys());
    left_out.sort_unstable();
    left_out.dedup();
    let mut sizes = vec![0u32; n];
    let mut skip = left_out.iter().copied().peekable();
    let is_left_out = |t: u32, skip: &mut std::iter::Peekable<_>| {
        if skip.peek() == Some(&t) {
            skip.next().is_some()
        } else {
            false
        }
    };
    for (t, &l) in (0..).zip(&label) {
        if !is_left_out(t, &mut skip) {
            sizes[l as usize] += 1;
        }
    }
    // The number of the group in place of its size, where a label has one.
    let mut groups: Vec<(u32, Vec<u32>)> = Vec::new();
    for (l, size) in (0u32..).zip(sizes.iter_mut()).filter(|(_, s)| **s > 0) {
        let list = Vec::with_capacity(*size as usize);
        *size = groups.len() as u32;
        groups.push((l, list));
    }
    let mut skip = left_out.iter().copied().peekable();
    for (t, &l) in (0..).zip(&label) {
        if !is_left_out(t, &mut skip) {
            groups[sizes[l as usize] as usize].1.push(t);
        }
    }
    if let [(l, list)] = &groups[..]
        && aside == 0
        && list.len() + collapsed.len() == n
    {
        // Collapsed triangles add exactly zero: the whole file is the one shell.
        return vec![(*l, Members::All)];
    }
    groups
        .into_iter()
        .map(|(l, list)| (l, Members::Listed(list)))
        .collect()
}

/// The unbalanced edges of each shell, by its label.
fn open_edges(
    odd: &[Half],
    left_out: &dyn Fn(u32) -> bool,
    sets: &Sets,
) -> HashMap<u32, Vec<OpenEdge>> {
    let mut open: HashMap<u32, Vec<OpenEdge>> = HashMap::new();
    for group in odd.chunk_by(|a, b| (a.low, a.high) == (b.low, b.high)) {
        let mut by_shell: BTreeMap<u32, (i64, Vec<u32>)> = BTreeMap::new();
        for h in group.iter().filter(|h| !left_out(h.triangle)) {
            let entry = by_shell.entry(sets.find(h.triangle)).or_default();
            entry.0 += if h.forward { 1 } else { -1 };
            entry.1.push(h.triangle);
        }
        for (shell, (net, triangles)) in by_shell.into_iter().filter(|(_, (net, _))| *net != 0) {
            let (low, high) = (group[0].low, group[0].high);
            let (from, to) = if net > 0 { (low, high) } else { (high, low) };
            let surplus = net.unsigned_abs() as u32;
            open.entry(shell).or_default().push(OpenEdge {
                from,
                to,
                surplus,
                triangles,
            });
        }
    }
    open
}

/// A shell before it is measured.
struct Draft {
    name: u32,
    joined: Vec<u32>,
    members: Members,
    first: u32,
    open: Vec<OpenEdge>,
    doubled: Vec<u32>,
}

/// Joins open shells of different names that close together. The joined shell takes the name of
/// its first triangle; names are listed in file order.
fn join_names(drafts: Vec<Draft>) -> Vec<Draft> {
    let mut at_edge: BTreeMap<(u32, u32), Vec<(usize, i64)>> = BTreeMap::new();
    for (i, d) in drafts.iter().enumerate() {
        for e in &d.open {
            let net = if e.from < e.to { 1 } else { -1 } * i64::from(e.surplus);
            at_edge
                .entry((e.from.min(e.to), e.from.max(e.to)))
                .or_default()
                .push((i, net));
        }
    }
    let sets = Sets::new(drafts.len());
    let mut joined_any = false;
    for list in at_edge.values() {
        for (k, a) in list.iter().enumerate() {
            for b in &list[k + 1..] {
                if a.1.signum() != b.1.signum() && drafts[a.0].name != drafts[b.0].name {
                    sets.join(a.0 as u32, b.0 as u32);
                    joined_any = true;
                }
            }
        }
    }
    if !joined_any {
        return drafts;
    }
    // A family closes when at each of its edges the passages cancel.
    let mut fails = vec![false; drafts.len()];
    for list in at_edge.values() {
        let mut net: BTreeMap<u32, i64> = BTreeMap::new();
        for &(i, n) in list {
            *net.entry(sets.find(i as u32)).or_default() += n;
        }
        for (family, _) in net.into_iter().filter(|(_, n)| *n != 0) {
            fails[family as usize] = true;
        }
    }
    let mut families: BTreeMap<u32, Vec<Draft>> = BTreeMap::new();
    for (i, d) in drafts.into_iter().enumerate() {
        let family = sets.find(i as u32);
        let key = if fails[family as usize] {
            i as u32
        } else {
            family
        };
        families.entry(key).or_default().push(d);
    }
    let mut out: Vec<Draft> = families.into_values().map(merge).collect();
    out.sort_by_key(|d| d.first);
    out
}

fn merge(mut family: Vec<Draft>) -> Draft {
    if family.len() == 1 {
        return family.remove(0);
    }
    family.sort_by_key(|d| d.first);
    let mut list: Vec<u32> = Vec::new();
    let mut joined: Vec<u32> = Vec::new();
    for d in &family {
        if let Members::Listed(l) = &d.members {
            list.extend(l);
        }
        if !joined.contains(&d.name) {
            joined.push(d.name);
        }
    }
    list.sort_unstable();
    let doubled = family
        .iter()
        .flat_map(|d| d.doubled.iter().copied())
        .collect();
    let first = &family[0];
    Draft {
        name: first.name,
        first: first.first,
        joined,
        members: Members::Listed(list),
        open: Vec::new(),
        doubled,
    }
}

impl Draft {
    fn finish(self, soup: &Soup) -> Shell {
        each!(&soup.triangles, f => {
            let select = self.members.select();
            let count = select.len(f.count());
            let bounds = bounds(f, select);
            let apex = f.triangle(self.first as usize)[0];
            let solid = integrate(f, select, apex, middle(&bounds));
            let facing = if self.open.is_empty() { facing(f, select, &solid) } else { 0 };
            Shell {
                name: self.name,
                joined: self.joined,
                count,
                first: self.first,
                loops: loops(&self.open),
                open: self.open,
                doubled: self.doubled,
                bounds,
                solid,
                facing,
                members: self.members,
            }
        })
    }
}

/// Middle of a box.
pub(crate) fn middle(bounds: &[[f64; 3]; 2]) -> [f64; 3] {
    [0, 1, 2].map(|k| bounds[0][k] + (bounds[1][k] - bounds[0][k]) / 2.0)
}

/// Which way a closed shell faces: by its volume where that is certain, else exactly.
fn facing(f: &impl Corners, select: Select<'_>, solid: &SolidIntegrals) -> i8 {
    // The volume's error is a few ulp of K (see `integrate`); a million times that is certain.
    if solid.moments.zeroth.abs() > 1e-9 * solid.absolute_volume {
        if solid.moments.zeroth > 0.0 { 1 } else { -1 }
    } else {
        exact_volume_sign(f, select)
    }
}

/// The box around the chosen triangles.
pub(crate) fn bounds(f: &impl Corners, select: Select<'_>) -> [[f64; 3]; 2] {
    const EMPTY: [[f64; 3]; 2] = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    let n = select.len(f.count());
    let block = |k: usize| {
        let mut b = EMPTY;
        for i in k * 4096..n.min((k + 1) * 4096) {
            for p in f.triangle(select.get(i)) {
                for a in 0..3 {
                    // Coordinates are no NaN; plain comparisons are one instruction each.
                    if p[a] < b[0][a] {
                        b[0][a] = p[a];
                    }
                    if p[a] > b[1][a] {
                        b[1][a] = p[a];
                    }
                }
            }
        }
        b
    };
    let wider = |a: [[f64; 3]; 2], b: [[f64; 3]; 2]| {
        [
            [0, 1, 2].map(|k| a[0][k].min(b[0][k])),
            [0, 1, 2].map(|k| a[1][k].max(b[1][k])),
        ]
    };
    let blocks = n.div_ceil(4096);
    let b = if blocks < 2 {
        block(0)
    } else {
        (0..blocks)
            .into_par_iter()
            .map(block)
            .reduce(|| EMPTY, wider)
    };
    // −0 would be shown as such.
    b.map(|p| p.map(|x| x + 0.0))
}
