//! A smooth motion through the pulses that count.
//!
//! Time is laid over angle, because the timing noise of a pulse is constant in time: then
//! every pulse has the same weight, and the instant of an angle needs no inversion. With y_i
//! the position of tooth i in samples and x_i its angle in knot intervals, the coefficients c
//! of the quintic spline s minimise
//!
//! Σ (y_i − s(x_i))² + Σ_k λ_k·(Δ⁵c)_k²,  λ_k = λ·(v_k/v̄)^q.
//!
//! - Knots are uniform in angle and run past the ends (P. Eilers, B. Marx 1996: P-splines).
//! - λ comes from the pulses' own scatter: generalised cross-validation (P. Craven, G. Wahba
//!   1979) with the true trace, residuals beyond five robust standard deviations clipped. Where
//!   the edges are known to be coarser than that scatter, Mallows' criterion with their own
//!   variance decides.
//! - A speed wobble of given size and frequency in time has a fifth derivative of t(θ) that
//!   goes with v⁻⁶: with q = 12 it is smoothed alike at all speeds. q ∈ {0, 6, 12} by the
//!   same score.
//! - Variance of angle and speed: mean of the Bayesian one, σ²H⁻¹ with H the matrix of the
//!   normal equations, and of the sandwich σ²H⁻¹AᵀAH⁻¹. Their ratio is taken from a train
//!   without gaps, H⁻¹ itself is exact and grows wide at gaps and ends.
//! - The equations are solved in windows. What a pulse does to a coefficient falls by
//!   e^{−0.309·λ^{−1/10}} per knot for stiff splines and by 0.43 for limp ones; guards on both
//!   sides are long enough for 1e-15 ([`guard_knots`]).

use crate::Error;
use shaftwise_signal::{
    BandedFactor, BandedMatrix, SamplePosition, median_in_place, quintic_slopes, quintic_weights,
};

/// Least and largest stiffness tried. Least: a wobble of one cycle in 8 knots keeps all but 7e-8
/// of its size, far less than the knots' own spacing costs it, and leverages stay clear of
/// rounding. Largest: guards of a thousand knots.
const STIFFNESS: [f64; 2] = [1e-6, 1e10];
const DIFFERENCE: [f64; 6] = [-1.0, 5.0, -10.0, 10.0, -5.0, 1.0];
/// Knots at most per revolution: a ripple of twice per revolution (a universal joint, the
/// strokes of an engine) is followed, finer steps come from the teeth rather than the shaft.
const MOST_KNOTS_PER_REV: u32 = 4;
/// Knots looked at, at most, while λ is chosen.
const SCORED_KNOTS: usize = 8192;
/// A pulse cannot be placed better than this, in samples.
const POSITION_FLOOR: f64 = 1e-7;

/// A pulse with its tooth, counted from the rotation's first pulse.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Pulse {
    pub(crate) tooth: i64,
    pub(crate) position: SamplePosition,
    /// Whether its instant takes part.
    pub(crate) used: bool,
}

/// What the smoother made of one stretch of pulses.
#[derive(Debug)]
pub(crate) struct Smoothed {
    pub(crate) knots_per_rev: u32,
    pub(crate) span_knots: f64,
    pub(crate) origin: u64,
    pub(crate) bits: u32,
    pub(crate) coefficients: Vec<i64>,
    pub(crate) sigma: Vec<[f32; 2]>,
    /// Pulses whose instants were dropped: index, distance from the motion in samples.
    pub(crate) dropped: Vec<(usize, f64)>,
}

/// How the smoother works on all stretches of one rotation.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Smoothing {
    lambda: f64,
    power: f64,
    /// Standard deviation of a pulse's position, in samples.
    pub(crate) sigma: f64,
}

/// Knots that a window must look beyond its borders for an influence below 1e-15.
///
/// Stiff: ln 1e15/0.309·λ^{1/10}; limp: ln 1e15/ln(1/0.4306) = 41. The sum bounds all
/// between (tested).
fn guard_knots(lambda: f64, pulses_per_knot: f64) -> usize {
    (48.0 + 112.0 * (lambda / pulses_per_knot).powf(0.1)).ceil() as usize
}

