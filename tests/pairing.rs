//! Shells, voids and bodies: what hangs together with what, against counts made another way.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/solids.rs"]
mod solids;
#[path = "support/voxels.rs"]
mod voxels;

use std::collections::HashMap;

use bismar::mesh::{Body, Mesh, NestedRule};
use bismar::soundness::{FindingKind, Severity, audit};
use proptest::prelude::*;
use solids::*;

fn cube(lo: f64, hi: f64) -> Vec<Tri> {
    cuboid([lo; 3], [hi; 3])
}

fn join(lists: &[Vec<Tri>]) -> Vec<Tri> {
    lists.concat()
}

fn volume(mesh: &Mesh, body: &Body) -> f64 {
    mesh.solid(body, None).unwrap().moments.zeroth
}

/// (shells, voids, volume) of each body.
fn bodies(mesh: &Mesh) -> Vec<(usize, usize, f64)> {
    mesh.bodies()
        .iter()
        .map(|b| (b.shell_count(), b.void_count(), volume(mesh, b)))
        .collect()
}

fn refused(mesh: &Mesh) -> (&'static str, u64, usize) {
    let [body] = mesh.bodies() else {
        panic!("{:?}", mesh.bodies())
    };
    let r = mesh.solid(body, None).unwrap_err();
    (r.kind, r.open_edges, r.loops)
}

/// Kinds, severities and counts of all findings, sorted.
fn findings(mesh: &Mesh) -> Vec<(FindingKind, Severity, u64)> {
    let a = audit(mesh, 1.0, 9, bismar::soundness::Depth::Surface);
    let all = a.file.iter().chain(a.bodies.iter().flatten());
    let mut out: Vec<_> = all.map(|f| (f.kind, f.severity, f.count)).collect();
    out.sort();
    out
}

#[test]
fn cubes_that_touch_are_two() {
    let first = cube(0.0, 1.0);
    let touching = [
        ("edge", cuboid([1.0, 1.0, 0.0], [2.0, 2.0, 1.0])),
        ("vertex", cube(1.0, 2.0)),
    ];
    for (how, second) in touching {
        let m = mesh(join(&[first.clone(), second]));
        assert_eq!(bodies(&m), [(1, 0, 1.0), (1, 0, 1.0)], "{how}");
        assert!(findings(&m).iter().all(|f| f.1 == Severity::Notes), "{how}");
    }
}

/// The facets in the shared face lie opposed on each other: they add nothing and are reported;
/// without them the cubes are one shell.
#[test]
fn cubes_on_a_whole_face_are_one_shell_and_it_is_said() {
    let second = moved(&cube(0.0, 1.0), [1.0, 0.0, 0.0]);
    // The diagonals of the two faces agree or cross; they must agree to be opposed.
    let mirrored = reversed(&mapped(&cube(0.0, 1.0), |p| [2.0 - p[0], p[1], p[2]]));
    for (how, second) in [("moved", second), ("mirrored", mirrored)] {
        let m = mesh(join(&[cube(0.0, 1.0), second]));
        let all: f64 = m.bodies().iter().map(|b| volume(&m, b)).sum();
        assert_eq!(all, 2.0, "{how}");
        let said = findings(&m);
        if m.bodies().len() == 1 {
            assert!(
                said.contains(&(FindingKind::Duplicate, Severity::Doubts, 2)),
                "{how} {said:?}"
            );
        } else {
            assert!(
                !said.iter().any(|f| f.0 == FindingKind::Duplicate),
                "{how} {said:?}"
            );
        }
    }
    let m = mesh(join(&[
        cube(0.0, 1.0),
        reversed(&mapped(&cube(0.0, 1.0), |p| [2.0 - p[0], p[1], p[2]])),
    ]));
    assert_eq!(bodies(&m), [(1, 0, 2.0)]);
}

