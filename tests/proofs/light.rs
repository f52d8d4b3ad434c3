//! The answer on light: facts of the sky, limits, and the short way for the outlook against the long one.

use proptest::prelude::*;
use rainward::bounds;
use rainward::optics::beam::Beam;
use rainward::optics::colour::{self, SPECTRUM};
use rainward::optics::light::answer::LightAnswer;
use rainward::optics::light::asked::{Asked, Fog};
use rainward::optics::light::{Prepared, answer};
use rainward::optics::population::Drops;
use rainward::optics::profile::{FINE, Light, Scatterer};
use rainward::optics::scene::{View, prominence};
use rainward::optics::water::Water;
use rainward::optics::white::Curves;

fn ask(asked: Asked) -> LightAnswer {
    let question = asked.check().expect("a good question");
    answer(&question, &Prepared::new(&question).expect("drops in range"))
}

fn sun(elevation_deg: f64) -> Asked {
    Asked { sun_elevation_deg: Some(elevation_deg), ..Asked::default() }
}

/// The brightest circle nears the ray's from inside as drops grow (Airy 1838), by what the reference tables say of it.
#[test]
fn the_peak_nears_the_ray_as_drops_grow() {
    let mut before = f64::INFINITY;
    for radius_um in [10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1500.0] {
        let told = ask(Asked { drop_radius_um: Some(radius_um), wavelength_um: Some(0.55), ..sun(20.0) });
        let inside_deg = told.bows[0].radius_deg - told.bows[0].brightest_deg.unwrap();
        assert!(inside_deg < before && inside_deg > 0.0, "{radius_um} um: {inside_deg}");
        before = inside_deg;
    }
    assert!(before < 0.3);
}

/// In rain under the Sun's disc the degree of polarisation at the peaks is near 91 % and 75 % in one wavelength.
#[test]
fn bows_are_polarised_along_the_tangent() {
    let told = ask(Asked { wavelength_um: Some(0.55), ..sun(20.0) });
    let [primary, secondary] = [0, 1].map(|bow: usize| told.bows[bow].degree_of_polarisation.unwrap());
    assert!((primary - 0.91).abs() < 0.015 && (secondary - 0.75).abs() < 0.02, "{primary} {secondary}");
    assert!(told.polariser.along_passes > 0.94 && told.polariser.across_passes < 0.06);
    // Sun on the horizon: half a circle, whose feet stand upright. Higher: they lean toward each other.
    let feet = |elevation_deg: f64| {
        let polariser = ask(sun(elevation_deg)).polariser;
        (polariser.left_foot_axis_deg, polariser.right_foot_axis_deg)
    };
    assert_eq!(feet(0.0), (Some(90.0), Some(90.0)));
    let (left, right) = feet(30.0);
    assert!((left.unwrap() + right.unwrap() - 180.0).abs() < 0.11 && left.unwrap() < 50.0);
    assert_eq!(feet(45.0), (None, None));
}

#[test]
fn the_secondary_is_weaker_and_turned_round() {
    let told = ask(sun(20.0));
    assert!(told.bows[1].contrast > 0.02 && told.bows[1].contrast < 0.25 * told.bows[0].contrast);
    let colours = told.across.colours().unwrap();
    let reddest = |from: usize, to: usize| {
        (from..to).max_by(|a, b| {
            let red = |index: usize| colours.linear_srgb[index][0] - colours.linear_srgb[index][2];
            red(*a).total_cmp(&red(*b))
        })
    };
    let angle = |index: usize| told.across.angle_deg[index];
    // Red stands outside in the primary, inside in the secondary.
    let (primary, secondary) = (angle(reddest(180, 300).unwrap()), angle(reddest(380, 500).unwrap()));
    assert!(primary > told.bows[0].brightest_deg.unwrap() && secondary < told.bows[1].brightest_deg.unwrap());
    // Alexander's band is the darkest place.
    let least = (0..601).min_by(|a, b| colours.luminance_cd_m2[*a].total_cmp(&colours.luminance_cd_m2[*b])).unwrap();
    assert!((43.0..50.5).contains(&angle(least)));
}

/// How far colours across the bow are from the grey of the scene: greatest spread of the parts over the light added.
fn colourfulness(told: &LightAnswer) -> f64 {
    let colours = told.across.colours().unwrap();
    let dark = colours.linear_srgb[300];
    let peak = colours.luminance_cd_m2.iter().copied().fold(0.0, f64::max) - colours.luminance_cd_m2[300];
    let spread = |linear: &[f64; 3]| {
        let added: [f64; 3] = std::array::from_fn(|part| (linear[part] - dark[part]) * colours.white_cd_m2);
        let blue_of_sun = told.sunlight_srgb[2].max(0.2);
        (added[0] - added[2] / blue_of_sun).abs() / peak
    };
    colours.linear_srgb.iter().map(spread).fold(0.0, f64::max)
}

