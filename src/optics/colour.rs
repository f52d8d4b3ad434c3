//! From spectrum to colour: the CIE 1931 standard observer of 2°, and sRGB (IEC 61966-2-1).

use std::sync::LazyLock;

use palette::convert::FromColorUnclamped;
use palette::white_point::D65;
use palette::{LinSrgb, Srgb, Xyz};

/// Luminous efficacy at 555 nm, lm/W.
pub const LUMENS_PER_WATT: f64 = 683.002;

/// One nanometre of the visible spectrum.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Nanometre {
    /// Wavelength, µm.
    pub wavelength_um: f64,
    /// Colour matching functions x, y, z of the CIE 1931 observer (CIE 018:2019).
    pub matching: [f64; 3],
    /// Sunlight above the air, W/m² and nm (ASTM G173-03).
    pub sunlight_w_m2_nm: f64,
}

/// 360 to 830 nm, from `data/observer_and_sun.csv`.
pub static SPECTRUM: LazyLock<Vec<Nanometre>> =
    LazyLock::new(|| include_str!("data/observer_and_sun.csv").lines().skip(1).filter_map(read).collect());

fn read(line: &str) -> Option<Nanometre> {
    let mut numbers = line.split(',').map_while(|number| number.parse::<f64>().ok());
    let mut next = || numbers.next();
    let wavelength_um = next()? / 1000.0;
    Some(Nanometre { wavelength_um, matching: [next()?, next()?, next()?], sunlight_w_m2_nm: next()? })
}

/// Tristimulus values of a spectrum given per nanometre, as sums over 360 to 830 nm.
pub fn xyz(spectrum: impl Fn(&Nanometre) -> f64) -> [f64; 3] {
    SPECTRUM.iter().fold([0.0; 3], |sum, here| {
        let power = spectrum(here);
        std::array::from_fn(|axis| sum[axis] + power * here.matching[axis])
    })
}

/// Tristimulus values of sunlight through something of the given transmittance, Y in lux (or cd/m² if so scaled).
pub fn xyz_of_sunlight(transmittance: impl Fn(f64) -> f64) -> [f64; 3] {
    xyz(|here| LUMENS_PER_WATT * here.sunlight_w_m2_nm * transmittance(here.wavelength_um))
}

/// Chromaticity x, y.
pub fn chromaticity([x, y, z]: [f64; 3]) -> [f64; 2] {
    [x / (x + y + z), y / (x + y + z)]
}

/// Linear sRGB; components may leave 0 to 1, and below 0 the colour lies outside what a screen shows.
pub fn linear_srgb([x, y, z]: [f64; 3]) -> [f64; 3] {
    let colour = LinSrgb::<f64>::from_color_unclamped(Xyz::<D65, f64>::new(x, y, z));
    [colour.red, colour.green, colour.blue]
}

/// Encoded sRGB of a linear colour of 0 to 1.
pub fn encode([red, green, blue]: [f64; 3]) -> [f64; 3] {
    let colour = Srgb::<f64>::from_linear(LinSrgb::new(red, green, blue));
    [colour.red, colour.green, colour.blue]
}

/// What a screen can show of a linear colour: mixed with grey of its own luminance until no component is below 0, so that
/// brightness and hue stay and only saturation gives way; then cut at 1.
pub fn shown(linear: [f64; 3]) -> [f64; 3] {
    let [red, green, blue] = linear;
    let luminance = (0.212_6 * red + 0.715_2 * green + 0.072_2 * blue).max(0.0);
    let least = red.min(green).min(blue);
    let kept = if least < 0.0 { luminance / (luminance - least) } else { 1.0 };
    linear.map(|component| (luminance + kept * (component - luminance)).clamp(0.0, 1.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_table_is_whole() {
        assert_eq!(SPECTRUM.len(), 471);
        assert!(SPECTRUM.windows(2).all(|pair| (pair[1].wavelength_um - pair[0].wavelength_um - 0.001).abs() < 1e-9));
    }

    #[test]
    fn what_is_out_of_gamut_keeps_its_brightness() {
        let luminance = |[red, green, blue]: [f64; 3]| 0.212_6 * red + 0.715_2 * green + 0.072_2 * blue;
        for linear in [[0.6, 0.3, -0.1], [-0.2, 0.5, 0.1], [0.2, -0.02, 0.9]] {
            let shown = shown(linear);
            assert!(shown.iter().all(|component| (0.0..=1.0).contains(component)), "{shown:?}");
            assert!((luminance(shown) - luminance(linear)).abs() < 1e-12);
        }
        let near = |shown: [f64; 3], wanted: [f64; 3]| shown.iter().zip(wanted).all(|(a, b)| (a - b).abs() < 1e-12);
        assert!(near(shown([0.2, 0.4, 0.6]), [0.2, 0.4, 0.6]) && near(shown([-1.0, -1.0, -1.0]), [0.0; 3]));
    }
}
