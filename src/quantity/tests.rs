//! Quantities as people write them, and as they must not.

use proptest::prelude::*;

use super::{Coverage, Dimension, LengthUnit, Quantity, QuantityError};
use crate::error::Kind;

fn read(text: &str, dimension: Dimension) -> Quantity {
    Quantity::parse(text, dimension, Some(LengthUnit::Mm)).unwrap_or_else(|e| panic!("{text}: {e}"))
}

fn fault(text: &str, dimension: Dimension) -> QuantityError {
    Quantity::parse(text, dimension, Some(LengthUnit::Mm)).expect_err(text)
}

/// Values are compared bit for bit: the right side is the correctly rounded double.
#[test]
fn values_are_correctly_rounded() {
    use Dimension::*;
    let cases = [
        ("7850 kg/m3", Density, 7850.0),
        ("7.85 g/cm3", Density, 7850.0),
        ("2.70 g/cm^3", Density, 2700.0),
        ("2.70 g/cm³", Density, 2700.0),
        ("1.24 kg/l", Density, 1240.0),
        ("7.85 t/m3", Density, 7850.0),
        ("4.12 kg", Mass, 4.12),
        ("20 g", Mass, 0.02),
        ("20g", Mass, 0.02),
        ("350 mg", Mass, 0.000_35),
        ("1.5 t", Mass, 1500.0),
        ("1 lb", Mass, 0.453_592_37),
        ("16 oz", Mass, 0.453_592_37),
        ("60 %", Fraction, 0.6),
        ("60%", Fraction, 0.6),
        ("90 deg", Angle, std::f64::consts::FRAC_PI_2),
        ("-45°", Angle, -std::f64::consts::FRAC_PI_4),
        ("1.2 rad", Angle, 1.2),
        ("120", Length, 0.12),
        ("-40", Length, -0.04),
        ("\u{2212}40\u{a0}mm", Length, -0.04),
        ("1 in", Length, 0.0254),
        ("0.1 ft", Length, 0.030_48),
        ("75 um", Length, 75e-6),
        ("75 µm", Length, 75e-6),
        ("6378.137 km", Length, 6_378_137.0),
        ("812 cm3", Volume, 812e-6),
        ("16 l", Volume, 0.016),
        ("250 ml", Volume, 250e-6),
        ("1 in^3", Volume, 1.638_706_4e-5),
        ("0.5 kg m2", Inertia, 0.5),
        ("0.5 kg·m²", Inertia, 0.5),
        ("12 g mm2", Inertia, 12e-9),
        ("9.80665 m/s2", Acceleration, 9.80665),
        (
            "3.986004418e14 m3/s2",
            GravitationalParameter,
            3.986_004_418e14,
        ),
        (
            "398600.4418 km3/s2",
            GravitationalParameter,
            3.986_004_418e14,
        ),
        ("1.2 kN", Force, 1200.0),
        ("0 kg", Mass, 0.0),
    ];
    for (text, dimension, expected) in cases {
        let held = read(text, dimension);
        assert_eq!(held.value, expected, "{text}");
        assert_eq!(held.tolerance, None, "{text}");
    }
}

/// lb/in3 × 27679.9047 (to half the last digit quoted); 0.098 lb/in3 is MMPDS's aluminium 6061,
/// 2713 kg/m3 in the table of materials. lb in2 in kg m2 follows from the definitions of both.
#[test]
fn customary_units() {
    let one = read("1 lb/in3", Dimension::Density).value;
    assert!((one - 27_679.904_7).abs() < 5e-5);
    let al = read("0.098 lb/in3", Dimension::Density).value;
    assert!((al - 2713.0).abs() < 0.5);
    let inertia = read("1 lb in2", Dimension::Inertia).value;
    assert_eq!(inertia, 2.926_396_534_292e-4);
}

#[test]
fn tolerances_become_absolute() {
    for (text, dimension, amount, relative) in [
        ("7850 kg/m3 ± 1 %", Dimension::Density, 78.5, true),
        ("7.85 g/cm3 +/- 1%", Dimension::Density, 78.5, true),
        ("7850 kg/m3 ± 0.1 g/cm3", Dimension::Density, 100.0, false),
        ("4.12 kg +/- 20 g", Dimension::Mass, 0.02, false),
        ("4.12 kg +- 20 g", Dimension::Mass, 0.02, false),
        ("4.12 kg+/\u{2212}20 g", Dimension::Mass, 0.02, false),
        ("-40 ± 0.5", Dimension::Length, 0.0005, false),
        ("-40 mm ± 0.5", Dimension::Length, 0.0005, false),
        ("-40 mm ± 10 %", Dimension::Length, 0.004, true),
        // Of a percentage, ± 2 % is two points: 58 % to 62 %.
        ("60 % ± 2 %", Dimension::Fraction, 0.02, false),
        ("0 kg ± 0 %", Dimension::Mass, 0.0, true),
    ] {
        let t = read(text, dimension).tolerance.expect(text);
        assert_eq!((t.amount, t.relative), (amount, relative), "{text}");
        assert_eq!(t.coverage, Coverage::HalfWidth);
    }
}

