//! Bodies: an outer shell with its voids, named, and either weighable or refused.

use std::collections::{BTreeMap, HashSet};

use super::families::{Part, Role, families};
use super::shells::{Members, Shell, Shells, middle};
use super::{Soup, each};

use crate::error::Result;
use crate::geometry::Corners;
use crate::moments::{SolidIntegrals, integrate};

/// A welded mesh with its bodies, in file order.
#[derive(Debug)]
pub struct Mesh {
    /// What the file holds.
    pub soup: Soup,
    pub(crate) found: Shells,
    bodies: Vec<Body>,
    pub(super) joined: Option<super::Joined>,
}

/// An outer shell and what lies directly inside it.
#[derive(Clone, Debug)]
pub struct Body {
    /// Unique and deterministic: the name, then `name/2`, `name/3`; unnamed: the file's stem.
    pub id: String,
    /// The file's own name.
    pub name: Option<String>,
    /// Materials that the file gives its triangles (`usemtl`), in order of appearance.
    pub materials: Vec<String>,
    /// Number of triangles.
    pub triangles: usize,
    /// Lower and upper corner (file unit).
    pub bounds: [[f64; 3]; 2],
    /// Whether the directed edges of every shell cancel.
    pub closed: bool,
    /// Whether the file has it inside out and it was turned.
    pub turned: bool,
    /// Names that were joined to close it, where more than one.
    pub joined: Vec<String>,
    /// Outer shell first, then voids, then solids nested in it, then open shells in it.
    pub(crate) shells: Vec<Role>,
    pub(crate) members: Members,
    pub(crate) first: u32,
    solid: Option<SolidIntegrals>,
}

/// How solid within solid is counted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NestedRule {
    /// Both count: the overlap twice.
    Sum,
    /// The overlap once: the inner shell adds nothing.
    Union,
    /// The inner shell is a void.
    Void,
}

/// Why a body cannot be weighed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Refusal {
    /// `not-closed`, `duplicate`, `nested-solid` or `degenerate`.
    pub kind: &'static str,
    /// Σ|imbalance| over undirected edges.
    pub open_edges: u64,
    /// Number of boundary loops.
    pub loops: usize,
    /// What to do about it.
    pub advice: String,
}

impl Mesh {
    /// Welds a soup and finds its bodies. `stem` names bodies that the file leaves unnamed.
    ///
    /// # Errors
    /// `too-large` past [`MOST_TRIANGLES`](super::MOST_TRIANGLES).
    pub fn new(soup: Soup, stem: &str) -> Result<Self> {
        let found = Shells::of(&soup)?;
        let mut drafts = families(&soup, &found.shells);
        drafts.sort_by_key(|d| d.iter().map(|r| found.shells[r.shell].first).min());
        let mut ids = Ids::default();
        let bodies = drafts
            .into_iter()
            .map(|roles| body(&soup, &found, roles, stem, &mut ids));
        let bodies = bodies.collect();
        Ok(Self {
            soup,
            found,
            bodies,
            joined: None,
        })
    }

    /// The bodies, in file order.
    pub fn bodies(&self) -> &[Body] {
        &self.bodies
    }

    /// The box around all triangles (file unit); `None` for none.
    pub fn bounds(&self) -> Option<[[f64; 3]; 2]> {
        (self.soup.triangles.count() > 0)
            .then(|| each!(&self.soup.triangles, f => super::shells::bounds(f, crate::geometry::Select::All)))
    }

    /// Volume integrals of a body by the rule for nested solids, in the file's unit, or why there
    /// are none.
    ///
    /// # Errors
    /// The refusal: open shells, facets doubled beyond mending, nested solids without a rule, or
    /// a volume of exactly zero.
    pub fn solid(
        &self,
        body: &Body,
        nested: Option<NestedRule>,
    ) -> Result<SolidIntegrals, Refusal> {
        if let Some(refusal) = self.refusal(body, nested) {
            return Err(refusal);
        }
        Ok(self.solid_by(body, nested.unwrap_or(NestedRule::Sum)))
    }

