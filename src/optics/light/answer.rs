//! What is told about light.

use serde::Serialize;
use utoipa::ToSchema;

use super::asked::Question;
use super::round;
use crate::optics::colour;

/// The bow in the light of one hour.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct LightAnswer {
    /// The question, with what was taken where it was silent.
    #[serde(flatten)]
    pub question: Question,
    /// Illuminance by the direct beam on a plane facing the Sun, lx.
    pub sunlight_lx: f64,
    /// Colour of the beam, encoded sRGB with its greatest part at 1.
    pub sunlight_srgb: [f64; 3],
    /// The curve across the bows, arrays side by side.
    #[serde(flatten)]
    pub across: Across,
    /// Primary and secondary.
    pub bows: Vec<LitBow>,
    /// Number of supernumerary bows inside the primary that stand out by the threshold.
    pub supernumeraries: u32,
    /// Contrast from which a bow counts as seen.
    pub contrast_threshold: f64,
    /// How a polarising filter acts on the primary.
    pub polariser: Polariser,
    /// What to expect, in words.
    pub expect: String,
    /// What was assumed.
    pub assumed: Vec<String>,
}

/// The curve across the bows.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Across {
    /// Angle from the antisolar point, degrees: 30 to 60 in steps of 0.05.
    pub angle_deg: Vec<f64>,
    /// Degree of polarisation of the light scattered once in the drops: positive along the tangent of the bow.
    pub degree_of_polarisation: Vec<f64>,
    /// Colours in white light, or the phase function in one wavelength.
    #[serde(flatten)]
    pub light: AcrossIn,
}

impl Across {
    /// Brightness and colour; none in one wavelength.
    pub fn colours(&self) -> Option<&Colours> {
        match &self.light {
            AcrossIn::White(colours) => Some(colours),
            AcrossIn::OneWavelength { .. } => None,
        }
    }

    /// The phase function; none in white light.
    pub fn phase_function(&self) -> Option<&[f64]> {
        match &self.light {
            AcrossIn::White(_) => None,
            AcrossIn::OneWavelength { phase_function } => Some(phase_function),
        }
    }
}

/// What the curve tells besides, by the light asked for.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
#[serde(untagged)]
pub enum AcrossIn {
    /// White light.
    White(Colours),
    /// One wavelength.
    OneWavelength {
        /// Phase function: its mean over all directions is 1.
        phase_function: Vec<f64>,
    },
}

/// Brightness and colour across the bows.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Colours {
    /// Luminance of all that is seen in that direction, cd/m²: rain, light scattered more than once, and what stands behind.
    pub luminance_cd_m2: Vec<f64>,
    /// Linear sRGB of the same, scaled to 1 at the greatest part of all; below 0 where a colour lies outside sRGB.
    pub linear_srgb: Vec<[f64; 3]>,
    /// Encoded sRGB, 0 to 1: out-of-gamut colours are mixed with grey of their luminance.
    pub srgb: Vec<[f64; 3]>,
    /// Luminance that a linear sRGB of 1, 1, 1 stands for, cd/m².
    pub white_cd_m2: f64,
    /// Luminance of what stands behind the rain, cd/m².
    pub behind_cd_m2: f64,
}

impl Colours {
    pub(super) fn new(total: &[[f64; 3]], behind_cd_m2: f64) -> Self {
        let linear: Vec<[f64; 3]> = total.iter().map(|xyz| colour::linear_srgb(*xyz)).collect();
        let white_cd_m2 = linear.iter().flatten().copied().fold(f64::MIN_POSITIVE, f64::max);
        let linear: Vec<[f64; 3]> = linear.iter().map(|colour| colour.map(|part| part / white_cd_m2)).collect();
        Self {
            luminance_cd_m2: total.iter().map(|xyz| round(xyz[1], 2)).collect(),
            srgb: linear.iter().map(|part| colour::encode(colour::shown(*part)).map(|part| round(part, 4))).collect(),
            linear_srgb: linear.iter().map(|colour| colour.map(|part| round(part, 5))).collect(),
            white_cd_m2: round(white_cd_m2, 2),
            behind_cd_m2: round(behind_cd_m2, 2),
        }
    }
}

/// One bow in its light.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct LitBow {
    /// Number of reflections in the drop: 1 the primary, 2 the secondary.
    pub order: u32,
    /// Angle of the stationary ray from the antisolar point, degrees: at 0.55 µm in white light.
    pub radius_deg: f64,
    /// Where it is brightest, degrees from the antisolar point; null where no bow forms.
    pub brightest_deg: Option<f64>,
    /// Width at half of its height over the band between the bows, degrees; null where it fades too slowly to tell.
    pub width_deg: Option<f64>,
    /// Luminance at the peak over that of the darkest place between the bows, less 1; 0 where no bow forms.
    pub contrast: f64,
    /// Degree of polarisation at the peak, for light scattered once.
    pub degree_of_polarisation: Option<f64>,
}

/// How a polarising filter acts on the primary. Its light swings along the tangent of the arc.
#[derive(Debug, Clone, PartialEq, Serialize, ToSchema)]
pub struct Polariser {
    /// Share of the bow's light that passes with the filter's axis along the arc.
    pub along_passes: f64,
    /// Share that passes with the axis across the arc: there the bow all but vanishes.
    pub across_passes: f64,
    /// Axis that keeps the crown, degrees from the horizontal counter-clockwise as the photographer sees it; 90° from it the crown vanishes.
    pub crown_axis_deg: f64,
    /// Axis that keeps the left foot on a level horizon; null where the bow has no feet.
    pub left_foot_axis_deg: Option<f64>,
    /// Axis that keeps the right foot.
    pub right_foot_axis_deg: Option<f64>,
}

impl Polariser {
    pub(super) fn new(sun_elevation_deg: f64, primary: &LitBow) -> Self {
        let degree = primary.degree_of_polarisation.unwrap_or(0.0);
        let radius_deg = primary.brightest_deg.unwrap_or(primary.radius_deg);
        // At a foot the tangent leans from the vertical toward the crown by F, sin F = sin h/sin ρ.
        let lean = sun_elevation_deg.to_radians().sin() / radius_deg.to_radians().sin();
        let lean_deg = Some(lean).filter(|lean| lean.abs() < 1.0).map(|lean| lean.asin().to_degrees());
        Self {
            along_passes: round(f64::midpoint(1.0, degree), 3),
            across_passes: round(f64::midpoint(1.0, -degree), 3),
            crown_axis_deg: 0.0,
            left_foot_axis_deg: lean_deg.map(|lean| round(90.0 - lean, 1)),
            right_foot_axis_deg: lean_deg.map(|lean| round(90.0 + lean, 1)),
        }
    }
}
