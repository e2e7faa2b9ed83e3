//! The limits of an assembly file.
//!
//! ```toml
//! [[limit]]
//! name = "all"
//! mass = { from = "80 kg", to = "95 kg" }
//! centre.x = { from = -40, to = 25 }
//! station = { datum = [0, 0, 0], along = "x", from = 200, to = 260 }      # length along from the datum
//! percent = { start = [517, 0, 0], end = [1706, 0, 0], from = "15 %" }    # of the length start to end
//! distance = { point = [0, 0, 0], to = 5 }          # or line = { at, along }, or plane = { at, normal }: signed
//! envelope = { datum = [0, 0, 0], along = "x", outline = [["80 kg", -40], ["95 kg", -20], ["95 kg", 25], ["80 kg", 25]] }
//! inertia.xx = { to = "4 kg m2" }                   # about the centre of mass, or about = [x, y, z]; xy is −∫xy dm
//! ratio = { moments = [3, 1], from = "110 %" }      # third principal moment over the first, ascending
//! tip = { from = "20 deg", towards = "x" }          # over the [[support]]s; straight over every edge without `towards`
//! reaction = { support = "front", from = "50 N" }   # where there are three supports
//! unbalance = { at = [0, 0, 0], along = "x", planes = [20, 180], speed = "3000 rpm", grade = "G 6.3" }
//! ```
//!
//! An envelope stands for two limits: its masses, and the station within the outline at the mass.
//! An unbalance stands for two: one a plane, of what the mass is permitted (ISO 21940-11).

use std::collections::HashMap;

use nalgebra::Vector3;

use super::read_statics::Standing;
use super::reader::{self, Reader};
use super::tree::Value;
use crate::error::Kind;
use crate::limits::{
    Axis, Envelope, Limit, Measured, Plane, Rotor, SupportShare, Tipping, rad_per_s,
};
use crate::quantity::Dimension;

/// The quantities that a limit may hold.
const QUANTITIES: [&str; 11] = [
    "mass",
    "centre",
    "station",
    "percent",
    "distance",
    "envelope",
    "inertia",
    "ratio",
    "tip",
    "reaction",
    "unbalance",
];

/// Reads every `[[limit]]`: one limit a quantity, in file order.
pub(super) fn read(root: &Reader<'_, '_>, standing: &Standing) -> Vec<Limit> {
    let mut limits: Vec<Limit> = Vec::new();
    let mut taken: HashMap<String, u64> = HashMap::new();
    for r in root.tables("limit") {
        let name = r.text("name").map(|(name, _)| name);
        let first = limits.len();
        limits.extend(band(&r, "mass", Measured::Mass, Dimension::Mass));
        if let Some(centre) = r.table("centre", "centre of a limit") {
            for (axis, key) in ["x", "y", "z"].into_iter().enumerate() {
                limits.extend(band(
                    &centre,
                    key,
                    Measured::Centre(axis),
                    Dimension::Length,
                ));
            }
            if centre.is_empty() {
                centre.missing(
                    "x`, `y` or `z",
                    Kind::Usage,
                    "write centre.x = { from = -40, to = 25 }",
                );
            }
            centre.finish();
        }
        limits.extend(station(&r));
        limits.extend(percent(&r));
        limits.extend(distance(&r));
        limits.extend(envelope(&r));
        limits.extend(inertia(&r));
        limits.extend(ratio(&r));
        limits.extend(tip(&r, standing));
        limits.extend(reaction(&r, standing));
        limits.extend(unbalance(&r));
        if QUANTITIES.iter().all(|k| r.entry(k).is_none()) {
            let advice = "write mass = { to = \"95 kg\" } or centre.x = { from = -40, to = 25 }";
            r.missing(
                "mass`, `centre` or another quantity `of a limit",
                Kind::Usage,
                advice,
            );
        }
        let mut names: Vec<String> = Vec::new();
        for limit in &mut limits[first..] {
            if let Some(name) = &name {
                limit.name.clone_from(name);
            }
            if !names.contains(&limit.name) {
                names.push(limit.name.clone());
            }
        }
        for name in names {
            if let Some(line) = taken.get(&name) {
                let message = format!("the limit `{name}` of line {line} has the same name");
                let advice = "give each [[limit]] a name of its own; an unnamed one is called after its quantity";
                r.shared.fault(r.line, Kind::AmbiguousName, message, advice);
            } else {
                taken.insert(name, r.line);
            }
        }
        r.finish();
    }
    limits
}

