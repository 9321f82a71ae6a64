//! From the tach's samples to the spectrum: how clean is a pure order?
#![allow(clippy::unwrap_used, missing_docs)]

mod planted;

use planted::{db, job, run, sensor, spectrum, write};
use shaftwise_run::{Analysis, ChannelPick, SpectrumSettings, TachSettings, WindowChoice};
use shaftwise_synth::{Channel, Edge, PulseTrain, Recipe, Speed, Width};

/// Highest line outside ± 0.1 order of a pure order `k`, relative to it, dB: blocks of 64
/// revolutions, Kaiser's window with β 18, angle from the tach channel.
fn beside(order: f64, speed: Speed, rate: f64, tach: PulseTrain) -> f64 {
    let dir = tempfile::tempdir().unwrap();
    let mut recipe = Recipe::new(rate, 14.0, speed);
    recipe.channels = vec![
        sensor("A", &[(order, 1.0, 20.0)], &[], 0.0),
        Channel::tach(tach),
    ];
    write(dir.path(), &recipe);
    let settings = SpectrumSettings {
        channel: Some(vec![ChannelPick::Number(1)]),
        order_step: 1.0 / 64.0,
        window: WindowChoice::Kaiser,
        max_order: Some(60.0),
        ..Default::default()
    };
    let mut job = job(dir.path(), vec![Analysis::Spectrum(settings)]);
    job.tach = TachSettings {
        channel: Some(ChannelPick::Number(2)),
        ..Default::default()
    };
    let result = run(&job);
    let channel = &spectrum(&result).channels[0];
    let worst = channel
        .orders
        .as_ref()
        .unwrap()
        .iter()
        .zip(&channel.rms)
        .filter(|(o, _)| (*o - order).abs() > 0.1)
        .map(|(_, rms)| *rms)
        .fold(0.0, f64::max);
    db(worst * std::f64::consts::SQRT_2)
}

#[test]
fn nothing_stands_beside_a_pure_order() {
    println!("order | edges | highest other line | allowed");
    for (edge, name) in [
        (Edge::Seconds(60e-6), "60 µs"),
        (Edge::Degrees(1.5), "1.5°"),
    ] {
        for order in [1.0, 7.0, 23.0, 47.3] {
            let speed = Speed::constant(50.0)
                .with_wobble(9.0, 0.11, 0.0)
                .with_wobble(2.0, 0.43, 70.0);
            let tach = PulseTrain {
                edge,
                width: Width::Degrees(36.0),
                ..PulseTrain::once_per_rev()
            };
            let worst = beside(order, speed, 51_200.0, tach);
            let allowed = -115.0 + db(order);
            println!("{order} | {name} | {worst:.1} dB | {allowed:.1} dB");
            assert!(
                worst <= allowed,
                "order {order}, edges of {name}: {worst:.1} dB"
            );
        }
    }
}
