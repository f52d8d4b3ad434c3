//! The weather laid round an observer: one field, asked at distances east and north of the eye.

use crate::bounds::Place;
use crate::sky::observer::Observer;
use crate::weather::field::{Field, Series, Space};
use crate::weather::quantity::Quantity;

/// Kilometres in a degree of latitude on a sphere of the Earth's mean radius.
const KM_PER_DEG: f64 = crate::sky::horizon::EARTH_RADIUS_M / 1000.0 * std::f64::consts::PI / 180.0;

/// Slowest wind that carries a series at one point out into space, m/s; below it the weather stands.
const SLOWEST_WIND_M_S: f64 = 1.0;

/// A field round an observer.
#[derive(Debug, Clone, Copy)]
pub struct Scene<'a> {
    field: &'a Field,
    cells: usize,
    place: Place,
    lon_per_km: f64,
}

/// The wind at the observer, m/s toward east and north.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Wind {
    /// Toward east, m/s.
    pub east_m_s: f64,
    /// Toward north, m/s.
    pub north_m_s: f64,
}

/// A scene at an instant: values by distance.
#[derive(Debug, Clone, Copy)]
pub struct Instant<'a> {
    scene: Scene<'a>,
    time_s: i64,
    /// Seconds per kilometre toward east and north by which a point's series runs behind; zero for a grid.
    lag_s_per_km: (f64, f64),
}

impl<'a> Scene<'a> {
    /// The scene round an observer; none when the field does not reach there.
    pub fn new(field: &'a Field, observer: &Observer) -> Option<Self> {
        let place = observer.place;
        field.corners(place.lat_deg(), place.lon_deg())?;
        let lon_per_km = 1.0 / (KM_PER_DEG * place.lat_deg().to_radians().cos().max(0.01));
        Some(Self { field, cells: field.cells(), place, lon_per_km })
    }

    /// Whether the weather stands at one point only and has to be laid out by the wind.
    pub fn is_point(&self) -> bool {
        matches!(self.field.space, Space::Point(_))
    }

    /// The value overhead at a time, where the field has one.
    pub fn overhead(&self, quantity: Quantity, time_s: i64) -> Option<f64> {
        self.field.at(quantity, self.place, time_s).map(f64::from)
    }

    /// The wind overhead, from its components or from speed and direction.
    pub fn wind(&self, time_s: i64) -> Option<Wind> {
        let pair = |a, b| Some((self.overhead(a, time_s)?, self.overhead(b, time_s)?));
        if let Some((east_m_s, north_m_s)) = pair(Quantity::WindEast, Quantity::WindNorth) {
            return Some(Wind { east_m_s, north_m_s });
        }
        let (speed, from_deg) = pair(Quantity::WindSpeed, Quantity::WindFrom)?;
        let (sin, cos) = from_deg.to_radians().sin_cos();
        Some(Wind { east_m_s: -speed * sin, north_m_s: -speed * cos })
    }

    /// The scene at an instant. A series at one point is laid out by the wind as a frozen field (Taylor 1938, Proc. R. Soc.
    /// A 164, 476-490): what stands upwind is what comes later.
    pub fn at(&self, time_s: i64, wind: Option<Wind>) -> Instant<'a> {
        let lag_s_per_km = match wind {
            Some(Wind { east_m_s, north_m_s }) if self.is_point() => {
                let square = east_m_s * east_m_s + north_m_s * north_m_s;
                if square < SLOWEST_WIND_M_S * SLOWEST_WIND_M_S {
                    (0.0, 0.0)
                } else {
                    (1000.0 * east_m_s / square, 1000.0 * north_m_s / square)
                }
            }
            _ => (0.0, 0.0),
        };
        Instant { scene: *self, time_s, lag_s_per_km }
    }

    /// The values of a quantity, where the field has it.
    pub fn series(&self, quantity: Quantity) -> Option<&'a Series> {
        self.field.series(quantity)
    }
}

impl Instant<'_> {
    /// The value of a series at a distance; NaN where the field says nothing.
    pub fn value(&self, series: &Series, east_km: f64, north_km: f64) -> f32 {
        let lag_s = self.lag_s_per_km.0 * east_km + self.lag_s_per_km.1 * north_km;
        let Some(bracket) = series.times.bracket(self.time_s - lag_s as i64) else { return f32::NAN };
        if self.scene.is_point() {
            return series.sample(1, bracket, &[(0, 1.0), (0, 0.0), (0, 0.0), (0, 0.0)]);
        }
        let lat_deg = self.scene.place.lat_deg() + north_km / KM_PER_DEG;
        let lon_deg = self.scene.place.lon_deg() + east_km * self.scene.lon_per_km;
        match self.scene.field.corners(lat_deg, lon_deg) {
            Some(corners) => series.sample(self.scene.cells, bracket, &corners),
            None => f32::NAN,
        }
    }
}
