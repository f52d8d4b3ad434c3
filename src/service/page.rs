//! The page: static files kept inside the program.

use axum::http::{HeaderValue, Method, Uri, header};
use axum::response::{IntoResponse, Response};
use rust_embed::RustEmbed;

use super::problem::Problem;

#[derive(RustEmbed)]
#[folder = "static/"]
struct Files;

/// Answers every path without a route of its own: a file of the page, or nothing there.
pub(super) async fn page(method: Method, uri: Uri) -> Result<Response, Problem> {
    let path = match uri.path().trim_start_matches('/') {
        "" => "index.html",
        path => path,
    };
    let file = Files::get(path).ok_or(Problem::NotFound)?;
    if !matches!(method, Method::GET | Method::HEAD) {
        return Err(Problem::MethodNotAllowed);
    }
    let kind =
        HeaderValue::from_str(file.metadata.mimetype()).unwrap_or(HeaderValue::from_static("application/octet-stream"));
    let headers = [(header::CONTENT_TYPE, kind), (header::CACHE_CONTROL, HeaderValue::from_static("no-cache"))];
    Ok((headers, file.data).into_response())
}
