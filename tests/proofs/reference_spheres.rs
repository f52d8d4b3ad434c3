//! Fresnel's laws, Airy's theory and the exact solution for spheres against every row of their tables.

use num_complex::Complex;
use rainward::optics::airy::{self, AiryBow};
use rainward::optics::debye;
use rainward::optics::fresnel;
use rainward::optics::mie::{BadSphere, Sphere};
use rainward::optics::partial::PartialWaves;
use rainward::optics::ray::Ray;
use serde_json::{Value, json};

use crate::table::{Row, check, rows};

#[test]
fn light_of_each_order() {
    let compute = |row: &Row| {
        let n = row.number("n");
        let ray = Ray::stationary(n, row.number("order") as u32).expect("a bow");
        let reflectance = fresnel::reflectance(n, ray.incidence_deg);
        let weight = fresnel::weight(&ray);
        json!({
            "reflectance_s": reflectance.s,
            "reflectance_p": reflectance.p,
            "weight_s": weight.s,
            "weight_p": weight.p,
            "weight_unpolarised": weight.mean(),
            "degree_of_polarisation": weight.degree(),
            "tangential_share": weight.tangential_share(),
            "internal_brewster_deg": fresnel::internal_brewster_deg(n),
            "refraction_deg": ray.refraction_deg,
        })
    };
    for order in 1..=3 {
        check("fresnel", &format!("Light of order {order} after Fresnel's laws"), compute);
    }
    check("fresnel", "Polarisation of the bows, textbook", compute);
}

#[test]
fn reflectance_of_a_surface() {
    check("fresnel", "Reflectance of a water surface", |row| {
        let reflectance = fresnel::reflectance(row.number("n"), row.number("incidence_deg"));
        json!({ "reflectance_s": reflectance.s, "reflectance_p": reflectance.p })
    });
}

fn sphere(row: &Row) -> Sphere {
    let kappa = if row.has("kappa") { row.number("kappa") } else { 0.0 };
    Sphere::new(row.number("size_parameter"), Complex::new(row.number("n"), -kappa)).expect("a sphere")
}

#[test]
fn efficiencies() {
    let compute = |row: &Row| {
        let sphere = sphere(row);
        json!({ "q_ext": sphere.q_ext, "q_sca": sphere.q_sca, "g": sphere.asymmetry, "q_back": sphere.q_back() })
    };
    check("mie", "Efficiencies of a sphere", compute);
    check("mie", "Efficiencies of a water sphere", compute);
}

#[test]
fn amplitudes() {
    check("mie", "Scattering amplitudes of a sphere", |row| {
        let cosine = row.number("angle_deg").to_radians().cos();
        let (s1, s2) = sphere(row).waves.amplitudes(&[cosine])[0];
        json!({
            "s1_re": s1.re, "s1_im": s1.im, "s2_re": s2.re, "s2_im": s2.im, "i1": s1.norm_sqr(), "i2": s2.norm_sqr(),
        })
    });
}

#[test]
fn intensities_near_the_bows() {
    for bow in ["primary", "secondary"] {
        check("mie", &format!("Angular intensities near the {bow} bow, single drop"), |row| {
            let sphere = sphere(row);
            let cosines: Vec<f64> = row.numbers("angle_deg").iter().map(|angle| angle.to_radians().cos()).collect();
            let intensities = sphere.waves.intensities(&cosines);
            json!({
                "i1": intensities.iter().map(|intensity| intensity.s).collect::<Vec<_>>(),
                "i2": intensities.iter().map(|intensity| intensity.p).collect::<Vec<_>>(),
                "q_ext": sphere.q_ext,
                "g": sphere.asymmetry,
            })
        });
    }
}

