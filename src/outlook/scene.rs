//! The weather laid round an observer: one field, asked at distances east and north of the eye.

use crate::bounds::Place;
use crate::sky::observer::Observer;
use crate::weather::field::{Field, KM_PER_DEG, Series, Space};
use crate::weather::quantity::Quantity;

/// Slowest wind that carries a series at one point out into space, m/s; a slower one tells nothing.
const SLOWEST_WIND_M_S: f64 = 1.0;

/// Unevenness of an axis that still counts as even, as a share of its step.
const EVEN: f64 = 1e-6;

/// A field round an observer.
#[derive(Debug, Clone, Copy)]
pub struct Scene<'a> {
    field: &'a Field,
    cells: usize,
    place: Place,
    lon_per_km: f64,
    even: Option<EvenGrid>,
}

/// A grid with even axes, addressed by kilometres from the observer.
#[derive(Debug, Clone, Copy)]
struct EvenGrid {
    row: EvenAxis,
    column: EvenAxis,
    columns: usize,
}

/// An even axis: the position of the observer on it, in steps, and how many steps a kilometre is.
#[derive(Debug, Clone, Copy)]
struct EvenAxis {
    here: f64,
    per_km: f64,
    last: f64,
}

/// The wind at the observer, m/s toward east and north.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Wind {
    /// Toward east, m/s.
    pub east_m_s: f64,
    /// Toward north, m/s.
    pub north_m_s: f64,
}

/// One series at an instant: values by distance.
#[derive(Debug, Clone, Copy)]
pub struct Look<'a> {
    scene: &'a Scene<'a>,
    series: &'a Series,
    time_s: i64,
    /// Where the instant lies in the series, where that is the same all round.
    bracket: Option<(usize, usize, f32)>,
    /// Seconds per kilometre toward east and north by which a point's series runs behind; zero for a grid.
    lag_s_per_km: (f64, f64),
}

impl<'a> Scene<'a> {
    /// The scene round an observer; none when the field does not reach there.
    pub fn new(field: &'a Field, observer: &Observer) -> Option<Self> {
        let place = observer.place;
        field.corners(place.lat_deg(), place.lon_deg())?;
        let lon_per_km = 1.0 / (KM_PER_DEG * place.lat_deg().to_radians().cos().max(0.01));
        let even = EvenGrid::new(field, place, lon_per_km);
        Some(Self { field, cells: field.cells(), place, lon_per_km, even })
    }

    /// Whether the weather stands at one point only and has to be laid out by the wind.
    pub fn is_point(&self) -> bool {
        matches!(self.field.space, Space::Point(_))
    }

    /// The value overhead at a time, where the field has one.
    pub fn overhead(&self, quantity: Quantity, time_s: i64) -> Option<f64> {
        self.field.at(quantity, self.place, time_s).map(f64::from)
    }

    /// The wind overhead, from its components or from speed and direction; none in a calm.
    pub fn wind(&self, time_s: i64) -> Option<Wind> {
        let pair = |a, b| Some((self.overhead(a, time_s)?, self.overhead(b, time_s)?));
        let components = pair(Quantity::WindEast, Quantity::WindNorth).or_else(|| {
            let (speed, from_deg) = pair(Quantity::WindSpeed, Quantity::WindFrom)?;
            let (sin, cos) = from_deg.to_radians().sin_cos();
            Some((-speed * sin, -speed * cos))
        });
        let (east_m_s, north_m_s) = components?;
        (east_m_s.hypot(north_m_s) >= SLOWEST_WIND_M_S).then_some(Wind { east_m_s, north_m_s })
    }

    /// A series at an instant. One at a point is laid out by the wind as a frozen field (Taylor 1938, Proc. R. Soc. A 164,
    /// 476-490): what stands upwind is what comes later.
    pub fn look(&'a self, series: &'a Series, time_s: i64, wind: Option<Wind>) -> Look<'a> {
        let lag_s_per_km = match wind {
            Some(Wind { east_m_s, north_m_s }) if self.is_point() => {
                let square = east_m_s * east_m_s + north_m_s * north_m_s;
                (1000.0 * east_m_s / square, 1000.0 * north_m_s / square)
            }
            _ => (0.0, 0.0),
        };
        Look { scene: self, series, time_s, bracket: series.times.bracket(time_s), lag_s_per_km }
    }

    /// Whether the field tells cloud bases above the sea rather than above the ground.
    pub fn cloud_base_above_sea(&self) -> bool {
        self.field.cloud_base_above_sea
    }

    /// The values of a quantity, where the field has it.
    pub fn series(&self, quantity: Quantity) -> Option<&'a Series> {
        self.field.series(quantity)
    }
}

