//! `rainward feed check NAME`: what a feed's document says, before it is trusted.

use std::process::ExitCode;

use chrono::{DateTime, TimeDelta, Utc};
use clap::Args;
use rainward::outlook::timeline::{Ask, assumed};
use rainward::service::App;
use rainward::service::query::Query;
use rainward::sky::observer::Observer;
use rainward::weather::feeds::{CheckQuantity, CheckReport, CheckSpace};

use super::{print_problem, say, say_json};

/// Exit code when the document could not be fetched or read.
const NOT_READ: u8 = 3;

/// Which feed, for which place.
#[derive(Args)]
pub struct Arguments {
    /// Name of the feed in the configuration
    name: String,
    /// A configured site to ask for; without it and without --lat and --lon the first site
    #[arg(long)]
    site: Option<String>,
    /// Latitude, degrees
    #[arg(long, allow_hyphen_values = true)]
    lat: Option<String>,
    /// Longitude, degrees, positive east
    #[arg(long, allow_hyphen_values = true)]
    lon: Option<String>,
    /// Print the report as JSON
    #[arg(long)]
    json: bool,
}

/// Prints what was understood.
pub async fn run(app: &App, arguments: Arguments) -> ExitCode {
    let json = arguments.json;
    let mut options = vec![("site", arguments.site), ("lat", arguments.lat), ("lon", arguments.lon)];
    if options.iter().all(|(_, value)| value.is_none()) {
        options[0].1 = app.config().sites.first().map(|site| site.name.clone());
    }
    let mut query = Query::from_pairs(options.into_iter().filter_map(|(name, value)| Some((name.to_owned(), value?))));
    let observer = query.observer(app);
    let observer = match (query.finish(), observer) {
        (Ok(()), Some(observer)) => observer,
        (Ok(()), None) => return ExitCode::from(crate::UNUSABLE),
        (Err(problem), _) => {
            print_problem(problem);
            return ExitCode::from(crate::UNUSABLE);
        }
    };
    let report = match app.feeds().check(&arguments.name, observer.place).await {
        Ok(report) => report,
        Err(error) => {
            eprintln!("rainward: {error}");
            return ExitCode::from(crate::UNUSABLE);
        }
    };
    if json {
        say_json(&report);
    } else {
        print(&report, observer);
    }
    if report.error.is_some() { ExitCode::from(NOT_READ) } else { ExitCode::SUCCESS }
}

fn print(report: &CheckReport, observer: Observer) {
    say!("Feed {} at {}", report.feed, report.host);
    let status = report.status.map_or_else(|| "no answer".into(), |status| format!("HTTP {status}"));
    let bytes = report.bytes.map_or_else(String::new, |bytes| format!(", {bytes} bytes"));
    let kind = report.content_type.as_deref().map_or_else(String::new, |kind| format!(", {kind}"));
    say!("Answer: {}{bytes}{kind}", if report.host.starts_with("demo") { "made here".into() } else { status });
    if let Some(error) = &report.error {
        say!("NOT READ: {error}");
        return;
    }
    say!("Issued: {}", report.issued.map_or_else(|| "not given".into(), moment));
    match &report.space {
        Some(CheckSpace::Point { lat, lon }) if report.located => say!("Place: {lat}, {lon}"),
        Some(CheckSpace::Point { lat, lon }) => say!("Place: not given; taken as asked: {lat}, {lon}"),
        Some(CheckSpace::Grid { south, west, north, east, rows, columns }) => {
            say!("Grid: {rows} x {columns}, latitude {south} to {north}, longitude {west} to {east}");
        }
        None => {}
    }
    say!("");
    say!(
        "{:<15} {:>9} {:>5}  {:<36}  {:>6} {:>7}  {:>9} {:>9}",
        "value",
        "read as",
        "kept",
        "UTC",
        "count",
        "missing",
        "least",
        "most"
    );
    for quantity in &report.quantities {
        say!("{}", row(quantity));
        if let Some(Some((start, end))) = quantity.gaps.first().map(|gap| gap.start.zip(gap.end)) {
            let count = quantity.gaps.len();
            say!("{:<15} gaps: {count}, the first from {} to {}", "", moment(start), moment(end));
        }
    }
    say!("");
    let absent: Vec<&str> = report.absent.iter().map(|quantity| quantity.name()).collect();
    say!("Not given: {}", if absent.is_empty() { "nothing".into() } else { absent.join(", ") });
    for note in &report.notes {
        say!("Note: {note}");
    }
    if let Some(field) = &report.field {
        let (first, last) = field.extent().unwrap_or_default();
        let from = DateTime::from_timestamp(first, 0).unwrap_or_default();
        let (length, step) = (TimeDelta::seconds(last - first), TimeDelta::hours(1));
        let ask = Ask { observer, from, length, step, threshold: 0.0, radius_deg: 42.0 };
        for assumption in assumed(field, &ask) {
            say!("The outlook will assume: {}", assumption.text);
        }
    }
}

fn row(quantity: &CheckQuantity) -> String {
    let span = match (quantity.first, quantity.last) {
        (Some(first), Some(last)) => format!("{} to {}", moment(first), moment(last)),
        _ => String::new(),
    };
    format!(
        "{:<15} {:>9} {:>5}  {span:<36}  {:>6} {:>7}  {:>9.2} {:>9.2}",
        quantity.quantity.name(),
        quantity.unit_read,
        quantity.unit_kept,
        quantity.count,
        quantity.missing,
        quantity.min,
        quantity.max
    )
}

fn moment(time: DateTime<Utc>) -> String {
    time.format("%Y-%m-%d %H:%M").to_string()
}
