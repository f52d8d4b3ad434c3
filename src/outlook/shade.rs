//! Light and shade on the rain of one copy: what the way to the Sun passes through.

use crate::sky::horizon::{EARTH_RADIUS_M, REFRACTION_COEFFICIENT};

use super::scene::Look;
use super::sight::Sight;

/// Cover where the feed says nothing of clouds, 0..1.
pub const UNKNOWN_COVER: f64 = 0.5;

/// Rain and clouds of one copy at an instant.
pub struct Sky<'a> {
    /// Rain rate.
    pub rain: Look<'a>,
    /// Probability that it rains at all, where given.
    pub rain_chance: Option<Look<'a>>,
    /// Layers with their height in km, none for that of the cloud base.
    pub clouds: [Option<(Look<'a>, Option<f64>)>; 3],
    /// All cloud, and the height of the lowest layer that is not given by itself.
    pub rest: Option<(Look<'a>, Option<f64>)>,
}

impl Sky<'_> {
    /// Whether the copy of a rank is dry there by the feed's rain chance.
    pub fn is_dry(&self, east_km: f64, north_km: f64, rank: f32) -> bool {
        self.rain_chance.is_some_and(|look| look.value(east_km, north_km) <= rank)
    }

    /// Probability that sunlight reaches a point: each cloud layer is crossed toward the Sun, its cover there is the
    /// probability of shade. Where the field does not reach that far, the cover over the point itself is taken; NaN where it
    /// has clouds but not now.
    pub fn lit(&self, east_km: f64, north_km: f64, height_km: f64, shade: &Shade) -> f64 {
        if self.clouds.iter().all(Option::is_none) {
            return 1.0 - UNKNOWN_COVER;
        }
        let at = (east_km, north_km, height_km);
        let (mut clear, mut unknown) = (1.0, false);
        for (look, layer_km) in self.clouds.iter().flatten() {
            let Some(cover) = shade.cover(look, *layer_km, at) else { continue };
            unknown |= cover.is_nan();
            clear *= if cover.is_nan() { 1.0 } else { 1.0 - cover };
        }
        if let Some((total, layer_km)) = &self.rest {
            // What is over all given layers is 1 - (1 - total) / product of (1 - given), all at the same place.
            if let Some(total) = shade.cover(total, *layer_km, at) {
                let given = self.clouds.iter().flatten().filter_map(|(look, _)| shade.cover(look, *layer_km, at));
                let through: f64 = given.map(|cover| 1.0 - cover).product();
                let rest = if through > 0.0 { 1.0 - (1.0 - total) / through } else { 0.0 * through };
                unknown |= rest.is_nan();
                clear *= if rest.is_nan() { 1.0 } else { 1.0 - rest.clamp(0.0, 1.0) };
            }
        }
        if unknown && clear > 0.0 { f64::NAN } else { clear }
    }
}

/// The way from a point to the Sun.
pub struct Shade {
    sun_east: f64,
    sun_north: f64,
    tan_sun: f64,
    /// Apparent elevation of the Sun, degrees.
    pub sun_elevation_deg: f64,
    cloud_base_km: f64,
    /// Height of the eye above the ground, km.
    pub eye_height_km: f64,
}

impl Shade {
    /// The way toward the Sun of a sight, below clouds whose base lies so high above the ground.
    pub fn new(sight: &Sight, cloud_base_km: f64, eye_height_km: f64) -> Self {
        let sun = sight.sun.apparent;
        let level = sun.east.hypot(sun.north).max(1e-9);
        Self {
            sun_east: sun.east / level,
            sun_north: sun.north / level,
            tan_sun: sun.up / level,
            sun_elevation_deg: sun.elevation_deg(),
            cloud_base_km,
            eye_height_km,
        }
    }

    /// Cover of a layer where the way from a point (km east, north, up) to the Sun crosses it, or over the point where the
    /// field does not reach that far; none for a layer below the point.
    fn cover(
        &self,
        look: &Look<'_>,
        layer_km: Option<f64>,
        (east_km, north_km, up_km): (f64, f64, f64),
    ) -> Option<f64> {
        let away_km = self.crossing_km(layer_km.unwrap_or(self.cloud_base_km) - up_km)?;
        let there = look.value(east_km + away_km * self.sun_east, north_km + away_km * self.sun_north);
        Some(f64::from(if there.is_nan() { look.value(east_km, north_km) } else { there }))
    }

    /// Distance at which the ray to the Sun has climbed by a height, over a round Earth with the ray bent as in surveying:
    /// the root of d tan h + d^2/(2R') = climb. None for a layer below the point.
    fn crossing_km(&self, climb_km: f64) -> Option<f64> {
        const RADIUS_KM: f64 = EARTH_RADIUS_M / 1000.0 / (1.0 - REFRACTION_COEFFICIENT);
        (climb_km > 0.0)
            .then(|| RADIUS_KM * ((self.tan_sun * self.tan_sun + 2.0 * climb_km / RADIUS_KM).sqrt() - self.tan_sun))
    }
}
