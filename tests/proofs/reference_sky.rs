//! Sun, refraction, risings, horizon, bow over the horizon and magnetic north against published figures and reference
//! libraries; each row of the tables names its source.

use chrono::{DateTime, Duration, TimeDelta, Utc};
use rainward::bounds::Place;
use rainward::sky::circle::Circle;
use rainward::sky::direction::Direction;
use rainward::sky::horizon::{Horizon, Skyline, dip_deg};
use rainward::sky::magnetic::declination_deg;
use rainward::sky::observer::Observer;
use rainward::sky::refraction::{Air, refraction_deg};
use rainward::sky::search::crossings;
use rainward::sky::sun::{Sun, airless};
use serde_json::{Value, json};

use crate::table::{Row, check, rows};

/// The Sun of the crate `spa` is asked to stand this near to the ephemeris, degrees.
const SUN_TOLERANCE_DEG: f64 = 0.012;

fn place(row: &Row) -> Place {
    Place::new(row.number("lat"), row.number("lon")).unwrap()
}

fn time(text: &str) -> DateTime<Utc> {
    DateTime::parse_from_rfc3339(text).unwrap_or_else(|error| panic!("{text}: {error}")).to_utc()
}

fn turn_deg(a: f64, b: f64) -> f64 {
    ((a - b + 180.0).rem_euclid(360.0) - 180.0).abs()
}

#[test]
fn the_sun_stands_where_the_ephemeris_has_it() {
    let mut worst = 0.0_f64;
    for quantity in ["Sun, airless topocentric position", "Sun, worked example: topocentric position"] {
        for row in rows("sun", quantity) {
            let sun = airless(place(&row), time(row.text("time")));
            let elevation = row.expected_number("airless_elevation_deg");
            let azimuth_error = turn_deg(sun.azimuth_deg(), row.expected_number("azimuth_deg"));
            let across = azimuth_error * elevation.to_radians().cos();
            let error = across.max((sun.elevation_deg() - elevation).abs());
            assert!(error < SUN_TOLERANCE_DEG, "{error} deg off at {}", row.text("time"));
            worst = worst.max(error);
        }
    }
    println!("Sun: worst {worst:.4} deg off");
}

#[test]
fn the_antisolar_point_is_opposite() {
    for row in rows("sun", "Sun, airless topocentric position") {
        let sun = airless(place(&row), time(row.text("time")));
        let antisolar = sun.opposite();
        let expected = row.expected_number("antisolar_azimuth_deg");
        let across = turn_deg(antisolar.azimuth_deg(), expected) * sun.elevation_deg().to_radians().cos();
        assert!(across < SUN_TOLERANCE_DEG, "{across} deg off at {}", row.text("time"));
    }
}

#[test]
fn refraction_follows_its_formula() {
    check("sun", "Refraction from airless elevation (1010 hPa, 10 C)", |row| {
        let h = row.number("airless_elevation_deg");
        let refraction = refraction_deg(h, Air::STANDARD);
        json!({ "refraction_arcmin": refraction * 60.0, "apparent_elevation_deg": h + refraction })
    });
    check("sun", "Refraction from airless elevation, scaled by pressure and temperature", |row| {
        let air = Air { pressure_hpa: row.number("pressure_hpa"), temperature_c: row.number("temperature_c") };
        json!({ "refraction_arcmin": refraction_deg(row.number("airless_elevation_deg"), air) * 60.0 })
    });
}

/// Risings and settings through the one search, over a level horizon at sea level.
fn rising_and_setting(row: &Row, from: DateTime<Utc>, to: DateTime<Utc>) -> (Value, Value, bool) {
    let observer = Observer::new(place(row), 0.0, 0.0, None);
    let up = |time| Sun::at(&observer, time).over_horizon_deg(&observer);
    let found = crossings(up, from, to, TimeDelta::minutes(10));
    let first = |begins| found.iter().find(|c| c.begins == begins).map_or(Value::Null, |c| json!(c.time));
    (first(true), first(false), up(from) >= 0.0)
}

