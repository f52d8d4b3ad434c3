//! The bow of one order for drops large against the wavelength, right at the bow and away from it.
//!
//! Airy's theory takes the wavefront for a cubic and the light that each surface passes for that of the stationary ray.
//! Both fail some degrees inside the bow. The uniform approximation (Chester, Friedman and Ursell 1957; Berry 1966) puts in
//! the true difference of path and the true brightness of the two rays that leave in each direction. It becomes Airy's theory
//! at the bow and geometrical optics far from it.
//!
//! Against the exact light of one order (`tests/proofs/profiles.rs`), at the maxima: the primary within 0.7 % from a size parameter of
//! 570 (50 µm of radius), 0.1 % from 1100; the secondary's main maximum within 1.5 % and 0.6 %.

use super::fresnel::{self, Polarised};
use super::ray::Ray;

/// Degree of the polynomials that carry the ray quantities over angle.
const DEGREE: usize = 7;
/// Lit side that the polynomials are fitted to, radians from the stationary ray (13°).
const LIT: f64 = 0.2269;
/// How far they are carried into the dark side, radians (4°); there the light of large drops is gone.
const DARK: f64 = -0.07;

/// See [`Direction::edge`], per square radian from the stationary ray.
const EDGE_OF_SECONDARY: f64 = 6300.0;

type Polynomial = [f64; DEGREE + 1];

/// One bow at one refractive index, for drops of any size.
#[derive(Debug, Clone, PartialEq)]
pub struct UniformBow {
    /// Scattering angle of the stationary ray, degrees.
    pub scattering_angle_deg: f64,
    lit_side: f64,
    edge: f64,
    /// Airy's argument over x^(2/3) and the distance from the stationary ray.
    stretch: Polynomial,
    even: [Polynomial; 2],
    odd: [Polynomial; 2],
}

/// What a bow is made of in one direction, to be joined with Airy's function of each size of drop:
/// |S|²/x² = x^(1/3) even Ai(-ζ)² + x^(-1/3) odd Ai'(-ζ)², ζ = x^(2/3) stretch.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Direction {
    /// ζ x^(-2/3), positive on the lit side.
    pub stretch: f64,
    /// Weight of Ai².
    pub even: Polarised,
    /// Weight of Ai'².
    pub odd: Polarised,
    /// Light missing for want of the drop's edge, where the outer ray of the secondary nears grazing: to be made up by a
    /// factor 1 + edge/x. Fitted to the exact light of that order (Debye), 0 to 9° inside, x from 500 to 6000.
    pub edge: f64,
}

impl UniformBow {
    /// The bow of `order` 1 or 2 at index `n`; `None` for other orders, or where the bow has no 13° of lit side.
    pub fn new(n: f64, order: u32) -> Option<Self> {
        let ray = Ray::stationary(n, order).filter(|_| order <= 2)?;
        let lit_side = if order == 1 { 1.0 } else { -1.0 };
        let mut at = [0.0; DEGREE + 1];
        let mut values = [[0.0; DEGREE + 1]; 5];
        for (node, at) in at.iter_mut().enumerate() {
            *at = 0.5 * LIT * (1.0 - ((node as f64 + 0.5) / (DEGREE as f64 + 1.0) * std::f64::consts::PI).cos());
            let [inner, outer] = [-1.0, 1.0].map(|side| leaving(n, &ray, *at, side));
            let (inner, outer) = (inner?, outer?);
            let stretch = (1.5 * (inner.path - outer.path).abs()).powf(2.0 / 3.0);
            let quarter = stretch.powf(0.25) * std::f64::consts::PI.sqrt();
            let per_quarter = stretch.powf(-0.25) * std::f64::consts::PI.sqrt();
            values[0][node] = stretch / *at;
            values[1][node] = (inner.amplitude.s + outer.amplitude.s) * quarter;
            values[2][node] = (inner.amplitude.p + outer.amplitude.p) * quarter;
            values[3][node] = (inner.amplitude.s - outer.amplitude.s) * per_quarter;
            values[4][node] = (inner.amplitude.p - outer.amplitude.p) * per_quarter;
        }
        let [stretch, even_s, even_p, odd_s, odd_p] = values.map(|values| through(&at, &values));
        Some(Self {
            scattering_angle_deg: ray.scattering_angle_deg(),
            lit_side,
            edge: if order == 2 { EDGE_OF_SECONDARY } else { 0.0 },
            stretch,
            even: [even_s, even_p],
            odd: [odd_s, odd_p],
        })
    }

