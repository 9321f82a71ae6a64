//! From a job to its results: pass 1, the plan, pass 2, and what the averages say.

use crate::chunk::{PassTwo, Space, Sums};
use crate::outcome::{self, Totals};
use crate::plan::{self, Plan};
use crate::settings::{Analysis, EdgeChoice, RecordingSettings, SpeedSettings, TachSettings};
use crate::spinning::Spinning;
use crate::workers::for_each_in_order;
use crate::{Control, Error, Job, Progress, RecordingFacts, RunResult, pass_one};
use shaftwise_recording::{ChannelSetup, OpenOptions, Quantity, Recording};
use shaftwise_rotation::{
    Edge, RotationConfig, TachConfig, rotation_from_scan, rotation_from_times,
};
use shaftwise_signal::InterpolationPlan;
use std::path::Path;
use std::sync::Arc;

/// Works a job out: one pass for the tach, one for everything else asked for.
///
/// Same bits for any number of threads. Progress is called from this thread; setting the cancel
/// flag ends the run with [`Error::Cancelled`] at the next chunk.
///
/// # Errors
/// What the recording, the tach or a setting does not allow; see [`Error`].
pub fn execute(job: &Job, control: &Control<'_>) -> Result<RunResult, Error> {
    let recording = open(&job.recording, &job.base)?;
    let tach = match &job.tach.channel {
        Some(pick) => Some(plan::channel(&recording, pick)?),
        None => None,
    };
    if tach.is_none() && job.tach.times.is_none() {
        return Err(Error::Setting {
            what: "no tach: orders need to know the shaft's angle".to_owned(),
            hint:
                "name its channel with --tach CH, or a file of pulse times with --tach-times FILE"
                    .to_owned(),
        });
    }
    let rate = recording.sample_rate_hz();
    let times = match &job.tach.times {
        Some(file) => Some(read_times(&job.base.join(file), job.tach.tach_delay_s)?),
        None => None,
    };
    let first = pass_one::read(
        &recording,
        tach.map(|t| (t, tach_config(&job.tach, rate))),
        job.threads,
        control,
    )?;
    let config = RotationConfig {
        sample_rate_hz: rate,
        total_samples: recording.frames(),
        pulses_per_rev: job.tach.pulses_per_rev,
    };
    let mut warnings = recording.warnings().to_vec();
    let rotation = match (&first.scan, &times) {
        (Some(scan), _) => {
            warnings.extend(scan.warnings.iter().cloned());
            rotation_from_scan(scan, &config)?
        }
        (None, times) => rotation_from_times(times.as_deref().unwrap_or_default(), &config)?,
    };
    drop(first.scan);
    let spinning = Spinning::new(Arc::new(rotation), &job.select)?;
    warnings.extend(spinning.rotation.warnings.iter().cloned());

    let plan = plan::plan(&recording, tach, &spinning, &job.analyses)?;
    let totals = pass_two(&recording, &plan, job.threads, control)?;
    let speed = outcome::speed(
        &spinning,
        &job.select.exclude,
        curve_step(&job.analyses, &spinning)?,
    );
    let analyses = outcome::outcomes(&spinning, &plan, job, totals, &speed);
    let mut said = std::collections::HashSet::new();
    warnings.retain(|warning| said.insert(warning.clone()));
    Ok(RunResult {
        recording: RecordingFacts {
            file: recording.name().to_owned(),
            sha256: first.sha256,
            sample_rate_hz: rate,
            seconds: recording.frames() as f64 / rate,
            channel_count: recording.channels().len(),
        },
        speed,
        analyses,
        warnings,
        cpu_level: InterpolationPlan::new().cpu_level(),
    })
}

/// Step of the speed curve in seconds: as asked for, else the default, wider where a very long recording
/// would make the curve a burden.
fn curve_step(analyses: &[Analysis], spinning: &Spinning) -> Result<f64, Error> {
    /// Values in a curve at most: 160 MB in four columns of text.
    const MOST: f64 = 2e6;
    let asked = analyses.iter().find_map(|analysis| match analysis {
        Analysis::Speed(settings) => Some(settings.step),
        _ => None,
    });
    let seconds = spinning.rotation.seconds();
    match asked {
        Some(step) if seconds / step > MOST && step != SpeedSettings::default().step => {
            Err(Error::Setting {
                what: format!(
                    "a step of {step} s over {seconds:.1} s gives more than {MOST:.0} values of speed"
                ),
                hint: format!("--step {:.3} or more", seconds / MOST),
            })
        }
        asked => Ok(asked
            .unwrap_or(SpeedSettings::default().step)
            .max(seconds / MOST)),
    }
}

