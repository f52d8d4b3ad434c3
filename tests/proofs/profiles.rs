//! Bows of many drops under the Sun's disc, against exact sums over drops.

use rainward::optics::fresnel::Polarised;
use rainward::optics::population::Drops;
use rainward::optics::profile::{FINE, Light, SUN_DIAMETER_DEG, Scatterer};
use serde_json::{Value, json};

use crate::table::{Row, check};

/// Value of the curve at an angle, straight between its points.
fn at(curve: &[f64], angle_deg: f64) -> f64 {
    let place = (angle_deg - FINE.first_deg) / FINE.step_deg;
    let (index, share) = (place as usize, place.fract());
    curve[index] * (1.0 - share) + curve[index + 1] * share
}

/// What a row of the averaged bows expects.
fn averaged(row: &Row, drops: Drops) -> Value {
    assert!((row.number("sun_diameter_deg") - SUN_DIAMETER_DEG).abs() < 1e-9);
    let light = Scatterer::new(drops, Light::OneWavelength)
        .under_the_sun(row.number("wavelength_um"), row.number("n"))
        .unwrap();
    let phase_function: Vec<f64> = light.iter().map(|at| at.mean()).collect();
    let angles: Vec<f64> = FINE.angles_deg().collect();
    let highest = |from_deg: f64, to_deg: f64| {
        let within = (0..angles.len()).filter(|index| (from_deg..to_deg).contains(&angles[*index]));
        within.max_by(|a, b| phase_function[*a].total_cmp(&phase_function[*b])).unwrap()
    };
    let (primary, secondary) = (highest(136.0, 149.9), highest(120.1, 129.5));
    let degree = |index: usize| Polarised::degree(light[index]);
    let dark_band_least = phase_function[secondary..primary].iter().copied().min_by(f64::total_cmp).unwrap();
    let wanted = row.numbers("angle_deg");
    json!({
        "phase_function": wanted.iter().map(|angle| at(&phase_function, *angle)).collect::<Vec<_>>(),
        "primary_peak_radius_deg": 180.0 - angles[primary],
        "primary_peak": phase_function[primary],
        "secondary_peak_radius_deg": 180.0 - angles[secondary],
        "secondary_peak": phase_function[secondary],
        "dark_band_least": dark_band_least,
        "primary_degree_of_polarisation": degree(primary),
        "secondary_degree_of_polarisation": degree(secondary),
    })
}

#[test]
fn bow_in_nearly_equal_drops() {
    check("mie", "Bow in nearly equal drops, over the Sun's disc", |row| {
        averaged(row, Drops::Equal { radius_um: row.number("mean_radius_um") })
    });
}

#[test]
fn bow_in_rain() {
    check("mie", "Bow in Marshall-Palmer rain of spheres, over the Sun's disc", |row| {
        averaged(row, Drops::Rain { mm_h: row.number("rain_mm_h") })
    });
}
