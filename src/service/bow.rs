//! `GET /v1/bow`: where the bow stands, by geometry alone.

use axum::Json;
use axum::extract::State;
use axum::http::{HeaderName, header};
use chrono::{DateTime, Utc};
use serde::Serialize;
use utoipa::ToSchema;

use super::App;
use super::problem::{Problem, ProblemBody};
use super::query::Query;
use crate::optics::ray::radius_deg;
use crate::optics::water::Water;
use crate::outlook::answer::{Bearing, Limit};
use crate::outlook::sight;
use crate::sky::circle::Circle;
use crate::sky::observer::Observer;
use crate::sky::sun::Sun;

/// Wavelengths of the edges and the middle of a bow, um.
const RED_UM: f64 = 0.700;
const GREEN_UM: f64 = 0.550;
const VIOLET_UM: f64 = 0.400;

/// Sun and bows for an observer at an instant.
#[derive(Debug, Serialize, ToSchema)]
pub struct BowAnswer {
    /// When.
    pub time: DateTime<Utc>,
    /// Who looks.
    pub observer: ObserverEcho,
    /// The Sun.
    pub sun: SunAnswer,
    /// The direction opposite the apparent Sun.
    pub antisolar_point: Bearing,
    /// Primary and secondary.
    pub bows: Vec<Bow>,
}

/// The observer as understood.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct ObserverEcho {
    /// Latitude, degrees.
    pub lat: f64,
    /// Longitude, degrees, positive east.
    pub lon: f64,
    /// Eye above the ground or water around, m.
    pub eye_height_m: f64,
    /// The horizon in use.
    pub horizon: HorizonEcho,
}

/// The horizon in use.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct HorizonEcho {
    /// Depression of the sea horizon, degrees.
    pub dip_deg: f64,
    /// Azimuth and elevation of the terrain, degrees, by rising azimuth; empty where the horizon is level.
    pub skyline: Vec<(f64, f64)>,
}

impl ObserverEcho {
    /// Of an observer.
    pub fn of(observer: &Observer) -> Self {
        Self {
            lat: observer.place.lat_deg(),
            lon: observer.place.lon_deg(),
            eye_height_m: observer.eye_height_m,
            horizon: HorizonEcho { dip_deg: observer.dip_deg, skyline: observer.horizon.points().to_vec() },
        }
    }
}

/// Where the Sun stands.
#[derive(Debug, Serialize, ToSchema)]
pub struct SunAnswer {
    /// Azimuth clockwise from true north, degrees.
    pub azimuth_deg: f64,
    /// Apparent elevation of the centre, refraction included, degrees.
    pub elevation_deg: f64,
    /// Elevation of the centre without air, degrees.
    pub airless_elevation_deg: f64,
    /// Whether the upper limb is over the horizon in use.
    pub above_horizon: bool,
}

/// Radii from the antisolar point by wavelength, degrees.
#[derive(Debug, Clone, Copy, Serialize, ToSchema)]
pub struct Radii {
    /// At 700 nm.
    pub red: f64,
    /// At 550 nm.
    pub green: f64,
    /// At 400 nm.
    pub violet: f64,
}

impl Radii {
    /// Rays of stationary deviation of an order in water of a temperature.
    pub fn of(order: u32, water: Water, temperature_c: f64) -> Option<Self> {
        let radius = |wavelength_um| radius_deg(water.index_in_air(wavelength_um, temperature_c), order);
        Some(Self { red: radius(RED_UM)?, green: radius(GREEN_UM)?, violet: radius(VIOLET_UM)? })
    }
}

/// Where a bow meets the horizon in use.
#[derive(Debug, Serialize, ToSchema)]
pub struct Feet {
    /// Left foot, seen facing the antisolar point: azimuth, degrees.
    pub left_azimuth_deg: f64,
    /// Right foot, likewise.
    pub right_azimuth_deg: f64,
}

/// One bow. Crown, feet and fraction are those of the red edge.
#[derive(Debug, Serialize, ToSchema)]
pub struct Bow {
    /// Number of reflections in the drop.
    pub order: u32,
    /// `primary` or `secondary`.
    pub name: &'static str,
    /// Ray radii.
    pub radius_deg: Radii,
    /// Highest visible point; where nothing is visible, the top of the circle, below the horizon.
    pub crown: Bearing,
    /// Null where the bow meets no horizon: none of it is visible, or its lowest point is.
    pub feet: Option<Feet>,
    /// Share of the full circle over the horizon in use, 0..1.
    pub visible_arc_fraction: f64,
    /// Whether any of it stands over the horizon in use, by geometry, whether or not the Sun is out.
    pub above_horizon: bool,
    /// By how many degrees the bow's best point stays below the horizon in use; null where some of it stands over it.
    pub below_horizon_by_deg: Option<f64>,
    /// Why no such bow is possible now, whatever the weather; null where it is.
    pub limited_by: Option<Limit>,
}

