//! Equally likely copies of a forecast: the field displaced in space and time within its error.
//!
//! Neighbourhood probability (Theis et al. 2005, Meteorol. Appl. 12, 257-268; Schwartz and Sobash 2017, Mon. Weather Rev.
//! 145, 3397-3418): a shower forecast at the right size but the wrong place. The error grows with lead time; its figures
//! are assumptions of this project, stated in every answer.

/// Number of copies made of a deterministic field.
pub const COUNT: usize = 25;

/// Standard error of a shower's place at lead time zero, km along each axis.
pub const PLACE_ERROR_KM: f64 = 4.0;
/// Growth of the error of place, km per hour of lead time.
pub const PLACE_ERROR_KM_PER_H: f64 = 1.0;
/// Greatest error of place, km.
pub const PLACE_ERROR_MAX_KM: f64 = 40.0;
/// Standard error of a shower's time at lead time zero, s.
pub const TIME_ERROR_S: f64 = 600.0;
/// Growth of the error of time, s per hour of lead time.
pub const TIME_ERROR_S_PER_H: f64 = 90.0;
/// Greatest error of time, s.
pub const TIME_ERROR_MAX_S: f64 = 5400.0;
/// Factor on both errors where no wind tells how weather moves past a single point.
pub const WIDER_WITHOUT_WIND: f64 = 2.0;

/// One copy: where and when the field is asked instead, and its place in the order of wetness.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Copy {
    /// Displacement toward east, in standard errors.
    pub east: f64,
    /// Displacement toward north, in standard errors.
    pub north: f64,
    /// Delay, in standard errors.
    pub delay: f64,
    /// Rank in 0..1: the copy is dry wherever the feed's rain chance lies below it.
    pub rank: f32,
}

/// Standard errors of place and time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Spread {
    /// Standard error of place along each axis, km.
    pub place_km: f64,
    /// Standard error of time, s.
    pub time_s: f64,
}

impl Spread {
    /// The spread at a lead time in hours; negative lead times count as zero.
    pub fn at_lead(lead_h: f64, wind_known: bool) -> Self {
        let lead_h = lead_h.max(0.0);
        let widen = if wind_known { 1.0 } else { WIDER_WITHOUT_WIND };
        Self {
            place_km: widen * (PLACE_ERROR_KM + PLACE_ERROR_KM_PER_H * lead_h).min(PLACE_ERROR_MAX_KM),
            time_s: widen * (TIME_ERROR_S + TIME_ERROR_S_PER_H * lead_h).min(TIME_ERROR_MAX_S),
        }
    }
}

/// The copies: normal deviates from a Halton sequence (Halton 1960, Numer. Math. 2, 84-90), the same for every question,
/// so that the same request gives the same answer.
pub fn copies() -> [Copy; COUNT] {
    std::array::from_fn(|index| {
        let n = index as u32 + 1;
        let (east, north) = normal_pair(halton(n, 2), halton(n, 3));
        let (delay, _) = normal_pair(halton(n, 5), halton(n, 7));
        Copy { east, north, delay, rank: (index as f32 + 0.5) / COUNT as f32 }
    })
}

/// The n-th term of the van der Corput sequence in a prime base, in (0, 1).
fn halton(mut n: u32, base: u32) -> f64 {
    let (mut term, mut share) = (0.0, 1.0);
    while n > 0 {
        share /= f64::from(base);
        term += share * f64::from(n % base);
        n /= base;
    }
    term
}

/// Two normal deviates from two uniform ones: Box and Muller (1958), Ann. Math. Stat. 29, 610-611.
fn normal_pair(u: f64, v: f64) -> (f64, f64) {
    let length = (-2.0 * u.ln()).sqrt();
    let (sin, cos) = (std::f64::consts::TAU * v).sin_cos();
    (length * cos, length * sin)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn deviates_are_centred_with_unit_spread() {
        let all = copies();
        for pick in [|c: &Copy| c.east, |c: &Copy| c.north, |c: &Copy| c.delay] {
            let mean = all.iter().map(pick).sum::<f64>() / COUNT as f64;
            let variance = all.iter().map(|c| pick(c).powi(2)).sum::<f64>() / COUNT as f64;
            assert!(mean.abs() < 0.15, "mean {mean}");
            assert!((variance - 1.0).abs() < 0.3, "variance {variance}");
        }
    }

    #[test]
    fn the_error_grows_and_is_bounded() {
        let near = Spread::at_lead(-3.0, true);
        let far = Spread::at_lead(1000.0, true);
        assert!((near.place_km - PLACE_ERROR_KM).abs() < 1e-12);
        assert!((far.place_km - PLACE_ERROR_MAX_KM).abs() < 1e-12 && (far.time_s - TIME_ERROR_MAX_S).abs() < 1e-9);
        assert!(Spread::at_lead(6.0, false).time_s > Spread::at_lead(6.0, true).time_s);
    }
}
