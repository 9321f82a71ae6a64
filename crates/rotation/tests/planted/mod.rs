//! Motions in closed form, and the pulses they make. Shares no formula with the crate.
#![allow(dead_code)]

/// Small generator of even and normal deviates (splitmix64); the same for the same seed.
pub(crate) struct Dice(pub(crate) u64);

impl Dice {
    pub(crate) fn even(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    pub(crate) fn normal(&mut self) -> f64 {
        let radius = (-2.0 * (1.0 - self.even()).ln()).sqrt();
        radius * (std::f64::consts::TAU * self.even()).cos()
    }
}

/// θ(t) = start + speed·t + ramp·t²/2 + Σ a/(2πf)·sin(2πft + φ), in rev and seconds.
#[derive(Clone)]
pub(crate) struct Motion {
    pub(crate) start: f64,
    pub(crate) speed: f64,
    pub(crate) ramp: f64,
    /// (a in rev/s, f in Hz, φ in rad)
    pub(crate) wobbles: Vec<(f64, f64, f64)>,
}

impl Motion {
    pub(crate) fn steady(speed: f64) -> Self {
        Self {
            start: -0.4,
            speed,
            ramp: 0.0,
            wobbles: Vec::new(),
        }
    }

    pub(crate) fn wobbling(speed: f64) -> Self {
        Self {
            wobbles: vec![(0.02 * speed, 0.31, 0.4), (0.006 * speed, 1.27, 1.0)],
            ..Self::steady(speed)
        }
    }

    pub(crate) fn angle(&self, t: f64) -> f64 {
        let swing: f64 = self
            .wobbles
            .iter()
            .map(|(a, f, phase)| {
                let w = std::f64::consts::TAU * f;
                a / w * (w * t + phase).sin()
            })
            .sum();
        self.start + t * (self.speed + 0.5 * self.ramp * t) + swing
    }

    pub(crate) fn speed(&self, t: f64) -> f64 {
        let swing: f64 = self
            .wobbles
            .iter()
            .map(|(a, f, phase)| a * (std::f64::consts::TAU * f * t + phase).cos())
            .sum();
        self.speed + self.ramp * t + swing
    }

    /// The instant of an angle: Newton from a guess.
    pub(crate) fn time(&self, angle: f64, guess: f64) -> f64 {
        let mut t = guess;
        for _ in 0..50 {
            let step = (angle - self.angle(t)) / self.speed(t);
            t += step;
            if step.abs() < 1e-15 * (1.0 + t.abs()) {
                break;
            }
        }
        t
    }

    /// Instants of the angles first, first + step … within [0, seconds].
    pub(crate) fn instants(&self, first: f64, step: f64, seconds: f64) -> Vec<f64> {
        let mut out: Vec<f64> = Vec::new();
        let mut number = ((self.angle(0.0) - first) / step).ceil();
        let mut guess = 0.0;
        loop {
            let t = self.time(first + number * step, guess);
            if t > seconds {
                return out;
            }
            guess = t + step / self.speed(t);
            out.push(t);
            number += 1.0;
        }
    }
}

/// Root mean square and largest of a set, its mean removed.
pub(crate) fn scatter(values: &[f64]) -> (f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    let square = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / n;
    (
        square.sqrt(),
        values.iter().fold(0.0, |m, v| m.max((v - mean).abs())),
    )
}

/// How long an edge takes, or a pulse.
#[derive(Clone, Copy)]
pub(crate) enum Length {
    Seconds(f64),
    Degrees(f64),
}

/// A tach sampled at points. The leading edge's middle stands at whole
/// multiples of 1/`per_rev` revolutions.
#[derive(Clone)]
pub(crate) struct Tach {
    pub(crate) rate: f64,
    pub(crate) per_rev: u32,
    pub(crate) edge: Length,
    pub(crate) width: Length,
    pub(crate) low: f64,
    pub(crate) high: f64,
    pub(crate) noise: f64,
    pub(crate) drift_per_s: f64,
    /// Step of the converter.
    pub(crate) step: f64,
    /// Edges shaped (1 + sin πx)/2 instead of straight.
    pub(crate) round: bool,
}

impl Tach {
    pub(crate) fn plain(rate: f64) -> Self {
        Self {
            rate,
            per_rev: 1,
            edge: Length::Seconds(100e-6),
            width: Length::Degrees(20.0),
            low: 0.2,
            high: 4.8,
            noise: 0.0,
            drift_per_s: 0.0,
            step: 0.0,
            round: false,
        }
    }

    /// Pulses at these instants of the leading edge.
    pub(crate) fn sample(&self, motion: &Motion, instants: &[f64], seconds: f64) -> Vec<f64> {
        let n = (seconds * self.rate) as usize;
        let mut level = vec![0.0f64; n];
        for &t in instants {
            let speed = motion.speed(t);
            let seconds_of = |length| match length {
                Length::Seconds(s) => s,
                Length::Degrees(d) => d / 360.0 / speed,
            };
            let angle = motion.angle(t);
            // Position along an edge whose middle is at instant `at`, from −½ to ½.
            let along = |time: f64, at: f64| match self.edge {
                Length::Seconds(s) => (time - at) / s,
                Length::Degrees(d) => (motion.angle(time) - motion.angle(at)) / (d / 360.0),
            };
            let shape = |x: f64| {
                let x = x.clamp(-0.5, 0.5);
                if self.round {
                    0.5 * (1.0 + (std::f64::consts::PI * x).sin())
                } else {
                    0.5 + x
                }
            };
            let end = match self.width {
                Length::Seconds(s) => t + s,
                Length::Degrees(d) => motion.time(angle + d / 360.0, t),
            };
            let margin = 1.5 * seconds_of(self.edge);
            let first = ((t - margin) * self.rate).max(0.0) as usize;
            let last = (((end + margin) * self.rate) as usize).min(n);
            for i in first..last {
                let time = i as f64 / self.rate;
                let up = shape(along(time, t));
                let down = shape(-along(time, end));
                level[i] = level[i].max(up.min(down));
            }
        }
        let mut dice = Dice(11);
        level
            .iter()
            .enumerate()
            .map(|(i, l)| {
                let mut x =
                    self.low + (self.high - self.low) * l + self.drift_per_s * i as f64 / self.rate;
                if self.noise > 0.0 {
                    x += self.noise * dice.normal();
                }
                if self.step > 0.0 {
                    (x / self.step).round() * self.step
                } else {
                    x
                }
            })
            .collect()
    }
}
