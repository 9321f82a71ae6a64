//! The rotation of a shaft: angle over time, with its uncertainty and its ledger.

use crate::numbering::{self, Numbering};
use crate::sampling;
use crate::section::Motion;
use crate::smoother::{self, Pulse, Smoothed};
use crate::{Error, LedgerAction, LedgerEntry, Section, TachScan};
use shaftwise_signal::SamplePosition;

/// What the zero of the angle means.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PhaseReference {
    /// Angle 0 is the timed edge of the one pulse per revolution.
    Pulse,
    /// Angle 0 is the edge of some tooth: known up to a multiple of one tooth.
    Arbitrary,
    /// Angle 0 means nothing.
    None,
}

/// How the pulses were counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct PulseCount {
    /// Pulses found and timed.
    pub timed: u64,
    /// Pulses that belong to a tooth: timed less rejected.
    pub used: u64,
    /// Teeth without a pulse.
    pub inserted: u64,
    /// Pulses that belong to no tooth.
    pub rejected: u64,
}

/// What must be known beside the pulses.
#[derive(Debug, Clone, PartialEq)]
pub struct RotationConfig {
    /// Sample rate of the recording in Hz.
    pub sample_rate_hz: f64,
    /// Length of the recording in samples; pulses beyond it are left out.
    pub total_samples: u64,
    /// Pulses per revolution. Range: 1 to 4096.
    pub pulses_per_rev: u32,
}

/// The angle of a shaft as a function of time.
#[derive(Debug, Clone, PartialEq)]
pub struct Rotation {
    /// Sample rate of the recording in Hz.
    pub sample_rate_hz: f64,
    /// Stretches without a break, in order.
    pub sections: Vec<Section>,
    /// What the zero of the angle means.
    pub phase_reference: PhaseReference,
    /// Every repair, in time order.
    pub ledger: Vec<LedgerEntry>,
    /// How the pulses were counted.
    pub pulses: PulseCount,
    /// Standard deviation of a pulse's instant as found in the data, in seconds.
    pub timing_sigma_s: f64,
    /// What was taken off the pulses for the sampling of their short edges, rms in seconds; 0 where
    /// no such error was found.
    pub sampling_error_s: f64,
    /// Pulses per revolution.
    pub pulses_per_rev: u32,
    /// Width of the timed edge (10 to 90 %) in degrees at the mean speed, where a channel was scanned.
    pub edge_width_deg: Option<f64>,
    /// Width of the pulse in degrees at the mean speed, where a channel was scanned.
    pub pulse_width_deg: Option<f64>,
    /// What is doubtful, in words.
    pub warnings: Vec<String>,
}

/// Speed at even steps of time.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SpeedCurve {
    /// Seconds from the first sample.
    pub time_s: Vec<f64>,
    /// Revolutions since the rotation's first pulse.
    pub revs: Vec<f64>,
    /// Speed in rpm.
    pub rpm: Vec<f64>,
    /// One standard deviation of the speed in rpm.
    pub rpm_sigma: Vec<f64>,
}

/// The rotation behind a list of pulse times, in seconds from the first sample, rising.
///
/// # Errors
///
/// Settings out of range, times out of order or not finite, fewer than [`LEAST_PULSES`]
/// usable pulses.
pub fn rotation_from_times(times_s: &[f64], config: &RotationConfig) -> Result<Rotation, Error> {
    check(config)?;
    let mut previous = f64::NEG_INFINITY;
    let mut positions = Vec::with_capacity(times_s.len());
    for (index, &time) in times_s.iter().enumerate() {
        if !(time.is_finite() && time > previous) {
            return Err(Error::TimeOrder {
                number: index + 1,
                found: time,
                previous,
            });
        }
        previous = time;
        if time >= 0.0 {
            positions.push(SamplePosition::from_seconds(time, config.sample_rate_hz));
        }
    }
    let outside = |p: &SamplePosition| p.index < config.total_samples;
    positions.retain(outside);
    let mut warnings = Vec::new();
    let left_out = times_s.len() - positions.len();
    if left_out > 0 {
        warnings.push(format!(
            "{left_out} pulse times lie outside the recording and are left out"
        ));
    }
    assemble(&positions, None, config, warnings)
}