/// Where teeth fall on the knots.
#[derive(Debug)]
struct Grid {
    pulses_per_rev: i64,
    knots_per_rev: i64,
    weights: Vec<[f64; 6]>,
    end_weights: [f64; 6],
}

impl Grid {
    fn new(pulses_per_rev: u32) -> Self {
        let p = i64::from(pulses_per_rev);
        Self {
            pulses_per_rev: p,
            knots_per_rev: i64::from(pulses_per_rev.min(MOST_KNOTS_PER_REV)),
            weights: (0..p)
                .map(|rest| quintic_weights(rest as f64 / p as f64))
                .collect(),
            end_weights: quintic_weights(1.0),
        }
    }

    fn pulses_per_knot(&self) -> f64 {
        self.pulses_per_rev as f64 / self.knots_per_rev as f64
    }
}

/// One stretch and what is prepared for it.
struct Train<'a> {
    grid: &'a Grid,
    pulses: &'a mut [Pulse],
    first_tooth: i64,
    intervals: usize,
    span_knots: f64,
    /// ln(v/v̄) by knot; empty for q = 0.
    log_speed: Vec<f32>,
}

/// Solution in one window, in samples from `origin + slope·(knot − low)`.
struct Window {
    low: usize,
    origin: i128,
    slope: i64,
    solution: Vec<f64>,
    factor: BandedFactor,
}

/// What the scoring and the final pass need of a pulse.
#[derive(Clone, Copy)]
struct Residual {
    pulse: usize,
    residual: f64,
    leverage: f64,
}

impl Residual {
    fn freedom(&self) -> f64 {
        (1.0 - self.leverage).max(1e-9)
    }

    /// Residual in units in which its standard deviation is that of a pulse.
    fn studentised(&self) -> f64 {
        self.residual / self.freedom().sqrt()
    }
}

