//! Unit symbols with their exact factors, and expressions made of them.
//!
//! Factors: SI prefixes; inch 25.4 mm and pound 0.45359237 kg exactly (international yard and pound
//! agreement, 1959); standard gravity 9.80665 m/s² (CGPM 1901).

use std::ops::Range;

use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::One;

use super::dimension::Powers;
use super::exact;

/// One symbol: `num / den · 10^ten` SI units, times π where `pi` says so.
struct Symbol {
    names: &'static [&'static str],
    powers: Powers,
    num: u64,
    den: u64,
    ten: i32,
    pi: bool,
}

const MASS: Powers = [1, 0, 0, 0, 0];
const LENGTH: Powers = [0, 1, 0, 0, 0];
const VOLUME: Powers = [0, 3, 0, 0, 0];
const TIME: Powers = [0, 0, 1, 0, 0];
const ANGLE: Powers = [0, 0, 0, 1, 0];
const FRACTION: Powers = [0, 0, 0, 0, 1];
const FORCE: Powers = [1, 1, -2, 0, 0];

/// One pound in units of 10⁻⁸ kg.
const POUND: u64 = 45_359_237;
/// Standard gravity in units of 10⁻⁵ m/s².
const STANDARD_GRAVITY: u64 = 980_665;

const fn unit(names: &'static [&'static str], powers: Powers, num: u64, ten: i32) -> Symbol {
    ratio(names, powers, num, 1, ten)
}

const fn ratio(
    names: &'static [&'static str],
    powers: Powers,
    num: u64,
    den: u64,
    ten: i32,
) -> Symbol {
    Symbol {
        names,
        powers,
        num,
        den,
        ten,
        pi: false,
    }
}

static SYMBOLS: &[Symbol] = &[
    unit(&["um", "\u{b5}m", "\u{3bc}m"], LENGTH, 1, -6),
    unit(&["mm"], LENGTH, 1, -3),
    unit(&["cm"], LENGTH, 1, -2),
    unit(&["dm"], LENGTH, 1, -1),
    unit(&["m"], LENGTH, 1, 0),
    unit(&["km"], LENGTH, 1, 3),
    unit(&["in", "inch", "inches"], LENGTH, 254, -4),
    unit(&["ft", "foot", "feet"], LENGTH, 3048, -4),
    unit(&["mg"], MASS, 1, -6),
    unit(&["g"], MASS, 1, -3),
    unit(&["kg"], MASS, 1, 0),
    unit(&["t"], MASS, 1, 3),
    unit(&["lb", "lbs"], MASS, POUND, -8),
    ratio(&["oz"], MASS, POUND, 16, -8),
    // One pound-force second squared per foot.
    ratio(&["slug"], MASS, POUND * STANDARD_GRAVITY, 3048, -9),
    unit(&["l", "L", "litre", "liter"], VOLUME, 1, -3),
    unit(&["dl", "dL"], VOLUME, 1, -4),
    unit(&["cl", "cL"], VOLUME, 1, -5),
    unit(&["ml", "mL", "cc"], VOLUME, 1, -6),
    unit(&["ms"], TIME, 1, -3),
    unit(&["s"], TIME, 1, 0),
    unit(&["min"], TIME, 60, 0),
    unit(&["h"], TIME, 3600, 0),
    unit(&["rad"], ANGLE, 1, 0),
    unit(&["mrad"], ANGLE, 1, -3),
    Symbol {
        names: &["deg", "\u{b0}", "degree", "degrees"],
        powers: ANGLE,
        num: 1,
        den: 180,
        ten: 0,
        pi: true,
    },
    unit(&["%"], FRACTION, 1, -2),
    unit(&["mN"], FORCE, 1, -3),
    unit(&["N"], FORCE, 1, 0),
    unit(&["kN"], FORCE, 1, 3),
    unit(&["MN"], FORCE, 1, 6),
    unit(&["lbf"], FORCE, POUND * STANDARD_GRAVITY, -13),
    unit(&["kgf"], FORCE, STANDARD_GRAVITY, -5),
];

/// Words that people write for a unit, and what to write.
static MEANT: &[(&str, &str)] = &[
    ("millimetre", "mm"),
    ("millimeter", "mm"),
    ("centimetre", "cm"),
    ("centimeter", "cm"),
    ("metre", "m"),
    ("meter", "m"),
    ("micron", "um"),
    ("gram", "g"),
    ("gramme", "g"),
    ("gr", "g"),
    ("kilo", "kg"),
    ("kilogram", "kg"),
    ("tonne", "t"),
    ("ton", "t"),
    ("pound", "lb"),
    ("ounce", "oz"),
    ("sec", "s"),
    ("second", "s"),
    ("percent", "%"),
    ("radian", "rad"),
    ("newton", "N"),
];

