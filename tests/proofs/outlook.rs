//! The chance of a bow over weather made for the purpose: what must make one, what must prevent it, and where windows end.

use chrono::{DateTime, TimeDelta, Utc};
use rainward::bounds::Place;
use rainward::outlook::answer::{Limit, Outlook, SkyEventKind, Step};
use rainward::outlook::sight::margin_deg;
use rainward::outlook::timeline::{Ask, outlook};
use rainward::sky::horizon::Skyline;
use rainward::sky::observer::Observer;
use rainward::weather::field::{Field, Series, Space, Times};
use rainward::weather::quantity::Quantity;

const LAT: f64 = 47.4;
const LON: f64 = -31.1;

fn at(text: &str) -> DateTime<Utc> {
    DateTime::parse_from_rfc3339(text).unwrap().to_utc()
}

/// A late afternoon with the Sun about 20 degrees up in the west.
fn afternoon() -> DateTime<Utc> {
    at("2031-05-04T19:00:00Z")
}

fn observer() -> Observer {
    Observer::new(Place::new(LAT, LON).unwrap(), 0.0, 1.7, None)
}

fn ask(from: DateTime<Utc>, hours: i64) -> Ask {
    Ask {
        observer: observer(),
        from,
        length: TimeDelta::hours(hours),
        step: TimeDelta::minutes(5),
        threshold: 0.3,
        radius_deg: 42.39,
    }
}

/// A grid of 6 x 8 degrees round the observer on which a value depends on the way east and north, in km.
struct Grid(Field, usize);

impl Grid {
    fn new() -> Self {
        Self::round(LON, 1.0)
    }

    /// `bend` other than 1 makes the axes uneven.
    fn round(lon: f64, bend: f64) -> Self {
        let axis = |centre: f64, half: f64, bend: f64| -> Vec<f64> {
            (-40..=40)
                .map(|i| centre + half * (f64::from(i) / 40.0).signum() * (f64::from(i) / 40.0).abs().powf(bend))
                .collect()
        };
        let space = Space::Grid { lats_deg: axis(LAT, 3.0, bend), lons_deg: axis(lon, 4.0, bend) };
        Self(Field::new(space, Some(afternoon())).unwrap(), 81)
    }

    fn with(mut self, quantity: Quantity, value: impl Fn(f64, f64) -> f32) -> Self {
        let Space::Grid { lats_deg, lons_deg } = self.0.space.clone() else { unreachable!() };
        let middle = lons_deg[self.1 / 2];
        let mut slice = Vec::new();
        for lat in &lats_deg {
            for lon in &lons_deg {
                slice.push(value((lon - middle) * 111.2 * LAT.to_radians().cos(), (lat - LAT) * 111.2));
            }
        }
        let start = afternoon().timestamp() - 24 * 3600;
        let times: Vec<i64> = (0..=44).map(|hour| start + hour * 3600).collect();
        let values = slice.repeat(times.len());
        self.0.insert(quantity, Series { times: Times::Instants(times), values }).unwrap();
        self
    }

    /// Rain all round under a clear sky, warm.
    fn sunlit_rain() -> Self {
        Self::new()
            .with(Quantity::Rain, |_, _| 2.0)
            .with(Quantity::CloudLow, |_, _| 0.0)
            .with(Quantity::Temperature, |_, _| 12.0)
    }
}

fn first(field: &Field) -> Step {
    of(field, &ask(afternoon(), 1)).steps.remove(0)
}

fn of(field: &Field, ask: &Ask) -> Outlook {
    outlook(ask, Some(field), Some(ask.from))
}

#[test]
fn sunlit_rain_makes_a_bow_for_certain() {
    let step = first(&Grid::sunlit_rain().0);
    assert_eq!((step.chance, step.limited_by), (Some(1.0), None));
    assert!(step.prominence.unwrap() > 0.2);
}

