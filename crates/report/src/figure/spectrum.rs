use shaftwise_figures::{
    Axis, Band, BandShade, Figure, LegendPlace, Panel, PeakLabel, Role, Series, Span, SpanKind,
};
use shaftwise_run::{AxisChoice, BlockFacts, PeakResult, SpectrumResult, detector_factor};

use super::{Drawing, Scene, foot::foot, subtitle};
use crate::number::{short, significant};
use crate::shown::{clean, line_unit, per_root, quantity};
use crate::words::{line_spacing, peak_named, peak_place};

/// A spectrum with its bounds shaded and its peaks labelled, and once more with decades for its
/// floor.
pub(super) fn figure(spectrum: &SpectrumResult, channel: usize, scene: Scene<'_>) -> Drawing {
    let Scene {
        result, context, ..
    } = scene;
    let channel = &spectrum.channels[channel];
    let detector = detector_factor(channel.detector);
    let shown = |values: &[f64]| -> Vec<f64> { values.iter().map(|v| v * detector).collect() };
    let unit = line_unit(spectrum, &channel.channel, channel.detector);
    let by_order = spectrum.axis == AxisChoice::Orders;
    let x = match (&channel.orders, &channel.frequency_hz) {
        (Some(x), _) | (None, Some(x)) => x.clone(),
        (None, None) => Vec::new(),
    };
    let highest = if by_order {
        scene.highest_order(&x)
    } else {
        x.last().copied().unwrap_or(0.0)
    };
    let shades = if by_order {
        Shades::of(
            &spectrum.blocks,
            highest,
            result.speed.highest_trusted_order,
        )
    } else {
        Shades::default()
    };
    let what = if spectrum.density { " density" } else { "" };
    let label = format!("{}{what}, {unit}", quantity(&channel.channel));
    let panel = |y: Axis| {
        let mut panel = Panel::new(x_axis(by_order, highest), y);
        panel.bands.push(Band {
            name: "90 % bounds".to_owned(),
            x: x.clone(),
            lower: shown(&channel.lower),
            upper: shown(&channel.upper),
            role: Role::Primary,
            shade: BandShade::Light,
        });
        let name = if by_order {
            "order spectrum"
        } else {
            "plain spectrum"
        };
        let rms = shown(&channel.rms);
        panel
            .series
            .push(Series::line(name, Role::Primary, x.clone(), rms));
        panel
    };
    let upper = shown(&channel.upper);
    let mut even = panel(y_axis(&label, &upper));
    even.spans.clone_from(&shades.spans);
    let unit_alone = clean(&channel.channel.unit) + per_root(spectrum);
    let highest_peak = channel.peaks.iter().map(|p| p.rms).fold(0.0, f64::max);
    let labels = |shown: &dyn Fn(&PeakResult) -> bool, with_level: bool| -> Vec<PeakLabel> {
        let mut peaks: Vec<&PeakResult> = channel.peaks.iter().filter(|p| shown(p)).collect();
        if !with_level {
            // Where decades are shown, what stands out most is seen first.
            peaks.sort_by(|a, b| b.over_noise_db.total_cmp(&a.over_noise_db));
        }
        let label = |peak: &PeakResult| {
            let at = peak_place(peak, spectrum);
            let level = significant(detector * peak.rms, 3);
            Some(PeakLabel {
                x: peak.order.or(peak.frequency_hz)?,
                y: detector * peak.rms,
                text: if with_level {
                    format!("{at} · {level} {unit_alone}")
                } else {
                    at
                },
                role: Role::Primary,
            })
        };
        peaks.into_iter().filter_map(label).collect()
    };
    even.labels = labels(&|p| p.rms >= SEEN * highest_peak, true);
    let mut decades = panel(decades(&label, &upper));
    decades.legend = LegendPlace::Hidden;
    decades.height_share = 0.55;
    decades.labels = labels(&|p| p.rms < SEEN * highest_peak, false);
    decades.labels.truncate(MOST_SMALL);
    decades.spans = shades.spans.iter().cloned().map(unnamed).collect();
    let title = match channel.peaks.first() {
        Some(peak) => {
            let mut named = peak_named(peak, spectrum);
            if by_order {
                named.replace_range(..1, "O");
            }
            let level = significant(detector * peak.rms, 3);
            format!("{named} stands highest: {level} {unit}")
        }
        None => "No peak stands out of its neighbourhood".to_owned(),
    };
    let spacing = line_spacing(spectrum);
    let mut foot = foot(&channel.channel, &unit, &spacing, &spectrum.blocks, result);
    foot.push(format!(
        "bounds: scatter of this recording only; calibration and mounting not included{}",
        shades.legend
    ));
    Drawing {
        suffix: "",
        figure: Figure {
            title,
            subtitle: subtitle(Some(&channel.channel), context),
            panels: vec![even, decades],
            shared_x: true,
            foot,
            ..Figure::default()
        },
    }
}