/// The rotation behind the edges of a tach channel.
///
/// # Errors
///
/// Settings out of range, fewer than [`LEAST_PULSES`] usable pulses.
pub fn rotation_from_scan(scan: &TachScan, config: &RotationConfig) -> Result<Rotation, Error> {
    check(config)?;
    let edge_sigma = scan.edge_sigma_s * config.sample_rate_hz;
    // An edge that the recording's start or end cuts into has no level on one side: its half-way
    // point is anybody's guess. Whole ones keep their own width and the timing's blur away.
    let whole = (scan.edge_width_s * config.sample_rate_hz + 3.0 * scan.smoothing).ceil() as u64;
    let inside = |p: &SamplePosition| p.index >= whole && p.index + whole < config.total_samples;
    let (positions, cut): (Vec<_>, Vec<_>) = scan
        .edges
        .iter()
        .map(|edge| edge.position)
        .partition(inside);
    let mut rotation = assemble(&positions, Some(edge_sigma), config, scan.warnings.clone())?;
    for position in cut {
        rotation.pulses.timed += 1;
        rotation.pulses.rejected += 1;
        rotation.ledger.push(LedgerEntry {
            time_s: position.seconds(config.sample_rate_hz),
            action: LedgerAction::Rejected,
            reason: "its edge is cut by the start or end of the recording".to_owned(),
        });
    }
    rotation
        .ledger
        .sort_by(|a, b| a.time_s.total_cmp(&b.time_s));
    let degrees = 360.0 * rotation.mean_speed();
    rotation.edge_width_deg = Some(scan.edge_width_s * degrees);
    rotation.pulse_width_deg = Some(scan.pulse_width_s * degrees);
    Ok(rotation)
}

/// Fewest pulses a section is made of: a polynomial of degree 4 goes through any five.
pub const LEAST_PULSES: usize = 6;

fn check(config: &RotationConfig) -> Result<(), Error> {
    if !(config.sample_rate_hz > 0.0 && config.sample_rate_hz.is_finite()) {
        return Err(Error::SampleRate {
            found: config.sample_rate_hz,
        });
    }
    if !(1..=4096).contains(&config.pulses_per_rev) {
        return Err(Error::PulsesPerRev {
            found: config.pulses_per_rev,
            most: 4096,
        });
    }
    Ok(())
}

/// A section and its dropped pulses: index, distance from the motion in samples.
fn section(
    pulses: &[Pulse],
    mut fit: Smoothed,
    config: &RotationConfig,
) -> (Section, Vec<(usize, f64)>) {
    let per_rev = i64::from(config.pulses_per_rev);
    for sigma in &mut fit.sigma {
        // From 1/(samples per rev) to rev/s.
        sigma[1] *= config.sample_rate_hz as f32;
    }
    let first = pulses[0].tooth;
    let section = Section {
        first_rev: first.div_euclid(per_rev),
        first_fraction: first.rem_euclid(per_rev) as f64 / per_rev as f64,
        span_knots: fit.span_knots,
        knots_per_rev: fit.knots_per_rev,
        sample_rate_hz: config.sample_rate_hz,
        motion: Motion::Spline {
            origin: fit.origin,
            bits: fit.bits,
            coefficients: fit.coefficients,
            sigma: fit.sigma,
        },
    };
    (section, fit.dropped)
}

