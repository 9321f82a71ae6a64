//! The motion against independent closed forms and quadrature.

#![allow(clippy::unwrap_used)]

use shaftwise_synth::{
    Difficulty, Exact, Hunting, Knot, Motion, Profile, Recipe, Speed, random_machine,
};

const RATE: f64 = 5000.0;

fn speeds() -> Vec<Speed> {
    let hunting = Speed {
        hunting: Some(Hunting {
            rms_rev_per_s: 0.5,
            slowest_hz: 0.03,
            fastest_hz: 0.8,
            sines: 24,
        }),
        start_angle_rev: 0.25,
        ..Speed::constant(24.6)
    };
    vec![
        Speed::constant(24.6),
        Speed::constant(30.0)
            .with_wobble(1.5, 0.3, 20.0)
            .with_wobble(-0.4, 2.1, -75.0),
        Speed::new(Profile::Ramp {
            start_rev_per_s: 8.0,
            slope_rev_per_s2: 0.7,
        }),
        Speed::new(Profile::Glide {
            knots: [(2.0, 8.0), (9.0, 30.0), (11.0, 28.0), (25.0, 50.0)]
                .map(|(at_s, rev_per_s)| Knot { at_s, rev_per_s })
                .to_vec(),
        }),
        Speed::new(Profile::Tanh {
            from_rev_per_s: 40.0,
            to_rev_per_s: 10.0,
            mid_s: 14.0,
            width_s: 3.0,
        }),
        hunting,
    ]
}

fn motions() -> Vec<Motion> {
    let recipes = speeds().into_iter().map(|s| Recipe::new(RATE, 30.0, s));
    recipes.map(|r| Motion::new(&r).unwrap()).collect()
}

/// Gauss–Legendre with five points (Abramowitz & Stegun 25.4.30, from memory).
fn quadrature(motion: &Motion, from: f64, to: f64) -> f64 {
    let nodes = [
        (0.0, 0.568_888_888_888_888_9),
        (0.538_469_310_105_683_1, 0.478_628_670_499_366_5),
        (0.906_179_845_938_664, 0.236_926_885_056_189_1),
    ];
    let (mid, half) = (0.5 * (from + to), 0.5 * (to - from));
    let sum = nodes.iter().map(|&(x, w)| match x {
        0.0 => w * motion.speed(mid),
        _ => w * (motion.speed(mid - half * x) + motion.speed(mid + half * x)),
    });
    half * sum.sum::<f64>()
}

#[test]
fn angle_is_the_integral_of_speed() {
    for motion in motions() {
        for step in 0..1600 {
            // up to 32 s, past the end; the knots and the ramp's end fall between steps
            let (from, to) = (f64::from(step) * 0.02, f64::from(step + 1) * 0.02);
            let part = quadrature(&motion, from, to);
            let exact = motion.angle(to).since(motion.angle(from));
            // h^10 rule: truncation < 1e-16 per step; rounding of speeds up to 50 over 0.02 s
            // 2e-16 each and of the difference 4e-16, of swings of up to 90 rev 1e-14 each
            assert!(
                (part - exact).abs() < 4e-14,
                "{motion:?} {from}: {part} {exact}"
            );
        }
    }
}

#[test]
fn known_angles() {
    let angle = |speed: &Speed, t: f64| {
        let motion = Motion::new(&Recipe::new(RATE, 30.0, speed.clone())).unwrap();
        motion.angle(t).value()
    };
    let all = speeds();
    assert!((angle(&all[0], 10.0) - 246.0).abs() < 1e-13);
    assert!((angle(&all[2], 10.0) - (80.0 + 35.0)).abs() < 1e-13);
    // after its end the ramp holds 8 + 0.7·30 = 29 rev/s
    assert!((angle(&all[2], 32.0) - (240.0 + 315.0 + 58.0)).abs() < 1e-12);
    // a glide covers its mean speed times its duration
    let glided = 2.0 * 8.0 + 7.0 * 19.0 + 2.0 * 29.0 + 14.0 * 39.0;
    assert!((angle(&all[3], 25.0) - glided).abs() < 1e-12);
    // tanh is odd about its middle
    assert!((angle(&all[4], 28.0) - 28.0 * 25.0).abs() < 1e-12);
    assert_eq!(angle(&all[5], 0.0), 0.25);
}

