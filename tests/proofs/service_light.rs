//! `/v1/light` over real sockets: facts of the sky, figures of the reference, every way to ask wrongly, what is kept.

use std::time::{Duration, Instant};

use rainward::bounds::{self, Range};
use rainward::service::light;
use serde_json::{Value, json};

use crate::served::{Reply, Served};
use crate::table::{Row, check, rows};

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("{value} is no number"))
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap_or_else(|| panic!("{value} is no list")).iter().map(number).collect()
}

async fn ask(served: &Served, query: &str) -> Value {
    let reply = served.get(&format!("/v1/light?{query}")).await;
    assert_eq!(reply.status, 200, "{query}: {}", reply.text);
    reply.json()
}

/// Index of an angle from the antisolar point.
fn at(angle_deg: f64) -> usize {
    ((angle_deg - 30.0) / 0.05).round() as usize
}

/// Light that the bow adds over the darkest place, as linear red, green and blue, summed over the primary.
fn added(answer: &Value) -> [f64; 3] {
    let linear: Vec<Vec<f64>> = answer["linear_srgb"].as_array().unwrap().iter().map(numbers).collect();
    let luminance = numbers(&answer["luminance_cd_m2"]);
    let dark = (at(38.0)..=at(50.0)).min_by(|a, b| luminance[*a].total_cmp(&luminance[*b])).unwrap();
    std::array::from_fn(|part| (at(35.0)..at(43.0)).map(|index| linear[index][part] - linear[dark][part]).sum())
}

#[tokio::test]
async fn the_curve_runs_from_30_to_60_degrees_side_by_side() {
    let served = Served::demo().await;
    let answer = ask(&served, "sun_elevation_deg=20").await;
    let angles = numbers(&answer["angle_deg"]);
    assert_eq!((angles.len(), angles[0], angles[600]), (601, 30.0, 60.0));
    assert!(angles.windows(2).all(|pair| (pair[1] - pair[0] - 0.05).abs() < 1e-9));
    for name in ["luminance_cd_m2", "linear_srgb", "srgb", "degree_of_polarisation"] {
        assert_eq!(answer[name].as_array().unwrap().len(), 601, "{name}");
    }
    assert!(answer.get("phase_function").is_none());
    let one = ask(&served, "sun_elevation_deg=20&wavelength_um=0.55").await;
    assert_eq!(one["phase_function"].as_array().unwrap().len(), 601);
    for name in ["luminance_cd_m2", "linear_srgb", "srgb"] {
        assert!(one.get(name).is_none(), "{name}");
    }
    // What was left out is told as taken.
    assert_eq!(answer["drops"], json!({ "rain_mm_h": 5.0 }));
    assert_eq!((&answer["water"], &answer["water_temperature_c"]), (&json!("fresh"), &json!(10.0)));
    assert!(answer["expect"].as_str().unwrap().len() > 20 && !answer["assumed"].as_array().unwrap().is_empty());
}

#[tokio::test]
async fn the_primary_is_brightest_inside_its_ray_and_the_secondary_weaker_outside() {
    let served = Served::demo().await;
    let answer = ask(&served, "sun_elevation_deg=20").await;
    let [primary, secondary] = [&answer["bows"][0], &answer["bows"][1]];
    let inside = number(&primary["radius_deg"]) - number(&primary["brightest_deg"]);
    let outside = number(&secondary["brightest_deg"]) - number(&secondary["radius_deg"]);
    // Ordinary rain under the Sun's disc, by the reference: 0.2 to 0.4 and 0.4 to 0.6 degrees.
    assert!((0.15..0.45).contains(&inside) && (0.3..0.65).contains(&outside), "{inside} {outside}");
    assert!(number(&secondary["contrast"]) < 0.25 * number(&primary["contrast"]));
    assert!(number(&secondary["width_deg"]) > number(&primary["width_deg"]));
    // Within the primary it is brighter than between the bows.
    let luminance = numbers(&answer["luminance_cd_m2"]);
    assert!(luminance[at(38.0)] > luminance[at(46.0)]);
    // Alexander's band is darker than the sky outside the secondary.
    assert!(luminance[at(46.0)] < luminance[at(56.0)]);
}