/// Scattering angle near `guess_deg` at which |S1|² is greatest, on ever finer grids.
fn peak_near(waves: &PartialWaves, guess_deg: f64, reach_deg: f64) -> f64 {
    let (mut centre, mut reach) = (guess_deg, reach_deg);
    while reach > 1e-5 {
        let angles: Vec<f64> = (-16..=16).map(|step| centre + reach * f64::from(step) / 16.0).collect();
        let cosines: Vec<f64> = angles.iter().map(|angle| angle.to_radians().cos()).collect();
        let intensities = waves.intensities(&cosines);
        let brightest = (0..angles.len()).max_by(|a, b| intensities[*a].s.total_cmp(&intensities[*b].s));
        centre = angles[brightest.expect("some angles")];
        reach /= 6.0;
    }
    centre
}

/// The light of one order alone, exactly, and Airy's figures beside it.
#[test]
fn peaks_of_one_order() {
    for (bow, order) in [("primary", 1), ("secondary", 2)] {
        check("mie", &format!("Peaks of the {bow} bow of one drop, light of that order alone"), |row| {
            let (x, n) = (row.number("size_parameter"), row.number("n"));
            let waves = debye::order_alone(x, n, order).expect("a sphere");
            let airy = AiryBow::new(x, n, order).expect("a bow");
            let exactly = |angle: f64| waves.intensities(&[angle.to_radians().cos()])[0];
            let mut computed = json!({ "descartes_radius_deg": airy.ray.radius_deg() });
            let unit_deg = (airy.maximum_deg(0).unwrap() - airy.ray.scattering_angle_deg()).abs() / airy::MAXIMA[0];
            for (number, name) in ["main", "supernumerary_1", "supernumerary_2"].into_iter().enumerate() {
                let guess_deg = airy.maximum_deg(number).unwrap();
                let peak_deg = peak_near(&waves, guess_deg, 0.55 * unit_deg);
                computed[format!("{name}_radius_deg")] = Value::from(180.0 - peak_deg);
                computed[format!("airy_{name}_radius_deg")] = json!(airy.maximum_radius_deg(number));
                if number == 0 {
                    computed["main_over_airy_peak"] = json!(exactly(peak_deg).s / airy.intensity(guess_deg).s);
                    computed["degree_of_polarisation_at_main"] = json!(exactly(peak_deg).degree());
                }
            }
            computed
        });
    }
}

/// Light of all orders adds up to the whole: reflected and refracted at the surface alone, and the bows.
#[test]
fn the_order_alone_is_most_of_the_light_near_its_bow() {
    for row in rows("mie", "Peaks of the primary bow of one drop, light of that order alone") {
        let (x, n) = (row.number("size_parameter"), row.number("n"));
        if !(1000.0..=3000.0).contains(&x) {
            continue;
        }
        let angles: Vec<f64> = (0..2000).map(|step| 137.5 + f64::from(step) * 0.001).collect();
        let cosines: Vec<f64> = angles.iter().map(|angle| angle.to_radians().cos()).collect();
        let mean =
            |waves: &PartialWaves| waves.intensities(&cosines).iter().map(|intensity| intensity.mean()).sum::<f64>();
        let whole = mean(&Sphere::new(x, n.into()).unwrap().waves);
        let alone = mean(&debye::order_alone(x, n, 1).unwrap());
        assert!((whole / alone - 1.0).abs() < 0.06, "x = {x}: {}", whole / alone);
    }
}

