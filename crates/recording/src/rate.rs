//! Conversion to another sample rate at a fixed ratio.

use rubato::audioadapter_buffers::direct::SequentialSlice;
use rubato::{Fft, FixedSync, Resampler, WindowFunction};

use crate::Error;

/// Shortest transform on either side. The transition band is about seven lines
/// of it wide: 0.2 % of the lower rate.
const BLOCK: u64 = 4096;

/// Longest smallest block of a ratio; 48 000 to 51 199 needs 51 199.
const MAX_TERM: u64 = 1 << 18;

/// How far an approximated ratio may have drifted by the end, in output
/// samples.
const MAX_DRIFT: f64 = 1e-3;

/// Converts `samples` from one rate to another by a synchronous FFT resampler
/// (overlap-add, sinc under a squared Blackman-Harris window, cut off just
/// below the lower Nyquist frequency).
///
/// The delay is removed: output `n` belongs to the time `n / to_hz`, counted
/// from the first input sample, and the output has `round(len * to / from)`
/// samples. Before the first and after the last sample the input counts as
/// zero, which the filter shows within some 2000 samples of both ends. A ratio
/// of rates that are not whole numbers is approximated so well that the last
/// output sample is off by less than a thousandth of a sample.
///
/// # Errors
///
/// [`Error::Setting`] if a rate is not positive and finite, or if no ratio of
/// whole numbers up to 262 144 comes near enough.
pub fn convert_rate(samples: &[f64], from_hz: f64, to_hz: f64) -> Result<Vec<f64>, Error> {
    for rate in [from_hz, to_hz] {
        if !(rate > 0.0 && rate.is_finite()) {
            return Err(Error::Setting {
                what: "sample rate".into(),
                found: format!("{rate} Hz"),
                expected: "a positive number of Hz".into(),
            });
        }
    }
    if from_hz == to_hz || samples.is_empty() {
        return Ok(samples.to_vec());
    }
    let refuse = || Error::Setting {
        what: "ratio of sample rates".into(),
        found: format!("{to_hz} Hz over {from_hz} Hz"),
        expected: format!("a ratio of whole numbers up to {MAX_TERM}"),
    };
    let (up, down) = ratio(to_hz / from_hz, samples.len()).ok_or_else(refuse)?;
    // An even number of smallest blocks: half a transform is then a whole number
    // of samples on both sides, and so is the delay.
    let blocks = BLOCK.div_ceil(up.min(down)).next_multiple_of(2);
    let block_in = (blocks * down) as usize;
    let mut resampler = Fft::<f64>::new_custom(
        down as usize,
        up as usize,
        block_in,
        1,
        1,
        WindowFunction::BlackmanHarris2,
        FixedSync::Both,
    )
    .map_err(|_| refuse())?;
    let block_out = resampler.output_frames_next();
    let delay = resampler.output_delay();
    let wanted = (samples.len() as f64 * to_hz / from_hz).round() as usize;

    let mut out = Vec::with_capacity(wanted + block_out);
    let mut input = vec![0.0; block_in];
    let mut output = vec![0.0; block_out];
    let mut chunks = samples.chunks(block_in);
    // what comes out during the delay lies before the first sample
    let mut early = delay;
    while out.len() < wanted {
        let chunk = chunks.next().unwrap_or_default();
        input[..chunk.len()].copy_from_slice(chunk);
        input[chunk.len()..].fill(0.0);
        let source = SequentialSlice::new(&input, 1, block_in).map_err(|_| refuse())?;
        let mut sink = SequentialSlice::new_mut(&mut output, 1, block_out).map_err(|_| refuse())?;
        resampler
            .process_into_buffer(&source, &mut sink, None)
            .map_err(|_| refuse())?;
        let skip = early.min(block_out);
        early -= skip;
        out.extend_from_slice(&output[skip..]);
    }
    out.truncate(wanted);
    Ok(out)
}

