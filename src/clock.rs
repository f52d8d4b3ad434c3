//! The clock, handed in from the edge so that everything else is given the time.

use std::sync::Arc;

use chrono::{DateTime, Utc};

/// Tells the time; the edge passes [`Clock::system`], tests pass their own.
#[derive(Clone)]
pub struct Clock(Arc<dyn Fn() -> DateTime<Utc> + Send + Sync>);

impl Clock {
    /// The computer's clock.
    pub fn system() -> Self {
        #[allow(clippy::disallowed_methods, reason = "the one place where the wall clock is read")]
        Self(Arc::new(Utc::now))
    }

    /// A clock that asks a function.
    pub fn from_fn(now: impl Fn() -> DateTime<Utc> + Send + Sync + 'static) -> Self {
        Self(Arc::new(now))
    }

    /// The time now, UTC.
    pub fn now(&self) -> DateTime<Utc> {
        (self.0)()
    }
}

impl std::fmt::Debug for Clock {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str("Clock")
    }
}
