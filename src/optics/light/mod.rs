//! The whole answer on light: what the bow looks like across, how it stands out, and what to expect in words.
//!
//! - [`asked`]: what can be asked, checked against the table of ranges;
//! - [`mod@answer`]: what is told;
//! - `measure`: peaks, widths and contrasts of a curve; `words`: the same in a sentence or two.

pub mod answer;
pub mod asked;
mod measure;
mod words;

use self::answer::{Across, AcrossIn, Colours, LightAnswer, LitBow, Polariser};
use self::asked::Question;
use self::measure::Measured;
use super::beam::{AEROSOL_WAVELENGTH_UM, Beam};
use super::colour::{self, SPECTRUM};
use super::mie::BadSphere;
use super::profile::{FINE, Light, Scatterer};
use super::ray;
use super::scene::{self, SEEN_FROM, Scene, View};
use super::white::Curves;

/// Angles from the antisolar point that are told: 30 to 60 degrees.
const ANGLES: usize = 601;
/// Index of 30° from the antisolar point among the scattering angles.
const AT_30_DEG: usize = 606;

/// What is worked out once for drops, water and wavelength, and serves any Sun, air and depth of rain.
#[derive(Debug, Clone, PartialEq)]
pub enum Prepared {
    /// For white light.
    White(Curves),
    /// For one wavelength: phase function and degree of polarisation at [`FINE`].
    One(Vec<(f64, f64)>),
}

impl Prepared {
    /// Works out the slow part of an answer: milliseconds for rain, up to some tenths of a second for drops just below 0.12 mm.
    ///
    /// # Errors
    /// [`BadSphere`] when a drop is out of the range of the exact solution.
    pub fn new(question: &Question) -> Result<Self, BadSphere> {
        let Some(wavelength_um) = question.wavelength_um else {
            let curves = Curves::new(question.drops.sizes(), question.water, question.water_temperature_c)?;
            return Ok(Self::White(curves));
        };
        let n = question.water.index_in_air(wavelength_um, question.water_temperature_c);
        let light = Scatterer::new(question.drops.sizes(), Light::OneWavelength).under_the_sun(wavelength_um, n)?;
        Ok(Self::One(light.iter().map(|at| (at.mean(), at.degree())).collect()))
    }

    /// Memory held, bytes.
    pub fn size_bytes(&self) -> usize {
        match self {
            Self::White(curves) => curves.size_bytes(),
            Self::One(curve) => size_of_val(curve.as_slice()),
        }
    }
}

/// The answer to a question, by what was prepared for its drops, water and wavelength; some 0.2 ms.
pub fn answer(question: &Question, prepared: &Prepared) -> LightAnswer {
    let beam = Beam::new(question.sun_elevation_deg, question.aerosol_optical_depth);
    let view = View::all_lit(question.lit_optical_depth);
    let told = |index: usize| AT_30_DEG - index;
    let lights = |sunlight: f64, above: f64| {
        let behind = scene::behind(sunlight, above, question.sun_elevation_deg);
        Scene::new(view, sunlight, behind)
    };
    let illuminance = beam.xyz();
    let (light, degree_of_polarisation, curve) = match prepared {
        Prepared::White(curves) => {
            let above = colour::xyz_of_sunlight(|_| 1.0);
            let scenes: [Scene; 3] = std::array::from_fn(|axis| lights(illuminance[axis], above[axis]));
            let seen = curves.seen(&beam);
            let per_lux = view.lit / (4.0 * std::f64::consts::PI);
            let total: Vec<[f64; 3]> = (0..ANGLES)
                .map(|index| std::array::from_fn(|axis| per_lux * seen[told(index)].xyz[axis] + scenes[axis].veil()))
                .collect();
            let degrees = (0..ANGLES).map(|index| round(seen[told(index)].degree_of_polarisation, 4)).collect();
            let luminance = total.iter().map(|xyz| xyz[1]).collect::<Vec<f64>>();
            (AcrossIn::White(Colours::new(&total, scenes[1].behind)), degrees, luminance)
        }
        Prepared::One(curve) => {
            let wavelength_um = question.wavelength_um.unwrap_or(AEROSOL_WAVELENGTH_UM);
            let above = SPECTRUM[((wavelength_um * 1000.0).round() as usize).clamp(360, 830) - 360].sunlight_w_m2_nm;
            let scene = lights(above * beam.transmittance(wavelength_um), above);
            let degrees: Vec<f64> = (0..ANGLES).map(|index| round(curve[told(index)].1, 4)).collect();
            let phase = (0..ANGLES).map(|index| curve[told(index)].0);
            let total = phase.clone().map(|phase| scene.per_phase * phase + scene.veil()).collect();
            let phase_function = phase.map(|phase| round(phase, 6)).collect();
            (AcrossIn::OneWavelength { phase_function }, degrees, total)
        }
    };
    let across = Across {
        angle_deg: (0..ANGLES).map(|index| round(30.0 + FINE.step_deg * index as f64, 2)).collect(),
        degree_of_polarisation,
        light,
    };
    let wavelength_um = question.wavelength_um.unwrap_or(AEROSOL_WAVELENGTH_UM);
    let n = question.water.index_in_air(wavelength_um, question.water_temperature_c);
    let radii = [1, 2].map(|order| ray::radius_deg(n, order).unwrap_or(f64::NAN));
    let measured = Measured::new(&across.angle_deg, &curve, radii);
    let bows: Vec<LitBow> = [1, 2]
        .into_iter()
        .zip(measured.bows)
        .zip(radii)
        .map(|((order, bow), radius_deg)| LitBow {
            order,
            radius_deg: round(radius_deg, 4),
            brightest_deg: bow.map(|bow| round(bow.brightest_deg, 2)),
            width_deg: bow.and_then(|bow| bow.width_deg).map(|width| round(width, 2)),
            contrast: bow.map_or(0.0, |bow| round(bow.contrast, 4)),
            degree_of_polarisation: bow.map(|bow| across.degree_of_polarisation[bow.index]),
        })
        .collect();
    let polariser = Polariser::new(question.sun_elevation_deg, &bows[0]);
    let greatest = illuminance.iter().copied().fold(f64::MIN_POSITIVE, f64::max);
    let sunlight = colour::linear_srgb(illuminance.map(|value| value / greatest));
    let brightest = sunlight.iter().copied().fold(f64::MIN_POSITIVE, f64::max);
    LightAnswer {
        question: question.clone(),
        sunlight_lx: round(illuminance[1], 1),
        sunlight_srgb: colour::encode(colour::shown(sunlight.map(|part| part / brightest))).map(|part| round(part, 4)),
        supernumeraries: measured.supernumeraries,
        contrast_threshold: SEEN_FROM,
        expect: words::expect(question, &bows, measured.supernumeraries),
        assumed: words::assumed(question),
        across,
        bows,
        polariser,
    }
}

/// Rounds to so many places after the point: an answer tells no digits that mean nothing.
fn round(value: f64, places: i32) -> f64 {
    let scale = 10.0_f64.powi(places);
    (value * scale).round() / scale
}
