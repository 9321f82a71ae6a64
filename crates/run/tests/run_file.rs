//! Run files read from text: what is right is read as it stands, what is wrong is shown where it
//! stands.
#![allow(clippy::unwrap_used)]

use proptest::prelude::*;
use shaftwise_run::{Analysis, ChannelPick, EdgeChoice, Error, RunFile, WindowChoice, schema_json};
use std::collections::BTreeSet;

/// Every key of a run file once, each on a line of its own. The names are in use, so is the µ.
const WHOLE: &str = r#"{
  "recordings": [
    {
      "file": "pump-p3-µ.wav",
      "sample_rate_hz": 51200,
      "channels": [
        {
          "number": 1,
          "name": "drive end, größe",
          "quantity": "acceleration",
          "unit": "m/s2",
          "factor": -98.1
        },
        {
          "number": 4,
          "mv_per_unit": 10.2,
          "range_v": 5
        }
      ]
    }
  ],
  "tach": {
    "channel": 4,
    "pulses_per_rev": 2,
    "edge": "falling",
    "threshold": 1.25,
    "tach_delay_s": 1e-6
  },
  "select": {
    "from_s": 2,
    "to_s": 30,
    "exclude": [
      {
        "from_s": 5,
        "to_s": 6.5,
        "reason": "valve moved"
      }
    ]
  },
  "analyses": [
    {
      "command": "speed",
      "step": 0.05
    },
    {
      "command": "spectrum",
      "channel": [1, "drive end"],
      "max_order": 40,
      "order_step": 0.125,
      "window": "flat-top",
      "overlap": 75,
      "averages": 20,
      "averaging": "peak-hold",
      "detector": "peak",
      "axis": "hz",
      "density": true,
      "as": "velocity",
      "repeatability": 0.5,
      "ratio": "23/57"
    },
    {
      "command": "synchronous",
      "channel": [1],
      "max_order": 30,
      "averages": 64,
      "as": "displacement",
      "ratio": "3"
    },
    {
      "command": "compare",
      "channel": [1],
      "max_order": 20,
      "order_step": 0.0625,
      "window": "hann",
      "overlap": 50,
      "averages": 10,
      "detector": "rms",
      "as": "acceleration",
      "ratio": "1/2"
    }
  ],
  "machine": {"name": "P-3", "site": "Lindmoor water works"},
  "conditions": {"flow_m3_h": 410}
}
"#;

