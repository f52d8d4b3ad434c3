//! HTTP: routes, problems, page.
//!
//! [`serve`] takes a bound listener and a shutdown signal, so that `main` and the tests start the very same service.

pub mod bow;
pub mod entity_tag;
pub mod feeds;
pub mod health;
pub mod layers;
pub mod light;
pub mod openapi;
pub mod outlook;
pub mod page;
pub mod problem;
pub mod query;
pub mod router;
pub mod sites;

use std::future::Future;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Duration;

use hyper::server::conn::http1;
use hyper_util::rt::{TokioIo, TokioTimer};
use hyper_util::server::graceful::GracefulShutdown;
use hyper_util::service::TowerToHyperService;
use tokio::net::TcpListener;
use tokio::sync::Semaphore;

use crate::clock::Clock;
use crate::config::Config;
use crate::demo;
use crate::optics::scene;
use crate::weather::feeds::{Feeds, Options, SetupError};

/// Longest time for a client to send its request head.
const HEAD_TIME: Duration = Duration::from_secs(10);
/// Longest time for open answers to finish once the service is told to stop.
const STOP_TIME: Duration = Duration::from_secs(20);
/// Pause after the system refuses a new connection, so that a lack of file handles does not spin.
const ACCEPT_PAUSE: Duration = Duration::from_millis(100);

/// What every handler can reach. Cheap to clone.
#[derive(Clone)]
pub struct App(Arc<Inner>);

struct Inner {
    config: Config,
    feeds: Feeds,
    clock: Clock,
    answers: outlook::Answers,
    curves: light::Curves,
    stopping: AtomicBool,
}

impl App {
    /// Sets up the service; nothing is fetched yet.
    ///
    /// # Errors
    /// Every [`SetupError`] of the feeds.
    pub fn new(config: Config, clock: Clock) -> Result<Self, Vec<SetupError>> {
        let options = Options {
            demo: Some(Arc::new(demo::document)),
            memory_bytes: config.limits.documents_mb * 1_000_000,
            ..Options::default()
        };
        let feeds = Feeds::with_options(&config.feeds, clock.clone(), options)?;
        let room = config.limits.answers_mb * 1_000_000;
        let (answers, curves) = (outlook::Answers::new(room), light::Curves::new(room));
        Ok(Self(Arc::new(Inner { config, feeds, clock, answers, curves, stopping: AtomicBool::new(false) })))
    }

    /// The configuration.
    pub fn config(&self) -> &Config {
        &self.0.config
    }

    /// The weather feeds.
    pub fn feeds(&self) -> &Feeds {
        &self.0.feeds
    }

    /// The clock.
    pub fn clock(&self) -> &Clock {
        &self.0.clock
    }

    /// Finished outlooks.
    pub fn answers(&self) -> &outlook::Answers {
        &self.0.answers
    }

    /// Light worked out so far.
    pub fn curves(&self) -> &light::Curves {
        &self.0.curves
    }

    /// Whether the service was told to stop.
    pub fn is_stopping(&self) -> bool {
        self.0.stopping.load(Ordering::Relaxed)
    }
}

/// Serves until `shutdown` resolves, then lets open answers finish.
pub async fn serve(listener: TcpListener, app: App, shutdown: impl Future<Output = ()>) {
    let limit = app.config().limits.connections;
    let slots = Arc::new(Semaphore::new(limit));
    let routes = router::router(app.clone());
    // The first outlook shall not wait for the tables of light, nor the start for them.
    drop(tokio::task::spawn_blocking(scene::prepare));
    let graceful = GracefulShutdown::new();
    let mut shutdown = std::pin::pin!(shutdown);
    loop {
        let accepted = async {
            let slot = slots.clone().acquire_owned().await;
            (slot, listener.accept().await)
        };
        let (slot, stream) = tokio::select! {
            (slot, accepted) = accepted => match accepted {
                Ok((stream, _)) => (slot, stream),
                Err(error) => {
                    tracing::warn!(%error, "could not accept a connection");
                    tokio::time::sleep(ACCEPT_PAUSE).await;
                    continue;
                }
            },
            () = &mut shutdown => break,
        };
        // Answers are small and written whole; waiting to fill packets only delays them.
        if let Err(error) = stream.set_nodelay(true) {
            tracing::debug!(%error, "could not set TCP_NODELAY");
        }
        let connection = http1::Builder::new()
            .timer(TokioTimer::new())
            .header_read_timeout(HEAD_TIME)
            .max_buf_size(64 * 1024)
            .serve_connection(TokioIo::new(stream), TowerToHyperService::new(routes.clone()));
        let connection = graceful.watch(connection);
        tokio::spawn(async move {
            if let Err(error) = connection.await {
                tracing::debug!(%error, "connection ended early");
            }
            drop(slot);
        });
    }
    app.0.stopping.store(true, Ordering::Relaxed);
    drop(listener);
    tracing::info!("stopping: open answers may finish");
    if tokio::time::timeout(STOP_TIME, graceful.shutdown()).await.is_err() {
        tracing::warn!(after_s = STOP_TIME.as_secs(), "stopped with connections still open");
    }
}
