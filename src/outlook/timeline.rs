//! The timeline of an observer: step by step what stands in the sky and what the weather makes of it.

use chrono::{DateTime, TimeDelta, Utc};

use crate::sky::observer::Observer;
use crate::sky::search::{Crossing, crossings};
use crate::sky::sun::Sun;
use crate::weather::field::{Field, Space};
use crate::weather::quantity::Quantity;

use super::answer::{
    Assumption, Bearing, CAUTIONS, Limit, Outlook, SkyEvent, SkyEventKind, Step, THUNDER_CAUTION, round,
};
use super::chance::{CLOUD_BASE_KM, Weather};
use super::copies::{COUNT, WIDER_WITHOUT_WIND};
use super::shade::UNKNOWN_COVER;
use super::sight::{FARTHEST_KM, Sight, margin_deg};
use super::windows::windows;

/// Longest step of the searches for risings and settings: the Sun's elevation turns round twice a day.
const SEARCH_STEP_MIN: f64 = 10.0;

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
/// `first_seen` stands in for the time of issue where the document does not tell it.
pub fn outlook(ask: &Ask, field: Option<&Field>, first_seen: Option<DateTime<Utc>>) -> Outlook {
    let issued = field.and_then(|field| field.issued).or(first_seen).unwrap_or(ask.from);
    let weather = field.and_then(|field| Weather::new(field, &ask.observer, issued.timestamp()));
    let step_ms = ask.step.num_milliseconds().max(1);
    let steps: Vec<Step> = (0..=ask.length.num_milliseconds() / step_ms)
        .map(|index| step(ask, weather.as_ref(), ask.from + TimeDelta::milliseconds(index * step_ms)))
        .collect();
    let crossings = Crossings::of(ask);
    Outlook {
        windows: windows(ask, &steps, &crossings.bow),
        sky_events: crossings.events(),
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

/// When Sun and bow cross the horizon in use.
struct Crossings {
    sun: Vec<Crossing>,
    bow: Vec<Crossing>,
}

impl Crossings {
    fn of(ask: &Ask) -> Self {
        let to = ask.from + ask.length;
        let observer = &ask.observer;
        // The margin may turn round at each point of a skyline, which the Sun passes at about 15 degrees an hour: four
        // samples from one point to the next leave no turn unseen.
        let narrowest_deg = observer.horizon.narrowest_deg();
        let step = TimeDelta::seconds((60.0 * narrowest_deg.clamp(0.5, SEARCH_STEP_MIN)) as i64);
        Self {
            sun: crossings(|time| Sun::at(observer, time).over_horizon_deg(observer), ask.from, to, step),
            bow: crossings(|time| margin_deg(observer, ask.radius_deg, time), ask.from, to, step),
        }
    }

    fn events(&self) -> Vec<SkyEvent> {
        let event = |c: &Crossing, rise, set| SkyEvent { time: c.time, event: if c.begins { rise } else { set } };
        let sun = self.sun.iter().map(|c| event(c, SkyEventKind::Sunrise, SkyEventKind::Sunset));
        let bow = self.bow.iter().map(|c| event(c, SkyEventKind::BowRises, SkyEventKind::BowSets));
        let mut events: Vec<SkyEvent> = sun.chain(bow).collect();
        events.sort_by_key(|event| event.time);
        events
    }
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
        let instead = if has(Quantity::CloudTotal) { "taken from the cover by all cloud" } else { "taken as none" };
        for (layer, words) in layers.into_iter().filter(|layer| !has(layer.0)) {
            say(layer.name(), format!("no {words} given: {instead}"));
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
            let text = "one point only: its hours are laid out in space along its wind; in a calm, the same all round";
            say("space", text.into());
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
        say("issued", "no time of issue given: the forecast's error grows from the time it was first seen".into());
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