/// (type, key, value or key as in [`WHOLE`], written instead, words of the message). The type and
/// its key are as in the schema; of a command they are the command's.
const BROKEN: &[(&str, &str, &str, &str, &str)] = &[
    (
        "",
        "recordings",
        "[\n    {\n      \"file\"",
        "5, \"_\": [{\"file\"",
        "`recordings` is 5; expected a list that is not empty",
    ),
    (
        "",
        "tach",
        "{\n    \"channel\": 4",
        "7, \"_\": {\"a\": 4",
        "`tach` is 7; expected an object",
    ),
    (
        "",
        "select",
        "{\n    \"from_s\"",
        "[], \"_\": {\"from_s\"",
        "`select` is a list of 0; expected an object",
    ),
    (
        "",
        "analyses",
        "[\n    {\n      \"command\": \"speed\"",
        "null, \"_\": [{\"a\": 1",
        "`analyses` is null; expected a list",
    ),
    (
        "",
        "machine",
        "{\"name\": \"P-3\"",
        "\"P-3\", \"_\": {\"name\": 1",
        "`machine` is \"P-3\"; expected an object",
    ),
    (
        "",
        "conditions",
        "{\"flow_m3_h\": 410}",
        "410",
        "`conditions` is 410; expected an object",
    ),
    (
        "RecordingSettings",
        "file",
        "\"pump-p3-µ.wav\"",
        "\"\"",
        "`file` is \"\"; expected a text that is not empty",
    ),
    (
        "RecordingSettings",
        "sample_rate_hz",
        "51200",
        "0",
        "`sample_rate_hz` is 0; expected a number above 0",
    ),
    (
        "RecordingSettings",
        "channels",
        "[\n        {\n          \"number\": 1",
        "{}, \"_\": [{\"number\": 1",
        "`channels` is an object; expected a list",
    ),
    (
        "ChannelSettings",
        "number",
        "1,\n          \"name\"",
        "0,\n          \"name\"",
        "`number` is 0; expected a whole number, 1 or more",
    ),
    (
        "ChannelSettings",
        "name",
        "\"drive end, größe\"",
        "12",
        "`name` is 12; expected a text that is not empty",
    ),
    (
        "ChannelSettings",
        "quantity",
        "\"acceleration\",\n          \"unit\"",
        "\"acceleratoin\",\n          \"unit\"",
        "`quantity` is \"acceleratoin\"; expected `acceleration`, `velocity`, `displacement`, `pressure`, `force`, `torque`, `voltage`, `current`, `temperature`, `speed` or `other`",
    ),
    (
        "ChannelSettings",
        "unit",
        "\"m/s2\"",
        "\"mm/s\"",
        "`unit` is \"mm/s\"; expected a unit of acceleration",
    ),
    (
        "ChannelSettings",
        "factor",
        "-98.1",
        "0.0",
        "`factor` is 0; expected a number other than 0",
    ),
    (
        "ChannelSettings",
        "mv_per_unit",
        "10.2",
        "-0",
        "`mv_per_unit` is -0; expected a number other than 0",
    ),
    (
        "ChannelSettings",
        "range_v",
        "5\n",
        "-5\n",
        "`range_v` is -5; expected a number above 0",
    ),
    (
        "TachSettings",
        "channel",
        "4,\n    \"pulses",
        "-4,\n    \"pulses",
        "`channel` is -4; expected a whole number, 1 or more",
    ),
    (
        "TachSettings",
        "times",
        "4,\n    \"pulses",
        "null, \"times\": 4,\n    \"pulses",
        "`times` is 4; expected a text that is not empty",
    ),
    (
        "TachSettings",
        "pulses_per_rev",
        "2,\n    \"edge\"",
        "4097,\n    \"edge\"",
        "`pulses_per_rev` is 4097; expected a whole number from 1 to 4096",
    ),
    (
        "TachSettings",
        "edge",
        "\"falling\"",
        "\"fall\"",
        "`edge` is \"fall\"; expected `rising` or `falling`",
    ),
    (
        "TachSettings",
        "threshold",
        "1.25",
        "\"1.25\"",
        "`threshold` is \"1.25\"; expected a number",
    ),
    (
        "TachSettings",
        "tach_delay_s",
        "1e-6",
        "true",
        "`tach_delay_s` is true; expected a number",
    ),
    (
        "Selection",
        "from_s",
        "2,\n    \"to_s\"",
        "-2,\n    \"to_s\"",
        "`from_s` is -2; expected a number, 0 or more",
    ),
    (
        "Selection",
        "to_s",
        "30,\n    \"exclude\"",
        "2,\n    \"exclude\"",
        "`to_s` is 2; expected a time after the start, 2 s",
    ),
    (
        "Selection",
        "exclude",
        "[\n      {\n        \"from_s\": 5",
        "[5, {\"from_s\": 5",
        "entry 1 of `exclude` is 5; expected an object",
    ),
    (
        "Exclusion",
        "from_s",
        "5,\n        \"to_s\"",
        "\"5\",\n        \"to_s\"",
        "`from_s` is \"5\"; expected a number, 0 or more",
    ),
    (
        "Exclusion",
        "to_s",
        "6.5",
        "4.5",
        "`to_s` is 4.5; expected a time after the start, 5 s",
    ),
    (
        "Exclusion",
        "reason",
        "\"valve moved\"",
        "[]",
        "`reason` is a list of 0; expected a text",
    ),
    (
        "speed",
        "command",
        "\"speed\"",
        "\"sped\"",
        "`command` is \"sped\"; expected `speed`, `spectrum`, `synchronous` or `compare`",
    ),
    (
        "speed",
        "step",
        "0.05",
        "0",
        "`step` is 0; expected a number, 0.0001 or more",
    ),
    (
        "spectrum",
        "command",
        "\"spectrum\"",
        "17",
        "`command` is 17; expected `speed`",
    ),
    (
        "spectrum",
        "channel",
        "[1, \"drive end\"]",
        "[]",
        "`channel` is a list of 0; expected a list that is not empty",
    ),
    (
        "spectrum",
        "max_order",
        "40",
        "1e9",
        "`max_order` is 1000000000; expected a number above 0, to 100000",
    ),
    (
        "spectrum",
        "order_step",
        "0.125",
        "2",
        "`order_step` is 2; expected a number from 1/65536 to 1",
    ),
    (
        "spectrum",
        "window",
        "\"flat-top\"",
        "\"flattop\"",
        "`window` is \"flattop\"; expected `rectangular`, `hann`, `hamming`, `blackman-harris`, `flat-top` or `kaiser`",
    ),
    (
        "spectrum",
        "overlap",
        "75",
        "95.5",
        "`overlap` is 95.5; expected a number from 0 to 95",
    ),
    (
        "spectrum",
        "averages",
        "20,",
        "0,",
        "`averages` is 0; expected a whole number, 1 or more",
    ),
    (
        "spectrum",
        "averaging",
        "\"peak-hold\"",
        "\"peak\"",
        "`averaging` is \"peak\"; expected `power`, `amplitude`, `exponential` or `peak-hold`",
    ),
    (
        "spectrum",
        "detector",
        "\"peak\"",
        "\"rsm\"",
        "`detector` is \"rsm\"; expected `rms`, `peak` or `peak-to-peak`",
    ),
    (
        "spectrum",
        "axis",
        "\"hz\"",
        "\"Hz\"",
        "`axis` is \"Hz\"; expected `orders` or `hz`",
    ),
    (
        "spectrum",
        "density",
        "true,",
        "1,",
        "`density` is 1; expected true or false",
    ),
    (
        "spectrum",
        "as",
        "\"velocity\"",
        "\"speed\"",
        "`as` is \"speed\"; expected `acceleration`, `velocity` or `displacement`",
    ),
    (
        "spectrum",
        "repeatability",
        "0.5",
        "0",
        "`repeatability` is 0; expected a number above 0",
    ),
    (
        "spectrum",
        "ratio",
        "\"23/57\"",
        "\"23/0\"",
        "`ratio` is \"23/0\"; expected two whole numbers above 0",
    ),
    (
        "synchronous",
        "command",
        "\"synchronous\"",
        "{}",
        "`command` is an object; expected `speed`",
    ),
    (
        "synchronous",
        "channel",
        "[1],\n      \"max_order\": 30",
        "1,\n      \"max_order\": 30",
        "`channel` is 1; expected a list that is not empty",
    ),
    (
        "synchronous",
        "max_order",
        "30,\n      \"averages\"",
        "-30,\n      \"averages\"",
        "`max_order` is -30; expected a number above 0, to 100000",
    ),
    (
        "synchronous",
        "averages",
        "64",
        "1",
        "`averages` is 1; expected a whole number, 2 or more",
    ),
    (
        "synchronous",
        "as",
        "\"displacement\"",
        "\"displacment\"",
        "`as` is \"displacment\"; expected",
    ),
    (
        "synchronous",
        "ratio",
        "\"3\"",
        "3",
        "`ratio` is 3; expected a text",
    ),
    (
        "compare",
        "command",
        "\"compare\"",
        "\"comparison\"",
        "`command` is \"comparison\"; expected",
    ),
    (
        "compare",
        "channel",
        "[1],\n      \"max_order\": 20",
        "[0],\n      \"max_order\": 20",
        "entry 1 of `channel` is 0; expected a whole number, 1 or more",
    ),
    (
        "compare",
        "max_order",
        "20,\n      \"order_step\"",
        "\"20\",\n      \"order_step\"",
        "`max_order` is \"20\"; expected a number above 0, to 100000",
    ),
    (
        "compare",
        "order_step",
        "0.0625",
        "0.00001",
        "`order_step` is 0.00001; expected a number from 1/65536 to 1",
    ),
    (
        "compare",
        "window",
        "\"hann\"",
        "\"hanning\"",
        "`window` is \"hanning\"; expected",
    ),
    (
        "compare",
        "overlap",
        "50,",
        "-1,",
        "`overlap` is -1; expected a number from 0 to 95",
    ),
    (
        "compare",
        "averages",
        "10,",
        "10.5,",
        "`averages` is 10.5; expected a whole number, 1 or more",
    ),
    (
        "compare",
        "detector",
        "\"rms\"",
        "false",
        "`detector` is false; expected `rms`, `peak` or `peak-to-peak`",
    ),
    (
        "compare",
        "as",
        "\"acceleration\",\n      \"ratio\"",
        "[\"a\"],\n      \"ratio\"",
        "`as` is a list of 1; expected `acceleration`, `velocity` or `displacement`",
    ),
    (
        "compare",
        "ratio",
        "\"1/2\"",
        "\"1:2\"",
        "`ratio` is \"1:2\"; expected two whole numbers above 0",
    ),
];