/// `edge_sigma`: for edges of a sampled channel, what is known of their own timing noise, in samples.
pub(crate) fn assemble(
    positions: &[SamplePosition],
    edge_sigma: Option<f64>,
    config: &RotationConfig,
    mut warnings: Vec<String>,
) -> Result<Rotation, Error> {
    let rate = config.sample_rate_hz;
    let sampled = edge_sigma.is_some();
    let edge_sigma = edge_sigma.unwrap_or(0.0);
    if positions.len() < LEAST_PULSES {
        return Err(Error::TooFewPulses {
            found: positions.len(),
            least: LEAST_PULSES,
        });
    }
    let Numbering {
        mut stretches,
        mut ledger,
        rejected,
        warnings: doubts,
    } = numbering::number(positions, config.pulses_per_rev, edge_sigma, rate);
    warnings.extend(doubts);
    if stretches.is_empty() {
        let found = positions.len() - rejected as usize;
        return Err(Error::TooFewPulses {
            found,
            least: LEAST_PULSES,
        });
    }
    let lay = |stretches: &mut [Vec<Pulse>]| -> Result<_, Error> {
        let (smoothing, fits) = smoother::smooth(stretches, config.pulses_per_rev, edge_sigma)?;
        let laid: Vec<_> = stretches
            .iter()
            .zip(fits)
            .map(|(p, fit)| section(p, fit, config))
            .collect();
        Ok((smoothing, laid))
    };
    let per_rev = i64::from(config.pulses_per_rev);
    let tooth_at = |section: &Section, tooth: i64| {
        section.at(
            tooth.div_euclid(per_rev),
            tooth.rem_euclid(per_rev) as f64 / per_rev as f64,
        )
    };
    let teeth = |stretches: &mut [Vec<Pulse>]| -> Result<_, Error> {
        let (_, laid) = lay(stretches)?;
        let of_section = |(pulses, (section, _)): (&Vec<Pulse>, &(Section, _))| {
            pulses
                .iter()
                .map(|pulse| tooth_at(section, pulse.tooth).position)
                .collect()
        };
        Ok(stretches.iter().zip(&laid).map(of_section).collect())
    };
    let sampling_error = if sampled {
        sampling::correct(&mut stretches, teeth)?
    } else {
        0.0
    };
    let (smoothing, laid) = lay(&mut stretches)?;
    let mut sections = Vec::with_capacity(laid.len());
    let mut inserted = 0;
    for (pulses, (section, dropped)) in stretches.into_iter().zip(laid) {
        for (index, off) in dropped {
            let pulse = &pulses[index];
            let speed = section.speed_at(pulse.position);
            ledger.push(LedgerEntry {
                time_s: pulse.position.seconds(rate),
                action: LedgerAction::Moved,
                reason: format!(
                    "pulse {:+.1} us ({:+.3} deg) off the smooth motion; its instant is not used",
                    off / rate * 1e6,
                    off / rate * speed * 360.0
                ),
            });
        }
        for pair in pulses.windows(2) {
            for tooth in pair[0].tooth + 1..pair[1].tooth {
                inserted += 1;
                let instant = tooth_at(&section, tooth);
                ledger.push(LedgerEntry {
                    time_s: instant.position.seconds(rate),
                    action: LedgerAction::Inserted,
                    reason: "no pulse where one was due".to_owned(),
                });
            }
        }
        sections.push(section);
    }
    ledger.sort_by(|a, b| a.time_s.total_cmp(&b.time_s));
    let timed = positions.len() as u64;
    Ok(Rotation {
        sample_rate_hz: rate,
        sections,
        phase_reference: if config.pulses_per_rev == 1 {
            PhaseReference::Pulse
        } else {
            PhaseReference::Arbitrary
        },
        ledger,
        pulses: PulseCount {
            timed,
            used: timed - rejected,
            inserted,
            rejected,
        },
        timing_sigma_s: smoothing.sigma / rate,
        sampling_error_s: sampling_error / rate,
        pulses_per_rev: config.pulses_per_rev,
        edge_width_deg: None,
        pulse_width_deg: None,
        warnings,
    })
}

