//! Tach channels against the exact crossings.

#![allow(clippy::unwrap_used)]

use shaftwise_synth::{
    Burst, Channel, Doubled, Edge, EdgeShape, Exact, Faults, Motion, PulseTrain, Recipe,
    ShaftRatio, Speed, Synth, TachTruth, Width,
};

const RATE: f64 = 20_000.0;

fn recipe(train: PulseTrain) -> Recipe {
    let speed = Speed::constant(25.0).with_wobble(2.0, 0.4, 30.0);
    let mut recipe = Recipe::new(RATE, 4.0, speed);
    recipe.channels.push(Channel::tach(train));
    recipe
}

fn rendered(train: PulseTrain) -> (Vec<f64>, TachTruth, Motion) {
    let recipe = recipe(train);
    let mut rendered = Synth::render(&recipe).unwrap();
    let motion = Motion::new(&recipe).unwrap();
    (
        rendered.channels.remove(0),
        rendered.truth.tachs.remove(0),
        motion,
    )
}

/// Times between samples at which the waveform passes half height upwards. Good to a rise's
/// curvature: exact for linear edges.
fn rising(values: &[f64], half: f64) -> Vec<f64> {
    let pairs = values.windows(2).enumerate();
    let crossings = pairs.filter(|(_, pair)| pair[0] < half && pair[1] >= half);
    crossings
        .map(|(index, pair)| (index as f64 + (half - pair[0]) / (pair[1] - pair[0])) / RATE)
        .collect()
}

#[test]
fn true_pulses_lie_at_whole_turns() {
    let (_, truth, motion) = rendered(PulseTrain {
        pulses_per_rev: 4,
        phase_deg: 30.0,
        ..PulseTrain::once_per_rev()
    });
    let end = motion.angle(4.0 - 1.0 / RATE).value();
    assert_eq!(truth.pulses.len(), ((end - 1.0 / 12.0) * 4.0) as usize + 1);
    for pulse in &truth.pulses {
        let angle = Exact::new(0, pulse.number as f64 / 4.0 + 30.0 / 360.0);
        assert!(motion.angle(pulse.time).since(angle).abs() < 3e-14);
        assert!(!pulse.missing && pulse.doubled.is_none());
    }
}

#[test]
fn edges_cross_half_height_at_the_true_times() {
    let edges = [Edge::Seconds(4e-4), Edge::Degrees(4.0)];
    let widths = [Width::Degrees(12.0), Width::Seconds(1.5e-3)];
    for edge in edges {
        for width in widths {
            for (low, high) in [(0.0, 5.0), (-1.0, 0.5), (5.0, 0.0)] {
                let (values, truth, _) = rendered(PulseTrain {
                    edge,
                    width,
                    shape: EdgeShape::Linear,
                    low,
                    high,
                    ..PulseTrain::once_per_rev()
                });
                let upright: Vec<f64> = values.iter().map(|v| (v - low) / (high - low)).collect();
                let seen = rising(&upright, 0.5);
                // the pulse at t = 0 starts half way up
                let pulses = &truth.pulses[1..];
                assert_eq!(seen.len(), pulses.len());
                for (seen, pulse) in seen.iter().zip(pulses) {
                    // time edges are straight in time; angle edges bend by ½·v̇/v·(50 µs)² < 1 ns
                    let bound = if matches!(edge, Edge::Seconds(_)) {
                        1e-13
                    } else {
                        1e-9
                    };
                    assert!((seen - pulse.time.value()).abs() < bound);
                }
            }
        }
    }
}

#[test]
fn falling_edges_are_a_width_behind() {
    for (edge, width) in [
        (Edge::Seconds(4e-4), Width::Degrees(12.0)),
        (Edge::Degrees(4.0), Width::Seconds(1.5e-3)),
    ] {
        let (values, truth, motion) = rendered(PulseTrain {
            edge,
            width,
            shape: EdgeShape::Linear,
            ..PulseTrain::once_per_rev()
        });
        let flipped: Vec<f64> = values.iter().map(|v| -v).collect();
        for (fall, pulse) in rising(&flipped, -2.5).iter().zip(&truth.pulses) {
            let expected = match width {
                Width::Seconds(s) => pulse.time.plus(s),
                Width::Degrees(deg) => motion.time_at(motion.angle(pulse.time).plus(deg / 360.0)),
            };
            assert!((fall - expected.value()).abs() < 1e-9);
        }
    }
}

