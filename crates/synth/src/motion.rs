//! How the shaft turns, in closed form.

use crate::sine::{CELL, Cell, Sine};
use crate::{Error, Exact, Generator, Profile, Recipe, Speed};
use std::f64::consts::{PI, TAU};

/// The angle of the main shaft as an exact function of time, θ(t) = ∫v.
///
/// Error of the angle: about 2e-16 rev, plus 2e-16 of the largest swing of a sine, glide or tanh
/// about its mean course (peak amplitude / 2πf, Δv·duration/2π, Δv·width), whatever the time: the
/// linear and quadratic parts are carried as whole revolutions plus fraction. Holds for
/// |t| < 1e7 s.
#[derive(Debug, Clone)]
pub struct Motion {
    course: Course,
    sines: Vec<Sine>,
    start: Exact,
    slowest: f64,
    fastest: f64,
    rate_hz: f64,
}

#[derive(Debug, Clone)]
enum Course {
    Constant(f64),
    Ramp {
        start: f64,
        slope: f64,
        seconds: f64,
    },
    Glide(Vec<Stretch>),
    Tanh {
        mean: f64,
        half: f64,
        mid: f64,
        width: f64,
    },
}

/// From one knot to the next; the last has duration infinity.
#[derive(Debug, Clone)]
struct Stretch {
    at: Exact,
    angle: Exact,
    from: f64,
    to: f64,
    duration: f64,
}

impl Motion {
    /// The motion of a recipe.
    ///
    /// # Errors
    /// If a value of the recipe is out of range, see [`Recipe::validate`].
    pub fn new(recipe: &Recipe) -> Result<Self, Error> {
        recipe.validate()?;
        Ok(Self::build(recipe))
    }

    pub(crate) fn build(recipe: &Recipe) -> Self {
        let rate_hz = recipe.sample_rate_hz;
        let speed = &recipe.speed;
        let sines: Vec<Sine> = speed_sines(speed, recipe.seed)
            .map(|[amplitude, hz, deg]| Sine::new(amplitude, hz, deg, rate_hz))
            .collect();
        let course = Course::new(&speed.profile, recipe.seconds);
        let zero = Exact::new(0, 0.0);
        let at_zero = course.angle(zero) + Exact::from(integral(&sines, zero));
        let [slowest, fastest] = speed_bounds(recipe);
        Self {
            start: Exact::from(speed.start_angle_rev) - at_zero,
            course,
            sines,
            slowest,
            fastest,
            rate_hz,
        }
    }

    /// Angle of the main shaft at a time in seconds, rev.
    #[must_use]
    pub fn angle(&self, time: impl Into<Exact>) -> Exact {
        let time = time.into();
        (self.start + self.course.angle(time)).plus(integral(&self.sines, time))
    }

    /// Speed of the main shaft at a time in seconds, rev/s.
    #[must_use]
    pub fn speed(&self, time: impl Into<Exact>) -> f64 {
        let time = time.into();
        let sines = self.sines.iter().map(|sine| sine.value(time));
        self.course.speed(time) + sines.sum::<f64>()
    }

    /// The time at which the main shaft passes an angle, s; also outside the recording.
    /// Error: about 2e-16 s plus the error of the angle over the speed.
    #[must_use]
    pub fn time_at(&self, angle: impl Into<Exact>) -> Exact {
        let angle = angle.into();
        let zero = Exact::new(0, 0.0);
        let ahead = angle.since(self.angle(zero));
        self.time_near(
            angle,
            zero.plus(ahead / (0.5 * (self.slowest + self.fastest))),
        )
    }

    /// Lower and upper bound of the speed at all times, rev/s (not always reached).
    #[must_use]
    pub fn speed_bounds(&self) -> [f64; 2] {
        [self.slowest, self.fastest]
    }

