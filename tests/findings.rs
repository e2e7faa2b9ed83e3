//! Each finding on a mesh that has it and no other, and the same findings however the mesh is
//! turned, moved or written.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[path = "findings/shapes.rs"]
mod shapes;

use bismar::mesh::{Mesh, Run, Soup, Triangles};
use bismar::soundness::{Depth, EffectIs, Finding, FindingKind, Severity, audit};
use proptest::prelude::*;
use shapes::{Corner, Facet, sound, tetrahedron};

fn mesh_of(facets: &[Facet]) -> Mesh {
    let soup = Soup {
        triangles: Triangles::Loose(facets.to_vec()),
        names: vec![None],
        runs: vec![Run {
            first: 0,
            count: facets.len(),
            name: 0,
            material: None,
        }],
        ..Soup::default()
    };
    Mesh::new(soup, "part").unwrap()
}

fn findings(mesh: &Mesh) -> Vec<Finding> {
    let a = audit(mesh, 1e-3, 1000, Depth::Surface);
    a.file
        .into_iter()
        .chain(a.bodies.into_iter().flatten())
        .collect()
}

type Kinds = Vec<(FindingKind, Severity, u64)>;

fn kinds(facets: &[Facet]) -> Kinds {
    let mut out: Kinds = findings(&mesh_of(facets))
        .iter()
        .map(|f| (f.kind, f.severity, f.count))
        .collect();
    out.sort_unstable();
    out
}

/// One thing to break.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Break {
    Remove,
    Flip,
    Double,
    SplitOneSide,
    Sliver,
    TearOut,
    TearApart,
    TurnInsideOut,
    Touch,
    Litter,
    Nest,
}

const ALL: [Break; 11] = [
    Break::Remove,
    Break::Flip,
    Break::Double,
    Break::SplitOneSide,
    Break::Sliver,
    Break::TearOut,
    Break::TearApart,
    Break::TurnInsideOut,
    Break::Touch,
    Break::Litter,
    Break::Nest,
];

fn middle(p: &Corner, q: &Corner) -> Corner {
    [0, 1, 2].map(|k| p[k] + (q[k] - p[k]) / 2.0)
}

