//! `GET /v1/light`: what the bow looks like, and whether it can be seen at all.

use std::sync::Arc;

use axum::Json;
use axum::extract::State;
use axum::http::{HeaderName, header};
use moka::future::Cache;

use super::App;
use super::problem::{Problem, ProblemBody};
use super::query::Query;
use crate::bounds::{
    AEROSOL_OPTICAL_DEPTH, DROP_RADIUS, LIT_OPTICAL_DEPTH, RAIN, SEA_WAVELENGTH, SUN_ELEVATION, WAVELENGTH,
};
use crate::optics::light::answer::LightAnswer;
use crate::optics::light::asked::{Asked, Fog, Question};
use crate::optics::light::{Prepared, answer};
use crate::optics::water::Water;

/// What was worked out for drops, water and wavelength, bounded by its size. It is pure, so that it never ages.
#[derive(Debug)]
pub struct Curves(Cache<String, Arc<Prepared>>);

impl Curves {
    /// Room for a number of bytes.
    pub fn new(bytes: u64) -> Self {
        let weigh =
            |key: &String, kept: &Arc<Prepared>| u32::try_from(key.len() + kept.size_bytes()).unwrap_or(u32::MAX);
        Self(Cache::builder().max_capacity(bytes).weigher(weigh).build())
    }
}

/// Parameters of the question.
pub const PARAMETERS: [&str; 9] = [
    "sun_elevation_deg",
    "rain_mm_h",
    "drop_radius_um",
    "fog",
    "water",
    "water_temperature_c",
    "aerosol_optical_depth",
    "lit_optical_depth",
    "wavelength_um",
];

/// The bow in its colours and brightness: the curve across it, how it stands out, how a polariser acts on it, and what to expect.
#[utoipa::path(
    get, path = "/v1/light", tag = "computed",
    params(
        ("sun_elevation_deg" = f64, Query, description = "apparent elevation of the Sun, degrees"),
        ("rain_mm_h" = Option<f64>, Query, description = "rain rate, mm/h; default 5; gives the sizes of the drops"),
        ("drop_radius_um" = Option<f64>, Query, description = "drops of nearly one radius, um, instead of rain_mm_h"),
        ("fog" = inline(Option<Fog>), Query, description = "radiation (6 um), advection (20 um) or drizzle (150 um), instead of rain_mm_h"),
        ("water" = inline(Option<Water>), Query, description = "fresh (rain, the default) or sea (spray, 35 g/kg)"),
        ("water_temperature_c" = Option<f64>, Query, description = "temperature of the drops, degrees Celsius; default 10; sea water up to 30"),
        ("aerosol_optical_depth" = Option<f64>, Query, description = "vertical optical depth of the aerosol at 0.55 um; default 0.1, a clear day"),
        ("lit_optical_depth" = Option<f64>, Query, description = "optical depth of sunlit rain along the line of sight; default 1"),
        ("wavelength_um" = Option<f64>, Query, description = "one wavelength, um, instead of white light; sea water 0.4 to 0.7"),
    ),
    responses(
        (status = 200, description = "the bow in its light", body = LightAnswer),
        (status = 400, description = "parameters that cannot be used", body = ProblemBody, content_type = "application/problem+json"),
        (status = 503, description = "too many requests at once, or too slow", body = ProblemBody, content_type = "application/problem+json"),
    )
)]
pub(super) async fn light(
    State(app): State<App>,
    query: Query,
) -> Result<([(HeaderName, &'static str); 1], Json<LightAnswer>), Problem> {
    let question = read(query)?;
    let prepared = prepared(&app, &question).await?;
    // The same question has the same answer for as long as the program is the same.
    let caching = [(header::CACHE_CONTROL, "public, max-age=86400")];
    Ok((caching, Json(answer(&question, &prepared))))
}

fn read(mut query: Query) -> Result<Question, Problem> {
    query.only(&PARAMETERS);
    let (water, water_temperature_c) = query.water();
    let asked = Asked {
        sun_elevation_deg: query.number(&SUN_ELEVATION),
        rain_mm_h: query.number(&RAIN),
        drop_radius_um: query.number(&DROP_RADIUS),
        fog: query.choice("fog", &Fog::NAMES),
        water: Some(water),
        water_temperature_c: Some(water_temperature_c),
        aerosol_optical_depth: query.number(&AEROSOL_OPTICAL_DEPTH),
        lit_optical_depth: query.number(&LIT_OPTICAL_DEPTH),
        wavelength_um: query.number(if water == Water::Sea { &SEA_WAVELENGTH } else { &WAVELENGTH }),
    };
    let question = asked.check().map_err(|refused| {
        for refused in refused {
            query.refuse_once(refused.field, refused.detail);
        }
    });
    query.finish()?;
    question.map_err(|()| Problem::Internal("a question was neither read nor refused".into()))
}

/// The slow part, worked out once for all who ask for the same drops, on no more cores than there are.
async fn prepared(app: &App, question: &Question) -> Result<Arc<Prepared>, Problem> {
    let Question { drops, water, water_temperature_c, wavelength_um, .. } = question;
    let key = format!("{drops:?} {water:?} {water_temperature_c} {wavelength_um:?}");
    let (cores, question) = (app.answers().cores(), question.clone());
    let made = app.curves().0.try_get_with(key, async move {
        let permit = cores.acquire_owned().await.map_err(|error| error.to_string())?;
        let work = tokio::task::spawn_blocking(move || {
            let _permit = permit;
            Prepared::new(&question).map(Arc::new).map_err(|error| error.to_string())
        });
        work.await.map_err(|error| error.to_string())?
    });
    made.await.map_err(|error: Arc<String>| Problem::Internal(error.to_string()))
}
