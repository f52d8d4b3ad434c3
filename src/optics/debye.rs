//! The light of one order alone, exactly: the term of the series by which Debye (1908) splits the Lorenz-Mie solution.
//!
//! This is the judge of every theory of the bow: it holds the one order, diffraction included, and nothing else.

use num_complex::Complex;

use super::mie::{BadSphere, SIZE_PARAMETER_MAX};
use super::partial::PartialWaves;

/// Partial waves of the light that leaves a sphere of index `n` after `order` inner reflections.
///
/// Each wave is let in, reflected `order` times and let out at the surface: -½ T₂₁ R₁₁^k T₁₂. Radial functions by upward
/// recurrence, stable for the outgoing and incoming waves used here.
///
/// # Errors
/// [`BadSphere`] when x is not within 1 to 60,000, or n not within 1.05 to 2.
pub fn order_alone(x: f64, n: f64, order: u32) -> Result<PartialWaves, BadSphere> {
    if !(1.0..=SIZE_PARAMETER_MAX).contains(&x) {
        return Err(BadSphere::Size(x));
    }
    if !(1.05..=2.0).contains(&n) {
        return Err(BadSphere::Index(n.into()));
    }
    // Beyond the edge of the sphere a wave no longer enters: where x ends, n x still swings.
    let terms = (x + 4.05 * x.cbrt() + 2.0) as usize;
    let mut waves = PartialWaves::with_capacity(x, terms);
    let mut outside = Outgoing::new(x);
    let mut inside = Outgoing::new(n * x);
    for _ in 0..terms {
        outside.advance();
        inside.advance();
        let term = |ratio: f64| {
            let (out, out_slope) = (outside.value, outside.slope());
            let (inner, inner_slope) = (inside.value, inside.slope());
            let denominator = inner.conj() * out_slope - ratio * inner_slope.conj() * out;
            let reflected = -(inner * out_slope - ratio * inner_slope * out) / denominator;
            let through = -4.0 * ratio / (denominator * denominator);
            // Conjugate: signs after Wiscombe (1979).
            (-0.5 * through * reflected.powu(order)).conj()
        };
        waves.push(term(1.0 / n), term(n));
    }
    Ok(waves)
}

/// Riccati-Hankel function of the outgoing wave at one argument, from order to order.
struct Outgoing {
    argument: f64,
    order: f64,
    before: Complex<f64>,
    value: Complex<f64>,
}

impl Outgoing {
    fn new(argument: f64) -> Self {
        let (sin, cos) = argument.sin_cos();
        Self { argument, order: 0.0, before: Complex::new(cos, sin), value: Complex::new(sin, -cos) }
    }

    fn advance(&mut self) {
        let next = (2.0 * self.order + 1.0) / self.argument * self.value - self.before;
        self.before = self.value;
        self.value = next;
        self.order += 1.0;
    }

    /// Derivative by the argument.
    fn slope(&self) -> Complex<f64> {
        self.before - self.order / self.argument * self.value
    }
}
