//! Findings of single facets and edges: busy edges, facets without area, doubled or warped ones.

use std::collections::{BTreeMap, BTreeSet};

use super::audit::{Home, Look};
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use crate::geometry::{Corners, Meeting, Point, meeting_point, meeting_sharing};
use crate::mesh::each;

/// Triangles that one place lists: enough to find it by, little where thousands meet.
const MOST_TRIANGLES: usize = 64;

impl Look<'_> {
    /// Edges at which more than two triangles of one name meet.
    pub(super) fn busy_edges(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        let found = self.mesh.found();
        let mut by_body: BTreeMap<(Option<usize>, Severity), Vec<Place>> = BTreeMap::new();
        let mut counts: BTreeMap<(Option<usize>, Severity), u64> = BTreeMap::new();
        for edge in found
            .odd
            .chunk_by(|a, b| (a.low, a.high) == (b.low, b.high))
        {
            let mut of_name: BTreeMap<u32, (i64, Vec<u32>)> = BTreeMap::new();
            for h in edge.iter().filter(|h| !found.is_set_aside(h.triangle)) {
                let e = of_name.entry(found.name_of(h.triangle)).or_default();
                e.0 += if h.forward { 1 } else { -1 };
                e.1.push(h.triangle);
            }
            for (net, triangles) in of_name.into_values().filter(|(_, t)| t.len() > 2) {
                let severity = if net == 0 {
                    Severity::Notes
                } else {
                    Severity::Blocks
                };
                let mut homes: Vec<Option<usize>> = triangles.iter().map(|&t| home.of(t)).collect();
                homes.sort_unstable();
                homes.dedup();
                for h in homes {
                    *counts.entry((h, severity)).or_default() += 1;
                    let places = by_body.entry((h, severity)).or_default();
                    if places.len() < self.places {
                        let at = self.middle_of_edge(edge[0].low, edge[0].high);
                        let first = triangles.iter().copied().take(MOST_TRIANGLES).collect();
                        places.push(self.place(at, first));
                    }
                }
            }
        }
        for ((body, severity), places) in by_body {
            let count = counts[&(body, severity)];
            let advice = if severity == Severity::Notes {
                "more than two facets meet at an edge where solids touch: harmless to the volume; part the solids or join them into one"
            } else {
                "more than two facets meet at an edge and do not cancel: look for a stray or missing face there"
            };
            put(
                body,
                self.finding(
                    FindingKind::NonManifoldEdge,
                    severity,
                    count,
                    places,
                    None,
                    advice,
                ),
            );
        }
    }

    /// Facets that cover each other and face the same way at an edge of more than two: a surface that
    /// is written twice, though not with the same facets. The search for surfaces that cut each
    /// other finds these too; here only the facets at such edges are looked at, which sound meshes
    /// hardly have, and so weighing sees them as well. The signs are exact.
    pub(super) fn written_twice(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        let found = self.mesh.found();
        let mut pairs: BTreeSet<(u32, u32)> = BTreeSet::new();
        let edges = found
            .odd
            .chunk_by(|a, b| (a.low, a.high) == (b.low, b.high));
        for edge in edges {
            let uses: Vec<_> = edge
                .iter()
                .filter(|h| !found.is_set_aside(h.triangle))
                .take(MOST_TRIANGLES)
                .collect();
            for (i, a) in uses.iter().enumerate() {
                for b in &uses[i + 1..] {
                    let (t, u) = (a.triangle.min(b.triangle), a.triangle.max(b.triangle));
                    let one_name = found.name_of(t) == found.name_of(u);
                    if one_name && a.forward == b.forward && self.cover(t, u) {
                        pairs.insert((t, u));
                    }
                }
            }
        }
        let mut by_body: BTreeMap<Option<usize>, (u64, Vec<Place>)> = BTreeMap::new();
        for (t, u) in pairs {
            // Two bodies that share a surface are both in doubt, whichever comes first in the file.
            let bodies = BTreeSet::from([home.of(t), home.of(u)]);
            for body in bodies {
                let of = by_body.entry(body).or_default();
                of.0 += 1;
                if of.1.len() < self.places {
                    let (p, q) = self.corners_of(t, u);
                    let at = meeting_point(&p, &q).map(|x| x * self.metres);
                    of.1.push(self.place(at, vec![t, u]));
                }
            }
        }
        for (body, (count, places)) in by_body {
            put(
                body,
                self.finding(
                    FindingKind::SelfOverlap,
                    Severity::Doubts,
                    count,
                    places,
                    None,
                    "facets that face the same way cover each other: a surface is written twice, and what it encloses counts twice; export it once",
                ),
            );
        }
    }

    fn corners_of(&self, t: u32, u: u32) -> ([Point; 3], [Point; 3]) {
        each!(&self.mesh.soup.triangles, f => (f.triangle(t as usize), f.triangle(u as usize)))
    }

    /// Whether two facets of a common edge share an area of one plane and face the same way.
    fn cover(&self, t: u32, u: u32) -> bool {
        let found = self.mesh.found();
        let (c, d) = (&found.corners[t as usize], &found.corners[u as usize]);
        let (p, q) = self.corners_of(t, u);
        let (c, d) = (c.map(|v| d.contains(&v)), d.map(|v| c.contains(&v)));
        meeting_sharing(&p, &q, c, d) == Meeting::Coplanar { opposed: false }
    }

    /// Triangles without area.
    pub(super) fn degenerate(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        self.by_body(
            home,
            &self.odd.flat,
            |t| self.place(self.corner(t), vec![t]),
            &mut |body, count, places| {
                put(
                    body,
                    self.finding(
                        FindingKind::Degenerate,
                        Severity::Notes,
                        count,
                        places,
                        Some((0.0, EffectIs::Exact)),
                        "these facets have no area and add nothing: a finer or cleaner export leaves them out",
                    ),
                );
            },
        );
    }

    /// Facets that stand in one place.
    pub(super) fn duplicates(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        let found = self.mesh.found();
        struct Of {
            count: u64,
            places: Vec<Place>,
            dropped: Vec<u32>,
            stays: bool,
        }
        let mut by_body: BTreeMap<Option<usize>, Of> = BTreeMap::new();
        let mut places: Vec<&Vec<u32>> = found.duplicates.places.iter().collect();
        places.sort();
        for place in places {
            // The facet that stays knows the body; of opposed pairs, a neighbour does.
            let body = place
                .iter()
                .find_map(|&t| home.of(t))
                .or_else(|| self.neighbour_body(home, place));
            let of = by_body.entry(body).or_insert_with(|| Of {
                count: 0,
                places: Vec::new(),
                dropped: Vec::new(),
                stays: false,
            });
            of.count += place.len() as u64 - 1;
            of.dropped.extend(
                place
                    .iter()
                    .filter(|t| found.dropped.binary_search(t).is_ok()),
            );
            of.stays |= place
                .iter()
                .any(|t| found.shells.iter().any(|s| s.doubled.contains(t)));
            if of.places.len() < self.places {
                of.places
                    .push(self.place(self.corner(place[0]), place.clone()));
            }
        }
        for (body, of) in by_body {
            let effect =
                (!of.stays).then(|| (self.dropped_volume(body, &of.dropped), EffectIs::Exact));
            let advice = if of.stays {
                "facets stand twice and dropping one opens the surface: a solid is drawn over another; unite them in the model"
            } else if of.dropped.is_empty() {
                "facets face each other in one place and add nothing: solids touch there; unite them or part them"
            } else {
                "facets stand twice; the repeated ones were left out: export each face once"
            };
            put(
                body,
                self.finding(
                    FindingKind::Duplicate,
                    Severity::Doubts,
                    of.count,
                    of.places,
                    effect,
                    advice,
                ),
            );
        }
    }

    /// The body of a triangle that shares an edge with an opposed pair.
    fn neighbour_body(&self, home: &Home, place: &[u32]) -> Option<usize> {
        let found = self.mesh.found();
        let c = found.corners[place[0] as usize];
        let edges = [(c[0], c[1]), (c[1], c[2]), (c[2], c[0])];
        edges.iter().find_map(|&(a, b)| {
            let key = (a.min(b), a.max(b));
            let from = found.odd.partition_point(|h| (h.low, h.high) < key);
            found.odd[from..]
                .iter()
                .take_while(|h| (h.low, h.high) == key)
                .find_map(|h| home.of(h.triangle))
        })
    }

    /// What dropping the facets changes the file's signed volume by, m³: taken about the body's
    /// first vertex, as the rest of it is.
    fn dropped_volume(&self, body: Option<usize>, dropped: &[u32]) -> f64 {
        let apex = body.map_or_else(
            || dropped.first().map_or([0.0; 3], |&t| self.raw_corner(t)),
            |b| self.raw_corner(self.mesh.bodies()[b].first),
        );
        let mut list = dropped.to_vec();
        list.sort_unstable();
        each!(&self.mesh.soup.triangles, f => {
            let s = crate::moments::integrate(f, crate::geometry::Select::List(&list), apex, apex);
            0.0 - s.moments.zeroth * self.metres.powi(3)
        })
    }

    fn raw_corner(&self, t: u32) -> [f64; 3] {
        each!(&self.mesh.soup.triangles, f => f.triangle(t as usize)[0])
    }

    /// Polygons whose corners are not flat.
    pub(super) fn warped(&self, home: &Home, put: &mut dyn FnMut(Option<usize>, Finding)) {
        struct Of {
            count: u64,
            places: Vec<Place>,
            most: f64,
        }
        let mut by_body: BTreeMap<(Option<usize>, Severity), Of> = BTreeMap::new();
        for w in &self.mesh.soup.warped {
            let severity = if w.within_rounding {
                Severity::Notes
            } else {
                Severity::Doubts
            };
            let of = by_body
                .entry((home.of(w.first as u32), severity))
                .or_insert_with(|| Of {
                    count: 0,
                    places: Vec::new(),
                    most: 0.0,
                });
            of.count += 1;
            of.most += w.volume_high.max(-w.volume_low);
            if of.places.len() < self.places {
                of.places.push(Place {
                    at_m: w.at.map(|x| x * self.metres),
                    triangles: (w.first..w.first + w.count)
                        .take(64)
                        .map(|t| t as u32)
                        .collect(),
                    line: w.line,
                    length_m: None,
                    edges: Some(w.count + 2),
                });
            }
        }
        for ((body, severity), of) in by_body {
            let advice = if severity == Severity::Notes {
                "polygons are flat to the rounding of the written numbers: export more digits or triangles to be rid of the doubt"
            } else {
                "polygons whose corners are not flat have no one surface: export triangles"
            };
            let effect = Some((of.most * self.metres.powi(3), EffectIs::Bound));
            put(
                body,
                self.finding(
                    FindingKind::WarpedPolygon,
                    severity,
                    of.count,
                    of.places,
                    effect,
                    advice,
                ),
            );
        }
    }
}
