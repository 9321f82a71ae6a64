//! Every curve as columns, units in the heads.

use std::borrow::Cow;

use shaftwise_run::{AnalysisResult, SpeedResult};

use crate::shown::clean;

/// One table: what its file's name ends with, and its columns.
pub(crate) struct Curves<'r> {
    pub(crate) suffix: &'static str,
    pub(crate) columns: Vec<(String, Cow<'r, [f64]>)>,
}

pub(crate) fn speed_tables(speed: &SpeedResult) -> Vec<Curves<'_>> {
    let curve = &speed.curve;
    vec![Curves {
        suffix: "",
        columns: vec![
            ("time [s]".to_owned(), Cow::from(&curve.time_s)),
            ("angle [rev]".to_owned(), Cow::from(&curve.revs)),
            ("speed [rpm]".to_owned(), Cow::from(&curve.rpm)),
            (
                "1 sigma of speed [rpm]".to_owned(),
                Cow::from(&curve.rpm_sigma),
            ),
        ],
    }]
}

/// The tables of one channel of an analysis (`speed`: channel 0).
pub(crate) fn analysis_tables(analysis: &AnalysisResult, channel: usize) -> Vec<Curves<'_>> {
    match analysis {
        AnalysisResult::Speed(speed) => speed_tables(speed),
        AnalysisResult::Spectrum(result) => {
            let channel = &result.channels[channel];
            let mut columns: Vec<(String, Cow<'_, [f64]>)> = Vec::new();
            if let Some(orders) = &channel.orders {
                columns.push(("order".to_owned(), Cow::from(orders)));
            }
            if let Some(frequency) = &channel.frequency_hz {
                columns.push(("frequency [Hz]".to_owned(), Cow::from(frequency)));
            }
            let mut unit = clean(&channel.channel.unit);
            if result.density {
                unit.push_str(if channel.orders.is_some() {
                    "/√order"
                } else {
                    "/√Hz"
                });
            }
            columns.push((format!("level rms [{unit}]"), Cow::from(&channel.rms)));
            columns.push((
                format!("lower bound rms [{unit}]"),
                Cow::from(&channel.lower),
            ));
            columns.push((
                format!("upper bound rms [{unit}]"),
                Cow::from(&channel.upper),
            ));
            vec![Curves {
                suffix: "",
                columns,
            }]
        }
        AnalysisResult::Synchronous(result) => {
            let channel = &result.channels[channel];
            let unit = clean(&channel.channel.unit);
            let convergence = &channel.convergence;
            let counts: Vec<f64> = convergence.revolutions.iter().map(|&n| n as f64).collect();
            vec![
                Curves {
                    suffix: "",
                    columns: vec![
                        ("angle [deg]".to_owned(), Cow::from(&channel.angle_deg)),
                        (format!("mean [{unit}]"), Cow::from(&channel.mean)),
                        (
                            format!("sd of one revolution [{unit}]"),
                            Cow::from(&channel.sd),
                        ),
                        (
                            format!("sd of the mean [{unit}]"),
                            Cow::from(&channel.sd_of_mean),
                        ),
                    ],
                },
                Curves {
                    suffix: "-orders",
                    columns: vec![
                        ("order".to_owned(), Cow::from(&channel.orders)),
                        (
                            format!("amplitude peak [{unit}]"),
                            Cow::from(&channel.amplitude_peak),
                        ),
                        (
                            "phase lead [deg]".to_owned(),
                            Cow::from(&channel.phase_lead_deg),
                        ),
                        (
                            "phase lag [deg]".to_owned(),
                            Cow::from(&channel.phase_lag_deg),
                        ),
                    ],
                },
                Curves {
                    suffix: "-convergence",
                    columns: vec![
                        ("revolutions averaged".to_owned(), counts.into()),
                        (
                            "noise reduction seen [dB]".to_owned(),
                            Cow::from(&convergence.seen_db),
                        ),
                        (
                            "law of random noise [dB]".to_owned(),
                            Cow::from(&convergence.law_db),
                        ),
                    ],
                },
            ]
        }
        AnalysisResult::Compare(result) => {
            let channel = &result.channels[channel];
            let unit = clean(&channel.channel.unit);
            vec![Curves {
                suffix: "",
                columns: vec![
                    ("order".to_owned(), Cow::from(&channel.orders)),
                    (
                        format!("tracked rms [{unit}]"),
                        Cow::from(&channel.tracked_rms),
                    ),
                    (
                        format!("smeared rms [{unit}]"),
                        Cow::from(&channel.smeared_rms),
                    ),
                ],
            }]
        }
    }
}
