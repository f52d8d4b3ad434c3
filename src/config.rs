//! The one reader of configuration: the documented defaults, then a file or the built-in demo, then the environment.

use std::collections::HashSet;
use std::net::SocketAddr;
use std::path::Path;

use figment::Figment;
use figment::error::Kind;
use figment::providers::{Env, Format as _, Toml};
use serde::Deserialize;
use thiserror::Error;

use crate::bounds::{
    ANSWERS, BODY, CONNECTIONS, DOCUMENTS, EYE_HEIGHT, GROUND, LAT, LON, Place, REQUEST_TIME, REQUESTS,
};
use crate::sky::horizon::Skyline;
use crate::sky::observer::Observer;
use crate::weather::spec::FeedSpec;

/// Every key with its default, as documented for users.
pub const DEFAULTS: &str = include_str!("../config/rainward.toml");

/// The configuration of the built-in demo.
pub const DEMO: &str = include_str!("../config/demo/demo.toml");

/// A checked configuration.
#[derive(Debug, Clone)]
pub struct Config {
    /// Where the service listens.
    pub listen: SocketAddr,
    /// Limits of the service.
    pub limits: Limits,
    /// How it logs.
    pub log: Log,
    /// Observers with a name.
    pub sites: Vec<Site>,
    /// Weather feeds; the first is the default.
    pub feeds: Vec<FeedSpec>,
}

/// Limits of the service.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Limits {
    /// Connections open at once.
    pub connections: usize,
    /// Requests answered at once.
    pub requests: usize,
    /// Longest time for one answer, s.
    pub request_s: u64,
    /// Longest request body, bytes.
    pub body_bytes: usize,
    /// Memory for weather documents, 10^6 bytes.
    pub documents_mb: u64,
    /// Memory for finished outlooks, 10^6 bytes.
    pub answers_mb: u64,
}

/// How the service logs.
#[derive(Debug, Clone, PartialEq, Eq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Log {
    /// Level or filter.
    pub level: String,
    /// Form of a line.
    pub format: LogFormat,
}

/// Form of a log line.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum LogFormat {
    /// For people.
    Text,
    /// One JSON object a line.
    Json,
}

/// An observer with a name.
#[derive(Debug, Clone, PartialEq)]
pub struct Site {
    /// Name in URLs.
    pub name: String,
    /// Name for people.
    pub label: String,
    /// Who looks from there.
    pub observer: Observer,
}

/// Why a configuration was refused: one line per problem.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("the configuration is not usable:\n{}", .0.iter().map(|line| format!("  {line}")).collect::<Vec<_>>().join("\n"))]
pub struct ConfigError(pub Vec<String>);

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Raw {
    listen: String,
    limits: Limits,
    log: Log,
    #[serde(default)]
    sites: Vec<RawSite>,
    #[serde(default)]
    feeds: Vec<FeedSpec>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct RawSite {
    name: String,
    label: Option<String>,
    lat: f64,
    lon: f64,
    #[serde(default)]
    ground_m: f64,
    #[serde(default = "default_eye_height_m")]
    eye_height_m: f64,
    #[serde(default)]
    skyline: Vec<(f64, f64)>,
}

/// Height of a standing observer's eye, m.
pub fn default_eye_height_m() -> f64 {
    1.7
}

/// Loads the configuration from a file, or the built-in demo where there is none.
///
/// # Errors
/// [`ConfigError`] with every problem found.
pub fn load(file: Option<&Path>) -> Result<Config, ConfigError> {
    let text = match file {
        Some(path) => {
            std::fs::read_to_string(path).map_err(|error| ConfigError(vec![format!("{}: {error}", path.display())]))?
        }
        None => DEMO.to_owned(),
    };
    read(&text, Env::prefixed("RAINWARD_").ignore(&["config"]).split("__"))
}

/// Reads a configuration from text and a layer of environment variables.
///
/// # Errors
/// [`ConfigError`] with every problem found; of values of a wrong type and unknown keys only the first.
pub fn read(text: &str, environment: Env) -> Result<Config, ConfigError> {
    let layers = Figment::from(Toml::string(DEFAULTS)).merge(Toml::string(text)).merge(environment);
    let raw: Raw =
        layers.extract().map_err(|errors| ConfigError(errors.into_iter().map(|error| describe(&error)).collect()))?;
    check(raw).map_err(ConfigError)
}

/// The known name that is most like an unknown one, where one is like it at all.
pub fn nearest<'a>(name: &str, known: &[&'a str]) -> Option<&'a str> {
    let likeness = |known: &str| strsim::jaro_winkler(name, known);
    known.iter().copied().max_by(|a, b| likeness(a).total_cmp(&likeness(b))).filter(|best| likeness(best) > 0.7)
}

fn describe(error: &figment::Error) -> String {
    let path = error.path.join(".");
    let at = if path.is_empty() { String::new() } else { format!("{path}: ") };
    let hint = |name: &str, known: &[&'static str]| {
        nearest(name, known).map_or_else(String::new, |best| format!("; did you mean `{best}`?"))
    };
    match &error.kind {
        Kind::UnknownField(name, known) => format!("{at}unknown key `{name}`{}", hint(name, known)),
        Kind::UnknownVariant(name, known) => format!("{at}unknown word `{name}`{}", hint(name, known)),
        Kind::MissingField(name) => format!("{at}missing key `{name}`"),
        kind => format!("{at}{kind}"),
    }
}

