use super::*;
use crate::weather::field::Space;
use crate::weather::intake::moment;

const CRS84: &str = r#"[{"coordinates": ["x", "y"], "system": {"type": "GeographicCRS",
    "id": "http://www.opengis.net/def/crs/OGC/1.3/CRS84"}},
    {"coordinates": ["t"], "system": {"type": "TemporalRS", "calendar": "Gregorian"}}]"#;
const TEMPERATURE: &str = r#"{"T": {"type": "Parameter", "unit": {"symbol": {"value": "Cel", "type": "ucum"}},
    "observedProperty": {"id": "http://vocab.example/standard_name/air_temperature/", "label": {"en": "x"}}}}"#;
const AXES: &str = r#"{"x": {"values": [1, 2, 3]}, "y": {"values": [52, 51]}, "z": {"values": [2]},
    "t": {"values": ["2031-05-04T12:00Z", "2031-05-04T13:00:00Z"]}}"#;

fn coverage(kind: &str, axes: &str, parameters: &str, ranges: &str) -> String {
    format!(
        r#"{{"type": "Coverage", "domain": {{"type": "Domain", "domainType": "{kind}", "axes": {axes},
        "referencing": {CRS84}}}, "parameters": {parameters}, "ranges": {ranges}}}"#
    )
}