fn limit(quantity: Measured, (from, to): Ends, line: u64) -> Limit {
    Limit {
        name: quantity.name().into(),
        quantity,
        from,
        to,
        line,
    }
}

type Ends = (Option<f64>, Option<f64>);

fn band(r: &Reader<'_, '_>, key: &'static str, quantity: Measured, of: Dimension) -> Option<Limit> {
    let band = r.table(key, "band of a limit")?;
    let ends = ends(&band, of, quantity.name());
    let line = band.line;
    band.finish();
    Some(limit(quantity, ends, line))
}

/// Both ends of a band; a fault where none is stated, one has a tolerance, or they are crossed.
fn ends(band: &Reader<'_, '_>, of: Dimension, name: &str) -> Ends {
    let (from, to) = (band.quantity("from", of), band.quantity("to", of));
    if band.entry("from").is_none() && band.entry("to").is_none() {
        band.missing(
            "from` or `to",
            Kind::Usage,
            "state at least one end of the band",
        );
    }
    for (end, line) in [from, to].into_iter().flatten() {
        if end.tolerance.is_some() {
            let message = "the end of a limit has a tolerance".to_string();
            band.shared.fault(
                line,
                Kind::Usage,
                message,
                "state the end itself, without ±",
            );
        }
    }
    if let (Some((from, _)), Some((to, line))) = (from, to)
        && from.value > to.value
    {
        let message = format!("`from` is above `to` in `{name}`, which nothing can hold");
        band.shared
            .fault(line, Kind::BadNumber, message, "exchange the two ends");
    }
    (from.map(|(q, _)| q.value), to.map(|(q, _)| q.value))
}

fn point(r: &Reader<'_, '_>, key: &'static str) -> Option<Vector3<f64>> {
    r.lengths(key)
        .map(|(q, _)| Vector3::from(q.map(|x| x.value)))
}

/// A point (the origin where left out) and a direction that must be stated.
fn axis(r: &Reader<'_, '_>, at: &'static str, along: &'static str) -> Option<Axis> {
    let start = point(r, at);
    let direction = r.direction(along);
    if r.entry(along).is_none() {
        r.missing(
            along,
            Kind::Usage,
            format!("write {along} = \"x\", \"y\", \"z\" or a vector"),
        );
    }
    let start = if r.entry(at).is_none() {
        Some(Vector3::zeros())
    } else {
        start
    };
    Some(Axis {
        at: start?,
        along: direction?,
    })
}

fn station(r: &Reader<'_, '_>) -> Option<Limit> {
    let t = r.table("station", "station")?;
    let axis = axis(&t, "datum", "along");
    let ends = ends(&t, Dimension::Length, "station");
    let line = t.line;
    t.finish();
    Some(limit(Measured::Station(axis?), ends, line))
}

fn percent(r: &Reader<'_, '_>) -> Option<Limit> {
    let t = r.table("percent", "percent")?;
    let (start, end) = (point(&t, "start"), point(&t, "end"));
    for key in ["start", "end"] {
        if t.entry(key).is_none() {
            t.missing(key, Kind::Usage, "state both ends of the reference length");
        }
    }
    let ends = ends(&t, Dimension::Fraction, "percent");
    let line = t.line;
    let shared = t.shared;
    t.finish();
    let (start, end) = (start?, end?);
    let length = (end - start).norm();
    if length.is_nan() || length <= 0.0 {
        let advice = "`start` and `end` are the two ends of the reference length";
        shared.fault(
            line,
            Kind::BadNumber,
            "the reference length is nothing".into(),
            advice,
        );
        return None;
    }
    let from = Axis {
        at: start,
        along: (end - start) / length,
    };
    Some(limit(Measured::Percent { from, length }, ends, line))
}

