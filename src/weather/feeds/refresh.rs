//! One document fetched and read, once however many ask.

use std::collections::HashMap;
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

use chrono::{DateTime, Utc};
use futures_util::FutureExt;
use futures_util::future::{BoxFuture, Shared, WeakShared};
use moka::future::Cache;
use moka::policy::EvictionPolicy;
use reqwest::Client;
use reqwest::header::HeaderMap;
use tokio::sync::Semaphore;
use tracing::{info, warn};
use xxhash_rust::xxh3::xxh3_64;

use super::freshness::Freshness;
use super::http::{self, Answer, Fault, Reply};
use super::source::{Ask, Source};
use super::state::{Good, Ledger, Slot, Trouble, delta};
use super::{Generator, Options};
use crate::clock::Clock;
use crate::weather::field::Field;
use crate::weather::read::read;

/// Most documents kept, of all feeds.
const MOST_DOCUMENTS: u64 = 4096;

/// Most exchanges with one feed's server at a time.
const MOST_EXCHANGES: usize = 4;

/// Most documents of one feed that wait for their exchange.
const MOST_WAITING: usize = 32;

/// Which feed and which of its documents.
pub(super) type Key = (usize, u128);

/// The fetch of one document, for all who wait for it.
type Fetching = BoxFuture<'static, Arc<Slot>>;

/// A feed with its history.
pub(super) struct Feed {
    pub source: Source,
    pub ledger: Mutex<Ledger>,
    /// Those that wait and those that are exchanged.
    seats: Arc<Semaphore>,
    exchanges: Arc<Semaphore>,
}

impl Feed {
    pub fn new(source: Source) -> Self {
        Self {
            source,
            ledger: Mutex::default(),
            seats: Arc::new(Semaphore::new(MOST_EXCHANGES + MOST_WAITING)),
            exchanges: Arc::new(Semaphore::new(MOST_EXCHANGES)),
        }
    }

    /// Why no document of this feed is asked for now, while it is in trouble as a whole.
    pub fn held(&self, now: DateTime<Utc>) -> Option<String> {
        let ledger = self.ledger.lock().unwrap_or_else(PoisonError::into_inner);
        ledger.trouble.as_ref().filter(|trouble| trouble.holds(now)).map(|trouble| trouble.reason.clone())
    }
}

/// What all clones of the feeds share.
pub(super) struct Inner {
    pub feeds: Vec<Feed>,
    pub clock: Clock,
    /// Kept by size, never by time: the last good document must outlive its freshness.
    pub slots: Cache<Key, Arc<Slot>>,
    flights: Mutex<HashMap<Key, WeakShared<Fetching>>>,
    client: OnceLock<Result<Client, String>>,
    demo: Option<Generator>,
    memory_bytes: u64,
}

/// A document as fetched, before it is read.
pub(super) enum Fetched {
    Document(Answer),
    Made(Vec<u8>),
    NotModified(HeaderMap),
}

impl Inner {
    pub fn new(feeds: Vec<Feed>, clock: Clock, options: Options) -> Self {
        let least = (options.memory_bytes / MOST_DOCUMENTS) as usize;
        let slots = Cache::builder()
            .max_capacity(options.memory_bytes)
            .eviction_policy(EvictionPolicy::lru())
            .weigher(move |_, slot: &Arc<Slot>| u32::try_from(slot.weight().max(least)).unwrap_or(u32::MAX))
            .build();
        Self {
            feeds,
            clock,
            slots,
            flights: Mutex::default(),
            client: OnceLock::new(),
            demo: options.demo,
            memory_bytes: options.memory_bytes,
        }
    }

    pub async fn slot(&self, index: usize, ask: &Ask) -> Arc<Slot> {
        self.slots.get(&(index, ask.key)).await.unwrap_or_default()
    }

    /// The fetch under way for a document, begun if there is none; none where the feed is busy. It gives up its place in
    /// the queue when all who wait for it leave, but once its exchange has begun it goes on without them.
    pub fn flight(self: &Arc<Self>, index: usize, ask: &Ask) -> Option<Shared<Fetching>> {
        let key = (index, ask.key);
        let mut flights = self.flights.lock().unwrap_or_else(PoisonError::into_inner);
        flights.retain(|_, flight| flight.upgrade().is_some_and(|flight| flight.peek().is_none()));
        if let Some(flight) = flights.get(&key).and_then(WeakShared::upgrade) {
            return Some(flight);
        }
        let feed = &self.feeds[index];
        let seat = Arc::clone(&feed.seats).try_acquire_owned().ok()?;
        let exchanges = Arc::clone(&feed.exchanges);
        let (inner, ask) = (Arc::clone(self), ask.clone());
        let flight = async move {
            let turn = exchanges.acquire_owned().await;
            // Keeps the flight on the list until the exchange ends, though all may leave.
            let listed = inner.flying(key);
            let exchange = tokio::spawn(async move {
                let slot = inner.refresh(index, &ask).await;
                drop((seat, turn, listed));
                slot
            });
            exchange.await.unwrap_or_else(|_| Arc::new(interrupted()))
        };
        let flight = flight.boxed().shared();
        flights.insert(key, flight.downgrade()?);
        Some(flight)
    }

    /// A flight that someone waits for.
    fn flying(&self, key: Key) -> Option<Shared<Fetching>> {
        self.flights.lock().unwrap_or_else(PoisonError::into_inner).get(&key).and_then(WeakShared::upgrade)
    }