#[test]
fn the_fog_bow_is_broad_and_nearly_white() {
    let rain = ask(sun(20.0));
    for fog in [Fog::Radiation, Fog::Advection] {
        let told = ask(Asked { fog: Some(fog), ..sun(20.0) });
        assert!(told.bows[0].width_deg.unwrap() > 4.0, "{fog:?}: {:?}", told.bows[0]);
        assert!(colourfulness(&told) < 0.6 * colourfulness(&rain), "{} {}", colourfulness(&told), colourfulness(&rain));
        assert!(told.expect.contains("nearly white"), "{}", told.expect);
    }
    assert!(rain.bows[0].width_deg.unwrap() < 2.0);
}

#[test]
fn the_bow_of_sunset_is_red() {
    let at = |elevation_deg: f64| {
        let told = ask(sun(elevation_deg));
        let colours = told.across.colours().unwrap();
        let sum = |part: usize| -> f64 {
            (180..260).map(|index| (colours.linear_srgb[index][part] - colours.linear_srgb[300][part]).max(0.0)).sum()
        };
        (sum(1) / sum(0), sum(2) / sum(0), told.expect)
    };
    let (green_low, blue_low, words) = at(0.5);
    let (green_high, blue_high, _) = at(25.0);
    assert!(green_low < 0.25 && blue_low < 0.05, "{green_low} {blue_low}");
    assert!(green_high > 0.6 && blue_high > 0.4, "{green_high} {blue_high}");
    assert!(words.contains("red"), "{words}");
}

#[test]
fn supernumeraries_need_equal_drops() {
    let equal = ask(Asked { drop_radius_um: Some(250.0), ..sun(20.0) });
    assert!(equal.supernumeraries >= 2, "{}", equal.supernumeraries);
    assert_eq!(ask(sun(20.0)).supernumeraries, 0);
}

#[test]
fn sea_spray_makes_a_smaller_primary_and_a_larger_secondary() {
    let (fresh, sea) = (ask(sun(20.0)), ask(Asked { water: Some(Water::Sea), ..sun(20.0) }));
    assert!((fresh.bows[0].radius_deg - sea.bows[0].radius_deg - 0.95).abs() < 0.05);
    assert!((sea.bows[1].radius_deg - fresh.bows[1].radius_deg - 1.7).abs() < 0.05);
}

/// White light is the sum of 22 curves, of fewer sizes for small drops: held against one every 6 nm, of all sizes.
#[test]
fn white_light_is_summed_finely_enough() {
    for drops in [
        Drops::Rain { mm_h: 0.5 },
        Drops::Rain { mm_h: 20.0 },
        Drops::Equal { radius_um: 300.0 },
        Drops::Equal { radius_um: 40.0 },
        Drops::Gamma { effective_radius_um: 20.0, effective_variance: 1.0 / 6.0 },
    ] {
        let beam = Beam::new(10.0, 0.1);
        let coarse = Curves::new(drops, Water::Fresh, 10.0).unwrap().seen(&beam);
        let scatterer = Scatterer::new(drops, Light::OneWavelength);
        let mut fine = vec![[0.0; 3]; FINE.count];
        for here in SPECTRUM[20..=360].iter().step_by(6) {
            let n = Water::Fresh.index_in_air(here.wavelength_um, 10.0);
            let curve = scatterer.under_the_sun(here.wavelength_um, n).unwrap();
            let power = 6.0 * colour::LUMENS_PER_WATT * here.sunlight_w_m2_nm * beam.transmittance(here.wavelength_um);
            for (sum, at) in fine.iter_mut().zip(&curve) {
                *sum = std::array::from_fn(|axis| sum[axis] + power * here.matching[axis] * at.mean());
            }
        }
        let greatest = fine.iter().map(|xyz| xyz[1]).fold(0.0, f64::max);
        let mut worst = 0.0_f64;
        for (coarse, fine) in coarse.iter().zip(&fine) {
            for (coarse, fine) in coarse.xyz.iter().zip(fine) {
                worst = worst.max((coarse - fine).abs() / greatest);
            }
        }
        println!("{drops:?}: white light within {worst:.4} of its greatest");
        let allowed = if matches!(drops, Drops::Gamma { .. }) { 0.03 } else { 0.012 };
        assert!(worst < allowed, "{drops:?}: {worst}");
    }
}

/// The outlook's short way against the whole answer.
#[test]
fn prominence_agrees_with_the_answer() {
    let mut worst = 0.0_f64;
    for rain_mm_h in [0.13, 0.7, 3.3, 12.0, 47.0] {
        for elevation_deg in [-0.4, 0.3, 2.2, 9.7, 24.4, 40.1] {
            for optical_depth in [0.02, 0.6, 4.0] {
                let asked =
                    Asked { rain_mm_h: Some(rain_mm_h), lit_optical_depth: Some(optical_depth), ..sun(elevation_deg) };
                let long = ask(asked).bows[0].contrast;
                let short = prominence(rain_mm_h, View::all_lit(optical_depth), elevation_deg);
                // The answer is rounded to 1e-4.
                worst = worst.max(((short - long).abs() - 5e-5) / long);
            }
        }
    }
    println!("prominence within {worst:.4} of the answer");
    assert!(worst < 0.01, "{worst}");
}

