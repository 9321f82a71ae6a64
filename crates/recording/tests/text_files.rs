//! Delimited text as loggers and programs write it.
#![allow(clippy::unwrap_used, missing_docs)]

use std::fmt::Write;

use shaftwise_recording::{ChannelSetup, Error, OpenOptions, Quantity, Recording};

fn open_at(text: impl AsRef<[u8]>, sample_rate_hz: Option<f64>) -> Result<Recording, Error> {
    let options = OpenOptions {
        sample_rate_hz,
        ..OpenOptions::default()
    };
    Recording::from_reader(text.as_ref(), "log.txt", &options)
}

fn open(text: impl AsRef<[u8]>) -> Result<Recording, Error> {
    open_at(text, None)
}

fn all(recording: &Recording) -> Vec<Vec<f64>> {
    let channels: Vec<usize> = (0..recording.channels().len()).collect();
    let mut out = vec![Vec::new(); channels.len()];
    recording
        .read(0, usize::MAX, &channels, &mut Vec::new(), &mut out)
        .unwrap();
    out
}

/// Rate, name and unit of each channel, values, no warnings.
fn reads(text: &str, rate: f64, channels: &[(&str, &str)], values: &[&[f64]]) {
    let recording = open(text).unwrap_or_else(|error| panic!("{error} in\n{text}"));
    assert_eq!(recording.warnings(), &[] as &[String], "{text}");
    assert_eq!(recording.sample_rate_hz(), rate, "{text}");
    let found: Vec<_> = recording
        .channels()
        .iter()
        .map(|c| (c.name.as_str(), c.unit.as_str()))
        .collect();
    assert_eq!(found, channels, "{text}");
    assert_eq!(all(&recording), values, "{text}");
    assert_eq!(recording.frames(), values[0].len() as u64);
}

fn refused(text: impl AsRef<[u8]>, words: &[&str]) {
    let error = open(text).unwrap_err();
    let message = error.to_string();
    for word in words {
        assert!(message.contains(word), "{word:?} is missing in: {message}");
    }
}

const V: [&[f64]; 2] = [&[1.5, -2.0, 3e-3], &[0.0, 5.0, 0.25]];

#[test]
fn separators_and_decimal_marks_are_told_apart() {
    let two = [("a", "unit"), ("b", "V")];
    reads(
        "t,a,b [V]\n0,1.5,0\n0.001,-2,5\n0.002,3e-3,.25\n",
        1000.0,
        &two,
        &V,
    );
    reads(
        "t;a;b [V]\r\n0;1.5;0\r\n0.001;-2;5\r\n0.002;3E-3;0.25\r\n",
        1000.0,
        &two,
        &V,
    );
    reads(
        "t;a;b [V]\n0;1,5;0\n0,001;-2;5\n0,002;3e-3;0,25",
        1000.0,
        &two,
        &V,
    );
    reads(
        "t\ta\tb [V]\n0\t1,5\t0\n0,001\t-2\t5\n0,002\t0,003\t0,25\n",
        1000.0,
        &two,
        &V,
    );
    reads(
        "t   a  \"b (V)\"\n 0   1.5 0\n 0.001 -2  5\n 0.002 +3e-3 0.25\n",
        1000.0,
        &two,
        &V,
    );
    reads(
        "t, a, b [V],\n0, 1.5, 0,\n0.001, -2, 5,\n0.002, 3e-3, .25,\n",
        1000.0,
        &two,
        &V,
    );
    reads(
        "\"t\";\"a\";\"b [V]\"\n\"0\";\"1,5\";0\n\"0,001\";-2;5\n0,002;3e-3;\"0,25\"\n",
        1000.0,
        &two,
        &V,
    );
}

#[test]
fn names_and_units_come_from_the_header() {
    reads(
        "time;DE [m/s2];tach\n s ;;V\n0;1.5;0\n0.001;-2;5\n0.002;3e-3;0.25\n",
        1000.0,
        &[("DE", "m/s²"), ("tach", "V")],
        &V,
    );
    reads(
        "\u{feff}Zeit;DE (m/s²);NDE (oben)\n0;1.5;0\n0.001;-2;5\n0.002;3e-3;0.25\n",
        1000.0,
        &[("DE", "m/s²"), ("NDE (oben)", "unit")],
        &V,
    );
    reads(
        "# P-3, Lindmoor water works\n% t a b\n0 1.5 0\n# note\n\n0.001 -2 5\n0.002 3e-3 0.25\n",
        1000.0,
        &[("a", "unit"), ("b", "unit")],
        &V,
    );
    // the middle column counts rows, the last one holds ms
    reads(
        "a,index,b,time [ms]\n1.5,1,0,10\n-2,2,5,10.5\n3e-3,3,.25,11\n",
        2000.0,
        &[("a", "unit"), ("b", "unit")],
        &V,
    );
    // Latin-1, as old loggers write it
    let recording = open(b"t;\xfcber [\xb5m]\n0;1\n0,1;2\n0,2;3\n").unwrap();
    let channel = &recording.channels()[0];
    assert_eq!(
        (channel.name.as_str(), channel.unit.as_str()),
        ("über", "µm")
    );
}