fn distance(r: &Reader<'_, '_>) -> Option<Limit> {
    let t = r.table("distance", "distance")?;
    let from_point = point(&t, "point").map(Measured::FromPoint);
    let from_line = t.table("line", "line of a distance").and_then(|l| {
        let a = axis(&l, "at", "along");
        l.finish();
        a.map(Measured::FromLine)
    });
    let from_plane = t.table("plane", "plane of a distance").and_then(|l| {
        let a = axis(&l, "at", "normal");
        l.finish();
        a.map(Measured::FromPlane)
    });
    let stated = ["point", "line", "plane"]
        .iter()
        .filter(|k| t.entry(k).is_some())
        .count();
    if stated != 1 {
        let message = if stated == 0 {
            "is from nothing"
        } else {
            "is from several things"
        };
        let advice =
            "state one of point = [x, y, z], line = { at, along } and plane = { at, normal }";
        t.shared.fault(
            t.line,
            Kind::Usage,
            format!("this distance {message}"),
            advice,
        );
    }
    let ends = ends(&t, Dimension::Length, "distance");
    let line = t.line;
    t.finish();
    let quantity = from_point.or(from_line).or(from_plane)?;
    Some(limit(quantity, ends, line))
}

fn envelope(r: &Reader<'_, '_>) -> Vec<Limit> {
    let Some(t) = r.table("envelope", "envelope") else {
        return Vec::new();
    };
    let axis = axis(&t, "datum", "along");
    let advice = "write outline = [[\"80 kg\", -40], [\"95 kg\", -20], …]: masses and stations, in order around";
    let mut corners = None;
    match t.entry("outline").map(|e| (&e.node.value, e.line)) {
        None => t.missing("outline", Kind::Usage, advice),
        Some((Value::List(list), line)) => {
            let read: Vec<_> = list
                .iter()
                .map(|node| match &node.value {
                    Value::List(pair) if pair.len() == 2 => {
                        let mass = reader::quantity(t.shared, &pair[0], "outline", Dimension::Mass);
                        let at = reader::quantity(t.shared, &pair[1], "outline", Dimension::Length);
                        Some([mass?.value, at?.value])
                    }
                    _ => {
                        let message = "a corner of `outline` is no pair".to_string();
                        t.shared.fault(node.line, Kind::BadNumber, message, advice);
                        None
                    }
                })
                .collect();
            corners = read
                .into_iter()
                .collect::<Option<Vec<_>>>()
                .map(|c| (c, line));
        }
        Some((_, line)) => {
            let message = "`outline` must be a list of corners".to_string();
            t.shared.fault(line, Kind::BadNumber, message, advice);
        }
    }
    let line = t.line;
    let shared = t.shared;
    t.finish();
    let (Some(axis), Some((corners, at))) = (axis, corners) else {
        return Vec::new();
    };
    match Envelope::new(axis, corners) {
        Ok(e) => {
            let (lo, hi) = e.masses();
            vec![
                limit(Measured::Mass, (Some(lo), Some(hi)), line),
                limit(Measured::Envelope(Box::new(e)), (None, None), line),
            ]
            .into_iter()
            .map(|l| Limit {
                name: "envelope".into(),
                ..l
            })
            .collect()
        }
        Err(message) => {
            shared.fault(
                at,
                Kind::BadNumber,
                message,
                "walk round the outline once, corner by corner",
            );
            Vec::new()
        }
    }
}

