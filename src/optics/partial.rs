//! Sums of partial waves over angles: the part of Lorenz-Mie and Debye computations where the time goes.

use num_complex::Complex;
use pulp::{Arch, Simd, WithSimd};

use super::fresnel::Polarised;

/// Coefficients of the partial waves a sphere sends out, from n = 1.
#[derive(Debug, Clone, PartialEq)]
pub struct PartialWaves {
    size_parameter: f64,
    electric: Vec<Complex<f64>>,
    magnetic: Vec<Complex<f64>>,
}

impl PartialWaves {
    pub(super) fn with_capacity(size_parameter: f64, terms: usize) -> Self {
        Self { size_parameter, electric: Vec::with_capacity(terms), magnetic: Vec::with_capacity(terms) }
    }

    pub(super) fn push(&mut self, electric: Complex<f64>, magnetic: Complex<f64>) {
        self.electric.push(electric);
        self.magnetic.push(magnetic);
    }

    /// Size parameter of the sphere.
    pub fn size_parameter(&self) -> f64 {
        self.size_parameter
    }

    /// Extinction and scattering efficiency, and mean cosine of the scattering angle.
    pub(super) fn efficiencies(&self) -> (f64, f64, f64) {
        let (mut extinction, mut scattering, mut forward) = (0.0, 0.0, 0.0);
        let waves = self.electric.iter().zip(&self.magnetic);
        let following = waves.clone().skip(1).map(|(a, b)| (*a, *b)).chain([(Complex::default(), Complex::default())]);
        for (n, ((a, b), (a_next, b_next))) in (1..).map(f64::from).zip(waves.zip(following)) {
            extinction += (2.0 * n + 1.0) * (a + b).re;
            scattering += (2.0 * n + 1.0) * (a.norm_sqr() + b.norm_sqr());
            forward += n * (n + 2.0) / (n + 1.0) * (a * a_next.conj() + b * b_next.conj()).re
                + (2.0 * n + 1.0) / (n * (n + 1.0)) * (a * b.conj()).re;
        }
        let area = self.size_parameter * self.size_parameter;
        (2.0 * extinction / area, 2.0 * scattering / area, 2.0 * forward / scattering)
    }

    /// Amplitudes S1 (across the scattering plane) and S2 (in it) by the cosine of the scattering angle, signs after
    /// Wiscombe (1979).
    pub fn amplitudes(&self, cosines: &[f64]) -> Vec<(Complex<f64>, Complex<f64>)> {
        let mut sums = vec![Sums::default(); cosines.len()];
        self.sum(cosines, &mut sums);
        sums.iter().map(Sums::amplitudes).collect()
    }

    /// Intensities |S1|² and |S2|² by the cosine of the scattering angle.
    pub fn intensities(&self, cosines: &[f64]) -> Vec<Polarised> {
        let amplitudes = self.amplitudes(cosines);
        amplitudes.iter().map(|(s1, s2)| Polarised { s: s1.norm_sqr(), p: s2.norm_sqr() }).collect()
    }

    fn sum(&self, cosines: &[f64], sums: &mut [Sums]) {
        // (2n + 1)/(n (n + 1)) times a + b and a - b, and the two factors of the recurrence.
        let terms: Vec<Term> = (1..)
            .map(f64::from)
            .zip(self.electric.iter().zip(&self.magnetic))
            .map(|(n, (a, b))| {
                let weight = (n + 0.5) / (n * (n + 1.0));
                let (sum, difference) = ((a + b) * weight, (a - b) * weight);
                Term { order: n, carry: 1.0 + 1.0 / n, parts: [sum.re, sum.im, difference.re, difference.im] }
            })
            .collect();
        Arch::new().dispatch(Summation { terms: &terms, cosines, sums });
    }
}

struct Term {
    order: f64,
    /// (n + 1)/n.
    carry: f64,
    parts: [f64; 4],
}

