//! From sums to results.

use crate::Job;
use crate::chunk::Sums;
use crate::plan::{AnalysisPlan, AveragesPlan, Place, Plan};
use crate::results::{
    AnalysisResult, CompareChannel, CompareResult, ComparedPeak, ConvergenceResult, LedgerLine,
    OnsetResult, Outcome, OverallResult, PeakResult, PeakVerdict, PulseFacts, SpectrumChannel,
    SpectrumResult, SpeedCurveResult, SpeedResult, SynchronousChannel, SynchronousResult,
};
use crate::settings::{Analysis, Averaging, AxisChoice, Detector, Exclusion, SpectrumSettings};
use crate::spinning::Spinning;
use shaftwise_findings::{
    SmearModel, SpectrumReading, Verdict, WindowLobe, compare_peak, peak_zones, read_spectrum,
};
use shaftwise_orders::{AveragedSpectrum, SpectrumPlan, revolution_orders};
use shaftwise_rotation::{LedgerAction, PhaseReference};
use shaftwise_signal::SamplePosition;

/// Two-sided probability of every bound.
const CONFIDENCE: f64 = 0.9;
/// Chance that noise alone gives a listed peak in a spectrum.
const FALSE_ALARM: f64 = 0.05;
/// Loss from which on smearing counts, dB.
const ONSET_DB: f64 = 1.0;

/// Speed, ledger and curve.
pub(crate) fn speed(spinning: &Spinning, excluded: &[Exclusion], step_s: f64) -> SpeedResult {
    let rotation = &spinning.rotation;
    let rate = rotation.sample_rate_hz;
    let curve = rotation.curve(step_s);
    let span = |from: SamplePosition, to: SamplePosition| (from.seconds(rate), to.seconds(rate));
    SpeedResult {
        pulses: PulseFacts {
            timed: rotation.pulses.timed,
            used: rotation.pulses.used,
            inserted: rotation.pulses.inserted,
            rejected: rotation.pulses.rejected,
        },
        ledger: rotation
            .ledger
            .iter()
            .map(|entry| LedgerLine {
                time_s: entry.time_s,
                action: match entry.action {
                    LedgerAction::Inserted => "inserted",
                    LedgerAction::Rejected => "rejected",
                    LedgerAction::Moved => "moved",
                }
                .to_owned(),
                reason: entry.reason.clone(),
            })
            .collect(),
        speed_rpm: spinning.range_rpm(1.0),
        angle_sigma_deg: rotation.angle_sigma_deg(),
        highest_trusted_order: rotation.highest_trusted_order(),
        timing_sigma_s: rotation.timing_sigma_s,
        sampling_error_s: rotation.sampling_error_s,
        edge_width_deg: rotation.edge_width_deg.unwrap_or(f64::NAN),
        pulse_width_deg: rotation.pulse_width_deg.unwrap_or(f64::NAN),
        sections_s: rotation
            .sections
            .iter()
            .map(|s| span(s.start(), s.end()))
            .collect(),
        selected_s: spinning
            .windows
            .iter()
            .map(|w| span(w.from, w.to))
            .collect(),
        excluded: excluded.to_vec(),
        phase_reference: match rotation.phase_reference {
            PhaseReference::Pulse => "pulse",
            PhaseReference::Arbitrary => "arbitrary",
            PhaseReference::None => "none",
        }
        .to_owned(),
        curve: SpeedCurveResult {
            time_s: curve.time_s,
            revs: curve.revs,
            rpm: curve.rpm,
            rpm_sigma: curve.rpm_sigma,
        },
    }
}

/// Averages of pass 2, by track and consumer; each is taken once.
pub(crate) struct Totals(pub(crate) Vec<Vec<Option<Sums>>>);

impl Totals {
    fn spectra(&mut self, place: Place) -> Vec<AveragedSpectrum> {
        match self.0[place.track][place.consumer].take() {
            Some(Sums::Spectrum(sums)) => sums.finish(),
            _ => unreachable!("a place is taken once, by the analysis that made it"),
        }
    }

    fn revolutions(&mut self, place: Place) -> Vec<shaftwise_orders::SynchronousAverage> {
        match self.0[place.track][place.consumer].take() {
            Some(Sums::Synchronous(sums)) => sums.finish(),
            _ => unreachable!("a place is taken once, by the analysis that made it"),
        }
    }
}

