//! Who looks, from where, over which horizon.

use super::horizon::{Horizon, REFRACTION_COEFFICIENT, Skyline, dip_deg};
use super::refraction::Air;
use crate::bounds::Place;

/// An observer: place, height above sea, eye height above the surrounding ground, skyline.
#[derive(Debug, Clone, PartialEq)]
pub struct Observer {
    /// Where.
    pub place: Place,
    /// Ground above mean sea level, m.
    pub ground_m: f64,
    /// Eye above the ground or water around, m.
    pub eye_height_m: f64,
    /// Depression of the sea horizon, degrees.
    pub dip_deg: f64,
    /// The horizon in use for the bow.
    pub horizon: Horizon,
}

impl Observer {
    /// An observer whose numbers were checked: without a skyline the horizon is level, lowered by the dip of the eye.
    pub fn new(place: Place, ground_m: f64, eye_height_m: f64, skyline: Option<Skyline>) -> Self {
        let dip = dip_deg(eye_height_m, REFRACTION_COEFFICIENT);
        let horizon = skyline.map_or(Horizon::Level(-dip), Horizon::Skyline);
        Self { place, ground_m, eye_height_m, dip_deg: dip, horizon }
    }

    /// The same observer with the eye at another height; a skyline stays as it was seen.
    pub fn with_eye_height(&self, eye_height_m: f64) -> Self {
        let skyline = match &self.horizon {
            Horizon::Level(_) => None,
            Horizon::Skyline(skyline) => Some(skyline.clone()),
        };
        Self::new(self.place, self.ground_m, eye_height_m, skyline)
    }

    /// The air at the eye, for refraction.
    pub fn air(&self) -> Air {
        Air::at_height(self.ground_m + self.eye_height_m)
    }
}