impl Train<'_> {
    /// Interval and u of a pulse.
    fn locate(&self, pulse: &Pulse) -> (usize, f64, &[f64; 6]) {
        let p = self.grid.pulses_per_rev;
        let turned = (pulse.tooth - self.first_tooth) * self.grid.knots_per_rev;
        let (knot, rest) = ((turned / p) as usize, turned % p);
        if knot == self.intervals {
            (knot - 1, 1.0, &self.grid.end_weights)
        } else {
            (
                knot,
                rest as f64 / p as f64,
                &self.grid.weights[rest as usize],
            )
        }
    }

    /// Pulses in intervals from `low` to before `high`.
    fn pulses_in(&self, low: usize, high: usize) -> std::ops::Range<usize> {
        let at = |knot| {
            self.pulses
                .partition_point(|pulse| self.locate(pulse).0 < knot)
        };
        at(low)..at(high)
    }

    fn prepare_speeds(&mut self, mean_period: f64) {
        let n = self.pulses.len();
        let mut speeds = vec![0.0; self.intervals];
        let mut filled = 0;
        for i in 0..n {
            let (a, b) = (
                &self.pulses[i.saturating_sub(3)],
                &self.pulses[(i + 3).min(n - 1)],
            );
            let period = b.position.since(a.position) / (b.tooth - a.tooth).max(1) as f64;
            let value = (mean_period / period.max(mean_period * 1e-6)).ln() as f32;
            let knot = self.locate(&self.pulses[i]).0;
            speeds[filled..=knot].fill(value);
            filled = knot + 1;
        }
        self.log_speed = speeds;
    }

    /// Median size of the fifth differences of the pulses' positions around a pulse, in
    /// samples: what no neighbour can foretell. None with fewer than four of them.
    fn bend(&self, index: usize) -> Option<f64> {
        const SIDE: usize = 24;
        let near =
            &self.pulses[index.saturating_sub(SIDE)..(index + SIDE + 1).min(self.pulses.len())];
        let mut sizes: Vec<f64> = near
            .windows(6)
            .filter(|six| six[5].tooth - six[0].tooth == 5 && six.iter().all(|p| p.used))
            .map(|six| {
                let at = six
                    .iter()
                    .map(|pulse| pulse.position.since(six[0].position));
                at.zip(DIFFERENCE).map(|(t, d)| t * d).sum::<f64>().abs()
            })
            .collect();
        (sizes.len() >= 4).then(|| median_in_place(&mut sizes))
    }

    fn row_stiffness(&self, row: usize, smoothing: &Smoothing) -> f64 {
        // Row k takes coefficients k … k + 5, centred on knots k − 2 … k + 3.
        let factor = match self.log_speed.get(row) {
            Some(&speed) if smoothing.power > 0.0 => (f64::from(speed) * smoothing.power).exp(),
            _ => 1.0,
        };
        (smoothing.lambda * factor).clamp(STIFFNESS[0], STIFFNESS[1])
    }

    /// Borders of the window around intervals `low` to `high` with its guards. Guards count
    /// pulses, so that a gap does not eat them up.
    fn guarded(&self, low: usize, high: usize, smoothing: &Smoothing) -> (usize, usize) {
        let stiffest = if smoothing.power > 0.0 {
            let near = low.saturating_sub(2000)..(high + 2000).min(self.intervals);
            near.map(|row| self.row_stiffness(row, smoothing))
                .fold(0.0, f64::max)
        } else {
            smoothing.lambda
        };
        let density = self.grid.pulses_per_knot();
        let pulses = (guard_knots(stiffest, density) as f64 * density).ceil() as usize;
        let inside = self.pulses_in(low, high);
        let first = inside.start.saturating_sub(pulses);
        let last = inside.end + pulses;
        (
            if first == 0 {
                0
            } else {
                self.locate(&self.pulses[first]).0.min(low)
            },
            match self.pulses.get(last) {
                Some(pulse) => self.locate(pulse).0.max(high),
                None => self.intervals,
            },
        )
    }

    /// Position of a pulse over the window's line.
    fn local(&self, pulse: &Pulse, low: usize, origin: i128, slope: i64) -> f64 {
        let (knot, u, _) = self.locate(pulse);
        let line = origin + i128::from(slope) * (knot - low) as i128;
        (i128::from(pulse.position.index) - line) as f64
            + (pulse.position.fraction - slope as f64 * u)
    }

    fn solve(
        &self,
        low: usize,
        high: usize,
        smoothing: &Smoothing,
        mut matrix: BandedMatrix,
    ) -> Result<Window, Error> {
        let rows = high - low + 5;
        let pulses = &self.pulses[self.pulses_in(low, high)];
        let (first, last) = (&pulses[0], &pulses[pulses.len() - 1]);
        let knots = (last.tooth - first.tooth) as f64 / self.grid.pulses_per_knot();
        let slope = (last.position.since(first.position) / knots.max(1e-9))
            .round()
            .min(1e15) as i64;
        let (knot, _, _) = self.locate(first);
        let origin = i128::from(first.position.index) - i128::from(slope) * (knot - low) as i128;

        matrix.reset(rows, 5);
        let mut right = vec![0.0; rows];
        let mut data = Vec::with_capacity(pulses.len());
        for pulse in pulses.iter().filter(|pulse| pulse.used) {
            let (knot, _, weights) = self.locate(pulse);
            matrix.add_outer(knot - low, weights, 1.0);
            let y = self.local(pulse, low, origin, slope);
            for (r, w) in right[knot - low..].iter_mut().zip(weights) {
                *r += w * y;
            }
            data.push((knot - low, weights, y));
        }
        let stiffness: Vec<f64> = (0..rows - 5)
            .map(|row| self.row_stiffness(low + row, smoothing))
            .collect();
        for (row, &lambda) in stiffness.iter().enumerate() {
            matrix.add_outer(row, &DIFFERENCE, lambda);
        }
        let factor = matrix.factor().map_err(|_| Error::Unsolvable {
            near: first.position.index,
        })?;
        let mut solution = right;
        factor.solve(&mut solution);
        // Stiff equations have a condition of 1e12 and more; the residual, taken from
        // differences and not from the matrix, brings the lost digits back.
        let mut correction = vec![0.0; rows];
        for _ in 0..2 {
            correction.fill(0.0);
            for (at, weights, y) in &data {
                let spline = dot(weights, &solution[*at..at + 6]);
                for (r, w) in correction[*at..].iter_mut().zip(*weights) {
                    *r += w * (y - spline);
                }
            }
            for (row, &lambda) in stiffness.iter().enumerate() {
                let bend = lambda * dot(&DIFFERENCE, &solution[row..row + 6]);
                for (r, d) in correction[row..].iter_mut().zip(&DIFFERENCE) {
                    *r -= d * bend;
                }
            }
            factor.solve(&mut correction);
            for (c, d) in solution.iter_mut().zip(&correction) {
                *c += d;
            }
        }
        Ok(Window {
            low,
            origin,
            slope,
            solution,
            factor,
        })
    }

    /// Residuals and leverages of the used pulses in intervals `low` to `high`.
    fn residuals(
        &self,
        window: &Window,
        inverse: &BandedMatrix,
        low: usize,
        high: usize,
        out: &mut Vec<Residual>,
    ) {
        for index in self.pulses_in(low, high) {
            let pulse = &self.pulses[index];
            if !pulse.used {
                continue;
            }
            let (knot, _, weights) = self.locate(pulse);
            let at = knot - window.low;
            let y = self.local(pulse, window.low, window.origin, window.slope);
            out.push(Residual {
                pulse: index,
                residual: y - dot(weights, &window.solution[at..at + 6]),
                leverage: quadratic(inverse, at, weights).min(1.0),
            });
        }
    }
}

