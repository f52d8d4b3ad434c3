//! Light across the bows in one wavelength: many drops, under the disc of the Sun.
//!
//! Drops above [`EXACT_BELOW_UM`] are summed by the uniform theory of each bow with the light of the other orders
//! added; below, each size is solved exactly. What a population does to Airy's function is worked out once for all
//! wavelengths and directions, and interpolated.

use super::averages::{Averages, cubic};
use super::background::{self, SizeShares};
use super::fresnel::Polarised;
use super::mie::{BadSphere, Sphere};
use super::population::{Drops, Population};
use super::uniform::UniformBow;

/// Effective radius below which the exact solution is used, µm.
///
/// There the uniform theory is within 0.5 % of it at the primary's maximum and 2 % at the secondary's (`tests/proofs`).
pub const EXACT_BELOW_UM: f64 = 120.0;

/// Mean diameter of the Sun's disc, degrees.
pub const SUN_DIAMETER_DEG: f64 = 0.533;

/// Scattering angles from 119.7 to 150.3 degrees in steps of 0.05: those of the bows and half a Sun more.
pub const FINE: Grid = Grid { first_deg: 119.7, step_deg: 0.05, count: 613 };

/// Evenly spaced scattering angles.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Grid {
    /// The least angle, degrees.
    pub first_deg: f64,
    /// Distance of neighbours, degrees.
    pub step_deg: f64,
    /// Number of angles.
    pub count: usize,
}

impl Grid {
    /// The angles, degrees.
    pub fn angles_deg(self) -> impl Iterator<Item = f64> + Clone {
        (0..self.count).map(move |index| self.first_deg + self.step_deg * index as f64)
    }
}

/// What light the drops stand in.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Light {
    /// Many wavelengths, to be added up.
    White,
    /// One wavelength.
    OneWavelength,
}

/// Drops made ready for any wavelength.
#[derive(Debug, Clone)]
pub struct Scatterer {
    light: Light,
    population: Population,
    averages: Option<Averages>,
}

impl Scatterer {
    /// Makes drops ready: some milliseconds for large ones.
    ///
    /// A single wavelength asks for more sizes of small drops than white light, in which the resonances of neighbouring
    /// sizes drown.
    pub fn new(drops: Drops, light: Light) -> Self {
        let (radius_um, large, small) = match drops {
            Drops::Rain { .. } => (f64::INFINITY, 240, 0),
            Drops::Equal { radius_um } => (radius_um, 61, if light == Light::White { 31 } else { 121 }),
            Drops::Gamma { effective_radius_um, .. } => {
                (effective_radius_um, 240, if light == Light::White { 100 } else { 240 })
            }
        };
        if radius_um < EXACT_BELOW_UM {
            return Self { light, population: Population::new(drops, small), averages: None };
        }
        let population = Population::new(drops, large);
        let averages = Some(Averages::new(&population));
        Self { light, population, averages }
    }

    /// Phase function (its mean over all directions 1) for each polarisation of unpolarised sunlight, at [`FINE`], before the
    /// Sun's disc: the mean of both is that of all light.
    ///
    /// # Errors
    /// [`BadSphere`] when a drop is out of the range of the exact solution.
    pub fn under_a_point(&self, wavelength_um: f64, n: f64) -> Result<Vec<Polarised>, BadSphere> {
        match &self.averages {
            Some(averages) => Ok(self.uniform(averages, wavelength_um, n)),
            None => self.exact(wavelength_um, n),
        }
    }

    /// The same under the disc of the Sun.
    ///
    /// # Errors
    /// As [`Scatterer::under_a_point`].
    pub fn under_the_sun(&self, wavelength_um: f64, n: f64) -> Result<Vec<Polarised>, BadSphere> {
        Ok(smear(&self.under_a_point(wavelength_um, n)?, FINE.step_deg, SUN_DIAMETER_DEG))
    }

