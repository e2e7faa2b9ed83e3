//! What `weigh` prints for people.

use super::Document;
use super::digits::{Scale, at_most, figure, length_in, significant, supported, tensor_figures};
use super::estimate::Estimated;
use super::footer::{CAUTION, footer, nominal};
use super::table::{Cell, Column, Look, Mark, Table};
use super::weigh::{WeighBody, WeighedBody, WeighedFile};
use super::words::{
    box_size, coordinates, direction, file_heading, kind_word, point, point_in, unit_of,
};
use crate::error::Result;
use crate::masses::Figures;
use crate::quantity::LengthUnit;
use crate::soundness::{EffectIs, FindingKind, Severity};
use crate::uncertainty::Uncertainty;

/// Bodies of one file that are shown with their tensors; more are shown as a table alone.
const IN_FULL: usize = 8;

/// As text.
pub fn render(document: &Document<WeighBody>, look: Look) -> String {
    let mut out = String::new();
    for file in &document.body.files {
        out.push_str(&of_file(file, look));
        out.push('\n');
    }
    let weighed = document.body.files.iter().any(|f| {
        f.bodies
            .iter()
            .flatten()
            .map(|b| &b.figures)
            .chain(f.whole.as_ref().map(|w| &w.figures))
            .any(|f| f.mass_kg.is_some())
    });
    if weighed {
        out.push_str(&nominal(&document.warnings));
        out.push_str(&format!("{CAUTION}\n"));
    }
    out.push_str(&footer(document, look));
    out
}

fn of_file(file: &WeighedFile, look: Look) -> String {
    let mut out = file_heading(
        &file.path,
        file.format,
        file.triangles,
        file.unit,
        file.unit_assumed,
        look,
    );
    if file.error.is_some() {
        out.push_str(&look.marked("not read: see the error\n", Mark::Fail));
        return out;
    }
    let unit = unit_of(file.unit);
    let bodies = file.bodies.as_deref().unwrap_or_default();
    let first = bodies
        .first()
        .map(|b| &b.figures)
        .or(file.whole.as_ref().map(|w| &w.figures));
    let printed = bodies.iter().any(|b| b.made.is_some());
    out.push_str(&substance(first, printed));
    if file.bodies.is_none() {
        out.push_str(&super::whole_text::render(file, unit, look));
        return out;
    }
    out.push('\n');
    out.push_str(&table(file, unit).render(look));
    for b in bodies.iter().filter(|b| b.refused.is_some()) {
        out.push_str(&refusal(b, look));
    }
    for b in bodies {
        if let Some(e) = &b.estimate {
            out.push_str(&estimated(&b.id, &b.figures, e, unit, look));
        }
        if let Some(made) = &b.made {
            let solid = b.figures.volume_m3;
            out.push_str(&super::print_text::render(&b.id, made, solid, look));
        }
        out.push_str(&remarks(b, look));
    }
    if let Some(made) = file.whole.as_ref().and_then(|w| w.made.as_ref())
        && bodies.len() > 1
    {
        let solid = file.whole.as_ref().and_then(|w| w.figures.volume_m3);
        out.push_str(&super::print_text::render(
            "all bodies together",
            made,
            solid,
            look,
        ));
    }
    if bodies.len() <= IN_FULL {
        for b in bodies {
            if let Some(f) = &b.facets {
                out.push_str(&format!("{}: {}\n", crate::text::shown(&b.id), f.line()));
            }
        }
    }
    if let (Some(whole), true) = (&file.whole, bodies.len() > 1)
        && let Some(e) = &whole.estimate
    {
        out.push_str(&estimated("total", &whole.figures, e, unit, look));
    }
    for f in file
        .findings
        .iter()
        .filter(|f| f.severity < Severity::Notes || f.kind == FindingKind::UnitSuspect)
    {
        out.push_str(&format!(
            "{} {}: {}\n",
            f.count,
            kind_word(f.kind, f.count),
            f.advice
        ));
    }
    let readable: Vec<&WeighedBody> = bodies.iter().filter(|b| b.refused.is_none()).collect();
    if readable.len() <= IN_FULL {
        for b in &readable {
            let (e, u) = (b.estimate.as_ref(), b.uncertainty.as_ref());
            out.push_str(&in_full(&b.id, &b.figures, e, u, unit, look));
        }
    } else {
        out.push_str(&format!(
            "\n{} bodies: tensors of each with --json, or name one as FILE#BODY\n",
            readable.len()
        ));
    }
    if readable.len() > 1
        && let Some(whole) = &file.whole
    {
        out.push_str(&in_full(
            "all bodies together",
            &whole.figures,
            whole.estimate.as_ref(),
            whole.uncertainty.as_ref(),
            unit,
            look,
        ));
    }
    out.push_str(match file.overlap {
        "untested" => "\nself-overlap: not tested; surfaces that cut each other would count some space twice (check tests it, --filled counts it once)\n",
        "none" => "\nself-overlap: none\n",
        _ => "\nself-overlap: found; each region is counted once\n",
    });
    out
}