/// One outcome for each analysis.
pub(crate) fn outcomes(
    spinning: &Spinning,
    plan: &Plan,
    job: &Job,
    mut totals: Totals,
    speed: &SpeedResult,
) -> Vec<Outcome> {
    job.analyses
        .iter()
        .zip(&plan.analyses)
        .map(|(analysis, work)| {
            let mut settings = settings_of(analysis, job);
            let mut warnings = Vec::new();
            let result = match (analysis, work) {
                (Analysis::Spectrum(asked), AnalysisPlan::Averages { place, plan }) => {
                    warnings.extend(plan.warnings.iter().cloned());
                    fill(&mut settings, plan);
                    let spectra = totals.spectra(*place);
                    AnalysisResult::Spectrum(spectrum(asked, plan, spectra, &mut warnings))
                }
                (Analysis::Synchronous(_), AnalysisPlan::Averages { place, plan }) => {
                    warnings.extend(plan.warnings.iter().cloned());
                    fill(&mut settings, plan);
                    if spinning.rotation.phase_reference != PhaseReference::Pulse {
                        warnings.push(format!(
                            "{} pulses per revolution without an index: phases hold within this recording only, their zero may be any tooth",
                            spinning.rotation.pulses_per_rev
                        ));
                    }
                    AnalysisResult::Synchronous(synchronous(
                        plan,
                        totals.revolutions(*place),
                        &mut warnings,
                    ))
                }
                (Analysis::Compare(_), AnalysisPlan::Compare { tracked, smeared, plan: averages }) => {
                    warnings.extend(averages.warnings.iter().cloned());
                    fill(&mut settings, averages);
                    let model = smear_model(spinning, plan, *tracked, averages);
                    let (tracked, smeared) = (totals.spectra(*tracked), totals.spectra(*smeared));
                    AnalysisResult::Compare(compare(averages, &tracked, &smeared, &model))
                }
                _ => AnalysisResult::Speed(speed.clone()),
            };
            Outcome { command: analysis.command(), settings, result, warnings }
        })
        .collect()
}

fn settings_of(analysis: &Analysis, job: &Job) -> serde_json::Value {
    let mut value = serde_json::to_value(analysis).unwrap_or_default();
    if let Some(map) = value.as_object_mut() {
        map.shift_remove("command");
        map.insert(
            "tach".to_owned(),
            serde_json::to_value(&job.tach).unwrap_or_default(),
        );
        map.insert(
            "select".to_owned(),
            serde_json::to_value(&job.select).unwrap_or_default(),
        );
    }
    value
}

/// Puts what was chosen where nothing was asked for.
fn fill(settings: &mut serde_json::Value, plan: &AveragesPlan) {
    if let Some(map) = settings.as_object_mut() {
        map.insert("max_order".to_owned(), plan.max_order.into());
        map.insert(
            "channel".to_owned(),
            plan.channels.iter().map(|c| c.number).collect(),
        );
    }
}

/// Detector's factor on an rms level.
#[must_use]
pub fn detector_factor(detector: Detector) -> f64 {
    match detector {
        Detector::Rms => 1.0,
        Detector::Peak => std::f64::consts::SQRT_2,
        Detector::PeakToPeak => 2.0 * std::f64::consts::SQRT_2,
    }
}

/// `power`: the channel's conversion in time, as a power of j2πf.
fn reading(
    plan: &AveragesPlan,
    repeatability_db: f64,
    axis: AxisChoice,
    power: i32,
) -> SpectrumReading {
    // The corner itself, at the lowest speed; up to twice of it levels are marked.
    let first_line = if power == 0 {
        1
    } else {
        (0.5 * plan.facts.corner_order / plan.facts.order_step).ceil() as usize
    };
    SpectrumReading {
        confidence: CONFIDENCE,
        false_alarm: FALSE_ALARM,
        repeatability_db,
        angle_sigma_rev: plan.angle_sigma_rev,
        line_order: if axis == AxisChoice::Orders {
            plan.facts.order_step
        } else {
            0.0
        },
        usable_lines: usable_lines(plan),
        first_line,
        floor_exponent: 2.0 * f64::from(power),
    }
}

