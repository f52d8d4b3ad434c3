//! Where the Sun is and whether it is out.

use chrono::{DateTime, TimeDelta, Utc};
use spa::StdFloatOps;

use super::direction::Direction;
use super::observer::Observer;
use super::refraction::{Air, refraction_deg};
use crate::bounds::Place;

/// Semidiameter of the Sun's disc in the convention for rising and setting: 16 arcmin (The Nautical Almanac).
pub const SEMIDIAMETER_DEG: f64 = 16.0 / 60.0;

/// Refraction at the horizon in the convention for rising and setting: 34 arcmin (The Nautical Almanac).
pub const HORIZON_REFRACTION_DEG: f64 = 34.0 / 60.0;

/// The Sun for an observer at an instant.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Sun {
    /// Where its centre would stand without air.
    pub airless: Direction,
    /// Where its centre is seen.
    pub apparent: Direction,
}

impl Sun {
    /// The Sun for an observer at a time. Airless position within 0.010 degrees of the JPL ephemeris DE421 up to 2045.
    pub fn at(observer: &Observer, time: DateTime<Utc>) -> Self {
        let airless = airless(observer.place, time);
        let elevation_deg = airless.elevation_deg();
        let apparent = Direction::from_angles(
            airless.azimuth_deg(),
            elevation_deg + refraction_deg(elevation_deg, observer.air()),
        );
        Self { airless, apparent }
    }

    /// The direction opposite the apparent Sun.
    pub fn antisolar_point(&self) -> Direction {
        self.apparent.opposite()
    }

    /// By how many degrees the Sun's upper limb stands over the observer's horizon; negative while it is hidden.
    ///
    /// Over a level horizon at sea level this is the almanacs' convention of -0.8333 degrees: refraction counts at most
    /// 34 arcmin. Over a skyline the refraction is that of the skyline's elevation, and the sea horizon still hides the
    /// Sun where the skyline lies below it.
    pub fn over_horizon_deg(&self, observer: &Observer) -> f64 {
        let lowest = observer.horizon.elevation_deg(self.airless.azimuth_deg()).max(-observer.dip_deg);
        self.over_deg(lowest)
    }

    /// By how many degrees the Sun's upper limb stands over an elevation, by the same convention.
    pub fn over_deg(&self, elevation_deg: f64) -> f64 {
        let airless_deg = self.airless.elevation_deg();
        let lifted = airless_deg + refraction_deg(airless_deg, Air::STANDARD).min(HORIZON_REFRACTION_DEG);
        lifted + SEMIDIAMETER_DEG - elevation_deg
    }
}

/// Direction of the Sun's centre without air, by the crate `spa`, which knows whole seconds only: between them the
/// direction is blended.
pub fn airless(place: Place, time: DateTime<Utc>) -> Direction {
    let share = f64::from(time.timestamp_subsec_nanos()) * 1e-9;
    let now = at_whole_second(place, time);
    if share == 0.0 {
        return now;
    }
    let next = at_whole_second(place, time + TimeDelta::seconds(1));
    Direction::blend(&[(now, 1.0 - share), (next, share)]).unwrap_or(now)
}

fn at_whole_second(place: Place, time: DateTime<Utc>) -> Direction {
    match spa::solar_position::<StdFloatOps>(time, place.lat_deg(), place.lon_deg()) {
        // At the zenith itself the crate's arc cosine can leave its domain by a rounding.
        Ok(position) if position.zenith_angle.is_finite() => {
            Direction::from_angles(position.azimuth, 90.0 - position.zenith_angle)
        }
        Ok(_) | Err(_) => Direction::ZENITH,
    }
}
