//! Axes of a domain: where and when its values stand, and in which order they are laid out.

use std::collections::BTreeMap;

use chrono::{DateTime, NaiveDate, NaiveDateTime};

use super::document::{Axis, Reference, Tick};
use crate::weather::field::Space;
use crate::weather::intake::{self, short};
use crate::weather::read::ReadError;

/// The axes of one coverage, sorted to ascend.
pub(super) struct Axes {
    pub space: Space,
    /// Unix seconds, ascending.
    pub times: Vec<i64>,
    /// Periods of the time axis, where it has bounds.
    pub periods: Option<Vec<std::ops::Range<i64>>>,
    /// Positions in the document of the sorted times, latitudes and longitudes.
    pub orders: [Vec<usize>; 3],
}

/// Names of the axes whose order the values follow here.
pub(super) const NAMES: [&str; 3] = ["t", "y", "x"];

fn unexpected(at: &str, what: impl Into<String>) -> ReadError {
    ReadError::Unexpected { at: at.to_owned(), what: what.into() }
}

/// How many ticks an axis has, before any of them is made.
pub(super) fn count(axis: &Axis, name: &str) -> Result<usize, ReadError> {
    match (&axis.values, axis.num) {
        (Some(values), _) => Ok(values.len()),
        (None, Some(num)) => {
            usize::try_from(num).map_err(|_| unexpected(name, format!("an axis of {num} values is too long")))
        }
        (None, None) => Err(unexpected(name, "the axis has neither values nor start, stop and num")),
    }
}

impl Axes {
    /// Reads the axes of a Grid or `PointSeries`. Their lengths must have been checked against the values, so that a
    /// short document cannot ask for a long axis.
    pub fn read(axes: &BTreeMap<String, Axis>, series: bool) -> Result<Self, ReadError> {
        let axis = |name: &str| axes.get(name).ok_or_else(|| unexpected("axes", format!("there is no {name} axis")));
        let t = axis("t")?;
        let stamps = instants(t.values.as_deref(), "t")?;
        let t_order = intake::ascending(&stamps, "t")?;
        let times: Vec<i64> = t_order.iter().map(|&index| stamps[index]).collect();
        let periods = t.bounds.as_ref().map(|bounds| periods(bounds, &t_order)).transpose()?;

        let (lats, lons) = (numbers(axis("y")?, "y")?, numbers(axis("x")?, "x")?);
        let (y_order, x_order, space) = if series {
            let (&[lat], &[lon]) = (lats.as_slice(), lons.as_slice()) else {
                return Err(unexpected("axes", "a PointSeries with more than one place"));
            };
            (vec![0], vec![0], Space::Point(intake::place(lat, lon, "axes")?))
        } else {
            let (y_order, lats_deg) = straight(lats, false);
            let (x_order, lons_deg) = straight(lons, true);
            (y_order, x_order, Space::Grid { lats_deg, lons_deg })
        };
        Ok(Self { space, times, periods, orders: [t_order, y_order, x_order] })
    }
}

/// A descending axis turned round; a longitude axis across the date line continued beyond 180. Other disorder is left
/// for the field to refuse.
fn straight(ticks: Vec<f64>, longitude: bool) -> (Vec<usize>, Vec<f64>) {
    let order: Vec<usize> = (0..ticks.len()).collect();
    if ticks.len() > 1 && ticks.windows(2).all(|pair| pair[0] > pair[1]) {
        return (order.into_iter().rev().collect(), ticks.into_iter().rev().collect());
    }
    let drop = ticks.windows(2).position(|pair| pair[1] < pair[0] - 180.0);
    match drop {
        Some(drop) if longitude => {
            let turned = ticks.iter().enumerate().map(|(index, &tick)| if index > drop { tick + 360.0 } else { tick });
            (order, turned.collect())
        }
        _ => (order, ticks),
    }
}

