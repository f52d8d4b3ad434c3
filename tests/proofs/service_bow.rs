//! `/v1/bow` over real sockets: facts of the sky, every way to ask wrongly, and random questions in range.

use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;
use rainward::bounds::{EYE_HEIGHT, LAT, LON, QUERY, TIME_MAX, TIME_MIN, WATER_TEMPERATURE};
use rainward::service::{bow, light, outlook};
use serde_json::Value;

use crate::served::Served;

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("{value} is no number"))
}

#[tokio::test]
async fn primary_and_secondary_stand_where_everyone_sees_them() {
    // Common practice: the primary at 40 to 42 degrees with red outside, the secondary at 50 to 53 with red inside.
    let served = Served::demo().await;
    let reply = served.get("/v1/bow?lat=60.2&lon=-4.1&time=2031-05-04T17:40:00Z").await;
    assert_eq!(reply.status, 200);
    let answer = reply.json();
    let [primary, secondary] = [&answer["bows"][0], &answer["bows"][1]];
    let radius = |bow: &Value, colour: &str| number(&bow["radius_deg"][colour]);
    assert!(radius(primary, "violet") > 40.0 && radius(primary, "red") < 42.6);
    assert!(radius(primary, "red") > radius(primary, "green") && radius(primary, "green") > radius(primary, "violet"));
    assert!(radius(secondary, "red") > 50.0 && radius(secondary, "violet") < 54.0);
    assert!(radius(secondary, "red") < radius(secondary, "violet"));
    // The figures of the design for 10 degrees Celsius, air outside.
    for (bow, colour, expected) in [
        (primary, "red", 42.39),
        (primary, "green", 41.78),
        (primary, "violet", 40.52),
        (secondary, "red", 50.33),
        (secondary, "green", 51.42),
        (secondary, "violet", 53.71),
    ] {
        assert!((radius(bow, colour) - expected).abs() < 0.006, "{colour}: {}", radius(bow, colour));
    }
    let sun = number(&answer["sun"]["elevation_deg"]);
    assert!((number(&primary["crown"]["elevation_deg"]) - (radius(primary, "red") - sun)).abs() < 1e-9);
    assert!((number(&answer["antisolar_point"]["elevation_deg"]) + sun).abs() < 1e-9);
}

#[tokio::test]
async fn sea_spray_makes_a_smaller_primary() {
    let served = Served::demo().await;
    let question = "/v1/bow?lat=60.2&lon=-4.1&time=2031-05-04T17:40:00Z&water=sea&water_temperature_c=10";
    let red = number(&served.get(question).await.json()["bows"][0]["radius_deg"]["red"]);
    assert!((red - 41.45).abs() < 0.006, "{red}");
    let hot = served.get("/v1/bow?lat=0&lon=0&water=sea&water_temperature_c=35").await;
    assert_eq!((hot.status, hot.refused()), (400, vec!["water_temperature_c".to_owned()]));
}

#[tokio::test]
async fn no_primary_on_level_ground_under_a_high_sun() {
    // Common practice: none with the Sun above about 42 degrees.
    let served = Served::demo().await;
    let answer = served.get("/v1/bow?lat=10&lon=0&time=2031-05-04T12:00:00Z&eye_height_m=0").await.json();
    let sun = number(&answer["sun"]["elevation_deg"]);
    let primary = &answer["bows"][0];
    assert!(sun > 80.0);
    assert_eq!(primary["above_horizon"], false);
    assert_eq!(primary["limited_by"], "sun_too_high");
    assert_eq!(primary["feet"], Value::Null);
    assert_eq!(number(&primary["visible_arc_fraction"]), 0.0);
    let below = number(&primary["below_horizon_by_deg"]);
    assert!((below - (sun - number(&primary["radius_deg"]["red"]))).abs() < 1e-9);
    // The same from the air: an eye 8 km up sees the bow below the horizontal only through a skyline that goes there; the sea
    // horizon is lowered by less than 3 degrees.
    let high = served.get("/v1/bow?lat=10&lon=0&time=2031-05-04T12:00:00Z&eye_height_m=8000").await.json();
    let dip = number(&high["observer"]["horizon"]["dip_deg"]);
    assert!(dip > 2.4 && dip < 3.0);
    assert!((below - number(&high["bows"][0]["below_horizon_by_deg"]) - dip).abs() < 0.02);
}

#[tokio::test]
async fn a_high_stand_over_a_gorge_sees_the_full_circle() {
    let text = "[[sites]]\nname = \"span\"\nlat = 47.4\nlon = -31.1\nskyline = [[0, -80]]";
    let served = Served::start(text, crate::served::noon()).await;
    let primary = served.get("/v1/bow?site=span&time=2031-05-04T18:30:00Z").await.json()["bows"][0].take();
    assert_eq!(number(&primary["visible_arc_fraction"]), 1.0);
    assert_eq!((&primary["feet"], &primary["above_horizon"]), (&Value::Null, &Value::Bool(true)));
}

#[tokio::test]
async fn at_night_it_says_that_the_sun_is_down() {
    let served = Served::demo().await;
    let answer = served.get("/v1/bow?lat=47&lon=-31&time=2031-05-04T03:00:00Z").await.json();
    assert_eq!(answer["sun"]["above_horizon"], false);
    assert_eq!(answer["bows"][0]["limited_by"], "sun_down");
}

