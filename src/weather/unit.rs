//! Units of weather values (UCUM) and their conversion into the units a field keeps.

use std::fmt;
use std::str::FromStr;

use serde::Deserialize;
use thiserror::Error;

use super::quantity::{Dimension, Quantity};

/// A unit that a feed may use: one row of the table below. Two spellings of one unit are equal.
#[derive(Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(try_from = "String")]
pub struct Unit(u8);

/// What a unit measures, as far as weather needs it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Measure {
    /// A value of that dimension as it is.
    Plain(Dimension),
    /// Depth of water gathered over a period; a rate once divided by it.
    Amount,
}

/// How a number becomes one in the unit kept: `value * scale + offset`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Conversion {
    /// Factor. For an amount: mm per unit, still to be divided by the period in hours.
    pub scale: f64,
    /// Added after the factor.
    pub offset: f64,
    /// Whether the number is an amount gathered over a period.
    pub amount: bool,
}

struct Row {
    code: &'static str,
    spellings: &'static [&'static str],
    meanings: &'static [(Measure, f64, f64)],
}

const RATE: Measure = Measure::Plain(Dimension::RainRate);
const SHARE: Measure = Measure::Plain(Dimension::Share);
const LENGTH: Measure = Measure::Plain(Dimension::Length);
const SPEED: Measure = Measure::Plain(Dimension::Speed);
const ANGLE: Measure = Measure::Plain(Dimension::Angle);
const TEMPERATURE: Measure = Measure::Plain(Dimension::Temperature);

/// UCUM code, other spellings met in weather documents, and factor and offset by what is measured. 1 kg of water on
/// 1 m2 is taken as 1 mm deep (1000 kg/m3; within 0.4 % from 0 to 30 Cel). Feet, inches and knots as defined (0.3048 m,
/// 25.4 mm, 1852 m/h).
const TABLE: &[Row] = &[
    row("mm/h", &["mm h-1", "mm.h-1", "mm/hr", "mm h^-1", "mm per hour"], &[(RATE, 1.0, 0.0)]),
    row(
        "mm",
        &["millimeter", "millimetre", "millimeters", "millimetres"],
        &[(Measure::Amount, 1.0, 0.0), (LENGTH, 0.001, 0.0)],
    ),
    row("cm", &["centimeter", "centimetre"], &[(Measure::Amount, 10.0, 0.0), (LENGTH, 0.01, 0.0)]),
    row(
        "kg.m-2.s-1",
        &["kg m-2 s-1", "kg/m2/s", "kg/(m2.s)", "kg m**-2 s**-1", "kg m^-2 s^-1"],
        &[(RATE, 3600.0, 0.0)],
    ),
    row("kg.m-2.h-1", &["kg m-2 h-1", "kg/m2/h", "kg/(m2.h)", "kg m**-2 h**-1"], &[(RATE, 1.0, 0.0)]),
    row("kg.m-2", &["kg m-2", "kg/m2", "kg m**-2", "kg m^-2", "kg/m^2"], &[(Measure::Amount, 1.0, 0.0)]),
    row("%", &["percent", "per cent", "pct"], &[(SHARE, 0.01, 0.0)]),
    row("1", &["(0 - 1)", "0-1", "fraction", "ratio"], &[(SHARE, 1.0, 0.0)]),
    row("{okta}", &["okta", "oktas", "octa", "octas", "1/8"], &[(SHARE, 0.125, 0.0)]),
    row(
        "Cel",
        &["°C", "˚C", "ºC", "degC", "deg_C", "celsius", "degree_celsius", "degrees celsius", "degree celsius"],
        &[(TEMPERATURE, 1.0, 0.0)],
    ),
    row("K", &["kelvin", "degK", "deg_K"], &[(TEMPERATURE, 1.0, -273.15)]),
    row("[degF]", &["°F", "˚F", "degF", "fahrenheit", "degree fahrenheit"], &[(TEMPERATURE, 5.0 / 9.0, -160.0 / 9.0)]),
    row("m/s", &["m s-1", "m.s-1", "m s**-1", "m s^-1", "m_s-1", "mps"], &[(SPEED, 1.0, 0.0), (RATE, 3.6e6, 0.0)]),
    row("km/h", &["km h-1", "km.h-1", "kmh", "kph", "km_h-1"], &[(SPEED, 1.0 / 3.6, 0.0)]),
    row("[kn_i]", &["kt", "kts", "kn", "knot", "knots"], &[(SPEED, 1852.0 / 3600.0, 0.0)]),
    row("[mi_i]/h", &["mph", "mp/h", "mi/h", "miles per hour"], &[(SPEED, 0.44704, 0.0)]),
    row("m", &["metre", "meter", "metres", "meters", "gpm"], &[(LENGTH, 1.0, 0.0), (Measure::Amount, 1000.0, 0.0)]),
    row("km", &["kilometre", "kilometer", "kilometres", "kilometers"], &[(LENGTH, 1000.0, 0.0)]),
    row("[ft_i]", &["ft", "foot", "feet"], &[(LENGTH, 0.3048, 0.0)]),
    row("[mi_i]", &["mi", "mile", "miles", "statute mile", "statute miles"], &[(LENGTH, 1609.344, 0.0)]),
    row("[in_i]", &["in", "inch", "inches"], &[(Measure::Amount, 25.4, 0.0), (LENGTH, 0.0254, 0.0)]),
    row("[in_i]/h", &["in/h", "inch/h", "in/hr", "in h-1"], &[(RATE, 25.4, 0.0)]),
    row("deg", &["°", "˚", "degree", "degrees", "degree_(angle)", "degree true", "degrees true"], &[(ANGLE, 1.0, 0.0)]),
    row("rad", &["radian", "radians"], &[(ANGLE, 180.0 / std::f64::consts::PI, 0.0)]),
];

