//! What is said: JSON fields, summaries, the page of findings, and their caveats.
#![allow(clippy::unwrap_used, missing_docs)]

#[allow(dead_code, unreachable_pub)]
mod fixture;

use std::path::PathBuf;

use serde_json::Value;
use shaftwise_report::{
    Context, OutputOptions, command_json, json_text, prepare, report_json, report_summary, summary,
};
use shaftwise_run::{AnalysisResult, AxisChoice, Detector, PeakVerdict, RunResult};

fn findings(run: &RunResult, context: &Context) -> String {
    let dir = tempfile::tempdir().unwrap();
    let prepared = prepare(&OutputOptions {
        dir: dir.path().to_owned(),
        png: false,
        svg: true,
        dpi: 300,
        figures: true,
    })
    .unwrap();
    prepared.write_report(run, context).unwrap();
    std::fs::read_to_string(dir.path().join("findings.md")).unwrap()
}

/// The same text in one line, so that words are found across its breaks.
fn flat(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

fn holds(object: &Value, fields: &[&str]) {
    for field in fields {
        assert!(
            object.get(field).is_some(),
            "{field} is missing in {object:.300}"
        );
    }
}

#[test]
fn json_holds_the_fixed_fields_of_every_command() {
    let run = fixture::full_run();
    let json: Vec<Value> = (0..4).map(|i| command_json(&run, i, "0.1.0")).collect();
    for object in &json {
        holds(
            object,
            &["command", "version", "recording", "settings", "warnings"],
        );
        holds(
            &object["recording"],
            &["file", "sha256", "sample_rate_hz", "seconds"],
        );
    }
    holds(
        &json[0],
        &[
            "pulses",
            "ledger",
            "speed_rpm",
            "angle_sigma_deg",
            "highest_trusted_order",
            "curve",
        ],
    );
    holds(
        &json[0]["pulses"],
        &["timed", "used", "inserted", "rejected"],
    );
    holds(&json[0]["ledger"][0], &["time_s", "action", "reason"]);
    holds(&json[0]["speed_rpm"], &["min", "mean", "max"]);
    holds(&json[0]["curve"], &["time_s", "revs", "rpm", "rpm_sigma"]);

    let channel = &json[1]["channels"][1];
    holds(
        channel,
        &[
            "number",
            "name",
            "unit",
            "orders",
            "rms",
            "lower",
            "upper",
            "averages",
            "equivalent_averages",
            "peaks",
            "overall",
        ],
    );
    holds(
        &channel["peaks"][0],
        &["order", "rms", "lower", "upper", "verdict"],
    );
    holds(
        &channel["overall"],
        &["value", "detector", "lower", "upper", "band_hz"],
    );
    assert_eq!(channel["peaks"][3]["verdict"], "wanders");
    assert_eq!(json[1]["warnings"].as_array().unwrap().len(), 2);

    holds(
        &json[2]["channels"][0],
        &[
            "revolutions",
            "angle_deg",
            "mean",
            "sd",
            "orders",
            "amplitude_peak",
            "phase_lead_deg",
            "phase_lag_deg",
            "synchronous_fraction",
            "noise_reduction_db",
        ],
    );
    let compared = &json[3]["channels"][0];
    holds(
        &compared["peaks"][0],
        &[
            "order",
            "tracked_rms",
            "smeared_rms",
            "loss_db",
            "smeared_at_order",
            "tracked_width_orders",
            "smeared_width_orders",
            "tracked_summed_rms",
            "smeared_summed_rms",
        ],
    );
    holds(&compared["onset"], &["predicted_order", "seen_order"]);

    let report = report_json(&run, &fixture::context());
    holds(
        &report,
        &[
            "command",
            "version",
            "recording",
            "settings",
            "warnings",
            "cpu_level",
        ],
    );
    let commands: Vec<&Value> = report["results"]
        .as_array()
        .unwrap()
        .iter()
        .map(|r| &r["command"])
        .collect();
    assert_eq!(commands, ["speed", "spectrum", "synchronous", "compare"]);
    for (alone, within) in json.iter().zip(report["results"].as_array().unwrap()) {
        assert_eq!(alone.get("channels"), within.get("channels"));
        assert_eq!(alone["settings"], within["settings"]);
    }
}

#[test]
fn json_text_says_the_same_in_more_lines() {
    let json = report_json(&fixture::full_run(), &fixture::context());
    let text = json_text(&json);
    assert!(text.ends_with("}\n"));
    // Compared as text: reading a number back may cost its last bit.
    let solid = |text: &str| text.split_whitespace().collect::<String>();
    assert_eq!(solid(&text), solid(&json.to_string()));
    let odd = serde_json::json!({"a \"b\"\n": [], "c": {}, "d": [[1.5, null], {"e": [{}]}]});
    assert_eq!(
        serde_json::from_str::<Value>(&json_text(&odd)).unwrap(),
        odd
    );
}

/// Everything that may be missing is missing.
fn hollow_run() -> RunResult {
    let mut run = fixture::full_run();
    let hollow_speed = |speed: &mut shaftwise_run::SpeedResult| {
        speed.ledger.clear();
        speed.sections_s.clear();
        speed.selected_s.clear();
        speed.curve = Default::default();
        speed.edge_width_deg = f64::NAN;
        speed.pulse_width_deg = f64::NAN;
        speed.highest_trusted_order = f64::NAN;
        speed.angle_sigma_deg = f64::NAN;
        speed.phase_reference = "none".to_owned();
    };
    hollow_speed(&mut run.speed);
    for outcome in &mut run.analyses {
        match &mut outcome.result {
            AnalysisResult::Speed(speed) => hollow_speed(speed),
            AnalysisResult::Spectrum(r) => {
                r.channels[0].lower.fill(f64::NAN);
                r.channels[0].upper.fill(f64::NAN);
                r.channels[0].rms.fill(f64::NAN);
                r.channels[0].peaks.clear();
                r.channels[1].peaks[0].lower = f64::NAN;
                r.channels[1].overall.value = f64::NAN;
                let c = &mut r.channels[2];
                c.orders = Some(Vec::new());
                for values in [&mut c.rms, &mut c.lower, &mut c.upper] {
                    values.clear();
                }
            }
            AnalysisResult::Synchronous(r) => {
                r.channels[0].mean.fill(f64::NAN);
                r.channels[0].sd_of_mean.fill(f64::NAN);
                r.channels[1].convergence = shaftwise_run::ConvergenceResult {
                    revolutions: Vec::new(),
                    seen_db: Vec::new(),
                    law_db: Vec::new(),
                };
                let c = &mut r.channels[2];
                for values in [
                    &mut c.angle_deg,
                    &mut c.mean,
                    &mut c.sd,
                    &mut c.sd_of_mean,
                    &mut c.orders,
                    &mut c.amplitude_peak,
                    &mut c.phase_lag_deg,
                    &mut c.phase_lead_deg,
                ] {
                    values.clear();
                }
            }
            AnalysisResult::Compare(r) => {
                r.channels[0].peaks.clear();
                r.channels[0].onset.predicted_order = None;
                for peak in &mut r.channels[1].peaks {
                    peak.loss_db = f64::NAN;
                    peak.smeared_width_orders = f64::NAN;
                }
                r.plain_is_good_enough = Some(true);
            }
        }
    }
    run
}

#[test]
fn what_could_not_be_worked_out_is_null_and_a_hyphen() {
    let run = hollow_run();
    let json = command_json(&run, 1, "0.1.0");
    assert_eq!(json["channels"][1]["peaks"][0]["lower"], Value::Null);
    assert_eq!(json["channels"][0]["rms"][5], Value::Null);
    for index in 0..4 {
        let text = summary(&run, index, &fixture::bare_context());
        assert!(!text.contains("NaN") && !text.contains("inf "), "{text}");
    }
    let page = findings(&run, &fixture::bare_context());
    assert!(!page.contains("NaN"), "{page}");
    assert!(page.contains("conditions: not stated"), "{page}");
}

#[test]
fn a_summary_says_what_was_read_found_and_what_limits_it() {
    let run = fixture::full_run();
    let text = flat(&summary(&run, 1, &fixture::bare_context()));
    for words in [
        "p3-hunting.wav: 120.0 s, 4 channels at 51200 Hz",
        "conditions: not stated",
        "1447–1507 rpm",
        "112 inserted, 66 rejected, 22 moved",
        "m/s² rms",
        "highest trusted order 44.5",
        "352 averages (333.4 equivalent)",
        "no limit supplied",
        "nothing here clears the machine to run",
        "calibration and mounting not included",
        "replaces neither it nor the maker's limits nor local codes",
        "next shaftwise compare p3-hunting.wav --tach 4",
    ] {
        assert!(text.contains(words), "{words} is missing in\n{text}");
    }
    let average = flat(&summary(&run, 2, &fixture::context()));
    for words in [
        "may be mechanical, hydraulic or synchronous electrical",
        "lag of acceleration, deg",
        "phase lag, 0–360°",
    ] {
        assert!(average.contains(words), "{words} is missing in\n{average}");
    }
    let compare = summary(&run, 3, &fixture::context());
    assert!(
        compare.contains("Plain averaging is not good enough"),
        "{compare}"
    );
    for index in 0..4 {
        let text = summary(&run, index, &fixture::context());
        assert!(text.lines().count() <= 32, "{text}");
        assert!(
            text.lines().all(|line| line.chars().count() <= 120),
            "{text}"
        );
        assert!(!text.contains('\u{1b}'));
    }
}

#[test]
fn one_channel_is_told_in_about_twenty_lines() {
    let mut run = fixture::full_run();
    for outcome in &mut run.analyses {
        match &mut outcome.result {
            AnalysisResult::Speed(_) => {}
            AnalysisResult::Spectrum(r) => r.channels.truncate(1),
            AnalysisResult::Synchronous(r) => r.channels.truncate(1),
            AnalysisResult::Compare(r) => r.channels.truncate(1),
        }
    }
    for index in 0..4 {
        let text = summary(&run, index, &fixture::context());
        let lines = text.lines().count();
        assert!((12..=32).contains(&lines), "{lines} lines:\n{text}");
    }
    let text = flat(&summary(&run, 1, &fixture::context()));
    assert!(text.contains("(and 21 lower peaks)"), "{text}");
    assert!(text.contains("more averages will not help"), "{text}");
}

#[test]
fn forty_channels_do_not_flood_the_terminal() {
    let mut run = fixture::full_run();
    let AnalysisResult::Spectrum(spectrum) = &mut run.analyses[1].result else {
        panic!("spectrum is the second");
    };
    let channel = spectrum.channels[1].clone();
    spectrum.channels = vec![channel; 40];
    let text = summary(&run, 1, &fixture::context());
    assert!(text.contains("and 34 channels"), "{text}");
    assert!(text.lines().count() < 45, "{text}");
}

#[test]
fn the_page_opens_with_cautions_and_ends_with_the_line_to_run_it_again() {
    let mut run = fixture::full_run();
    let mut context = fixture::context();
    context.command_line = "shaftwise report 'a `b`.json'".to_owned();
    if let AnalysisResult::Spectrum(r) = &mut run.analyses[1].result {
        r.channels[0].channel.name = "DE | *hot* <b>\u{1b}[2J".to_owned();
    }
    let page = findings(&run, &context);
    let place = |words: &str| {
        page.find(words)
            .unwrap_or_else(|| panic!("{words} is missing in\n{page}"))
    };
    let order = [
        "# Findings: Pump P-3, Lindmoor water works",
        "## Cautions",
        "Rotating machinery injures. Guards, lock-out, safe distance and the maker's speed limits come first.",
        "It does not replace it, nor local codes.",
        "nothing here clears the machine to run",
        "## What was measured",
        "| conditions: flow",
        "## In short",
        "## 2. Order spectrum",
        "wanders, 2.7 dB seen",
        "## 4. Smeared against tracked",
        "## Ledger of the pulses",
        "The first 20 of 200 entries",
        "## Settings, as done",
        "## Warnings",
        "2. spectrum: channel 3: 12 samples at full scale",
        "## Files of this report",
        "## To run it again",
        "```\nshaftwise report 'a `b`.json'\n```",
    ];
    assert!(order.map(place).is_sorted(), "{:?}", order.map(place));
    assert!(page.contains(r"DE \| \*hot\* \<b\> \[2J"), "{page}");
    assert!(
        !page.contains('\u{1b}') && !page.contains("\n\n\n"),
        "{page}"
    );
}

#[test]
fn a_report_is_summed_up_with_where_to_read_on() {
    let run = fixture::full_run();
    let written = ["out/speed.png", "out/results.json", "out/findings.md"].map(PathBuf::from);
    let text = report_summary(&run, &written, &fixture::context());
    for words in [
        "flow 310 m³/h",
        "3 files in out",
        "read out/findings.md",
        "2 warnings, listed in findings.md",
        "no limit supplied",
    ] {
        assert!(text.contains(words), "{words} is missing in\n{text}");
    }
}

#[test]
fn people_are_shown_the_detector_and_json_stays_rms() {
    let mut run = fixture::full_run();
    let before = command_json(&run, 1, "0.1.0");
    let AnalysisResult::Spectrum(r) = &mut run.analyses[1].result else {
        panic!("spectrum is the second");
    };
    r.channels.truncate(1);
    let rms = r.channels[0].peaks[0].rms;
    r.channels[0].detector = Detector::PeakToPeak;
    let text = flat(&summary(&run, 1, &fixture::context()));
    let shown = format!("{:.2} m/s² peak-to-peak", rms * 8f64.sqrt());
    assert!(text.contains(&shown), "{shown} is missing in\n{text}");
    let after = command_json(&run, 1, "0.1.0");
    assert_eq!(after["channels"][0]["rms"], before["channels"][0]["rms"]);
    assert_eq!(
        after["channels"][0]["peaks"],
        before["channels"][0]["peaks"]
    );
}

#[test]
fn a_plain_spectrum_speaks_of_hertz() {
    let mut run = fixture::full_run();
    let AnalysisResult::Spectrum(r) = &mut run.analyses[1].result else {
        panic!("spectrum is the second");
    };
    r.axis = AxisChoice::Hz;
    r.density = true;
    for channel in &mut r.channels {
        let hz = |orders: &[f64]| orders.iter().map(|k| 24.64 * k).collect();
        channel.frequency_hz = channel.orders.take().as_deref().map(hz);
        for peak in &mut channel.peaks {
            peak.frequency_hz = peak.order.take().map(|k| 24.64 * k);
        }
    }
    let text = flat(&summary(&run, 1, &fixture::context()));
    assert!(
        text.contains("the highest 123.2 Hz at 2.40 m/s² rms/√Hz"),
        "{text}"
    );
    assert!(text.contains("lines 1.54 Hz apart"), "{text}");
    let page = findings(&run, &fixture::context());
    assert!(page.contains("## 2. Plain spectrum"), "{page}");
    assert!(
        !command_json(&run, 1, "0")["channels"][0]["peaks"][0]
            .as_object()
            .unwrap()
            .contains_key("order")
    );
}

#[test]
fn verdicts_are_counted_in_words() {
    let mut run = fixture::full_run();
    let AnalysisResult::Spectrum(r) = &mut run.analyses[1].result else {
        panic!("spectrum is the second");
    };
    r.channels.truncate(1);
    r.channels[0].peaks.truncate(1);
    r.channels[0].peaks[0].verdict = PeakVerdict::MoreAverages;
    r.channels[0].peaks[0].averages_needed = Some(704);
    let text = flat(&summary(&run, 1, &fixture::context()));
    // Twice the averages, twice the 104.9 s.
    assert!(
        text.contains("1 needs more averages. 704 averages would do"),
        "{text}"
    );
    assert!(text.contains("about 210 s like this"), "{text}");
}

#[test]
fn phases_without_a_pulse_are_held_back_from_comparison() {
    let mut run = fixture::full_run();
    run.speed.phase_reference = "arbitrary".to_owned();
    let text = summary(&run, 2, &fixture::context());
    assert!(
        text.contains("not to be compared with other recordings"),
        "{text}"
    );
}
