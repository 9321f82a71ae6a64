//! Sweeps over length and channels: throughput must not depend on either.
#![allow(missing_docs)]

use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use shaftwise_run::{
    Analysis, ChannelPick, Control, Job, RecordingSettings, TachSettings, execute,
};
use shaftwise_synth::{Channel, Noise, Order, PulseTrain, Recipe, Speed, Synth};
use std::path::Path;
use std::sync::atomic::AtomicBool;

fn write(path: &Path, seconds: f64, channels: usize) {
    let mut recipe = Recipe::new(
        25_600.0,
        seconds,
        Speed::constant(40.0).with_wobble(1.2, 0.2, 0.0),
    );
    for number in 0..channels {
        recipe.channels.push(Channel {
            orders: vec![Order::new(1.0, 1.0, 0.0), Order::new(7.0, 0.5, 40.0)],
            noise: vec![Noise::White { rms: 0.3 }],
            ..Channel::new(&format!("sensor {}", number + 1), "acceleration", "m/s²")
        });
    }
    recipe
        .channels
        .push(Channel::tach(PulseTrain::once_per_rev()));
    let names: Vec<String> = recipe.channels.iter().map(|c| c.name.clone()).collect();
    let mut synth = Synth::new(&recipe).unwrap();
    let frames = synth.frames();
    shaftwise_report::write_wav(path, 25_600.0, &names, frames, &mut |count, out| {
        synth.next_block(count, out);
    })
    .unwrap();
}

fn sweep(c: &mut Criterion) {
    let dir = tempfile::tempdir().unwrap();
    let mut group = c.benchmark_group("spectrum and synchronous average");
    group.sample_size(10);
    for (seconds, channels) in [(10.0, 1), (20.0, 1), (40.0, 1), (20.0, 4), (20.0, 8)] {
        let path = dir.path().join(format!("{seconds}-{channels}.wav"));
        write(&path, seconds, channels);
        let job = Job {
            recording: RecordingSettings {
                file: path.display().to_string(),
                ..Default::default()
            },
            tach: TachSettings {
                channel: Some(ChannelPick::Number(channels as u32 + 1)),
                ..Default::default()
            },
            select: Default::default(),
            analyses: vec![
                Analysis::Spectrum(Default::default()),
                Analysis::Synchronous(Default::default()),
            ],
            base: "/".into(),
            threads: 2,
        };
        group.throughput(Throughput::Elements(
            (seconds * 25_600.0) as u64 * channels as u64,
        ));
        group.bench_function(
            BenchmarkId::from_parameter(format!("{channels} ch x {seconds} s")),
            |b| {
                b.iter(|| {
                    execute(
                        &job,
                        &Control {
                            progress: &|_| {},
                            cancel: &AtomicBool::new(false),
                        },
                    )
                    .unwrap()
                });
            },
        );
    }
    group.finish();
}

criterion_group!(benches, sweep);
criterion_main!(benches);
