//! Smeared against tracked: what the drifting speed hid.

use crate::{Peak, WindowLobe};
use shaftwise_orders::AveragedSpectrum;
use std::ops::Range;

/// One order in both spectra. Powers are mean squares, places and widths in lines.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ComparedPeak {
    /// Place of the tracked peak.
    pub place: f64,
    /// Its power.
    pub tracked: f64,
    /// Power of the highest smeared line in the band.
    pub smeared: f64,
    /// Place of that line, interpolated.
    pub smeared_place: f64,
    /// Width of the tracked peak at half power.
    pub tracked_width: f64,
    /// Width of the smeared peak at half power, between the outermost crossings in the band.
    pub smeared_width: f64,
    /// Power summed over the band, noise bandwidth taken off.
    pub tracked_sum: f64,
    /// The same of the smeared spectrum.
    pub smeared_sum: f64,
}

/// Sets a tracked peak beside the smeared spectrum.
///
/// The smeared peak is looked for in `zone`, the lines half-way to the neighbouring peaks, and within
/// the band; the sums go over the whole band. The band of both is the peak ± (`half_spread` · place + 4 lines), `half_spread` being half the
/// swing of the speed over its mean: as far as the order travels in the plain spectrum.
#[must_use]
pub fn compare_peak(
    peak: &Peak,
    tracked: &AveragedSpectrum,
    smeared: &AveragedSpectrum,
    zone: Range<usize>,
    half_spread: f64,
    noise_bandwidth: f64,
    lobe: &WindowLobe,
) -> ComparedPeak {
    let lines = tracked.mean.len().min(smeared.mean.len());
    let half = half_spread * peak.place + 4.0;
    let from = ((peak.place - half).ceil().max(1.0)) as usize;
    let to = ((peak.place + half).floor() as usize + 1).min(lines);
    let band = from.min(peak.line)..to.max(peak.line + 1);
    let sum = |s: &AveragedSpectrum| s.mean[band.clone()].iter().sum::<f64>() / noise_bandwidth;
    // Half-way to the neighbouring peaks: what lies beyond belongs to them.
    let zone = band.start.max(zone.start).min(peak.line)..band.end.min(zone.end).max(peak.line + 1);
    let top = zone
        .clone()
        .max_by(|a, b| smeared.mean[*a].total_cmp(&smeared.mean[*b]).then(b.cmp(a)))
        .unwrap_or(peak.line);
    let (smeared_power, smeared_place) = interpolate(&smeared.mean, top, lobe);
    ComparedPeak {
        place: peak.place,
        tracked: peak.power,
        smeared: smeared_power,
        smeared_place,
        tracked_width: width(&tracked.mean, peak.line, peak.line, peak.line + 1),
        smeared_width: width(&smeared.mean, top, zone.start, zone.end),
        tracked_sum: sum(tracked),
        smeared_sum: sum(smeared),
    }
}

/// The lines nearer to each peak than to any other, in the peaks' own order.
#[must_use]
pub fn peak_zones(peaks: &[Peak], lines: usize) -> Vec<Range<usize>> {
    let half_way = |a: usize, b: usize| (a + b).div_ceil(2);
    peaks
        .iter()
        .map(|peak| {
            let others = || peaks.iter().map(|other| other.line);
            let below = others().filter(|line| *line < peak.line).max();
            let above = others().filter(|line| *line > peak.line).min();
            below.map_or(0, |line| half_way(line, peak.line))
                ..above.map_or(lines, |line| half_way(peak.line, line))
        })
        .collect()
}

/// Power and place between lines: the window's own lobe while the peak is that narrow, else the
/// line itself.
fn interpolate(power: &[f64], line: usize, lobe: &WindowLobe) -> (f64, f64) {
    if line == 0 || line + 1 >= power.len() {
        return (power.get(line).copied().unwrap_or(f64::NAN), line as f64);
    }
    let (before, here, after) = (power[line - 1], power[line], power[line + 1]);
    let offset = lobe.offset(before, after);
    let response = lobe.power(offset);
    if before + after
        <= 1.3 * here / response * (lobe.power(1.0 - offset) + lobe.power(1.0 + offset))
    {
        return (here / response, line as f64 + offset);
    }
    // A broad top: the vertex of a parabola through the three levels in dB, if they bend down.
    let (a, b, c) = (before.max(1e-300).ln(), here.ln(), after.max(1e-300).ln());
    let bend = a - 2.0 * b + c;
    let shift = if bend < 0.0 {
        (0.5 * (a - c) / bend).clamp(-0.5, 0.5)
    } else {
        0.0
    };
    (here, line as f64 + shift)
}

