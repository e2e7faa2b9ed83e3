//! From the tree of an assembly file to the model of it.

use std::collections::HashMap;
use std::path::Path;

use globset::GlobBuilder;

use super::file::{
    AssemblyFile, Assign, Each, Entry, Expect, Group, Item, MeshChoice, Part, Pattern,
};
use super::growth::{self, Allowances};
use super::load::Loader;
use super::made;
use super::position;
use super::read_ballast;
use super::read_limits;
use super::read_statics;
use super::read_weighing;
use super::reader::{Reader, Shared};
use super::service::{self, Tank};
use super::shape;
use super::smear;
use super::spread;
use super::substance::{self, OwnMaterials};
use super::tree;
use crate::curvature::Reading;
use crate::error::Kind;
use crate::quantity::{Dimension, LengthUnit, Quantity};

/// What the entries of one file are read with.
pub(super) struct Context<'a, 'p> {
    pub(super) shared: &'a Shared<'p>,
    pub(super) own: &'a OwnMaterials,
    pub(super) allowances: &'a Allowances,
    pub(super) loader: &'a mut Loader,
}

/// Reads a whole file. Faults go to `shared`; the model is of use only where there are none.
pub(super) fn file(
    shared: &mut Shared<'_>,
    entries: &[tree::Entry],
    loader: &mut Loader,
) -> AssemblyFile {
    let stem = shared
        .path
        .file_stem()
        .unwrap_or_default()
        .to_string_lossy();
    let mut name = stem.into_owned();
    // The unit comes first: every bare length of the file is read in it.
    let mut unit = None;
    {
        let root = Reader::new(shared, entries, "assembly file", 1, 0);
        if let Some(head) = root.table("assembly", "assembly") {
            if let Some((stated, _)) = head.text("name") {
                name = stated;
            }
            unit = length_unit(&head, "unit");
            if head.entry("unit").is_none() {
                head.missing("unit", Kind::Unit, UNIT_ADVICE);
            }
            head.finish();
        } else if root.entry("assembly").is_none() {
            root.missing("[assembly] unit", Kind::Unit, UNIT_ADVICE);
        }
    }
    shared.unit = unit.unwrap_or_default();
    let shared = &*shared;
    let root = Reader::new(shared, entries, "assembly file", 1, 0);
    root.entry("assembly");
    let own = substance::own_materials(&root);
    let allowances = growth::allowances(&root);
    let assigns = root.tables("assign");
    let assigns = assigns
        .into_iter()
        .filter_map(|r| assign(r, &own))
        .collect();
    let mut context = Context {
        shared,
        own: &own,
        allowances: &allowances,
        loader,
    };
    let entries = context.entries(&root, 0);
    let ballast = read_ballast::read(&root, &mut context);
    let service = service::read(&root);
    let standing = read_statics::supports(&root, &service.gravity);
    let hang = read_statics::hang(&root, &service.gravity);
    let limits = read_limits::read(&root, &standing);
    let weighings = read_weighing::read(&root, &standing);
    let smears = smear::read(&root);
    root.finish();
    AssemblyFile {
        path: shared.path.to_path_buf(),
        name,
        unit: shared.unit,
        assigns,
        entries,
        limits,
        service,
        stand: standing.stand,
        hang,
        weighings,
        ballast,
        smears,
    }
}

const UNIT_ADVICE: &str = "state the unit of the meshes and of bare lengths: \
                           unit = \"mm\", \"cm\", \"m\", \"in\" or \"ft\"";

fn length_unit(r: &Reader<'_, '_>, key: &'static str) -> Option<LengthUnit> {
    let (text, line) = r.text(key)?;
    let units = [
        LengthUnit::Mm,
        LengthUnit::Cm,
        LengthUnit::M,
        LengthUnit::In,
        LengthUnit::Ft,
    ];
    let found = units.into_iter().find(|u| u.symbol() == text.trim());
    if found.is_none() {
        let message = format!("`{text}` is no unit of length that a mesh can be in");
        r.shared.fault(line, Kind::Unit, message, UNIT_ADVICE);
    }
    found
}

fn assign(r: Reader<'_, '_>, own: &OwnMaterials) -> Option<Assign> {
    let (body, part) = (pattern(&r, "body"), pattern(&r, "part"));
    let material = substance::chosen(&r, own);
    if r.entry("body").is_none() && r.entry("part").is_none() {
        let advice = "add body = \"a glob on names of bodies\", part = \"a glob on paths of parts\", or both";
        r.missing("body` or `part", Kind::Usage, advice);
    }
    if r.entry("material").is_none() {
        r.missing(
            "material",
            Kind::Usage,
            "name the material that a match gets",
        );
    }
    let line = r.line;
    r.finish();
    Some(Assign {
        line,
        body,
        part,
        material: material?,
    })
}

