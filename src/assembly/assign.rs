//! Which material a body gets.

use std::collections::HashSet;
use std::path::{Path, PathBuf};

use super::expand::{Instance, What};
use super::file::{Assign, Substance};
use super::source::BodyFigures;

/// The rules that gave some body its material, by file and line.
pub(super) type Used = HashSet<(PathBuf, u64)>;

/// Two rules give one body different materials through different names of it.
#[derive(Debug)]
pub(super) struct Ambiguous(pub(super) String);

/// The material of one body of a part: the part's own, or that of the first rule that matches.
/// Rules of an included file come before those of the file that includes it.
pub(super) fn material_of(
    instance: &Instance<'_>,
    body: &BodyFigures,
    used: &mut Used,
) -> Result<Option<Substance>, Ambiguous> {
    if let What::Part(part) = instance.what
        && let Some(material) = &part.material
    {
        return Ok(Some(material.clone()));
    }
    let rules = rules_for(instance);
    let first = |name: &str| {
        let hit = |(_, rule): &&(&Path, &Assign)| {
            rule.body.as_ref().is_none_or(|p| p.matcher.is_match(name))
        };
        rules.iter().position(|r| hit(&r))
    };
    let own = [Some(body.id.as_str()), body.name.as_deref()];
    let own = own.into_iter().flatten().filter_map(first).min();
    // Pieces that were joined because only together they close: each has a say.
    let mut named: Vec<(&str, usize)> = Vec::new();
    named.extend(own.map(|n| (body.name.as_deref().unwrap_or(&body.id), n)));
    named.extend(
        body.joined
            .iter()
            .filter_map(|n| Some((n.as_str(), first(n)?))),
    );
    let meshed = body
        .materials
        .iter()
        .filter_map(|n| Some((n.as_str(), first(n)?)));
    let meshed: Vec<(&str, usize)> = meshed.collect();
    let least = |says: &[(&str, usize)]| says.iter().map(|(_, n)| *n).min();
    // The order of the rules decides between a body's name and the mesh's own materials; only
    // names of the same kind can contradict each other.
    let (winner, says, silent) = match (least(&named), least(&meshed)) {
        (Some(name), mesh) if mesh.is_none_or(|mesh| name <= mesh) => (name, named, None),
        (_, Some(mesh)) => {
            let silent = body.materials.iter().find(|n| first(n).is_none());
            (mesh, meshed, silent)
        }
        (_, None) => return Ok(None),
    };
    let (path, rule) = &rules[winner];
    let gets = format!(
        "body `{}` gets `{}` by the rule at line {}",
        body.id, rule.material.name, rule.line
    );
    for (name, n) in says {
        let other = rules[n].1;
        if other.material != rule.material {
            return Err(Ambiguous(format!(
                "{gets} and, through its name `{name}`, `{}` by the rule at line {}",
                other.material.name, other.line
            )));
        }
    }
    if let Some(name) = silent {
        return Err(Ambiguous(format!(
            "{gets}, and no rule matches `{name}`, which the mesh file puts on it too"
        )));
    }
    used.insert((path.to_path_buf(), rule.line));
    Ok(Some(rule.material.clone()))
}

/// The rules whose `part` matches, in the order in which they are tried.
fn rules_for<'f>(instance: &Instance<'f>) -> Vec<(&'f Path, &'f Assign)> {
    let mut rules = Vec::new();
    for scope in instance.scopes.iter().rev() {
        let path = &instance.path[scope.path_from..];
        let entry_path = &instance.entry_path[scope.entry_path_from..];
        for rule in &scope.file.assigns {
            let hit = rule
                .part
                .as_ref()
                .is_none_or(|p| p.matcher.is_match(path) || p.matcher.is_match(entry_path));
            if hit {
                rules.push((scope.file.path.as_path(), rule));
            }
        }
    }
    rules
}
