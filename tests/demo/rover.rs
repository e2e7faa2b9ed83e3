//! The orchard sprayer rover: x forward, y to the left, z up, origin on the ground amidships.

use super::File;
use super::mesh::{Axis, BINARY_GRID, Body, Outline, TEXT_GRID, arc};
use super::write::{obj, stl_ascii, stl_binary};

pub(crate) fn files() -> Vec<File> {
    let one = |path: &str, header: &str, body: Body| {
        let bytes = stl_binary(header, std::slice::from_ref(&body));
        File {
            path: format!("rover/{path}"),
            bytes,
            bodies: vec![body],
        }
    };
    let many = |path: &str, bytes: Vec<u8>, bodies: Vec<Body>| File {
        path: format!("rover/{path}"),
        bytes,
        bodies,
    };
    let frame = frame();
    let wheel = vec![tyre(), rim()];
    let bearing = vec![bearing_block()];
    let arm = vec![mast(), mast_clamp(), boom()];
    let lid = vec![tank_lid()];
    let boxes = vec![electronics_cover(), battery_tray()];
    vec![
        many(
            "frame.obj",
            obj("orchard sprayer rover: welded frame, mm", &frame),
            frame,
        ),
        many(
            "wheel.obj",
            obj("orchard sprayer rover: wheel, outer side +y, mm", &wheel),
            wheel,
        ),
        many("bearing-block.stl", stl_ascii(&bearing), bearing),
        many("spray-arm.stl", stl_ascii(&arm), arm),
        many("tank-lid.stl", stl_ascii(&lid), lid),
        many(
            "electronics.obj",
            obj("orchard sprayer rover: cover and tray, mm", &boxes),
            boxes,
        ),
        one("deck.stl", "orchard sprayer rover: deck, mm", deck()),
        one("axle.stl", "orchard sprayer rover: axle, mm", axle()),
        one(
            "counter-plate.stl",
            "orchard sprayer rover: counter plate, mm",
            counter_plate(),
        ),
        one(
            "pump-body.stl",
            "orchard sprayer rover: pump body, mm",
            pump_body(),
        ),
        one(
            "spray-tank.stl",
            "orchard sprayer rover: spray tank, mm",
            spray_tank(),
        ),
        one(
            "spray-tank-inside.stl",
            "orchard sprayer rover: inside of the spray tank, mm",
            spray_tank_inside(),
        ),
        one(
            "nozzle-bracket.stl",
            "orchard sprayer rover: nozzle bracket, mm",
            nozzle_bracket(),
        ),
        File {
            path: "rover/rover.toml".to_owned(),
            bytes: include_bytes!("rover.toml").to_vec(),
            bodies: Vec::new(),
        },
    ]
}

/// Two drilled rails, open at their ends, and three capped cross members between them.
fn frame() -> Vec<Body> {
    let rail = |side: &str, y: f64| {
        let mut body = Body::new(&format!("frame rail {side}"), TEXT_GRID);
        let drilled = (&[-560.0, -500.0, -120.0, 120.0, 500.0, 560.0][..], 6.5);
        body.drilled_tube(
            Axis::X,
            [y, 260.0],
            [60.0, 60.0],
            3.0,
            [-650.0, 650.0],
            drilled,
        );
        body
    };
    let cross = |place: &str, x: f64| {
        let mut body = Body::new(&format!("frame cross {place}"), TEXT_GRID);
        let inside = Outline::rect([260.0, x], [54.0, 54.0]);
        body.prism(Axis::Y, &inside, -187.0, 187.0);
        body.turn_inside_out();
        body.prism(
            Axis::Y,
            &Outline::rect([260.0, x], [60.0, 60.0]),
            -190.0,
            190.0,
        );
        body
    };
    vec![
        rail("left", 220.0),
        rail("right", -220.0),
        cross("front", 530.0),
        cross("middle", 0.0),
        cross("rear", -530.0),
    ]
}

