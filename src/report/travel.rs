//! The travel of the balance point as a picture: from above, from the side, and against the mass,
//! with what the limits allow.
//!
//! Black and white throughout: forbidden ground is hatched, the way is a line with a dot a step,
//! phases begin at numbered dots, and a ring with a letter marks where a limit is at its worst.

use std::fmt::Write as _;
use std::path::Path;

use super::balance::fixed;
use super::digits::{length_in, significant};
use super::picture::write_picture;
use crate::assembly::service::Drain;
use crate::error::Result;
use crate::quantity::LengthUnit;

const SIDE: f64 = 380.0;
const LEFT: f64 = 76.0;
const TOP: f64 = 62.0;
const GAP: f64 = 92.0;

/// Draws the travel and writes the picture.
///
/// # Errors
/// `usage` for an ending that is neither .svg nor .png, `cannot-write`.
pub fn draw(path: &Path, drain: &Drain, unit: LengthUnit) -> Result<()> {
    write_picture(path, &svg(drain, unit))
}

/// What an axis of a panel shows.
#[derive(Clone, Copy, PartialEq)]
enum Shown {
    Centre(usize),
    Mass,
}

impl Shown {
    fn name(self, unit: LengthUnit) -> String {
        match self {
            Self::Centre(k) => format!("{}, {}", ["x", "y", "z"][k], unit.symbol()),
            Self::Mass => "mass, kg".to_owned(),
        }
    }

    fn quantity(self) -> &'static str {
        match self {
            Self::Centre(k) => ["centre.x", "centre.y", "centre.z"][k],
            Self::Mass => "mass",
        }
    }

    /// A figure in the unit that is shown.
    fn of(self, mass: f64, centre: &[f64; 3], unit: LengthUnit) -> f64 {
        match self {
            Self::Centre(k) => length_in(centre[k], unit),
            Self::Mass => mass,
        }
    }

    /// The narrowest band that the limits leave, in the unit that is shown.
    fn band(self, drain: &Drain, unit: LengthUnit) -> [Option<f64>; 2] {
        let in_unit = |x: f64| match self {
            Self::Centre(_) => length_in(x, unit),
            Self::Mass => x,
        };
        let limits = drain.limits.iter().map(|l| &l.judged);
        let mine = limits.filter(|l| l.quantity == self.quantity());
        let from = mine.clone().filter_map(|l| l.from).reduce(f64::max);
        let to = mine.filter_map(|l| l.to).reduce(f64::min);
        [from.map(in_unit), to.map(in_unit)]
    }
}

/// A stretch of an axis.
#[derive(Clone, Copy)]
struct Scale {
    lo: f64,
    hi: f64,
    /// Where `lo` and `hi` are drawn.
    at: [f64; 2],
}

impl Scale {
    /// Around the values; at least `least` to each side.
    fn of(values: impl Iterator<Item = f64>, at: [f64; 2], least: f64) -> Self {
        let [lo, hi] = values
            .filter(|v| v.is_finite())
            .fold([f64::INFINITY, f64::NEG_INFINITY], |[lo, hi], v| {
                [lo.min(v), hi.max(v)]
            });
        let [lo, hi] = if lo > hi { [0.0, 0.0] } else { [lo, hi] };
        // What does not travel at all still needs a width.
        let room = ((hi - lo) * 0.12).max(least).max(1e-3);
        Self {
            lo: lo - room,
            hi: hi + room,
            at,
        }
    }

    fn place(&self, v: f64) -> f64 {
        let [a, b] = self.at;
        a + (b - a) * ((v - self.lo) / (self.hi - self.lo)).clamp(-0.01, 1.01)
    }

    /// Round values, about five.
    fn ticks(&self) -> Vec<f64> {
        let rough = (self.hi - self.lo) / 5.0;
        let power = 10f64.powf(rough.log10().floor());
        let step = [1.0, 2.0, 5.0, 10.0]
            .map(|k| k * power)
            .into_iter()
            .find(|s| *s >= rough)
            .unwrap_or(rough);
        let first = (self.lo / step).ceil();
        (0..12)
            .map(|n| (first + f64::from(n)) * step)
            .take_while(|v| *v <= self.hi)
            .map(|v| v + 0.0)
            .collect()
    }
}

