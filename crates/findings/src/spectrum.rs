//! From averaged powers to lines with bounds and peaks with verdicts.

use crate::WindowLobe;
use shaftwise_orders::{AveragedSpectrum, SpectrumPlan};
use shaftwise_signal::{
    LineScatter, chi_square_quantile, chi_square_tail, equivalent_averages, level_bounds,
    median_in_place, tone_equivalent_averages,
};

/// What to ask of a spectrum.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SpectrumReading {
    /// Probability that the bounds hold the expected level, two-sided. Common: 0.9.
    pub confidence: f64,
    /// Chance that noise alone gives any listed peak. Common: 0.05.
    pub false_alarm: f64,
    /// Repeatability wished, ± dB.
    pub repeatability_db: f64,
    /// 1-sigma of the angle in revolutions of the analysed shaft (0 on a time axis).
    pub angle_sigma_rev: f64,
    /// Orders from line to line (0 on a time axis, where no angle enters).
    pub line_order: f64,
    /// Lines from here on hold nothing to be trusted.
    pub usable_lines: usize,
    /// No peak is listed below this line: there a high-pass stands. 1 without one.
    pub first_line: usize,
    /// Power of the line number that a conversion in time puts on the noise: 2p for (j2πf)^p.
    pub floor_exponent: f64,
}

/// What can be said of a peak.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// Bounds within the repeatability wished.
    Repeatable,
    /// More averages would get there.
    MoreAverages,
    /// The level changed during the recording by more than its noise explains.
    Wanders,
}

/// A peak that stands out of its neighbourhood.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Peak {
    /// Highest line.
    pub line: usize,
    /// Interpolated place, in lines.
    pub place: f64,
    /// Interpolated mean square.
    pub power: f64,
    /// Lower bound of it.
    pub lower: f64,
    /// Upper bound of it.
    pub upper: f64,
    /// Power over the noise beside it.
    pub over_noise: f64,
    /// Verdict.
    pub verdict: Verdict,
    /// Averages that would reach the repeatability; none where the peak wanders.
    pub averages_needed: Option<u64>,
    /// 1-sigma of the average as seen between the twelfths, dB.
    pub seen_scatter_db: f64,
}

/// Bounds of every line, and the peaks, strongest first. Powers are mean squares.
#[derive(Debug, Clone, PartialEq)]
pub struct SpectrumFindings {
    /// Noise power beside each line.
    pub noise: Vec<f64>,
    /// Lower bound of each line's expected power.
    pub lower: Vec<f64>,
    /// Upper bound.
    pub upper: Vec<f64>,
    /// Peaks.
    pub peaks: Vec<Peak>,
    /// Equivalent averages of noise.
    pub noise_averages: f64,
    /// Equivalent averages of the product of a tone with noise.
    pub tone_averages: f64,
    /// Mean square of the whole band, window's noise bandwidth taken off.
    pub total: f64,
    /// Its lower bound.
    pub total_lower: f64,
    /// Its upper bound.
    pub total_upper: f64,
}

