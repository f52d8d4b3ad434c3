//! `/v1/outlook` and `/v1/feeds` over real sockets: from real documents, and while feeds fail in every way.

use chrono::DateTime;
use rainward::clock::Clock;
use serde_json::Value;

use crate::feeds_documents::folder;
use crate::misbehaving::{Act, FORECAST, Hand, MAPPING, Server, reply};
use crate::served::{Served, noon};

/// A real document: its folder and file, its mapping, a moment at which it speaks, and a value whose lack must be stated.
struct Real {
    kind: &'static str,
    file: &'static str,
    mapping: &'static str,
    place: &'static str,
    from: &'static str,
    hours: u32,
    assumed: &'static str,
    /// Whether it tells of rain by daylight, so that the chance must be known somewhere.
    rain: bool,
}

const REAL: [Real; 8] = [
    Real {
        kind: "json",
        file: "metno-locationforecast-complete.json",
        mapping: r#"
            [feeds.json]
            steps = "/properties/timeseries"
            time = "/time"
            issued = "/properties/meta/updated_at"
            values.rain = { at = "/data/next_1_hours/details/precipitation_amount", unit = "mm", over_min = 60, period = "after" }
            values.cloud_low = { at = "/data/instant/details/cloud_area_fraction_low", unit = "%" }
            values.cloud_middle = { at = "/data/instant/details/cloud_area_fraction_medium", unit = "%" }
            values.cloud_high = { at = "/data/instant/details/cloud_area_fraction_high", unit = "%" }
            values.temperature = { at = "/data/instant/details/air_temperature", unit = "Cel" }
            values.wind_speed = { at = "/data/instant/details/wind_speed", unit = "m/s" }
            values.wind_from = { at = "/data/instant/details/wind_from_direction", unit = "deg" }
        "#,
        place: "lat=51.5&lon=-0.1",
        from: "2020-07-20T11:00:00Z",
        hours: 240,
        assumed: "cloud_base",
        rain: true,
    },
    Real {
        kind: "json",
        file: "smhi-snow1g-timeseries.json",
        mapping: r#"
            [feeds.json]
            steps = "/timeSeries"
            time = "/time"
            issued = "/referenceTime"
            values.rain = { at = "/data/precipitation_amount_mean", unit = "kg.m-2", since = "/intervalParametersStartTime" }
            values.rain_chance = { at = "/data/probability_of_precipitation", unit = "%" }
            values.cloud_low = { at = "/data/low_type_cloud_area_fraction", unit = "{okta}" }
            values.cloud_base = { at = "/data/cloud_base_altitude", unit = "m", missing = [9999], above = "sea" }
            values.temperature = { at = "/data/air_temperature", unit = "Cel" }
            values.visibility = { at = "/data/visibility_in_air", unit = "km" }
            values.wind_speed = { at = "/data/wind_speed", unit = "m/s" }
            values.wind_from = { at = "/data/wind_from_direction", unit = "deg" }
            values.thunder_chance = { at = "/data/thunderstorm_probability", unit = "%" }
        "#,
        place: "lat=58.58&lon=16.16",
        from: "2026-04-02T11:00:00Z",
        hours: 200,
        assumed: "cloud_middle",
        rain: true,
    },
    Real {
        kind: "json",
        file: "dwd-json-hourly-list.json",
        mapping: r#"
            [feeds.json]
            steps = "/weather"
            time = "/timestamp"
            values.rain = { at = "/precipitation", unit = "mm", over_min = 60, period = "before" }
            values.cloud_total = { at = "/cloud_cover", unit = "%" }
            values.temperature = { at = "/temperature", unit = "Cel" }
            values.wind_speed = { at = "/wind_speed", unit = "km/h" }
            values.wind_from = { at = "/wind_direction", unit = "deg" }
            values.visibility = { at = "/visibility", unit = "m" }
        "#,
        place: "lat=52.5&lon=7.3",
        from: "2025-09-18T14:00:00Z",
        hours: 24,
        assumed: "cloud_low",
        rain: true,
    },
    Real {
        kind: "json",
        file: "openmeteo-imperial-local.json",
        mapping: r#"
            [feeds.json]
            time = "/hourly/time"
            time_format = "%Y-%m-%dT%H:%M"
            time_zone = "Etc/GMT+5"
            lat = "/latitude"
            lon = "/longitude"
            values.rain = { at = "/hourly/precipitation", unit = "[in_i]", over_min = 60, period = "before" }
            values.rain_chance = { at = "/hourly/precipitation_probability", unit = "%" }
            values.temperature = { at = "/hourly/temperature_2m", unit = "[degF]" }
            values.wind_speed = { at = "/hourly/wind_speed_10m", unit = "[mi_i]/h" }
            values.wind_from = { at = "/hourly/wind_direction_10m", unit = "deg" }
        "#,
        place: "lat=43.704&lon=-79.405",
        from: "2026-03-04T05:00:00Z",
        hours: 190,
        assumed: "cloud_total",
        rain: true,
    },
    Real {
        kind: "json",
        file: "openmeteo-local-time.json",
        mapping: r#"
            [feeds.json]
            time = "/hourly/time"
            time_format = "%Y-%m-%dT%H:%M"
            time_zone = "Europe/Amsterdam"
            values.rain = { at = "/hourly/precipitation", unit = "mm", over_min = 60, period = "after" }
            values.temperature = { at = "/hourly/temperature_2m", unit = "Cel" }
        "#,
        place: "lat=52.366&lon=4.901",
        from: "2026-07-10T12:00:00Z",
        hours: 24,
        assumed: "wind",
        rain: false,
    },
    Real {
        kind: "covjson",
        file: "edr-forecast-position-all-params.covjson",
        mapping: r#"
            [feeds.coveragejson]
            parameters = { rain = "precipitation1h", temperature = "temperature" }
            units = { rain = "mm", temperature = "Cel" }
            over_min = 60
        "#,
        place: "lat=60.17&lon=24.94",
        from: "2008-08-05T06:00:00Z",
        hours: 4,
        assumed: "cloud_total",
        rain: true,
    },
    Real {
        kind: "covjson",
        file: "playground-grid.covjson",
        mapping: r#"
            [feeds.coveragejson]
            parameters = { cloud_total = "ICEC" }
        "#,
        place: "lat=45&lon=-5",
        from: "2010-01-01T00:00:00Z",
        hours: 24,
        assumed: "rain",
        rain: false,
    },
    Real {
        kind: "covjson",
        file: "playground-pointseries.covjson",
        mapping: r#"
            [feeds.coveragejson]
            parameters = { temperature = "POTM" }
        "#,
        place: "lat=-40.2&lon=-10.1",
        from: "2013-01-01T00:00:00Z",
        hours: 96,
        assumed: "rain",
        rain: false,
    },
];