/// A face that shares its edges but not its diagonal: the edges are paired across the solids.
#[test]
fn cubes_on_a_face_cut_the_other_way_are_two() {
    let mut second = moved(&cube(0.0, 1.0), [1.0, 0.0, 0.0]);
    let quad = [
        [1.0, 0.0, 0.0],
        [1.0, 0.0, 1.0],
        [1.0, 1.0, 1.0],
        [1.0, 1.0, 0.0],
    ];
    second.retain(|t| !t.iter().all(|p| p[0] == 1.0));
    let first = cube(0.0, 1.0);
    let on_face: Vec<&Tri> = first
        .iter()
        .filter(|t| t.iter().all(|p| p[0] == 1.0))
        .collect();
    let has_02 = on_face
        .iter()
        .all(|t| t.contains(&quad[0]) && t.contains(&quad[2]));
    let k = usize::from(has_02);
    second.push([quad[k], quad[k + 1], quad[k + 2]]);
    second.push([quad[k], quad[k + 2], quad[(k + 3) % 4]]);
    let m = mesh(join(&[first, second]));
    assert_eq!(bodies(&m), [(1, 0, 1.0), (1, 0, 1.0)]);
}

#[test]
fn voids_and_islands_by_depth() {
    let hollow = join(&[cube(0.0, 10.0), reversed(&cube(1.0, 9.0))]);
    assert_eq!(bodies(&mesh(hollow.clone())), [(2, 1, 1000.0 - 512.0)]);
    // An island in the void is a body of its own, and so on inward.
    let island = join(&[hollow.clone(), cube(2.0, 8.0)]);
    assert_eq!(
        bodies(&mesh(island.clone())),
        [(2, 1, 488.0), (1, 0, 216.0)]
    );
    let deeper = join(&[island, reversed(&cube(3.0, 7.0)), cube(4.0, 6.0)]);
    assert_eq!(
        bodies(&mesh(deeper)),
        [(2, 1, 488.0), (2, 1, 152.0), (1, 0, 8.0)]
    );
    // Two voids of one body.
    let two = join(&[
        cube(0.0, 10.0),
        reversed(&cube(1.0, 2.0)),
        reversed(&cube(5.0, 7.0)),
    ]);
    assert_eq!(bodies(&mesh(two)), [(3, 2, 991.0)]);
}

#[test]
fn a_family_inside_out_is_turned_as_one() {
    let m = mesh(reversed(&join(&[
        cube(0.0, 10.0),
        reversed(&cube(1.0, 9.0)),
    ])));
    assert_eq!(bodies(&m), [(2, 1, 488.0)]);
    assert!(m.bodies()[0].turned);
    assert_eq!(
        findings(&m),
        [(FindingKind::InsideOut, Severity::Doubts, 2)]
    );
    // Only the outer one inverted: it is turned, the void stays one.
    let m = mesh(reversed(&join(&[cube(0.0, 10.0), cube(1.0, 9.0)])));
    assert_eq!(bodies(&m), [(2, 1, 488.0)]);
    assert!(m.bodies()[0].turned);
    // A neighbour that faces outward is left alone.
    let m = mesh(join(&[reversed(&cube(0.0, 1.0)), cube(5.0, 7.0)]));
    assert_eq!(bodies(&m), [(1, 0, 1.0), (1, 0, 8.0)]);
    assert_eq!(
        m.bodies().iter().map(|b| b.turned).collect::<Vec<_>>(),
        [true, false]
    );
}

