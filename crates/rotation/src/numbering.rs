//! Which pulse belongs to which tooth, decided over the whole train at once.
//!
//! Pulses are a marked point process: a tooth gives its pulse with probability 1 − p near the
//! angle it stands at; strays come at a rate λ. Hypotheses, each a sequence of labels with a
//! Kalman filter for the motion, are carried along the train and ranked by likelihood:
//!
//! - stray: ln λ;
//! - tooth m after the last: (m − 1)·ln p + ln(1 − p) + ln v − ½ ln 2πS − ½ν²/S, with ν the
//!   distance from the predicted angle and S its variance; ln v makes the density one in time,
//!   as that of the strays is.
//!
//! Motion: white jerk, of density q·v⁵, so that q is a number per tooth. Time is in units of
//! the train's median interval, angle in teeth. p, λ and q come from three stretches of the
//! train itself. Hypotheses with the same last tooth and speeds within a quarter of a standard
//! deviation are one; those 30 nats behind are given up.
//!
//! A gap is bridged only where both sides agree on its number of teeth: the filter run up to
//! it and the filter run back to it give that number with a standard deviation, and beyond
//! 0.12 teeth, or 30 missing teeth, a new section starts.

use crate::smoother::Pulse;
use crate::{LEAST_PULSES, LedgerAction, LedgerEntry};
use shaftwise_signal::{SamplePosition, median_in_place};

const BEAM: usize = 200;
const PRUNE: f64 = 30.0;
const MOST_STEP: i64 = 150;
/// Missing teeth bridged at most.
const MOST_MISSING: i64 = 30;
/// Largest standard deviation of a gap's count, in teeth.
const SURE: f64 = 0.12;
/// First pulses that may be the first tooth, and how far apart the first two teeth may be.
const STARTS: usize = 24;
const FIRST_PAIR: usize = 8;
/// Pulses between decisions, and how far those lie behind.
const DECIDE: usize = 4096;
const LAG: usize = 1024;

/// Pulses with their teeth, in stretches whose count is sure.
#[derive(Debug, Default)]
pub(crate) struct Numbering {
    pub(crate) stretches: Vec<Vec<Pulse>>,
    pub(crate) ledger: Vec<LedgerEntry>,
    pub(crate) rejected: u64,
    pub(crate) warnings: Vec<String>,
}

/// What a train is like.
#[derive(Debug, Clone, Copy)]
struct Traits {
    /// Share of teeth without a pulse.
    missing: f64,
    /// Strays per unit of time.
    strays: f64,
    /// Density of the jerk, per tooth.
    jerk: f64,
    /// Variance of a pulse's instant.
    variance: f64,
    /// Variance of a tooth's angle.
    tooth_variance: f64,
}

/// Angle past the last tooth, speed, acceleration, with their covariance.
#[derive(Debug, Clone, Copy)]
struct State {
    x: [f64; 3],
    /// 00 01 02 11 12 22
    p: [f64; 6],
}

impl State {
    /// At the second of two neighbouring teeth, `dt` apart.
    fn between(dt: f64, traits: &Traits) -> Self {
        let v = 1.0 / dt;
        let r = traits.variance * v * v + traits.tooth_variance;
        // Nothing is known of the acceleration but that speed lasts for a few teeth.
        let a = (0.3 * v * v).powi(2);
        Self {
            x: [0.0, v, 0.0],
            p: [
                r,
                r * v,
                0.0,
                2.0 * r * v * v + 0.25 * a * dt * dt,
                0.5 * a * dt,
                a,
            ],
        }
    }

