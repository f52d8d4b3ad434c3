//! How much light each surface of a drop reflects and lets through (Fresnel 1823), for both polarisations.
//!
//! `s` is the electric field across the plane of incidence, which lies along the tangent of a bow; `p` is in that plane.

use super::ray::Ray;

/// A quantity for each of the two polarisations.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Polarised {
    /// Along the tangent of the bow.
    pub s: f64,
    /// Across it.
    pub p: f64,
}

impl Polarised {
    /// Mean of both: what unpolarised light gives.
    pub fn mean(self) -> f64 {
        f64::midpoint(self.s, self.p)
    }

    /// Degree of polarisation (s - p)/(s + p), positive along the tangent of the bow; 0 where there is no light.
    pub fn degree(self) -> f64 {
        let sum = self.s + self.p;
        if sum > 0.0 { (self.s - self.p) / sum } else { 0.0 }
    }

    /// Share of the light that swings along the tangent, s/(s + p).
    pub fn tangential_share(self) -> f64 {
        f64::midpoint(1.0, self.degree())
    }
}

/// Amplitudes reflected at the outside of a surface by the angles of incidence and refraction, in radians.
///
/// -sin(i - r)/sin(i + r) and tan(i - r)/tan(i + r); inside, at the same pair of angles, both change sign.
pub fn reflected_amplitude(incidence: f64, refraction: f64) -> Polarised {
    let (sum, difference) = (incidence + refraction, incidence - refraction);
    if sum < 1e-6 {
        // Head-on, where the ratio of small angles is that of the indices.
        let n = if refraction > 0.0 { incidence / refraction } else { 1.0 };
        return Polarised { s: (1.0 - n) / (1.0 + n), p: (n - 1.0) / (n + 1.0) };
    }
    Polarised { s: -difference.sin() / sum.sin(), p: difference.tan() / sum.tan() }
}

/// Share of the intensity that a surface of index `n` relative to the air reflects, by the angle of incidence outside.
pub fn reflectance(n: f64, incidence_deg: f64) -> Polarised {
    let incidence = incidence_deg.to_radians();
    let amplitude = reflected_amplitude(incidence.max(1e-9), (incidence.max(1e-9).sin() / n).asin());
    Polarised { s: amplitude.s.powi(2), p: amplitude.p.powi(2) }
}

/// Share of the intensity of a ray that leaves a drop after the ray's order of inner reflections: (1 - R)² R^k.
pub fn weight(ray: &Ray) -> Polarised {
    let amplitude = reflected_amplitude(ray.incidence_deg.to_radians(), ray.refraction_deg.to_radians());
    let through = |amplitude: f64| {
        let reflectance = amplitude * amplitude;
        (1.0 - reflectance).powi(2) * reflectance.powf(f64::from(ray.order))
    };
    Polarised { s: through(amplitude.s), p: through(amplitude.p) }
}

/// Angle inside water at which its surface reflects no light of polarisation p (Brewster), degrees.
///
/// The ray of a primary bow strikes within 4° of it, which is why bows are so strongly polarised.
pub fn internal_brewster_deg(n: f64) -> f64 {
    (1.0 / n).atan().to_degrees()
}