/// Width at half the power of `top`. From the outermost lines of `from..to` that reach it, walk out to
/// the crossing; levels between lines follow the parabola of the top next to it, straight lines in
/// dB further out.
fn width(power: &[f64], top: usize, from: usize, to: usize) -> f64 {
    let half = 0.5 * power[top];
    let first = (from..=top).find(|k| power[*k] >= half).unwrap_or(top);
    let last = (top..to.max(top + 1))
        .rev()
        .find(|k| power[*k] >= half)
        .unwrap_or(top);
    let crossing = |start: usize, step: isize| -> f64 {
        let mut inside = start;
        loop {
            let Some(outside) = inside.checked_add_signed(step).filter(|k| *k < power.len()) else {
                return inside as f64;
            };
            if power[outside] < half {
                let (high, low) = (power[inside].ln(), power[outside].max(1e-300).ln());
                let share = if inside == top && top > 0 && top + 1 < power.len() {
                    // ln P falls as a·u² on the side of a symmetric top.
                    (std::f64::consts::LN_2 / (high - low)).sqrt()
                } else {
                    (high - half.ln()) / (high - low)
                };
                return inside as f64 + step as f64 * share.clamp(0.0, 1.0);
            }
            inside = outside;
        }
    };
    crossing(last, 1) - crossing(first, -1)
}

/// What the speed alone says of smearing, before any spectrum is looked at.
///
/// For each of a number of blocks: how far the shaft runs ahead of steady turning, in
/// revolutions, at equal steps of time.
#[derive(Debug, Clone, PartialEq)]
pub struct SmearModel {
    /// Window values at those steps.
    pub window: Vec<f64>,
    /// Lead in revolutions, block by block.
    pub lead_rev: Vec<Vec<f64>>,
}

impl SmearModel {
    /// Loss in dB of a pure order in the plain power average: the largest over lines q of the mean
    /// over blocks of |Σ w e^{j2π(k·lead − q n/L)}|² / (Σw)².
    #[must_use]
    pub fn loss_db(&self, order: f64) -> f64 {
        let points = self.window.len() as f64;
        let sum: f64 = self.window.iter().sum();
        let turn = 2.0 * std::f64::consts::PI;
        let best = (-6..=6)
            .map(|q| {
                let q = f64::from(q) * 0.5;
                let power: f64 = self
                    .lead_rev
                    .iter()
                    .map(|lead| {
                        let (mut re, mut im) = (0.0, 0.0);
                        for (n, (w, lead)) in self.window.iter().zip(lead).enumerate() {
                            let (s, c) = (turn * (order * lead - q * n as f64 / points)).sin_cos();
                            re += w * c;
                            im += w * s;
                        }
                        re * re + im * im
                    })
                    .sum();
                power / self.lead_rev.len() as f64
            })
            .fold(0.0, f64::max);
        -10.0 * (best / (sum * sum)).log10()
    }

    /// Lowest order that loses 1 dB, within 1 %; none up to `highest`.
    #[must_use]
    pub fn onset(&self, highest: f64) -> Option<f64> {
        if self.lead_rev.is_empty() {
            return None;
        }
        let mut low = 0.0;
        let mut high = 0.1;
        while self.loss_db(high) < 1.0 {
            if high >= highest {
                return None;
            }
            low = high;
            high = (high * 1.3).min(highest);
        }
        while high - low > 0.01 * high {
            let middle = 0.5 * (low + high);
            if self.loss_db(middle) < 1.0 {
                low = middle
            } else {
                high = middle
            }
        }
        Some(0.5 * (low + high))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    #[test]
    fn a_ramp_inside_a_block_costs_what_the_table_says() {
        // Closed form Σ w e^{j2πk·½·5t²}, recomputed with numpy for a tone a quarter of a line off the
        // grid: order k at 5 rev/s² in a block of 0.5 s sweeps 5k/4 lines; Hann leaves this of its peak.
        let points = 400;
        let window: Vec<f64> = (0..points)
            .map(|n| 0.5 - 0.5 * (2.0 * PI * f64::from(n) / f64::from(points)).cos())
            .collect();
        let lead = |offset_lines: f64, order: f64| -> Vec<f64> {
            (0..points)
                .map(|n| {
                    let share = f64::from(n) / f64::from(points);
                    let t = 0.5 * (share - 0.5);
                    2.5 * t * t + offset_lines * share / order
                })
                .collect()
        };
        for (order, expected) in [(2.0, 0.921_315), (10.0, 0.558_470), (40.0, 0.282_624)] {
            let model = SmearModel {
                window: window.clone(),
                lead_rev: vec![lead(0.25, order)],
            };
            let peak = 10f64.powf(-model.loss_db(order) / 20.0);
            assert!((peak - expected).abs() < 1e-5, "{order}: {peak}");
        }
        let model = SmearModel {
            window,
            lead_rev: vec![lead(0.0, 1.0)],
        };
        let onset = model.onset(50.0);
        assert!(
            onset.is_some_and(|o| (model.loss_db(o) - 1.0).abs() < 0.05),
            "{onset:?}"
        );
    }

    #[test]
    fn steady_turning_never_smears() {
        let model = SmearModel {
            window: vec![1.0; 64],
            lead_rev: vec![vec![0.0; 64]; 5],
        };
        assert_eq!(model.onset(1e4), None);
    }

    #[test]
    fn the_width_of_a_hann_line_is_about_its_3_db_bandwidth() {
        // Harris 1978: 1.44 lines.
        let power = [0.0, 0.0, 0.25, 1.0, 0.25, 0.0, 0.0];
        assert!((width(&power, 3, 3, 4) - 1.44).abs() < 0.04);
        let flat = [0.01, 0.8, 1.0, 0.3, 0.9, 0.01];
        let w = width(&flat, 2, 0, 6);
        assert!(w > 3.0 && w < 4.6, "{w}");
    }
}
