//! JSON documents read through a mapping of RFC 6901 pointers, in both common shapes: arrays side by side, and a list
//! of objects per step.

mod stamp;

use serde_json::Value;

pub use stamp::Stamp;

use super::field::{Field, Series, Space, Times};
use super::intake::{self, Intake};
use super::quantity::Quantity;
use super::read::{self, ReadError};
use super::spec::{Above, JsonMapping, Side, ValueMapping};
use crate::bounds::{OVER_MIN, Place};

/// Reads a JSON document; `asked` is where its values stand when the mapping does not say.
///
/// Nulls, the mapping's `missing` numbers and, unless it says what they stand for, absent keys are missing values; so are
/// numbers outside what is possible, which are counted in the notes. Steps out of order are sorted.
///
/// # Errors
/// See [`ReadError`]: a pointer that matches nothing, arrays of different lengths, times that occur twice, amounts
/// whose periods overlap.
pub fn read(bytes: &[u8], mapping: &JsonMapping, asked: Place) -> Result<Field, ReadError> {
    if let Some((key, what)) = faults(mapping).into_iter().next() {
        return Err(ReadError::Unexpected { at: format!("mapping {key}"), what });
    }
    let root: Value =
        serde_json::from_str(read::text(bytes)?).map_err(|error| ReadError::Malformed(error.to_string()))?;
    let stamp = Stamp::new(mapping);
    let steps = Steps::find(&root, mapping)?;
    let times = steps.times(mapping, &stamp)?;
    let order = intake::ascending(&times, &mapping.time)?;

    let mut field = field_for(&root, mapping, &stamp, asked)?;
    if order.windows(2).any(|pair| pair[0] > pair[1]) {
        field.notes.push("the steps were out of order and have been sorted".into());
    }
    for (&quantity, value) in &mapping.values {
        let column = steps.column(value, times.len(), &mapping.time)?;
        let absent = column.iter().filter(|found| found.is_none()).count();
        if let (1.., Some(number)) = (absent, value.absent) {
            let (name, unit, count) = (quantity.name(), value.unit.code(), times.len());
            field
                .notes
                .push(format!("{name}: {} is absent in {absent} of {count} steps: {number} {unit} there", value.at));
        }
        let mut intake = Intake::new(quantity, value.unit, &value.at)?;
        let series = if value.has_period() {
            let periods = steps.periods(value, &times, &stamp)?;
            rates(&mut intake, &column, value, &periods, &order, quantity)?
        } else {
            let values = order.iter().map(|&step| take(&mut intake, column[step], value, 1.0)).collect();
            Series { times: Times::Instants(order.iter().map(|&step| times[step]).collect()), values }
        };
        intake.deliver(&mut field, series)?;
    }
    field.cloud_base_above_sea =
        mapping.values.get(&Quantity::CloudBase).is_some_and(|value| value.above == Some(Above::Sea));
    if field.quantities().next().is_none() {
        return Err(ReadError::Empty(format!("none of the values mapped has a value in {} steps", times.len())));
    }
    Ok(field)
}

