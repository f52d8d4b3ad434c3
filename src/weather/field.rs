//! A field: weather read from one document, asked for one value at a place and time.

use std::collections::BTreeMap;
use std::ops::Range;

use chrono::{DateTime, Utc};
use thiserror::Error;

use super::quantity::{Dimension, Quantity};
use crate::bounds::Place;
use crate::sky::horizon::EARTH_RADIUS_M;

/// Mean radius of the Earth, km.
const EARTH_KM: f64 = EARTH_RADIUS_M / 1000.0;

/// Length of a degree of a great circle, km.
pub const KM_PER_DEG: f64 = EARTH_KM * std::f64::consts::PI / 180.0;

/// How far from its place the series of one point still speaks for the weather, km.
pub const POINT_REACH_KM: f64 = 50.0;

/// Longest gap between two time stamps across which a state is interpolated, s.
pub const MAX_GAP_S: i64 = 6 * 3600;

/// How far outside its outermost points a grid still speaks, as a share of the last cell.
const EDGE_SHARE: f64 = 0.5;

/// Weather from one document.
#[derive(Debug, Clone)]
pub struct Field {
    /// When the forecast was made, where the document says so.
    pub issued: Option<DateTime<Utc>>,
    /// Where the values stand.
    pub space: Space,
    /// Whether the document itself says where its values stand; if not, they are taken to stand where they were asked for.
    pub located: bool,
    /// Whether [`Quantity::CloudBase`] is a height above mean sea level instead of above the ground.
    pub cloud_base_above_sea: bool,
    /// What the reader passed over, in words for `feed check`.
    pub notes: Vec<String>,
    /// Where each quantity was found in the document.
    pub origins: BTreeMap<Quantity, Origin>,
    series: [Option<Series>; Quantity::ALL.len()],
}

/// Where a field's values stand.
#[derive(Debug, Clone, PartialEq)]
pub enum Space {
    /// One place.
    Point(Place),
    /// A grid regular or not along each axis; both ascending, in degrees. Values run latitude by latitude.
    Grid {
        /// Latitudes, ascending.
        lats_deg: Vec<f64>,
        /// Longitudes, ascending; may run beyond 180.
        lons_deg: Vec<f64>,
    },
}

/// Where and how a quantity stood in its document.
#[derive(Debug, Clone, PartialEq)]
pub struct Origin {
    /// Pointer or name of the parameter.
    pub at: String,
    /// Unit there (UCUM).
    pub unit: &'static str,
    /// Values of the document that were missing or left out.
    pub missing: usize,
}

/// The values of one quantity, in the unit of [`Quantity::unit`].
#[derive(Debug, Clone, PartialEq)]
pub struct Series {
    /// When each value holds.
    pub times: Times,
    /// `times.len() * cells` values, time by time; NaN where missing.
    pub values: Vec<f32>,
}

/// When the values of a series hold, Unix seconds.
#[derive(Debug, Clone, PartialEq)]
pub enum Times {
    /// At instants, strictly ascending: a state, linear in between.
    Instants(Vec<i64>),
    /// Over half-open periods, ascending, not overlapping: a mean rate, constant within.
    Periods(Vec<Range<i64>>),
}