fn feed_text(url: &str, kind: &str, rest: &str) -> String {
    let format = if kind == "json" { "json" } else { "coveragejson" };
    format!("[[feeds]]\nname = \"real\"\nurl = \"{url}/document\"\nformat = \"{format}\"\n{rest}")
}

#[tokio::test]
async fn an_outlook_comes_from_each_real_document() {
    let mut made = 0;
    for real in &REAL {
        let Some(folder) = folder(real.kind) else { return };
        let body = std::fs::read(folder.join(real.file)).unwrap();
        let server = Server::start(move |_| reply(200, &[("Content-Type", "application/json")], &body)).await;
        let now = DateTime::parse_from_rfc3339(real.from).unwrap().to_utc();
        let served = Served::start(&feed_text(&server.url, real.kind, real.mapping), Clock::from_fn(move || now)).await;
        let reply = served.get(&format!("/v1/outlook?{}&from={}&hours={}", real.place, real.from, real.hours)).await;
        assert_eq!(reply.status, 200, "{}: {}", real.file, reply.text);
        let answer = reply.json();
        assert_eq!(answer["feed"]["problem"], Value::Null, "{}", real.file);
        assert_eq!(answer["steps"].as_array().unwrap().len(), real.hours as usize * 12 + 1, "{}", real.file);
        let assumed = answer["assumed"].as_array().unwrap();
        assert!(assumed.iter().any(|entry| entry["value"] == real.assumed), "{}: {assumed:?}", real.file);
        let mut judged = 0;
        for step in answer["steps"].as_array().unwrap() {
            let geometry = matches!(step["limited_by"].as_str(), Some("sun_down" | "sun_too_high" | "skyline"));
            match step["chance"].as_f64() {
                Some(chance) => assert!((0.0..=1.0).contains(&chance), "{}: {step}", real.file),
                None => assert_eq!(step["limited_by"], "no_data", "{}: {step}", real.file),
            }
            judged += usize::from(step["chance"].is_number() && !geometry);
        }
        assert_eq!(judged > 0, real.rain, "{}: {judged} steps were judged by their weather", real.file);
        made += 1;
    }
    assert_eq!(made, REAL.len());
}