#[test]
fn what_prevents_a_bow_is_named() {
    let sunlit = Grid::sunlit_rain;
    let rows = [
        ("dry", sunlit().with(Quantity::Rain, |_, _| 0.0), Limit::NoRain),
        ("overcast", sunlit().with(Quantity::CloudLow, |_, _| 1.0), Limit::SunBlocked),
        ("overcast in the middle", sunlit().with(Quantity::CloudMiddle, |_, _| 1.0), Limit::SunBlocked),
        ("frost", sunlit().with(Quantity::Temperature, |_, _| -5.0), Limit::Snow),
        (
            "dry frost",
            sunlit().with(Quantity::Temperature, |_, _| -5.0).with(Quantity::Rain, |_, _| 0.0),
            Limit::NoRain,
        ),
        (
            "a trace in mist",
            sunlit().with(Quantity::Rain, |_, _| 0.011).with(Quantity::Visibility, |_, _| 160.0),
            Limit::TooFaint,
        ),
    ];
    for (name, grid, limit) in rows {
        let step = first(&grid.0);
        assert_eq!((step.chance, step.limited_by), (Some(0.0), Some(limit)), "{name}");
    }
}

#[test]
fn geometry_forbids_before_weather_is_asked() {
    let field = Grid::sunlit_rain().0;
    let limit = |ask: &Ask| of(&field, ask).steps[0].limited_by;
    assert_eq!(limit(&ask(at("2031-05-04T02:00:00Z"), 1)), Some(Limit::SunDown));
    assert_eq!(limit(&ask(at("2031-05-04T14:00:00Z"), 1)), Some(Limit::SunTooHigh));
    let walled = |elevation| {
        let skyline = Skyline::new(&[(0.0, elevation)]).unwrap();
        Ask { observer: Observer::new(observer().place, 0.0, 1.7, skyline), ..ask(afternoon(), 1) }
    };
    assert_eq!(limit(&walled(30.0)), Some(Limit::Skyline), "a wall hides the Sun");
    assert_eq!(limit(&walled(5.0)), None);
    // The Sun over a low west, the bow behind a high east.
    let behind = Skyline::new(&[(0.0, 0.0), (30.0, 50.0), (150.0, 50.0), (180.0, 0.0)]).unwrap();
    let hidden = Ask { observer: Observer::new(observer().place, 0.0, 1.7, behind), ..ask(afternoon(), 1) };
    assert_eq!(limit(&hidden), Some(Limit::Skyline));
    assert_eq!(of(&field, &hidden).steps[0].chance, Some(0.0), "known without any weather");
}

#[test]
fn what_the_feed_does_not_say_is_unknown() {
    let field = Grid::sunlit_rain().0;
    let late = of(&field, &ask(afternoon() + TimeDelta::days(1), 1));
    assert!(late.steps.iter().all(|step| step.chance.is_none() == (step.limited_by == Some(Limit::NoData))));
    assert_eq!(late.steps[0].chance, None);
    let elsewhere = Ask {
        observer: Observer::new(Place::new(-10.0, 100.0).unwrap(), 0.0, 1.7, None),
        ..ask(at("2031-05-04T09:30:00Z"), 1)
    };
    assert_eq!(of(&field, &elsewhere).steps[0].limited_by, Some(Limit::NoData));
    let without = outlook(&ask(afternoon(), 1), None, None);
    assert_eq!((without.steps[0].chance, without.windows.len()), (None, 0));
    assert!(without.steps[0].crown.is_some(), "geometry still answers");
    let no_rain = Grid::new().with(Quantity::CloudLow, |_, _| 0.2).0;
    let answer = of(&no_rain, &ask(afternoon(), 1));
    assert_eq!(answer.steps[0].limited_by, Some(Limit::NoData));
    assert!(answer.assumed.iter().any(|assumption| assumption.value == "rain"));
}