#[tokio::test]
async fn every_parameter_is_refused_by_name() {
    let served = Served::demo().await;
    let nonsense =
        ["", "NaN", "inf", "-1e308", "1e999", "abc", "1,5", "0x1F", "%00", "%FF%FE", "9".repeat(5000).as_str()]
            .map(ToOwned::to_owned);
    for (path, parameters, rest) in [
        ("/v1/bow", &bow::PARAMETERS[..], "lat=47&lon=-31"),
        ("/v1/outlook", &outlook::PARAMETERS[..], "lat=47&lon=-31&hours=1"),
        ("/v1/light", &light::PARAMETERS[..], "sun_elevation_deg=20"),
    ] {
        for name in parameters {
            for value in &nonsense {
                let others = rest.split('&').filter(|pair| !pair.starts_with(&format!("{name}=")));
                let query = others.chain([format!("{name}={value}").as_str()]).collect::<Vec<_>>().join("&");
                let reply = served.get(&format!("{path}?{query}")).await;
                assert_eq!(reply.status, 400, "{path}?{query}");
                assert!(reply.refused().contains(&(*name).to_owned()), "{name}={value:.20}: {}", reply.text);
            }
        }
    }
}

#[tokio::test]
async fn bounds_are_named_and_all_bad_fields_come_at_once() {
    let served = Served::demo().await;
    let reply = served
        .get("/v1/outlook?lat=91&lon=181&eye_height_m=-1&hours=241&step_min=0&threshold=1.5&from=2031&feed=none&hour=2&lat=3")
        .await;
    let mut refused = reply.refused();
    refused.sort();
    let all = ["eye_height_m", "feed", "from", "hour", "hours", "lat", "lat", "lon", "step_min", "threshold"];
    // A parameter given twice is refused for that, and the last value is still checked.
    assert!(
        all.iter().filter(|name| **name != "lat").all(|name| refused.contains(&(*name).to_string())),
        "{refused:?}"
    );
    assert!(refused.contains(&"lat".to_owned()));
    for text in [
        "between -180 and 180 deg",
        "between 0 and 20000 m",
        "between 1 and 240 h",
        "between 1 and 60 min",
        "did you mean hours?",
        "given twice",
    ] {
        assert!(reply.text.contains(text), "{text}: {}", reply.text);
    }
    let neither = served.get("/v1/bow").await;
    assert_eq!(neither.refused(), ["lat", "lon"]);
    let both = served.get("/v1/bow?site=gull-stairs&lat=1").await;
    assert_eq!(both.refused(), ["lat"]);
    assert_eq!(served.get("/v1/bow?site=nowhere").await.refused(), ["site"]);
    for outside in ["1949-12-31T23:59:59Z", "2100-01-01T00:00:01Z", "2031-02-30T00:00:00Z", "2031-05-04T12:00:00"] {
        assert_eq!(served.get(&format!("/v1/bow?lat=1&lon=1&time={outside}")).await.refused(), ["time"]);
    }
    assert_eq!(served.get("/v1/bow?lat=1&lon=1&time=2031-05-04T12:00:00+02:00").await.status, 200);
}

#[tokio::test]
async fn anything_in_range_is_answered() {
    let served = Served::demo().await;
    let mut runner = TestRunner::deterministic();
    let question = (
        LAT.min..=LAT.max,
        LON.min..=LON.max,
        EYE_HEIGHT.min..=EYE_HEIGHT.max,
        WATER_TEMPERATURE.min..=WATER_TEMPERATURE.max,
        TIME_MIN.timestamp()..=TIME_MAX.timestamp(),
    );
    for _ in 0..300 {
        let (lat, lon, eye, water, second) = question.new_tree(&mut runner).unwrap().current();
        let time = chrono::DateTime::from_timestamp(second, 0).unwrap().format("%Y-%m-%dT%H:%M:%SZ");
        let query = format!("lat={lat}&lon={lon}&eye_height_m={eye}&water_temperature_c={water}&time={time}");
        let reply = served.get(&format!("/v1/bow?{query}")).await;
        assert_eq!(reply.status, 200, "{query}: {}", reply.text);
        for bow in reply.json()["bows"].as_array().unwrap() {
            let fraction = number(&bow["visible_arc_fraction"]);
            assert!((0.0..=1.0).contains(&fraction) && (fraction > 0.0) == (bow["above_horizon"] == true), "{query}");
        }
    }
    // The very ends of every range.
    for range in QUERY.iter().filter(|range| bow::PARAMETERS.contains(&range.name)) {
        for end in [range.min, range.max] {
            let mut pairs = vec![("lat", 47.0), ("lon", -31.0)];
            pairs.retain(|pair| pair.0 != range.name);
            pairs.push((range.name, end));
            let query: Vec<String> = pairs.iter().map(|(name, value)| format!("{name}={value}")).collect();
            let reply = served.get(&format!("/v1/bow?{}", query.join("&"))).await;
            assert_eq!(reply.status, 200, "{query:?}: {}", reply.text);
        }
    }
}
