//! The circle of a bow round the antisolar point, and how much of it stands over the horizon.

use std::f64::consts::{PI, TAU};

use super::direction::Direction;
use super::horizon::Horizon;

/// Points by which a whole circle would be sampled before crossings with a skyline are narrowed: 2 degrees each.
const SAMPLES: usize = 180;

/// Same-signed neighbours nearer to the skyline than this may hide two crossings between them, degrees: more than a
/// circle can bulge over a straight skyline within one sample.
const BULGE_DEG: f64 = 0.05;

/// A circle on the sky. A point on it is named by its angle from the top, in radians, growing to the right as seen
/// facing the centre.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Circle {
    centre: Direction,
    top: Direction,
    right: Direction,
    cos_radius: f64,
    sin_radius: f64,
}

/// What of a circle stands over a horizon.
#[derive(Debug, Clone, PartialEq)]
pub struct Arc {
    /// The visible pieces as (from, to) angles, to > from; one of (-pi, pi) is the full circle.
    pub runs: Vec<(f64, f64)>,
    /// Share of the whole circle that is visible, 0..1.
    pub fraction: f64,
    /// Highest visible point.
    pub crown: Option<Direction>,
    /// Where the bow meets the horizon left and right of the hidden piece that holds its lowest point; none when nothing
    /// is visible or the lowest point is visible itself.
    pub feet: Option<(Direction, Direction)>,
}

impl Circle {
    /// The circle of a radius in degrees round a centre.
    pub fn new(centre: Direction, radius_deg: f64) -> Self {
        let zenith = Direction::ZENITH;
        let lift = -centre.up;
        // With the centre at zenith or nadir no point is higher than another; the top then lies toward north.
        let top = Direction::blend(&[(zenith, 1.0), (centre, lift)])
            .filter(|_| centre.up.abs() < 1.0 - 1e-12)
            .unwrap_or(Direction { east: 0.0, north: 1.0, up: 0.0 });
        let (sin_radius, cos_radius) = radius_deg.to_radians().sin_cos();
        Self { centre, top, right: centre.cross(&top), cos_radius, sin_radius }
    }

    /// The point at an angle from the top.
    pub fn point(&self, angle: f64) -> Direction {
        let (sin, cos) = angle.sin_cos();
        let (c, t, r) = (self.cos_radius, self.sin_radius * cos, self.sin_radius * sin);
        Direction {
            east: c * self.centre.east + t * self.top.east + r * self.right.east,
            north: c * self.centre.north + t * self.top.north + r * self.right.north,
            up: c * self.centre.up + t * self.top.up + r * self.right.up,
        }
    }

    /// What of the circle stands over the horizon.
    pub fn over(&self, horizon: &Horizon) -> Arc {
        let runs = match horizon {
            Horizon::Level(limit_deg) => self.over_level(*limit_deg),
            Horizon::Skyline(_) => self.over_skyline(horizon),
        };
        self.arc(runs)
    }

    /// By how many degrees the circle reaches over the horizon; negative where all of it is hidden. Its sign and its value
    /// near zero are those of the best point; where the top clears the whole skyline, or lies below all of it, it is how far
    /// the top does.
    pub fn reach_deg(&self, horizon: &Horizon) -> f64 {
        let top_deg = self.point(0.0).elevation_deg();
        let (lowest_deg, highest_deg) = horizon.extent_deg();
        if top_deg - highest_deg > BULGE_DEG || lowest_deg == highest_deg {
            return top_deg - highest_deg;
        }
        if top_deg - lowest_deg < -BULGE_DEG {
            return top_deg - lowest_deg;
        }
        self.best_clearance_deg(horizon, self.half_width((lowest_deg - 2.0 * BULGE_DEG).max(-90.0)))
    }

    /// By how many degrees the best point of the whole circle stands over the horizon; negative where all of it is hidden.
    /// Dearer than [`Circle::reach_deg`], which has the same sign.
    pub fn clearance_of_best_deg(&self, horizon: &Horizon) -> f64 {
        match horizon {
            Horizon::Level(limit_deg) => self.point(0.0).elevation_deg() - limit_deg,
            Horizon::Skyline(_) => self.best_clearance_deg(horizon, PI),
        }
    }