/// What the figures are of.
fn substance(first: Option<&Figures>, printed: bool) -> String {
    let Some(first) = first else {
        return String::new();
    };
    let Some(density) = first.density_kg_m3 else {
        return "no density given: volume figures only (--density or --material gives masses)\n"
            .to_owned();
    };
    let name = first
        .material
        .as_deref()
        .map_or(String::new(), |m| format!("{m}, "));
    let solid = if printed { "as printed" } else { "solid" };
    format!(
        "material: {name}{} kg/m3, {solid}\n",
        significant(density, 6)
    )
}

fn refusal(b: &WeighedBody, look: Look) -> String {
    let Some(r) = &b.refused else {
        return String::new();
    };
    let why = match r.kind {
        "not-closed" => format!(
            "not closed: {} open edges in {} boundary loop{}",
            r.open_edges,
            r.loops,
            if r.loops == 1 { "" } else { "s" }
        ),
        "duplicate" => "facets stand twice".to_owned(),
        "nested-solid" => "a solid lies within the solid".to_owned(),
        other => other.to_owned(),
    };
    format!(
        "{} {}: {why}; {}\n",
        look.marked("REFUSED", Mark::Fail),
        crate::text::shown(&b.id),
        crate::text::shown(&r.advice)
    )
}

/// Figures of a volume with this bound that may be shown: the last one is of the bound's size.
fn digits_of(volume: Option<f64>, estimate: Option<&Estimated>) -> u32 {
    match (volume, estimate.map(|e| e.volume_bound_m3)) {
        (_, None) => 6,
        (Some(v), Some(Some(b))) if b > 0.0 && v > 0.0 => {
            (v.log10().floor() - b.log10().floor() + 1.0).clamp(1.0, 6.0) as u32
        }
        (Some(_), Some(Some(_))) => 6,
        _ => 1,
    }
}

/// Decimal places of a length known to within `bound`.
fn unit_digits(bound: f64, unit: LengthUnit) -> usize {
    let b = length_in(bound, unit);
    if b > 0.0 {
        (-b.log10().floor()).clamp(0.0, 6.0) as usize
    } else {
        6
    }
}

/// The bounds of an estimate, never without what they rest on.
fn estimated(id: &str, f: &Figures, e: &Estimated, unit: LengthUnit, look: Look) -> String {
    let (Some(bound), Some(volume)) = (e.volume_bound_m3, f.volume_m3) else {
        return String::new();
    };
    let mass = f.density_kg_m3.map_or(String::new(), |d| {
        let m = bound * d;
        let scale = Scale::for_mass(m);
        format!(", mass ± {} {}", at_most(scale.of(m)), scale.symbol)
    });
    let centre = e.centre_bound_m.map_or(String::new(), |c| {
        format!(
            ", centre ± {} {}",
            at_most(length_in(c, unit)),
            unit.symbol()
        )
    });
    format!(
        "{} {}: {}; volume ± {} cm3 ({} %){mass}{centre} {}\n",
        look.marked("ESTIMATE", Mark::Fail),
        crate::text::shown(id),
        e.how(),
        at_most(bound * 1e6),
        at_most(100.0 * bound / volume),
        e.assumption(),
    )
}

