//! What stands beside and behind the bow, and so how well the bow stands out.
//!
//! Prominence is the luminance of the bow at its peak, less that of the sky just outside its red rim, over the latter. Three lights stand
//! there: rain lit by the Sun sends some outside the bow too; light scattered more than once fills the rain evenly; and behind it
//! all is cloud or sky. The last two are estimates, good to a factor of two, and said to be so in the answers:
//!
//! - Scattering more than once: the light of an even scatterer of optical depth (1 - g) τ (similarity, van de Hulst 1980), less what once
//!   scattered light brings on average, with g = 0.87 for drops of water.
//! - Behind stands a grey of reflectance 0.2, as a rain cloud seen from its shaded side (common practice), under the Sun and sky of
//!   the hour; rain before it takes from it as much as rain lit by the sky adds.

use std::sync::LazyLock;

use super::beam::Beam;
use super::colour;
use super::drops::VISUAL_RANGE_CONTRAST;
use super::population::Drops;
use super::profile::FINE;
use super::water::Water;
use super::white::Curves;

/// Contrast from which a bow counts as seen (Koschmieder 1924, as for the visual range).
pub const SEEN_FROM: f64 = VISUAL_RANGE_CONTRAST;
/// Share of the light that what stands behind the rain throws back.
pub const BEHIND_REFLECTANCE: f64 = 0.2;
/// Illuminance by sunlight above the air, lx (ASTM G173-03).
const SUNLIGHT_ABOVE_LX: f64 = 133_100.0;
/// Mean cosine of the scattering angle of large drops of water.
const ASYMMETRY: f64 = 0.87;

/// Rain along a line of sight.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct View {
    /// ∫ lit · extinction · exp(-2 τ) dr: sunlight scattered once that reaches the eye, 0 to 0.5. Light is weakened by the same rain on
    /// its way in as on its way out.
    pub lit: f64,
    /// Optical depth of all rain along the line of sight, lit or not.
    pub optical_depth: f64,
}

impl View {
    /// Rain lit all through.
    pub fn all_lit(optical_depth: f64) -> Self {
        Self { lit: once(optical_depth), optical_depth }
    }
}

/// ∫ exp(-2 τ) dτ.
fn once(optical_depth: f64) -> f64 {
    -0.5 * (-2.0 * optical_depth).exp_m1()
}

/// The lights of a scene, in cd/m² where the beam is in lux.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scene {
    /// Luminance of rain for a phase function of 1.
    pub per_phase: f64,
    /// Of light scattered more than once.
    pub multiple: f64,
    /// Of what stands behind.
    pub behind: f64,
}

impl Scene {
    /// The lights for a beam of `sunlight` on a plane that faces it, with `behind` by [`behind`].
    pub fn new(view: View, sunlight: f64, behind: f64) -> Self {
        let per_direction = sunlight / (4.0 * std::f64::consts::PI);
        let full = once(view.optical_depth);
        let lit_share = if full > 0.0 { (view.lit / full).min(1.0) } else { 0.0 };
        let even = 1.0 - ASYMMETRY;
        let more_than_once = (once(even * view.optical_depth) - even * full).max(0.0);
        Self { per_phase: per_direction * view.lit, multiple: per_direction * lit_share * more_than_once, behind }
    }

    /// Light that does not belong to rain seen once.
    pub fn veil(&self) -> f64 {
        self.multiple + self.behind
    }

    /// Contrast of a bow of phase function `peak` against `outside`, both seen before the veil.
    pub fn contrast(&self, peak: f64, outside: f64) -> f64 {
        let outside = self.per_phase * outside + self.veil();
        if outside > 0.0 { (self.per_phase * peak + self.veil()) / outside - 1.0 } else { 0.0 }
    }
}

/// Illuminance of a level plane by a sky of sun and cloud, without the Sun itself, lx: 300 + 45,000 sin h.
///
/// Law of the Illuminating Engineering Society for a partly cloudy sky (Gillette, Pierpoint and Treado 1984; from memory).
pub fn sky_illuminance_lx(elevation_deg: f64) -> f64 {
    300.0 + 45_000.0 * elevation_deg.to_radians().sin().max(0.0)
}

/// Luminance of what stands behind, for `sunlight` that was `above` the air, both on a plane that faces it (in lux, or any unit if both
/// are in it), and the Sun at an elevation. The light of the sky has the colour of sunlight above the air.
pub fn behind(sunlight: f64, above: f64, elevation_deg: f64) -> f64 {
    let direct = sunlight * elevation_deg.to_radians().sin().max(0.0);
    let from_sky = above * sky_illuminance_lx(elevation_deg) / SUNLIGHT_ABOVE_LX;
    BEHIND_REFLECTANCE * (direct + from_sky) / std::f64::consts::PI
}

