//! `GET /openapi.json`: exactly what is served, with the bounds of the one table of ranges.

use axum::http::{HeaderName, header};
use axum::response::IntoResponse;
use serde_json::{Value, json};
use utoipa::OpenApi;

use crate::bounds::QUERY;

/// Title and description; the routes are added where they are routed.
#[derive(OpenApi)]
#[openapi(info(
    title = "rainward",
    description = "Where, when and how well a rainbow will stand in the sky. Azimuth runs clockwise from true north, \
                   elevation is positive above the horizontal, longitude is positive east, times are UTC."
))]
struct Base;

/// The document without routes.
pub fn base() -> utoipa::openapi::OpenApi {
    Base::openapi()
}

/// The finished document: each parameter that stands in the table of ranges gets its bounds from there.
pub fn document(routes: utoipa::openapi::OpenApi) -> Value {
    let mut document = serde_json::to_value(routes).unwrap_or_default();
    let paths = document["paths"].as_object_mut().into_iter().flat_map(|paths| paths.values_mut());
    let parameters = paths.filter_map(|path| path.pointer_mut("/get/parameters")?.as_array_mut()).flatten();
    for parameter in parameters {
        if let Some(range) = QUERY.iter().find(|range| parameter["name"] == range.name) {
            parameter["schema"] = json!({ "type": "number", "minimum": range.min, "maximum": range.max });
        }
    }
    document
}

/// Answers with the document.
pub fn answer(document: &Value) -> impl IntoResponse + use<> {
    let headers: [(HeaderName, &str); 2] =
        [(header::CONTENT_TYPE, "application/json"), (header::CACHE_CONTROL, "public, max-age=300")];
    (headers, document.to_string())
}