    /// The clearance of the best point within an angle from the top.
    fn best_clearance_deg(&self, horizon: &Horizon, within: f64) -> f64 {
        let width = TAU / SAMPLES as f64;
        let best = self
            .sample_angles(horizon, 0.0, within)
            .into_iter()
            .map(|angle| (angle, self.clearance_deg(horizon, angle)))
            .max_by(|a, b| a.1.total_cmp(&b.1))
            .map_or(0.0, |best| best.0);
        self.clearance_deg(horizon, self.turning_point(horizon, best - width, best + width, 1.0))
    }

    /// Half the width, as an angle on the circle, over which it stands above an elevation: sin(elevation) = sin a cos r +
    /// cos a sin r cos(angle), solved for the angle. 0 where it does nowhere, pi where it does all round.
    fn half_width(&self, limit_deg: f64) -> f64 {
        let across = self.top.up * self.sin_radius;
        let above = self.centre.up * self.cos_radius - limit_deg.to_radians().sin();
        if above >= across.abs() {
            PI
        } else if above <= -across.abs() {
            0.0
        } else {
            (-above / across).acos()
        }
    }

    fn over_level(&self, limit_deg: f64) -> Vec<(f64, f64)> {
        let half = self.half_width(limit_deg);
        if half > 0.0 { vec![(-half, half)] } else { Vec::new() }
    }

    fn clearance_deg(&self, horizon: &Horizon, angle: f64) -> f64 {
        let point = self.point(angle);
        point.up.clamp(-1.0, 1.0).asin().to_degrees() - horizon.elevation_deg(point.azimuth_deg())
    }

    /// Even samples at angles from `near` to `far` on both sides of the top, and the places there where the circle passes
    /// over a corner of the skyline: between two of them the skyline is one straight line.
    fn sample_angles(&self, horizon: &Horizon, near: f64, far: f64) -> Vec<f64> {
        let count = ((far - near) / TAU * SAMPLES as f64).ceil().max(1.0) as usize;
        let mut angles = Vec::with_capacity(2 * (count + 1 + horizon.points().len()));
        for index in 0..=count {
            let angle = near + (far - near) * index as f64 / count as f64;
            angles.extend([-angle, angle]);
        }
        for &(azimuth_deg, _) in horizon.points() {
            let corners = self.angles_at_azimuth(azimuth_deg).into_iter().flatten();
            angles.extend(corners.filter(|angle| (near..=far).contains(&angle.abs())));
        }
        angles.sort_by(f64::total_cmp);
        angles
    }

    /// Where the circle meets the vertical half-plane of an azimuth: point . m = 0 for its horizontal normal m.
    fn angles_at_azimuth(&self, azimuth_deg: f64) -> [Option<f64>; 2] {
        let toward = Direction::from_angles(azimuth_deg, 0.0);
        let normal = Direction { east: toward.north, north: -toward.east, up: 0.0 };
        let constant = self.cos_radius * self.centre.dot(&normal);
        let (cosine, sine) = (self.sin_radius * self.top.dot(&normal), self.sin_radius * self.right.dot(&normal));
        let amplitude = cosine.hypot(sine);
        if amplitude <= constant.abs() {
            return [None, None];
        }
        let (middle, half) = (sine.atan2(cosine), (-constant / amplitude).acos());
        [middle + half, middle - half].map(|angle| {
            let angle = (angle + PI).rem_euclid(TAU) - PI;
            (self.point(angle).dot(&toward) > 0.0).then_some(angle)
        })
    }

    /// Above the highest point of the skyline all is visible, below its lowest nothing: only the angles in between are
    /// sampled.
    fn over_skyline(&self, horizon: &Horizon) -> Vec<(f64, f64)> {
        let (lowest_deg, highest_deg) = horizon.extent_deg();
        let near = self.half_width((highest_deg + 2.0 * BULGE_DEG).min(90.0));
        let far = self.half_width((lowest_deg - 2.0 * BULGE_DEG).max(-90.0));
        let angles = self.sample_angles(horizon, near, far);
        let sampled = angles.into_iter().map(|angle| (angle, self.clearance_deg(horizon, angle)));
        let mut edges = Vec::new();
        let mut first = None;
        let mut before: Option<(f64, f64)> = None;
        for sample in sampled {
            if let Some(before) = before {
                self.edges_between(horizon, before, sample, &mut edges);
            }
            first = first.or(Some(sample));
            before = Some(sample);
        }
        // From the last sample through the lowest point to the first there is nothing left to cross, unless all is sampled.
        let (Some(first), Some(last)) = (first, before) else { return Vec::new() };
        self.edges_between(horizon, last, (first.0 + TAU, first.1), &mut edges);
        pieces(&edges, first.1 >= 0.0)
    }

