//! A feed as set up: its address, headers and limits, checked once, with the environment filled in.

use std::collections::HashMap;
use std::time::Duration;

use iri_string::spec::UriSpec;
use iri_string::template::UriTemplateStr;
use iri_string::template::simple_context::SimpleContext;
use percent_encoding::{AsciiSet, CONTROLS, utf8_percent_encode};
use reqwest::Url;
use reqwest::header::{HeaderMap, HeaderName, HeaderValue};
use secrecy::{ExposeSecret, SecretString};
use thiserror::Error;
use xxhash_rust::xxh3::xxh3_128;

use super::Environment;
use super::secrets::{PLACE, Secrets};
use crate::bounds::{MAX_BYTES, Place, REFRESH, TIMEOUT};
use crate::weather::spec::{FeedSpec, Format};
use crate::weather::{coveragejson, json};

/// Why a feed cannot be set up.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("feed {feed:?}: {field}: {what}")]
pub struct SetupError {
    /// Name of the feed.
    pub feed: String,
    /// Key in its configuration.
    pub field: String,
    /// What is wrong with it.
    pub what: String,
}

/// A feed ready to be asked. Has no `Debug`: its address and headers may hold secrets.
pub(super) struct Source {
    pub spec: FeedSpec,
    pub refresh: Duration,
    pub timeout: Duration,
    pub max_bytes: usize,
    pub headers: HeaderMap,
    /// Scheme and host alone, fit for the public.
    pub host: String,
    /// None for the demo.
    template: Option<SecretString>,
    secrets: Secrets,
}

/// One document of a feed: where it is and what identifies it.
#[derive(Clone)]
pub(super) struct Ask {
    /// Hash of the address; holds no secret.
    pub key: u128,
    /// The place asked for, rounded.
    pub place: Place,
    /// None for the demo.
    pub url: Option<Url>,
}

/// Decimals of the coordinates sent: places closer than some 100 m share a document.
const DECIMALS: i32 = 3;

/// What may not stand literally in a template (RFC 6570, 2.1), besides what is not ASCII.
const NOT_LITERAL: &AsciiSet = &CONTROLS
    .add(b' ')
    .add(b'"')
    .add(b'\'')
    .add(b'<')
    .add(b'>')
    .add(b'\\')
    .add(b'^')
    .add(b'`')
    .add(b'{')
    .add(b'|')
    .add(b'}');

impl Source {
    /// Checks a feed's description and fills in the environment; all faults at once.
    pub fn new(spec: &FeedSpec, environment: &Environment) -> Result<Self, Vec<SetupError>> {
        let mut faults = Vec::new();
        let mut fault = |field: &str, what: String| {
            faults.push(SetupError { feed: spec.name.clone(), field: field.to_owned(), what });
        };
        for (field, checked) in [
            ("refresh_min", REFRESH.check(spec.refresh_min)),
            ("timeout_s", TIMEOUT.check(spec.timeout_s)),
            ("max_bytes", MAX_BYTES.check(spec.max_bytes as f64)),
        ] {
            if let Err(bound) = checked {
                fault(field, bound.to_string());
            }
        }
        let (key, mapped) = match (spec.format, &spec.json, &spec.coveragejson) {
            (Format::Json, Some(mapping), _) => ("json", json::faults(mapping)),
            (Format::Json, None, _) => ("json", vec![(String::new(), "is missing: the mapping [feeds.json]".into())]),
            (Format::Coveragejson, _, Some(mapping)) => ("coveragejson", coveragejson::faults(mapping)),
            (Format::Coveragejson, _, None) => ("", Vec::new()),
        };
        for (inner, what) in mapped {
            fault(format!("{key}.{inner}").trim_end_matches('.'), what);
        }

        let mut filled_in = Vec::new();
        let (mut template, mut host, mut literal) = (None, "demo:".to_owned(), None);
        if !spec.url.starts_with("demo:") {
            let encoded = |value: &str| utf8_percent_encode(value, NOT_LITERAL).to_string();
            let filled = fill(&spec.url, environment, encoded, &mut filled_in)
                .and_then(|url| Ok((address(&url)?, expand(&url, PLACE, PLACE)?, url)));
            match filled {
                Ok((origin, parts, url)) => {
                    (template, host, literal) = (Some(SecretString::from(url)), origin, Some(parts));
                }
                Err(what) => fault("url", what),
            }
        }
        let mut headers = HeaderMap::new();
        for (name, value) in &spec.headers {
            match header(name, value, environment, &mut filled_in) {
                Ok((name, value)) => drop(headers.insert(name, value)),
                Err(what) => fault(&format!("headers.{name}"), what),
            }
        }
        if !faults.is_empty() {
            return Err(faults);
        }
        let public = format!("{host} {:?} {:?}", spec.json, spec.coveragejson);
        Ok(Self {
            secrets: Secrets::new(filled_in, literal.as_ref(), &headers, &public),
            spec: spec.clone(),
            refresh: Duration::from_secs_f64(spec.refresh_min * 60.0),
            timeout: Duration::from_secs_f64(spec.timeout_s),
            max_bytes: spec.max_bytes as usize,
            headers,
            host,
            template,
        })
    }

