//! Feeds: fetching, caching, and the last good document of each.
//!
//! - `source`: a feed as configured, checked and with the environment filled in; `secrets`: what of it is never told;
//! - `http`: one exchange with its server; `freshness`: what the server says of keeping its document;
//! - `state`: what went well and wrong so far, and when to try again;
//! - `refresh`: one document fetched and read, once however many ask;
//! - `check`: a feed tried out, for its owner.

mod check;
mod freshness;
mod http;
mod refresh;
mod secrets;
mod source;
mod state;

use std::sync::{Arc, PoisonError};
use std::time::Duration;

use chrono::{DateTime, Utc};
use thiserror::Error;

pub use self::check::{CheckGap, CheckQuantity, CheckReport, CheckSpace};
use self::refresh::{Feed, Inner};
pub use self::source::SetupError;
use self::source::Source;
pub use self::state::{Failure, FeedState, Standing};
use self::state::{Good, Slot};
use super::field::{Field, Space};
use super::spec::FeedSpec;
use crate::bounds::Place;
use crate::clock::Clock;

/// How long someone who could be served an old document waits for a new one.
const PATIENCE: Duration = Duration::from_secs(1);

/// What those are told who find no document and too many waiting.
const BUSY: &str = "the feed is busy; try again";

/// Makes the document of the built-in demo for a time.
pub type Generator = Arc<dyn Fn(DateTime<Utc>) -> Vec<u8> + Send + Sync>;

/// Looks up a variable of the environment.
pub type Environment = Arc<dyn Fn(&str) -> Option<String> + Send + Sync>;

/// What feeds need from outside beyond their description.
#[derive(Clone)]
pub struct Options {
    /// Makes the documents of feeds whose URL begins with `demo:`.
    pub demo: Option<Generator>,
    /// Where `${NAME}` in addresses and headers is looked up.
    pub environment: Environment,
    /// Memory for the documents of all feeds, bytes; those not asked for longest give way.
    pub memory_bytes: u64,
}

impl Default for Options {
    fn default() -> Self {
        Self { demo: None, environment: Arc::new(|name| std::env::var(name).ok()), memory_bytes: 256 << 20 }
    }
}

/// All configured feeds with what was last read from them. Cheap to clone.
///
/// A document is fetched when it is asked for and past its time, once however many ask. Coordinates are sent with three
/// decimals, so that places within some 100 m share a document. The last good document is kept through every failure
/// and marked stale; meanwhile the server is tried again after 30 s to 30 min.
#[derive(Clone)]
pub struct Feeds(Arc<Inner>);

/// The last good answer of a feed for a place.
#[derive(Debug, Clone)]
pub struct Document {
    /// Name of the feed.
    pub feed: String,
    /// What it says.
    pub field: Arc<Field>,
    /// When it was fetched or last confirmed by the server.
    pub fetched: DateTime<Utc>,
    /// When this version of it, byte for byte, was first received: no later than `fetched`.
    pub first_seen: DateTime<Utc>,
    /// Whether a newer one should have come by now.
    pub stale: bool,
    /// Changes whenever the document's bytes change: a hash of them.
    pub version: u64,
}

impl Document {
    /// Seconds since it was fetched or confirmed; 0 if the clock was set back since.
    pub fn age_s(&self, now: DateTime<Utc>) -> i64 {
        (now - self.fetched).num_seconds().max(0)
    }
}

/// Why a feed has no answer, not even an old one.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum FeedError {
    /// No feed of that name.
    #[error("no feed is called {0:?}")]
    Unknown(String),
    /// Never answered well; the reason of the last failure.
    #[error("feed {feed:?} has no document yet: {reason}")]
    NoDocument {
        /// Name of the feed.
        feed: String,
        /// Reason of the last failure, fit for the public.
        reason: String,
    },
}

impl Feeds {
    /// Sets up the configured feeds with the process's environment and no demo; nothing is fetched yet.
    ///
    /// # Errors
    /// Every [`SetupError`] found.
    pub fn new(specs: &[FeedSpec], clock: Clock) -> Result<Self, Vec<SetupError>> {
        Self::with_options(specs, clock, Options::default())
    }