#[test]
fn a_solid_in_a_solid_has_three_readings() {
    let m = mesh(join(&[cube(0.0, 10.0), cube(2.0, 4.0)]));
    let [body] = m.bodies() else { panic!() };
    assert!(body.has_nested() && body.closed && body.void_count() == 0);
    assert_eq!(m.solid(body, None).unwrap_err().kind, "nested-solid");
    let by = |rule| m.solid(body, Some(rule)).unwrap().moments;
    assert_eq!(by(NestedRule::Sum).zeroth, 1008.0);
    assert_eq!(by(NestedRule::Union).zeroth, 1000.0);
    assert_eq!(by(NestedRule::Void).zeroth, 992.0);
    // Centres: the inner cube of 8 stands at 3, the outer of 1000 at 5.
    for (rule, inner) in [
        (NestedRule::Sum, 8.0),
        (NestedRule::Union, 0.0),
        (NestedRule::Void, -8.0),
    ] {
        let want = (5000.0 + 3.0 * inner) / (1000.0 + inner);
        let c = by(rule).centre().unwrap();
        assert!(
            (0..3).all(|k| (c[k] - want).abs() < 1e-14 * 10.0),
            "{rule:?} {c}"
        );
    }
    assert_eq!(
        findings(&m),
        [(FindingKind::NestedSolid, Severity::Doubts, 1)]
    );
    // A third level: even depth opens a body again.
    let m = mesh(join(&[cube(0.0, 10.0), cube(2.0, 8.0), cube(4.0, 6.0)]));
    let shells: Vec<_> = m
        .bodies()
        .iter()
        .map(|b| (b.shell_count(), b.has_nested()))
        .collect();
    assert_eq!(shells, [(2, true), (1, false)]);
    let sum: f64 = m
        .bodies()
        .iter()
        .map(|b| m.solid(b, Some(NestedRule::Void)).unwrap().moments.zeroth)
        .sum();
    assert_eq!(sum, 1000.0 - 216.0 + 8.0);
    // Where the overlap counts once, the innermost adds nothing to the whole.
    assert_eq!(
        m.bodies()
            .iter()
            .map(|b| b.is_in_nested())
            .collect::<Vec<_>>(),
        [false, true]
    );
    // The hollow of a nested solid is taken from it, and is no body that is inside out.
    let m = mesh(join(&[
        cube(0.0, 10.0),
        cube(2.0, 8.0),
        reversed(&cube(4.0, 6.0)),
    ]));
    let [body] = m.bodies() else { panic!() };
    let by = |rule| m.solid(body, Some(rule)).unwrap().moments.zeroth;
    assert!(!body.turned);
    assert_eq!(by(NestedRule::Sum), 1000.0 + 216.0 - 8.0);
    assert_eq!(by(NestedRule::Union), 1000.0);
    assert_eq!(by(NestedRule::Void), 1000.0 - 216.0 + 8.0);
}

/// Vertices of the void that lie on the outer surface decide nothing; another point does.
#[test]
fn a_void_may_touch_the_outer_surface() {
    // One vertex of an inner tetrahedron in the middle of a face of the cube.
    let spike = |p: P| {
        let q = [p, [4.0, 5.0, 4.0], [6.0, 5.0, 4.0], [5.0, 7.0, 5.0]];
        let t = polyhedron(
            &q,
            &[vec![0, 1, 2], vec![0, 2, 3], vec![0, 3, 1], vec![1, 3, 2]],
        );
        let s: f64 = t.iter().map(|f| dot(f[0], cross(f[1], f[2]))).sum();
        (if s > 0.0 { reversed(&t) } else { t }, s.abs() / 6.0)
    };
    let spots = [
        ("face", [3.0, 4.0, 0.0]),
        ("edge of a diagonal", [5.0, 5.0, 0.0]),
        ("edge", [5.0, 0.0, 0.0]),
        ("corner", [0.0, 0.0, 0.0]),
        ("foremost face", [10.0, 3.0, 4.0]),
        ("foremost corner", [10.0, 10.0, 10.0]),
    ];
    for (where_, p) in spots {
        let (void, v) = spike(p);
        let m = mesh(join(&[cube(0.0, 10.0), void]));
        let [body] = m.bodies() else {
            panic!("{where_}: {} bodies", m.bodies().len())
        };
        assert_eq!((body.shell_count(), body.void_count()), (2, 1), "{where_}");
        let off = volume(&m, body) - (1000.0 - v);
        assert!(off.abs() < 1e-10, "{where_}: {off}");
    }
}

