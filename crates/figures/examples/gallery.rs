//! Writes one figure of each kind, with made-up data, into a directory:
//! `cargo run -p shaftwise-figures --example gallery -- DIR`.

use std::f64::consts::TAU;
use std::path::Path;
use std::{env, error, fs};

use shaftwise_figures::{
    Axis, Band, BandShade, Figure, FigureSize, Inset, InsetPlace, MarkHeight, Marks, Panel,
    PeakLabel, RenderOptions, Role, Rule, RuleWay, Series, SeriesStyle, Span, SpanKind, Symbol,
    render, render_svg,
};

fn main() -> Result<(), Box<dyn error::Error>> {
    let directory = env::args().nth(1).unwrap_or_else(|| ".".to_owned());
    let directory = Path::new(&directory);
    fs::create_dir_all(directory)?;
    for (name, figure) in figures() {
        fs::write(
            directory.join(name).with_extension("png"),
            render(&figure, &RenderOptions::default())?,
        )?;
        fs::write(
            directory.join(name).with_extension("svg"),
            render_svg(&figure)?,
        )?;
    }
    let slide = Figure {
        size: FigureSize::SLIDE,
        ..compare()
    };
    fs::write(
        directory.join("compare-slide.png"),
        render(&slide, &RenderOptions { dpi: 150.0 })?,
    )?;
    Ok(())
}