/// π to 70 decimals, in units of 10⁻⁷⁰.
const PI: &str = "31415926535897932384626433832795028841971693993751058209749445923078164";

impl Symbol {
    fn factor(&self) -> BigRational {
        let plain = BigRational::new(BigInt::from(self.num), BigInt::from(self.den));
        let scaled = plain * exact::ten(self.ten);
        match PI.parse::<BigInt>() {
            Ok(pi) if self.pi => scaled * BigRational::from_integer(pi) * exact::ten(-70),
            _ => scaled,
        }
    }
}

/// What a unit expression amounts to.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Expression {
    pub(super) powers: Powers,
    /// SI units in one of it.
    pub(super) factor: BigRational,
}

/// What is wrong with a unit expression; `at` counts bytes from its start.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Fault {
    pub(super) what: String,
    pub(super) advice: Option<String>,
    pub(super) at: Range<usize>,
}

fn fault(what: String, at: Range<usize>) -> Fault {
    Fault {
        what,
        advice: None,
        at,
    }
}

/// Reads `kg/m3`, `g mm^2`, `kg·m²`, `m3 s-2`. A `/` holds for the one unit after it; a product
/// after a `/` could be read in two ways and is refused.
pub(super) fn read(text: &str) -> Result<Expression, Fault> {
    let mut powers: Powers = [0; 5];
    let mut factor = BigRational::one();
    let mut at = skip_space(text, 0);
    let mut dividing = false;
    let mut divided = false;
    loop {
        let start = at;
        let end = symbol_end(text, start);
        let name = &text[start..end];
        if name.is_empty() {
            let rest = text[start..].chars().next();
            let what = match rest {
                Some(c) => format!("`{c}` stands where a unit must"),
                None => "a unit is missing".to_owned(),
            };
            return Err(fault(what, start..start + rest.map_or(0, char::len_utf8)));
        }
        let symbol = find(name).ok_or_else(|| unknown(name, start..end))?;
        let (power, after) = exponent(text, end).ok_or_else(|| {
            let to = text.len();
            fault(
                format!("the exponent after `{name}` is not a whole number from 1 to 9"),
                end..to,
            )
        })?;
        let signed = if dividing { -power } else { power };
        for (sum, p) in powers.iter_mut().zip(symbol.powers) {
            *sum += p * signed;
        }
        factor *= symbol.factor().pow(signed);
        let spaced = skip_space(text, after);
        let Some(next) = text[spaced..].chars().next() else {
            return Ok(Expression { powers, factor });
        };
        dividing = next == '/';
        let joined = matches!(next, '/' | '*' | '.' | '\u{b7}' | '\u{22c5}' | '\u{d7}');
        if !dividing && divided {
            return Err(Fault {
                what: format!("`{}` can be read in two ways", text.trim()),
                advice: Some("after a `/`, write a further `/` for each unit divided by".into()),
                at: spaced..text.len(),
            });
        }
        divided |= dividing;
        at = if joined {
            skip_space(text, spaced + next.len_utf8())
        } else {
            spaced
        };
    }
}

fn skip_space(text: &str, at: usize) -> usize {
    text[at..]
        .char_indices()
        .find(|(_, c)| !c.is_whitespace())
        .map_or(text.len(), |(i, _)| at + i)
}

fn symbol_end(text: &str, at: usize) -> usize {
    let mut chars = text[at..].char_indices();
    match chars.next() {
        Some((_, c @ ('%' | '\u{b0}'))) => at + c.len_utf8(),
        Some((_, c)) if c.is_alphabetic() => chars
            .find(|(_, c)| !c.is_alphabetic())
            .map_or(text.len(), |(i, _)| at + i),
        _ => at,
    }
}

/// The exponent at `at` and where it ends; 1 where there is none, `None` where it is malformed.
fn exponent(text: &str, at: usize) -> Option<(i32, usize)> {
    let rest = &text[at..];
    let mut chars = rest.chars().peekable();
    let mut read = 0;
    let caret = chars.next_if_eq(&'^').is_some();
    read += usize::from(caret);
    let mut negative = false;
    if let Some(c) = chars.next_if(|c| matches!(c, '-' | '\u{2212}' | '\u{207b}')) {
        negative = true;
        read += c.len_utf8();
    }
    let mut digits: Option<i32> = None;
    while let Some(d) = chars.peek().copied().and_then(digit) {
        if digits.is_some() {
            return None;
        }
        digits = Some(d);
        read += chars.next().map_or(0, char::len_utf8);
    }
    match digits {
        Some(d) if d > 0 => Some((if negative { -d } else { d }, at + read)),
        None if read == 0 => Some((1, at)),
        _ => None,
    }
}

