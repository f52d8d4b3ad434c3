//! Real documents of open weather services, fetched from a local server through the real path and compared with values
//! decoded by an independent reader. Documents and values: ../shared/feeds with its README (origins and licences there).

use std::io::Write as _;
use std::path::{Path, PathBuf};

use chrono::DateTime;
use rainward::bounds::Place;
use rainward::weather::feeds::{Document, Feeds};
use rainward::weather::field::{Field, Space, Times};
use rainward::weather::quantity::Quantity;
use rainward::weather::read::read;
use rainward::weather::spec::FeedSpec;
use serde_json::{Value, json};

use crate::misbehaving::{Hand, Server, here, reply};

/// Folder of the documents; none where a clone has not got them.
pub fn folder(kind: &str) -> Option<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/feeds").join(kind);
    if folder.is_dir() {
        return Some(folder);
    }
    assert_ne!(std::env::var("CI").as_deref(), Ok("true"), "{} is missing", folder.display());
    // Past the test harness, which keeps what a passing test prints to itself; in one piece, as tests run side by side.
    std::io::stderr().write_all(format!("skipped: ../shared/feeds/{kind} is missing\n").as_bytes()).unwrap();
    None
}

pub fn decoded(folder: &Path) -> Value {
    let text = std::fs::read_to_string(folder.join("decoded.json")).unwrap();
    serde_json::from_str::<Value>(&text).unwrap()["files"].take()
}

pub fn spec(url: &str, format: &str, mapping: &Value) -> FeedSpec {
    serde_json::from_value(json!({"name": "real", "url": url, "format": format, format: mapping})).unwrap()
}

/// Fetches a document from a local server.
pub async fn fetch(folder: &Path, file: &str, format: &str, mapping: Value) -> Document {
    let body = std::fs::read(folder.join(file)).unwrap();
    let server = Server::start(move |_| reply(200, &[("Content-Type", "application/json")], &body)).await;
    let spec = spec(&format!("{}/{file}", server.url), format, &mapping);
    let feeds = Feeds::new(&[spec], Hand::new().clock()).unwrap();
    feeds.get("real", here()).await.unwrap_or_else(|error| panic!("{file}: {error}"))
}

pub fn values(field: &Field, quantity: Quantity) -> &[f32] {
    &field.series(quantity).unwrap().values
}

pub fn extent(field: &Field, quantity: Quantity) -> [String; 2] {
    let (first, last) = field.series(quantity).unwrap().times.extent().unwrap();
    [first, last].map(|time_s| DateTime::from_timestamp(time_s, 0).unwrap().format("%Y-%m-%dT%H:%M:%SZ").to_string())
}

/// Compares values kept with those decoded, which become values kept by `scale` and `offset`.
pub fn same(found: &[f32], expected: &Value, scale: f64, offset: f64) {
    for (index, expected) in expected.as_array().unwrap().iter().enumerate() {
        let Some(number) = expected.as_f64() else {
            assert!(found[index].is_nan(), "{index}: {} where nothing is", found[index]);
            continue;
        };
        let expected = number * scale + offset;
        let found = f64::from(found[index]);
        assert!((found - expected).abs() <= 2e-6 * expected.abs().max(1.0), "{index}: {found} != {expected}");
    }
}