/// All vertices of the void lie on the outer shell: only points within its facets tell.
#[test]
fn a_void_inscribed_with_every_vertex_on_the_outer_shell() {
    let corners = [
        [0.0, 0.0, 0.0],
        [10.0, 10.0, 0.0],
        [10.0, 0.0, 10.0],
        [0.0, 10.0, 10.0],
    ];
    let t = polyhedron(
        &corners,
        &[vec![0, 1, 2], vec![0, 2, 3], vec![0, 3, 1], vec![1, 3, 2]],
    );
    let s: f64 = t.iter().map(|f| dot(f[0], cross(f[1], f[2]))).sum();
    let inward = if s > 0.0 { reversed(&t) } else { t };
    // Corners of the cube: its edges lie in the cube's faces, along diagonals or across them.
    let m = mesh(join(&[cube(0.0, 10.0), inward]));
    let total: f64 = m.bodies().iter().map(|b| volume(&m, b)).sum();
    assert!(
        (total - (1000.0 - 1000.0 / 3.0)).abs() < 1e-10,
        "{:?}",
        bodies(&m)
    );
    // Middles of the faces: an octahedron.
    let p: Vec<P> = regular(8)
        .iter()
        .map(|p| p.map(|x| 5.0 + x * 50f64.sqrt()))
        .collect();
    let p: Vec<P> = p.iter().map(|p| p.map(f64::round)).collect();
    let octahedron = mapped(
        &hull(&p.iter().map(|p| p.map(|x| x - 5.0)).collect::<Vec<_>>()),
        |p| p.map(|x| x + 5.0),
    );
    let v = solid(octahedron.clone()).moments.zeroth;
    assert!((v - 1000.0 / 6.0).abs() < 1e-10);
    let m = mesh(join(&[cube(0.0, 10.0), reversed(&octahedron)]));
    let [body] = m.bodies() else {
        panic!("{:?}", bodies(&m))
    };
    assert_eq!(body.void_count(), 1);
    assert!((volume(&m, body) - 1000.0 * 5.0 / 6.0).abs() < 1e-10);
}

#[test]
fn an_open_shell_in_a_closed_one_refuses_the_body() {
    let mut open = reversed(&cube(2.0, 4.0));
    open.pop();
    let m = mesh(join(&[cube(0.0, 10.0), open.clone()]));
    assert_eq!(refused(&m), ("not-closed", 3, 1));
    assert!(!m.bodies()[0].closed);
    // Beside it, it is a body of its own and the closed one is weighed.
    let m = mesh(join(&[cube(0.0, 10.0), moved(&open, [20.0, 0.0, 0.0])]));
    assert_eq!(m.bodies().len(), 2);
    assert_eq!(volume(&m, &m.bodies()[0]), 1000.0);
    assert_eq!(
        m.solid(&m.bodies()[1], None).unwrap_err().kind,
        "not-closed"
    );
}

/// A pipe without ends gives 2/3 of its volume about every origin: it is refused by its edges.
#[test]
fn a_pipe_without_ends_is_refused() {
    let mut pipe = cylinder(1.0, 4.0, 12);
    pipe.retain(|t| t.iter().any(|p| p[2] == 0.0) && t.iter().any(|p| p[2] == 4.0));
    assert_eq!(refused(&mesh(pipe)), ("not-closed", 24, 2));
}

#[test]
fn names_that_close_together_are_one_body() {
    let all = cube(0.0, 2.0);
    let (a, b) = all.split_at(5);
    let piece = |pieces: Vec<(Option<&str>, Vec<Tri>)>| Mesh::new(named(pieces), "it").unwrap();
    let m = piece(vec![(Some("a"), a.to_vec()), (Some("b"), b.to_vec())]);
    let [body] = m.bodies() else { panic!() };
    assert_eq!((body.id.as_str(), body.name.as_deref()), ("a", Some("a")));
    assert_eq!(body.joined, ["a", "b"]);
    assert_eq!(volume(&m, body), 8.0);
    assert_eq!(findings(&m), [(FindingKind::NameSplit, Severity::Notes, 1)]);
    // Three names; the first in the file gives the name.
    let m = piece(vec![
        (Some("z"), all[..2].to_vec()),
        (Some("m"), all[2..7].to_vec()),
        (Some("a"), all[7..].to_vec()),
    ]);
    assert_eq!(m.bodies().len(), 1);
    assert_eq!(m.bodies()[0].id, "z");
    assert_eq!(m.bodies()[0].joined, ["z", "m", "a"]);
    // One triangle is missing: they do not close together, and no piece is weighed.
    let m = piece(vec![(Some("a"), a[..4].to_vec()), (Some("b"), b.to_vec())]);
    let names: Vec<_> = m.bodies().iter().map(|b| b.name.as_deref()).collect();
    // Bottom and top of the cube hang together under neither name.
    assert_eq!(names, [Some("a"), Some("a"), Some("b")]);
    assert!(m.bodies().iter().all(|b| !b.closed && b.joined.is_empty()));
    assert!(m.bodies().iter().all(|b| m.solid(b, None).is_err()));
    // A whole cube under one name and a split one elsewhere: the whole is not drawn in.
    let far = moved(&all, [9.0, 0.0, 0.0]);
    let m = piece(vec![
        (Some("whole"), far),
        (Some("a"), a.to_vec()),
        (Some("b"), b.to_vec()),
    ]);
    let ids: Vec<_> = m.bodies().iter().map(|b| b.id.as_str()).collect();
    assert_eq!(ids, ["whole", "a"]);
    // Coincident faces under two names are two solids: nothing is welded between names.
    let m = piece(vec![
        (Some("left"), cube(0.0, 2.0)),
        (Some("right"), moved(&cube(0.0, 2.0), [2.0, 0.0, 0.0])),
    ]);
    assert_eq!(bodies(&m), [(1, 0, 8.0), (1, 0, 8.0)]);
    assert_eq!(findings(&m), []);
    // One solid inside another of another name: depth is counted within a name.
    let m = piece(vec![
        (Some("out"), cube(0.0, 10.0)),
        (Some("in"), cube(2.0, 4.0)),
    ]);
    assert_eq!(bodies(&m), [(1, 0, 1000.0), (1, 0, 8.0)]);
}

