//! Water, rays and drops against every row of their tables.

use rainward::optics::air;
use rainward::optics::drops::{self, MarshallPalmer};
use rainward::optics::ray::{self, Ray};
use rainward::optics::water::{self, Water};
use serde_json::json;

use crate::table::{Row, check};

#[test]
fn index_of_water_check_values() {
    check("water_index", "Refractive index of water, check values", |row| {
        let wavelength_um = row.number("wavelength_um");
        let n = water::index_by_density(wavelength_um, row.number("temperature_k"), row.number("density_kg_m3"));
        json!({ "n": n, "n_relative_to_air": n / air::index(wavelength_um) })
    });
}

#[test]
fn index_of_fresh_water() {
    check("water_index", "Refractive index of fresh water at 1 atm", |row| {
        let (wavelength_um, temperature_c) = (row.number("wavelength_um"), row.number("temperature_c"));
        json!({
            "n": water::fresh_index(wavelength_um, temperature_c),
            "n_relative_to_air": Water::Fresh.index_in_air(wavelength_um, temperature_c),
            "density_kg_m3": water::density_kg_m3(temperature_c),
            "n_air": air::index(wavelength_um),
        })
    });
}

/// The note of the table allows any density that keeps within this of IAPWS-95.
#[test]
fn density_of_fresh_water() {
    for row in crate::table::rows("water_index", "Refractive index of fresh water at 1 atm") {
        let temperature_c = row.number("temperature_c");
        let apart = water::density_kg_m3(temperature_c) - row.expected_number("density_kg_m3");
        assert!(apart.abs() < 0.006, "{apart} kg/m3 off at {temperature_c} C");
    }
}

#[test]
fn index_of_sea_water() {
    check("water_index", "Refractive index of sea water", |row| {
        let wavelength_um = row.number("wavelength_nm") / 1000.0;
        let n = water::sea_index(wavelength_um, row.number("temperature_c"), row.number("salinity_g_kg"));
        json!({ "n_relative_to_air": n })
    });
}

fn stationary(row: &Row) -> serde_json::Value {
    let ray = Ray::stationary(row.number("n"), row.number("order") as u32).expect("a bow");
    json!({
        "incidence_deg": ray.incidence_deg,
        "refraction_deg": ray.refraction_deg,
        "deviation_deg": ray.deviation_deg,
        "impact_parameter": ray.impact_parameter,
        "scattering_angle_deg": ray.scattering_angle_deg(),
        "radius_deg": ray.radius_deg(),
        "centre": match ray.centre() { ray::Centre::AntisolarPoint => "antisolar point", ray::Centre::Sun => "sun" },
    })
}

#[test]
fn stationary_rays() {
    for order in 1..=4 {
        check("bow_angles", &format!("Bow of order {order}, ray of stationary deviation"), stationary);
    }
    check("bow_angles", "Bow of higher order", stationary);
    check("bow_angles", "Bow radii of the classics", stationary);
}

#[test]
fn radius_in_rain() {
    check("bow_angles", "Bow radius in rain by wavelength and temperature", |row| {
        let (wavelength_um, temperature_c) = (row.number("wavelength_um"), row.number("temperature_c"));
        let order = row.number("order") as u32;
        let n = Water::Fresh.index_in_air(wavelength_um, temperature_c);
        let ray = Ray::stationary(n, order).expect("a bow");
        json!({
            "n_relative_to_air": n,
            "radius_deg": ray.radius_deg(),
            "radius_with_vacuum_index_deg": ray::radius_deg(water::fresh_index(wavelength_um, temperature_c), order),
            "centre": match ray.centre() { ray::Centre::AntisolarPoint => "antisolar point", ray::Centre::Sun => "sun" },
        })
    });
}

#[test]
fn radius_in_sea_spray() {
    check("bow_angles", "Bow radius in sea spray by wavelength and temperature (35 g/kg)", |row| {
        let n = Water::Sea.index_in_air(row.number("wavelength_um"), row.number("temperature_c"));
        json!({ "n_relative_to_air": n, "radius_deg": ray::radius_deg(n, row.number("order") as u32) })
    });
}