/// Breaks it; returns what must be found, as kind and severity, with the count of each body.
fn broken(mut m: Vec<Facet>, what: Break, t: usize) -> (Vec<Facet>, Kinds) {
    use FindingKind as K;
    use Severity as S;
    // About 3e-7 of the size.
    let shift = |p: Corner| [p[0] + 1e-5, p[1] - 2e-5, p[2] + 1.5e-5];
    let [a, b, c] = m[t];
    let want = match what {
        Break::Remove => {
            m.remove(t);
            vec![(K::Hole, S::Blocks, 1)]
        }
        Break::Flip => {
            m[t] = [a, c, b];
            vec![(K::WindingConflict, S::Blocks, 3)]
        }
        Break::Double => {
            m.push([b, c, a]);
            vec![(K::Duplicate, S::Doubts, 1)]
        }
        Break::SplitOneSide => {
            let x = middle(&a, &b);
            m[t] = [a, x, c];
            m.push([x, b, c]);
            vec![(K::TJunction, S::Blocks, 1)]
        }
        Break::Sliver => {
            let x = middle(&a, &b);
            m[t] = [a, x, c];
            m.extend([[x, b, c], [a, b, x]]);
            vec![(K::Degenerate, S::Notes, 1)]
        }
        Break::TearOut => {
            // One facet shifted a little: a ring of three edges, seen from both sides.
            m[t] = m[t].map(shift);
            // A facet torn from a void lies in the same body as the rest.
            vec![(K::Crack, S::Blocks, 1); mesh_of(&m).bodies().len()]
        }
        Break::TearApart => {
            // One corner of one facet is let go: four open edges, of one shell still.
            m[t][0] = shift(a);
            vec![(K::Crack, S::Blocks, 1)]
        }
        Break::TurnInsideOut => {
            for f in &mut m {
                f.swap(1, 2);
            }
            // The hollow one's two shells.
            let shells = mesh_of(&m).bodies()[0].shell_count() as u64;
            vec![(K::InsideOut, S::Doubts, shells)]
        }
        Break::Touch => {
            // A tetrahedron on the vertex that is farthest along (1, 2, 3), beyond it.
            let along = |p: &Corner| p[0] + 2.0 * p[1] + 3.0 * p[2];
            let v = *m
                .iter()
                .flatten()
                .max_by(|p, q| along(p).total_cmp(&along(q)))
                .unwrap();
            let by = |x: f64, y: f64, z: f64| [v[0] + x, v[1] + y, v[2] + z];
            m.extend(tetrahedron(
                v,
                by(9.0, 5.0, 9.0),
                by(2.0, 9.0, 9.0),
                by(4.0, 6.0, 12.0),
            ));
            vec![(K::NonManifoldVertex, S::Notes, 1); 2]
        }
        Break::Litter => {
            let at = |x: f64, y: f64, z: f64| [150.0 + x, 20.0 + y, z];
            let (d, o) = (1e-3, at(0.0, 0.0, 0.0));
            m.extend(tetrahedron(
                o,
                at(d, 0.0, 0.0),
                at(0.0, d, 0.0),
                at(0.0, 0.0, d),
            ));
            vec![(K::TinyShell, S::Notes, 1)]
        }
        Break::Nest => {
            // A tetrahedron just below the middle of a facet.
            let g = [0, 1, 2].map(|k| (a[k] + b[k] + c[k]) / 3.0);
            let (u, v) = (
                [0, 1, 2].map(|k| b[k] - a[k]),
                [0, 1, 2].map(|k| c[k] - a[k]),
            );
            let n = [
                u[1] * v[2] - u[2] * v[1],
                u[2] * v[0] - u[0] * v[2],
                u[0] * v[1] - u[1] * v[0],
            ];
            let l = n.iter().map(|x| x * x).sum::<f64>().sqrt();
            let tip = [0, 1, 2].map(|k| g[k] - 0.5 * n[k] / l);
            let foot = |p: &Corner| [0, 1, 2].map(|k| g[k] - 0.2 * n[k] / l + (p[k] - g[k]) * 0.5);
            m.extend(tetrahedron(tip, foot(&a), foot(&b), foot(&c)));
            vec![(K::NestedSolid, S::Doubts, 1)]
        }
    };
    (m, want)
}

#[test]
fn a_cracked_body_is_weighed_as_its_refusal_says() {
    let run = |arguments: &[&str]| {
        let out = std::process::Command::new(env!("CARGO_BIN_EXE_bismar"))
            .args(arguments)
            .arg("fixtures/crack-one-ulp.stl")
            .current_dir(env!("CARGO_MANIFEST_DIR"))
            .output()
            .unwrap();
        let json: serde_json::Value = serde_json::from_slice(&out.stdout).unwrap();
        (out.status.code().unwrap(), json)
    };
    let (exit, json) = run(&["weigh", "--json"]);
    assert_eq!(exit, 1);
    let advice = json["files"][0]["bodies"][0]["refused"]["advice"]
        .as_str()
        .unwrap();
    let distance = advice
        .split("--join \"")
        .nth(1)
        .unwrap()
        .split('"')
        .next()
        .unwrap();
    // The rims are 2^-21 mm apart, the spacing of 32-bit numbers from 4 to 8.
    let (exit, json) = run(&["check", "--json"]);
    let join = json["files"][0]["bodies"][0]["findings"][0]["join_m"]
        .as_f64()
        .unwrap();
    assert!(
        exit == 1 && (join / (2f64.powi(-21) * 1e-3) - 1.0).abs() < 1e-11,
        "{join}"
    );
    let (exit, json) = run(&["weigh", "--json", "--join", distance]);
    let body = &json["files"][0]["bodies"][0];
    assert_eq!(exit, 0);
    assert!((body["volume_m3"].as_f64().unwrap() - 1e-6).abs() < 1e-19);
    assert_eq!(body["findings"][0]["kind"], "crack");
    assert!(
        json["warnings"]
            .as_array()
            .unwrap()
            .iter()
            .any(|w| w["kind"] == "joined")
    );
    // A little less leaves it open, in whatever unit it is said.
    for less in ["4.768e-7", "4.768e-10 m"] {
        let (exit, _) = run(&["weigh", "--json", "--join", less]);
        assert_eq!(exit, 1, "{less}");
    }
}

