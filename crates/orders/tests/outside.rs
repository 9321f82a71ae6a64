//! Against numpy and scipy: values committed in tests/outside/check_values.json, made by the script
//! beside it (scipy.signal.welch, numpy mean, std and rfft, scipy.stats).
#![allow(clippy::unwrap_used, missing_docs)]

use serde_json::Value;
use shaftwise_orders::{
    Average, SpectrumAccumulator, SpectrumConfig, SpectrumPlan, SynchronousAccumulator,
    revolution_orders,
};
use shaftwise_signal::{Window, chi_square_quantile, normal_quantile};
use std::sync::Arc;

fn values() -> Value {
    serde_json::from_str(include_str!("../../../tests/outside/check_values.json")).unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value
        .as_array()
        .unwrap()
        .iter()
        .map(|v| v.as_f64().unwrap())
        .collect()
}

/// The script's test signal: whole-number arithmetic.
fn test_signal(count: u64) -> Vec<f64> {
    (0..count)
        .map(|n| {
            let noise = n * 2_654_435_761 % (1 << 32);
            noise as f64 / 4_294_967_296.0 - 0.5 + (n * 7 % 64) as f64 / 64.0
        })
        .collect()
}

#[test]
fn averaged_spectra_are_those_of_scipy_welch() {
    let values = values();
    let x = test_signal(8192);
    for (name, window, hop) in [
        ("welch_hann_50", Window::Hann, 128),
        ("welch_blackmanharris_75", Window::BlackmanHarris, 64),
        ("welch_kaiser18_50", Window::Kaiser { beta: 18.0 }, 128),
        ("welch_hamming_0", Window::Hamming, 256),
    ] {
        let config = SpectrumConfig {
            window,
            block: 256,
            hop,
            lines: 129,
            average: Average::Power,
        };
        let plan = Arc::new(SpectrumPlan::new(config).unwrap());
        let mut scratch = plan.scratch();
        let mut sums = SpectrumAccumulator::new(plan.clone(), 1);
        let blocks = (8192 - 256) / hop + 1;
        for block in 0..blocks {
            let part = &x[block * hop..block * hop + 256];
            let mean = part.iter().sum::<f64>() / 256.0;
            sums.push(block * 12 / blocks, [(part, mean)], &mut scratch);
        }
        let ours = sums.finish().remove(0).shown;
        let theirs = numbers(&values[name]);
        assert_eq!(ours.len(), theirs.len());
        let top = theirs.iter().copied().fold(0.0, f64::max);
        for line in 0..129 {
            let miss = (ours[line] - theirs[line]).abs();
            // Transforms of 256 points and sums of 125 blocks: 1e-13 of the largest is generous.
            assert!(
                miss < 1e-13 * top,
                "{name}, line {line}: {} {}",
                ours[line],
                theirs[line]
            );
        }
    }
}

#[test]
fn the_mean_revolution_is_that_of_numpy() {
    let values = values();
    let x = test_signal(90 * 41);
    let mut sums = SynchronousAccumulator::new(90, 1);
    for (r, revolution) in x.chunks_exact(90).enumerate() {
        sums.push(r * 12 / 41, r as u64, [revolution]);
    }
    let average = sums.finish().remove(0);
    for (ours, name) in [
        (&average.mean, "revolution_mean"),
        (&average.sd, "revolution_sd"),
    ] {
        for (a, b) in ours.iter().zip(numbers(&values[name])) {
            assert!((a - b).abs() < 1e-14, "{name}: {a} {b}");
        }
    }
    let orders = revolution_orders(&average.mean, 39);
    let amplitudes = numbers(&values["revolution_amplitude"]);
    let phases = numbers(&values["revolution_phase_turns"]);
    for ((order, amplitude), phase) in orders[1..].iter().zip(amplitudes).zip(phases) {
        assert!((order.amplitude - amplitude).abs() < 1e-14);
        assert!((order.phase - phase).abs() < 1e-11, "order {}", order.order);
    }
}

#[test]
fn quantiles_are_those_of_scipy() {
    let values = values();
    for row in values["chi_square"].as_array().unwrap() {
        let row = numbers(row);
        let ours = chi_square_quantile(row[0], row[1]);
        assert!((ours / row[2] - 1.0).abs() < 1e-9, "{row:?} {ours}");
    }
    for row in values["normal"].as_array().unwrap() {
        let row = numbers(row);
        assert!((normal_quantile(row[0]) - row[1]).abs() < 1e-10, "{row:?}");
    }
}
