//! Recordings with planted content, written to a folder, and the way from there to results.
#![allow(clippy::unwrap_used, dead_code, missing_docs, unreachable_pub)]

use shaftwise_recording::{FloatWidth, WavConfig, WavWriter};
use shaftwise_run::{
    Analysis, AnalysisResult, CompareResult, Control, Job, RecordingSettings, RunResult, Selection,
    SpectrumResult, SynchronousResult, TachSettings, execute,
};
use shaftwise_synth::{Channel, Noise, Order, Recipe, Synth, Tone};
use std::path::Path;
use std::sync::atomic::AtomicBool;

/// Writes the recipe's channels as a 64-bit float WAV and its true pulse times beside it.
pub fn write(dir: &Path, recipe: &Recipe) {
    let rendered = Synth::render(recipe).unwrap();
    let file = std::fs::File::create(dir.join("r.wav")).unwrap();
    let config = WavConfig {
        channels: rendered.channels.len(),
        sample_rate_hz: recipe.sample_rate_hz,
        frames: rendered.channels[0].len() as u64,
        width: FloatWidth::F64,
    };
    let mut writer = WavWriter::new(std::io::BufWriter::new(file), &config).unwrap();
    writer.write_planar(&rendered.channels).unwrap();
    writer.finish().unwrap();
    let mut times = String::new();
    for time in rendered
        .truth
        .tachs
        .first()
        .map(|t| t.times_s())
        .unwrap_or_default()
    {
        times.push_str(&format!("{time:.17}\n"));
    }
    std::fs::write(dir.join("times.txt"), times).unwrap();
}

pub fn job(dir: &Path, analyses: Vec<Analysis>) -> Job {
    Job {
        recording: RecordingSettings {
            file: "r.wav".to_owned(),
            ..Default::default()
        },
        tach: TachSettings {
            times: Some("times.txt".to_owned()),
            ..Default::default()
        },
        select: Selection::default(),
        analyses,
        base: dir.to_owned(),
        threads: 2,
    }
}

pub fn run(job: &Job) -> RunResult {
    execute(
        job,
        &Control {
            progress: &|_| {},
            cancel: &AtomicBool::new(false),
        },
    )
    .unwrap()
}

pub fn spectrum(result: &RunResult) -> &SpectrumResult {
    result
        .analyses
        .iter()
        .find_map(|o| {
            if let AnalysisResult::Spectrum(s) = &o.result {
                Some(s)
            } else {
                None
            }
        })
        .unwrap()
}

pub fn synchronous(result: &RunResult) -> &SynchronousResult {
    result
        .analyses
        .iter()
        .find_map(|o| {
            if let AnalysisResult::Synchronous(s) = &o.result {
                Some(s)
            } else {
                None
            }
        })
        .unwrap()
}

pub fn comparison(result: &RunResult) -> &CompareResult {
    result
        .analyses
        .iter()
        .find_map(|o| {
            if let AnalysisResult::Compare(s) = &o.result {
                Some(s)
            } else {
                None
            }
        })
        .unwrap()
}

pub fn sensor(name: &str, orders: &[(f64, f64, f64)], tones: &[(f64, f64)], noise: f64) -> Channel {
    Channel {
        orders: orders
            .iter()
            .map(|(k, a, p)| Order::new(*k, *a, *p))
            .collect(),
        tones: tones.iter().map(|(f, a)| Tone::new(*f, *a, 10.0)).collect(),
        noise: if noise > 0.0 {
            vec![Noise::White { rms: noise }]
        } else {
            Vec::new()
        },
        ..Channel::new(name, "acceleration", "m/s²")
    }
}

pub fn db(ratio: f64) -> f64 {
    20.0 * ratio.log10()
}
