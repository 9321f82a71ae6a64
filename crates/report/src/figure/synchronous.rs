use std::f64::consts::PI;

use shaftwise_figures::{
    Axis, Band, BandShade, Figure, Panel, PeakLabel, Role, Rule, RuleWay, Series, SeriesStyle,
};
use shaftwise_run::{SynchronousChannel, SynchronousResult};

use super::{Drawing, Scene, foot::foot, subtitle};
use crate::number::{fixed, place, significant};
use crate::shown::{clean, quantity};
use crate::words::{amplitude_sigma, convergence_verdict, strongest_orders};

/// The mean revolution with its orders, and how its noise fell.
pub(super) fn figures(
    average: &SynchronousResult,
    channel: usize,
    scene: Scene<'_>,
) -> Vec<Drawing> {
    let Scene {
        result, context, ..
    } = scene;
    let channel = &average.channels[channel];
    let unit = clean(&channel.channel.unit);
    let resolution = format!(
        "one revolution, {} values of angle",
        channel.angle_deg.len()
    );
    let foot = foot(
        &channel.channel,
        &unit,
        &resolution,
        &average.blocks,
        result,
    );
    let figure = |title: String, panels: Vec<Panel>, mut foot: Vec<String>, note: &str| {
        if !note.is_empty() {
            foot.push(note.to_owned());
        }
        Figure {
            title,
            subtitle: subtitle(Some(&channel.channel), context),
            panels,
            foot,
            ..Figure::default()
        }
    };
    let share = format!(
        "{} % of the power repeats with the shaft",
        significant(100.0 * channel.synchronous_fraction, 2)
    );
    let zero = match result.speed.phase_reference.as_str() {
        "pulse" => "angle 0 is the timed edge of the reference pulse",
        _ => {
            "where angle 0 lies on the shaft is arbitrary: angles and phases hold within this recording only"
        }
    };
    let mut drawings = vec![Drawing {
        suffix: "",
        figure: figure(
            share,
            vec![revolution(channel, &unit), orders(channel, &unit)],
            foot.clone(),
            zero,
        ),
    }];
    if !channel.convergence.revolutions.is_empty() {
        let title = format!(
            "Averaging lowered the noise by {} dB; {}",
            fixed(channel.noise_reduction_db, 1),
            convergence_verdict(channel)
        );
        drawings.push(Drawing {
            suffix: "-convergence",
            figure: figure(title, vec![convergence(channel)], foot, ""),
        });
    }
    drawings
}

/// Values drawn between two neighbours of the angle grid.
const FINE: usize = 8;
/// Above so many values a revolution they stand close enough by themselves.
const DENSE: usize = 1024;

/// A closed revolution on a finer grid: the mean by the one band-limited curve through its values,
/// the spreads by straight lines between theirs.
struct Closed {
    fine: usize,
    angle: Vec<f64>,
}

impl Closed {
    fn new(angle_deg: &[f64]) -> Self {
        let count = angle_deg.len();
        let step = 360.0 / count as f64;
        let even = angle_deg
            .iter()
            .enumerate()
            .all(|(i, a)| (a - i as f64 * step).abs() < 1e-6 * step);
        if !even || count == 0 || count % 2 == 1 || count > DENSE {
            let first = angle_deg.first().map(|a| a + 360.0);
            return Self {
                fine: 1,
                angle: angle_deg.iter().copied().chain(first).collect(),
            };
        }
        Self {
            fine: FINE,
            angle: (0..=count * FINE)
                .map(|i| i as f64 * step / FINE as f64)
                .collect(),
        }
    }

    fn straight(&self, values: &[f64]) -> Vec<f64> {
        self.each(values, |values, i, share| {
            let next = values[(i + 1) % values.len()];
            values[i] + share * (next - values[i])
        })
    }

    /// Σ x_n·sin(πu)/(M·tan(πu/M)) with u = position − n: the periodic curve through M values, M
    /// even, that holds no order above M/2.
    fn band_limited(&self, values: &[f64]) -> Vec<f64> {
        let count = values.len();
        let weights: Vec<Vec<f64>> = (0..self.fine)
            .map(|part| {
                let weight = |n: usize| {
                    let u = part as f64 / self.fine as f64 - n as f64;
                    if u == 0.0 {
                        return 1.0;
                    }
                    let turn = PI * u;
                    turn.sin() / (count as f64 * (turn / count as f64).tan())
                };
                (0..count).map(weight).collect()
            })
            .collect();
        self.each(values, |values, i, share| {
            if share == 0.0 {
                return values[i];
            }
            let weights = &weights[(share * self.fine as f64).round() as usize];
            let ahead = (0..count).map(|n| weights[n] * values[(i + n) % count]);
            ahead.sum()
        })
    }

    fn each(&self, values: &[f64], at: impl Fn(&[f64], usize, f64) -> f64) -> Vec<f64> {
        let fine = 0..values.len() * self.fine;
        let mut out: Vec<f64> = fine
            .map(|i| {
                at(
                    values,
                    i / self.fine,
                    (i % self.fine) as f64 / self.fine as f64,
                )
            })
            .collect();
        out.extend(values.first());
        out
    }
}

