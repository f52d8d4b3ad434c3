//! The Sun's beam and its colour against every row of their tables.

use rainward::optics::beam::{self, Beam};
use rainward::optics::colour::{self, SPECTRUM};
use serde_json::{Value, json};

use crate::table::{Row, check};

#[test]
fn clear_air() {
    let air_mass = |row: &Row| json!({ "air_mass": beam::air_mass(row.number("apparent_elevation_deg")) });
    check("air", "Relative optical air mass", air_mass);
    check("air", "Relative optical air mass to three decimals", air_mass);
    check("air", "Rayleigh optical depth, Bodhaine et al.", |row| {
        let depth = beam::rayleigh_optical_depth(row.number("wavelength_um"), row.number("pressure_hpa"));
        json!({ "optical_depth": depth })
    });
    check("air", "Rayleigh optical depth, Hansen and Travis", |row| {
        let depth = beam::rayleigh_optical_depth_hansen_travis(row.number("wavelength_um"), row.number("pressure_hpa"));
        json!({ "optical_depth": depth })
    });
    check("air", "Rayleigh optical depth at 443 nm", |row| {
        let depth = beam::rayleigh_optical_depth_hansen_travis(row.number("wavelength_um"), 1013.25);
        json!({ "optical_depth": depth })
    });
}

#[test]
fn observer_and_sunlight() {
    let at = |row: &Row| SPECTRUM[row.number("wavelength_nm") as usize - 360];
    check("colour", "CIE 1931 colour matching functions, 2 degrees", |row| {
        let [x, y, z] = at(row).matching;
        json!({ "x": x, "y": y, "z": z })
    });
    check("colour", "Colour of monochromatic light", |row| {
        let [x, y] = colour::chromaticity(at(row).matching);
        json!({ "x": x, "y": y, "linear_srgb": colour::linear_srgb(at(row).matching) })
    });
    check("colour", "Reference sunlight by wavelength", |row| {
        let [extraterrestrial, _, direct] = g173(row.number("wavelength_nm") as usize);
        assert!((extraterrestrial - at(row).sunlight_w_m2_nm).abs() < 1e-12, "both tables say the same");
        json!({ "extraterrestrial": extraterrestrial, "direct": direct })
    });
}

/// ASTM G173-03 at a wavelength: extraterrestrial, global, direct.
fn g173(wavelength_nm: usize) -> [f64; 3] {
    let text = include_str!("../reference/astm_g173.csv");
    let line = text.lines().nth(wavelength_nm - 359).expect("a line");
    let numbers: Vec<f64> = line.split(',').map(|number| number.parse().expect("a number")).collect();
    assert!((numbers[0] - wavelength_nm as f64).abs() < 1e-9);
    [numbers[1], numbers[2], numbers[3]]
}

/// All that is asked of a light by its tristimulus values.
fn described(xyz: [f64; 3]) -> Value {
    let [x, y] = colour::chromaticity(xyz);
    let linear = colour::linear_srgb(xyz);
    let greatest = linear.iter().copied().fold(0.0, f64::max);
    let linear = linear.map(|component| component / greatest);
    json!({
        "x": x,
        "y": y,
        "illuminance_lx": xyz[1],
        "linear_srgb": linear,
        "srgb": colour::encode(linear.map(|component| component.max(0.0))),
        "photopic_transmittance": xyz[1] / colour::xyz_of_sunlight(|_| 1.0)[1],
    })
}

#[test]
fn colour_of_sunlight() {
    check("colour", "Colour and illuminance of reference sunlight", |row| {
        let column = match row.text("spectrum") {
            "extraterrestrial" => 0,
            "global" => 1,
            other => panic!("{other}"),
        };
        let sum = colour::xyz(|here| g173((here.wavelength_um * 1000.0).round() as usize)[column]);
        described(sum.map(|value| value * colour::LUMENS_PER_WATT))
    });
    check("colour", "Direct sunlight through clear air, by elevation", |row| {
        let elevation_deg = row.number("apparent_elevation_deg");
        // The rows are without ozone.
        let beam = Beam { ozone_atm_cm: 0.0, turbidity: row.number("angstrom_beta"), ..Beam::new(elevation_deg, 0.0) };
        assert!((beam.air_mass / row.number("air_mass") - 1.0).abs() < 1e-6);
        described(beam.xyz())
    });
}

#[test]
fn black_bodies() {
    check("colour", "Chromaticity of a black body", |row| {
        // Planck (1900), second radiation constant 0.014388 m K.
        let temperature_k = row.number("temperature_k");
        let radiance = |um: f64| um.powi(-5) / ((14_388.0 / (um * temperature_k)).exp() - 1.0);
        let [x, y, z] = colour::xyz(|here| radiance(here.wavelength_um));
        let chromaticity = colour::chromaticity([x, y, z]);
        json!({ "x": chromaticity[0], "y": chromaticity[1], "linear_srgb": colour::linear_srgb([x / y, 1.0, z / y]) })
    });
}

#[test]
fn srgb() {
    check("colour", "XYZ to linear sRGB", |row| {
        let [x, y, z] = row.numbers("xyz")[..] else { panic!("three values") };
        json!({ "linear_srgb": colour::linear_srgb([x, y, z]) })
    });
    check("colour", "sRGB encoding", |row| json!({ "encoded": colour::encode([row.number("linear"), 0.0, 0.0])[0] }));
    check("colour", "White point of sRGB", |_| {
        // The white of equal components: found by inverting the matrix on its columns.
        let columns = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]].map(colour::linear_srgb);
        let white = solve(columns, [1.0, 1.0, 1.0]);
        let [x, y] = colour::chromaticity(white);
        // To the digits that the standard prints.
        json!({ "x": (x * 1e4).round() / 1e4, "y": (y * 1e4).round() / 1e4 })
    });
}

/// Solves columns · unknown = right by Cramer's rule.
fn solve(columns: [[f64; 3]; 3], right: [f64; 3]) -> [f64; 3] {
    let determinant = |[a, b, c]: [[f64; 3]; 3]| {
        a[0] * (b[1] * c[2] - b[2] * c[1]) - a[1] * (b[0] * c[2] - b[2] * c[0]) + a[2] * (b[0] * c[1] - b[1] * c[0])
    };
    std::array::from_fn(|index| {
        let mut replaced = columns;
        replaced[index] = right;
        determinant(replaced) / determinant(columns)
    })
}

/// Low Sun is red, high Sun nearly white; haze and ozone take light away.
#[test]
fn the_beam_behaves() {
    let red_over_blue = |elevation_deg: f64| {
        let [red, _, blue] = colour::linear_srgb(Beam::new(elevation_deg, 0.1).xyz());
        blue / red
    };
    assert!(red_over_blue(1.0) < 0.05 && red_over_blue(10.0) < 0.45 && red_over_blue(60.0) > 0.55);
    for elevation_deg in [-0.5, 0.0, 5.0, 45.0, 90.0] {
        let clear = Beam::new(elevation_deg, 0.0);
        assert!(clear.xyz()[1] > Beam::new(elevation_deg, 0.3).xyz()[1]);
        assert!(Beam { ozone_atm_cm: 0.0, ..clear }.xyz()[1] > clear.xyz()[1]);
    }
}