#[test]
fn the_cloud_that_counts_lies_toward_the_sun() {
    // Sun in the west at about 20 degrees: a layer 1 km up is crossed some 3 km to the west of the rain.
    let west = Grid::sunlit_rain().with(Quantity::CloudLow, |east, _| if east < -60.0 { 1.0 } else { 0.0 });
    let all_but_west = Grid::sunlit_rain().with(Quantity::CloudHigh, |east, _| if east < 5.0 { 0.0 } else { 1.0 });
    assert_eq!(first(&west.0).chance, Some(1.0), "cloud beyond the way of the light shades nothing");
    let step = first(&all_but_west.0);
    assert!(step.chance.unwrap() > 0.5, "high cloud over the rain is crossed 22 km toward the Sun: {:?}", step.chance);
    // With a Sun 2 degrees up the same low cloud far in the west is in the way.
    let low_sun = at("2031-05-04T21:00:00Z");
    let far_west = Grid::sunlit_rain().with(Quantity::CloudLow, |east, _| if east < -8.0 { 1.0 } else { 0.0 });
    let evening = of(&far_west.0, &ask(low_sun, 1)).steps[0].clone();
    let noonward = first(&far_west.0);
    assert!(evening.sun.elevation_deg > 0.5 && evening.sun.elevation_deg < 4.0, "{}", evening.sun.elevation_deg);
    assert!(evening.chance.unwrap() < noonward.chance.unwrap(), "{:?} {:?}", evening.chance, noonward.chance);
}

#[test]
fn rain_must_stand_opposite_the_sun() {
    let east = Grid::sunlit_rain().with(Quantity::Rain, |east, _| if east > 4.0 { 3.0 } else { 0.0 });
    let west = Grid::sunlit_rain().with(Quantity::Rain, |east, _| if east < -4.0 { 3.0 } else { 0.0 });
    let (opposite, sunward) = (first(&east.0).chance.unwrap(), first(&west.0).chance.unwrap());
    assert!(opposite > 0.9 && sunward < 0.5, "{opposite} {sunward}");
}

#[test]
fn a_rain_chance_is_the_share_of_wet_copies_and_cover_the_share_in_shade() {
    let unsure = Grid::sunlit_rain().with(Quantity::RainChance, |_, _| 0.4);
    assert_eq!(first(&unsure.0).chance, Some(0.4));
    let half = Grid::sunlit_rain().with(Quantity::CloudLow, |_, _| 0.5);
    let chance = first(&half.0).chance.unwrap();
    assert!((0.5..=0.875).contains(&chance), "one to three gaps along the arc: {chance}");
}

#[test]
fn a_shower_gets_less_certain_with_lead_time() {
    let shower = |east: f64, north: f64| if (east - 6.0).hypot(north) < 8.0 { 4.0 } else { 0.0 };
    let field = Grid::sunlit_rain().with(Quantity::Rain, shower).0;
    let step = |issued: DateTime<Utc>| {
        let mut field = field.clone();
        field.issued = Some(issued);
        first(&field).chance.unwrap()
    };
    let (fresh, old) = (step(afternoon()), step(afternoon() - TimeDelta::hours(36)));
    assert!(fresh > 0.6 && old < 0.7 * fresh, "{fresh} {old}");
}

fn series(wind_from_deg: Option<f32>) -> Field {
    let mut field = Field::new(Space::Point(Place::new(LAT, LON).unwrap()), Some(afternoon())).unwrap();
    let hour = |offset: i64| afternoon().timestamp() + offset * 60;
    let periods = vec![hour(-180)..hour(-40), hour(-40)..hour(-10), hour(-10)..hour(180)];
    field.insert(Quantity::Rain, Series { times: Times::Periods(periods), values: vec![0.0, 4.0, 0.0] }).unwrap();
    let times = Times::Instants(vec![hour(-180), hour(180)]);
    let mut state = |quantity, value| {
        field.insert(quantity, Series { times: times.clone(), values: vec![value; 2] }).unwrap();
    };
    state(Quantity::CloudLow, 0.0);
    state(Quantity::Temperature, 12.0);
    if let Some(from) = wind_from_deg {
        state(Quantity::WindFrom, from);
        state(Quantity::WindSpeed, 9.0);
    }
    field
}

