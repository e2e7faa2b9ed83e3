//! Solids of which it is known by counting whether they share space: sets of lattice cubes.

use super::*;
use crate::mesh::{Run, Soup, Triangles};
use proptest::prelude::*;

type Facet = [Point; 3];

/// Cubes of edge `size` at integer places of a grid with `n` a side.
#[derive(Clone, Debug)]
struct Cubes {
    n: i32,
    size: i32,
    filled: Vec<bool>,
}

impl Cubes {
    /// Whether the unit cube at (x, y, z) is filled.
    fn has(&self, p: [i32; 3]) -> bool {
        let q = p.map(|x| x.div_euclid(self.size));
        q.iter().all(|x| (0..self.n).contains(x))
            && self.filled[((q[0] * self.n + q[1]) * self.n + q[2]) as usize]
    }

    /// Its surface, outward, each square cut along either diagonal.
    fn facets(&self, diagonal: impl Fn(usize) -> bool) -> Vec<Facet> {
        let (mut out, s) = (Vec::new(), self.size);
        for (i, &filled) in self.filled.iter().enumerate() {
            let i = i as i32;
            let at = [i / self.n / self.n, i / self.n % self.n, i % self.n].map(|x| x * s);
            if !filled {
                continue;
            }
            for axis in 0..3 {
                for side in [0, 1] {
                    let mut next = at;
                    next[axis] += if side == 1 { s } else { -s };
                    if self.has(next) {
                        continue;
                    }
                    let corner = |u: i32, v: i32| {
                        let mut p = at;
                        p[axis] += side * s;
                        p[(axis + 1) % 3] += u * s;
                        p[(axis + 2) % 3] += v * s;
                        p.map(f64::from)
                    };
                    let mut q = [corner(0, 0), corner(1, 0), corner(1, 1), corner(0, 1)];
                    if side == 0 {
                        q.reverse();
                    }
                    if diagonal(out.len()) {
                        q.rotate_left(1);
                    }
                    out.push([q[0], q[1], q[2]]);
                    out.push([q[0], q[2], q[3]]);
                }
            }
        }
        out
    }
}

fn mesh(pieces: &[(&str, Vec<Facet>)]) -> Mesh {
    let mut soup = Soup::default();
    let mut all = Vec::new();
    for (i, (name, facets)) in pieces.iter().enumerate() {
        soup.names.push(Some((*name).to_owned()));
        soup.runs.push(Run {
            first: all.len(),
            count: facets.len(),
            name: i as u32,
            material: None,
        });
        all.extend(facets.iter().copied());
    }
    soup.triangles = Triangles::Loose(all);
    Mesh::new(soup, "stem").unwrap()
}

fn cubes(n: i32, size: i32) -> impl Strategy<Value = Cubes> {
    prop::collection::vec(prop::bool::weighted(0.4), (n * n * n) as usize)
        .prop_map(move |filled| Cubes { n, size, filled })
}

fn box_of(low: [i32; 3], high: [i32; 3]) -> Cubes {
    let n = 8;
    let filled = (0..n * n * n)
        .map(|i| {
            let p = [i / n / n, i / n % n, i % n];
            (0..3).all(|k| low[k] <= p[k] && p[k] < high[k])
        })
        .collect();
    Cubes { n, size: 1, filled }
}

/// Whether the two must be told to overlap: around some lattice edge both have a surface, with one
/// wedge of material each, and share one of the four cubes.
fn must_overlap(a: &Cubes, b: &Cubes, most: i32) -> bool {
    let range = || {
        (0..=most)
            .flat_map(move |x| (0..=most).flat_map(move |y| (0..=most).map(move |z| [x, y, z])))
    };
    range().any(|p| {
        (0..3).any(|axis| {
            let around = |c: &Cubes| {
                [(0, 0), (1, 0), (1, 1), (0, 1)].map(|(u, v)| {
                    let mut q = p;
                    q[(axis + 1) % 3] -= u;
                    q[(axis + 2) % 3] -= v;
                    c.has(q)
                })
            };
            let (wa, wb) = (around(a), around(b));
            let changes = |w: [bool; 4]| (0..4).filter(|&i| w[i] != w[(i + 1) % 4]).count();
            changes(wa) == 2 && changes(wb) == 2 && (0..4).any(|i| wa[i] && wb[i])
        })
    })
}

fn share(a: &Cubes, b: &Cubes, most: i32) -> bool {
    (0..most).any(|x| (0..most).any(|y| (0..most).any(|z| a.has([x, y, z]) && b.has([x, y, z]))))
}

