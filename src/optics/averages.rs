//! What a population of drops does to Airy's function, worked out once for all wavelengths and directions.

use std::sync::LazyLock;

use super::airy::airy_function;
use super::fresnel::Polarised;
use super::population::Population;
use super::uniform::Direction;

/// Cubic (Catmull and Rom 1974) between the second and third of four evenly spaced values.
pub(super) fn cubic([before, from, to, after]: [f64; 4], share: f64) -> f64 {
    let slope = 0.5 * (to - before);
    let bend = before - 2.5 * from + 2.0 * to - 0.5 * after;
    let twist = 0.5 * (after - before) + 1.5 * (from - to);
    from + share * (slope + share * (bend + share * twist))
}

/// Mean of Ai² and Ai'² over a population, by the argument for its effective radius.
#[derive(Debug, Clone)]
pub struct Averages {
    /// Effective radius, µm.
    pub radius_um: f64,
    /// Mean of 1/radius by cross-section, per µm.
    inverse_radius_um: f64,
    even: Vec<f64>,
    odd: Vec<f64>,
}

/// Arguments of the averages: from the dark side, where the light is gone, to where only the mean is left.
const ARGUMENT_FIRST: f64 = -24.0;
const ARGUMENT_LAST: f64 = 32.0;
const ARGUMENT_STEP: f64 = 0.04;

impl Averages {
    /// Works through a population: some 3 ms for 240 classes.
    pub fn new(population: &Population) -> Self {
        let radius_um = population.effective_radius_um;
        // Beyond this argument neighbouring classes fall out of step; by then the population's fringes are washed out.
        let in_step = (1.1 / population.log_step).powf(2.0 / 3.0);
        let sizes: Vec<[f64; 3]> = population
            .classes
            .iter()
            .map(|class| {
                let cube_root = (class.radius_um / radius_um).cbrt();
                [cube_root * cube_root, class.share * cube_root, class.share / cube_root]
            })
            .collect();
        let count = ((ARGUMENT_LAST - ARGUMENT_FIRST) / ARGUMENT_STEP) as usize + 3;
        let means = (0..count).map(|index| {
            let argument = ARGUMENT_FIRST + ARGUMENT_STEP * (index as f64 - 1.0);
            sizes.iter().fold((0.0, 0.0), |(even, odd), [scale, even_weight, odd_weight]| {
                let (ai2, slope2) = squares(argument * scale, in_step);
                (even + even_weight * ai2, odd + odd_weight * slope2)
            })
        });
        let (even, odd) = means.unzip();
        let inverse_radius_um = population.classes.iter().map(|class| class.share / class.radius_um).sum();
        Self { radius_um, inverse_radius_um, even, odd }
    }

    /// |S|²/x² of the population in a direction of a bow, where `x` belongs to the effective radius.
    pub fn intensity(&self, direction: &Direction, x: f64) -> Polarised {
        let cube_root = x.cbrt();
        let argument = direction.stretch * cube_root * cube_root;
        let (even, odd) = if argument >= ARGUMENT_LAST {
            (0.5 / (std::f64::consts::PI * argument.sqrt()), 0.5 * argument.sqrt() / std::f64::consts::PI)
        } else if argument.is_nan() || argument <= ARGUMENT_FIRST {
            return Polarised::default();
        } else {
            let place = (argument - ARGUMENT_FIRST) / ARGUMENT_STEP + 1.0;
            let (node, share) = (place as usize, place.fract());
            let between = |values: &[f64]| {
                cubic([values[node - 1], values[node], values[node + 1], values[node + 2]], share).max(0.0)
            };
            (between(&self.even), between(&self.odd))
        };
        let edge = 1.0 + direction.edge * self.inverse_radius_um * self.radius_um / x;
        let (even, odd) = (edge * even * cube_root, edge * odd / cube_root);
        Polarised {
            s: direction.even.s * even + direction.odd.s * odd,
            p: direction.even.p * even + direction.odd.p * odd,
        }
    }
}

/// Ai(-z)² and Ai'(-z)², with their swing faded out toward `in_step`, where their means take over.
fn squares(z: f64, in_step: f64) -> (f64, f64) {
    let mean = |z: f64| (0.5 / (std::f64::consts::PI * z.sqrt()), 0.5 * z.sqrt() / std::f64::consts::PI);
    if z >= in_step {
        return mean(z);
    }
    let (ai, slope) = tabulated(-z);
    let (ai2, slope2) = (ai * ai, slope * slope);
    let fade = (z - 0.6 * in_step) / (0.4 * in_step);
    if fade <= 0.0 {
        return (ai2, slope2);
    }
    let (ai2_mean, slope2_mean) = mean(z);
    (ai2 + fade * (ai2_mean - ai2), slope2 + fade * (slope2_mean - slope2))
}

const TABLE_FIRST: f64 = -60.0;
const TABLE_LAST: f64 = 8.0;
const TABLE_STEP: f64 = 0.02;

/// Ai and Ai' at nodes: made on first use, in some 10 ms.
static TABLE: LazyLock<Vec<(f64, f64)>> = LazyLock::new(|| {
    let count = ((TABLE_LAST - TABLE_FIRST) / TABLE_STEP) as usize + 2;
    (0..count).map(|node| airy_function(TABLE_FIRST + TABLE_STEP * node as f64)).collect()
});

/// Ai and Ai' by Hermite's cubic between nodes: Ai'' = z Ai gives the slopes. To 1e-6 of the amplitude.
fn tabulated(z: f64) -> (f64, f64) {
    if z >= TABLE_LAST {
        return (0.0, 0.0);
    }
    if z <= TABLE_FIRST {
        return airy_function(z);
    }
    let place = (z - TABLE_FIRST) / TABLE_STEP;
    let (node, share) = (place as usize, place.fract());
    let ((ai0, slope0), (ai1, slope1)) = (TABLE[node], TABLE[node + 1]);
    let z0 = TABLE_FIRST + TABLE_STEP * node as f64;
    let hermite = |from: f64, to: f64, slope_from: f64, slope_to: f64| {
        let (rise, from_slope, to_slope) = (to - from, slope_from * TABLE_STEP, slope_to * TABLE_STEP);
        from + share
            * (from_slope
                + share * (3.0 * rise - 2.0 * from_slope - to_slope + share * (from_slope + to_slope - 2.0 * rise)))
    };
    (hermite(ai0, ai1, slope0, slope1), hermite(slope0, slope1, z0 * ai0, (z0 + TABLE_STEP) * ai1))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_table_of_airy_is_true_between_its_nodes() {
        for step in 0..3000 {
            let z = -62.0 + 0.0233 * f64::from(step);
            let ((ai, slope), (table_ai, table_slope)) = (airy_function(z), tabulated(z));
            let amplitude = (1.0 + z.abs()).powf(0.25);
            assert!((ai - table_ai).abs() * amplitude < 1e-5, "Ai({z})");
            assert!((slope - table_slope).abs() / amplitude < 1e-5, "Ai'({z})");
        }
    }
}
