//! The timeline of an observer: step by step what stands in the sky and what the weather makes of it.

use chrono::{DateTime, TimeDelta, Utc};

use crate::sky::observer::Observer;
use crate::sky::search::crossings;
use crate::sky::sun::Sun;
use crate::weather::field::{Field, Space};
use crate::weather::quantity::Quantity;

use super::answer::{
    Assumption, Bearing, CAUTIONS, Limit, Outlook, SkyEvent, SkyEventKind, Step, THUNDER_CAUTION, round,
};
use super::chance::{CLOUD_BASE_KM, UNKNOWN_COVER, Weather};
use super::copies::{COUNT, WIDER_WITHOUT_WIND};
use super::sight::{FARTHEST_KM, Sight, margin_deg};
use super::windows::windows;

/// Step of the searches for risings and settings: the Sun's elevation turns round twice a day.
const SEARCH_STEP: TimeDelta = TimeDelta::minutes(10);

/// What is asked of an outlook; every number was checked.
#[derive(Debug, Clone, PartialEq)]
pub struct Ask {
    /// Who looks.
    pub observer: Observer,
    /// First step.
    pub from: DateTime<Utc>,
    /// Length of the timeline.
    pub length: TimeDelta,
    /// Time between steps.
    pub step: TimeDelta,
    /// Chance from which a step belongs to a window, 0..1.
    pub threshold: f64,
    /// Radius of the primary's red edge, degrees.
    pub radius_deg: f64,
}

/// The outlook for an observer. Without a field, or where it does not say, geometry still answers and the chance is null.
/// `fetched` stands in for the time of issue where the document does not tell it.
pub fn outlook(ask: &Ask, field: Option<&Field>, fetched: Option<DateTime<Utc>>) -> Outlook {
    let issued = field.and_then(|field| field.issued).or(fetched).unwrap_or(ask.from);
    let weather = field.and_then(|field| Weather::new(field, &ask.observer, issued.timestamp()));
    let step_ms = ask.step.num_milliseconds().max(1);
    let steps: Vec<Step> = (0..=ask.length.num_milliseconds() / step_ms)
        .map(|index| step(ask, weather.as_ref(), ask.from + TimeDelta::milliseconds(index * step_ms)))
        .collect();
    Outlook {
        windows: windows(ask, &steps),
        sky_events: sky_events(ask),
        assumed: field.map_or_else(Vec::new, |field| assumed(field, ask)),
        cautions: cautions(field, ask),
        steps,
    }
}

fn step(ask: &Ask, weather: Option<&Weather<'_>>, time: DateTime<Utc>) -> Step {
    let sight = Sight::at(&ask.observer, ask.radius_deg, time);
    let (chance, prominence, limited_by) = match sight.limit {
        Some(limit) => (Some(0.0), Some(0.0), Some(limit)),
        None => match weather.and_then(|weather| weather.judge(&sight, time.timestamp())) {
            Some(verdict) => (Some(round(verdict.chance, 4)), Some(round(verdict.prominence, 4)), verdict.limit),
            None => (None, None, Some(Limit::NoData)),
        },
    };
    Step {
        time,
        sun: Bearing::rounded(sight.sun.apparent),
        antisolar_point: Bearing::rounded(sight.sun.antisolar_point()),
        crown: sight.arc.crown.map(Bearing::rounded),
        visible_arc_fraction: round(sight.arc.fraction, 5),
        chance,
        prominence,
        limited_by,
    }
}

/// Risings and settings of Sun and bow over the horizon in use.
pub fn sky_events(ask: &Ask) -> Vec<SkyEvent> {
    let to = ask.from + ask.length;
    let observer = &ask.observer;
    let sun = crossings(|time| Sun::at(observer, time).over_horizon_deg(observer), ask.from, to, SEARCH_STEP);
    let bow = crossings(|time| margin_deg(observer, ask.radius_deg, time), ask.from, to, SEARCH_STEP);
    let named = |begins: bool, rise, set| if begins { rise } else { set };
    let mut events: Vec<SkyEvent> =
        sun.iter()
            .map(|c| SkyEvent { time: c.time, event: named(c.begins, SkyEventKind::Sunrise, SkyEventKind::Sunset) })
            .chain(bow.iter().map(|c| SkyEvent {
                time: c.time,
                event: named(c.begins, SkyEventKind::BowRises, SkyEventKind::BowSets),
            }))
            .collect();
    events.sort_by_key(|event| event.time);
    events
}

