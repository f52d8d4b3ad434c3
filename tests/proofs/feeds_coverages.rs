//! Real CoverageJSON documents, fetched from a local server through the real path and compared with values decoded by an
//! independent reader. Documents and values: ../shared/feeds/covjson (origins and licences in the README there).

use rainward::weather::field::Space;
use rainward::weather::quantity::Quantity;
use rainward::weather::read::read;
use serde_json::{Value, json};

use crate::feeds_documents::{decoded, extent, fetch, folder, same, spec, values};
use crate::misbehaving::here;

/// Compares count, missing, extremes and sum of a range.
fn same_statistics(found: &[f32], expected: &Value, scale: f64, offset: f64) {
    let kept: Vec<f64> = found.iter().filter(|value| !value.is_nan()).map(|&value| f64::from(value)).collect();
    assert_eq!(found.len() as u64, expected["n"].as_u64().unwrap());
    assert_eq!((found.len() - kept.len()) as u64, expected["nulls"].as_u64().unwrap());
    let close = |found: f64, key: &str, count: f64| {
        let expected = expected[key].as_f64().unwrap() * scale + offset * count;
        assert!((found - expected).abs() <= 1e-5 * expected.abs().max(1.0), "{key}: {found} != {expected}");
    };
    close(kept.iter().copied().fold(f64::INFINITY, f64::min), "min", 1.0);
    close(kept.iter().copied().fold(f64::NEG_INFINITY, f64::max), "max", 1.0);
    close(kept.iter().sum(), "sum", kept.len() as f64);
}

#[tokio::test]
async fn coverages_are_read_as_decoded() {
    let Some(folder) = folder("covjson") else { return };
    let decoded = decoded(&folder);
    let rows = [
        (
            "edr-forecast-position-minified.covjson",
            json!({"parameters": {"temperature": "temperature"}}),
            vec![(0, "temperature", Quantity::Temperature, 1.0, 0.0)],
        ),
        (
            "edr-forecast-position-all-params.covjson",
            json!({
            "parameters": {"temperature": "temperature", "cloud_total": "totalcloudcover", "cloud_low": "lowcloudcover",
                "cloud_middle": "mediumcloudcover", "cloud_high": "highcloudcover", "rain": "precipitation1h",
                "rain_chance": "pop", "wind_speed": "windspeedms", "wind_east": "windums", "wind_north": "windvms"},
            "units": {"cloud_total": "%", "cloud_low": "%", "cloud_middle": "%", "cloud_high": "%", "rain": "mm/h",
                "rain_chance": "%", "wind_speed": "m/s", "wind_east": "m/s", "wind_north": "m/s"}}),
            vec![
                (0, "temperature", Quantity::Temperature, 1.0, 0.0),
                (0, "totalcloudcover", Quantity::CloudTotal, 0.01, 0.0),
                (0, "highcloudcover", Quantity::CloudHigh, 0.01, 0.0),
                (0, "precipitation1h", Quantity::Rain, 1.0, 0.0),
                (0, "pop", Quantity::RainChance, 0.01, 0.0),
                (0, "windums", Quantity::WindEast, 1.0, 0.0),
            ],
        ),
        (
            "edr-profile-position-kelvin.covjson",
            json!({"units": {"temperature": "Cel"}}),
            vec![(0, "air_temperature", Quantity::Temperature, 1.0, 0.0)],
        ),
        // Salinity, ice, weather codes and the Sun's angle are no weather used here: they stand in for it to show the axes.
        (
            "playground-pointseries.covjson",
            json!({"parameters": {"temperature": "POTM", "cloud_base": "PSAL"}, "units": {"cloud_base": "m"}}),
            vec![(0, "POTM", Quantity::Temperature, 1.0, 0.0), (0, "PSAL", Quantity::CloudBase, 1.0, 0.0)],
        ),
        (
            "playground-grid.covjson",
            json!({"parameters": {"cloud_total": "ICEC"}}),
            vec![(0, "ICEC", Quantity::CloudTotal, 1.0, 0.0)],
        ),
        (
            "edr-cube-weathercode-grid.covjson",
            json!({
            "parameters": {"temperature": "weather_code_24h_gl", "wind_speed": "weather_code_gl"},
            "units": {"temperature": "Cel", "wind_speed": "m/s"}}),
            vec![
                (0, "weather_code_24h_gl", Quantity::Temperature, 1.0, 0.0),
                (1, "weather_code_gl", Quantity::WindSpeed, 1.0, 0.0),
            ],
        ),
        (
            "edr-position-solar-zenith.covjson",
            json!({"parameters": {"wind_from": "solarterminator"}, "units": {"wind_from": "deg"}}),
            vec![(0, "solarterminator", Quantity::WindFrom, 1.0, 0.0)],
        ),
    ];
    for (file, mapping, ranges) in rows {
        let document = fetch(&folder, file, "coveragejson", mapping).await;
        for (index, key, quantity, scale, offset) in ranges {
            let coverage = &decoded[file]["coverage"][index];
            let expected = &coverage["ranges"][key];
            let found = values(&document.field, quantity);
            same_statistics(found, expected, scale, offset);
            let axes = &coverage["axes"];
            match &document.field.space {
                Space::Point(place) => {
                    assert_eq!(
                        json!([place.lat_deg(), place.lon_deg()]),
                        json!([axes["y"]["first"].as_f64(), axes["x"]["first"].as_f64()])
                    );
                    same(found, &expected["first"], scale, offset);
                }
                Space::Grid { lats_deg, lons_deg } => {
                    let ends = |axis: &str| ["first", "last"].map(|end| axes[axis][end].as_f64().unwrap());
                    let [from, to] = ends("y");
                    assert_eq!([lats_deg[0], lats_deg[lats_deg.len() - 1]], [from.min(to), from.max(to)]);
                    assert_eq!([lons_deg[0], lons_deg[lons_deg.len() - 1]], ends("x"));
                    let row = lons_deg.len();
                    let turned = if from > to { row * (lats_deg.len() - 1) } else { 0 };
                    let first = expected["first"].as_array().unwrap()[..row].to_vec();
                    same(&found[turned..turned + row], &Value::Array(first), scale, offset);
                }
            }
            let [first, last] = extent(&document.field, quantity);
            let (t_first, t_last) = (axes["t"]["first"].as_str().unwrap(), axes["t"]["last"].as_str().unwrap());
            assert!(
                first.starts_with(t_first.trim_end_matches('Z')) && last.starts_with(t_last.trim_end_matches('Z')),
                "{file}"
            );
        }
    }
}

