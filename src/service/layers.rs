//! The layers round the routes, as two ordered lists: what every request passes, and what only answers that cost
//! something pass besides.

use std::time::Duration;

use axum::body::Body;
use axum::error_handling::HandleErrorLayer;
use axum::extract::DefaultBodyLimit;
use axum::http::{HeaderName, HeaderValue, Request, StatusCode, header};
use axum::response::{IntoResponse, Response};
use axum::{BoxError, Router};
use tower::ServiceBuilder;
use tower::limit::GlobalConcurrencyLimitLayer;
use tower_http::catch_panic::CatchPanicLayer;
use tower_http::compression::CompressionLayer;
use tower_http::limit::RequestBodyLimitLayer;
use tower_http::request_id::{MakeRequestUuid, PropagateRequestIdLayer, RequestId, SetRequestIdLayer};
use tower_http::set_header::SetResponseHeaderLayer;
use tower_http::trace::{DefaultOnRequest, DefaultOnResponse, TraceLayer};
use tracing::Level;

use super::App;
use super::problem::Problem;
use crate::config::Limits;

/// Only what the page itself brings may run or load.
const CONTENT_POLICY: &str =
    "default-src 'self'; img-src 'self' data:; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";

/// Limits round everything but the health checks: a busy service still says that it lives.
pub fn limited(routes: Router<App>, limits: &Limits) -> Router<App> {
    routes.layer(
        ServiceBuilder::new()
            .layer(HandleErrorLayer::new(overload))
            .load_shed()
            .layer(GlobalConcurrencyLimitLayer::new(limits.requests))
            .timeout(Duration::from_secs(limits.request_s))
            .map_response(too_large)
            .layer(RequestBodyLimitLayer::new(limits.body_bytes))
            .layer(DefaultBodyLimit::disable())
            .layer(CompressionLayer::new()),
    )
}

/// Identity, log, panics and headers of every answer.
pub fn observed(routes: Router<App>) -> Router<App> {
    routes.layer(
        ServiceBuilder::new()
            .layer(SetRequestIdLayer::x_request_id(MakeRequestUuid))
            .layer(
                TraceLayer::new_for_http()
                    .make_span_with(span)
                    .on_request(DefaultOnRequest::new().level(Level::DEBUG))
                    // A line for every answer costs more than a bow: it is there for those who ask for it. Failures are
                    // logged all the same.
                    .on_response(DefaultOnResponse::new().level(Level::DEBUG)),
            )
            .layer(PropagateRequestIdLayer::x_request_id())
            .layer(fixed_header(header::X_CONTENT_TYPE_OPTIONS, "nosniff"))
            .layer(fixed_header(header::CONTENT_SECURITY_POLICY, CONTENT_POLICY))
            .layer(fixed_header(header::REFERRER_POLICY, "no-referrer"))
            .layer(CatchPanicLayer::custom(panicked)),
    )
}

fn fixed_header(name: HeaderName, value: &'static str) -> SetResponseHeaderLayer<HeaderValue> {
    SetResponseHeaderLayer::overriding(name, HeaderValue::from_static(value))
}

/// The query stays out of the log: it holds where somebody stands.
fn span<B>(request: &Request<B>) -> tracing::Span {
    let id = request.extensions().get::<RequestId>().and_then(|id| id.header_value().to_str().ok()).unwrap_or("-");
    tracing::info_span!("request", method = %request.method(), path = request.uri().path(), id)
}

async fn overload(error: BoxError) -> Problem {
    if error.is::<tower::timeout::error::Elapsed>() {
        Problem::TooSlow
    } else if error.is::<tower::load_shed::error::Overloaded>() {
        Problem::Busy
    } else {
        Problem::Internal(error.to_string())
    }
}

/// The layer that counts the body refuses in a shape of its own.
fn too_large<B: axum::body::HttpBody<Data = bytes::Bytes> + Send + 'static>(response: http::Response<B>) -> Response
where
    B::Error: Into<BoxError>,
{
    if response.status() == StatusCode::PAYLOAD_TOO_LARGE {
        Problem::TooLarge.into_response()
    } else {
        response.map(Body::new)
    }
}

#[allow(clippy::needless_pass_by_value, reason = "the layer hands the payload over")]
fn panicked(payload: Box<dyn std::any::Any + Send + 'static>) -> Response {
    let text = payload
        .downcast_ref::<String>()
        .cloned()
        .or_else(|| payload.downcast_ref::<&str>().map(ToString::to_string))
        .unwrap_or_else(|| "no text".into());
    Problem::Internal(format!("panic: {text}")).into_response()
}
