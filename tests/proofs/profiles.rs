//! Bows of many drops under the Sun's disc, against exact sums over drops.

use rainward::optics::airy::{AiryBow, airy_function};
use rainward::optics::debye;
use rainward::optics::fresnel::Polarised;
use rainward::optics::population::{Drops, Population};
use rainward::optics::profile::size_parameter;
use rainward::optics::profile::{FINE, Light, SUN_DIAMETER_DEG, Scatterer};
use rainward::optics::uniform::UniformBow;
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

/// At the brightest maxima the uniform theory is held against the exact light of its order alone.
#[test]
fn uniform_theory_against_debye() {
    // Size parameter, order, number of the maximum, error allowed.
    let cases = [
        (571.2, 1, 0, 0.004),
        (571.2, 1, 1, 0.007),
        (571.2, 1, 2, 0.008),
        (571.2, 2, 0, 0.016),
        (1142.4, 1, 0, 0.001),
        (1142.4, 1, 4, 0.002),
        (1142.4, 2, 0, 0.007),
        (1142.4, 2, 1, 0.01),
        (5712.0, 1, 0, 0.002),
        (5712.0, 1, 4, 0.002),
        (5712.0, 2, 0, 0.005),
        (5712.0, 2, 4, 0.01),
    ];
    for (x, order, number, allowed) in cases {
        let x: f64 = x;
        let n = 1.33503;
        let exact = debye::order_alone(x, n, order).unwrap();
        let (bow, airy) = (UniformBow::new(n, order).unwrap(), AiryBow::new(x, n, order).unwrap());
        let at_deg = airy.maximum_deg(number).unwrap();
        let reach_deg = 0.1 * (airy.maximum_deg(1).unwrap() - airy.maximum_deg(0).unwrap());
        let (mut by_theory, mut exactly) = (0.0, 0.0);
        for step in -20..=20 {
            let angle_deg = at_deg + reach_deg * f64::from(step) / 20.0;
            let direction = bow.direction(angle_deg);
            let (ai, slope) = airy_function(-direction.stretch * x.powf(2.0 / 3.0));
            let light = x.cbrt() * direction.even.mean() * ai * ai + direction.odd.mean() * slope * slope / x.cbrt();
            by_theory += x * x * light * (1.0 + direction.edge / x);
            exactly += exact.intensities(&[angle_deg.to_radians().cos()])[0].mean();
        }
        let off = by_theory / exactly - 1.0;
        println!("uniform, x {x}, order {order}, maximum {number}: {off:+.4}");
        assert!(off.abs() < allowed, "x {x}, order {order}, maximum {number}: {off}");
    }
}

/// The tables of averages are interpolated: held against sums over drops with Airy's function itself.
#[test]
fn averages_against_direct_sums() {
    let (wavelength_um, n) = (0.55, 1.33503);
    for drops in [Drops::Rain { mm_h: 2.0 }, Drops::Rain { mm_h: 40.0 }, Drops::Equal { radius_um: 400.0 }] {
        let light = Scatterer::new(drops, Light::OneWavelength).under_a_point(wavelength_um, n).unwrap();
        let bows = [1, 2].map(|order| UniformBow::new(n, order).unwrap());
        let population = Population::new(drops, 3000);
        let largest = light.iter().map(|at| at.mean()).fold(0.0, f64::max);
        let mut worst: f64 = 0.0;
        for (angle_deg, at) in FINE.angles_deg().zip(&light).step_by(3) {
            // Only where a bow is bright: the background is another matter.
            let direct: f64 = population
                .classes
                .iter()
                .map(|class| {
                    let x = size_parameter(class.radius_um, wavelength_um);
                    let of_bow = |bow: &UniformBow| {
                        let direction = bow.direction(angle_deg);
                        let (ai, slope) = airy_function(-direction.stretch * x.powf(2.0 / 3.0));
                        x.cbrt() * direction.even.mean() * ai * ai + direction.odd.mean() * slope * slope / x.cbrt()
                    };
                    2.0 * class.share * bows.iter().map(of_bow).sum::<f64>()
                })
                .sum();
            worst = worst.max((at.mean() - direct - 0.0107).abs() / largest);
        }
        println!("{drops:?}: interpolated averages within {worst:.4} of the peak");
        assert!(worst < 0.015, "{drops:?}: {worst}");
    }
}
