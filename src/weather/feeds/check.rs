//! A feed tried out, for its owner: fetched past the cache, read, and what was understood told.

use chrono::{DateTime, Utc};
use reqwest::header::{CONTENT_TYPE, HeaderMap};
use serde::Serialize;

use super::refresh::{self, Fetched};
use super::{FeedError, Feeds};
use crate::bounds::Place;
use crate::weather::field::{Field, Space};
use crate::weather::quantity::Quantity;
use crate::weather::spec::Format;

/// What a feed's document says, or why it cannot be read.
#[derive(Debug, Clone, Serialize)]
pub struct CheckReport {
    /// Name of the feed.
    pub feed: String,
    /// How it is read.
    pub format: Format,
    /// Scheme and host of its server.
    pub host: String,
    /// HTTP status, where the server answered.
    pub status: Option<u16>,
    /// Size of the document after decompression, bytes.
    pub bytes: Option<usize>,
    /// What the server says it is.
    pub content_type: Option<String>,
    /// Why it could not be fetched or read; none when all went well.
    pub error: Option<String>,
    /// When the forecast was made, where the document says so.
    pub issued: Option<DateTime<Utc>>,
    /// Where its values stand; none when it could not be read.
    pub space: Option<CheckSpace>,
    /// Whether the document itself says where its values stand.
    pub located: bool,
    /// The quantities understood.
    pub quantities: Vec<CheckQuantity>,
    /// The quantities that the document does not give.
    pub absent: Vec<Quantity>,
    /// What the reader passed over.
    pub notes: Vec<String>,
    /// What was read; none when it could not be.
    #[serde(skip)]
    pub field: Option<Field>,
}

/// Where the values of a document stand.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum CheckSpace {
    /// At one place.
    Point {
        /// Latitude, degrees.
        lat: f64,
        /// Longitude, degrees.
        lon: f64,
    },
    /// On a grid.
    Grid {
        /// Southernmost latitude, degrees.
        south: f64,
        /// Westernmost longitude, degrees.
        west: f64,
        /// Northernmost latitude, degrees.
        north: f64,
        /// Easternmost longitude, degrees; may run beyond 180.
        east: f64,
        /// Rows.
        rows: usize,
        /// Columns.
        columns: usize,
    },
}

/// What was understood of one quantity.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CheckQuantity {
    /// The quantity.
    pub quantity: Quantity,
    /// Pointer or parameter where it stands in the document.
    pub at: String,
    /// Unit in the document (UCUM).
    pub unit_read: String,
    /// Unit of the figures here (UCUM).
    pub unit_kept: String,
    /// Values kept.
    pub count: usize,
    /// Values missing or left out.
    pub missing: usize,
    /// First moment covered.
    pub first: Option<DateTime<Utc>>,
    /// Last moment covered.
    pub last: Option<DateTime<Utc>>,
    /// Spans between them about which it says nothing.
    pub gaps: Vec<CheckGap>,
    /// Least value.
    pub min: f32,
    /// Greatest value.
    pub max: f32,
}

/// A span of time about which a quantity says nothing.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CheckGap {
    /// Its start.
    pub start: Option<DateTime<Utc>>,
    /// Its end.
    pub end: Option<DateTime<Utc>>,
}

impl Feeds {
    /// Fetches a document past the cache and tells what was understood of it. What is kept does not change.
    ///
    /// # Errors
    /// [`FeedError::Unknown`]; all else that goes wrong is told in the report.
    pub async fn check(&self, name: &str, place: Place) -> Result<CheckReport, FeedError> {
        let feed = &self.0.feeds[self.index(name)?];
        let mut report = CheckReport {
            feed: name.to_owned(),
            format: feed.source.spec.format,
            host: feed.source.host.clone(),
            status: None,
            bytes: None,
            content_type: None,
            error: None,
            issued: None,
            space: None,
            located: false,
            quantities: Vec::new(),
            absent: Vec::new(),
            notes: Vec::new(),
            field: None,
        };
        let Some(ask) = feed.source.ask(place) else {
            report.error = Some("the place does not fit the address".into());
            return Ok(report);
        };
        let body = match self.0.fetch(feed, &ask, HeaderMap::new()).await {
            Ok(Fetched::Document(answer)) => {
                report.status = Some(answer.status);
                let kind = answer.headers.get(CONTENT_TYPE).and_then(|kind| kind.to_str().ok());
                report.content_type = kind.map(|kind| feed.source.scrub(kind.to_owned()));
                answer.body
            }
            Ok(Fetched::Made(body)) => body,
            Ok(Fetched::NotModified(_)) => Vec::new(),
            Err(fault) => {
                report.status = fault.status;
                report.error = Some(feed.source.scrub(fault.reason));
                return Ok(report);
            }
        };
        report.bytes = Some(body.len());
        match refresh::understand(feed, &ask, body, report.status).await {
            Ok(field) => {
                report.tell(&field);
                report.field = Some(field);
            }
            Err(fault) => report.error = Some(feed.source.scrub(fault.reason)),
        }
        Ok(report)
    }
}

impl CheckReport {
    fn tell(&mut self, field: &Field) {
        self.issued = field.issued;
        self.located = field.located;
        self.space = Some(match &field.space {
            Space::Point(place) => CheckSpace::Point { lat: place.lat_deg(), lon: place.lon_deg() },
            Space::Grid { lats_deg, lons_deg } => CheckSpace::Grid {
                south: lats_deg[0],
                west: lons_deg[0],
                north: lats_deg[lats_deg.len() - 1],
                east: lons_deg[lons_deg.len() - 1],
                rows: lats_deg.len(),
                columns: lons_deg.len(),
            },
        });
        self.notes.clone_from(&field.notes);
        for quantity in Quantity::ALL {
            match understood(field, quantity) {
                Some(understood) => self.quantities.push(understood),
                None => self.absent.push(quantity),
            }
        }
    }
}

fn understood(field: &Field, quantity: Quantity) -> Option<CheckQuantity> {
    let series = field.series(quantity)?;
    let origin = field.origins.get(&quantity);
    let kept = || series.values.iter().copied().filter(|value| !value.is_nan());
    let moment = |time_s| DateTime::from_timestamp(time_s, 0);
    let extent = series.times.extent();
    Some(CheckQuantity {
        quantity,
        at: origin.map_or_else(String::new, |origin| origin.at.clone()),
        unit_read: origin.map_or_else(String::new, |origin| origin.unit.to_owned()),
        unit_kept: quantity.unit().to_owned(),
        count: kept().count(),
        missing: origin.map_or(0, |origin| origin.missing),
        first: extent.and_then(|extent| moment(extent.0)),
        last: extent.and_then(|extent| moment(extent.1)),
        gaps: series
            .times
            .gaps()
            .into_iter()
            .map(|(start, end)| CheckGap { start: moment(start), end: moment(end) })
            .collect(),
        min: kept().fold(f32::INFINITY, f32::min),
        max: kept().fold(f32::NEG_INFINITY, f32::max),
    })
}