/// A hollow tyre: half an ellipse over the rim, and the air chamber inside it.
fn tyre() -> Body {
    let mut body = Body::new("tyre", TEXT_GRID);
    let section = |seat: f64, foot: f64, across: f64, up: f64| {
        let mut profile = vec![[seat, -foot]];
        profile.extend(
            arc([0.0, 0.0], 1.0, -1.0, 1.0, 16)
                .iter()
                .map(|p| [150.0 + across * p[0], up * p[1]]),
        );
        profile.push([seat, foot]);
        profile
    };
    body.revolve(
        Axis::Y,
        [0.0, 0.0],
        &section(128.0, 42.0, 41.0, 53.0),
        64,
        true,
    );
    body.turn_inside_out();
    body.revolve(
        Axis::Y,
        [0.0, 0.0],
        &section(120.0, 50.0, 50.0, 62.0),
        64,
        true,
    );
    body
}

/// A dished rim with a bored hub; the hub stands out on the outer side.
fn rim() -> Body {
    let mut body = Body::new("rim", TEXT_GRID);
    let profile = [
        [15.5, -45.0],
        [32.0, -45.0],
        [32.0, 6.0],
        [112.0, 14.0],
        [114.0, -50.0],
        [120.0, -50.0],
        [120.0, 50.0],
        [114.0, 50.0],
        [112.0, 22.0],
        [32.0, 16.0],
        [32.0, 60.0],
        [15.5, 60.0],
    ];
    body.revolve(Axis::Y, [0.0, 0.0], &profile, 64, true);
    body
}

fn axle() -> Body {
    let mut body = Body::new("axle", BINARY_GRID);
    let half = [
        [15.0, 195.0],
        [20.0, 195.0],
        [20.0, 245.0],
        [15.0, 245.0],
        [15.0, 458.0],
        [13.0, 460.0],
        [0.0, 460.0],
    ];
    let mut profile: Vec<[f64; 2]> = half.iter().rev().map(|p| [p[0], -p[1]]).collect();
    profile.extend(half);
    body.revolve(Axis::Y, [0.0, 0.0], &profile, 40, false);
    body
}

/// Holds an axle collar under a rail: the bore runs along y, 30 mm below the block's top.
fn bearing_block() -> Body {
    let mut body = Body::new("bearing block", TEXT_GRID);
    let holes = [
        Outline::circle([0.0, 0.0], 21.0, 40),
        Outline::circle([0.0, 31.0], 4.0, 12),
        Outline::circle([0.0, -31.0], 4.0, 12),
    ];
    let outline = Outline::rounded([0.0, 0.0], [60.0, 80.0], 8.0, 4);
    body.extrude(Axis::Y, &outline, &holes, -20.0, 20.0);
    body
}

fn deck() -> Body {
    let mut body = Body::new("deck", BINARY_GRID);
    let mut holes = vec![
        Outline::rounded([510.0, 0.0], [60.0, 160.0], 20.0, 5),
        Outline::rounded([-285.0, 0.0], [120.0, 120.0], 25.0, 5),
    ];
    for x in [-20.0, 170.0, 360.0] {
        for y in [-165.0, 165.0] {
            holes.push(Outline::circle([x + 35.0, y], 22.0, 28));
        }
    }
    holes.push(Outline::circle([170.0, 0.0], 60.0, 40));
    let outline = Outline::rounded([110.0, 0.0], [1060.0, 500.0], 30.0, 6);
    body.extrude(Axis::Z, &outline, &holes, 290.0, 294.0);
    body
}

/// Bolted across the rail ends: a bumper, and a counterweight to the spray arm.
fn counter_plate() -> Body {
    let mut body = Body::new("counter plate", BINARY_GRID);
    let at = [
        [-220.0, 276.0],
        [220.0, 276.0],
        [-120.0, 230.0],
        [120.0, 230.0],
    ];
    let holes = at.map(|c| Outline::circle(c, 6.5, 20));
    let outline = Outline::rounded([0.0, 250.0], [500.0, 80.0], 15.0, 5);
    body.extrude(Axis::X, &outline, &holes, 650.0, 662.0);
    body
}

