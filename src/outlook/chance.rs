//! The chance of a bow at an instant: a walk out along the visible arc through every copy of the weather.

use crate::optics::drops::rain_extinction_per_km;
use crate::optics::scene::{SEEN_FROM, View, prominence};
use crate::sky::horizon::{EARTH_RADIUS_M, REFRACTION_COEFFICIENT};
use crate::sky::observer::Observer;
use crate::weather::field::{Field, Series};
use crate::weather::quantity::Quantity;

use super::answer::Limit;
use super::copies::{COUNT, Copy, Spread, copies};
use super::scene::{Look, Scene, Wind};
use super::sight::{DIRECTIONS, FARTHEST_KM, PIECES, Piece, Ray, Sight};

/// Rain below this rate is taken as none, mm/h: a trace (common practice: gauges resolve 0.1 mm).
pub const TRACE_MM_H: f32 = 0.01;
/// Cloud base where the feed gives none, km above the ground.
pub const CLOUD_BASE_KM: f64 = 1.0;
/// Height of middle cloud, km (WMO International Cloud Atlas: 2 to 7 km in temperate latitudes).
pub const MIDDLE_CLOUD_KM: f64 = 4.0;
/// Height of high cloud, km (WMO International Cloud Atlas: 5 to 13 km in temperate latitudes).
pub const HIGH_CLOUD_KM: f64 = 8.0;
/// Cover where the feed says nothing of clouds, 0..1.
pub const UNKNOWN_COVER: f64 = 0.5;
/// Fall of temperature with height in the standard atmosphere, K/km (ISO 2533:1975).
const LAPSE_K_PER_KM: f64 = 6.5;
/// Near-ground temperature below which precipitation is taken as snow, degrees Celsius (common practice: about 1).
const SNOW_BELOW_C: f64 = 1.0;

/// What the weather makes of a sight.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Verdict {
    /// Probability that some part of the bow reaches [`SEEN_FROM`], 0..1.
    pub chance: f64,
    /// Contrast of the bow where it is seen.
    pub prominence: f64,
    /// What takes away most of the chance.
    pub limit: Option<Limit>,
}

/// A field prepared for one observer.
pub struct Weather<'a> {
    scene: Scene<'a>,
    rain: &'a Series,
    rain_chance: Option<&'a Series>,
    clouds: Clouds<'a>,
    copies: [Copy; COUNT],
    issued_s: i64,
    ground_km: f64,
    eye_height_km: f64,
}

/// What the feed says of clouds: layers with their height in km, none where it is that of the cloud base.
type Clouds<'a> = [Option<(&'a Series, Option<f64>)>; 3];

/// Conditions at the observer that hold for every copy.
struct Overhead {
    visual_range_km: f64,
    cloud_base_km: f64,
    rain_top_km: f64,
    snow: bool,
}

/// The outcome in one copy.
#[derive(Default)]
struct Outcome {
    known: bool,
    rain: bool,
    chance: f64,
    contrast: f64,
}