impl Bow {
    fn of(order: u32, name: &'static str, radii: Radii, observer: &Observer, sun: &Sun) -> Self {
        let circle = Circle::new(sun.antisolar_point(), radii.red);
        let arc = circle.over(&observer.horizon);
        let feet = arc
            .feet
            .map(|(left, right)| Feet { left_azimuth_deg: left.azimuth_deg(), right_azimuth_deg: right.azimuth_deg() });
        let hidden = arc.crown.is_none();
        Self {
            order,
            name,
            radius_deg: radii,
            crown: Bearing::of(arc.crown.unwrap_or_else(|| circle.point(0.0))),
            feet,
            visible_arc_fraction: arc.fraction,
            above_horizon: !hidden,
            below_horizon_by_deg: hidden.then(|| -circle.clearance_of_best_deg(&observer.horizon)),
            limited_by: sight::limit(observer, sun, &circle, &arc),
        }
    }
}

/// Parameters of the question.
pub const PARAMETERS: [&str; 7] = ["site", "lat", "lon", "eye_height_m", "time", "water", "water_temperature_c"];

/// Where Sun, antisolar point, primary and secondary bow stand, by geometry alone.
#[utoipa::path(
    get, path = "/v1/bow", tag = "computed",
    params(
        ("site" = Option<String>, Query, min_length = 1, description = "a configured site, instead of lat and lon"),
        ("lat" = Option<f64>, Query, description = "latitude, degrees"),
        ("lon" = Option<f64>, Query, description = "longitude, degrees, positive east"),
        ("eye_height_m" = Option<f64>, Query, description = "eye above the ground or water around, m; default 1.7, or the site's"),
        ("time" = Option<DateTime<Utc>>, Query, description = "RFC 3339, 1950 to 2100; default now"),
        ("water" = inline(Option<Water>), Query, description = "fresh (rain, the default) or sea (spray, 35 g/kg)"),
        ("water_temperature_c" = Option<f64>, Query, description = "temperature of the drops, degrees Celsius; default 10; sea water up to 30"),
    ),
    responses(
        (status = 200, description = "Sun and bows", body = BowAnswer),
        (status = 400, description = "parameters that cannot be used", body = ProblemBody, content_type = "application/problem+json"),
        (status = 503, description = "too many requests at once, or too slow", body = ProblemBody, content_type = "application/problem+json"),
    )
)]
pub(super) async fn bow(
    State(app): State<App>,
    mut query: Query,
) -> Result<([(HeaderName, &'static str); 1], Json<BowAnswer>), Problem> {
    query.only(&PARAMETERS);
    let observer = query.observer(&app);
    let asked = query.time("time");
    let (water, temperature_c) = query.water();
    query.finish()?;
    let observer = observer.ok_or_else(|| Problem::Internal("an observer was neither read nor refused".into()))?;
    let caching = if asked.is_some() { "public, max-age=86400" } else { "no-cache" };
    let time = asked.unwrap_or_else(|| app.clock().now());
    let answer = answer(&observer, time, water, temperature_c)
        .ok_or_else(|| Problem::Internal("water without a stationary ray".into()))?;
    Ok(([(header::CACHE_CONTROL, caching)], Json(answer)))
}

/// Sun and bows; none when the water's index makes no bow, which no water does.
pub fn answer(observer: &Observer, time: DateTime<Utc>, water: Water, temperature_c: f64) -> Option<BowAnswer> {
    let sun = Sun::at(observer, time);
    let bow = |order, name| Some(Bow::of(order, name, Radii::of(order, water, temperature_c)?, observer, &sun));
    Some(BowAnswer {
        time,
        observer: ObserverEcho::of(observer),
        sun: SunAnswer {
            azimuth_deg: sun.apparent.azimuth_deg(),
            elevation_deg: sun.apparent.elevation_deg(),
            airless_elevation_deg: sun.airless.elevation_deg(),
            above_horizon: sun.over_horizon_deg(observer) >= 0.0,
        },
        antisolar_point: Bearing::of(sun.antisolar_point()),
        bows: vec![bow(1, "primary")?, bow(2, "secondary")?],
    })
}
