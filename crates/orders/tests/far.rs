//! More than a day into a recording, from a sparse synthetic source: nothing is lost.
#![allow(clippy::unwrap_used, missing_docs)]

use shaftwise_orders::{Instant, Track};
use shaftwise_rotation::{RotationConfig, rotation_from_times};
use shaftwise_signal::{InterpolationPlan, Taps};
use shaftwise_synth::{Channel, Order, Recipe, Speed, Synth};
use std::f64::consts::TAU;
use std::sync::Arc;

/// Largest error of a pure order resampled at 128 samples per revolution, `hours` into a recording of
/// 51.2 kHz at about 80 rev/s.
fn worst_error(hours: f64, order: f64) -> f64 {
    let rate = 51_200.0;
    let start_s = 3600.0 * hours;
    let mut recipe = Recipe::new(
        rate,
        start_s + 20.0,
        Speed::constant(80.0).with_wobble(1.0, 0.1, 0.0),
    );
    recipe.channels = vec![Channel {
        orders: vec![Order::new(order, 1.0, 0.0)],
        ..Channel::new("A", "acceleration", "m/s²")
    }];
    let mut synth = Synth::new(&recipe).unwrap();
    let motion = synth.motion().clone();
    let first_rev = motion
        .angle(shaftwise_synth::Exact::from(start_s))
        .value()
        .ceil();
    let times: Vec<_> = (0..400)
        .map(|n| motion.time_at(shaftwise_synth::Exact::from(first_rev + f64::from(n))))
        .collect();
    let seconds: Vec<f64> = times.iter().map(|t| t.value()).collect();
    let config = RotationConfig {
        sample_rate_hz: rate,
        total_samples: synth.frames(),
        pulses_per_rev: 1,
    };
    let rotation = Arc::new(rotation_from_times(&seconds, &config).unwrap());
    let track = Track::new(rotation, 1, 1, 128);
    let mut instants: Vec<Instant> = Vec::new();
    track.instants(0, 128 * 100, 128 * 200, &mut instants);
    let from = instants[0].index - 200;
    let count = (instants.last().unwrap().index + 400 - from) as usize;
    synth.seek(from);
    let mut samples = [Vec::new()];
    while samples[0].len() < count {
        let mut part = [Vec::new()];
        synth.next_block(65_536, &mut part);
        samples[0].append(&mut part[0]);
    }
    let plan = InterpolationPlan::new();
    let mut taps = Taps::default();
    // The pulses' own times are f64 seconds: after a day they are good to 7e-12 s, 1e-9 of a turn at
    // this speed. That is the input's accuracy, not ours: compare with the angle the pulses tell.
    instants
        .iter()
        .enumerate()
        .map(|(i, instant)| {
            plan.taps(
                instant.index as i64,
                instant.fraction,
                instant.step,
                &mut taps,
            );
            let value = taps.apply(&plan, &samples[0], from as i64);
            let rev = first_rev + 100.0 + (i / 128) as f64;
            let turns = (order * rev).fract() + order * (i % 128) as f64 / 128.0;
            (value - (TAU * turns).cos()).abs()
        })
        .fold(0.0, f64::max)
}

#[test]
fn a_day_in_is_as_good_as_the_first_minute() {
    for order in [1.0, 23.0, 49.0] {
        for hours in [0.02, 30.0] {
            let error = 20.0 * worst_error(hours, order).log10();
            println!("order {order}, {hours} h: {error:.1} dB");
            assert!(
                error < -120.0,
                "order {order} after {hours} h: {error:.1} dB"
            );
        }
    }
}