/// File, line, column, message and hint of the fault in a text.
fn fault(text: &str) -> (String, usize, usize, String, String) {
    match RunFile::parse(text, "run.json") {
        Err(Error::RunFile {
            file,
            line,
            column,
            what,
            hint,
        }) => (file, line, column, what, hint),
        other => panic!("no fault shown: {other:?}\nin {text}"),
    }
}

/// Line and column of a byte, counted the plain way.
fn place(text: &str, byte: usize) -> (usize, usize) {
    let (mut line, mut column) = (1, 1);
    for letter in text[..byte].chars() {
        if letter == '\n' {
            (line, column) = (line + 1, 1);
        } else {
            column += 1;
        }
    }
    (line, column)
}

/// The byte where `piece` stands after the key, in the whole run file.
fn found_at(kind: &str, key: &str, piece: &str) -> usize {
    let start = match kind {
        "speed" | "spectrum" | "synchronous" | "compare" => {
            WHOLE.find(&format!("\"command\": \"{kind}\"")).unwrap()
        }
        "TachSettings" => WHOLE.find("\"tach\"").unwrap(),
        "Selection" => WHOLE.find("\"select\"").unwrap(),
        "Exclusion" => WHOLE.find("\"exclude\"").unwrap(),
        _ => 0,
    };
    let sought = if key == "times" { "channel" } else { key };
    let key_at = start + WHOLE[start..].find(&format!("\"{sought}\": ")).unwrap();
    key_at + WHOLE[key_at..].find(piece).unwrap()
}