#[tokio::test]
async fn a_list_of_steps_with_nested_values() {
    let Some(folder) = folder("json") else { return };
    let file = "metno-locationforecast-complete.json";
    let details = "/data/instant/details";
    let document = fetch(&folder, file, "json", json!({
        "steps": "/properties/timeseries", "time": "/time", "issued": "/properties/meta/updated_at",
        "lon": "/geometry/coordinates/0", "lat": "/geometry/coordinates/1",
        "values": {
            "cloud_total": {"at": format!("{details}/cloud_area_fraction"), "unit": "%"},
            "cloud_low": {"at": format!("{details}/cloud_area_fraction_low"), "unit": "%"},
            "temperature": {"at": format!("{details}/air_temperature"), "unit": "Cel"},
            "rain": {"at": "/data/next_1_hours/details/precipitation_amount", "unit": "mm", "over_min": 60, "period": "after"},
        },
    }))
    .await;
    let (field, expected) = (&document.field, &decoded(&folder)[file]);
    assert_eq!(field.space, Space::Point(Place::new(51.5, -0.1).unwrap()));
    assert_eq!(field.issued.unwrap().to_rfc3339(), "2020-07-20T01:30:57+00:00");
    assert_eq!(
        extent(field, Quantity::CloudTotal),
        [expected["first"].as_str().unwrap(), expected["last"].as_str().unwrap()]
    );
    assert_eq!(values(field, Quantity::CloudTotal).len() as u64, expected["n"].as_u64().unwrap());
    same(values(field, Quantity::CloudTotal), &expected["cloud_area_fraction"], 0.01, 0.0);
    same(values(field, Quantity::Rain), &expected["precip_next_1h"], 1.0, 0.0);
    let without = expected["without_next_1h"].as_u64().unwrap() as usize;
    assert_eq!(field.origins[&Quantity::Rain].missing, without);
    assert_eq!(values(field, Quantity::Rain).len(), 82 - without);
}

#[tokio::test]
async fn a_list_of_steps_whose_periods_change() {
    let Some(folder) = folder("json") else { return };
    let file = "smhi-snow1g-timeseries.json";
    let document = fetch(&folder, file, "json", json!({
        "steps": "/timeSeries", "time": "/time", "issued": "/referenceTime",
        "lon": "/geometry/coordinates/0", "lat": "/geometry/coordinates/1",
        "values": {
            "cloud_total": {"at": "/data/cloud_area_fraction", "unit": "{okta}"},
            "cloud_base": {"at": "/data/cloud_base_altitude", "unit": "m", "missing": [9999], "above": "sea"},
            "wind_speed": {"at": "/data/wind_speed", "unit": "m/s"},
            "visibility": {"at": "/data/visibility_in_air", "unit": "km"},
            "rain_chance": {"at": "/data/probability_of_precipitation", "unit": "%"},
            "rain": {"at": "/data/precipitation_amount_mean", "unit": "kg.m-2", "since": "/intervalParametersStartTime"},
        },
    }))
    .await;
    let (field, expected) = (&document.field, &decoded(&folder)[file]);
    same(values(field, Quantity::CloudTotal), &expected["cloud_octas"], 0.125, 0.0);
    same(values(field, Quantity::WindSpeed), &expected["wind"], 1.0, 0.0);
    same(values(field, Quantity::Rain), &expected["precip_mean"], 1.0, 0.0);
    assert_eq!(values(field, Quantity::Visibility)[0], 17900.0);
    assert!(field.cloud_base_above_sea);
    // 9999 stands in the document 16 times, half of them in the height of cloud tops.
    assert_eq!(field.origins[&Quantity::CloudBase].missing as u64 * 2, expected["missing_9999"].as_u64().unwrap());
    let Times::Periods(periods) = &field.series(Quantity::Rain).unwrap().times else { panic!("rain without periods") };
    let last = periods.last().unwrap();
    let ends = [last.start, last.end].map(|end| DateTime::from_timestamp(end, 0).unwrap().format("%FT%TZ").to_string());
    assert_eq!(json!(ends), expected["interval_of_last"]);
    // 0.6 mm in the last 12 hours.
    assert!((values(field, Quantity::Rain).last().unwrap() - 0.05).abs() < 1e-6);
}