#[test]
fn a_cracked_part_is_joined_as_its_refusal_says() {
    let folder = tempfile::tempdir().unwrap();
    let from = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/crack-one-ulp.stl");
    std::fs::copy(from, folder.path().join("tank.stl")).unwrap();
    let balance = |join: &str| {
        let text = format!(
            "[assembly]\nunit = \"cm\"\n[[part]]\nmesh = \"tank.stl\"\nunit = \"mm\"\nmaterial = \"steel S235\"\n{join}\n"
        );
        let file = folder.path().join("rover.toml");
        std::fs::write(&file, text).unwrap();
        let out = std::process::Command::new(env!("CARGO_BIN_EXE_bismar"))
            .args(["balance", "--json"])
            .arg(file)
            .output()
            .unwrap();
        let json: serde_json::Value = serde_json::from_slice(&out.stdout).unwrap();
        (out.status.code().unwrap(), json)
    };
    let (exit, json) = balance("");
    let advice = json["error"]["advice"]
        .as_str()
        .unwrap_or_else(|| panic!("{json}"));
    let join = advice
        .split("state ")
        .nth(1)
        .and_then(|rest| rest.split(" on the part").next())
        .unwrap_or_else(|| panic!("{advice}"));
    assert_eq!((exit, join.starts_with("join = \"")), (2, true), "{advice}");
    let (exit, json) = balance(join);
    assert_eq!(exit, 0, "{json}");
    // A cube of 10 mm of 7850 kg/m3.
    let mass = json["total"]["mass_kg"].as_f64().unwrap();
    assert!((mass / 7.85e-3 - 1.0).abs() < 1e-12, "{mass}");
    let kinds: Vec<&str> = json["warnings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|w| w["kind"].as_str().unwrap())
        .collect();
    assert!(
        kinds.contains(&"joined") && kinds.contains(&"crack"),
        "{kinds:?}"
    );
    // The unit of a bare length is the assembly's: 4.8e-8 cm, the crack's 2^-21 mm and a little.
    assert_eq!(balance("join = 4.8e-8").0, 0);
    assert_eq!(balance("join = 4.7e-8").0, 2);
    let (exit, json) = balance("join = 0");
    assert_eq!((exit, &json["error"]["line"]), (2, &7.into()), "{json}");
}

#[test]
fn a_box_written_twice_with_other_diagonals_is_in_doubt_when_weighed() {
    let corner = |i: usize| [i & 1, i >> 1 & 1, i >> 2 & 1];
    // Each side as its four corners in order, outward.
    let sides = [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ];
    let text = |starts: &[usize]| {
        let mut text = "o peg\n".to_owned();
        for i in 0..8 {
            let [x, y, z] = corner(i);
            text += &format!("v {x} {y} {z}\n");
        }
        for side in starts
            .iter()
            .flat_map(|&s| sides.map(|q| [0, 1, 2, 3].map(|k| q[(k + s) % 4] + 1)))
        {
            let [a, b, c, d] = side;
            text += &format!("f {a} {b} {c}\nf {a} {c} {d}\n");
        }
        text
    };
    let folder = tempfile::tempdir().unwrap();
    let weigh = |text: String| {
        let file = folder.path().join("peg.obj");
        std::fs::write(&file, text).unwrap();
        let out = std::process::Command::new(env!("CARGO_BIN_EXE_bismar"))
            .args(["weigh", "--json", "--unit", "m"])
            .arg(file)
            .output()
            .unwrap();
        let json: serde_json::Value = serde_json::from_slice(&out.stdout).unwrap();
        let body = &json["files"][0]["bodies"][0];
        let findings = body["findings"].as_array().unwrap();
        findings
            .iter()
            .find(|f| f["kind"] == "self-overlap")
            .map(|f| (f["severity"].clone(), f["count"].as_u64().unwrap()))
    };
    assert_eq!(weigh(text(&[0])), None);
    // On each side either facet of one meets both of the other, at two of the side's edges.
    let found = weigh(text(&[0, 1]));
    assert_eq!(found, Some(("doubts".into(), 24)));
    // Exact repeats are dropped, and said as such.
    assert_eq!(weigh(text(&[0, 0])), None);
}

/// What metamorphic tests do to a mesh.
fn moved(facets: &[Facet], axis: [f64; 3], angle: f64, by: [f64; 3]) -> Vec<Facet> {
    let axis = nalgebra::Unit::new_normalize(nalgebra::Vector3::from(axis));
    let r = nalgebra::Rotation3::from_axis_angle(&axis, angle);
    let go = |p: &Corner| {
        let q = r * nalgebra::Vector3::from(*p);
        [q.x + by[0], q.y + by[1], q.z + by[2]]
    };
    facets
        .iter()
        .map(|f| [go(&f[0]), go(&f[1]), go(&f[2])])
        .collect()
}

fn shuffled(facets: &[Facet], seed: u64) -> Vec<Facet> {
    let mut state = seed | 1;
    let mut next = || {
        // Knuth's multiplicative congruential step (TAOCP vol. 2, 3.3.4), from memory.
        state = state
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) as usize
    };
    let mut out = facets.to_vec();
    for i in (1..out.len()).rev() {
        out.swap(i, next() % (i + 1));
    }
    for f in &mut out {
        f.rotate_left(next() % 3);
    }
    out
}

