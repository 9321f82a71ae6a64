use shaftwise_figures::{
    Axis, Band, BandShade, Figure, MarkHeight, Marks, Panel, Role, Series, Span, SpanKind, Symbol,
};
use shaftwise_run::{Exclusion, SpeedResult};

use super::{Drawing, Scene, foot, subtitle};
use crate::number::{short, significant};
use crate::shown::clean;
use crate::words::{ledger_count, speed_range};

/// Speed against time with its 1-sigma band, the ledger's marks, breaks and what was left out.
pub(crate) fn speed_figure(speed: &SpeedResult, scene: Scene<'_>) -> Drawing {
    let Scene {
        result, context, ..
    } = scene;
    let curve = joined(speed);
    let mut panel = Panel::new(Axis::linear("time, s"), Axis::linear("shaft speed, rpm"));
    let edge = |sign: f64| {
        let points = curve.rpm.iter().zip(&curve.sigma);
        points.map(|(rpm, sigma)| rpm + sign * sigma).collect()
    };
    panel.bands.push(Band {
        name: "± 1 sigma".to_owned(),
        x: curve.time.clone(),
        lower: edge(-1.0),
        upper: edge(1.0),
        role: Role::Primary,
        shade: BandShade::Light,
    });
    panel
        .series
        .push(Series::line("speed", Role::Primary, curve.time, curve.rpm));
    for (action, symbol, role) in [
        ("inserted", Symbol::Inserted, Role::Third),
        ("rejected", Symbol::Rejected, Role::Warning),
        ("moved", Symbol::Moved, Role::Secondary),
    ] {
        let lines = speed.ledger.iter().filter(|line| line.action == action);
        let x: Vec<f64> = lines.map(|line| line.time_s).collect();
        if !x.is_empty() {
            panel.marks.push(Marks {
                name: format!("{action} ({})", x.len()),
                symbol,
                role,
                x,
                height: MarkHeight::Lane,
            });
        }
    }
    panel.spans = spans(speed);
    let stretches = match speed.sections_s.len() {
        0 | 1 => String::new(),
        sections => format!("; {sections} sections"),
    };
    let spread = 100.0 * (speed.speed_rpm.max - speed.speed_rpm.min) / speed.speed_rpm.mean;
    let step = match speed.curve.time_s.as_slice() {
        [first, second, ..] => format!("a value every {} s", short(second - first, 3)),
        _ => "no value".to_owned(),
    };
    Drawing {
        suffix: "",
        figure: Figure {
            title: format!(
                "The shaft turned at {}, a spread of {} %",
                speed_range(&speed.speed_rpm),
                significant(spread, 2)
            ),
            subtitle: subtitle(None, context),
            panels: vec![panel],
            foot: vec![
                format!(
                    "reference pulse, rpm; {step}, no window, not averaged; {}{stretches}; {} pulses timed, {} used, {}",
                    speed_range(&speed.speed_rpm),
                    speed.pulses.timed,
                    speed.pulses.used,
                    ledger_count(speed),
                ),
                format!(
                    "{}; angle known to ± {}° (1 sigma)",
                    foot::source(result),
                    significant(speed.angle_sigma_deg, 2)
                ),
            ],
            ..Figure::default()
        },
    }
}

struct Curve {
    time: Vec<f64>,
    rpm: Vec<f64>,
    sigma: Vec<f64>,
}

/// The curve with a gap between sections: nothing is known of the speed there.
fn joined(speed: &SpeedResult) -> Curve {
    let mut out = Curve {
        time: Vec::new(),
        rpm: Vec::new(),
        sigma: Vec::new(),
    };
    let sections = &speed.sections_s;
    let section = |t: f64| {
        let here = sections.partition_point(|&(_, end)| end < t);
        sections
            .get(here)
            .filter(|(start, _)| *start <= t)
            .map(|_| here)
    };
    let curve = &speed.curve;
    let mut last = None;
    for ((&time, &rpm), &sigma) in curve.time_s.iter().zip(&curve.rpm).zip(&curve.rpm_sigma) {
        let here = section(time);
        let inside = here.is_some() || sections.is_empty();
        let gap = !inside || here != last.unwrap_or(here);
        last = Some(here);
        if gap {
            out.time.push(time);
            out.rpm.push(f64::NAN);
            out.sigma.push(f64::NAN);
        }
        if inside {
            out.time.push(time);
            out.rpm.push(rpm);
            out.sigma.push(sigma);
        }
    }
    out
}

/// Breaks between sections, and what of the sections was not selected.
fn spans(speed: &SpeedResult) -> Vec<Span> {
    let breaks = speed.sections_s.windows(2).map(|pair| Span {
        from: pair[0].1,
        to: pair[1].0,
        kind: SpanKind::Break,
        text: "no pulses".to_owned(),
    });
    let unused = speed.sections_s.iter().flat_map(|&section| {
        remainder(section, &speed.selected_s)
            .into_iter()
            .map(|(from, to)| Span {
                from,
                to,
                kind: SpanKind::Excluded,
                text: reason(speed, from, to).unwrap_or_else(|| "not selected".to_owned()),
            })
    });
    breaks.chain(unused).collect()
}

/// The reason given for leaving a stretch out, where one was.
fn reason(speed: &SpeedResult, from: f64, to: f64) -> Option<String> {
    let middle = 0.5 * (from + to);
    let covers = |e: &&Exclusion| e.from_s <= middle && middle <= e.to_s;
    let excluded = speed.excluded.iter().find(covers)?;
    excluded.reason.as_deref().map(clean)
}

/// What of a stretch is in none of the others, which are in ascending order.
fn remainder((from, to): (f64, f64), taken: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let mut left = Vec::new();
    let mut at = from;
    for &(start, end) in taken {
        if start > at && at < to {
            left.push((at, start.min(to)));
        }
        at = at.max(end);
    }
    if at < to {
        left.push((at, to));
    }
    // The curve's own ends are a step away from the pulses'.
    left.retain(|(from, to)| to - from > 1e-3);
    left
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_left_of_a_stretch() {
        assert_eq!(
            remainder((0.0, 10.0), &[(1.0, 2.0), (4.0, 20.0)]),
            [(0.0, 1.0), (2.0, 4.0)]
        );
        assert_eq!(remainder((0.0, 10.0), &[]), [(0.0, 10.0)]);
        assert_eq!(remainder((5.0, 6.0), &[(0.0, 5.5)]), [(5.5, 6.0)]);
        assert!(remainder((5.0, 6.0), &[(0.0, 9.0)]).is_empty());
        assert_eq!(remainder((5.0, 6.0), &[(7.0, 9.0)]), [(5.0, 6.0)]);
    }
}
