//! Edges of planted tach channels, against the instants they were planted at.
#![allow(clippy::unwrap_used)]

mod planted;
use planted::{Length, Motion, Tach, scatter};
use shaftwise_rotation::{
    Edge, Error, Rotation, RotationConfig, TachConfig, TachScan, TachScanner, rotation_from_scan,
};
use shaftwise_signal::SamplePosition;

fn config(rate: f64) -> TachConfig {
    TachConfig {
        sample_rate_hz: rate,
        pulses_per_rev: 1,
        edge: Edge::Rising,
        threshold: None,
        delay_s: 0.0,
    }
}

fn scan(samples: &[f64], config: &TachConfig) -> Result<TachScan, Error> {
    let mut scanner = TachScanner::new(config)?;
    scanner.push(samples);
    scanner.finish()
}

fn rotation(samples: &[f64], config: &TachConfig) -> (TachScan, Rotation) {
    let scan = scan(samples, config).unwrap();
    let settings = RotationConfig {
        sample_rate_hz: config.sample_rate_hz,
        total_samples: samples.len() as u64,
        pulses_per_rev: config.pulses_per_rev,
    };
    let rotation = rotation_from_scan(&scan, &settings).unwrap();
    (scan, rotation)
}

/// Root mean square of the angle error in degrees, its mean removed.
fn angle_error(rotation: &Rotation, motion: &Motion) -> f64 {
    let section = &rotation.sections[0];
    let (start, span) = (section.start(), section.end().since(section.start()));
    let errors: Vec<f64> = (0..4000)
        .map(|i| {
            let offset = start.fraction + span * f64::from(i) / 3999.0;
            let position = SamplePosition::new(start.index, offset);
            let (rev, fraction) = section.angle_at(position);
            let truth = motion.angle(position.seconds(rotation.sample_rate_hz));
            360.0 * (rev as f64 + fraction - truth)
        })
        .collect();
    scatter(&errors).0
}

/// Channels and how well the angle must come out, in degrees rms.
fn table() -> Vec<(&'static str, Tach, f64)> {
    let plain = Tach::plain(51_200.0);
    let round = Tach {
        round: true,
        ..plain.clone()
    };
    let step = 10.0 / 256.0;
    vec![
        ("straight 100 us", plain.clone(), 5e-4),
        (
            "straight 1 deg",
            Tach {
                edge: Length::Degrees(1.0),
                ..plain.clone()
            },
            5e-4,
        ),
        (
            "straight 3 deg",
            Tach {
                edge: Length::Degrees(3.0),
                ..plain.clone()
            },
            5e-4,
        ),
        (
            "straight 20 samples",
            Tach {
                edge: Length::Seconds(4e-4),
                ..plain.clone()
            },
            5e-4,
        ),
        ("round 100 us", round.clone(), 5e-4),
        (
            "round 200 us",
            Tach {
                edge: Length::Seconds(2e-4),
                ..round.clone()
            },
            1e-4,
        ),
        (
            "round 400 us",
            Tach {
                edge: Length::Seconds(4e-4),
                ..round.clone()
            },
            1e-4,
        ),
        (
            "round 2 deg",
            Tach {
                edge: Length::Degrees(2.0),
                ..round.clone()
            },
            5e-4,
        ),
        (
            "round 4 deg",
            Tach {
                edge: Length::Degrees(4.0),
                ..round.clone()
            },
            1e-4,
        ),
        (
            "half open",
            Tach {
                width: Length::Degrees(180.0),
                ..round.clone()
            },
            5e-4,
        ),
        (
            "drift",
            Tach {
                drift_per_s: 0.6,
                ..round.clone()
            },
            5e-4,
        ),
        (
            "downward",
            Tach {
                low: 4.0,
                high: -1.0,
                ..round.clone()
            },
            5e-4,
        ),
        (
            "8 bits, round 100 us",
            Tach {
                step,
                ..round.clone()
            },
            2e-3,
        ),
        (
            "8 bits, round 4 deg",
            Tach {
                step,
                edge: Length::Degrees(4.0),
                ..round.clone()
            },
            2e-3,
        ),
        (
            "8 bits, straight 1 deg",
            Tach {
                step,
                edge: Length::Degrees(1.0),
                ..plain
            },
            2e-3,
        ),
    ]
}

