//! `GET /v1/outlook`: when a bow is likely, and why or why not.

use std::sync::Arc;

use axum::extract::State;
use axum::http::{HeaderName, header};
use axum::response::{IntoResponse, Response};
use bytes::Bytes;
use chrono::{DateTime, DurationRound, TimeDelta, Utc};
use moka::future::Cache;
use serde::Serialize;
use tokio::sync::Semaphore;
use utoipa::ToSchema;

use super::App;
use super::bow::{ObserverEcho, Radii};
use super::problem::{Problem, ProblemBody};
use super::query::Query;
use crate::bounds::{HOURS, STEP, THRESHOLD};
use crate::optics::water::Water;
use crate::outlook::answer::{Assumption, Outlook};
use crate::outlook::timeline::{Ask, outlook as compute};
use crate::weather::feeds::{Document, FeedError};

/// Length of an outlook where none is asked, h.
pub const DEFAULT_HOURS: f64 = 48.0;
/// Step where none is asked, min.
pub const DEFAULT_STEP_MIN: f64 = 5.0;
/// Threshold where none is asked.
pub const DEFAULT_THRESHOLD: f64 = 0.3;

/// Longest time for which a finished outlook is kept; the feed may have news by then.
const KEEP: std::time::Duration = std::time::Duration::from_secs(60);

/// Finished outlooks by question, bounded by their size, and the leave to compute one.
#[derive(Debug)]
pub struct Answers {
    finished: Cache<String, Bytes>,
    cores: Arc<Semaphore>,
}

impl Answers {
    /// Room for a number of bytes.
    pub fn new(bytes: u64) -> Self {
        let cores = std::thread::available_parallelism().map_or(1, std::num::NonZero::get);
        let finished = Cache::builder()
            .max_capacity(bytes)
            .weigher(|key: &String, body: &Bytes| u32::try_from(key.len() + body.len()).unwrap_or(u32::MAX))
            .time_to_live(KEEP)
            .build();
        Self { finished, cores: Arc::new(Semaphore::new(cores)) }
    }

    /// The leave to compute: one for each core.
    pub(super) fn cores(&self) -> Arc<Semaphore> {
        self.cores.clone()
    }
}

/// The weather that an outlook rests on.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct FeedEcho {
    /// Name of the feed.
    pub name: String,
    /// When the forecast was made, where its document says so.
    pub issued: Option<DateTime<Utc>>,
    /// When it was fetched, or last confirmed by its server.
    pub fetched: Option<DateTime<Utc>>,
    /// Seconds since then, as of the minute of the answer; null where there is no document.
    pub age_s: Option<i64>,
    /// Whether a newer document should have come by now.
    pub stale: bool,
    /// Hash of the document, so that an answer can be traced to it.
    pub document: Option<String>,
    /// Why there is no document; null where there is one.
    pub problem: Option<String>,
}

/// Radii of both bows.
#[derive(Debug, Clone, Copy, Serialize, ToSchema)]
pub struct BothRadii {
    /// Primary.
    pub primary: Radii,
    /// Secondary.
    pub secondary: Radii,
}

/// An outlook and what it rests on.
#[derive(Debug, Serialize, ToSchema)]
pub struct OutlookAnswer {
    /// Who looks.
    pub observer: ObserverEcho,
    /// The weather it rests on; null where no feed is configured.
    pub feed: Option<FeedEcho>,
    /// Ray radii from the antisolar point.
    pub radius_deg: BothRadii,
    /// Chance from which a step belongs to a window.
    pub threshold: f64,
    /// Timeline, windows, risings, assumptions, cautions.
    #[serde(flatten)]
    pub outlook: Outlook,
}

/// A question, checked.
#[derive(Debug, Clone)]
pub struct Question {
    /// What is asked of the sky.
    pub ask: Ask,
    /// Water of the drops.
    pub water: Water,
    /// Its temperature, degrees Celsius.
    pub water_temperature_c: f64,
    /// Name of the feed; none for the first.
    pub feed: Option<String>,
    /// The minute of the question.
    pub now: DateTime<Utc>,
}

/// Parameters of the question.
pub const PARAMETERS: [&str; 11] = [
    "site",
    "lat",
    "lon",
    "eye_height_m",
    "water",
    "water_temperature_c",
    "feed",
    "from",
    "hours",
    "step_min",
    "threshold",
];

/// The timeline of chance and its good windows for an observer.
#[utoipa::path(
    get, path = "/v1/outlook", tag = "computed",
    params(
        ("site" = Option<String>, Query, min_length = 1, description = "a configured site, instead of lat and lon"),
        ("lat" = Option<f64>, Query, description = "latitude, degrees"),
        ("lon" = Option<f64>, Query, description = "longitude, degrees, positive east"),
        ("eye_height_m" = Option<f64>, Query, description = "eye above the ground or water around, m; default 1.7, or the site's"),
        ("water" = inline(Option<Water>), Query, description = "fresh (rain, the default) or sea (spray, 35 g/kg)"),
        ("water_temperature_c" = Option<f64>, Query, description = "temperature of the drops, degrees Celsius; default 10; sea water up to 30"),
        ("feed" = Option<String>, Query, min_length = 1, description = "a configured feed; default the first"),
        ("from" = Option<DateTime<Utc>>, Query, description = "RFC 3339, 1950 to 2100; default the current minute"),
        ("hours" = Option<f64>, Query, description = "length, h; default 48"),
        ("step_min" = Option<f64>, Query, description = "step, min; default 5"),
        ("threshold" = Option<f64>, Query, description = "chance from which a step belongs to a window; default 0.3"),
    ),
    responses(
        (status = 200, description = "timeline and windows", body = OutlookAnswer),
        (status = 400, description = "parameters that cannot be used", body = ProblemBody, content_type = "application/problem+json"),
        (status = 503, description = "too many requests at once, or too slow", body = ProblemBody, content_type = "application/problem+json"),
    )
)]
pub(super) async fn outlook(State(app): State<App>, query: Query) -> Result<Response, Problem> {
    let question = Question::read(&app, query)?;
    let body = finished(&app, question).await?;
    let headers: [(HeaderName, &str); 2] =
        [(header::CONTENT_TYPE, "application/json"), (header::CACHE_CONTROL, "public, max-age=60")];
    Ok((headers, body).into_response())
}

