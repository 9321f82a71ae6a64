//! A channel ready to be made, cell by cell.

use crate::motion::Turning;
use crate::noise::{NoiseSource, Page};
use crate::pulses::PulseSource;
use crate::sine::{CELL, Cell, Sine};
use crate::{Channel, Converter, Generator, Motion, Order, Recipe, Resonance};
use std::f64::consts::TAU;

#[derive(Debug, Clone)]
pub(crate) struct ChannelSource {
    orders: Vec<OrderSource>,
    tones: Vec<Sine>,
    pub(crate) noise: Vec<NoiseSource>,
    pub(crate) pulses: Option<PulseSource>,
    bias: f64,
    drift_per_s: f64,
    /// First index, number, height.
    spikes: Vec<(i64, i64, f64)>,
    clip_at: Option<f64>,
    converter: Option<Converter>,
}

#[derive(Debug, Clone)]
struct OrderSource {
    order: Order,
    modulation: Option<Sine>,
    main_shaft_order: f64,
    cos: f64,
    sin: f64,
}

impl ChannelSource {
    pub(crate) fn new(
        channel: &Channel,
        recipe: &Recipe,
        motion: &Motion,
        generator: Generator,
    ) -> Self {
        let rate_hz = recipe.sample_rate_hz;
        let tone = |tone: &crate::Tone| {
            Sine::new(
                tone.amplitude,
                tone.frequency_hz,
                tone.phase_lead_deg,
                rate_hz,
            )
        };
        let noise =
            |(index, noise)| NoiseSource::new(noise, rate_hz, generator.fork(index as u64 + 1));
        Self {
            orders: channel
                .orders
                .iter()
                .map(|order| OrderSource::new(order, rate_hz))
                .collect(),
            tones: channel.tones.iter().map(tone).collect(),
            noise: channel.noise.iter().enumerate().map(noise).collect(),
            pulses: channel
                .pulses
                .as_ref()
                .map(|train| PulseSource::new(train, recipe, motion, generator.fork(0))),
            bias: channel.bias,
            drift_per_s: channel.drift_per_s,
            spikes: channel
                .spikes
                .iter()
                .map(|spike| {
                    let first = (spike.at_s * rate_hz).round() as i64;
                    (first, spike.samples as i64, spike.value)
                })
                .collect(),
            clip_at: channel.clip_at,
            converter: channel.converter,
        }
    }

    pub(crate) fn needs_speed(&self) -> bool {
        self.orders
            .iter()
            .any(|order| order.order.resonance.is_some())
    }

    /// The cell's samples; `pages` holds one entry per noise.
    pub(crate) fn cell(
        &self,
        number: i64,
        motion: &Motion,
        turning: &Turning,
        speeds: &Cell,
        pages: &mut [Page],
    ) -> Cell {
        let first = number * CELL as i64;
        let mut out = [self.bias; CELL];
        if self.drift_per_s != 0.0 {
            for (out, time) in out.iter_mut().zip(&turning.times) {
                *out += self.drift_per_s * time.value();
            }
        }
        for order in &self.orders {
            order.add_cell(turning, speeds, &mut out);
        }
        for tone in &self.tones {
            tone.add_cell(turning.times[0], &mut out);
        }
        if let Some(pulses) = &self.pulses {
            pulses.add_cell(motion, turning, &mut out);
        }
        for (noise, page) in self.noise.iter().zip(pages) {
            noise.add(first, page, &mut out);
        }
        for &(start, count, value) in &self.spikes {
            let from = (start - first).clamp(0, CELL as i64) as usize;
            let to = (start + count - first).clamp(0, CELL as i64) as usize;
            out[from..to].iter_mut().for_each(|out| *out += value);
        }
        if let Some(limit) = self.clip_at {
            out.iter_mut()
                .for_each(|out| *out = out.clamp(-limit, limit));
        }
        if let Some(converter) = &self.converter {
            let steps = f64::from(converter.bits - 1).exp2();
            let step = converter.full_scale / steps;
            for out in &mut out {
                *out = step * (*out / step).round().clamp(-steps, steps - 1.0);
            }
        }
        out
    }
}

impl OrderSource {
    fn new(order: &Order, rate_hz: f64) -> Self {
        let (sin, cos) = order.phase_lead_deg.to_radians().sin_cos();
        Self {
            order: *order,
            modulation: order.modulation.map(|modulation| {
                let (hz, deg) = (modulation.frequency_hz, modulation.phase_deg);
                Sine::new(modulation.depth, hz, deg, rate_hz)
            }),
            main_shaft_order: order.main_shaft_order(),
            cos: order.amplitude * cos,
            sin: order.amplitude * sin,
        }
    }

    fn add_cell(&self, turning: &Turning, speeds: &Cell, out: &mut Cell) {
        let mut wave = self.turns(turning);
        match &self.order.resonance {
            None => {
                for wave in &mut wave {
                    let (sin, cos) = (TAU * *wave).sin_cos();
                    *wave = self.cos * cos - self.sin * sin;
                }
            }
            Some(resonance) => self.resonate(resonance, speeds, &mut wave),
        }
        if let Some(modulation) = &self.modulation {
            let mut envelope = [1.0; CELL];
            modulation.add_cell(turning.times[0], &mut envelope);
            for (wave, envelope) in wave.iter_mut().zip(envelope) {
                *wave *= envelope;
            }
        }
        for (out, wave) in out.iter_mut().zip(wave) {
            *out += wave;
        }
    }

    /// k·θ of its shaft, reduced to ± ½ turn.
    fn turns(&self, turning: &Turning) -> Cell {
        let order = self.order.order;
        match self.order.shaft {
            None => turning.angles.map(|angle| angle.turn(order)),
            Some(shaft) => turning
                .angles
                .map(|angle| angle.ratio(shaft.turns, shaft.per).turn(order)),
        }
    }

    fn resonate(&self, resonance: &Resonance, speeds: &Cell, wave: &mut Cell) {
        for (wave, speed) in wave.iter_mut().zip(speeds) {
            let (re, im) = resonance.gain(self.main_shaft_order * speed);
            let (sin, cos) = (TAU * *wave).sin_cos();
            let (direct, cross) = (
                self.cos * cos - self.sin * sin,
                self.cos * sin + self.sin * cos,
            );
            *wave = re * direct - im * cross;
        }
    }
}
