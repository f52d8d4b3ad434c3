//! OGC CoverageJSON 1.0: PointSeries and Grid, alone or as a collection with one coverage per parameter.

mod axes;
mod document;
mod parameters;

use std::collections::BTreeSet;

use chrono::DateTime;

use self::axes::{Axes, NAMES};
use self::document::{Axis, Document, Domain, Linked, Range, Values};
use self::parameters::Found;
use super::field::{Field, Series, Times};
use super::intake::{self, Intake, short};
use super::quantity::Quantity;
use super::read::{self, ReadError};
use super::spec::{CoverageMapping, Side};
use crate::bounds::{OVER_MIN, Place};

/// Reads a CoverageJSON document. Its places are its own; `asked` is not needed.
///
/// # Errors
/// See [`ReadError`]: other domain types, values that are not in the document itself, reference systems other than
/// longitude and latitude, axes and values that do not fit each other.
pub fn read(bytes: &[u8], mapping: &CoverageMapping, _asked: Place) -> Result<Field, ReadError> {
    let mut document: Document =
        serde_json::from_str(read::text(bytes)?).map_err(|error| ReadError::Malformed(error.to_string()))?;
    let issued = match document.issued.as_deref() {
        None => None,
        Some(text) => Some(
            axes::instant(text)
                .and_then(|time_s| DateTime::from_timestamp(time_s, 0))
                .ok_or_else(|| unexpected("issued", format!("{:?} is no time", short(text))))?,
        ),
    };
    let coverages = match document.kind.as_deref() {
        Some("Coverage") => Vec::new(),
        Some("CoverageCollection") => document.coverages.take().unwrap_or_default(),
        Some(other) => {
            return Err(ReadError::Unsupported(format!(
                "a bare {}: a Coverage or CoverageCollection is wanted",
                short(other)
            )));
        }
        None => return Err(unexpected("type", "the document has no type, so it is no CoverageJSON")),
    };
    let collection = document.kind.as_deref() == Some("CoverageCollection");
    if collection && coverages.is_empty() {
        return Err(ReadError::Empty("the collection has no coverages".into()));
    }
    let mut reader = Reader { mapping, issued, field: None, named: BTreeSet::new(), notes: Vec::new() };
    if collection {
        for mut coverage in coverages {
            reader.coverage(&mut coverage, Some(&document))?;
        }
    } else {
        reader.coverage(&mut document, None)?;
    }
    reader.finish()
}

/// What is wrong with a mapping, by key; checked when a feed is set up.
pub fn faults(mapping: &CoverageMapping) -> Vec<(String, String)> {
    let mut faults = Vec::new();
    for (&quantity, unit) in &mapping.units {
        if let Err(wrong) = unit.conversion(quantity) {
            faults.push((format!("units.{}", quantity.name()), wrong.to_string()));
        }
    }
    if let Some(Err(bound)) = mapping.over_min.map(|over_min| OVER_MIN.check(over_min)) {
        faults.push(("over_min".into(), bound.to_string()));
    }
    faults
}

fn unexpected(at: &str, what: impl Into<String>) -> ReadError {
    ReadError::Unexpected { at: at.to_owned(), what: what.into() }
}

struct Reader<'a> {
    mapping: &'a CoverageMapping,
    issued: Option<DateTime<chrono::Utc>>,
    field: Option<Field>,
    named: BTreeSet<Quantity>,
    notes: Vec<String>,
}