/// Lines within the sample rate's reach at the highest speed.
fn usable_lines(plan: &AveragesPlan) -> usize {
    (plan.facts.reachable_order.min(plan.max_order) / plan.facts.order_step + 1e-9).floor() as usize
        + 1
}

fn transform(plan: &AveragesPlan) -> &SpectrumPlan {
    plan.spectrum
        .as_deref()
        .expect("spectra are planned with their transform")
}

fn spectrum(
    asked: &SpectrumSettings,
    plan: &AveragesPlan,
    spectra: Vec<AveragedSpectrum>,
    warnings: &mut Vec<String>,
) -> SpectrumResult {
    let fft = transform(plan);
    let lobe = WindowLobe::new(fft.window());
    let facts = &plan.facts;
    let per_line = match asked.axis {
        AxisChoice::Orders => facts.order_step,
        AxisChoice::Hz => facts.order_step * facts.mean_speed_rev_s,
    };
    let width = if asked.density {
        facts.noise_bandwidth_lines * per_line
    } else {
        1.0
    };
    if asked.averaging == Averaging::PeakHold {
        warnings.push("peak hold has no bounds: they belong to averages".to_owned());
    }
    let channels = plan
        .channels
        .iter()
        .zip(&plan.detectors)
        .zip(&plan.powers)
        .zip(spectra)
        .map(|(((channel, detector), power), mut spectrum)| {
            let reading = reading(plan, asked.repeatability, asked.axis, *power);
            let blocks = spectrum.blocks;
            if let Averaging::Exponential = asked.averaging {
                // A fading average scatters like (2 − α)/α = N blocks.
                let memory = asked.averages.unwrap_or(16);
                spectrum.mean.clone_from(&spectrum.shown);
                spectrum.blocks = blocks.min(memory);
            }
            let findings = read_spectrum(&spectrum, fft, &lobe, &reading);
            let lines = spectrum.shown.len();
            let usable = reading.usable_lines.min(lines);
            let level = |power: f64| (power / width).sqrt();
            let curve = |powers: &[f64]| -> Vec<f64> {
                (0..lines)
                    .map(|k| {
                        if k < usable {
                            level(powers[k])
                        } else {
                            f64::NAN
                        }
                    })
                    .collect()
            };
            // What the averaging shows may differ from the mean of power; bounds go with it.
            let bound = |bounds: &[f64]| -> Vec<f64> {
                (0..lines)
                    .map(|k| match asked.averaging {
                        _ if k >= usable => f64::NAN,
                        Averaging::PeakHold => f64::NAN,
                        _ if spectrum.mean[k] > 0.0 => {
                            level(bounds[k] * spectrum.shown[k] / spectrum.mean[k])
                        }
                        _ => level(bounds[k]),
                    })
                    .collect()
            };
            let places: Vec<f64> = (0..lines).map(|k| k as f64 * per_line).collect();
            let peaks = findings
                .peaks
                .iter()
                .map(|peak| {
                    let shown = spectrum.shown[peak.line] / spectrum.mean[peak.line];
                    let place = peak.place * per_line;
                    let at_orders = asked.axis == AxisChoice::Orders;
                    let held = asked.averaging == Averaging::PeakHold;
                    PeakResult {
                        order: at_orders.then_some(place),
                        frequency_hz: (!at_orders).then_some(place),
                        rms: level(peak.power * shown),
                        lower: if held {
                            f64::NAN
                        } else {
                            level(peak.lower * shown)
                        },
                        upper: if held {
                            f64::NAN
                        } else {
                            level(peak.upper * shown)
                        },
                        verdict: match peak.verdict {
                            Verdict::Repeatable => PeakVerdict::Repeatable,
                            Verdict::MoreAverages => PeakVerdict::MoreAverages,
                            Verdict::Wanders => PeakVerdict::Wanders,
                        },
                        averages_needed: peak.averages_needed,
                        seen_scatter_db: peak.seen_scatter_db,
                        over_noise_db: 10.0 * peak.over_noise.log10(),
                    }
                })
                .collect();
            let hertz = facts.order_step * facts.mean_speed_rev_s;
            SpectrumChannel {
                channel: channel.clone(),
                orders: (asked.axis == AxisChoice::Orders).then(|| places.clone()),
                frequency_hz: (asked.axis == AxisChoice::Hz).then_some(places),
                rms: curve(&spectrum.shown),
                lower: bound(&findings.lower),
                upper: bound(&findings.upper),
                averages: blocks,
                equivalent_averages: findings.noise_averages,
                peaks,
                overall: OverallResult {
                    value: findings.total.sqrt(),
                    detector: Detector::Rms,
                    lower: findings.total_lower.sqrt(),
                    upper: findings.total_upper.sqrt(),
                    band_hz: (0.5 * hertz, (usable as f64 - 0.5) * hertz),
                },
                detector: *detector,
            }
        })
        .collect();
    SpectrumResult {
        blocks: facts.clone(),
        axis: asked.axis,
        averaging: asked.averaging,
        density: asked.density,
        repeatability_db: asked.repeatability,
        channels,
    }
}