fn svg(drain: &Drain, unit: LengthUnit) -> String {
    let panels = [
        ("from above", Shown::Centre(0), Shown::Centre(1)),
        ("from the side", Shown::Centre(0), Shown::Centre(2)),
        ("against the mass", Shown::Centre(0), Shown::Mass),
    ];
    let width = LEFT + 3.0 * SIDE + 2.0 * GAP + 24.0;
    let list = drain.phases.len() + drain.limits.len();
    let height = TOP + SIDE + 76.0 + 18.0 * list as f64;
    let mut out = String::new();
    // Writing into a String cannot fail; that is why the results are let go.
    let _ = write!(
        out,
        "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {width} {height}\" width=\"{width}\" height=\"{height}\" font-family=\"sans-serif\" font-size=\"13\">\n\
         <title>{name}: travel of the balance point</title>\n\
         <defs><pattern id=\"no\" width=\"7\" height=\"7\" patternUnits=\"userSpaceOnUse\" patternTransform=\"rotate(45)\"><rect width=\"7\" height=\"7\" fill=\"#fff\"/><line x1=\"0\" y1=\"0\" x2=\"0\" y2=\"7\" stroke=\"#999\" stroke-width=\"1.4\"/></pattern></defs>\n\
         <rect width=\"{width}\" height=\"{height}\" fill=\"#fff\"/>\n\
         <text x=\"{LEFT}\" y=\"26\" font-size=\"17\" font-weight=\"bold\">{name}: travel of the balance point{case}</text>\n",
        name = escaped(&drain.name),
        case = drain
            .case
            .as_ref()
            .map_or(String::new(), |c| format!(", case {}", escaped(c))),
    );
    for (n, (title, across, up)) in panels.into_iter().enumerate() {
        let left = LEFT + n as f64 * (SIDE + GAP);
        panel(&mut out, drain, unit, (title, across, up), left);
    }
    legend(&mut out, drain, unit);
    out.push_str("</svg>\n");
    out
}

fn panel(
    out: &mut String,
    drain: &Drain,
    unit: LengthUnit,
    (title, across, up): (&str, Shown, Shown),
    left: f64,
) {
    let steps = || drain.phases.iter().flat_map(|p| &p.steps);
    let bands = [across.band(drain, unit), up.band(drain, unit)];
    let scale = |shown: Shown, band: &[Option<f64>; 2], at: [f64; 2], least: f64| {
        let way = steps().map(|s| shown.of(s.mass_kg, &s.centre_of_mass_m, unit));
        let worst = drain.limits.iter();
        let worst = worst.map(|l| shown.of(l.worst.mass_kg, &l.worst.centre_of_mass_m, unit));
        Scale::of(
            way.chain(worst).chain(band.iter().copied().flatten()),
            at,
            least,
        )
    };
    let x = scale(across, &bands[0], [left, left + SIDE], 0.0);
    // What hardly travels is not blown up until its rounding shows.
    let least = if up == Shown::Mass {
        0.0
    } else {
        0.05 * (x.hi - x.lo)
    };
    let y = scale(up, &bands[1], [TOP + SIDE, TOP], least);
    let allowed = |scale: &Scale, band: &[Option<f64>; 2]| {
        let ends = [
            band[0].map_or(scale.at[0], |v| scale.place(v)),
            band[1].map_or(scale.at[1], |v| scale.place(v)),
        ];
        [ends[0].min(ends[1]), ends[0].max(ends[1])]
    };
    let (ax, ay) = (allowed(&x, &bands[0]), allowed(&y, &bands[1]));
    let _ = write!(
        out,
        "<text x=\"{left}\" y=\"{:.1}\" font-weight=\"bold\">{title}</text>\n\
         <rect x=\"{left}\" y=\"{TOP}\" width=\"{SIDE}\" height=\"{SIDE}\" fill=\"url(#no)\" stroke=\"#000\"/>\n\
         <rect x=\"{:.2}\" y=\"{:.2}\" width=\"{:.2}\" height=\"{:.2}\" fill=\"#fff\" stroke=\"#000\" stroke-width=\"1.6\"/>\n",
        TOP - 10.0,
        ax[0],
        ay[0],
        (ax[1] - ax[0]).max(0.0),
        (ay[1] - ay[0]).max(0.0),
    );
    for v in x.ticks() {
        let at = x.place(v);
        let _ = writeln!(
            out,
            "<path d=\"M{at:.2} {:.2}v5\" stroke=\"#000\"/><text x=\"{at:.2}\" y=\"{:.2}\" text-anchor=\"middle\">{}</text>",
            TOP + SIDE,
            TOP + SIDE + 19.0,
            tick(v)
        );
    }
    for v in y.ticks() {
        let at = y.place(v);
        let _ = writeln!(
            out,
            "<path d=\"M{left} {at:.2}h-5\" stroke=\"#000\"/><text x=\"{:.2}\" y=\"{:.2}\" text-anchor=\"end\">{}</text>",
            left - 8.0,
            at + 4.5,
            tick(v)
        );
    }
    let _ = writeln!(
        out,
        "<text x=\"{:.2}\" y=\"{:.2}\" text-anchor=\"middle\">{}</text><text transform=\"translate({:.2} {:.2}) rotate(-90)\" text-anchor=\"middle\">{}</text>",
        left + SIDE / 2.0,
        TOP + SIDE + 38.0,
        across.name(unit),
        left - 56.0,
        TOP + SIDE / 2.0,
        up.name(unit)
    );
    let place = |mass: f64, centre: &[f64; 3]| {
        (
            x.place(across.of(mass, centre, unit)),
            y.place(up.of(mass, centre, unit)),
        )
    };
    let way: Vec<(f64, f64)> = steps()
        .map(|s| place(s.mass_kg, &s.centre_of_mass_m))
        .collect();
    let line: Vec<String> = way.iter().map(|(x, y)| format!("{x:.2},{y:.2}")).collect();
    let _ = writeln!(
        out,
        "<polyline points=\"{}\" fill=\"none\" stroke=\"#000\" stroke-width=\"1.6\"/>",
        line.join(" ")
    );
    // Dots that would run into a band are left out.
    let every = way.len().div_ceil(200);
    for (x, y) in way.iter().step_by(every) {
        let _ = writeln!(out, "<circle cx=\"{x:.2}\" cy=\"{y:.2}\" r=\"2.4\"/>");
    }
    for (n, phase) in drain.phases.iter().enumerate() {
        if let Some(s) = phase.steps.first() {
            let (x, y) = place(s.mass_kg, &s.centre_of_mass_m);
            let _ = writeln!(
                out,
                "<circle cx=\"{x:.2}\" cy=\"{y:.2}\" r=\"8.5\" fill=\"#000\"/><text x=\"{x:.2}\" y=\"{:.2}\" fill=\"#fff\" font-size=\"11\" text-anchor=\"middle\">{}</text>",
                y + 4.0,
                n + 1
            );
        }
    }
    for (n, l) in drain.limits.iter().enumerate() {
        if l.judged.quantity != across.quantity() && l.judged.quantity != up.quantity() {
            continue;
        }
        let (x, y) = place(l.worst.mass_kg, &l.worst.centre_of_mass_m);
        // Side by side where several are worst at one place.
        let before = drain.limits[..n].iter().filter(|o| {
            o.judged.quantity == across.quantity() || o.judged.quantity == up.quantity()
        });
        let shift = 12.0 * before.count() as f64;
        let _ = writeln!(
            out,
            "<circle cx=\"{x:.2}\" cy=\"{y:.2}\" r=\"11\" fill=\"none\" stroke=\"#000\" stroke-width=\"1.4\"/><text x=\"{:.2}\" y=\"{:.2}\" font-weight=\"bold\">{}</text>",
            x + 12.0 + shift,
            y - 9.0,
            letter(n)
        );
    }
}