/// The numbers of an axis.
fn numbers(axis: &Axis, name: &str) -> Result<Vec<f64>, ReadError> {
    if let Some(values) = &axis.values {
        let number = |tick: &Tick| match tick {
            Tick::Number(number) if number.is_finite() => Ok(*number),
            _ => Err(unexpected(name, "an axis value is no number")),
        };
        return values.iter().map(number).collect();
    }
    match (axis.start, axis.stop, axis.num) {
        (Some(start), Some(_), Some(1)) => Ok(vec![start]),
        (Some(start), Some(stop), Some(num)) if num > 1 => {
            Ok((0..num).map(|index| start + (stop - start) * index as f64 / (num - 1) as f64).collect())
        }
        _ => Err(unexpected(name, "the axis has neither values nor start, stop and num")),
    }
}

fn instants(values: Option<&[Tick]>, name: &str) -> Result<Vec<i64>, ReadError> {
    let values = values.ok_or_else(|| unexpected(name, "a time axis needs values"))?;
    let instant = |tick: &Tick| match tick {
        Tick::Text(text) => instant(text).ok_or_else(|| {
            unexpected(name, format!("{:?} is no date and time of the Gregorian calendar", short(text)))
        }),
        _ => Err(unexpected(name, "a time is no text")),
    };
    values.iter().map(instant).collect()
}

/// Unix seconds of a time in the forms that the standard allows down to the day; without an offset it is taken as UTC.
pub(super) fn instant(text: &str) -> Option<i64> {
    let text = text.trim();
    if let Ok(time) = DateTime::parse_from_rfc3339(text) {
        return Some(time.timestamp());
    }
    if let Some(time) = ["%Y-%m-%dT%H:%M%#z", "%Y-%m-%dT%H:%M:%S%.f%#z"]
        .iter()
        .find_map(|pattern| DateTime::parse_from_str(text, pattern).ok())
    {
        return Some(time.timestamp());
    }
    ["%Y-%m-%dT%H:%M", "%Y-%m-%dT%H:%M:%S%.f"]
        .iter()
        .find_map(|pattern| NaiveDateTime::parse_from_str(text, pattern).ok())
        .or_else(|| NaiveDate::parse_from_str(text, "%Y-%m-%d").ok()?.and_hms_opt(0, 0, 0))
        .map(|time| time.and_utc().timestamp())
}

fn periods(bounds: &[Tick], order: &[usize]) -> Result<Vec<std::ops::Range<i64>>, ReadError> {
    let bounds = instants(Some(bounds), "t bounds")?;
    if bounds.len() != 2 * order.len() {
        return Err(unexpected("t bounds", format!("{} bounds for {} times", bounds.len(), order.len())));
    }
    Ok(order.iter().map(|&index| bounds[2 * index]..bounds[2 * index + 1]).collect())
}

/// Checks that places are longitude and latitude and times Gregorian.
pub(super) fn check_references(references: &[Reference], notes: &mut Vec<String>) -> Result<(), ReadError> {
    let about = |names: &'static [&str]| {
        references
            .iter()
            .filter(|reference| reference.coordinates.iter().any(|coordinate| names.contains(&coordinate.as_str())))
    };
    for reference in about(&["x", "y"]) {
        let system = &reference.system;
        let id = system.id.as_deref().unwrap_or_default();
        let known = ["CRS84", "CRS84h", "4326", "4979"]
            .iter()
            .any(|&tail| id.strip_suffix(tail).is_some_and(|rest| rest.ends_with(['/', ':']) || rest.is_empty()));
        if system.kind != "GeographicCRS" || !(known || id.is_empty()) {
            return Err(ReadError::Unsupported(format!(
                "the reference system {} {id:?}: only longitude and latitude (CRS84, EPSG 4326 or 4979) are read",
                short(&system.kind),
                id = short(id)
            )));
        }
    }
    if about(&["x", "y"]).next().is_none() {
        notes.push("the document names no reference system: x is taken as longitude, y as latitude".into());
    }
    for reference in about(&["t"]) {
        let calendar = reference.system.calendar.as_deref().unwrap_or("Gregorian");
        let gregorian = calendar.eq_ignore_ascii_case("gregorian") || calendar.ends_with("/Gregorian");
        if reference.system.kind != "TemporalRS" || !gregorian {
            return Err(ReadError::Unsupported(format!("the calendar {:?}", short(calendar))));
        }
    }
    Ok(())
}
