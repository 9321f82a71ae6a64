//! The three inner loops that take the time, compiled for AVX-512, for AVX2 with FMA, and for any
//! processor; the widest the processor has is chosen.
//!
//! One body serves both (`const FMA`), so the twins cannot drift apart; they differ only in the
//! rounding of a fused multiply-add. This is the one file of the workspace that may hold
//! `unsafe`: the calls of functions compiled for processor features that were asked for first.
#![allow(unsafe_code)]

/// Instruction set the inner loops run on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum CpuLevel {
    /// Any processor.
    Portable,
    /// AVX2 and FMA, asked of the processor; made by [`CpuLevel::detect`] only.
    Avx2Fma,
    /// AVX-512F beside them, likewise. The same operations in wider registers: the same bits.
    Avx512,
}

impl CpuLevel {
    pub(crate) fn detect() -> Self {
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx512f")
            && std::arch::is_x86_feature_detected!("avx2")
            && std::arch::is_x86_feature_detected!("fma")
        {
            return Self::Avx512;
        }
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma")
        {
            return Self::Avx2Fma;
        }
        Self::Portable
    }
}

/// Lanes worked on together: two AVX2 registers of f64.
pub(crate) const LANES: usize = 8;

/// What the weights of one instant depend on.
#[derive(Debug, Clone, Copy)]
pub(crate) struct WeightShape<'a> {
    /// Cut-off relative to the signal's own Nyquist frequency, 0…1.
    pub(crate) scale: f64,
    /// Position relative to the centre sample, −0.5…0.5.
    pub(crate) fraction: f64,
    /// Samples on either side of the centre.
    pub(crate) reach: usize,
    /// 1 / half width², half width in samples at the cut-off's own rate.
    pub(crate) inverse_square_half_width: f64,
    /// Window polynomial in y = 1 − 2(x/half width)², lowest power first.
    pub(crate) polynomial: &'a [f64],
}

macro_rules! twins {
    ($name:ident, $body:ident, ($($arg:ident : $kind:ty),*) $(-> $out:ty)?) => {
        pub(crate) fn $name(level: CpuLevel, $($arg: $kind),*) $(-> $out)? {
            #[cfg(target_arch = "x86_64")]
            {
                #[target_feature(enable = "avx2,fma")]
                fn fused($($arg: $kind),*) $(-> $out)? {
                    $body::<true>($($arg),*)
                }
                #[target_feature(enable = "avx512f,avx2,fma")]
                fn wide($($arg: $kind),*) $(-> $out)? {
                    $body::<true>($($arg),*)
                }
                match level {
                    // SAFETY: the two levels exist only where `detect` found their features.
                    CpuLevel::Avx512 => return unsafe { wide($($arg),*) },
                    CpuLevel::Avx2Fma => return unsafe { fused($($arg),*) },
                    CpuLevel::Portable => {}
                }
            }
            let _ = level;
            $body::<false>($($arg),*)
        }
    };
}

