//! Noise: white by position, coloured by a recursive filter over it.
//!
//! To keep a sample a function of its index, a coloured noise is made in pages: the filter starts
//! at rest `warm_up` samples before the page, long enough for its memory to fall below 1e-18, and
//! runs to the page's end. Neighbouring pages are therefore the same endless filter's output
//! except for rounding.

use crate::{Generator, Noise};
use std::f64::consts::TAU;

/// Samples in a page of coloured noise.
pub(crate) const PAGE: usize = 16_384;

const LONGEST_WARM_UP: f64 = 1e6;

/// y = Σ b·w − Σ a·y over a channel's own white noise.
#[derive(Debug, Clone)]
pub(crate) struct Filter {
    b: [f64; 3],
    a: [f64; 2],
    warm_up: usize,
}

impl Filter {
    /// `None` if the filter would need to remember more than 1e6 samples.
    pub(crate) fn new(noise: &Noise, rate_hz: f64) -> Option<Self> {
        let (b, a) = match *noise {
            Noise::White { .. } => ([1.0, 0.0, 0.0], [0.0, 0.0]),
            Noise::OnePole { corner_hz, .. } => {
                let pole = (-TAU * corner_hz / rate_hz).exp();
                ([1.0, 0.0, 0.0], [-pole, 0.0])
            }
            Noise::LowPass { corner_hz, .. } => {
                let (sin, cos) = (TAU * corner_hz / rate_hz).sin_cos();
                let alpha = sin * std::f64::consts::FRAC_1_SQRT_2;
                let [a0, a1, a2] = [1.0 + alpha, -2.0 * cos, 1.0 - alpha];
                let b = (1.0 - cos) / a0;
                ([0.5 * b, b, 0.5 * b], [a1 / a0, a2 / a0])
            }
            Noise::BandPass {
                center_hz,
                bandwidth_hz,
                ..
            } => {
                let cos = (TAU * center_hz / rate_hz).cos();
                let alpha = (0.5 * TAU * bandwidth_hz / rate_hz).tan();
                let [a0, a1, a2] = [1.0 + alpha, -2.0 * cos, 1.0 - alpha];
                ([alpha / a0, 0.0, -alpha / a0], [a1 / a0, a2 / a0])
            }
        };
        // radius of the slower pole
        let root = 0.25 * a[0] * a[0] - a[1];
        let radius = if root < 0.0 {
            a[1].sqrt()
        } else {
            0.5 * a[0].abs() + root.sqrt()
        };
        let warm_up = 16.0 + (1e-18f64.ln() / radius.ln()).max(0.0);
        (radius < 1.0 && warm_up < LONGEST_WARM_UP).then_some(Self {
            b,
            a,
            warm_up: warm_up as usize,
        })
    }

    fn run(&self, values: &mut [f64]) {
        let ([b0, b1, b2], [a1, a2]) = (self.b, self.a);
        let (mut first, mut second) = (0.0, 0.0);
        for value in values {
            let input = *value;
            let output = b0 * input + first;
            first = b1 * input - a1 * output + second;
            second = b2 * input - a2 * output;
            *value = output;
        }
    }

    /// Σh²: the power that unit white noise has behind the filter.
    fn power(&self) -> f64 {
        let mut response = vec![0.0; self.warm_up];
        response[0] = 1.0;
        self.run(&mut response);
        response.iter().map(|h| h * h).sum()
    }

    /// |H|² at a frequency as a fraction of the rate.
    fn gain(&self, fraction: f64) -> f64 {
        let [first, second] = [1.0, 2.0].map(|n| (TAU * n * fraction).sin_cos());
        let square = |c0: f64, c1: f64, c2: f64| {
            let re = c0 + c1 * first.1 + c2 * second.1;
            let im = c1 * first.0 + c2 * second.0;
            re * re + im * im
        };
        let ([b0, b1, b2], [a1, a2]) = (self.b, self.a);
        square(b0, b1, b2) / square(1.0, a1, a2)
    }
}

impl Noise {
    /// Rms, unit.
    #[must_use]
    pub fn rms(&self) -> f64 {
        match *self {
            Self::White { rms }
            | Self::OnePole { rms, .. }
            | Self::LowPass { rms, .. }
            | Self::BandPass { rms, .. } => rms,
        }
    }

    /// One-sided power density at a frequency, unit²/Hz: its integral from 0 to rate/2 is rms².
    /// The frequency is from 0 to rate/2; NaN if the noise is not valid at this rate.
    #[must_use]
    pub fn density(&self, frequency_hz: f64, rate_hz: f64) -> f64 {
        let rms = self.rms();
        Filter::new(self, rate_hz).map_or(f64::NAN, |filter| {
            2.0 * rms * rms / rate_hz * filter.gain(frequency_hz / rate_hz) / filter.power()
        })
    }
}

/// A noise ready to be made.
#[derive(Debug, Clone)]
pub(crate) struct NoiseSource {
    generator: Generator,
    gain: f64,
    filter: Option<Filter>,
}

/// The page of a coloured noise made last.
#[derive(Debug, Clone, Default)]
pub(crate) struct Page {
    number: Option<i64>,
    values: Vec<f64>,
}