#[test]
fn raised_cosine_has_its_course_and_a_step_is_a_step() {
    let (values, truth, _) = rendered(PulseTrain::once_per_rev());
    let pulse = truth.pulses[3].time.value();
    for (index, value) in values.iter().enumerate() {
        let part = (index as f64 / RATE - pulse) / 2e-4;
        if part.abs() < 0.5 {
            let expected = 2.5 * (1.0 + (std::f64::consts::PI * part).sin());
            assert!((value - expected).abs() < 1e-10);
        }
    }
    let (values, ..) = rendered(PulseTrain {
        edge: Edge::Seconds(0.0),
        ..PulseTrain::once_per_rev()
    });
    assert!(values.iter().all(|&value| value == 0.0 || value == 5.0));
    assert_eq!(values[0], 5.0);
}

#[test]
fn wheels_have_gaps_errors_and_ratios() {
    let errors = vec![0.0, 0.5, -0.5, 0.0, 0.3, -0.3, 0.0, 0.0];
    let (values, truth, motion) = rendered(PulseTrain {
        pulses_per_rev: 8,
        missing_teeth: 2,
        tooth_errors_deg: errors.clone(),
        shaft: Some(ShaftRatio { turns: 3, per: 2 }),
        shape: EdgeShape::Linear,
        ..PulseTrain::wheel(8)
    });
    let seen = rising(&values, 2.5);
    assert_eq!(seen.len(), truth.pulses.len() - 1);
    for (seen, pulse) in seen.iter().zip(&truth.pulses[1..]) {
        let tooth = pulse.number.rem_euclid(8);
        assert!(tooth < 6);
        let shaft = pulse.number as f64 / 8.0 + errors[tooth as usize] / 360.0;
        assert!((motion.angle(pulse.time).value() - shaft / 1.5).abs() < 3e-14);
        assert!((seen - pulse.time.value()).abs() < 1e-9);
    }
}

#[test]
fn faults_are_where_the_truth_says() {
    let faults = Faults {
        missing_fraction: 0.1,
        missing_pulses: vec![40, 10],
        doubled: Some(Doubled {
            fraction: 0.1,
            lag_deg: 60.0,
        }),
        strays_per_s: 1.0,
        stray_times_s: vec![1.234_567],
        bursts: vec![Burst {
            at_s: 3.0,
            count: 5,
            spacing_s: 4e-3,
        }],
        ..Faults::default()
    };
    let (values, truth, motion) = rendered(PulseTrain {
        shape: EdgeShape::Linear,
        faults,
        ..PulseTrain::once_per_rev()
    });
    let missing = truth.missing();
    assert!(missing.contains(&10) && missing.contains(&40));
    assert!(missing.len() > 4 && missing.len() < 25, "{missing:?}");
    let mut expected = truth.strays_s.clone();
    for pulse in truth.pulses.iter().filter(|pulse| !pulse.missing) {
        expected.push(pulse.time.value());
        if let Some(second) = pulse.doubled {
            let turned = motion.angle(second).since(motion.angle(pulse.time));
            assert!((turned - 60.0 / 360.0).abs() < 3e-14);
            expected.push(second.value());
        }
    }
    let doubled = truth
        .pulses
        .iter()
        .filter(|pulse| pulse.doubled.is_some())
        .count();
    assert!(doubled > 2 && doubled < 25);
    assert!(truth.strays_s.len() >= 6 && truth.strays_s.contains(&1.234_567));
    expected.sort_by(f64::total_cmp);
    let seen = rising(&values, 2.5);
    // strays may fall onto a pulse and join it: every crossing is explained, few are hidden
    for crossing in &seen {
        assert!(
            expected.iter().any(|time| (time - crossing).abs() < 1e-12),
            "{crossing}"
        );
    }
    assert!(seen.len() + 4 > expected.len());
}

#[test]
fn shares_of_faults_are_as_asked() {
    let mut recipe = recipe(PulseTrain::once_per_rev());
    recipe.seconds = 400.0;
    recipe.speed = Speed::constant(25.0);
    recipe.channels[0].pulses.as_mut().unwrap().faults = Faults {
        missing_fraction: 0.03,
        doubled: Some(Doubled {
            fraction: 0.05,
            lag_deg: 60.0,
        }),
        strays_per_s: 2.0,
        ..Faults::default()
    };
    let truth = Synth::new(&recipe).unwrap().truth().tachs.remove(0);
    let within = |found: usize, mean: f64| {
        // binomial and Poisson counts: s.d. at most the root of the mean; five of them
        assert!(
            (found as f64 - mean).abs() < 5.0 * mean.sqrt(),
            "{found} {mean}"
        );
    };
    assert_eq!(truth.pulses.len(), 10_000);
    within(truth.missing().len(), 300.0);
    within(
        truth.pulses.iter().filter(|p| p.doubled.is_some()).count(),
        10_000.0 * 0.97 * 0.05,
    );
    within(truth.strays_s.len(), 800.0);
}