#[test]
fn clean_edges_reach_the_stated_angle() {
    let seconds = 15.0;
    let mut found = Vec::new();
    for (name, tach, limit) in table() {
        for motion in [
            Motion::wobbling(30.0),
            Motion::wobbling(75.0),
            Motion {
                ramp: 1.7,
                ..Motion::steady(8.0)
            },
        ] {
            let instants = motion.instants(0.0, 1.0, seconds);
            let samples = tach.sample(&motion, &instants, seconds);
            // The planted edge is the leading one, which falls where pulses point down.
            let edge = if tach.high > tach.low {
                Edge::Rising
            } else {
                Edge::Falling
            };
            let (scan, rotation) = rotation(
                &samples,
                &TachConfig {
                    edge,
                    ..config(tach.rate)
                },
            );
            let inside = instants.len() - usize::from(instants.last().unwrap() + 0.001 > seconds);
            assert!(
                scan.edges.len() >= inside,
                "{name}: {} edges",
                scan.edges.len()
            );
            assert!(rotation.ledger.is_empty(), "{name}: {:?}", rotation.ledger);
            let error = angle_error(&rotation, &motion);
            found.push((name, motion.speed, error));
            assert!(
                error < limit,
                "{name} at {} rev/s: {error:e} deg; {found:?}",
                motion.speed
            );
        }
    }
}

#[test]
fn rates_widths_and_noise_of_all_kinds_lose_no_pulse() {
    let seconds = 8.0;
    let plain = Tach::plain(51_200.0);
    let tachs = [
        Tach {
            rate: 8_000.0,
            ..plain.clone()
        },
        Tach {
            rate: 204_800.0,
            ..plain.clone()
        },
        Tach {
            edge: Length::Seconds(10e-6),
            ..plain.clone()
        },
        Tach {
            edge: Length::Seconds(20e-6),
            width: Length::Degrees(3.6),
            ..plain.clone()
        },
        Tach {
            noise: 4.6 / 100.0,
            ..plain.clone()
        },
        Tach {
            noise: 4.6 / 20.0,
            ..plain.clone()
        },
        Tach {
            noise: 4.6 / 8.0,
            ..plain.clone()
        },
        Tach {
            noise: 4.6 / 20.0,
            drift_per_s: -2.0,
            ..plain.clone()
        },
    ];
    for (number, tach) in tachs.into_iter().enumerate() {
        for motion in [
            Motion::wobbling(50.0),
            Motion {
                ramp: 4.0,
                ..Motion::steady(10.0)
            },
        ] {
            let instants = motion.instants(0.0, 1.0, seconds - 0.05);
            let samples = tach.sample(&motion, &instants, seconds);
            let (scan, rotation) = rotation(&samples, &config(tach.rate));
            assert_eq!(scan.edges.len(), instants.len(), "tach {number}");
            // The found scatter is what the noise and the slope explain.
            if tach.noise > 0.0 {
                let ratio = rotation.timing_sigma_s / scan.edge_sigma_s;
                assert!((0.7..1.5).contains(&ratio), "tach {number}: {ratio}");
            }
            // Edges shorter than a sample err by where the samples fall, pulse after pulse alike
            // while the speed holds: that averages out less than its sigma, which takes it for
            // white, says.
            let factor = if number == 0 || number == 2 { 4.0 } else { 2.0 };
            let error = angle_error(&rotation, &motion);
            let sigma = rotation.angle_sigma_deg();
            assert!(
                error < factor * sigma + 1e-4,
                "tach {number}: {error:e}, {sigma:e}"
            );
        }
    }
}

#[test]
fn a_channel_of_two_values_is_known_and_its_limit_stated() {
    let motion = Motion::wobbling(50.0);
    let tach = Tach {
        low: 0.0,
        high: 1.0,
        step: 1.0,
        ..Tach::plain(51_200.0)
    };
    let samples = tach.sample(&motion, &motion.instants(0.0, 1.0, 20.0), 20.0);
    let (scan, rotation) = rotation(&samples, &config(tach.rate));
    assert!(scan.two_level && scan.warnings.len() == 1);
    // Quantised to one sample: T/√12 (standard), and so found.
    let quantised = 1.0 / (51_200.0 * 12f64.sqrt());
    assert!((scan.edge_sigma_s / quantised - 1.0).abs() < 1e-12);
    assert!((rotation.timing_sigma_s / quantised - 1.0).abs() < 0.1);
    // 360·f·T/√12 for a single pulse; the smoothed angle is better.
    assert!(angle_error(&rotation, &motion) < 360.0 * 50.0 * quantised);
}

