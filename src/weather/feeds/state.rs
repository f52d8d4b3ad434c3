//! What is known of each feed and document: when it was last good, what went wrong, when to try again.

use std::sync::Arc;
use std::time::Duration;

use backon::{BackoffBuilder, ExponentialBuilder};
use chrono::{DateTime, TimeDelta, Utc};
use serde::Serialize;
use utoipa::ToSchema;

use super::freshness::Freshness;
use super::http::Fault;
use crate::weather::field::Field;
use crate::weather::spec::Format;

/// State of a feed, without its secrets.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct FeedState {
    /// Name of the feed.
    pub name: String,
    /// How its documents are read.
    pub format: Format,
    /// How it stands, by the most recent exchange.
    pub state: Standing,
    /// Scheme and host of its server, never more of the address.
    pub host: String,
    /// Documents kept, one per place asked for.
    pub documents: u64,
    /// When a document was last fetched or confirmed.
    pub last_success: Option<DateTime<Utc>>,
    /// Seconds since then.
    pub age_s: Option<i64>,
    /// The most recent failure, also after it was overcome.
    pub last_failure: Option<Failure>,
    /// Before this the server is not asked again.
    pub next_try: Option<DateTime<Utc>>,
    /// Exchanges that failed one after another up to now.
    pub consecutive_failures: u32,
}

/// How a feed stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum Standing {
    /// Nobody has asked for it yet.
    NeverFetched,
    /// The document last fetched is within its time.
    Fresh,
    /// The document last fetched is past its time; the next request fetches it anew.
    Stale,
    /// The last exchange failed.
    Failing,
}

/// A failed exchange.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, ToSchema)]
pub struct Failure {
    /// When it failed.
    pub time: DateTime<Utc>,
    /// Why.
    pub reason: String,
    /// HTTP status, where the server answered.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub status: Option<u16>,
}

/// Failures in a row, of a document or of a whole feed.
#[derive(Debug, Clone)]
pub(super) struct Trouble {
    pub failures: u32,
    pub next_try: DateTime<Utc>,
    pub reason: String,
}

/// Pause before the first new try, and the longest before any.
const PAUSE: (Duration, Duration) = (Duration::from_secs(30), Duration::from_secs(30 * 60));

impl Trouble {
    /// One more failure: the pause doubles from 30 s, with up to as much again by chance so that many do not come back at
    /// once, to 30 min; a server may ask for a longer one.
    pub fn after(before: Option<&Self>, fault: &Fault, now: DateTime<Utc>) -> Self {
        let failures = before.map_or(0, |trouble| trouble.failures).saturating_add(1);
        let pauses = ExponentialBuilder::new()
            .with_jitter()
            .with_min_delay(PAUSE.0)
            .with_max_delay(PAUSE.1 / 2)
            .without_max_times()
            .build();
        let pause = pauses.take(failures.min(16) as usize).last().unwrap_or(PAUSE.1);
        let pause = pause.clamp(PAUSE.0, PAUSE.1).max(fault.retry_after.unwrap_or_default());
        Self { failures, next_try: now + delta(pause), reason: fault.reason.clone() }
    }

    /// Whether it is too early for a new try. A clock set back by more than any pause does not hold a feed up.
    pub fn holds(&self, now: DateTime<Utc>) -> bool {
        now < self.next_try && self.next_try - now <= TimeDelta::days(1)
    }
}

/// A duration of the standard library as one of wall-clock time; the longest here is a day.
pub(super) fn delta(duration: Duration) -> TimeDelta {
    TimeDelta::from_std(duration).unwrap_or(TimeDelta::MAX)
}

/// A document that was read.
pub(super) struct Good {
    pub field: Arc<Field>,
    pub version: u64,
    pub first_seen: DateTime<Utc>,
    pub fetched: DateTime<Utc>,
    pub fresh_until: DateTime<Utc>,
    /// None for the demo.
    pub freshness: Option<Freshness>,
}

impl Good {
    /// Past its time, or from after now because the clock was set back.
    pub fn is_stale(&self, now: DateTime<Utc>) -> bool {
        now >= self.fresh_until || now < self.fetched
    }
}

/// All that is kept of one document.
#[derive(Clone, Default)]
pub(super) struct Slot {
    pub good: Option<Arc<Good>>,
    pub trouble: Option<Trouble>,
}

impl Slot {
    /// Whether the server should be asked now.
    pub fn is_due(&self, now: DateTime<Utc>) -> bool {
        let stale = self.good.as_ref().is_none_or(|good| good.is_stale(now));
        stale && !self.trouble.as_ref().is_some_and(|trouble| trouble.holds(now))
    }
}

/// The exchanges of one feed so far.
#[derive(Default)]
pub(super) struct Ledger {
    pub last_success: Option<DateTime<Utc>>,
    pub fresh_until: Option<DateTime<Utc>>,
    pub last_failure: Option<Failure>,
    pub next_try: Option<DateTime<Utc>>,
    pub consecutive: u32,
    /// Trouble that would meet every document.
    pub trouble: Option<Trouble>,
}

impl Ledger {
    pub fn succeeded(&mut self, good: &Good) {
        self.last_success = Some(good.fetched);
        self.fresh_until = Some(good.fresh_until);
        self.next_try = Some(good.fresh_until);
        self.consecutive = 0;
        self.trouble = None;
    }

    pub fn failed(&mut self, fault: &Fault, document: &Trouble, now: DateTime<Utc>) {
        self.consecutive = self.consecutive.saturating_add(1);
        self.next_try = Some(document.next_try);
        self.last_failure = Some(Failure { time: now, reason: fault.reason.clone(), status: fault.status });
        if fault.whole_feed {
            let trouble = Trouble::after(self.trouble.as_ref(), fault, now);
            self.next_try = Some(trouble.next_try.max(document.next_try));
            self.trouble = Some(trouble);
        }
    }

    pub fn standing(&self, now: DateTime<Utc>) -> Standing {
        match (self.consecutive, self.fresh_until) {
            (1.., _) => Standing::Failing,
            (0, None) => Standing::NeverFetched,
            (0, Some(until)) if now < until => Standing::Fresh,
            (0, Some(_)) => Standing::Stale,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pauses_double_with_jitter_from_half_a_minute_to_half_an_hour() {
        let now = DateTime::UNIX_EPOCH;
        let fault = Fault::document("x", None);
        let mut trouble = None;
        for failure in 1..40 {
            let next = Trouble::after(trouble.as_ref(), &fault, now);
            let pause_s = (next.next_try - now).num_milliseconds() as f64 / 1000.0;
            let least = (30.0 * 2_f64.powi(failure - 1)).min(900.0);
            assert!((least..=2.0 * least).contains(&pause_s), "failure {failure}: {pause_s} s");
            trouble = Some(next);
        }
        let patient = Fault { retry_after: Some(Duration::from_secs(7200)), ..fault };
        assert_eq!(Trouble::after(None, &patient, now).next_try, now + TimeDelta::seconds(7200));
    }
}