/// Reads an averaged spectrum.
///
/// The noise of a line is the median of the quiet lines beside it over the median of its χ² law. A peak is a local maximum above what noise alone reaches with the chance asked for in
/// the whole spectrum, and above the skirts of stronger peaks.
#[must_use]
pub fn read_spectrum(
    spectrum: &AveragedSpectrum,
    plan: &SpectrumPlan,
    lobe: &WindowLobe,
    reading: &SpectrumReading,
) -> SpectrumFindings {
    let power = &spectrum.mean;
    let usable = reading.usable_lines.min(power.len());
    let noise_averages = equivalent_averages(spectrum.blocks, |m| plan.correlation(m)).max(1.0);
    let tone_averages = tone_equivalent_averages(spectrum.blocks, |m| plan.correlation(m))
        .clamp(0.5, noise_averages);
    let freedom = 2.0 * noise_averages;
    // Neighbouring lines share noise: Σ of squared correlations over lines is N Σw⁴/(Σw²)².
    let w = plan.window().samples();
    let square: f64 = w.iter().map(|w| w * w).sum();
    let fourth: f64 = w.iter().map(|w| w.powi(4)).sum();
    let shared = w.len() as f64 * fourth / (square * square);
    let chance = reading.false_alarm / usable.max(1) as f64;
    // The noise level is itself a median (π/2 times the variance of a mean) of lines of which every
    // `shared` count as one.
    let level_freedom = freedom * (2 * SIDE) as f64 / (0.5 * std::f64::consts::PI * shared);
    let stand_out = f_quantile_above(chance, freedom, level_freedom);

    // Noise first with everything in, then without what stood out.
    let mut busy = vec![false; usable];
    let mut noise = floor(power, &busy, lobe, freedom, reading);
    let mut found = Vec::new();
    for _ in 0..3 {
        found = candidates(power, &noise, stand_out, lobe, reading, usable);
        let mut next = vec![false; usable];
        for &line in &found {
            let from = line.saturating_sub(lobe.half_width());
            let to = (line + lobe.half_width() + 1).min(usable);
            next[from..to].fill(true);
        }
        if next == busy {
            break;
        }
        busy = next;
        noise = floor(power, &busy, lobe, freedom, reading);
    }

    let scatter = |line: usize, noise_power: f64| LineScatter {
        noise_power,
        tone_averages,
        noise_averages,
        systematic_variance: systematic_variance(line, reading),
    };
    let (mut lower, mut upper) = (vec![f64::NAN; power.len()], vec![f64::NAN; power.len()]);
    let mut total_variance = 0.0;
    for line in 0..usable {
        let bounds = level_bounds(power[line], &scatter(line, noise[line]), reading.confidence);
        lower[line] = bounds.lower;
        upper[line] = bounds.upper;
        if line > 0 && bounds.freedom > 0.0 {
            total_variance += 2.0 * power[line] * power[line] / bounds.freedom;
        }
    }

    let mut peaks: Vec<Peak> = found
        .iter()
        .map(|&line| {
            read_peak(
                line,
                spectrum,
                &noise,
                lobe,
                &scatter(line, noise[line]),
                reading,
            )
        })
        .collect();
    peaks.sort_by(|a, b| b.power.total_cmp(&a.power).then(a.line.cmp(&b.line)));

    let bandwidth = plan.window().noise_bandwidth_lines();
    let total = power[1.min(usable)..usable].iter().sum::<f64>() / bandwidth;
    let by_noise = total_variance * shared / (bandwidth * bandwidth);
    let seen = seen_variance(spectrum, |epoch| {
        epoch[1.min(usable)..usable].iter().sum::<f64>() / bandwidth
    });
    let variance = by_noise.max(seen.unwrap_or(0.0));
    let (total_lower, total_upper) = chi_square_band(total, variance, reading.confidence);

    SpectrumFindings {
        noise,
        lower,
        upper,
        peaks,
        noise_averages,
        tone_averages,
        total,
        total_lower,
        total_upper,
    }
}

/// The ratio of two independent χ²/ν with `freedom` and `level_freedom` degrees of freedom that is
/// passed with probability `chance`: a line over a noise level that is itself estimated.
///
/// The law of the level is taken at its mid-quantiles, and the mean chance solved by halving.
fn f_quantile_above(chance: f64, freedom: f64, level_freedom: f64) -> f64 {
    const PARTS: usize = 96;
    let levels: Vec<f64> = (0..PARTS)
        .map(|i| {
            chi_square_quantile((i as f64 + 0.5) / PARTS as f64, level_freedom) / level_freedom
        })
        .collect();
    let passed = |ratio: f64| {
        levels
            .iter()
            .map(|level| chi_square_tail(ratio * level * freedom, freedom))
            .sum::<f64>()
            / PARTS as f64
    };
    let (mut low, mut high) = (1.0, 2.0);
    while passed(high) > chance {
        low = high;
        high *= 2.0;
    }
    for _ in 0..20 {
        let middle = 0.5 * (low + high);
        if passed(middle) > chance {
            low = middle;
        } else {
            high = middle;
        }
    }
    high
}

/// Bounds of a positive value with the given variance, as a χ² of the same mean and variance.
fn chi_square_band(value: f64, variance: f64, confidence: f64) -> (f64, f64) {
    let freedom = 2.0 * value * value / variance;
    if !(freedom > 0.0 && freedom < 1e12) {
        return (value, value);
    }
    let tail = 0.5 * (1.0 - confidence);
    (
        freedom * value / chi_square_quantile(1.0 - tail, freedom),
        freedom * value / chi_square_quantile(tail, freedom),
    )
}

