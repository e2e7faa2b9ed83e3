//! Open edges explained: cracks and T-junctions are told apart from holes.

use std::collections::{BTreeMap, BTreeSet, HashMap, HashSet};

use super::audit::{Home, Look};
use super::crack::{Crack, cracks, stated};
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use super::t_junction::{Junction, split};
use crate::geometry::Corners;
use crate::mesh::near::{distance, length};
use crate::mesh::{Boundary, clusters, each, moved_triangles, swept};

/// What is known of the boundary.
#[derive(Default)]
pub(super) struct Gaps {
    boundary: Boundary,
    cracks: Vec<Crack>,
    junctions: Vec<Junction>,
    /// Directed edges (shell, from, to) that a crack or a T-junction explains.
    explained: HashSet<(u32, u32, u32)>,
}

impl Gaps {
    pub(super) fn of(mesh: &crate::mesh::Mesh) -> Self {
        let boundary = Boundary::of(&mesh.soup.triangles, mesh.found());
        if boundary.edges.is_empty() {
            return Self::default();
        }
        let cracks = cracks(&boundary);
        let mut taken = vec![false; boundary.edges.len()];
        for &i in cracks.iter().flat_map(|c| &c.edges) {
            taken[i as usize] = true;
        }
        let split = split(&boundary, &taken);
        let explained = (0..boundary.edges.len())
            .filter(|&i| taken[i] || (split.cancels[i] && boundary.edges[i].weight == 1))
            .map(|i| {
                let e = &boundary.edges[i];
                let name = |v: u32| boundary.vertices[v as usize];
                (e.shell, name(e.from), name(e.to))
            })
            .collect();
        Self {
            cracks,
            junctions: split.junctions,
            explained,
            boundary,
        }
    }

    /// Whether every edge of the loop is explained.
    pub(super) fn explains(&self, shell: usize, vertices: &[u32]) -> bool {
        !self.explained.is_empty()
            && vertices.iter().enumerate().all(|(i, &from)| {
                let to = vertices[(i + 1) % vertices.len()];
                self.explained.contains(&(shell as u32, from, to))
            })
    }

    fn facets<'a>(&self, look: &'a Look<'_>, edge: u32) -> &'a [u32] {
        let e = &self.boundary.edges[edge as usize];
        &look.mesh.found().shells[e.shell as usize].open[e.index as usize].triangles
    }

    fn bodies(&self, look: &Look<'_>, home: &Home, edges: &[u32]) -> BTreeSet<Option<usize>> {
        // Facets of one shell are of one body.
        let mut seen = HashMap::new();
        for &i in edges {
            let shell = self.boundary.edges[i as usize].shell;
            seen.entry(shell)
                .or_insert_with(|| self.facets(look, i).first().and_then(|&t| home.of(t)));
        }
        seen.into_values().collect()
    }

    /// The findings.
    pub(super) fn report(
        &self,
        look: &Look<'_>,
        home: &Home,
        put: &mut dyn FnMut(Option<usize>, Finding),
    ) {
        self.report_cracks(look, home, put);
        self.report_junctions(look, home, put);
    }

    fn report_cracks(
        &self,
        look: &Look<'_>,
        home: &Home,
        put: &mut dyn FnMut(Option<usize>, Finding),
    ) {
        if self.cracks.is_empty() {
            return;
        }
        let bounds = self.swept_by_joining(look);
        struct Of {
            count: u64,
            places: Vec<Place>,
            distance: f64,
            swept: f64,
        }
        let mut by_body: BTreeMap<Option<usize>, Of> = BTreeMap::new();
        for (crack, swept) in self.cracks.iter().zip(bounds) {
            for body in self.bodies(look, home, &crack.edges) {
                let of = by_body.entry(body).or_insert(Of {
                    count: 0,
                    places: Vec::new(),
                    distance: 0.0,
                    swept: 0.0,
                });
                of.count += 1;
                of.distance = of.distance.max(crack.distance);
                of.swept += swept;
                if of.places.len() < look.places {
                    of.places.push(self.place_of(look, crack));
                }
            }
        }
        for (body, of) in by_body {
            let distance = stated(of.distance);
            let mut finding = look.finding(
                FindingKind::Crack,
                Severity::Blocks,
                of.count,
                of.places,
                Some((of.swept * look.metres.powi(3), EffectIs::Bound)),
                format!(
                    "two rims lie side by side and do not share their vertices: stitch them in the model, or add --join {} (bare numbers are in the mesh's unit)",
                    rounded_up(distance)
                ),
            );
            finding.join_m = Some(distance * look.metres);
            put(body, finding);
        }
    }