/// The ways to fail that a person would name, and a word that `/v1/feeds` must then use.
fn faults() -> Vec<(&'static str, Vec<Act>, &'static str)> {
    let ok = |body: &[u8]| reply(200, &[("Content-Type", "application/json")], body);
    let mut truncated = reply(200, &[], FORECAST.as_bytes());
    if let Some(Act::Send(bytes)) = truncated.last_mut() {
        bytes.truncate(bytes.len() / 2);
    }
    vec![
        ("reset", vec![Act::Reset], "connection"),
        ("truncated", truncated, ""),
        ("empty", ok(b""), "empty"),
        ("a page", reply(200, &[("Content-Type", "text/html")], b"<html><body>busy</body></html>"), "HTML"),
        ("not UTF-8", ok(b"{\"a\": \"\xff\xfe\"}"), ""),
        ("another document", ok(b"{\"type\": \"Coverage\"}"), ""),
        ("refused", reply(403, &[], b"no"), "403"),
        ("gone", reply(404, &[], b"no"), "404"),
        ("broken", reply(500, &[], b"no"), "500"),
        ("redirected for ever", reply(302, &[("Location", "/document")], b""), "redirect"),
        ("too big", ok(&vec![b' '; 300_000]), "max_bytes"),
        ("slow", vec![Act::Wait(std::time::Duration::from_secs(3))], ""),
    ]
}

#[tokio::test]
async fn while_a_feed_fails_the_last_good_answer_is_served_and_the_state_is_told() {
    for (name, acts, word) in faults() {
        let server = Server::start(|_| reply(200, &[("Content-Type", "application/json")], FORECAST.as_bytes())).await;
        let hand = Hand::new();
        let text = feed_text(
            &server.url,
            "json",
            "timeout_s = 2\nmax_bytes = 100000\nheaders = { \"X-Key\" = \"open-sesame\" }\n",
        );
        let served = Served::start(&format!("{text}{MAPPING}"), hand.clock()).await;
        let question = "/v1/outlook?lat=47.4&lon=-31.1&hours=6";
        assert_eq!(served.get("/v1/feeds").await.json()["feeds"][0]["state"], "never_fetched");
        let good = served.get(question).await.json();
        assert_eq!((&good["feed"]["stale"], &good["feed"]["problem"]), (&Value::Bool(false), &Value::Null), "{name}");
        server.now_do(move |_| acts.clone());
        hand.forward(1800);
        let mut later = served.get(question).await.json();
        // An asker waits a moment for a refresh and is then served the old document: the failure may show a little later.
        for _ in 0..60 {
            if served.get("/v1/feeds").await.json()["feeds"][0]["state"] == "failing" {
                break;
            }
            tokio::time::sleep(std::time::Duration::from_millis(100)).await;
        }
        later = if later["feed"]["stale"] == true { later } else { served.get(question).await.json() };
        assert_eq!(later["feed"]["document"], good["feed"]["document"], "{name}: the last good document was lost");
        assert_eq!(
            (&later["feed"]["stale"], &later["feed"]["age_s"]),
            (&Value::Bool(true), &Value::from(1800)),
            "{name}"
        );
        let reply = served.get("/v1/feeds").await;
        let state = reply.json()["feeds"][0].take();
        assert_eq!(state["state"], "failing", "{name}: {state}");
        let reason = state["last_failure"]["reason"].as_str().unwrap();
        assert!(!reason.is_empty() && reason.to_lowercase().contains(&word.to_lowercase()), "{name}: {reason}");
        assert!(!reply.text.contains("open-sesame") && !reply.text.contains("/document"), "{name}: {}", reply.text);
        assert_eq!(served.get("/v1/bow?lat=47.4&lon=-31.1").await.status, 200, "{name}");
    }
}

#[tokio::test]
async fn a_feed_that_never_answered_leaves_the_chance_unknown() {
    let mut server = Server::start(|_| vec![Act::Reset]).await;
    server.stop().await;
    let served = Served::start(&format!("{}{}", feed_text(&server.url, "json", ""), MAPPING), noon()).await;
    let answer = served.get("/v1/outlook?lat=47.4&lon=-31.1&hours=12").await.json();
    assert!(answer["feed"]["problem"].is_string() && answer["feed"]["age_s"].is_null());
    let steps = answer["steps"].as_array().unwrap();
    assert!(steps.iter().any(|step| step["chance"].is_null() && step["limited_by"] == "no_data"));
    assert!(answer["windows"].as_array().unwrap().is_empty());
}

#[tokio::test]
async fn without_any_feed_geometry_answers() {
    let served = Served::start("", noon()).await;
    let answer = served.get("/v1/outlook?lat=47.4&lon=-31.1&hours=12").await.json();
    assert_eq!(answer["feed"], Value::Null);
    assert!(answer["steps"].as_array().unwrap().iter().any(|step| step["crown"].is_object()));
}
