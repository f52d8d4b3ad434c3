//! Sizes of drops, and what they take from a beam of light.
//!
//! Drops are taken as spheres. Those above about 1 mm in diameter fall flattened, which weakens the top of a bow in heavy
//! rain more than its feet; that is not modelled.

use std::f64::consts::PI;

/// Contrast at which a dark object fades from sight, by the convention of visual range (Koschmieder 1924).
pub const VISUAL_RANGE_CONTRAST: f64 = 0.02;

/// Extinction of a beam, 1/km, from the range at which contrast falls to `contrast` (Koschmieder 1924).
///
/// 0.02 for the visual range, 0.05 for the meteorological optical range (WMO-No. 8). Zero range means no bound.
pub fn extinction_from_range_per_km(range_km: f64, contrast: f64) -> f64 {
    -contrast.ln() / range_km
}

/// Range at which contrast falls to `contrast`, km: the inverse of [`extinction_from_range_per_km`].
pub fn range_from_extinction_km(extinction_per_km: f64, contrast: f64) -> f64 {
    -contrast.ln() / extinction_per_km
}

/// Rain with the drops of Marshall and Palmer (1948), J. Meteor. 5, 165: N(D) = N₀ exp(-Λ D).
///
/// N₀ = 8000 /m³/mm and Λ = 4.1 R^-0.21 /mm with the rain rate R in mm/h. Its moments over all diameters are closed forms.
/// Rain rates found from optical extinction miss by 25 % on average (Ulbrich and Atlas 1985): so do extinctions from rain rates.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MarshallPalmer {
    /// Λ, per mm; infinite without rain.
    pub slope_per_mm: f64,
}

/// N₀ of Marshall and Palmer (1948), per m³ and mm.
const INTERCEPT_M3_MM: f64 = 8000.0;

impl MarshallPalmer {
    /// Drops of a rain rate above or equal to zero, in mm/h.
    pub fn new(rain_mm_h: f64) -> Self {
        Self { slope_per_mm: 4.1 * rain_mm_h.powf(-0.21) }
    }

    /// Drops per m³ and mm of diameter.
    pub fn density_m3_mm(self, diameter_mm: f64) -> f64 {
        INTERCEPT_M3_MM * (-self.slope_per_mm * diameter_mm).exp()
    }

    /// Integral of `D^power N(D)` over all diameters, mm^power/m³.
    fn moment(self, power: i32) -> f64 {
        let factorial: f64 = (1..=power).map(f64::from).product();
        INTERCEPT_M3_MM * factorial / self.slope_per_mm.powi(power + 1)
    }

    /// Extinction of a beam, 1/km, by twice the drops' cross-section (drops large against the wavelength).
    ///
    /// 8 % above the empirical law of Atlas (1953), see [`visual_range_atlas_km`], at every rain rate.
    pub fn extinction_per_km(self) -> f64 {
        PI / 2.0 * self.moment(2) * 1e-3
    }

    /// Drops per m³.
    pub fn drops_per_m3(self) -> f64 {
        self.moment(0)
    }

    /// Liquid water in the air, g/m³.
    pub fn water_g_m3(self) -> f64 {
        PI / 6.0 * self.moment(3) * 1e-3
    }

    /// Radar reflectivity, mm⁶/m³.
    pub fn reflectivity_mm6_m3(self) -> f64 {
        self.moment(6)
    }

    /// Mean diameter, mm.
    pub fn mean_diameter_mm(self) -> f64 {
        self.moment(1) / self.moment(0)
    }

    /// Mean diameter weighted by cross-section, mm: what the light meets.
    pub fn area_weighted_diameter_mm(self) -> f64 {
        self.moment(3) / self.moment(2)
    }

    /// Mean diameter weighted by volume, mm.
    pub fn volume_weighted_diameter_mm(self) -> f64 {
        self.moment(4) / self.moment(3)
    }

    /// Diameter that halves the water, mm: Λ D = 3.67206, the median of a gamma distribution of shape 4.
    pub fn median_volume_diameter_mm(self) -> f64 {
        3.672_060_748_850_897 / self.slope_per_mm
    }

    /// Range at which contrast falls to `contrast` in this rain alone, km.
    pub fn visual_range_km(self, contrast: f64) -> f64 {
        range_from_extinction_km(self.extinction_per_km(), contrast)
    }
}

/// Extinction of a beam by rain, 1/km, with the drops of [`MarshallPalmer`]; 0 without rain.
pub fn rain_extinction_per_km(rain_mm_h: f64) -> f64 {
    if rain_mm_h > 0.0 { MarshallPalmer::new(rain_mm_h).extinction_per_km() } else { 0.0 }
}

/// Visual range in rain as measured, km: 11.6 R^-0.63 (Atlas 1953, J. Meteor. 10, 486; from memory). A check of the drop sizes.
pub fn visual_range_atlas_km(rain_mm_h: f64) -> f64 {
    11.6 * rain_mm_h.powf(-0.63)
}

/// Fall speed of a raindrop in still air near the ground, m/s: 9.65 - 10.3 exp(-0.6 D), not below 0.
///
/// Atlas, Srivastava and Sekhon (1973), Rev. Geophys. 11, 1, for diameters of 0.6 to 5.8 mm.
pub fn fall_speed_m_s(diameter_mm: f64) -> f64 {
    (9.65 - 10.3 * (-0.6 * diameter_mm).exp()).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_rain_takes_nothing() {
        assert!(rain_extinction_per_km(0.0) == 0.0);
        assert!(MarshallPalmer::new(0.0).extinction_per_km() == 0.0);
    }
}