#[test]
fn several_bodies_of_a_name_are_numbered() {
    let t = join(&[cube(0.0, 1.0), cube(2.0, 3.0), cube(4.0, 5.0)]);
    let m = Mesh::new(named(vec![(Some("bolt"), t.clone())]), "file").unwrap();
    let ids: Vec<_> = m.bodies().iter().map(|b| b.id.clone()).collect();
    assert_eq!(ids, ["bolt", "bolt/2", "bolt/3"]);
    let m = mesh(t);
    let ids: Vec<_> = m.bodies().iter().map(|b| b.id.clone()).collect();
    assert_eq!(ids, ["it", "it/2", "it/3"]);
    assert!(m.bodies().iter().all(|b| b.name.is_none()));
}

#[test]
fn repeated_facets_are_dropped_and_said_where_the_rest_closes() {
    let c = || cube(0.0, 2.0);
    let twice = mesh(join(&[c(), c()]));
    assert_eq!(bodies(&twice), [(1, 0, 8.0)]);
    assert_eq!(
        findings(&twice),
        [(FindingKind::Duplicate, Severity::Doubts, 12)]
    );
    let thrice = mesh(join(&[c(), c(), c()]));
    assert_eq!(bodies(&thrice), [(1, 0, 8.0)]);
    assert_eq!(
        findings(&thrice),
        [(FindingKind::Duplicate, Severity::Doubts, 24)]
    );
    for which in 0..12 {
        let mut one = c();
        one.insert(which * 7 % 13, c()[which]);
        let m = mesh(one);
        assert_eq!(bodies(&m), [(1, 0, 8.0)]);
        assert_eq!(
            findings(&m),
            [(FindingKind::Duplicate, Severity::Doubts, 1)]
        );
    }
    // Doubled with another first corner: still the same facet.
    let mut one = c();
    let [p, q, r] = one[3];
    one.push([q, r, p]);
    assert_eq!(bodies(&mesh(one)), [(1, 0, 8.0)]);
}

#[test]
fn a_doubled_facet_on_an_open_shell_is_refused() {
    // The rest does not close: a hole beside it. Nothing is dropped, and no piece is weighed.
    let mut t = cube(0.0, 2.0);
    t.push(t[5]);
    t.remove(0);
    let open = imbalance(&t);
    assert_eq!(open, 6);
    let m = mesh(t);
    let refusals: Vec<_> = m
        .bodies()
        .iter()
        .map(|b| m.solid(b, None).unwrap_err())
        .collect();
    // The facet and its copy part from the rest, which is open by itself.
    let kinds: Vec<_> = m
        .bodies()
        .iter()
        .zip(&refusals)
        .map(|(b, r)| (b.triangles, r.kind))
        .collect();
    assert!(
        kinds.iter().all(|k| *k
            == if k.0 == 1 {
                (1, "duplicate")
            } else {
                (10, "not-closed")
            }),
        "{kinds:?}"
    );
    assert!(refusals.iter().map(|r| r.open_edges).sum::<u64>() >= open);
    let counted: usize = m.bodies().iter().map(|b| b.triangles).sum();
    assert_eq!(counted, 12);
    assert!(findings(&m).contains(&(FindingKind::Duplicate, Severity::Doubts, 1)));
}