/// Peaks lower than this share of the highest lie on the axis where it is even; they are named
/// where it has decades.
const SEEN: f64 = 0.02;
/// Most names of small peaks.
const MOST_SMALL: usize = 16;

fn unnamed(span: Span) -> Span {
    Span {
        text: String::new(),
        ..span
    }
}

pub(super) fn x_axis(by_order: bool, highest: f64) -> Axis {
    let axis = Axis::linear(if by_order {
        "order (multiples of shaft speed)"
    } else {
        "frequency, Hz"
    });
    if highest > 0.0 {
        axis.over(0.0, highest)
    } else {
        axis
    }
}

/// Lines beside zero that hold what is left of a sensor's bias: they may not press the rest flat.
const BIAS_LINES: usize = 4;

/// Lowest and highest above zero away from the bias.
fn extremes(values: &[f64]) -> Option<(f64, f64)> {
    let sound = values.iter().skip(BIAS_LINES).copied();
    let sound = sound.filter(|v| v.is_finite() && *v > 0.0);
    sound.fold(None, |extremes, v| {
        let (low, high): (f64, f64) = extremes.unwrap_or((v, v));
        Some((low.min(v), high.max(v)))
    })
}

/// From zero to a little over the highest line, so that there is room for labels.
pub(super) fn y_axis(label: &str, upper: &[f64]) -> Axis {
    let axis = Axis::linear(label);
    match extremes(upper) {
        Some((_, highest)) => axis.over(0.0, 1.16 * highest),
        None => axis.from_zero(),
    }
}

/// Decades over all lines, at most seven below the highest.
fn decades(label: &str, upper: &[f64]) -> Axis {
    let axis = Axis::log(label);
    match extremes(upper) {
        Some((lowest, highest)) => axis.over((0.5 * lowest).max(1e-7 * highest), 4.0 * highest),
        None => axis,
    }
}

/// Orders that are drawn but not to be relied on, or not there at all.
#[derive(Debug, Default)]
pub(super) struct Shades {
    pub(super) spans: Vec<Span>,
    /// Their meaning, for the foot: narrow ones have no room for their names.
    pub(super) legend: String,
}

impl Shades {
    pub(super) fn of(blocks: &BlockFacts, highest: f64, trusted: f64) -> Self {
        let mut shades = Self::default();
        let mut add = |from: f64, to: f64, kind, text: &str, meaning: String| {
            if from < to {
                shades.spans.push(Span {
                    from,
                    to,
                    kind,
                    text: text.to_owned(),
                });
                shades.legend.push_str(&meaning);
            }
        };
        let reachable = blocks.reachable_order.min(highest);
        let corner = blocks.corner_order;
        add(
            0.0,
            corner.min(highest),
            SpanKind::Excluded,
            "below 2 × high-pass",
            format!(
                "; hatched below order {}: within twice the high-pass corner",
                short(corner, 2)
            ),
        );
        add(
            trusted,
            reachable,
            SpanKind::Excluded,
            "angle not trusted",
            format!(
                "; hatched above order {}: angle not trusted",
                short(trusted, 3)
            ),
        );
        add(
            reachable,
            highest,
            SpanKind::NotReachable,
            "not reachable",
            format!(
                "; grey above order {}: beyond the sample rate at the highest speed",
                short(reachable, 3)
            ),
        );
        shades
    }
}
