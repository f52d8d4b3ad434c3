//! Time stamps of JSON documents.

use chrono::format::{Item, ParseResult, Parsed, StrftimeItems, parse};
use chrono::{DateTime, LocalResult, NaiveDateTime, TimeZone};
use chrono_tz::Tz;
use serde_json::Value;

use crate::bounds::{TIME_MAX, TIME_MIN};
use crate::weather::intake::short;
use crate::weather::read::ReadError;
use crate::weather::spec::{JsonMapping, TimeFormat};

/// Reads time stamps as a mapping describes them.
pub struct Stamp<'a> {
    format: Format<'a>,
    zone: Tz,
}

enum Format<'a> {
    Rfc3339,
    Unix { per_s: f64 },
    Pattern(Vec<Item<'a>>),
}

/// What is wrong with a time format.
pub(super) fn bad_format(format: &TimeFormat) -> Option<String> {
    let TimeFormat::Pattern(pattern) = format else { return None };
    let items: Vec<Item> = StrftimeItems::new(pattern).collect();
    let fields = items.iter().any(|item| matches!(item, Item::Numeric(..) | Item::Fixed(_)));
    (!fields || items.contains(&Item::Error))
        .then(|| format!("{pattern:?} is neither rfc3339, unix_s, unix_ms nor a strftime pattern"))
}

impl<'a> Stamp<'a> {
    /// A reader for the times of a mapping.
    pub fn new(mapping: &'a JsonMapping) -> Self {
        let format = match &mapping.time_format {
            TimeFormat::Rfc3339 => Format::Rfc3339,
            TimeFormat::UnixS => Format::Unix { per_s: 1.0 },
            TimeFormat::UnixMs => Format::Unix { per_s: 1000.0 },
            TimeFormat::Pattern(pattern) => Format::Pattern(StrftimeItems::new(pattern).collect()),
        };
        Self { format, zone: mapping.time_zone }
    }

    /// Unix seconds of a time stamp: the first and the second time at which clocks show it, mostly the same.
    ///
    /// # Errors
    /// [`ReadError::Unexpected`] for what is no time in that format, a local time that clocks skip, or a year outside
    /// those the service computes for.
    pub fn read(&self, value: &Value, at: &str) -> Result<[i64; 2], ReadError> {
        let unexpected = |what: String| ReadError::Unexpected { at: at.to_owned(), what };
        let text =
            || value.as_str().ok_or_else(|| unexpected(format!("a time is {}, not text", short(&value.to_string()))));
        let times_s = match &self.format {
            Format::Rfc3339 => {
                let text = text()?;
                let time = DateTime::parse_from_rfc3339(text)
                    .map_err(|error| unexpected(format!("{:?} is no RFC 3339 time: {error}", short(text))))?;
                [time.timestamp(); 2]
            }
            Format::Unix { per_s } => {
                let number = super::number(value).filter(|number| number.is_finite());
                let number =
                    number.ok_or_else(|| unexpected(format!("{} is no Unix time", short(&value.to_string()))))?;
                [(number / per_s).floor() as i64; 2]
            }
            Format::Pattern(items) => {
                let text = text()?;
                match written(text, items) {
                    Ok(Written::Instant(time_s)) => [time_s; 2],
                    Ok(Written::Local(local)) => self.shown(local).ok_or_else(|| {
                        unexpected(format!(
                            "{local} does not exist in {}: clocks skip it; a feed that ignores summer time needs a \
                             fixed zone such as Etc/GMT+5",
                            self.zone
                        ))
                    })?,
                    Err(error) => {
                        return Err(unexpected(format!("{:?} does not match the time format: {error}", short(text))));
                    }
                }
            }
        };
        if times_s.iter().all(|time_s| (TIME_MIN.timestamp()..=TIME_MAX.timestamp()).contains(time_s)) {
            Ok(times_s)
        } else {
            Err(unexpected(format!(
                "{} is not between {} and {}: is the time format right?",
                short(&value.to_string()),
                TIME_MIN.format("%Y"),
                TIME_MAX.format("%Y")
            )))
        }
    }

    fn shown(&self, local: NaiveDateTime) -> Option<[i64; 2]> {
        match self.zone.from_local_datetime(&local) {
            LocalResult::None => None,
            LocalResult::Single(time) => Some([time.timestamp(); 2]),
            LocalResult::Ambiguous(first, second) => Some([first.timestamp(), second.timestamp()]),
        }
    }
}

/// Which of the two times each stamp of a series means, so that they ascend or descend throughout where that is possible.
pub fn series(stamps: &[[i64; 2]]) -> Vec<i64> {
    let forward = rising(stamps.iter());
    if ascend(&forward) {
        return forward;
    }
    let mut backward = rising(stamps.iter().rev());
    if ascend(&backward) {
        backward.reverse();
        return backward;
    }
    forward
}

/// The first of each two times unless it would not come after the one before.
fn rising<'a>(stamps: impl Iterator<Item = &'a [i64; 2]>) -> Vec<i64> {
    let mut last_s = i64::MIN;
    let after_last = |&[first, second]: &[i64; 2]| {
        last_s = if first > last_s { first } else { second };
        last_s
    };
    stamps.map(after_last).collect()
}

fn ascend(times_s: &[i64]) -> bool {
    times_s.windows(2).all(|pair| pair[0] < pair[1])
}

/// What a time stamp says by itself.
enum Written {
    /// An instant: it has an offset or counts seconds.
    Instant(i64),
    /// What a clock showed.
    Local(NaiveDateTime),
}

/// Reads by a pattern; what it has no field for below the day is zero.
fn written(text: &str, items: &[Item]) -> ParseResult<Written> {
    let mut parsed = Parsed::new();
    parse(&mut parsed, text, items.iter())?;
    if let Some(time_s) = parsed.timestamp() {
        return Ok(Written::Instant(time_s));
    }
    if parsed.hour_mod_12().is_none() {
        parsed.set_hour(0)?;
    }
    if parsed.minute().is_none() {
        parsed.set_minute(0)?;
    }
    if parsed.offset().is_some() {
        return Ok(Written::Instant(parsed.to_datetime()?.timestamp()));
    }
    parsed.to_naive_datetime_with_offset(0).map(Written::Local)
}
