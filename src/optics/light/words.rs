//! What to expect, in words.

use super::answer::LitBow;
use super::asked::{AskedDrops, Question};
use crate::optics::scene::{BEHIND_REFLECTANCE, SEEN_FROM};
use crate::optics::water::Water;

/// Elevation of the Sun under which little but red is left of a bow.
const RED_BELOW_DEG: f64 = 2.0;

/// A few sentences on the bow.
pub(super) fn expect(question: &Question, bows: &[LitBow], supernumeraries: u32) -> String {
    let [primary, secondary] = bows else { return String::new() };
    if primary.brightest_deg.is_none() {
        return "Drops this small make no bow between 30 and 60 degrees from the antisolar point.".to_owned();
    }
    let mut sentences = Vec::new();
    sentences.push(if primary.contrast < SEEN_FROM {
        "Too faint to be seen.".to_owned()
    } else {
        let strength = match primary.contrast {
            ..0.08 => "A faint bow",
            ..0.3 => "A clear bow",
            ..1.0 => "A bright bow",
            _ => "A very bright bow",
        };
        format!("{strength}, {}.", colours(question, primary))
    });
    if question.sun_elevation_deg >= primary.radius_deg {
        sentences.push("The Sun is too high: on level ground the bow lies below the horizon.".to_owned());
    }
    if primary.contrast >= SEEN_FROM {
        let coloured =
            question.wavelength_um.is_none() && !broad(primary) && question.sun_elevation_deg >= RED_BELOW_DEG;
        sentences.push(match secondary.contrast {
            ..SEEN_FROM => "The secondary will hardly show.".to_owned(),
            _ if coloured => "The secondary shows too, its colours reversed, with a darker band between.".to_owned(),
            _ => "The secondary shows too, much weaker.".to_owned(),
        });
        match supernumeraries {
            0 => {}
            1 => sentences.push("One supernumerary bow inside the primary.".to_owned()),
            many => sentences.push(format!("{many} supernumerary bows inside the primary.")),
        }
        let across = match primary.degree_of_polarisation.unwrap_or(0.0) {
            ..0.5 => "weakens it a little",
            ..0.8 => "weakens it much",
            _ => "nearly wipes it out",
        };
        sentences.push(format!(
            "A polarising filter strengthens the bow with its axis along the arc and {across} with its axis across it."
        ));
    }
    sentences.join(" ")
}

fn colours(question: &Question, primary: &LitBow) -> &'static str {
    if question.wavelength_um.is_some() {
        "in one colour"
    } else if broad(primary) {
        "broad and nearly white"
    } else if question.sun_elevation_deg < RED_BELOW_DEG {
        "red, with little else"
    } else if question.sun_elevation_deg < 6.0 {
        "mostly red and orange, weak in blue"
    } else {
        "in all its colours"
    }
}

/// Fog bows are: their colours overlap to white.
fn broad(primary: &LitBow) -> bool {
    primary.width_deg.is_none_or(|width| width > 3.5)
}

/// What was taken for granted.
pub(super) fn assumed(question: &Question) -> Vec<String> {
    let mut assumed = vec![
        format!(
            "behind the rain: a grey of reflectance {BEHIND_REFLECTANCE} under the Sun and a partly cloudy sky of the hour"
        ),
        "all rain along the view is sunlit; light scattered more than once is estimated, good to a factor of two"
            .to_owned(),
        "air at sea level with 0.3 atm-cm of ozone; the Sun's disc at its mean of 0.533 degrees".to_owned(),
        "drops are spheres: large ones are flattened, which weakens the crown in heavy rain".to_owned(),
    ];
    let sizes = match question.drops {
        AskedDrops::RainMmH(_) => "drop sizes after Marshall and Palmer, 0.1 to 5 mm in diameter",
        AskedDrops::DropRadiusUm(_) => "drops of nearly one size, with 3 % standard deviation",
        AskedDrops::Fog(_) => "drop sizes by a gamma distribution",
    };
    assumed.push(sizes.to_owned());
    if question.water == Water::Sea {
        assumed.push("sea water of 35 g/kg".to_owned());
    }
    assumed
}