    fn predict(&self, dt: f64, traits: &Traits) -> Self {
        let [e, v, a] = self.x;
        let h = 0.5 * dt * dt;
        let [p00, p01, p02, p11, p12, p22] = self.p;
        // F·P, F = [1 dt h; 0 1 dt; 0 0 1]
        let f00 = p00 + dt * p01 + h * p02;
        let f01 = p01 + dt * p11 + h * p12;
        let f02 = p02 + dt * p12 + h * p22;
        let f11 = p11 + dt * p12;
        let f12 = p12 + dt * p22;
        let q = traits.jerk * v.abs().powi(5);
        let (d2, d3) = (dt * dt, dt * dt * dt);
        Self {
            x: [e + v * dt + a * h, v + a * dt, a],
            p: [
                f00 + dt * f01 + h * f02 + q * d2 * d3 / 20.0,
                f01 + dt * f02 + q * d2 * d2 / 8.0,
                f02 + q * d3 / 6.0,
                f11 + dt * f12 + q * d3 / 3.0,
                f12 + q * d2 / 2.0,
                p22 + q * dt,
            ],
        }
    }

    fn innovation_variance(&self, traits: &Traits) -> f64 {
        self.p[0] + traits.variance * self.x[1] * self.x[1] + traits.tooth_variance
    }

    /// After the angle was seen to be `step`; the angle counts from there on.
    fn update(&self, step: f64, s: f64) -> Self {
        let nu = step - self.x[0];
        let [p00, p01, p02, p11, p12, p22] = self.p;
        let (k0, k1, k2) = (p00 / s, p01 / s, p02 / s);
        Self {
            x: [
                self.x[0] + k0 * nu - step,
                self.x[1] + k1 * nu,
                self.x[2] + k2 * nu,
            ],
            p: [
                p00 - k0 * p00,
                p01 - k0 * p01,
                p02 - k0 * p02,
                p11 - k1 * p01,
                p12 - k1 * p02,
                p22 - k2 * p02,
            ],
        }
    }
}

#[derive(Debug, Clone, Copy)]
struct Hypothesis {
    score: f64,
    state: State,
    tooth: i64,
    /// Teeth that gave a pulse.
    seen: usize,
    /// Pulse of the last tooth, and its time.
    pulse: usize,
    time: f64,
    node: usize,
}

impl Hypothesis {
    /// Whether too much has been missed since the last tooth to tell where the shaft stands.
    fn is_lost(&self, time: f64, traits: &Traits) -> bool {
        let missed = self.state.x[1] * (time - self.time);
        self.seen >= LEAST_PULSES
            && missed > MOST_MISSING as f64
            && (missed > MOST_STEP as f64
                || self.state.predict(time - self.time, traits).p[0] > 1.0)
    }
}

/// A label in the tree of hypotheses.
#[derive(Debug, Clone, Copy)]
struct Node {
    parent: usize,
    pulse: usize,
    tooth: i64,
}

const ROOT: usize = usize::MAX;

/// The labels of a stretch of pulses.
#[derive(Debug, Default)]
struct Labels {
    /// Pulse and tooth.
    teeth: Vec<(usize, i64)>,
    score: f64,
    /// First pulse that could not be reached from those before.
    broken_at: Option<usize>,
}