#[test]
fn pulses_of_a_wheel_are_found_one_by_one() {
    let motion = Motion::wobbling(25.0);
    let tach = Tach {
        width: Length::Degrees(3.0),
        edge: Length::Seconds(40e-6),
        ..Tach::plain(51_200.0)
    };
    let instants = motion.instants(0.0, 1.0 / 60.0, 5.0);
    let samples = tach.sample(&motion, &instants, 5.0);
    let (scan, rotation) = rotation(
        &samples,
        &TachConfig {
            pulses_per_rev: 60,
            ..config(tach.rate)
        },
    );
    assert!(instants.len() - scan.edges.len() <= 1);
    assert!(angle_error(&rotation, &motion) < 2e-3);
}

#[test]
fn a_slow_shaft_with_long_pulses_keeps_both_edges() {
    // A pulse lasts three slabs.
    let motion = Motion::steady(0.5);
    let tach = Tach {
        width: Length::Degrees(170.0),
        noise: 0.02,
        ..Tach::plain(204_800.0)
    };
    let instants = motion.instants(0.0, 1.0, 19.0);
    let samples = tach.sample(&motion, &instants, 20.0);
    for (edge, late) in [(Edge::Rising, 0.0), (Edge::Falling, 170.0 / 360.0 / 0.5)] {
        let scan = scan(
            &samples,
            &TachConfig {
                edge,
                ..config(tach.rate)
            },
        )
        .unwrap();
        let planted: Vec<f64> = instants
            .iter()
            .map(|t| t + late)
            .filter(|t| *t < 19.99)
            .collect();
        assert_eq!(scan.edges.len(), planted.len(), "{edge:?}");
        for (found, truth) in scan.edges.iter().zip(planted) {
            // A slope of 0.22 V a sample, 0.02 V of noise: 0.09 sample, less by smoothing.
            let off = found.position.seconds(tach.rate) - truth;
            assert!(off.abs() < 0.3 / tach.rate, "{edge:?} {truth} s: {off:e} s");
        }
    }
}

#[test]
fn widths_and_levels_are_reported() {
    let motion = Motion::steady(40.0);
    let tach = Tach {
        width: Length::Degrees(30.0),
        ..Tach::plain(51_200.0)
    };
    let samples = tach.sample(&motion, &motion.instants(0.0, 1.0, 5.0), 5.0);
    let (scan, rotation) = rotation(&samples, &config(tach.rate));
    assert!((scan.low - 0.2).abs() < 1e-9 && (scan.high - 4.8).abs() < 1e-9);
    // 10 to 90 % of a straight edge of 100 µs, its corners cut between samples of 20 µs.
    assert!((scan.edge_width_s - 80e-6).abs() < 4e-6);
    assert!((rotation.pulse_width_deg.unwrap() - 30.0).abs() < 0.01);
    assert!((rotation.edge_width_deg.unwrap() - 80e-6 * 40.0 * 360.0).abs() < 0.06);
}

#[test]
fn threshold_edge_and_delay_are_obeyed() {
    let motion = Motion::steady(40.0);
    let tach = Tach::plain(51_200.0);
    let samples = tach.sample(&motion, &motion.instants(0.0, 1.0, 5.0), 5.0);
    let base = config(tach.rate);
    let at = |config: &TachConfig| {
        scan(&samples, config).unwrap().edges[20]
            .position
            .seconds(tach.rate)
    };
    let middle = at(&base);
    // A quarter of the height is a quarter of the edge's 100 µs earlier; the smoothing
    // rounds the corners of an edge of five samples a little.
    let low = at(&TachConfig {
        threshold: Some(0.2 + 0.25 * 4.6),
        ..base.clone()
    });
    assert!((middle - low - 25e-6).abs() < 6e-6, "{}", middle - low);
    let late = at(&TachConfig {
        delay_s: 0.003,
        ..base.clone()
    });
    assert!((middle - late - 0.003).abs() < 1e-9);
    let falling = at(&TachConfig {
        edge: Edge::Falling,
        ..base
    });
    // 20 deg at 40 rev/s.
    assert!((falling - middle - 20.0 / 360.0 / 40.0).abs() < 1e-6);
}