impl EvenGrid {
    /// None for a point and for axes that are uneven, have one tick only, or close round the globe: those take the
    /// general way.
    fn new(field: &Field, place: Place, lon_per_km: f64) -> Option<Self> {
        let Space::Grid { lats_deg, lons_deg } = &field.space else { return None };
        let (first, last) = (*lons_deg.first()?, *lons_deg.last()?);
        let turn = (place.lon_deg() - first).div_euclid(360.0) * 360.0;
        // A little west of the first longitude is not a whole turn east of it.
        let lon_deg =
            if place.lon_deg() - turn > last + 180.0 { place.lon_deg() - turn - 360.0 } else { place.lon_deg() - turn };
        if last - first > 300.0 {
            return None;
        }
        Some(Self {
            row: EvenAxis::new(lats_deg, place.lat_deg(), 1.0 / KM_PER_DEG)?,
            column: EvenAxis::new(lons_deg, lon_deg, lon_per_km)?,
            columns: lons_deg.len(),
        })
    }
}

impl EvenAxis {
    fn new(ticks: &[f64], here: f64, deg_per_km: f64) -> Option<Self> {
        let (first, last) = (*ticks.first()?, *ticks.last()?);
        let steps = ticks.len().checked_sub(1).filter(|&steps| steps > 0)? as f64;
        let step = (last - first) / steps;
        let even = ticks.iter().enumerate().all(|(i, tick)| (tick - first - step * i as f64).abs() < EVEN * step);
        even.then_some(Self { here: (here - first) / step, per_km: deg_per_km / step, last: steps })
    }

    /// The tick at or before a place and how far beyond it the place lies, in steps; none more than half a step outside.
    fn find(&self, km: f64) -> Option<(usize, f32)> {
        let at = self.here + km * self.per_km;
        if !(at >= -0.5 && at <= self.last + 0.5) {
            return None;
        }
        let at = at.clamp(0.0, self.last);
        let before = (at as usize).min(self.last as usize - 1);
        Some((before, (at - before as f64) as f32))
    }
}

impl Look<'_> {
    /// The value at a distance; NaN where the field says nothing.
    pub fn value(&self, east_km: f64, north_km: f64) -> f32 {
        if let Some(grid) = &self.scene.even {
            return self.on_even_grid(grid, east_km, north_km);
        }
        let lag_s = self.lag_s_per_km.0 * east_km + self.lag_s_per_km.1 * north_km;
        let bracket = if lag_s == 0.0 { self.bracket } else { self.series.times.bracket(self.time_s - lag_s as i64) };
        let Some(bracket) = bracket else { return f32::NAN };
        if self.scene.is_point() {
            return self.series.sample(1, bracket, &[(0, 1.0), (0, 0.0), (0, 0.0), (0, 0.0)]);
        }
        let lat_deg = self.scene.place.lat_deg() + north_km / KM_PER_DEG;
        let lon_deg = self.scene.place.lon_deg() + east_km * self.scene.lon_per_km;
        match self.scene.field.corners(lat_deg, lon_deg) {
            Some(corners) => self.series.sample(self.scene.cells, bracket, &corners),
            None => f32::NAN,
        }
    }

    fn on_even_grid(&self, grid: &EvenGrid, east_km: f64, north_km: f64) -> f32 {
        let Some((before, after, weight)) = self.bracket else { return f32::NAN };
        let (Some((row, v)), Some((column, u))) = (grid.row.find(north_km), grid.column.find(east_km)) else {
            return f32::NAN;
        };
        let corner = row * grid.columns + column;
        let slice = |index: usize| {
            let values = &self.series.values[index * self.scene.cells + corner..];
            let (south, north) = (&values[..2], &values[grid.columns..grid.columns + 2]);
            blend(blend(south[0], south[1], u), blend(north[0], north[1], u), v)
        };
        if weight > 0.0 { blend(slice(before), slice(after), weight) } else { slice(before) }
    }
}

/// Between two values; a missing one counts only where it has weight.
fn blend(from: f32, to: f32, weight: f32) -> f32 {
    if weight <= 0.0 {
        from
    } else if weight >= 1.0 {
        to
    } else {
        from + weight * (to - from)
    }
}