#[test]
fn energy_is_kept() {
    for (x, n) in [(0.01, 1.33), (1.0, 1.33), (25.0, 1.5), (300.0, 1.335), (5000.0, 1.34), (20_000.0, 1.33)] {
        let sphere = Sphere::new(x, Complex::new(n, 0.0)).unwrap();
        let albedo = sphere.q_sca / sphere.q_ext;
        assert!((albedo - 1.0).abs() < 1e-6, "albedo {albedo} at x = {x}");
    }
    // The phase function's mean over all directions is 1.
    for x in [0.5, 10.0, 150.0] {
        let sphere = Sphere::new(x, Complex::new(1.335, 0.0)).unwrap();
        let steps = 4000;
        let angles = (0..steps).map(|step| (f64::from(step) + 0.5) / f64::from(steps) * std::f64::consts::PI);
        let cosines: Vec<f64> = angles.clone().map(f64::cos).collect();
        let intensities = sphere.waves.intensities(&cosines);
        let sum: f64 = intensities.iter().zip(angles).map(|(intensity, angle)| intensity.mean() * angle.sin()).sum();
        let mean = 2.0 * sum * std::f64::consts::PI / f64::from(steps) / (x * x * sphere.q_sca);
        assert!((mean - 1.0).abs() < 5e-4, "mean phase function {mean} at x = {x}");
    }
    // Large spheres take twice their cross-section, in the limit.
    for x in [300.0_f64, 1000.0, 10_000.0, 50_000.0] {
        let q_ext = Sphere::new(x, Complex::new(1.335, 0.0)).unwrap().q_ext;
        assert!(q_ext > 2.0 && q_ext < 2.0 + 4.0 * x.powf(-2.0 / 3.0), "{q_ext} at x = {x}");
    }
}

/// At whole multiples of π the first of the radial functions vanishes: no recurrence may lean on it.
#[test]
fn no_size_is_singular() {
    for multiple in 1..400 {
        let x = f64::from(multiple) * std::f64::consts::PI;
        let q_ext = |x: f64| Sphere::new(x, Complex::new(1.335, 0.0)).unwrap().q_ext;
        let (at, beside) = (q_ext(x), q_ext(x * (1.0 + 1e-9)));
        assert!((at / beside - 1.0).abs() < 1e-4, "x = {multiple} pi: {at} beside {beside}");
    }
}

/// Near a sharp resonance, at a whole multiple of π and for a drop of a millimetre, by sums in 50 digits (mpmath 1.4.1).
#[test]
fn amplitudes_to_fifty_digits() {
    let cases: [(f64, f64, f64, [f64; 4]); 3] = [
        (
            1_430.238_093_978_642_2,
            1.239_797_384_179_386_1,
            140.0,
            [-245.519_368_021_043, 326.642_826_521_578, 71.634_535_732_360_7, 162.505_673_811_008],
        ),
        (
            1_068.141_502_220_529_7,
            1.335_03,
            134.0,
            [-45.752_360_458_488_4, -160.052_357_989_26, 12.529_964_342_86, 11.961_041_570_101_9],
        ),
        (
            9_999.5,
            1.335,
            138.0,
            [2_779.854_614_401_87, 1_442.336_289_831_14, 607.055_241_950_046, -507.704_793_777_715],
        ),
    ];
    for (x, n, angle_deg, expected) in cases {
        let sphere = Sphere::new(x, Complex::new(n, 0.0)).unwrap();
        let (s1, s2) = sphere.waves.amplitudes(&[angle_deg.to_radians().cos()])[0];
        for (got, expected) in [s1.re, s1.im, s2.re, s2.im].into_iter().zip(expected) {
            assert!((got - expected).abs() < 1e-6 * s1.norm(), "x = {x}: {got} instead of {expected}");
        }
    }
}

#[test]
fn absurd_spheres_are_refused() {
    for x in [f64::NAN, -1.0, 0.0, 1e9, f64::INFINITY] {
        assert!(matches!(Sphere::new(x, Complex::new(1.33, 0.0)), Err(BadSphere::Size(_))), "{x}");
        assert!(debye::order_alone(x, 1.33, 1).is_err() && AiryBow::new(x, 1.33, 0).is_none(), "{x}");
    }
    for index in [Complex::new(f64::NAN, 0.0), Complex::new(0.0, 0.0), Complex::new(1.3, 1.0), Complex::new(99.0, 0.0)]
    {
        let refused = Sphere::new(10.0, index).unwrap_err();
        assert!(refused.to_string().contains("between 0.1 and 10"), "{refused}");
    }
}
