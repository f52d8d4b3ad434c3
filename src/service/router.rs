//! The contents page: every route and the layers round them.

use axum::Router;
use axum::routing::get;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use super::{App, bow, entity_tag, feeds, health, layers, light, openapi, outlook, page, problem, sites};

/// All routes of the service.
pub fn router(app: App) -> Router {
    let (answers, document) = OpenApiRouter::with_openapi(openapi::base())
        // What is computed.
        .routes(routes!(bow::bow))
        .routes(routes!(outlook::outlook))
        .routes(routes!(light::light))
        // What is configured and how it fares.
        .routes(routes!(sites::sites))
        .routes(routes!(feeds::feeds))
        .split_for_parts();
    let (health, document) = OpenApiRouter::with_openapi(document)
        .routes(routes!(health::healthz))
        .routes(routes!(health::readyz))
        .split_for_parts();
    let document = openapi::document(document);
    let answers = answers
        .route("/openapi.json", get(async move || openapi::answer(&document)))
        .fallback(page::page)
        .method_not_allowed_fallback(problem::method_not_allowed)
        .layer(axum::middleware::from_fn(entity_tag::entity_tag));
    let limited = layers::limited(answers, &app.config().limits);
    layers::observed(limited.merge(health.method_not_allowed_fallback(problem::method_not_allowed))).with_state(app)
}