fn revolution(channel: &SynchronousChannel, unit: &str) -> Panel {
    let closed = Closed::new(&channel.angle_deg);
    let angle = closed.angle.clone();
    let mean = closed.band_limited(&channel.mean);
    let band = |name: &str, spread: &[f64], shade| {
        let spread = closed.straight(spread);
        let edge = |sign: f64| {
            mean.iter()
                .zip(&spread)
                .map(|(m, s)| m + sign * s)
                .collect()
        };
        Band {
            name: name.to_owned(),
            x: angle.clone(),
            lower: edge(-1.0),
            upper: edge(1.0),
            role: Role::Primary,
            shade,
        }
    };
    let mut panel = Panel::new(
        Axis::linear("shaft angle, degrees")
            .over(0.0, 360.0)
            .every(45.0),
        Axis::linear(&format!("{}, {unit}", quantity(&channel.channel))),
    );
    panel.bands = vec![
        band("± sd of one revolution", &channel.sd, BandShade::Light),
        band("± sd of the mean", &channel.sd_of_mean, BandShade::Strong),
    ];
    panel.series.push(Series::line(
        &format!("mean of {} revolutions", channel.revolutions),
        Role::Primary,
        angle.clone(),
        mean.clone(),
    ));
    panel.rules.push(Rule {
        at: 0.0,
        way: RuleWay::Across,
        text: String::new(),
        role: Role::Muted,
    });
    panel
}

fn orders(channel: &SynchronousChannel, unit: &str) -> Panel {
    let shown: Vec<usize> = (0..channel.orders.len())
        .filter(|&i| channel.orders[i] > 0.0)
        .collect();
    let pick = |values: &[f64]| -> Vec<f64> { shown.iter().map(|&i| values[i]).collect() };
    let x = pick(&channel.orders);
    let highest = x.last().copied().unwrap_or(1.0);
    let mut panel = Panel::new(
        Axis::linear("order (multiples of shaft speed)").over(0.0, highest + 0.5),
        Axis::linear(&format!("amplitude, {unit} peak")).from_zero(),
    );
    panel.height_share = 0.62;
    panel.series.push(Series {
        name: "orders of the mean revolution".to_owned(),
        style: SeriesStyle::Stem,
        ..Series::line("", Role::Primary, x, pick(&channel.amplitude_peak))
    });
    let sigma = amplitude_sigma(channel);
    if sigma.is_finite() {
        panel.rules.push(Rule {
            at: 3.0 * sigma,
            way: RuleWay::Across,
            text: "3 sigma of the scatter".to_owned(),
            role: Role::Reference,
        });
    }
    panel.labels = strongest_orders(channel, 8)
        .into_iter()
        .map(|i| PeakLabel {
            x: channel.orders[i],
            y: channel.amplitude_peak[i],
            text: format!(
                "{} · {} {unit}",
                place(channel.orders[i], 1.0, 0),
                significant(channel.amplitude_peak[i], 3)
            ),
            role: Role::Primary,
        })
        .collect();
    panel
}

fn convergence(channel: &SynchronousChannel) -> Panel {
    let curve = &channel.convergence;
    let counts: Vec<f64> = curve.revolutions.iter().map(|&n| n as f64).collect();
    let mut panel = Panel::new(
        Axis::log("revolutions averaged"),
        Axis::linear("noise reduction, dB").from_zero(),
    );
    panel.series.push(Series {
        style: SeriesStyle::LinePoints,
        ..Series::line(
            "seen in this recording",
            Role::Primary,
            counts.clone(),
            curve.seen_db.clone(),
        )
    });
    panel.series.push(Series::line(
        "1/√N law of random noise, 10·log₁₀ N",
        Role::Reference,
        counts,
        curve.law_db.clone(),
    ));
    panel
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_drawn_revolution_is_the_one_between_its_values() {
        let step = 360.0 / 64.0;
        let angle: Vec<f64> = (0..64).map(|i| f64::from(i) * step).collect();
        let wave = |a: f64| {
            let a = a.to_radians();
            1.5 + (25.0 * a + 0.4).cos() + 3.0 * (2.0 * a).sin()
        };
        let values: Vec<f64> = angle.iter().map(|&a| wave(a)).collect();
        let closed = Closed::new(&angle);
        let fine = closed.band_limited(&values);
        assert_eq!(fine.len(), closed.angle.len());
        for (at, value) in closed.angle.iter().zip(&fine) {
            // Exact but for rounding: 64 terms of size 6 at most.
            assert!((value - wave(*at)).abs() < 64.0 * 6.0 * f64::EPSILON * 4.0);
        }
        assert_eq!(closed.straight(&values)[8], values[1]);
        assert_eq!(closed.straight(&values)[4], 0.5 * (values[0] + values[1]));
    }
}
