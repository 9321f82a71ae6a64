//! The program end to end, as a user types it.
#![allow(clippy::unwrap_used)]

mod harness;

use harness::{Folder, equal_lists, has};
use serde_json::Value;
use sha2::{Digest, Sha256};
use std::process::Stdio;

const COMMANDS: [&str; 4] = ["speed", "spectrum", "synchronous", "compare"];

// ---- what every command does

#[test]
fn every_command_speaks_in_about_twenty_lines() {
    let folder = Folder::with_recording();
    for command in COMMANDS {
        let outcome = folder.run(&format!("{command} small.wav --tach 3"));
        outcome
            .done()
            .says("small.wav")
            .says("conditions: not stated")
            .says("next");
        let lines = outcome.stdout.lines().count();
        assert!(
            (6..=40).contains(&lines),
            "{lines} lines\n{}",
            outcome.stdout
        );
        assert!(
            outcome
                .stdout
                .lines()
                .all(|line| line.chars().count() <= 120),
            "{}",
            outcome.stdout
        );
    }
}

#[test]
fn every_command_has_the_common_fields() {
    let folder = Folder::with_recording();
    let bytes = std::fs::read(folder.path("small.wav")).unwrap();
    let sum: String = Sha256::digest(&bytes)
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect();
    for command in COMMANDS {
        let json = folder
            .run(&format!("{command} small.wav --tach 3 --json"))
            .json();
        has(&json, "command version recording settings warnings");
        assert_eq!(json["command"], command);
        assert_eq!(json["recording"]["file"], "small.wav");
        assert_eq!(json["recording"]["sha256"], sum.as_str());
        assert_eq!(json["recording"]["sample_rate_hz"], 5120.0);
        assert_eq!(json["recording"]["seconds"], 12.0);
        assert!(json["settings"].get("threads").is_none());
    }
}

#[test]
fn warnings_are_both_in_the_json_and_on_standard_error() {
    let folder = Folder::with_recording();
    let mut bytes = std::fs::read(folder.path("small.wav")).unwrap();
    bytes.truncate(bytes.len() - 1001);
    folder.write("cut.wav", bytes);
    let outcome = folder.run("speed cut.wav --tach 3 --json");
    let json = outcome.json();
    let warnings = json["warnings"].as_array().unwrap();
    assert!(!warnings.is_empty());
    for warning in warnings {
        outcome.warns(warning.as_str().unwrap());
    }
    assert_eq!(
        outcome.stderr.lines().count(),
        warnings.len(),
        "{}",
        outcome.stderr
    );
}

// ---- speed

#[test]
fn speed_finds_the_planted_speed() {
    let json = Folder::with_recording()
        .run("speed small.wav --tach 3 --json")
        .json();
    has(
        &json,
        "pulses ledger speed_rpm angle_sigma_deg highest_trusted_order curve",
    );
    has(&json["pulses"], "timed used inserted rejected");
    let rows = equal_lists(&json["curve"], "time_s revs rpm rpm_sigma");
    assert!(rows > 500, "{rows} rows"); // 12 s in steps of 0.02 s
    // 24.6 rev/s ± 0.6: from 1440 to 1512 rpm, within a pulse of the ends
    let rpm = |key: &str| json["speed_rpm"][key].as_f64().unwrap();
    assert!((rpm("min") - 1440.0).abs() < 1.0, "{}", rpm("min"));
    assert!((rpm("max") - 1512.0).abs() < 1.0, "{}", rpm("max"));
    assert!((rpm("mean") - 1476.0).abs() < 5.0, "{}", rpm("mean"));
}

#[test]
fn the_step_of_the_curve_is_the_one_asked_for() {
    let json = Folder::with_recording()
        .run("speed run.json --tach tach --step 0.5 --json")
        .json();
    let times: Vec<f64> = serde_json::from_value(json["curve"]["time_s"].clone()).unwrap();
    assert!(
        (times[1] - times[0] - 0.5).abs() < 1e-9,
        "{:?}",
        &times[..2]
    );
}

