//! Entity tags: an answer that the client already has is not sent again. They are weak: packed or not, an answer has one
//! tag (RFC 9110, 8.8.1).

use axum::body::Body;
use axum::extract::Request;
use axum::http::{Method, StatusCode};
use axum::middleware::Next;
use axum::response::{IntoResponse, Response};
use headers::{ETag, HeaderMapExt, IfNoneMatch};
use http_body_util::BodyExt;
use xxhash_rust::xxh3::xxh3_128;

use super::problem::Problem;

/// Tags every good answer by a hash of its body and answers 304 where the client's tag still fits. Answers are whole in
/// memory already, so that collecting one copies nothing.
pub(super) async fn entity_tag(request: Request, next: Next) -> Response {
    let reads = matches!(*request.method(), Method::GET | Method::HEAD);
    let known = request.headers().typed_get::<IfNoneMatch>();
    let response = next.run(request).await;
    if !reads || response.status() != StatusCode::OK {
        return response;
    }
    let (mut parts, body) = response.into_parts();
    let bytes = match body.collect().await {
        Ok(body) => body.to_bytes(),
        Err(error) => return Problem::Internal(format!("an answer broke off: {error}")).into_response(),
    };
    let Ok(tag) = format!("W/\"{:032x}\"", xxh3_128(&bytes)).parse::<ETag>() else {
        return Response::from_parts(parts, Body::from(bytes));
    };
    let unchanged = known.is_some_and(|known| !known.precondition_passes(&tag));
    parts.headers.typed_insert(tag);
    if unchanged {
        parts.status = StatusCode::NOT_MODIFIED;
        parts.headers.remove(axum::http::header::CONTENT_LENGTH);
        return Response::from_parts(parts, Body::empty());
    }
    Response::from_parts(parts, Body::from(bytes))
}
