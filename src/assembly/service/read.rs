//! Reads tanks, gravity, cases, motions, phases and frames.

use std::collections::{BTreeMap, HashMap};

use nalgebra::{Matrix3, Vector3};

use super::keys::{Case, Fill, FillOf, Frame, Gravity, Motion, MotionKind, Phase, ServiceKeys};
use crate::assembly::reader::{self, Reader, Shared};
use crate::assembly::tree::{Node, Value};
use crate::error::Kind;
use crate::gravity::{Field, STANDARD_GRAVITY};
use crate::quantity::{Dimension, Quantity};

/// Everything but tanks, from the root table.
pub(in crate::assembly) fn read(root: &Reader<'_, '_>) -> ServiceKeys {
    let keys = ServiceKeys {
        gravity: root
            .table("gravity", "gravity")
            .and_then(gravity)
            .unwrap_or_default(),
        cases: root.tables("case").into_iter().filter_map(case).collect(),
        motions: root
            .tables("motion")
            .into_iter()
            .filter_map(motion)
            .collect(),
        phases: root.tables("phase").into_iter().filter_map(phase).collect(),
        frames: root.tables("frame").into_iter().filter_map(frame).collect(),
    };
    let shared = root.shared;
    unique(shared, "case", keys.cases.iter().map(|c| (&c.name, c.line)));
    unique(
        shared,
        "motion",
        keys.motions.iter().map(|m| (&m.name, m.line)),
    );
    unique(
        shared,
        "phase",
        keys.phases.iter().map(|p| (&p.name, p.line)),
    );
    unique(
        shared,
        "frame",
        keys.frames.iter().map(|f| (&f.name, f.line)),
    );
    keys
}

fn unique<'n>(shared: &Shared<'_>, what: &str, names: impl Iterator<Item = (&'n String, u64)>) {
    let mut seen = HashMap::new();
    for (name, line) in names {
        if let Some(first) = seen.insert(name, line) {
            let message = format!("the {what} `{name}` of line {first} has the same name");
            let advice = format!("give each [[{what}]] a name of its own");
            shared.fault(line, Kind::AmbiguousName, message, advice);
        }
    }
}

fn name(r: &Reader<'_, '_>) -> Option<String> {
    let name = r.text("name").map(|(name, _)| name);
    if name.is_none() && r.entry("name").is_none() {
        let advice = "name it, so that results can speak of it";
        r.missing("name", Kind::Usage, advice);
    }
    name
}

/// How far a tank is filled: per cent, a volume, a mass, or a length for a level.
pub(in crate::assembly) fn fill(shared: &Shared<'_>, node: &Node, key: &str) -> Option<Fill> {
    const OF: [Dimension; 4] = [
        Dimension::Fraction,
        Dimension::Volume,
        Dimension::Mass,
        Dimension::Length,
    ];
    let read = match &node.value {
        Value::Text(s) => Quantity::parse_one_of(s, &OF, Some(shared.unit)),
        Value::Number(x) if x.is_finite() => {
            Quantity::from_number(*x, Dimension::Length, Some(shared.unit))
                .map(|q| (Dimension::Length, q))
        }
        other => {
            let message = format!("`{key}` must be a fill, and is {}", other.kind());
            let advice = "write \"60 %\", \"32 l\", \"30 kg\", or a length for the level";
            shared.fault(node.line, Kind::BadNumber, message, advice);
            return None;
        }
    };
    let (of, amount) = match read {
        Ok(read) => read,
        Err(e) => {
            let message = format!("`{key}`: {}", e.message);
            shared.fault(node.line, e.kind, message, e.advice);
            return None;
        }
    };
    let of = match of {
        Dimension::Fraction => FillOf::Share,
        Dimension::Volume => FillOf::Volume,
        Dimension::Mass => FillOf::Mass,
        _ => FillOf::Level,
    };
    let wrong = match of {
        _ if amount.value < 0.0 => Some("is below zero"),
        FillOf::Share if amount.value > 1.0 => Some("is above 100 %"),
        _ => None,
    };
    if let Some(wrong) = wrong {
        let advice = "a tank holds from nothing to all of its volume";
        shared.fault(
            node.line,
            Kind::BadNumber,
            format!("`{key}` {wrong}"),
            advice,
        );
        return None;
    }
    Some(Fill {
        of,
        amount,
        line: node.line,
    })
}