#[test]
fn pulse_times_from_a_file_serve_as_well_as_a_channel() {
    let folder = Folder::with_recording();
    let times: Vec<String> = (0..200)
        .map(|n| format!("{}", 0.5 + f64::from(n) * 0.05))
        .collect();
    folder.write("times.txt", times.join("\n"));
    let json = folder
        .run("speed small.wav --tach-times times.txt --json")
        .json();
    // a pulse each 50 ms is 1200 rpm
    assert!((json["speed_rpm"]["mean"].as_f64().unwrap() - 1200.0).abs() < 1e-6);
    assert_eq!(json["pulses"]["timed"], 200);
}

// ---- spectrum

#[test]
fn spectrum_finds_the_planted_orders() {
    let json = Folder::with_recording()
        .run("spectrum small.wav --tach 3 --max-order 40 --json")
        .json();
    let channels = json["channels"].as_array().unwrap();
    assert_eq!(channels.len(), 2);
    for channel in channels {
        has(
            channel,
            "number name unit averages equivalent_averages peaks overall",
        );
        has(&channel["overall"], "value detector lower upper band_hz");
        equal_lists(channel, "orders rms lower upper");
        for peak in channel["peaks"].as_array().unwrap() {
            has(peak, "order rms lower upper verdict");
        }
    }
    // amplitudes 2, 1.5 and 1 of a peak are these rms, in 0.1 rms of noise over 1600 lines
    for (order, amplitude) in [(1.0, 2.0), (6.0, 1.5), (24.0, 1.0)] {
        let mut peaks = channels[0]["peaks"].as_array().unwrap().iter();
        let near = |peak: &&Value| (peak["order"].as_f64().unwrap() - order).abs() < 0.02;
        let peak = peaks
            .find(near)
            .unwrap_or_else(|| panic!("no peak at {order}"));
        let rms = peak["rms"].as_f64().unwrap();
        let truth = amplitude / 2f64.sqrt();
        assert!(
            (rms / truth - 1.0).abs() < 0.02,
            "order {order}: {rms} for {truth}"
        );
    }
}

#[test]
fn a_plain_spectrum_has_frequencies_in_place_of_orders() {
    let json = Folder::with_recording()
        .run("spectrum small.wav --tach 3 --axis hz --json")
        .json();
    let channel = &json["channels"][0];
    equal_lists(channel, "frequency_hz rms lower upper");
    assert!(channel.get("orders").is_none());
}

#[test]
fn channels_are_picked_by_number_and_by_name() {
    let folder = Folder::with_recording();
    let json = folder
        .run("spectrum small.wav --tach 3 --channel 2 --json")
        .json();
    assert_eq!(json["channels"].as_array().unwrap().len(), 1);
    assert_eq!(json["channels"][0]["number"], 2);
    let words = ["spectrum", "run.json", "--channel", "drive end", "--json"];
    let json = folder.call(&words).json();
    assert_eq!(json["channels"][0]["number"], 1);
    assert_eq!(json["channels"][0]["name"], "drive end");
    folder
        .run("spectrum small.wav --tach 3 --channel 9")
        .fails(1, "9");
    let twice = folder.run("spectrum small.wav --tach 3 --channel 2,2 --json");
    assert_eq!(twice.json()["channels"].as_array().unwrap().len(), 1);
}

#[test]
fn recordings_beside_the_first_are_not_dropped_silently() {
    let folder = Folder::with_recording();
    let one = "\"recordings\": [";
    let two = format!("{one}{{\"file\": \"other.wav\"}}, ");
    folder.change("run.json", one, &two);
    std::fs::copy(folder.path("small.wav"), folder.path("other.wav")).unwrap();
    for command in ["speed", "spectrum", "synchronous", "compare", "report"] {
        folder
            .run(&format!("{command} run.json --no-figures --quiet"))
            .done()
            .warns("run.json names 2 recordings; only the first, other.wav, is analysed");
    }
}

#[test]
fn a_report_asks_for_a_run_file_alone() {
    let folder = Folder::empty();
    for page in ["report -h", "report --help"] {
        let help = folder.run(page);
        help.done().says("report [OPTIONS] <RUN.json>");
        for words in ["RECORDING", "Bare recordings", "standard input"] {
            assert!(!help.stdout.contains(words), "{}", help.stdout);
        }
    }
}

