//! How long a document counts as fresh, and how it is asked for again, by HTTP's caching rules (RFC 9111).

use std::time::Duration;

use chrono::{DateTime, Utc};
use headers::{CacheControl, HeaderMapExt};
use http::header::{AGE, CACHE_CONTROL, EXPIRES, IF_MODIFIED_SINCE, IF_NONE_MATCH, PRAGMA};
use http::{HeaderMap, HeaderValue, Request, Response, StatusCode};
use http_cache_semantics::{AfterResponse, BeforeRequest, CacheOptions, CachePolicy};

/// Shortest and longest time for which a server's word on freshness is taken.
const LIFETIME: (Duration, Duration) = (Duration::from_secs(10), Duration::from_secs(24 * 3600));

/// A server's word on how a document may be kept.
///
/// `max-age`, `Expires` and `Age` count, within 10 s and 24 h. Where a server says nothing, or forbids keeping outright
/// (`no-store`, `no-cache`), the feed's own refresh time counts: the last good document must be at hand when the server
/// is not, and asking for every answer anew would do the server no favour.
#[derive(Clone)]
pub(super) struct Freshness {
    policy: CachePolicy,
    /// How long the document stays fresh.
    pub lifetime: Duration,
}

/// The request as the caching rules see it: every request of a feed is alike, so that its headers need not be kept.
fn request() -> Request<()> {
    let mut request = Request::new(());
    // Asks for revalidation even of what is still fresh; only the validators of the result are used.
    request.headers_mut().insert(CACHE_CONTROL, HeaderValue::from_static("no-cache"));
    request
}

fn response(status: StatusCode, headers: &HeaderMap) -> Response<()> {
    let mut response = Response::new(());
    *response.status_mut() = status;
    *response.headers_mut() = headers.clone();
    let headers = response.headers_mut();
    // Directives are case-insensitive; the policy compares them as they stand.
    let directives: Vec<_> = headers
        .get_all(CACHE_CONTROL)
        .iter()
        .filter_map(|value| HeaderValue::from_str(&value.to_str().ok()?.to_ascii_lowercase()).ok())
        .collect();
    headers.remove(CACHE_CONTROL);
    for directive in directives {
        headers.append(CACHE_CONTROL, directive);
    }
    // An absurd age would overflow the policy's sum.
    let age_s = headers.get(AGE).and_then(|age| age.to_str().ok()?.parse::<u64>().ok());
    if age_s.is_none_or(|age_s| age_s > 10 * 365 * 86400) {
        headers.remove(AGE);
    }
    response
}

impl Freshness {
    /// From the headers of a whole answer.
    pub fn new(headers: &HeaderMap, now: DateTime<Utc>, refresh: Duration) -> Self {
        let options = CacheOptions { shared: false, cache_heuristic: 0.0, ..CacheOptions::default() };
        let response = response(StatusCode::OK, headers);
        let policy = CachePolicy::new_options(&request(), &response, now.into(), options);
        Self { lifetime: lifetime(response.headers(), &policy, now, refresh), policy }
    }

    /// Headers that ask for the document only if it has changed; empty where it has no validator.
    pub fn conditions(&self, now: DateTime<Utc>) -> HeaderMap {
        let BeforeRequest::Stale { request, .. } = self.policy.before_request(&request(), now.into()) else {
            return HeaderMap::new();
        };
        let validators = [IF_NONE_MATCH, IF_MODIFIED_SINCE];
        validators
            .into_iter()
            .filter_map(|name| request.headers.get(&name).cloned().map(|value| (name, value)))
            .collect()
    }

    /// After the server confirmed the document; None when it confirmed another one.
    pub fn confirmed(&self, headers: &HeaderMap, now: DateTime<Utc>, refresh: Duration) -> Option<Self> {
        let mut headers = headers.clone();
        // A 304 need not repeat the validators (RFC 9110, 15.4.5 asks for ETag only); what it leaves out stands.
        if !headers.contains_key(http::header::ETAG) {
            for (name, value) in self.kept() {
                headers.entry(name).or_insert(value);
            }
        }
        // Confirmed by its origin: the age of the first answer no longer counts.
        headers.entry(AGE).or_insert(HeaderValue::from_static("0"));
        let response = response(StatusCode::NOT_MODIFIED, &headers);
        match self.policy.after_response(&request(), &response, now.into()) {
            AfterResponse::NotModified(policy, parts) => {
                Some(Self { lifetime: lifetime(&parts.headers, &policy, now, refresh), policy })
            }
            AfterResponse::Modified(..) => None,
        }
    }

