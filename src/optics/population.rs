//! The drops that make a bow: how large they are, by how much of the light falls on each size.

use super::drops::MarshallPalmer;

/// Relative standard deviation of drops asked for by one radius.
pub const EQUAL_SPREAD: f64 = 0.03;

/// Diameters of rain that count, mm: the law of Marshall and Palmer has too many smaller drops, and larger ones break up.
pub const RAIN_DIAMETERS_MM: (f64, f64) = (0.1, 5.0);

/// What drops there are.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Drops {
    /// Rain by its rate, with the sizes of Marshall and Palmer (1948) from 0.1 to 5 mm of diameter.
    Rain {
        /// Rain rate, mm/h.
        mm_h: f64,
    },
    /// Drops of nearly one radius: normal about it with 3 % standard deviation, cut at 2.5 of them.
    Equal {
        /// Mean radius, µm.
        radius_um: f64,
    },
    /// A gamma distribution as Hansen and Travis (1974) write it: n(r) ∝ r^((1 - 3 v)/v) exp(-r/(a v)).
    Gamma {
        /// Effective radius a: the mean weighted by cross-section, µm.
        effective_radius_um: f64,
        /// Effective variance v, of the same weight, relative to a².
        effective_variance: f64,
    },
}

/// One size of drop.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Class {
    /// Radius, µm.
    pub radius_um: f64,
    /// Share of the cross-section of all drops.
    pub share: f64,
}

/// Sizes of drops with their shares of the cross-section, which add up to 1.
#[derive(Debug, Clone, PartialEq)]
pub struct Population {
    /// From the smallest on.
    pub classes: Vec<Class>,
    /// Mean radius weighted by cross-section, µm.
    pub effective_radius_um: f64,
    /// Distance of neighbouring classes in the logarithm of the radius.
    pub log_step: f64,
}

impl Population {
    /// The sizes of some drops, in `count` classes (2 or more) evenly spaced in the logarithm of the radius, or in the radius
    /// itself for nearly equal drops.
    pub fn new(drops: Drops, count: usize) -> Self {
        let (from_um, to_um, area): (f64, f64, Box<dyn Fn(f64) -> f64>) = match drops {
            Drops::Rain { mm_h } => {
                let rain = MarshallPalmer::new(mm_h);
                let (from_mm, to_mm) = RAIN_DIAMETERS_MM;
                let area = move |radius_um: f64| radius_um.powi(2) * rain.density_m3_mm(radius_um / 500.0);
                (from_mm * 500.0, to_mm * 500.0, Box::new(area))
            }
            Drops::Equal { radius_um } => {
                let reach = 2.5 * EQUAL_SPREAD;
                let area = move |radius: f64| {
                    let apart = (radius / radius_um - 1.0) / EQUAL_SPREAD;
                    radius.powi(2) * (-0.5 * apart * apart).exp()
                };
                (radius_um * (1.0 - reach), radius_um * (1.0 + reach), Box::new(area))
            }
            Drops::Gamma { effective_radius_um, effective_variance } => {
                let (a, v) = (effective_radius_um, effective_variance);
                let power = (1.0 - v) / v;
                let area = move |radius: f64| {
                    let relative = radius / a;
                    (power * (relative.ln() - relative + 1.0) - (relative - 1.0)).exp()
                };
                // ±4.5 standard deviations of the logarithm hold all but 1e-4 of the cross-section for v up to 0.25.
                let reach = 4.5 * v.sqrt();
                (a * (-reach).exp(), a * (0.75 * reach).exp(), Box::new(area))
            }
        };
        let log_step = (to_um / from_um).ln() / (count as f64);
        let even_radii = matches!(drops, Drops::Equal { .. });
        let mut classes: Vec<Class> = (0..count)
            .map(|index| {
                if even_radii {
                    let radius_um = from_um + (to_um - from_um) * index as f64 / (count as f64 - 1.0);
                    return Class { radius_um, share: area(radius_um) };
                }
                let radius_um = from_um * (log_step * (index as f64 + 0.5)).exp();
                Class { radius_um, share: radius_um * area(radius_um) }
            })
            .collect();
        let sum: f64 = classes.iter().map(|class| class.share).sum();
        for class in &mut classes {
            class.share /= sum;
        }
        let effective_radius_um = classes.iter().map(|class| class.radius_um * class.share).sum();
        Self { classes, effective_radius_um, log_step }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn effective_radius_and_variance_come_out() {
        for (a, v) in [(6.0, 1.0 / 9.0), (20.0, 1.0 / 6.0), (100.0, 0.05)] {
            let drops = Population::new(Drops::Gamma { effective_radius_um: a, effective_variance: v }, 400);
            let variance: f64 =
                drops.classes.iter().map(|class| class.share * (class.radius_um / a - 1.0).powi(2)).sum();
            assert!((drops.effective_radius_um / a - 1.0).abs() < 2e-3, "{} {a}", drops.effective_radius_um);
            assert!((variance / v - 1.0).abs() < 0.02, "{variance} {v}");
        }
    }

    #[test]
    fn rain_has_the_closed_form_mean() {
        // Within the cut at 0.1 and 5 mm.
        let drops = Population::new(Drops::Rain { mm_h: 5.0 }, 300);
        let closed_um = 500.0 * MarshallPalmer::new(5.0).area_weighted_diameter_mm();
        assert!((drops.effective_radius_um / closed_um - 1.0).abs() < 0.01);
    }
}