#[test]
fn flags_win_over_the_run_file() {
    let folder = Folder::with_recording();
    let command = "{\"command\": \"spectrum\", \"max_order\": 20, \"window\": \"kaiser\"}";
    let run = "{\"recordings\": [{\"file\": \"small.wav\"}], \"tach\": {\"channel\": 3}, \"analyses\": [COMMAND]}";
    folder.write("two.json", run.replace("COMMAND", command));
    let json = folder.run("spectrum two.json --max-order 10 --json").json();
    assert_eq!(json["settings"]["max_order"], 10.0);
    assert_eq!(json["settings"]["window"], "kaiser");
    let orders = json["channels"][0]["orders"].as_array().unwrap();
    assert!(orders.last().unwrap().as_f64().unwrap() <= 10.01);
}

#[test]
fn a_calibration_scales_the_levels() {
    let folder = Folder::with_recording();
    let line = "spectrum small.wav --tach 3 --channel 1 --json";
    let plain = folder.run(line).json();
    let scaled = folder.run(&format!("{line} --calibration 1=-10")).json();
    let level = |json: &Value| json["channels"][0]["overall"]["value"].as_f64().unwrap();
    assert!((level(&scaled) / level(&plain) - 10.0).abs() < 1e-9);
}

// ---- synchronous, compare

#[test]
fn synchronous_finds_amplitude_and_phase() {
    let json = Folder::with_recording()
        .run("synchronous small.wav --tach 3 --json")
        .json();
    let channel = &json["channels"][0];
    has(
        channel,
        "number name unit revolutions synchronous_fraction noise_reduction_db",
    );
    equal_lists(channel, "angle_deg mean sd");
    equal_lists(
        channel,
        "orders amplitude_peak phase_lead_deg phase_lag_deg",
    );
    // the recipe plants order 1 with amplitude 2 and a lead of 40°
    let amplitude = channel["amplitude_peak"][1].as_f64().unwrap();
    let lead = channel["phase_lead_deg"][1].as_f64().unwrap();
    assert!((amplitude - 2.0).abs() < 0.02, "{amplitude}");
    assert!((lead - 40.0).abs() < 1.0, "{lead}");
}

#[test]
fn compare_shows_what_the_drift_hid() {
    let json = Folder::with_recording()
        .run("compare small.wav --tach 3 --max-order 40 --json")
        .json();
    let channel = &json["channels"][0];
    has(&channel["onset"], "predicted_order seen_order");
    let peaks = channel["peaks"].as_array().unwrap();
    let fields = "order tracked_rms smeared_rms loss_db smeared_at_order tracked_width_orders \
                  smeared_width_orders tracked_summed_rms smeared_summed_rms";
    peaks.iter().for_each(|peak| has(peak, fields));
    let near = |peak: &&Value| (peak["order"].as_f64().unwrap() - 24.0).abs() < 0.05;
    let peak = peaks.iter().find(near).expect("order 24");
    assert!(peak["loss_db"].as_f64().unwrap() > 3.0, "{peak}");
}

// ---- files

#[test]
fn nothing_is_written_without_a_folder() {
    let folder = Folder::with_recording();
    folder.run("spectrum small.wav --tach 3").done();
    assert_eq!(folder.names(""), ["run.json", "small.wav"]);
}

#[test]
fn figures_and_tables_go_into_the_folder_named() {
    let folder = Folder::with_recording();
    for command in COMMANDS {
        folder
            .run(&format!(
                "{command} small.wav --tach 3 --out a/{command} --format png,svg"
            ))
            .done();
        let names = folder.names(&format!("a/{command}"));
        for ending in [".png", ".svg", ".csv", ".json"] {
            assert!(
                names.iter().any(|name| name.ends_with(ending)),
                "{command} {ending}: {names:?}"
            );
        }
        assert!(
            names.iter().all(|name| !name.ends_with(".tmp")),
            "{names:?}"
        );
    }
}

#[test]
fn no_figures_means_none() {
    let folder = Folder::with_recording();
    folder
        .run("spectrum small.wav --tach 3 --out out --no-figures")
        .done();
    assert!(
        folder
            .names("out")
            .iter()
            .all(|name| !name.ends_with(".png"))
    );
}