pub(super) fn pattern(r: &Reader<'_, '_>, key: &'static str) -> Option<Pattern> {
    let (text, line) = r.text(key)?;
    match GlobBuilder::new(&text)
        .literal_separator(false)
        .backslash_escape(true)
        .build()
    {
        Ok(glob) => Some(Pattern {
            text,
            matcher: glob.compile_matcher(),
        }),
        Err(e) => {
            let message = format!("`{text}` is no glob: {}", e.kind());
            let advice =
                "use * for any characters, ? for one, [ab] for a choice, {a,b} for alternatives";
            r.shared.fault(line, Kind::Usage, message, advice);
            None
        }
    }
}

impl Context<'_, '_> {
    /// The parts, items, tanks and groups of a table, in file order.
    fn entries(&mut self, r: &Reader<'_, '_>, depth: usize) -> Vec<Entry> {
        let mut entries = Vec::new();
        for part in r.tables("part") {
            let at = part.offset;
            entries.extend(self.part(part).map(|p| (at, Entry::Part(Box::new(p)))));
        }
        for item in r.tables("item") {
            let at = item.offset;
            entries.extend(self.item(item).map(|i| (at, Entry::Item(Box::new(i)))));
        }
        for tank in r.tables("tank") {
            let at = tank.offset;
            entries.extend(self.tank(tank).map(|t| (at, Entry::Tank(Box::new(t)))));
        }
        for group in r.tables("group") {
            let at = group.offset;
            entries.extend(
                self.group(group, depth)
                    .map(|g| (at, Entry::Group(Box::new(g)))),
            );
        }
        entries.sort_by_key(|(at, _)| *at);
        let entries: Vec<Entry> = entries.into_iter().map(|(_, e)| e).collect();
        let mut seen: HashMap<&str, u64> = HashMap::new();
        for entry in &entries {
            if let Some(first) = seen.get(entry.name()) {
                self.shared.fault(
                    entry.line(),
                    Kind::AmbiguousName,
                    format!("the name `{}` is taken by line {first}", entry.name()),
                    "give it a name of its own, or repeat the first with `places` or `count`",
                );
            } else {
                seen.insert(entry.name(), entry.line());
            }
        }
        entries
    }

    fn part(&mut self, r: Reader<'_, '_>) -> Option<Part> {
        let name = r.text("name").map(|(name, _)| name);
        let unit = length_unit(&r, "unit").unwrap_or(self.shared.unit);
        // A graded part's density is its own: `material` only names it then.
        let material = match r.entry("graded") {
            Some(_) => {
                r.text("material");
                None
            }
            None => substance::chosen(&r, self.own),
        };
        let position = position::read(&r, true);
        let measured = measured(&r);
        let accept_open = r.exactly("accept-open", Dimension::Fraction);
        let join = join(&r);
        let (made, made_off) = made::read(&r).unzip();
        let facets = facets(&r);
        let expect = expect(&r);
        let each = each(&r);
        let maturity = self.allowances.maturity(&r);
        let (sheet, coating, graded) = spread::read(&r, self.own);
        if let (Some(_), Some(crate::curvature::Reading::Curved), Some(entry)) =
            (&made, facets, r.entry("facets"))
        {
            r.shared.fault(
                entry.line,
                Kind::Usage,
                "`facets = \"curved\"` and `made` cannot stand together: what facets do to the inside of a print is not known".into(),
                "take one of them out; without `facets` the bias is in the uncertainty",
            );
        }
        let mesh = r
            .text("mesh")
            .and_then(|(typed, line)| self.loader.mesh(self.shared, &typed, line));
        if r.entry("mesh").is_none() {
            r.missing(
                "mesh",
                Kind::Usage,
                "name its mesh: mesh = \"file.obj#body\"; without one it is an [[item]]",
            );
        }
        let line = r.line;
        r.finish();
        let mesh = mesh?;
        Some(Part {
            line,
            name: name.unwrap_or_else(|| default_name(&mesh)),
            mesh,
            unit,
            material,
            position,
            measured,
            accept_open,
            join,
            made,
            made_off: made_off.unwrap_or_default(),
            facets,
            expect,
            each,
            maturity,
            sheet,
            coating,
            graded,
        })
    }

    fn item(&mut self, r: Reader<'_, '_>) -> Option<Item> {
        let name = named(&r);
        let mass = r.quantity("mass", Dimension::Mass);
        if r.entry("mass").is_none() {
            r.missing(
                "mass",
                Kind::Usage,
                "state its mass from the catalogue or the scale: mass = \"4.12 kg ± 20 g\"",
            );
        }
        let shape = shape::read(&r, mass.map(|(m, _)| m.value));
        let position = position::read(&r, false);
        let each = each(&r);
        let maturity = self.allowances.maturity(&r);
        let line = r.line;
        r.finish();
        Some(Item {
            line,
            name: name?,
            mass: mass?.0,
            shape,
            position,
            each,
            maturity,
        })
    }

