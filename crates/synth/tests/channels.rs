//! What channels hold, against formulas written out here.

#![allow(clippy::unwrap_used)]

use shaftwise_synth::{
    Channel, Converter, Difficulty, Exact, Generator, Modulation, Motion, Noise, Order, PulseTrain,
    Recipe, Rendered, Resonance, ShaftRatio, Speed, Spike, Synth, Tone, random_machine,
};
use std::f64::consts::TAU;

const RATE: f64 = 4096.0;

fn recipe(seconds: f64, channel: Channel) -> Recipe {
    let speed = Speed::constant(25.0).with_wobble(2.0, 0.375, 30.0);
    let mut recipe = Recipe::new(RATE, seconds, speed);
    recipe.channels.push(channel);
    recipe
}

fn channel() -> Channel {
    Channel::new("drive end", "acceleration", "m/s²")
}

fn rendered(seconds: f64, channel: Channel) -> Vec<f64> {
    Synth::render(&recipe(seconds, channel))
        .unwrap()
        .channels
        .remove(0)
}

/// The angle in plain f64, by the integral of the wobble written out.
fn angle(t: f64) -> f64 {
    let phase = 30f64.to_radians();
    25.0 * t + 2.0 / (TAU * 0.375) * ((TAU * 0.375 * t + phase).sin() - phase.sin())
}

fn speed(t: f64) -> f64 {
    25.0 + 2.0 * (TAU * 0.375 * t + 30f64.to_radians()).cos()
}

fn assert_follows(values: &[f64], tolerance: f64, expected: impl Fn(f64) -> f64) {
    for (index, value) in values.iter().enumerate() {
        let t = index as f64 / RATE;
        assert!(
            (value - expected(t)).abs() < tolerance,
            "{t}: {value} {}",
            expected(t)
        );
    }
}

#[test]
fn orders_and_tones_follow_their_formulas() {
    let values = rendered(
        3.0,
        Channel {
            orders: vec![Order::new(1.0, 2.0, 40.0), Order::new(4.87, 0.5, -100.0)],
            tones: vec![Tone::new(100.3, 0.7, 15.0)],
            bias: 0.3,
            drift_per_s: -0.2,
            ..channel()
        },
    );
    // plain f64 here: angle 80 rev to 2e-14, times 2π·4.87·0.5 and the like
    assert_follows(&values, 2e-12, |t| {
        2.0 * (TAU * angle(t) + 40f64.to_radians()).cos()
            + 0.5 * (TAU * 4.87 * angle(t) - 100f64.to_radians()).cos()
            + 0.7 * (TAU * 100.3 * t + 15f64.to_radians()).cos()
            + 0.3
            - 0.2 * t
    });
}

#[test]
fn other_shafts_and_modulation_follow_their_formulas() {
    let order = Order {
        shaft: Some(ShaftRatio { turns: 17, per: 6 }),
        modulation: Some(Modulation {
            depth: 0.4,
            frequency_hz: 0.9,
            phase_deg: 70.0,
        }),
        ..Order::new(1.5, 2.0, 40.0)
    };
    assert_eq!(order.main_shaft_order(), 4.25);
    let values = rendered(
        3.0,
        Channel {
            orders: vec![order],
            ..channel()
        },
    );
    assert_follows(&values, 2e-12, |t| {
        2.0 * (1.0 + 0.4 * (TAU * 0.9 * t + 70f64.to_radians()).cos())
            * (TAU * 4.25 * angle(t) + 40f64.to_radians()).cos()
    });
}

#[test]
fn resonances_scale_and_turn_with_speed() {
    for speed_power in 0..=4 {
        let order = Order {
            resonance: Some(Resonance {
                natural_hz: 51.0,
                damping_ratio: 0.05,
                speed_power,
            }),
            ..Order::new(2.0, 3.0, 25.0)
        };
        let values = rendered(
            3.0,
            Channel {
                orders: vec![order],
                ..channel()
            },
        );
        assert_follows(&values, 1e-10, |t| {
            // polar form: |H| and its angle
            let r = 2.0 * speed(t) / 51.0;
            let size =
                r.powi(speed_power as i32) / ((1.0 - r * r).powi(2) + (0.1 * r).powi(2)).sqrt();
            let turn = -(0.1 * r).atan2(1.0 - r * r);
            3.0 * size * (TAU * 2.0 * angle(t) + 25f64.to_radians() + turn).cos()
        });
        // at resonance 1/(2ζ) = 10, a quarter turn late
        let (amplitude, lead) = order.at_speed(25.5);
        assert!((amplitude - 30.0).abs() < 1e-12 && (lead + 65.0).abs() < 1e-12);
    }
}

#[test]
fn spikes_clip_and_converter_come_last_in_that_order() {
    let values = rendered(
        0.5,
        Channel {
            tones: vec![Tone::new(10.0, 1.0, 0.0)],
            spikes: vec![Spike {
                at_s: 0.25,
                value: 9.0,
                samples: 3,
            }],
            clip_at: Some(4.9),
            converter: Some(Converter {
                bits: 4,
                full_scale: 2.0,
            }),
            ..channel()
        },
    );
    // 16 steps of 0.25 from −2 to 1.75
    for (index, value) in values.iter().enumerate() {
        assert_eq!(value * 4.0, (value * 4.0).round());
        let tone = (TAU * 10.0 * index as f64 / RATE).cos();
        match index {
            1024..1027 => assert_eq!(*value, 1.75),
            _ => assert!((value - tone).abs() < 0.125 + 1e-12),
        }
    }
    let clipped = rendered(
        0.5,
        Channel {
            tones: vec![Tone::new(10.0, 1.0, 0.0)],
            clip_at: Some(0.5),
            ..channel()
        },
    );
    assert_eq!(clipped.iter().copied().fold(f64::MIN, f64::max), 0.5);
    assert_eq!(clipped.iter().copied().fold(f64::MAX, f64::min), -0.5);
}