    async fn refresh(&self, index: usize, ask: &Ask) -> Arc<Slot> {
        let feed = &self.feeds[index];
        let before = self.slot(index, ask).await;
        let now = self.clock.now();
        // What was waited for may have come, or the feed failed, in the meantime.
        if !before.is_due(now) || feed.held(now).is_some() {
            return before;
        }
        let name = &feed.source.spec.name;
        let outcome = self.obtain(feed, ask, before.good.as_deref()).await;
        let now = self.clock.now();
        let mut ledger_entry = Ok(());
        let slot = Arc::new(match outcome {
            Ok(good) => Slot { good: Some(Arc::new(good)), trouble: None },
            Err(mut fault) => {
                fault.reason = feed.source.scrub(fault.reason);
                warn!(feed = %name, reason = %fault.reason, status = fault.status, "fetch failed");
                let trouble = Trouble::after(before.trouble.as_ref(), &fault, now);
                ledger_entry = Err(fault);
                Slot { good: before.good.clone(), trouble: Some(trouble) }
            }
        });
        self.slots.insert((index, ask.key), Arc::clone(&slot)).await;
        // The cache would put eviction off and meanwhile hold more than it may.
        self.slots.run_pending_tasks().await;
        let mut ledger = feed.ledger.lock().unwrap_or_else(PoisonError::into_inner);
        match (&ledger_entry, slot.good.as_deref(), &slot.trouble) {
            (Err(fault), _, Some(trouble)) => ledger.failed(fault, trouble, now),
            (_, Some(good), _) => ledger.succeeded(good),
            _ => {}
        }
        drop(ledger);
        slot
    }

    /// A new document, or the one kept confirmed.
    async fn obtain(&self, feed: &Feed, ask: &Ask, kept: Option<&Good>) -> Result<Good, Fault> {
        let refresh = feed.source.refresh;
        let conditions = match kept.and_then(|good| good.freshness.as_ref()) {
            Some(freshness) => freshness.conditions(self.clock.now()),
            None => HeaderMap::new(),
        };
        let fetched = self.fetch(feed, ask, conditions).await?;
        let now = self.clock.now();
        let (body, freshness, status) = match (fetched, kept) {
            (Fetched::Made(body), _) => (body, None, None),
            (Fetched::Document(answer), _) => {
                let freshness = Freshness::new(&answer.headers, now, refresh);
                (answer.body, Some(freshness), Some(answer.status))
            }
            (Fetched::NotModified(headers), Some(kept)) => {
                let confirmed = kept.freshness.as_ref().and_then(|fresh| fresh.confirmed(&headers, now, refresh));
                let freshness =
                    confirmed.ok_or_else(|| Fault::document("the server confirmed another document", Some(304)))?;
                info!(feed = %feed.source.spec.name, "confirmed");
                return Ok(Good {
                    field: Arc::clone(&kept.field),
                    version: kept.version,
                    first_seen: kept.first_seen,
                    fetched: now,
                    fresh_until: now + delta(freshness.lifetime),
                    freshness: Some(freshness),
                });
            }
            (Fetched::NotModified(_), None) => {
                return Err(Fault::document("\"not modified\", though no document was kept", Some(304)));
            }
        };
        let (bytes, version) = (body.len(), xxh3_64(&body));
        let (field, first_seen) = match kept {
            Some(kept) if kept.version == version => (Arc::clone(&kept.field), kept.first_seen),
            _ => (Arc::new(understand(feed, ask, body, status).await?), now),
        };
        if field.bytes() as u64 > self.memory_bytes / 2 {
            return Err(Fault::document("the document is too large for the memory of the feeds", status));
        }
        info!(feed = %feed.source.spec.name, bytes, "fetched");
        let lifetime = freshness.as_ref().map_or(refresh, |freshness| freshness.lifetime);
        Ok(Good { field, version, first_seen, fetched: now, fresh_until: now + delta(lifetime), freshness })
    }

    /// Asks the server, or the demo.
    pub async fn fetch(&self, feed: &Feed, ask: &Ask, conditions: HeaderMap) -> Result<Fetched, Fault> {
        let now = self.clock.now();
        let Some(url) = ask.url.clone() else {
            let demo = self.demo.clone().ok_or_else(|| Fault::document("there is no demo here", None))?;
            return tokio::task::spawn_blocking(move || Fetched::Made(demo(now)))
                .await
                .map_err(|_| Fault::document("the demo broke off", None));
        };
        let client = self.client.get_or_init(http::client).as_ref();
        let client = client.map_err(|what| Fault::document(format!("no HTTP client: {what}"), None))?;
        http::exchange(client, &feed.source, url, conditions, now).await.map(|reply| match reply {
            Reply::Document(answer) => Fetched::Document(answer),
            Reply::NotModified(headers) => Fetched::NotModified(headers),
        })
    }
}

/// Reads a document away from the threads that serve.
pub(super) async fn understand(feed: &Feed, ask: &Ask, body: Vec<u8>, status: Option<u16>) -> Result<Field, Fault> {
    let (spec, place) = (feed.source.spec.clone(), ask.place);
    match tokio::task::spawn_blocking(move || read(&body, &spec, place)).await {
        Ok(Ok(mut field)) => {
            field.notes = field.notes.into_iter().map(|note| feed.source.scrub(note)).collect();
            Ok(field)
        }
        Ok(Err(error)) => Err(Fault::document(error.to_string(), status)),
        Err(_) => Err(Fault::document("reading the document broke off", status)),
    }
}

/// What is left of a fetch that did not end: nothing, until someone asks again.
fn interrupted() -> Slot {
    Slot::default()
}