const fn row(code: &'static str, spellings: &'static [&'static str], meanings: &'static [(Measure, f64, f64)]) -> Row {
    Row { code, spellings, meanings }
}

/// A unit that is not in the table.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("{0:?} is no known unit; known are {known}", known = TABLE.iter().map(|row| row.code).collect::<Vec<_>>().join(", "))]
pub struct UnknownUnit(String);

/// A unit that cannot measure the value.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("{name} cannot be measured in {unit}; it needs {wanted}")]
pub struct WrongUnit {
    /// The value.
    pub name: &'static str,
    /// Code of the unit given.
    pub unit: &'static str,
    /// Units that would do.
    pub wanted: String,
}

impl Unit {
    /// The UCUM code.
    pub fn code(self) -> &'static str {
        TABLE[usize::from(self.0)].code
    }

    /// How a number in this unit becomes one in the unit that a field keeps.
    ///
    /// # Errors
    /// [`WrongUnit`] when the unit cannot measure that quantity.
    pub fn conversion(self, quantity: Quantity) -> Result<Conversion, WrongUnit> {
        TABLE[usize::from(self.0)].meaning(quantity).ok_or_else(|| WrongUnit {
            name: quantity.name(),
            unit: self.code(),
            wanted: TABLE
                .iter()
                .filter(|row| row.meaning(quantity).is_some())
                .map(|row| row.code)
                .collect::<Vec<_>>()
                .join(", "),
        })
    }
}

impl Row {
    fn meaning(&self, quantity: Quantity) -> Option<Conversion> {
        self.meanings.iter().find_map(|&(measure, scale, offset)| {
            let amount = measure == Measure::Amount;
            let fits = match measure {
                Measure::Plain(dimension) => dimension == quantity.dimension(),
                Measure::Amount => quantity.dimension() == Dimension::RainRate,
            };
            fits.then_some(Conversion { scale, offset, amount })
        })
    }
}

impl FromStr for Unit {
    type Err = UnknownUnit;

    fn from_str(text: &str) -> Result<Self, UnknownUnit> {
        let wanted = text.trim();
        TABLE
            .iter()
            .position(|row| row.code == wanted)
            .or_else(|| {
                TABLE.iter().position(|row| {
                    row.spellings.iter().any(|spelling| spelling.to_lowercase() == wanted.to_lowercase())
                })
            })
            .map(|index| Self(index as u8))
            .ok_or_else(|| UnknownUnit(text.chars().take(40).collect()))
    }
}

impl TryFrom<String> for Unit {
    type Error = UnknownUnit;

    fn try_from(text: String) -> Result<Self, UnknownUnit> {
        text.parse()
    }
}

impl fmt::Debug for Unit {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "Unit({})", self.code())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn convert(value: f64, unit: &str, quantity: Quantity) -> f64 {
        let by = unit.parse::<Unit>().unwrap().conversion(quantity).unwrap();
        value * by.scale + by.offset
    }

    #[test]
    fn conversions_follow_the_definitions() {
        // Definitions of the units: NIST SP 811 (2008), appendix B.8 (from memory).
        let rows = [
            (1.0, "kg.m-2.s-1", Quantity::Rain, 3600.0),
            (0.5, "[in_i]/h", Quantity::Rain, 12.7),
            (2.5, "kg m-2 h-1", Quantity::Rain, 2.5),
            (50.0, "%", Quantity::CloudLow, 0.5),
            (5.0, "{okta}", Quantity::CloudTotal, 0.625),
            (273.15, "K", Quantity::Temperature, 0.0),
            (212.0, "[degF]", Quantity::Temperature, 100.0),
            (-40.0, "°F", Quantity::Temperature, -40.0),
            (36.0, "km/h", Quantity::WindSpeed, 10.0),
            (1.0, "kts", Quantity::WindEast, 0.514_444_444),
            (10.0, "mp/h", Quantity::WindNorth, 4.4704),
            (1000.0, "[ft_i]", Quantity::CloudBase, 304.8),
            (10.0, "km", Quantity::Visibility, 10_000.0),
            (std::f64::consts::PI, "rad", Quantity::WindFrom, 180.0),
        ];
        for (value, unit, quantity, expected) in rows {
            let found = convert(value, unit, quantity);
            assert!((found - expected).abs() < 1e-6 * expected.abs().max(1.0), "{value} {unit}: {found} != {expected}");
        }
    }

    #[test]
    fn spellings_of_one_unit_are_one_unit_and_none_has_two_meanings() {
        for (index, row) in TABLE.iter().enumerate() {
            for spelling in row.spellings.iter().chain([&row.code]) {
                assert_eq!(spelling.parse::<Unit>().unwrap(), Unit(index as u8), "{spelling}");
            }
        }
        assert_eq!("Percent".parse::<Unit>(), "%".parse());
        assert_eq!("Kelvin".parse::<Unit>(), "K".parse());
    }

    #[test]
    fn unknown_and_wrong_units_are_refused_by_name() {
        let refusal = serde_json::from_str::<Unit>("\"furlong\"").unwrap_err().to_string();
        assert!(refusal.contains("\"furlong\" is no known unit; known are mm/h, mm,"), "{refusal}");
        let wrong = "Cel".parse::<Unit>().unwrap().conversion(Quantity::WindSpeed).unwrap_err().to_string();
        assert_eq!(wrong, "wind_speed cannot be measured in Cel; it needs m/s, km/h, [kn_i], [mi_i]/h");
        assert!("mm/h".parse::<Unit>().unwrap().conversion(Quantity::Visibility).is_err());
        assert!("mm".parse::<Unit>().unwrap().conversion(Quantity::Rain).unwrap().amount);
    }
}