#[test]
fn a_report_goes_beside_its_run_file() {
    let folder = Folder::with_recording();
    std::fs::create_dir(folder.path("elsewhere")).unwrap();
    let outcome = folder.run("report run.json");
    outcome.done().says("findings.md");
    let names = folder.names("report");
    for name in ["results.json", "findings.md"] {
        assert!(names.iter().any(|found| found == name), "{names:?}");
    }
    assert!(
        names.iter().filter(|name| name.ends_with(".png")).count() >= 4,
        "{names:?}"
    );
    let text = std::fs::read_to_string(folder.path("report/results.json")).unwrap();
    let results: Value = serde_json::from_str(&text).unwrap();
    has(
        &results,
        "command version recording settings warnings cpu_level results",
    );
    let commands = results["results"].as_array().unwrap().iter();
    assert!(
        commands
            .map(|result| &result["command"])
            .eq(COMMANDS.iter())
    );
}

#[test]
fn a_report_prints_as_json_what_it_writes() {
    let folder = Folder::with_recording();
    let printed = folder
        .run("report run.json --out out --no-figures --json")
        .json();
    let text = std::fs::read_to_string(folder.path("out/results.json")).unwrap();
    assert_eq!(printed, serde_json::from_str::<Value>(&text).unwrap());
}

#[test]
fn any_number_of_threads_gives_the_same_bytes() {
    let folder = Folder::with_recording();
    let contents = |threads: usize| {
        let out = format!("out-{threads}");
        folder
            .run(&format!("report run.json --threads {threads} --out {out}"))
            .done();
        let names = folder.names(&out);
        let read = |name: &String| std::fs::read(folder.path(&out).join(name)).unwrap();
        names
            .iter()
            .map(|name| (name.clone(), read(name)))
            .collect::<Vec<_>>()
    };
    let one = contents(1);
    for threads in [2, 3, 7] {
        for (left, right) in one.iter().zip(contents(threads)) {
            assert_eq!(left.0, right.0);
            assert!(
                left.1 == right.1,
                "{} differs with {threads} threads",
                left.0
            );
        }
    }
}

#[test]
fn standard_input_equals_the_file_apart_from_its_name() {
    let folder = Folder::with_recording();
    let bytes = std::fs::read(folder.path("small.wav")).unwrap();
    for command in COMMANDS {
        let mut file = folder
            .run(&format!("{command} small.wav --tach 3 --json"))
            .json();
        let words = [command, "-", "--tach", "3", "--json"];
        let mut pipe = folder.call_with(&words, |_| (), &bytes).json();
        assert_eq!(pipe["recording"]["file"].take(), "-");
        assert_eq!(file["recording"]["file"].take(), "small.wav");
        assert!(file == pipe, "{command}");
    }
}

// ---- demo

#[test]
fn the_demos_are_listed() {
    let outcome = Folder::empty().run("demo --list");
    outcome
        .done()
        .says("hunting")
        .says("sick-tach")
        .says("run-up");
}

#[test]
fn a_demo_comes_with_a_run_file_that_runs() {
    let folder = Folder::empty();
    folder
        .run("demo sick-tach --out here")
        .done()
        .says("next: shaftwise report here/run.json");
    assert_eq!(folder.names("here"), ["recording.wav", "run.json"]);
    let json = folder.run("speed here/run.json --json").json();
    assert!(json["pulses"]["inserted"].as_u64().unwrap() > 0);
    assert!(json["pulses"]["rejected"].as_u64().unwrap() > 0);
    assert!(!json["ledger"].as_array().unwrap().is_empty());
}

#[test]
fn a_demo_can_be_asked_for_as_json() {
    let json = Folder::empty().run("demo run-up --out here --json").json();
    has(&json, "command version recording settings warnings demos");
    assert!(json["recording"].is_null());
    assert_eq!(json["demos"][0]["run_file"], "here/run.json");
}

#[test]
fn an_unknown_demo_is_a_wrong_command_line() {
    Folder::empty()
        .run("demo huntng --out here")
        .fails(2, "hunting, sick-tach, run-up")
        .hints("--list");
    Folder::empty().run("demo").fails(2, "--out");
}

#[test]
fn a_wrong_recipe_is_shown_with_its_place() {
    let folder = Folder::empty();
    folder.write("a.json", "{\n  \"seconds\": 1,\n  \"sedes\": 2\n}");
    folder
        .run("demo a.json --out here")
        .fails(1, "line 3")
        .fails(1, "sedes");
    folder.run("demo b.json --out here").fails(1, "b.json");
    assert_eq!(folder.names(""), ["a.json"]);
}

// ---- help