    /// Newton from a guess, kept inside the bracket that the bounds of the speed give.
    pub(crate) fn time_near(&self, angle: Exact, guess: Exact) -> Exact {
        let mut time = guess;
        let mut bracket: Option<[Exact; 2]> = None;
        let mut last_miss = f64::INFINITY;
        for _ in 0..200 {
            let miss = angle.since(self.angle(time));
            let step = miss / self.speed(time);
            if miss.abs() >= last_miss && step.abs() < 1e-12 {
                // down at rounding: no further gain
                break;
            }
            last_miss = miss.abs();
            let reach = [miss / self.fastest, miss / self.slowest];
            let [mut low, mut high] = [
                time.plus(reach[0].min(reach[1])),
                time.plus(reach[0].max(reach[1])),
            ];
            if let Some([known_low, known_high]) = bracket {
                // rounding may turn the two around by a last digit: harmless
                low = if known_low > low { known_low } else { low };
                high = if known_high < high { known_high } else { high };
            }
            bracket = Some([low, high]);
            let next = time.plus(step);
            let inside = next >= low && next <= high;
            let next = if inside || step.abs() < 1e-12 {
                next
            } else {
                low.plus(0.5 * high.since(low))
            };
            if next == time {
                break;
            }
            time = next;
        }
        time
    }

    pub(crate) fn turning(&self, cell: i64) -> Turning {
        let first = cell * CELL as i64;
        let mut swing = [0.0; CELL];
        let start = Exact::index_time(first, self.rate_hz);
        for sine in &self.sines {
            sine.add_integral_cell(start, &mut swing);
        }
        let mut times = [start; CELL];
        let mut angles = times;
        for offset in 0..CELL {
            let time = Exact::index_time(first + offset as i64, self.rate_hz);
            times[offset] = time;
            angles[offset] = (self.start + self.course.angle(time)).plus(swing[offset]);
        }
        Turning { times, angles }
    }

    pub(crate) fn speeds(&self, times: &[Exact; CELL]) -> Cell {
        let mut speeds = [0.0; CELL];
        for sine in &self.sines {
            sine.add_cell(times[0], &mut speeds);
        }
        for (speed, &time) in speeds.iter_mut().zip(times) {
            *speed += self.course.speed(time);
        }
        speeds
    }
}

/// Times and angles of the samples of a cell.
#[derive(Debug, Clone)]
pub(crate) struct Turning {
    pub(crate) times: [Exact; CELL],
    pub(crate) angles: [Exact; CELL],
}

fn integral(sines: &[Sine], time: Exact) -> f64 {
    sines.iter().map(|sine| sine.integral(time)).sum()
}

/// Amplitude, frequency and phase of all sines in the speed.
fn speed_sines(speed: &Speed, seed: u64) -> impl Iterator<Item = [f64; 3]> {
    let wobbles = speed.wobbles.iter().map(|wobble| {
        [
            wobble.amplitude_rev_per_s,
            wobble.frequency_hz,
            wobble.phase_deg,
        ]
    });
    let hunting = speed.hunting.iter().flat_map(move |hunting| {
        let mut generator = Generator::new(seed).fork(0x6875_6e74);
        let count = hunting.sines as f64;
        let span = (hunting.fastest_hz / hunting.slowest_hz).ln();
        (0..hunting.sines).map(move |index| {
            let place = (index as f64 + generator.uniform(0.0, 1.0)) / count;
            [
                hunting.rms_rev_per_s * (2.0 / count).sqrt(),
                hunting.slowest_hz * (span * place).exp(),
                generator.uniform(0.0, 360.0),
            ]
        })
    });
    wobbles.chain(hunting)
}

/// Lowest and highest speed that the recipe could reach at any time.
pub(crate) fn speed_bounds(recipe: &Recipe) -> [f64; 2] {
    let ends = match &recipe.speed.profile {
        Profile::Constant { rev_per_s } => vec![*rev_per_s],
        Profile::Ramp {
            start_rev_per_s,
            slope_rev_per_s2,
        } => vec![
            *start_rev_per_s,
            start_rev_per_s + slope_rev_per_s2 * recipe.seconds,
        ],
        Profile::Glide { knots } => knots.iter().map(|knot| knot.rev_per_s).collect(),
        Profile::Tanh {
            from_rev_per_s,
            to_rev_per_s,
            ..
        } => vec![*from_rev_per_s, *to_rev_per_s],
    };
    let swing: f64 = speed_sines(&recipe.speed, recipe.seed)
        .map(|[amplitude, ..]| amplitude.abs())
        .sum();
    let low = ends.iter().copied().fold(f64::INFINITY, f64::min);
    let high = ends.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    [low - swing, high + swing]
}

