//! Failed exports for `check`: each file has the faults that its name and the README state.

use super::File;
use super::mesh::{Axis, BINARY_GRID, Body, Outline, TEXT_GRID, arc};
use super::rover::nozzle_bracket;
use super::write::{obj, stl_ascii, stl_binary};

pub(crate) fn files() -> Vec<File> {
    let file = |path: &str, bytes: Vec<u8>| File {
        path: format!("broken/{path}"),
        bytes,
        bodies: Vec::new(),
    };
    vec![
        file(
            "bracket-with-a-hole.stl",
            stl_binary("a face went missing", &[holed_bracket()]),
        ),
        file("knob-inside-out.stl", stl_ascii(&[inside_out_knob()])),
        file(
            "housing-with-a-flipped-shell.obj",
            obj("the chamber faces outward", &[housing()]),
        ),
        file(
            "plate-with-flipped-facets.obj",
            obj("two faces look inward", &[flipped_plate()]),
        ),
        file("README.md", include_bytes!("broken.md").to_vec()),
    ]
}

/// Two neighbouring triangles of the outer edge are missing: one four-cornered hole.
fn holed_bracket() -> Body {
    let mut body = nozzle_bracket();
    let last = body.triangles().len();
    let mut triangles: Vec<Vec<usize>> = Vec::new();
    for face in &body.faces {
        for i in 1..face.len() - 1 {
            triangles.push(vec![face[0], face[i], face[i + 1]]);
        }
    }
    // The last wall written is a slot's: its final quad is the last two triangles.
    triangles.truncate(last - 2);
    body.faces = triangles;
    body
}

fn inside_out_knob() -> Body {
    let mut profile = vec![[0.0, 0.0], [18.0, 0.0], [15.0, 12.0]];
    profile.extend(arc([0.0, 24.0], 14.0, 0.0, 1.0, 6));
    let mut body = Body::new("knob", TEXT_GRID);
    body.revolve(Axis::Z, [0.0, 0.0], &profile, 24, false);
    body.turn_inside_out();
    body
}

/// A box with a round chamber whose surface faces outward, as if it were a second solid.
fn housing() -> Body {
    let mut body = Body::new("housing", TEXT_GRID);
    body.prism(Axis::Z, &Outline::rect([0.0, 0.0], [80.0, 60.0]), 0.0, 50.0);
    let chamber = [[0.0, 5.0], [20.0, 5.0], [20.0, 45.0], [0.0, 45.0]];
    body.revolve(Axis::Z, [0.0, 0.0], &chamber, 24, false);
    body
}

/// Two side faces of a hexagonal plate are wound the wrong way round.
fn flipped_plate() -> Body {
    let mut body = Body::new("plate", BINARY_GRID);
    body.prism(Axis::Z, &Outline::circle([0.0, 0.0], 40.0, 6), 0.0, 8.0);
    for side in [3, 6] {
        body.faces[side].reverse();
    }
    body
}