#[test]
fn a_whole_run_file_is_read_as_it_stands() {
    let run = RunFile::parse(WHOLE, "run.json").unwrap();
    assert_eq!(run.recordings[0].file, "pump-p3-µ.wav");
    assert_eq!(run.recordings[0].channels[1].mv_per_unit, Some(10.2));
    assert_eq!(run.tach.channel, Some(ChannelPick::Number(4)));
    assert_eq!(run.tach.edge, EdgeChoice::Falling);
    assert_eq!(run.select.exclude[0].reason.as_deref(), Some("valve moved"));
    let commands: Vec<_> = run.analyses.iter().map(Analysis::command).collect();
    assert_eq!(commands, ["speed", "spectrum", "synchronous", "compare"]);
    let Analysis::Spectrum(spectrum) = &run.analyses[1] else {
        panic!("{:?}", run.analyses[1]);
    };
    assert_eq!(spectrum.window, WindowChoice::FlatTop);
    assert_eq!(spectrum.ratio.as_deref(), Some("23/57"));
    assert_eq!(run.conditions["flow_m3_h"], 410);
    assert_eq!(run.check(), Ok(()));
}

#[test]
fn what_is_left_out_takes_its_default() {
    let run = RunFile::parse(
        r#"{"recordings": [{"file": "a.wav"}], "analyses": [{"command": "spectrum", "averages": null}]}"#,
        "run.json",
    );
    let run = run.unwrap();
    assert_eq!(run.tach.pulses_per_rev, 1);
    assert_eq!(
        run.analyses[0],
        Analysis::Spectrum(shaftwise_run::SpectrumSettings::default())
    );
}

