//! The built-in demo feed: showers that drift on the wind along an invented coast, written as CoverageJSON and read like
//! any other feed. The same moment gives the same bytes.

use std::collections::BTreeMap;

use chrono::{DateTime, SecondsFormat, TimeDelta, Utc};
use serde::Serialize;
use serde_json::{Value, json};
use xxhash_rust::xxh3::xxh3_64;

const LAT: (f64, f64, usize) = (46.94, 47.94, 26);
const LON: (f64, f64, usize) = (-31.92, -30.36, 27);
const STEP_MIN: i64 = 20;
const HOURS: i64 = 62;
/// Wind toward east and north, km/h.
const WIND_KM_H: (f64, f64) = (26.0, 12.0);
/// Spacing of the lattice on which showers are seeded, km, and the time each lattice of showers lives, h.
const SPACING_KM: f64 = 22.0;
const LIFE_H: f64 = 3.0;
/// Rain below this is none, mm/h.
const LEAST_RAIN: f64 = 0.05;

/// A CoverageJSON document of the demo weather from an hour before a time to two days and a half after it.
pub fn document(now: DateTime<Utc>) -> Vec<u8> {
    let step_s = STEP_MIN * 60;
    let start_s = (now.timestamp() - 3600).div_euclid(step_s) * step_s;
    let start = DateTime::from_timestamp(start_s, 0).unwrap_or(now);
    let times: Vec<DateTime<Utc>> =
        (0..=HOURS * 60 / STEP_MIN).map(|index| start + TimeDelta::minutes(index * STEP_MIN)).collect();
    let cells: Vec<(f64, f64)> = (0..LAT.2).flat_map(|row| (0..LON.2).map(move |column| km(row, column))).collect();
    let mut grids: [Vec<f32>; 3] = std::array::from_fn(|_| Vec::with_capacity(times.len() * cells.len()));
    for time in &times {
        let hour = time.timestamp() as f64 / 3600.0;
        let showers = showers(hour);
        for &(east_km, north_km) in &cells {
            let fall = |wider| showers.iter().map(|shower| shower.at(east_km, north_km, wider)).sum::<f64>();
            let rain = Some(fall(1.0)).filter(|rain| *rain >= LEAST_RAIN).unwrap_or(0.0);
            let cloud = 12.0 + 30.0 * fall(1.7);
            let warmth = 11.0 + 3.0 * ((hour - 17.0) / 24.0 * std::f64::consts::TAU).cos() - 0.4 * rain;
            for (grid, value) in grids.iter_mut().zip([rain, cloud.min(100.0), warmth]) {
                grid.push(((value * 100.0).round() / 100.0) as f32);
            }
        }
    }
    let [rain, cloud, warmth] = grids.map(|values| NdArray::new(times.len(), values));
    let same = |value: f32| NdArray::new(times.len(), vec![value; times.len() * cells.len()]);
    let stamps: Vec<String> = times.iter().map(|time| time.to_rfc3339_opts(SecondsFormat::Secs, true)).collect();
    let coverage = Coverage {
        r#type: "Coverage",
        domain: json!({
            "type": "Domain",
            "domainType": "Grid",
            "axes": {
                "t": { "values": stamps },
                "y": { "start": LAT.0, "stop": LAT.1, "num": LAT.2 },
                "x": { "start": LON.0, "stop": LON.1, "num": LON.2 },
            },
            "referencing": [
                { "coordinates": ["x", "y"],
                  "system": { "type": "GeographicCRS", "id": "http://www.opengis.net/def/crs/OGC/1.3/CRS84" } },
                { "coordinates": ["t"], "system": { "type": "TemporalRS", "calendar": "Gregorian" } },
            ],
        }),
        parameters: json!({
            "rain": parameter("rainfall_rate", "mm/h"),
            "low": parameter("low_type_cloud_area_fraction", "%"),
            "middle": parameter("medium_type_cloud_area_fraction", "%"),
            "high": parameter("high_type_cloud_area_fraction", "%"),
            "temperature": parameter("air_temperature", "Cel"),
            "east": parameter("eastward_wind", "km/h"),
            "north": parameter("northward_wind", "km/h"),
        }),
        ranges: BTreeMap::from([
            ("rain", rain),
            ("low", cloud),
            ("middle", same(10.0)),
            ("high", same(15.0)),
            ("temperature", warmth),
            ("east", same(WIND_KM_H.0 as f32)),
            ("north", same(WIND_KM_H.1 as f32)),
        ]),
    };
    // Numbers and texts always serialise; should they not, the reader refuses the empty document by name.
    serde_json::to_vec(&coverage).unwrap_or_default()
}