fn remarks(b: &WeighedBody, look: Look) -> String {
    let mut out = String::new();
    for f in b
        .findings
        .iter()
        .filter(|f| f.severity == Severity::Doubts || b.turned)
    {
        let (label, mark) = match f.severity {
            Severity::Notes => ("note", Mark::Dim),
            _ => ("DOUBT", Mark::Fail),
        };
        // What was mended is in the figures; what could not be is how far off they may be.
        let off = match (f.volume_effect_m3, f.volume_effect_is) {
            (Some(v), Some(EffectIs::Bound)) if v != 0.0 => {
                format!("; the volume may be off by {} cm3", at_most(v.abs() * 1e6))
            }
            _ => String::new(),
        };
        out.push_str(&format!(
            "{} {}: {} {}{off}; {}\n",
            look.marked(label, mark),
            crate::text::shown(&b.id),
            f.count,
            kind_word(f.kind, f.count),
            crate::text::shown(&f.advice)
        ));
    }
    if let Some(n) = &b.nested {
        out.push_str(&format!(
            "   sum {} cm3 · union {} cm3 · void {} cm3\n",
            significant(n.sum_m3 * 1e6, 6),
            significant(n.union_m3 * 1e6, 6),
            significant(n.void_m3 * 1e6, 6)
        ));
    }
    out
}

/// Centre, tensor, principal moments and axes of one thing.
pub(super) fn in_full(
    title: &str,
    f: &Figures,
    estimate: Option<&Estimated>,
    uncertainty: Option<&Uncertainty>,
    unit: LengthUnit,
    look: Look,
) -> String {
    let mut out = format!(
        "\n{}\n",
        look.marked(&crate::text::shown(title), Mark::Heading)
    );
    // Of a print the centre of mass is not the mesh's centroid.
    let centre = f.centre_of_mass_m.as_ref().or(f.centroid_m.as_ref());
    let (Some(centre), Some(volume_inertia)) = (centre, &f.volume_inertia_m5) else {
        return out;
    };
    let u = unit.symbol();
    if let (Some(m), Some(of)) = (f.mass_kg, uncertainty) {
        out.push_str(&mass_line(m, of));
    }
    if let Some(e) = estimate {
        // Digits of a centre and a tensor that only stand within bounds would be read as known.
        let centre = e.centre_bound_m.map_or_else(
            || "centre: nothing bounds it\n".to_owned(),
            |b| {
                let digits = unit_digits(b, unit);
                let c = centre.map(|x| format!("{:.digits$}", length_in(x, unit)));
                format!(
                    "centre  ({}, {}, {}) {u} ± {} {u}, {}\n",
                    c[0],
                    c[1],
                    c[2],
                    at_most(length_in(b, unit)),
                    e.assumption()
                )
            },
        );
        out.push_str(&centre);
        out.push_str("inertia and axes with their bound: --json\n");
        return out;
    }
    // kg·mm² and the like read better than kg·m² on parts of a hand's size.
    let k = 1.0 / (unit.metres() * unit.metres());
    let word = if f.mass_kg.is_some() {
        "centre of mass"
    } else {
        "centroid"
    };
    out.push_str(&format!(
        "{word}  {}   frame: the file's own axes and origin\n",
        f.bounds_m
            .as_ref()
            .map_or_else(|| point(centre, unit), |b| point_in(centre, b, unit))
    ));
    let (tensor_si, name, scale) = match &f.inertia_kg_m2 {
        Some(i) => (i, format!("kg {u}2"), k),
        None => (volume_inertia, format!("{u}5"), 1.0 / unit.metres().powi(5)),
    };
    out.push_str(&matrix(
        &format!("inertia about the {word}, {name}; off-diagonals are the tensor's own, −∫xy"),
        &tensor_si.map(|r| r.map(|x| x * scale)),
        least_certain(uncertainty).map(|s| s * scale),
    ));
    let moments = f.principal_moments_kg_m2.or(f.principal_volume_moments_m5);
    if let (Some(moments), Some(axes), Some(radii)) =
        (moments, &f.principal_axes, &f.radii_of_gyration_m)
    {
        let mut t = Table::new(vec![
            Column::text("n", "principal"),
            Column::figures("moment", "moment", &name),
            Column::figures("radius", "radius of gyration", u),
            Column::text("axis", "axis"),
        ]);
        let free = f.axes_free.as_deref().unwrap_or_default();
        let spread = uncertainty.and_then(|u| u.principal_moments_kg_m2.as_ref());
        let off = |i: usize| spread.map(|p| p.standard[i] * scale);
        for i in 0..3 {
            let axis = direction(&axes[i]);
            let axis = if free.contains(&i) {
                format!("{axis} (free)")
            } else {
                axis
            };
            t.row(vec![
                Cell::text(&(i + 1).to_string()),
                Cell::figure(
                    supported(moments[i] * scale, off(i), |x| significant(x, 6)),
                    moments[i],
                ),
                Cell::figure(significant(radii[i] / unit.metres(), 6), radii[i]),
                Cell::text(&axis),
            ]);
        }
        out.push_str(&t.render(look));
    }
    if let Some(about) = &f.about {
        let (tensor_si, name, scale) = match &about.inertia_kg_m2 {
            Some(i) => (i, format!("kg {u}2"), k),
            None => (
                &about.volume_inertia_m5,
                format!("{u}5"),
                1.0 / unit.metres().powi(5),
            ),
        };
        out.push_str(&matrix(
            &format!("inertia about {}, {name}", point(&about.point_m, unit)),
            &tensor_si.map(|r| r.map(|x| x * scale)),
            least_certain(uncertainty).map(|s| s * scale),
        ));
    }
    out
}