/// A cast body on a square flange: bored from below, four bolt holes.
fn pump_body() -> Body {
    let mut body = Body::new("pump body", BINARY_GRID);
    let flange = Outline::rounded([0.0, 0.0], [100.0, 100.0], 12.0, 5);
    let bolts = [[40.0, 40.0], [-40.0, 40.0], [-40.0, -40.0], [40.0, -40.0]];
    let bolts = bolts.map(|c| Outline::circle(c, 4.5, 16));
    for (z, radius, up) in [(0.0, 25.0, false), (8.0, 35.0, true)] {
        let mut holes = bolts.to_vec();
        holes.push(Outline::circle([0.0, 0.0], radius, 48));
        body.pierced(Axis::Z, z, &flange.0, &holes, up);
    }
    body.wall(Axis::Z, &flange.0, 0.0, 8.0, true);
    for bolt in &bolts {
        body.wall(Axis::Z, &bolt.0, 0.0, 8.0, false);
    }
    let mut outside = vec![[35.0, 8.0]];
    outside.extend(arc([23.0, 68.0], 12.0, 0.0, 1.0, 6));
    outside.push([0.0, 80.0]);
    body.revolve(Axis::Z, [0.0, 0.0], &outside, 48, false);
    body.revolve(
        Axis::Z,
        [0.0, 0.0],
        &[[0.0, 60.0], [25.0, 60.0], [25.0, 0.0]],
        48,
        false,
    );
    body
}

const TANK_STEPS: usize = 64;

/// The tank's floor and lower corner, at `inset` inside the outer surface.
fn tank_floor(inset: f64) -> Vec<[f64; 2]> {
    let mut profile = vec![[0.0, inset]];
    profile.extend(arc([150.0, 60.0], 60.0 - inset, -1.0, 0.0, 8));
    profile
}

/// The tank's profile, at `inset` inside the outer surface.
fn tank_skin(inset: f64) -> Vec<[f64; 2]> {
    let mut profile = tank_floor(inset);
    profile.extend(arc([130.0, 300.0], 80.0 - inset, 0.0, 1.0, 10));
    profile.extend([[60.0 - inset, 380.0 - inset], [60.0 - inset, 400.0 - inset]]);
    profile.push([0.0, 400.0 - inset]);
    profile
}

/// Rotationally moulded: one closed outer surface, one closed chamber 5 mm inside it.
fn spray_tank() -> Body {
    let mut body = Body::new("spray tank", BINARY_GRID);
    body.revolve(Axis::Z, [0.0, 0.0], &tank_skin(5.0), TANK_STEPS, false);
    body.turn_inside_out();
    body.revolve(Axis::Z, [0.0, 0.0], &tank_skin(0.0), TANK_STEPS, false);
    body
}

/// The chamber as a solid of its own: what liquid can fill.
fn spray_tank_inside() -> Body {
    let mut body = Body::new("spray tank inside", BINARY_GRID);
    body.revolve(Axis::Z, [0.0, 0.0], &tank_skin(5.0), TANK_STEPS, false);
    body
}

fn tank_lid() -> Body {
    let mut profile = vec![[0.0, 0.0], [66.0, 0.0]];
    profile.extend(arc([61.0, 9.0], 5.0, 0.0, 1.0, 3));
    profile.extend([[28.0, 16.0], [24.0, 22.0]]);
    profile.extend(arc([22.0, 34.0], 6.0, 0.0, 1.0, 4));
    profile.push([0.0, 40.0]);
    let mut body = Body::new("tank lid", TEXT_GRID);
    body.revolve(Axis::Z, [0.0, 0.0], &profile, 32, false);
    body
}

fn mast() -> Body {
    let mut body = Body::new("mast", TEXT_GRID);
    let profile = [[17.0, 0.0], [20.0, 0.0], [20.0, 700.0], [17.0, 700.0]];
    body.revolve(Axis::Z, [0.0, 0.0], &profile, 40, true);
    body
}

fn mast_clamp() -> Body {
    let mut body = Body::new("mast clamp", TEXT_GRID);
    let outline = Outline::rounded([0.0, 0.0], [80.0, 80.0], 10.0, 4);
    body.extrude(
        Axis::Z,
        &outline,
        &[Outline::circle([0.0, 0.0], 20.5, 40)],
        -30.0,
        30.0,
    );
    body
}

