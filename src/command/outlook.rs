//! `rainward outlook`: the windows as a table for people or JSON for programs.

use std::process::ExitCode;

use clap::Args;
use rainward::outlook::answer::{Limit, Step, Window};
use rainward::service::App;
use rainward::service::outlook::{OutlookAnswer, Question, answer};
use rainward::service::query::Query;

use super::{print_problem, say, say_json};

/// Exit code when no window was found.
const NO_WINDOW: u8 = 1;
/// Exit code when the feed gave no weather, or none of the time and place asked for.
const NO_WEATHER: u8 = 3;

/// The question; every option is checked like the parameter of the same name in the API.
#[derive(Args)]
pub struct Arguments {
    /// A configured site, instead of --lat and --lon
    #[arg(long)]
    site: Option<String>,
    /// Latitude, degrees
    #[arg(long, allow_hyphen_values = true)]
    lat: Option<String>,
    /// Longitude, degrees, positive east
    #[arg(long, allow_hyphen_values = true)]
    lon: Option<String>,
    /// Eye above the ground or water around, m
    #[arg(long, allow_hyphen_values = true)]
    eye_height_m: Option<String>,
    /// fresh or sea
    #[arg(long)]
    water: Option<String>,
    /// Temperature of the drops, degrees Celsius
    #[arg(long, allow_hyphen_values = true)]
    water_temperature_c: Option<String>,
    /// A configured feed; default the first
    #[arg(long)]
    feed: Option<String>,
    /// First step, RFC 3339; default now
    #[arg(long)]
    from: Option<String>,
    /// Length, hours (1 to 240; default 48)
    #[arg(long, allow_hyphen_values = true)]
    hours: Option<String>,
    /// Step, minutes (1 to 60; default 5)
    #[arg(long, allow_hyphen_values = true)]
    step_min: Option<String>,
    /// Chance from which a step belongs to a window (0 to 1; default 0.3)
    #[arg(long, allow_hyphen_values = true)]
    threshold: Option<String>,
    /// Print the whole answer as JSON, as the API gives it
    #[arg(long)]
    json: bool,
}

impl Arguments {
    fn query(self) -> Query {
        let options = [
            ("site", self.site),
            ("lat", self.lat),
            ("lon", self.lon),
            ("eye_height_m", self.eye_height_m),
            ("water", self.water),
            ("water_temperature_c", self.water_temperature_c),
            ("feed", self.feed),
            ("from", self.from),
            ("hours", self.hours),
            ("step_min", self.step_min),
            ("threshold", self.threshold),
        ];
        Query::from_pairs(options.into_iter().filter_map(|(name, value)| Some((name.to_owned(), value?))))
    }
}

/// Prints the outlook.
pub async fn run(app: &App, arguments: Arguments) -> ExitCode {
    let json = arguments.json;
    let site = arguments.site.clone();
    let question = match Question::read(app, arguments.query()) {
        Ok(question) => question,
        Err(problem) => {
            print_problem(problem);
            return ExitCode::from(crate::UNUSABLE);
        }
    };
    let answer = match answer(app, &question).await {
        Ok(answer) => answer,
        Err(error) => {
            eprintln!("rainward: {error}");
            return ExitCode::from(crate::UNUSABLE);
        }
    };
    if json {
        say_json(&answer);
    } else {
        let label =
            site.and_then(|name| app.config().sites.iter().find(|site| site.name == name).map(|s| s.label.clone()));
        print(&answer, label.as_deref());
    }
    if answer.feed.as_ref().is_none_or(|feed| feed.document.is_none()) {
        let reason = answer.feed.and_then(|feed| feed.problem).unwrap_or_else(|| "no feed is configured".into());
        eprintln!("rainward: no weather: {reason}");
        return ExitCode::from(NO_WEATHER);
    }
    if !answer.outlook.windows.is_empty() {
        return ExitCode::SUCCESS;
    }
    let steps = &answer.outlook.steps;
    let unknown = steps.iter().filter(|step| step.limited_by == Some(Limit::NoData)).count();
    if unknown > 0 {
        eprintln!("rainward: the feed says nothing of {unknown} of {} steps", steps.len());
    }
    let judged = steps.iter().any(|step| !geometric(step) && step.chance.is_some());
    if unknown > 0 && !judged { ExitCode::from(NO_WEATHER) } else { ExitCode::from(NO_WINDOW) }
}