#[test]
fn marshall_palmer_rain() {
    check("drops", "Marshall-Palmer rain", |row| {
        let rain = MarshallPalmer::new(row.number("rain_mm_h"));
        json!({
            "slope_per_mm": rain.slope_per_mm,
            "extinction_per_km": rain.extinction_per_km(),
            "drops_per_m3": rain.drops_per_m3(),
            "water_g_m3": rain.water_g_m3(),
            "median_volume_diameter_mm": rain.median_volume_diameter_mm(),
            "mean_diameter_mm": rain.mean_diameter_mm(),
            "area_weighted_diameter_mm": rain.area_weighted_diameter_mm(),
            "volume_weighted_diameter_mm": rain.volume_weighted_diameter_mm(),
            "reflectivity_mm6_m3": rain.reflectivity_mm6_m3(),
            "koschmieder_range_km": rain.visual_range_km(drops::VISUAL_RANGE_CONTRAST),
            "meteorological_optical_range_km": rain.visual_range_km(0.05),
        })
    });
    check("drops", "Marshall-Palmer water content law", |row| {
        let rain = MarshallPalmer::new(row.number("rain_mm_h"));
        json!({ "water_g_m3": rain.water_g_m3(), "reflectivity_mm6_m3": rain.reflectivity_mm6_m3() })
    });
}

#[test]
fn marshall_palmer_rain_of_limited_diameters() {
    check("drops", "Marshall-Palmer rain, diameters limited", |row| {
        let rain = MarshallPalmer::new(row.number("rain_mm_h"));
        let (from, to) = (row.number("diameter_from_mm"), row.number("diameter_to_mm"));
        // Midpoints: the integrands are smooth but for the kink where the fall speed starts.
        let steps = 200_000;
        let width = (to - from) / f64::from(steps);
        let integral = |weight: &dyn Fn(f64) -> f64| -> f64 {
            let diameters = (0..steps).map(|step| from + (f64::from(step) + 0.5) * width);
            diameters.map(|diameter| weight(diameter) * rain.density_m3_mm(diameter) * width).sum()
        };
        let volume = |diameter: f64| std::f64::consts::PI / 6.0 * diameter.powi(3);
        json!({
            "extinction_per_km": 1e-3 * std::f64::consts::FRAC_PI_2 * integral(&|diameter| diameter * diameter),
            "water_g_m3": 1e-3 * integral(&volume),
            "rain_from_drops_mm_h": 3.6e-3 * integral(&|diameter| volume(diameter) * drops::fall_speed_m_s(diameter)),
        })
    });
}

#[test]
fn visual_range_in_rain() {
    check("drops", "Visual range in rain, empirical", |row| {
        let visual_range_km = drops::visual_range_atlas_km(row.number("rain_mm_h"));
        let extinction = drops::extinction_from_range_per_km(visual_range_km, drops::VISUAL_RANGE_CONTRAST);
        json!({ "visual_range_km": visual_range_km, "extinction_per_km": extinction })
    });
    check("air", "Extinction from visual range", |row| {
        let extinction = drops::extinction_from_range_per_km(row.number("range_km"), row.number("contrast_threshold"));
        json!({ "extinction_per_km": extinction })
    });
}

/// The closed form and the measured law agree within the scatter that Ulbrich and Atlas (1985) found.
#[test]
fn extinction_agrees_with_what_was_measured() {
    let scatter = &crate::table::rows("drops", "Scatter of rain rate from optical extinction")[0];
    for row in crate::table::rows("drops", "Visual range in rain, empirical") {
        let ratio = drops::rain_extinction_per_km(row.number("rain_mm_h")) / row.expected_number("extinction_per_km");
        assert!((ratio - 1.0).abs() < scatter.expected_number("mean_deviation"), "{ratio}");
    }
}