#[test]
fn help_teaches_by_examples_that_run() {
    let folder = Folder::empty();
    folder.run("demo hunting --out p3").done();
    let mut tried = 0;
    let pages = [
        "",
        "speed",
        "spectrum",
        "synchronous",
        "compare",
        "report",
        "demo",
    ];
    for page in pages {
        let help = folder.run(&format!("{page} --help"));
        help.done();
        for line in help
            .stdout
            .lines()
            .filter_map(|line| line.strip_prefix("  shaftwise "))
        {
            let line = line.split("   ").next().unwrap();
            let words: Vec<String> = quoted_words(line);
            folder
                .call(&words.iter().map(String::as_str).collect::<Vec<_>>())
                .done();
            tried += 1;
        }
    }
    assert!(tried >= 20, "{tried} examples");
}

/// Words as a shell splits them, blanks within double quotes kept.
fn quoted_words(line: &str) -> Vec<String> {
    let mut words = vec![String::new()];
    let mut quoted = false;
    for letter in line.trim_end().chars() {
        match letter {
            '"' => quoted = !quoted,
            ' ' if !quoted => words.push(String::new()),
            _ => words.last_mut().unwrap().push(letter),
        }
    }
    words
}

#[test]
fn short_help_is_shorter_than_long_help_and_only_long_help_cautions() {
    let folder = Folder::empty();
    for page in ["", "speed", "spectrum", "synchronous", "compare", "report"] {
        let short = folder.run(&format!("{page} -h"));
        let long = folder.run(&format!("{page} --help"));
        short.done();
        long.done().says("rotating machinery injures");
        assert!(short.stdout.len() < long.stdout.len());
        assert!(!short.stdout.contains("injures"));
    }
}

#[test]
fn no_colour_is_ever_used() {
    let folder = Folder::with_recording();
    for words in [
        &["--help"][..],
        &["speed", "small.wav", "--tach", "3"],
        &["speed", "--tahc"],
    ] {
        for (key, value) in [("NO_COLOR", "1"), ("CLICOLOR_FORCE", "1")] {
            let setting = |command: &mut std::process::Command| {
                command.env(key, value);
            };
            let outcome = folder.call_with(words, setting, b"");
            assert!(!outcome.stdout.contains('\u{1b}') && !outcome.stderr.contains('\u{1b}'));
        }
    }
}

#[test]
fn progress_is_not_for_pipes() {
    let folder = Folder::with_recording();
    let outcome = folder.run("spectrum small.wav --tach 3");
    assert!(!outcome.done().stderr.contains('%'), "{}", outcome.stderr);
}

#[test]
fn quiet_leaves_warnings_errors_and_json() {
    let folder = Folder::with_recording();
    let outcome = folder.run("spectrum small.wav --tach 3 --quiet --out out");
    assert!(outcome.done().stdout.is_empty());
    folder
        .run("spectrum small.wav --tach 3 --quiet --json")
        .json();
    folder
        .run("spectrum small.wav --tach 9 --quiet")
        .fails(1, "9");
}

#[test]
fn a_reader_that_has_heard_enough_is_no_failure() {
    let folder = Folder::with_recording();
    for words in [
        &["spectrum", "small.wav", "--tach", "3", "--json"][..],
        &["--help"],
    ] {
        let mut child = folder.start(words, |_| ());
        drop(child.stdout.take());
        assert_eq!(child.wait().unwrap().code(), Some(0));
    }
}

#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_behind_standard_output_is_a_failure() {
    let folder = Folder::with_recording();
    let full = std::fs::OpenOptions::new()
        .write(true)
        .open("/dev/full")
        .unwrap();
    let words = ["speed", "small.wav", "--tach", "3"];
    let redirect = |command: &mut std::process::Command| {
        command.stdout(Stdio::from(full.try_clone().unwrap()));
    };
    folder
        .call_with(&words, redirect, b"")
        .fails(1, "standard output: ");
}