twins!(fill_weights, fill_weights_body, (shape: &WeightShape<'_>, weights: &mut [f64]) -> f64);
twins!(dot, dot_body, (weights: &[f64], samples: &[f64]) -> f64);
twins!(half_band, half_band_body, (pairs: &[f64], even: &[f64], odd: &[f64], out: &mut [f64]));

#[inline(always)]
fn fma<const FMA: bool>(a: f64, b: f64, c: f64) -> f64 {
    if FMA { a.mul_add(b, c) } else { a * b + c }
}

/// (sin πx, cos πx) for |x| < 2^51, error below 3e-16.
///
/// x is reduced to |r| ≤ 1/4 exactly; Taylor's series of πr to the 17th power leaves 5e-17 out.
/// Own code, because the C library's sine differs between systems and the bytes must not.
#[inline(always)]
pub(crate) fn sin_cos_pi<const FMA: bool>(x: f64) -> (f64, f64) {
    const SIN: [f64; 9] = [
        1.0,
        -1.0 / 6.0,
        1.0 / 120.0,
        -1.0 / 5_040.0,
        1.0 / 362_880.0,
        -1.0 / 39_916_800.0,
        1.0 / 6_227_020_800.0,
        -1.0 / 1_307_674_368_000.0,
        1.0 / 355_687_428_096_000.0,
    ];
    const COS: [f64; 9] = [
        1.0,
        -0.5,
        1.0 / 24.0,
        -1.0 / 720.0,
        1.0 / 40_320.0,
        -1.0 / 3_628_800.0,
        1.0 / 479_001_600.0,
        -1.0 / 87_178_291_200.0,
        1.0 / 20_922_789_888_000.0,
    ];
    let quarter_turns = (2.0 * x).round();
    let a = std::f64::consts::PI * (x - 0.5 * quarter_turns);
    let square = a * a;
    let (mut sin, mut cos) = (SIN[8], COS[8]);
    for k in (0..8).rev() {
        sin = fma::<FMA>(sin, square, SIN[k]);
        cos = fma::<FMA>(cos, square, COS[k]);
    }
    sin *= a;
    match (quarter_turns as i64).rem_euclid(4) {
        0 => (sin, cos),
        1 => (cos, -sin),
        2 => (-sin, -cos),
        _ => (-cos, sin),
    }
}

/// Windowed-sinc weights for taps −reach…reach around the centre sample, zeros up to the end of
/// `weights` (a multiple of [`LANES`]); returns their sum. Not normalised: w(d) = sin(πsd)/d · W.
#[inline(always)]
fn fill_weights_body<const FMA: bool>(shape: &WeightShape<'_>, weights: &mut [f64]) -> f64 {
    let s = shape.scale;
    let first = -(shape.reach as f64) - shape.fraction;
    // Lane l starts at angle π s (first + l); each group turns all lanes by 8 π s.
    let turn = |(a, b): (f64, f64), (c, d): (f64, f64)| (a * d + b * c, b * d - a * c);
    let r1 = sin_cos_pi::<FMA>(s);
    let r2 = turn(r1, r1);
    let r4 = turn(r2, r2);
    let (turn_sin, turn_cos) = turn(r4, r4);
    let start = sin_cos_pi::<FMA>(s * first);
    let mut lanes = [start; LANES];
    lanes[1] = turn(start, r1);
    for l in 2..4 {
        lanes[l] = turn(lanes[l - 2], r2);
    }
    for l in 4..8 {
        lanes[l] = turn(lanes[l - 4], r4);
    }
    let mut sin = lanes.map(|lane| lane.0);
    let mut cos = lanes.map(|lane| lane.1);
    let mut distance: [f64; LANES] = std::array::from_fn(|l| first + l as f64);
    let to_square = s * s * shape.inverse_square_half_width;
    let (&top, rest) = match shape.polynomial.split_last() {
        Some(parts) => parts,
        None => return 0.0,
    };
    let mut sums = [0.0; LANES];
    for group in weights.chunks_exact_mut(LANES) {
        let mut y = [0.0; LANES];
        for l in 0..LANES {
            y[l] = fma::<FMA>(-2.0 * to_square, distance[l] * distance[l], 1.0);
        }
        let mut value = [top; LANES];
        for &coefficient in rest.iter().rev() {
            for l in 0..LANES {
                value[l] = fma::<FMA>(value[l], y[l], coefficient);
            }
        }
        for l in 0..LANES {
            // y < −1 lies outside the window.
            let inside = if y[l] >= -1.0 { value[l] } else { 0.0 };
            group[l] = inside * sin[l] / distance[l];
            let next_sin = fma::<FMA>(sin[l], turn_cos, cos[l] * turn_sin);
            cos[l] = fma::<FMA>(cos[l], turn_cos, -(sin[l] * turn_sin));
            sin[l] = next_sin;
            distance[l] += LANES as f64;
        }
        for l in 0..LANES {
            sums[l] += group[l];
        }
    }
    // The centre tap, where sin/d from the running rotation would lose its digits.
    let d = -shape.fraction;
    let centre = if d == 0.0 {
        std::f64::consts::PI * s
    } else {
        sin_cos_pi::<FMA>(s * d).0 / d
    };
    let y = 1.0 - 2.0 * to_square * d * d;
    let window = rest
        .iter()
        .rev()
        .fold(top, |value, c| fma::<FMA>(value, y, *c));
    let wrong = weights[shape.reach];
    weights[shape.reach] = centre * window;
    let mut sum = 0.0;
    if wrong.is_finite() {
        for pair in sums {
            sum += pair;
        }
        sum - wrong + weights[shape.reach]
    } else {
        for weight in weights.iter() {
            sum += weight;
        }
        sum
    }
}

/// Σ weights·samples over the length of `weights`, in a fixed order of 16 partial sums.
#[inline(always)]
fn dot_body<const FMA: bool>(weights: &[f64], samples: &[f64]) -> f64 {
    let samples = &samples[..weights.len()];
    let mut sums = [[0.0; LANES]; 2];
    let mut w = weights.chunks_exact(2 * LANES);
    let mut x = samples.chunks_exact(2 * LANES);
    for (w, x) in w.by_ref().zip(x.by_ref()) {
        for l in 0..LANES {
            sums[0][l] = fma::<FMA>(w[l], x[l], sums[0][l]);
            sums[1][l] = fma::<FMA>(w[LANES + l], x[LANES + l], sums[1][l]);
        }
    }
    for (l, (w, x)) in w.remainder().iter().zip(x.remainder()).enumerate() {
        sums[0][l % LANES] = fma::<FMA>(*w, *x, sums[0][l % LANES]);
    }
    let mut total = 0.0;
    for l in 0..LANES {
        total += sums[0][l] + sums[1][l];
    }
    total
}

/// `out[n] = ½ even[n + K] + Σ_{k<K} pairs[k] (odd[n+K+k] + odd[n+K−1−k])`, K = `pairs.len()`.
#[inline(always)]
fn half_band_body<const FMA: bool>(pairs: &[f64], even: &[f64], odd: &[f64], out: &mut [f64]) {
    let reach = pairs.len();
    let count = out.len();
    let even = &even[reach..reach + count];
    let odd = &odd[..count + 2 * reach - 1];
    // Four registers' worth of outputs at once: one alone would wait for its own sum.
    const OUTPUTS: usize = 4 * LANES;
    let whole = count - count % OUTPUTS;
    for start in (0..whole).step_by(OUTPUTS) {
        let mut sums = [0.0; OUTPUTS];
        for (k, &c) in pairs.iter().enumerate() {
            let ahead = &odd[start + reach + k..][..OUTPUTS];
            let behind = &odd[start + reach - 1 - k..][..OUTPUTS];
            for l in 0..OUTPUTS {
                sums[l] = fma::<FMA>(c, ahead[l] + behind[l], sums[l]);
            }
        }
        for l in 0..OUTPUTS {
            out[start + l] = fma::<FMA>(0.5, even[start + l], sums[l]);
        }
    }
    for n in whole..count {
        let mut sum = 0.0;
        for (k, &c) in pairs.iter().enumerate() {
            sum = fma::<FMA>(c, odd[n + reach + k] + odd[n + reach - 1 - k], sum);
        }
        out[n] = fma::<FMA>(0.5, even[n], sum);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sine_and_cosine_keep_their_digits() {
        for i in -4000..4000 {
            let x = f64::from(i) * 0.003_7;
            let (s, c) = sin_cos_pi::<false>(x);
            // The library call sees π x rounded, which alone costs |πx| eps.
            let tolerance = 4e-16 + (x * 3.2).abs() * 2.3e-16;
            assert!(
                (s - (std::f64::consts::PI * x).sin()).abs() < tolerance,
                "{x}"
            );
            assert!(
                (c - (std::f64::consts::PI * x).cos()).abs() < tolerance,
                "{x}"
            );
            assert!((s * s + c * c - 1.0).abs() < 6e-16);
        }
        assert_eq!(sin_cos_pi::<false>(1e6), (0.0, 1.0));
        assert_eq!(sin_cos_pi::<false>(0.5), (1.0, 0.0));
    }

    #[test]
    fn wider_registers_give_the_same_bits() {
        if CpuLevel::detect() != CpuLevel::Avx512 {
            return;
        }
        let polynomial: Vec<f64> = (0..14).map(|k| 0.9f64.powi(k)).collect();
        for (scale, fraction, reach) in [(1.0, 0.31, 22), (0.437, -0.5, 50), (0.9, 1e-13, 24)] {
            let shape = WeightShape {
                scale,
                fraction,
                reach,
                inverse_square_half_width: 1.0 / 484.0,
                polynomial: &polynomial,
            };
            let length = (2 * reach + 1).next_multiple_of(LANES);
            let (mut a, mut b) = (vec![0.0; length], vec![0.0; length]);
            let sums = [
                fill_weights(CpuLevel::Avx2Fma, &shape, &mut a),
                fill_weights(CpuLevel::Avx512, &shape, &mut b),
            ];
            assert_eq!((sums[0], a.clone()), (sums[1], b));
            let samples: Vec<f64> = (0..length).map(|i| (i as f64 * 0.7).sin()).collect();
            assert_eq!(
                dot(CpuLevel::Avx2Fma, &a, &samples),
                dot(CpuLevel::Avx512, &a, &samples)
            );
        }
    }

    #[test]
    fn the_twins_agree() {
        let level = CpuLevel::detect();
        let polynomial = [0.2, 0.3, 0.4, 0.1];
        for (scale, fraction, reach) in [
            (1.0, 0.31, 20),
            (0.437, -0.5, 45),
            (0.21, 0.0, 95),
            (0.9, 1e-13, 22),
        ] {
            let shape = WeightShape {
                scale,
                fraction,
                reach,
                inverse_square_half_width: 1.0 / 400.0,
                polynomial: &polynomial,
            };
            let length = (2 * reach + 1).next_multiple_of(LANES);
            // Dirty scratch must not show.
            let (mut a, mut b) = (vec![f64::NAN; length], vec![7.0; length]);
            let sum_a = fill_weights(CpuLevel::Portable, &shape, &mut a);
            let sum_b = fill_weights(level, &shape, &mut b);
            // Weights are at most π; the running rotation adds one rounding per group.
            let tolerance = std::f64::consts::PI * f64::EPSILON * (length / LANES + 8) as f64;
            assert!((sum_a - sum_b).abs() <= tolerance * 8.0);
            for (a, b) in a.iter().zip(&b) {
                assert!((a - b).abs() <= tolerance, "{a} {b}");
            }
            let samples: Vec<f64> = (0..length).map(|i| (i as f64 * 0.7).sin()).collect();
            let (x, y) = (
                dot(CpuLevel::Portable, &a, &samples),
                dot(level, &a, &samples),
            );
            assert!((x - y).abs() <= length as f64 * f64::EPSILON * 3.2);
        }
        for count in [0, 1, 7, 32, 77] {
            let pairs = [0.3, -0.07, 0.02];
            let even: Vec<f64> = (0..count + 6).map(|i| (i as f64).cos()).collect();
            let odd: Vec<f64> = (0..count + 6).map(|i| (1.3 * i as f64).sin()).collect();
            let (mut a, mut b) = (vec![f64::NAN; count], vec![0.0; count]);
            half_band(CpuLevel::Portable, &pairs, &even, &odd, &mut a);
            half_band(level, &pairs, &even, &odd, &mut b);
            for (n, (a, b)) in a.iter().zip(&b).enumerate() {
                assert!((a - b).abs() <= 8.0 * f64::EPSILON);
                let naive: f64 = 0.5 * even[n + 3]
                    + (0..3)
                        .map(|k| pairs[k] * (odd[n + 3 + k] + odd[n + 2 - k]))
                        .sum::<f64>();
                assert!((a - naive).abs() <= 8.0 * f64::EPSILON);
            }
        }
    }
}