fn inertia(r: &Reader<'_, '_>) -> Vec<Limit> {
    let Some(t) = r.table("inertia", "inertia of a limit") else {
        return Vec::new();
    };
    let about = point(&t, "about");
    let elements = [
        ("xx", 0, 0),
        ("yy", 1, 1),
        ("zz", 2, 2),
        ("xy", 0, 1),
        ("xz", 0, 2),
        ("yz", 1, 2),
    ];
    let mut out = Vec::new();
    for (key, row, column) in elements {
        out.extend(band(
            &t,
            key,
            Measured::Inertia { row, column, about },
            Dimension::Inertia,
        ));
    }
    if about.is_none() && t.is_empty() || out.is_empty() && about.is_some() {
        t.missing(
            "xx` or another `element",
            Kind::Usage,
            "write inertia.xx = { to = \"4 kg m2\" }",
        );
    }
    t.finish();
    out
}

fn ratio(r: &Reader<'_, '_>) -> Option<Limit> {
    let t = r.table("ratio", "ratio")?;
    let advice =
        "write moments = [3, 1] for the third principal moment over the first, in ascending order";
    let entry = t.entry("moments").map(|e| (&e.node.value, e.line));
    let pair = match entry {
        None => {
            t.missing("moments", Kind::Usage, advice);
            None
        }
        Some((value, line)) => {
            let number = |v: &Value| match v {
                Value::Number(x) if [1.0, 2.0, 3.0].contains(x) => Some(*x as usize - 1),
                _ => None,
            };
            let pair = match value {
                Value::List(list) if list.len() == 2 => {
                    number(&list[0].value).zip(number(&list[1].value))
                }
                _ => None,
            };
            let pair = pair.filter(|(a, b)| a != b);
            if pair.is_none() {
                let message = "`moments` must be two different numbers of 1, 2 and 3".to_string();
                t.shared.fault(line, Kind::BadNumber, message, advice);
            }
            pair
        }
    };
    let ends = ends(&t, Dimension::Fraction, "ratio");
    let line = t.line;
    t.finish();
    let (of, to) = pair?;
    Some(limit(Measured::Ratio { of, to }, ends, line))
}

fn tip(r: &Reader<'_, '_>, standing: &Standing) -> Option<Limit> {
    let t = r.table("tip", "tip")?;
    let towards = t.direction("towards");
    let from = t.quantity("from", Dimension::Angle);
    if t.entry("from").is_none() {
        t.missing(
            "from",
            Kind::Usage,
            "state the slope that it must stand on: from = \"20 deg\"",
        );
    }
    let (line, shared) = (t.line, t.shared);
    t.finish();
    let Some(stand) = &standing.stand else {
        if !standing.faulty {
            let advice = "state where it stands with three [[support]]s or more";
            shared.fault(
                line,
                Kind::Usage,
                "a limit on tipping needs supports".into(),
                advice,
            );
        }
        return None;
    };
    let towards = match towards {
        None => None,
        Some(u) => {
            let level = u - stand.up() * stand.up().dot(&u);
            if level.norm() < 1e-6 {
                let advice = "lean it towards a direction across gravity";
                shared.fault(
                    line,
                    Kind::BadNumber,
                    "`towards` is the direction of gravity".into(),
                    advice,
                );
                return None;
            }
            Some(level.normalize())
        }
    };
    let tipping = Tipping::new(stand.edges(), towards)?;
    Some(limit(
        Measured::Tip(Box::new(tipping)),
        (Some(from?.0.value), None),
        line,
    ))
}

