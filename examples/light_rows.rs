//! Answers questions on light, one JSON object per line in and out, so that other programs can be held against the library.
//!
//! `{"ask": "mie", "x": 100, "n": 1.33, "kappa": 0, "angles_deg": [140]}`, `airy` (`z`), `index` (`wavelength_um`, `temperature_c`),
//! `sea_index` (and `salinity_g_kg`), `colour` (`xyz`), `beam` (`elevation_deg`, `aerosol_optical_depth`), `light` (as `GET /v1/light`),
//! `time_mie` (as `mie`, and `repeat`: seconds for one).

#![allow(clippy::print_stdout, clippy::unwrap_used, reason = "a tool for tests: it ends on bad input")]

use std::hint::black_box;
use std::io::BufRead;
use std::time::Instant;

use num_complex::Complex;
use rainward::optics::beam::Beam;
use rainward::optics::light::asked::Asked;
use rainward::optics::light::{Prepared, answer};
use rainward::optics::mie::Sphere;
use rainward::optics::{air, airy, colour, water};
use serde_json::{Value, json};

fn main() {
    for line in std::io::stdin().lock().lines() {
        let question: Value = serde_json::from_str(&line.unwrap()).unwrap();
        println!("{}", told(&question));
    }
}

fn told(question: &Value) -> Value {
    let number = |key: &str| question[key].as_f64().unwrap();
    let numbers = |key: &str| -> Vec<f64> {
        question[key].as_array().unwrap().iter().map(|item| item.as_f64().unwrap()).collect()
    };
    match question["ask"].as_str().unwrap() {
        "mie" | "time_mie" => {
            let index = Complex::new(number("n"), -question["kappa"].as_f64().unwrap_or(0.0));
            let cosines: Vec<f64> = numbers("angles_deg").iter().map(|angle| angle.to_radians().cos()).collect();
            let solve = || {
                let sphere = Sphere::new(black_box(number("x")), index).unwrap();
                let amplitudes = sphere.waves.amplitudes(&cosines);
                (sphere, amplitudes)
            };
            if let Some(repeat) = question["repeat"].as_u64() {
                let start = Instant::now();
                for _ in 0..repeat {
                    black_box(solve());
                }
                return json!({ "seconds": start.elapsed().as_secs_f64() / repeat as f64 });
            }
            let (sphere, amplitudes) = solve();
            json!({
                "q_ext": sphere.q_ext,
                "q_sca": sphere.q_sca,
                "g": sphere.asymmetry,
                "q_back": sphere.q_back(),
                "s1": amplitudes.iter().map(|(s1, _)| [s1.re, s1.im]).collect::<Vec<_>>(),
                "s2": amplitudes.iter().map(|(_, s2)| [s2.re, s2.im]).collect::<Vec<_>>(),
            })
        }
        "airy" => {
            let (ai, slope) = airy::airy_function(number("z"));
            json!({ "ai": ai, "slope": slope })
        }
        "index" => {
            let (wavelength_um, temperature_c) = (number("wavelength_um"), number("temperature_c"));
            let n = water::fresh_index(wavelength_um, temperature_c);
            json!({ "n": n, "density_kg_m3": water::density_kg_m3(temperature_c), "n_air": air::index(wavelength_um) })
        }
        "colour" => {
            let xyz: [f64; 3] = numbers("xyz").try_into().unwrap();
            let linear = colour::linear_srgb(xyz);
            json!({ "linear_srgb": linear, "srgb": colour::encode(linear.map(|part| part.clamp(0.0, 1.0))) })
        }
        "beam" => json!({ "xyz": Beam::new(number("elevation_deg"), number("aerosol_optical_depth")).xyz() }),
        "light" => {
            let asked = Asked {
                sun_elevation_deg: question["sun_elevation_deg"].as_f64(),
                rain_mm_h: question["rain_mm_h"].as_f64(),
                drop_radius_um: question["drop_radius_um"].as_f64(),
                fog: serde_json::from_value(question["fog"].clone()).unwrap(),
                water: serde_json::from_value(question["water"].clone()).unwrap(),
                water_temperature_c: question["water_temperature_c"].as_f64(),
                aerosol_optical_depth: question["aerosol_optical_depth"].as_f64(),
                lit_optical_depth: question["lit_optical_depth"].as_f64(),
                wavelength_um: question["wavelength_um"].as_f64(),
            };
            let question = asked.check().unwrap();
            let start = Instant::now();
            let prepared = Prepared::new(&question).unwrap();
            let prepare_s = start.elapsed().as_secs_f64();
            let start = Instant::now();
            let told = answer(&question, &prepared);
            let mut told = serde_json::to_value(told).unwrap();
            told["prepare_s"] = json!(prepare_s);
            told["answer_s"] = json!(start.elapsed().as_secs_f64());
            told
        }
        other => json!({ "error": format!("cannot answer {other:?}") }),
    }
}