#[test]
fn sound_meshes_have_no_finding() {
    for shape in sound() {
        assert_eq!(kinds(&shape), []);
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn one_thing_broken_is_that_finding_and_no_other(
        shape in 0usize..5, what in prop::sample::select(&ALL[..]), pick in 0usize..1_000_000,
        axis in prop::array::uniform3(-1.0f64..1.0), angle in -3.0f64..3.0,
        by in prop::array::uniform3(-300.0f64..300.0), seed in any::<u64>(),
    ) {
        prop_assume!(axis.iter().any(|x| x.abs() > 0.1));
        let whole = sound().swap_remove(shape);
        let t = pick % whole.len();
        let (m, want) = broken(whole, what, t);
        prop_assert_eq!(&kinds(&m), &want, "{:?} of shape {} at {}", what, shape, t);
        let cyclic: Vec<Facet> = m.iter().map(|f| f.map(|p| [p[1], p[2], p[0]])).collect();
        prop_assert_eq!(&kinds(&cyclic), &want);
        // A mirror turns every facet, so that two corners are swapped with it.
        let mirrored: Vec<Facet> = m
            .iter()
            .map(|f| { let [a, b, c] = f.map(|p| [p[1], p[0], p[2]]); [a, c, b] })
            .collect();
        prop_assert_eq!(&kinds(&mirrored), &want);
        prop_assert_eq!(&kinds(&shuffled(&m, seed)), &want);
        let turned = moved(&m, axis, angle, by);
        prop_assert_eq!(&kinds(&shuffled(&turned, seed)), &want, "{:?} turned", what);
    }

    /// One corner of a facet let go and another facet missing, wherever they lie: also where the
    /// slit runs into the hole, or shares an edge with it.
    #[test]
    fn a_slit_and_a_hole_are_a_crack_and_a_hole(
        shape in 0usize..4, at in 0usize..1_000_000, off in 0usize..1_000_000, seed in any::<u64>()
    ) {
        let mut m = sound().swap_remove(shape);
        let t = at % m.len();
        // Half of them close by: facets are written row by row.
        let near = if off % 2 == 0 { 1 + off / 2 % 4 } else { 1 + off % (m.len() - 1) };
        let gone = (t + near) % m.len();
        let shift = [1e-5, -2e-5, 1.5e-5];
        m[t][0] = [0, 1, 2].map(|k| m[t][0][k] + shift[k]);
        let width = shift.iter().map(|x: &f64| x * x).sum::<f64>().sqrt();
        m.remove(gone);
        let m = shuffled(&m, seed);
        let mesh = mesh_of(&m);
        let mut found = findings(&mesh);
        // Between the slit and the hole what is left may touch at a vertex, which is no fault.
        found.retain(|f| (f.kind, f.severity) != (FindingKind::NonManifoldVertex, Severity::Notes));
        let kinds: Vec<_> = found.iter().map(|f| (f.kind, f.severity, f.count)).collect();
        let want = [
            (FindingKind::Hole, Severity::Blocks, 1),
            (FindingKind::Crack, Severity::Blocks, 1),
        ];
        // Without its third neighbour the torn facet is a body of its own, with the same two. (In the
        // hollow box, which is left out, it would lie in the body of the rest and be counted there.)
        let bodies = mesh.bodies().len();
        for w in want {
            let n = kinds.iter().filter(|k| **k == w).count();
            prop_assert_eq!(n, bodies, "{:?} of shape {} at {} without {}", &kinds, shape, t, gone);
        }
        prop_assert!(kinds.iter().all(|k| want.contains(k)), "{:?}", &kinds);
        let crack = found.iter().find(|f| f.kind == FindingKind::Crack).unwrap();
        let join = crack.join_m.unwrap() * 1e3;
        // Coordinates of 100 mm have steps of 1.4e-14.
        prop_assert!((join - width).abs() <= 1e-12 + 1e-11 * width, "{join} {width}");
        // Joined, the hole is left, of three edges.
        let after = findings(&mesh.join(join, "part").unwrap());
        let hole: Vec<_> = after.iter().filter(|f| f.severity == Severity::Blocks).collect();
        prop_assert_eq!(hole.len(), 1, "{:?}", &hole);
        prop_assert_eq!((hole[0].kind, hole[0].places[0].edges), (FindingKind::Hole, Some(3)));
    }

    /// The stated distance closes the crack, and a little less does not.
    #[test]
    fn the_distance_of_a_crack_is_the_least_that_closes_it(
        shape in 0usize..5, pick in 0usize..1_000_000, apart in prop::bool::ANY
    ) {
        let whole = sound().swap_remove(shape);
        let volume = |m: &Mesh| {
            m.bodies().iter().map(|b| m.solid(b, None).unwrap().moments.zeroth).sum::<f64>()
        };
        let true_volume = volume(&mesh_of(&whole));
        let t = pick % whole.len();
        let how = if apart { Break::TearApart } else { Break::TearOut };
        let (m, _) = broken(whole, how, t);
        let mesh = mesh_of(&m);
        let crack = findings(&mesh).into_iter().find(|f| f.kind == FindingKind::Crack).unwrap();
        let join = crack.join_m.unwrap() * 1e3;
        let open = mesh.join(join * (1.0 - 1e-9), "part").unwrap();
        prop_assert!(open.bodies().iter().any(|b| !b.closed));
        let joined = mesh_of(&m).join(join, "part").unwrap();
        prop_assert!(joined.bodies().iter().all(|b| b.closed));
        let found = findings(&joined);
        prop_assert!(found.iter().all(|f| (f.kind, f.severity) == (FindingKind::Crack, Severity::Doubts)));
        let bound: f64 = found.iter().map(|f| f.volume_effect_m3.unwrap() * 1e9).sum();
        prop_assert!(bound > 0.0 && found.iter().all(|f| f.volume_effect_is == Some(EffectIs::Bound)));
        // 1e-13 of K bounds the rounding of both volumes; K is below ten times the box here.
        let off = (volume(&joined) - true_volume).abs();
        prop_assert!(off <= bound + 1e-6, "{} against {}", off, bound);
    }
}