/// Compares a time with the row's, allowing for the Sun's own error over its vertical speed.
fn assert_time(row: &Row, key: &str, got: &Value, vertical_speed: f64, worst: &mut f64) {
    let Some(expected) = row.expected_text(key) else {
        assert!(got.is_null(), "{key}: {got} where there is none");
        return;
    };
    let got = time(got.as_str().unwrap_or_else(|| panic!("{key}: none instead of {expected}")));
    let apart_s = (got - time(expected)).num_milliseconds().abs() as f64 / 1000.0;
    let allowed_s = row.tolerance_s(key) + (SUN_TOLERANCE_DEG - 0.004) / vertical_speed;
    *worst = worst.max(apart_s);
    assert!(apart_s <= allowed_s, "{key}: {got} instead of {expected}: {apart_s} s apart, {allowed_s} s allowed");
}

/// The Sun's vertical speed at a moment, degrees per second.
fn vertical_speed(place: Place, at: &Value) -> f64 {
    let Some(at) = at.as_str().map(time) else { return 1.0 };
    let elevation = |time| airless(place, time).elevation_deg();
    ((elevation(at + Duration::seconds(30)) - elevation(at - Duration::seconds(30))) / 60.0).abs()
}

#[test]
fn risings_settings_and_polar_days_come_out_to_the_second() {
    let mut worst = 0.0;
    for row in rows("sun", "Sunrise and sunset") {
        let (rise, set, up) = rising_and_setting(&row, time(row.text("window_start")), time(row.text("window_end")));
        assert_time(&row, "sunrise", &rise, vertical_speed(place(&row), &rise), &mut worst);
        assert_time(&row, "sunset", &set, vertical_speed(place(&row), &set), &mut worst);
        let state = match (rise.is_null() && set.is_null(), up) {
            (false, _) => "rises and sets",
            (true, true) => "polar day",
            (true, false) => "polar night",
        };
        assert_eq!(row.expected_text("state"), Some(state));
    }
    println!("risings and settings: worst {worst:.1} s apart");
}

#[test]
fn the_worked_example_rises_and_sets_as_published() {
    let mut worst = 0.0;
    for row in rows("sun", "Sun, worked example: sunrise and sunset") {
        let day = time("2003-10-17T00:00:00Z");
        let (rise, set, _) = rising_and_setting(&row, day, day + TimeDelta::days(1));
        assert_time(&row, "sunrise", &rise, vertical_speed(place(&row), &rise), &mut worst);
        assert_time(&row, "sunset", &set, vertical_speed(place(&row), &set), &mut worst);
    }
}

#[test]
fn almanac_minutes_are_met() {
    for row in rows("sun", "Sunrise and sunset to the minute") {
        let noon = time(&format!("{}T12:00:00{}", row.text("local_date"), row.text("utc_offset")));
        let (rise, set, _) = rising_and_setting(&row, noon - TimeDelta::hours(12), noon + TimeDelta::hours(12));
        for (key, got) in [("sunrise", rise), ("sunset", set)] {
            let expected = row.expected_text(key).unwrap().replacen('T', " ", 1);
            let expected = DateTime::parse_from_str(&expected, "%Y-%m-%d %H:%M%:z").unwrap();
            let apart_s = (time(got.as_str().unwrap()) - expected.to_utc()).num_seconds().abs();
            assert!(apart_s <= 60, "{key} {apart_s} s apart");
        }
    }
}

#[test]
fn the_sun_crosses_the_bows_radius_in_time() {
    let mut worst = 0.0;
    for row in rows("sun", "Times at which the Sun crosses a given airless elevation") {
        let over = |time| airless(place(&row), time).elevation_deg() - row.number("elevation_deg");
        let found =
            crossings(over, time(row.text("window_start")), time(row.text("window_end")), TimeDelta::minutes(10));
        assert_eq!(found.len(), 2);
        for (key, crossing) in [("upward", found[0]), ("downward", found[1])] {
            let at = json!(crossing.time);
            assert_time(&row, key, &at, vertical_speed(place(&row), &at), &mut worst);
        }
    }
    println!("crossings of the bow's radius: worst {worst:.1} s apart");
}

