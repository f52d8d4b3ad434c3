//! `GET /v1/sites`: the observers that have a name.

use axum::Json;
use axum::extract::State;
use axum::http::{HeaderName, header};
use serde::Serialize;
use utoipa::ToSchema;

use super::App;
use super::problem::{Problem, ProblemBody};
use super::query::Query;

/// The configured sites.
#[derive(Debug, Serialize, ToSchema)]
pub struct Sites {
    /// In the order of the configuration.
    pub sites: Vec<SiteEntry>,
}

/// A place with a name.
#[derive(Debug, Serialize, ToSchema)]
pub struct SiteEntry {
    /// Name for queries.
    pub name: String,
    /// Name for people.
    pub label: String,
    /// Latitude, degrees.
    pub lat: f64,
    /// Longitude, degrees, positive east.
    pub lon: f64,
    /// Ground above mean sea level, m.
    pub ground_m: f64,
    /// Eye above the ground or water around, m.
    pub eye_height_m: f64,
    /// Azimuth and elevation of the terrain, degrees, by rising azimuth; empty where the horizon is level.
    pub skyline: Vec<(f64, f64)>,
}

/// The observers that have a name.
#[utoipa::path(
    get, path = "/v1/sites", tag = "configuration",
    responses(
        (status = 200, description = "the configured sites", body = Sites),
        (status = 400, description = "a parameter was given", body = ProblemBody, content_type = "application/problem+json"),
        (status = 503, description = "too many requests at once, or too slow", body = ProblemBody, content_type = "application/problem+json"),
    )
)]
pub(super) async fn sites(
    State(app): State<App>,
    mut query: Query,
) -> Result<([(HeaderName, &'static str); 1], Json<Sites>), Problem> {
    query.only(&[]);
    query.finish()?;
    let sites = app.config().sites.iter().map(|site| SiteEntry {
        name: site.name.clone(),
        label: site.label.clone(),
        lat: site.observer.place.lat_deg(),
        lon: site.observer.place.lon_deg(),
        ground_m: site.observer.ground_m,
        eye_height_m: site.observer.eye_height_m,
        skyline: site.observer.horizon.points().to_vec(),
    });
    Ok(([(header::CACHE_CONTROL, "public, max-age=60")], Json(Sites { sites: sites.collect() })))
}