fn synchronous(
    plan: &AveragesPlan,
    averages: Vec<shaftwise_orders::SynchronousAverage>,
    warnings: &mut Vec<String>,
) -> SynchronousResult {
    let channels = plan
        .channels
        .iter()
        .zip(averages)
        .map(|(channel, average)| {
            if !(average.total_rms > 0.0) {
                warnings.push(format!(
                    "channel {}, {}: silent, so its share and noise reduction are left blank; is the sensor connected?",
                    channel.number, channel.name
                ));
            }
            let highest = plan.max_order.min(plan.facts.reachable_order).floor() as u32;
            let orders = revolution_orders(&average.mean, highest);
            let length = average.mean.len();
            let root = (average.revolutions as f64).sqrt();
            let (revolutions, seen): (Vec<u64>, Vec<f64>) =
                average.convergence.iter().copied().unzip();
            let lead = |phase: f64| 360.0 * phase;
            let lag = |phase: f64| {
                let lag = (-360.0 * phase).rem_euclid(360.0);
                // −1e-17 wraps to 360 itself.
                if lag >= 360.0 { 0.0 } else { lag }
            };
            SynchronousChannel {
                channel: channel.clone(),
                revolutions: average.revolutions,
                angle_deg: (0..length)
                    .map(|m| 360.0 * m as f64 / length as f64)
                    .collect(),
                sd_of_mean: average.sd.iter().map(|s| s / root).collect(),
                orders: orders.iter().map(|o| f64::from(o.order)).collect(),
                amplitude_peak: orders.iter().map(|o| o.amplitude).collect(),
                phase_lead_deg: orders.iter().map(|o| lead(o.phase)).collect(),
                phase_lag_deg: orders.iter().map(|o| lag(o.phase)).collect(),
                synchronous_fraction: average.synchronous_fraction,
                noise_reduction_db: average.noise_reduction_db,
                residual_rms: average.residual_rms,
                total_rms: average.total_rms,
                convergence: ConvergenceResult {
                    law_db: revolutions
                        .iter()
                        .map(|n| 10.0 * (*n as f64).log10())
                        .collect(),
                    revolutions,
                    seen_db: seen,
                },
                mean: average.mean,
                sd: average.sd,
            }
        })
        .collect();
    SynchronousResult {
        blocks: plan.facts.clone(),
        channels,
    }
}

