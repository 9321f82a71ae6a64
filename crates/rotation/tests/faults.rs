mod planted;
use planted::{Dice, Motion};
use shaftwise_rotation::*;

#[test]
fn peek() {
    let motions = [
        ("steady", Motion::steady(50.0)),
        ("wobble", Motion::wobbling(30.0)),
        ("runup", Motion { ramp: 1.7, ..Motion::steady(8.0) }),
        ("hunt", Motion { wobbles: vec![(10.0, 2.0, 0.3)], ..Motion::steady(50.0) }),
        ("slow hunt", Motion { wobbles: vec![(1.0, 2.0, 0.3)], ..Motion::steady(8.0) }),
    ];
    for (name, motion) in motions {
        for (miss, stray, noise) in [(0.0, 0.0, 0.0), (0.03, 0.03, 0.0), (0.03, 0.03, 0.3), (0.1, 0.1, 0.1), (0.3, 0.3, 0.1), (0.5, 0.5, 0.1)] {
            let mut slips = 0; let mut sections = 0; let mut moved = 0; let mut wrong = 0; let mut unstray = 0; let mut dt = 0.0;
            let mut inserted_off = 0i64; let mut dupl = 0;
            for seed in 0..10 {
                let mut dice = Dice(100 + seed);
                let all = motion.instants(0.0, 1.0, 40.0);
                let n = all.len();
                let rate = 51200.0;
                let mut events: Vec<(f64, Option<usize>)> = Vec::new();
                let mut missing = 0;
                for (i, t) in all.iter().enumerate() {
                    if i > 10 && i + 10 < n && dice.even() < miss { missing += 1; continue; }
                    events.push((t + noise / rate * dice.normal(), Some(i)));
                }
                for _ in 0..(stray * n as f64) as usize {
                    events.push((dice.even() * 40.0, None));
                }
                events.sort_by(|a, b| a.0.total_cmp(&b.0));
                let times: Vec<f64> = events.iter().map(|e| e.0).collect();
                let t0 = std::time::Instant::now();
                let r = rotation_from_times(&times, &RotationConfig { sample_rate_hz: rate, total_samples: 40 * 51200, pulses_per_rev: 1 }).unwrap();
                dt += t0.elapsed().as_secs_f64();
                sections += r.sections.len();
                if seed == 0 { for w in &r.warnings { println!("   {w}"); } }
                let first = r.sections[0].start().seconds(rate);
                let base = motion.angle(first).round();
                for s in &r.sections {
                    let e = motion.angle(s.end().seconds(rate)) - base - s.end_rev();
                    let b = motion.angle(s.start().seconds(rate)) - base - s.start_rev();
                    if (e - b).abs() > 0.3 { slips += 1; }
                    let mut bad = false;
                    for k in 0..2000 { let x = s.start_rev() + s.span_rev() * k as f64 / 2000.0; let a = s.at(x.floor() as i64, x - x.floor());
                        let d = motion.angle(a.position.seconds(rate)) - base - x; if (d - b).abs() > 0.2 { bad = true; } }
                    if bad { wrong += 1; }
                }
                moved += r.ledger.iter().filter(|l| l.action == LedgerAction::Moved).count();
                inserted_off += r.pulses.inserted as i64 - missing as i64;
                let rej = r.pulses.rejected as i64 - events.iter().filter(|e| e.1.is_none()).count() as i64;
                dupl += rej;
                unstray += r.warnings.len();
            }
            println!("{name:10} {miss} {stray} {noise}: sections {sections}/10 slips {slips} wrong {wrong} moved {moved} inserted diff {inserted_off} rejected diff {dupl} warnings {unstray} time {:.0} ms", dt * 100.0);
        }
    }
}
