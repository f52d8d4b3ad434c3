//! Refractive index of the water in a drop.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use super::air;

/// Salinity of sea spray, the mean of the oceans, in g/kg.
pub const SEA_SALINITY_G_KG: f64 = 35.0;

/// What the drops are made of.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum Water {
    /// Rain, fog, fresh spray.
    #[default]
    Fresh,
    /// Sea spray of 35 g/kg.
    Sea,
}

impl Water {
    /// Refractive index relative to the air around the drop, which is what bends a ray.
    ///
    /// Fresh water 0 to 40 °C by [`fresh_index`], to about 2e-5; sea water 0 to 30 °C by [`sea_index`], to about 3e-5.
    /// Both for 0.38 to 0.75 µm.
    pub fn index_in_air(self, wavelength_um: f64, temperature_c: f64) -> f64 {
        match self {
            Self::Fresh => fresh_index(wavelength_um, temperature_c) / air::index(wavelength_um),
            Self::Sea => sea_index(wavelength_um, temperature_c, SEA_SALINITY_G_KG),
        }
    }
}

/// Refractive index of fresh water at 1 atm relative to vacuum, 0 to 40 °C.
pub fn fresh_index(wavelength_um: f64, temperature_c: f64) -> f64 {
    index_by_density(wavelength_um, temperature_c + 273.15, density_kg_m3(temperature_c))
}

/// Refractive index of water relative to vacuum by wavelength, temperature and density.
///
/// IAPWS R9-97, eq. 1, for 0.2 to 1.1 µm, -12 to 500 °C and up to 1060 kg/m³; good to about 1.5e-5 in the visible.
pub fn index_by_density(wavelength_um: f64, temperature_k: f64, density_kg_m3: f64) -> f64 {
    const ULTRAVIOLET: f64 = 0.229_202_0;
    const INFRARED: f64 = 5.432_937;
    let density = density_kg_m3 / 1000.0;
    let temperature = temperature_k / 273.15;
    let wavelength2 = (wavelength_um / 0.589).powi(2);
    let refraction = density
        * (0.244_257_733 + 9.746_344_76e-3 * density - 3.732_349_96e-3 * temperature
            + 2.686_784_72e-4 * wavelength2 * temperature
            + 1.589_205_70e-3 / wavelength2
            + 2.459_342_59e-3 / (wavelength2 - ULTRAVIOLET * ULTRAVIOLET)
            + 0.900_704_920 / (wavelength2 - INFRARED * INFRARED)
            - 1.666_262_19e-2 * density * density);
    ((1.0 + 2.0 * refraction) / (1.0 - refraction)).sqrt()
}

/// Density of air-free water at 1 atm, 0 to 40 °C, in kg/m³.
///
/// Tanaka et al. (2001), Metrologia 38, 301, eq. 1 (coefficients from memory); within 0.006 kg/m³ of IAPWS-95.
pub fn density_kg_m3(temperature_c: f64) -> f64 {
    let t = temperature_c;
    999.974_950 * (1.0 - (t - 3.983_035).powi(2) * (t + 301.797) / (522_528.9 * (t + 69.348_81)))
}

/// Refractive index of sea water at 1 atm relative to air.
///
/// Quan and Fry (1995), Applied Optics 34, 3477, eq. 3, for 0.4 to 0.7 µm, 0 to 30 °C and 0 to 35 g/kg, with the
/// standard error of 1.5e-5 its authors give.
pub fn sea_index(wavelength_um: f64, temperature_c: f64, salinity_g_kg: f64) -> f64 {
    let (t, s) = (temperature_c, salinity_g_kg);
    let wavelength_nm = wavelength_um * 1000.0;
    1.314_05 + (1.779e-4 - 1.05e-6 * t + 1.6e-8 * t * t) * s - 2.02e-6 * t * t
        + (15.868 + 0.011_55 * s - 0.004_23 * t) / wavelength_nm
        - 4382.0 / wavelength_nm.powi(2)
        + 1.1455e6 / wavelength_nm.powi(3)
}