#[cfg(unix)]
#[test]
fn an_interrupted_run_leaves_nothing_and_says_so() {
    let folder = Folder::empty();
    let recipe =
        include_str!("recipes/small.json").replace("\"seconds\": 12", "\"seconds\": 40000");
    folder.write("long.json", recipe);
    let child = folder.start(&["demo", "long.json", "--out", "here"], |_| ());
    let begun = || folder.path("here").exists() && !folder.names("here").is_empty();
    while !begun() {
        std::thread::sleep(std::time::Duration::from_millis(5));
    }
    let id = child.id().to_string();
    assert!(
        std::process::Command::new("kill")
            .args(["-INT", &id])
            .status()
            .unwrap()
            .success()
    );
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130));
    assert!(String::from_utf8_lossy(&output.stderr).contains("error: interrupted"));
    assert_eq!(folder.names(""), ["long.json"]);
}

#[cfg(unix)]
#[test]
fn a_report_interrupted_while_it_draws_leaves_nothing() {
    let folder = Folder::with_recording();
    let words = ["report", "run.json", "--dpi", "1200", "--out", "here"];
    let child = folder.start(&words, |_| ());
    // one file is only the trial whether the folder takes any
    let drawing = || folder.path("here").exists() && folder.names("here").len() >= 2;
    while !drawing() {
        std::thread::sleep(std::time::Duration::from_millis(2));
    }
    let id = child.id().to_string();
    let kill = std::process::Command::new("kill")
        .args(["-INT", &id])
        .status();
    assert!(kill.unwrap().success());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130));
    assert!(String::from_utf8_lossy(&output.stderr).contains("error: interrupted"));
    assert_eq!(folder.names(""), ["run.json", "small.wav"]);
}

// ---- the command line is wrong

#[test]
fn values_out_of_range_are_shown_under_the_flags_name() {
    let folder = Folder::with_recording();
    for (line, words) in [
        (
            "spectrum small.wav --tach 3 --max-order 1e9",
            "--max-order is 1000000000; expected a number above 0, to 100000",
        ),
        (
            "spectrum small.wav --tach 3 --max-order -5",
            "--max-order is -5; expected",
        ),
        (
            "spectrum small.wav --tach 3 --max-order NaN",
            "'NaN' for '--max-order <X>': expected a finite number",
        ),
        (
            "spectrum small.wav --tach 3 --max-order inf",
            "expected a finite number",
        ),
        (
            "spectrum small.wav --tach 3 --order-step 0",
            "--order-step is 0; expected a number from 1/65536 to 1",
        ),
        (
            "spectrum small.wav --tach 3 --order-step 1/0",
            "expected a finite number",
        ),
        (
            "spectrum small.wav --tach 3 --overlap 96",
            "--overlap is 96; expected a number from 0 to 95",
        ),
        (
            "spectrum small.wav --tach 3 --averages 0",
            "--averages is 0; expected a whole number, 1 or more",
        ),
        (
            "spectrum small.wav --tach 3 --repeatability 0",
            "--repeatability is 0; expected",
        ),
        (
            "spectrum small.wav --tach 3 --ratio 3/0",
            "--ratio is \"3/0\"; expected",
        ),
        (
            "spectrum small.wav --tach 3 --channel 0",
            "--channel is 0; expected",
        ),
        (
            "synchronous small.wav --tach 3 --averages 1",
            "--averages is 1; expected a whole number, 2 or more",
        ),
        (
            "compare small.wav --tach 3 --window hanning",
            "'hanning' for '--window <WINDOW>'",
        ),
        (
            "speed small.wav --tach 3 --step 0",
            "--step is 0; expected a number, 0.0001 or more",
        ),
        (
            "speed small.wav --tach 3 --step -1",
            "--step is -1; expected a number, 0.0001 or more",
        ),
        ("speed small.wav --tach 0", "--tach is 0; expected"),
        (
            "speed small.wav --tach 3 --pulses-per-rev 0",
            "--pulses-per-rev is 0; expected a whole number from 1 to 4096",
        ),
        (
            "speed small.wav --tach 3 --pulses-per-rev -1",
            "'-1' for '--pulses-per-rev <N>': expected a whole number, 1 to 4096",
        ),
        (
            "spectrum small.wav --tach 3 --averages -1",
            "'-1' for '--averages <N>': expected a whole number, 1 or more",
        ),
        (
            "speed small.wav --tach 3 --edge both",
            "'both' for '--edge <EDGE>'",
        ),
        (
            "speed small.wav --tach 3 --from 5 --to 3",
            "--to is 3; expected a time after the start, 5 s",
        ),
        (
            "speed small.wav --tach 3 --exclude 5:3",
            "the end of --exclude is 3; expected a time after the start, 5 s",
        ),
        (
            "speed small.wav --tach 3 --exclude 5",
            "expected START:END in seconds",
        ),
        (
            "speed small.wav --tach 3 --sample-rate 0",
            "--sample-rate is 0; expected a number above 0",
        ),
        (
            "speed small.wav --tach 3 --calibration 1=0",
            "--calibration is 0; expected a number other than 0",
        ),
        (
            "speed small.wav --tach 3 --threads 0",
            "'0' for '--threads <N>'",
        ),
        ("speed small.wav --tach 3 --dpi 9", "'9' for '--dpi <N>'"),
        (
            "speed small.wav --tach 3 --tach-times a.txt",
            "cannot be used with",
        ),
        (
            "speed small.wav --tach 3 --frobnicate",
            "unexpected argument '--frobnicate'",
        ),
        ("survey small.wav", "unrecognized subcommand 'survey'"),
        ("speed", "required"),
    ] {
        folder.run(line).fails(2, words);
    }
}