/// Labels `times[first..last]`.
fn label(times: &[f64], first: usize, last: usize, traits: &Traits) -> Labels {
    let (ln_stray, ln_missing, ln_seen) = (
        traits.strays.ln(),
        traits.missing.ln(),
        (1.0 - traits.missing).ln(),
    );
    let mut beam: Vec<Hypothesis> = Vec::new();
    let mut next: Vec<Hypothesis> = Vec::new();
    let mut ranked: Vec<(f64, usize)> = Vec::new();
    let mut nodes: Vec<Node> = Vec::new();
    let mut labels = Labels::default();
    let mut decided = first;
    for pulse in first..last {
        let time = times[pulse];
        if beam
            .first()
            .is_some_and(|leader| leader.is_lost(time, traits))
        {
            labels.broken_at = Some(beam[0].pulse + 1);
            break;
        }
        next.clear();
        for h in &beam {
            next.push(Hypothesis {
                score: h.score + ln_stray,
                ..*h
            });
            let predicted = h.state.predict(time - h.time, traits);
            let s = predicted.innovation_variance(traits);
            let v = predicted.x[1];
            if !(v > 0.0 && s > 0.0) {
                continue;
            }
            let gate = 5.0 * s.sqrt() + 0.02;
            let from = ((predicted.x[0] - gate).ceil() as i64).max(1);
            let to = ((predicted.x[0] + gate).floor() as i64).min(MOST_STEP);
            for step in from..=to {
                let nu = step as f64 - predicted.x[0];
                let gain = (step - 1) as f64 * ln_missing + ln_seen + v.ln()
                    - 0.5 * (std::f64::consts::TAU * s).ln()
                    - 0.5 * nu * nu / s;
                let tooth = h.tooth + step;
                nodes.push(Node {
                    parent: h.node,
                    pulse,
                    tooth,
                });
                next.push(Hypothesis {
                    score: h.score + gain,
                    state: predicted.update(step as f64, s),
                    tooth,
                    seen: h.seen + 1,
                    pulse,
                    time,
                    node: nodes.len() - 1,
                });
            }
        }
        // A train may start here: all before are strays but one.
        for start in pulse.saturating_sub(FIRST_PAIR).max(first)..pulse.min(first + STARTS) {
            let dt = time - times[start];
            let strays = (pulse - first - 1) as f64 * ln_stray;
            // Two teeth, any speed within a factor of e^10.
            let score = strays + 2.0 * ln_seen - 2.0 * dt.ln() - 10f64.ln();
            nodes.push(Node {
                parent: ROOT,
                pulse: start,
                tooth: 0,
            });
            nodes.push(Node {
                parent: nodes.len() - 1,
                pulse,
                tooth: 1,
            });
            next.push(Hypothesis {
                score,
                state: State::between(dt, traits),
                tooth: 1,
                seen: 2,
                pulse,
                time,
                node: nodes.len() - 1,
            });
        }
        // Teeth overdue count against a hypothesis, or "all are strays" would crowd out the rest.
        let rank = |h: &Hypothesis| {
            let overdue = (h.state.x[1] * (time - h.time) - 0.5).floor().max(0.0);
            h.score + overdue * ln_missing
        };
        // Most hypotheses are hopeless: only the rest is put in order.
        ranked.clear();
        ranked.extend(next.iter().map(rank).zip(0..));
        let best = ranked
            .iter()
            .map(|(rank, _)| *rank)
            .fold(f64::NEG_INFINITY, f64::max);
        ranked.retain(|(rank, _)| *rank >= best - PRUNE);
        ranked.sort_unstable_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        // Where a train may start, there is more to choose from.
        let room = if pulse < first + 3 * STARTS {
            4 * BEAM
        } else {
            BEAM
        };
        beam.clear();
        for &(_, index) in &ranked {
            if beam.len() >= room {
                break;
            }
            let h: &Hypothesis = &next[index];
            let double = beam.iter().any(|other| {
                other.pulse == h.pulse
                    && (other.state.x[1] - h.state.x[1]).abs() < 0.25 * other.state.p[3].sqrt()
            });
            if !double {
                beam.push(*h);
            }
        }
        if pulse - decided >= DECIDE && !beam.is_empty() {
            decide(&mut beam, &mut nodes, pulse - LAG, &mut labels.teeth);
            decided = pulse;
        }
    }
    if let Some(leader) = beam.first() {
        labels.score = leader.score;
        let mut tail = chain(&nodes, leader.node);
        tail.reverse();
        labels.teeth.extend(tail);
    }
    labels
}

/// Labels from a node back to the root.
fn chain(nodes: &[Node], mut node: usize) -> Vec<(usize, i64)> {
    let mut out = Vec::new();
    while node != ROOT {
        out.push((nodes[node].pulse, nodes[node].tooth));
        node = nodes[node].parent;
    }
    out
}