impl<'a> Weather<'a> {
    /// Prepares a field; none when it has no rain or does not reach the observer. `issued_s` is the time from which its
    /// error grows, Unix seconds.
    pub fn new(field: &'a Field, observer: &Observer, issued_s: i64) -> Option<Self> {
        let scene = Scene::new(field, observer)?;
        let layer = |quantity, height_km| scene.series(quantity).map(|series| (series, height_km));
        let mut clouds: Clouds<'a> = [
            layer(Quantity::CloudLow, None),
            layer(Quantity::CloudMiddle, Some(MIDDLE_CLOUD_KM)),
            layer(Quantity::CloudHigh, Some(HIGH_CLOUD_KM)),
        ];
        if clouds.iter().all(Option::is_none) {
            clouds[0] = layer(Quantity::CloudTotal, None);
        }
        Some(Self {
            scene,
            rain: scene.series(Quantity::Rain)?,
            rain_chance: scene.series(Quantity::RainChance),
            clouds,
            copies: copies(),
            issued_s,
            ground_km: observer.ground_m / 1000.0,
            eye_height_km: observer.eye_height_m / 1000.0,
        })
    }

    /// The verdict on a sight; none where the field does not say.
    pub fn judge(&self, sight: &Sight, time_s: i64) -> Option<Verdict> {
        let overhead = self.overhead(time_s);
        if overhead.snow {
            let rain = f64::from(self.scene.overhead(Quantity::Rain, time_s)? as f32);
            let limit = if rain > f64::from(TRACE_MM_H) { Limit::Snow } else { Limit::NoRain };
            return Some(Verdict { chance: 0.0, prominence: 0.0, limit: Some(limit) });
        }
        let rays: [Option<(Ray, [Piece; PIECES])>; DIRECTIONS] = sight.rays().map(|ray| {
            let ray = ray?;
            Some((ray, ray.pieces(overhead.visual_range_km, overhead.rain_top_km, self.eye_height_km)?))
        });
        let wind = if self.scene.is_point() { self.scene.wind(time_s) } else { None };
        let lead_h = (time_s - self.issued_s) as f64 / 3600.0;
        let spread = Spread::at_lead(lead_h, !self.scene.is_point() || wind.is_some());
        let shade = Shade::new(sight, overhead.cloud_base_km);
        let mut sum = Sum::default();
        for copy in &self.copies {
            let shift_km = (spread.place_km * copy.east, spread.place_km * copy.north);
            let sky = self.sky(time_s - (spread.time_s * copy.delay) as i64, wind);
            sum.add(&walk(&rays, &sky, shift_km, copy.rank, &shade));
        }
        sum.verdict()
    }

    fn overhead(&self, time_s: i64) -> Overhead {
        let km = |quantity| self.scene.overhead(quantity, time_s).map(|m| m / 1000.0);
        let temperature_c = self.scene.overhead(Quantity::Temperature, time_s);
        let freezing_km = km(Quantity::FreezingLevel)
            .map(|above_sea| above_sea - self.ground_km)
            .or_else(|| temperature_c.map(|temperature| temperature / LAPSE_K_PER_KM));
        let cloud_base_km = km(Quantity::CloudBase).unwrap_or(CLOUD_BASE_KM).max(0.05);
        Overhead {
            visual_range_km: km(Quantity::Visibility).unwrap_or(FARTHEST_KM),
            cloud_base_km,
            rain_top_km: freezing_km.map_or(cloud_base_km, |freezing| cloud_base_km.min(freezing.max(0.0))),
            snow: temperature_c
                .map_or(freezing_km.is_some_and(|km| km <= 0.0), |temperature| temperature < SNOW_BELOW_C),
        }
    }

    /// Everything a walk looks at, at an instant.
    fn sky(&self, time_s: i64, wind: Option<Wind>) -> Sky<'_> {
        let look = |series| self.scene.look(series, time_s, wind);
        Sky {
            rain: look(self.rain),
            rain_chance: self.rain_chance.map(look),
            clouds: self.clouds.map(|layer| layer.map(|(series, height_km)| (look(series), height_km))),
        }
    }
}

