//! A sine at a fixed frequency, evaluated cell by cell.

use crate::Exact;
use std::f64::consts::TAU;

/// Samples in a cell. Cells start at whole multiples of it, so a sample's bits depend on its index
/// alone. A power of two; larger saves little and makes single samples dearer.
pub(crate) const CELL: usize = 64;

/// One value per sample of a cell.
pub(crate) type Cell = [f64; CELL];

/// a·cos(2πft + φ). The phase is worked out once per cell and turned from there by a table of
/// angles: one rotation, not a recurrence, so the error stays at 3e-16·a.
#[derive(Debug, Clone)]
pub(crate) struct Sine {
    amplitude: f64,
    frequency_hz: f64,
    phase_turns: f64,
    cos: Box<Cell>,
    sin: Box<Cell>,
}

impl Sine {
    pub(crate) fn new(amplitude: f64, frequency_hz: f64, phase_deg: f64, rate_hz: f64) -> Self {
        let mut cos = Box::new([0.0; CELL]);
        let mut sin = Box::new([0.0; CELL]);
        for index in 0..CELL {
            let time = Exact::index_time(index as i64, rate_hz);
            (sin[index], cos[index]) = (TAU * time.turn(frequency_hz)).sin_cos();
        }
        Self {
            amplitude,
            frequency_hz,
            phase_turns: phase_deg / 360.0,
            cos,
            sin,
        }
    }

    /// 2π(ft + φ) reduced to about ± 2π.
    pub(crate) fn phase(&self, time: Exact) -> f64 {
        TAU * (time.turn(self.frequency_hz) + self.phase_turns)
    }

    pub(crate) fn add_cell(&self, start: Exact, out: &mut Cell) {
        let (sin, cos) = self.phase(start).sin_cos();
        self.add_turned(self.amplitude * cos, self.amplitude * sin, out);
    }

    /// Adds a·sin(2πft + φ)/(2πf): the integral of the sine, up to a constant.
    pub(crate) fn add_integral_cell(&self, start: Exact, out: &mut Cell) {
        let (sin, cos) = self.phase(start).sin_cos();
        let scale = self.integral_amplitude();
        self.add_turned(scale * sin, -scale * cos, out);
    }

    pub(crate) fn value(&self, time: Exact) -> f64 {
        self.amplitude * self.phase(time).cos()
    }

    pub(crate) fn integral(&self, time: Exact) -> f64 {
        self.integral_amplitude() * self.phase(time).sin()
    }

    fn integral_amplitude(&self) -> f64 {
        self.amplitude / (TAU * self.frequency_hz)
    }

    fn add_turned(&self, cos: f64, sin: f64, out: &mut Cell) {
        for ((out, c), s) in out.iter_mut().zip(self.cos.iter()).zip(self.sin.iter()) {
            *out += cos * c - sin * s;
        }
    }
}