fn gravity(r: Reader<'_, '_>) -> Option<Gravity> {
    let field = r.text("field");
    let kind = field.as_ref().map_or("uniform", |(f, _)| f.as_str());
    let down = r.direction("down").unwrap_or(-Vector3::z());
    let g = r.quantity("g", Dimension::Acceleration);
    let latitude = r.quantity("latitude", Dimension::Angle);
    let height = r.quantity("height", Dimension::Length);
    let gm = r.quantity("gm", Dimension::GravitationalParameter);
    let at = r.lengths("at");
    let acceleration = r
        .entry("acceleration")
        .map(|e| accelerations(r.shared, &e.node));
    // A key of another field would be silently without effect.
    let of = |key: &'static str, fields: &[&str]| {
        if let Some(entry) = r.entry(key)
            && !fields.contains(&kind)
        {
            let message = format!("`{key}` says nothing in a field that is \"{kind}\"");
            let advice = format!("take it out, or write field = \"{}\"", fields[0]);
            r.shared.fault(entry.line, Kind::Usage, message, advice);
        }
    };
    of("g", &["uniform"]);
    of("down", &["uniform", "earth"]);
    of("latitude", &["earth"]);
    of("height", &["earth"]);
    of("gm", &["central"]);
    of("at", &["central"]);
    let need = |key: &'static str, example: &str| {
        if r.entry(key).is_none() {
            r.missing(key, Kind::Usage, format!("write {example}"));
        }
    };
    let field = match kind {
        "uniform" => {
            let below = g.filter(|(q, _)| q.value < 0.0);
            if let Some((_, line)) = below {
                let advice = "turn `down` round instead";
                r.shared
                    .fault(line, Kind::BadNumber, "`g` is below zero".into(), advice);
            }
            let g = g.map_or(STANDARD_GRAVITY, |(q, _)| q.value);
            Some(Field::Uniform { g, down })
        }
        "earth" => {
            need("latitude", "latitude = \"48.2 deg\"");
            let latitude = latitude.and_then(|(q, line)| {
                // A hair more than a right angle: degrees were rounded on their way to radians.
                if q.value.abs() <= std::f64::consts::FRAC_PI_2 * (1.0 + 1e-15) {
                    return Some(q.value);
                }
                let advice = "latitudes run from -90 deg to 90 deg";
                let message = "`latitude` is beyond the poles".into();
                r.shared.fault(line, Kind::BadNumber, message, advice);
                None
            });
            latitude.map(|latitude| Field::Earth {
                latitude,
                height: height.map_or(0.0, |(q, _)| q.value),
                down,
            })
        }
        "central" => {
            need("gm", "gm = \"3.986004418e14 m3/s2\"");
            need(
                "at",
                "at = [\"6378.137 km\", 0, 0], the origin seen from the field's centre",
            );
            match (gm, at) {
                (Some((gm, _)), Some((at, line))) => {
                    let at = Vector3::from(at.map(|q| q.value));
                    if at.norm() == 0.0 {
                        let message = "`at` is the very centre of the field".into();
                        let advice = "write where the assembly's origin is, seen from there";
                        r.shared.fault(line, Kind::BadNumber, message, advice);
                    }
                    Some(Field::Central { gm: gm.value, at })
                }
                _ => None,
            }
        }
        other => {
            let line = field.as_ref().map_or(r.line, |(_, line)| *line);
            let message = format!("there is no field \"{other}\"");
            let advice = "the fields are \"uniform\", \"earth\" and \"central\"";
            r.shared.fault(line, Kind::Usage, message, advice);
            None
        }
    };
    let line = r.line;
    r.finish();
    Some(Gravity {
        field: field?,
        acceleration: match acceleration {
            Some(a) => a?,
            None => Vector3::zeros(),
        },
        line: Some(line),
    })
}

fn accelerations(shared: &Shared<'_>, node: &Node) -> Option<Vector3<f64>> {
    let advice = "write acceleration = [\"2 m/s2\", \"0 m/s2\", \"0 m/s2\"]";
    let Value::List(list) = &node.value else {
        let message = "`acceleration` must be three accelerations".into();
        shared.fault(node.line, Kind::BadNumber, message, advice);
        return None;
    };
    let [x, y, z] = list.as_slice() else {
        let message = format!("`acceleration` must be three, and is {}", list.len());
        shared.fault(node.line, Kind::BadNumber, message, advice);
        return None;
    };
    let [x, y, z] = [x, y, z].map(|n| match n.value {
        // Nothing along an axis needs no unit.
        Value::Number(0.0) => Some(Quantity::exact(0.0)),
        _ => reader::quantity(shared, n, "acceleration", Dimension::Acceleration),
    });
    Some(Vector3::new(x?.value, y?.value, z?.value))
}

