//! The readers over random input: documents cut, overwritten and mixed never panic, and no impossible value comes out.

use proptest::prelude::*;
use rainward::weather::field::Field;
use rainward::weather::quantity::Quantity;
use rainward::weather::read::read;
use rainward::weather::spec::FeedSpec;

use crate::misbehaving::{FORECAST, here, spec};

const COVERAGE: &str = r#"{"type": "Coverage", "domain": {"type": "Domain", "domainType": "Grid", "axes": {
    "x": {"start": 1, "stop": 3, "num": 3}, "y": {"values": [52, 51]}, "z": {"values": [2]},
    "t": {"values": ["2031-05-04T12:00Z", "2031-05-04T13:00:00Z"], "bounds": ["2031-05-04T11:00Z", "2031-05-04T12:00Z",
    "2031-05-04T12:00Z", "2031-05-04T13:00Z"]}}, "referencing": [{"coordinates": ["y", "x"], "system": {"type": "GeographicCRS",
    "id": "http://www.opengis.net/def/crs/EPSG/0/4326"}}]}, "parameters": {"R": {"type": "Parameter", "unit": {"symbol":
    {"value": "kg m-2", "type": "u"}}, "observedProperty": {"id": "cf/precipitation_amount", "label": {"en": "Rain"}}}},
    "ranges": {"R": {"type": "NdArray", "dataType": "float", "axisNames": ["t", "x", "z", "y"], "shape": [2, 3, 1, 2],
    "values": [0, 1, 2.5, null, 4e0, 5, 6, 7, 8, 9, 10, -0.001]}}}"#;

fn coverage() -> FeedSpec {
    serde_json::from_str(r#"{"name": "area", "url": "http://x.example", "format": "coveragejson"}"#).unwrap()
}

fn seeds() -> Vec<(FeedSpec, Vec<u8>)> {
    let mut list = spec("http://x.example");
    let mapping = r#"{"steps": "/s", "time": "/t", "time_format": "%Y-%m-%dT%H:%M", "time_zone": "Europe/Amsterdam", "values":
        {"rain": {"at": "/v/r", "unit": "kg.m-2", "since": "/b"}, "cloud_low": {"at": "/v/c", "unit": "{okta}", "missing": [9]}}}"#;
    list.json = Some(serde_json::from_str(mapping).unwrap());
    let steps = r#"{"s": [{"t": "2031-10-26T02:30", "b": "2031-10-26T01:00", "v": {"r": "0.5", "c": 3}},
        {"t": "2031-10-26T04:30", "b": "2031-10-26T03:00", "v": {"r": 1, "c": null}}]}"#;
    vec![(spec("http://x.example"), FORECAST.into()), (list, steps.into()), (coverage(), COVERAGE.into())]
}

fn possible(field: &Field) -> Result<(), TestCaseError> {
    for quantity in field.quantities() {
        let (min, max) = quantity.plausible();
        for &value in &field.series(quantity).unwrap().values {
            prop_assert!(value.is_nan() || (min..=max).contains(&f64::from(value)), "{} {value}", quantity.name());
        }
    }
    Ok(())
}

#[test]
fn the_seeds_themselves_are_read() {
    for (spec, bytes) in seeds() {
        let field = read(&bytes, &spec, here()).unwrap();
        assert!(field.series(Quantity::Rain).is_some());
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 3000, ..ProptestConfig::default() })]

    #[test]
    fn documents_cut_and_overwritten_never_panic(
        seed in 0..3_usize,
        cut in any::<prop::sample::Index>(),
        whole in any::<bool>(),
        edits in prop::collection::vec((any::<prop::sample::Index>(), any::<u8>()), 0..6),
    ) {
        let (spec, mut bytes) = seeds().swap_remove(seed);
        for (place, byte) in edits {
            let place = place.index(bytes.len());
            bytes[place] = byte;
        }
        if !whole {
            bytes.truncate(cut.index(bytes.len()));
        }
        if let Ok(field) = read(&bytes, &spec, here()) {
            possible(&field)?;
        }
    }

    #[test]
    fn pieces_of_one_place_put_into_another_never_panic(
        seed in 0..3_usize,
        from in any::<prop::sample::Index>(),
        length in 0..60_usize,
        to in any::<prop::sample::Index>(),
        word in prop::sample::select(vec!["", "1e308", "-1e308", "null", "[]", "{}", "\"\"", "9999999999999", "\"NaN\"", "[[[[", "0.0", "true"]),
    ) {
        let (spec, mut bytes) = seeds().swap_remove(seed);
        let from = from.index(bytes.len());
        let mut piece = bytes[from..(from + length).min(bytes.len())].to_vec();
        piece.extend_from_slice(word.as_bytes());
        let to = to.index(bytes.len());
        bytes.splice(to..to, piece);
        if let Ok(field) = read(&bytes, &spec, here()) {
            possible(&field)?;
        }
    }

    #[test]
    fn any_numbers_in_any_quantity_leave_only_possible_values(
        numbers in prop::collection::vec(prop::num::f64::ANY, 2),
        quantity in prop::sample::select(Quantity::ALL.to_vec()),
    ) {
        let written = |number: &f64| if number.is_finite() { format!("{number:e}") } else { "null".into() };
        let mut spec = spec("http://x.example");
        let mapping = format!(r#"{{"time": "/t", "values": {{"{}": {{"at": "/temp", "unit": "{}"}}}}}}"#, quantity.name(), quantity.unit());
        spec.json = Some(serde_json::from_str(&mapping).unwrap());
        let list = numbers.iter().map(written).collect::<Vec<_>>().join(",");
        let document = FORECAST.replace("10.0, 12.0", &list);
        if let Ok(field) = read(document.as_bytes(), &spec, here()) {
            possible(&field)?;
        }
    }
}