#[tokio::test]
async fn fog_is_broad_and_nearly_white_and_sunset_red() {
    let served = Served::demo().await;
    let rain = ask(&served, "sun_elevation_deg=25").await;
    let fog = ask(&served, "sun_elevation_deg=25&fog=radiation").await;
    let width = |answer: &Value| number(&answer["bows"][0]["width_deg"]);
    assert!(width(&fog) > 4.0 && width(&rain) < 2.0, "{} {}", width(&fog), width(&rain));
    // Common practice: the fog bow's radius is several degrees less than the ray's.
    let inside = number(&fog["bows"][0]["radius_deg"]) - number(&fog["bows"][0]["brightest_deg"]);
    assert!((2.0..8.0).contains(&inside), "{inside}");
    let spread = |answer: &Value| {
        let colours: Vec<Vec<f64>> = answer["srgb"].as_array().unwrap().iter().map(numbers).collect();
        // Against the tint of the Sun, which is all there is on the far side.
        let tint = |colour: &[f64]| [colour[0] - colour[1], colour[1] - colour[2]];
        let plain = tint(&colours[at(46.0)]);
        colours
            .iter()
            .flat_map(|colour| [0, 1].map(|part| (tint(colour)[part] - plain[part]).abs()))
            .fold(0.0, f64::max)
    };
    assert!(spread(&fog) < 0.5 * spread(&rain), "{} {}", spread(&fog), spread(&rain));
    assert!(fog["expect"].as_str().unwrap().contains("nearly white"));
    let sunset = ask(&served, "sun_elevation_deg=0.5").await;
    let [low, high] = [added(&sunset), added(&rain)];
    assert!(low[1] < 0.25 * low[0] && low[2] < 0.1 * low[0], "{low:?}");
    assert!(high[1] > 0.6 * high[0] && high[2] > 0.4 * high[0], "{high:?}");
    assert!(sunset["expect"].as_str().unwrap().contains("red"));
    assert!(number(&sunset["sunlight_lx"]) < 0.1 * number(&rain["sunlight_lx"]));
}

#[tokio::test]
async fn sea_spray_shifts_both_bows() {
    // Common practice: the primary smaller by about 0.9, the secondary larger by 1.7 degrees.
    let served = Served::demo().await;
    let [fresh, sea] =
        [ask(&served, "sun_elevation_deg=20").await, ask(&served, "sun_elevation_deg=20&water=sea").await];
    let shift = |bow: usize, of: &str| number(&sea["bows"][bow][of]) - number(&fresh["bows"][bow][of]);
    for of in ["radius_deg", "brightest_deg"] {
        assert!((shift(0, of) + 0.93).abs() < 0.1 && (shift(1, of) - 1.7).abs() < 0.15, "{of}");
    }
}

#[tokio::test]
async fn less_lit_rain_and_more_haze_weaken_the_bow_and_a_filter_takes_it_away() {
    let served = Served::demo().await;
    let contrast = async |query: &str| number(&ask(&served, query).await["bows"][0]["contrast"]);
    let plain = contrast("sun_elevation_deg=20").await;
    assert!(contrast("sun_elevation_deg=20&lit_optical_depth=0.1").await < 0.5 * plain);
    assert!(contrast("sun_elevation_deg=5&aerosol_optical_depth=1").await < contrast("sun_elevation_deg=5").await);
    let answer = ask(&served, "sun_elevation_deg=20").await;
    let polariser = &answer["polariser"];
    assert!(number(&polariser["across_passes"]) < 0.06 && number(&polariser["along_passes"]) > 0.94);
    assert_eq!(number(&polariser["crown_axis_deg"]), 0.0);
    let [left, right] = ["left_foot_axis_deg", "right_foot_axis_deg"].map(|name| number(&polariser[name]));
    assert!((left + right - 180.0).abs() < 0.11 && left < 90.0);
    assert_eq!(ask(&served, "sun_elevation_deg=60").await["polariser"]["left_foot_axis_deg"], Value::Null);
    let equal = ask(&served, "sun_elevation_deg=20&drop_radius_um=250").await;
    assert!(number(&equal["supernumeraries"]) >= 2.0 && equal["expect"].as_str().unwrap().contains("supernumerary"));
}