/// A list of texts, or one text.
fn texts(r: &Reader<'_, '_>, key: &'static str) -> Vec<String> {
    let Some(entry) = r.entry(key) else {
        return Vec::new();
    };
    let list = match &entry.node.value {
        Value::List(list) => list.as_slice(),
        Value::Text(_) => std::slice::from_ref(&entry.node),
        _ => &[],
    };
    let found: Vec<String> = list
        .iter()
        .filter_map(|n| match &n.value {
            Value::Text(s) if !s.trim().is_empty() => Some(s.clone()),
            _ => None,
        })
        .collect();
    if found.len() != list.len() || list.is_empty() {
        let message = format!("`{key}` must be a list of names");
        let advice = format!("write {key} = [\"a name\", \"another\"]");
        r.shared.fault(entry.line, Kind::Usage, message, advice);
    }
    found
}

fn motion(r: Reader<'_, '_>) -> Option<Motion> {
    let of = r.text("of");
    if r.entry("of").is_none() {
        r.missing("of", Kind::Usage, "name what moves: of = \"boom\"");
    }
    let name = r.text("name").map(|(n, _)| n);
    let name = name.or_else(|| of.as_ref().map(|(of, _)| of.clone()));
    let along = r.direction("along").map(MotionKind::Along);
    let turn = r.table("turn", "turn of a motion").and_then(|t| {
        let axis = t.direction("axis");
        if t.entry("axis").is_none() {
            let advice = "write turn = { axis = [0, 1, 0], at = [0, 0, 0] }";
            t.missing("axis", Kind::Usage, advice);
        }
        let at = t.lengths("at");
        t.finish();
        Some(MotionKind::Turn {
            axis: axis?,
            at: at.map_or_else(Vector3::zeros, |(at, _)| Vector3::from(at.map(|q| q.value))),
        })
    });
    let through = r.entry("through").and_then(|entry| {
        let places = match &entry.node.value {
            Value::List(list) if list.len() >= 2 => {
                let places = list.iter();
                places
                    .map(|n| reader::lengths(r.shared, n, "through"))
                    .collect::<Option<Vec<_>>>()?
            }
            _ => {
                let message = "`through` must be a list of two positions or more".into();
                let advice = "write through = [[x, y, z], [x, y, z], …], the first where it stands";
                r.shared.fault(entry.line, Kind::Usage, message, advice);
                return None;
            }
        };
        let places = places.into_iter();
        Some(MotionKind::Through(
            places.map(|p| Vector3::from(p.map(|q| q.value))).collect(),
        ))
    });
    let stated = ["along", "turn", "through"].map(|key| r.entry(key).is_some());
    let count = stated.iter().filter(|s| **s).count();
    if count != 1 {
        let message = match count {
            0 => "this motion says not how it moves",
            _ => "this motion says in more than one way how it moves",
        };
        let advice = "write one of along = [..], turn = { axis, at } and through = [[..], ..]";
        r.shared.fault(r.line, Kind::Usage, message.into(), advice);
    }
    let of_value = match stated {
        [true, ..] => Dimension::Length,
        [_, true, _] => Dimension::Angle,
        _ => Dimension::Fraction,
    };
    let from = r.quantity("from", of_value).map(|(q, _)| q.value);
    let to = r.quantity("to", of_value);
    let whole_way = stated[2].then_some(1.0);
    if r.entry("to").is_none() && !stated[2] {
        let [example, _] = of_value.examples();
        r.missing(
            "to",
            Kind::Usage,
            format!("say how far it moves: to = \"{example}\""),
        );
    }
    if stated[2] {
        for (key, value) in [("from", from), ("to", to.map(|(q, _)| q.value))] {
            if value.is_some_and(|v| !(0.0..=1.0).contains(&v)) {
                let line = r.entry(key).map_or(r.line, |e| e.line);
                let message =
                    format!("`{key}` of a motion through positions is a share of the way");
                r.shared
                    .fault(line, Kind::BadNumber, message, "write from 0 % to 100 %");
            }
        }
    }
    let line = r.line;
    r.finish();
    Some(Motion {
        line,
        name: name?,
        of: of?.0,
        kind: along.or(turn).or(through)?,
        from: from.unwrap_or(0.0),
        to: to.map(|(q, _)| q.value).or(whole_way)?,
    })
}