/// The mass with how far it may be off, and why.
fn mass_line(kg: f64, u: &Uncertainty) -> String {
    let (scale, m) = (Scale::for_mass(kg), &u.mass_kg);
    let [standard, low, high] = [m.standard, m.low_95, m.high_95].map(|x| scale.of(x));
    let shown = |x: f64| figure(x, Some(standard));
    // Never ± about a figure that the interval does not lie about.
    let off = super::sure::off(scale.of(kg), standard, [low, high], "");
    let off = match off.contains('±') {
        true => format!("{off} {} (standard uncertainty)", scale.symbol),
        false => format!(" {}", scale.symbol),
    };
    format!(
        "mass  {}{off}, 95 % from {} to {} {}; by {}\n",
        shown(scale.of(kg)),
        shown(low),
        shown(high),
        scale.symbol,
        super::sure::drivers(&m.drivers, |s| *s),
    )
}

/// The largest standard uncertainty of the moments about the axes, kg m².
fn least_certain(u: Option<&Uncertainty>) -> Option<f64> {
    let i = u?.inertia_kg_m2.as_ref()?.standard;
    Some(i[0][0].max(i[1][1]).max(i[2][2])).filter(|s| *s > 0.0)
}

/// A tensor as three aligned rows under its title, to the place that `standard` supports.
pub(super) fn matrix(title: &str, m: &[[f64; 3]; 3], standard: Option<f64>) -> String {
    let (cells, exponent) = tensor_figures(m, standard);
    let times = if exponent == 0 {
        String::new()
    } else {
        format!(" × 10^{exponent}")
    };
    let width = cells.iter().flatten().map(String::len).max().unwrap_or(0);
    let mut out = format!("{title}{times}\n");
    for row in &cells {
        let row = row.each_ref().map(|c| format!("{c:>width$}"));
        out.push_str(&format!("  [ {} ]\n", row.join("  ")));
    }
    out
}

fn table(file: &WeighedFile, unit: LengthUnit) -> Table {
    let bodies = file.bodies.as_deref().unwrap_or_default();
    let heaviest = bodies
        .iter()
        .filter_map(|b| b.figures.mass_kg)
        .fold(0.0f64, |m, x| m.max(x.abs()));
    let scale = Scale::for_mass(heaviest);
    let mut table = columns("body", unit, scale);
    for b in bodies {
        let name = match (&b.refused, &b.estimate) {
            (Some(_), _) => format!("{} (refused)", b.id),
            (_, Some(_)) => format!("{} (estimate)", b.id),
            _ => b.id.clone(),
        };
        let (e, u) = (b.estimate.as_ref(), b.uncertainty.as_ref());
        table.row(cells(&name, &b.figures, e, u, unit, scale));
    }
    if bodies.len() > 1 {
        match &file.whole {
            Some(whole) => table.total(cells(
                "total",
                &whole.figures,
                whole.estimate.as_ref(),
                whole.uncertainty.as_ref(),
                unit,
                scale,
            )),
            None => table.total(vec![
                Cell::text("total: none, a body is missing").marked(Mark::Fail),
            ]),
        }
    }
    table
}

/// The table of figures, still empty.
pub(super) fn columns(what: &str, unit: LengthUnit, scale: Scale) -> Table {
    let u = unit.symbol();
    Table::new(vec![
        Column::text("id", what),
        Column::figures("volume_cm3", "volume", "cm3"),
        Column::figures("area_cm2", "area", "cm2"),
        Column::figures("mass", "mass", scale.symbol),
        Column::figures("x", "centre x", u),
        Column::figures("y", "y", u),
        Column::figures("z", "z", u),
        Column::text("size", &format!("box, {u}")),
    ])
}