impl Reader<'_> {
    fn coverage(&mut self, coverage: &mut Document, collection: Option<&Document>) -> Result<(), ReadError> {
        let domain = match coverage.domain.take() {
            Some(Linked::Here(domain)) => domain,
            Some(Linked::Elsewhere) => return Err(ReadError::Unsupported("a domain given by its URL".into())),
            None => return Err(unexpected("domain", "the coverage has none")),
        };
        let kind = [&domain.kind, &coverage.domain_type, &collection.and_then(|outer| outer.domain_type.clone())]
            .into_iter()
            .find_map(Clone::clone);
        let series = is_series(kind.as_deref(), &domain)?;
        for axis in domain.axes.keys() {
            if !["t", "x", "y", "z"].contains(&axis.as_str()) {
                return Err(ReadError::Unsupported(format!("an axis called {:?}", short(axis))));
            }
        }
        let references = if domain.referencing.is_empty() {
            collection.map_or(&coverage.referencing, |outer| &outer.referencing)
        } else {
            &domain.referencing
        };
        axes::check_references(references, &mut self.notes)?;

        let parameters = match collection {
            Some(outer) if coverage.parameters.is_empty() => &outer.parameters,
            _ => &coverage.parameters,
        };
        let found = parameters::recognise(parameters, self.mapping, &mut self.notes)?;
        let mut axes = None;
        for Found { quantity, key, unit, above_sea } in found {
            self.named.insert(quantity);
            let Some(range) = coverage.ranges.remove(key) else {
                self.notes.push(format!("{}: {key} has no range", quantity.name()));
                continue;
            };
            let at = format!("ranges {key}");
            let (values, layout) = inline(range, &domain, &at)?;
            let axes = match &mut axes {
                Some(axes) => axes,
                empty => empty.insert(Axes::read(&domain.axes, series)?),
            };
            let series = self.series(values, &layout, axes, Intake::new(quantity, unit, key)?, quantity)?;
            let field = match &mut self.field {
                Some(field) if field.space != axes.space => {
                    return Err(ReadError::Unsupported("a collection of coverages at different places".into()));
                }
                Some(field) if field.series(quantity).is_some() => {
                    return Err(ReadError::Unsupported(format!(
                        "more than one coverage gives {} (members, levels or runs)",
                        quantity.name()
                    )));
                }
                Some(field) => field,
                empty => empty.insert(Field::new(axes.space.clone(), self.issued)?),
            };
            let (intake, series) = series;
            field.cloud_base_above_sea |= above_sea;
            intake.deliver(field, series)?;
        }
        Ok(())
    }

    /// Values in the order of time, latitude, longitude and in the unit kept.
    fn series(
        &self,
        values: Values,
        strides: &[usize; 3],
        axes: &Axes,
        mut intake: Intake,
        quantity: Quantity,
    ) -> Result<(Intake, Series), ReadError> {
        let over = if intake.is_amount() { Some(self.periods(axes, quantity)?) } else { axes.periods.clone() };
        let rate = intake.is_amount();
        let mut numbers = arranged(values.numbers, strides, &axes.orders);
        let cells = numbers.len() / axes.times.len();
        let mut spoilt = values.unreadable;
        for (step, numbers) in numbers.chunks_mut(cells).enumerate() {
            let over_h = match &over {
                Some(periods) if rate => (periods[step].end - periods[step].start) as f64 / 3600.0,
                _ => 1.0,
            };
            for number in numbers {
                *number = if !number.is_nan() {
                    intake.keep(f64::from(*number), over_h)
                } else if spoilt > 0 {
                    spoilt -= 1;
                    intake.spoilt()
                } else {
                    intake.lack()
                };
            }
        }
        let times = match over {
            Some(periods) if quantity == Quantity::Rain => intake::apart(periods, quantity.name(), "t bounds")?,
            _ => Times::Instants(axes.times.clone()),
        };
        Ok((intake, Series { times, values: numbers }))
    }

    /// Periods of amounts: the bounds of the time axis, else the mapping's period, else the step of the axis.
    fn periods(&self, axes: &Axes, quantity: Quantity) -> Result<Vec<std::ops::Range<i64>>, ReadError> {
        if let Some(periods) = &axes.periods {
            return Ok(periods.clone());
        }
        let over_s = if let Some(over_min) = self.mapping.over_min {
            (over_min * 60.0).round() as i64
        } else {
            let mut steps = axes.times.windows(2).map(|pair| pair[1] - pair[0]);
            let first = steps.next();
            first.filter(|&first| steps.all(|step| step == first)).ok_or_else(|| {
                unexpected("t", format!("the period of {} is not told: give over_min", quantity.name()))
            })?
        };
        let side = self.mapping.period.unwrap_or(Side::Before);
        Ok(axes.times.iter().map(|&time_s| intake::period(time_s, over_s, side)).collect())
    }

    fn finish(self) -> Result<Field, ReadError> {
        if let Some((quantity, key)) =
            self.mapping.parameters.iter().find(|(quantity, _)| !self.named.contains(quantity))
        {
            return Err(unexpected(
                "parameters",
                format!("there is no {:?}, mapped to {}", short(key), quantity.name()),
            ));
        }
        let mut notes = self.notes;
        notes.dedup();
        match self.field {
            Some(mut field) if field.quantities().next().is_some() => {
                notes.append(&mut field.notes);
                field.notes = notes;
                Ok(field)
            }
            _ if notes.is_empty() => Err(ReadError::Empty(
                "no parameter has a CF standard name that is used here, and the mapping names none that is there"
                    .into(),
            )),
            _ => Err(ReadError::Empty(notes.join("; "))),
        }
    }
}