fn check(raw: Raw) -> Result<Config, Vec<String>> {
    let mut problems = Vec::new();
    let listen = raw.listen.parse::<SocketAddr>();
    if listen.is_err() {
        problems.push(format!("listen: {:?} is not an address with a port, such as 127.0.0.1:8080", raw.listen));
    }
    let limits = &raw.limits;
    for (range, value) in [
        (CONNECTIONS, limits.connections as u64),
        (REQUESTS, limits.requests as u64),
        (REQUEST_TIME, limits.request_s),
        (BODY, limits.body_bytes as u64),
        (DOCUMENTS, limits.documents_mb),
        (ANSWERS, limits.answers_mb),
    ] {
        problems.extend(range.check(value as f64).err().map(|error| format!("limits.{}: {error}", range.name)));
    }
    problems.extend(log_problem(&raw.log.level).map(|problem| format!("log.level: {problem}")));
    let mut names = HashSet::new();
    let sites = raw.sites.into_iter().enumerate().filter_map(|(index, raw)| {
        let at = format!("sites.{index}");
        problems.extend(name_problem(&raw.name, &mut names).map(|problem| format!("{at}.name: {problem}")));
        match site(raw) {
            Ok(site) => Some(site),
            Err(found) => {
                problems.extend(found.into_iter().map(|(key, what)| format!("{at}.{key}: {what}")));
                None
            }
        }
    });
    let sites = sites.collect();
    names.clear();
    for (index, feed) in raw.feeds.iter().enumerate() {
        problems.extend(name_problem(&feed.name, &mut names).map(|problem| format!("feeds.{index}.name: {problem}")));
    }
    match listen {
        Ok(listen) if problems.is_empty() => {
            Ok(Config { listen, limits: raw.limits, log: raw.log, sites, feeds: raw.feeds })
        }
        _ => Err(problems),
    }
}

/// A bare word of a filter that is no level would be taken for the name of a module and silence the log.
fn log_problem(level: &str) -> Option<String> {
    let levels = ["off", "error", "warn", "info", "debug", "trace"];
    let word = level.split(',').map(str::trim).find(|part| !part.contains('=') && !levels.contains(part))?;
    Some(format!("{word:?} must be one of {}, or a filter such as rainward=debug,info", levels.join(", ")))
}

fn name_problem(name: &str, taken: &mut HashSet<String>) -> Option<String> {
    let plain = !name.is_empty()
        && name.len() <= 64
        && name.chars().all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-');
    if !plain {
        return Some(format!("{name:?} must be 1 to 64 small letters, digits and hyphens"));
    }
    (!taken.insert(name.to_owned())).then(|| format!("{name:?} is taken twice"))
}

fn site(raw: RawSite) -> Result<Site, Vec<(&'static str, String)>> {
    let mut problems = Vec::new();
    let numbers = [
        ("lat", LAT, raw.lat),
        ("lon", LON, raw.lon),
        ("ground_m", GROUND, raw.ground_m),
        ("eye_height_m", EYE_HEIGHT, raw.eye_height_m),
    ];
    for (key, range, value) in numbers {
        problems.extend(range.check(value).err().map(|error| (key, error.to_string())));
    }
    let skyline = Skyline::new(&raw.skyline).map_err(|error| problems.push(("skyline", error.to_string())));
    match (Place::new(raw.lat, raw.lon), skyline) {
        (Ok(place), Ok(skyline)) if problems.is_empty() => Ok(Site {
            label: raw.label.unwrap_or_else(|| raw.name.clone()),
            observer: Observer::new(place, raw.ground_m, raw.eye_height_m, skyline),
            name: raw.name,
        }),
        _ => Err(problems),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn from_text(text: &str) -> Result<Config, ConfigError> {
        read(text, Env::prefixed("RAINWARD_NO_SUCH_LAYER_"))
    }

    #[test]
    fn defaults_and_demo_are_usable() {
        assert_eq!(from_text("").unwrap().listen.port(), 8080);
        let demo = from_text(DEMO).unwrap();
        assert!(demo.sites.len() >= 3 && demo.feeds.len() == 1);
    }

    #[test]
    fn an_unknown_key_is_refused_with_the_nearest_known_one() {
        let top = from_text("lisen = \"127.0.0.1:1\"").unwrap_err().to_string();
        assert!(top.contains("unknown key `lisen`; did you mean `listen`?"), "{top}");
        let site = from_text("[[sites]]\nname = \"a\"\nlat = 1\nlon = 1\neye_hight_m = 2").unwrap_err().to_string();
        assert!(site.contains("did you mean `eye_height_m`?"), "{site}");
    }

    #[test]
    fn every_problem_is_named_with_its_bound() {
        let text = r#"
            listen = "nowhere"
            [[sites]]
            name = "A b"
            lat = 91
            lon = -181
            skyline = [[10, 95]]
            [[sites]]
            name = "quay"
            lat = 1
            lon = 1
            [[sites]]
            name = "quay"
            lat = 1
            lon = 1
        "#;
        let problems = from_text(text).unwrap_err().0;
        for part in
            ["listen: ", "sites.0.name: ", "between -90 and 90", "between -180 and 180", "skyline point 0", "twice"]
        {
            assert!(problems.iter().any(|problem| problem.contains(part)), "{part} not in {problems:?}");
        }
    }
}