/// A rectangular ± 2 % half-width is u = 1.154701 % (JCGM 100:2008, type B evaluation).
#[test]
fn coverage_gives_the_standard_uncertainty() {
    let half = read("100 kg ± 2 %", Dimension::Mass);
    assert!((half.standard() - 1.154_701).abs() < 5e-7);
    let one = read("100 kg ± 2 kg (k=1)", Dimension::Mass);
    assert_eq!(one.standard(), 2.0);
    let two = read("100 kg ± 2 % ( k = 2 )", Dimension::Mass);
    assert_eq!(two.standard(), 1.0);
    for bad in ["(k=0)", "(k=-1)", "(k=nan)", "(95 %)", "(k=2", "(k=2) kg"] {
        let e = fault(&format!("100 kg ± 2 kg {bad}"), Dimension::Mass);
        assert_eq!((e.kind, e.at.start), (Kind::BadNumber, 15), "{bad}");
    }
}

#[test]
fn faults_say_what_was_expected() {
    use Dimension::*;
    let cases = [
        ("7850", Density, Kind::Unit, "a density"),
        ("4.12", Mass, Kind::Unit, "a mass"),
        ("90", Angle, Kind::Unit, "an angle"),
        ("0.6", Fraction, Kind::Unit, "a percentage"),
        (
            "7850 N",
            Density,
            Kind::Unit,
            "is a force, where a density is expected",
        ),
        (
            "60 %",
            Mass,
            Kind::Unit,
            "is a percentage, where a mass is expected",
        ),
        ("12 furlong", Length, Kind::Unit, "`furlong`"),
        ("", Mass, Kind::BadNumber, "a mass"),
        (" \u{a0}", Mass, Kind::BadNumber, "a mass"),
        ("heavy", Mass, Kind::BadNumber, "a mass"),
        ("NaN kg", Mass, Kind::BadNumber, "a mass"),
        ("inf kg", Mass, Kind::BadNumber, "a mass"),
        ("1e400 kg", Mass, Kind::BadNumber, "range"),
        ("1e-400 kg", Mass, Kind::BadNumber, "range"),
        ("1e99999999999 kg", Mass, Kind::BadNumber, "range"),
        ("-4 kg", Mass, Kind::BadNumber, "negative"),
        (
            "7,85 g/cm3",
            Density,
            Kind::BadNumber,
            "more than one number",
        ),
        ("1 000 kg", Mass, Kind::BadNumber, "more than one number"),
        ("1.2.3 kg", Mass, Kind::BadNumber, "more than one number"),
        ("± 1 kg", Mass, Kind::BadNumber, "missing"),
        ("4 kg ±", Mass, Kind::BadNumber, "missing"),
        ("4 kg ± -1 g", Mass, Kind::BadNumber, "negative"),
        ("4 kg ± 1", Mass, Kind::Unit, "has no unit"),
        (
            "4 kg ± 1 mm",
            Mass,
            Kind::Unit,
            "is a length, where a percentage or a mass",
        ),
        ("4 kg ± 1 g ± 2 g", Mass, Kind::Unit, "`±`"),
        ("0 mm ± 1 %", Length, Kind::Unit, "of zero"),
        // In millimetres or in inches? Both could be meant.
        ("1 in ± 0.1", Length, Kind::Unit, "has no unit"),
        ("12 ± 0.1 in and more", Length, Kind::Unit, "`and`"),
    ];
    for (text, dimension, kind, part) in cases {
        let e = fault(text, dimension);
        assert_eq!(e.kind, kind, "{text}: {e}");
        assert!(e.message.contains(part), "{text}: {e}");
        assert!(!e.advice.is_empty(), "{text}");
        assert!(text.get(e.at.clone()).is_some(), "{text}: {:?}", e.at);
    }
    let without = Quantity::parse("12", Length, None).unwrap_err();
    assert_eq!(without.kind, Kind::Unit);
    assert!(fault(&"1".repeat(300), Length).message.contains("too long"));
    assert_eq!(fault("7850 kg/furlong3", Density).at, 8..15);
}

