//! Which parameter of a coverage is which quantity, and in which unit.

use std::collections::BTreeMap;

use super::document::Parameter;
use crate::weather::intake::short;
use crate::weather::quantity::Quantity;
use crate::weather::read::ReadError;
use crate::weather::spec::{Above, CoverageMapping};
use crate::weather::unit::Unit;

/// CF standard names (CF Conventions standard name table; from memory) by quantity.
const STANDARD_NAMES: &[(&str, Quantity)] = &[
    ("precipitation_flux", Quantity::Rain),
    ("rainfall_flux", Quantity::Rain),
    ("rainfall_rate", Quantity::Rain),
    ("lwe_precipitation_rate", Quantity::Rain),
    ("precipitation_amount", Quantity::Rain),
    ("rainfall_amount", Quantity::Rain),
    ("thickness_of_rainfall_amount", Quantity::Rain),
    ("lwe_thickness_of_precipitation_amount", Quantity::Rain),
    ("cloud_area_fraction", Quantity::CloudTotal),
    ("low_type_cloud_area_fraction", Quantity::CloudLow),
    ("medium_type_cloud_area_fraction", Quantity::CloudMiddle),
    ("high_type_cloud_area_fraction", Quantity::CloudHigh),
    ("cloud_base_altitude", Quantity::CloudBase),
    ("wind_speed", Quantity::WindSpeed),
    ("wind_from_direction", Quantity::WindFrom),
    ("eastward_wind", Quantity::WindEast),
    ("northward_wind", Quantity::WindNorth),
    ("air_temperature", Quantity::Temperature),
    ("freezing_level_altitude", Quantity::FreezingLevel),
    ("visibility_in_air", Quantity::Visibility),
    ("thunderstorm_probability", Quantity::ThunderChance),
];

/// A parameter that is a quantity we use.
pub(super) struct Found<'a> {
    pub quantity: Quantity,
    pub key: &'a str,
    pub unit: Unit,
    /// Whether it is a cloud base above the sea.
    pub above_sea: bool,
}

/// The quantities among the parameters: those of the mapping first, the others by CF standard name. A parameter that
/// is recognised by its name alone and whose unit does not tell is left out with a note; one that the mapping names
/// must be right.
pub(super) fn recognise<'a>(
    parameters: &'a BTreeMap<String, Parameter>,
    mapping: &CoverageMapping,
    notes: &mut Vec<String>,
) -> Result<Vec<Found<'a>>, ReadError> {
    let mut found: Vec<Found<'a>> = Vec::new();
    for (&quantity, key) in &mapping.parameters {
        if let Some((key, parameter)) = parameters.get_key_value(key) {
            let unit = unit(parameter, quantity, mapping)
                .map_err(|what| ReadError::Unexpected { at: format!("parameter {key}"), what })?;
            found.push(Found { quantity, key, unit, above_sea: above_sea(parameter, quantity, mapping) });
        }
    }
    for (key, parameter) in parameters {
        let Some(quantity) = standard(parameter) else { continue };
        if mapping.parameters.contains_key(&quantity) || found.iter().any(|other| other.key == key) {
            continue;
        }
        if let Some(other) = found.iter().find(|other| other.quantity == quantity) {
            notes.push(format!("{}: {key} left out, {} is taken", quantity.name(), other.key));
            continue;
        }
        match unit(parameter, quantity, mapping) {
            Ok(unit) => found.push(Found { quantity, key, unit, above_sea: above_sea(parameter, quantity, mapping) }),
            Err(what) => notes.push(format!("{}: {key} left out: {what}", quantity.name())),
        }
    }
    Ok(found)
}

/// Whether a cloud base is measured from the sea: by the mapping, else by its CF standard name, of which there is one.
fn above_sea(parameter: &Parameter, quantity: Quantity, mapping: &CoverageMapping) -> bool {
    let by_name = || standard(parameter) == Some(Quantity::CloudBase);
    quantity == Quantity::CloudBase && mapping.above.map_or_else(by_name, |above| above == Above::Sea)
}

/// The quantity by CF standard name: the end of the observed property's id, or its label.
fn standard(parameter: &Parameter) -> Option<Quantity> {
    let property = parameter.observed_property.as_ref()?;
    let id = property.id.as_deref().map(|id| {
        let id = id.trim_end_matches('/');
        id.rsplit(['/', '#', ':']).next().unwrap_or(id).to_owned()
    });
    let labels = property.label.iter().flat_map(|label| label.all());
    let labels = labels.map(|label| label.trim().to_lowercase().replace([' ', '-'], "_"));
    let names: Vec<String> = id.into_iter().chain(labels).collect();
    names
        .iter()
        .find_map(|name| STANDARD_NAMES.iter().find(|(standard, _)| standard == name).map(|&(_, quantity)| quantity))
}

/// The unit: that of the mapping, else the document's symbol, else its label.
fn unit(parameter: &Parameter, quantity: Quantity, mapping: &CoverageMapping) -> Result<Unit, String> {
    let unit = match (mapping.units.get(&quantity), &parameter.unit) {
        (Some(&unit), _) => unit,
        (None, None) => return Err("it has no unit; name one under units".into()),
        (None, Some(text)) => {
            let labels = text.label.iter().flat_map(|label| label.all());
            let written: Vec<&str> = match &text.symbol {
                Some(symbol) => vec![symbol.text()],
                None => labels.collect(),
            };
            written.iter().find_map(|text| text.parse().ok()).ok_or_else(|| {
                let written = written.first().map_or(String::new(), |text| short(text));
                format!("its unit {written:?} is not known; name one under units")
            })?
        }
    };
    unit.conversion(quantity).map_err(|wrong| wrong.to_string())?;
    Ok(unit)
}