/// Every document of the folder without a mapping: read, or the begin of the reason why not.
const BY_STANDARD_NAME: &[(&str, &str)] = &[
    ("edr-collection-metadata.json", "type: the document has no type"),
    ("edr-cube-two-levels.covjson", "not supported: domain type Point"),
    ("edr-cube-weathercode-grid.covjson", "nothing to use: no parameter has a CF standard name"),
    ("edr-forecast-position-all-params.covjson", "nothing to use: no parameter has a CF standard name"),
    ("edr-forecast-position-minified.covjson", "nothing to use: no parameter has a CF standard name"),
    ("edr-landing-page.json", "type: the document has no type"),
    ("edr-multipoint-timeseries.covjson", "not supported: domain type Point"),
    ("edr-position-solar-zenith.covjson", "nothing to use: no parameter has a CF standard name"),
    ("edr-position-vertical-profile.covjson", "not supported: domain type VerticalProfile"),
    ("edr-position-wind-heights.covjson", "not supported: more than one coverage gives wind_speed"),
    (
        "edr-profile-position-kelvin.covjson",
        "air_temperature: read in K as temperature, none of 3 values lies within -100..70 Cel",
    ),
    ("edr-standard-collection-example.json", "type: the document has no type"),
    ("edr-trajectory-2d.covjson", "not supported: domain type Trajectory"),
    ("edr-trajectory-4d.covjson", "not supported: domain type Trajectory"),
    ("ens-timeseries-latlon-axes.covjson", "not supported: an axis called \"latitude\""),
    ("ens-trajectory-path.covjson", "not supported: domain type Trajectory"),
    ("ogc-annexb-vertical-profile.covjson", "not supported: domain type VerticalProfile"),
    ("ogc-spec-grid-coverage.covjson", "not supported: ranges TEMP is a URL"),
    ("ogc-spec-grid-domain.covjson", "not supported: a bare Domain"),
    ("playground-grid-tiled.covjson", "nothing to use: no parameter has a CF standard name"),
    ("playground-grid.covjson", "nothing to use: no parameter has a CF standard name"),
    ("playground-pointseries.covjson", "nothing to use: no parameter has a CF standard name"),
    ("playground-polygonseries.covjson", "not supported: domain type PolygonSeries"),
    ("playground-profile-collection.covjson", "not supported: domain type VerticalProfile"),
    ("spec-grid-range-by-url.covjson", "not supported: ranges TEMP is a URL"),
    ("spec-trajectory.covjson", "not supported: domain type Trajectory"),
];

#[test]
fn every_coverage_document_is_read_or_refused_for_the_right_reason() {
    let Some(folder) = folder("covjson") else { return };
    let bare = spec("http://x.example", "coveragejson", &json!({}));
    let mut files: Vec<_> = std::fs::read_dir(&folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    files.sort();
    for path in files.iter().filter(|path| path.is_file() && !path.ends_with("decoded.json")) {
        let file = path.file_name().unwrap().to_str().unwrap();
        let (_, expected) =
            BY_STANDARD_NAME.iter().find(|row| row.0 == file).unwrap_or_else(|| panic!("{file} is new"));
        let refusal = read(&std::fs::read(path).unwrap(), &bare, here()).unwrap_err().to_string();
        assert!(refusal.starts_with(expected), "{file}: {refusal}");
    }
    let tiled = spec(
        "http://x.example",
        "coveragejson",
        &json!({"parameters": {"temperature": "FOO"}, "units": {"temperature": "Cel"}}),
    );
    let bytes = std::fs::read(folder.join("playground-grid-tiled.covjson")).unwrap();
    let refusal = read(&bytes, &tiled, here()).unwrap_err().to_string();
    assert!(refusal.starts_with("not supported: ranges FOO is TiledNdArray"), "{refusal}");
    for tile in ["a/0-0", "b/1", "c/all"] {
        let bytes = std::fs::read(folder.join(format!("grid-tiled/{tile}.covjson"))).unwrap();
        let refusal = read(&bytes, &bare, here()).unwrap_err().to_string();
        assert!(refusal.starts_with("not supported: a bare NdArray"), "{tile}: {refusal}");
    }
}
