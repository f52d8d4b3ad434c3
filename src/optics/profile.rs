//! Light across the bows in one wavelength: many drops, under the disc of the Sun.
//!
//! Drops above [`EXACT_BELOW_UM`] are summed by the uniform theory of each bow with the light of the other orders
//! added; below, each size is solved exactly. What a population does to Airy's function is worked out once for all
//! wavelengths and directions, and interpolated.

use std::sync::LazyLock;

use super::airy::airy_function;
use super::background::{self, SizeShares};
use super::fresnel::Polarised;
use super::mie::{BadSphere, Sphere};
use super::population::{Drops, Population};
use super::uniform::{Direction, UniformBow};

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
                (effective_radius_um, 240, if light == Light::White { 60 } else { 240 })
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

/// Cubic (Catmull and Rom 1974) between the second and third of four evenly spaced values.
fn cubic([before, from, to, after]: [f64; 4], share: f64) -> f64 {
    let slope = 0.5 * (to - before);
    let bend = before - 2.5 * from + 2.0 * to - 0.5 * after;
    let twist = 0.5 * (after - before) + 1.5 * (from - to);
    from + share * (slope + share * (bend + share * twist))
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

/// Mean of Ai² and Ai'² over a population, by the argument for its effective radius.
#[derive(Debug, Clone)]
struct Averages {
    radius_um: f64,
    /// Mean of 1/radius by cross-section, per µm.
    inverse_radius_um: f64,
    even: Vec<f64>,
    odd: Vec<f64>,
}

/// Arguments of the averages: from the dark side, where the light is gone, to where only the mean is left.
const ARGUMENT_FIRST: f64 = -24.0;
const ARGUMENT_LAST: f64 = 32.0;
const ARGUMENT_STEP: f64 = 0.04;

impl Averages {
    fn new(population: &Population) -> Self {
        let radius_um = population.effective_radius_um;
        // Beyond this argument neighbouring classes fall out of step; by then the population's fringes are washed out.
        let in_step = (1.1 / population.log_step).powf(2.0 / 3.0);
        let sizes: Vec<[f64; 3]> = population
            .classes
            .iter()
            .map(|class| {
                let cube_root = (class.radius_um / radius_um).cbrt();
                [cube_root * cube_root, class.share * cube_root, class.share / cube_root]
            })
            .collect();
        let count = ((ARGUMENT_LAST - ARGUMENT_FIRST) / ARGUMENT_STEP) as usize + 3;
        let means = (0..count).map(|index| {
            let argument = ARGUMENT_FIRST + ARGUMENT_STEP * (index as f64 - 1.0);
            sizes.iter().fold((0.0, 0.0), |(even, odd), [scale, even_weight, odd_weight]| {
                let (ai2, slope2) = squares(argument * scale, in_step);
                (even + even_weight * ai2, odd + odd_weight * slope2)
            })
        });
        let (even, odd) = means.unzip();
        let inverse_radius_um = population.classes.iter().map(|class| class.share / class.radius_um).sum();
        Self { radius_um, inverse_radius_um, even, odd }
    }

    /// |S|²/x² of the population in a direction of a bow, where `x` belongs to the effective radius.
    fn intensity(&self, direction: &Direction, x: f64) -> Polarised {
        let cube_root = x.cbrt();
        let argument = direction.stretch * cube_root * cube_root;
        let (even, odd) = if argument >= ARGUMENT_LAST {
            (0.5 / (std::f64::consts::PI * argument.sqrt()), 0.5 * argument.sqrt() / std::f64::consts::PI)
        } else if argument <= ARGUMENT_FIRST {
            return Polarised::default();
        } else {
            let place = (argument - ARGUMENT_FIRST) / ARGUMENT_STEP + 1.0;
            let (node, share) = (place as usize, place.fract());
            let between = |values: &[f64]| {
                cubic([values[node - 1], values[node], values[node + 1], values[node + 2]], share).max(0.0)
            };
            (between(&self.even), between(&self.odd))
        };
        let edge = 1.0 + direction.edge * self.inverse_radius_um * self.radius_um / x;
        let (even, odd) = (edge * even * cube_root, edge * odd / cube_root);
        Polarised {
            s: direction.even.s * even + direction.odd.s * odd,
            p: direction.even.p * even + direction.odd.p * odd,
        }
    }
}

/// Ai(-z)² and Ai'(-z)², with their swing faded out toward `in_step`, where their means take over.
fn squares(z: f64, in_step: f64) -> (f64, f64) {
    let mean = |z: f64| (0.5 / (std::f64::consts::PI * z.sqrt()), 0.5 * z.sqrt() / std::f64::consts::PI);
    if z >= in_step {
        return mean(z);
    }
    let (ai, slope) = tabulated(-z);
    let (ai2, slope2) = (ai * ai, slope * slope);
    let fade = (z - 0.6 * in_step) / (0.4 * in_step);
    if fade <= 0.0 {
        return (ai2, slope2);
    }
    let (ai2_mean, slope2_mean) = mean(z);
    (ai2 + fade * (ai2_mean - ai2), slope2 + fade * (slope2_mean - slope2))
}

const TABLE_FIRST: f64 = -60.0;
const TABLE_LAST: f64 = 8.0;
const TABLE_STEP: f64 = 0.02;

/// Ai and Ai' at nodes: made on first use, in some 10 ms.
static TABLE: LazyLock<Vec<(f64, f64)>> = LazyLock::new(|| {
    let count = ((TABLE_LAST - TABLE_FIRST) / TABLE_STEP) as usize + 2;
    (0..count).map(|node| airy_function(TABLE_FIRST + TABLE_STEP * node as f64)).collect()
});

/// Ai and Ai' by Hermite's cubic between nodes: Ai'' = z Ai gives the slopes. To 1e-6 of the amplitude.
fn tabulated(z: f64) -> (f64, f64) {
    if z >= TABLE_LAST {
        return (0.0, 0.0);
    }
    if z <= TABLE_FIRST {
        return airy_function(z);
    }
    let place = (z - TABLE_FIRST) / TABLE_STEP;
    let (node, share) = (place as usize, place.fract());
    let ((ai0, slope0), (ai1, slope1)) = (TABLE[node], TABLE[node + 1]);
    let z0 = TABLE_FIRST + TABLE_STEP * node as f64;
    let hermite = |from: f64, to: f64, slope_from: f64, slope_to: f64| {
        let (rise, from_slope, to_slope) = (to - from, slope_from * TABLE_STEP, slope_to * TABLE_STEP);
        from + share
            * (from_slope
                + share * (3.0 * rise - 2.0 * from_slope - to_slope + share * (from_slope + to_slope - 2.0 * rise)))
    };
    (hermite(ai0, ai1, slope0, slope1), hermite(slope0, slope1, z0 * ai0, (z0 + TABLE_STEP) * ai1))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_table_of_airy_is_true_between_its_nodes() {
        for step in 0..3000 {
            let z = -62.0 + 0.0233 * f64::from(step);
            let ((ai, slope), (table_ai, table_slope)) = (airy_function(z), tabulated(z));
            let amplitude = (1.0 + z.abs()).powf(0.25);
            assert!((ai - table_ai).abs() * amplitude < 1e-5, "Ai({z})");
            assert!((slope - table_slope).abs() / amplitude < 1e-5, "Ai'({z})");
        }
    }

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
