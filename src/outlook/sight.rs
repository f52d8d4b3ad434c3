//! Where an observer looks for the bow at an instant: directions along the visible arc, cut into pieces of range.

use chrono::{DateTime, Utc};

use crate::sky::circle::{Arc, Circle};
use crate::sky::direction::Direction;
use crate::sky::horizon::Horizon;
use crate::sky::observer::Observer;
use crate::sky::sun::Sun;

use super::answer::Limit;

/// Directions followed along the arc.
pub const DIRECTIONS: usize = 7;
/// Pieces of range along a direction.
pub const PIECES: usize = 8;
/// Nearest rain that counts, km.
pub const NEAREST_KM: f64 = 0.1;
/// Farthest rain that counts, km, however clear the air.
pub const FARTHEST_KM: f64 = 20.0;
/// Length of arc that shares one gap in the clouds, as an angle along the circle, radians: parts of the arc farther apart
/// than this are lit or shaded on their own. Assumption of this project.
const SECTOR: f64 = std::f64::consts::FRAC_PI_3;

/// Sun and bow for an observer at an instant.
#[derive(Debug, Clone)]
pub struct Sight {
    /// The Sun.
    pub sun: Sun,
    /// What of the primary's red edge stands over the horizon in use.
    pub arc: Arc,
    /// The circle of the primary's red edge.
    pub circle: Circle,
    /// Why no bow is possible whatever the weather, where that is so.
    pub limit: Option<Limit>,
}

impl Sight {
    /// The sight at an instant; `radius_deg` is that of the primary's red edge.
    pub fn at(observer: &Observer, radius_deg: f64, time: DateTime<Utc>) -> Self {
        let sun = Sun::at(observer, time);
        let circle = Circle::new(sun.antisolar_point(), radius_deg);
        let arc = circle.over(&observer.horizon);
        let limit = limit(observer, &sun, &circle, &arc);
        Self { sun, arc, circle, limit }
    }

    /// The directions in which the arc is looked at, evenly spread over its visible pieces.
    pub fn rays(&self) -> [Option<Ray>; DIRECTIONS] {
        let length: f64 = self.arc.runs.iter().map(|(from, to)| to - from).sum();
        let sectors = (length / SECTOR).ceil().clamp(1.0, DIRECTIONS as f64);
        std::array::from_fn(|index| {
            let share = (index as f64 + 0.5) / DIRECTIONS as f64;
            let mut along = share * length;
            for &(from, to) in &self.arc.runs {
                if along <= to - from {
                    return Some(Ray::toward(self.circle.point(from + along), (share * sectors) as usize));
                }
                along -= to - from;
            }
            None
        })
    }
}

/// By how many degrees Sun and bow clear their limits; zero or more while a bow is possible. The margin of the search for
/// the exact ends of windows.
pub fn margin_deg(observer: &Observer, radius_deg: f64, time: DateTime<Utc>) -> f64 {
    let sun = Sun::at(observer, time);
    let clear_deg = sun.over_horizon_deg(observer);
    if clear_deg < 0.0 {
        return clear_deg;
    }
    clear_deg.min(Circle::new(sun.antisolar_point(), radius_deg).reach_deg(&observer.horizon))
}

/// What geometry alone forbids.
pub fn limit(observer: &Observer, sun: &Sun, circle: &Circle, arc: &Arc) -> Option<Limit> {
    if sun.over_horizon_deg(observer) < 0.0 {
        return Some(if sun.over_deg(-observer.dip_deg) < 0.0 { Limit::SunDown } else { Limit::Skyline });
    }
    if arc.runs.is_empty() {
        let over_level_deg = circle.reach_deg(&Horizon::Level(-observer.dip_deg));
        return Some(if over_level_deg < 0.0 { Limit::SunTooHigh } else { Limit::Skyline });
    }
    None
}

/// A direction along the arc.
#[derive(Debug, Clone, Copy)]
pub struct Ray {
    /// Horizontal part toward east, per unit of range.
    pub east: f64,
    /// Horizontal part toward north, per unit of range.
    pub north: f64,
    /// Rise per unit of range.
    pub up: f64,
    /// Which sector of the arc it lies in, below [`DIRECTIONS`].
    pub sector: usize,
}

/// A piece of a ray: its middle and length.
#[derive(Debug, Clone, Copy, Default)]
pub struct Piece {
    /// Range of the middle, km.
    pub range_km: f64,
    /// Length, km.
    pub length_km: f64,
}

impl Ray {
    fn toward(direction: Direction, sector: usize) -> Self {
        Self { east: direction.east, north: direction.north, up: direction.up, sector: sector.min(DIRECTIONS - 1) }
    }

    /// Pieces of range, growing by a constant factor, over the way on which rain can be seen: at least [`NEAREST_KM`] away,
    /// within the visual range, between the ground and the top of the rain. Heights are above the ground; an eye above the
    /// rain looks down into it. None when there is no such way.
    pub fn pieces(&self, visual_range_km: f64, rain_top_km: f64, eye_height_km: f64) -> Option<[Piece; PIECES]> {
        let over_top_km = eye_height_km - rain_top_km;
        let (enter_km, leave_km) = if self.up < 0.0 {
            (over_top_km.max(0.0) / -self.up, eye_height_km / -self.up)
        } else if over_top_km >= 0.0 {
            return None;
        } else {
            (0.0, if self.up > 0.0 { -over_top_km / self.up } else { f64::INFINITY })
        };
        let begin_km = enter_km.max(NEAREST_KM);
        let end_km = visual_range_km.min(FARTHEST_KM).min(leave_km);
        if end_km <= begin_km {
            return None;
        }
        let growth = (end_km / begin_km).powf(1.0 / PIECES as f64);
        let mut from_km = begin_km;
        Some(std::array::from_fn(|_| {
            let to_km = from_km * growth;
            let piece = Piece { range_km: 0.5 * (from_km + to_km), length_km: to_km - from_km };
            from_km = to_km;
            piece
        }))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pieces_cover_the_way_without_gap() {
        let ray = Ray { east: 0.0, north: 0.8, up: 0.6, sector: 0 };
        let pieces = ray.pieces(30.0, 1.5, 0.002).unwrap();
        let end: f64 = NEAREST_KM + pieces.iter().map(|piece| piece.length_km).sum::<f64>();
        assert!((end - (1.5 - 0.002) / 0.6).abs() < 1e-9);
        assert!(ray.pieces(30.0, 0.05, 0.002).is_none(), "rain ends overhead below the nearest range");
        let down = Ray { up: -0.6, ..ray };
        assert!(down.pieces(30.0, 1.5, 0.002).is_none(), "the ground is right below");
        assert!(down.pieces(30.0, 1.5, 0.6).is_some(), "a high stand sees rain below");
        assert!(ray.pieces(30.0, 1.5, 2.0).is_none(), "nothing to light above the rain");
        let from_above = down.pieces(30.0, 1.5, 3.0).unwrap();
        let begin = from_above[0].range_km - 0.5 * from_above[0].length_km;
        let last = from_above[PIECES - 1];
        assert!((begin - 2.5).abs() < 1e-9 && (last.range_km + 0.5 * last.length_km - 5.0).abs() < 1e-9);
    }
}
