//! The exact waveform of a tach.

use crate::motion::Turning;
use crate::sine::{CELL, Cell};
use crate::{Edge, EdgeShape, Exact, Generator, Motion, Pulse, PulseTrain, Recipe, Width};
use std::f64::consts::PI;

/// A pulse train ready to be sampled.
#[derive(Debug, Clone)]
pub(crate) struct PulseSource {
    train: PulseTrain,
    generator: Generator,
    missing: Vec<i64>,
    strays_s: Vec<f64>,
    /// How far, s, a pulse reaches before and behind its leading crossing, at most.
    ahead_s: f64,
    behind_s: f64,
    stray_behind_s: f64,
    fastest_shaft: f64,
    slowest_shaft: f64,
}

/// An edge: its centre and its length, in seconds or revolutions of its shaft.
enum Slope {
    Time(Exact, f64),
    Angle(Exact, f64),
}

/// Where an edge sits.
#[derive(Clone, Copy)]
enum Place {
    Time(Exact),
    Angle(Exact),
}

impl PulseSource {
    pub(crate) fn new(
        train: &PulseTrain,
        recipe: &Recipe,
        motion: &Motion,
        generator: Generator,
    ) -> Self {
        let faults = &train.faults;
        let [slowest_shaft, fastest_shaft] =
            motion.speed_bounds().map(|speed| train.shaft_speed(speed));
        let half_edge_s = 0.5
            * match train.edge {
                Edge::Seconds(s) => s,
                Edge::Degrees(deg) => deg / 360.0 / slowest_shaft,
            };
        let width_s = match train.width {
            Width::Seconds(s) => s,
            Width::Degrees(deg) => deg / 360.0 / slowest_shaft,
        };
        let lag_s = faults
            .doubled
            .map_or(0.0, |doubled| doubled.lag_deg / 360.0 / slowest_shaft);
        let mut missing = faults.missing_pulses.clone();
        missing.sort_unstable();
        Self {
            train: train.clone(),
            generator,
            missing,
            strays_s: strays(train, recipe.seconds, generator.fork(3)),
            ahead_s: half_edge_s,
            behind_s: width_s + half_edge_s + lag_s,
            stray_behind_s: faults.stray_width_s + half_edge_s,
            fastest_shaft,
            slowest_shaft,
        }
    }

    /// Adds the waveform at the samples of a cell.
    pub(crate) fn add_cell(&self, motion: &Motion, turning: &Turning, out: &mut Cell) {
        let mut level = [0.0f64; CELL];
        let shaft = turning.angles.map(|angle| self.shaft_angle(angle));
        let first = shaft[0].plus(-self.behind_s * self.fastest_shaft);
        let last = shaft[CELL - 1].plus(self.ahead_s * self.fastest_shaft);
        // a cell is short: its middle is near enough for Newton to end in two or three steps
        let guess = turning.times[CELL / 2];
        for number in self.numbers(first, last) {
            let angle = self.pulse_angle(number);
            if angle < first || angle > last || self.is_lost(number) {
                continue;
            }
            self.add_pulse(
                motion,
                turning,
                &shaft,
                Place::Angle(angle),
                guess,
                &mut level,
            );
            if let Some(lag) = self.lag(number) {
                let place = Place::Angle(angle.plus(lag));
                self.add_pulse(motion, turning, &shaft, place, guess, &mut level);
            }
        }
        let from = turning.times[0].value() - self.stray_behind_s;
        let to = turning.times[CELL - 1].value() + self.ahead_s;
        let start = self.strays_s.partition_point(|&time| time < from);
        for &time in self.strays_s[start..]
            .iter()
            .take_while(|&&time| time <= to)
        {
            let place = Place::Time(Exact::from(time));
            self.add_pulse(motion, turning, &shaft, place, guess, &mut level);
        }
        let (low, high) = (self.train.low, self.train.high);
        for (out, level) in out.iter_mut().zip(level) {
            *out += low + (high - low) * level;
        }
    }

    /// Joins a pulse; strays are those placed by time.
    fn add_pulse(
        &self,
        motion: &Motion,
        turning: &Turning,
        shaft: &[Exact; CELL],
        leading: Place,
        guess: Exact,
        level: &mut Cell,
    ) {
        let faults = &self.train.faults;
        let (trailing, height) = match (leading, self.train.width) {
            (Place::Time(time), _) => (
                Place::Time(time.plus(faults.stray_width_s)),
                faults.stray_height,
            ),
            (Place::Angle(angle), Width::Degrees(deg)) => {
                (Place::Angle(angle.plus(deg / 360.0)), 1.0)
            }
            (Place::Angle(angle), Width::Seconds(s)) => {
                let time = motion.time_near(self.main_angle(angle), guess);
                (Place::Time(time.plus(s)), 1.0)
            }
        };
        let rise = self.slope(motion, leading, guess);
        let fall = self.slope(motion, trailing, guess);
        for index in 0..CELL {
            let (time, angle) = (turning.times[index], shaft[index]);
            let up = rise.level(self.train.shape, time, angle);
            let down = fall.level(self.train.shape, time, angle);
            level[index] = level[index].max(height * up.min(1.0 - down));
        }
    }