/// The row's figures as the service tells them.
fn told(row: &Row, answer: &Value) -> Value {
    let phase = numbers(&answer["phase_function"]);
    let between = |angle_deg: f64| {
        let place = (180.0 - angle_deg - 30.0) / 0.05;
        let index = (place as usize).min(599);
        phase[index] + (place - index as f64) * (phase[index + 1] - phase[index])
    };
    let bow = |order: usize| &answer["bows"][order - 1];
    let brightest = |order: usize| at(number(&bow(order)["brightest_deg"]));
    let dark = phase[brightest(1)..brightest(2)].iter().copied().fold(f64::INFINITY, f64::min);
    json!({
        "phase_function": row.numbers("angle_deg").into_iter().map(between).collect::<Vec<_>>(),
        "primary_peak_radius_deg": bow(1)["brightest_deg"],
        "primary_peak": phase[brightest(1)],
        "primary_degree_of_polarisation": bow(1)["degree_of_polarisation"],
        "secondary_peak_radius_deg": bow(2)["brightest_deg"],
        "secondary_peak": phase[brightest(2)],
        "secondary_degree_of_polarisation": bow(2)["degree_of_polarisation"],
        "dark_band_least": dark,
    })
}

async fn answers(served: &Served, quantity: &str, drops: &str, key: &str) -> Vec<(String, Value)> {
    let mut answers = Vec::new();
    for row in rows("mie", quantity) {
        let query =
            format!("sun_elevation_deg=20&{drops}={}&wavelength_um={}", row.number(key), row.number("wavelength_um"));
        answers.push((query.clone(), ask(served, &query).await));
    }
    answers
}

#[tokio::test]
async fn in_one_wavelength_it_agrees_with_the_exact_sums_of_the_reference() {
    let served = Served::demo().await;
    for (quantity, drops, key) in [
        ("Bow in Marshall-Palmer rain of spheres, over the Sun's disc", "rain_mm_h", "rain_mm_h"),
        ("Bow in nearly equal drops, over the Sun's disc", "drop_radius_um", "mean_radius_um"),
    ] {
        let answers = answers(&served, quantity, drops, key).await;
        check("mie", quantity, |row| {
            let query = format!(
                "sun_elevation_deg=20&{drops}={}&wavelength_um={}",
                row.number(key),
                row.number("wavelength_um")
            );
            told(row, &answers.iter().find(|answer| answer.0 == query).unwrap().1)
        });
    }
}

fn refused(reply: &Reply) -> Vec<String> {
    let mut refused = reply.refused();
    refused.sort();
    refused
}