    fn edges_between(&self, horizon: &Horizon, a: (f64, f64), b: (f64, f64), edges: &mut Vec<f64>) {
        if (a.1 >= 0.0) != (b.1 >= 0.0) {
            edges.push(self.edge(horizon, a, b));
        } else if a.1.abs().min(b.1.abs()) < BULGE_DEG {
            let sign = if a.1 >= 0.0 { -1.0 } else { 1.0 };
            let angle = self.turning_point(horizon, a.0, b.0, sign);
            let turn = (angle, self.clearance_deg(horizon, angle));
            if (turn.1 >= 0.0) != (a.1 >= 0.0) {
                edges.push(self.edge(horizon, a, turn));
                edges.push(self.edge(horizon, turn, b));
            }
        }
    }

    /// Narrows a crossing between two samples of opposite sign to 1e-9 radians: regula falsi with the Illinois change
    /// (Dowell and Jarratt 1971, BIT 11, 168-174).
    fn edge(&self, horizon: &Horizon, mut a: (f64, f64), mut b: (f64, f64)) -> f64 {
        let mut kept_far = None;
        for _ in 0..60 {
            if b.0 - a.0 < 1e-9 || a.1 == b.1 {
                break;
            }
            let angle = b.0 - b.1 * (b.0 - a.0) / (b.1 - a.1);
            let clearance = self.clearance_deg(horizon, angle);
            if clearance.abs() < 1e-9 {
                return angle;
            }
            let moves_a = (clearance >= 0.0) == (a.1 >= 0.0);
            let (near, far) = if moves_a { (&mut a, &mut b) } else { (&mut b, &mut a) };
            *near = (angle, clearance);
            if kept_far == Some(moves_a) {
                far.1 *= 0.5;
            }
            kept_far = Some(moves_a);
        }
        0.5 * (a.0 + b.0)
    }

    /// Where `sign` times the clearance is greatest between two angles, by thirds.
    fn turning_point(&self, horizon: &Horizon, mut low: f64, mut high: f64, sign: f64) -> f64 {
        while high - low > 1e-6 {
            let third = (high - low) / 3.0;
            let (left, right) = (low + third, high - third);
            if sign * self.clearance_deg(horizon, left) < sign * self.clearance_deg(horizon, right) {
                low = left;
            } else {
                high = right;
            }
        }
        0.5 * (low + high)
    }

    fn arc(&self, runs: Vec<(f64, f64)>) -> Arc {
        let fraction = runs.iter().fold(0.0, |sum, (from, to)| sum + (to - from)) / TAU;
        let crown = runs
            .iter()
            .flat_map(|&(from, to)| [highest_angle(from, to), from, to])
            .max_by(|a, b| a.cos().total_cmp(&b.cos()))
            .map(|angle| self.point(angle));
        let lowest_visible = runs.iter().any(|&(from, to)| from <= -PI || to >= PI);
        let feet = (!lowest_visible && !runs.is_empty()).then(|| {
            let left = runs.iter().map(|run| run.0).fold(f64::INFINITY, f64::min);
            let right = runs.iter().map(|run| run.1).fold(f64::NEG_INFINITY, f64::max);
            (self.point(left), self.point(right))
        });
        Arc { runs, fraction: fraction.min(1.0), crown, feet }
    }
}

/// The angle nearest to the top within a run.
fn highest_angle(from: f64, to: f64) -> f64 {
    if from <= 0.0 && to >= 0.0 || to >= TAU { 0.0 } else { from }
}

/// The visible pieces between edges met while going once round from -pi; a piece that runs through the lowest point is
/// kept as one, ending beyond pi.
fn pieces(edges: &[f64], visible_at_start: bool) -> Vec<(f64, f64)> {
    if edges.is_empty() {
        return if visible_at_start { vec![(-PI, PI)] } else { Vec::new() };
    }
    let begin = usize::from(visible_at_start);
    let count = edges.len();
    (begin..count + begin)
        .step_by(2)
        .map(|index| {
            let from = edges[index % count];
            let to = edges[(index + 1) % count];
            (from, if to < from { to + TAU } else { to })
        })
        .collect()
}

impl Arc {
    /// Number of visible pieces.
    pub fn pieces(&self) -> usize {
        self.runs.len()
    }
}