    fn slope(&self, motion: &Motion, place: Place, guess: Exact) -> Slope {
        match (self.train.edge, place) {
            (Edge::Seconds(s), Place::Time(time)) => Slope::Time(time, s),
            (Edge::Seconds(s), Place::Angle(angle)) => {
                Slope::Time(motion.time_near(self.main_angle(angle), guess), s)
            }
            (Edge::Degrees(deg), Place::Angle(angle)) => Slope::Angle(angle, deg / 360.0),
            (Edge::Degrees(deg), Place::Time(time)) => {
                Slope::Angle(self.shaft_angle(motion.angle(time)), deg / 360.0)
            }
        }
    }

    fn shaft_angle(&self, main: Exact) -> Exact {
        self.train
            .shaft
            .map_or(main, |shaft| main.ratio(shaft.turns, shaft.per))
    }

    fn main_angle(&self, shaft_angle: Exact) -> Exact {
        self.train.shaft.map_or(shaft_angle, |shaft| {
            shaft_angle.ratio(shaft.per, shaft.turns)
        })
    }

    /// Angle, on its shaft, of the leading crossing of a pulse.
    fn pulse_angle(&self, number: i64) -> Exact {
        let teeth = i64::from(self.train.pulses_per_rev);
        let tooth = number.rem_euclid(teeth);
        let errors = &self.train.tooth_errors_deg;
        let error = errors.get(tooth as usize).copied().unwrap_or(0.0);
        Exact::new(
            number.div_euclid(teeth),
            tooth as f64 / teeth as f64 + (self.train.phase_deg + error) / 360.0,
        )
    }

    /// Numbers of the teeth there are, that may lie between two angles of the shaft.
    fn numbers(&self, from: Exact, to: Exact) -> impl Iterator<Item = i64> {
        let teeth = i64::from(self.train.pulses_per_rev);
        let errors = &self.train.tooth_errors_deg;
        let margin = errors
            .iter()
            .fold(0.0f64, |most, error| most.max(error.abs()))
            / 360.0;
        let phase = self.train.phase_deg / 360.0;
        let pulses = |angle: Exact| angle.whole * teeth + (angle.fraction * teeth as f64) as i64;
        let first = pulses(from.plus(-phase - margin));
        let last = pulses(to.plus(margin - phase)) + 1;
        let present = teeth - i64::from(self.train.missing_teeth);
        (first..=last).filter(move |number| number.rem_euclid(teeth) < present)
    }

    fn is_lost(&self, number: i64) -> bool {
        self.missing.binary_search(&number).is_ok()
            || self.generator.fork(1).uniform_at(number as u64) < self.train.faults.missing_fraction
    }

    /// Lag in revolutions of the second pulse, if the pulse comes twice.
    fn lag(&self, number: i64) -> Option<f64> {
        let doubled = self.train.faults.doubled?;
        let draw = self.generator.fork(2).uniform_at(number as u64);
        (draw < doubled.fraction && !self.is_lost(number)).then_some(doubled.lag_deg / 360.0)
    }

    /// All true pulses between two times.
    pub(crate) fn truth(&self, motion: &Motion, start: Exact, end: Exact) -> Vec<Pulse> {
        let [first, last] = [start, end].map(|time| self.shaft_angle(motion.angle(time)));
        let mut pulses: Vec<Pulse> = Vec::new();
        let mut guess = start;
        let pitch_s =
            2.0 / (self.slowest_shaft + self.fastest_shaft) / f64::from(self.train.pulses_per_rev);
        for number in self.numbers(first, last) {
            let angle = self.pulse_angle(number);
            let time = motion.time_near(self.main_angle(angle), guess);
            guess = time.plus(pitch_s);
            if time >= start && time <= end {
                let doubled = self
                    .lag(number)
                    .map(|lag| motion.time_near(self.main_angle(angle.plus(lag)), guess));
                pulses.push(Pulse {
                    number,
                    time,
                    missing: self.is_lost(number),
                    doubled,
                });
            }
        }
        // placing errors larger than a pitch may turn neighbours round
        pulses.sort_by(|a, b| a.time.since(b.time).total_cmp(&0.0));
        pulses
    }

    pub(crate) fn strays_between(&self, start: Exact, end: Exact) -> Vec<f64> {
        let strays = self.strays_s.iter().copied();
        strays
            .filter(|&time| Exact::from(time) >= start && Exact::from(time) <= end)
            .collect()
    }
}

impl Slope {
    /// From 0 before the edge to 1 behind it.
    fn level(&self, shape: EdgeShape, time: Exact, angle: Exact) -> f64 {
        let (distance, length) = match self {
            Self::Time(centre, length) => (time.since(*centre), *length),
            Self::Angle(centre, length) => (angle.since(*centre), *length),
        };
        if 2.0 * distance.abs() >= length {
            return if distance < 0.0 { 0.0 } else { 1.0 };
        }
        let part = distance / length;
        match shape {
            EdgeShape::Linear => 0.5 + part,
            EdgeShape::RaisedCosine => 0.5 * (1.0 + (PI * part).sin()),
        }
    }
}

fn strays(train: &PulseTrain, seconds: f64, mut generator: Generator) -> Vec<f64> {
    let faults = &train.faults;
    let mut times = faults.stray_times_s.clone();
    for burst in &faults.bursts {
        times.extend((0..burst.count).map(|n| burst.at_s + f64::from(n) * burst.spacing_s));
    }
    if faults.strays_per_s > 0.0 {
        // a Poisson process: exponential gaps
        let mut gap = || -generator.uniform(0.0, 1.0).ln() / faults.strays_per_s;
        let mut time = gap();
        while time < seconds {
            times.push(time);
            time += gap();
        }
    }
    times.sort_by(f64::total_cmp);
    times
}