#[test]
fn no_words_at_all_show_the_help() {
    let outcome = Folder::empty().run("");
    assert!(
        outcome.exits(2).stderr.contains("Examples"),
        "{}",
        outcome.stderr
    );
}

#[test]
fn a_misspelt_flag_leads_to_the_right_one() {
    Folder::empty()
        .run("spectrum a.wav --max-oder 3")
        .fails(2, "--max-oder")
        .hints("--max-order");
}

// ---- the data or the run file does not allow it

#[test]
fn a_tach_is_never_guessed() {
    let folder = Folder::with_recording();
    for command in COMMANDS {
        folder
            .run(&format!("{command} small.wav"))
            .fails(1, "no tach")
            .hints("--tach CH");
    }
    folder.change(
        "run.json",
        "\"tach\": {",
        "\"conditions\": {}, \"machine\": {",
    );
    folder.write("bare.json", "{\"recordings\": [{\"file\": \"small.wav\"}]}");
    folder
        .run("speed bare.json")
        .fails(1, "no tach")
        .hints("\"tach\": {\"channel\": N}");
}

#[test]
fn a_fault_in_a_run_file_is_shown_with_its_place() {
    let folder = Folder::with_recording();
    folder.write(
        "a.json",
        "{\n  \"recordings\": [{\"file\": \"small.wav\"}],\n\t\"tahc\": {}\n}",
    );
    folder
        .run("report a.json")
        .fails(1, "a.json:3:2: unknown key `tahc`")
        .hints("did you mean `tach`?");
    folder.write("b.json", "{\n  \"recordings\": [\n}");
    folder
        .run("spectrum b.json")
        .fails(1, "b.json:3:1: found `}`");
    folder.write(
        "c.json",
        "{\"recordings\": [{\"file\": \"small.wav\"}],\r\n \"tach\": {\"pulses_per_rev\": 0}}",
    );
    folder.run("speed c.json --pulses-per-rev 2").fails(
        1,
        "c.json:2:29: `pulses_per_rev` is 0; expected a whole number from 1 to 4096",
    );
    folder.write("empty.json", "");
    folder
        .run("speed empty.json")
        .fails(1, "empty.json:1:1: the file is empty");
}

#[test]
fn a_run_file_is_told_by_its_content_too() {
    let folder = Folder::with_recording();
    std::fs::rename(folder.path("run.json"), folder.path("p3")).unwrap();
    folder.run("speed p3").done();
}

#[test]
fn a_report_of_nothing_is_refused() {
    let folder = Folder::with_recording();
    folder.write(
        "a.json",
        "{\"recordings\": [{\"file\": \"small.wav\"}], \"tach\": {\"channel\": 3}}",
    );
    folder
        .run("report a.json")
        .fails(1, "asks for nothing")
        .hints("analyses");
    folder
        .run("report small.wav --tach 3")
        .fails(1, "needs a run file");
    assert_eq!(folder.names(""), ["a.json", "run.json", "small.wav"]);
}