/// What is wrong with a mapping, by key; checked when a feed is set up.
pub fn faults(mapping: &JsonMapping) -> Vec<(String, String)> {
    let mut faults = Vec::new();
    let pointers =
        [("steps", mapping.steps.as_ref()), ("time", Some(&mapping.time)), ("issued", mapping.issued.as_ref())];
    let places = [("lat", mapping.lat.as_ref()), ("lon", mapping.lon.as_ref())];
    for (key, pointer) in pointers.into_iter().chain(places) {
        if let Some(what) = pointer.and_then(|pointer| bad_pointer(pointer)) {
            faults.push((key.into(), what));
        }
    }
    if mapping.lat.is_some() != mapping.lon.is_some() {
        faults.push(("lat".into(), "lat and lon go together: give both or neither".into()));
    }
    if let Some(what) = stamp::bad_format(&mapping.time_format) {
        faults.push(("time_format".into(), what));
    }
    if mapping.values.is_empty() {
        faults.push(("values".into(), "no value is mapped".into()));
    }
    for (quantity, value) in &mapping.values {
        let mut fault = |key: &str, what: String| faults.push((format!("values.{}{key}", quantity.name()), what));
        for pointer in [Some(&value.at), value.since.as_ref()].into_iter().flatten() {
            if let Some(what) = bad_pointer(pointer) {
                fault(".at", what);
            }
        }
        if value.above.is_some() && *quantity != Quantity::CloudBase {
            fault(".above", "is for cloud_base alone".into());
        }
        if let Some(number) = value.absent {
            if mapping.steps.is_none() {
                fault(".absent", "needs a list of steps".into());
            }
            if !number.is_finite() {
                fault(".absent", format!("{number} is no number"));
            }
        }
        match value.unit.conversion(*quantity) {
            Err(wrong) => fault(".unit", wrong.to_string()),
            Ok(_) if value.has_period() && *quantity != Quantity::Rain => {
                fault("", "over_min, period and since are for rain alone".into());
            }
            Ok(by) if !(value.has_period() || by.amount) => {}
            Ok(by) => match (&value.since, value.over_min, value.period) {
                (Some(_), None, None) if mapping.steps.is_some() => {}
                (Some(_), None, None) => fault(".since", "needs a list of steps".into()),
                (None, Some(over_min), Some(_)) => {
                    if let Err(bound) = OVER_MIN.check(over_min) {
                        fault(".over_min", bound.to_string());
                    }
                }
                _ => {
                    let kind = if by.amount { "an amount" } else { "a mean rate" };
                    fault("", format!("{kind} in {} needs over_min and period, or since", value.unit.code()));
                }
            },
        }
    }
    faults
}

fn bad_pointer(pointer: &str) -> Option<String> {
    (!pointer.is_empty() && !pointer.starts_with('/'))
        .then(|| format!("{pointer:?} is no JSON pointer (RFC 6901): it must begin with \"/\""))
}

/// Where the steps of a document are.
enum Steps<'a> {
    /// A list with one object per step.
    List(&'a [Value]),
    /// Arrays side by side, found from the root.
    Arrays(&'a Value),
}

impl<'a> Steps<'a> {
    fn find(root: &'a Value, mapping: &JsonMapping) -> Result<Self, ReadError> {
        match &mapping.steps {
            None => Ok(Self::Arrays(root)),
            Some(at) => array(root, at).map(Self::List),
        }
    }

    fn times(&self, mapping: &JsonMapping, stamp: &Stamp) -> Result<Vec<i64>, ReadError> {
        let written: Vec<&Value> = match self {
            Self::Arrays(root) => array(root, &mapping.time)?.iter().collect(),
            Self::List(steps) => steps
                .iter()
                .enumerate()
                .map(|(index, step)| {
                    step.pointer(&mapping.time).ok_or_else(|| ReadError::Unexpected {
                        at: mapping.time.clone(),
                        what: format!("step {index} has no time there"),
                    })
                })
                .collect::<Result<_, _>>()?,
        };
        if written.is_empty() {
            return Err(ReadError::Empty("the document has no steps".into()));
        }
        let stamps: Result<Vec<_>, _> = written.into_iter().map(|value| stamp.read(value, &mapping.time)).collect();
        Ok(stamp::series(&stamps?))
    }

    /// What stands at a pointer in each step.
    fn column(&self, value: &ValueMapping, count: usize, time_at: &str) -> Result<Vec<Option<&'a Value>>, ReadError> {
        let at = &value.at;
        let unexpected = |what| ReadError::Unexpected { at: at.to_owned(), what };
        match self {
            Self::List(steps) => {
                let column: Vec<_> = steps.iter().map(|step| step.pointer(at)).collect();
                if value.absent.is_none() && column.iter().all(Option::is_none) {
                    return Err(unexpected(format!("is in none of the {count} steps")));
                }
                Ok(column)
            }
            Self::Arrays(root) => {
                let values = array(root, at)?;
                if values.len() != count {
                    return Err(unexpected(format!("has {} values but {time_at} has {count}", values.len())));
                }
                Ok(values.iter().map(Some).collect())
            }
        }
    }

    /// The period of an amount at each step.
    fn periods(
        &self,
        value: &ValueMapping,
        times: &[i64],
        stamp: &Stamp,
    ) -> Result<Vec<std::ops::Range<i64>>, ReadError> {
        if let (Some(since), Self::List(steps)) = (&value.since, self) {
            let begins = |(step, &end): (&Value, &i64)| {
                let begin = step.pointer(since).ok_or_else(|| ReadError::Unexpected {
                    at: since.clone(),
                    what: format!("the step at {} has no begin of its period there", intake::moment(end)),
                })?;
                Ok(stamp.read(begin, since)?[0]..end)
            };
            return steps.iter().zip(times).map(begins).collect();
        }
        let over_s = (value.over_min.unwrap_or_default() * 60.0).round() as i64;
        let side = value.period.unwrap_or(Side::Before);
        Ok(times.iter().map(|&time_s| intake::period(time_s, over_s, side)).collect())
    }
}

