//! Refractive index of air.

/// Refractive index of standard dry air relative to vacuum: 15 °C, 101 325 Pa, 450 ppm carbon dioxide.
///
/// Ciddor (1996), Applied Optics 35, 1566, eq. 1, for 0.3 to 1.7 µm; good to about 1e-8 for that air. Real air at the
/// ground departs from it by at most some 3e-5, which moves a primary bow by less than 0.005°.
pub fn index(wavelength_um: f64) -> f64 {
    let wavenumber2 = wavelength_um.powi(-2);
    1.0 + 1e-8 * (5_792_105.0 / (238.0185 - wavenumber2) + 167_917.0 / (57.362 - wavenumber2))
}
