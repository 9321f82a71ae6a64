//! What point sampling does to the timing of a short edge, learned from the pulses themselves.
//!
//! An edge of one to four samples is not band-limited. Where its crossing is read then depends a
//! little on where in the sample interval the edge fell: by up to 0.01 sample for an edge of three
//! samples, 0.1 for one of a single sample. That error is a function e(φ, v) of the timed phase φ in
//! the sample interval, and of the speed v where the edge has a fixed angle; the shaft knows neither.
//!
//! Differences of order k between neighbouring pulses hold next to nothing of a smooth motion, but
//! √C(2k, k) times the error. So
//!
//! Δᵏt = Δᵏe + noise,  e(φ, v) = Σ_{h ≤ H} Σ_{p ≤ P} P_p(v) (a_hp sin 2πhφ + b_hp cos 2πhφ),
//!
//! P_p Legendre's polynomials over the speed range, by least squares. k is the order that leaves
//! least; H and P are those of the least n ln(RSS/n) + c ln n, n rows and c coefficients (G. Schwarz,
//! Ann. Statist. 6, 1978, from memory), which takes none where the scatter is random.

use crate::smoother::Pulse;
use shaftwise_signal::{BandedMatrix, SamplePosition, median_in_place};
use std::f64::consts::TAU;
use std::ops::RangeInclusive;

const ORDERS: RangeInclusive<usize> = 3..=10;
/// (H, P) tried.
const SHAPES: [(usize, usize); 6] = [(2, 0), (5, 0), (10, 0), (2, 3), (5, 3), (8, 3)];
const HARMONICS: usize = 10;
const POWERS: usize = 4;
const WIDEST: usize = 2 * HARMONICS * POWERS;
/// Rows learned from: enough for 80 coefficients, little work.
const ROWS: usize = 4096;
const ROWS_PER_COEFFICIENT: usize = 8;

/// The error as a function of phase and speed.
#[derive(Debug)]
struct SamplingError {
    speeds: (f64, f64),
    /// By harmonic, power, and sine before cosine.
    coefficients: [f64; WIDEST],
}

/// A pulse as it was timed, and where in the sample interval it fell.
#[derive(Debug, Clone, Copy)]
struct Seen {
    tooth: i64,
    timed: SamplePosition,
    /// 0…1; as timed at first, then as the smooth motion has it.
    phase: f64,
}

/// Correction, rms in samples, from which on the timed phase is too rough to learn from.
const ROUGH: f64 = 0.01;
/// Rounds with the phases of the smooth motion: each leaves less of the error in them.
const ROUNDS: usize = 3;

/// Takes off the pulses what point sampling did to their edges; returns its rms in samples, 0 when
/// nothing was found or nothing can be mended.
///
/// `smooth` lays the motion through the pulses and gives the instant of each pulse's tooth.
pub(crate) fn correct<E>(
    stretches: &mut [Vec<Pulse>],
    mut smooth: impl FnMut(&mut [Vec<Pulse>]) -> Result<Vec<Vec<SamplePosition>>, E>,
) -> Result<f64, E> {
    let mut seen: Vec<Vec<Seen>> = stretches
        .iter()
        .map(|pulses| {
            let seen = |p: &Pulse| Seen {
                tooth: p.tooth,
                timed: p.position,
                phase: p.position.fraction,
            };
            pulses.iter().map(seen).collect()
        })
        .collect();
    let mut rms = 0.0;
    for round in 0..=ROUNDS {
        let Some(error) = learn(&seen) else {
            break;
        };
        // Over the timed phase itself the slope says nothing: it is the phase that stood still.
        if round > 0 && error.hides_the_edge() {
            // Between two samples the edge left no trace: whatever is taken off is made up.
            rms = 0.0;
            put_back(stretches, &seen);
            break;
        }
        rms = error.take_off(stretches, &seen);
        if rms < ROUGH || round == ROUNDS {
            break;
        }
        for (seen, smooth) in seen.iter_mut().zip(smooth(stretches)?) {
            for (seen, smooth) in seen.iter_mut().zip(smooth) {
                seen.phase = smooth.fraction;
            }
        }
    }
    Ok(rms)
}

fn put_back(stretches: &mut [Vec<Pulse>], seen: &[Vec<Seen>]) {
    for (pulses, seen) in stretches.iter_mut().zip(seen) {
        for (pulse, seen) in pulses.iter_mut().zip(seen) {
            pulse.position = seen.timed;
        }
    }
}

/// Teeth per sample about a pulse.
fn speed(pulses: &[Seen], index: usize) -> f64 {
    let before = &pulses[index.saturating_sub(1)];
    let after = &pulses[(index + 1).min(pulses.len() - 1)];
    (after.tooth - before.tooth) as f64 / after.timed.since(before.timed)
}

/// Binomial coefficients of a difference of order k, signs alternating.
fn difference(k: usize) -> Vec<f64> {
    let mut weight = 1.0;
    (0..=k)
        .map(|i| {
            let here = weight;
            weight *= -((k - i) as f64) / (i + 1) as f64;
            here
        })
        .collect()
}