/// At one angle: sums of (a + b)(π + τ) and (a - b)(π - τ), which are (S1 + S2) and (S1 - S2).
#[derive(Debug, Clone, Copy, Default)]
struct Sums([f64; 4]);

impl Sums {
    fn amplitudes(&self) -> (Complex<f64>, Complex<f64>) {
        let [sum_re, sum_im, difference_re, difference_im] = self.0;
        let (sum, difference) = (Complex::new(sum_re, sum_im), Complex::new(difference_re, difference_im));
        (sum + difference, sum - difference)
    }
}

/// Registers of angles worked on together: enough of them in flight to hide the latency of the recurrence.
const BLOCK: usize = 4;

struct Summation<'a> {
    terms: &'a [Term],
    cosines: &'a [f64],
    sums: &'a mut [Sums],
}

impl WithSimd for Summation<'_> {
    type Output = ();

    /// The angular functions π and τ of order n by upward recurrence (Wiscombe 1979): with s = μ π and t = s - (π before),
    /// τ = n t - (π before) and (π after) = s + (n + 1)/n t.
    #[allow(clippy::inline_always, reason = "only inlined code is compiled for the instruction set that was found")]
    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        let lanes = S::F64_LANES;
        let mut cosines = [0.0; 8 * BLOCK];
        let mut results = [[0.0; 8 * BLOCK]; 4];
        let width = lanes * BLOCK;
        for (cosines_here, sums) in self.cosines.chunks(width).zip(self.sums.chunks_mut(width)) {
            cosines[..cosines_here.len()].copy_from_slice(cosines_here);
            let mut cosine = [simd.splat_f64s(0.0); BLOCK];
            for (cosine, values) in cosine.iter_mut().zip(cosines.chunks_exact(lanes)) {
                *cosine = simd.partial_load_f64s(values);
            }
            let mut before = [simd.splat_f64s(0.0); BLOCK];
            let mut pi = [simd.splat_f64s(1.0); BLOCK];
            let mut sums_here = [[simd.splat_f64s(0.0); BLOCK]; 4];
            for term in self.terms {
                let (order, carry) = (simd.splat_f64s(term.order), simd.splat_f64s(term.carry));
                let [sum_re, sum_im, difference_re, difference_im] = term.parts;
                let (sum_re, sum_im) = (simd.splat_f64s(sum_re), simd.splat_f64s(sum_im));
                let (difference_re, difference_im) = (simd.splat_f64s(difference_re), simd.splat_f64s(difference_im));
                for lane in 0..BLOCK {
                    let s = simd.mul_f64s(cosine[lane], pi[lane]);
                    let t = simd.sub_f64s(s, before[lane]);
                    let tau = simd.sub_f64s(simd.mul_f64s(order, t), before[lane]);
                    let (plus, minus) = (simd.add_f64s(pi[lane], tau), simd.sub_f64s(pi[lane], tau));
                    sums_here[0][lane] = simd.mul_add_e_f64s(sum_re, plus, sums_here[0][lane]);
                    sums_here[1][lane] = simd.mul_add_e_f64s(sum_im, plus, sums_here[1][lane]);
                    sums_here[2][lane] = simd.mul_add_e_f64s(difference_re, minus, sums_here[2][lane]);
                    sums_here[3][lane] = simd.mul_add_e_f64s(difference_im, minus, sums_here[3][lane]);
                    before[lane] = pi[lane];
                    pi[lane] = simd.mul_add_e_f64s(carry, t, s);
                }
            }
            for (values, registers) in results.iter_mut().zip(&sums_here) {
                for (values, register) in values.chunks_exact_mut(lanes).zip(registers) {
                    simd.partial_store_f64s(values, *register);
                }
            }
            for (index, sum) in sums.iter_mut().enumerate() {
                *sum = Sums([results[0][index], results[1][index], results[2][index], results[3][index]]);
            }
        }
    }
}