    /// Sets up the configured feeds; nothing is fetched yet. Their names are unique by configuration.
    ///
    /// # Errors
    /// Every [`SetupError`] found.
    pub fn with_options(specs: &[FeedSpec], clock: Clock, options: Options) -> Result<Self, Vec<SetupError>> {
        let (mut feeds, mut faults) = (Vec::new(), Vec::new());
        for spec in specs {
            if spec.url.starts_with("demo:") && options.demo.is_none() {
                let (feed, field, what) = (spec.name.clone(), "url".into(), "there is no demo here".into());
                faults.push(SetupError { feed, field, what });
            }
            match Source::new(spec, &options.environment) {
                Ok(source) => feeds.push(Feed::new(source)),
                Err(mut found) => faults.append(&mut found),
            }
        }
        if faults.is_empty() { Ok(Self(Arc::new(Inner::new(feeds, clock, options)))) } else { Err(faults) }
    }

    /// The document of a feed for a place: the one kept while it is fresh, else a new one. Where an old one is kept, a new
    /// one is waited for no longer than a second; a caller who leaves does not end an exchange that has begun. Of the
    /// documents of one feed 4 are fetched at a time and 32 wait; beyond that the old one is served at once.
    ///
    /// # Errors
    /// [`FeedError`] when there is none, not even an old one.
    pub async fn get(&self, name: &str, place: Place) -> Result<Document, FeedError> {
        let index = self.index(name)?;
        let feed = &self.0.feeds[index];
        let no_document = |reason: String| FeedError::NoDocument { feed: name.to_owned(), reason };
        let ask = feed.source.ask(place).ok_or_else(|| no_document("the place does not fit the address".into()))?;
        let mut slot = self.0.slot(index, &ask).await;
        let now = self.0.clock.now();
        if slot.is_due(now) && feed.held(now).is_none() {
            match self.0.flight(index, &ask) {
                None if slot.good.is_none() => return Err(no_document(BUSY.into())),
                None => {}
                Some(flight) if slot.good.is_none() => slot = flight.await,
                Some(flight) => {
                    if let Ok(landed) = tokio::time::timeout(PATIENCE, flight).await
                        && landed.good.is_some()
                    {
                        slot = landed;
                    }
                }
            }
        }
        if let Some(good) = &slot.good {
            return Ok(self.document(name, good, ask.place));
        }
        let trouble = slot.trouble.as_ref().map(|trouble| trouble.reason.clone());
        Err(no_document(trouble.or_else(|| feed.held(now)).unwrap_or_else(|| "the fetch broke off".into())))
    }

    fn document(&self, name: &str, good: &Good, place: Place) -> Document {
        let mut field = Arc::clone(&good.field);
        // A document that does not say where it holds serves wherever it is asked for.
        if !field.located && field.space != Space::Point(place) {
            Arc::make_mut(&mut field).space = Space::Point(place);
        }
        Document {
            feed: name.to_owned(),
            field,
            fetched: good.fetched,
            first_seen: good.first_seen,
            stale: good.is_stale(self.0.clock.now()),
            version: good.version,
        }
    }

    /// State of every feed, in the order of the configuration.
    pub fn states(&self) -> Vec<FeedState> {
        let now = self.0.clock.now();
        let mut documents = vec![0_u64; self.0.feeds.len()];
        for (key, slot) in &self.0.slots {
            documents[key.0] += u64::from(slot.good.is_some());
        }
        let state = |(feed, documents): (&Feed, u64)| {
            let ledger = feed.ledger.lock().unwrap_or_else(PoisonError::into_inner);
            FeedState {
                name: feed.source.spec.name.clone(),
                format: feed.source.spec.format,
                state: ledger.standing(now),
                host: feed.source.host.clone(),
                documents,
                last_success: ledger.last_success,
                age_s: ledger.last_success.map(|last| (now - last).num_seconds().max(0)),
                last_failure: ledger.last_failure.clone(),
                next_try: ledger.next_try,
                consecutive_failures: ledger.consecutive,
            }
        };
        self.0.feeds.iter().zip(documents).map(state).collect()
    }

    /// Names of the feeds, in the order of the configuration.
    pub fn names(&self) -> impl Iterator<Item = &str> {
        self.0.feeds.iter().map(|feed| feed.source.spec.name.as_str())
    }

    fn index(&self, name: &str) -> Result<usize, FeedError> {
        self.names().position(|known| known == name).ok_or_else(|| FeedError::Unknown(name.to_owned()))
    }
}

impl std::fmt::Debug for Feeds {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_list().entries(self.names()).finish()
    }
}

impl Slot {
    fn weight(&self) -> usize {
        self.good.as_ref().map_or(0, |good| good.field.bytes())
    }
}

#[cfg(test)]
mod tests;
