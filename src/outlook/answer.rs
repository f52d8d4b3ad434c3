//! What an outlook answers, as it goes out in JSON.

use chrono::{DateTime, Utc};
use serde::Serialize;
use utoipa::ToSchema;

use crate::sky::direction::Direction;

/// What limits the chance of a step most.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum Limit {
    /// The Sun is below the horizon.
    SunDown,
    /// The Sun stands so high that the whole bow lies below the horizon.
    SunTooHigh,
    /// Terrain hides the Sun or the whole bow.
    Skyline,
    /// No rain where the bow would stand.
    NoRain,
    /// Rain, but clouds keep the Sun from it.
    SunBlocked,
    /// What falls is snow, which makes no bow.
    Snow,
    /// Sunlit rain, but too little of it to be seen.
    TooFaint,
    /// The feed does not say.
    NoData,
}

/// A direction on the sky.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, ToSchema)]
pub struct Bearing {
    /// Azimuth clockwise from true north, degrees in [0, 360).
    pub azimuth_deg: f64,
    /// Elevation above the horizontal, degrees, -90 to 90.
    pub elevation_deg: f64,
}

impl Bearing {
    /// In full precision.
    pub fn of(direction: Direction) -> Self {
        Self { azimuth_deg: direction.azimuth_deg(), elevation_deg: direction.elevation_deg() }
    }

    /// Rounded to 0.001 degrees, for long lists.
    pub fn rounded(direction: Direction) -> Self {
        let azimuth_deg = round(direction.azimuth_deg(), 3);
        let azimuth_deg = if azimuth_deg >= 360.0 { 0.0 } else { azimuth_deg };
        Self { azimuth_deg, elevation_deg: round(direction.elevation_deg(), 3) }
    }
}

/// Rounds to a number of decimals.
pub fn round(value: f64, decimals: i32) -> f64 {
    let scale = 10f64.powi(decimals);
    (value * scale).round() / scale
}

/// One instant of the timeline.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Step {
    /// When.
    pub time: DateTime<Utc>,
    /// The Sun as seen, refraction included.
    pub sun: Bearing,
    /// The direction opposite the Sun.
    pub antisolar_point: Bearing,
    /// Highest visible point of the primary's red edge; null where none of it stands over the horizon.
    pub crown: Option<Bearing>,
    /// Share of the primary's full circle over the horizon in use, 0..1.
    pub visible_arc_fraction: f64,
    /// Probability that a bow can be seen, 0..1; null where the feed does not say.
    pub chance: Option<f64>,
    /// Luminance contrast of the bow with what is behind it, should it be seen; null where the feed does not say.
    pub prominence: Option<f64>,
    /// What limits the chance most; null where nothing does.
    pub limited_by: Option<Limit>,
}

/// The best step of a window.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, ToSchema)]
pub struct Best {
    /// When.
    pub time: DateTime<Utc>,
    /// Its chance, 0..1.
    pub chance: f64,
}

/// A run of steps whose chance reaches the threshold.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Window {
    /// Begin: exact to 1 s where Sun or bow decide, else where the chance crosses the threshold between two steps.
    pub start: DateTime<Utc>,
    /// End, likewise.
    pub end: DateTime<Utc>,
    /// The best step.
    pub best: Best,
    /// True azimuth to face at the best step: that of the antisolar point, degrees.
    pub face_azimuth_deg: f64,
    /// The same from magnetic north; null outside the years of the magnetic model.
    pub face_magnetic_deg: Option<f64>,
    /// Elevation of the crown at the best step, degrees.
    pub crown_elevation_deg: f64,
    /// Visible share of the primary's circle at the best step, 0..1.
    pub visible_arc_fraction: f64,
    /// What limits the chance at the best step; null where nothing does.
    pub limited_by: Option<Limit>,
}

/// When the Sun or the bow comes over the horizon in use or goes below it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, ToSchema)]
pub struct SkyEvent {
    /// When, to 1 s.
    pub time: DateTime<Utc>,
    /// What happens.
    pub event: SkyEventKind,
}

/// What happens in a sky event.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum SkyEventKind {
    /// The Sun's upper limb comes over the horizon in use.
    Sunrise,
    /// The Sun's upper limb goes behind the horizon in use.
    Sunset,
    /// The primary begins to stand over the horizon while the Sun is out.
    BowRises,
    /// The primary ceases to stand over the horizon, or the Sun goes.
    BowSets,
}

/// Something the feed lacks and what was taken instead.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, ToSchema)]
pub struct Assumption {
    /// What it is about: a value of the feed, or a part of the model.
    pub value: &'static str,
    /// What was taken, in words.
    pub text: String,
}

/// Sky and weather over the asked time, without what the edge adds.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Outlook {
    /// The timeline.
    pub steps: Vec<Step>,
    /// The good windows, in order.
    pub windows: Vec<Window>,
    /// Risings and settings, in order.
    pub sky_events: Vec<SkyEvent>,
    /// What the feed lacked and what was taken instead.
    pub assumed: Vec<Assumption>,
    /// Cautions for those who go out.
    pub cautions: Vec<&'static str>,
}

/// What everyone who goes out for a bow should have read.
pub const CAUTIONS: [&str; 6] = [
    "Thunder: go indoors or into a car at the first rumble, and stay there until 30 minutes after the last.",
    "Never look at the Sun through a lens, a viewfinder or binoculars.",
    "Wet rock, cliff edges, tides and rising streams are slippery and quick: keep a way back.",
    "Do not watch the sky while driving; stop where it is safe and allowed.",
    "Drones and private land: local rules decide, not this page.",
    "This is no official weather warning and never replaces one.",
];

/// Added where the feed gives thunder a chance within the outlook.
pub const THUNDER_CAUTION: &str = "The feed gives thunder a chance in these hours.";
