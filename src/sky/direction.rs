//! Directions as unit vectors in the observer's frame.

/// A direction as a unit vector.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Direction {
    /// Toward true east.
    pub east: f64,
    /// Toward true north.
    pub north: f64,
    /// Toward the zenith.
    pub up: f64,
}

impl Direction {
    /// The zenith.
    pub const ZENITH: Self = Self { east: 0.0, north: 0.0, up: 1.0 };

    /// From azimuth (clockwise from true north) and elevation, degrees.
    pub fn from_angles(azimuth_deg: f64, elevation_deg: f64) -> Self {
        let (sin_azimuth, cos_azimuth) = azimuth_deg.to_radians().sin_cos();
        let (up, level) = elevation_deg.to_radians().sin_cos();
        Self { east: level * sin_azimuth, north: level * cos_azimuth, up }
    }

    /// Azimuth clockwise from true north, degrees, in [0, 360); 0 at zenith and nadir.
    pub fn azimuth_deg(&self) -> f64 {
        let azimuth = self.east.atan2(self.north).to_degrees();
        if azimuth < 0.0 { (azimuth + 360.0) % 360.0 } else { azimuth }
    }

    /// Elevation above the horizontal, degrees, -90 to 90.
    pub fn elevation_deg(&self) -> f64 {
        self.up.atan2(self.east.hypot(self.north)).to_degrees()
    }

    /// The opposite direction.
    pub fn opposite(&self) -> Self {
        Self { east: -self.east, north: -self.north, up: -self.up }
    }

    /// Cosine of the angle to another direction.
    pub fn dot(&self, other: &Self) -> f64 {
        self.east * other.east + self.north * other.north + self.up * other.up
    }

    /// Cross product: perpendicular to both, as long as the sine of the angle between them.
    pub fn cross(&self, other: &Self) -> Self {
        Self {
            east: self.north * other.up - self.up * other.north,
            north: self.up * other.east - self.east * other.up,
            up: self.east * other.north - self.north * other.east,
        }
    }

    /// Angle to another direction, degrees.
    pub fn angle_to(&self, other: &Self) -> f64 {
        self.cross(other).length().atan2(self.dot(other)).to_degrees()
    }

    /// A weighted sum of directions, brought back to length 1; none where they cancel.
    pub fn blend(parts: &[(Self, f64)]) -> Option<Self> {
        let mut sum = Self { east: 0.0, north: 0.0, up: 0.0 };
        for (part, weight) in parts {
            sum.east += part.east * weight;
            sum.north += part.north * weight;
            sum.up += part.up * weight;
        }
        let length = sum.length();
        (length > 1e-12).then(|| Self { east: sum.east / length, north: sum.north / length, up: sum.up / length })
    }

    fn length(&self) -> f64 {
        self.dot(self).sqrt()
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        #[test]
        fn angles_survive_the_round_trip(azimuth in 0.0..360.0_f64, elevation in -89.9..89.9_f64) {
            let direction = Direction::from_angles(azimuth, elevation);
            let turn = (direction.azimuth_deg() - azimuth).abs();
            prop_assert!(turn.min(360.0 - turn) < 1e-9);
            prop_assert!((direction.elevation_deg() - elevation).abs() < 1e-9);
            prop_assert!((direction.angle_to(&direction.opposite()) - 180.0).abs() < 1e-9);
        }
    }

    #[test]
    fn azimuth_stays_below_360() {
        let just_west_of_north = Direction { east: -1e-300, north: 1.0, up: 0.0 };
        assert!(just_west_of_north.azimuth_deg() < 360.0);
    }
}
