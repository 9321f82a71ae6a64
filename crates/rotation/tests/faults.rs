//! Lost, stray, doubled and displaced pulses.
#![allow(clippy::unwrap_used)]

mod planted;
use planted::{Dice, Motion, Tach};
use shaftwise_rotation::{
    Edge, Error, LedgerAction, Rotation, RotationConfig, TachConfig, TachScanner,
    rotation_from_scan, rotation_from_times,
};

const RATE: f64 = 51_200.0;

fn rotation(times: &[f64]) -> Rotation {
    let config = RotationConfig {
        sample_rate_hz: RATE,
        total_samples: 1 << 40,
        pulses_per_rev: 1,
    };
    rotation_from_times(times, &config).unwrap()
}

/// Whether every section runs with the planted motion, to a twentieth of a revolution.
fn keeps_count(rotation: &Rotation, motion: &Motion) -> bool {
    rotation.sections.iter().all(|section| {
        let start = section.start().seconds(RATE);
        let offset = motion.angle(start) - section.start_rev();
        (0..=1000).all(|k| {
            let angle = section.start_rev() + section.span_rev() * f64::from(k) / 1000.0;
            let instant = section.at(angle.floor() as i64, angle - angle.floor());
            let truth = motion.angle(instant.position.seconds(RATE)) - offset;
            (truth - angle).abs() < 0.05
        })
    })
}

fn count(rotation: &Rotation, action: LedgerAction) -> u64 {
    rotation
        .ledger
        .iter()
        .filter(|entry| entry.action == action)
        .count() as u64
}

#[test]
fn no_revolution_is_lost_or_gained_with_three_in_a_hundred_missing_and_stray() {
    let motions = [
        Motion::steady(50.0),
        Motion::wobbling(30.0),
        Motion {
            ramp: 1.7,
            ..Motion::steady(8.0)
        },
        Motion {
            wobbles: vec![(10.0, 2.0, 0.3)],
            ..Motion::steady(50.0)
        },
    ];
    for motion in motions {
        for seed in 0..3 {
            let mut dice = Dice(100 + seed);
            let all = motion.instants(0.0, 1.0, 30.0);
            let mut lost = 0;
            let mut times = Vec::new();
            for (i, t) in all.iter().enumerate() {
                if i > 3 && i + 4 < all.len() && dice.even() < 0.03 {
                    lost += 1;
                } else {
                    times.push(t + 0.2 / RATE * dice.normal());
                }
            }
            let strays = all.len() * 3 / 100;
            times.extend((0..strays).map(|_| 0.2 + 29.6 * dice.even()));
            times.sort_by(f64::total_cmp);
            let rotation = rotation(&times);
            assert_eq!(rotation.sections.len(), 1, "{:?}", rotation.warnings);
            assert!(keeps_count(&rotation, &motion));
            let pulses = rotation.pulses;
            assert_eq!(pulses.timed, times.len() as u64);
            assert_eq!(pulses.used, pulses.timed - pulses.rejected);
            // Every repair is in the ledger, in time order.
            assert_eq!(count(&rotation, LedgerAction::Inserted), pulses.inserted);
            assert_eq!(count(&rotation, LedgerAction::Rejected), pulses.rejected);
            assert!(
                rotation
                    .ledger
                    .windows(2)
                    .all(|pair| pair[0].time_s <= pair[1].time_s)
            );
            // A stray right where a pulse is lost passes for it: one balances the other.
            assert_eq!(lost - pulses.inserted, strays as u64 - pulses.rejected);
            assert!(lost - pulses.inserted <= 2);
        }
    }
}

#[test]
fn ten_pulses_lost_in_a_row_are_counted() {
    let motion = Motion::wobbling(30.0);
    let mut times = motion.instants(0.0, 1.0, 20.0);
    let gap: Vec<f64> = times.drain(300..310).collect();
    let rotation = rotation(&times);
    assert_eq!(rotation.sections.len(), 1, "{:?}", rotation.warnings);
    assert_eq!(rotation.pulses.inserted, 10);
    for (entry, truth) in rotation.ledger.iter().zip(gap) {
        assert_eq!(entry.action, LedgerAction::Inserted);
        // A hundredth of a revolution.
        assert!((entry.time_s - truth).abs() < 0.01 / 30.0);
    }
    assert!(keeps_count(&rotation, &motion));
}