#[test]
fn noises_are_independent_between_channels_components_and_seeds() {
    let noisy = Channel {
        noise: vec![Noise::White { rms: 1.0 }],
        ..channel()
    };
    let mut recipe = recipe(16.0, noisy.clone());
    recipe.channels.push(noisy);
    let first = Synth::render(&recipe).unwrap().channels;
    recipe.seed += 1;
    let second = Synth::render(&recipe).unwrap().channels;
    let count = first[0].len() as f64;
    let correlation =
        |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| a * b).sum::<f64>() / count;
    // s.d. of a correlation of n independent pairs is 1/√n; five of them
    let bound = 5.0 / count.sqrt();
    assert!((correlation(&first[0], &first[0]) - 1.0).abs() < bound * 2f64.sqrt());
    assert!(correlation(&first[0], &first[1]).abs() < bound);
    assert!(correlation(&first[0], &second[0]).abs() < bound);
}

fn full_recipe() -> Recipe {
    let mut recipe = random_machine(3, Difficulty::Hard);
    recipe.channels[0].orders[0].resonance = Some(Resonance {
        natural_hz: 40.0,
        damping_ratio: 0.05,
        speed_power: 2,
    });
    recipe.channels[1].noise.push(Noise::OnePole {
        rms: 0.1,
        corner_hz: 30.0,
    });
    let tach = recipe.channels.last_mut().unwrap().pulses.as_mut().unwrap();
    tach.faults.missing_fraction = 0.05;
    tach.faults.strays_per_s = 2.0;
    recipe.channels.push(Channel::tach(PulseTrain::wheel(60)));
    recipe
}

#[test]
fn any_split_gives_the_same_bits() {
    let recipe = full_recipe();
    let whole = Synth::render(&recipe).unwrap().channels;
    let frames = whole[0].len();
    let mut generator = Generator::new(77);
    for split in [1, 2, 3, 7, 64, frames - 1, frames, 0] {
        let mut synth = Synth::new(&recipe).unwrap();
        let mut parts = vec![Vec::new(); whole.len()];
        // dirty vectors must not matter
        let mut block = vec![vec![f64::NAN; 5]; whole.len()];
        loop {
            let size = if split == 0 {
                generator.whole(1, 999) as usize
            } else {
                split
            };
            if synth.next_block(size, &mut block) == 0 {
                break;
            }
            for (part, block) in parts.iter_mut().zip(&block) {
                part.extend_from_slice(block);
            }
        }
        assert!(parts == whole, "split {split}");
    }
}

#[test]
fn single_samples_and_seeks_give_the_same_bits() {
    let recipe = full_recipe();
    let Rendered { channels, .. } = Synth::render(&recipe).unwrap();
    let mut synth = Synth::new(&recipe).unwrap();
    let mut generator = Generator::new(78);
    let mut block = vec![Vec::new(); channels.len()];
    for _ in 0..40 {
        let index = generator.whole(0, synth.frames() - 1);
        synth.seek(index);
        synth.next_block(1, &mut block);
        for (number, channel) in channels.iter().enumerate() {
            assert_eq!(block[number][0], channel[index as usize]);
            assert_eq!(synth.sample(number, index), channel[index as usize]);
        }
    }
    synth.seek(synth.frames());
    assert_eq!(synth.next_block(5, &mut block), 0);
    assert!(block.iter().all(Vec::is_empty));
}

#[test]
fn samples_days_away_keep_their_digits() {
    let mut recipe = recipe(
        2.0 * 86_400.0,
        Channel {
            orders: vec![Order::new(23.0, 1.0, 0.0)],
            tones: vec![Tone::new(1000.0, 1.0, 0.0)],
            ..channel()
        },
    );
    recipe
        .channels
        .push(Channel::tach(PulseTrain::once_per_rev()));
    let synth = Synth::new(&recipe).unwrap();
    let motion = Motion::new(&recipe).unwrap();
    let seconds = 130_000;
    for offset in 0..200u64 {
        let index = seconds * 4096 + offset;
        let time = Exact::new(seconds as i64, offset as f64 / RATE);
        // whole seconds of 25 rev/s and 1000 Hz are whole turns, and of the wobble whole
        // turns of 0.375 Hz · 130 000 s: the plain formula near zero holds here too
        let near = offset as f64 / RATE;
        let expected = (TAU * 23.0 * angle(near)).cos() + (TAU * 1000.0 * near).cos();
        assert!((synth.sample(0, index) - expected).abs() < 1e-12);
        assert!((motion.angle(time).fraction - angle(near).rem_euclid(1.0)).abs() < 4e-15);
    }
    // and the pulses there are those of the start, moved
    let there = synth.truth_between(seconds * 4096, (seconds + 2) * 4096 - 1);
    let here = synth.truth_between(0, 2 * 4096 - 1);
    for (there, here) in there.tachs[0].pulses.iter().zip(&here.tachs[0].pulses) {
        assert_eq!(there.number - here.number, 25 * seconds as i64);
        let moved = there.time.since(Exact::new(seconds as i64, 0.0)) - here.time.value();
        assert!(moved.abs() < 1e-15, "{moved}");
    }
}