/// The simplest fraction near enough to `ratio` for a signal of `len` samples:
/// the first good convergent of its continued fraction.
fn ratio(ratio: f64, len: usize) -> Option<(u64, u64)> {
    let (mut p, mut q) = ((1u64, 0u64), (0u64, 1u64));
    let mut rest = ratio;
    loop {
        let whole = rest.floor();
        // an exact fraction leaves a rest of 0 and comes here as infinity
        if whole > MAX_TERM as f64 {
            return None;
        }
        let next = |(last, before): (u64, u64)| (whole as u64 * last + before, last);
        (p, q) = (next(p), next(q));
        if p.0 > MAX_TERM || q.0 > MAX_TERM {
            return None;
        }
        let off = (p.0 as f64 / q.0 as f64 - ratio).abs() * len as f64;
        if p.0 > 0 && off <= MAX_DRIFT {
            return Some((p.0, q.0));
        }
        rest = 1.0 / (rest - whole);
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    /// Amplitude and delay in samples of the best sine of known frequency,
    /// by least squares over samples away from the ends.
    fn sine_of(samples: &[f64], cycles_per_sample: f64, ends: usize) -> (f64, f64) {
        let (mut cc, mut cs, mut ss, mut xc, mut xs) = (0.0, 0.0, 0.0, 0.0, 0.0);
        for (n, x) in samples
            .iter()
            .enumerate()
            .skip(ends)
            .take(samples.len() - 2 * ends)
        {
            let (s, c) = (2.0 * PI * cycles_per_sample * n as f64).sin_cos();
            cc += c * c;
            cs += c * s;
            ss += s * s;
            xc += x * c;
            xs += x * s;
        }
        let det = cc * ss - cs * cs;
        let (a, b) = ((xc * ss - xs * cs) / det, (xs * cc - xc * cs) / det);
        (a.hypot(b), a.atan2(b) / (2.0 * PI * cycles_per_sample))
    }

    #[test]
    fn tones_keep_level_and_time_up_to_nine_tenths_of_the_lower_nyquist() {
        // The window's side lobes lie below −180 dB, 1e-8 of a level in dB and of
        // a sample; a ratio that is no fraction drifts by MAX_DRIFT, and a phase
        // that slides that far costs its square in level.
        let (exact, drifting) = ((1e-7, 1e-8), (1e-4, MAX_DRIFT));
        for (from, to, (level_tolerance, delay_tolerance)) in [
            (51_200.0, 48_000.0, exact),
            (44_100.0, 48_000.0, exact),
            (48_000.0, 16_000.0, exact),
            (8192.0, 65_536.0, exact),
            (12_987.5, 48_000.0, exact),
            (30.01 * 256.0, 16_000.0, exact),
            (5000.0 * PI, 16_000.0, drifting),
        ] {
            for share in [0.01, 0.3, 0.9] {
                let tone = share * f64::min(from, to) / 2.0;
                let samples: Vec<f64> = (0..60_000)
                    .map(|n| 0.7 * (2.0 * PI * tone * f64::from(n) / from).sin())
                    .collect();
                let out = convert_rate(&samples, from, to).unwrap();
                assert_eq!(out.len(), (60_000.0 * to / from).round() as usize);
                let ends = (6000.0 * f64::max(1.0, to / from)) as usize;
                let (amplitude, delay) = sine_of(&out, tone / to, ends);
                let level_db = 20.0 * (amplitude / 0.7).log10();
                assert!(
                    level_db.abs() < level_tolerance,
                    "{from} {to} {tone}: {level_db} dB"
                );
                assert!(
                    delay.abs() < delay_tolerance,
                    "{from} {to} {tone}: {delay} samples"
                );
            }
        }
    }

    #[test]
    fn tones_above_the_lower_nyquist_are_gone() {
        let samples: Vec<f64> = (0..60_000)
            .map(|n| (2.0 * PI * 9000.0 * f64::from(n) / 48_000.0).sin())
            .collect();
        let out = convert_rate(&samples, 48_000.0, 16_000.0).unwrap();
        // within the ends the tone is switched on and off, which is broad
        let rest = out[4000..out.len() - 4000]
            .iter()
            .fold(0.0, |a: f64, x| a.max(x.abs()));
        assert!(rest < 1e-9, "{rest:e}");
    }

    #[test]
    fn fractions_are_the_simplest_that_do() {
        assert_eq!(ratio(48_000.0 / 44_100.0, 1_000_000), Some((160, 147)));
        assert_eq!(ratio(0.25, 10), Some((1, 4)));
        assert_eq!(ratio(PI, 100), Some((355, 113)));
        assert_eq!(ratio(1e-12, 10), None);
        assert_eq!(ratio(f64::MAX, 10), None);
    }

    #[test]
    fn rates_that_cannot_be_are_refused() {
        for (from, to) in [
            (0.0, 1.0),
            (1.0, f64::NAN),
            (-1.0, 1.0),
            (1.0, f64::INFINITY),
            (1e-9, 1e9),
        ] {
            assert!(convert_rate(&[1.0, 2.0], from, to).is_err(), "{from} {to}");
        }
        assert_eq!(convert_rate(&[], 1.0, 2.0).unwrap(), []);
    }
}
