//! Findings of shells: holes, facets that face opposite ways, shells inside out or nested.

use super::audit::Look;
use super::cap::{self, centre_of_polyline};
use super::finding::{EffectIs, Finding, FindingKind, Place, Severity};
use crate::mesh::{Body, Loop, NestedRule, Part, Shell, containers};

impl Look<'_> {
    /// Holes, winding conflicts, and what is said of whole shells.
    pub(super) fn shells_of(&self, body: &Body, put: &mut dyn FnMut(Finding)) {
        let shells = body.roles().iter().map(|r| r.shell);
        let mut holes = Vec::new();
        let mut conflicts = Vec::new();
        for place in shells {
            let shell: &Shell = &self.mesh.found().shells[place];
            let unexplained = |l: &&Loop| !l.conflict && !self.gaps.explains(place, &l.vertices);
            holes.extend(shell.loops.iter().filter(unexplained));
            let doubled = shell
                .open
                .iter()
                .filter(|e| e.surplus == 2 && e.triangles.len() == 2);
            conflicts.extend(doubled);
        }
        if !holes.is_empty() {
            let places = holes
                .iter()
                .take(self.places)
                .map(|l| {
                    let points: Vec<[f64; 3]> =
                        l.vertices.iter().map(|&v| self.vertex(v)).collect();
                    let (centre, length) = centre_of_polyline(&points);
                    Place {
                        at_m: centre,
                        triangles: l.triangles.iter().copied().take(64).collect(),
                        line: None,
                        length_m: Some(length),
                        edges: Some(l.vertices.len()),
                    }
                })
                .collect();
            // What capping leaves open, under the assumption that the caps state.
            let bound = cap::estimate(self.mesh, body, None)
                .ok()
                .map(|e| (e.bounds.volume * self.metres.powi(3), EffectIs::Bound));
            put(self.finding(
                FindingKind::Hole,
                Severity::Blocks,
                holes.len() as u64,
                places,
                bound,
                "the surface is open here: look for a missing or unstitched face in the model, and export again",
            ));
        }
        if !conflicts.is_empty() {
            let places = conflicts
                .iter()
                .take(self.places)
                .map(|e| self.place(self.middle_of_edge(e.from, e.to), e.triangles.clone()))
                .collect();
            put(self.finding(
                FindingKind::WindingConflict,
                Severity::Blocks,
                conflicts.len() as u64,
                places,
                None,
                "neighbouring facets face opposite ways: turn the facets that face inward, or export again with consistent normals",
            ));
        }
        if body.closed && self.mesh.solid_by(body, NestedRule::Sum).moments.zeroth == 0.0 {
            put(self.finding(
                FindingKind::Degenerate,
                Severity::Blocks,
                1,
                vec![self.place(self.corner(body.first), vec![body.first])],
                None,
                "the surface is closed but holds no volume: export the solid, not a sheet",
            ));
        }
        self.inside_out(body, put);
        self.nested(body, put);
        if body.joined.len() > 1 {
            let names = body
                .joined
                .iter()
                .map(|n| format!("\"{n}\""))
                .collect::<Vec<_>>();
            put(self.finding(
                FindingKind::NameSplit,
                Severity::Notes,
                1,
                vec![self.place(self.corner(body.first), vec![body.first])],
                None,
                format!(
                    "the surface of one solid is spread over the names {}: it was joined under the first; give the solid one name",
                    names.join(", ")
                ),
            ));
        }
    }

    fn inside_out(&self, body: &Body, put: &mut dyn FnMut(Finding)) {
        let turned: Vec<_> = body.roles().iter().filter(|r| r.turned).collect();
        if turned.is_empty() {
            return;
        }
        let shells = &self.mesh.found().shells;
        let m3 = self.metres.powi(3);
        let effect: f64 = turned
            .iter()
            .map(|r| -2.0 * shells[r.shell].solid.moments.zeroth)
            .sum();
        let places = turned
            .iter()
            .take(self.places)
            .map(|r| {
                let t = shells[r.shell].first;
                self.place(self.corner(t), vec![t])
            })
            .collect();
        // The exactness is the volume's own; a body that is not closed has none.
        let effect = body.closed.then_some((effect * m3, EffectIs::Exact));
        put(self.finding(
            FindingKind::InsideOut,
            Severity::Doubts,
            turned.len() as u64,
            places,
            effect,
            match self.body_around(body, turned[0].shell) {
                Some(around) => format!(
                    "the shell faces inward and lies inside \"{}\", which has another name: it was turned and counts as a solid; if it is a hollow of \"{}\", give both one name, else export it with its normals outward",
                    around.id, around.id
                ),
                None => "the shell faces inward: it was turned; export it with its normals outward".to_owned(),
            },
        ));
    }

    /// The innermost solid of another name that a shell lies in.
    fn body_around(&self, body: &Body, shell: usize) -> Option<&Body> {
        /// More boxes about one shell than this are a heap, in which no one solid is meant.
        const MOST: usize = 64;
        let shells = &self.mesh.found().shells;
        let inner = &shells[shell];
        let encloses = |s: &Shell| {
            (0..3).all(|k| {
                s.bounds[0][k] <= inner.bounds[0][k] && inner.bounds[1][k] <= s.bounds[1][k]
            })
        };
        let around: Vec<(&Body, &Shell)> = self
            .mesh
            .bodies()
            .iter()
            .filter(|b| b.name != body.name)
            .filter_map(|b| Some((b, &shells[b.roles().first()?.shell])))
            .filter(|(b, s)| b.closed && encloses(s))
            .take(MOST + 1)
            .collect();
        if around.is_empty() || around.len() > MOST {
            return None;
        }
        let all: Vec<&Shell> = std::iter::once(inner)
            .chain(around.iter().map(|(_, s)| *s))
            .collect();
        let volume = |i: usize| all[i].solid.moments.zeroth.abs();
        containers(&self.mesh.soup.triangles, &all)[0]
            .iter()
            .copied()
            .min_by(|&i, &j| volume(i).total_cmp(&volume(j)))
            .map(|i| around[i - 1].0)
    }

    fn nested(&self, body: &Body, put: &mut dyn FnMut(Finding)) {
        let nested: Vec<_> = body
            .roles()
            .iter()
            .filter(|r| r.part == Part::Nested)
            .collect();
        if nested.is_empty() {
            return;
        }
        let shells = &self.mesh.found().shells;
        let places = nested
            .iter()
            .take(self.places)
            .map(|r| {
                let t = shells[r.shell].first;
                self.place(self.corner(t), vec![t])
            })
            .collect();
        let effect = body.closed.then(|| {
            let v = |rule| self.mesh.solid_by(body, rule).moments.zeroth * self.metres.powi(3);
            let (sum, union, void) = (
                v(NestedRule::Sum),
                v(NestedRule::Union),
                v(NestedRule::Void),
            );
            (sum, union, void)
        });
        let said = effect.map_or(String::new(), |(sum, union, void)| {
            format!(
                " (sum {:.4} cm3, union {:.4} cm3, void {:.4} cm3)",
                sum * 1e6,
                union * 1e6,
                void * 1e6
            )
        });
        put(self.finding(
            FindingKind::NestedSolid,
            Severity::Doubts,
            nested.len() as u64,
            places,
            // Counted once instead of twice.
            effect.map(|(sum, union, _)| (union - sum, EffectIs::Exact)),
            format!(
                "a solid lies inside another{said}: if it is a hollow, turn it inward; else remove it, or say how to count it with --nested"
            ),
        ));
    }
}