/// The left boom: a tube along +y, open at its root, with a round tip.
fn boom() -> Body {
    let mut profile = arc([0.0, 882.0], 15.5, 1.0, 0.0, 6);
    profile.extend([[15.5, 0.0], [18.0, 0.0]]);
    profile.extend(arc([0.0, 882.0], 18.0, 0.0, 1.0, 6));
    let mut body = Body::new("boom", TEXT_GRID);
    body.revolve(Axis::Y, [0.0, 0.0], &profile, 32, false);
    body
}

pub(crate) fn nozzle_bracket() -> Body {
    let mut body = Body::new("nozzle bracket", BINARY_GRID);
    let outline = Outline::rounded([-25.0, 0.0], [110.0, 60.0], 14.0, 6);
    let holes = [
        Outline::circle([0.0, 0.0], 18.5, 32),
        Outline::circle([-58.0, 0.0], 8.0, 24),
        Outline::rounded([-36.0, 0.0], [9.0, 32.0], 4.0, 4),
    ];
    body.extrude(Axis::Y, &outline, &holes, -6.0, 6.0);
    body
}

/// Stepped when seen from the side: its ends are concave six-cornered faces. Open below.
fn electronics_cover() -> Body {
    let mut body = Body::new("electronics cover", TEXT_GRID);
    // (z, x), counter-clockwise about +y; the last edge lies on the deck.
    let outer = [
        [0.0, 0.0],
        [120.0, 0.0],
        [120.0, 100.0],
        [60.0, 100.0],
        [60.0, 200.0],
        [0.0, 200.0],
    ];
    let inner = [
        [0.0, 3.0],
        [117.0, 3.0],
        [117.0, 97.0],
        [57.0, 97.0],
        [57.0, 197.0],
        [0.0, 197.0],
    ];
    for (outline, y, outside) in [(outer, 120.0, true), (inner, 117.0, false)] {
        let end = |y: f64| outline.iter().map(move |p| [p[1], y, p[0]]);
        let mut faces: Vec<Vec<[f64; 3]>> = vec![end(y).collect(), end(-y).rev().collect()];
        for side in outline.windows(2) {
            let [p, q] = [side[0], side[1]];
            faces.push(vec![
                [p[1], -y, p[0]],
                [q[1], -y, q[0]],
                [q[1], y, q[0]],
                [p[1], y, p[0]],
            ]);
        }
        for mut face in faces {
            if !outside {
                face.reverse();
            }
            body.face(&face);
        }
    }
    // The rim on the deck, mitred at its corners, seen from below.
    let (big, small) = (
        [[0.0, -120.0], [0.0, 120.0], [200.0, 120.0], [200.0, -120.0]],
        [[3.0, -117.0], [3.0, 117.0], [197.0, 117.0], [197.0, -117.0]],
    );
    for i in 0..4 {
        let j = (i + 1) % 4;
        body.face(&[big[i], big[j], small[j], small[i]].map(|p: [f64; 2]| [p[0], p[1], 0.0]));
    }
    body
}

fn battery_tray() -> Body {
    let mut body = Body::new("battery tray", TEXT_GRID);
    let outer = Outline::rounded([0.0, 0.0], [220.0, 200.0], 10.0, 4);
    let inner = Outline::rounded([0.0, 0.0], [212.0, 192.0], 6.0, 4);
    let flat = |o: &Outline, z: f64| o.0.iter().map(|p| [p[0], p[1], z]).collect::<Vec<_>>();
    let mut below = flat(&outer, 0.0);
    below.reverse();
    body.face(&below);
    body.face(&flat(&inner, 4.0));
    body.wall(Axis::Z, &outer.0, 0.0, 60.0, true);
    body.wall(Axis::Z, &inner.0, 4.0, 60.0, false);
    body.pierced(Axis::Z, 60.0, &outer.0, std::slice::from_ref(&inner), true);
    body
}