/// Every pair of triangles, without the tree.
fn all_pairs(mesh: &Mesh) -> Vec<(u32, u32)> {
    let homes = Homes::of(mesh);
    let Triangles::Loose(list) = &mesh.soup.triangles else {
        panic!("loose triangles");
    };
    let ids = &mesh.found().corners;
    let mut out = Vec::new();
    let part = |t: u32| homes.members.as_ref().is_none_or(|m| m.contains(&t));
    for t in 0..list.len() as u32 {
        for u in t + 1..list.len() as u32 {
            let (p, q) = (&list[t as usize], &list[u as usize]);
            if part(t)
                && part(u)
                && matches!(
                    judged(ids, t, u, p, q, homes.home(t), homes.home(u)),
                    Judged::Overlap
                )
            {
                out.push((t, u));
            }
        }
    }
    out
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    #[test]
    fn marks_say_what_counts_say(
        a in cubes(3, 2), b in cubes(3, 2), c in cubes(3, 2), by in -1i32..=1, d in any::<u64>()
    ) {
        let at = |cubes: &Cubes, by: i32| -> Vec<Facet> {
            let facets = cubes.facets(|i| d >> (i % 64) & 1 == 1);
            facets.iter().map(|t| t.map(|p| p.map(|x| x + f64::from(by)))).collect()
        };
        // The first two share a name, so that a body may cut itself.
        let m = mesh(&[("a", [at(&a, 0), at(&b, by)].concat()), ("c", at(&c, 2 * by))]);
        let counted = cuts(&m, 0);
        let marked = cut_bodies(&m);
        prop_assert_eq!(marked.any, !counted.is_empty());
        for i in 0..m.bodies().len() {
            prop_assert_eq!(marked.themselves[i], counted.contains_key(&(i, i)));
        }
    }

    #[test]
    fn a_sound_solid_never_overlaps_itself(a in cubes(3, 1), cut in any::<u64>()) {
        let m = mesh(&[("a", a.facets(|i| cut >> (i % 64) & 1 == 1))]);
        prop_assert_eq!(cuts(&m, 5), BTreeMap::new());
    }

    #[test]
    fn solids_on_one_lattice_overlap_where_they_share_cubes(
        a in cubes(3, 1), b in cubes(3, 1), cut in any::<u64>()
    ) {
        let m = mesh(&[
            ("a", a.facets(|i| cut >> (i % 64) & 1 == 1)),
            ("b", b.facets(|i| cut >> (i % 61) & 1 == 0)),
        ]);
        let found = !cuts(&m, 5).is_empty();
        if must_overlap(&a, &b, 3) {
            prop_assert!(found);
        }
        if !share(&a, &b, 3) {
            prop_assert!(!found);
        }
    }

    #[test]
    fn solids_on_a_coarse_and_a_fine_lattice_too(
        a in cubes(4, 1), b in cubes(2, 2), cut in any::<u64>()
    ) {
        let m = mesh(&[
            ("a", a.facets(|i| cut >> (i % 64) & 1 == 1)),
            ("b", b.facets(|i| cut >> (i % 61) & 1 == 0)),
        ]);
        let found = !cuts(&m, 5).is_empty();
        if must_overlap(&a, &b, 4) {
            prop_assert!(found);
        }
        if !share(&a, &b, 4) {
            prop_assert!(!found);
        }
    }

    #[test]
    fn a_void_is_free_inside_and_overlaps_where_it_pokes_out(
        low in prop::array::uniform3(0i32..6), size in prop::array::uniform3(1i32..5),
        cut in any::<u64>()
    ) {
        // The solid is the box from 1 to 6; the void lies anywhere.
        let outer = box_of([1; 3], [6; 3]);
        let hollow = box_of(low, [0, 1, 2].map(|k| (low[k] + size[k]).min(8)));
        let inside = (0..3).all(|k| low[k] >= 1 && low[k] + size[k] <= 6);
        let whole = (0..3).all(|k| low[k] == 1 && size[k] == 5);
        prop_assume!(!whole && share(&outer, &hollow, 8));
        // Two facets a side: facets that stand in one place are duplicates, not overlaps.
        let mut facets = block([1.0; 3], [6.0; 3]);
        facets.extend(hollow.facets(|i| cut >> (i % 61) & 1 == 1).iter().map(|t| [t[0], t[2], t[1]]));
        let m = mesh(&[("a", facets)]);
        prop_assert_eq!(cuts(&m, 5).is_empty(), inside, "{:?} {:?}", low, size);
    }

    #[test]
    fn the_tree_finds_what_all_pairs_show_in_any_order_and_attitude(
        raw in prop::collection::vec(prop::array::uniform9(-4i8..=4), 2..60),
        shift in 1usize..50
    ) {
        let list: Vec<Facet> = raw
            .iter()
            .map(|v| [0, 3, 6].map(|k| [0, 1, 2].map(|i| f64::from(v[k + i]))))
            .collect();
        let m = mesh(&[("a", list.clone())]);
        let want = all_pairs(&m);
        let total = |m: &Mesh| cuts(m, usize::MAX).values().map(|c| c.count).sum::<u64>();
        let found = cuts(&m, usize::MAX);
        let mut got: Vec<_> = found.values().flat_map(|c| c.pairs.clone()).collect();
        got.sort_unstable();
        // Wedges add pairs only between closed shells, which such a heap hardly ever has.
        prop_assert!(want.iter().all(|p| got.binary_search(p).is_ok()));
        prop_assert_eq!(total(&m), got.len() as u64);
        let few = cuts(&m, 3);
        for (key, all) in &found {
            prop_assert_eq!(&few[key].pairs[..], &all.pairs[..all.pairs.len().min(3)]);
            prop_assert_eq!(few[key].count, all.count);
        }
        // Permuted triangles and corners, turned axes: the same number.
        let mut moved: Vec<Facet> = list
            .iter()
            .map(|t| [t[1], t[2], t[0]].map(|p| [p[1], -p[0], p[2]]))
            .collect();
        let by = shift % moved.len();
        moved.rotate_left(by);
        prop_assert_eq!(total(&mesh(&[("a", moved)])), total(&m));
    }
}