/// 25 kN/m3 is 2549 kg/m3, not 2500: division by standard gravity 9.80665 m/s2 (CGPM 1901).
#[test]
fn specific_weight_is_not_density() {
    let e = fault("25 kN/m3", Dimension::Density);
    assert_eq!(e.kind, Kind::Unit);
    assert!(e.message.contains("specific weight"), "{e}");
    assert!(
        e.advice.contains("9.80665") && e.advice.contains("2549 kg/m3"),
        "{}",
        e.advice
    );
    let e = fault("9.80665 N", Dimension::Mass);
    assert!(e.advice.contains("gives 1 kg"), "{}", e.advice);
}

#[test]
fn bare_numbers_of_a_file_are_lengths() {
    let inch = Some(LengthUnit::In);
    let held = Quantity::from_number(0.1, Dimension::Length, inch);
    assert_eq!(held.unwrap().value, 0.002_54);
    for (number, value) in [(0.1, 1e-4), (-120.0, -0.12), (1e300, 1e297), (3e-7, 3e-10)] {
        let held = Quantity::from_number(number, Dimension::Length, Some(LengthUnit::Mm));
        assert_eq!(held.unwrap().value, value);
    }
    for number in [f64::NAN, f64::INFINITY] {
        let e = Quantity::from_number(number, Dimension::Length, inch).unwrap_err();
        assert_eq!(e.kind, Kind::BadNumber);
    }
    let e = Quantity::from_number(7850.0, Dimension::Density, inch).unwrap_err();
    assert_eq!(e.kind, Kind::Unit);
    assert!(e.message.contains("`7850` has no unit"), "{e}");
}

#[test]
fn one_of_several() {
    let fill = [
        Dimension::Fraction,
        Dimension::Volume,
        Dimension::Mass,
        Dimension::Length,
    ];
    let read = |text| Quantity::parse_one_of(text, &fill, Some(LengthUnit::Mm));
    for (text, dimension, value) in [
        ("60 %", Dimension::Fraction, 0.6),
        ("16 l", Dimension::Volume, 0.016),
        ("12 kg", Dimension::Mass, 12.0),
        ("150", Dimension::Length, 0.15),
    ] {
        assert_eq!(read(text), Ok((dimension, Quantity::exact(value))));
    }
    let e = read("3 N m").unwrap_err();
    assert!(
        e.message
            .contains("a percentage, a volume, a mass or a length"),
        "{e}"
    );
}

#[test]
fn printed_text_is_short() {
    for (text, dimension, shown) in [
        ("7.85 g/cm3 ± 1 %", Dimension::Density, "7850 kg/m3 ± 1 %"),
        (
            "4.12 kg +/- 20 g (k=2)",
            Dimension::Mass,
            "4.12 kg ± 0.02 kg (k=2)",
        ),
        ("60 %", Dimension::Fraction, "60 %"),
        ("120", Dimension::Length, "0.12 m"),
    ] {
        assert_eq!(read(text, dimension).printed(dimension).to_string(), shown);
    }
}

proptest! {
    #[test]
    fn printing_reads_back(
        value in proptest::num::f64::NORMAL,
        size in 1e-6..0.9_f64,
        relative: bool,
        standard: bool,
        which in 0..Dimension::ALL.len(),
    ) {
        let dimension = Dimension::ALL[which];
        prop_assume!(value.abs() > 1e-290 && value.abs() < 1e290);
        let value = if dimension.is_never_negative() { value.abs() } else { value };
        let relative = relative && dimension != Dimension::Fraction;
        let held = Quantity {
            value,
            tolerance: Some(super::Tolerance {
                amount: value.abs() * size,
                relative,
                coverage: if standard { Coverage::Standard { k: 2.0 } } else { Coverage::HalfWidth },
            }),
        };
        let text = held.printed(dimension).to_string();
        prop_assert_eq!(Quantity::parse(&text, dimension, None), Ok(held), "{}", text);
    }

    /// No text panics, and the place of a fault is within it.
    #[test]
    fn any_text_is_survived(text in "[0-9 .eE+±/%()k=−²^·a-zA-Z-]{0,24}|\\PC{0,24}") {
        for dimension in Dimension::ALL {
            if let Err(e) = Quantity::parse(&text, dimension, Some(LengthUnit::Cm)) {
                prop_assert!(text.get(e.at).is_some());
            }
        }
    }
}
