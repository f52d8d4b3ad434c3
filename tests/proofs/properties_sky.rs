//! Properties of the sky over random input: brute force, symmetry, bounds.

use chrono::DateTime;
use proptest::prelude::*;
use rainward::bounds::{EYE_HEIGHT, GROUND, LAT, LON, Place, TIME_MAX, TIME_MIN};
use rainward::sky::circle::Circle;
use rainward::sky::direction::Direction;
use rainward::sky::horizon::{Horizon, Skyline};
use rainward::sky::observer::Observer;
use rainward::sky::sun::Sun;

/// Points by which a circle is sampled to check its closed forms.
const POINTS: usize = 20_000;

fn skyline() -> impl Strategy<Value = Vec<(f64, f64)>> {
    prop::collection::btree_map(0_u16..360, -89.0..89.0_f64, 1..30)
        .prop_map(|points| points.into_iter().map(|(azimuth, elevation)| (f64::from(azimuth), elevation)).collect())
}

fn gentle_skyline() -> impl Strategy<Value = Vec<(f64, f64)>> {
    prop::collection::btree_map(0_u16..36, -3.0..25.0_f64, 1..20).prop_map(|points| {
        points.into_iter().map(|(azimuth, elevation)| (10.0 * f64::from(azimuth), elevation)).collect()
    })
}

fn sampled_fraction(circle: &Circle, horizon: &Horizon) -> f64 {
    let visible = (0..POINTS).filter(|&index| {
        let point = circle.point(std::f64::consts::TAU * index as f64 / POINTS as f64);
        point.elevation_deg() >= horizon.elevation_deg(point.azimuth_deg())
    });
    visible.count() as f64 / POINTS as f64
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, ..ProptestConfig::default() })]

    #[test]
    fn a_level_horizon_agrees_with_brute_force(
        azimuth in 0.0..360.0_f64, sun in -10.0..90.0_f64, radius in 38.0..55.0_f64, limit in -90.0..5.0_f64,
    ) {
        let circle = Circle::new(Direction::from_angles(azimuth, -sun), radius);
        let horizon = Horizon::Level(limit);
        let arc = circle.over(&horizon);
        prop_assert!((arc.fraction - sampled_fraction(&circle, &horizon)).abs() < 2e-4);
        if let Some((left, right)) = arc.feet {
            prop_assert!((left.elevation_deg() - limit).abs() < 1e-6 && (right.elevation_deg() - limit).abs() < 1e-6);
            prop_assert!((circle.point(0.0).angle_to(&left) - circle.point(0.0).angle_to(&right)).abs() < 1e-9);
        }
        if let Some(crown) = arc.crown {
            let highest = (0..POINTS)
                .map(|index| circle.point(std::f64::consts::TAU * index as f64 / POINTS as f64).elevation_deg())
                .fold(f64::NEG_INFINITY, f64::max);
            prop_assert!((crown.elevation_deg() - highest).abs() < 1e-3);
        } else {
            prop_assert_eq!(arc.fraction, 0.0);
        }
    }

    #[test]
    fn a_skyline_agrees_with_brute_force(
        points in gentle_skyline(), azimuth in 0.0..360.0_f64, sun in -1.0..50.0_f64, radius in 38.0..55.0_f64,
    ) {
        let circle = Circle::new(Direction::from_angles(azimuth, -sun), radius);
        let horizon = Horizon::Skyline(Skyline::new(&points).unwrap().unwrap());
        let arc = circle.over(&horizon);
        prop_assert!((arc.fraction - sampled_fraction(&circle, &horizon)).abs() < 3e-4);
        let reach = circle.reach_deg(&horizon);
        prop_assert_eq!(reach > 1e-3, reach > 1e-3 && !arc.runs.is_empty());
        prop_assert_eq!(reach < -1e-3, reach < -1e-3 && arc.runs.is_empty());
        for foot in arc.feet.into_iter().flat_map(|(left, right)| [left, right]) {
            prop_assert!((foot.elevation_deg() - horizon.elevation_deg(foot.azimuth_deg())).abs() < 1e-4);
        }
    }

    #[test]
    fn a_level_skyline_is_a_level_horizon(
        azimuth in 0.0..360.0_f64, sun in -5.0..60.0_f64, radius in 38.0..55.0_f64, limit in -20.0..10.0_f64,
    ) {
        let circle = Circle::new(Direction::from_angles(azimuth, -sun), radius);
        let level = circle.over(&Horizon::Level(limit));
        let skyline = circle.over(&Horizon::Skyline(Skyline::new(&[(77.0, limit)]).unwrap().unwrap()));
        prop_assert!((level.fraction - skyline.fraction).abs() < 1e-7);
        prop_assert_eq!(level.runs.len(), skyline.runs.len());
    }

    #[test]
    fn wild_skylines_never_break_it(
        points in skyline(), azimuth in 0.0..360.0_f64, sun in -90.0..90.0_f64, radius in 0.0..180.0_f64,
    ) {
        let circle = Circle::new(Direction::from_angles(azimuth, -sun), radius);
        let arc = circle.over(&Horizon::Skyline(Skyline::new(&points).unwrap().unwrap()));
        prop_assert!((0.0..=1.0).contains(&arc.fraction));
        prop_assert_eq!(arc.fraction > 0.0, arc.crown.is_some());
    }

    #[test]
    fn the_sun_has_a_place_for_every_observer_and_time(
        lat in LAT.min..=LAT.max, lon in LON.min..=LON.max, ground in GROUND.min..=GROUND.max,
        eye in EYE_HEIGHT.min..=EYE_HEIGHT.max, second in TIME_MIN.timestamp()..TIME_MAX.timestamp(),
    ) {
        let observer = Observer::new(Place::new(lat, lon).unwrap(), ground, eye, None);
        let sun = Sun::at(&observer, DateTime::from_timestamp(second, 500_000_000).unwrap());
        prop_assert!((0.0..360.0).contains(&sun.apparent.azimuth_deg()));
        prop_assert!(sun.apparent.elevation_deg() >= sun.airless.elevation_deg() - 1e-9);
        prop_assert!(sun.over_horizon_deg(&observer).is_finite());
        let opposite = sun.apparent.angle_to(&sun.antisolar_point());
        prop_assert!((opposite - 180.0).abs() < 1e-6);
    }
}

#[test]
fn half_the_circle_stands_over_a_level_horizon_with_the_sun_on_it() {
    for radius in [40.5, 42.4, 50.3, 53.7] {
        let arc = Circle::new(Direction::from_angles(123.0, 0.0), radius).over(&Horizon::Level(0.0));
        assert!((arc.fraction - 0.5).abs() < 1e-12);
    }
}

#[test]
fn straight_down_and_straight_up_are_no_special_case() {
    for elevation in [-90.0, 90.0] {
        let arc = Circle::new(Direction::from_angles(0.0, elevation), 42.0).over(&Horizon::Level(0.0));
        assert_eq!(arc.fraction, if elevation > 0.0 { 1.0 } else { 0.0 });
    }
    let pole = Observer::new(Place::new(90.0, 0.0).unwrap(), 0.0, 1.7, None);
    let midsummer = DateTime::parse_from_rfc3339("2027-06-21T12:00:00Z").unwrap().to_utc();
    assert!((Sun::at(&pole, midsummer).airless.elevation_deg() - 23.43).abs() < 0.02);
}