#[test]
fn a_first_column_without_a_name_is_time_if_it_is_even() {
    reads(
        "0 1.5 0\n0.001 -2 5\n0.002 3e-3 0.25\n",
        1000.0,
        &[("channel 1", "unit"), ("channel 2", "unit")],
        &V,
    );
    refused(
        "1.5 0\n-2 5\n3e-3 0.25\n",
        &["no time column", "no sample rate"],
    );
    // rows counted by 1 are no seconds
    refused("0 1.5 0\n1 -2 5\n2 3e-3 0.25\n", &["no time column"]);
    let recording = open_at("1.5 0\n-2 5\n3e-3 0.25\n", Some(51_200.0)).unwrap();
    assert_eq!(all(&recording), V);
    let recording = open_at("0 1.5 0\n1 -2 5\n2 3e-3 0.25\n", Some(51_200.0)).unwrap();
    assert_eq!(
        (all(&recording), recording.sample_rate_hz()),
        (V.map(<[f64]>::to_vec).to_vec(), 51_200.0)
    );
    let recording = open_at("1.5\n-2\n3e-3\n", Some(100.0)).unwrap();
    assert_eq!(all(&recording), [V[0]]);
}

#[test]
fn rates_survive_the_rounding_of_printed_times() {
    for rate in [51_200.0, 44_100.0, 65_536.0, 12_345.0, 100.0 / 3.0, 2.5] {
        for digits in [6, 7, 9, 12] {
            let mut fixed = "t,a\n".to_owned();
            let mut floating = fixed.clone();
            let mut shortest = fixed.clone();
            for n in 0..20_000 {
                let t = f64::from(n) / rate;
                writeln!(fixed, "{t:.digits$},{n}").unwrap();
                writeln!(floating, "{t:.digits$e},{n}").unwrap();
                writeln!(shortest, "{t},{n}").unwrap();
            }
            for text in [fixed, floating, shortest] {
                let recording = open(&text).unwrap_or_else(|e| panic!("{e} {rate} {digits}"));
                let found = recording.sample_rate_hz();
                // both ends rounded by half a digit of the longest span
                let tolerance = 10f64.powi(-(digits as i32)) / (20_000.0 / rate).min(1.0);
                assert!(
                    (found / rate - 1.0).abs() <= tolerance,
                    "{rate} {digits}: {found}"
                );
                if rate.fract() == 0.0 && tolerance * rate < 0.1 {
                    assert_eq!(found, rate, "{digits}");
                }
            }
        }
    }
}

#[test]
fn uneven_times_say_how_uneven() {
    let row = |n: u32, gap: f64| format!("{},{n}\n", f64::from(n) * 0.001 + gap);
    let mut text = "t,a\n".to_owned();
    text.extend((0..500).map(|n| row(n, 0.0)));
    text.extend((500..1000).map(|n| row(n, 0.01)));
    refused(&text, &["row 50", "steps off", "1.0000e-3 s", "0.10"]);
    let recording = open_at(&text, Some(1000.0)).unwrap();
    assert!(recording.warnings()[0].contains("not even"));
    assert_eq!(recording.channels().len(), 1);

    refused("t,a\n0,1\n0,2\n0,3\n", &["does not increase"]);
    refused("t,a\n2,1\n1,2\n0,3\n", &["does not increase"]);
    refused("t,a\n0,1\n1,2\n", &["2 rows"]);
    let recording = open_at("t,a\n0,1\n0.001,2\n0.002,3\n", Some(500.0)).unwrap();
    assert!(recording.warnings()[0].contains("says 1000 Hz"));
    assert_eq!(recording.sample_rate_hz(), 500.0);
}