    fn tank(&mut self, r: Reader<'_, '_>) -> Option<Tank> {
        let name = r.text("name").map(|(name, _)| name);
        let unit = length_unit(&r, "unit").unwrap_or(self.shared.unit);
        let liquid = substance::chosen_by(&r, "liquid", self.own);
        let fill = r.entry("fill");
        let position = position::read(&r, true);
        let each = each(&r);
        let mesh = r
            .text("mesh")
            .and_then(|(typed, line)| self.loader.mesh(self.shared, &typed, line));
        let examples = [
            (
                "mesh",
                "name the mesh of its inside: mesh = \"tank-inside.stl\"",
            ),
            (
                "liquid",
                "name what is in it, as a material: liquid = \"water\"",
            ),
            (
                "fill",
                "say how full it is: fill = \"60 %\", \"32 l\", \"30 kg\" or a level",
            ),
        ];
        for (key, advice) in examples {
            if r.entry(key).is_none() {
                r.missing(key, Kind::Usage, advice);
            }
        }
        let fill = fill.and_then(|e| service::fill(r.shared, &e.node, "fill"));
        let line = r.line;
        r.finish();
        let mesh = mesh?;
        Some(Tank {
            line,
            name: name.unwrap_or_else(|| default_name(&mesh)),
            mesh,
            unit,
            liquid: liquid?,
            fill: fill?,
            position,
            each,
        })
    }

    fn group(&mut self, r: Reader<'_, '_>, depth: usize) -> Option<Group> {
        let name = r.text("name").map(|(name, _)| name);
        let position = position::read(&r, true);
        let include = r.text("include");
        let line = r.line;
        let deep = self.loader.deep(self.shared, depth, line);
        let entries = if deep {
            Vec::new()
        } else {
            self.entries(&r, depth + 1)
        };
        if deep {
            // Not read, and not unknown either.
            for key in ["part", "item", "tank", "group"] {
                r.entry(key);
            }
        }
        let include = match include {
            Some((typed, line)) if !deep => self
                .loader
                .include(self.shared, &typed, line, depth + 1)
                .map(Box::new),
            _ => None,
        };
        let named = r.entry("name").is_some() || r.entry("include").is_some();
        if !named {
            r.missing(
                "name",
                Kind::Usage,
                "name it: it is the first half of the paths in it",
            );
        }
        r.finish();
        let name = name.or_else(|| include.as_ref().map(|f| f.name.clone()))?;
        Some(Group {
            line,
            name,
            position,
            entries,
            include,
        })
    }
}

/// What an unnamed entry is called: its body, or else the stem of its mesh file.
fn default_name(mesh: &MeshChoice) -> String {
    mesh.body.clone().unwrap_or_else(|| {
        let stem = Path::new(&mesh.typed).file_stem().unwrap_or_default();
        stem.to_string_lossy().into_owned()
    })
}

fn named(r: &Reader<'_, '_>) -> Option<String> {
    let name = r.text("name").map(|(name, _)| name);
    if name.is_none() && r.entry("name").is_none() {
        r.missing(
            "name",
            Kind::Usage,
            "name it, so that results can speak of it",
        );
    }
    name
}

fn measured(r: &Reader<'_, '_>) -> Option<Quantity> {
    let (mass, line) = r.quantity("measured", Dimension::Mass)?;
    if mass.value > 0.0 {
        return Some(mass);
    }
    let advice = "write what the scale showed, above zero";
    r.shared
        .fault(line, Kind::BadNumber, "`measured` is zero".into(), advice);
    None
}

fn join(r: &Reader<'_, '_>) -> Option<f64> {
    let (distance, line) = r.quantity("join", Dimension::Length)?;
    if distance.value > 0.0 {
        return Some(distance.value);
    }
    let message = "`join` is not a distance above zero".into();
    let advice = "state the distance that `bismar check` names for the crack";
    r.shared.fault(line, Kind::Usage, message, advice);
    None
}

fn facets(r: &Reader<'_, '_>) -> Option<Reading> {
    match r.text("facets")? {
        (s, _) if s == "flat" => Some(Reading::Flat),
        (s, _) if s == "curved" => Some(Reading::Curved),
        (s, line) => {
            let message = format!("`facets` is `{s}`");
            let advice = "write \"curved\" where facets stand for curves, or \"flat\" where they are what is meant";
            r.shared.fault(line, Kind::Usage, message, advice);
            None
        }
    }
}

fn each(r: &Reader<'_, '_>) -> Each {
    match r.text("each") {
        None => Each::Shared,
        Some((s, _)) if s == "independent" => Each::Independent,
        Some((s, _)) if s == "shared" => Each::Shared,
        Some((s, line)) => {
            let message = format!("`each` is `{s}`");
            let advice =
                "write \"independent\" where each repeat is off in its own way, or \"shared\"";
            r.shared.fault(line, Kind::Usage, message, advice);
            Each::Shared
        }
    }
}

fn expect(r: &Reader<'_, '_>) -> Option<Expect> {
    let e = r.table("expect", "expect")?;
    let expect = Expect {
        volume: e.quantity("volume", Dimension::Volume).map(|(q, _)| q),
        mass: e.quantity("mass", Dimension::Mass).map(|(q, _)| q),
        size: e.lengths("size").map(|(q, _)| q),
        centre: e.lengths("centre").map(|(q, _)| q),
    };
    e.finish();
    Some(expect)
}
