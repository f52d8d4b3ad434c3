//! The chance of a bow at an instant: a walk out along the visible arc through every copy of the weather.

use crate::optics::drops::rain_extinction_per_km;
use crate::optics::scene::{SEEN_FROM, View, prominence};
use crate::sky::observer::Observer;
use crate::weather::field::{Field, Series};
use crate::weather::quantity::Quantity;

use super::answer::Limit;
use super::copies::{COUNT, Copy, Spread, copies};
use super::scene::{Scene, Wind};
use super::shade::{Shade, Sky};
use super::sight::{DIRECTIONS, FARTHEST_KM, PIECES, Piece, Ray, Sight};

/// Rain below this rate is taken as none, mm/h: a trace (common practice: gauges resolve 0.1 mm).
pub const TRACE_MM_H: f32 = 0.01;
/// Cloud base where the feed gives none, km above the ground.
pub const CLOUD_BASE_KM: f64 = 1.0;
/// Height of middle cloud, km (WMO International Cloud Atlas: 2 to 7 km in temperate latitudes).
pub const MIDDLE_CLOUD_KM: f64 = 4.0;
/// Height of high cloud, km (WMO International Cloud Atlas: 5 to 13 km in temperate latitudes).
pub const HIGH_CLOUD_KM: f64 = 8.0;
/// Share of the way along the arc about which a copy must know the rain, and share of the copies that must know enough, for
/// an answer.
const LEAST_KNOWN: f64 = 0.5;
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
    /// Cover by all cloud, and the height of the lowest layer that is not given by itself.
    rest: Option<(&'a Series, Option<f64>)>,
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
        let heights = [None, Some(MIDDLE_CLOUD_KM), Some(HIGH_CLOUD_KM)];
        let mut rest = None;
        if clouds.iter().all(Option::is_none) {
            clouds[0] = layer(Quantity::CloudTotal, None);
        } else if let Some(lowest) = clouds.iter().position(Option::is_none) {
            rest = layer(Quantity::CloudTotal, heights[lowest]);
        }
        Some(Self {
            scene,
            rain: scene.series(Quantity::Rain)?,
            rain_chance: scene.series(Quantity::RainChance),
            clouds,
            rest,
            copies: copies(),
            issued_s,
            ground_km: observer.ground_m / 1000.0,
            eye_height_km: observer.eye_height_m / 1000.0,
        })
    }

    /// The verdict on a sight; none where the field does not say.
    pub fn judge(&self, sight: &Sight, time_s: i64) -> Option<Verdict> {
        let overhead = self.overhead(time_s);
        let rays: [Option<(Ray, [Piece; PIECES])>; DIRECTIONS] = sight.rays().map(|ray| {
            let ray = ray?;
            Some((ray, ray.pieces(overhead.visual_range_km, overhead.rain_top_km, self.eye_height_km)?))
        });
        if overhead.snow || rays.iter().all(Option::is_none) {
            let falls = self.scene.overhead(Quantity::Rain, time_s)? >= f64::from(TRACE_MM_H);
            let limit = match (falls, overhead.snow) {
                (false, _) => Limit::NoRain,
                (true, true) => Limit::Snow,
                (true, false) => Limit::TooFaint,
            };
            return Some(Verdict { chance: 0.0, prominence: 0.0, limit: Some(limit) });
        }
        let wind = if self.scene.is_point() { self.scene.wind(time_s) } else { None };
        let lead_h = (time_s - self.issued_s) as f64 / 3600.0;
        let spread = Spread::at_lead(lead_h, !self.scene.is_point() || wind.is_some());
        let shade = Shade::new(sight, overhead.cloud_base_km, self.eye_height_km);
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
        let below_base_km = if self.scene.cloud_base_above_sea() { self.ground_km } else { 0.0 };
        let cloud_base_km = km(Quantity::CloudBase).map_or(CLOUD_BASE_KM, |base| base - below_base_km).max(0.05);
        Overhead {
            visual_range_km: km(Quantity::Visibility).unwrap_or(FARTHEST_KM),
            cloud_base_km,
            rain_top_km: freezing_km.map_or(cloud_base_km, |freezing| cloud_base_km.min(freezing.max(0.0))),
            snow: freezing_km.is_some_and(|km| km <= 0.0) || temperature_c.is_some_and(|cel| cel < SNOW_BELOW_C),
        }
    }

    /// Everything a walk looks at, at an instant.
    fn sky(&self, time_s: i64, wind: Option<Wind>) -> Sky<'_> {
        let look = |series| self.scene.look(series, time_s, wind);
        Sky {
            rain: look(self.rain),
            rain_chance: self.rain_chance.map(look),
            clouds: self.clouds.map(|layer| layer.map(|(series, height_km)| (look(series), height_km))),
            rest: self.rest.map(|(series, height_km)| (look(series), height_km)),
        }
    }
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
    let (mut way_km, mut known_km, mut shade_unknown) = (0.0, 0.0, false);
    for (ray, pieces) in rays.iter().flatten() {
        let (mut passed, mut seen, mut lit, mut fallen) = (1.0_f64, 0.0, 0.0, 0.0);
        for piece in pieces {
            let east_km = piece.range_km * ray.east - shift_km.0;
            let north_km = piece.range_km * ray.north - shift_km.1;
            let rain = sky.rain.value(east_km, north_km);
            way_km += piece.length_km;
            known_km += if rain.is_nan() { 0.0 } else { piece.length_km };
            if rain.is_nan() || rain < TRACE_MM_H || sky.is_dry(east_km, north_km, rank) {
                continue;
            }
            outcome.rain = true;
            let passes = (-2.0 * rain_extinction_per_km(f64::from(rain)) * piece.length_km).exp();
            let share = 0.5 * passed * (1.0 - passes);
            passed *= passes;
            seen += share;
            fallen += share * f64::from(rain);
            lit += share * sky.lit(east_km, north_km, shade.eye_height_km + piece.range_km * ray.up, shade);
        }
        if seen <= 0.0 {
            continue;
        }
        // As it would be with the Sun on all of it: a gap in the clouds is wider than the rain along one ray.
        let view = View { lit: seen, optical_depth: -0.5 * passed.ln() };
        let contrast = prominence(fallen / seen, view, shade.sun_elevation_deg);
        if contrast >= SEEN_FROM {
            if lit.is_nan() {
                shade_unknown = true;
                continue;
            }
            outcome.contrast = outcome.contrast.max(contrast);
            dark[ray.sector] = dark[ray.sector].min(1.0 - lit / seen);
        }
    }
    outcome.chance = 1.0 - dark.iter().product::<f64>();
    outcome.known = known_km >= LEAST_KNOWN * way_km && !(shade_unknown && outcome.contrast == 0.0);
    outcome
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
        if self.known < LEAST_KNOWN * COUNT as f64 {
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