#[test]
fn prominence_has_its_limits() {
    let view = View::all_lit(1.0);
    assert!(prominence(0.0, view, 20.0) == 0.0 && prominence(f64::NAN, view, 20.0) == 0.0);
    assert!(prominence(5.0, View { lit: 0.0, optical_depth: 1.0 }, 20.0) == 0.0);
    // Less lit rain, less bow; rain in front that is not lit adds nothing.
    assert!(prominence(5.0, View { lit: 0.2, optical_depth: 1.0 }, 20.0) < prominence(5.0, view, 20.0));
    assert!(prominence(1e9, view, 1e9).is_finite() && prominence(1e-9, view, -90.0).is_finite());
}

#[test]
fn bad_questions_are_refused_with_the_bound() {
    let bad = [f64::NAN, f64::INFINITY, -1.0, -1e300, 1e300];
    for value in bad {
        let asked = Asked {
            sun_elevation_deg: Some(value),
            drop_radius_um: Some(value),
            aerosol_optical_depth: Some(value),
            lit_optical_depth: Some(value),
            wavelength_um: Some(value),
            water_temperature_c: Some(value),
            ..Asked::default()
        };
        let refused = asked.check().unwrap_err();
        let fields: Vec<&str> = refused.iter().map(|refused| refused.field).collect();
        for field in [
            "sun_elevation_deg",
            "drop_radius_um",
            "aerosol_optical_depth",
            "lit_optical_depth",
            "wavelength_um",
            "water_temperature_c",
        ] {
            assert!(fields.contains(&field), "{value}: {fields:?}");
        }
        assert!(refused.iter().all(|refused| refused.detail.contains("between")), "{refused:?}");
    }
    for zero in [Asked { rain_mm_h: Some(0.0), ..sun(9.0) }, Asked { drop_radius_um: Some(0.0), ..sun(9.0) }] {
        assert_eq!(zero.check().unwrap_err().len(), 1);
    }
    let two = Asked { rain_mm_h: Some(1.0), fog: Some(Fog::Drizzle), ..sun(9.0) };
    let refused = two.check().unwrap_err().remove(0);
    assert!(refused.field == "fog" && refused.detail.contains("only one"), "{refused:?}");
    assert_eq!(Asked::default().check().unwrap_err()[0].field, "sun_elevation_deg");
    let sea = Asked { water: Some(Water::Sea), water_temperature_c: Some(35.0), ..sun(9.0) };
    assert!(sea.check().unwrap_err()[0].detail.contains("between 0 and 30"));
}

fn within(range: bounds::Range) -> impl Strategy<Value = f64> {
    prop_oneof![8 => range.min..=range.max, 1 => Just(range.min), 1 => Just(range.max)]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn every_good_question_has_a_sound_answer(
        sun_elevation_deg in within(bounds::SUN_ELEVATION),
        kind in 0..4,
        rain_mm_h in within(bounds::RAIN),
        drop_radius_um in within(bounds::DROP_RADIUS),
        aerosol in within(bounds::AEROSOL_OPTICAL_DEPTH),
        lit in within(bounds::LIT_OPTICAL_DEPTH),
        wavelength_um in proptest::option::of(within(bounds::WAVELENGTH)),
        sea: bool,
    ) {
        let told = ask(Asked {
            sun_elevation_deg: Some(sun_elevation_deg),
            rain_mm_h: (kind == 0).then_some(rain_mm_h),
            drop_radius_um: (kind == 1).then_some(drop_radius_um),
            fog: [None, None, Some(Fog::Radiation), Some(Fog::Drizzle)][kind as usize],
            water: Some(if sea { Water::Sea } else { Water::Fresh }),
            aerosol_optical_depth: Some(aerosol),
            lit_optical_depth: Some(lit),
            wavelength_um: wavelength_um.map(|um| if sea { um.clamp(0.4, 0.7) } else { um }),
            ..Asked::default()
        });
        prop_assert_eq!(told.across.angle_deg.len(), 601);
        prop_assert!(told.across.degree_of_polarisation.iter().all(|degree| (-1.0..=1.0).contains(degree)));
        match (told.across.colours(), told.across.phase_function()) {
            (Some(colours), None) => {
                prop_assert!(colours.luminance_cd_m2.iter().all(|luminance| luminance.is_finite() && *luminance >= 0.0));
                prop_assert!(colours.srgb.iter().flatten().all(|part| (0.0..=1.0).contains(part)));
                prop_assert!(colours.linear_srgb.iter().flatten().all(|part| *part <= 1.0));
            }
            (None, Some(phase)) => prop_assert!(phase.iter().all(|phase| phase.is_finite() && *phase > 0.0)),
            _ => prop_assert!(false, "one of the two"),
        }
        for bow in &told.bows {
            prop_assert!(bow.contrast.is_finite() && bow.contrast >= 0.0);
        }
        prop_assert!(!told.expect.is_empty());
    }
}