/// A mesh and its mirror in winding lie on each other: nothing is left, and no body.
#[test]
fn opposed_facets_add_nothing() {
    let m = mesh(join(&[cube(0.0, 2.0), reversed(&cube(0.0, 2.0))]));
    assert_eq!(m.bodies().len(), 0);
    assert_eq!(
        findings(&m),
        [(FindingKind::Duplicate, Severity::Doubts, 12)]
    );
    // A pair beside a cube is no body and leaves the cube as it is.
    let flap = [[5.0, 0.0, 0.0], [6.0, 0.0, 0.0], [5.0, 1.0, 0.0]];
    let m = mesh(join(&[
        cube(0.0, 2.0),
        vec![flap, [flap[0], flap[2], flap[1]]],
    ]));
    assert_eq!(bodies(&m), [(1, 0, 8.0)]);
    // Attached to it by a whole edge as well.
    let fin = [[0.0, 0.0, 0.0], [0.0, 0.0, 2.0], [-3.0, -3.0, 1.0]];
    let m = mesh(join(&[cube(0.0, 2.0), vec![fin, [fin[0], fin[2], fin[1]]]]));
    assert_eq!(bodies(&m), [(1, 0, 8.0)]);
    assert_eq!(
        findings(&m),
        [(FindingKind::Duplicate, Severity::Doubts, 1)]
    );
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(192))]

    /// Random sets of unit cubes: the boundary of their union, its facets in any order, sheared by
    /// integers. Bodies are the sets of cubes that hang together by faces, voids the pockets of
    /// air that hang together by faces and edges (a solid that touches itself along an edge is
    /// paired across the solid, so the air runs through); counted by flood fill. Inside out, the
    /// edges are paired across what the file calls solid, the air: the other way round.
    #[test]
    fn cubes_on_a_grid(
        filled in prop::collection::vec(0.0..1.0f64, 64),
        share in 0.2..0.95f64,
        order in Just((0..2000u32).collect::<Vec<_>>()).prop_shuffle(),
        shear in [-2..3i32, -2..3, -2..3],
        inverted in any::<bool>(),
    ) {
        let solid = |x: i32, y: i32, z: i32| {
            let inside = |a: i32| (0..4).contains(&a);
            inside(x) && inside(y) && inside(z) && filled[(x + 4 * y + 16 * z) as usize] < share
        };
        let grid = voxels::Grid::of(4, &solid);
        let surface = grid.surface();
        let [a, b, c] = shear.map(f64::from);
        let mixed: Vec<Tri> = order.iter().filter_map(|&i| surface.get(i as usize)).copied().collect();
        prop_assert_eq!(mixed.len(), surface.len());
        let mixed = mapped(&mixed, |p| [p[0] + a * p[1] + b * p[2], p[1] + c * p[2], p[2]]);
        let mixed = if inverted { reversed(&mixed) } else { mixed };
        let m = mesh(mixed);
        prop_assert!(m.bodies().iter().all(|b| b.closed && b.turned == inverted && !b.has_nested()));
        let mut sizes: Vec<u64> = m.bodies().iter().map(|b| volume(&m, b).round() as u64).collect();
        sizes.sort_unstable();
        prop_assert_eq!(&sizes, &grid.solids(inverted));
        for body in m.bodies() {
            let v = volume(&m, body);
            prop_assert!((v - v.round()).abs() < 1e-12 * 64.0);
        }
        let voids: usize = m.bodies().iter().map(bismar::mesh::Body::void_count).sum();
        prop_assert_eq!(voids, grid.pockets(!inverted));
        let shells: usize = m.bodies().iter().map(bismar::mesh::Body::shell_count).sum();
        prop_assert_eq!(shells, grid.solids(inverted).len() + grid.pockets(!inverted));
    }

    /// Random facets on small integers, most of them open: nothing is counted twice, a body is
    /// closed exactly where no open edge is found, and no order of the facets or of their corners
    /// changes what is found.
    #[test]
    fn random_facets(
        corners in prop::collection::vec([[0..3u8, 0..3, 0..3], [0..3, 0..3, 0..3], [0..3, 0..3, 0..3]], 1..40),
        order in Just((0..40usize).collect::<Vec<_>>()).prop_shuffle(),
        start in 0..3usize,
    ) {
        let t: Vec<Tri> = corners.iter().map(|t| t.map(|p| p.map(f64::from))).collect();
        let m = mesh(t.clone());
        let open: u64 = m.bodies().iter().map(|b| open_edges(&m, b)).sum();
        let net = imbalance(&t);
        // Shells can each be open where together they cancel; never the other way.
        prop_assert!(open >= net, "{open} open edges found, {net} at least");
        for b in m.bodies() {
            prop_assert_eq!(b.closed, open_edges(&m, b) == 0);
        }
        let counted: usize = m.bodies().iter().map(|b| b.triangles).sum();
        prop_assert!(counted <= t.len());
        let mixed: Vec<Tri> = order
            .iter()
            .filter_map(|&i| t.get(i))
            .map(|t| [t[start], t[(start + 1) % 3], t[(start + 2) % 3]])
            .collect();
        if !stacked(&t) {
            prop_assert_eq!(told(&m), told(&mesh(mixed)));
        }
    }

    /// The same of closed surfaces: tetrahedra on small integers, that touch and cut each other
    /// along faces, edges and corners in every way.
    #[test]
    fn random_tetrahedra(
        corners in prop::collection::vec([[0..3i8, 0..3, 0..3], [0..3, 0..3, 0..3], [0..3, 0..3, 0..3], [0..3, 0..3, 0..3]], 1..8),
        order in Just((0..40usize).collect::<Vec<_>>()).prop_shuffle(),
    ) {
        let mut t = Vec::new();
        for p in &corners {
            let p = p.map(|p| p.map(f64::from));
            t.extend(polyhedron(&p, &[vec![0, 2, 1], vec![0, 1, 3], vec![1, 2, 3], vec![0, 3, 2]]));
        }
        prop_assert_eq!(imbalance(&t), 0);
        let m = mesh(t.clone());
        let mixed: Vec<Tri> = order.iter().filter_map(|&i| t.get(i)).copied().collect();
        if stacked(&t) {
            return Ok(());
        }
        // Which of two shells that cut each other lies in the other has no answer, so bodies are
        // not compared: shells are.
        let shells = |m: &Mesh| {
            let of = |f: fn(&Body) -> usize| m.bodies().iter().map(f).sum::<usize>();
            (of(Body::shell_count), of(|b| b.triangles), m.bodies().iter().all(|b| b.closed))
        };
        prop_assert_eq!(shells(&m), shells(&mesh(mixed)));
        prop_assert!(m.bodies().iter().all(|b| b.closed));
    }

    /// Closed surfaces with facets taken out or flipped, where no edge is busy: shells are what
    /// hangs together across edges of two, counted by painting; open edges by a plain count.
    #[test]
    fn damaged_surfaces(
        n in 4..14usize,
        gone in prop::collection::vec(any::<bool>(), 400),
        flip in prop::collection::vec(0.0..1.0f64, 400),
        rate in 0.0..0.2f64,
        keep_all in any::<bool>(),
    ) {
        let t: Vec<Tri> = torus(4.0, 1.0, 2 * n)
            .into_iter()
            .enumerate()
            .filter(|(i, _)| keep_all || !gone[i % 400])
            .map(|(i, t)| if flip[i % 400] < rate { [t[1], t[0], t[2]] } else { t })
            .collect();
        if t.is_empty() {
            return Ok(());
        }
        let m = mesh(t.clone());
        // No shell lies in another here, so bodies are shells.
        let painted = painted(&t);
        let mut sizes: Vec<usize> = m.bodies().iter().map(|b| b.triangles).collect();
        sizes.sort_unstable();
        prop_assert_eq!(sizes, painted);
        let open: u64 = m.bodies().iter().map(|b| m.solid(b, None).err().map_or(0, |r| r.open_edges)).sum();
        prop_assert_eq!(open, imbalance(&t));
    }
}

