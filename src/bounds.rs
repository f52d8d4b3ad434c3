//! The one table of ranges: name, bounds and unit of every number that comes in from outside.
//! The checks, the error texts, openapi.json and the random input of the tests all read it.

use chrono::{DateTime, Utc};
use thiserror::Error;

/// An inclusive range of a number that arrives from outside.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Range {
    /// The name under which it is asked for, unit included.
    pub name: &'static str,
    /// Least value allowed.
    pub min: f64,
    /// Greatest value allowed.
    pub max: f64,
    /// Unit as text, empty for a pure number.
    pub unit: &'static str,
    /// Whether only whole numbers are allowed.
    pub whole: bool,
}

/// Why a value was refused.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum OutOfBounds {
    /// The value is not in the range.
    #[error("{value} is out of range: {name} must lie between {min} and {max}{space}{unit}", space = if unit.is_empty() { "" } else { " " })]
    Range {
        /// What was given.
        value: String,
        /// Name of the quantity.
        name: &'static str,
        /// Least value allowed.
        min: f64,
        /// Greatest value allowed.
        max: f64,
        /// Unit of the bounds.
        unit: &'static str,
    },
    /// The text is no number at all.
    #[error("{value:?} is not a {kind}: {name} must lie between {min} and {max}{space}{unit}", space = if unit.is_empty() { "" } else { " " })]
    NotANumber {
        /// What was given, shortened.
        value: String,
        /// `number` or `whole number`.
        kind: &'static str,
        /// Name of the quantity.
        name: &'static str,
        /// Least value allowed.
        min: f64,
        /// Greatest value allowed.
        max: f64,
        /// Unit of the bounds.
        unit: &'static str,
    },
}

impl Range {
    const fn real(name: &'static str, min: f64, max: f64, unit: &'static str) -> Self {
        Self { name, min, max, unit, whole: false }
    }

    const fn whole(name: &'static str, min: f64, max: f64, unit: &'static str) -> Self {
        Self { name, min, max, unit, whole: true }
    }

    /// Checks a number.
    ///
    /// # Errors
    /// `OutOfBounds` when the value is NaN, infinite, outside the range, or not whole where it must be.
    pub fn check(&self, value: f64) -> Result<f64, OutOfBounds> {
        if self.whole && value.is_finite() && value.fract() != 0.0 {
            return Err(self.not_a_number(&value.to_string()));
        }
        if value >= self.min && value <= self.max {
            Ok(value)
        } else {
            Err(OutOfBounds::Range {
                value: value.to_string(),
                name: self.name,
                min: self.min,
                max: self.max,
                unit: self.unit,
            })
        }
    }

    /// Reads and checks a number given as text.
    ///
    /// # Errors
    /// `OutOfBounds` when the text is no number or the number is refused by [`Range::check`].
    pub fn parse(&self, text: &str) -> Result<f64, OutOfBounds> {
        text.parse::<f64>().map_err(|_| self.not_a_number(text)).and_then(|value| self.check(value))
    }

    fn not_a_number(&self, text: &str) -> OutOfBounds {
        OutOfBounds::NotANumber {
            value: text.chars().take(40).collect(),
            kind: if self.whole { "whole number" } else { "number" },
            name: self.name,
            min: self.min,
            max: self.max,
            unit: self.unit,
        }
    }
}

/// Geographic latitude.
pub const LAT: Range = Range::real("lat", -90.0, 90.0, "deg");
/// Geographic longitude, positive east.
pub const LON: Range = Range::real("lon", -180.0, 180.0, "deg");
/// Height of the ground above mean sea level.
pub const GROUND: Range = Range::real("ground_m", -500.0, 9000.0, "m");
/// Height of the eye above the ground or water around.
pub const EYE_HEIGHT: Range = Range::real("eye_height_m", 0.0, 20000.0, "m");
/// Temperature of the drops in rain.
pub const WATER_TEMPERATURE: Range = Range::real("water_temperature_c", 0.0, 40.0, "Cel");
/// Temperature of the drops in sea spray: the range of Quan and Fry (1995).
pub const SEA_TEMPERATURE: Range = Range::real("water_temperature_c", 0.0, 30.0, "Cel");
/// Length of an outlook.
pub const HOURS: Range = Range::real("hours", 1.0, 240.0, "h");
/// Step of an outlook.
pub const STEP: Range = Range::real("step_min", 1.0, 60.0, "min");
/// Chance from which a step belongs to a window.
pub const THRESHOLD: Range = Range::real("threshold", 0.0, 1.0, "");
/// Azimuth of a skyline point.
pub const SKYLINE_AZIMUTH: Range = Range::real("skyline azimuth", 0.0, 360.0, "deg");
/// Elevation of a skyline point; negative where one looks down on the ground or water.
pub const SKYLINE_ELEVATION: Range = Range::real("skyline elevation", -90.0, 90.0, "deg");
/// How long a feed's document counts as fresh when its server does not say.
pub const REFRESH: Range = Range::real("refresh_min", 1.0, 1440.0, "min");
/// How long a feed may take to answer.
pub const TIMEOUT: Range = Range::real("timeout_s", 1.0, 120.0, "s");
/// Size limit of a feed's document, after decompression.
pub const MAX_BYTES: Range = Range::whole("max_bytes", 1000.0, 1.0e9, "bytes");
/// Connections open at once.
pub const CONNECTIONS: Range = Range::whole("connections", 1.0, 1.0e6, "");
/// Requests answered at once.
pub const REQUESTS: Range = Range::whole("requests", 1.0, 1.0e6, "");
/// Longest time for one answer.
pub const REQUEST_TIME: Range = Range::whole("request_s", 1.0, 3600.0, "s");
/// Longest request body.
pub const BODY: Range = Range::whole("body_bytes", 0.0, 1.0e9, "bytes");
/// Memory for weather documents.
pub const DOCUMENTS: Range = Range::whole("documents_mb", 1.0, 1.0e6, "MB");
/// Memory for finished answers.
pub const ANSWERS: Range = Range::whole("answers_mb", 1.0, 1.0e6, "MB");
/// Period over which an accumulated value was gathered.
pub const OVER_MIN: Range = Range::real("over_min", 1.0, 1440.0, "min");