#[test]
fn every_broken_field_is_shown_at_its_value_with_what_was_expected() {
    for (kind, key, piece, broken, words) in BROKEN {
        let byte = found_at(kind, key, piece);
        let text = format!("{}{broken}{}", &WHOLE[..byte], &WHOLE[byte + piece.len()..]);
        let (file, line, column, what, _) = fault(&text);
        assert_eq!(file, "run.json");
        assert!(what.contains(words), "{kind} {key}: {what}");
        // of a list with a wrong entry, or a value put before the key broken, the place is inside
        let within = broken
            .find(if *key == "times" { "4," } else { "\u{0}" })
            .unwrap_or(0);
        let within = within + usize::from(what.starts_with("entry"));
        assert_eq!(
            (line, column),
            place(&text, byte + within),
            "{kind} {key}: {what}"
        );
    }
}

#[test]
fn no_field_is_left_unbroken() {
    let schema: serde_json::Value = serde_json::from_str(&schema_json()).unwrap();
    let keys = |node: &serde_json::Value| -> Vec<String> {
        let properties = node["properties"].as_object();
        properties
            .into_iter()
            .flatten()
            .map(|(key, _)| key.clone())
            .collect()
    };
    let mut fields: BTreeSet<(String, String)> = BTreeSet::new();
    fields.extend(keys(&schema).into_iter().map(|key| (String::new(), key)));
    for (name, definition) in schema["$defs"].as_object().unwrap() {
        fields.extend(keys(definition).into_iter().map(|key| (name.clone(), key)));
        for variant in definition["oneOf"].as_array().into_iter().flatten() {
            let command = variant["properties"]["command"]["const"].as_str();
            let command = command.unwrap_or_default().to_owned();
            fields.extend(keys(variant).into_iter().map(|key| (command.clone(), key)));
        }
    }
    let broken: BTreeSet<(String, String)> = BROKEN
        .iter()
        .map(|(kind, key, ..)| ((*kind).to_owned(), (*key).to_owned()))
        .collect();
    let left: Vec<_> = fields.symmetric_difference(&broken).collect();
    assert!(left.is_empty(), "{left:?}");
}

#[test]
fn an_unknown_key_is_shown_at_the_key_with_the_nearest_known_one() {
    let text = WHOLE.replace("\"overlap\": 75", "\"overlapp\": 75");
    let (_, line, column, what, hint) = fault(&text);
    assert_eq!(
        (line, column),
        place(&text, text.find("\"overlapp\"").unwrap())
    );
    assert!(
        what.starts_with("unknown key `overlapp`; expected `command`, `channel`, "),
        "{what}"
    );
    assert_eq!(hint, "did you mean `overlap`?");
}

#[test]
fn a_key_of_another_command_is_unknown() {
    let text = WHOLE.replace("\"step\": 0.05", "\"window\": \"hann\"");
    let (.., what, _) = fault(&text);
    assert_eq!(what, "unknown key `window`; expected `command` or `step`");
}

#[test]
fn a_flags_spelling_leads_to_the_key() {
    let text = WHOLE.replace("\"pulses_per_rev\"", "\"pulses-per-rev\"");
    assert_eq!(fault(&text).4, "did you mean `pulses_per_rev`?");
}

#[test]
fn a_key_written_twice_is_shown_at_its_second_place() {
    let text = WHOLE.replace(
        "\"edge\": \"falling\"",
        "\"edge\": \"falling\", \"edge\": \"rising\"",
    );
    let (_, line, column, what, _) = fault(&text);
    assert_eq!(
        (line, column),
        place(&text, text.rfind("\"edge\"").unwrap())
    );
    assert!(what.contains("`edge` is here twice"), "{what}");
}

#[test]
fn of_two_faults_the_first_in_the_text_is_shown() {
    let text = WHOLE
        .replace("\"overlap\": 75", "\"overlap\": 99")
        .replace("\"step\": 0.05", "\"step\": -1");
    assert!(fault(&text).3.starts_with("`step` is -1"));
}