    fn place_of(&self, look: &Look<'_>, crack: &Crack) -> Place {
        let b = &self.boundary;
        let mut triangles: Vec<u32> = crack
            .edges
            .iter()
            .flat_map(|&i| self.facets(look, i))
            .copied()
            .collect();
        triangles.sort_unstable();
        triangles.dedup();
        triangles.truncate(64);
        let e = &b.edges[crack.edges[0] as usize];
        let length: f64 = crack
            .edges
            .iter()
            .map(|&i| b.length(&b.edges[i as usize]))
            .sum();
        Place {
            at_m: look.middle_of_edge(b.vertices[e.from as usize], b.vertices[e.to as usize]),
            triangles,
            line: None,
            length_m: Some(length * look.metres),
            edges: Some(crack.edges.len()),
        }
    }

    /// For each crack, the most volume that joining it sweeps (file unit³).
    fn swept_by_joining(&self, look: &Look<'_>) -> Vec<f64> {
        let b = &self.boundary;
        let widest = self.cracks.iter().fold(0.0f64, |m, c| m.max(c.distance));
        let rep = clusters(&b.points, stated(widest));
        let mut crack_of: HashMap<u32, usize> = HashMap::new();
        for (c, crack) in self.cracks.iter().enumerate() {
            for &i in &crack.edges {
                let e = &b.edges[i as usize];
                crack_of.insert(e.from, c);
                crack_of.insert(e.to, c);
            }
        }
        let moves: HashMap<u32, u32> = crack_of
            .keys()
            .filter(|&&v| rep[v as usize] != v)
            .map(|&v| (b.vertices[v as usize], b.vertices[rep[v as usize] as usize]))
            .collect();
        let mut bounds = vec![0.0; self.cracks.len()];
        let found = look.mesh.found();
        for t in moved_triangles(found, &moves) {
            let old = each!(&look.mesh.soup.triangles, f => f.triangle(t as usize));
            let mut new = old;
            let mut crack = None;
            for (k, v) in found.corners[t as usize].iter().enumerate() {
                if let Some(to) = moves.get(v) {
                    new[k] = look.mesh.soup.triangles.vertex(*to);
                    let place = b.vertices.partition_point(|w| w < v) as u32;
                    crack = crack_of.get(&place).copied();
                }
            }
            if let Some(c) = crack {
                bounds[c] += swept(&old, &new);
            }
        }
        bounds
    }

    fn report_junctions(
        &self,
        look: &Look<'_>,
        home: &Home,
        put: &mut dyn FnMut(Option<usize>, Finding),
    ) {
        struct Of {
            count: u64,
            places: Vec<Place>,
            swept: f64,
            exact: bool,
        }
        let mut by_body: BTreeMap<Option<usize>, Of> = BTreeMap::new();
        for j in &self.junctions {
            for body in self.bodies(look, home, &[j.edge]) {
                let of = by_body.entry(body).or_insert(Of {
                    count: 0,
                    places: Vec::new(),
                    swept: 0.0,
                    exact: true,
                });
                of.count += 1;
                of.exact &= j.exact;
                of.swept += if j.exact {
                    0.0
                } else {
                    self.swept_by_splitting(look, j)
                };
                if of.places.len() < look.places {
                    let at = self.boundary.points[j.vertex as usize];
                    let at = at.map(|x| x * look.metres);
                    of.places
                        .push(look.place(at, self.facets(look, j.edge).to_vec()));
                }
            }
        }
        for (body, of) in by_body {
            let effect = if of.exact {
                (0.0, EffectIs::Exact)
            } else {
                (of.swept * look.metres.powi(3), EffectIs::Bound)
            };
            put(
                body,
                look.finding(
                    FindingKind::TJunction,
                    Severity::Blocks,
                    of.count,
                    of.places,
                    Some(effect),
                    "a vertex lies on the edge of a facet that does not have it as a corner: export with one tolerance for all faces, or split the edge there",
                ),
            );
        }
    }

