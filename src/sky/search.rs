//! The one search for when something begins or ends.
//!
//! What is asked is a margin: a continuous function of time that is zero or more while the state holds. The search
//! samples it, narrows every change of sign, and looks closer where it turns round just short of zero, so that a Sun
//! that comes out for less than a step is found as well.

use chrono::{DateTime, TimeDelta, Utc};

/// How closely a crossing is narrowed, ms; what is returned lies within half of it behind the crossing.
const TOLERANCE_MS: i64 = 200;

/// A moment at which a state begins or ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Crossing {
    /// When, to better than 1 s.
    pub time: DateTime<Utc>,
    /// Whether the state begins to hold.
    pub begins: bool,
}

/// Every crossing of zero between two times, in order. The step must be shorter than the time over which the margin turns
/// round twice; for the Sun's elevation that is hours.
pub fn crossings(
    mut margin: impl FnMut(DateTime<Utc>) -> f64,
    from: DateTime<Utc>,
    to: DateTime<Utc>,
    step: TimeDelta,
) -> Vec<Crossing> {
    let origin = from;
    let end_ms = (to - from).num_milliseconds();
    let step_ms = step.num_milliseconds().max(TOLERANCE_MS);
    let mut at = |ms: i64| margin(origin + TimeDelta::milliseconds(ms));
    if end_ms <= 0 {
        return Vec::new();
    }
    let mut found: Vec<(i64, bool)> = Vec::new();
    let mut samples: [Option<(i64, f64)>; 3] = [None, None, Some((0, at(0)))];
    let mut ms = 0;
    loop {
        if let [Some(a), Some(b), Some(c)] = samples {
            turn(&mut at, a, b, c, &mut found);
        }
        if ms >= end_ms {
            break;
        }
        ms = (ms + step_ms).min(end_ms);
        let value = at(ms);
        if let Some(before) = samples[2]
            && (before.1 >= 0.0) != (value >= 0.0)
        {
            found.push(narrow(&mut at, before, (ms, value)));
        }
        samples = [samples[1], samples[2], Some((ms, value))];
    }
    found.sort_unstable();
    found.into_iter().map(|(ms, begins)| Crossing { time: origin + TimeDelta::milliseconds(ms), begins }).collect()
}

/// Narrows a change of sign by halving: the first moment known to have the new state.
fn narrow(at: &mut impl FnMut(i64) -> f64, before: (i64, f64), after: (i64, f64)) -> (i64, bool) {
    let begins = after.1 >= 0.0;
    let (mut low, mut high) = (before.0, after.0);
    while high - low > TOLERANCE_MS {
        let middle = low + (high - low) / 2;
        if (at(middle) >= 0.0) == begins {
            high = middle;
        } else {
            low = middle;
        }
    }
    (high, begins)
}

/// Looks for a pair of crossings inside three samples of one sign whose middle one is nearest to zero, by thirds toward
/// the turning point.
fn turn(at: &mut impl FnMut(i64) -> f64, a: (i64, f64), b: (i64, f64), c: (i64, f64), found: &mut Vec<(i64, bool)>) {
    let holds = b.1 >= 0.0;
    let nearest = b.1.abs() <= a.1.abs() && b.1.abs() <= c.1.abs();
    // A margin that turns round within the samples rises no further beyond the middle than it rose outside it.
    let within_reach = b.1.abs() <= (a.1 - b.1).abs().max((c.1 - b.1).abs());
    if (a.1 >= 0.0) != holds || (c.1 >= 0.0) != holds || !nearest || !within_reach {
        return;
    }
    let (mut low, mut high) = (a.0, c.0);
    while high - low > TOLERANCE_MS {
        let third = (high - low) / 3;
        let (left, right) = (low + third, high - third);
        let (at_left, at_right) = (at(left), at(right));
        for (ms, value) in [(left, at_left), (right, at_right)] {
            if (value >= 0.0) != holds {
                found.push(narrow(at, a, (ms, value)));
                found.push(narrow(at, (ms, value), c));
                return;
            }
        }
        if at_left.abs() < at_right.abs() { high = right } else { low = left }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn start() -> DateTime<Utc> {
        DateTime::from_timestamp(1_900_000_000, 0).unwrap()
    }

    fn seconds(found: &[Crossing]) -> Vec<(f64, bool)> {
        found.iter().map(|c| ((c.time - start()).num_milliseconds() as f64 / 1000.0, c.begins)).collect()
    }

    fn search(margin: impl Fn(f64) -> f64, length_s: i64, step_s: i64) -> Vec<(f64, bool)> {
        let at = |time: DateTime<Utc>| margin((time - start()).num_milliseconds() as f64 / 1000.0);
        seconds(&crossings(at, start(), start() + TimeDelta::seconds(length_s), TimeDelta::seconds(step_s)))
    }

    fn assert_near(found: &[(f64, bool)], expected: &[(f64, bool)]) {
        assert_eq!(found.len(), expected.len(), "{found:?} for {expected:?}");
        for (f, e) in found.iter().zip(expected) {
            assert!((f.0 - e.0).abs() <= 0.3 && f.1 == e.1, "{found:?} for {expected:?}");
        }
    }

    #[test]
    fn finds_crossings_at_the_edges_and_in_the_middle() {
        assert_near(&search(|t| t - 0.5, 1000, 300), &[(0.5, true)]);
        assert_near(&search(|t| t - 999.5, 1000, 300), &[(999.5, true)]);
        assert_near(&search(|t| (t - 100.0) * (700.0 - t), 1000, 300), &[(100.0, true), (700.0, false)]);
        assert_near(&search(|t| t + 1.0, 1000, 300), &[]);
    }

    #[test]
    fn finds_a_state_shorter_than_a_step() {
        let brief = |t: f64| 4.0 - (t - 1450.0).powi(2) / 100.0;
        assert_near(&search(brief, 3000, 300), &[(1430.0, true), (1470.0, false)]);
        let pause = |t: f64| (t - 1450.0).powi(2) / 100.0 - 4.0;
        assert_near(&search(pause, 3000, 300), &[(1430.0, false), (1470.0, true)]);
    }

    #[test]
    fn an_empty_or_backward_span_has_none() {
        assert_near(&search(|t| t, 0, 300), &[]);
        assert_near(&search(|t| t, -10, 300), &[]);
    }
}
