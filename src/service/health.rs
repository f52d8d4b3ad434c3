//! Whether the service lives and whether it should be sent work.

use axum::Json;
use axum::extract::State;
use axum::http::{HeaderName, StatusCode, header};
use serde::Serialize;
use utoipa::ToSchema;

use super::App;

type Uncached = [(HeaderName, &'static str); 1];
const UNCACHED: Uncached = [(header::CACHE_CONTROL, "no-store")];

/// State of the service.
#[derive(Debug, Serialize, ToSchema)]
pub struct Health {
    /// `ok` or `stopping`.
    pub status: &'static str,
    /// Version of the program.
    pub version: &'static str,
}

/// Answers as long as the process lives.
#[utoipa::path(get, path = "/healthz", tag = "health", responses((status = 200, description = "alive", body = Health)))]
pub(super) async fn healthz() -> (Uncached, Json<Health>) {
    (UNCACHED, Json(Health { status: "ok", version: env!("CARGO_PKG_VERSION") }))
}

/// 200 while the service takes work. A failing feed does not change that: bows and the last good outlook are served.
#[utoipa::path(
    get, path = "/readyz", tag = "health",
    responses(
        (status = 200, description = "takes work", body = Health),
        (status = 503, description = "is stopping", body = Health),
    )
)]
pub(super) async fn readyz(State(app): State<App>) -> (StatusCode, Uncached, Json<Health>) {
    let (status, word) =
        if app.is_stopping() { (StatusCode::SERVICE_UNAVAILABLE, "stopping") } else { (StatusCode::OK, "ok") };
    (status, UNCACHED, Json(Health { status: word, version: env!("CARGO_PKG_VERSION") }))
}