#[test]
fn a_gap_nobody_can_count_starts_a_new_section() {
    let motion = Motion::wobbling(30.0);
    let mut times = motion.instants(0.0, 1.0, 30.0);
    times.drain(300..500);
    let rotation = rotation(&times);
    assert_eq!(rotation.sections.len(), 2);
    assert_eq!(rotation.warnings.len(), 1, "{:?}", rotation.warnings);
    assert_eq!(rotation.pulses.inserted, 0);
    assert!(keeps_count(&rotation, &motion));
    let (first, second) = (&rotation.sections[0], &rotation.sections[1]);
    // Phase goes on in whole revolutions, counted as well as may be.
    assert!(second.start_rev() > first.end_rev() + 150.0);
    assert!((second.start_rev() - second.start_rev().round()).abs() < 1e-12);
}

#[test]
fn doubled_pulses_are_rejected() {
    let motion = Motion::wobbling(40.0);
    let mut times = motion.instants(0.0, 1.0, 10.0);
    let doubles: Vec<f64> = times
        .iter()
        .skip(20)
        .step_by(37)
        .map(|t| t + 0.002)
        .collect();
    let planted = doubles.len() as u64;
    times.extend(doubles);
    times.sort_by(f64::total_cmp);
    let rotation = rotation(&times);
    assert_eq!(
        (rotation.pulses.rejected, rotation.pulses.inserted),
        (planted, 0)
    );
    assert!(keeps_count(&rotation, &motion));
}

#[test]
fn a_displaced_pulse_keeps_its_tooth_and_loses_its_instant() {
    let motion = Motion::wobbling(40.0);
    let mut dice = Dice(8);
    let mut times: Vec<f64> = motion
        .instants(0.0, 1.0, 10.0)
        .iter()
        .map(|t| t + 0.02 / RATE * dice.normal())
        .collect();
    // Half a degree early.
    times[200] -= 0.5 / 360.0 / 40.0;
    let rotation = rotation(&times);
    let moved: Vec<_> = rotation
        .ledger
        .iter()
        .filter(|e| e.action == LedgerAction::Moved)
        .collect();
    assert_eq!(moved.len(), 1);
    assert!((moved[0].time_s - times[200]).abs() < 1e-6);
    assert_eq!((rotation.pulses.rejected, rotation.pulses.inserted), (0, 0));
    let instant = rotation.sections[0].at(200, 0.0);
    let error = motion.angle(instant.position.seconds(RATE)) - 200.0;
    assert!(360.0 * error.abs() < 0.05, "{error}");
}

#[test]
fn faults_in_the_channel_itself_end_in_the_ledger() {
    // Missing and stray pulses on a noisy, drifting channel.
    let motion = Motion::wobbling(30.0);
    let tach = Tach {
        noise: 0.1,
        drift_per_s: 0.5,
        ..Tach::plain(RATE)
    };
    let mut dice = Dice(77);
    let all = motion.instants(0.0, 1.0, 20.0);
    let mut instants = Vec::new();
    let mut lost = 0;
    for (i, &t) in all.iter().enumerate() {
        if i > 3 && i + 4 < all.len() && dice.even() < 0.03 {
            lost += 1;
        } else {
            instants.push(t);
        }
        if i % 40 == 17 {
            instants.push(t + 0.45 / 30.0);
        }
    }
    let strays = instants.len() + lost - all.len();
    let samples = tach.sample(&motion, &instants, 20.0);
    let mut scanner = TachScanner::new(&TachConfig {
        sample_rate_hz: RATE,
        pulses_per_rev: 1,
        edge: Edge::Rising,
        threshold: None,
        delay_s: 0.0,
    })
    .unwrap();
    scanner.push(&samples);
    let config = RotationConfig {
        sample_rate_hz: RATE,
        total_samples: samples.len() as u64,
        pulses_per_rev: 1,
    };
    let rotation = rotation_from_scan(&scanner.finish().unwrap(), &config).unwrap();
    assert_eq!(rotation.sections.len(), 1);
    assert_eq!(rotation.pulses.inserted, lost as u64);
    assert_eq!(rotation.pulses.rejected, strays as u64);
    assert!(keeps_count(&rotation, &motion));
}

#[test]
fn times_that_are_no_train_are_refused() {
    let config = RotationConfig {
        sample_rate_hz: RATE,
        total_samples: 1 << 20,
        pulses_per_rev: 1,
    };
    let found = |times: &[f64]| rotation_from_times(times, &config).unwrap_err();
    assert!(matches!(found(&[]), Error::TooFewPulses { found: 0, .. }));
    assert!(matches!(
        found(&[0.1, 0.2, 0.15]),
        Error::TimeOrder { number: 3, .. }
    ));
    assert!(matches!(
        found(&[0.1, f64::NAN]),
        Error::TimeOrder { number: 2, .. }
    ));
    // Outside the recording, of which there are 20.48 s.
    assert!(matches!(
        found(&[50.0, 51.0, 52.0]),
        Error::TooFewPulses { found: 0, .. }
    ));
}
