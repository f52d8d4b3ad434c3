//! Problems as RFC 9457: the one place where what went wrong becomes a status and a text.

use axum::http::{HeaderValue, StatusCode, header};
use axum::response::{IntoResponse, Response};
use serde::Serialize;
use utoipa::ToSchema;

/// Everything that can go wrong with a request.
#[derive(Debug)]
pub enum Problem {
    /// Parameters that cannot be used, all of them.
    BadQuery(Vec<FieldProblem>),
    /// Nothing at this path.
    NotFound,
    /// The path is there, the method is not.
    MethodNotAllowed,
    /// The request's body is larger than allowed.
    TooLarge,
    /// Too many requests at once.
    Busy,
    /// The answer took too long.
    TooSlow,
    /// A fault of the service; the text is for the log only.
    Internal(String),
}

/// One parameter that cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, ToSchema)]
pub struct FieldProblem {
    /// Name of the parameter.
    pub field: String,
    /// What is wrong, with the bound it breaks.
    pub detail: String,
}

/// A problem as it goes out (RFC 9457).
#[derive(Debug, Serialize, ToSchema)]
pub struct ProblemBody {
    /// Always `about:blank`: the status says what kind it is.
    pub r#type: &'static str,
    /// The status in words.
    pub title: &'static str,
    /// The status.
    pub status: u16,
    /// What went wrong.
    pub detail: String,
    /// Every parameter that cannot be used; empty for other problems.
    pub errors: Vec<FieldProblem>,
}

impl IntoResponse for Problem {
    fn into_response(self) -> Response {
        let (status, detail, errors) = match self {
            Self::BadQuery(errors) => {
                let count = errors.len();
                let detail = format!("{count} parameter{} cannot be used", if count == 1 { "" } else { "s" });
                (StatusCode::BAD_REQUEST, detail, errors)
            }
            Self::NotFound => {
                (StatusCode::NOT_FOUND, "nothing here; /openapi.json lists what there is".into(), Vec::new())
            }
            Self::MethodNotAllowed => {
                (StatusCode::METHOD_NOT_ALLOWED, "this path answers other methods only".into(), Vec::new())
            }
            Self::TooLarge => (StatusCode::PAYLOAD_TOO_LARGE, "the request's body is too large".into(), Vec::new()),
            Self::Busy => (StatusCode::SERVICE_UNAVAILABLE, "too many requests at once; try again".into(), Vec::new()),
            Self::TooSlow => (StatusCode::SERVICE_UNAVAILABLE, "the answer took too long".into(), Vec::new()),
            Self::Internal(text) => {
                tracing::error!(%text, "internal fault");
                (StatusCode::INTERNAL_SERVER_ERROR, "a fault of the service; it was logged".into(), Vec::new())
            }
        };
        let title = status.canonical_reason().unwrap_or("Error");
        let body = ProblemBody { r#type: "about:blank", title, status: status.as_u16(), detail, errors };
        let mut response = (status, axum::Json(body)).into_response();
        let headers = response.headers_mut();
        headers.insert(header::CONTENT_TYPE, HeaderValue::from_static("application/problem+json"));
        headers.insert(header::CACHE_CONTROL, HeaderValue::from_static("no-store"));
        if status == StatusCode::SERVICE_UNAVAILABLE {
            headers.insert(header::RETRY_AFTER, HeaderValue::from_static("5"));
        }
        response
    }
}

/// Answers a known path asked with another method.
pub(super) async fn method_not_allowed() -> Problem {
    Problem::MethodNotAllowed
}