    /// The facet at the edge becomes two with the vertex as a corner: a tetrahedron, at most.
    fn swept_by_splitting(&self, look: &Look<'_>, j: &Junction) -> f64 {
        let b = &self.boundary;
        let e = &b.edges[j.edge as usize];
        let (p, q, x) = (
            &b.points[e.from as usize],
            &b.points[e.to as usize],
            &b.points[j.vertex as usize],
        );
        let (u, w) = (
            [0, 1, 2].map(|k| q[k] - p[k]),
            [0, 1, 2].map(|k| x[k] - p[k]),
        );
        let area = 0.5
            * length(&[
                u[1] * w[2] - u[2] * w[1],
                u[2] * w[0] - u[0] * w[2],
                u[0] * w[1] - u[1] * w[0],
            ]);
        let reach = self
            .facets(look, j.edge)
            .iter()
            .flat_map(|&t| each!(&look.mesh.soup.triangles, f => f.triangle(t as usize)))
            .fold(0.0f64, |m, corner| m.max(distance(p, &corner)));
        area * reach / 3.0
    }
}

/// What `--join` did, as findings: the joined cracks, with the most that they can have changed.
pub(super) fn report_joined(
    look: &Look<'_>,
    home: &Home,
    put: &mut dyn FnMut(Option<usize>, Finding),
) {
    let Some(joined) = look.mesh.joined() else {
        return;
    };
    let mut by_body: BTreeMap<Option<usize>, (u64, f64, Vec<Place>)> = BTreeMap::new();
    for seam in &joined.seams {
        let bodies: BTreeSet<Option<usize>> = seam.triangles.iter().map(|&t| home.of(t)).collect();
        for body in bodies {
            let of = by_body.entry(body).or_default();
            of.0 += 1;
            of.1 += seam.swept;
            if of.2.len() < look.places {
                let first = seam.triangles.iter().copied().take(64).collect();
                of.2.push(look.place(seam.at.map(|x| x * look.metres), first));
            }
        }
    }
    for (body, (count, swept, places)) in by_body {
        let mut finding = look.finding(
            FindingKind::Crack,
            Severity::Doubts,
            count,
            places,
            Some((swept * look.metres.powi(3), EffectIs::Bound)),
            "vertices on these open edges were joined as asked: stitch them in the model to be rid of the doubt",
        );
        finding.join_m = Some(joined.distance * look.metres);
        put(body, finding);
    }
}

/// A length to four digits, not less than it is.
pub(crate) fn rounded_up(x: f64) -> String {
    let text = format!("{x:.3e}");
    let near: f64 = text.parse().unwrap_or(x);
    let up = if near < x {
        let digit = 10f64.powi(x.abs().log10().floor() as i32 - 3);
        format!("{:.3e}", near + digit)
    } else {
        text
    };
    // Plain where that is short.
    let value: f64 = up.parse().unwrap_or(x);
    if (1e-4..1e4).contains(&value) {
        value.to_string()
    } else {
        up
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_distance_is_never_rounded_down() {
        for x in [
            4.76837158203125e-7,
            0.00099996,
            0.123456,
            3.00001,
            9.99999,
            123.0,
            1e-12,
        ] {
            let shown: f64 = rounded_up(x).parse().unwrap();
            assert!(shown >= x && shown <= x * 1.002, "{x} {shown}");
        }
        assert_eq!(rounded_up(0.12345), "0.1235");
    }
}