/// Rain and clouds of one copy at an instant.
struct Sky<'a> {
    rain: Look<'a>,
    rain_chance: Option<Look<'a>>,
    clouds: [Option<(Look<'a>, Option<f64>)>; 3],
}

/// Walks out along the rays through one copy.
fn walk(
    rays: &[Option<(Ray, [Piece; PIECES])>; DIRECTIONS],
    sky: &Sky<'_>,
    shift_km: (f64, f64),
    rank: f32,
    shade: &Shade,
) -> Outcome {
    let mut outcome = Outcome::default();
    let mut dark = [1.0_f64; DIRECTIONS];
    for (ray, pieces) in rays.iter().flatten() {
        let (mut passed, mut seen, mut lit, mut fallen) = (1.0_f64, 0.0, 0.0, 0.0);
        for piece in pieces {
            let east_km = piece.range_km * ray.east - shift_km.0;
            let north_km = piece.range_km * ray.north - shift_km.1;
            let rain = sky.rain.value(east_km, north_km);
            outcome.known |= !rain.is_nan();
            if rain.is_nan() || rain < TRACE_MM_H || sky.is_dry(east_km, north_km, rank) {
                continue;
            }
            outcome.rain = true;
            let passes = (-2.0 * rain_extinction_per_km(f64::from(rain)) * piece.length_km).exp();
            let share = 0.5 * passed * (1.0 - passes);
            passed *= passes;
            seen += share;
            fallen += share * f64::from(rain);
            lit += share * sky.lit(east_km, north_km, piece.range_km * ray.up, shade);
        }
        if seen <= 0.0 {
            continue;
        }
        // As it would be with the Sun on all of it: a gap in the clouds is wider than the rain along one ray.
        let view = View { lit: seen, optical_depth: -0.5 * passed.ln() };
        let contrast = prominence(fallen / seen, view, shade.sun_elevation_deg);
        if contrast >= SEEN_FROM {
            outcome.contrast = outcome.contrast.max(contrast);
            if lit.is_nan() {
                return Outcome::default();
            }
            dark[ray.sector] = dark[ray.sector].min(1.0 - lit / seen);
        }
    }
    outcome.chance = 1.0 - dark.iter().product::<f64>();
    outcome
}

impl Sky<'_> {
    fn is_dry(&self, east_km: f64, north_km: f64, rank: f32) -> bool {
        self.rain_chance.is_some_and(|look| look.value(east_km, north_km) <= rank)
    }

    /// Probability that sunlight reaches a point: each cloud layer is crossed toward the Sun, its cover there is the
    /// probability of shade. Where the field does not reach that far, the cover over the point itself is taken; NaN where it
    /// has clouds but not now.
    fn lit(&self, east_km: f64, north_km: f64, height_km: f64, shade: &Shade) -> f64 {
        if self.clouds.iter().all(Option::is_none) {
            return 1.0 - UNKNOWN_COVER;
        }
        let mut lit = 1.0;
        for (look, layer_km) in self.clouds.iter().flatten() {
            let layer_km = layer_km.unwrap_or(shade.cloud_base_km);
            let Some(away_km) = shade.crossing_km(layer_km - height_km) else { continue };
            let there = look.value(east_km + away_km * shade.sun_east, north_km + away_km * shade.sun_north);
            let cover = if there.is_nan() { look.value(east_km, north_km) } else { there };
            lit *= 1.0 - f64::from(cover);
        }
        lit
    }
}

/// The way from a point to the Sun.
struct Shade {
    sun_east: f64,
    sun_north: f64,
    tan_sun: f64,
    sun_elevation_deg: f64,
    cloud_base_km: f64,
}

impl Shade {
    fn new(sight: &Sight, cloud_base_km: f64) -> Self {
        let sun = sight.sun.apparent;
        let level = sun.east.hypot(sun.north).max(1e-9);
        Self {
            sun_east: sun.east / level,
            sun_north: sun.north / level,
            tan_sun: sun.up / level,
            sun_elevation_deg: sun.elevation_deg(),
            cloud_base_km,
        }
    }

    /// Distance at which the ray to the Sun has climbed by a height, over a round Earth with the ray bent as in surveying:
    /// the root of d tan h + d^2/(2R') = climb. None for a layer below the point.
    fn crossing_km(&self, climb_km: f64) -> Option<f64> {
        const RADIUS_KM: f64 = EARTH_RADIUS_M / 1000.0 / (1.0 - REFRACTION_COEFFICIENT);
        (climb_km > 0.0)
            .then(|| RADIUS_KM * ((self.tan_sun * self.tan_sun + 2.0 * climb_km / RADIUS_KM).sqrt() - self.tan_sun))
    }
}

/// Sums over copies.
#[derive(Default)]
struct Sum {
    known: f64,
    chance: f64,
    weighted_contrast: f64,
    dry: f64,
    faint: f64,
    blocked: f64,
}

impl Sum {
    fn add(&mut self, outcome: &Outcome) {
        if !outcome.known {
            return;
        }
        self.known += 1.0;
        self.chance += outcome.chance;
        self.weighted_contrast += outcome.chance * outcome.contrast;
        if !outcome.rain {
            self.dry += 1.0;
        } else if outcome.contrast <= 0.0 {
            self.faint += 1.0;
        } else {
            self.blocked += 1.0 - outcome.chance;
        }
    }

    fn verdict(&self) -> Option<Verdict> {
        if self.known <= 0.0 {
            return None;
        }
        let chance = self.chance / self.known;
        let losses = [(self.dry, Limit::NoRain), (self.faint, Limit::TooFaint), (self.blocked, Limit::SunBlocked)];
        let worst = losses.into_iter().max_by(|a, b| a.0.total_cmp(&b.0));
        Some(Verdict {
            chance,
            prominence: if self.chance > 0.0 { self.weighted_contrast / self.chance } else { 0.0 },
            limit: worst.filter(|loss| loss.0 / self.known > 0.005).map(|loss| loss.1),
        })
    }
}