/// Makes the leader's labels up to `until` final, drops hypotheses that differ from them, and
/// forgets the nodes no longer needed.
fn decide(
    beam: &mut Vec<Hypothesis>,
    nodes: &mut Vec<Node>,
    until: usize,
    teeth: &mut Vec<(usize, i64)>,
) {
    let ancestor = |mut node: usize| {
        while node != ROOT && nodes[node].pulse > until {
            node = nodes[node].parent;
        }
        node
    };
    let settled = ancestor(beam[0].node);
    if settled == ROOT {
        return;
    }
    beam.retain(|h| ancestor(h.node) == settled);
    let mut part = chain(nodes, settled);
    part.reverse();
    teeth.extend(part);
    let mut needed = vec![false; nodes.len()];
    for h in beam.iter() {
        let mut node = h.node;
        while node != settled && !needed[node] {
            needed[node] = true;
            node = nodes[node].parent;
        }
    }
    // Parents come before their children, so one pass renumbers all. The settled label is out
    // already: its children become roots.
    let mut place = vec![ROOT; nodes.len()];
    let mut kept = Vec::new();
    for (index, node) in nodes.iter().enumerate() {
        if needed[index] {
            let parent = if node.parent == settled {
                ROOT
            } else {
                place[node.parent]
            };
            place[index] = kept.len();
            kept.push(Node { parent, ..*node });
        }
    }
    for h in beam.iter_mut() {
        h.node = if h.node == settled {
            ROOT
        } else {
            place[h.node]
        };
    }
    *nodes = kept;
}

/// Numbers the pulses. `sigma` is the timing noise known of the edges, in samples.
pub(crate) fn number(
    positions: &[SamplePosition],
    pulses_per_rev: u32,
    sigma: f64,
    sample_rate_hz: f64,
) -> Numbering {
    let mut intervals: Vec<f64> = positions
        .windows(2)
        .map(|pair| pair[1].since(pair[0]))
        .collect();
    let unit = median_in_place(&mut intervals).max(1e-9);
    let times: Vec<f64> = positions
        .iter()
        .map(|p| p.since(positions[0]) / unit)
        .collect();
    let traits = learn(&times, pulses_per_rev, sigma / unit);

    let mut out = Numbering::default();
    let mut taken = vec![false; positions.len()];
    let mut tooth = 0;
    let mut first = 0;
    while first < times.len() {
        let labels = label(&times, first, times.len(), &traits);
        if labels.teeth.len() < LEAST_PULSES && labels.broken_at.is_none() {
            // No train begins among these pulses.
            first += STARTS;
            continue;
        }
        let Some(&(start, start_tooth)) = labels.teeth.first() else {
            break;
        };
        if let Some(previous) = out.stretches.last().and_then(|s: &Vec<Pulse>| s.last()) {
            // Best guess over a break nobody can count: the mean of the speeds on both sides.
            let (a, b) = (previous.position, positions[start]);
            tooth = previous.tooth + guess_teeth(&out.stretches, &labels, positions, b.since(a));
            out.warnings.push(format!(
                "no sure count of revolutions from {:.3} s to {:.3} s: a new section starts there",
                a.seconds(sample_rate_hz),
                b.seconds(sample_rate_hz)
            ));
        }
        let mut stretch: Vec<Pulse> = Vec::new();
        for (i, &(pulse, label)) in labels.teeth.iter().enumerate() {
            let position = positions[pulse];
            let this = Pulse {
                tooth: tooth + label - start_tooth,
                position,
                used: true,
            };
            if let Some(last) = stretch.last() {
                let missing = this.tooth - last.tooth - 1;
                let doubt = if missing > 0 {
                    doubt(&times, &labels.teeth, i, &traits)
                } else {
                    None
                };
                if missing > MOST_MISSING || doubt.is_some() {
                    out.warnings.push(format!(
                        "about {missing} pulses missing from {:.3} s to {:.3} s, {}: a new section \
                         starts there",
                        last.position.seconds(sample_rate_hz),
                        position.seconds(sample_rate_hz),
                        doubt.unwrap_or_else(|| "too many to bridge".to_owned())
                    ));
                    out.stretches.push(std::mem::take(&mut stretch));
                }
            }
            stretch.push(this);
            taken[pulse] = true;
        }
        out.stretches.push(stretch);
        match labels.broken_at {
            Some(next) if next > first => first = next,
            _ => break,
        }
    }
    let mut short = Vec::new();
    out.stretches.retain(|stretch| {
        let enough = stretch.len() >= LEAST_PULSES;
        if !enough {
            short.extend(stretch.iter().map(|pulse| pulse.position));
        }
        enough
    });
    // Revolutions count from the first pulse that is left.
    if let Some(zero) = out.stretches.first().map(|stretch| stretch[0].tooth) {
        for pulse in out.stretches.iter_mut().flatten() {
            pulse.tooth -= zero;
        }
    }
    let mut reject = |position: SamplePosition, reason: &str| {
        out.rejected += 1;
        out.ledger.push(LedgerEntry {
            time_s: position.seconds(sample_rate_hz),
            action: LedgerAction::Rejected,
            reason: reason.to_owned(),
        });
    };
    for position in short {
        reject(position, "too few pulses together to follow the motion");
    }
    for (position, taken) in positions.iter().zip(taken) {
        if !taken {
            reject(*position, "pulse where none was due");
        }
    }
    out
}

