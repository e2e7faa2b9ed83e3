//! Where an assembly stands and what it hangs from.
//!
//! ```toml
//! [[support]]                        # feet, wheels, scales
//! name = "front"
//! at = [450, 0, 0]
//! [hang]
//! hook = [0, 0, 1500]
//! [[hang.line]]                      # none: it hangs from the hook as a point; two to four
//! name = "left"
//! at = [0, 300, 400]
//! ```

use nalgebra::Vector3;

use super::file::Hang;
use super::reader::Reader;
use super::service::Gravity;
use crate::error::Kind;
use crate::statics::{Line, Stand, Support};

/// The supports of a file, with the gravity that acts there.
#[derive(Clone, Debug)]
pub(super) struct Standing {
    pub(super) stand: Option<Stand>,
    /// Supports were stated, and something is wrong with them, which was said.
    pub(super) faulty: bool,
    /// m/s².
    pub(super) gravity: f64,
    /// Against gravity.
    pub(super) up: Vector3<f64>,
}

/// A table with a name and a place.
fn placed(r: Reader<'_, '_>, taken: &mut Vec<String>) -> Option<(String, Vector3<f64>)> {
    let name = r.text("name");
    let at = r
        .lengths("at")
        .map(|(q, _)| Vector3::from(q.map(|x| x.value)));
    for key in ["name", "at"] {
        if r.entry(key).is_none() {
            r.missing(
                key,
                Kind::Usage,
                "name it and state where it is: at = [x, y, z]",
            );
        }
    }
    if let Some((name, line)) = &name {
        if taken.contains(name) {
            let message = format!("the name `{name}` stands twice");
            r.shared.fault(
                *line,
                Kind::AmbiguousName,
                message,
                "give each a name of its own",
            );
        }
        taken.push(name.clone());
    }
    r.finish();
    Some((name?.0, at?))
}

/// Reads every `[[support]]`.
///
/// They stand against effective gravity: the file's field at the assembly's origin, less the
/// assembly's own acceleration.
pub(super) fn supports(root: &Reader<'_, '_>, gravity: &Gravity) -> Standing {
    let effective = gravity.effective();
    let mut out = Standing {
        stand: None,
        faulty: false,
        gravity: effective.map_or(0.0, |g| g.norm()),
        up: effective.map_or(Vector3::z(), |g| -g.normalize()),
    };
    let tables = root.tables("support");
    let Some(line) = tables.first().map(|t| t.line) else {
        out.faulty = root.entry("support").is_some();
        return out;
    };
    if effective.is_none() {
        root.shared.fault(
            line,
            Kind::Usage,
            "without effective gravity nothing stands on a support".into(),
            "state the field in [gravity], or take the supports out",
        );
        out.faulty = true;
        return out;
    }
    let mut taken = Vec::new();
    let read: Vec<_> = tables.into_iter().map(|t| placed(t, &mut taken)).collect();
    let supports: Option<Vec<Support>> = read
        .into_iter()
        .map(|s| s.map(|(name, at)| Support { name, at }))
        .collect();
    match supports.map(|s| Stand::new(s, out.up)) {
        Some(Ok(stand)) => out.stand = Some(stand),
        Some(Err(e)) => {
            root.shared.push(e.at_line(line));
            out.faulty = true;
        }
        None => out.faulty = true,
    }
    out
}

/// Reads `[hang]`.
pub(super) fn hang(root: &Reader<'_, '_>, gravity: &Gravity) -> Option<Hang> {
    let r = root.table("hang", "hang")?;
    if gravity.effective().is_none() {
        r.shared.fault(
            r.line,
            Kind::Usage,
            "without effective gravity nothing hangs from a hook".into(),
            "state the field in [gravity], or take [hang] out",
        );
    }
    let hook = r
        .lengths("hook")
        .map(|(q, _)| Vector3::from(q.map(|x| x.value)));
    if r.entry("hook").is_none() {
        r.missing(
            "hook",
            Kind::Usage,
            "state where the hook is: hook = [x, y, z]",
        );
    }
    let mut taken = Vec::new();
    let tables = r.tables("line");
    let count = tables.len();
    let lines: Vec<Line> = tables
        .into_iter()
        .filter_map(|t| placed(t, &mut taken))
        .map(|(name, at)| Line { name, at })
        .collect();
    if count == 1 || count > 4 {
        let message = format!(
            "{count} line{} from one hook",
            if count == 1 { "" } else { "s" }
        );
        let advice =
            "state two to four [[hang.line]]s; for one, make the hook the point that it holds";
        r.shared.fault(r.line, Kind::Usage, message, advice);
    }
    if let Some(hook) = hook
        && let Some(l) = lines.iter().find(|l| l.at == hook)
    {
        let message = format!("the line `{}` has no length", l.name);
        r.shared.fault(
            r.line,
            Kind::BadNumber,
            message,
            "put the hook above what the lines hold",
        );
    }
    let line = r.line;
    r.finish();
    Some(Hang {
        line,
        hook: hook?,
        lines,
    })
}
