//! The ray that makes a bow: the one whose deviation is stationary (Descartes 1637, Newton 1704).

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

/// What a bow is a circle around.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum Centre {
    /// The point opposite the Sun: orders 1 and 2 in water.
    AntisolarPoint,
    /// The Sun itself: orders 3 and 4 in water.
    Sun,
}

/// The stationary ray of one order through a spherical drop.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ray {
    /// Number of reflections inside the drop.
    pub order: u32,
    /// Angle of incidence at the surface, degrees.
    pub incidence_deg: f64,
    /// Angle of refraction inside, degrees.
    pub refraction_deg: f64,
    /// Distance of the incoming ray from the drop's centre, in drop radii.
    pub impact_parameter: f64,
    /// Total deviation, degrees; beyond 360 for high orders.
    pub deviation_deg: f64,
}

impl Ray {
    /// The stationary ray of `order` reflections in a drop of index `n` relative to the air around it.
    ///
    /// cos² i = (n² - 1)/(k (k + 2)), sin i = n sin r, D = 2 (i - r) + k (180° - 2 r). `None` where there is no such ray: order 0,
    /// an index not above 1, or one of k + 1 or more, for which even the ray through the centre leaves with the least deviation.
    pub fn stationary(n: f64, order: u32) -> Option<Self> {
        let k = f64::from(order);
        if order == 0 || !(n > 1.0 && n < k + 1.0) {
            return None;
        }
        let cos2 = (n * n - 1.0) / (k * (k + 2.0));
        let impact_parameter = (1.0 - cos2).sqrt();
        let incidence_deg = cos2.sqrt().acos().to_degrees();
        let refraction_deg = (impact_parameter / n).asin().to_degrees();
        let deviation_deg = 2.0 * (incidence_deg - refraction_deg) + k * (180.0 - 2.0 * refraction_deg);
        Some(Self { order, incidence_deg, refraction_deg, impact_parameter, deviation_deg })
    }

    /// Angle between the Sun's forward direction and the light leaving the drop, 0 to 180 degrees.
    pub fn scattering_angle_deg(&self) -> f64 {
        let turned = self.deviation_deg % 360.0;
        turned.min(360.0 - turned)
    }

    /// What the bow surrounds: whichever of the two is nearer.
    pub fn centre(&self) -> Centre {
        if self.scattering_angle_deg() > 90.0 { Centre::AntisolarPoint } else { Centre::Sun }
    }

    /// Angular distance of the bow from its centre, 0 to 90 degrees.
    pub fn radius_deg(&self) -> f64 {
        let angle = self.scattering_angle_deg();
        angle.min(180.0 - angle)
    }
}

/// Angular distance of a bow from its centre, in degrees; `None` where [`Ray::stationary`] finds no bow.
pub fn radius_deg(n: f64, order: u32) -> Option<f64> {
    Ray::stationary(n, order).map(|ray| ray.radius_deg())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_bow_without_a_stationary_ray() {
        for (n, order) in [(1.333, 0), (1.0, 1), (0.9, 1), (2.0, 1), (3.5, 2), (f64::NAN, 1), (f64::INFINITY, 3)] {
            assert_eq!(Ray::stationary(n, order), None, "n = {n}, order {order}");
        }
        assert!(radius_deg(1.999, 1).is_some_and(|radius| radius < 0.1));
        assert!(radius_deg(1.333, u32::MAX).is_some_and(f64::is_finite));
    }

    #[test]
    fn the_deviation_is_stationary_there() {
        for order in 1..=8 {
            let ray = Ray::stationary(1.3333, order).unwrap();
            let deviation = |incidence_deg: f64| {
                let refraction_deg = (incidence_deg.to_radians().sin() / 1.3333).asin().to_degrees();
                2.0 * (incidence_deg - refraction_deg) + f64::from(order) * (180.0 - 2.0 * refraction_deg)
            };
            for aside_deg in [-3.0, -0.5, 0.5, 3.0] {
                assert!(deviation(ray.incidence_deg + aside_deg) > ray.deviation_deg);
            }
        }
    }
}