impl Course {
    fn new(profile: &Profile, seconds: f64) -> Self {
        match profile {
            Profile::Constant { rev_per_s } => Self::Constant(*rev_per_s),
            Profile::Ramp {
                start_rev_per_s,
                slope_rev_per_s2,
            } => Self::Ramp {
                start: *start_rev_per_s,
                slope: *slope_rev_per_s2,
                seconds,
            },
            Profile::Glide { knots } => {
                let mut stretches: Vec<Stretch> = Vec::with_capacity(knots.len());
                for (index, knot) in knots.iter().enumerate() {
                    let at = Exact::from(knot.at_s);
                    let angle = stretches
                        .last()
                        .map_or(Exact::new(0, 0.0), |last| last.angle(at));
                    let next = knots.get(index + 1);
                    stretches.push(Stretch {
                        at,
                        angle,
                        from: knot.rev_per_s,
                        to: next.map_or(knot.rev_per_s, |next| next.rev_per_s),
                        duration: next.map_or(f64::INFINITY, |next| next.at_s - knot.at_s),
                    });
                }
                Self::Glide(stretches)
            }
            Profile::Tanh {
                from_rev_per_s,
                to_rev_per_s,
                mid_s,
                width_s,
            } => Self::Tanh {
                mean: 0.5 * (from_rev_per_s + to_rev_per_s),
                half: 0.5 * (to_rev_per_s - from_rev_per_s),
                mid: *mid_s,
                width: *width_s,
            },
        }
    }

    /// An integral of the speed; its value at 0 is taken off by the caller.
    fn angle(&self, time: Exact) -> Exact {
        match self {
            Self::Constant(speed) => time.scaled(*speed),
            Self::Ramp {
                start,
                slope,
                seconds,
            } => {
                let (start, slope, seconds) = (*start, *slope, *seconds);
                if time.whole < 0 {
                    return time.scaled(start);
                }
                let end = Exact::from(seconds);
                let within = if time > end { end } else { time };
                let ramp = within.scaled(start) + half_square(within, slope);
                ramp + (time - within).scaled(start + slope * seconds)
            }
            Self::Glide(stretches) => stretch(stretches, time).angle(time),
            Self::Tanh {
                mean,
                half,
                mid,
                width,
            } => {
                // w·ln cosh(x/w) = |x| + w·ln(1 + e^(−2|x|/w)) − w·ln 2
                let from_mid = time - Exact::from(*mid);
                let distance = if from_mid.whole < 0 {
                    Exact::new(0, 0.0) - from_mid
                } else {
                    from_mid
                };
                let bend = (-2.0 * distance.value() / width).exp().ln_1p();
                (time.scaled(*mean) + distance.scaled(*half)).plus(half * width * bend)
            }
        }
    }

    fn speed(&self, time: Exact) -> f64 {
        match self {
            Self::Constant(speed) => *speed,
            Self::Ramp {
                start,
                slope,
                seconds,
            } => start + slope * time.value().clamp(0.0, *seconds),
            Self::Glide(stretches) => stretch(stretches, time).speed(time),
            Self::Tanh {
                mean,
                half,
                mid,
                width,
            } => mean + half * (time.since(Exact::from(*mid)) / width).tanh(),
        }
    }
}

/// slope·t²/2 for t >= 0: whole², 2·whole·fraction and fraction² each with their own rounding.
fn half_square(time: Exact, slope: f64) -> Exact {
    let whole = Exact::new(time.whole, 0.0);
    let square = Exact::new(time.whole.saturating_mul(time.whole), 0.0);
    let cross = whole.scaled(slope).scaled(time.fraction);
    (square.scaled(0.5 * slope) + cross).plus(0.5 * slope * time.fraction * time.fraction)
}

fn stretch(stretches: &[Stretch], time: Exact) -> &Stretch {
    let after = stretches.partition_point(|stretch| stretch.at <= time);
    &stretches[after.saturating_sub(1)]
}

impl Stretch {
    fn angle(&self, time: Exact) -> Exact {
        let elapsed = time - self.at;
        if elapsed.whole < 0 || self.duration.is_infinite() {
            return self.angle + elapsed.scaled(self.from);
        }
        let bend = (PI * elapsed.value() / self.duration).sin() * self.duration / TAU;
        (self.angle + elapsed.scaled(0.5 * (self.from + self.to)))
            .plus(-(self.to - self.from) * bend)
    }

    fn speed(&self, time: Exact) -> f64 {
        let elapsed = time.since(self.at);
        if elapsed < 0.0 || self.duration.is_infinite() {
            return self.from;
        }
        let part = 0.5 * (1.0 - (PI * elapsed / self.duration).cos());
        self.from + (self.to - self.from) * part
    }
}