    /// The document for a place; None when the place cannot be written into the address.
    pub fn ask(&self, place: Place) -> Option<Ask> {
        let scale = 10_f64.powi(DECIMALS);
        // Adding zero turns -0 into 0.
        let round = |degrees: f64| (degrees * scale).round() / scale + 0.0;
        let place = Place::new(round(place.lat_deg()), round(place.lon_deg())).ok()?;
        let Some(template) = &self.template else {
            return Some(Ask { key: 0, place, url: None });
        };
        let [lat, lon] = [place.lat_deg(), place.lon_deg()].map(|degrees| degrees.to_string());
        let url = expand(template.expose_secret(), &lat, &lon).ok()?;
        Some(Ask { key: xxh3_128(url.as_str().as_bytes()), place, url: Some(url) })
    }

    /// Takes what may be secret in address and headers out of a text that comes from a server.
    pub fn scrub(&self, text: String) -> String {
        self.secrets.scrub(text)
    }
}

/// Scheme, host and port of a filled address, once it has been checked.
fn address(url: &str) -> Result<String, String> {
    let template = UriTemplateStr::new(url).map_err(|_| "is no URL template (RFC 6570)".to_owned())?;
    for name in template.variables() {
        if !["lat", "lon"].contains(&name.as_str()) {
            return Err(format!("has {{{}}}; only {{lat}} and {{lon}} are known", name.as_str()));
        }
    }
    let url = expand(url, "0", "0")?;
    if !["http", "https"].contains(&url.scheme()) {
        return Err("must begin with http:// or https:// (or demo: for the built-in demo)".into());
    }
    let host = url.host_str().ok_or("has no host")?;
    let port = url.port().map_or(String::new(), |port| format!(":{port}"));
    Ok(format!("{}://{host}{port}", url.scheme()))
}

fn expand(template: &str, lat: &str, lon: &str) -> Result<Url, String> {
    let mut context = SimpleContext::new();
    context.insert("lat", lat);
    context.insert("lon", lon);
    let text = UriTemplateStr::new(template)
        .and_then(|template| template.expand::<UriSpec, _>(&context).map(|expanded| expanded.to_string()))
        .map_err(|_| "is no URL template (RFC 6570)".to_owned())?;
    Url::parse(&text).map_err(|error| format!("is no URL: {error}"))
}

fn header(
    name: &str,
    value: &str,
    environment: &Environment,
    filled_in: &mut Vec<String>,
) -> Result<(HeaderName, HeaderValue), String> {
    let name = name.parse::<HeaderName>().map_err(|_| "is no header name".to_owned())?;
    let filled = fill(value, environment, str::to_owned, filled_in)?;
    let mut value = HeaderValue::from_str(&filled).map_err(|_| "has a value that no header can hold".to_owned())?;
    value.set_sensitive(true);
    Ok((name, value))
}

/// Replaces each `${NAME}` by the environment as `written`; nothing else in the text is special.
fn fill(
    text: &str,
    environment: &Environment,
    written: impl Fn(&str) -> String,
    filled_in: &mut Vec<String>,
) -> Result<String, String> {
    let escaped = text.replace('\\', r"\\").replace('$', r"\$").replace(r"\${", "${");
    let template = subst::Template::from_str(&escaped).map_err(|error| format!("cannot be filled in: {error}"))?;
    let mut known = HashMap::new();
    // The library names one missing variable at a time and asks for each by its name.
    loop {
        match template.expand(&known) {
            Ok(filled) => return Ok(filled),
            Err(subst::error::ExpandError::NoSuchVariable(missing)) if !known.contains_key(&missing.name) => {
                let value = environment(&missing.name)
                    .ok_or_else(|| format!("the environment variable {} is not set", missing.name))?;
                let text = written(&value);
                filled_in.extend([value, text.clone()]);
                known.insert(missing.name, text);
            }
            Err(_) => return Err("cannot be filled in from the environment".into()),
        }
    }
}