/// Why a series does not fit its field.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum FieldError {
    /// There is no time or no cell at all.
    #[error("{0} has no values")]
    Empty(&'static str),
    /// Count of values differs from times x cells.
    #[error("{name} has {found} values where its axes make {expected}")]
    Shape {
        /// The quantity.
        name: &'static str,
        /// Values found.
        found: usize,
        /// Values that the axes make.
        expected: usize,
    },
    /// Times or periods are not in ascending order.
    #[error("the times of {0} do not ascend")]
    Order(&'static str),
    /// An axis of the grid does not ascend or has a value that is no coordinate.
    #[error("the {0} axis of the grid does not ascend or is no coordinate")]
    Axis(&'static str),
}

impl Times {
    /// How many there are.
    pub fn len(&self) -> usize {
        match self {
            Self::Instants(times) => times.len(),
            Self::Periods(periods) => periods.len(),
        }
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// First and last moment covered, Unix seconds.
    pub fn extent(&self) -> Option<(i64, i64)> {
        match self {
            Self::Instants(times) => Some((*times.first()?, *times.last()?)),
            Self::Periods(periods) => Some((periods.first()?.start, periods.last()?.end)),
        }
    }

    /// Lengths of the gaps in which the series says nothing, as (start, end).
    pub fn gaps(&self) -> Vec<(i64, i64)> {
        match self {
            Self::Instants(times) => {
                times.windows(2).filter(|pair| pair[1] - pair[0] > MAX_GAP_S).map(|pair| (pair[0], pair[1])).collect()
            }
            Self::Periods(periods) => periods
                .windows(2)
                .filter(|pair| pair[1].start > pair[0].end)
                .map(|pair| (pair[0].end, pair[1].start))
                .collect(),
        }
    }

    fn ascend(&self) -> bool {
        match self {
            Self::Instants(times) => times.windows(2).all(|pair| pair[0] < pair[1]),
            Self::Periods(periods) => {
                periods.iter().all(|period| period.start < period.end)
                    && periods.windows(2).all(|pair| pair[0].end <= pair[1].start)
            }
        }
    }

    /// The two values between which `time_s` lies and the weight of the second; none outside or in a gap.
    pub fn bracket(&self, time_s: i64) -> Option<(usize, usize, f32)> {
        match self {
            Self::Instants(times) => {
                let after = times.partition_point(|&time| time <= time_s);
                if after == 0 {
                    return None;
                }
                let before = after - 1;
                if times[before] == time_s {
                    return Some((before, before, 0.0));
                }
                let next = *times.get(after)?;
                let gap_s = next - times[before];
                (gap_s <= MAX_GAP_S).then(|| (before, after, ((time_s - times[before]) as f64 / gap_s as f64) as f32))
            }
            Self::Periods(periods) => {
                let after = periods.partition_point(|period| period.start <= time_s);
                let index = after.checked_sub(1)?;
                (time_s < periods[index].end).then_some((index, index, 0.0))
            }
        }
    }
}

impl Field {
    /// A field without values yet.
    ///
    /// # Errors
    /// [`FieldError::Axis`] when an axis of the grid is empty, does not ascend or holds no coordinates.
    pub fn new(space: Space, issued: Option<DateTime<Utc>>) -> Result<Self, FieldError> {
        if let Space::Grid { lats_deg, lons_deg } = &space {
            let ascends = |axis: &[f64], min: f64, max: f64| {
                !axis.is_empty()
                    && axis.windows(2).all(|pair| pair[0] < pair[1])
                    && axis.iter().all(|&value| value >= min && value <= max)
            };
            if !ascends(lats_deg, -90.0, 90.0) {
                return Err(FieldError::Axis("latitude"));
            }
            if !ascends(lons_deg, -360.0, 720.0) {
                return Err(FieldError::Axis("longitude"));
            }
        }
        Ok(Self {
            issued,
            space,
            located: true,
            cloud_base_above_sea: false,
            notes: Vec::new(),
            origins: BTreeMap::new(),
            series: std::array::from_fn(|_| None),
        })
    }

    /// Number of places at which values stand.
    pub fn cells(&self) -> usize {
        match &self.space {
            Space::Point(_) => 1,
            Space::Grid { lats_deg, lons_deg } => lats_deg.len() * lons_deg.len(),
        }
    }

    /// Memory that the values and axes take, bytes.
    pub fn bytes(&self) -> usize {
        let axes = match &self.space {
            Space::Point(_) => 0,
            Space::Grid { lats_deg, lons_deg } => 8 * (lats_deg.len() + lons_deg.len()),
        };
        let series: usize =
            self.series.iter().flatten().map(|series| 4 * series.values.len() + 16 * series.times.len()).sum();
        size_of::<Self>() + axes + series
    }

    /// Adds or replaces the values of a quantity.
    ///
    /// # Errors
    /// [`FieldError`] when the values do not fit the axes or the times do not ascend.
    pub fn insert(&mut self, quantity: Quantity, series: Series) -> Result<(), FieldError> {
        let name = quantity.name();
        let expected = series.times.len() * self.cells();
        if expected == 0 {
            return Err(FieldError::Empty(name));
        }
        if series.values.len() != expected {
            return Err(FieldError::Shape { name, found: series.values.len(), expected });
        }
        if !series.times.ascend() {
            return Err(FieldError::Order(name));
        }
        self.series[quantity as usize] = Some(series);
        Ok(())
    }

    /// The values of a quantity, where the document has it.
    pub fn series(&self, quantity: Quantity) -> Option<&Series> {
        self.series[quantity as usize].as_ref()
    }

    /// The quantities that the document has.
    pub fn quantities(&self) -> impl Iterator<Item = Quantity> + '_ {
        Quantity::ALL.into_iter().filter(|&quantity| self.series(quantity).is_some())
    }

    /// First and last moment of which any quantity speaks, Unix seconds.
    pub fn extent(&self) -> Option<(i64, i64)> {
        self.series
            .iter()
            .flatten()
            .filter_map(|series| series.times.extent())
            .reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)))
    }

    /// The value of a quantity at a place and time: bilinear in space, linear in time for states, constant within
    /// its period for rates; directions by the mean of their unit vectors. None outside the area or time, in a gap
    /// longer than [`MAX_GAP_S`], or where missing. A field of one point speaks for [`POINT_REACH_KM`] around it.
    pub fn at(&self, quantity: Quantity, place: Place, time_s: i64) -> Option<f32> {
        let series = self.series(quantity)?;
        let bracket = series.times.bracket(time_s)?;
        let corners = self.corners(place.lat_deg(), place.lon_deg())?;
        let value = if quantity.dimension() == Dimension::Angle {
            series.sample_direction(self.cells(), bracket, &corners)
        } else {
            series.sample(self.cells(), bracket, &corners)
        };
        value.is_finite().then_some(value)
    }

    /// The four cells around a place and their weights; none outside the area.
    pub fn corners(&self, lat_deg: f64, lon_deg: f64) -> Option<[(usize, f32); 4]> {
        match &self.space {
            Space::Point(point) => (distance_km(point, lat_deg, lon_deg) <= POINT_REACH_KM).then_some([
                (0, 1.0),
                (0, 0.0),
                (0, 0.0),
                (0, 0.0),
            ]),
            Space::Grid { lats_deg, lons_deg } => {
                let west = *lons_deg.first()?;
                let turn = (lon_deg - west).div_euclid(360.0) * 360.0;
                let (south, north, to_north) = along(lats_deg, lat_deg, None)?;
                let round = round_the_globe(lons_deg);
                let (left, right, to_right) = along(lons_deg, lon_deg - turn, round)
                    .or_else(|| along(lons_deg, lon_deg - turn - 360.0, round))?;
                let width = lons_deg.len();
                let (v, u) = (to_north as f32, to_right as f32);
                Some([
                    (south * width + left, (1.0 - v) * (1.0 - u)),
                    (south * width + right, (1.0 - v) * u),
                    (north * width + left, v * (1.0 - u)),
                    (north * width + right, v * u),
                ])
            }
        }
    }
}

