//! The engine as a library: a recording made on the spot, one job, its peaks.
//!
//! cargo run --release --example engine

#![allow(clippy::print_stdout)]

use shaftwise_run::{
    Analysis, AnalysisResult, ChannelPick, Control, Job, RecordingSettings, TachSettings, execute,
};
use shaftwise_synth::{Channel, Noise, Order, PulseTrain, Recipe, Speed, Synth};
use std::error::Error;
use std::sync::atomic::AtomicBool;

/// Writes a recording, averages it by angle and prints what stands out.
pub fn main() -> Result<(), Box<dyn Error>> {
    // A shaft at about 25 rev/s whose speed hunts, an accelerometer and a once-per-revolution tach.
    let mut recipe = Recipe::new(
        6400.0,
        20.0,
        Speed::constant(25.0).with_wobble(0.8, 0.3, 0.0),
    );
    recipe.channels = vec![
        Channel {
            orders: vec![Order::new(1.0, 2.0, 0.0), Order::new(7.0, 1.0, 90.0)],
            noise: vec![Noise::White { rms: 0.1 }],
            ..Channel::new("bearing", "acceleration", "m/s²")
        },
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    let folder = tempfile::tempdir()?;
    let path = folder.path().join("recording.wav");
    let mut synth = Synth::new(&recipe)?;
    let names = ["bearing".to_owned(), "tach".to_owned()];
    shaftwise_report::write_wav(
        &path,
        recipe.sample_rate_hz,
        &names,
        synth.frames(),
        &mut |count, out| {
            synth.next_block(count, out);
        },
    )?;

    let job = Job {
        recording: RecordingSettings {
            file: path.display().to_string(),
            ..Default::default()
        },
        tach: TachSettings {
            channel: Some(ChannelPick::Number(2)),
            ..Default::default()
        },
        select: Default::default(),
        analyses: vec![Analysis::Spectrum(Default::default())],
        base: folder.path().to_owned(),
        threads: 2,
    };
    let result = execute(
        &job,
        &Control {
            progress: &|_| {},
            cancel: &AtomicBool::new(false),
        },
    )?;
    for outcome in &result.analyses {
        if let AnalysisResult::Spectrum(spectrum) = &outcome.result {
            for peak in &spectrum.channels[0].peaks {
                let order = peak.order.unwrap_or(f64::NAN);
                println!(
                    "order {order:.2}: {:.4} m/s² rms, {:.4} to {:.4} at 90 %",
                    peak.rms, peak.lower, peak.upper
                );
            }
        }
    }
    Ok(())
}