/// Whether Sun and horizon alone forbid a bow.
fn geometric(step: &Step) -> bool {
    matches!(step.limited_by, Some(Limit::SunDown | Limit::SunTooHigh | Limit::Skyline))
}

fn print(answer: &OutlookAnswer, label: Option<&str>) {
    let (lat, lon) = (answer.observer.lat, answer.observer.lon);
    let (ns, ew) = (if lat < 0.0 { 'S' } else { 'N' }, if lon < 0.0 { 'W' } else { 'E' });
    let place = format!("{:.3} {ns} {:.3} {ew}", lat.abs(), lon.abs());
    say!("{}", label.map_or_else(|| place.clone(), |label| format!("{label}, {place}")));
    if let Some(feed) = &answer.feed {
        let age = feed.age_s.map_or_else(|| "no document".into(), |age_s| format!("{} min old", age_s / 60));
        say!("Feed {}, {age}{}", feed.name, if feed.stale && feed.document.is_some() { ", STALE" } else { "" });
    }
    let steps = &answer.outlook.steps;
    if let (Some(first), Some(last)) = (steps.first(), steps.last()) {
        say!("{} to {} UTC", first.time.format("%a %e %b %Y %H:%M"), last.time.format("%a %e %b %Y %H:%M"));
    }
    say!("");
    if answer.outlook.windows.is_empty() {
        say!("No window with a chance of {} or more.", answer.threshold);
    } else {
        say!("{:<11} {:>5}  {:>5}  {:>5}  {:>5}  {:>5}  {:>6}", "UTC", "from", "to", "face", "crown", "arc", "chance");
        for window in &answer.outlook.windows {
            say!("{}", row(window));
        }
    }
    say!("");
    say!("Otherwise: {}.", reasons(steps, answer.threshold));
    for assumption in &answer.outlook.assumed {
        say!("Assumed: {}", assumption.text);
    }
    for caution in &answer.outlook.cautions {
        say!("Caution: {caution}");
    }
}

fn row(window: &Window) -> String {
    format!(
        "{:<11} {:>5}  {:>5}  {:>4.0}°  {:>4.0}°  {:>5.2}  {:>6.2}",
        window.start.format("%a %e %b").to_string(),
        window.start.format("%H:%M").to_string(),
        window.end.format("%H:%M").to_string(),
        window.face_azimuth_deg,
        window.crown_elevation_deg,
        window.visible_arc_fraction,
        window.best.chance,
    )
}

/// What the steps outside windows lack, most frequent first.
fn reasons(steps: &[Step], threshold: f64) -> String {
    let all = [
        (Limit::SunDown, "Sun down"),
        (Limit::SunTooHigh, "Sun too high"),
        (Limit::Skyline, "behind the skyline"),
        (Limit::NoRain, "no rain there"),
        (Limit::SunBlocked, "cloud before the Sun"),
        (Limit::Snow, "snow"),
        (Limit::TooFaint, "too faint"),
        (Limit::NoData, "weather unknown"),
    ];
    let good = |chance: f64| chance > 0.0 && chance >= threshold;
    let outside: Vec<&Step> = steps.iter().filter(|step| !step.chance.is_some_and(good)).collect();
    let mut counted: Vec<(usize, &str)> = all
        .iter()
        .map(|(limit, words)| (outside.iter().filter(|step| step.limited_by == Some(*limit)).count(), *words))
        .filter(|(count, _)| *count > 0)
        .collect();
    counted.sort_by_key(|reason| std::cmp::Reverse(reason.0));
    let share = |count: usize| 100.0 * count as f64 / outside.len() as f64;
    let words: Vec<String> = counted.iter().map(|(count, words)| format!("{words} {:.0} %", share(*count))).collect();
    if words.is_empty() { "nothing in the way".into() } else { words.join(", ") }
}