/// Whether two facets stand in one place: which of them is kept is the first of the file.
fn stacked(t: &[Tri]) -> bool {
    let mut keys: Vec<_> = t
        .iter()
        .map(|f| {
            let mut k = f.map(key);
            k.sort_unstable();
            k
        })
        .filter(|k| k[0] != k[1] && k[1] != k[2])
        .collect();
    let all = keys.len();
    keys.sort_unstable();
    keys.dedup();
    keys.len() < all
}

fn open_edges(mesh: &Mesh, body: &Body) -> u64 {
    let refusal = mesh.solid(body, Some(NestedRule::Sum)).err();
    refusal.map_or(0, |r| r.open_edges)
}

/// What is found, without order: of each body its facets, shells, voids, open edges, whether it
/// was turned, and 6·V where it has one (a whole number here); and all findings.
type Told = (
    Vec<(usize, usize, usize, u64, bool, Option<i64>)>,
    Vec<(FindingKind, Severity, u64)>,
);

fn told(mesh: &Mesh) -> Told {
    let mut bodies: Vec<_> = mesh
        .bodies()
        .iter()
        .map(|b| {
            let v = mesh.solid(b, Some(NestedRule::Sum)).ok();
            let v = v.map(|s| (s.moments.zeroth * 6.0).round() as i64);
            (
                b.triangles,
                b.shell_count(),
                b.void_count(),
                open_edges(mesh, b),
                b.turned,
                v,
            )
        })
        .collect();
    bodies.sort_unstable();
    // Where boundaries meet at a vertex they can be strung together in more than one way.
    let strung = [FindingKind::Hole, FindingKind::WindingConflict];
    let found = findings(mesh).into_iter().map(|f| {
        if strung.contains(&f.0) {
            (f.0, f.1, 0)
        } else {
            f
        }
    });
    (bodies, found.collect())
}