#[tokio::test]
async fn a_flat_list_with_nulls() {
    let Some(folder) = folder("json") else { return };
    let file = "dwd-json-hourly-list.json";
    let document = fetch(
        &folder,
        file,
        "json",
        json!({
            "steps": "/weather", "time": "/timestamp", "lat": "/sources/0/lat", "lon": "/sources/0/lon",
            "values": {
                "cloud_total": {"at": "/cloud_cover", "unit": "%"},
                "rain": {"at": "/precipitation", "unit": "mm", "over_min": 60, "period": "before"},
                "wind_speed": {"at": "/wind_speed", "unit": "km/h"},
                "wind_from": {"at": "/wind_direction", "unit": "deg"},
                "rain_chance": {"at": "/precipitation_probability_6h", "unit": "%"},
            },
        }),
    )
    .await;
    let (field, expected) = (&document.field, &decoded(&folder)[file]);
    assert_eq!(extent(field, Quantity::CloudTotal), ["2025-09-18T14:00:00Z", "2025-09-19T13:00:00Z"]);
    same(values(field, Quantity::CloudTotal), &expected["cloud_cover"], 0.01, 0.0);
    same(values(field, Quantity::Rain), &expected["precipitation_mm"], 1.0, 0.0);
    same(values(field, Quantity::WindSpeed), &expected["wind_speed_kmh"], 1.0 / 3.6, 0.0);
    let nulls = expected["nulls"]["precipitation_probability_6h"].as_u64().unwrap();
    assert_eq!(field.origins[&Quantity::RainChance].missing as u64, nulls);
}

#[tokio::test]
async fn arrays_side_by_side_in_imperial_units_and_local_time() {
    let Some(folder) = folder("json") else { return };
    let file = "openmeteo-imperial-local.json";
    // The document counts local time at a fixed -5 h, also past the change to summer time within it.
    let mapping = json!({
        "time": "/hourly/time", "time_format": "%Y-%m-%dT%H:%M", "time_zone": "Etc/GMT+5", "lat": "/latitude", "lon": "/longitude",
        "values": {
            "temperature": {"at": "/hourly/temperature_2m", "unit": "[degF]"},
            "rain": {"at": "/hourly/precipitation", "unit": "[in_i]", "over_min": 60, "period": "before"},
            "rain_chance": {"at": "/hourly/precipitation_probability", "unit": "%"},
            "wind_speed": {"at": "/hourly/wind_speed_10m", "unit": "mp/h"},
            "wind_from": {"at": "/hourly/wind_direction_10m", "unit": "deg"},
        },
    });
    let document = fetch(&folder, file, "json", mapping.clone()).await;
    let (field, expected) = (&document.field, &decoded(&folder)[file]["hourly"]);
    for (quantity, key, scale, offset) in [
        (Quantity::Temperature, "temperature_2m", 5.0 / 9.0, -160.0 / 9.0),
        (Quantity::RainChance, "precipitation_probability", 0.01, 0.0),
        (Quantity::WindSpeed, "wind_speed_10m", 0.447_04, 0.0),
        (Quantity::WindFrom, "wind_direction_10m", 1.0, 0.0),
        (Quantity::Rain, "precipitation", 25.4, 0.0),
    ] {
        let (found, expected) = (values(field, quantity), &expected[key]);
        assert_eq!(found.len() as u64, expected["n"].as_u64().unwrap());
        same(found, &expected["first"], scale, offset);
        let sum: f64 = found.iter().map(|&value| f64::from(value)).sum();
        let expected_sum = expected["sum"].as_f64().unwrap() * scale + offset * found.len() as f64;
        assert!((sum - expected_sum).abs() <= 1e-4 * expected_sum.abs(), "{key}: {sum} != {expected_sum}");
    }
    assert_eq!(extent(field, Quantity::Temperature), ["2026-03-04T05:00:00Z", "2026-03-12T04:00:00Z"]);

    let mut by_clocks = mapping;
    by_clocks["time_zone"] = json!("America/Toronto");
    let bytes = std::fs::read(folder.join(file)).unwrap();
    let refusal = read(&bytes, &spec("http://x.example", "json", &by_clocks), here()).unwrap_err().to_string();
    assert!(refusal.contains("2026-03-08 02:00:00 does not exist in America/Toronto"), "{refusal}");
}

#[tokio::test]
async fn arrays_of_one_value_in_summer_time() {
    let Some(folder) = folder("json") else { return };
    let file = "openmeteo-local-time.json";
    let document = fetch(&folder, file, "json", json!({
        "time": "/hourly/time", "time_format": "%Y-%m-%dT%H:%M", "time_zone": "Europe/Amsterdam", "lat": "/latitude", "lon": "/longitude",
        "values": {
            "temperature": {"at": "/hourly/temperature_2m", "unit": "°C"},
            "rain": {"at": "/hourly/precipitation", "unit": "mm", "over_min": 60, "period": "before"},
        },
    }))
    .await;
    let (field, expected) = (&document.field, &decoded(&folder)[file]);
    assert_eq!(extent(field, Quantity::Temperature)[0], expected["first_utc"].as_str().unwrap());
    same(values(field, Quantity::Rain), &expected["precipitation"], 1.0, 0.0);
    assert_eq!(values(field, Quantity::Temperature), [21.2]);
}

