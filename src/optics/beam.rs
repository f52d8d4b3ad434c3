//! Sunlight on its way through the air to the drops.

use super::colour;

/// Ångström's exponent of the aerosol: how fast its optical depth falls with wavelength (Ångström 1929, mean of many places).
pub const ANGSTROM_EXPONENT: f64 = 1.3;
/// Wavelength at which the aerosol optical depth is given, µm.
pub const AEROSOL_WAVELENGTH_UM: f64 = 0.55;
/// Ozone overhead, atm-cm (300 Dobson units, a common mean).
pub const OZONE_ATM_CM: f64 = 0.3;
/// Pressure at sea level, hPa.
pub const PRESSURE_HPA: f64 = 1013.25;

/// Relative optical air mass by the apparent elevation of the Sun.
///
/// Kasten and Young (1989), Applied Optics 28, 4735; within 0.5 % down to the horizon, continued here to -0.5°.
pub fn air_mass(elevation_deg: f64) -> f64 {
    1.0 / (elevation_deg.to_radians().sin() + 0.505_72 * (elevation_deg + 6.079_95).powf(-1.6364))
}

/// Relative path through the ozone layer, 22 km up (Robinson 1966 as in Bird and Riordan 1986, eq. 2-10).
pub fn ozone_mass(elevation_deg: f64) -> f64 {
    let height = 22.0 / 6370.0;
    (1.0 + height) / (elevation_deg.to_radians().sin().powi(2) + 2.0 * height).sqrt()
}

/// Vertical optical depth of clear air by Rayleigh scattering.
///
/// Bodhaine et al. (1999), J. Atmos. Oceanic Technol. 16, 1854, eq. 30, for sea level at 45° and 360 ppm carbon dioxide, in
/// proportion to pressure; 0.25 to 0.85 µm.
pub fn rayleigh_optical_depth(wavelength_um: f64, pressure_hpa: f64) -> f64 {
    let square = wavelength_um * wavelength_um;
    0.002_152_0 * (1.045_599_6 - 341.290_61 / square - 0.902_308_50 * square)
        / (1.0 + 0.002_705_988_9 / square - 85.968_563 * square)
        * pressure_hpa
        / PRESSURE_HPA
}

/// The same by Hansen and Travis (1974), Space Sci. Rev. 16, 527, eq. 2.30: a check, 0.3 % away.
pub fn rayleigh_optical_depth_hansen_travis(wavelength_um: f64, pressure_hpa: f64) -> f64 {
    let inverse = wavelength_um.powi(-2);
    0.008_569 * inverse * inverse * (1.0 + 0.011_3 * inverse + 0.000_13 * inverse * inverse) * pressure_hpa
        / PRESSURE_HPA
}

/// Absorption by ozone, per atm-cm (Bird and Riordan 1986, table 1): wavelength in nm, coefficient.
const OZONE: [(f64, f64); 32] = [
    (430.0, 0.0),
    (440.0, 0.0),
    (450.0, 0.003),
    (460.0, 0.006),
    (470.0, 0.009),
    (480.0, 0.014),
    (490.0, 0.021),
    (500.0, 0.03),
    (510.0, 0.04),
    (520.0, 0.048),
    (530.0, 0.063),
    (540.0, 0.075),
    (550.0, 0.085),
    (570.0, 0.12),
    (593.0, 0.119),
    (610.0, 0.12),
    (630.0, 0.09),
    (656.0, 0.065),
    (667.6, 0.051),
    (690.0, 0.028),
    (710.0, 0.018),
    (718.0, 0.015),
    (724.4, 0.012),
    (740.0, 0.01),
    (752.5, 0.008),
    (757.5, 0.007),
    (762.5, 0.006),
    (767.5, 0.005),
    (780.0, 0.0),
    (800.0, 0.0),
    (816.0, 0.0),
    (823.7, 0.0),
];

/// Absorption by ozone, per atm-cm, straight between the rows of the table.
pub fn ozone_absorption_per_atm_cm(wavelength_um: f64) -> f64 {
    let wavelength_nm = wavelength_um * 1000.0;
    let above = OZONE.partition_point(|row| row.0 <= wavelength_nm).clamp(1, OZONE.len() - 1);
    let ((from, low), (to, high)) = (OZONE[above - 1], OZONE[above]);
    low + (high - low) * ((wavelength_nm - from) / (to - from)).clamp(0.0, 1.0)
}

/// The direct beam of the Sun at one elevation, in one state of the air.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Beam {
    /// Relative optical air mass.
    pub air_mass: f64,
    /// Path through ozone, atm-cm.
    pub ozone_atm_cm: f64,
    /// Ångström's turbidity: vertical optical depth of the aerosol at 1 µm.
    pub turbidity: f64,
}

impl Beam {
    /// The beam of the Sun at an apparent elevation, through aerosol of the given vertical optical depth at 0.55 µm, mean ozone and
    /// the pressure of sea level.
    pub fn new(elevation_deg: f64, aerosol_optical_depth: f64) -> Self {
        Self {
            air_mass: air_mass(elevation_deg),
            ozone_atm_cm: OZONE_ATM_CM * ozone_mass(elevation_deg),
            turbidity: aerosol_optical_depth * AEROSOL_WAVELENGTH_UM.powf(ANGSTROM_EXPONENT),
        }
    }

    /// Share of the light that comes through.
    pub fn transmittance(&self, wavelength_um: f64) -> f64 {
        let vertical = rayleigh_optical_depth(wavelength_um, PRESSURE_HPA)
            + self.turbidity * wavelength_um.powf(-ANGSTROM_EXPONENT);
        (-self.air_mass * vertical - self.ozone_atm_cm * ozone_absorption_per_atm_cm(wavelength_um)).exp()
    }

    /// Tristimulus values of the beam, Y in lux on a plane facing the Sun.
    pub fn xyz(&self) -> [f64; 3] {
        colour::xyz_of_sunlight(|wavelength_um| self.transmittance(wavelength_um))
    }
}