/// Runs of `k + 1` pulses of neighbouring teeth, at most [`ROWS`] of them spread over all.
fn windows(stretches: &[Vec<Seen>], k: usize) -> impl Iterator<Item = (&[Seen], usize)> {
    let total: usize = stretches.iter().map(Vec::len).sum();
    // Whole blocks, so that neighbours stay neighbours: one in `stride` of them.
    const BLOCK: usize = 256;
    let stride = total.div_ceil(ROWS).max(1);
    stretches.iter().flat_map(move |pulses| {
        (0..pulses.len().saturating_sub(k))
            .filter(move |i| (i / BLOCK).is_multiple_of(stride))
            .filter(move |&i| pulses[i + k].tooth - pulses[i].tooth == k as i64)
            .map(move |i| (pulses.as_slice(), i))
    })
}

/// Δᵏ of the positions, from exact distances to the first of them.
fn step(pulses: &[Seen], first: usize, weights: &[f64]) -> f64 {
    let origin = pulses[first].timed;
    weights
        .iter()
        .zip(&pulses[first..])
        .map(|(w, p)| w * p.timed.since(origin))
        .sum()
}

fn learn(stretches: &[Vec<Seen>]) -> Option<SamplingError> {
    let (mut best, mut order) = (f64::INFINITY, 0);
    for k in ORDERS {
        let weights = difference(k);
        let gain = weights.iter().map(|w| w * w).sum::<f64>().sqrt();
        let mut sizes: Vec<f64> = windows(stretches, k)
            .map(|(p, i)| step(p, i, &weights).abs())
            .collect();
        let typical = median_in_place(&mut sizes) / gain;
        if typical < best {
            (best, order) = (typical, k);
        }
    }
    if !(best > 0.0 && best.is_finite()) {
        return None;
    }
    let weights = difference(order);
    let gain: f64 = weights.iter().map(|w| w * w).sum();
    // Six standard deviations (1.4826 medians): what lies beyond is no matter of sampling.
    let limit = 6.0 * 1.4826 * best * gain.sqrt();
    let mut speeds = (f64::INFINITY, f64::NEG_INFINITY);
    for (pulses, i) in windows(stretches, order) {
        let v = speed(pulses, i);
        speeds = (speeds.0.min(v), speeds.1.max(v));
    }
    let mut error = SamplingError {
        speeds,
        coefficients: [0.0; WIDEST],
    };
    let mut normal = vec![0.0; WIDEST * WIDEST];
    let mut right = [0.0; WIDEST];
    let (mut square, mut rows) = (0.0, 0usize);
    let (mut row, mut one) = ([0.0; WIDEST], [0.0; WIDEST]);
    for (pulses, i) in windows(stretches, order) {
        let y = step(pulses, i, &weights);
        if y.abs() > limit {
            continue;
        }
        row.fill(0.0);
        for (j, w) in weights.iter().enumerate() {
            error.basis(pulses[i + j].phase, speed(pulses, i + j), &mut one);
            for (r, o) in row.iter_mut().zip(&one) {
                *r += w * o;
            }
        }
        for (a, ra) in row.iter().enumerate() {
            right[a] += ra * y;
            for (n, rb) in normal[a * WIDEST..=a * WIDEST + a].iter_mut().zip(&row) {
                *n += ra * rb;
            }
        }
        square += y * y;
        rows += 1;
    }
    let n = rows as f64;
    // A thousandth of what spread phases give: holds columns back that a steady speed leaves empty.
    let ridge = 1e-3 * 0.5 * gain * n;
    let mut least = n * (square / n).ln();
    let mut found = false;
    for (harmonics, powers) in SHAPES {
        let taken: Vec<usize> = (0..WIDEST)
            .filter(|c| c / (2 * POWERS) < harmonics && c / 2 % POWERS <= powers)
            .collect();
        let size = taken.len();
        if rows < ROWS_PER_COEFFICIENT * size {
            continue;
        }
        let mut matrix = BandedMatrix::zeros(size, size - 1);
        for (i, &a) in taken.iter().enumerate() {
            for (j, &b) in taken[..=i].iter().enumerate() {
                matrix.add(i, j, normal[a * WIDEST + b]);
            }
            matrix.add(i, i, ridge);
        }
        let Ok(factor) = matrix.factor() else {
            continue;
        };
        let mut solution: Vec<f64> = taken.iter().map(|&c| right[c]).collect();
        factor.solve(&mut solution);
        let explained: f64 = taken
            .iter()
            .zip(&solution)
            .map(|(&c, s)| right[c] * s)
            .sum();
        let left = (square - explained).max(1e-12 * square);
        let score = n * (left / n).ln() + size as f64 * n.ln();
        if score < least {
            least = score;
            found = true;
            error.coefficients.fill(0.0);
            for (&c, s) in taken.iter().zip(solution) {
                error.coefficients[c] = s;
            }
        }
    }
    found.then_some(error)
}