fn phase(r: Reader<'_, '_>) -> Option<Phase> {
    let name = name(&r);
    let drain = texts(&r, "drain");
    let moves = texts(&r, "move");
    let to = r.entry("to").and_then(|e| fill(r.shared, &e.node, "to"));
    if drain.is_empty() && moves.is_empty() {
        let advice = "write drain = [\"a tank\"], move = [\"a motion\"], or both";
        r.missing("drain` or `move", Kind::Usage, advice);
    }
    if let Some(entry) = r.entry("to")
        && drain.is_empty()
    {
        let message = "`to` says what is left in tanks, and this phase drains none".into();
        r.shared
            .fault(entry.line, Kind::Usage, message, "add drain = [\"a tank\"]");
    }
    let line = r.line;
    r.finish();
    Some(Phase {
        line,
        name: name?,
        drain,
        to,
        moves,
    })
}

fn case(r: Reader<'_, '_>) -> Option<Case> {
    let name = name(&r);
    let without = texts_or_none(&r, "without");
    let with = texts_or_none(&r, "with");
    let mut fills = BTreeMap::new();
    for entry in r.own_keys("fill") {
        if let Some(f) = fill(r.shared, &entry.node, &entry.key) {
            fills.insert(entry.key.clone(), f);
        }
    }
    let mut at = BTreeMap::new();
    for entry in r.own_keys("at") {
        if let Some(p) = reader::lengths(r.shared, &entry.node, &entry.key) {
            at.insert(entry.key.clone(), p.map(|q| q.value));
        }
    }
    let line = r.line;
    r.finish();
    Some(Case {
        line,
        name: name?,
        without,
        with,
        fill: fills,
        at,
    })
}

/// As [`texts`], but an empty list is allowed.
fn texts_or_none(r: &Reader<'_, '_>, key: &'static str) -> Vec<String> {
    match r.entry(key).map(|e| &e.node.value) {
        Some(Value::List(list)) if list.is_empty() => Vec::new(),
        _ => texts(r, key),
    }
}

fn frame(r: Reader<'_, '_>) -> Option<Frame> {
    let name = name(&r);
    let at = r.lengths("at").map(|(at, _)| at.map(|q| q.value));
    let axes = r.entry("axes").map(|e| axes(r.shared, &e.node));
    let line = r.line;
    r.finish();
    Some(Frame {
        line,
        name: name?,
        at: at.map_or_else(Vector3::zeros, Vector3::from),
        axes: match axes {
            Some(axes) => axes?,
            None => Matrix3::identity(),
        },
    })
}

/// Three directions, at right angles to within a thousandth; made exactly so, x first.
fn axes(shared: &Shared<'_>, node: &Node) -> Option<Matrix3<f64>> {
    let advice = "write axes = [[1, 0, 0], [0, 1, 0], [0, 0, 1]]: x, y and z of the frame in the \
                  assembly's axes, at right angles, right-handed";
    let fault = |message: &str| {
        shared.fault(node.line, Kind::BadNumber, message.into(), advice);
    };
    let Value::List(list) = &node.value else {
        fault("`axes` must be three directions");
        return None;
    };
    let rows: Option<Vec<Vector3<f64>>> = list.iter().map(reader::direction).collect();
    let Some([x, y, z]) = rows.and_then(|r| <[Vector3<f64>; 3]>::try_from(r).ok()) else {
        fault("`axes` must be three directions");
        return None;
    };
    let skew = x.dot(&y).abs().max(y.dot(&z).abs()).max(z.dot(&x).abs());
    if skew > 1e-3 || x.cross(&y).dot(&z) < 0.0 {
        fault("`axes` are not at right angles, or left-handed");
        return None;
    }
    let z = x.cross(&y).normalize();
    let y = z.cross(&x);
    Some(Matrix3::from_rows(&[
        x.transpose(),
        y.transpose(),
        z.transpose(),
    ]))
}