/// An angle that scatters by σ takes 1 − e^{−(kσ)²} off the power of order k; the loss is not
/// corrected, so it counts as what may be missing.
fn systematic_variance(line: usize, reading: &SpectrumReading) -> f64 {
    let angle =
        2.0 * std::f64::consts::PI * line as f64 * reading.line_order * reading.angle_sigma_rev;
    let loss = -(-angle * angle).exp_m1();
    loss * loss
}

/// Lines asked on either side of a line for its noise: the median of both keeps 1.25/√48 of one
/// line's scatter, and a floor that bends within so few lines is rare.
const SIDE: usize = 24;

/// Noise beside each line: the median of the nearest quiet lines on either side, after the slope
/// between the two sides (a straight line in log power) was taken off.
fn floor(
    power: &[f64],
    busy: &[bool],
    lobe: &WindowLobe,
    freedom: f64,
    reading: &SpectrumReading,
) -> Vec<f64> {
    let usable = busy.len();
    let near = lobe.half_width() + 2;
    let to_mean = freedom / chi_square_quantile(0.5, freedom);
    let top = chi_square_quantile(0.995, freedom) / freedom;
    // Integration tilts the floor in a way that is known: look at it as it was recorded.
    let tilt = |line: usize| (line.max(1) as f64).powf(reading.floor_exponent);
    let recorded: Vec<f64> = power
        .iter()
        .enumerate()
        .map(|(line, p)| p / tilt(line))
        .collect();
    let quiet = |line: &usize| !busy[*line];
    let (mut left, mut right) = (Vec::with_capacity(SIDE), Vec::with_capacity(SIDE));
    let mut pool = Vec::with_capacity(2 * SIDE);
    let mut median = |lines: &[usize]| {
        pool.clear();
        pool.extend(lines.iter().map(|l| recorded[*l]));
        median_in_place(&mut pool)
    };
    let centre = |lines: &[usize]| lines.iter().sum::<usize>() as f64 / lines.len() as f64;
    let mut level_pool = Vec::with_capacity(2 * SIDE);
    let mut noise = vec![0.0; power.len()];
    for line in 0..usable {
        left.clear();
        left.extend(
            (1..line.saturating_sub(near - 1))
                .rev()
                .filter(quiet)
                .take(SIDE),
        );
        right.clear();
        right.extend((line + near..usable).filter(quiet).take(SIDE));
        // Six lines are the fewest whose median says anything.
        let slope = if left.len() >= 6 && right.len() >= 6 {
            let (a, b) = (median(&left), median(&right));
            if a > 0.0 && b > 0.0 {
                (b / a).ln() / (centre(&right) - centre(&left))
            } else {
                0.0
            }
        } else {
            0.0
        };
        level_pool.clear();
        level_pool.extend(
            left.iter()
                .chain(&right)
                .map(|&l| recorded[l] * (slope * (line as f64 - l as f64)).exp()),
        );
        if level_pool.is_empty() {
            continue;
        }
        let mut level = median_in_place(&mut level_pool) * to_mean;
        // What still towers over the noise is no noise.
        for _ in 0..4 {
            let before = level_pool.len();
            level_pool.retain(|p| *p <= level * top);
            if level_pool.len() == before || level_pool.len() < 6 {
                break;
            }
            level = median_in_place(&mut level_pool) * to_mean;
        }
        noise[line] = level * tilt(line);
    }
    noise
}

/// What the resampling itself may leave of a tone anywhere in the spectrum, as power: −120 dB.
const OWN_ACCURACY: f64 = 1e-12;

