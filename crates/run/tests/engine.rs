//! The engine against recordings with planted content.
#![allow(clippy::unwrap_used, missing_docs)]

mod planted;

use planted::{comparison, db, job, run, sensor, spectrum, synchronous, write};
use shaftwise_run::{
    Analysis, AxisChoice, ChannelPick, ChannelSettings, CompareSettings, Exclusion, Job, ShownAs,
    SpectrumSettings, SpeedSettings, SynchronousSettings, WindowChoice,
};
use shaftwise_synth::{Channel, PulseTrain, Recipe, Speed};

#[test]
fn orders_keep_level_and_phase_while_the_speed_drifts() {
    let dir = tempfile::tempdir().unwrap();
    let mut recipe = Recipe::new(
        12800.0,
        30.0,
        Speed::constant(25.0).with_wobble(1.2, 0.31, 40.0),
    );
    let orders = [
        (1.0, 2.0, 30.0),
        (6.0, 1.0, -100.0),
        (23.0, 0.5, 170.0),
        (4.87, 0.7, 0.0),
        (47.0, 0.1, 5.0),
    ];
    recipe.channels = vec![
        Channel {
            bias: 200.0,
            ..sensor("DE", &orders, &[], 0.0)
        },
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    write(dir.path(), &recipe);
    let settings = SynchronousSettings {
        channel: Some(vec![ChannelPick::Number(1)]),
        ..Default::default()
    };
    let window = SpectrumSettings {
        channel: settings.channel.clone(),
        window: WindowChoice::Kaiser,
        ..Default::default()
    };
    let result = run(&job(
        dir.path(),
        vec![Analysis::Spectrum(window), Analysis::Synchronous(settings)],
    ));
    let channel = &spectrum(&result).channels[0];
    assert_eq!(channel.orders.as_ref().unwrap().len(), 801);
    for (order, amplitude, _) in orders {
        let peak = channel
            .peaks
            .iter()
            .find(|p| (p.order.unwrap() - order).abs() < 0.01)
            .unwrap();
        let error = db(peak.rms * std::f64::consts::SQRT_2 / amplitude);
        assert!(error.abs() < 0.01, "order {order}: {error} dB");
    }
    assert_eq!(channel.peaks.len(), orders.len(), "{:?}", channel.peaks);
    let channel = &synchronous(&result).channels[0];
    for (order, amplitude, phase) in [orders[0], orders[1], orders[2], orders[4]] {
        let k = order as usize;
        // Order 4.87 leaks into the comb by at most 1/(N sin) of it: compare there loosely.
        assert!(
            db(channel.amplitude_peak[k] / amplitude).abs() < 0.05,
            "{order}"
        );
        let miss = (channel.phase_lead_deg[k] - phase + 180.0).rem_euclid(360.0) - 180.0;
        assert!(miss.abs() < 0.5, "order {order}: {miss}°");
    }
}

#[test]
fn any_number_of_threads_gives_the_same_bits() {
    let dir = tempfile::tempdir().unwrap();
    let mut recipe = Recipe::new(
        6400.0,
        40.0,
        Speed::constant(30.0).with_wobble(1.0, 0.5, 0.0),
    );
    recipe.channels = vec![
        sensor(
            "A",
            &[(1.0, 1.0, 0.0), (7.0, 1.0, 0.0)],
            &[(100.0, 0.3)],
            0.2,
        ),
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    write(dir.path(), &recipe);
    let analyses = vec![
        Analysis::Speed(SpeedSettings::default()),
        Analysis::Spectrum(SpectrumSettings::default()),
        Analysis::Spectrum(SpectrumSettings {
            axis: AxisChoice::Hz,
            ..Default::default()
        }),
        Analysis::Spectrum(SpectrumSettings {
            shown_as: Some(ShownAs::Velocity),
            channel: Some(vec![ChannelPick::Number(1)]),
            ..Default::default()
        }),
        Analysis::Synchronous(SynchronousSettings::default()),
        Analysis::Compare(CompareSettings::default()),
    ];
    let mut job = job(dir.path(), analyses);
    job.recording.channels = vec![ChannelSettings {
        unit: Some("m/s2".to_owned()),
        ..Default::default()
    }];
    job.select.exclude = vec![Exclusion {
        from_s: 17.0,
        to_s: 18.2,
        reason: None,
    }];
    let text = |threads: usize| {
        let result = run(&Job {
            threads,
            ..job.clone()
        });
        serde_json::to_string(
            &result
                .analyses
                .iter()
                .map(|o| &o.result)
                .collect::<Vec<_>>(),
        )
        .unwrap()
    };
    let one = text(1);
    for threads in [2, 3, 7] {
        assert!(one == text(threads), "{threads} threads differ from one");
    }
}

#[test]
fn comparison_shows_what_smearing_spread() {
    let dir = tempfile::tempdir().unwrap();
    let mut recipe = Recipe::new(
        6400.0,
        60.0,
        Speed::constant(25.0).with_wobble(0.6, 0.13, 0.0),
    );
    recipe.channels = vec![
        sensor(
            "A",
            &[(1.0, 1.0, 0.0), (12.0, 1.0, 0.0), (40.0, 1.0, 0.0)],
            &[],
            0.05,
        ),
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    write(dir.path(), &recipe);
    let settings = CompareSettings {
        channel: Some(vec![ChannelPick::Number(1)]),
        ..Default::default()
    };
    let result = run(&job(dir.path(), vec![Analysis::Compare(settings)]));
    let compared = comparison(&result);
    assert_eq!(compared.plain_is_good_enough, Some(false));
    let channel = &compared.channels[0];
    println!("{:#?}\n{:?}", channel.peaks, channel.onset);
    for order in [12.0, 40.0] {
        let peak = channel
            .peaks
            .iter()
            .find(|p| (p.order - order).abs() < 0.01)
            .unwrap();
        assert!(db(peak.tracked_rms * std::f64::consts::SQRT_2).abs() < 0.02);
        assert!(peak.loss_db > 3.0);
        assert!(db(peak.smeared_summed_rms / peak.tracked_summed_rms).abs() < 0.2);
        assert!(peak.smeared_width_orders > 2.0 * peak.tracked_width_orders);
    }
}

#[test]
fn velocity_comes_from_acceleration_above_twice_the_corner() {
    let dir = tempfile::tempdir().unwrap();
    let mut recipe = Recipe::new(
        12800.0,
        20.0,
        Speed::constant(24.0).with_wobble(0.5, 0.2, 0.0),
    );
    // One order at a time has a closed form only at steady speed; tones do while it drifts.
    recipe.channels = vec![
        Channel {
            bias: 50.0,
            ..sensor("A", &[], &[(159.2, 10.0), (25.0, 1.0), (900.0, 3.0)], 0.0)
        },
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    write(dir.path(), &recipe);
    let settings = SpectrumSettings {
        channel: Some(vec![ChannelPick::Number(1)]),
        axis: AxisChoice::Hz,
        shown_as: Some(ShownAs::Velocity),
        ..Default::default()
    };
    let mut job = job(dir.path(), vec![Analysis::Spectrum(settings)]);
    job.recording.channels = vec![ChannelSettings {
        unit: Some("m/s2".to_owned()),
        ..Default::default()
    }];
    let result = run(&job);
    let channel = &spectrum(&result).channels[0];
    assert_eq!(channel.channel.unit, "mm/s");
    for (frequency, amplitude) in [(159.2, 10.0), (25.0, 1.0), (900.0, 3.0)] {
        let peak = channel
            .peaks
            .iter()
            .find(|p| (p.frequency_hz.unwrap() - frequency).abs() < 0.2)
            .unwrap();
        let expected = 1000.0 * amplitude
            / (2.0 * std::f64::consts::PI * frequency * std::f64::consts::SQRT_2);
        assert!(
            db(peak.rms / expected).abs() < 0.02,
            "{frequency}: {} dB",
            db(peak.rms / expected)
        );
    }
}
