//! The horizon in use: level, lowered for a raised eye, or the skyline of the terrain.

use thiserror::Error;

use crate::bounds::{OutOfBounds, SKYLINE_AZIMUTH, SKYLINE_ELEVATION};

/// Mean radius of the Earth, m (IUGG 1980, mean radius R1).
pub const EARTH_RADIUS_M: f64 = 6_371_008.8;

/// Refraction coefficient of surveying near the ground (common practice).
pub const REFRACTION_COEFFICIENT: f64 = 0.13;

/// Dip of the sea horizon in degrees for an eye at a height in metres: acos(R'/(R' + H)) with R' = R/(1 - k), closed form
/// of spherical geometry with the ray bent as a circle of curvature k/R.
pub fn dip_deg(eye_height_m: f64, refraction_coefficient: f64) -> f64 {
    let radius_m = EARTH_RADIUS_M / (1.0 - refraction_coefficient);
    let height_m = eye_height_m.max(0.0);
    // acos(R'/(R' + H)) loses digits for small H; the tangent from outside a circle has length sqrt(H(2R' + H)).
    (height_m * (2.0 * radius_m + height_m)).sqrt().atan2(radius_m).to_degrees()
}

/// Elevation of the terrain by azimuth: straight lines between points, closed through north.
#[derive(Debug, Clone, PartialEq)]
pub struct Skyline {
    points: Vec<(f64, f64)>,
    lowest_deg: f64,
    highest_deg: f64,
}

/// Why a skyline was refused.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum SkylineError {
    /// A number is out of its range.
    #[error("skyline point {index}: {source}")]
    Bounds {
        /// Index of the point, from 0.
        index: usize,
        /// What is wrong.
        source: OutOfBounds,
    },
    /// Two points at one azimuth (0 and 360 are one).
    #[error("two skyline points at azimuth {0} deg")]
    Twice(f64),
}

impl Skyline {
    /// A skyline from (azimuth, elevation) pairs in degrees, in any order. None from an empty list: the horizon is level.
    ///
    /// # Errors
    /// [`SkylineError`] when a number is out of range or an azimuth comes twice.
    pub fn new(pairs: &[(f64, f64)]) -> Result<Option<Self>, SkylineError> {
        let mut points = Vec::with_capacity(pairs.len());
        for (index, &(azimuth, elevation)) in pairs.iter().enumerate() {
            let bounds = |source| SkylineError::Bounds { index, source };
            let azimuth = SKYLINE_AZIMUTH.check(azimuth).map_err(bounds)? % 360.0;
            points.push((azimuth, SKYLINE_ELEVATION.check(elevation).map_err(bounds)?));
        }
        points.sort_by(|a, b| a.0.total_cmp(&b.0));
        if let Some(pair) = points.windows(2).find(|pair| pair[0].0 >= pair[1].0) {
            return Err(SkylineError::Twice(pair[0].0));
        }
        let lowest_deg = points.iter().map(|point| point.1).fold(f64::INFINITY, f64::min);
        let highest_deg = points.iter().map(|point| point.1).fold(f64::NEG_INFINITY, f64::max);
        Ok((!points.is_empty()).then_some(Self { points, lowest_deg, highest_deg }))
    }

    /// Elevation of the skyline at an azimuth in [0, 360], degrees.
    pub fn elevation_deg(&self, azimuth_deg: f64) -> f64 {
        let count = self.points.len();
        let after = self.points.partition_point(|point| point.0 <= azimuth_deg);
        let (left, right) = (self.points[(after + count - 1) % count], self.points[after % count]);
        let width = (right.0 - left.0).rem_euclid(360.0);
        if width == 0.0 {
            return left.1;
        }
        let along = (azimuth_deg - left.0).rem_euclid(360.0) / width;
        left.1 + (right.1 - left.1) * along
    }
}

/// The limit above which the sky, and the rain before the ground, can be seen.
#[derive(Debug, Clone, PartialEq)]
pub enum Horizon {
    /// One elevation all round, degrees: 0, or minus the dip.
    Level(f64),
    /// The skyline of the terrain.
    Skyline(Skyline),
}

impl Horizon {
    /// Elevation of the horizon at an azimuth, degrees.
    pub fn elevation_deg(&self, azimuth_deg: f64) -> f64 {
        match self {
            Self::Level(elevation) => *elevation,
            Self::Skyline(skyline) => skyline.elevation_deg(azimuth_deg),
        }
    }

    /// The points of the skyline by rising azimuth, degrees; none where the horizon is level.
    pub fn points(&self) -> &[(f64, f64)] {
        match self {
            Self::Level(_) => &[],
            Self::Skyline(skyline) => &skyline.points,
        }
    }

    /// Least distance in azimuth between two neighbouring points of the skyline, degrees; 360 where it has no two.
    pub fn narrowest_deg(&self) -> f64 {
        let points = self.points();
        let next = points.iter().cycle().skip(1);
        let widths = points.iter().zip(next).map(|(here, next)| (next.0 - here.0).rem_euclid(360.0));
        widths.filter(|width| *width > 0.0).fold(360.0, f64::min)
    }

    /// Lowest and highest elevation all round, degrees.
    pub fn extent_deg(&self) -> (f64, f64) {
        match self {
            Self::Level(elevation) => (*elevation, *elevation),
            Self::Skyline(skyline) => (skyline.lowest_deg, skyline.highest_deg),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_run_straight_between_points_and_through_north() {
        let skyline = Skyline::new(&[(90.0, 0.2), (350.0, 4.0), (10.0, 2.0)]).unwrap().unwrap();
        for (azimuth, expected) in [(10.0, 2.0), (50.0, 1.1), (90.0, 0.2), (350.0, 4.0), (0.0, 3.0), (360.0, 3.0)] {
            assert!((skyline.elevation_deg(azimuth) - expected).abs() < 1e-12, "at {azimuth}");
        }
    }

    #[test]
    fn nonsense_is_refused_by_name() {
        assert_eq!(Skyline::new(&[]), Ok(None));
        assert_eq!(Skyline::new(&[(0.0, 1.0), (360.0, 2.0)]), Err(SkylineError::Twice(0.0)));
        let refusal = Skyline::new(&[(0.0, 1.0), (10.0, 91.0)]).unwrap_err().to_string();
        assert_eq!(refusal, "skyline point 1: 91 is out of range: skyline elevation must lie between -90 and 90 deg");
        assert!(Skyline::new(&[(f64::NAN, 1.0)]).is_err());
    }
}
