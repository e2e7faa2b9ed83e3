//! What looks odd in an assembly, said beside its result.

use std::collections::HashSet;

use super::assign::Used;
use super::expand::Instance;
use super::file::{AssemblyFile, Entry, Part};
use super::load::Loaded;
use super::spread;
use crate::error::Warning;

/// A measured part whose implied density lies well away from that of its material. Spreads of
/// tables are half-widths of what is usual; three of them away, or 5 % where no spread is known,
/// the part is hollow, the material wrong or the mesh old.
pub(super) fn odd_density(
    instance: &Instance<'_>,
    part: &Part,
    implied: f64,
    table: f64,
    spread: f64,
) -> Option<Warning> {
    let allowed = if spread > 0.0 {
        3.0 * spread
    } else {
        0.05 * table
    };
    if (implied - table).abs() <= allowed {
        return None;
    }
    Some(warning(
        instance,
        "implied-density",
        format!(
            "part `{}` as measured has a density of {implied:.0} kg/m³, and its material has {table:.0}",
            instance.path
        ),
        &format!(
            "check the scale, the material and whether `{}` is the part that was weighed",
            part.mesh.typed
        ),
    ))
}

/// A sheet or coat that is not thin against its body: the first order may not do.
pub(super) fn thick_skin(
    instance: &Instance<'_>,
    part: &Part,
    bodies: &super::choose::Bodies,
) -> Option<Warning> {
    let thickness = part.sheet.or(part.coating.as_ref().map(|c| c.thickness))?;
    let ratio = bodies
        .iter()
        .filter_map(|b| spread::thick(b, thickness.value))
        .reduce(f64::max)?;
    Some(warning(
        instance,
        "thick-skin",
        format!(
            "the sheet or coating of `{}` is {:.1} % of the least side of its box; its mass is \
             surface times thickness, the first order only",
            instance.path,
            100.0 * ratio
        ),
        "model its thickness in the mesh where the figures must be better than that",
    ))
}

/// A warning about a thing, with its file and line.
pub(super) fn warning(
    instance: &Instance<'_>,
    kind: &str,
    message: String,
    advice: &str,
) -> Warning {
    Warning {
        kind: kind.into(),
        message,
        path: instance
            .file()
            .map(|f| f.path.to_string_lossy().into_owned()),
        line: Some(instance.line()),
        advice: advice.into(),
    }
}

/// Rules that never chose a material.
pub(super) fn unused_rules(loaded: &Loaded, used: &Used, warnings: &mut Vec<Warning>) {
    let mut files = vec![&loaded.file];
    let mut said = HashSet::new();
    while let Some(file) = files.pop() {
        for rule in &file.assigns {
            let key = (file.path.clone(), rule.line);
            if used.contains(&key) || !said.insert(key) {
                continue;
            }
            let patterns = [("body", &rule.body), ("part", &rule.part)];
            let patterns: Vec<String> = patterns
                .into_iter()
                .filter_map(|(key, p)| Some(format!("{key} = \"{}\"", p.as_ref()?.text)))
                .collect();
            warnings.push(Warning {
                kind: "assign-unused".into(),
                message: format!(
                    "the rule with {} gives no body its material",
                    patterns.join(", ")
                ),
                path: Some(file.path.to_string_lossy().into_owned()),
                line: Some(rule.line),
                advice: "check its spelling, and whether an earlier rule or a part's own \
                         `material` takes its bodies"
                    .into(),
            });
        }
        includes(&file.entries, &mut files);
    }
}

fn includes<'f>(entries: &'f [Entry], files: &mut Vec<&'f AssemblyFile>) {
    for entry in entries {
        if let Entry::Group(group) = entry {
            files.extend(group.include.as_deref());
            includes(&group.entries, files);
        }
    }
}