#[test]
fn hunting_has_its_rms() {
    let motion = &motions()[5];
    let count = 200_000;
    let squares: f64 = (0..count)
        .map(|i| (motion.speed(f64::from(i) * 0.5) - 24.6).powi(2))
        .sum();
    // over 1e5 s the cross terms of 24 sines at least 1e-3 Hz apart have gone: < 1 %
    let rms = (squares / f64::from(count)).sqrt();
    assert!((rms / 0.5 - 1.0).abs() < 0.01, "{rms}");
}

#[test]
fn time_at_undoes_angle() {
    for motion in motions() {
        for index in -40..400 {
            let time = Exact::from(f64::from(index) * 0.0913);
            let back = motion.time_at(motion.angle(time));
            // angle to 3e-14 rev at worst (swings of 90 rev), speed 8 rev/s or more
            assert!(
                back.since(time).abs() < 5e-15,
                "{motion:?} {time:?} {back:?}"
            );
        }
    }
}

#[test]
fn time_at_holds_on_random_machines() {
    for seed in 0..60 {
        let recipe = random_machine(seed, Difficulty::Hard);
        let motion = Motion::new(&recipe).unwrap();
        let [slowest, fastest] = motion.speed_bounds();
        for index in 0..50 {
            let time = Exact::from(recipe.seconds * f64::from(index) / 49.0);
            assert!(motion.time_at(motion.angle(time)).since(time).abs() < 1e-14);
            let speed = motion.speed(time);
            assert!(speed >= slowest - 1e-12 && speed <= fastest + 1e-12);
        }
    }
}

/// Sum of products in integers: speed and times are multiples of 2^-20, so nothing is rounded.
#[test]
fn days_cost_no_digits() {
    let speed = 24.6f64;
    let numerator = (speed * (1u64 << 48) as f64) as i128;
    assert_eq!(numerator as f64 / (1u64 << 48) as f64, speed);
    let motion = Motion::new(&Recipe::new(
        51_200.0,
        3.0 * 86_400.0,
        Speed::constant(speed),
    ))
    .unwrap();
    for whole in [0i64, 1, 86_399, 259_199, 9_999_999] {
        for part in [0u32, 1, 77_777, 1 << 19, (1 << 20) - 1] {
            let time = Exact::new(whole, f64::from(part) / f64::from(1 << 20));
            let ticks = i128::from(whole) * (1 << 20) + i128::from(part);
            let product = numerator * ticks;
            let turns = (product >> 68) as i64;
            let rest = (product & ((1i128 << 68) - 1)) as f64 / (1i128 << 68) as f64;
            let miss = motion.angle(time).since(Exact::new(turns, rest));
            assert!(miss.abs() < 4e-16, "{time:?} {miss}");
        }
    }
}

#[test]
fn index_times_are_exact_for_whole_and_broken_rates() {
    for index in [0i64, 1, 51_199, 51_200, 4_423_680_001, (1 << 50) + 12_345] {
        let time = Exact::index_time(index, 51_200.0);
        assert_eq!(time.whole, index / 51_200);
        assert_eq!(time.fraction, (index % 51_200) as f64 / 51_200.0);
        // 48 000/1.001 cannot be held exactly; go back through integers: time · rate = index
        let rate = 47_952.125;
        let time = Exact::index_time(index, rate);
        let back = i128::from(time.whole) * 383_617 - i128::from(index) * 8;
        // (index − whole·rate)/rate = fraction; whole·rate·8 is a whole number
        let fraction = -(back as f64) / 383_617.0;
        assert!((time.fraction - fraction).abs() < 3e-16, "{index}");
    }
}

#[test]
fn ratios_of_shafts_are_exact() {
    // 21 revolutions of this shaft for 13 of the main shaft, after 13e9 + 6.5 revolutions
    let angle = Exact::new(13_000_000_006, 0.5).ratio(21, 13);
    assert_eq!(angle.whole, 21_000_000_010);
    assert_eq!(angle.fraction, 0.5);
    let back = angle.ratio(13, 21);
    assert!(back.since(Exact::new(13_000_000_006, 0.5)).abs() < 3e-16);
    assert_eq!(Exact::new(-1, 0.5).ratio(1, 2).value(), -0.25);
}
