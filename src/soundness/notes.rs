//! Findings that are worth knowing and leave the volume as it is.

use std::collections::{BTreeMap, BTreeSet};

use super::audit::{Home, Look};
use super::facets::has_normals;
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use crate::geometry::Corners;
use crate::mesh::near::{distance, length};
use crate::mesh::{Mesh, each};

/// Those of `kinds` that [`audit`](super::audit()) and [`unit_suspect`](super::unit_suspect) can
/// look for in this mesh: stated normals are compared where the reader keeps them, in binary STL.
pub fn tested(mesh: &Mesh, kinds: &[FindingKind]) -> Vec<FindingKind> {
    kinds
        .iter()
        .copied()
        .filter(|k| *k != FindingKind::FacetNormalDisagrees || has_normals(mesh))
        .collect()
}

impl Look<'_> {
    pub(super) fn notes(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        self.touching(home, put);
        self.slivers(home, put);
        self.normals(home, put);
        self.fragments(put);
    }

    fn touching(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        let mut by_body: BTreeMap<Option<usize>, (u64, Vec<Place>)> = BTreeMap::new();
        for pinch in &self.pinches {
            let bodies: BTreeSet<Option<usize>> =
                pinch.triangles.iter().map(|&t| home.of(t)).collect();
            for body in bodies {
                let of = by_body.entry(body).or_default();
                of.0 += 1;
                if of.1.len() < self.places {
                    let few = pinch.triangles.iter().copied().take(64).collect();
                    of.1.push(self.place(self.vertex(pinch.vertex), few));
                }
            }
        }
        for (body, (count, places)) in by_body {
            put(
                body,
                self.finding(
                    FindingKind::NonManifoldVertex,
                    Severity::Notes,
                    count,
                    places,
                    Some((0.0, EffectIs::Exact)),
                    "surfaces touch at a single vertex: harmless to the volume; part them or join them along a face",
                ),
            );
        }
    }

    fn slivers(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        // Turning the long edge of a sliver moves the surface by a tetrahedron of its area, no
        // higher than its longest side.
        let mut most: BTreeMap<Option<usize>, f64> = BTreeMap::new();
        for &t in &self.odd.slivers {
            let [a, b, c] = each!(&self.mesh.soup.triangles, f => f.triangle(t as usize));
            let (u, v) = (
                [0, 1, 2].map(|k| b[k] - a[k]),
                [0, 1, 2].map(|k| c[k] - a[k]),
            );
            let area = 0.5
                * length(&[
                    u[1] * v[2] - u[2] * v[1],
                    u[2] * v[0] - u[0] * v[2],
                    u[0] * v[1] - u[1] * v[0],
                ]);
            let longest = length(&u).max(length(&v)).max(distance(&b, &c));
            *most.entry(home.of(t)).or_default() += area * longest / 3.0;
        }
        self.by_body(
            home,
            &self.odd.slivers,
            |t| self.place(self.corner(t), vec![t]),
            &mut |body, count, places| {
                let effect = most.get(&body).copied().unwrap_or_default() * self.metres.powi(3);
                put(
                    body,
                    self.finding(
                        FindingKind::Degenerate,
                        Severity::Notes,
                        count,
                        places,
                        Some((effect, EffectIs::Bound)),
                        "these facets are slivers, whose height is less than a millionth of their length: a cleaner export leaves them out",
                    ),
                );
            },
        );
    }

    fn normals(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        self.by_body(
            home,
            &self.odd.disagree,
            |t| self.place(self.corner(t), vec![t]),
            &mut |body, count, places| {
                put(
                    body,
                    self.finding(
                        FindingKind::FacetNormalDisagrees,
                        Severity::Notes,
                        count,
                        places,
                        Some((0.0, EffectIs::Exact)),
                        "the file states normals that point away from the side that the corners turn about; the corners were believed: export again with normals that agree",
                    ),
                );
            },
        );
    }

    fn fragments(&self, put: &mut dyn FnMut(Option<usize>, Finding)) {
        if self.tiny.is_empty() {
            return;
        }
        let shells = &self.mesh.found().shells;
        for (b, body) in self.mesh.bodies().iter().enumerate() {
            let of_body: Vec<_> = body
                .roles()
                .iter()
                .filter(|r| self.tiny.binary_search(&r.shell).is_ok())
                .collect();
            if of_body.is_empty() {
                continue;
            }
            let closed = of_body.iter().all(|r| shells[r.shell].closed());
            let volume: f64 = of_body
                .iter()
                .map(|r| {
                    let sign = if r.turned { -1.0 } else { 1.0 };
                    sign * shells[r.shell].solid.moments.zeroth
                })
                .sum();
            let effect = closed.then(|| (0.0 - volume * self.metres.powi(3), EffectIs::Exact));
            let places = of_body
                .iter()
                .take(self.places)
                .map(|r| {
                    let first = shells[r.shell].first;
                    self.place(self.corner(first), vec![first])
                })
                .collect();
            put(
                Some(b),
                self.finding(
                    FindingKind::TinyShell,
                    Severity::Notes,
                    of_body.len() as u64,
                    places,
                    effect,
                    "a fragment of a few facets, less than a thousandth of the file in size: delete it if it was left behind by chance",
                ),
            );
        }
    }
}