    fn refusal(&self, body: &Body, nested: Option<NestedRule>) -> Option<Refusal> {
        let shells = || body.shells.iter().map(|r| &self.found.shells[r.shell]);
        let open_edges: u64 = shells().map(Shell::open_edges).sum();
        let loops: usize = shells().map(|s| s.loops.len()).sum();
        let refuse = |kind, advice: String| {
            Some(Refusal {
                kind,
                open_edges,
                loops,
                advice,
            })
        };
        // First, since it is said of open bodies too: their edges tell how open they are.
        if shells().any(|s| !s.doubled.is_empty()) {
            return refuse(
                "duplicate",
                if open_edges > 0 {
                    "facets stand twice, and the surface is open with or without the second ones: remove them, close the surface, and export again; `bismar check` lists the places"
                } else {
                    "facets stand twice where dropping one would open the surface: remove the solid that is drawn over another, and export again"
                }
                .into(),
            );
        }
        if open_edges > 0 {
            return refuse(
                "not-closed",
                "close the surface in the program that made it and export again; `bismar check` lists the places".into(),
            );
        }
        if nested.is_none() && body.shells.iter().any(|r| r.part == Part::Nested) {
            return refuse(
                "nested-solid",
                "a solid lies inside another: say how to count it with --nested sum, union or void"
                    .into(),
            );
        }
        if self
            .solid_by(body, nested.unwrap_or(NestedRule::Sum))
            .moments
            .zeroth
            == 0.0
        {
            return refuse(
                "degenerate",
                "the surface is closed but holds no volume: export the solid, not a sheet".into(),
            );
        }
        None
    }

    /// The figures by a rule, of a body whose shells are all closed.
    pub(crate) fn solid_by(&self, body: &Body, rule: NestedRule) -> SolidIntegrals {
        if let Some(solid) = body.solid {
            return solid;
        }
        let mut total: Option<SolidIntegrals> = None;
        for role in &body.shells {
            let s = &self.found.shells[role.shell];
            let weight = role.weight(rule, s.facing);
            if weight == 0.0 {
                continue;
            }
            let moments = s.solid.moments.weighted(weight);
            total = Some(match total {
                None => SolidIntegrals { moments, ..s.solid },
                Some(t) => SolidIntegrals {
                    moments: t.moments.plus(&moments),
                    area: t.area + s.solid.area,
                    absolute_volume: t.absolute_volume + s.solid.absolute_volume,
                },
            });
        }
        total.unwrap_or(SolidIntegrals {
            moments: crate::moments::Moments::zero(nalgebra::Vector3::zeros()),
            area: 0.0,
            absolute_volume: 0.0,
        })
    }

    /// What welding and matching found.
    pub(crate) fn found(&self) -> &Shells {
        &self.found
    }

    /// The triangles of a body, ascending.
    pub(crate) fn members<'a>(&self, body: &'a Body) -> impl Iterator<Item = u32> + 'a {
        let select = body.members.select();
        let n = select.len(self.soup.triangles.count());
        (0..n).map(move |i| select.get(i) as u32)
    }

    /// Surface area of a body, open or not (file unit²).
    pub fn area(&self, body: &Body) -> f64 {
        body.solid.map_or_else(
            || {
                body.shells
                    .iter()
                    .map(|r| self.found.shells[r.shell].solid.area)
                    .sum()
            },
            |s| s.area,
        )
    }

    /// The facets of a body (file unit) as they count: shells that were turned are turned.
    pub fn outward_facets(&self, body: &Body) -> Vec<[[f64; 3]; 3]> {
        each!(&self.soup.triangles, f => {
            let mut out = Vec::with_capacity(body.triangles);
            for role in &body.shells {
                let select = self.found.shells[role.shell].members.select();
                for i in 0..select.len(f.count()) {
                    let [a, b, c] = f.triangle(select.get(i));
                    out.push(if role.turned { [a, c, b] } else { [a, b, c] });
                }
            }
            out
        })
    }

    /// The box of `turn`·vertices of a body (file unit).
    pub fn bounds_turned(&self, body: &Body, turn: &nalgebra::Matrix3<f64>) -> [[f64; 3]; 2] {
        struct Turned<'a, C>(&'a C, &'a nalgebra::Matrix3<f64>);
        impl<C: Corners> Corners for Turned<'_, C> {
            fn count(&self) -> usize {
                self.0.count()
            }
            fn triangle(&self, t: usize) -> [[f64; 3]; 3] {
                self.0
                    .triangle(t)
                    .map(|p| (self.1 * nalgebra::Vector3::from(p)).into())
            }
        }
        each!(&self.soup.triangles, f => super::shells::bounds(&Turned(f, turn), body.members.select()))
    }
}

impl Body {
    /// Its shells with their parts.
    pub(crate) fn roles(&self) -> &[Role] {
        &self.shells
    }

    /// Number of shells.
    pub fn shell_count(&self) -> usize {
        self.shells.len()
    }

    /// Number of voids.
    pub fn void_count(&self) -> usize {
        self.shells.iter().filter(|r| r.part == Part::Void).count()
    }

