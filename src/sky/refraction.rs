//! How the air lifts the Sun.

/// Pressure and temperature of the air at the observer.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Air {
    /// Pressure, hPa.
    pub pressure_hpa: f64,
    /// Temperature, degrees Celsius.
    pub temperature_c: f64,
}

impl Air {
    /// The air for which the formula is written: 1010 hPa, 10 degrees Celsius.
    pub const STANDARD: Self = Self { pressure_hpa: 1010.0, temperature_c: 10.0 };

    /// Air of 10 degrees Celsius at a height above sea, by the standard atmosphere's pressure (ISO 2533:1975, eq. 12).
    /// Range -500 to 11,000 m; above, the pressure at 11,000 m is taken.
    pub fn at_height(height_m: f64) -> Self {
        let pressure_hpa = 1013.25 * (1.0 - 0.0065 * height_m.min(11_000.0) / 288.15).powf(5.255_88);
        Self { pressure_hpa, ..Self::STANDARD }
    }
}

/// Airless elevation down to which the formula is used; below, its value there is kept.
const FORMULA_FROM_DEG: f64 = -1.0;

/// Airless elevation below which refraction means nothing for what is seen, even from 20 km up with a dip of 4.2 degrees:
/// it tapers off from here over one degree.
const TAPER_FROM_DEG: f64 = -6.0;

/// Refraction in degrees at an airless elevation in degrees: Saemundsson (1986), Sky and Telescope 72, 70, as in Meeus
/// (1998) eq. 16.4, scaled by pressure and temperature. Good to about 0.1 arcmin above 5 degrees in the air given; at the
/// horizon the real air varies by several arcmin. Below -1 degree, where the Sun is seen from raised ground only, it stays
/// as it is there; from -6 degrees, where nobody sees the Sun, it falls to zero at -7 degrees, so that the apparent
/// elevation stays a rising function.
pub fn refraction_deg(airless_elevation_deg: f64, air: Air) -> f64 {
    let h = airless_elevation_deg.max(FORMULA_FROM_DEG);
    let arcmin = 1.02 / (h + 10.3 / (h + 5.11)).to_radians().tan();
    let taper = (airless_elevation_deg - (TAPER_FROM_DEG - 1.0)).clamp(0.0, 1.0);
    let scale = air.pressure_hpa / 1010.0 * 283.0 / (273.0 + air.temperature_c);
    (arcmin * scale * taper / 60.0).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn apparent_elevation_rises_with_the_airless_one() {
        let apparent = |tenth: i32| {
            let h = f64::from(tenth) / 100.0;
            h + refraction_deg(h, Air::STANDARD)
        };
        for tenth in -9000..9000 {
            assert!(apparent(tenth + 1) > apparent(tenth), "falls at {tenth}");
        }
    }

    #[test]
    fn the_sun_at_a_deep_horizon_is_lifted_no_less_than_at_a_level_one() {
        // 4.3 degrees: more than the dip from 20 km up; 50 arcmin: the convention for a level horizon.
        for hundredth in 83..(83 + 430) {
            let h = -f64::from(hundredth) / 100.0;
            assert!(refraction_deg(h, Air::STANDARD) * 60.0 > 34.0, "too little at {h}");
        }
    }

    #[test]
    fn thin_air_bends_less() {
        let high = Air::at_height(3000.0);
        // ISO 2533:1975: 701.08 hPa at 3,000 m.
        assert!((high.pressure_hpa - 701.08).abs() < 0.1);
        assert!(refraction_deg(1.0, high) < refraction_deg(1.0, Air::STANDARD));
    }
}