fn legend(out: &mut String, drain: &Drain, unit: LengthUnit) {
    let mut y = TOP + SIDE + 66.0;
    let mut line = |text: String| {
        let _ = writeln!(out, "<text x=\"{LEFT}\" y=\"{y:.1}\">{text}</text>");
        y += 18.0;
    };
    for (n, phase) in drain.phases.iter().enumerate() {
        line(format!("{} begins phase {}", n + 1, escaped(&phase.name)));
    }
    for (n, l) in drain.limits.iter().enumerate() {
        let (margin, symbol) =
            super::balance::readable(l.worst.margin, l.judged.unit, l.judged.quantity, unit);
        let margin = match l.judged.unit {
            "m" => fixed(margin),
            _ => significant(margin, 4),
        };
        let (word, _) = super::balance::verdict(l.judged.verdict);
        line(format!(
            "{} worst of {} ({}): margin {margin} {symbol}, {word}",
            letter(n),
            escaped(&l.judged.name),
            l.judged.quantity
        ));
    }
}

/// a to z, then aa, ab, …
fn letter(n: usize) -> String {
    let own = char::from(b'a' + (n % 26) as u8);
    match n / 26 {
        0 => own.to_string(),
        more => letter(more - 1) + &own.to_string(),
    }
}

fn tick(v: f64) -> String {
    let text = format!("{v:.6}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text.is_empty() || text == "-0" {
        "0".to_owned()
    } else {
        text.to_owned()
    }
}

fn escaped(text: &str) -> String {
    let text = crate::text::shown(text);
    text.replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        let s = Scale::of([-3.0, 47.0].into_iter(), [0.0, 1.0], 0.0);
        assert_eq!(s.ticks(), [0.0, 20.0, 40.0]);
        let still = Scale::of([5.0].into_iter(), [0.0, 1.0], 0.0);
        assert!(still.hi > still.lo && !still.ticks().is_empty());
        assert_eq!(tick(-0.0), "0");
        assert_eq!(
            (letter(0), letter(26), letter(27)),
            ("a".into(), "aa".into(), "ab".into())
        );
    }
}