    /// Whether it lies in a solid that is nested in another: where the outermost counts as one
    /// with what is in it, this one adds nothing to the whole.
    pub fn is_in_nested(&self) -> bool {
        self.shells[0].in_nested
    }

    /// Whether a solid lies within its solid.
    pub fn has_nested(&self) -> bool {
        self.shells.iter().any(|r| r.part == Part::Nested)
    }
}

fn body(soup: &Soup, found: &Shells, roles: Vec<Role>, stem: &str, ids: &mut Ids) -> Body {
    let shells = || roles.iter().map(|r| &found.shells[r.shell]);
    let outer = &found.shells[roles[0].shell];
    let name = soup.names.get(outer.name as usize).cloned().flatten();
    let id = ids.next(name.as_deref().unwrap_or(stem));
    let members = match &roles[..] {
        [_] => outer.members.clone(),
        _ => {
            let mut all: Vec<u32> = shells()
                .flat_map(|s| match &s.members {
                    Members::Listed(list) => list.as_slice(),
                    Members::All => &[],
                })
                .copied()
                .collect();
            all.sort_unstable();
            let whole = all.len() + found.collapsed.len() == soup.triangles.count()
                && found
                    .collapsed
                    .iter()
                    .all(|t| all.binary_search(t).is_err());
            if whole {
                Members::All
            } else {
                Members::Listed(all)
            }
        }
    };
    let counted: usize = shells().map(|s| s.count).sum();
    // The members of a whole file hold its collapsed triangles, which bound nothing.
    let triangles = match members {
        Members::All => soup.triangles.count() - found.collapsed.len(),
        Members::Listed(_) => counted,
    };
    let first = shells().map(|s| s.first).min().unwrap_or(0);
    let bounds = [
        [0, 1, 2].map(|k| {
            shells()
                .map(|s| s.bounds[0][k])
                .fold(f64::INFINITY, f64::min)
        }),
        [0, 1, 2].map(|k| {
            shells()
                .map(|s| s.bounds[1][k])
                .fold(f64::NEG_INFINITY, f64::max)
        }),
    ];
    let closed = shells().all(Shell::closed);
    let turned = roles[0].turned;
    // One pass over all its triangles, unless shells count in different ways.
    let uniform = closed
        && roles
            .iter()
            .all(|r| r.turned == turned && matches!(r.part, Part::Outer | Part::Void));
    let solid = uniform.then(|| {
        let whole = if roles.len() == 1 {
            outer.solid
        } else {
            each!(&soup.triangles, f => {
                let apex = f.triangle(first as usize)[0];
                integrate(f, members.select(), apex, middle(&bounds))
            })
        };
        let sign = if turned { -1.0 } else { 1.0 };
        SolidIntegrals {
            moments: whole.moments.weighted(sign),
            ..whole
        }
    });
    let mut joined: Vec<String> = Vec::new();
    for s in shells() {
        for &n in &s.joined {
            let name = soup.names[n as usize].clone().unwrap_or_default();
            if !joined.contains(&name) {
                joined.push(name);
            }
        }
    }
    let materials = materials_of(soup, &members);
    Body {
        id,
        name,
        materials,
        triangles,
        bounds,
        closed,
        turned,
        joined,
        shells: roles,
        members,
        first,
        solid,
    }
}

/// The file's own materials of the triangles, in order of appearance.
fn materials_of(soup: &Soup, members: &Members) -> Vec<String> {
    if soup.materials.is_empty() {
        return Vec::new();
    }
    let mut seen: Vec<u32> = Vec::new();
    for run in &soup.runs {
        let Some(material) = run.material.filter(|m| !seen.contains(m)) else {
            continue;
        };
        let touches = match members {
            Members::All => run.count > 0,
            Members::Listed(list) => {
                let at = list.partition_point(|&t| (t as usize) < run.first);
                list.get(at)
                    .is_some_and(|&t| (t as usize) < run.first + run.count)
            }
        };
        if touches {
            seen.push(material);
        }
    }
    seen.into_iter()
        .filter_map(|m| soup.materials.get(m as usize).cloned())
        .collect()
}

/// Hands out ids: the name, then `name/2`, `name/3`; never one twice.
#[derive(Default)]
struct Ids {
    taken: HashSet<String>,
    used: BTreeMap<String, usize>,
}

impl Ids {
    fn next(&mut self, name: &str) -> String {
        let count = self.used.entry(name.to_owned()).or_insert(0);
        loop {
            *count += 1;
            let id = if *count == 1 {
                name.to_owned()
            } else {
                format!("{name}/{count}")
            };
            if self.taken.insert(id.clone()) {
                return id;
            }
        }
    }
}