    fn kept(&self) -> Vec<(http::HeaderName, HeaderValue)> {
        let conditions = self.conditions(DateTime::UNIX_EPOCH);
        [(IF_NONE_MATCH, http::header::ETAG), (IF_MODIFIED_SINCE, http::header::LAST_MODIFIED)]
            .into_iter()
            .filter_map(|(condition, name)| conditions.get(&condition).cloned().map(|value| (name, value)))
            .collect()
    }
}

fn lifetime(headers: &HeaderMap, policy: &CachePolicy, now: DateTime<Utc>, refresh: Duration) -> Duration {
    let directives = headers.typed_get::<CacheControl>();
    let forbidden = directives.as_ref().is_some_and(|cache| cache.no_store() || cache.no_cache())
        || (directives.is_none() && headers.get(PRAGMA).is_some_and(|value| value == "no-cache"));
    let told = directives.is_some_and(|cache| cache.max_age().is_some()) || headers.contains_key(EXPIRES);
    if forbidden || !told { refresh } else { policy.time_to_live(now.into()).clamp(LIFETIME.0, LIFETIME.1) }
}

#[cfg(test)]
mod tests {
    use super::*;

    const REFRESH: Duration = Duration::from_secs(900);

    fn now() -> DateTime<Utc> {
        DateTime::from_timestamp(1_935_619_200, 0).unwrap()
    }

    fn headers(pairs: &[(&str, &str)]) -> HeaderMap {
        pairs.iter().map(|(name, value)| (name.parse::<http::HeaderName>().unwrap(), value.parse().unwrap())).collect()
    }

    #[test]
    fn the_servers_word_counts_within_reason() {
        for (pairs, expected_s) in [
            (&[] as &[(&str, &str)], 900),
            (&[("cache-control", "max-age=120")], 120),
            (&[("cache-control", "Public, Max-Age=120")], 120),
            (&[("cache-control", "private, max-age=300"), ("age", "100")], 200),
            (&[("cache-control", "max-age=60"), ("age", "70")], 10),
            (&[("cache-control", "max-age=0")], 10),
            (&[("cache-control", "max-age=99999999999")], 86400),
            (&[("cache-control", "max-age=60"), ("age", "18446744073709551615")], 60),
            (&[("cache-control", "no-store")], 900),
            (&[("cache-control", "no-cache, max-age=5")], 900),
            (&[("pragma", "no-cache"), ("expires", "0")], 900),
            (&[("date", "Sun, 04 May 2031 00:00:00 GMT"), ("expires", "Sun, 04 May 2031 00:30:00 GMT")], 1800),
            (&[("expires", "never")], 10),
            (&[("last-modified", "Sun, 04 May 2025 00:00:00 GMT")], 900),
        ] {
            let found = Freshness::new(&headers(pairs), now(), REFRESH).lifetime.as_secs();
            assert_eq!(found, expected_s, "{pairs:?}");
        }
    }

    #[test]
    fn a_confirmation_counts_only_for_the_document_it_names() {
        let first = headers(&[("etag", "\"a\""), ("cache-control", "max-age=60"), ("age", "50")]);
        let kept = Freshness::new(&first, now(), REFRESH);
        assert_eq!(kept.lifetime.as_secs(), 10);
        assert_eq!(kept.conditions(now())["if-none-match"], "\"a\"");
        let later = now() + chrono::TimeDelta::seconds(600);
        for (pairs, expected_s) in [
            (&[("etag", "\"a\""), ("cache-control", "max-age=90")] as &[(&str, &str)], Some(90)),
            (&[("cache-control", "max-age=90")], Some(90)),
            (&[("etag", "\"b\"")], None),
        ] {
            let confirmed = kept.confirmed(&headers(pairs), later, REFRESH);
            assert_eq!(confirmed.map(|fresh| fresh.lifetime.as_secs()), expected_s, "{pairs:?}");
        }
        let bare = Freshness::new(&HeaderMap::new(), now(), REFRESH);
        assert!(bare.conditions(now()).is_empty());
    }
}
