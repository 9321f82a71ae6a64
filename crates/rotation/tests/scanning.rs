mod planted;
use planted::{Dice, Length, Motion, Tach, scatter};
use shaftwise_rotation::*;
use shaftwise_signal::SamplePosition;

fn scan(samples: &[f64], rate: f64, p: u32, edge: Edge) -> TachScan {
    let mut s = TachScanner::new(&TachConfig {
        sample_rate_hz: rate,
        pulses_per_rev: p,
        edge,
        threshold: None,
        delay_s: 0.0,
    })
    .unwrap();
    s.push(samples);
    s.finish().unwrap()
}

fn errors(rotation: &Rotation, motion: &Motion) -> Vec<f64> {
    let mut out = Vec::new();
    let rate = rotation.sample_rate_hz;
    for s in &rotation.sections {
        let (a, b) = (s.start(), s.end());
        let span = b.since(a);
        for i in 0..5000 {
            let p = SamplePosition::new(a.index, a.fraction + span * i as f64 / 4999.0);
            let (rev, fraction) = s.angle_at(p);
            out.push(360.0 * (rev as f64 + fraction - motion.angle(p.seconds(rate))));
        }
    }
    out
}

#[test]
fn peek() {
    let seconds = 30.0;
    let plain = Tach::plain(51200.0);
    let cases: Vec<(&str, Tach)> = vec![
        ("plain", plain.clone()),
        ("round", Tach { round: true, ..plain.clone() }),
        ("round 8bit", Tach { step: 10.0 / 256.0, round: true, ..plain.clone() }),
        ("round angle1", Tach { round: true, edge: Length::Degrees(1.0), ..plain.clone() }),
        ("round angle2", Tach { round: true, edge: Length::Degrees(2.0), ..plain.clone() }),
        ("round angle4", Tach { round: true, edge: Length::Degrees(4.0), ..plain.clone() }),
        ("round a4 8bit", Tach { step: 10.0/256.0, round: true, edge: Length::Degrees(4.0), ..plain.clone() }),
        ("round 40us", Tach { round: true, edge: Length::Seconds(40e-6), ..plain.clone() }),
        ("round 200us", Tach { round: true, edge: Length::Seconds(200e-6), ..plain.clone() }),
        ("round 400us", Tach { round: true, edge: Length::Seconds(400e-6), ..plain.clone() }),
        (
            "angle",
            Tach {
                edge: Length::Degrees(1.0),
                ..plain.clone()
            },
        ),
        (
            "8bit",
            Tach {
                step: 10.0 / 256.0,
                ..plain.clone()
            },
        ),
        (
            "8bit angle",
            Tach {
                step: 10.0 / 256.0,
                edge: Length::Degrees(1.0),
                ..plain.clone()
            },
        ),
        (
            "short edge",
            Tach {
                edge: Length::Seconds(10e-6),
                ..plain.clone()
            },
        ),
        (
            "20 samples",
            Tach {
                edge: Length::Seconds(400e-6),
                ..plain.clone()
            },
        ),
        (
            "narrow 1%",
            Tach {
                edge: Length::Seconds(20e-6),
                width: Length::Degrees(3.6),
                ..plain.clone()
            },
        ),
        (
            "50%",
            Tach {
                width: Length::Degrees(180.0),
                ..plain.clone()
            },
        ),
        (
            "3deg edge",
            Tach {
                edge: Length::Degrees(3.0),
                ..plain.clone()
            },
        ),
        (
            "0.2deg edge",
            Tach {
                edge: Length::Degrees(0.2),
                ..plain.clone()
            },
        ),
        (
            "drift",
            Tach {
                drift_per_s: 0.3,
                ..plain.clone()
            },
        ),
        (
            "negative",
            Tach {
                low: 4.0,
                high: -1.0,
                ..plain.clone()
            },
        ),
        (
            "noise 100",
            Tach {
                noise: 4.6 / 100.0,
                ..plain.clone()
            },
        ),
        (
            "noise 20",
            Tach {
                noise: 4.6 / 20.0,
                ..plain.clone()
            },
        ),
        (
            "noise 8",
            Tach {
                noise: 4.6 / 8.0,
                ..plain.clone()
            },
        ),
        (
            "two level",
            Tach {
                low: 0.0,
                high: 1.0,
                step: 1.0,
                ..plain.clone()
            },
        ),
        (
            "60 ppr",
            Tach {
                per_rev: 60,
                width: Length::Degrees(3.0),
                edge: Length::Seconds(20e-6),
                ..plain.clone()
            },
        ),
        (
            "8k",
            Tach {
                rate: 8000.0,
                ..plain.clone()
            },
        ),
        (
            "204.8k",
            Tach {
                rate: 204800.0,
                ..plain.clone()
            },
        ),
    ];
    for (name, tach) in cases {
        for (mname, motion) in [
            ("50", Motion::wobbling(50.0)),
            ("75", Motion::wobbling(75.0)),
            (
                "runup",
                Motion {
                    ramp: 1.7,
                    ..Motion::steady(8.0)
                },
            ),
        ] {
            let step = 1.0 / tach.per_rev as f64;
            let mut instants = motion.instants(0.0, step, seconds);
            let samples = tach.sample(&motion, &instants, seconds);
            let t0 = std::time::Instant::now();
            let scan = scan(
                &samples,
                tach.rate,
                tach.per_rev,
                if tach.high > tach.low {
                    Edge::Rising
                } else {
                    Edge::Falling
                },
            );
            let t1 = t0.elapsed().as_nanos() as f64 / samples.len() as f64;
            let config = RotationConfig {
                sample_rate_hz: tach.rate,
                total_samples: samples.len() as u64,
                pulses_per_rev: tach.per_rev,
            };
            let r = rotation_from_scan(&scan, &config).unwrap();
            let e = scatter(&errors(&r, &motion));
            println!(
                "{name:12} {mname:6} pulses {} of {}; err rms {:.2e} max {:.2e} sigma {:.2e} timing {:.1e} predicted {:.1e} samples, ledger {}, edge {:.3} deg pulse {:.2} deg gauss {:.2} levels {:.3} {:.3} two {} {t1:.1} ns/sample",
                scan.edges.len(),
                instants.len(),
                e.0,
                e.1,
                r.angle_sigma_deg(),
                r.timing_sigma_s * tach.rate,
                scan.edge_sigma_s * tach.rate,
                r.ledger.len(),
                r.edge_width_deg.unwrap(),
                r.pulse_width_deg.unwrap(),
                scan.smoothing,
                scan.low,
                scan.high,
                scan.two_level
            );
        }
    }
}
