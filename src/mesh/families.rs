//! Which shells make a body together: by name, then by depth.

use std::collections::BTreeMap;

use super::nesting::{containers, winding_number};
use super::shells::Shell;
use super::{NestedRule, Soup, each};
use crate::geometry::Corners;

/// A shell's part in a body.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Role {
    /// Index into the shells.
    pub(crate) shell: usize,
    pub(crate) part: Part,
    /// Whether its triangles count the other way round than the file has them.
    pub(crate) turned: bool,
    /// How many shells lie between it and the outer one, itself counted.
    level: u32,
    /// Whether it lies, at whatever depth, in a solid that is nested in another.
    pub(crate) in_nested: bool,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) enum Part {
    Outer,
    Void,
    /// Outward directly inside the outer shell: solid within solid.
    Nested,
    /// Inward inside a nested solid: its hollow.
    Deep,
    /// Open, inside the outer shell or around it.
    Stray,
}

impl Role {
    /// What the shell's integrals, as the file has them, are multiplied by.
    pub(crate) fn weight(&self, rule: NestedRule, facing: i8) -> f64 {
        let sign = if self.turned { -1.0 } else { 1.0 };
        match (self.part, rule) {
            (Part::Stray, _) => 0.0,
            (Part::Outer | Part::Void, _) | (_, NestedRule::Sum) => sign,
            // What lies in a solid that counts already adds nothing.
            (_, NestedRule::Union) => 0.0,
            // Solid and void take turns on the way inward, whichever way the shells face.
            (_, NestedRule::Void) => {
                let turn = if self.level.is_multiple_of(2) {
                    1.0
                } else {
                    -1.0
                };
                turn * f64::from(facing)
            }
        }
    }
}

/// Shells sorted into bodies; the outer shell first in each.
pub(crate) fn families(soup: &Soup, shells: &[Shell]) -> Vec<Vec<Role>> {
    let mut by_name: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
    for (i, s) in shells.iter().enumerate() {
        by_name.entry(s.name).or_default().push(i);
    }
    by_name
        .into_values()
        .flat_map(|of_name| of_one_name(soup, shells, &of_name))
        .collect()
}

fn of_one_name(soup: &Soup, shells: &[Shell], of_name: &[usize]) -> Vec<Vec<Role>> {
    let group: Vec<&Shell> = of_name.iter().map(|&i| &shells[i]).collect();
    if let [only] = group[..] {
        let turned = only.facing < 0;
        return vec![vec![Role {
            shell: of_name[0],
            part: Part::Outer,
            turned,
            level: 0,
            in_nested: false,
        }]];
    }
    let inside = containers(&soup.triangles, &group);
    let depth: Vec<usize> = inside.iter().map(Vec::len).collect();
    let parent = |a: usize| {
        inside[a]
            .iter()
            .copied()
            .max_by_key(|&b| (depth[b], usize::MAX - b))
    };
    let mut order: Vec<usize> = (0..group.len()).collect();
    order.sort_by_key(|&a| (depth[a], a));

    // From the outside in: (outer shell, part, level) of each shell.
    let mut place: Vec<(usize, Part, u32)> =
        (0..group.len()).map(|a| (a, Part::Outer, 0)).collect();
    let mut in_nested = vec![false; group.len()];
    // Whether a family is turned as one.
    let mut whole = vec![false; group.len()];
    for at_depth in order.chunk_by(|&a, &b| depth[a] == depth[b]) {
        for &a in at_depth {
            let Some(p) = parent(a) else {
                if let Some(around) = open_shell_around(soup, &group, a) {
                    place[a] = (around, Part::Void, 1);
                }
                continue;
            };
            let (home, part, level) = place[p];
            in_nested[a] = in_nested[p] || part == Part::Nested;
            place[a] = match part {
                Part::Nested if group[a].facing < 0 => (home, Part::Deep, level + 1),
                // Even depth opens a body, in a void as in a nested solid.
                Part::Nested | Part::Deep | Part::Void | Part::Stray => (a, Part::Outer, 0),
                Part::Outer => (home, Part::Void, 1),
            };
        }
        // The guests of a family now stand; whether they are voids depends on all of them.
        let mut guests: BTreeMap<usize, Vec<usize>> = BTreeMap::new();
        for &a in at_depth.iter().filter(|&&a| place[a].1 == Part::Void) {
            guests.entry(place[a].0).or_default().push(a);
        }
        for (home, guests) in guests {
            whole[home] = group[home].facing < 0
                && guests
                    .iter()
                    .filter(|&&a| group[a].closed())
                    .all(|&a| group[a].facing > 0);
            for a in guests {
                if group[home].closed() && (group[a].facing > 0) != whole[home] {
                    place[a].1 = Part::Nested;
                }
            }
        }
    }
    // An open shell that was found around a void may itself have found a home meanwhile.
    for a in 0..place.len() {
        let home = place[a].0;
        place[a].0 = place[home].0;
    }
    let mut bodies: BTreeMap<usize, Vec<Role>> = BTreeMap::new();
    for (a, &(home, part, level)) in place.iter().enumerate() {
        let outer = part == Part::Outer;
        let turned = if outer {
            group[a].facing < 0
        } else {
            whole[home]
        };
        let part = if outer || group[a].closed() {
            part
        } else {
            Part::Stray
        };
        bodies.entry(home).or_default().push(Role {
            shell: of_name[a],
            part,
            turned,
            level,
            in_nested: in_nested[a],
        });
    }
    let mut bodies: Vec<Vec<Role>> = bodies.into_values().collect();
    bodies
        .iter_mut()
        .for_each(|roles| roles.sort_by_key(|r| (r.part, r.shell)));
    bodies
}

/// The open shell that an inward one lies in: it is the void of a body with a hole, not a body
/// that is inside out.
fn open_shell_around(soup: &Soup, group: &[&Shell], a: usize) -> Option<usize> {
    if group[a].facing >= 0 {
        return None;
    }
    let p = each!(&soup.triangles, f => f.triangle(group[a].first as usize)[0]);
    (0..group.len()).find(|&b| {
        b != a
            && !group[b].closed()
            && (0..3).all(|k| {
                group[b].bounds[0][k] <= group[a].bounds[0][k]
                    && group[a].bounds[1][k] <= group[b].bounds[1][k]
            })
            && winding_number(&soup.triangles, group[b], &p).abs() > 0.5
    })
}