#[test]
fn files_that_are_no_recordings_are_refused() {
    let folder = Folder::with_recording();
    let whole = std::fs::read(folder.path("small.wav")).unwrap();
    folder.write("empty.wav", "");
    folder.write(
        "text.wav",
        "Dear Sir, enclosed please find the recording of pump P-3.\n",
    );
    folder.write(
        "clothes.wav",
        "RIFF, that is all there is of a WAV in this file\n",
    );
    folder.write("cut.wav", &whole[..30]);
    folder.write("head.wav", &whole[..60]);
    for name in [
        "empty.wav",
        "text.wav",
        "clothes.wav",
        "cut.wav",
        "head.wav",
        "missing.wav",
        ".",
    ] {
        let outcome = folder.run(&format!("spectrum {name} --tach 1 --out out"));
        outcome.fails(1, name);
    }
    assert!(!folder.path("out").exists());
}

#[test]
fn a_tach_that_says_nothing_is_refused() {
    let folder = Folder::empty();
    let table = |tach: fn(usize) -> f64| -> String {
        (0..5000)
            .map(|n| format!("{},{}\n", (n as f64 * 0.3).sin(), tach(n)))
            .collect()
    };
    folder.write("flat.csv", table(|_| 2.5));
    folder.write(
        "three.csv",
        table(|n| f64::from(n > 100 && n / 50 % 20 == 0) * 5.0),
    );
    folder
        .run("speed flat.csv --sample-rate 1000 --tach 2")
        .fails(1, "pulses")
        .hints("--threshold");
    folder
        .run("speed three.csv --sample-rate 1000 --tach 2")
        .exits(1);
}

#[test]
fn an_output_folder_that_is_a_file_is_noticed_before_the_work() {
    let folder = Folder::with_recording();
    folder.write("out", "mine");
    folder
        .run("spectrum missing.wav --tach 3 --out out")
        .fails(1, "out: found a file")
        .hints("--out DIR");
    folder
        .run("report run.json --out out/deeper")
        .fails(1, "found a file");
    folder
        .run("demo hunting --out out")
        .fails(1, "found a file");
    assert_eq!(std::fs::read(folder.path("out")).unwrap(), b"mine");
}

#[test]
fn orders_beyond_the_sample_rate_are_refused_with_the_numbers() {
    let folder = Folder::with_recording();
    // 5120 Hz and 25.2 rev/s carry orders up to about 100
    let outcome = folder.run("spectrum small.wav --tach 3 --max-order 500");
    outcome.fails(1, "500");
}

#[test]
fn a_stretch_without_pulses_is_refused() {
    let folder = Folder::with_recording();
    folder
        .run("spectrum small.wav --tach 3 --from 100 --to 200")
        .exits(1);
    folder
        .run("spectrum small.wav --tach 3 --exclude 0:12")
        .exits(1);
}

#[test]
fn two_hundred_channels_are_no_trouble() {
    let folder = Folder::empty();
    let row = |n: usize| {
        // 10 rev/s: the tach is high for 20 of 100 samples
        let tach = if n % 100 < 20 { "5" } else { "0" };
        format!("{}{tach}\n", "0.5,".repeat(199))
    };
    folder.write("many.csv", (0..5000).map(row).collect::<String>());
    let json = folder.run("speed many.csv --sample-rate 1000 --tach 200 --json");
    let mean = json.json()["speed_rpm"]["mean"].as_f64().unwrap();
    assert!((mean - 600.0).abs() < 1e-6, "{mean}");
    folder
        .run("speed many.csv --sample-rate 1000 --tach 201")
        .fails(1, "201");
}

#[test]
fn samples_that_are_no_numbers_are_shown_with_their_place() {
    let folder = Folder::empty();
    let row = |n: usize| {
        let value = if n == 2000 { "nan" } else { "0.25" };
        let tach = if n % 100 < 20 { 5 } else { 0 };
        format!("{value},{tach}\n")
    };
    folder.write("gap.csv", (0..5000).map(row).collect::<String>());
    folder
        .run("spectrum gap.csv --sample-rate 1000 --tach 2")
        .fails(1, "gap.csv: line 2001, column 1: found \"nan\"");
}

#[test]
fn pulse_times_that_are_none_are_shown_with_their_line() {
    let folder = Folder::with_recording();
    folder.write("times.txt", "0.1\n0.2\nsoon\n");
    folder
        .run("speed small.wav --tach-times times.txt")
        .fails(1, "times.txt:3:1");
    folder
        .run("speed small.wav --tach-times none.txt")
        .fails(1, "none.txt");
}