/// What a field lacks for this question and what is taken instead.
pub fn assumed(field: &Field, ask: &Ask) -> Vec<Assumption> {
    let has = |quantity| field.series(quantity).is_some();
    let mut list = Vec::new();
    let mut say = |value: &'static str, text: String| list.push(Assumption { value, text });
    if field.corners(ask.observer.place.lat_deg(), ask.observer.place.lon_deg()).is_none() {
        say("place", "the feed does not reach this place: chance unknown".into());
    }
    if !has(Quantity::Rain) {
        say("rain", "no rain in this feed: chance unknown".into());
    }
    let layers = [
        (Quantity::CloudLow, "low cloud"),
        (Quantity::CloudMiddle, "middle cloud"),
        (Quantity::CloudHigh, "high cloud"),
    ];
    if layers.iter().any(|layer| has(layer.0)) {
        for (layer, words) in layers.into_iter().filter(|layer| !has(layer.0)) {
            say(layer.name(), format!("no {words} given: taken as none"));
        }
    } else if has(Quantity::CloudTotal) {
        say("cloud_low", "no cloud layers given: all cloud taken as low cloud".into());
    } else {
        say("cloud_total", format!("no cloud given: cover taken as {UNKNOWN_COVER} everywhere"));
    }
    // The middle of each hour stands for it: enough to find what a feed leaves out now and then.
    let hours = 0..ask.length.num_hours().max(1);
    let times: Vec<i64> = hours.map(|hour| ask.from.timestamp() + hour * 3600 + 1800).collect();
    let lacking = |quantity| times.iter().any(|&time_s| field.at(quantity, ask.observer.place, time_s).is_none());
    let given = |quantity| if has(quantity) { "not always given: else" } else { "not given:" };
    if lacking(Quantity::CloudBase) {
        let text = format!("cloud base {} taken as {CLOUD_BASE_KM} km above the ground", given(Quantity::CloudBase));
        say("cloud_base", text);
    }
    match (!lacking(Quantity::FreezingLevel), !lacking(Quantity::Temperature)) {
        (true, true) => {}
        (false, true) => {
            let text = format!("freezing level {} from the temperature, 6.5 K/km", given(Quantity::FreezingLevel));
            say("freezing_level", text);
        }
        (true, false) => {
            let text = given(Quantity::Temperature);
            say("temperature", format!("temperature {text} snow only where the freezing level lies on the ground"));
        }
        (false, false) => {
            let text = given(Quantity::Temperature);
            say("temperature", format!("temperature {text} all that falls is taken as rain"));
        }
    }
    if lacking(Quantity::Visibility) {
        say("visibility", format!("visibility {} taken as {FARTHEST_KM} km", given(Quantity::Visibility)));
    }
    if matches!(field.space, Space::Point(_)) {
        let pair = |a, b| has(a) && has(b);
        if pair(Quantity::WindEast, Quantity::WindNorth) || pair(Quantity::WindSpeed, Quantity::WindFrom) {
            say("space", "one point only: its hours are laid out in space along its wind".into());
        } else {
            say(
                "wind",
                format!(
                    "one point without wind: the same weather taken all round, its error {WIDER_WITHOUT_WIND} times wider"
                ),
            );
        }
    }
    if field.issued.is_none() {
        say("issued", "no time of issue given: the forecast's error grows from the time it was fetched".into());
    }
    say(
        "copies",
        format!("{COUNT} copies of the forecast, displaced within an assumed error that grows with lead time"),
    );
    list
}

fn cautions(field: Option<&Field>, ask: &Ask) -> Vec<&'static str> {
    let thunder = field.is_some_and(|field| {
        let hours = 0..=ask.length.num_hours();
        hours.into_iter().any(|hour| {
            let time_s = ask.from.timestamp() + hour * 3600;
            field.at(Quantity::ThunderChance, ask.observer.place, time_s).is_some_and(|chance| chance > 0.0)
        })
    });
    thunder.then_some(THUNDER_CAUTION).into_iter().chain(CAUTIONS).collect()
}