fn tach_config(tach: &TachSettings, sample_rate_hz: f64) -> TachConfig {
    TachConfig {
        sample_rate_hz,
        pulses_per_rev: tach.pulses_per_rev,
        edge: match tach.edge {
            EdgeChoice::Rising => Edge::Rising,
            EdgeChoice::Falling => Edge::Falling,
        },
        threshold: tach.threshold,
        delay_s: tach.tach_delay_s,
    }
}

fn open(settings: &RecordingSettings, base: &Path) -> Result<Recording, Error> {
    let mut options = OpenOptions {
        sample_rate_hz: settings.sample_rate_hz,
        channels: Vec::new(),
    };
    for (place, channel) in settings.channels.iter().enumerate() {
        let quantity = match &channel.quantity {
            None => None,
            Some(name) => Some(Quantity::from_name(name).ok_or_else(|| Error::Setting {
                what: format!("unknown quantity '{name}'"),
                hint: "acceleration, velocity, displacement, pressure, force, voltage, speed or other".to_owned(),
            })?),
        };
        options.channels.push(ChannelSetup {
            number: channel.number.map_or(place + 1, |n| n as usize),
            name: channel.name.clone(),
            quantity,
            unit: channel.unit.clone(),
            factor: channel.factor,
            mv_per_unit: channel.mv_per_unit,
            range_v: channel.range_v,
        });
    }
    let opened = if settings.file == "-" {
        Recording::from_reader(std::io::stdin().lock(), "-", &options)
    } else {
        Recording::open(&base.join(&settings.file), &options)
    };
    opened.map_err(Error::in_recording(&settings.file))
}

/// Pulse times, one a line, seconds from the first sample.
fn read_times(path: &Path, delay_s: f64) -> Result<Vec<f64>, Error> {
    let file = path.display().to_string();
    let text = std::fs::read_to_string(path).map_err(|source| Error::File {
        file: file.clone(),
        source,
    })?;
    let mut times = Vec::new();
    for (number, line) in text.lines().enumerate() {
        let line = line.trim();
        if line.is_empty() || line.starts_with('#') {
            continue;
        }
        match line.parse::<f64>() {
            Ok(time) if time.is_finite() => times.push(time - delay_s),
            _ => {
                return Err(Error::RunFile {
                    file,
                    line: number + 1,
                    column: 1,
                    what: format!(
                        "found '{}', expected a pulse time in seconds",
                        line.chars().take(40).collect::<String>()
                    ),
                    hint: "one time a line, counted from the first sample".to_owned(),
                });
            }
        }
    }
    Ok(times)
}

fn pass_two(
    recording: &Recording,
    plan: &Plan,
    threads: usize,
    control: &Control<'_>,
) -> Result<Totals, Error> {
    let new_sums = || -> Vec<Vec<Sums>> {
        plan.tracks
            .iter()
            .map(|work| work.consumers.iter().map(Sums::new).collect())
            .collect()
    };
    let mut totals = new_sums();
    let pass = PassTwo::new(recording, &plan.tracks);
    // The threads share the flag only: the progress callback stays on this one.
    let cancel = control.cancel;
    let count = plan.chunks.len();
    for_each_in_order(
        count,
        threads,
        Space::default,
        |chunk, space| pass.work(&plan.chunks[chunk], space, cancel),
        |chunk, sums| {
            for (totals, sums) in totals.iter_mut().zip(sums) {
                for (total, sum) in totals.iter_mut().zip(sums) {
                    total.merge(sum);
                }
            }
            (control.progress)(Progress {
                stage: "averaging",
                share: (chunk + 1) as f64 / count as f64,
            });
            true
        },
    )?;
    Ok(Totals(
        totals
            .into_iter()
            .map(|t| t.into_iter().map(Some).collect())
            .collect(),
    ))
}
