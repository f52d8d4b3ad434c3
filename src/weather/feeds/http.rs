//! One exchange with a feed's server, within its limits of time, size and place.

use std::time::Duration;

use chrono::{DateTime, Utc};
use reqwest::header::{ACCEPT, CONTENT_TYPE, HeaderMap, HeaderValue, RETRY_AFTER};
use reqwest::redirect::{Attempt, Policy};
use reqwest::{Client, Response, StatusCode, Url};
use tracing::warn;

use super::source::Source;

/// How often a server may send us on to another of its addresses.
const MAX_REDIRECTS: usize = 5;

/// Longest wait that a server may ask for.
const MAX_RETRY_AFTER: Duration = Duration::from_secs(24 * 3600);

/// What a server answered.
pub(super) enum Reply {
    /// A document.
    Document(Answer),
    /// The document kept is still the right one.
    NotModified(HeaderMap),
}

/// A document as it came.
pub(super) struct Answer {
    pub status: u16,
    pub headers: HeaderMap,
    pub body: Vec<u8>,
}

/// Why an exchange gave no document.
#[derive(Debug, Clone)]
pub(super) struct Fault {
    /// In words fit for the public.
    pub reason: String,
    /// Status of the answer, where there was one.
    pub status: Option<u16>,
    /// How long the server asks us to stay away.
    pub retry_after: Option<Duration>,
    /// Whether it would meet every document of the feed, not this one alone.
    pub whole_feed: bool,
}

impl Fault {
    /// A fault of one document.
    pub fn document(reason: impl Into<String>, status: Option<u16>) -> Self {
        Self { reason: reason.into(), status, retry_after: None, whole_feed: false }
    }

    fn feed(reason: impl Into<String>, status: Option<u16>) -> Self {
        Self { whole_feed: true, ..Self::document(reason, status) }
    }
}

/// The client for all feeds. Custom headers never leave the host, because no redirect does.
pub(super) fn client() -> Result<Client, String> {
    // Fails only when a provider is already installed, which is as good.
    let _ = rustls::crypto::ring::default_provider().install_default();
    let builder = || {
        Client::builder()
            .user_agent(concat!("rainward/", env!("CARGO_PKG_VERSION")))
            .referer(false)
            .redirect(Policy::custom(redirect))
    };
    builder().build().or_else(|error| {
        // A machine without certificates can still fetch by http; by https each server will be refused.
        warn!(error = %innermost(&error), "no certificates to check servers with");
        let tls = rustls::ClientConfig::builder()
            .with_root_certificates(rustls::RootCertStore::empty())
            .with_no_client_auth();
        builder().tls_backend_preconfigured(tls).build().map_err(|error| innermost(&error))
    })
}

fn redirect(attempt: Attempt) -> reqwest::redirect::Action {
    if attempt.previous().len() > MAX_REDIRECTS {
        return attempt.error(format!("more than {MAX_REDIRECTS} redirects"));
    }
    match attempt.previous().last() {
        Some(from) if same_host(from, attempt.url()) => attempt.follow(),
        _ => attempt.error("a redirect to another host"),
    }
}

/// Same scheme, host and port, or the change from http to https on the usual ports of one host.
fn same_host(from: &Url, to: &Url) -> bool {
    let upgrade = from.scheme() == "http" && to.scheme() == "https" && from.port().is_none() && to.port().is_none();
    from.host() == to.host()
        && (upgrade || (from.scheme() == to.scheme() && from.port_or_known_default() == to.port_or_known_default()))
}

/// Asks a server for a document.
pub(super) async fn exchange(
    client: &Client,
    source: &Source,
    url: Url,
    conditions: HeaderMap,
    now: DateTime<Utc>,
) -> Result<Reply, Fault> {
    let conditional = !conditions.is_empty();
    let mut headers = HeaderMap::new();
    headers.insert(ACCEPT, HeaderValue::from_static("application/prs.coverage+json, application/json, */*;q=0.5"));
    headers.extend(source.headers.clone());
    headers.extend(conditions);
    let whole = async {
        let response =
            client.get(url).headers(headers).send().await.map_err(|error| unreachable(&error.without_url()))?;
        let status = response.status();
        match status {
            StatusCode::NOT_MODIFIED if conditional => Ok(Reply::NotModified(response.headers().clone())),
            StatusCode::OK | StatusCode::NON_AUTHORITATIVE_INFORMATION => {
                body(response, source.max_bytes).await.map(Reply::Document)
            }
            _ => Err(refusal(status, response.headers(), now)),
        }
    };
    tokio::time::timeout(source.timeout, whole)
        .await
        .unwrap_or_else(|_| Err(Fault::feed(format!("no full answer within {} s", source.timeout.as_secs_f64()), None)))
}

