//! Random machines for tests against planted truth.

use crate::{
    Channel, Converter, Edge, EdgeShape, Generator, Hunting, Knot, Noise, Order, Profile,
    PulseTrain, Recipe, Speed, Tone, Width, Wobble,
};

/// How hard a random machine is to analyse.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Difficulty {
    /// Clean: speed within ± 2 %, no noise, no tones, integer orders.
    Clean,
    /// As measured: speed within ± 5 %, noise, a tone or two, some orders not whole.
    Usual,
    /// Biased towards what breaks methods: wide or fast speed changes, close pairs of orders,
    /// orders that nearly meet tones, amplitudes over four decades, large bias, narrow pulses,
    /// a tach with noise, hum, drift and a 10-bit converter.
    Hard,
}

/// A random machine: channels 0 and 1 are accelerometers with the same 3 to 8 orders at amplitudes
/// and phases of their own, channel 2 is a tach with one pulse per revolution.
///
/// The rate is 5.12, 8.192 or 10 kHz, the length 6 to 12 s, the mean speed 12 to 60 rev/s. Orders
/// stay at or below 0.35 · rate / highest speed and are at least 0.5 apart (hard: 0.25). The recipe
/// is plain data: change or lengthen it as a test needs.
#[must_use]
pub fn random_machine(seed: u64, difficulty: Difficulty) -> Recipe {
    let mut generator = Generator::new(seed).fork(0x6d61_6368);
    let sample_rate_hz = [5120.0, 8192.0, 10_000.0][generator.whole(0, 2) as usize];
    let seconds = generator.uniform(6.0, 12.0);
    let speed = random_speed(&mut generator, difficulty, seconds);
    let mut recipe = Recipe::new(sample_rate_hz, seconds, speed);
    recipe.seed = generator.next_u64() >> 12;
    recipe.description = format!("random machine {seed}, {difficulty:?}");
    let [slowest, fastest] = crate::motion::speed_bounds(&recipe);
    let highest = (0.35 * sample_rate_hz / fastest).floor();
    let tones = random_tones(&mut generator, difficulty, sample_rate_hz, slowest, fastest);
    let orders = random_orders(
        &mut generator,
        difficulty,
        highest,
        &tones,
        0.5 * (slowest + fastest),
    );
    for name in ["drive end", "non-drive end"] {
        let mut channel = Channel::new(name, "acceleration", "m/s²");
        for &order in &orders {
            let amplitude = match difficulty {
                Difficulty::Hard => 10f64.powf(generator.uniform(-3.0, 1.0)),
                _ => 10f64.powf(generator.uniform(-1.0, 1.0)),
            };
            let lead = generator.uniform(-180.0, 180.0);
            channel.orders.push(Order::new(order, amplitude, lead));
        }
        channel.tones.clone_from(&tones);
        match difficulty {
            Difficulty::Clean => {}
            Difficulty::Usual => {
                let rms = 10f64.powf(generator.uniform(-2.0, -0.5));
                channel.noise.push(Noise::White { rms });
                channel.bias = generator.uniform(-1.0, 1.0);
            }
            Difficulty::Hard => {
                let rms = 10f64.powf(generator.uniform(-2.0, 0.3));
                channel.noise.push(Noise::White { rms });
                channel.noise.push(Noise::BandPass {
                    rms: 0.5 * rms,
                    center_hz: sample_rate_hz * generator.uniform(0.05, 0.4),
                    bandwidth_hz: sample_rate_hz * generator.uniform(0.005, 0.05),
                });
                channel.bias = generator.uniform(-300.0, 300.0);
            }
        }
        recipe.channels.push(channel);
    }
    recipe
        .channels
        .push(random_tach(&mut generator, difficulty, fastest));
    recipe
}

