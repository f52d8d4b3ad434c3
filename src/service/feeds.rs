//! `GET /v1/feeds`: how the weather feeds fare, without their secrets.

use axum::Json;
use axum::extract::State;
use axum::http::{HeaderName, header};
use serde::Serialize;
use utoipa::ToSchema;

use super::App;
use super::problem::{Problem, ProblemBody};
use super::query::Query;
use crate::weather::feeds::FeedState;

/// State of every feed.
#[derive(Debug, Serialize, ToSchema)]
pub struct FeedStates {
    /// In the order of the configuration; the first is the default of the outlook.
    pub feeds: Vec<FeedState>,
}

/// How the weather feeds fare.
#[utoipa::path(
    get, path = "/v1/feeds", tag = "configuration",
    responses(
        (status = 200, description = "state of every feed", body = FeedStates),
        (status = 400, description = "a parameter was given", body = ProblemBody, content_type = "application/problem+json"),
        (status = 503, description = "too many requests at once, or too slow", body = ProblemBody, content_type = "application/problem+json"),
    )
)]
pub(super) async fn feeds(
    State(app): State<App>,
    mut query: Query,
) -> Result<([(HeaderName, &'static str); 1], Json<FeedStates>), Problem> {
    query.only(&[]);
    query.finish()?;
    Ok(([(header::CACHE_CONTROL, "no-cache")], Json(FeedStates { feeds: app.feeds().states() })))
}