/// The numbers time by time, latitude by latitude; untouched where they already are.
fn arranged(numbers: Vec<f32>, strides: &[usize; 3], orders: &[Vec<usize>; 3]) -> Vec<f32> {
    let [t_order, y_order, x_order] = orders;
    let places = || {
        t_order.iter().flat_map(move |&t| {
            y_order
                .iter()
                .flat_map(move |&y| x_order.iter().map(move |&x| t * strides[0] + y * strides[1] + x * strides[2]))
        })
    };
    if places().enumerate().all(|(index, place)| index == place) {
        return numbers;
    }
    places().map(|place| numbers[place]).collect()
}

/// Whether the values stand at one place, as in a PointSeries or a Grid of one cell.
fn is_series(kind: Option<&str>, domain: &Domain) -> Result<bool, ReadError> {
    match kind {
        Some("PointSeries") => Ok(true),
        Some("Grid") | None if domain.axes.contains_key("composite") => {
            Err(ReadError::Unsupported("a domain with a composite axis: PointSeries and Grid are read".into()))
        }
        Some("Grid") | None => {
            let single = |name: &str| domain.axes.get(name).is_some_and(|axis| axes::count(axis, name) == Ok(1));
            Ok(single("x") && single("y"))
        }
        Some(other) => {
            Err(ReadError::Unsupported(format!("domain type {}: PointSeries and Grid are read", short(other))))
        }
    }
}

/// The values of a range and the stride of each of [`NAMES`], once its shape fits the axes.
fn inline(range: Linked<Range>, domain: &Domain, at: &str) -> Result<(Values, [usize; 3]), ReadError> {
    let Linked::Here(range) = range else {
        return Err(ReadError::Unsupported(format!("{at} is a URL: values must stand in the document itself")));
    };
    match range.kind.as_deref() {
        Some("NdArray") => {}
        kind => {
            let kind = kind.map_or("of no type".into(), short);
            return Err(ReadError::Unsupported(format!("{at} is {kind}: values must stand in the document itself")));
        }
    }
    let values = range.values.ok_or_else(|| unexpected(at, "there are no values"))?;
    let names = range.axis_names.unwrap_or_default();
    let lengths = names
        .iter()
        .map(|name| {
            let axis: &Axis = domain
                .axes
                .get(name)
                .ok_or_else(|| unexpected(at, format!("axisNames has {:?}, which is no axis", short(name))))?;
            axes::count(axis, name)
        })
        .collect::<Result<Vec<_>, _>>()?;
    if let Some(shape) = range.shape.filter(|shape| !(shape.is_empty() || *shape == lengths)) {
        return Err(unexpected(at, format!("its shape is {shape:?} but its axes {names:?} are {lengths:?} long")));
    }
    let product = lengths.iter().try_fold(1_usize, |product, &length| product.checked_mul(length));
    if product != Some(values.numbers.len()) {
        return Err(unexpected(
            at,
            format!("it has {} values but its axes {names:?} are {lengths:?} long", values.numbers.len()),
        ));
    }
    if values.numbers.is_empty() {
        return Err(ReadError::Empty(format!("{at} has no values")));
    }
    let mut strides = [0; NAMES.len()];
    let mut stride = 1;
    for (index, name) in names.iter().enumerate().rev() {
        if names[..index].contains(name) {
            return Err(unexpected(at, format!("axisNames has {name:?} twice")));
        }
        if let Some(place) = NAMES.iter().position(|known| known == name) {
            strides[place] = stride;
        }
        stride *= lengths[index];
    }
    for (name, axis) in &domain.axes {
        let length = axes::count(axis, name)?;
        if length != 1 && (!names.contains(name) || name == "z") {
            return Err(ReadError::Unsupported(format!("{at}: {length} values along {name}, of which one is wanted")));
        }
    }
    Ok((values, strides))
}

#[cfg(test)]
mod tests;