impl Rotation {
    /// A shaft that turns steadily at `speed_rev_s` for `revs` revolutions from `start`.
    ///
    /// # Panics
    ///
    /// If the rate or the speed is not positive and finite, or there are no revolutions.
    #[must_use]
    pub fn steady(sample_rate_hz: f64, start: SamplePosition, revs: u64, speed_rev_s: f64) -> Self {
        let samples_per_rev = sample_rate_hz / speed_rev_s;
        assert!(
            samples_per_rev > 0.0 && samples_per_rev < 1e15 && revs > 0,
            "{revs} revolutions at {speed_rev_s} rev/s and {sample_rate_hz} Hz"
        );
        let whole = samples_per_rev.floor();
        let section = Section {
            first_rev: 0,
            first_fraction: 0.0,
            span_knots: revs as f64,
            knots_per_rev: 1,
            sample_rate_hz,
            motion: Motion::Steady {
                start,
                whole: whole as u64,
                rest: samples_per_rev - whole,
            },
        };
        Self {
            sample_rate_hz,
            sections: vec![section],
            phase_reference: PhaseReference::None,
            ledger: Vec::new(),
            pulses: PulseCount::default(),
            timing_sigma_s: 0.0,
            sampling_error_s: 0.0,
            pulses_per_rev: 1,
            edge_width_deg: None,
            pulse_width_deg: None,
            warnings: Vec::new(),
        }
    }

    /// Revolutions in all sections.
    #[must_use]
    pub fn revs(&self) -> f64 {
        self.sections.iter().map(Section::span_rev).sum()
    }

    /// Seconds in all sections.
    #[must_use]
    pub fn seconds(&self) -> f64 {
        let samples: f64 = self.sections.iter().map(|s| s.end().since(s.start())).sum();
        samples / self.sample_rate_hz
    }

    /// Mean speed in rev/s: revolutions over seconds.
    #[must_use]
    pub fn mean_speed(&self) -> f64 {
        self.revs() / self.seconds()
    }