/// A corner, so that it can be a key.
fn key(p: P) -> [u64; 3] {
    p.map(|x| (x + 0.0).to_bits())
}

/// Σ|imbalance| over undirected edges of all triangles that are not collapsed.
fn imbalance(t: &[Tri]) -> u64 {
    let mut net: HashMap<_, i64> = HashMap::new();
    for f in t.iter().map(|f| f.map(key)) {
        if f[0] == f[1] || f[1] == f[2] || f[2] == f[0] {
            continue;
        }
        for k in 0..3 {
            let (a, b) = (f[k], f[(k + 1) % 3]);
            *net.entry((a.min(b), a.max(b))).or_default() += if a < b { 1 } else { -1 };
        }
    }
    net.values().map(|n| n.unsigned_abs()).sum()
}

/// Sizes of the sets of triangles that hang together across edges of two, ascending.
fn painted(t: &[Tri]) -> Vec<usize> {
    let mut at: HashMap<_, Vec<usize>> = HashMap::new();
    for (i, f) in t.iter().map(|f| f.map(key)).enumerate() {
        for k in 0..3 {
            let (a, b) = (f[k], f[(k + 1) % 3]);
            at.entry((a.min(b), a.max(b))).or_default().push(i);
        }
    }
    assert!(at.values().all(|l| l.len() < 3));
    let mut colour: Vec<usize> = (0..t.len()).collect();
    loop {
        let before = colour.clone();
        for l in at.values().filter(|l| l.len() == 2) {
            let least = colour[l[0]].min(colour[l[1]]);
            colour[l[0]] = least;
            colour[l[1]] = least;
        }
        if colour == before {
            break;
        }
    }
    let mut sizes: HashMap<usize, usize> = HashMap::new();
    colour
        .into_iter()
        .for_each(|c| *sizes.entry(c).or_default() += 1);
    let mut out: Vec<usize> = sizes.into_values().collect();
    out.sort_unstable();
    out
}