fn dot(a: &[f64; 6], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

/// wᵀ·Z·w with w standing at `at`.
fn quadratic(z: &BandedMatrix, at: usize, w: &[f64; 6]) -> f64 {
    let mut sum = 0.0;
    for i in (0..6).filter(|&i| w[i] != 0.0) {
        sum += w[i] * w[i] * z.get(at + i, at + i);
        for j in 0..i {
            sum += 2.0 * w[i] * w[j] * z.get(at + i, at + j);
        }
    }
    sum
}

/// 1.4826 × the median magnitude: the standard deviation of what is not outlying.
fn robust_sigma(values: impl Iterator<Item = f64>) -> f64 {
    let mut sizes: Vec<f64> = values.map(f64::abs).collect();
    if sizes.is_empty() {
        0.0
    } else {
        1.482_602_218_505_602 * median_in_place(&mut sizes)
    }
}

/// Score of a stiffness over the scored windows of all trains.
struct Score {
    value: f64,
    /// Standard deviation of the residuals, freed of the fit's own share, in samples.
    sigma: f64,
}

fn score(
    trains: &[Train<'_>],
    smoothing: &Smoothing,
    known_sigma: Option<f64>,
) -> Result<Score, Error> {
    let total: usize = trains.iter().map(|train| train.intervals).sum();
    let length = 1024;
    // Every window, or evenly spread ones: depends on the pulses' number only.
    let windows = total.div_ceil(length).max(1);
    let stride = windows.div_ceil(SCORED_KNOTS / length).max(1);
    let mut residuals = Vec::new();
    let mut matrix = BandedMatrix::default();
    let mut inverse = BandedMatrix::default();
    let mut number = 0;
    for train in trains {
        let mut low = 0;
        while low < train.intervals {
            let high = (low + length).min(train.intervals);
            if number % stride == stride / 2 || total <= SCORED_KNOTS {
                let inside = train.pulses_in(low, high);
                if !inside.is_empty() {
                    let (from, to) = train.guarded(low, high, smoothing);
                    let window = train.solve(from, to, smoothing, matrix)?;
                    window.factor.inverse_band(&mut inverse);
                    train.residuals(&window, &inverse, low, high, &mut residuals);
                    matrix = window.factor.into_scratch();
                }
            }
            number += 1;
            low = high;
        }
    }
    let n = residuals.len() as f64;
    // Clipped against the neighbourhood as well: a lone stray is, a stretch that the stiffness
    // does not suit is not.
    let whole = robust_sigma(residuals.iter().map(Residual::studentised));
    let squares: f64 = residuals
        .chunks(32)
        .map(|near| {
            let clip = 5.0 * robust_sigma(near.iter().map(Residual::studentised)).max(whole);
            near.iter()
                .map(|r| r.studentised().powi(2).min(clip * clip) * r.freedom())
                .sum::<f64>()
        })
        .sum();
    let freedom = residuals.iter().map(Residual::freedom).sum::<f64>();
    let value = match known_sigma {
        None => n * squares / (freedom * freedom),
        Some(sigma) => squares / n + 2.0 * sigma * sigma * (n - freedom) / n,
    };
    Ok(Score {
        value,
        sigma: (squares / freedom).sqrt(),
    })
}

/// Ratio of the sandwich variance to the Bayesian one on a train without gaps: for the
/// position and for its slope.
fn sandwich_ratios(lambda: f64, pulses_per_knot: f64) -> [f64; 2] {
    let mut sums = [[0.0; 2]; 2];
    let points = 4096;
    for i in 0..points {
        let w = std::f64::consts::PI * (f64::from(i) + 0.5) / f64::from(points);
        let value = (66.0 + 52.0 * w.cos() + 2.0 * (2.0 * w).cos()) / 120.0;
        let slope = (20.0 * w.sin() + 2.0 * (2.0 * w).sin()) / 24.0;
        let a = pulses_per_knot * value * value;
        let s = a + lambda * (2.0 * (0.5 * w).sin()).powi(10);
        for (sum, gain) in sums.iter_mut().zip([value * value, slope * slope]) {
            sum[0] += gain / s;
            sum[1] += gain * a / (s * s);
        }
    }
    sums.map(|[bayes, sandwich]| sandwich / bayes)
}

/// Chooses the stiffness and lays the motion through each stretch. Pulses found far off the
/// motion get `used = false`. `edge_sigma` is what is known of the edges' own timing noise,
/// in samples.
pub(crate) fn smooth(
    stretches: &mut [Vec<Pulse>],
    pulses_per_rev: u32,
    edge_sigma: f64,
) -> Result<(Smoothing, Vec<Smoothed>), Error> {
    let grid = Grid::new(pulses_per_rev);
    let (mut periods, mut teeth) = (0.0, 0.0);
    for pulses in stretches.iter() {
        let (first, last) = (&pulses[0], &pulses[pulses.len() - 1]);
        periods += last.position.since(first.position);
        teeth += (last.tooth - first.tooth) as f64;
    }
    let mut trains: Vec<Train<'_>> = stretches
        .iter_mut()
        .map(|pulses| {
            let first_tooth = pulses[0].tooth;
            let span_knots =
                (pulses[pulses.len() - 1].tooth - first_tooth) as f64 / grid.pulses_per_knot();
            let mut train = Train {
                grid: &grid,
                pulses,
                first_tooth,
                intervals: span_knots.ceil() as usize,
                span_knots,
                log_speed: Vec::new(),
            };
            train.prepare_speeds(periods / teeth);
            train
        })
        .collect();
    let floor = edge_sigma.max(POSITION_FLOOR);
    let mut smoothing = choose(&trains, floor)?;

    let mut dropped = vec![Vec::new(); trains.len()];
    let mut results = Vec::new();
    for round in 0..8 {
        results.clear();
        let mut squares = 0.0;
        let mut freedom = 0.0;
        let mut all: Vec<Vec<Residual>> = Vec::new();
        for train in &trains {
            let (fit, residuals) = fit(train, &smoothing)?;
            results.push(fit);
            for r in &residuals {
                squares += r.residual * r.residual;
                freedom += r.freedom();
            }
            all.push(residuals);
        }
        let outlying = outliers(&trains, &all, floor);
        smoothing.sigma = (squares / freedom).sqrt().max(floor);
        if outlying.is_empty() || round == 7 {
            break;
        }
        for (train, index, off) in outlying {
            trains[train].pulses[index].used = false;
            dropped[train].push((index, off));
        }
        if round == 0 {
            smoothing = choose(&trains, floor)?;
        }
    }
    let ratios = sandwich_ratios(smoothing.lambda, grid.pulses_per_knot())
        .map(|ratio| (smoothing.sigma.powi(2) * 0.5 * (1.0 + ratio)).sqrt());
    for (result, dropped) in results.iter_mut().zip(dropped) {
        for sigma in &mut result.sigma {
            sigma[0] = (f64::from(sigma[0]) * ratios[0]) as f32;
            sigma[1] = (f64::from(sigma[1]) * ratios[1]) as f32;
        }
        result.dropped = dropped;
    }
    Ok((smoothing, results))
}

/// λ by decades over the whole range, then to a quarter of a decade; q by the same score.
fn choose(trains: &[Train<'_>], floor: f64) -> Result<Smoothing, Error> {
    let speeds = trains.iter().flat_map(|train| &train.log_speed);
    let (slowest, fastest) = speeds.fold((f32::MAX, f32::MIN), |(a, b), &s| (a.min(s), b.max(s)));
    let powers: &[f64] = if fastest - slowest > 0.2 {
        &[0.0, 6.0, 12.0]
    } else {
        &[0.0]
    };
    let mut best = (
        f64::INFINITY,
        Smoothing {
            lambda: STIFFNESS[0],
            power: 0.0,
            sigma: floor,
        },
    );
    let mut known = None;
    // A second turn only where the edges are known to be coarser than the scatter found.
    for _ in 0..2 {
        best.0 = f64::INFINITY;
        for &power in powers {
            let mut at = f64::NAN;
            let mut least = f64::INFINITY;
            let mut consider = |exponent: f64, at: &mut f64| -> Result<(), Error> {
                let trial = Smoothing {
                    lambda: 10f64.powf(exponent),
                    power,
                    sigma: floor,
                };
                let found = score(trains, &trial, known)?;
                if found.value < least {
                    least = found.value;
                    *at = exponent;
                }
                if found.value < best.0 {
                    best = (
                        found.value,
                        Smoothing {
                            sigma: found.sigma,
                            ..trial
                        },
                    );
                }
                Ok(())
            };
            let decades = (STIFFNESS[0].log10() as i32)..=(STIFFNESS[1].log10() as i32);
            for decade in decades.step_by(2) {
                consider(f64::from(decade), &mut at)?;
            }
            for step in [1.0, 0.5, 0.25] {
                let centre = at;
                for exponent in [centre - step, centre + step] {
                    if (STIFFNESS[0].log10()..=STIFFNESS[1].log10()).contains(&exponent) {
                        consider(exponent, &mut at)?;
                    }
                }
            }
        }
        if known.is_some() || best.1.sigma >= floor {
            break;
        }
        known = Some(floor);
    }
    Ok(best.1)
}

/// Fits one train in windows. Sigmas are left for a unit standard deviation of the pulses.
fn fit(train: &Train<'_>, smoothing: &Smoothing) -> Result<(Smoothed, Vec<Residual>), Error> {
    let n = train.intervals;
    let origin = train.pulses[0].position.index;
    let length = train.pulses[train.pulses.len() - 1].position.index - origin;
    // Room for the length, for coefficients beyond the ends, and a sign.
    let bits = (60 - (64 - length.leading_zeros()).min(60)).min(40);
    let unit = f64::from(bits).exp2();
    let mut coefficients = vec![0i64; n + 5];
    let mut sigma = vec![[0f32; 2]; n + 1];
    let mut residuals = Vec::new();
    let mut matrix = BandedMatrix::default();
    let mut inverse = BandedMatrix::default();
    let guard = guard_knots(smoothing.lambda, train.grid.pulses_per_knot());
    let core = (4 * guard).max(1024);
    let (at_value, at_slope) = (quintic_weights(0.0), quintic_slopes(0.0));
    let mut low = 0;
    while low < n {
        let high = (low + core).min(n);
        let (from, to) = train.guarded(low, high, smoothing);
        let window = train.solve(from, to, smoothing, matrix)?;
        window.factor.inverse_band(&mut inverse);
        train.residuals(&window, &inverse, low, high, &mut residuals);
        // Coefficient i is centred on knot i − 2; the last window owns those past the end.
        let last = if high == n { n + 5 } else { high };
        for i in low..last {
            let line = window.origin - i128::from(origin)
                + i128::from(window.slope) * (i as i128 - 2 - from as i128);
            let local = window.solution[i - from] * unit;
            coefficients[i] = ((line << bits) + local.round() as i128) as i64;
        }
        let knots = if high == n { n + 1 } else { high };
        for (knot, sigma) in sigma.iter_mut().enumerate().take(knots).skip(low) {
            let at = knot - from;
            let five = &window.solution[at..];
            let slope: f64 = at_slope[..5]
                .iter()
                .zip(five)
                .map(|(w, c)| w * c)
                .sum::<f64>()
                + window.slope as f64;
            let variances = [
                five_quadratic(&inverse, at, &at_value),
                five_quadratic(&inverse, at, &at_slope),
            ];
            let per_rev = train.grid.knots_per_rev as f64;
            // d angle = d position/(samples per rev); d speed/speed = −d slope/slope. The
            // speed still lacks its factor, the sample rate.
            sigma[0] = (variances[0].max(0.0).sqrt() / (slope * per_rev)) as f32;
            sigma[1] = (variances[1].max(0.0).sqrt() / (slope * slope * per_rev)) as f32;
        }
        matrix = window.factor.into_scratch();
        low = high;
    }
    let smoothed = Smoothed {
        knots_per_rev: train.grid.knots_per_rev as u32,
        span_knots: train.span_knots,
        origin,
        bits,
        coefficients,
        sigma,
        dropped: Vec::new(),
    };
    Ok((smoothed, residuals))
}

/// As [`quadratic`], for weights whose sixth is zero and may stand past the last row.
fn five_quadratic(z: &BandedMatrix, at: usize, w: &[f64; 6]) -> f64 {
    let mut sum = 0.0;
    for i in 0..5 {
        sum += w[i] * w[i] * z.get(at + i, at + i);
        for j in 0..i {
            sum += 2.0 * w[i] * w[j] * z.get(at + i, at + j);
        }
    }
    sum
}

/// Pulses whose instants stand out: beyond five robust standard deviations of their
/// neighbourhood and of the whole, each the worst among its neighbours. Train, pulse, distance
/// in samples.
fn outliers(
    trains: &[Train<'_>],
    residuals: &[Vec<Residual>],
    floor: f64,
) -> Vec<(usize, usize, f64)> {
    const NEIGHBOURS: usize = 24;
    /// Below this share of a revolution (0.01 deg) no instant is worth a repair.
    const LEAST_REV: f64 = 3e-5;
    const LEAST_AT_ENDS_REV: f64 = 0.02;
    const ENDS: usize = 4;
    let whole = robust_sigma(residuals.iter().flatten().map(Residual::studentised)).max(floor);
    let mut found = Vec::new();
    for (number, (train, residuals)) in trains.iter().zip(residuals).enumerate() {
        for (position, r) in residuals.iter().enumerate() {
            let size = r.studentised().abs();
            if size <= 5.0 * whole {
                continue;
            }
            let near = &residuals[position.saturating_sub(NEIGHBOURS)
                ..(position + NEIGHBOURS + 1).min(residuals.len())];
            let worst = near.iter().all(|other| other.studentised().abs() <= size);
            let local = robust_sigma(near.iter().map(Residual::studentised));
            let off = r.residual / r.freedom();
            let i = r.pulse;
            let (a, b) = (
                &train.pulses[i.saturating_sub(2)],
                &train.pulses[(i + 2).min(train.pulses.len() - 1)],
            );
            let per_rev = b.position.since(a.position) / (b.tooth - a.tooth) as f64
                * train.grid.pulses_per_rev as f64;
            // Beside an end or a gap a pulse is held against what is half an extrapolation.
            let end = position < ENDS || position + ENDS >= residuals.len();
            let least = if end {
                LEAST_AT_ENDS_REV * per_rev
            } else if train.pulses[residuals[position + ENDS].pulse].tooth
                - train.pulses[residuals[position - ENDS].pulse].tooth
                > 2 * ENDS as i64
            {
                5.0 * train.bend(i).unwrap_or(LEAST_AT_ENDS_REV * per_rev)
            } else {
                0.0
            };
            if worst && size > 5.0 * local && off.abs() > least.max(LEAST_REV * per_rev) {
                found.push((number, i, off));
            }
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    fn train_of(grid: &Grid, pulses: &mut [Pulse], act: impl FnOnce(&Train<'_>)) {
        let intervals = pulses.len() - 1;
        act(&Train {
            grid,
            pulses,
            first_tooth: 0,
            intervals,
            span_knots: intervals as f64,
            log_speed: Vec::new(),
        });
    }

    #[test]
    fn windows_give_what_the_whole_gives() {
        let mut pulses: Vec<Pulse> = (0..6000)
            .map(|i| {
                let t = f64::from(i);
                let offset = 1024.0 * t + 300.0 * (0.02 * t).sin() + (t * 12.9898).sin();
                Pulse {
                    tooth: i64::from(i),
                    position: SamplePosition::new(0, offset),
                    used: true,
                }
            })
            .collect();
        let grid = Grid::new(1);
        train_of(&grid, &mut pulses, |train| {
            for lambda in [1e-6, 1.0, 1e5, 1e8] {
                let smoothing = Smoothing {
                    lambda,
                    power: 0.0,
                    sigma: 1.0,
                };
                let solve = |low, high| {
                    let window = train.solve(low, high, &smoothing, BandedMatrix::default());
                    window.expect("positive definite")
                };
                let whole = solve(0, train.intervals);
                let (low, high) = (2700, 3300);
                let (from, to) = train.guarded(low, high, &smoothing);
                let part = solve(from, to);
                for i in low..high {
                    let place = |window: &Window| {
                        let line = window.origin
                            + i128::from(window.slope) * (i as i128 - 2 - window.low as i128);
                        (line, window.solution[i - window.low])
                    };
                    let ((a, b), (c, d)) = (place(&whole), place(&part));
                    let difference = (a - c) as f64 + (b - d);
                    // 1e-15 of the position, which is 3e6 samples, twice rounded.
                    assert!(difference.abs() < 6e-9, "{lambda:e} {i}: {difference:e}");
                }
            }
        });
    }

    #[test]
    fn guards_bound_what_a_pulse_does_far_away() {
        let grid = Grid::new(1);
        for exponent in -6..=10 {
            let lambda = 10f64.powi(exponent);
            let guard = guard_knots(lambda, 1.0);
            let n = 2 * guard + 1;
            // One pulse off by 1e6 samples in an even train.
            let mut pulses: Vec<Pulse> = (0..n)
                .map(|i| {
                    let index = 1_000_000_000 + 1000 * i as u64 + 1_000_000 * u64::from(i == guard);
                    let position = SamplePosition {
                        index,
                        fraction: 0.0,
                    };
                    Pulse {
                        tooth: i as i64,
                        position,
                        used: true,
                    }
                })
                .collect();
            let smoothing = Smoothing {
                lambda,
                power: 0.0,
                sigma: 1.0,
            };
            train_of(&grid, &mut pulses, |train| {
                let window = train
                    .solve(0, train.intervals, &smoothing, BandedMatrix::default())
                    .expect("positive definite");
                let size = |i: usize| window.solution[i].abs();
                let at = |share: f64| {
                    let from = guard + 2 + (share * guard as f64) as usize;
                    (from..from + guard / 20).map(size).fold(0.0, f64::max)
                };
                // Rounding hides the last third; the first 60 % must have lost 60 % of the
                // fifteen decades.
                let lost = (at(0.0) / at(0.6)).log10();
                assert!(lost > 0.6 * 15.0 - 1.0, "{lambda:e}: {lost} decades");
            });
        }
    }

    #[test]
    fn a_limp_spline_has_equal_variances_and_a_stiff_one_the_known_ratios() {
        let limp = sandwich_ratios(1e-9, 1.0);
        assert!(limp.iter().all(|r| (r - 1.0).abs() < 1e-3), "{limp:?}");
        // ∫(1 + x¹⁰)⁻²/∫(1 + x¹⁰)⁻¹ = 9/10, with x² before both 7/10.
        let stiff = sandwich_ratios(1e9, 1.0);
        assert!(
            (stiff[0] - 0.9).abs() < 5e-3 && (stiff[1] - 0.7).abs() < 5e-3,
            "{stiff:?}"
        );
    }
}
