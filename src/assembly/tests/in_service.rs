//! States of an assembly, as statics and sampling ask for them.

use super::*;
use crate::assembly::service::{Service, State};

/// REFERENCE section "Trade": a sprayer of 120 kg dry, centred, 0.5 m high, with a box tank 0.8 m
/// wide, 0.5 m long and 0.8 m high whose bottom is 0.3 m high, holding 160 kg.
const SPRAYER: &str = r#"
[assembly]
unit = "m"
[material.brine]
density = "1000 kg/m3"
[[item]]
name = "frame"
mass = "120 kg"
at = [0, 0, 0.5]
[[tank]]
name = "tank"
mesh = "inside.obj"
liquid = "brine"
fill = "160 kg"
[[motion]]
of = "tank"
turn = { axis = "z", at = [1, 0, 0] }
to = "180 deg"
[[motion]]
of = "frame"
along = "y"
from = "1 cm"
to = "5 cm"
"#;

fn service(text: &str) -> Service {
    let mut bench = Bench::new().mesh(
        "inside.obj",
        vec![block("inside", [-0.25, -0.4, 0.3], [0.25, 0.4, 1.1])],
    );
    bench.put("it.toml", text);
    let loaded = bench.load("it.toml").unwrap();
    resolve(&loaded, &mut bench).unwrap().service.unwrap()
}

/// Gravity as it is felt on a slope that falls toward +y.
fn on_slope(state: &State, angle: f64) -> State {
    State {
        effective: Some(Vector3::new(0.0, angle.sin(), -angle.cos()) * 9.80665),
        ..state.clone()
    }
}

/// Where the line of action meets the ground, sideways.
fn foot(centre: &Vector3<f64>, angle: f64) -> f64 {
    centre.y + centre.z * angle.tan()
}

fn tips(outside: impl Fn(f64) -> bool) -> f64 {
    let (mut lo, mut hi) = (0.0, 1.2);
    while hi - lo > 1e-13 {
        let middle = (lo + hi) / 2.0;
        if outside(middle) {
            hi = middle;
        } else {
            lo = middle;
        }
    }
    lo.to_degrees()
}

/// It tips over wheels 0.45 m out at 36.97196065°; a surface frozen level says 41.98721250°.
#[test]
fn liquid_finds_its_level_on_every_slope() {
    let service = service(&SPRAYER.replace("from = \"1 cm\"", "from = 0"));
    let rest = service.rest(None).unwrap();
    let centre = |s: &State| service.at(s).unwrap().total.centre().unwrap();
    let angle = tips(|a| foot(&centre(&on_slope(&rest, a)), a) > 0.45);
    assert!((angle - 36.97196065).abs() < 1e-8, "{angle}");
    let frozen = centre(&rest);
    let angle = tips(|a| foot(&frozen, a) > 0.45);
    assert!((angle - 41.98721250).abs() < 1e-8, "{angle}");
}

#[test]
fn a_state_places_fills_and_moves() {
    let service = service(SPRAYER);
    let rest = service.rest(None).unwrap();
    assert_eq!(service.tanks()[0].path, "tank");
    near(rest.fills[0], 0.16);
    // What begins elsewhere than the file has it stands there at rest.
    assert_eq!(rest.motions, [0.0, 0.01]);
    let at_rest = service.at(&rest).unwrap();
    assert_eq!(service.path(at_rest.things[0].thing), "frame");
    near3(
        at_rest.things[0].moments.about.into(),
        [0.0, 0.01, 0.5],
        1.0,
    );
    let mut turned = rest.clone();
    turned.motions[0] = std::f64::consts::PI;
    turned.fills[0] = 0.08;
    let s = service.at(&turned).unwrap();
    near(s.total.zeroth, 200.0);
    let liquid = s.tanks[0].moments.centre().unwrap();
    near3(liquid.into(), [2.0, 0.0, 0.4], 1.0);
    near(s.tanks[0].level.unwrap(), 0.2);
    near3(
        s.tanks[0].surface.unwrap().centroid.into(),
        [2.0, 0.0, 0.5],
        1.0,
    );
    // Reported things are those of the snapshot.
    let (weighed, _) = service.weighed(&turned).unwrap();
    assert_eq!(weighed[1].moments, s.things[1].moments);
    near(weighed[1].volume.unwrap(), 0.08);
    // A surplus of liquid is no more than full, and less than nothing is nothing.
    turned.fills[0] = 9.0;
    near(service.at(&turned).unwrap().tanks[0].volume, 0.32);
    turned.fills[0] = -1.0;
    let s = service.at(&turned).unwrap();
    assert_eq!((s.tanks[0].volume, s.tanks[0].surface), (0.0, None));
    // Without anything that is up, a part filling has no place.
    let nowhere = State {
        effective: None,
        ..rest
    };
    assert!(service.at(&nowhere).is_err());
}
