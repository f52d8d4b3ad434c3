//! The command line: `rainward serve`, `rainward outlook`, `rainward feed check`.

#![allow(clippy::print_stdout, clippy::print_stderr, reason = "a command line speaks to its caller")]

mod command;

use std::net::SocketAddr;
use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Args, Parser, Subcommand};
use rainward::clock::Clock;
use rainward::config::{self, Config};
use rainward::service::App;

/// Exit code for arguments or a configuration that cannot be used.
const UNUSABLE: u8 = 2;

/// Where, when and how well a rainbow will stand in the sky.
#[derive(Parser)]
#[command(version, about, long_about = None, max_term_width = 100)]
struct Cli {
    #[command(subcommand)]
    command: Option<Command>,
    #[command(flatten)]
    common: Common,
}

#[derive(Args)]
struct Common {
    /// Configuration file; without one the built-in demo is used
    #[arg(long, global = true, env = "RAINWARD_CONFIG", value_name = "FILE")]
    config: Option<PathBuf>,
}

#[derive(Subcommand)]
enum Command {
    /// Serve the page and the API (also what happens without a command)
    Serve {
        /// Address and port to listen on, instead of the configured ones
        #[arg(long, value_name = "ADDR")]
        listen: Option<SocketAddr>,
    },
    /// Print when a bow is likely. Exit code: 0 a window, 1 none, 2 unusable arguments or configuration, 3 no weather
    Outlook(command::outlook::Arguments),
    /// Weather feeds
    Feed {
        #[command(subcommand)]
        command: FeedCommand,
    },
}

#[derive(Subcommand)]
enum FeedCommand {
    /// Fetch and read a feed once and print what was understood. Exit code: 0 read, 2 unusable arguments, 3 not read
    Check(command::check::Arguments),
}

fn main() -> ExitCode {
    let cli = Cli::parse();
    let mut config = match config::load(cli.common.config.as_deref()) {
        Ok(config) => config,
        Err(error) => return unusable(&error),
    };
    if let Some(Command::Serve { listen: Some(listen) }) = &cli.command {
        config.listen = *listen;
    }
    let demo = cli.common.config.is_none();
    if let Err(error) = command::serve::log(&config.log, cli.command.as_ref().is_some_and(Command::is_brief)) {
        return unusable(&error);
    }
    let app = match start(config) {
        Ok(app) => app,
        Err(code) => return code,
    };
    let runtime = match tokio::runtime::Builder::new_multi_thread().enable_all().build() {
        Ok(runtime) => runtime,
        Err(error) => return unusable(&error),
    };
    runtime.block_on(async {
        match cli.command {
            None | Some(Command::Serve { .. }) => command::serve::run(app, demo).await,
            Some(Command::Outlook(arguments)) => command::outlook::run(&app, arguments).await,
            Some(Command::Feed { command: FeedCommand::Check(arguments) }) => {
                command::check::run(&app, arguments).await
            }
        }
    })
}

impl Command {
    /// Whether the command ends by itself: it then logs warnings only.
    fn is_brief(&self) -> bool {
        !matches!(self, Self::Serve { .. })
    }
}

fn start(config: Config) -> Result<App, ExitCode> {
    App::new(config, Clock::system()).map_err(|errors| {
        for error in &errors {
            eprintln!("rainward: {error}");
        }
        ExitCode::from(UNUSABLE)
    })
}

fn unusable(error: &dyn std::fmt::Display) -> ExitCode {
    eprintln!("rainward: {error}");
    ExitCode::from(UNUSABLE)
}