/// Luminance-weighted phase function of the primary in white light, with the beam that makes it.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
struct Primary {
    peak: f64,
    band: f64,
}

/// An evenly spaced scale of a table.
#[derive(Clone, Copy)]
struct Scale {
    first: f64,
    step: f64,
    count: usize,
}

impl Scale {
    fn value(self, node: usize) -> f64 {
        self.first + self.step * node as f64
    }

    /// Node below a value and share of the way to the next; what lies outside counts as the end.
    fn place(self, value: f64) -> (usize, f64) {
        let place = ((value - self.first) / self.step).clamp(0.0, self.count as f64 - 1.000_001);
        (place as usize, place.fract())
    }
}

/// Logarithm of the rain rate: 0.1 to 100 mm/h.
const RAINS: Scale = Scale { first: -std::f64::consts::LN_10, step: std::f64::consts::LN_10 / 2.0, count: 7 };
/// Elevation of the Sun for the colours of the bow, degrees.
const ELEVATIONS: Scale = Scale { first: -0.5, step: 2.0, count: 24 };
/// The same for the brightness of the beam, which changes fast near the horizon.
const BEAMS: Scale = Scale { first: -0.5, step: 0.1, count: 461 };

struct Table {
    primary: [[Primary; ELEVATIONS.count]; RAINS.count],
    /// Illuminance in lux, and luminance of what stands behind.
    beam: [(f64, f64); BEAMS.count],
}

/// Primaries from 0.1 to 100 mm/h and Sun from -0.5 to 45.5°, made on first use in some 100 ms.
static TABLE: LazyLock<Table> = LazyLock::new(|| {
    let beam = |elevation_deg: f64| Beam::new(elevation_deg, AEROSOL_OF_TABLE);
    let primary = std::array::from_fn(|rain| {
        let curves = Curves::new(Drops::Rain { mm_h: RAINS.value(rain).exp() }, Water::Fresh, 10.0);
        std::array::from_fn(|node| {
            curves.as_ref().map_or(Primary::default(), |curves| primary(curves, &beam(ELEVATIONS.value(node))))
        })
    });
    let above = colour::xyz_of_sunlight(|_| 1.0)[1];
    let beam = std::array::from_fn(|node| {
        let elevation_deg = BEAMS.value(node);
        let beam = beam(elevation_deg);
        let sunlight = beam.xyz()[1];
        (sunlight, behind(sunlight, above, elevation_deg))
    });
    Table { primary, beam }
});

/// Aerosol optical depth that the table is made for.
pub const AEROSOL_OF_TABLE: f64 = 0.1;

fn primary(curves: &Curves, beam: &Beam) -> Primary {
    let illuminance = beam.xyz()[1];
    let (mut peak, mut band) = (0.0_f64, f64::INFINITY);
    for (angle_deg, seen) in FINE.angles_deg().zip(curves.seen(beam)) {
        let phase = seen.xyz[1] / illuminance;
        if angle_deg > 136.0 {
            peak = peak.max(phase);
        }
        band = band.min(phase);
    }
    Primary { peak, band }
}

/// Makes the tables behind [`prominence`] now rather than at its first call, which they would delay by some 100 ms.
pub fn prepare() {
    LazyLock::force(&TABLE);
}

/// Prominence of the primary in rain by rain rate (mm/h), rain along the view and apparent elevation of the Sun, in fresh water and clear
/// air of aerosol optical depth 0.1. Rates and elevations out of the table count as the nearest in it; 0 without lit rain.
///
/// Interpolated between tabulated curves: within 1 % of the full computation (`tests/proofs`).
pub fn prominence(rain_mm_h: f64, view: View, sun_elevation_deg: f64) -> f64 {
    if rain_mm_h.is_nan() || view.lit.is_nan() || rain_mm_h <= 0.0 || view.lit <= 0.0 {
        return 0.0;
    }
    let table = &*TABLE;
    let (rain, rain_share) = RAINS.place(rain_mm_h.ln());
    let (node, share) = ELEVATIONS.place(sun_elevation_deg);
    let (beam, beam_share) = BEAMS.place(sun_elevation_deg);
    let mix = |from: f64, to: f64, share: f64| from + share * (to - from);
    let of = |value: fn(&Primary) -> f64| {
        let row = |rain: usize| mix(value(&table.primary[rain][node]), value(&table.primary[rain][node + 1]), share);
        mix(row(rain), row(rain + 1), rain_share)
    };
    let sunlight = mix(table.beam[beam].0, table.beam[beam + 1].0, beam_share);
    let behind = mix(table.beam[beam].1, table.beam[beam + 1].1, beam_share);
    Scene::new(view, sunlight, behind).contrast(of(|at| at.peak), of(|at| at.band))
}