impl NoiseSource {
    pub(crate) fn new(noise: &Noise, rate_hz: f64, generator: Generator) -> Self {
        let filter = match noise {
            Noise::White { .. } => None,
            _ => Filter::new(noise, rate_hz),
        };
        let power = filter.as_ref().map_or(1.0, Filter::power);
        Self {
            generator,
            gain: noise.rms() / power.sqrt(),
            filter,
        }
    }

    /// Adds samples first, first + 1, … that lie within one page.
    pub(crate) fn add(&self, first: i64, page: &mut Page, out: &mut [f64]) {
        let Some(filter) = &self.filter else {
            page.values.resize(out.len(), 0.0);
            self.generator.fill_gaussian(first, &mut page.values);
            add_scaled(self.gain, &page.values, out);
            return;
        };
        let number = first.div_euclid(PAGE as i64);
        let start = number * PAGE as i64;
        if page.number != Some(number) {
            page.values.resize(filter.warm_up + PAGE, 0.0);
            self.generator
                .fill_gaussian(start - filter.warm_up as i64, &mut page.values);
            filter.run(&mut page.values);
            page.number = Some(number);
        }
        let offset = filter.warm_up + (first - start) as usize;
        add_scaled(self.gain, &page.values[offset..], out);
    }
}

fn add_scaled(gain: f64, values: &[f64], out: &mut [f64]) {
    for (out, value) in out.iter_mut().zip(values) {
        *out += gain * value;
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]

    use super::*;

    const RATE: f64 = 5000.0;

    fn kinds() -> [Noise; 4] {
        [
            Noise::White { rms: 0.7 },
            Noise::OnePole {
                rms: 0.7,
                corner_hz: 20.0,
            },
            Noise::LowPass {
                rms: 0.7,
                corner_hz: 300.0,
            },
            Noise::BandPass {
                rms: 0.7,
                center_hz: 900.0,
                bandwidth_hz: 100.0,
            },
        ]
    }

    #[test]
    fn density_adds_up_to_the_power() {
        for noise in kinds() {
            // the periodic spectrum is summed by the midpoint rule, which converges like radius^n
            let lines = 20_000;
            let step = 0.5 * RATE / f64::from(lines);
            let power: f64 = (0..lines)
                .map(|i| step * noise.density((f64::from(i) + 0.5) * step, RATE))
                .sum();
            assert!((power / 0.49 - 1.0).abs() < 1e-10, "{noise:?}: {power}");
        }
    }

    #[test]
    fn half_power_points_lie_where_they_are_asked_for() {
        let [_, _, low, band] = kinds();
        // by definition of the Butterworth corner under the bilinear transform
        let ratio = low.density(300.0, RATE) / low.density(0.0, RATE);
        assert!((ratio - 0.5).abs() < 1e-12);
        // the −3 dB points of a digital resonator lie at m ± Δ/2, cos m = cos ω₀ · cos Δ/2
        let half_width = TAU * 50.0 / RATE;
        let middle = ((TAU * 900.0 / RATE).cos() * half_width.cos()).acos();
        for side in [middle - half_width, middle + half_width] {
            let ratio = band.density(side / TAU * RATE, RATE) / band.density(900.0, RATE);
            assert!((ratio - 0.5).abs() < 1e-12);
        }
    }

    #[test]
    fn rms_is_as_asked() {
        for noise in kinds() {
            let source = NoiseSource::new(&noise, RATE, Generator::new(8));
            let mut page = Page::default();
            let pages = 32;
            let mut power = 0.0;
            for number in 0..pages {
                let mut out = vec![0.0; PAGE];
                source.add(number * PAGE as i64, &mut page, &mut out);
                power += out.iter().map(|x| x * x).sum::<f64>();
            }
            let count = (pages * PAGE as i64) as f64;
            // var of the mean square is 2σ⁴·Σρ²/N, Σρ² = (rate/2)·∫S²df / (∫S df)²
            let step = RATE / 40_000.0;
            let squares: f64 = (0..20_000)
                .map(|i| {
                    let density = noise.density((f64::from(i) + 0.5) * step, RATE);
                    step * density * density
                })
                .sum();
            let spread = (2.0 * 0.5 * RATE * squares / 0.49f64.powi(2) / count).sqrt();
            let miss = power / count / 0.49 - 1.0;
            assert!(miss.abs() < 5.0 * spread, "{noise:?}: {miss} of {spread}");
        }
    }

    #[test]
    fn pages_join_as_one_endless_filter() {
        let noise = kinds()[1];
        let filter = Filter::new(&noise, RATE).unwrap();
        let source = NoiseSource::new(&noise, RATE, Generator::new(8));
        let mut straight = vec![0.0; filter.warm_up + 2 * PAGE];
        source
            .generator
            .fill_gaussian(-(filter.warm_up as i64), &mut straight);
        filter.run(&mut straight);
        let mut page = Page::default();
        let mut out = vec![0.0; PAGE];
        source.add(PAGE as i64, &mut page, &mut out);
        for (value, expected) in out.iter().zip(&straight[filter.warm_up + PAGE..]) {
            // rounding of about 40 remembered steps of values up to 5 rms
            assert!((value - source.gain * expected).abs() < 1e-13);
        }
    }
}
