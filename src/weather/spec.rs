//! What the configuration says of a feed: where it is, how it is read.

use std::collections::BTreeMap;

use chrono_tz::Tz;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use super::quantity::Quantity;
use super::unit::Unit;

/// A configured weather source, as written in the configuration.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FeedSpec {
    /// Name used in queries and answers.
    pub name: String,
    /// URL template (RFC 6570) with `{lat}` and `{lon}`, filled in with three decimals so that places within some 100 m
    /// share a document; `${NAME}` is taken from the environment. `demo:` is the built-in demo.
    pub url: String,
    /// How the document is read.
    pub format: Format,
    /// How long a document counts as fresh when its server does not say, minutes.
    #[serde(default = "default_refresh_min")]
    pub refresh_min: f64,
    /// How long the server may take to answer in full, seconds.
    #[serde(default = "default_timeout_s")]
    pub timeout_s: f64,
    /// Size limit after decompression, bytes.
    #[serde(default = "default_max_bytes")]
    pub max_bytes: u64,
    /// Request headers; `${NAME}` is taken from the environment.
    #[serde(default)]
    pub headers: BTreeMap<String, String>,
    /// Mapping for `format = "json"`.
    pub json: Option<JsonMapping>,
    /// Mapping for `format = "coveragejson"`, where CF standard names do not tell.
    pub coveragejson: Option<CoverageMapping>,
}

fn default_refresh_min() -> f64 {
    15.0
}

fn default_timeout_s() -> f64 {
    10.0
}

fn default_max_bytes() -> u64 {
    20_000_000
}

/// A weather format that can be read.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum Format {
    /// JSON read through a mapping of RFC 6901 pointers.
    Json,
    /// OGC CoverageJSON 1.0.
    Coveragejson,
}

/// How values are found in a JSON document.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct JsonMapping {
    /// Pointer to a list with one object per step; absent where values are arrays side by side.
    pub steps: Option<String>,
    /// Pointer to the time, within a step or to the array of times.
    pub time: String,
    /// How times are written.
    #[serde(default)]
    pub time_format: TimeFormat,
    /// Zone of times written without an offset (IANA).
    #[serde(default = "utc")]
    pub time_zone: Tz,
    /// Pointer from the root to the time at which the forecast was made, written like the other times.
    pub issued: Option<String>,
    /// Pointers from the root to the latitude and longitude of the values, where the document tells.
    pub lat: Option<String>,
    /// See `lat`.
    pub lon: Option<String>,
    /// The values, by quantity.
    pub values: BTreeMap<Quantity, ValueMapping>,
}

fn utc() -> Tz {
    Tz::UTC
}

/// How times are written in a JSON document.
#[derive(Debug, Clone, PartialEq, Eq, Default, Deserialize)]
#[serde(from = "String")]
pub enum TimeFormat {
    /// RFC 3339 with an offset.
    #[default]
    Rfc3339,
    /// Seconds since 1970.
    UnixS,
    /// Milliseconds since 1970.
    UnixMs,
    /// A strftime pattern.
    Pattern(String),
}

impl From<String> for TimeFormat {
    fn from(text: String) -> Self {
        match text.as_str() {
            "rfc3339" => Self::Rfc3339,
            "unix_s" => Self::UnixS,
            "unix_ms" => Self::UnixMs,
            _ => Self::Pattern(text),
        }
    }
}

/// Where one value stands in a JSON document and what it means.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ValueMapping {
    /// Pointer within a step, or to an array beside the times.
    pub at: String,
    /// Unit of the number (UCUM).
    pub unit: Unit,
    /// Period over which an amount of rain was gathered or its rate averaged, minutes.
    pub over_min: Option<f64>,
    /// Whether that period lies before or after the time stamp.
    pub period: Option<Side>,
    /// Pointer within a step to the time at which the period of an amount began, in place of `over_min` and `period`;
    /// the period ends at the step's time. For feeds whose periods change along the forecast.
    pub since: Option<String>,
    /// Numbers that stand for a missing value.
    #[serde(default)]
    pub missing: Vec<f64>,
    /// Value at steps of a list where `at` points to nothing, for feeds that leave out what is zero; without it such a
    /// value is missing.
    pub absent: Option<f64>,
    /// What the cloud base is measured from; default: the ground.
    pub above: Option<Above>,
}

/// What a height is measured from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Above {
    /// The ground below.
    Ground,
    /// Mean sea level.
    Sea,
}

impl ValueMapping {
    /// Whether anything is said of a period.
    pub fn has_period(&self) -> bool {
        self.over_min.is_some() || self.period.is_some() || self.since.is_some()
    }
}

/// Side of the time stamp on which a period lies.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum Side {
    /// The period ends at the time stamp.
    Before,
    /// The period begins at the time stamp.
    After,
}

/// How parameters of a CoverageJSON document are recognised where CF standard names do not tell.
#[derive(Debug, Clone, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CoverageMapping {
    /// Parameter key by quantity.
    #[serde(default)]
    pub parameters: BTreeMap<Quantity, String>,
    /// Unit (UCUM) by quantity, where the document gives none or a wrong one.
    #[serde(default)]
    pub units: BTreeMap<Quantity, Unit>,
    /// Period over which amounts of rain were gathered, minutes; default: the step of the time axis.
    pub over_min: Option<f64>,
    /// Side of the time stamp on which that period lies; default: before, as CF time bounds usually have it.
    pub period: Option<Side>,
    /// What the cloud base is measured from; default: the sea for the CF standard name `cloud_base_altitude`, else the
    /// ground.
    pub above: Option<Above>,
}