#[test]
fn a_series_at_one_point_is_laid_out_by_its_wind() {
    // It rained here until ten minutes ago; the Sun stands in the west, the bow in the east.
    let blown_east = first(&series(Some(270.0))).chance.unwrap();
    let blown_west = first(&series(Some(90.0))).chance.unwrap();
    assert!(blown_east > 0.5 && blown_west < 0.4 * blown_east, "{blown_east} {blown_west}");
    let said = |field: &Field, value| of(field, &ask(afternoon(), 1)).assumed.iter().any(|a| a.value == value);
    assert!(said(&series(None), "wind") && said(&series(Some(270.0)), "space"));
}

#[test]
fn windows_end_where_the_sun_or_the_bow_does() {
    let ask = ask(at("2031-05-04T12:02:00Z"), 12);
    let answer = of(&Grid::sunlit_rain().0, &ask);
    assert_eq!(answer.windows.len(), 1, "{:?}", answer.windows);
    let window = &answer.windows[0];
    let event = |kind| answer.sky_events.iter().find(|event| event.event == kind).unwrap().time;
    for (end, kind) in [(window.start, SkyEventKind::BowRises), (window.end, SkyEventKind::BowSets)] {
        assert!((end - event(kind)).num_milliseconds().abs() <= 500, "{end} {}", event(kind));
        let margin = |seconds| margin_deg(&ask.observer, ask.radius_deg, end + TimeDelta::seconds(seconds));
        assert!((margin(-1) >= 0.0) != (margin(1) >= 0.0), "no crossing within 1 s of {end}");
    }
    assert!((window.end - event(SkyEventKind::Sunset)).num_milliseconds().abs() <= 500);
    assert_eq!(window.best.chance, 1.0);
    assert!(window.crown_elevation_deg < 42.5 && window.face_azimuth_deg > 0.0 && window.face_azimuth_deg < 180.0);
}

#[test]
fn weather_ends_a_window_between_its_steps() {
    let answer = of(&series(Some(270.0)), &ask(afternoon() - TimeDelta::minutes(20), 2));
    let window = answer.windows.first().expect("a window while the shower goes off to the east");
    let inside = |time| time >= window.start && time <= window.end;
    for step in &answer.steps {
        let good = step.chance.unwrap() >= 0.3;
        assert_eq!(good, answer.windows.iter().any(|w| step.time >= w.start && step.time <= w.end), "{}", step.time);
        assert!(!inside(step.time) || good);
    }
    let shortest = answer.windows.iter().all(|w| w.end >= w.start);
    assert!(shortest && window.best.time >= window.start && window.best.time <= window.end);
}

#[test]
fn the_same_question_gives_the_same_answer_and_thresholds_are_kept() {
    let field = series(Some(300.0));
    let ask = ask(afternoon() - TimeDelta::hours(2), 4);
    assert_eq!(of(&field, &ask), of(&field, &ask));
    for threshold in [0.0, 0.5, 1.0] {
        let answer = of(&field, &Ask { threshold, ..ask.clone() });
        assert!(answer.windows.iter().all(|window| window.best.chance >= threshold && window.best.chance > 0.0));
    }
}

