//! Light in the directions of the bows that belongs to neither of them: reflected at the outside of the drop, or leaving
//! after five or six inner reflections. In Alexander's band it is all there is.

use std::sync::LazyLock;

use super::debye;
use super::fresnel::{self, Polarised};
use super::ray::Ray;

/// Orders whose bows fall near the primary and the secondary; what others bring there is below 1 % of the outer reflection.
const ORDERS: [u32; 2] = [5, 6];
/// Index for which these are computed; for others the pattern is moved with its bow.
const INDEX: f64 = 1.336;
/// Scattering angles of the table, degrees: those of both bows with room for the pattern to move.
const FIRST_DEG: f64 = 95.0;
const STEP_DEG: f64 = 0.5;
const COUNT: usize = 160;
/// Size parameters of the table, in powers of √2 from here.
const SIZE_FIRST: f64 = 400.0;
const SIZES: usize = 11;

/// How a population of drops shares out among the sizes of the table.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SizeShares([f64; SIZES]);

impl SizeShares {
    /// By size parameters and their shares of the cross-section; sizes out of 400 to 12,800 count as the nearest in there.
    pub fn new(sizes: impl Iterator<Item = (f64, f64)>) -> Self {
        let mut shares = [0.0; SIZES];
        for (x, share_of_area) in sizes {
            let place = (2.0 * (x / SIZE_FIRST).log2()).clamp(0.0, SIZES as f64 - 1.001);
            let (size, share) = (place as usize, place.fract());
            shares[size] += share_of_area * (1.0 - share);
            shares[size + 1] += share_of_area * share;
        }
        Self(shares)
    }
}

/// Outer reflection and high orders, |S|²/x², by scattering angle, for drops of index `n`.
///
/// The outer reflection is that of rays, the high orders are exact. Together within 5 % of what the exact solution leaves
/// beside primary and secondary (`tests/proofs`).
pub fn intensities(shares: &SizeShares, n: f64, angles_deg: impl Iterator<Item = f64>) -> Vec<Polarised> {
    let bow_deg = |n: f64, order: u32| Ray::stationary(n, order).map_or(0.0, |ray| ray.scattering_angle_deg());
    let tables = ORDERS.map(|order| bow_deg(n, order) - bow_deg(INDEX, order)).into_iter().zip(HIGH_ORDERS.iter());
    let high: Vec<(f64, Vec<Polarised>)> = tables
        .map(|(moved_deg, table)| {
            let mean = |node: usize| {
                shares.0.iter().zip(table).fold(Polarised::default(), |sum, (share, of_size)| Polarised {
                    s: sum.s + share * of_size[node].s,
                    p: sum.p + share * of_size[node].p,
                })
            };
            (moved_deg, (0..COUNT).map(mean).collect())
        })
        .collect();
    let at = |angle_deg: f64| {
        let outer = fresnel::reflectance(n, f64::midpoint(180.0, -angle_deg));
        let mut light = Polarised { s: 0.25 * outer.s, p: 0.25 * outer.p };
        for (moved_deg, table) in &high {
            let place = ((angle_deg - moved_deg - FIRST_DEG) / STEP_DEG).clamp(0.0, COUNT as f64 - 1.001);
            let (node, share) = (place as usize, place.fract());
            light.s += (1.0 - share) * table[node].s + share * table[node + 1].s;
            light.p += (1.0 - share) * table[node].p + share * table[node + 1].p;
        }
        light
    };
    angles_deg.map(at).collect()
}

/// |S|²/x² of each high order by size and angle; made on first use, in some 20 ms.
static HIGH_ORDERS: LazyLock<[Vec<Vec<Polarised>>; 2]> = LazyLock::new(|| {
    let cosines: Vec<f64> = (0..COUNT).map(|node| (FIRST_DEG + STEP_DEG * node as f64).to_radians().cos()).collect();
    ORDERS.map(|order| {
        let of_size = |size: usize| {
            let x = SIZE_FIRST * 2.0_f64.powf(0.5 * size as f64);
            let light = debye::order_alone(x, INDEX, order).map(|waves| waves.intensities(&cosines));
            let light = light.unwrap_or_else(|_| vec![Polarised::default(); COUNT]);
            light.iter().map(|light| Polarised { s: light.s / (x * x), p: light.p / (x * x) }).collect()
        };
        (0..SIZES).map(of_size).collect()
    })
});
