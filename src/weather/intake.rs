//! What the readers share: numbers into kept values, amounts into rates, and an account of what was left out.

use std::ops::Range;

use chrono::DateTime;

use super::field::{Field, Origin, Series, Times};
use super::quantity::{Dimension, Quantity};
use super::read::ReadError;
use super::spec::Side;
use super::unit::{Conversion, Unit};
use crate::bounds::{LAT, LON, Place};

/// Turns the numbers of one quantity into values kept, counting what is left out.
pub(super) struct Intake {
    quantity: Quantity,
    unit: Unit,
    at: String,
    by: Conversion,
    missing: usize,
    outside: usize,
    unreadable: usize,
    kept: usize,
}

/// Overshoot beyond the plausible range that is only the rounding of a packed document, in the unit kept: taken to the
/// bound instead of left out.
fn rounding(dimension: Dimension) -> f64 {
    match dimension {
        Dimension::Share => 0.005,
        Dimension::RainRate | Dimension::Angle => 0.01,
        Dimension::Length | Dimension::Speed | Dimension::Temperature => 0.0,
    }
}

impl Intake {
    pub(super) fn new(quantity: Quantity, unit: Unit, at: &str) -> Result<Self, ReadError> {
        let by = unit
            .conversion(quantity)
            .map_err(|wrong| ReadError::Unexpected { at: at.to_owned(), what: wrong.to_string() })?;
        Ok(Self { quantity, unit, at: at.to_owned(), by, missing: 0, outside: 0, unreadable: 0, kept: 0 })
    }

    /// Whether the numbers are amounts, so that [`Intake::keep`] needs a period.
    pub(super) fn is_amount(&self) -> bool {
        self.by.amount
    }

    /// The value kept for a number of the document; NaN when it is missing or impossible. `over_h` is the period of an
    /// amount in hours, 1 for all else.
    pub(super) fn keep(&mut self, number: f64, over_h: f64) -> f32 {
        let (min, max) = self.quantity.plausible();
        let slack = rounding(self.quantity.dimension());
        let value = number * self.by.scale / over_h + self.by.offset;
        if value >= min - slack && value <= max + slack {
            self.kept += 1;
            value.clamp(min, max) as f32
        } else {
            self.outside += 1;
            f32::NAN
        }
    }

    /// A value that the document leaves out.
    pub(super) fn lack(&mut self) -> f32 {
        self.missing += 1;
        f32::NAN
    }

    /// A value that is there but is no number.
    pub(super) fn spoilt(&mut self) -> f32 {
        self.unreadable += 1;
        f32::NAN
    }

    /// Puts the series into the field with its origin and notes. A quantity with no value at all is left out.
    pub(super) fn deliver(self, field: &mut Field, series: Series) -> Result<(), ReadError> {
        let name = self.quantity.name();
        let (min, max) = self.quantity.plausible();
        let possible = format!("{min}..{max} {}", self.quantity.unit().trim_start_matches('1'));
        let possible = possible.trim_end();
        let total = self.kept + self.outside + self.unreadable + self.missing;
        if self.kept == 0 && self.outside > 0 {
            return Err(ReadError::Unexpected {
                at: self.at,
                what: format!(
                    "read in {} as {name}, none of {} values lies within {possible}: is the unit right?",
                    self.unit.code(),
                    self.outside
                ),
            });
        }
        if self.kept == 0 && self.unreadable > 0 {
            return Err(ReadError::Unexpected {
                at: self.at,
                what: format!("none of {} values of {name} is a number", self.unreadable),
            });
        }
        if self.kept == 0 {
            field.notes.push(format!("{name}: {} holds no value in any of {total} places", self.at));
            return Ok(());
        }
        if self.outside > 0 {
            field.notes.push(format!("{} values of {name} outside {possible} left out", self.outside));
        }
        if self.unreadable > 0 {
            field.notes.push(format!("{} values of {name} are no numbers and left out", self.unreadable));
        }
        field.insert(self.quantity, series)?;
        let missing = self.missing + self.outside + self.unreadable;
        field.origins.insert(self.quantity, Origin { at: self.at, unit: self.unit.code(), missing });
        Ok(())
    }
}

/// The period that ends or begins at a time stamp.
pub(super) fn period(time_s: i64, over_s: i64, side: Side) -> Range<i64> {
    match side {
        Side::Before => time_s - over_s..time_s,
        Side::After => time_s..time_s + over_s,
    }
}

/// Checks that ascending periods do not overlap: an amount counted twice would be a wrong number.
pub(super) fn apart(periods: Vec<Range<i64>>, name: &str, at: &str) -> Result<Times, ReadError> {
    if let Some(empty) = periods.iter().find(|period| period.start >= period.end) {
        return Err(ReadError::Unexpected {
            at: at.to_owned(),
            what: format!("the period of {name} at {} is empty or runs backwards", moment(empty.end)),
        });
    }
    if let Some(pair) = periods.windows(2).find(|pair| pair[0].end > pair[1].start) {
        let minutes = (pair[0].end - pair[0].start) / 60;
        return Err(ReadError::Unexpected {
            at: at.to_owned(),
            what: format!(
                "the periods of {name} overlap: {minutes} min from {}, and the next begins at {}",
                moment(pair[0].start),
                moment(pair[1].start)
            ),
        });
    }
    Ok(Times::Periods(periods))
}

/// Unix seconds in words.
pub(super) fn moment(time_s: i64) -> String {
    DateTime::from_timestamp(time_s, 0)
        .map_or_else(|| format!("{time_s} s"), |time| time.format("%Y-%m-%dT%H:%M:%SZ").to_string())
}

/// Order in which the times ascend. Two equal times are refused.
pub(super) fn ascending(times: &[i64], at: &str) -> Result<Vec<usize>, ReadError> {
    let mut order: Vec<usize> = (0..times.len()).collect();
    order.sort_by_key(|&index| times[index]);
    if let Some(pair) = order.windows(2).find(|pair| times[pair[0]] == times[pair[1]]) {
        return Err(ReadError::Unexpected {
            at: at.to_owned(),
            what: format!("the time {} occurs twice", moment(times[pair[0]])),
        });
    }
    Ok(order)
}

/// A place from a document, whose longitudes may run to 360.
pub(super) fn place(lat_deg: f64, lon_deg: f64, at: &str) -> Result<Place, ReadError> {
    let turned = if lon_deg > LON.max && lon_deg <= 360.0 { lon_deg - 360.0 } else { lon_deg };
    LAT.check(lat_deg)
        .and_then(|lat_deg| Place::new(lat_deg, turned))
        .map_err(|bound| ReadError::Unexpected { at: at.to_owned(), what: bound.to_string() })
}

/// Shortens text of a document for an error.
pub(super) fn short(text: &str) -> String {
    text.chars().take(40).collect()
}
