//! What a quantity is a measure of, and how it is spoken of in advice.

/// Powers of kilogram, metre, second, radian and fraction. An angle and a fraction stand as base
/// dimensions of their own, so that neither is taken for a plain number.
pub(super) type Powers = [i32; 5];

/// What a quantity is a measure of. It fixes the SI unit in which the value is held.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Dimension {
    /// m
    Length,
    /// m²
    Area,
    /// m³
    Volume,
    /// kg
    Mass,
    /// kg/m³
    Density,
    /// rad
    Angle,
    /// 1; 60 % is 0.6
    Fraction,
    /// kg m²
    Inertia,
    /// m/s²
    Acceleration,
    /// m³/s²
    GravitationalParameter,
    /// N
    Force,
    /// N m
    Torque,
    /// s
    Time,
}

impl Dimension {
    /// Every dimension, in the order of their declaration.
    pub const ALL: [Self; 13] = [
        Self::Length,
        Self::Area,
        Self::Volume,
        Self::Mass,
        Self::Density,
        Self::Angle,
        Self::Fraction,
        Self::Inertia,
        Self::Acceleration,
        Self::GravitationalParameter,
        Self::Force,
        Self::Torque,
        Self::Time,
    ];

    /// The SI unit as it is written and read here, such as `kg/m3`. A fraction is written in `%`.
    pub fn symbol(self) -> &'static str {
        match self {
            Self::Length => "m",
            Self::Area => "m2",
            Self::Volume => "m3",
            Self::Mass => "kg",
            Self::Density => "kg/m3",
            Self::Angle => "rad",
            Self::Fraction => "%",
            Self::Inertia => "kg m2",
            Self::Acceleration => "m/s2",
            Self::GravitationalParameter => "m3/s2",
            Self::Force => "N",
            Self::Torque => "N m",
            Self::Time => "s",
        }
    }

    /// The name with its article, for sentences: `a density`.
    pub fn name(self) -> &'static str {
        match self {
            Self::Length => "a length",
            Self::Area => "an area",
            Self::Volume => "a volume",
            Self::Mass => "a mass",
            Self::Density => "a density",
            Self::Angle => "an angle",
            Self::Fraction => "a percentage",
            Self::Inertia => "a moment of inertia",
            Self::Acceleration => "an acceleration",
            Self::GravitationalParameter => "a gravitational parameter",
            Self::Force => "a force",
            Self::Torque => "a torque",
            Self::Time => "a time",
        }
    }

    /// Two ways to write one, for advice.
    pub fn examples(self) -> [&'static str; 2] {
        match self {
            Self::Length => ["120 mm", "4.5 in"],
            Self::Area => ["250 cm2", "0.025 m2"],
            Self::Volume => ["812 cm3", "16 l"],
            Self::Mass => ["4.12 kg ± 20 g", "9 lb"],
            Self::Density => ["7850 kg/m3 ± 1 %", "2.70 g/cm3"],
            Self::Angle => ["90 deg", "1.2 rad"],
            Self::Fraction => ["60 %", "2.5 %"],
            Self::Inertia => ["0.012 kg m2", "41 lb in2"],
            Self::Acceleration => ["9.80665 m/s2", "1.62 m/s2"],
            Self::GravitationalParameter => ["3.986004418e14 m3/s2", "398600.4418 km3/s2"],
            Self::Force => ["250 N", "1.2 kN"],
            Self::Torque => ["12 N m", "0.5 N m"],
            Self::Time => ["30 s", "5 min"],
        }
    }

    /// Whether a value below zero makes no sense.
    pub fn is_never_negative(self) -> bool {
        matches!(
            self,
            Self::Area
                | Self::Volume
                | Self::Mass
                | Self::Density
                | Self::GravitationalParameter
                | Self::Time
        )
    }

    pub(super) fn powers(self) -> Powers {
        match self {
            Self::Length => [0, 1, 0, 0, 0],
            Self::Area => [0, 2, 0, 0, 0],
            Self::Volume => [0, 3, 0, 0, 0],
            Self::Mass => [1, 0, 0, 0, 0],
            Self::Density => [1, -3, 0, 0, 0],
            Self::Angle => [0, 0, 0, 1, 0],
            Self::Fraction => [0, 0, 0, 0, 1],
            Self::Inertia => [1, 2, 0, 0, 0],
            Self::Acceleration => [0, 1, -2, 0, 0],
            Self::GravitationalParameter => [0, 3, -2, 0, 0],
            Self::Force => [1, 1, -2, 0, 0],
            Self::Torque => [1, 2, -2, 0, 0],
            Self::Time => [0, 0, 1, 0, 0],
        }
    }
}

/// What `powers` measure, with the article; for messages about a unit in the wrong place.
pub(super) fn name_of(powers: Powers) -> &'static str {
    if let Some(found) = Dimension::ALL.iter().find(|d| d.powers() == powers) {
        return found.name();
    }
    match powers {
        SPECIFIC_WEIGHT => "a specific weight (force per volume)",
        [1, -2, 0, 0, 0] => "a mass per area",
        [1, -1, 0, 0, 0] => "a mass per length",
        [1, -1, -2, 0, 0] => "a pressure",
        [1, 1, 0, 0, 0] => "a mass times a length",
        [0, 1, -1, 0, 0] => "a speed",
        [0, 4, 0, 0, 0] => "a second moment of area",
        [0, 5, 0, 0, 0] => "a second moment of volume",
        _ => "a quantity of another kind",
    }
}

/// Force per volume, often quoted for building materials where a density is meant.
pub(super) const SPECIFIC_WEIGHT: Powers = [1, -2, -2, 0, 0];

/// `a, b or c`.
pub(super) fn any_of(dimensions: &[Dimension]) -> String {
    let names: Vec<&str> = dimensions.iter().map(|d| d.name()).collect();
    match names.split_last() {
        None => "nothing".to_owned(),
        Some((last, [])) => (*last).to_owned(),
        Some((last, rest)) => format!("{} or {last}", rest.join(", ")),
    }
}

/// Examples for one dimension, or one for each of several.
pub(super) fn such_as(dimensions: &[Dimension]) -> String {
    match dimensions {
        [one] => {
            let [a, b] = one.examples();
            format!("such as `{a}` or `{b}`")
        }
        several => {
            let quoted: Vec<String> = several
                .iter()
                .map(|d| format!("`{}`", d.examples()[0]))
                .collect();
            format!("such as {}", quoted.join(", "))
        }
    }
}
