//! The shape a pure tone takes in a spectrum: the window's main lobe and the skirt beside it.

use shaftwise_signal::WindowPlan;

/// Steps per line of the table.
const FINE: usize = 64;
/// Lines the fine table reaches: the widest main lobe (flat top, Kaiser β 18) is 6 lines to a side.
const FINE_LINES: usize = 7;
/// Steps per line when looking for the top of a side lobe.
const COARSE: usize = 8;

/// A window's response to a tone, tabled.
#[derive(Debug, Clone)]
pub struct WindowLobe {
    /// Power response at offsets i/FINE lines.
    power: Vec<f64>,
    /// Largest power response at or beyond a distance of i lines, tone anywhere between lines.
    skirt: Vec<f64>,
    /// Lines from the tone to the end of the main lobe.
    half_width: usize,
}

impl WindowLobe {
    /// Tables the response of a window.
    #[must_use]
    pub fn new(window: &WindowPlan) -> Self {
        let at = |offset: f64| power_response(window.samples(), offset);
        let power: Vec<f64> = (0..=FINE * FINE_LINES + 2)
            .map(|i| at(i as f64 / FINE as f64))
            .collect();
        let lines = (window.samples().len() / 2).min(256);
        let mut skirt: Vec<f64> = (0..=lines)
            .map(|line| {
                (0..COARSE)
                    .map(|i| {
                        let offset = (line as f64 + i as f64 / COARSE as f64 - 0.5).max(0.0);
                        at(offset)
                    })
                    .fold(0.0, f64::max)
            })
            .collect();
        for i in (0..lines).rev() {
            skirt[i] = skirt[i].max(skirt[i + 1]);
        }
        // The main lobe ends where the response stops falling or is lost in rounding.
        let half_width = (FINE..power.len() - 1)
            .find(|&i| power[i + 1] > power[i] || power[i] < 1e-18)
            .unwrap_or(power.len() - 1)
            .div_ceil(FINE);
        Self {
            power,
            skirt,
            half_width,
        }
    }

    /// Power response `offset` lines from the tone, 0…7 lines; cubic between table values.
    #[must_use]
    pub fn power(&self, offset: f64) -> f64 {
        let place = (offset.abs() * FINE as f64).min((FINE * FINE_LINES) as f64);
        let i = place as usize;
        let u = place - i as f64;
        let p = |i: isize| self.power[i.unsigned_abs()];
        let i = i as isize;
        let (a, b, c, d) = (p(i - 1), p(i), p(i + 1), p(i + 2));
        // Lagrange's cubic through four neighbours.
        -a * u * (u - 1.0) * (u - 2.0) / 6.0 + b * (u + 1.0) * (u - 1.0) * (u - 2.0) / 2.0
            - c * (u + 1.0) * u * (u - 2.0) / 2.0
            + d * (u + 1.0) * u * (u - 1.0) / 6.0
    }

    /// Largest power response at `lines` lines or further from the line nearest a tone.
    #[must_use]
    pub fn skirt(&self, lines: usize) -> f64 {
        self.skirt
            .get(lines)
            .or(self.skirt.last())
            .copied()
            .unwrap_or(0.0)
    }

    /// Lines from a tone to the end of its main lobe.
    #[must_use]
    pub fn half_width(&self) -> usize {
        self.half_width
    }

    /// Offset of a tone from the middle one of three lines, −0.5…0.5 lines, from their powers.
    #[must_use]
    pub fn offset(&self, before: f64, after: f64) -> f64 {
        let sign = if after >= before { 1.0 } else { -1.0 };
        let (near, far) = if after >= before {
            (after, before)
        } else {
            (before, after)
        };
        // Grows from 1 at offset 0: compare products, far may be 0.
        let beyond = |d: f64| near * self.power(1.0 + d) > far * self.power(1.0 - d);
        if beyond(0.5) {
            return sign * 0.5;
        }
        let (mut low, mut high) = (0.0, 0.5);
        for _ in 0..40 {
            let middle = 0.5 * (low + high);
            if beyond(middle) {
                low = middle
            } else {
                high = middle
            }
        }
        sign * 0.5 * (low + high)
    }
}

/// |Σ w e^{−j2π·offset·n/N}|² / (Σw)², by a running rotation (error N eps).
fn power_response(w: &[f64], offset: f64) -> f64 {
    let (step_sin, step_cos) = (2.0 * std::f64::consts::PI * offset / w.len() as f64).sin_cos();
    let (mut c, mut s, mut re, mut im, mut sum) = (1.0, 0.0, 0.0, 0.0, 0.0);
    for w in w {
        re += w * c;
        im += w * s;
        sum += w;
        (c, s) = (c * step_cos - s * step_sin, s * step_cos + c * step_sin);
    }
    (re * re + im * im) / (sum * sum)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use shaftwise_signal::Window;

    #[test]
    fn the_lobe_is_the_window_and_finds_offsets() {
        for (window, width) in [
            (Window::Hann, 2),
            (Window::Rectangular, 1),
            (Window::FlatTop, 5),
            (Window::Kaiser { beta: 18.0 }, 6),
        ] {
            let plan = WindowPlan::new(window, 1024).unwrap();
            let lobe = WindowLobe::new(&plan);
            assert_eq!(lobe.half_width(), width, "{window:?}");
            for i in 0..60 {
                let offset = f64::from(i) * 0.0413;
                assert!(
                    (lobe.power(offset) - plan.response(offset).powi(2)).abs() < 2e-7,
                    "{offset}"
                );
            }
            for offset in [-0.5, -0.31, 0.0, 0.07, 0.49] {
                let found = lobe.offset(
                    plan.response(1.0 + offset).powi(2),
                    plan.response(1.0 - offset).powi(2),
                );
                assert!((found - offset).abs() < 1e-4, "{window:?} {offset} {found}");
            }
        }
        // Hann's first side lobe stands at −31.5 dB, 2.4 lines out (Harris 1978); from 2.5 lines on a
        // little less is left.
        let lobe = WindowLobe::new(&WindowPlan::new(Window::Hann, 1024).unwrap());
        let db = 10.0 * lobe.skirt(3).log10();
        assert!((-33.0..-31.5).contains(&db), "{db}");
    }
}