/// Amounts and mean rates of rain over their periods. Steps without a value have no period, so that a feed may leave the value
/// out where another length of period takes over.
fn rates(
    intake: &mut Intake,
    column: &[Option<&Value>],
    value: &ValueMapping,
    periods: &[std::ops::Range<i64>],
    order: &[usize],
    quantity: Quantity,
) -> Result<Series, ReadError> {
    let (mut kept, mut values) = (Vec::new(), Vec::new());
    for &step in order {
        let hours = (periods[step].end - periods[step].start) as f64 / 3600.0;
        let over_h = if intake.is_amount() { hours } else { 1.0 };
        let rate = take(intake, column[step], value, over_h);
        if !rate.is_nan() {
            kept.push(periods[step].clone());
            values.push(rate);
        }
    }
    Ok(Series { times: intake::apart(kept, quantity.name(), &value.at)?, values })
}

fn take(intake: &mut Intake, found: Option<&Value>, mapping: &ValueMapping, over_h: f64) -> f32 {
    let Some(value) = found else {
        return match mapping.absent {
            Some(number) => intake.keep(number, over_h),
            None => intake.lack(),
        };
    };
    if value.is_null() {
        return intake.lack();
    }
    match number(value) {
        Some(number) if mapping.missing.contains(&number) => intake.lack(),
        Some(number) => intake.keep(number, over_h),
        None => intake.spoilt(),
    }
}

fn number(value: &Value) -> Option<f64> {
    match value {
        Value::Number(number) => number.as_f64(),
        Value::String(text) => text.trim().parse().ok(),
        _ => None,
    }
}

fn array<'a>(root: &'a Value, at: &str) -> Result<&'a [Value], ReadError> {
    let unexpected = |what: &str| ReadError::Unexpected { at: at.to_owned(), what: what.to_owned() };
    let found = root.pointer(at).ok_or_else(|| unexpected("is not in the document"))?;
    found.as_array().map(Vec::as_slice).ok_or_else(|| unexpected("is not an array"))
}

/// An empty field where the document stands.
fn field_for(root: &Value, mapping: &JsonMapping, stamp: &Stamp, asked: Place) -> Result<Field, ReadError> {
    let found = |at: &str| {
        root.pointer(at)
            .ok_or_else(|| ReadError::Unexpected { at: at.to_owned(), what: "is not in the document".into() })
    };
    let coordinate = |at: &str| {
        number(found(at)?).ok_or_else(|| ReadError::Unexpected { at: at.to_owned(), what: "is no coordinate".into() })
    };
    let located = match (&mapping.lat, &mapping.lon) {
        (Some(lat), Some(lon)) => Some(intake::place(coordinate(lat)?, coordinate(lon)?, lat)?),
        _ => None,
    };
    let issued = match &mapping.issued {
        Some(at) => chrono::DateTime::from_timestamp(stamp.read(found(at)?, at)?[0], 0),
        None => None,
    };
    let mut field = Field::new(Space::Point(located.unwrap_or(asked)), issued)?;
    field.located = located.is_some();
    Ok(field)
}

#[cfg(test)]
mod tests;