fn digit(c: char) -> Option<i32> {
    match c {
        '0'..='9' => c.to_digit(10).and_then(|d| i32::try_from(d).ok()),
        '\u{b9}' => Some(1),
        '\u{b2}' => Some(2),
        '\u{b3}' => Some(3),
        '\u{2070}' => Some(0),
        '\u{2074}'..='\u{2079}' => i32::try_from(u32::from(c) - 0x2070).ok(),
        _ => None,
    }
}

fn find(name: &str) -> Option<&'static Symbol> {
    SYMBOLS.iter().find(|s| s.names.contains(&name))
}

fn unknown(name: &str, at: Range<usize>) -> Fault {
    let lower = name.to_lowercase();
    let plain = lower.strip_suffix('s').unwrap_or(&lower);
    let meant = MEANT
        .iter()
        .find(|(word, _)| *word == lower || *word == plain)
        .map(|(_, symbol)| *symbol)
        .or_else(|| {
            let mut names = SYMBOLS.iter().flat_map(|s| s.names).copied();
            names.find(|n| n.to_lowercase() == lower)
        });
    let advice = match (meant, lower.as_str()) {
        (_, "ton" | "tons") => {
            Some("`t` is the tonne of 1000 kg; give other tons in kg or lb".into())
        }
        (_, "gal" | "gallon" | "gallons") => {
            Some("gallons differ by country: give the volume in l or in3".into())
        }
        (Some(symbol), _) => Some(format!("`{symbol}` may be meant; case counts in units")),
        _ => None,
    };
    Fault {
        what: format!("`{name}` is not a unit that is known here"),
        advice,
        at,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn factor(text: &str) -> f64 {
        exact::nearest(&read(text).unwrap().factor).unwrap()
    }

    #[test]
    fn every_name_is_one_unit() {
        let mut names: Vec<&str> = SYMBOLS.iter().flat_map(|s| s.names).copied().collect();
        let all = names.len();
        names.sort_unstable();
        names.dedup();
        assert_eq!(names.len(), all);
        for (_, meant) in MEANT {
            assert!(find(meant).is_some(), "{meant}");
        }
    }

    #[test]
    fn factors_agree_with_their_definitions() {
        assert_eq!(factor("in"), 0.0254);
        assert_eq!(factor("ft"), 0.3048);
        assert_eq!(factor("lb"), 0.453_592_37);
        assert_eq!(factor("oz"), 0.028_349_523_125);
        assert_eq!(factor("lbf"), 4.448_221_615_260_5);
        // REFERENCE table of unit traps: lb/in3 is 27679.9047 kg/m3, so to half its last digit.
        assert!((factor("lb/in3") - 27_679.904_7).abs() < 5e-5);
        // NIST SP 811 appendix B.8: slug 14.59390 kg, so to half its last digit.
        assert!((factor("slug") - 14.593_90).abs() < 5e-6);
        assert_eq!(factor("deg"), std::f64::consts::PI / 180.0);
        assert_eq!(factor("l"), factor("dm3"));
        assert_eq!(factor("g/cm3"), 1000.0);
        assert_eq!(factor("t/m3"), 1000.0);
    }

    #[test]
    fn spellings_of_one_unit_agree() {
        let m2 = read("kg m2").unwrap();
        for text in [
            "kg·m²",
            "kg*m^2",
            "kg.m2",
            " kg \u{a0} m²",
            "kg⋅m2",
            "kg/m-2",
            "m2 kg",
        ] {
            assert_eq!(read(text).unwrap(), m2, "{text}");
        }
        assert_eq!(read("m3/s2"), read("m3 s-2"));
        assert_eq!(read("m3/s2"), read("m³·s⁻²"));
        assert_eq!(read("m3/s2"), read("m^3 / s / s"));
    }

    #[test]
    fn faults_are_placed() {
        let e = read("kg/furlong3").unwrap_err();
        assert_eq!(e.at, 3..10);
        assert!(read("kg/m s2").unwrap_err().advice.is_some());
        assert_eq!(
            read("MM").unwrap_err().advice.unwrap(),
            "`mm` may be meant; case counts in units"
        );
        for bad in ["", "/s", "kg/", "m^", "m0", "m12", "m^x", "kg//m", "m3 7"] {
            assert!(read(bad).is_err(), "{bad}");
        }
    }
}