    /// What the bow is made of at a scattering angle; valid to 13° on the lit side, held constant beyond 4° on the dark side.
    pub fn direction(&self, scattering_angle_deg: f64) -> Direction {
        let distance = self.lit_side * (scattering_angle_deg - self.scattering_angle_deg).to_radians();
        let within = distance.clamp(DARK, LIT);
        let squared = |[s, p]: &[Polynomial; 2]| Polarised { s: value(s, within).powi(2), p: value(p, within).powi(2) };
        Direction {
            stretch: distance * value(&self.stretch, within),
            even: squared(&self.even),
            odd: squared(&self.odd),
            edge: self.edge * distance.max(0.0).powi(2),
        }
    }
}

/// A ray that leaves the drop beside the stationary one.
struct Leaving {
    /// Optical path over twice the drop's radius, up to a constant.
    path: f64,
    /// Square root of |S|²/x² by geometrical optics, with its sign.
    amplitude: Polarised,
}

/// The ray whose deviation is greater than the least by `beyond` radians, on the given side of the stationary ray.
fn leaving(n: f64, ray: &Ray, beyond: f64, side: f64) -> Option<Leaving> {
    let k = f64::from(ray.order);
    let refraction = |incidence: f64| (incidence.sin() / n).asin();
    let deviation = |incidence: f64| 2.0 * incidence - 2.0 * (k + 1.0) * refraction(incidence);
    let slope = |incidence: f64| 2.0 - 2.0 * (k + 1.0) * incidence.cos() / (n * refraction(incidence).cos());
    let stationary = ray.incidence_deg.to_radians();
    let target = deviation(stationary) + beyond;
    let (mut near, mut far) = (stationary, if side < 0.0 { 0.0 } else { std::f64::consts::FRAC_PI_2 });
    if deviation(far) < target {
        return None;
    }
    // Newton's steps, halving where they would leave the bracket.
    let mut incidence = f64::midpoint(near, far);
    for _ in 0..60 {
        let excess = deviation(incidence) - target;
        if excess > 0.0 {
            far = incidence;
        } else {
            near = incidence;
        }
        let step = incidence - excess / slope(incidence);
        let inside = step > near.min(far) && step < near.max(far);
        let next = if inside { step } else { f64::midpoint(near, far) };
        let moved = (next - incidence).abs();
        incidence = next;
        if moved < 1e-14 {
            break;
        }
    }
    let inner = refraction(incidence);
    let sin_angle = (ray.deviation_deg.to_radians() + beyond).sin().abs();
    let spread = (incidence.sin() * incidence.cos() / (sin_angle * slope(incidence).abs())).sqrt();
    let reflected = fresnel::reflected_amplitude(incidence, inner);
    let through = |amplitude: f64| (1.0 - amplitude * amplitude) * amplitude.powi(ray.order as i32) * spread;
    Some(Leaving {
        path: incidence.cos() - (k + 1.0) * n * inner.cos(),
        amplitude: Polarised { s: through(reflected.s), p: through(reflected.p) },
    })
}

/// Polynomial through points, lowest power first (Newton's divided differences, multiplied out).
fn through(at: &[f64; DEGREE + 1], values: &[f64; DEGREE + 1]) -> Polynomial {
    let mut divided = *values;
    for level in 1..=DEGREE {
        for node in (level..=DEGREE).rev() {
            divided[node] = (divided[node] - divided[node - 1]) / (at[node] - at[node - level]);
        }
    }
    let mut polynomial = [0.0; DEGREE + 1];
    for node in (0..=DEGREE).rev() {
        for power in (1..=DEGREE).rev() {
            polynomial[power] = polynomial[power - 1] - at[node] * polynomial[power];
        }
        polynomial[0] = divided[node] - at[node] * polynomial[0];
    }
    polynomial
}

fn value(polynomial: &Polynomial, at: f64) -> f64 {
    polynomial.iter().rev().fold(0.0, |sum, coefficient| sum * at + coefficient)
}