/// Teeth over a break of `gap` samples, at the mean of the speeds on both sides.
fn guess_teeth(
    stretches: &[Vec<Pulse>],
    labels: &Labels,
    positions: &[SamplePosition],
    gap: f64,
) -> i64 {
    let speed = |teeth: i64, a: SamplePosition, b: SamplePosition| teeth as f64 / b.since(a);
    let mut speeds = Vec::new();
    if let Some(last) = stretches.last().filter(|s| s.len() > 1) {
        let (a, b) = (&last[last.len().saturating_sub(8)], &last[last.len() - 1]);
        speeds.push(speed(b.tooth - a.tooth, a.position, b.position));
    }
    if labels.teeth.len() > 1 {
        let (a, b) = (
            labels.teeth[0],
            labels.teeth[(labels.teeth.len() - 1).min(7)],
        );
        speeds.push(speed(b.1 - a.1, positions[a.0], positions[b.0]));
    }
    let mean = speeds.iter().sum::<f64>() / speeds.len().max(1) as f64;
    ((gap * mean).round() as i64).max(1)
}

/// Runs the filter over teeth in order; state at the last of them.
fn filtered(points: impl Iterator<Item = (f64, i64)>, traits: &Traits) -> Option<State> {
    let mut points = points.peekable();
    let (first_time, first_tooth) = points.next()?;
    let &(time, tooth) = points.peek()?;
    let mut state = State::between((time - first_time) / (tooth - first_tooth) as f64, traits);
    // Started on the second tooth, whatever lies between the two.
    let (mut last_time, mut last_tooth) = points.next()?;
    for (time, tooth) in points {
        let predicted = state.predict(time - last_time, traits);
        let s = predicted.innovation_variance(traits);
        state = predicted.update((tooth - last_tooth) as f64, s);
        (last_time, last_tooth) = (time, tooth);
    }
    Some(state)
}

/// Whether the number of teeth in the gap before label `i` is in doubt, and why.
fn doubt(times: &[f64], teeth: &[(usize, i64)], i: usize, traits: &Traits) -> Option<String> {
    const SIDE: usize = 16;
    let at = |k: usize| (times[teeth[k].0], teeth[k].1);
    let left = filtered((i.saturating_sub(SIDE)..i).map(at), traits);
    // The other side with time and angle running backwards.
    let right = filtered(
        (i..(i + SIDE).min(teeth.len()))
            .rev()
            .map(at)
            .map(|(t, n)| (-t, -n)),
        traits,
    );
    let (Some(left), Some(right)) = (left, right) else {
        return Some("with too few pulses on one side to count them".to_owned());
    };
    let (time, tooth) = at(i);
    let (before, last) = at(i - 1);
    let left = left.predict(time - before, traits);
    // Turned round again: angle and acceleration change sign, speed does not.
    let d = [
        -right.x[0] - (left.x[0] - (tooth - last) as f64),
        right.x[1] - left.x[1],
        -right.x[2] - left.x[2],
    ];
    let (l, r) = (left.p, right.p);
    let c = [
        l[0] + r[0],
        l[1] - r[1],
        l[2] + r[2],
        l[3] + r[3],
        l[4] - r[4],
        l[5] + r[5],
    ];
    // The step is what angle differs by once speed and acceleration are made to agree:
    // regression of d0 on (d1, d2).
    let det = c[3] * c[5] - c[4] * c[4];
    let b1 = (c[1] * c[5] - c[2] * c[4]) / det;
    let b2 = (c[2] * c[3] - c[1] * c[4]) / det;
    let step = d[0] - b1 * d[1] - b2 * d[2];
    let sigma = (c[0] - b1 * c[1] - b2 * c[2]).max(0.0).sqrt();
    if sigma <= SURE && step.abs() <= 0.35 {
        return None;
    }
    if only_count(times, teeth, i) {
        return None;
    }
    Some(if sigma > SURE || sigma.is_nan() {
        format!("their number uncertain by {sigma:.2}")
    } else {
        format!("their number {step:+.2} off a whole one")
    })
}