impl Series {
    /// Weighted mean over cells and times; NaN where a contributing value is missing.
    pub fn sample(&self, cells: usize, bracket: (usize, usize, f32), corners: &[(usize, f32); 4]) -> f32 {
        self.mean(cells, bracket, corners, |value| value)
    }

    /// Weighted mean of directions in degrees, 0..360: that of their unit vectors, so that 350 and 10 make 0. NaN where
    /// a contributing value is missing or the directions cancel.
    pub fn sample_direction(&self, cells: usize, bracket: (usize, usize, f32), corners: &[(usize, f32); 4]) -> f32 {
        let east = self.mean(cells, bracket, corners, |value| value.to_radians().sin());
        let north = self.mean(cells, bracket, corners, |value| value.to_radians().cos());
        if east.hypot(north) > 1e-4 { east.atan2(north).to_degrees().rem_euclid(360.0) } else { f32::NAN }
    }

    fn mean(
        &self,
        cells: usize,
        (before, after, weight): (usize, usize, f32),
        corners: &[(usize, f32); 4],
        part: impl Fn(f32) -> f32,
    ) -> f32 {
        let slice = |index: usize| {
            let values = &self.values[index * cells..(index + 1) * cells];
            corners.iter().filter(|corner| corner.1 > 0.0).map(|&(cell, share)| part(values[cell]) * share).sum::<f32>()
        };
        if weight <= 0.0 { slice(before) } else { slice(before) * (1.0 - weight) + slice(after) * weight }
    }
}

/// Great-circle distance, km, by the haversine formula (Sinnott 1984) on a sphere; within 0.6 % of the ellipsoid.
fn distance_km(from: &Place, lat_deg: f64, lon_deg: f64) -> f64 {
    let (here, there) = (from.lat_deg().to_radians(), lat_deg.to_radians());
    let across = ((lon_deg - from.lon_deg()).to_radians() / 2.0).sin();
    let along = ((there - here) / 2.0).sin();
    let h = along * along + here.cos() * there.cos() * across * across;
    2.0 * EARTH_KM * h.clamp(0.0, 1.0).sqrt().asin()
}

/// Step that closes a longitude axis round the globe, where it does.
fn round_the_globe(lons_deg: &[f64]) -> Option<f64> {
    let (first, last) = (lons_deg.first()?, lons_deg.last()?);
    let step = (last - first) / (lons_deg.len().checked_sub(1).filter(|&n| n > 1)?) as f64;
    let closing = 360.0 - (last - first);
    (closing > 0.0 && closing < 1.5 * step).then_some(closing)
}

/// Neighbours of `value` on an ascending axis and the weight of the second; half a cell beyond either end still counts.
fn along(axis: &[f64], value: f64, closing: Option<f64>) -> Option<(usize, usize, f64)> {
    let last = axis.len() - 1;
    if last == 0 {
        return ((value - axis[0]).abs() * KM_PER_DEG <= POINT_REACH_KM).then_some((0, 0, 0.0));
    }
    let after = axis.partition_point(|&tick| tick <= value);
    if after == 0 {
        return (axis[0] - value <= EDGE_SHARE * (axis[1] - axis[0])).then_some((0, 0, 0.0));
    }
    if after > last {
        let beyond = value - axis[last];
        if let Some(step) = closing {
            return (beyond <= step).then(|| (last, 0, beyond / step));
        }
        return (beyond <= EDGE_SHARE * (axis[last] - axis[last - 1])).then_some((last, last, 0.0));
    }
    let before = after - 1;
    Some((before, after, (value - axis[before]) / (axis[after] - axis[before])))
}

#[cfg(test)]
mod tests;