#[test]
fn dip_of_the_sea_horizon() {
    check("bow_horizon", "Dip of the sea horizon", |row| {
        // The tables' distance and small-angle form follow from the same radius; the dip is what is computed here.
        let (height_m, k) = (row.number("eye_height_m"), row.number("refraction_coefficient"));
        let radius_m = row.number("earth_radius_m") / (1.0 - k);
        let dip = dip_deg(height_m, k);
        json!({
            "dip_deg": dip,
            "nearly_deg": (2.0 * height_m / radius_m).sqrt().to_degrees(),
            "horizon_distance_km": radius_m * dip.to_radians() / 1000.0 * (1.0 - k) / (1.0 - k),
        })
    });
}

fn circle(row: &Row, antisolar_azimuth_deg: f64) -> Circle {
    let antisolar = Direction::from_angles(antisolar_azimuth_deg, -row.number("sun_elevation_deg"));
    Circle::new(antisolar, row.number("bow_radius_deg"))
}

#[test]
fn bows_over_level_and_lowered_horizons() {
    for quantity in [
        "Bow over a level horizon",
        "Bow with the Sun just below the level horizon",
        "Bow over a depressed sea horizon",
        "Bow with drops below the observer (high stand, spray, aircraft): the limit is the depression of the nearest ground",
    ] {
        check("bow_horizon", quantity, |row| {
            // Any azimuth must do: this one puts the feet on either side of north.
            let azimuth_deg = 20.0;
            let arc = circle(row, azimuth_deg).over(&Horizon::Level(row.number("limit_elevation_deg")));
            let offset = arc.feet.map(|(left, right)| {
                let (left, right) =
                    (turn_deg(left.azimuth_deg(), azimuth_deg), turn_deg(right.azimuth_deg(), azimuth_deg));
                assert!((left - right).abs() < 1e-9, "feet are not symmetric: {left}, {right}");
                right
            });
            json!({
                "crown_elevation_deg": circle(row, azimuth_deg).point(0.0).elevation_deg(),
                "foot_azimuth_offset_deg": offset,
                "visible_arc_fraction": arc.fraction,
                "full_circle": arc.fraction >= 1.0,
            })
        });
    }
}

#[test]
fn bows_over_skylines() {
    check("bow_horizon", "Bow over a skyline", |row| {
        let pairs: Vec<(f64, f64)> =
            row.list("skyline", "azimuth_deg").into_iter().zip(row.list("skyline", "elevation_deg")).collect();
        let skyline = Skyline::new(&pairs).unwrap().unwrap();
        let arc = circle(row, row.number("antisolar_azimuth_deg")).over(&Horizon::Skyline(skyline));
        json!({ "visible_arc_fraction": arc.fraction, "runs_above": arc.pieces() })
    });
}

#[test]
fn magnetic_north_by_the_world_magnetic_model() {
    for row in rows("magnetic", "Magnetic declination at a place") {
        let year = row.number("decimal_year");
        let start = time(&format!("{}-01-01T00:00:00Z", year.floor()));
        let days = if year.floor() % 4.0 == 0.0 { 366.0 } else { 365.0 };
        let at = start + Duration::milliseconds((year.fract() * days * 86_400_000.0) as i64);
        let height_m = row.number("height_km") * 1000.0;
        let got = declination_deg(place(&row), height_m, at).expect("within the model's years");
        let expected = row.expected_number("declination_deg");
        // The model is asked for a whole day: declination drifts by less than 0.003 deg a day away from the poles.
        assert!((got - expected).abs() < 0.015, "{got} instead of {expected} at {:?}", place(&row));
    }
    let outside = declination_deg(Place::new(50.0, 0.0).unwrap(), 0.0, time("2035-01-01T00:00:00Z"));
    assert_eq!(outside, None, "outside the model's years");
}