fn random_speed(generator: &mut Generator, difficulty: Difficulty, seconds: f64) -> Speed {
    let mean = generator.uniform(12.0, 60.0);
    let spread = match difficulty {
        Difficulty::Clean => generator.uniform(0.002, 0.02),
        Difficulty::Usual => generator.uniform(0.005, 0.05),
        Difficulty::Hard => generator.uniform(0.05, 0.3),
    };
    let kinds = if difficulty == Difficulty::Clean {
        2
    } else {
        5
    };
    let mut speed = Speed::constant(mean);
    speed.start_angle_rev = generator.uniform(-2.0, 2.0);
    match generator.whole(0, kinds - 1) {
        0 => {
            // two sines that together reach the spread
            let share = generator.uniform(0.3, 0.9);
            for part in [share, 1.0 - share] {
                speed.wobbles.push(Wobble {
                    amplitude_rev_per_s: mean * spread * part,
                    frequency_hz: generator.uniform(0.1, 0.6),
                    phase_deg: generator.uniform(0.0, 360.0),
                });
            }
        }
        1 => {
            speed.hunting = Some(Hunting {
                // 12 sines peak at about 2.5 rms
                rms_rev_per_s: mean * spread / 2.5,
                slowest_hz: 0.05,
                fastest_hz: generator.uniform(0.3, 1.0),
                sines: 12,
            });
        }
        2 => {
            speed.profile = Profile::Ramp {
                start_rev_per_s: mean * (1.0 - spread),
                slope_rev_per_s2: 2.0 * mean * spread / seconds,
            };
        }
        3 => {
            let count = generator.whole(3, 6);
            let step = seconds / (count - 1) as f64;
            speed.profile = Profile::Glide {
                knots: (0..count)
                    .map(|index| Knot {
                        at_s: index as f64 * step,
                        rev_per_s: mean * (1.0 + spread * generator.uniform(-1.0, 1.0)),
                    })
                    .collect(),
            };
        }
        _ => {
            let sign = if generator.whole(0, 1) == 0 {
                -1.0
            } else {
                1.0
            };
            speed.profile = Profile::Tanh {
                from_rev_per_s: mean * (1.0 - sign * spread),
                to_rev_per_s: mean * (1.0 + sign * spread),
                mid_s: seconds * generator.uniform(0.3, 0.7),
                width_s: seconds * generator.uniform(0.1, 0.3),
            };
        }
    }
    speed
}

fn random_tones(
    generator: &mut Generator,
    difficulty: Difficulty,
    rate_hz: f64,
    slowest: f64,
    fastest: f64,
) -> Vec<Tone> {
    let mut tone = |frequency_hz: f64| Tone {
        frequency_hz,
        amplitude: 10f64.powf(generator.uniform(-1.0, 0.5)),
        phase_lead_deg: generator.uniform(-180.0, 180.0),
    };
    match difficulty {
        Difficulty::Clean => Vec::new(),
        Difficulty::Usual => vec![tone(100.0)],
        // one that the orders sweep over, one near half the rate
        Difficulty::Hard => vec![
            tone(100.0),
            tone(3.0 * (slowest + fastest)),
            tone(0.46 * rate_hz),
        ],
    }
}

fn random_orders(
    generator: &mut Generator,
    difficulty: Difficulty,
    highest: f64,
    tones: &[Tone],
    mean: f64,
) -> Vec<f64> {
    let count = generator.whole(3, 8) as usize;
    let apart = if difficulty == Difficulty::Hard {
        0.25
    } else {
        0.5
    };
    let mut orders = vec![1.0];
    // a close pair high up, and an order near a tone: what a plain spectrum gets wrong
    if difficulty == Difficulty::Hard {
        orders.push(highest - 1.0);
        orders.push(highest - 1.25);
        let near = tones.first().map_or(2.0, |tone| tone.frequency_hz / mean) + 0.1;
        if orders.iter().all(|order| (order - near).abs() >= apart) && near < highest {
            orders.push(near);
        }
    }
    for _ in 0..200 {
        if orders.len() >= count {
            break;
        }
        let whole = difficulty == Difficulty::Clean || generator.whole(0, 2) > 0;
        let mut order = highest.powf(generator.uniform(0.0, 1.0)).min(highest);
        order = if whole {
            order.round()
        } else {
            (order * 100.0).round() / 100.0
        };
        if order >= 0.5
            && orders
                .iter()
                .all(|other| (other - order).abs() >= apart - 1e-9)
        {
            orders.push(order);
        }
    }
    orders.sort_by(f64::total_cmp);
    orders
}

fn random_tach(generator: &mut Generator, difficulty: Difficulty, fastest: f64) -> Channel {
    let hard = difficulty == Difficulty::Hard;
    let high = generator.uniform(1.0, 10.0);
    let down = generator.whole(0, 1) == 1;
    let train = PulseTrain {
        width: Width::Degrees(generator.uniform(if hard { 6.0 } else { 12.0 }, 40.0)),
        edge: if generator.whole(0, 1) == 0 {
            // 4 degrees at the highest speed, well under the narrowest pulse
            Edge::Seconds(4.0 / 360.0 / fastest)
        } else {
            Edge::Degrees(generator.uniform(3.0, 5.0))
        },
        shape: if generator.whole(0, 1) == 0 {
            EdgeShape::Linear
        } else {
            EdgeShape::RaisedCosine
        },
        high: if down { -high } else { high },
        ..PulseTrain::once_per_rev()
    };
    let mut tach = Channel::tach(train);
    if difficulty != Difficulty::Clean {
        tach.bias = generator.uniform(-3.0, 3.0);
        tach.noise.push(Noise::White {
            rms: high * if hard { 0.02 } else { 0.002 },
        });
    }
    if hard {
        tach.converter = Some(Converter {
            bits: 10,
            full_scale: 20.0,
        });
        tach.drift_per_s = 0.02 * high * generator.uniform(-1.0, 1.0);
        tach.tones.push(Tone::new(
            50.0,
            0.05 * high,
            generator.uniform(-180.0, 180.0),
        ));
    }
    tach
}