pub(super) fn cells(
    name: &str,
    f: &Figures,
    estimate: Option<&Estimated>,
    uncertainty: Option<&Uncertainty>,
    unit: LengthUnit,
    scale: Scale,
) -> Vec<Cell> {
    let digits = digits_of(f.volume_m3, estimate);
    let figure = |x: Option<f64>, k: f64| {
        x.map_or_else(Cell::empty, |x| {
            Cell::figure(significant(x * k, digits), x * k)
        })
    };
    let mut row = vec![
        Cell::text(name),
        figure(f.volume_m3, 1e6),
        figure(f.area_m2, 1e4),
        f.mass_kg.map_or_else(Cell::empty, |m| {
            let off = uncertainty.filter(|_| estimate.is_none());
            let off = off.map(|u| scale.of(u.mass_kg.standard));
            let text = supported(scale.of(m), off, |x| significant(x, digits));
            Cell::figure(text, scale.of(m))
        }),
    ];
    match (f.centre_of_mass_m.or(f.centroid_m), &f.bounds_m) {
        (Some(c), Some(b)) => {
            let size = (0..3).map(|k| b[1][k] - b[0][k]).fold(0.0, f64::max);
            let shown = coordinates(&c, size, unit);
            match estimate {
                None => row.extend(shown.map(|(text, x)| Cell::figure(text, x))),
                Some(e) => row.extend(shown.map(|(_, x)| match e.centre_bound_m {
                    Some(b) => Cell::figure(format!("{x:.*}", unit_digits(b, unit)), x),
                    None => Cell::empty(),
                })),
            }
        }
        _ => row.extend([Cell::empty(), Cell::empty(), Cell::empty()]),
    }
    row.push(
        f.bounds_m
            .as_ref()
            .map_or_else(Cell::empty, |b| Cell::text(&box_size(b, unit))),
    );
    row
}

/// As CSV: one row a body, SI units.
///
/// # Errors
/// As [`Table::csv`].
pub fn csv(body: &WeighBody) -> Result<String> {
    let keys = [
        "volume_m3",
        "area_m2",
        "density_kg_m3",
        "mass_kg",
        "centre_x_m",
        "centre_y_m",
        "centre_z_m",
        "inertia_xx_kg_m2",
        "inertia_yy_kg_m2",
        "inertia_zz_kg_m2",
        "inertia_xy_kg_m2",
        "inertia_xz_kg_m2",
        "inertia_yz_kg_m2",
        "size_x_m",
        "size_y_m",
        "size_z_m",
    ];
    let mut columns = vec![
        Column::text("path", ""),
        Column::text("id", ""),
        Column::text("refused", ""),
    ];
    columns.extend(keys.iter().map(|k| Column::figures(k, k, "")));
    let mut table = Table::new(columns);
    for file in &body.files {
        let bodies = file.bodies.iter().flatten().map(|b| {
            let refused = b.refused.as_ref().map_or("", |r| r.kind);
            (b.id.as_str(), refused, Some(&b.figures))
        });
        let whole = file.bodies.is_none() && file.error.is_none();
        let whole = whole.then(|| {
            (
                "",
                super::whole_text::refusal(file),
                file.whole.as_ref().map(|w| &w.figures),
            )
        });
        let unknown = Figures::unknown(None);
        for (id, refused, figures) in bodies.chain(whole) {
            let f = figures.unwrap_or(&unknown);
            let i = |a: usize, b: usize| f.inertia_kg_m2.map(|t| t[a][b]);
            let c = |k: usize| f.centroid_m.map(|c| c[k]);
            let size = |k: usize| f.bounds_m.map(|b| b[1][k] - b[0][k]);
            let figures = [
                f.volume_m3,
                f.area_m2,
                f.density_kg_m3,
                f.mass_kg,
                c(0),
                c(1),
                c(2),
                i(0, 0),
                i(1, 1),
                i(2, 2),
                i(0, 1),
                i(0, 2),
                i(1, 2),
                size(0),
                size(1),
                size(2),
            ];
            let mut row = vec![Cell::text(&file.path), Cell::text(id), Cell::text(refused)];
            row.extend(figures.map(|x| x.map_or_else(Cell::empty, |x| Cell::figure("", x))));
            table.row(row);
        }
    }
    table.csv()
}