async fn body(mut response: Response, max_bytes: usize) -> Result<Answer, Fault> {
    let status = Some(response.status().as_u16());
    let too_big = || Fault::document(format!("the answer is larger than max_bytes = {max_bytes}"), status);
    if response.content_length().is_some_and(|length| length > max_bytes as u64) {
        return Err(too_big());
    }
    let kind = response.headers().get(CONTENT_TYPE).and_then(|kind| kind.to_str().ok()).unwrap_or_default();
    if kind.to_ascii_lowercase().starts_with("text/html") {
        return Err(Fault::document("HTML instead of data", status));
    }
    let mut body = Vec::new();
    loop {
        // The stream is decompressed piece by piece, so that the limit holds before a bomb has unfolded.
        match response.chunk().await {
            Ok(Some(chunk)) if body.len() + chunk.len() > max_bytes => return Err(too_big()),
            Ok(Some(chunk)) => body.extend_from_slice(&chunk),
            Ok(None) => break,
            Err(error) => {
                return Err(Fault::feed(format!("the answer broke off: {}", innermost(&error.without_url())), status));
            }
        }
    }
    if body.is_empty() {
        return Err(Fault::document("empty answer", status));
    }
    Ok(Answer { status: response.status().as_u16(), headers: response.headers().clone(), body })
}

fn unreachable(error: &reqwest::Error) -> Fault {
    let detail = innermost(error);
    if error.is_redirect() {
        Fault::document(format!("the server sends us on: {detail}"), error.status().map(|status| status.as_u16()))
    } else if error.is_connect() {
        Fault::feed(format!("the server cannot be reached: {detail}"), None)
    } else {
        Fault::feed(format!("the exchange failed: {detail}"), None)
    }
}

/// The last cause, which tells what happened without the address.
fn innermost(error: &reqwest::Error) -> String {
    let mut cause: &dyn std::error::Error = error;
    while let Some(next) = cause.source() {
        cause = next;
    }
    cause.to_string()
}

fn refusal(status: StatusCode, headers: &HeaderMap, now: DateTime<Utc>) -> Fault {
    let code = Some(status.as_u16());
    let mut fault = match status {
        StatusCode::NO_CONTENT | StatusCode::RESET_CONTENT => Fault::document("empty answer", code),
        StatusCode::NOT_MODIFIED => Fault::document("\"not modified\", though no document was kept", code),
        StatusCode::UNAUTHORIZED | StatusCode::FORBIDDEN => Fault::feed("the server refuses the credentials", code),
        StatusCode::NOT_FOUND | StatusCode::GONE => Fault::document("the server has no such document", code),
        StatusCode::TOO_MANY_REQUESTS => Fault::feed("the server is asked too often", code),
        StatusCode::BAD_GATEWAY | StatusCode::SERVICE_UNAVAILABLE | StatusCode::GATEWAY_TIMEOUT => {
            Fault::feed("the server is not available", code)
        }
        _ if status.is_server_error() => Fault::document("the server failed", code),
        _ => Fault::document("the server gave no document", code),
    };
    fault.reason = format!("{} (status {})", fault.reason, status.as_u16());
    if matches!(status, StatusCode::TOO_MANY_REQUESTS | StatusCode::SERVICE_UNAVAILABLE) {
        fault.retry_after = headers.get(RETRY_AFTER).and_then(|value| retry_after(value.to_str().ok()?, now));
    }
    fault
}

/// Seconds or a date (RFC 9110, 10.2.3), at most a day.
fn retry_after(text: &str, now: DateTime<Utc>) -> Option<Duration> {
    let wait = if let Ok(seconds) = text.trim().parse::<u64>() {
        Duration::from_secs(seconds)
    } else {
        (DateTime::parse_from_rfc2822(text).ok()?.to_utc() - now).to_std().ok()?
    };
    Some(wait.min(MAX_RETRY_AFTER))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_the_same_host_is_followed() {
        for (from, to, follow) in [
            ("http://a.example/x", "http://a.example/y", true),
            ("http://a.example/x", "https://a.example/x", true),
            ("http://a.example/x", "http://a.example:80/y", true),
            ("https://a.example/x", "http://a.example/x", false),
            ("http://a.example:8080/x", "https://a.example/x", false),
            ("http://a.example/x", "http://a.example:8080/x", false),
            ("http://a.example/x", "http://b.example/x", false),
            ("http://a.example/x", "http://a.example.evil.example/x", false),
        ] {
            let (from, to) = (Url::parse(from).unwrap(), Url::parse(to).unwrap());
            assert_eq!(same_host(&from, &to), follow, "{from} -> {to}");
        }
    }

    #[test]
    fn retry_after_is_seconds_or_a_date_and_at_most_a_day() {
        let now = DateTime::from_timestamp(784_111_777, 0).unwrap();
        // The date of RFC 9110, 5.6.7 is that instant.
        for (text, expected_s) in [
            ("120", Some(120)),
            ("99999999", Some(86400)),
            ("Sun, 06 Nov 1994 08:50:37 GMT", Some(60)),
            ("Sun, 06 Nov 1994 08:00:00 GMT", None),
            ("soon", None),
            ("-5", None),
        ] {
            assert_eq!(retry_after(text, now).map(|wait| wait.as_secs()), expected_s, "{text}");
        }
    }
}