fn reaction(r: &Reader<'_, '_>, standing: &Standing) -> Option<Limit> {
    let t = r.table("reaction", "reaction")?;
    let support = t.text("support");
    if t.entry("support").is_none() {
        t.missing("support", Kind::Usage, "name one of the three [[support]]s");
    }
    let ends = ends(&t, Dimension::Force, "reaction");
    let (line, shared) = (t.line, t.shared);
    t.finish();
    let (support, at) = support?;
    let Some(stand) = &standing.stand else {
        if !standing.faulty {
            let advice = "state where it stands with three [[support]]s";
            shared.fault(
                line,
                Kind::Usage,
                "a limit on a reaction needs supports".into(),
                advice,
            );
        }
        return None;
    };
    let names: Vec<&str> = stand.supports().iter().map(|s| s.name.as_str()).collect();
    let Some(i) = names.iter().position(|n| *n == support) else {
        let message = format!("there is no support `{support}`");
        shared.fault(
            at,
            Kind::UnknownName,
            message,
            format!("the supports are {}", super::listed(&names)),
        );
        return None;
    };
    let Some((a, b)) = stand.share(i) else {
        let message = format!(
            "how {} supports share a load is not fixed by statics",
            names.len()
        );
        let advice = "limit reactions where there are three supports, or limit the centre";
        shared.fault(line, Kind::Usage, message, advice);
        return None;
    };
    let share = SupportShare {
        support,
        a,
        b,
        gravity: standing.gravity,
    };
    Some(limit(Measured::Reaction(Box::new(share)), ends, line))
}

fn unbalance(r: &Reader<'_, '_>) -> Vec<Limit> {
    let Some(t) = r.table("unbalance", "unbalance") else {
        return Vec::new();
    };
    let axis = axis(&t, "at", "along");
    let advice = "write planes = [20, 180]: where the two planes cut the axis, from `at`";
    let planes = match t.entry("planes").map(|e| &e.node) {
        None => {
            t.missing("planes", Kind::Usage, advice);
            None
        }
        Some(node) => match &node.value {
            Value::List(pair) if pair.len() == 2 => {
                let [a, b] = [0, 1]
                    .map(|k| reader::quantity(t.shared, &pair[k], "planes", Dimension::Length));
                match (a, b) {
                    (Some(a), Some(b)) if a.value == b.value => {
                        let message = "both planes are in one place".to_string();
                        t.shared.fault(node.line, Kind::BadNumber, message, advice);
                        None
                    }
                    (a, b) => a.zip(b).map(|(a, b)| [a.value, b.value]),
                }
            }
            _ => {
                t.shared.fault(
                    node.line,
                    Kind::BadNumber,
                    "`planes` must be two lengths".into(),
                    advice,
                );
                None
            }
        },
    };
    let speed = word(
        &t,
        "speed",
        "write speed = \"3000 rpm\" or \"314 rad/s\"",
        |s| {
            let (number, unit) = s.split_at(s.find(|c: char| c.is_ascii_whitespace())?);
            let x: f64 = number.parse().ok()?;
            match unit.trim() {
                "rpm" | "1/min" => Some(rad_per_s(x)),
                "rad/s" => Some(x),
                _ => None,
            }
        },
    );
    let grade = word(
        &t,
        "grade",
        "write the balance quality grade: grade = \"G 6.3\"",
        |s| {
            s.strip_prefix(['G', 'g'])?
                .trim()
                .parse::<f64>()
                .ok()
                .map(|g| g * 1e-3)
        },
    );
    let line = t.line;
    t.finish();
    let (Some(axis), Some(planes), Some(speed), Some(grade)) = (axis, planes, speed, grade) else {
        return Vec::new();
    };
    let rotor = Box::new(Rotor {
        axis,
        planes,
        speed,
        grade,
    });
    [Plane::A, Plane::B]
        .map(|plane| {
            limit(
                Measured::Unbalance(rotor.clone(), plane),
                (None, None),
                line,
            )
        })
        .into()
}

/// A text that must read as a number above zero.
fn word(
    t: &Reader<'_, '_>,
    key: &'static str,
    advice: &str,
    read: impl Fn(&str) -> Option<f64>,
) -> Option<f64> {
    let text = t.text(key);
    if t.entry(key).is_none() {
        t.missing(key, Kind::Usage, advice);
    }
    let (text, line) = text?;
    let value = read(text.trim()).filter(|x| x.is_finite() && *x > 0.0);
    if value.is_none() {
        let message = format!("`{key}` cannot be \"{text}\"");
        t.shared.fault(line, Kind::BadNumber, message, advice);
    }
    value
}