/// Local maxima that stand out of their noise and of what stronger ones leave: their skirts, the
/// ghosts that an uncertain angle makes of them, and the resampling's own errors.
fn candidates(
    power: &[f64],
    noise: &[f64],
    stand_out: f64,
    lobe: &WindowLobe,
    reading: &SpectrumReading,
    usable: usize,
) -> Vec<usize> {
    let mut tops: Vec<usize> = (reading.first_line.max(1)..usable.saturating_sub(1))
        .filter(|&k| {
            power[k] > power[k - 1]
                && power[k] >= power[k + 1]
                && power[k] > noise[k] * stand_out
                && power[k] > 0.0
        })
        .collect();
    tops.sort_by(|a, b| power[*b].total_cmp(&power[*a]).then(a.cmp(b)));
    let mut kept: Vec<usize> = Vec::new();
    // A skirt reaches its own top value only beside a steady tone; 6 dB for one that is not.
    const MARGIN: f64 = 4.0;
    let mut left_over = 0.0f64;
    for top in tops {
        // What is left of the bias stands on line 0; its lobe shows twice its mean square.
        let bias = std::iter::once((0, 2.0 * power[0]));
        let strong = kept.iter().map(|&line| (line, power[line])).chain(bias);
        let hidden = power[top] < left_over
            || strong.into_iter().any(|(line, level)| {
                // Skirt and noise add as amplitudes at worst.
                let skirt = (MARGIN * level * lobe.skirt(top.abs_diff(line))).sqrt();
                power[top].sqrt() < skirt + (noise[top] * stand_out).sqrt()
            });
        if !hidden {
            kept.push(top);
            // An angle off by σ turns order k by 2πkσ: that share of it may stand elsewhere.
            let turn = 2.0
                * std::f64::consts::PI
                * top as f64
                * reading.line_order
                * reading.angle_sigma_rev;
            left_over = left_over.max(power[top] * (turn * turn).max(OWN_ACCURACY));
        }
    }
    kept.sort_unstable();
    kept
}

fn read_peak(
    line: usize,
    spectrum: &AveragedSpectrum,
    noise: &[f64],
    lobe: &WindowLobe,
    scatter: &LineScatter,
    reading: &SpectrumReading,
) -> Peak {
    let power = &spectrum.mean;
    let beside = |other: usize| (power[other] - noise[line]).max(0.0);
    let (before, here, after) = (beside(line - 1), beside(line), beside(line + 1));
    let offset = lobe.offset(before, after);
    let response = lobe.power(offset);
    // A pure tone has a main lobe of the window's own width; a wider peak is no tone between
    // lines, and nothing is added to it.
    let narrow = before + after
        <= 1.3 * here / response * (lobe.power(1.0 - offset) + lobe.power(1.0 + offset));
    let gain = if narrow { 1.0 / response } else { 1.0 };
    let bounds = level_bounds(power[line], scatter, reading.confidence);

    let half_width_db = 0.5 * 10.0 * (bounds.upper / bounds.lower).log10();
    let seen = seen_variance(spectrum, |epoch| epoch[line]);
    let by_noise = 2.0 * power[line] * power[line] / bounds.freedom;
    let mean = power[line];
    let seen_scatter_db = seen.map_or(f64::NAN, |v| {
        10.0 / std::f64::consts::LN_10 * v.sqrt() / mean
    });
    let epochs = spectrum.epoch_means.len() as f64;
    // One in a thousand peaks of a steady machine may be called wandering, and then only if it
    // also spoils the repeatability.
    let wanders = seen.is_some_and(|v| {
        let ratio = v / by_noise * (epochs - 1.0);
        ratio > chi_square_quantile(0.999, epochs - 1.0)
            && 1.645 * seen_scatter_db > reading.repeatability_db
    });
    let verdict = if wanders {
        Verdict::Wanders
    } else if half_width_db <= reading.repeatability_db {
        Verdict::Repeatable
    } else {
        Verdict::MoreAverages
    };
    let averages_needed = match verdict {
        Verdict::Wanders => None,
        Verdict::Repeatable => Some(spectrum.blocks),
        Verdict::MoreAverages => Some(
            (spectrum.blocks as f64 * (half_width_db / reading.repeatability_db).powi(2)).ceil()
                as u64,
        ),
    };
    Peak {
        line,
        place: line as f64 + offset,
        power: mean * gain,
        lower: bounds.lower * gain,
        upper: bounds.upper * gain,
        over_noise: if noise[line] > 0.0 {
            mean / noise[line]
        } else {
            f64::INFINITY
        },
        verdict,
        averages_needed,
        seen_scatter_db,
    }
}

/// Variance of the whole average as seen between the twelfths; none with fewer than four.
fn seen_variance(spectrum: &AveragedSpectrum, value: impl Fn(&[f64]) -> f64) -> Option<f64> {
    let epochs = &spectrum.epoch_means;
    if epochs.len() < 4 {
        return None;
    }
    let total: u64 = epochs.iter().map(|(n, _)| n).sum();
    let mean = epochs
        .iter()
        .map(|(n, e)| *n as f64 * value(e))
        .sum::<f64>()
        / total as f64;
    let between: f64 = epochs
        .iter()
        .map(|(n, e)| *n as f64 * (value(e) - mean).powi(2))
        .sum();
    Some(between / (epochs.len() as f64 - 1.0) / total as f64)
}
