//! The bow in white light: curves of some wavelengths, added up by what each means to the eye.

use super::beam::Beam;
use super::colour::{LUMENS_PER_WATT, SPECTRUM};
use super::fresnel::Polarised;
use super::mie::BadSphere;
use super::population::Drops;
use super::profile::{Light, Scatterer};
use super::water::Water;

/// Wavelengths for which curves are made, µm: 390 to 705 nm.
const FIRST_UM: f64 = 0.39;
const STEP_UM: f64 = 0.015;
const COUNT: usize = 22;

/// Phase functions under the Sun's disc by wavelength, at the angles of [`super::profile::FINE`]. They depend on the drops alone,
/// so that one set serves every height of the Sun.
#[derive(Debug, Clone, PartialEq)]
pub struct Curves {
    /// One per wavelength, shortest first.
    by_wavelength: Vec<Vec<Polarised>>,
}

/// What the eye gets at one angle for a phase function: tristimulus values, Y in lux, and the degree of polarisation.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Seen {
    /// Phase function times the beam's tristimulus values, summed over the spectrum.
    pub xyz: [f64; 3],
    /// Degree of polarisation of that light as the eye weighs it.
    pub degree_of_polarisation: f64,
}

impl Curves {
    /// Works out the curves: some milliseconds for rain, up to some tenths of a second for drops just below
    /// [`super::profile::EXACT_BELOW_UM`].
    ///
    /// # Errors
    /// [`BadSphere`] when a drop is out of the range of the exact solution.
    pub fn new(drops: Drops, water: Water, temperature_c: f64) -> Result<Self, BadSphere> {
        let scatterer = Scatterer::new(drops, Light::White);
        let curve = |index: usize| {
            let wavelength_um = wavelength_um(index);
            scatterer.under_the_sun(wavelength_um, water.index_in_air(wavelength_um, temperature_c))
        };
        let by_wavelength = (0..COUNT).map(curve).collect::<Result<_, _>>()?;
        Ok(Self { by_wavelength })
    }

    /// Memory held, bytes.
    pub fn size_bytes(&self) -> usize {
        self.by_wavelength.iter().map(|curve| size_of_val(curve.as_slice())).sum()
    }

    /// Adds the curves up under a beam. Between wavelengths a curve counts as the straight mean of its neighbours, beyond the ends as
    /// the last: the error of all that is about 1 % of the greatest brightness, 3 % in fog (`tests/proofs`).
    pub fn seen(&self, beam: &Beam) -> Vec<Seen> {
        let weights = weights(beam);
        let angles = self.by_wavelength.first().map_or(0, Vec::len);
        (0..angles)
            .map(|angle| {
                let (mut xyz, mut tangential) = ([0.0; 3], 0.0);
                for (curve, weight) in self.by_wavelength.iter().zip(&weights) {
                    let mean = curve[angle].mean();
                    for (sum, weight) in xyz.iter_mut().zip(weight) {
                        *sum += weight * mean;
                    }
                    tangential += 0.5 * weight[1] * (curve[angle].s - curve[angle].p);
                }
                let degree_of_polarisation = if xyz[1] > 0.0 { tangential / xyz[1] } else { 0.0 };
                Seen { xyz, degree_of_polarisation }
            })
            .collect()
    }
}

fn wavelength_um(index: usize) -> f64 {
    FIRST_UM + STEP_UM * index as f64
}

/// Tristimulus values of the beam that fall to each wavelength, Y in lux.
fn weights(beam: &Beam) -> [[f64; 3]; COUNT] {
    let mut weights = [[0.0; 3]; COUNT];
    for here in SPECTRUM.iter() {
        let power = LUMENS_PER_WATT * here.sunlight_w_m2_nm * beam.transmittance(here.wavelength_um);
        let place = ((here.wavelength_um - FIRST_UM) / STEP_UM).clamp(0.0, COUNT as f64 - 1.0);
        let node = (place as usize).min(COUNT - 2);
        let share = place - node as f64;
        for (node, share) in [(node, 1.0 - share), (node + 1, share)] {
            for (weight, matching) in weights[node].iter_mut().zip(here.matching) {
                *weight += share * power * matching;
            }
        }
    }
    weights
}