    /// Lowest and highest speed at the knots, in rev/s.
    #[must_use]
    pub fn speed_range(&self) -> (f64, f64) {
        self.sections
            .iter()
            .flat_map(Section::knot_speeds)
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), s| {
                (a.min(s), b.max(s))
            })
    }

    /// Standard deviation of the angle in degrees, root mean square over the run.
    #[must_use]
    pub fn angle_sigma_deg(&self) -> f64 {
        let (mut squares, mut count) = (0.0, 0u64);
        for section in &self.sections {
            if let Motion::Spline { sigma, .. } = &section.motion {
                count += sigma.len() as u64;
                squares += sigma.iter().map(|s| f64::from(s[0]).powi(2)).sum::<f64>();
            }
        }
        if count == 0 {
            0.0
        } else {
            360.0 * (squares / count as f64).sqrt()
        }
    }

    /// The order at which the angle's scatter makes 10 degrees of phase (common practice);
    /// infinite where the angle has no scatter.
    #[must_use]
    pub fn highest_trusted_order(&self) -> f64 {
        10.0 / self.angle_sigma_deg()
    }

    /// Speed every `step_s` seconds from the start of each section to its end.
    ///
    /// # Panics
    ///
    /// If the step is not positive.
    #[must_use]
    pub fn curve(&self, step_s: f64) -> SpeedCurve {
        assert!(step_s > 0.0, "a step of {step_s} s");
        let mut curve = SpeedCurve::default();
        let step = step_s * self.sample_rate_hz;
        for section in &self.sections {
            let start = section.start();
            let steps = (section.end().since(start) / step).floor() as u64;
            for i in 0..=steps {
                let offset = start.fraction + i as f64 * step;
                let position = SamplePosition::new(start.index, offset);
                let (rev, fraction) = section.angle_at(position);
                curve.time_s.push(position.seconds(self.sample_rate_hz));
                curve.revs.push(rev as f64 + fraction);
                curve.rpm.push(60.0 * section.speed_at(position));
                curve.rpm_sigma.push(60.0 * section.sigma_at(position).1);
            }
        }
        curve
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Position of `tenths` tenths of a revolution at `samples` + 0.3 samples per revolution,
    /// exact but for the last rounding.
    fn exact(tenths: u64, samples: u64) -> SamplePosition {
        // (samples + 3/10)·tenths/10 = (10·samples + 3)·tenths/100
        let hundredths = (10 * samples + 3) * tenths;
        SamplePosition {
            index: hundredths / 100,
            fraction: (hundredths % 100) as f64 / 100.0,
        }
    }

    #[test]
    fn positions_after_a_day_are_as_good_as_at_the_start() {
        // Half a revolution per second at 51.2 kHz: 24 h are 43 200 revolutions.
        let (samples, revs) = (102_400, 43_200);
        let positions: Vec<SamplePosition> =
            (0..=revs).map(|rev| exact(10 * rev, samples)).collect();
        let config = RotationConfig {
            sample_rate_hz: 51_200.0,
            total_samples: u64::MAX,
            pulses_per_rev: 1,
        };
        let made = assemble(&positions, None, &config, Vec::new()).expect("a plain train");
        let steady = Rotation::steady(
            51_200.0,
            SamplePosition::default(),
            revs,
            51_200.0 / (samples as f64 + 0.3),
        );
        // −120 dB at the highest frequency: 1e-6/π sample. A steady speed is itself known to
        // the last digit only, which is 7e-12 sample per revolution.
        for (rotation, tolerance) in [(made, 1e-7), (steady, 7.5e-12 * revs as f64)] {
            let section = &rotation.sections[0];
            for rev in [0, 1, 2, 777, 21_600, revs - 3, revs - 1] {
                for tenth in [0, 3, 7] {
                    let found = section.at(rev as i64, tenth as f64 / 10.0).position;
                    let error = found.since(exact(10 * rev + tenth, samples));
                    assert!(error.abs() < tolerance, "rev {rev}.{tenth}: {error:e}");
                }
            }
        }
    }

    #[test]
    fn a_steady_shaft_is_a_line_from_its_start() {
        let start = SamplePosition::new(1000, 0.25);
        let rotation = Rotation::steady(48_000.0, start, 500, 37.0);
        assert_eq!(rotation.phase_reference, PhaseReference::None);
        let section = &rotation.sections[0];
        assert_eq!((section.start_rev(), section.end_rev()), (0.0, 500.0));
        assert_eq!(section.start(), start);
        let end = section.end().since(start);
        assert!((end - 500.0 * 48_000.0 / 37.0).abs() < 1e-9);
        assert!((rotation.mean_speed() - 37.0).abs() < 1e-12);
        let (rev, fraction) = section.angle_at(SamplePosition::new(1000, 0.25 + end * 0.3));
        assert!((rev as f64 + fraction - 150.0).abs() < 1e-11);
        assert_eq!(section.sigma_at(start), (0.0, 0.0));
        assert_eq!(rotation.highest_trusted_order(), f64::INFINITY);
    }

    #[test]
    fn a_rotation_takes_at_most_24_bytes_per_revolution() {
        let positions: Vec<SamplePosition> = (0..5000).map(|rev| exact(10 * rev, 1000)).collect();
        let config = RotationConfig {
            sample_rate_hz: 51_200.0,
            total_samples: u64::MAX,
            pulses_per_rev: 1,
        };
        let rotation = assemble(&positions, None, &config, Vec::new()).expect("a plain train");
        let Motion::Spline {
            coefficients,
            sigma,
            ..
        } = &rotation.sections[0].motion
        else {
            panic!("no spline");
        };
        let bytes = 8 * coefficients.capacity() + 8 * sigma.capacity();
        assert!(bytes < 24 * 4999, "{bytes} bytes");
    }
}