#[test]
fn uneven_axes_and_the_date_line_change_nothing() {
    let shower = |east: f64, north: f64| ((9.0 - (east - 8.0).hypot(north)).max(0.0) * 0.5) as f32;
    let chances = |grid: Grid, lon: f64, hours: f64| -> Vec<Option<f64>> {
        let mut field =
            grid.with(Quantity::Rain, shower).with(Quantity::CloudLow, |east, _| (0.3 + east / 900.0) as f32).0;
        let shift = TimeDelta::seconds((hours * 3600.0) as i64);
        let mut ask = ask(afternoon() + shift, 1);
        ask.observer = Observer::new(Place::new(LAT, lon).unwrap(), 0.0, 1.7, None);
        field.issued = Some(ask.from);
        of(&field, &ask).steps.into_iter().map(|step| step.chance).collect()
    };
    let even = chances(Grid::round(LON, 1.0), LON, 0.0);
    let nearly_even = chances(Grid::round(LON, 1.000_01), LON, 0.0);
    for (a, b) in even.iter().zip(&nearly_even) {
        assert!((a.unwrap() - b.unwrap()).abs() < 0.02, "{a:?} {b:?}");
    }
    // The same sky half a day's turn further: 180 degrees east, the grid running over the date line.
    let line = chances(Grid::round(180.0, 1.0), 180.0, -(180.0 - LON) / 15.0);
    let other_side = chances(Grid::round(180.0, 1.0), -180.0, -(180.0 - LON) / 15.0);
    assert_eq!(line, other_side);
    assert!(line.iter().flatten().any(|chance| *chance > 0.1), "{line:?}");
}

#[test]
fn an_eye_above_the_rain_looks_down_into_it() {
    let field = Grid::sunlit_rain().with(Quantity::CloudBase, |_, _| 400.0).0;
    let seen_from = |eye_height_m: f64, skyline: &[(f64, f64)]| {
        let observer = Observer::new(observer().place, 0.0, eye_height_m, Skyline::new(skyline).unwrap());
        of(&field, &Ask { observer, ..ask(afternoon(), 1) }).steps[0].clone()
    };
    assert_eq!(seen_from(1.7, &[]).chance, Some(1.0));
    let above = seen_from(3000.0, &[]);
    assert_eq!((above.chance, above.limited_by), (Some(0.0), Some(Limit::TooFaint)), "only air before the eye");
    assert_eq!(
        seen_from(3000.0, &[(0.0, -80.0)]).chance,
        Some(1.0),
        "the rain below, through a horizon that goes there"
    );
    let over_cloud = Grid::sunlit_rain().with(Quantity::CloudBase, |_, _| 800.0).with(Quantity::CloudLow, |_, _| 1.0).0;
    let high = Ask { observer: Observer::new(observer().place, 0.0, 1000.0, None), ..ask(afternoon(), 1) };
    assert_ne!(
        of(&over_cloud, &high).steps[0].limited_by,
        Some(Limit::SunBlocked),
        "cloud below the eye shades nothing"
    );
}

#[test]
fn what_is_known_to_be_hopeless_is_not_called_unknown() {
    let rows = [
        ("fog", Grid::sunlit_rain().with(Quantity::Visibility, |_, _| 50.0), Limit::TooFaint),
        (
            "fog without rain",
            Grid::sunlit_rain().with(Quantity::Visibility, |_, _| 50.0).with(Quantity::Rain, |_, _| 0.0),
            Limit::NoRain,
        ),
        (
            "freezing on the ground",
            Grid::sunlit_rain().with(Quantity::FreezingLevel, |_, _| 0.0).with(Quantity::Temperature, |_, _| 3.0),
            Limit::Snow,
        ),
    ];
    for (name, grid, limit) in rows {
        let step = first(&grid.0);
        assert_eq!((step.chance, step.limited_by), (Some(0.0), Some(limit)), "{name}");
    }
}

#[test]
fn cloud_that_is_in_no_layer_but_in_the_total_shades_too() {
    let both = |low: f32, total: f32| {
        let grid =
            Grid::sunlit_rain().with(Quantity::CloudLow, move |_, _| low).with(Quantity::CloudTotal, move |_, _| total);
        first(&grid.0).chance.unwrap()
    };
    assert_eq!(both(0.1, 1.0), 0.0, "an overcast whose layers are not all given");
    assert_eq!(both(0.0, 0.0), 1.0);
    assert!(
        (both(0.4, 0.4) - first(&Grid::sunlit_rain().with(Quantity::CloudLow, |_, _| 0.4).0).chance.unwrap()).abs()
            < 1e-6
    );
}