#[test]
fn ripple_ringing_and_one_great_stray_do_no_harm() {
    let motion = Motion::wobbling(20.0);
    let tach = Tach {
        noise: 0.01,
        ..Tach::plain(51_200.0)
    };
    let instants = motion.instants(0.0, 1.0, 10.0);
    let mut samples = tach.sample(&motion, &instants, 10.0);
    for &t in &instants {
        let edge = (t * tach.rate) as usize + 4;
        for k in 0..60.min(samples.len() - edge) {
            let age = k as f64;
            samples[edge + k] += 1.2 * (-age / 12.0).exp() * (age * 0.9).sin();
        }
    }
    for x in &mut samples[200_000..200_040] {
        *x += 60.0;
    }
    let (scan, rotation) = rotation(&samples, &config(tach.rate));
    assert!(
        scan.edges.len() - instants.len() <= 1,
        "{} edges",
        scan.edges.len()
    );
    assert_eq!(rotation.sections.len(), 1);
    assert!((rotation.revs() - (instants.len() - 1) as f64).abs() < 1e-9);
}

#[test]
fn any_split_of_the_channel_gives_the_same_bits() {
    let motion = Motion::wobbling(30.0);
    let tach = Tach {
        noise: 0.1,
        ..Tach::plain(51_200.0)
    };
    let samples = tach.sample(&motion, &motion.instants(0.0, 1.0, 5.0), 5.0);
    let whole = scan(&samples, &config(tach.rate)).unwrap();
    for split in [1, 2, 3, 7, 64, 1000, 65_536, samples.len() - 1] {
        let mut scanner = TachScanner::new(&config(tach.rate)).unwrap();
        scanner.push(&[]);
        for part in samples.chunks(split) {
            scanner.push(part);
        }
        assert_eq!(scanner.finish().unwrap(), whole, "split {split}");
    }
    assert!(std::mem::size_of_val(&whole.edges[0]) <= 24);
}

#[test]
fn bad_channels_and_settings_are_named() {
    let base = config(51_200.0);
    let settings = RotationConfig {
        sample_rate_hz: 51_200.0,
        total_samples: 1 << 20,
        pulses_per_rev: 1,
    };
    assert_eq!(
        scan(&[1.5; 5000], &base),
        Err(Error::Constant {
            level: 1.5,
            samples: 5000
        })
    );
    let mut samples = vec![0.0; 5000];
    samples[1234] = f64::NAN;
    let error = scan(&samples, &base).unwrap_err();
    assert!(
        matches!(error, Error::NotFinite { index: 1234, .. }),
        "{error}"
    );
    samples[1234] = f64::INFINITY;
    assert!(matches!(
        scan(&samples, &base),
        Err(Error::NotFinite { index: 1234, .. })
    ));
    assert!(matches!(
        scan(&[], &base),
        Err(Error::TooFewPulses { found: 0, .. })
    ));

    let tach = Tach::plain(51_200.0);
    let motion = Motion::steady(20.0);
    let samples = tach.sample(&motion, &[0.1, 0.15, 0.2], 1.0);
    let three = scan(&samples, &base).unwrap();
    let error = rotation_from_scan(&three, &settings).unwrap_err();
    assert_eq!(error, Error::TooFewPulses { found: 3, least: 6 });
    assert_eq!(error.to_string(), "3 usable pulses, expected at least 6");
    assert!(!error.hint().is_empty());

    for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(TachScanner::new(&config(bad)).is_err());
    }
    let per_rev = TachConfig {
        pulses_per_rev: 0,
        ..base.clone()
    };
    assert!(matches!(
        TachScanner::new(&per_rev),
        Err(Error::PulsesPerRev { found: 0, .. })
    ));
    let delay = TachConfig {
        delay_s: f64::NAN,
        ..base
    };
    assert!(matches!(
        TachScanner::new(&delay),
        Err(Error::Setting { .. })
    ));
}