#[derive(Serialize)]
struct Coverage {
    r#type: &'static str,
    domain: Value,
    parameters: Value,
    ranges: BTreeMap<&'static str, NdArray>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct NdArray {
    r#type: &'static str,
    data_type: &'static str,
    axis_names: [&'static str; 3],
    shape: [usize; 3],
    values: Vec<f32>,
}

impl NdArray {
    fn new(times: usize, values: Vec<f32>) -> Self {
        let (axis_names, shape) = (["t", "y", "x"], [times, LAT.2, LON.2]);
        Self { r#type: "NdArray", data_type: "float", axis_names, shape, values }
    }
}

fn km(row: usize, column: usize) -> (f64, f64) {
    let share = |axis: (f64, f64, usize), index: usize| axis.0 + (axis.1 - axis.0) * index as f64 / (axis.2 - 1) as f64;
    let (lat, lon) = (share(LAT, row), share(LON, column));
    ((lon - LON.0) * 111.2 * LAT.0.to_radians().cos(), (lat - LAT.0) * 111.2)
}

/// A shower at a moment.
struct Shower {
    east_km: f64,
    north_km: f64,
    radius_km: f64,
    peak_mm_h: f64,
}

impl Shower {
    /// Its rain at a place, mm/h; `wider` stretches it.
    fn at(&self, east_km: f64, north_km: f64, wider: f64) -> f64 {
        let (east, north, radius) = (self.east_km - east_km, self.north_km - north_km, self.radius_km * wider);
        let square = (east * east + north * north) / (2.0 * radius * radius);
        if square > 12.0 { 0.0 } else { self.peak_mm_h * (-square).exp() }
    }
}

/// The showers over the coast at an hour since 1970: seeded on a lattice that drifts with the wind, they grow and fade.
fn showers(hour: f64) -> Vec<Shower> {
    let (drift_east, drift_north) = (WIND_KM_H.0 * hour, WIND_KM_H.1 * hour);
    let (width, height) = km(LAT.2 - 1, LON.2 - 1);
    let lattice = |from: f64, to: f64| (from / SPACING_KM).floor() as i64 - 1..=(to / SPACING_KM).floor() as i64 + 1;
    let generation = (hour / LIFE_H).floor() as i64;
    let mut found = Vec::new();
    for born in [generation - 1, generation] {
        let age = (hour / LIFE_H - born as f64) / 2.0;
        let vigour = (std::f64::consts::PI * age).sin().powi(2);
        for i in lattice(-drift_east, width - drift_east) {
            for j in lattice(-drift_north, height - drift_north) {
                let [present, dx, dy, size, strength] = dice(i, j, born);
                if present < spell(born) {
                    found.push(Shower {
                        east_km: (i as f64 + dx) * SPACING_KM + drift_east,
                        north_km: (j as f64 + dy) * SPACING_KM + drift_north,
                        radius_km: 2.5 + 3.5 * size,
                        peak_mm_h: vigour * (0.5 + 5.0 * strength),
                    });
                }
            }
        }
    }
    found
}

/// Share of the lattice that holds a shower: showery spells follow dry ones about every half day.
fn spell(born: i64) -> f64 {
    0.3 * (born as f64 * LIFE_H / 13.0 * std::f64::consts::TAU).sin().max(0.0)
}

/// Five numbers in 0..1 for a lattice cell.
fn dice(i: i64, j: i64, born: i64) -> [f64; 5] {
    std::array::from_fn(|side| {
        let seed: Vec<u8> = [i, j, born, side as i64].iter().flat_map(|part| part.to_le_bytes()).collect();
        (xxh3_64(&seed) >> 11) as f64 / (1_u64 << 53) as f64
    })
}

fn parameter(standard_name: &str, unit: &str) -> Value {
    json!({
        "type": "Parameter",
        "observedProperty": {
            "id": format!("http://vocab.nerc.ac.uk/standard_name/{standard_name}/"),
            "label": { "en": standard_name },
        },
        "unit": { "symbol": { "value": unit, "type": "http://www.opengis.net/def/uom/UCUM/" } },
    })
}
