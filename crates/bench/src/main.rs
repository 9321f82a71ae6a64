//! Runs the tool, a plain numpy/scipy script and the floor in turn on one recording, and prints
//! times, ratios and peak memory.
//!
//! cargo run --release --manifest-path crates/bench/Cargo.toml [--bin shaftwise-bench] -- [SECONDS] [CHANNELS] [ROUNDS]
//!
//! The recording (51.2 kHz, 32-bit, hunting speed, a once-per-rev tach) is written to the folder
//! for temporary files first and stays in the page cache. Needs `cargo build --release` of the program
//! and, for the script, python3 with numpy and scipy.

use shaftwise_synth::{Channel, Noise, Order, PulseTrain, Recipe, Speed, Synth};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

/// Wall time and peak resident memory of a command.
fn run(command: &mut Command) -> Option<(f64, f64)> {
    let start = Instant::now();
    let mut child = command
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn()
        .ok()?;
    let status = PathBuf::from(format!("/proc/{}/status", child.id()));
    let mut peak = 0.0f64;
    loop {
        if let Ok(text) = std::fs::read_to_string(&status)
            && let Some(line) = text.lines().find(|l| l.starts_with("VmHWM"))
            && let Some(kib) = line
                .split_whitespace()
                .nth(1)
                .and_then(|k| k.parse::<f64>().ok())
        {
            peak = peak.max(kib / 1024.0);
        }
        match child.try_wait().ok()? {
            Some(exit) => {
                return exit
                    .success()
                    .then(|| (start.elapsed().as_secs_f64(), peak));
            }
            None => std::thread::sleep(Duration::from_millis(2)),
        }
    }
}

fn recipe(seconds: f64, channels: usize) -> Recipe {
    let mut recipe = Recipe::new(
        51_200.0,
        seconds,
        Speed::constant(50.0).with_wobble(1.5, 0.2, 0.0),
    );
    for number in 0..channels {
        recipe.channels.push(Channel {
            orders: vec![
                Order::new(1.0, 1.0, 0.0),
                Order::new(7.0, 0.5, 40.0),
                Order::new(31.0, 0.2, 0.0),
            ],
            noise: vec![Noise::White { rms: 0.3 }],
            ..Channel::new(&format!("sensor {}", number + 1), "acceleration", "m/s²")
        });
    }
    recipe
        .channels
        .push(Channel::tach(PulseTrain::once_per_rev()));
    recipe
}

fn write(path: &Path, recipe: &Recipe) {
    let mut synth = Synth::new(recipe).expect("the recipe is sound");
    let names: Vec<String> = recipe.channels.iter().map(|c| c.name.clone()).collect();
    let frames = synth.frames();
    shaftwise_report::write_wav(
        path,
        recipe.sample_rate_hz,
        &names,
        frames,
        &mut |count, out| {
            synth.next_block(count, out);
        },
    )
    .expect("the recording can be written");
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    values[values.len() / 2]
}

fn main() {
    let args: Vec<String> = std::env::args().collect();
    let number =
        |i: usize, default: f64| args.get(i).and_then(|a| a.parse().ok()).unwrap_or(default);
    let (seconds, channels, rounds) = (
        number(1, 120.0),
        number(2, 4.0) as usize,
        number(3, 5.0) as usize,
    );
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    let wav = std::env::temp_dir().join(format!("shaftwise-bench-{seconds}-{channels}.wav"));
    if !wav.exists() {
        eprintln!("writing {}", wav.display());
        write(&wav, &recipe(seconds, channels));
    }
    let run_file = wav.with_extension("json");
    let job = format!(
        r#"{{"recordings": [{{"file": "{}"}}], "tach": {{"channel": {}}},
            "analyses": [{{"command": "spectrum"}}, {{"command": "synchronous"}}]}}"#,
        wav.file_name().expect("a file").to_string_lossy(),
        channels + 1
    );
    std::fs::write(&run_file, job).expect("the run file can be written");
    let program = here.join("../../target/release/shaftwise");
    let out = std::env::temp_dir().join("shaftwise-bench-out");
    let tool = || {
        let mut command = Command::new(&program);
        command
            .args([
                "report",
                "--no-figures",
                "--threads",
                "2",
                "--quiet",
                "--out",
            ])
            .arg(&out)
            .arg(&run_file);
        command
    };
    let floor = || {
        // Blocks of 16 revolutions at 50 rev/s, half overlapped, at the recording's own rate.
        let blocks = (seconds * 50.0 / 8.0) as usize - 1;
        let mut command = Command::new(here.join("target/release/floor"));
        command
            .arg(&wav)
            .args([channels, 16_384, blocks, 2].map(|n| n.to_string()));
        command
    };
    let plain = || {
        let mut command = Command::new("python3");
        command
            .arg(here.join("plain.py"))
            .arg(&wav)
            .arg((channels + 1).to_string());
        command
    };
    let (mut tools, mut floors, mut plains) = (Vec::new(), Vec::new(), Vec::new());
    let mut memory = [0.0f64; 3];
    for round in 0..=rounds {
        let one = run(&mut tool())
            .unwrap_or_else(|| panic!("{} fails; build it first", program.display()));
        let two = run(&mut floor()).expect("the floor runs");
        // The script takes seconds: three rounds of it are enough.
        let three = if round <= 3 { run(&mut plain()) } else { None };
        // The first round warms the caches.
        if round > 0 {
            tools.push(one.0);
            floors.push(two.0);
            memory[0] = memory[0].max(one.1);
            memory[1] = memory[1].max(two.1);
            if let Some(three) = three {
                plains.push(three.0);
                memory[2] = memory[2].max(three.1);
            }
        }
    }
    let (tool, floor) = (median(tools.clone()), median(floors.clone()));
    let ratio = median(tools.iter().zip(&floors).map(|(a, b)| a / b).collect());
    println!(
        "{channels} channels + tach, {seconds} s at 51.2 kHz, 32-bit; 2 threads; median of {rounds} rounds"
    );
    println!(
        "shaftwise  {tool:8.3} s  {:6.0} MB   {ratio:.1} x the floor",
        memory[0]
    );
    println!("floor      {floor:8.3} s  {:6.0} MB", memory[1]);
    if plains.is_empty() {
        println!(
            "plain script: not run (python3 with numpy and scipy is missing, or memory is short)"
        );
    } else {
        let plain = median(plains);
        println!(
            "plain      {plain:8.3} s  {:6.0} MB   {:.0} x shaftwise",
            memory[2],
            plain / tool
        );
    }
}
