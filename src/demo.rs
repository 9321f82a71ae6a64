//! Demo recordings with exactly known content.

use crate::failure::{Failure, Status};
use crate::flags::DemoCommand;
use crate::interruption::interruption;
use crate::speech::{ProgressLine, say};
use serde_json::{Value, json};
use shaftwise_report::OutputOptions;
use shaftwise_run::Progress;
use shaftwise_synth::{Recipe, Synth};
use std::path::Path;
use std::sync::atomic::{AtomicBool, Ordering};

/// Name and recipe of every demo.
const DEMOS: [(&str, &str); 3] = [
    ("hunting", include_str!("../demo-runs/recipes/hunting.json")),
    (
        "sick-tach",
        include_str!("../demo-runs/recipes/sick-tach.json"),
    ),
    ("run-up", include_str!("../demo-runs/recipes/run-up.json")),
];

/// Name of every recording written; the folder says which it is.
const WAV: &str = "recording.wav";

pub(crate) fn demo(flags: &DemoCommand) -> Result<(), Failure> {
    let Some(out) = flags.out.as_deref().filter(|_| !flags.list) else {
        return list();
    };
    let stop = interruption()?;
    let mut written = Vec::new();
    match flags.what.as_deref() {
        None => {
            for (name, text) in DEMOS {
                written.push(write(
                    name,
                    &recipe(name, text)?,
                    &out.join(name),
                    flags.quiet,
                    stop,
                )?);
            }
        }
        Some(what) => {
            let (name, recipe) = find(what)?;
            written.push(write(&name, &recipe, out, flags.quiet, stop)?);
        }
    }
    if flags.json {
        let result = json!({
            "command": "demo",
            "version": env!("CARGO_PKG_VERSION"),
            "recording": null,
            "settings": {"what": flags.what},
            "warnings": [],
            "demos": written,
        });
        return say(&shaftwise_report::json_text(&result));
    }
    if flags.quiet {
        return Ok(());
    }
    for demo in &written {
        let text = |key: &str| demo[key].as_str().unwrap_or_default().to_owned();
        say(&format!(
            "{} and {}\n  {}\n",
            text("file"),
            text("run_file"),
            text("description")
        ))?;
    }
    let first = written.first().and_then(|demo| demo["run_file"].as_str());
    say(&format!(
        "next: shaftwise report {}\n",
        first.unwrap_or_default()
    ))
}

/// Name and recipe of a demo, or of a recipe's file.
fn find(what: &str) -> Result<(String, Recipe), Failure> {
    if let Some((name, text)) = DEMOS.iter().find(|(name, _)| *name == what) {
        return Ok(((*name).to_owned(), recipe(name, text)?));
    }
    let path = Path::new(what);
    if !path.exists() && path.extension().is_none() {
        let names = DEMOS.map(|(name, _)| name).join(", ");
        let message =
            format!("there is no demo {what:?}; expected one of {names}, or a recipe's file");
        return Err(Failure::new(Status::Usage, message).hint("shaftwise demo --list"));
    }
    let text = std::fs::read_to_string(path)
        .map_err(|error| Failure::new(Status::Failed, format!("{what}: {error}")))?;
    let name = path
        .file_stem()
        .unwrap_or(path.as_os_str())
        .to_string_lossy();
    Ok((name.into_owned(), recipe(what, &text)?))
}

fn recipe(name: &str, text: &str) -> Result<Recipe, Failure> {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    Recipe::parse(text).map_err(|error| {
        Failure::new(Status::Failed, format!("{name}: {error}"))
            .hint("demo-runs/recipes holds recipes to begin from")
    })
}

fn list() -> Result<(), Failure> {
    let mut lines = String::new();
    for (name, text) in DEMOS {
        let recipe = recipe(name, text)?;
        let (seconds, channels) = (recipe.seconds, recipe.channels.len());
        lines += &format!(
            "{name}: {seconds} s, {channels} channels\n  {}\n",
            recipe.description
        );
    }
    say(&lines)
}

/// Writes a recording and a run file beside it; returns what it wrote.
fn write(
    name: &str,
    recipe: &Recipe,
    out: &Path,
    quiet: bool,
    stop: &AtomicBool,
) -> Result<Value, Failure> {
    let mut synth = Synth::new(recipe)
        .map_err(|error| Failure::new(Status::Failed, format!("{name}: {error}")))?;
    let prepared = shaftwise_report::prepare(&OutputOptions {
        dir: out.to_path_buf(),
        png: false,
        svg: false,
        dpi: 300,
        figures: false,
    })?;
    let (file, run_file) = (out.join(WAV), out.join("run.json"));
    let frames = synth.frames();
    let names: Vec<String> = synth
        .channels()
        .iter()
        .map(|info| info.name.clone())
        .collect();
    let progress = ProgressLine::new(quiet);
    let mut next_block = |wanted: usize, block: &mut [Vec<f64>]| {
        if stop.load(Ordering::Relaxed) {
            // nothing where samples are wanted ends the writing
            return block.iter_mut().for_each(Vec::clear);
        }
        progress.show(Progress {
            stage: "writing the recording",
            share: synth.position() as f64 / frames as f64,
        });
        synth.next_block(wanted, block);
    };
    let done = shaftwise_report::write_wav(
        &file,
        recipe.sample_rate_hz,
        &names,
        frames,
        &mut next_block,
    );
    progress.clear();
    if done.is_err() && stop.load(Ordering::Relaxed) {
        let message = "interrupted; the recording was not written";
        return Err(Failure::new(Status::Interrupted, message));
    }
    done?;
    let text = shaftwise_report::json_text(&run_file_for(recipe));
    prepared.write_text("run.json", &text)?;
    Ok(json!({
        "name": name,
        "description": recipe.description,
        "file": file.to_string_lossy(),
        "run_file": run_file.to_string_lossy(),
        "sample_rate_hz": recipe.sample_rate_hz,
        "seconds": recipe.seconds,
    }))
}

/// A run file that asks everything of a recipe's recording.
fn run_file_for(recipe: &Recipe) -> Value {
    let channels = recipe.channels.iter().enumerate().map(|(index, channel)| {
        json!({
            "number": index + 1,
            "name": channel.name,
            "quantity": channel.quantity,
            "unit": channel.unit,
            "factor": 1,
        })
    });
    let mut run = json!({
        "recordings": [{"file": WAV, "channels": channels.collect::<Vec<_>>()}],
    });
    let mut pulses = recipe.channels.iter().enumerate();
    let tach = pulses.find_map(|(index, channel)| Some((index, channel.pulses.as_ref()?)));
    if let Some((index, pulses)) = tach {
        run["tach"] = json!({"channel": index + 1, "pulses_per_rev": pulses.pulses_per_rev});
    }
    run["analyses"] = ["speed", "spectrum", "synchronous", "compare"]
        .map(|command| json!({"command": command}))
        .into();
    run["machine"] = json!({"description": recipe.description});
    run["conditions"] = json!({"source": "made from a recipe; its content is known exactly"});
    run
}

#[cfg(test)]
mod tests {
    use super::*;
    use shaftwise_run::RunFile;

    #[test]
    fn the_run_file_of_every_demo_is_in_order() {
        for (name, text) in DEMOS {
            let recipe = recipe(name, text).expect("a recipe");
            let run = run_file_for(&recipe).to_string();
            let run = RunFile::parse(&run, name).expect("a run file");
            assert!(run.tach.channel.is_some(), "{name}");
            assert_eq!(run.analyses.len(), 4);
        }
    }
}