#[test]
fn a_calm_tells_no_more_than_no_wind() {
    let mut calm = series(Some(270.0));
    let times = calm.series(Quantity::WindSpeed).unwrap().times.clone();
    calm.insert(Quantity::WindSpeed, Series { times, values: vec![0.2; 2] }).unwrap();
    let chances =
        |field: &Field| of(field, &ask(afternoon(), 1)).steps.into_iter().map(|s| s.chance).collect::<Vec<_>>();
    assert_eq!(chances(&calm), chances(&series(None)));
}

#[test]
fn what_lies_beyond_the_field_is_unknown_not_dry() {
    // A grid that ends just behind the observer: the bow stands in the east, of which it says nothing.
    let mut field = Field::new(
        Space::Grid { lats_deg: vec![46.4, 48.4], lons_deg: vec![LON - 0.245, LON - 0.145, LON - 0.045] },
        Some(afternoon()),
    )
    .unwrap();
    let times = Times::Instants(vec![afternoon().timestamp() - 7200, afternoon().timestamp() + 7200]);
    field.insert(Quantity::Rain, Series { times, values: vec![0.0; 12] }).unwrap();
    assert_eq!(first(&field).limited_by, Some(Limit::NoData));
}

#[test]
fn a_bow_that_sets_and_rises_between_two_steps_ends_a_window() {
    let grid = Grid::round(7.5, 1.0);
    let mut field = grid.with(Quantity::Rain, |_, _| 2.0).with(Quantity::CloudLow, |_, _| 0.0).0;
    // The same rain on the day of a Sun that culminates just above the bow's radius.
    let day = at("2026-03-27T00:00:00Z");
    let times = Times::Instants((0..25).map(|hour| day.timestamp() + hour * 3600).collect());
    let cells = field.cells();
    for (quantity, value) in [(Quantity::Rain, 2.0), (Quantity::CloudLow, 0.0)] {
        field.insert(quantity, Series { times: times.clone(), values: vec![value; 25 * cells] }).unwrap();
    }
    let mut ask = ask(at("2026-03-27T09:00:00Z"), 5);
    // The bow is below the horizon for less than half an hour, between the steps at 11 and 12.
    ask.observer = Observer::new(Place::new(50.2, 7.5).unwrap(), 0.0, 1.7, None);
    for minutes in [1, 60] {
        let answer = of(&field, &Ask { step: TimeDelta::minutes(minutes), ..ask.clone() });
        let found: Vec<String> =
            answer.windows.iter().map(|w| format!("{} {}", w.start.format("%H:%M"), w.end.format("%H:%M"))).collect();
        assert_eq!(found, ["09:00 11:21", "11:49 14:00"], "steps of {minutes} min");
    }
}

#[test]
fn risings_behind_a_jagged_skyline_agree_with_the_steps() {
    // Notches and teeth of 2 degrees all along the western half.
    let points: Vec<(f64, f64)> = (90..180).map(|i| (f64::from(2 * i), if i % 2 == 0 { 2.0 } else { 9.0 })).collect();
    let jagged = Observer::new(observer().place, 0.0, 1.7, Skyline::new(&points).unwrap());
    let ask = Ask { observer: jagged, step: TimeDelta::minutes(1), ..ask(at("2031-05-04T15:00:00Z"), 8) };
    let answer = outlook(&ask, None, None);
    let possible = |step: &Step| !matches!(step.limited_by, Some(Limit::SunDown | Limit::SunTooHigh | Limit::Skyline));
    let changes = answer.steps.windows(2).filter(|pair| possible(&pair[0]) != possible(&pair[1])).count();
    let told = answer
        .sky_events
        .iter()
        .filter(|event| matches!(event.event, SkyEventKind::BowRises | SkyEventKind::BowSets))
        .count();
    assert!(changes >= 6, "the skyline is not jagged enough: {changes}");
    assert_eq!(told, changes);
}