#[test]
fn what_is_missing_is_shown_at_the_object_it_is_missing_from() {
    let (_, line, column, what, _) = fault("{\n  \"tach\": {\"channel\": 1}\n}");
    assert_eq!((line, column), (1, 1));
    assert_eq!(
        what,
        "`recordings` is missing; expected a list that is not empty"
    );
    let (_, line, column, what, _) = fault("{\"recordings\": [\n  {\"sample_rate_hz\": 5}]}");
    assert_eq!((line, column), (2, 3));
    assert_eq!(what, "`file` is missing; expected a text that is not empty");
    let (.., what, _) = fault("{\"recordings\": []}");
    assert_eq!(
        what,
        "`recordings` is a list of 0; expected a list that is not empty"
    );
    let (.., what, _) = fault(r#"{"recordings": [{"file": "a"}], "analyses": [{"step": 1}]}"#);
    assert!(
        what.starts_with("`command` is missing; expected `speed`"),
        "{what}"
    );
    let (.., what, _) =
        fault(r#"{"recordings": [{"file": "a"}], "select": {"exclude": [{"to_s": 1}]}}"#);
    assert_eq!(what, "`from_s` is missing; expected a number, 0 or more");
}

#[test]
fn two_sources_of_the_rotation_are_at_odds() {
    let text = WHOLE.replace(
        "\"channel\": 4,",
        "\"channel\": 4, \"times\": \"pulses.txt\",",
    );
    let (_, line, column, what, _) = fault(&text);
    assert_eq!(
        (line, column),
        place(&text, text.find("\"pulses.txt\"").unwrap())
    );
    assert_eq!(
        what,
        "`times` is \"pulses.txt\" beside `channel`; expected either `channel` or `times`"
    );
}

#[test]
fn two_ways_to_calibrate_are_at_odds() {
    let text = WHOLE.replace("\"factor\": -98.1", "\"factor\": -98.1, \"range_v\": 5");
    let what = fault(&text).3;
    assert!(
        what.starts_with("`range_v` is 5 beside `factor` -98.1; expected either"),
        "{what}"
    );
}

#[test]
fn a_channel_described_twice_is_at_odds_with_itself() {
    let text = WHOLE.replace("\"number\": 4", "\"number\": 1");
    let (_, line, column, what, _) = fault(&text);
    assert_eq!(
        (line, column),
        place(&text, text.find("1,\n          \"mv").unwrap())
    );
    assert_eq!(what, "`number` is 1; expected each number once");
    let text = WHOLE.replace("\"number\": 4", "\"name\": \"drive end, größe\"");
    assert_eq!(
        fault(&text).3,
        "`name` is \"drive end, größe\"; expected each name once"
    );
}

#[test]
fn syntax_errors_show_what_was_found_and_what_was_expected() {
    for (text, line, column, words) in [
        ("", 1, 1, "the file is empty; expected a JSON object"),
        (" \r\n\t", 1, 1, "the file is empty; expected a JSON object"),
        ("{\"a\": NaN}", 1, 7, "found `N`; expected a value"),
        (
            "{\n\t\"é\": 1,}",
            2,
            9,
            "found `}`; expected another entry after the comma",
        ),
        (
            "{\r\n  \"a\": 1\r\n  \"b\": 2}",
            3,
            3,
            "found `\"`; expected `,` or `}`",
        ),
        (
            "{'a': 1}",
            1,
            2,
            "found `'`; expected a key in double quotes",
        ),
        (
            "{\"a\": 1} {}",
            1,
            10,
            "found `{`; expected nothing after the run file's object",
        ),
        (
            "{\"a\": [1, 2",
            1,
            12,
            "found the end of the file; expected `,` or `]`",
        ),
        (
            "{\"a\": \"x\n\"}",
            1,
            9,
            "found the end of the line; expected the closing \"",
        ),
        (
            "{\"größe\": 01}",
            1,
            12,
            "found `1`; expected a number such as",
        ),
        ("{\"a\": 1e999}", 1, 11, "expected a number below 1.8e308"),
        (
            "[]",
            1,
            1,
            "the run file is a list of 0; expected an object",
        ),
        ("RIFF\u{1}\u{2}", 1, 1, "found `R`; expected a value"),
    ] {
        let (_, found_line, found_column, what, _) = fault(text);
        assert!(what.contains(words), "{text:?}: {what}");
        assert_eq!(
            (found_line, found_column),
            (line, column),
            "{text:?}: {what}"
        );
    }
}

#[test]
fn places_hold_in_files_with_tabs_carriage_returns_and_a_byte_order_mark() {
    let text = WHOLE
        .replace("  ", "\t")
        .replace('\n', "\r\n")
        .replace("\"max_order\": 40", "\"max_order\":\t0");
    let expected = place(&text, text.find("0,\r\n\t\t\t\"order_step\"").unwrap());
    for mark in ["", "\u{feff}"] {
        let (_, line, column, what, _) = fault(&format!("{mark}{text}"));
        assert!(what.starts_with("`max_order` is 0"), "{what}");
        assert_eq!((line, column), expected);
    }
}

#[test]
fn a_file_that_is_not_utf8_is_shown_at_the_first_wrong_byte() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("run.json");
    std::fs::write(&path, b"{\n \"gr\xf6\xdfe\": 1}").unwrap();
    let Err(Error::RunFile {
        line, column, what, ..
    }) = RunFile::read(&path)
    else {
        panic!("read");
    };
    assert_eq!((line, column), (2, 5));
    assert_eq!(what, "byte 0xF6 is no UTF-8 text; expected JSON in UTF-8");
}

#[test]
fn a_missing_file_is_named() {
    let error = RunFile::read(std::path::Path::new("nowhere/run.json")).unwrap_err();
    assert!(
        error.to_string().starts_with("nowhere/run.json: "),
        "{error}"
    );
}

#[test]
fn what_is_written_by_serde_is_read_back() {
    let run = RunFile::parse(WHOLE, "run.json").unwrap();
    let text = serde_json::to_string(&run).unwrap();
    assert_eq!(RunFile::parse(&text, "run.json").unwrap(), run);
}

/// A run file with a piece cut out, doubled, or replaced.
fn mutated() -> impl Strategy<Value = String> {
    let pieces = prop::sample::select(vec![
        "",
        "{",
        "}",
        "[",
        "]",
        "\"",
        ",",
        ":",
        "0",
        "-1",
        "1e9",
        "1e999",
        "NaN",
        "null",
        "true",
        "\\",
        "\\u12",
        "\\ud800",
        "é",
        "\u{feff}",
        "\r\n",
        "\t",
        "\"tach\": 1,",
        "/",
        "~1",
    ]);
    let edit = (0..WHOLE.len(), 0..40usize, pieces);
    prop::collection::vec(edit, 1..4).prop_map(|edits| {
        let mut text = WHOLE.to_owned();
        for (start, length, piece) in edits {
            let boundary = |byte: usize| {
                let byte = byte.min(text.len());
                (0..=byte)
                    .rev()
                    .find(|&at| text.is_char_boundary(at))
                    .unwrap()
            };
            let (start, end) = (boundary(start), boundary(start + length));
            text.replace_range(start..end, piece);
        }
        text
    })
}

fn fault_lies_within(text: &str) {
    let Err(error) = RunFile::parse(text, "run.json") else {
        return;
    };
    let Error::RunFile {
        line, column, what, ..
    } = error
    else {
        panic!("{error:?}");
    };
    assert!(!what.is_empty());
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let lines: Vec<&str> = text.split('\n').collect();
    assert!(
        (1..=lines.len()).contains(&line),
        "line {line} of {}: {what}",
        lines.len()
    );
    let length = lines[line - 1].chars().count();
    // one past the end: where something is missing
    assert!(
        (1..=length + 1).contains(&column),
        "column {column} of {length}: {what}"
    );
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, ..ProptestConfig::default() })]

    #[test]
    fn mutated_run_files_never_panic_and_faults_lie_within_them(text in mutated()) {
        fault_lies_within(&text);
    }

    #[test]
    fn any_text_at_all_never_panics(text in any::<String>()) {
        fault_lies_within(&text);
    }
}