/// All figures of the gallery, by file name.
pub fn figures() -> [(&'static str, Figure); 6] {
    [
        ("speed", speed()),
        ("order-spectrum", order_spectrum()),
        ("compare", compare()),
        ("synchronous-average", synchronous_average()),
        ("convergence", convergence()),
        ("order-traces", order_traces()),
    ]
}

fn steps(from: f64, to: f64, count: u32) -> Vec<f64> {
    (0..=count)
        .map(|i| from + (to - from) * f64::from(i) / f64::from(count))
        .collect()
}

fn map(x: &[f64], f: impl FnMut(f64) -> f64) -> Vec<f64> {
    x.iter().copied().map(f).collect()
}

/// Evenly spread numbers in 0 to 1 from a counter (a multiplicative hash).
fn scatter(seed: u32) -> impl FnMut() -> f64 {
    let mut state = seed;
    move || {
        state = state.wrapping_mul(747_796_405).wrapping_add(2_891_336_453);
        let word = ((state >> ((state >> 28) + 4)) ^ state).wrapping_mul(277_803_737);
        f64::from((word >> 22) ^ word) / f64::from(u32::MAX)
    }
}

fn speed() -> Figure {
    let t = steps(0.0, 120.0, 6000);
    let mut noise = scatter(7);
    let drift = |t: f64| 1480.0 + 22.0 * (TAU * t / 71.0).sin() + 6.0 * (TAU * t / 9.3).sin();
    let rpm = map(&t, |t| {
        if (61.0..66.0).contains(&t) {
            f64::NAN
        } else {
            drift(t) + 1.6 * (noise() - 0.5)
        }
    });
    let sigma = map(&t, |t| 1.2 + 2.5 * (-((t - 96.0) / 7.0).powi(2)).exp());
    let lower = rpm.iter().zip(&sigma).map(|(r, s)| r - s).collect();
    let upper = rpm.iter().zip(&sigma).map(|(r, s)| r + s).collect();
    let mut panel = Panel::new(Axis::linear("time, s"), Axis::linear("shaft speed, rpm"));
    panel.bands.push(Band {
        name: "± 1 standard uncertainty".to_owned(),
        x: t.clone(),
        lower,
        upper,
        role: Role::Primary,
        shade: BandShade::Light,
    });
    panel
        .series
        .push(Series::line("speed", Role::Primary, t, rpm));
    panel.marks = vec![
        marks(
            "inserted (2)",
            Symbol::Inserted,
            Role::Third,
            vec![22.4, 58.1],
        ),
        marks(
            "rejected (3)",
            Symbol::Rejected,
            Role::Warning,
            vec![14.0, 14.6, 88.2],
        ),
        marks(
            "moved (4)",
            Symbol::Moved,
            Role::Secondary,
            vec![93.0, 95.5, 97.1, 99.0],
        ),
    ];
    panel.spans = vec![
        Span {
            from: 34.0,
            to: 46.0,
            kind: SpanKind::Excluded,
            text: "excluded: valve closed".to_owned(),
        },
        Span {
            from: 61.0,
            to: 66.0,
            kind: SpanKind::Break,
            text: "no pulses".to_owned(),
        },
    ];
    panel.rules.push(Rule {
        at: 1500.0,
        way: RuleWay::Across,
        text: "rated 1500 rpm".to_owned(),
        role: Role::Reference,
    });
    Figure {
        title: "Pump P-3 ran between 1451 and 1508 rpm".to_owned(),
        subtitle: "Lindmoor water works, shaft speed from the reference pulse, 2 sections".to_owned(),
        panels: vec![panel],
        foot: vec![
            "tach channel 4, 1 pulse per revolution, rising edge, threshold 2.1 V (automatic); speed every 0.02 s; 2953 pulses timed, 3 rejected, 2 inserted, 4 moved".to_owned(),
            "source: p3-2024-05.wav, 51.2 kHz, 120.0 s; angle known to ± 0.08° (1 standard uncertainty)".to_owned(),
        ],
        ..Figure::default()
    }
}

fn marks(name: &str, symbol: Symbol, role: Role, x: Vec<f64>) -> Marks {
    Marks {
        name: name.to_owned(),
        symbol,
        role,
        x,
        height: MarkHeight::Lane,
    }
}

const LINES: [(f64, f64); 9] = [
    (1.0, 0.42),
    (2.0, 1.31),
    (3.0, 0.22),
    (5.0, 0.9),
    (7.13, 0.31),
    (10.0, 0.55),
    (15.0, 0.27),
    (20.0, 0.16),
    (23.0, 0.2),
];

fn spectrum(orders: &[f64], width: impl Fn(f64) -> f64, floor: f64, seed: u32) -> Vec<f64> {
    let mut noise = scatter(seed);
    map(orders, |k| {
        let ground = floor * (0.7 + 0.6 * noise()) / (1.0 + 0.05 * k);
        let lines = LINES.iter().map(|&(order, rms)| {
            let w = width(order);
            let reach = ((k - order) / w).abs();
            rms * (0.09 / w).sqrt().min(1.0) * (-0.7 * reach.powi(4)).exp()
        });
        ground + lines.sum::<f64>()
    })
}

fn order_spectrum() -> Figure {
    let orders = steps(0.0, 25.0, 400);
    let rms = spectrum(&orders, |_| 0.09, 0.05, 3);
    let mut panel = Panel::new(
        Axis::linear("order (multiples of shaft speed)"),
        Axis::linear("velocity, mm/s rms").from_zero(),
    );
    panel.bands.push(Band {
        name: "90 % repeatability bounds".to_owned(),
        x: orders.clone(),
        lower: map(&rms, |v| v * 0.86),
        upper: map(&rms, |v| v * 1.14),
        role: Role::Primary,
        shade: BandShade::Light,
    });
    panel.labels = [1, 3, 5, 0, 4, 6, 2, 8, 7]
        .map(|i: usize| {
            let (order, _) = LINES[i];
            let at = orders.iter().position(|k| *k >= order - 0.03).unwrap_or(0);
            PeakLabel {
                x: orders[at],
                y: rms[at],
                text: format!("{order:.2} · {:.2} mm/s", rms[at]),
                role: Role::Primary,
            }
        })
        .to_vec();
    panel.series.push(Series::line(
        "tracked order spectrum",
        Role::Primary,
        orders,
        rms,
    ));
    panel.rules.push(Rule {
        at: 1.1,
        way: RuleWay::Across,
        text: "limit supplied: 1.1 mm/s".to_owned(),
        role: Role::Limit,
    });
    panel.spans.push(Span {
        from: 0.0,
        to: 0.8,
        kind: SpanKind::NotReachable,
        text: "below 2 × high-pass".to_owned(),
    });
    Figure {
        title: "Orders 2 and 5 carry most of the velocity".to_owned(),
        subtitle: "Pump P-3, drive end, horizontal; 1447–1507 rpm".to_owned(),
        panels: vec![panel],
        foot: foot(),
        ..Figure::default()
    }
}

fn foot() -> Vec<String> {
    vec![
        "channel 2, velocity in mm/s rms; 1/16 order, Hann, 62 averages (41.3 equivalent), 50 % overlap; 1447–1507 rpm; bounds are scatter of this recording only".to_owned(),
        "source: p3-2024-05.wav, 51.2 kHz, 120.0 s".to_owned(),
    ]
}

fn compare() -> Figure {
    let orders = steps(0.0, 25.0, 1600);
    let tracked = spectrum(&orders, |_| 0.04, 0.03, 5);
    let smeared = spectrum(&orders, |k| 0.04 + 0.02 * k, 0.03, 6);
    let panel = |heading: &str, role, y| {
        let mut panel = Panel::new(
            Axis::linear("order (multiples of mean shaft speed)"),
            Axis::linear("velocity, mm/s rms").from_zero(),
        );
        panel.heading = heading.to_owned();
        panel.series.push(Series {
            name: String::new(),
            x: orders.clone(),
            y,
            role,
            style: SeriesStyle::Area,
        });
        panel
    };
    let mut above = panel("Smeared: even time steps", Role::Secondary, smeared);
    let mut below = panel("Tracked: even angle steps", Role::Primary, tracked);
    above.inset = Some(Inset {
        share: (0.3, 0.72),
        ..Inset::new(14.0, 16.0)
    });
    below.inset = Some(Inset {
        share: (0.3, 0.72),
        place: InsetPlace::Auto,
        y: None,
        ..Inset::new(14.0, 16.0)
    });
    below.labels = vec![
        PeakLabel {
            x: 2.0,
            y: 1.34,
            text: "2.00 · 1.33 mm/s".to_owned(),
            role: Role::Primary,
        },
        PeakLabel {
            x: 10.0,
            y: 0.58,
            text: "10.00 · 0.57 mm/s".to_owned(),
            role: Role::Primary,
        },
    ];
    Figure {
        title: "The drifting speed hid orders 10 and above".to_owned(),
        subtitle: "Pump P-3, drive end, horizontal; the same data, windows and resolution in both"
            .to_owned(),
        panels: vec![above, below],
        shared_x: true,
        shared_y: true,
        foot: foot(),
        ..Figure::default()
    }
}

fn synchronous_average() -> Figure {
    let angle = steps(0.0, 360.0, 720);
    let wave = |a: f64| {
        let turn = TAU * a / 360.0;
        3.1 * (turn - 0.6).cos()
            + 1.2 * (5.0 * turn).cos()
            + 6.5 * (-((a - 212.0) / 4.0).powi(2)).exp()
    };
    let mean = map(&angle, wave);
    let sd = map(&angle, |a| {
        1.6 + 0.8 * (-((a - 212.0) / 30.0).powi(2)).exp()
    });
    let band = |name: &str, scale: f64, shade| Band {
        name: name.to_owned(),
        x: angle.clone(),
        lower: mean.iter().zip(&sd).map(|(m, s)| m - scale * s).collect(),
        upper: mean.iter().zip(&sd).map(|(m, s)| m + scale * s).collect(),
        role: Role::Primary,
        shade,
    };
    let mut panel = Panel::new(
        Axis::linear("shaft angle from the pulse's edge, degrees").every(45.0),
        Axis::linear("acceleration, m/s²"),
    );
    panel.bands = vec![
        band("± s.d. of one revolution", 1.0, BandShade::Light),
        band("± s.d. of the mean", 0.16, BandShade::Strong),
    ];
    panel.series.push(Series::line(
        "mean of 40 revolutions",
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
    panel.labels.push(PeakLabel {
        x: 212.0,
        y: wave(212.0),
        text: "once per revolution, at 212°".to_owned(),
        role: Role::Primary,
    });
    Figure {
        title: "One revolution of blower B-1: a knock at 212°".to_owned(),
        subtitle: "Lindmoor water works, blower B-1, non-drive end, vertical".to_owned(),
        panels: vec![panel],
        foot: foot(),
        ..Figure::default()
    }
}

fn convergence() -> Figure {
    let counts: Vec<f64> = (0..=10).map(|i| f64::from(1 << i)).collect();
    let mut noise = scatter(11);
    let reached = map(&counts, |n| {
        10.0 * n.log10() + if n > 1.0 { 1.4 * (noise() - 0.55) } else { 0.0 }
    });
    let law = map(&counts, |n| 10.0 * n.log10());
    let mut panel = Panel::new(
        Axis::log("number of averaged revolutions"),
        Axis::linear("noise reduction, dB"),
    );
    panel.series.push(Series {
        style: SeriesStyle::LinePoints,
        ..Series::line(
            "measured on this recording",
            Role::Primary,
            counts.clone(),
            reached,
        )
    });
    panel.series.push(Series::line(
        "1/√N law, 10·log₁₀ N",
        Role::Reference,
        counts,
        law,
    ));
    Figure {
        title: "Averaging removes noise as 1/√N up to 1024 revolutions".to_owned(),
        subtitle: "Mixer M-2, gearbox, output shaft".to_owned(),
        panels: vec![panel],
        foot: foot(),
        ..Figure::default()
    }
}

fn order_traces() -> Figure {
    let rpm = steps(600.0, 3000.0, 400);
    let response = |rpm: f64, order: f64, scale: f64| {
        let r = rpm * order / 3600.0;
        scale * r * r / ((1.0 - r * r).powi(2) + (0.1 * r).powi(2)).sqrt()
    };
    let lag = |rpm: f64, order: f64| {
        let r = rpm * order / 3600.0;
        (0.1 * r).atan2(1.0 - r * r).to_degrees()
    };
    let mut above = Panel::new(
        Axis::linear("shaft speed, rpm"),
        Axis::log("displacement, µm peak"),
    );
    let mut below = Panel::new(
        Axis::linear("shaft speed, rpm"),
        Axis::linear("phase lag of displacement, degrees")
            .over(0.0, 180.0)
            .every(45.0),
    );
    for (order, scale, role) in [
        (1.0, 12.0, Role::Primary),
        (2.0, 4.0, Role::Secondary),
        (3.0, 1.5, Role::Third),
        (4.0, 0.8, Role::Fourth),
    ] {
        let name = format!("order {order}");
        above.series.push(Series::line(
            &name,
            role,
            rpm.clone(),
            map(&rpm, |n| response(n, order, scale)),
        ));
        below.series.push(Series::line(
            "",
            role,
            rpm.clone(),
            map(&rpm, |n| lag(n, order)),
        ));
    }
    for at in [1800.0, 1200.0, 900.0] {
        above.rules.push(Rule {
            at,
            way: RuleWay::Upright,
            text: format!("{at} rpm"),
            role: Role::Reference,
        });
        below.rules.push(Rule {
            at,
            way: RuleWay::Upright,
            text: String::new(),
            role: Role::Reference,
        });
    }
    below.height_share = 0.7;
    Figure {
        title: "Run-up of mixer M-2: three resonances below 3000 rpm".to_owned(),
        subtitle: String::new(),
        panels: vec![above, below],
        shared_x: true,
        foot: foot(),
        ..Figure::default()
    }
}
