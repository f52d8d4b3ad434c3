//! `rainward feed check NAME`.

use std::process::ExitCode;

use clap::Args;
use rainward::service::App;

/// Which feed, for which place.
#[derive(Args)]
pub struct Arguments {
    /// Name of the feed in the configuration
    name: String,
}

/// Prints what was understood.
pub async fn run(_app: &App, arguments: Arguments) -> ExitCode {
    println!("{}", arguments.name);
    ExitCode::SUCCESS
}