/// Apparent elevation of the Sun in questions on light.
pub const SUN_ELEVATION: Range = Range::real("sun_elevation_deg", -0.5, 90.0, "deg");
/// Rain rate.
pub const RAIN: Range = Range::real("rain_mm_h", 0.05, 200.0, "mm/h");
/// Radius of nearly equal drops.
pub const DROP_RADIUS: Range = Range::real("drop_radius_um", 1.0, 3000.0, "um");
/// Vertical optical depth of the aerosol at 0.55 um.
pub const AEROSOL_OPTICAL_DEPTH: Range = Range::real("aerosol_optical_depth", 0.0, 5.0, "");
/// Optical depth of sunlit rain along the line of sight.
pub const LIT_OPTICAL_DEPTH: Range = Range::real("lit_optical_depth", 0.001, 50.0, "");
/// Wavelength of light, where refractive index and eye are known.
pub const WAVELENGTH: Range = Range::real("wavelength_um", 0.38, 0.75, "um");
/// The same in sea water: the range of Quan and Fry (1995).
pub const SEA_WAVELENGTH: Range = Range::real("wavelength_um", 0.4, 0.7, "um");

/// Every range that a query may name; where they differ by kind of water the wider one stands here.
pub const QUERY: [Range; 13] = [
    LAT,
    LON,
    EYE_HEIGHT,
    WATER_TEMPERATURE,
    HOURS,
    STEP,
    THRESHOLD,
    SUN_ELEVATION,
    RAIN,
    DROP_RADIUS,
    AEROSOL_OPTICAL_DEPTH,
    LIT_OPTICAL_DEPTH,
    WAVELENGTH,
];

/// Times the service computes for: the Sun's formulae were measured from 2003 to 2045 and drift slowly outside.
pub const TIME_MIN: DateTime<Utc> = DateTime::from_timestamp(-631_152_000, 0).expect("1950-01-01");
/// End of the times the service computes for.
pub const TIME_MAX: DateTime<Utc> = DateTime::from_timestamp(4_102_444_800, 0).expect("2100-01-01");

/// A place on the Earth, checked once.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    lat_deg: f64,
    lon_deg: f64,
}

impl Place {
    /// A place by latitude and longitude in degrees.
    ///
    /// # Errors
    /// `OutOfBounds` when either is outside [`LAT`] or [`LON`].
    pub fn new(lat_deg: f64, lon_deg: f64) -> Result<Self, OutOfBounds> {
        Ok(Self { lat_deg: LAT.check(lat_deg)?, lon_deg: LON.check(lon_deg)? })
    }

    /// Latitude in degrees, -90 to 90.
    pub fn lat_deg(&self) -> f64 {
        self.lat_deg
    }

    /// Longitude in degrees, positive east, -180 to 180.
    pub fn lon_deg(&self) -> f64 {
        self.lon_deg
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_are_inclusive_and_name_the_field() {
        assert_eq!(LAT.parse("-90"), Ok(-90.0));
        assert_eq!(LAT.parse("90"), Ok(90.0));
        let refusal = LAT.parse("90.0001").unwrap_err().to_string();
        assert_eq!(refusal, "90.0001 is out of range: lat must lie between -90 and 90 deg");
        assert_eq!(
            THRESHOLD.parse("two").unwrap_err().to_string(),
            "\"two\" is not a number: threshold must lie between 0 and 1"
        );
    }

    #[test]
    fn nan_infinity_and_fractions_of_whole_numbers_are_refused() {
        for text in ["NaN", "inf", "-inf", "1e999", "", " 1", "0x10"] {
            assert!(LON.parse(text).is_err(), "{text:?} was accepted");
        }
        assert!(MAX_BYTES.check(5000.5).is_err());
        assert_eq!(MAX_BYTES.check(5000.0), Ok(5000.0));
    }
}
