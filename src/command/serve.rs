//! `rainward serve`.

use std::io::IsTerminal as _;
use std::process::ExitCode;

use rainward::config::{Log, LogFormat};
use rainward::service::{App, serve};
use tokio::net::TcpListener;
use tokio::signal::unix::{SignalKind, signal};
use tracing_subscriber::EnvFilter;
use tracing_subscriber::filter::ParseError;

use super::say;

/// Starts the log on standard error.
///
/// # Errors
/// When the configured level is no filter.
pub fn log(log: &Log, brief: bool) -> Result<(), ParseError> {
    let filter = EnvFilter::try_new(if brief { "warn" } else { &log.level })?;
    let colours = std::io::stderr().is_terminal();
    let lines = tracing_subscriber::fmt().with_env_filter(filter).with_ansi(colours).with_writer(std::io::stderr);
    match log.format {
        LogFormat::Text => lines.init(),
        LogFormat::Json => lines.json().init(),
    }
    Ok(())
}

/// Serves until interrupted or terminated.
pub async fn run(app: App, demo: bool) -> ExitCode {
    let listen = app.config().listen;
    let listener = match TcpListener::bind(listen).await {
        Ok(listener) => listener,
        Err(error) => {
            eprintln!("rainward: cannot listen on {listen}: {error}");
            return ExitCode::from(crate::UNUSABLE);
        }
    };
    let signals = signal(SignalKind::terminate()).and_then(|term| Ok((term, signal(SignalKind::interrupt())?)));
    let (mut terminated, mut interrupted) = match signals {
        Ok(signals) => signals,
        Err(error) => {
            eprintln!("rainward: cannot watch for signals: {error}");
            return ExitCode::from(crate::UNUSABLE);
        }
    };
    let at = listener.local_addr().unwrap_or(listen);
    say!("rainward looks out at http://{at}/");
    if demo {
        say!("  This is the built-in demo: an invented coast under invented showers. Your own: --config FILE");
    }
    if let Some(site) = app.config().sites.first() {
        say!("  bow now    http://{at}/v1/bow?site={}", site.name);
        say!("  outlook    http://{at}/v1/outlook?site={}", site.name);
    }
    say!("  all there  http://{at}/openapi.json");
    serve(listener, app, async move {
        tokio::select! {
            _ = terminated.recv() => {}
            _ = interrupted.recv() => {}
        }
    })
    .await;
    ExitCode::SUCCESS
}
