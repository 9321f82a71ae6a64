use shaftwise_figures::{Figure, Inset, Panel, PeakLabel, Role, Series, SeriesStyle};
use shaftwise_run::{CompareResult, detector_factor};

use super::spectrum::{Shades, x_axis, y_axis};
use super::{Drawing, Scene, foot::foot, subtitle};
use crate::number::{count, fixed, place, significant};
use crate::shown::{clean, level_unit, quantity};
use crate::words::{lost, order_spacing, showcase};

/// Smeared over tracked on one amplitude axis, both magnified where smearing cost most.
pub(super) fn figure(compare: &CompareResult, channel: usize, scene: Scene<'_>) -> Drawing {
    let Scene {
        result, context, ..
    } = scene;
    let channel = &compare.channels[channel];
    let blocks = &compare.blocks;
    let detector = detector_factor(channel.detector);
    let unit = level_unit(&channel.channel, channel.detector);
    let shown = |values: &[f64]| -> Vec<f64> { values.iter().map(|v| v * detector).collect() };
    let both: Vec<f64> = channel
        .tracked_rms
        .iter()
        .zip(&channel.smeared_rms)
        .map(|(a, b)| detector * a.max(*b))
        .collect();
    let trusted = result.speed.highest_trusted_order;
    let magnified = showcase(channel, trusted);
    let highest = scene.highest_order(&channel.orders);
    let shades = Shades::of(blocks, highest, trusted);
    let inset = magnified.map(|peak| {
        let spread = compare.speed_spread * peak.order;
        let reach = [peak.smeared_width_orders, peak.tracked_width_orders, spread]
            .into_iter()
            .filter(|w| w.is_finite())
            .fold(8.0 * blocks.order_step, f64::max);
        let to = (peak.order + reach).min(highest.max(peak.order));
        Inset {
            share: (0.3, 0.66),
            ..Inset::new((to - 2.0 * reach).max(0.0), to)
        }
    });
    let panel = |heading: &str, role, y: Vec<f64>| {
        let mut panel = Panel::new(
            x_axis(true, highest),
            y_axis(&format!("{}, {unit}", quantity(&channel.channel)), &both),
        );
        panel.x.label = "order (multiples of mean shaft speed)".to_owned();
        panel.heading = heading.to_owned();
        panel.series.push(Series {
            name: String::new(),
            x: channel.orders.clone(),
            y,
            role,
            style: SeriesStyle::Area,
        });
        panel.inset = inset.clone();
        panel.spans.clone_from(&shades.spans);
        panel
    };
    let mut smeared = panel(
        "smeared: blocks of equal time",
        Role::Secondary,
        shown(&channel.smeared_rms),
    );
    let mut tracked = panel(
        "tracked: blocks of equal angle",
        Role::Primary,
        shown(&channel.tracked_rms),
    );
    let short = clean(&channel.channel.unit);
    let label = |at: f64, order: f64, level: f64, role| PeakLabel {
        x: at,
        y: detector * level,
        text: format!(
            "{} · {} {short}",
            place(order, blocks.order_step, 2),
            significant(detector * level, 3)
        ),
        role,
    };
    for peak in channel.peaks.iter().take(MOST_LABELS) {
        // Orders that ran together share their highest line: one label says it.
        let at = peak.smeared_at_order;
        if !smeared.labels.iter().any(|other| other.x == at) {
            smeared
                .labels
                .push(label(at, at, peak.smeared_rms, Role::Secondary));
        }
        let at = peak.order;
        tracked
            .labels
            .push(label(at, at, peak.tracked_rms, Role::Primary));
    }
    let (lost, listed) = (lost(channel), channel.peaks.len());
    let title = match magnified {
        None => "No peak stands out: nothing to compare".to_owned(),
        Some(_) if lost == 0 => "No listed peak lost 1 dB to smearing".to_owned(),
        Some(peak) => format!(
            "Smearing made {lost} of {} read low, order {} by {} dB",
            count(listed, "peak"),
            place(peak.order, blocks.order_step, 2),
            fixed(peak.loss_db, 1)
        ),
    };
    let mut foot = foot(
        &channel.channel,
        &unit,
        &order_spacing(blocks),
        blocks,
        result,
    );
    foot.push(format!(
        "smeared and tracked: the same stretch, blocks, window and lines{}",
        shades.legend
    ));
    Drawing {
        suffix: "",
        figure: Figure {
            title,
            subtitle: subtitle(Some(&channel.channel), context),
            panels: vec![smeared, tracked],
            shared_x: true,
            shared_y: true,
            foot,
            ..Figure::default()
        },
    }
}

/// More labels than this would hide what the two halves show together.
const MOST_LABELS: usize = 8;