fn compare(
    plan: &AveragesPlan,
    tracked: &[AveragedSpectrum],
    smeared: &[AveragedSpectrum],
    model: &SmearModel,
) -> CompareResult {
    let fft = transform(plan);
    let lobe = WindowLobe::new(fft.window());
    let facts = &plan.facts;
    let spread = (facts.speed_rpm.max - facts.speed_rpm.min) / facts.speed_rpm.mean;
    let highest = facts.reachable_order.min(plan.max_order);
    let predicted_order = model.onset(highest);
    let channels: Vec<CompareChannel> = plan
        .channels
        .iter()
        .zip(&plan.detectors)
        .zip(&plan.powers)
        .zip(tracked.iter().zip(smeared))
        .map(|(((channel, detector), power), (tracked, smeared))| {
            let reading = reading(plan, 1.0, AxisChoice::Orders, *power);
            let findings = read_spectrum(tracked, fft, &lobe, &reading);
            let step = facts.order_step;
            let zones = peak_zones(&findings.peaks, tracked.mean.len());
            let peaks: Vec<ComparedPeak> = findings
                .peaks
                .iter()
                .zip(zones)
                .map(|(peak, zone)| {
                    let both = compare_peak(
                        peak,
                        tracked,
                        smeared,
                        zone,
                        0.5 * spread,
                        facts.noise_bandwidth_lines,
                        &lobe,
                    );
                    ComparedPeak {
                        order: both.place * step,
                        tracked_rms: both.tracked.sqrt(),
                        smeared_rms: both.smeared.sqrt(),
                        loss_db: 10.0 * (both.tracked / both.smeared).log10(),
                        smeared_at_order: both.smeared_place * step,
                        tracked_width_orders: both.tracked_width * step,
                        smeared_width_orders: both.smeared_width * step,
                        tracked_summed_rms: both.tracked_sum.sqrt(),
                        smeared_summed_rms: both.smeared_sum.sqrt(),
                    }
                })
                .collect();
            let seen_order = peaks
                .iter()
                .filter(|p| p.loss_db >= ONSET_DB)
                .map(|p| p.order)
                .min_by(f64::total_cmp);
            let usable = reading.usable_lines.min(tracked.mean.len());
            let levels = |spectrum: &AveragedSpectrum| -> Vec<f64> {
                spectrum
                    .mean
                    .iter()
                    .enumerate()
                    .map(|(k, p)| if k < usable { p.sqrt() } else { f64::NAN })
                    .collect()
            };
            CompareChannel {
                channel: channel.clone(),
                peaks,
                onset: OnsetResult {
                    predicted_order,
                    seen_order,
                },
                orders: (0..tracked.mean.len()).map(|k| k as f64 * step).collect(),
                tracked_rms: levels(tracked),
                smeared_rms: levels(smeared),
                detector: *detector,
            }
        })
        .collect();
    CompareResult {
        blocks: facts.clone(),
        speed_spread: spread,
        plain_is_good_enough: channels
            .iter()
            .any(|c| !c.peaks.is_empty())
            .then(|| channels.iter().all(|c| c.onset.seen_order.is_none())),
        channels,
    }
}

/// How far the shaft runs ahead of steady turning within blocks spread over the selection.
fn smear_model(
    spinning: &Spinning,
    plan: &Plan,
    tracked: Place,
    averages: &AveragesPlan,
) -> SmearModel {
    const POINTS: usize = 64;
    const BLOCKS: u64 = 48;
    let work = &plan.tracks[tracked.track];
    let consumer = &work.consumers[tracked.consumer];
    let window = transform(averages)
        .config()
        .window
        .samples(POINTS)
        .unwrap_or_else(|_| vec![1.0; POINTS]);
    let speed = spinning.mean;
    let rate = spinning.rotation.sample_rate_hz;
    let ratio = work.track.ratio();
    let seconds = averages.facts.block_revs / averages.facts.mean_speed_rev_s;
    let total = consumer.total_blocks();
    let stride = total.div_ceil(BLOCKS).max(1);
    let mut lead_rev = Vec::new();
    let mut number = 0;
    for (stretch, count) in work.stretches.iter().zip(&consumer.blocks) {
        let Some(stretch) = stretch else { continue };
        let section = &spinning.rotation.sections[stretch.section];
        for block in 0..*count {
            number += 1;
            if (number - 1) % stride != 0 {
                continue;
            }
            let instant = work.track.instant(
                stretch.section,
                stretch.first + block as i64 * consumer.hop as i64,
            );
            let start = SamplePosition {
                index: instant.index,
                fraction: instant.fraction,
            };
            let first = section.angle_at(start);
            let lead: Vec<f64> = (0..POINTS)
                .map(|n| {
                    let t = seconds * n as f64 / POINTS as f64;
                    let here = SamplePosition::new(start.index, start.fraction + t * rate);
                    let here = if here > section.end() {
                        section.end()
                    } else {
                        here
                    };
                    let (rev, fraction) = section.angle_at(here);
                    ratio * ((rev - first.0) as f64 + (fraction - first.1) - speed * t)
                })
                .collect();
            lead_rev.push(lead);
        }
    }
    SmearModel { window, lead_rev }
}