#[tokio::test]
async fn bounds_are_named_and_all_bad_fields_come_at_once() {
    let served = Served::demo().await;
    let bad = "sun_elevation_deg=91&rain_mm_h=0&drop_radius_um=-1&fog=mist&water=oil&water_temperature_c=41\
               &aerosol_optical_depth=-0.1&lit_optical_depth=0&wavelength_um=NaN&lit_optical_dept=1";
    let reply = served.get(&format!("/v1/light?{bad}")).await;
    let mut all = light::PARAMETERS.map(ToOwned::to_owned).to_vec();
    all.push("lit_optical_dept".to_owned());
    all.sort();
    assert_eq!((reply.status, refused(&reply)), (400, all));
    for text in [
        "between -0.5 and 90 deg",
        "between 0.05 and 200 mm/h",
        "between 1 and 3000 um",
        "between 0 and 40 Cel",
        "between 0 and 5",
        "between 0.001 and 50",
        "between 0.38 and 0.75 um",
        "must be radiation or advection or drizzle",
        "did you mean lit_optical_depth?",
    ] {
        assert!(reply.text.contains(text), "{text}: {}", reply.text);
    }
    let none = served.get("/v1/light").await;
    assert_eq!((none.status, none.refused()), (400, vec!["sun_elevation_deg".to_owned()]));
    assert!(none.text.contains("is missing"));
    let two = served.get("/v1/light?sun_elevation_deg=9&rain_mm_h=1&drop_radius_um=100&fog=drizzle").await;
    assert_eq!((two.status, refused(&two)), (400, vec!["drop_radius_um".to_owned(), "fog".to_owned()]));
    // Sea water is known in a narrower range.
    let sea = served.get("/v1/light?sun_elevation_deg=9&water=sea&water_temperature_c=31&wavelength_um=0.39").await;
    assert_eq!((sea.status, refused(&sea)), (400, vec!["water_temperature_c".to_owned(), "wavelength_um".to_owned()]));
    assert!(sea.text.contains("between 0.4 and 0.7 um") && sea.text.contains("between 0 and 30 Cel"));
}

#[tokio::test]
async fn the_ends_of_every_range_are_answered() {
    let served = Served::demo().await;
    let ranges: [Range; 7] = [
        bounds::SUN_ELEVATION,
        bounds::RAIN,
        bounds::DROP_RADIUS,
        bounds::WATER_TEMPERATURE,
        bounds::AEROSOL_OPTICAL_DEPTH,
        bounds::LIT_OPTICAL_DEPTH,
        bounds::WAVELENGTH,
    ];
    for range in ranges {
        for end in [range.min, range.max] {
            let sun = if range.name == "sun_elevation_deg" { "" } else { "&sun_elevation_deg=10" };
            ask(&served, &format!("{}={end}{sun}", range.name)).await;
        }
    }
}

#[tokio::test]
async fn what_was_worked_out_is_kept_and_may_be_kept_by_others() {
    let served = Served::demo().await;
    let question = "/v1/light?sun_elevation_deg=12.5&drop_radius_um=110";
    let begin = Instant::now();
    let first = served.get(question).await;
    let slow = begin.elapsed();
    assert_eq!((first.status, first.header("cache-control")), (200, "public, max-age=86400"));
    let begin = Instant::now();
    let again = served.get(question).await;
    let quick = begin.elapsed();
    assert_eq!(first.text, again.text);
    // The figures of a release build are in benches/; here the second must only be far quicker.
    assert!(quick < slow / 3 + Duration::from_millis(5), "{slow:?}, then {quick:?}");
    let tag = first.header("etag").to_owned();
    let unchanged = served.send(reqwest::Method::GET, question, &[("if-none-match", &tag)]).await;
    assert_eq!((unchanged.status, unchanged.text.as_str()), (304, ""));
    // Another Sun, the same drops: only the quick part is done anew.
    let begin = Instant::now();
    ask(&served, "sun_elevation_deg=3&drop_radius_um=110").await;
    assert!(begin.elapsed() < slow / 3 + Duration::from_millis(5));
}

#[tokio::test]
async fn many_at_once_share_the_work() {
    let served = Served::demo().await;
    let begin = Instant::now();
    ask(&served, "sun_elevation_deg=8&drop_radius_um=112").await;
    let alone = begin.elapsed();
    let begin = Instant::now();
    let all = (0..12).map(|sun| {
        let query = format!("/v1/light?sun_elevation_deg={sun}&drop_radius_um=111");
        let served = &served;
        async move { served.get(&query).await.status }
    });
    assert!(futures_util::future::join_all(all).await.iter().all(|status| *status == 200));
    let together = begin.elapsed();
    assert!(together < alone * 5 + Duration::from_millis(100), "one {alone:?}, twelve {together:?}");
}