#[test]
fn faults_have_a_line_and_a_column() {
    let with = |row: &str| format!("t,a,b\n# x\n0,1,2\n0.1,1,2\n{row}\n0.3,1,2\n");
    refused(
        with("0.2,x1,2"),
        &["line 5, column 2", "\"x1\"", "a number"],
    );
    refused(with("0.2,,2"), &["line 5, column 2", "\"\""]);
    refused(with("0.2,1"), &["line 5 has 2 fields, expected 3"]);
    refused(with("0.2,1,2,3"), &["line 5 has 4 fields, expected 3"]);
    refused(with("0.2,1,2,,"), &["line 5 has 5 fields"]);
    refused(with("0.2,nan,2"), &["line 5, column 2", "nan", "finite"]);
    refused(with("0.2,1,-inf"), &["line 5, column 3", "finite"]);
    refused(with("0.2,1e999,1"), &["line 5, column 2", "finite"]);
    refused(with("t,a,b"), &["line 5, column 1", "\"t\""]);
    // the very first row of numbers
    refused(
        "t,a,b\n0,x,2\n0.1,1,2\n0.2,1,2\n",
        &["line 2, column 2", "\"x\""],
    );
    // thousands: mixed marks would be off by 1000
    refused(
        "t;a\n0;1,5\n0,1;2,5\n0,2;1.000\n",
        &["line 4, column 2", "decimal comma"],
    );
    refused("hello\nworld\n", &["no row of numbers", "2 lines", "hello"]);
    refused("t,a\n", &["no row of numbers"]);
    refused("\n \n", &["no row of numbers"]);
    refused(
        format!("1 2\n{}\n", "1".repeat(2 << 20)),
        &["line 2 is longer than 1048576 bytes"],
    );
    refused("0\n", &["no time column"]);
    refused("t\n0\n0.1\n0.2\n", &["channels", "none beside the time"]);
    refused(b"\xff\xfet\0,\0a\0\n\0".as_slice(), &["neither a WAV"]);
    assert!(open("t,a\n").unwrap_err().hint().is_none());
    assert!(
        open("1\n")
            .unwrap_err()
            .hint()
            .unwrap()
            .contains("--sample-rate")
    );
}

#[test]
fn lines_before_the_header_are_mentioned() {
    let recording =
        open("Lindmoor water works\nB-1;blower\n\nt;a;b\n0;1,5;0\n0,001;-2;5\n0,002;3e-3;0,25\n")
            .unwrap();
    assert_eq!(
        recording.warnings(),
        ["2 lines before the rows of numbers were not read"]
    );
    assert_eq!(recording.channels()[0].name, "a");
    assert_eq!(all(&recording), V);
}

#[test]
fn sensitivities_apply_to_volts() {
    let setup = |mv_per_unit, range_v| OpenOptions {
        channels: vec![ChannelSetup {
            number: 1,
            quantity: Some(Quantity::Acceleration),
            unit: Some("g".into()),
            mv_per_unit: Some(mv_per_unit),
            range_v,
            ..ChannelSetup::default()
        }],
        sample_rate_hz: Some(100.0),
    };
    for (header, volts) in [("a [V]", 1.0), ("a [mV]", 1e-3), ("a", 1.0)] {
        let text = format!("{header}\n2\n-1\n");
        let recording =
            Recording::from_reader(text.as_bytes(), "-", &setup(-100.0, Some(10.0))).unwrap();
        let values = &all(&recording)[0];
        approx::assert_relative_eq!(values[0], -20.0 * volts * 9.80665, max_relative = 1e-14);
        let full_scale = recording.channels()[0].full_scale.unwrap();
        approx::assert_relative_eq!(full_scale, 980.665, max_relative = 1e-14);
        assert_eq!(recording.channels()[0].unit, "m/s²");
    }
    // without a sensitivity the unit of the header counts
    let text = "t;a [g];b [mV]\n0;1;1000\n0,1;2;-500\n0,2;0;1\n";
    let recording = open(text).unwrap();
    assert_eq!(
        all(&recording),
        [[9.80665, 19.6133, 0.0], [1.0, -0.5, 0.001]]
    );
    assert_eq!(recording.channels()[1].quantity, Quantity::Voltage);
}

#[test]
fn long_texts_are_the_same_as_short_ones() {
    // beyond the head that the shape is told from, and many spool writes
    let mut text = "t,a,b\n".to_owned();
    for n in 0..60_000u32 {
        writeln!(
            text,
            "{},{},{}",
            f64::from(n) / 8192.0,
            n,
            f64::from(n) * -0.1
        )
        .unwrap();
    }
    let recording = open(&text).unwrap();
    assert_eq!(recording.sample_rate_hz(), 8192.0);
    let values = all(&recording);
    assert!(values[0].iter().enumerate().all(|(n, v)| *v == n as f64));
    assert!(
        values[1]
            .iter()
            .enumerate()
            .all(|(n, v)| *v == n as f64 * -0.1)
    );
    assert_eq!(values[0].len(), 60_000);
}