/// Whether the speeds seen around the gap before label `i`, and a quarter of their spread beyond, leave
/// one number of teeth only. Decides where speed swings within few teeth: a white jerk then
/// makes the filter more timid than the train is wild.
fn only_count(times: &[f64], teeth: &[(usize, i64)], i: usize) -> bool {
    const SIDE: usize = 12;
    let near = &teeth[i.saturating_sub(SIDE)..(i + SIDE).min(teeth.len())];
    let (mut slowest, mut fastest, mut count) = (f64::INFINITY, 0f64, 0);
    for pair in near.windows(2).filter(|pair| pair[1].1 - pair[0].1 == 1) {
        let speed = 1.0 / (times[pair[1].0] - times[pair[0].0]);
        (slowest, fastest, count) = (slowest.min(speed), fastest.max(speed), count + 1);
    }
    let gap = times[teeth[i].0] - times[teeth[i - 1].0];
    let spread = fastest - slowest;
    let (least, most) = (
        gap * (slowest - 0.25 * spread),
        gap * (fastest + 0.25 * spread),
    );
    let step = (teeth[i].1 - teeth[i - 1].1) as f64;
    count >= SIDE / 2 && least > step - 0.6 && most < step + 0.6
}

/// p, λ and q from three stretches of the train: q by likelihood over a grid of decades, then
/// p and λ counted once.
fn learn(times: &[f64], pulses_per_rev: u32, sigma: f64) -> Traits {
    const STRETCH: usize = 600;
    let n = times.len();
    let stretches: Vec<(usize, usize)> = if n <= 3 * STRETCH {
        vec![(0, n)]
    } else {
        [0, (n - STRETCH) / 2, n - STRETCH]
            .map(|first| (first, first + STRETCH))
            .to_vec()
    };
    // Marks of a wheel or a tape stand where they should to a hundredth of their pitch; a
    // single mark does exactly, but its edge is not better than this in practice.
    let tooth: f64 = if pulses_per_rev > 1 { 0.01 } else { 0.002 };
    let mut traits = Traits {
        missing: 0.02,
        strays: 0.02,
        jerk: 1.0,
        variance: sigma * sigma,
        tooth_variance: tooth * tooth,
    };
    let mut best = f64::NEG_INFINITY;
    let mut jerk = traits.jerk;
    for exponent in [-10, -8, -6, -5, -4, -3, -2, -1] {
        traits.jerk = 10f64.powi(exponent);
        let score: f64 = stretches
            .iter()
            .map(|&(a, b)| label(times, a, b, &traits).score)
            .sum();
        if score > best {
            (best, jerk) = (score, traits.jerk);
        }
    }
    traits.jerk = jerk;
    let (mut teeth, mut missing, mut strays, mut length) = (0.0, 0.0, 0.0, 0.0);
    for &(a, b) in &stretches {
        let labels = label(times, a, b, &traits);
        let seen = labels.teeth.len() as f64;
        if let (Some(first), Some(last)) = (labels.teeth.first(), labels.teeth.last()) {
            missing += (last.1 - first.1 + 1) as f64 - seen;
            length += times[last.0] - times[first.0];
        }
        teeth += seen + missing;
        strays += (b - a) as f64 - seen;
    }
    // As if twenty more teeth had been watched, with one fault of each kind in a hundred of them.
    traits.missing = ((missing + 0.2) / (teeth + 20.0)).clamp(1e-4, 0.6);
    traits.strays = ((strays + 0.2) / (length + 20.0)).clamp(1e-4, 2.0);
    traits
}
