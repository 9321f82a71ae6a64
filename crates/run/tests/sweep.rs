//! The swept cut-off: a pure order or a far tone moves through everything above the highest order while the
//! speed swings by a fifth; how much of it is left at or below the highest order?
#![allow(clippy::unwrap_used, missing_docs)]

mod planted;

use planted::{db, job, run, sensor, spectrum, write};
use shaftwise_run::{Analysis, ChannelPick, SpectrumSettings, WindowChoice};
use shaftwise_synth::{Channel, PulseTrain, Recipe, Speed};

/// Highest line up to order 50 of unit amplitudes at the given orders and frequencies, dB.
fn left_over(orders: &[f64], tones_hz: &[f64], rate: f64) -> f64 {
    let dir = tempfile::tempdir().unwrap();
    let mut recipe = Recipe::new(rate, 12.0, Speed::constant(20.0).with_wobble(4.0, 0.2, 0.0));
    let orders: Vec<_> = orders.iter().map(|o| (*o, 1.0, 0.0)).collect();
    let tones: Vec<_> = tones_hz.iter().map(|t| (*t, 1.0)).collect();
    recipe.channels = vec![
        sensor("A", &orders, &tones, 0.0),
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    write(dir.path(), &recipe);
    let settings = SpectrumSettings {
        window: WindowChoice::Kaiser,
        channel: Some(vec![ChannelPick::Number(1)]),
        ..Default::default()
    };
    let result = run(&job(dir.path(), vec![Analysis::Spectrum(settings)]));
    let highest = spectrum(&result).channels[0]
        .rms
        .iter()
        .copied()
        .fold(0.0, f64::max);
    db(highest * std::f64::consts::SQRT_2)
}

#[test]
fn nothing_folds_back_while_the_speed_swings() {
    println!("beyond the highest order | left at or below it");
    for share in [1.05, 1.1, 1.2, 1.3, 1.4, 1.5, 1.6] {
        let left = left_over(&[50.0 * share], &[], 12_800.0);
        println!("order x {share} | {left:.1} dB");
        assert!(left < -100.0, "{share}: {left:.1} dB");
    }
    // At the highest speed order 50 stands at 1200 Hz; at the lowest these are orders 94 and more.
    for tone in [1500.0, 2200.0, 3700.0, 5300.0, 11_000.0, 23_000.0] {
        let left = left_over(&[], &[tone], 51_200.0);
        println!("{tone} Hz | {left:.1} dB");
        assert!(left < -100.0, "{tone} Hz: {left:.1} dB");
    }
}