    fn uniform(&self, averages: &Averages, wavelength_um: f64, n: f64) -> Vec<Polarised> {
        let x = size_parameter(averages.radius_um, wavelength_um);
        // Extinction of large spheres above twice their face (van de Hulst 1957; factor of Nussenzveig and Wiscombe 1980).
        let q_sca = 2.0 + 1.9924 * x.powf(-2.0 / 3.0);
        let sizes =
            self.population.classes.iter().map(|class| (size_parameter(class.radius_um, wavelength_um), class.share));
        let background = background::intensities(&SizeShares::new(sizes), n, FINE.angles_deg());
        let bows = [1, 2].map(|order| UniformBow::new(n, order));
        let at = |(angle_deg, mut light): (f64, Polarised)| {
            for bow in bows.iter().flatten() {
                let from_bow = averages.intensity(&bow.direction(angle_deg), x);
                light.s += from_bow.s;
                light.p += from_bow.p;
            }
            Polarised { s: 4.0 / q_sca * light.s, p: 4.0 / q_sca * light.p }
        };
        FINE.angles_deg().zip(background).map(at).collect()
    }

    fn exact(&self, wavelength_um: f64, n: f64) -> Result<Vec<Polarised>, BadSphere> {
        // One drop's pattern is as fine as 180°/x. In white light it drowns, and every fourth angle with a cubic between
        // is enough.
        let every = if self.light == Light::White { 4 } else { 1 };
        let step_deg = FINE.step_deg * every as f64;
        let coarse = Grid { first_deg: FINE.first_deg - step_deg, step_deg, count: (FINE.count - 1) / every + 4 };
        let cosines: Vec<f64> = coarse.angles_deg().map(|angle| angle.to_radians().cos()).collect();
        let mut sum = vec![Polarised::default(); cosines.len()];
        let mut scattered = 0.0;
        for class in &self.population.classes {
            let x = size_parameter(class.radius_um, wavelength_um);
            let sphere = Sphere::new(x, n.into())?;
            scattered += class.share * sphere.q_sca;
            let weight = 4.0 * class.share / (x * x);
            for (sum, intensity) in sum.iter_mut().zip(sphere.waves.intensities(&cosines)) {
                sum.s += weight * intensity.s;
                sum.p += weight * intensity.p;
            }
        }
        let between = |index: usize, of: fn(&Polarised) -> f64| {
            let (node, share) = (index / every, (index % every) as f64 / every as f64);
            cubic([of(&sum[node]), of(&sum[node + 1]), of(&sum[node + 2]), of(&sum[node + 3])], share) / scattered
        };
        Ok((0..FINE.count)
            .map(|index| Polarised { s: between(index, |at| at.s), p: between(index, |at| at.p) })
            .collect())
    }
}

/// 2 π radius/wavelength.
pub fn size_parameter(radius_um: f64, wavelength_um: f64) -> f64 {
    2.0 * std::f64::consts::PI * radius_um / wavelength_um
}

/// Light under a uniform disc instead of a point: a mean weighted by the length of the disc's chords.
pub fn smear(light: &[Polarised], step_deg: f64, diameter_deg: f64) -> Vec<Polarised> {
    let radius = 0.5 * diameter_deg / step_deg;
    let reach = (radius + 0.5).ceil() as isize;
    // Area of the disc to the left of a chord, over half the radius squared.
    let area = |edge: f64| {
        let edge = (edge / radius).clamp(-1.0, 1.0);
        edge * (1.0 - edge * edge).sqrt() + edge.asin()
    };
    let weight = |offset: isize| (area(offset as f64 + 0.5) - area(offset as f64 - 0.5)) / std::f64::consts::PI;
    let weights: Vec<(isize, f64)> = (-reach..=reach).map(|offset| (offset, weight(offset))).collect();
    let last = light.len() as isize - 1;
    (0..=last)
        .map(|index| {
            let mut mean = Polarised::default();
            for (offset, weight) in &weights {
                let there = light[(index + offset).clamp(0, last) as usize];
                mean.s += weight * there.s;
                mean.p += weight * there.p;
            }
            mean
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_disc_keeps_the_light() {
        let mut light = vec![Polarised::default(); 101];
        light[50] = Polarised { s: 1.0, p: 2.0 };
        let smeared = smear(&light, 0.05, SUN_DIAMETER_DEG);
        let sum = smeared.iter().fold((0.0, 0.0), |(s, p), at| (s + at.s, p + at.p));
        assert!((sum.0 - 1.0).abs() < 1e-12 && (sum.1 - 2.0).abs() < 1e-12);
        assert!(smeared[50].s > smeared[54].s && smeared[57].s == 0.0);
    }
}
