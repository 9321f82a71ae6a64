//! Recipes as text: what is read, what is refused and how it says so.

#![allow(clippy::unwrap_used)]

use shaftwise_synth::{Difficulty, Error, Noise, Recipe, Synth, random_machine};

const GOOD: &str = r#"{
  "sample_rate_hz": 4000, "seconds": 2, "seed": 7,
  "speed": {"profile": {"constant": {"rev_per_s": 24.6}},
            "wobbles": [{"amplitude_rev_per_s": 0.5, "frequency_hz": 0.3}]},
  "channels": [
    {"name": "drive end", "quantity": "acceleration", "unit": "m/s²",
     "orders": [{"order": 1, "amplitude": 2.5, "phase_lead_deg": 40}],
     "tones": [{"frequency_hz": 100, "amplitude": 0.3}],
     "noise": [{"white": {"rms": 0.1}}, {"low_pass": {"rms": 0.1, "corner_hz": 200}}]},
    {"name": "tach", "quantity": "voltage", "unit": "V",
     "pulses": {"pulses_per_rev": 1, "width": {"degrees": 10}, "edge": {"seconds": 0.0002}}}
  ]
}"#;

#[test]
fn a_recipe_is_read_and_written_back() {
    let recipe = Recipe::parse(GOOD).unwrap();
    assert_eq!(recipe.frames(), 8000);
    assert_eq!(recipe.channels[0].noise[0], Noise::White { rms: 0.1 });
    assert_eq!(recipe.channels[1].pulses.as_ref().unwrap().high, 5.0);
    assert_eq!(Recipe::parse(&recipe.to_json().unwrap()).unwrap(), recipe);
}

#[test]
fn syntax_errors_name_line_and_column() {
    for (from, to, line) in [
        ("\"tones\"", "\"tonnes\"", 8),
        ("\"rev_per_s\"", "\"rpm\"", 3),
        ("\"white\"", "\"pink\"", 9),
        ("2.5", "\"loud\"", 7),
        ("\"seed\": 7", "\"seed\": -7", 2),
        ("]\n}", "]", 12),
    ] {
        let text = GOOD.replacen(from, to, 1);
        assert_ne!(text, GOOD);
        match Recipe::parse(&text) {
            Err(Error::Syntax {
                line: found,
                column,
                message,
            }) => {
                assert_eq!(found, line, "{to}: {message}");
                assert!(column > 0 && !message.contains(" at line "));
            }
            other => panic!("{to}: {other:?}"),
        }
    }
}

#[test]
fn values_out_of_range_name_their_field() {
    for (from, to, field) in [
        ("4000", "0", "sample_rate_hz"),
        ("\"seconds\": 2", "\"seconds\": -1", "seconds"),
        ("\"seconds\": 2", "\"seconds\": 1e-9", "seconds"),
        ("24.6", "0.4", "speed"),
        ("24.6", "-3", "speed.profile.rev_per_s"),
        ("0.3}]},", "0}]},", "speed.wobbles[0].frequency_hz"),
        (
            "\"order\": 1",
            "\"order\": 0",
            "channels[0].orders[0].order",
        ),
        ("2.5", "-2.5", "channels[0].orders[0].amplitude"),
        ("100", "-100", "channels[0].tones[0].frequency_hz"),
        (
            "{\"rms\": 0.1}",
            "{\"rms\": -0.1}",
            "channels[0].noise[0].rms",
        ),
        ("200", "2000", "channels[0].noise[1].corner_hz"),
        ("200", "0.01", "channels[0].noise[1]"),
        (
            "\"pulses_per_rev\": 1",
            "\"pulses_per_rev\": 0",
            "channels[1].pulses.pulses_per_rev",
        ),
        ("10}", "400}", "channels[1].pulses.width.degrees"),
        ("0.0002", "0.2", "channels[1].pulses.edge.seconds"),
        ("\"tach\"", "\"\"", "channels[1].name"),
    ] {
        let text = GOOD.replacen(from, to, 1);
        assert_ne!(text, GOOD);
        match Recipe::parse(&text) {
            Err(Error::Value { field: found, .. }) => assert_eq!(found, field, "{to}"),
            other => panic!("{to}: {other:?}"),
        }
    }
    let error = Recipe::parse(&GOOD.replacen("\"order\": 1", "\"order\": 0", 1)).unwrap_err();
    let expected =
        "recipe, channels[0].orders[0].order: found 0, expected above 0, at most 1000000 per rev";
    assert_eq!(error.to_string(), expected);
}

#[test]
fn values_that_are_no_numbers_are_refused() {
    let good = Recipe::parse(GOOD).unwrap();
    let breaks: [fn(&mut Recipe); 7] = [
        |r| r.sample_rate_hz = f64::NAN,
        |r| r.seconds = f64::INFINITY,
        |r| r.speed.start_angle_rev = f64::NAN,
        |r| r.channels[0].orders[0].phase_lead_deg = f64::NAN,
        |r| r.channels[0].bias = f64::INFINITY,
        |r| r.channels[0].drift_per_s = f64::NAN,
        |r| r.channels[1].pulses.as_mut().unwrap().high = f64::NAN,
    ];
    for break_it in breaks {
        let mut recipe = good.clone();
        break_it(&mut recipe);
        assert!(matches!(Synth::new(&recipe), Err(Error::Value { .. })));
        assert!(recipe.to_json().is_err());
    }
}

#[test]
fn random_machines_are_valid_repeatable_and_within_their_promise() {
    let mut counts = [0; 9];
    for seed in 0..300 {
        for difficulty in [Difficulty::Clean, Difficulty::Usual, Difficulty::Hard] {
            let recipe = random_machine(seed, difficulty);
            recipe.validate().unwrap();
            assert_eq!(recipe, random_machine(seed, difficulty));
            assert_eq!(Recipe::parse(&recipe.to_json().unwrap()).unwrap(), recipe);
            let synth = Synth::new(&recipe).unwrap();
            let [slowest, fastest] = synth.motion().speed_bounds();
            assert!(slowest > 4.0 && fastest < 100.0);
            let orders = &recipe.channels[0].orders;
            counts[orders.len()] += 1;
            let apart = if difficulty == Difficulty::Hard {
                0.25
            } else {
                0.5
            };
            for pair in orders.windows(2) {
                assert!(pair[1].order - pair[0].order > apart - 1e-9);
            }
            assert!(orders[orders.len() - 1].order <= 0.35 * recipe.sample_rate_hz / fastest);
        }
    }
    assert_eq!(counts[..3], [0; 3]);
    assert!(counts[3..].iter().all(|&count| count > 20), "{counts:?}");
}

#[test]
fn demo_recipes_are_valid_and_small() {
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/../../demo-runs/recipes");
    let mut bytes = 0;
    for name in ["hunting", "sick-tach", "run-up"] {
        let text = std::fs::read_to_string(format!("{folder}/{name}.json")).unwrap();
        let recipe = Recipe::parse(&text).unwrap_or_else(|error| panic!("{name}: {error}"));
        // as 32-bit samples
        bytes += recipe.frames() * recipe.channels.len() as u64 * 4;
        let limit = recipe.sample_rate_hz / 2.0;
        let [_, fastest] = Synth::new(&recipe).unwrap().motion().speed_bounds();
        for order in recipe.channels.iter().flat_map(|channel| &channel.orders) {
            assert!(
                order.main_shaft_order() * fastest < limit,
                "{name}: would alias"
            );
        }
    }
    assert!(bytes < 7_500_000, "{bytes}");
}