#[tokio::test]
async fn a_bare_array_in_basic_time_format() {
    let Some(folder) = folder("json") else { return };
    let file = "fmi-timeseries-flat-list.json";
    let document = fetch(
        &folder,
        file,
        "json",
        json!({
            "steps": "", "time": "/time", "time_format": "%Y%m%dT%H%M%S",
            "values": {"temperature": {"at": "/Temperature", "unit": "Cel"}},
        }),
    )
    .await;
    let (field, expected) = (&document.field, &decoded(&folder)[file]);
    let found = values(field, Quantity::Temperature);
    assert_eq!(found.len() as u64, expected["n"].as_u64().unwrap());
    assert_eq!([found[0], found[60]], [22.0, 20.0]);
    assert_eq!(extent(field, Quantity::Temperature), ["2013-08-05T12:00:00Z", "2013-08-05T22:00:00Z"]);
    assert!(!field.located);
}

#[tokio::test]
async fn arrays_side_by_side_at_two_steps_in_one_document() {
    let Some(folder) = folder("json") else { return };
    let file = "openmeteo-parallel-arrays.json";
    let expected = &decoded(&folder)[file];
    for group in ["hourly", "minutely_15"] {
        // The codes of weather in it are no quantity here; they stand in for one to show the axes.
        let document = fetch(&folder, file, "json", json!({
            "time": format!("/{group}/time"), "time_format": "%Y-%m-%dT%H:%M", "lat": "/latitude", "lon": "/longitude",
            "values": {"temperature": {"at": format!("/{group}/weather_code"), "unit": "Cel", "missing": [80, 81, 82, 85, 86, 95, 96, 99]}},
        }))
        .await;
        let expected = &expected[group];
        same(values(&document.field, Quantity::Temperature), &expected["weather_code"], 1.0, 0.0);
        assert_eq!(values(&document.field, Quantity::Temperature).len() as u64, expected["n"].as_u64().unwrap());
        let [first, last] = extent(&document.field, Quantity::Temperature);
        assert_eq!(
            [first, last],
            [expected["first"].clone(), expected["last"].clone()].map(|at| format!("{}:00Z", at.as_str().unwrap()))
        );
    }
}

#[tokio::test]
async fn json_documents_in_shapes_not_read_yet_are_refused_for_the_right_reason() {
    let Some(folder) = folder("json") else { return };
    let one = |steps: &str, time: &str, format: &str, at: &str, unit: &str| json!({"steps": steps, "time": time, "time_format": format, "values": {"temperature": {"at": at, "unit": unit}}});
    for (file, mapping, expected) in [
        (
            "nws-gridpoint-layers.json",
            one("/properties/temperature/values", "/validTime", "rfc3339", "/value", "Cel"),
            "/validTime: \"2022-02-03T21:00:00+00:00/PT1H\" is no RFC 3339 time",
        ),
        (
            "nws-observation-layers.json",
            one("/features", "/properties/timestamp", "rfc3339", "/properties/temperature/value", "Cel"),
            "/properties/timestamp: the time 2019-06-27T10:53:00Z occurs twice",
        ),
        (
            "ipma-daily-hourly-list.json",
            one("", "/dataPrev", "%Y-%m-%dT%H:%M:%S", "/tMed", "Cel"),
            "/dataPrev: the time 2022-07-29T00:00:00Z occurs twice",
        ),
    ] {
        let bytes = std::fs::read(folder.join(file)).unwrap();
        let refusal = read(&bytes, &spec("http://x.example", "json", &mapping), here()).unwrap_err().to_string();
        assert!(refusal.starts_with(expected), "{file}: {refusal}");
    }
}