/// A box as twelve facets, not on a lattice.
fn block(low: Point, high: Point) -> Vec<Facet> {
    let unit = Cubes {
        n: 1,
        size: 1,
        filled: vec![true],
    };
    unit.facets(|_| false)
        .into_iter()
        .map(|t| t.map(|p| [0, 1, 2].map(|k| if p[k] == 0.0 { low[k] } else { high[k] })))
        .collect()
}

#[test]
fn boxes_that_cross_are_told_within_a_name_and_between_names() {
    let (a, b) = (
        block([0.0; 3], [2.0; 3]),
        block([1.0, 0.5, 0.25], [3.0, 2.5, 1.0]),
    );
    let one = mesh(&[("a", [a.clone(), b.clone()].concat())]);
    let two = mesh(&[("a", a), ("b", b)]);
    let (one, two) = (self_overlap(&one, 1e-3, 4), self_overlap(&two, 1e-3, 4));
    // Boxes of one name are two bodies too.
    for found in [&one, &two] {
        assert_eq!(found.file.len(), 1);
        assert!(found.bodies.iter().all(Vec::is_empty));
        let f = &found.file[0];
        assert_eq!(
            (f.kind, f.severity),
            (FindingKind::SelfOverlap, Severity::Doubts)
        );
        assert!(f.count >= 8 && f.places_shown == 4);
    }
    assert!(two.file[0].advice.contains("\"a\" and \"b\""));
    assert_eq!(one.file[0].count, two.file[0].count);
}

#[test]
fn a_bolt_in_an_undrilled_plate_overlaps_it_and_in_a_drilled_one_does_not() {
    // Head resting on the plate's top, shank reaching down: every meeting is an edge on a face.
    let bolt = |n: i32| Cubes {
        n: 5,
        size: 1,
        filled: (0..125)
            .map(|i| {
                let p = [i / 25, i / 5 % 5, i % 5];
                p[2] == 3 && p[0] >= 1 && p[0] < 4 && p[1] >= 1 && p[1] < 4
                    || p[0] == 2 && p[1] == 2 && (n..3).contains(&p[2])
            })
            .collect(),
    };
    let plate = block([0.0; 3], [5.0, 5.0, 3.0]);
    let m = mesh(&[("bolt", bolt(1).facets(|_| true)), ("plate", plate)]);
    assert!(!self_overlap(&m, 1.0, 1).file.is_empty());
    let drilled = Cubes {
        n: 5,
        size: 1,
        filled: (0..125)
            .map(|i| i % 5 < 3 && !(i / 25 == 2 && i / 5 % 5 == 2))
            .collect(),
    };
    let m = mesh(&[
        ("bolt", bolt(1).facets(|_| true)),
        ("plate", drilled.facets(|_| false)),
    ]);
    assert_eq!(cuts(&m, 1), BTreeMap::new());
}

#[test]
fn one_mesh_under_two_names_overlaps_itself() {
    let a = block([0.0; 3], [2.0; 3]);
    let m = mesh(&[("a", a.clone()), ("b", a)]);
    let found = cuts(&m, 100);
    // Each facet with its copy.
    assert_eq!(found[&(0, 1)].count, 12);
}

#[test]
fn a_flap_folded_onto_its_neighbour_overlaps_it() {
    // A tetrahedron whose apex is pressed into its base: three facets over one, in one plane.
    let p = [[0.0; 3], [4.0, 0.0, 0.0], [0.0, 4.0, 0.0], [1.0, 1.0, 0.0]];
    let facets = [[0, 2, 1], [0, 1, 3], [1, 2, 3], [2, 0, 3]].map(|f: [usize; 3]| f.map(|i| p[i]));
    let m = mesh(&[("a", facets.to_vec())]);
    assert_eq!(cuts(&m, 9)[&(0, 0)].count, 3);
}
