//! Good windows: runs of steps whose chance reaches the threshold, with their ends.

use chrono::{DateTime, TimeDelta, Utc};

use crate::sky::magnetic::declination_deg;
use crate::sky::search::Crossing;

use super::answer::{Best, Step, Window, round};
use super::timeline::Ask;

/// The windows of a timeline; `bow` are the moments at which geometry lets a bow begin or end. A bow that sets and rises again
/// between two good steps ends one window and begins another.
pub fn windows(ask: &Ask, steps: &[Step], bow: &[Crossing]) -> Vec<Window> {
    let good = |step: &Step| step.chance.is_some_and(|chance| chance > 0.0 && chance >= ask.threshold);
    let mut found = Vec::new();
    let mut index = 0;
    for run in steps.chunk_by(|a, b| good(a) == good(b) && !(good(a) && between(bow, a, b).next().is_some())) {
        let first = index;
        index += run.len();
        if !good(&run[0]) {
            continue;
        }
        let before = first.checked_sub(1).map(|before| &steps[before]);
        let (begin, last) = (&run[0], &run[run.len() - 1]);
        let start = before.map_or(begin.time, |outside| {
            between(bow, outside, begin).last().map_or_else(|| where_chance_ends(ask, begin, outside), |c| c.time)
        });
        let end = steps.get(index).map_or(last.time, |outside| {
            between(bow, last, outside).next().map_or_else(|| where_chance_ends(ask, last, outside), |c| c.time)
        });
        found.extend(window(ask, run, start, end));
    }
    found
}

/// The crossings between two steps, the later one's moment included.
fn between<'a>(bow: &'a [Crossing], a: &Step, b: &Step) -> impl Iterator<Item = &'a Crossing> + use<'a> {
    let (from, to) = (a.time, b.time);
    let first = bow.partition_point(|crossing| crossing.time <= from);
    bow[first..].iter().take_while(move |crossing| crossing.time <= to)
}

fn window(ask: &Ask, run: &[Step], start: DateTime<Utc>, end: DateTime<Utc>) -> Option<Window> {
    // The first of equals: a steady window is best at its beginning.
    let best = run.iter().rev().max_by(|a, b| a.chance.unwrap_or(0.0).total_cmp(&b.chance.unwrap_or(0.0)))?;
    let face_azimuth_deg = best.antisolar_point.azimuth_deg;
    let declination = declination_deg(ask.observer.place, ask.observer.ground_m, best.time);
    Some(Window {
        start,
        end,
        best: Best { time: best.time, chance: best.chance? },
        face_azimuth_deg,
        face_magnetic_deg: declination.map(|declination| round((face_azimuth_deg - declination).rem_euclid(360.0), 3)),
        crown_elevation_deg: best.crown?.elevation_deg,
        visible_arc_fraction: best.visible_arc_fraction,
        limited_by: best.limited_by,
    })
}

/// Where the chance, drawn as a straight line from a good step to its neighbour outside, crosses the threshold; at the good
/// step where the other is unknown.
fn where_chance_ends(ask: &Ask, good: &Step, outside: &Step) -> DateTime<Utc> {
    let (Some(inside), Some(other)) = (good.chance, outside.chance) else { return good.time };
    let share = ((inside - ask.threshold) / (inside - other)).clamp(0.0, 1.0);
    let apart_ms = (outside.time - good.time).num_milliseconds() as f64;
    good.time + TimeDelta::milliseconds((share * apart_ms) as i64)
}
