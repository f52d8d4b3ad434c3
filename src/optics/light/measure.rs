//! Peaks, widths and contrasts of a curve across the bows.

use crate::optics::scene::SEEN_FROM;

/// A bow found on the curve.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Found {
    pub index: usize,
    pub brightest_deg: f64,
    pub width_deg: Option<f64>,
    pub contrast: f64,
}

/// What a curve shows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Measured {
    /// Primary and secondary.
    pub bows: [Option<Found>; 2],
    pub supernumeraries: u32,
}

impl Measured {
    /// Measures total luminance by the angle from the antisolar point; `radii` are those of the stationary rays.
    pub fn new(angles_deg: &[f64], curve: &[f64], radii: [f64; 2]) -> Self {
        // Light is brightest inside the primary's ray and outside the secondary's.
        let split = angles_deg.partition_point(|angle| *angle < f64::midpoint(radii[0], radii[1]));
        let Some(primary) = peak(curve, 0, split) else { return Self { bows: [None, None], supernumeraries: 0 } };
        let ray = angles_deg.partition_point(|angle| *angle < radii[1]).min(curve.len() - 1);
        let secondary = peak(curve, least(curve, primary, ray), curve.len());
        let band = least(curve, primary, secondary.unwrap_or(curve.len() - 1));
        let found = |index: usize| {
            let half = f64::midpoint(curve[index], curve[band]);
            let inner = (0..index).rev().find(|below| curve[*below] < half);
            let outer = (index..curve.len()).find(|below| curve[*below] < half);
            let crossing = |below: usize, above: usize| {
                let share = (half - curve[below]) / (curve[above] - curve[below]);
                angles_deg[below] + share * (angles_deg[above] - angles_deg[below])
            };
            Found {
                index,
                brightest_deg: angles_deg[index],
                width_deg: inner
                    .zip(outer)
                    .map(|(inner, outer)| crossing(outer, outer - 1) - crossing(inner, inner + 1)),
                contrast: curve[index] / curve[band] - 1.0,
            }
        };
        Self { bows: [Some(found(primary)), secondary.map(found)], supernumeraries: supernumeraries(curve, primary) }
    }
}

/// Highest inner point of a stretch of the curve; `None` where it only climbs toward an end.
fn peak(curve: &[f64], from: usize, to: usize) -> Option<usize> {
    let highest = (from..to).max_by(|a, b| curve[*a].total_cmp(&curve[*b]))?;
    (highest > from + 2 && highest + 3 < to).then_some(highest)
}

fn least(curve: &[f64], from: usize, to: usize) -> usize {
    (from..=to).min_by(|a, b| curve[*a].total_cmp(&curve[*b])).unwrap_or(from)
}

/// Maxima inside the primary that rise by the threshold over the trough before them.
fn supernumeraries(curve: &[f64], primary: usize) -> u32 {
    let (mut count, mut trough, mut crest) = (0, curve[primary], None::<f64>);
    for value in curve[..primary].iter().rev().copied() {
        match crest {
            None if value < trough => trough = value,
            None if value > trough * (1.0 + SEEN_FROM) => crest = Some(value),
            Some(height) if value > height => crest = Some(value),
            Some(height) if value < height / (1.0 + SEEN_FROM) => {
                count += 1;
                (trough, crest) = (value, None);
            }
            None | Some(_) => {}
        }
    }
    count
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn crests_are_counted_by_their_height() {
        let curve = |swing: f64| -> Vec<f64> {
            (0..200).map(|step| 2.0 + swing * (f64::from(step) * 0.1).cos() + 0.02 * f64::from(step)).collect()
        };
        // The crest at the very end may rise further beyond it and does not count.
        assert_eq!(supernumeraries(&curve(1.0), 189), 2);
        assert_eq!(supernumeraries(&curve(0.01), 189), 0);
    }

    #[test]
    fn no_peak_at_an_end() {
        let rising: Vec<f64> = (0..601).map(f64::from).collect();
        assert_eq!(peak(&rising, 0, 300), None);
        assert_eq!(peak(&[0.0, 1.0, 2.0, 3.0, 2.0, 1.0, 0.0], 0, 7), Some(3));
    }
}
