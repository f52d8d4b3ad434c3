//! What can be asked about light.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::bounds::{self, Range};
use crate::optics::population::Drops;
use crate::optics::water::Water;

/// Kinds of fog and drizzle by name.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum Fog {
    /// Fog of a clear cold night over land: gamma distribution of effective radius 6 µm and variance 1/9 (Shettle and Fenn 1979, heavy
    /// radiation fog; from memory).
    Radiation,
    /// Fog of mild air over cold water: effective radius 20 µm, variance 1/6 (Shettle and Fenn 1979, heavy advection fog; from memory).
    Advection,
    /// Drizzle: effective radius 150 µm, variance 0.15 (drops under 0.5 mm in diameter, as the World Meteorological Organization
    /// defines it; figures by common practice).
    Drizzle,
}

impl Fog {
    /// Every kind by its name.
    pub const NAMES: [(&str, Self); 3] =
        [("radiation", Self::Radiation), ("advection", Self::Advection), ("drizzle", Self::Drizzle)];
}

/// The drops, in the words of the question.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum AskedDrops {
    /// Rain by its rate, mm/h: Marshall and Palmer (1948).
    RainMmH(f64),
    /// Drops of nearly one radius, µm (3 % standard deviation).
    DropRadiusUm(f64),
    /// Fog or drizzle by name.
    Fog(Fog),
}

impl AskedDrops {
    /// The sizes meant.
    pub fn sizes(self) -> Drops {
        match self {
            Self::RainMmH(mm_h) => Drops::Rain { mm_h },
            Self::DropRadiusUm(radius_um) => Drops::Equal { radius_um },
            Self::Fog(fog) => {
                let (effective_radius_um, effective_variance) = match fog {
                    Fog::Radiation => (6.0, 1.0 / 9.0),
                    Fog::Advection => (20.0, 1.0 / 6.0),
                    Fog::Drizzle => (150.0, 0.15),
                };
                Drops::Gamma { effective_radius_um, effective_variance }
            }
        }
    }
}

/// A question on light, as it arrives.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Asked {
    /// Apparent elevation of the Sun; must be given.
    pub sun_elevation_deg: Option<f64>,
    /// Rain rate; 5 mm/h where no drops are given.
    pub rain_mm_h: Option<f64>,
    /// Radius of nearly equal drops, in place of a rain rate.
    pub drop_radius_um: Option<f64>,
    /// Fog or drizzle by name, in place of a rain rate.
    pub fog: Option<Fog>,
    /// Default fresh.
    pub water: Option<Water>,
    /// Default 10.
    pub water_temperature_c: Option<f64>,
    /// At 0.55 µm; default 0.1.
    pub aerosol_optical_depth: Option<f64>,
    /// Default 1.
    pub lit_optical_depth: Option<f64>,
    /// One wavelength in place of white light.
    pub wavelength_um: Option<f64>,
}

/// A question that can be answered.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Question {
    /// Apparent elevation of the Sun, degrees.
    pub sun_elevation_deg: f64,
    /// The drops.
    pub drops: AskedDrops,
    /// What they are made of.
    pub water: Water,
    /// Temperature of the drops, °C.
    pub water_temperature_c: f64,
    /// Vertical optical depth of the aerosol at 0.55 µm.
    pub aerosol_optical_depth: f64,
    /// Optical depth of sunlit rain along the line of sight.
    pub lit_optical_depth: f64,
    /// The one wavelength, µm; null for white light.
    pub wavelength_um: Option<f64>,
}

/// Why part of a question was refused.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Refused {
    /// Name of the field.
    pub field: &'static str,
    /// What is wrong with it, with its bound.
    pub detail: String,
}

impl Asked {
    /// Checks all fields at once against the table of ranges.
    ///
    /// # Errors
    /// Every field that was refused.
    pub fn check(&self) -> Result<Question, Vec<Refused>> {
        let mut refused = Vec::new();
        let mut within = |value: f64, range: Range| {
            if let Err(error) = range.check(value) {
                refused.push(Refused { field: range.name, detail: error.to_string() });
            }
            value
        };
        let water = self.water.unwrap_or_default();
        let (temperature, wavelength) = match water {
            Water::Fresh => (bounds::WATER_TEMPERATURE, bounds::WAVELENGTH),
            Water::Sea => (bounds::SEA_TEMPERATURE, bounds::SEA_WAVELENGTH),
        };
        let drops = match (self.rain_mm_h, self.drop_radius_um, self.fog) {
            (rain, None, None) => AskedDrops::RainMmH(within(rain.unwrap_or(5.0), bounds::RAIN)),
            (_, Some(radius), _) => AskedDrops::DropRadiusUm(within(radius, bounds::DROP_RADIUS)),
            (_, None, Some(fog)) => AskedDrops::Fog(fog),
        };
        let question = Question {
            sun_elevation_deg: within(self.sun_elevation_deg.unwrap_or(0.0), bounds::SUN_ELEVATION),
            drops,
            water,
            water_temperature_c: within(self.water_temperature_c.unwrap_or(10.0), temperature),
            aerosol_optical_depth: within(self.aerosol_optical_depth.unwrap_or(0.1), bounds::AEROSOL_OPTICAL_DEPTH),
            lit_optical_depth: within(self.lit_optical_depth.unwrap_or(1.0), bounds::LIT_OPTICAL_DEPTH),
            wavelength_um: self.wavelength_um.map(|asked| within(asked, wavelength)),
        };
        if self.sun_elevation_deg.is_none() {
            let Range { name, min, max, unit, .. } = bounds::SUN_ELEVATION;
            let detail = format!("{name} is missing: it must lie between {min} and {max} {unit}");
            refused.push(Refused { field: name, detail });
        }
        let kinds = [
            (bounds::RAIN.name, self.rain_mm_h.is_some()),
            (bounds::DROP_RADIUS.name, self.drop_radius_um.is_some()),
            ("fog", self.fog.is_some()),
        ];
        for (field, _) in kinds.into_iter().filter(|kind| kind.1).skip(1) {
            let detail = "only one of rain_mm_h, drop_radius_um and fog can be given".to_owned();
            refused.push(Refused { field, detail });
        }
        if refused.is_empty() { Ok(question) } else { Err(refused) }
    }
}
