mod planted;
use planted::{Dice, Motion, scatter};
use shaftwise_rotation::*;
use shaftwise_signal::SamplePosition;

pub fn config(rate: f64, p: u32, seconds: f64) -> RotationConfig {
    RotationConfig {
        sample_rate_hz: rate,
        total_samples: (seconds * rate) as u64 + 1,
        pulses_per_rev: p,
    }
}

fn errors(rotation: &Rotation, motion: &Motion) -> (Vec<f64>, Vec<f64>) {
    let mut out = (Vec::new(), Vec::new());
    let rate = rotation.sample_rate_hz;
    for s in &rotation.sections {
        let (a, b) = (s.start(), s.end());
        let span = b.since(a);
        for i in 0..5000 {
            let p = SamplePosition::new(a.index, a.fraction + span * i as f64 / 4999.0);
            let (rev, fraction) = s.angle_at(p);
            let truth = motion.angle(p.seconds(rate));
            out.0.push(360.0 * (rev as f64 + fraction - truth));
            out.1
                .push((rev as f64 + fraction - truth) / s.sigma_at(p).0);
        }
    }
    out
}

#[test]
fn peek() {
    for noise in [0.0, 1e-4, 1e-2, 0.3] {
        for (name, motion) in [
            ("steady", Motion::steady(50.0)),
            ("wobble", Motion::wobbling(50.0)),
            (
                "runup",
                Motion {
                    ramp: 1.7,
                    ..Motion::steady(8.0)
                },
            ),
            (
                "hunt",
                Motion {
                    wobbles: vec![(10.0, 2.0, 0.3)],
                    ..Motion::steady(50.0)
                },
            ),
        ] {
            let mut dice = Dice(7);
            let times: Vec<f64> = motion
                .instants(0.0, 1.0, 40.0)
                .iter()
                .map(|t| t + noise / 51200.0 * dice.normal())
                .collect();
            let t0 = std::time::Instant::now();
            let r = rotation_from_times(&times, &config(51200.0, 1, 40.0)).unwrap();
            for l in &r.ledger {
                println!("   {} {}", l.time_s, l.reason);
            }
            let (e, z) = errors(&r, &motion);
            let inside = z.iter().filter(|z| z.abs() < 1.0).count() as f64 / z.len() as f64;
            println!(
                "{name} noise {noise}: {} pulses, err {:?}, sigma {:.2e} timing {:.3e} samples, coverage {inside:.2} ledger {} range {:?} {:?}",
                times.len(),
                scatter(&e),
                r.angle_sigma_deg(),
                r.timing_sigma_s * 51200.0,
                r.ledger.len(),
                r.speed_range(),
                t0.elapsed()
            );
        }
    }
}