impl Question {
    /// Reads a question from its parameters; the command line asks through the same door.
    ///
    /// # Errors
    /// [`Problem::BadQuery`] with every parameter that cannot be used.
    pub fn read(app: &App, mut query: Query) -> Result<Self, Problem> {
        query.only(&PARAMETERS);
        let now = minute(app.clock().now());
        let observer = query.observer(app);
        let (water, water_temperature_c) = query.water();
        let feed = query.text("feed");
        if feed.as_ref().is_some_and(|name| !app.config().feeds.iter().any(|feed| feed.name == *name)) {
            query.refuse("feed", "no such feed; /v1/feeds lists them");
        }
        let from = query.time("from").unwrap_or(now);
        let hours = query.number(&HOURS).unwrap_or(DEFAULT_HOURS);
        let step_min = query.number(&STEP).unwrap_or(DEFAULT_STEP_MIN);
        let threshold = query.number(&THRESHOLD).unwrap_or(DEFAULT_THRESHOLD);
        query.finish()?;
        let observer = observer.ok_or_else(|| Problem::Internal("an observer was neither read nor refused".into()))?;
        let radii = Radii::of(1, water, water_temperature_c)
            .ok_or_else(|| Problem::Internal("water without a stationary ray".into()))?;
        let minutes = |minutes: f64| TimeDelta::milliseconds((minutes * 60_000.0).round() as i64);
        let ask = Ask {
            observer,
            from,
            length: minutes(hours * 60.0),
            step: minutes(step_min),
            threshold,
            radius_deg: radii.red,
        };
        Ok(Self { ask, water, water_temperature_c, feed, now })
    }
}

/// The minute in which a time lies: an outlook is the same all through it, so that it can be kept.
pub fn minute(time: DateTime<Utc>) -> DateTime<Utc> {
    time.duration_trunc(TimeDelta::minutes(1)).unwrap_or(time)
}

/// The answer as bytes, computed once for all who ask the same within a minute.
async fn finished(app: &App, question: Question) -> Result<Bytes, Problem> {
    let (feed, document) = weather(app, &question).await;
    let version = document.as_ref().map(|document| document.version);
    let key = format!("{question:?} {feed:?} {version:?}");
    let answers = app.answers();
    let cores = answers.cores.clone();
    let made = answers.finished.try_get_with(key, async move {
        let permit = cores.acquire_owned().await.map_err(|error| error.to_string())?;
        let work = tokio::task::spawn_blocking(move || {
            let _permit = permit;
            let answer = assemble(&question, feed, document.as_ref()).ok_or("water without a stationary ray")?;
            serde_json::to_vec(&answer).map(Bytes::from).map_err(|error| error.to_string())
        });
        work.await.map_err(|error| error.to_string())?
    });
    made.await.map_err(|error| Problem::Internal(error.to_string()))
}

/// The answer to a question, for those who want it as values.
///
/// # Errors
/// A text when the water makes no bow, which no water does.
pub async fn answer(app: &App, question: &Question) -> Result<OutlookAnswer, String> {
    let (feed, document) = weather(app, question).await;
    assemble(question, feed, document.as_ref()).ok_or_else(|| "water without a stationary ray".into())
}

async fn weather(app: &App, question: &Question) -> (Option<FeedEcho>, Option<Document>) {
    let Some(name) = question.feed.clone().or_else(|| app.config().feeds.first().map(|feed| feed.name.clone())) else {
        return (None, None);
    };
    match app.feeds().get(&name, question.ask.observer.place).await {
        Ok(document) => {
            let echo = FeedEcho {
                name,
                issued: document.field.issued,
                fetched: Some(document.fetched),
                age_s: Some((question.now - document.fetched).num_seconds().max(0)),
                stale: document.stale,
                document: Some(format!("{:016x}", document.version)),
                problem: None,
            };
            (Some(echo), Some(document))
        }
        Err(error) => {
            let reason = match error {
                FeedError::Unknown(name) => format!("no feed is called {name:?}"),
                FeedError::NoDocument { reason, .. } => reason,
            };
            let echo = FeedEcho {
                name,
                issued: None,
                fetched: None,
                age_s: None,
                stale: true,
                document: None,
                problem: Some(reason),
            };
            (Some(echo), None)
        }
    }
}

fn assemble(question: &Question, feed: Option<FeedEcho>, document: Option<&Document>) -> Option<OutlookAnswer> {
    let radii = |order| Radii::of(order, question.water, question.water_temperature_c);
    let field = document.map(|document| document.field.as_ref());
    let mut outlook = compute(&question.ask, field, document.map(|document| document.fetched));
    if question.water == Water::Sea {
        let text = "the bow's radius is that of sea water, its prominence that of rain".into();
        outlook.assumed.push(Assumption { value: "water", text });
    }
    Some(OutlookAnswer {
        observer: ObserverEcho::of(&question.ask.observer),
        feed,
        radius_deg: BothRadii { primary: radii(1)?, secondary: radii(2)? },
        threshold: question.ask.threshold,
        outlook,
    })
}
