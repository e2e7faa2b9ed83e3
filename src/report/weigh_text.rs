//! What `weigh` prints for people.

use super::Document;
use super::digits::{self, DEFAULT_DIGITS, Scale, significant, tensor};
use super::footer::{CAUTION, footer};
use super::table::{Cell, Column, Look, Mark, Table};
use super::weigh::{Estimate, WeighBody, WeighedBody, WeighedFile};
use super::words::{box_size, coordinates, direction, file_heading, kind_word, point, unit_of};
use crate::error::Result;
use crate::masses::Figures;
use crate::quantity::LengthUnit;
use crate::soundness::{FindingKind, Severity};

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
    out.push_str(&substance(first));
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
        out.push_str(&remarks(b, look));
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
            out.push_str(&in_full(&b.id, &b.figures, b.estimate.as_ref(), unit, look));
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
            file.whole_estimate.as_ref(),
            unit,
            look,
        ));
    }
    if let Some(e) = &file.whole_estimate {
        out.push_str(&estimated("all bodies together", e));
    }
    out.push_str(match file.overlap {
        "untested" => "\nself-overlap: not tested; surfaces that cut each other would count some space twice (check tests it, --filled counts it once)\n",
        "none" => "\nself-overlap: none\n",
        _ => "\nself-overlap: found; each region is counted once\n",
    });
    out
}

/// How far off an estimate may be.
fn estimated(id: &str, e: &Estimate) -> String {
    format!(
        "{}: by {}, volume ± {} cm3, centre ± {} mm, if {}\n",
        crate::text::shown(id),
        e.method,
        significant(e.volume_bound_m3 * 1e6, 2),
        significant(e.centre_bound_m * 1e3, 2),
        e.condition
    )
}

/// What the figures are of.
fn substance(first: Option<&Figures>) -> String {
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
    format!("material: {name}{} kg/m3, solid\n", significant(density, 6))
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

fn remarks(b: &WeighedBody, look: Look) -> String {
    let mut out = String::new();
    for f in b
        .findings
        .iter()
        .filter(|f| f.severity == Severity::Doubts || b.turned)
    {
        out.push_str(&format!(
            "{} {}: {} {}; {}\n",
            look.marked("note", Mark::Fail),
            crate::text::shown(&b.id),
            f.count,
            kind_word(f.kind, f.count),
            crate::text::shown(&f.advice)
        ));
    }
    if let Some(e) = &b.estimate {
        out.push_str(&estimated(&b.id, e));
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
    estimate: Option<&Estimate>,
    unit: LengthUnit,
    look: Look,
) -> String {
    let shown = supported_digits(f, estimate);
    let mut out = format!(
        "\n{}\n",
        look.marked(&crate::text::shown(title), Mark::Heading)
    );
    let (Some(centre), Some(volume_inertia)) = (&f.centroid_m, &f.volume_inertia_m5) else {
        return out;
    };
    let u = unit.symbol();
    // kg·mm² and the like read better than kg·m² on parts of a hand's size.
    let k = 1.0 / (unit.metres() * unit.metres());
    let word = if f.mass_kg.is_some() {
        "centre of mass"
    } else {
        "centroid"
    };
    out.push_str(&format!(
        "{word}  {}   frame: the file's own axes and origin\n",
        estimated_point(centre, estimate, unit)
    ));
    let (tensor_si, name, scale) = match &f.inertia_kg_m2 {
        Some(i) => (i, format!("kg {u}2"), k),
        None => (volume_inertia, format!("{u}5"), 1.0 / unit.metres().powi(5)),
    };
    out.push_str(&matrix(
        &format!("inertia about the {word}, {name}; off-diagonals are the tensor's own, −∫xy"),
        &tensor_si.map(|r| r.map(|x| x * scale)),
        shown,
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
        for i in 0..3 {
            let axis = direction(&axes[i]);
            let axis = if free.contains(&i) {
                format!("{axis} (free)")
            } else {
                axis
            };
            t.row(vec![
                Cell::text(&(i + 1).to_string()),
                Cell::figure(significant(moments[i] * scale, shown), moments[i]),
                Cell::figure(significant(radii[i] / unit.metres(), shown), radii[i]),
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
            shown,
        ));
    }
    out
}

/// Digits that an estimate's relative error supports; three times the volume's, since moments of
/// a higher order weigh what is far off more.
fn supported_digits(f: &Figures, estimate: Option<&Estimate>) -> u32 {
    let relative = f
        .volume_m3
        .zip(estimate)
        .map(|(v, e)| 3.0 * e.volume_bound_m3 / v.abs())
        .filter(|r| r.is_finite() && *r > 0.0);
    relative.map_or(DEFAULT_DIGITS, |r| {
        // The cast saturates.
        ((-r.log10()).floor() as u32 + 1).clamp(1, DEFAULT_DIGITS)
    })
}

fn estimated_point(at_m: &[f64; 3], estimate: Option<&Estimate>, unit: LengthUnit) -> String {
    let Some(e) = estimate else {
        return point(at_m, unit);
    };
    let off = Some(e.centre_bound_m / unit.metres());
    let p = at_m.map(|x| digits::figure(x / unit.metres(), off));
    format!("({}, {}, {}) {}", p[0], p[1], p[2], unit.symbol())
}

/// A tensor as three aligned rows under its title.
pub(super) fn matrix(title: &str, m: &[[f64; 3]; 3], shown: u32) -> String {
    let (cells, exponent) = tensor(m, shown);
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
        let name = if b.refused.is_some() {
            format!("{} (refused)", b.id)
        } else {
            b.id.clone()
        };
        table.row(cells(&name, &b.figures, b.estimate.as_ref(), unit, scale));
    }
    if bodies.len() > 1 {
        match &file.whole {
            Some(whole) => {
                let estimate = file.whole_estimate.as_ref();
                table.total(cells("total", &whole.figures, estimate, unit, scale));
            }
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
    estimate: Option<&Estimate>,
    unit: LengthUnit,
    scale: Scale,
) -> Vec<Cell> {
    // No more digits than an estimate's own bound supports.
    let figure = |x: Option<f64>, k: f64, off: Option<f64>| {
        x.map_or_else(Cell::empty, |x| {
            Cell::figure(digits::figure(x * k, off.map(|o| o * k)), x * k)
        })
    };
    let volume_off = estimate.map(|e| e.volume_bound_m3);
    let mass_off = volume_off.zip(f.density_kg_m3).map(|(v, d)| v * d);
    let centre_off = estimate.map(|e| e.centre_bound_m);
    let mut row = vec![
        Cell::text(name),
        figure(f.volume_m3, 1e6, volume_off),
        figure(f.area_m2, 1e4, None),
        f.mass_kg.map_or_else(Cell::empty, |m| {
            let off = mass_off.map(|o| scale.of(o));
            Cell::figure(digits::figure(scale.of(m), off), scale.of(m))
        }),
    ];
    match (&f.centroid_m, &f.bounds_m) {
        (Some(c), _) if centre_off.is_some() => {
            row.extend(c.map(|x| figure(Some(x), 1.0 / unit.metres(), centre_off)));
        }
        (Some(c), Some(b)) => {
            let size = (0..3).map(|k| b[1][k] - b[0][k]).fold(0.0, f64::max);
            row.extend(coordinates(c, size, unit).map(|(text, x)| Cell::figure(text, x)));
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