impl SamplingError {
    fn basis(&self, phase: f64, speed: f64, out: &mut [f64; WIDEST]) {
        let half = 0.5 * (self.speeds.1 - self.speeds.0);
        let x = if half > 0.0 {
            ((speed - self.speeds.0) / half - 1.0).clamp(-1.0, 1.0)
        } else {
            0.0
        };
        let legendre = [1.0, x, 1.5 * x * x - 0.5, (2.5 * x * x - 1.5) * x];
        let (sin, cos) = (TAU * phase).sin_cos();
        let (mut s, mut c) = (sin, cos);
        for harmonic in out.chunks_exact_mut(2 * POWERS) {
            for (pair, polynomial) in harmonic.chunks_exact_mut(2).zip(legendre) {
                pair[0] = polynomial * s;
                pair[1] = polynomial * c;
            }
            (s, c) = (s * cos + c * sin, c * cos - s * sin);
        }
    }

    /// Puts the pulses where they were timed less the error; returns its rms in samples.
    fn take_off(&self, stretches: &mut [Vec<Pulse>], seen: &[Vec<Seen>]) -> f64 {
        let (mut square, mut count) = (0.0, 0.0);
        for (pulses, seen) in stretches.iter_mut().zip(seen) {
            for (index, (pulse, here)) in pulses.iter_mut().zip(seen).enumerate() {
                let off = self.at(here.phase, speed(seen, index));
                pulse.position = SamplePosition::new(here.timed.index, here.timed.fraction - off);
                square += off * off;
                count += 1.0;
            }
        }
        f64::sqrt(square / count)
    }

    /// Whether somewhere in the sample interval the timed instant stands still while the edge moves:
    /// e′ = −1. An edge shorter than a sample does that between two samples. A twentieth of the interval
    /// may come within a twelfth of it, for the flat ends of an edge just long enough.
    fn hides_the_edge(&self) -> bool {
        const LOOKS: usize = 200;
        let speed = 0.5 * (self.speeds.0 + self.speeds.1);
        let half = 0.5 / LOOKS as f64;
        let still = (0..LOOKS)
            .filter(|i| {
                let phase = *i as f64 / LOOKS as f64;
                self.at(phase + half, speed) - self.at(phase - half, speed) < -0.92 * 2.0 * half
            })
            .count();
        still > LOOKS / 20
    }

    /// Timed less true, samples.
    fn at(&self, phase: f64, speed: f64) -> f64 {
        let mut row = [0.0; WIDEST];
        self.basis(phase, speed, &mut row);
        row.iter().zip(&self.coefficients).map(|(r, c)| r * c).sum()
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// Teeth of a shaft that hunts, timed with an error that depends on the phase in the sample.
    fn train(error: impl Fn(f64) -> f64) -> (Vec<Vec<Pulse>>, Vec<SamplePosition>) {
        let truth: Vec<SamplePosition> = (0..900)
            .map(|n| {
                let turns = f64::from(n);
                SamplePosition::new(1000, 1024.0 * turns + 3000.0 * (turns * 0.01).sin())
            })
            .collect();
        let pulses = truth.iter().zip(0..).map(|(at, tooth)| Pulse {
            tooth,
            position: SamplePosition::new(at.index, at.fraction + error(at.fraction)),
            used: true,
        });
        (vec![pulses.collect()], truth)
    }

    fn worst(stretches: &[Vec<Pulse>], truth: &[SamplePosition]) -> f64 {
        let off: Vec<f64> = stretches[0]
            .iter()
            .zip(truth)
            .map(|(p, t)| p.position.since(*t))
            .collect();
        let mean = off.iter().sum::<f64>() / off.len() as f64;
        off.iter().map(|o| (o - mean).abs()).fold(0.0, f64::max)
    }

    #[test]
    fn an_error_of_phase_is_learned_and_taken_off() {
        let error = |phase: f64| 0.006 * (TAU * phase).sin() + 0.001 * (2.0 * TAU * phase).cos();
        let (mut stretches, truth) = train(error);
        assert!(worst(&stretches, &truth) > 0.006);
        // A small error needs no second round: the motion is never asked for.
        let rms = correct(&mut stretches, |_| Err("asked")).unwrap();
        assert!((rms - 0.0043).abs() < 2e-4, "{rms}");
        // The timed phase is off by 0.006 sample itself: e′ of 0.04 times that, not learned.
        assert!(
            worst(&stretches, &truth) < 3e-4,
            "{:e}",
            worst(&stretches, &truth)
        );
    }

    #[test]
    fn random_scatter_is_left_alone() {
        let mut state = 7u64;
        let mut random = move || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1);
            (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
        };
        let (mut stretches, _) = train(|_| 0.0);
        for pulse in &mut stretches[0] {
            pulse.position = SamplePosition::new(
                pulse.position.index,
                pulse.position.fraction + 0.01 * random(),
            );
        }
        let before = stretches.clone();
        let rms = correct(&mut stretches, |_| Err(())).unwrap();
        assert_eq!(rms, 0.0);
        assert_eq!(before, stretches);
    }
}