fn array(names: &str, shape: &str, values: &str) -> String {
    format!(r#"{{"type": "NdArray", "dataType": "float", "axisNames": {names}, "shape": {shape}, "values": {values}}}"#)
}

fn read_with(document: &str, mapping: &str) -> Result<Field, ReadError> {
    read(document.as_bytes(), &serde_json::from_str(mapping).unwrap(), Place::new(0.0, 0.0).unwrap())
}

fn refusal(document: &str) -> String {
    read_with(document, "{}").unwrap_err().to_string()
}

#[test]
fn every_order_of_axes_gives_the_same_field() {
    // The value at time t, row y, column x of the document's axes is 100 t + 10 y + x.
    let lengths = [("t", 2), ("y", 2), ("x", 3), ("z", 1)];
    let mut fields = Vec::new();
    for names in [["t", "y", "x", "z"], ["x", "y", "z", "t"], ["z", "t", "x", "y"], ["y", "x", "t", "z"]] {
        let order: Vec<usize> =
            names.iter().map(|name| lengths.iter().position(|(known, _)| known == name).unwrap()).collect();
        let shape: Vec<usize> = order.iter().map(|&axis| lengths[axis].1).collect();
        let mut values = Vec::new();
        for flat in 0..12 {
            let (mut rest, mut at) = (flat, [0; 4]);
            for (&axis, &length) in order.iter().zip(&shape).rev() {
                at[axis] = rest % length;
                rest /= length;
            }
            values.push((at[0] * 20 + at[1] * 10 + at[2]).to_string());
        }
        let range =
            array(&serde_json::to_string(&names).unwrap(), &format!("{shape:?}"), &format!("[{}]", values.join(",")));
        fields.push(read_with(&coverage("Grid", AXES, TEMPERATURE, &format!(r#"{{"T": {range}}}"#)), "{}").unwrap());
    }
    for field in &fields {
        assert_eq!(field.space, Space::Grid { lats_deg: vec![51.0, 52.0], lons_deg: vec![1.0, 2.0, 3.0] });
        let series = field.series(Quantity::Temperature).unwrap();
        assert_eq!(series.values, [10.0, 11.0, 12.0, 0.0, 1.0, 2.0, 30.0, 31.0, 32.0, 20.0, 21.0, 22.0]);
        assert_eq!(series.times.extent().map(|(first, _)| moment(first)).unwrap(), "2031-05-04T12:00:00Z");
    }
}

#[test]
fn regular_axes_the_date_line_and_missing_values() {
    let axes = r#"{"x": {"values": [178, 179, -180, -179]}, "y": {"start": -40, "stop": -42, "num": 2},
        "t": {"values": ["2031-05-04"]}}"#;
    let range = array(r#"["t", "y", "x"]"#, "[1, 2, 4]", r#"[0, 1, 2, 3, null, "5", 1e308, 7]"#);
    let field = read_with(&coverage("Grid", axes, TEMPERATURE, &format!(r#"{{"T": {range}}}"#)), "{}").unwrap();
    assert_eq!(field.space, Space::Grid { lats_deg: vec![-42.0, -40.0], lons_deg: vec![178.0, 179.0, 180.0, 181.0] });
    let values = &field.series(Quantity::Temperature).unwrap().values;
    assert_eq!(values[..3].iter().filter(|value| value.is_nan()).count(), 3);
    assert_eq!(values[3..], [7.0, 0.0, 1.0, 2.0, 3.0]);
    assert_eq!(field.origins[&Quantity::Temperature].missing, 3);
    assert_eq!(
        field.notes,
        [
            "1 values of temperature outside -100..70 Cel left out",
            "1 values of temperature are no numbers and left out"
        ]
    );
}

#[test]
fn amounts_take_their_period_from_bounds_the_mapping_or_the_step() {
    let rain = r#"{"R": {"type": "Parameter", "unit": {"symbol": "kg m-2"},
        "observedProperty": {"label": {"en": "Precipitation amount"}}}}"#;
    let range = format!(r#"{{"R": {}}}"#, array(r#"["t"]"#, "[2]", "[1.0, 3.0]"));
    let with = |t: &str| {
        let axes = format!(r#"{{"x": {{"values": [350]}}, "y": {{"values": [52]}}, "t": {{{t}}}}}"#);
        coverage("PointSeries", &axes, rain, &range)
    };
    let times = r#""values": ["1970-01-01T02:00:00Z", "1970-01-01T04:00:00Z"]"#;
    let bounds = r#", "bounds": ["1970-01-01T00:00:00Z", "1970-01-01T02:00:00Z", "1970-01-01T03:00:00Z", "1970-01-01T04:00:00Z"]"#;
    for (t, mapping, periods, rates) in [
        (times.to_owned(), "{}", [0..7200, 7200..14400], [0.5, 1.5]),
        (times.to_owned(), r#"{"over_min": 60, "period": "after"}"#, [7200..10800, 14400..18000], [1.0, 3.0]),
        (format!("{times}{bounds}"), "{}", [0..7200, 10800..14400], [0.5, 3.0]),
    ] {
        let field = read_with(&with(&t), mapping).unwrap();
        assert_eq!(field.space, Space::Point(Place::new(52.0, -10.0).unwrap()));
        let series = field.series(Quantity::Rain).unwrap();
        assert_eq!(series.times, Times::Periods(periods.to_vec()));
        assert_eq!(series.values, rates);
    }
    let overlap = read_with(&with(times), r#"{"over_min": 180}"#).unwrap_err().to_string();
    assert!(overlap.contains("the periods of rain overlap"), "{overlap}");
    let uneven = times.replace("02:00:00Z\",", "02:00:00Z\", \"1970-01-01T02:30:00Z\",");
    let document = with(&uneven).replace("[2]", "[3]").replace("[1.0, 3.0]", "[1, 2, 3]");
    assert_eq!(refusal(&document), "t: the period of rain is not told: give over_min");
}

#[test]
fn units_are_not_guessed() {
    let parameter = |unit: &str| {
        format!(r#"{{"C": {{"type": "Parameter", {unit} "observedProperty": {{"id": "cf:cloud_area_fraction"}}}}}}"#)
    };
    let axes = r#"{"x": {"values": [1]}, "y": {"values": [52]}, "t": {"values": ["2031-05-04T12:00:00Z"]}}"#;
    let range = r#"{"C": {"type": "NdArray", "dataType": "float", "values": [50]}}"#;
    let with = |unit: &str| coverage("PointSeries", axes, &parameter(unit), range);
    let share = |document: &str, mapping: &str| {
        read_with(document, mapping).map(|field| field.series(Quantity::CloudTotal).unwrap().values[0])
    };
    assert_eq!(share(&with(r#""unit": {"label": {"en": "Percent"}},"#), "{}"), Ok(0.5));
    assert_eq!(share(&with(""), r#"{"units": {"cloud_total": "%"}}"#), Ok(0.5));
    assert_eq!(refusal(&with("")), "nothing to use: cloud_total: C left out: it has no unit; name one under units");
    assert!(refusal(&with(r#""unit": {"symbol": "unknown"},"#)).contains("its unit \"unknown\" is not known"));
    assert!(refusal(&with(r#""unit": {"symbol": "K"},"#)).contains("cloud_total cannot be measured in K"));
    assert!(
        refusal(&with(r#""unit": {"symbol": "1"},"#)).contains("none of 1 values lies within 0..1: is the unit right?")
    );
    let mapped = read_with(&with(""), r#"{"parameters": {"cloud_low": "C"}}"#).unwrap_err().to_string();
    assert_eq!(mapped, "parameter C: it has no unit; name one under units");
    let absent = read_with(&with(""), r#"{"parameters": {"rain": "RR1"}}"#).unwrap_err().to_string();
    assert_eq!(absent, "parameters: there is no \"RR1\", mapped to rain");
}

#[test]
fn what_does_not_fit_or_is_not_read_is_refused_by_name() {
    let good = format!(r#"{{"T": {}}}"#, array(r#"["t", "y", "x"]"#, "[2, 2, 3]", "[0,1,2,3,4,5,6,7,8,9,10,11]"));
    let grid = coverage("Grid", AXES, TEMPERATURE, &good);
    assert!(read_with(&grid, "{}").is_ok());
    for (from, to, expected) in [
        (
            "[2, 2, 3]",
            "[2, 3, 2]",
            "ranges T: its shape is [2, 3, 2] but its axes [\"t\", \"y\", \"x\"] are [2, 2, 3] long",
        ),
        (",11]", "]", "ranges T: it has 11 values but its axes [\"t\", \"y\", \"x\"] are [2, 2, 3] long"),
        ("[\"t\", \"y\", \"x\"]", "[\"t\", \"y\", \"u\"]", "ranges T: axisNames has \"u\", which is no axis"),
        (
            "[1, 2, 3]",
            "[1, 3, 2]",
            "the values do not fit together: the longitude axis of the grid does not ascend or is no coordinate",
        ),
        ("13:00:00Z", "12:00:00Z", "t: the time 2031-05-04T12:00:00Z occurs twice"),
        ("2031-05-04T12:00Z", "noon", "t: \"noon\" is no date and time of the Gregorian calendar"),
        ("\"t\": {\"values\"", "\"u\": {\"values\"", "not supported: an axis called \"u\""),
        (
            "\"Grid\"",
            "\"VerticalProfile\"",
            "not supported: domain type VerticalProfile: PointSeries and Grid are read",
        ),
        (
            "OGC/1.3/CRS84",
            "EPSG/0/28992",
            "not supported: the reference system GeographicCRS \"http://www.opengis.net/def/crs/EPSG/0/28\": only longitude and latitude (CRS84, EPSG 4326 or 4979) are read",
        ),
        ("GeographicCRS", "ProjectedCRS", "not supported: the reference system ProjectedCRS"),
        ("\"Gregorian\"", "\"360_day\"", "not supported: the calendar \"360_day\""),
        (
            "\"NdArray\"",
            "\"TiledNdArray\"",
            "not supported: ranges T is TiledNdArray: values must stand in the document itself",
        ),
        ("air_temperature", "sea_water_salinity", "nothing to use: no parameter has a CF standard name"),
        ("\"Coverage\"", "\"NdArray\"", "not supported: a bare NdArray: a Coverage or CoverageCollection is wanted"),
        ("\"type\": \"Coverage\",", "", "type: the document has no type, so it is no CoverageJSON"),
    ] {
        assert!(grid.contains(from), "{from}");
        let found = refusal(&grid.replacen(from, to, 1));
        assert!(found.starts_with(expected), "{found}\n{expected}");
    }
    let by_url = coverage("Grid", AXES, TEMPERATURE, r#"{"T": "https://weather.example/T"}"#);
    assert_eq!(refusal(&by_url), "not supported: ranges T is a URL: values must stand in the document itself");
    let huge = r#"{"x": {"start": 0, "stop": 1, "num": 900000000000}, "y": {"values": []}, "t": {"values": []}}"#;
    let nothing = format!(r#"{{"T": {}}}"#, array(r#"["t", "y", "x"]"#, "[0, 0, 900000000000]", "[]"));
    assert_eq!(refusal(&coverage("Grid", huge, TEMPERATURE, &nothing)), "nothing to use: ranges T has no values");
}

#[test]
fn a_collection_is_read_where_each_quantity_comes_once_and_at_one_place() {
    let one = |parameter: &str, x: i32| {
        format!(
            r#"{{"type": "Coverage", "domain": {{"type": "Domain", "axes": {{"x": {{"values": [{x}]}}, "y": {{"values": [52]}},
            "t": {{"values": ["2031-05-04T12:00:00Z"]}}}}}},
            "ranges": {{"{parameter}": {{"type": "NdArray", "dataType": "float", "values": [5]}}}}}}"#
        )
    };
    let parameters = r#"{"T": {"unit": {"symbol": "Cel"}, "observedProperty": {"id": "air_temperature"}},
        "U": {"unit": {"symbol": "m s-1"}, "observedProperty": {"id": "eastward_wind"}}}"#;
    let with = |coverages: &[String]| {
        format!(
            r#"{{"type": "CoverageCollection", "domainType": "PointSeries", "issued": "2031-05-04T06:00:00Z",
            "coverages": [{}], "parameters": {parameters}, "referencing": {CRS84}}}"#,
            coverages.join(",")
        )
    };
    let field = read_with(&with(&[one("T", 1), one("U", 1)]), "{}").unwrap();
    assert_eq!(field.quantities().collect::<Vec<_>>(), [Quantity::WindEast, Quantity::Temperature]);
    assert_eq!(field.issued.unwrap().to_rfc3339(), "2031-05-04T06:00:00+00:00");
    assert!(refusal(&with(&[one("T", 1), one("U", 2)])).contains("a collection of coverages at different places"));
    assert!(refusal(&with(&[one("T", 1), one("T", 1)])).contains("more than one coverage gives temperature"));
    assert_eq!(refusal(&with(&[])), "nothing to use: the collection has no coverages");
}

#[test]
fn a_cloud_base_is_above_the_sea_by_its_standard_name_or_the_mapping() {
    let axes = r#"{"x": {"values": [1]}, "y": {"values": [52]}, "t": {"values": ["2031-05-04T12:00:00Z"]}}"#;
    let range = r#"{"B": {"type": "NdArray", "dataType": "float", "values": [500]}}"#;
    for (name, mapping, expected) in [
        ("cloud_base_altitude", "{}", true),
        ("cloud_base_altitude", r#"{"parameters": {"cloud_base": "B"}}"#, true),
        ("cloud_base_altitude", r#"{"above": "ground"}"#, false),
        ("cloud_base_height_above_ground", r#"{"parameters": {"cloud_base": "B"}}"#, false),
        ("ceiling", r#"{"parameters": {"cloud_base": "B"}, "above": "sea"}"#, true),
    ] {
        let parameter = format!(r#"{{"B": {{"unit": {{"symbol": "m"}}, "observedProperty": {{"id": "{name}"}}}}}}"#);
        let field = read_with(&coverage("PointSeries", axes, &parameter, range), mapping).unwrap();
        assert_eq!(field.series(Quantity::CloudBase).unwrap().values, [500.0]);
        assert_eq!((field.cloud_base_above_sea, &field.notes[..]), (expected, &[][..]), "{name} {mapping}");
    }
}
