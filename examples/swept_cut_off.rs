//! Draws what is left, at or below the highest order, of a pure order that moves through and beyond it
//! while the speed swings by a fifth: the picture of the cut-off that stands in the README.
//!
//! cargo run --release --example swept_cut_off -- FILE.png [POINTS]

use shaftwise_figures::{Axis, Figure, Panel, RenderOptions, Role, Rule, RuleWay, Series, render};
use shaftwise_run::{
    Analysis, AnalysisResult, ChannelPick, Control, Job, RecordingSettings, SpectrumSettings,
    TachSettings, WindowChoice, execute,
};
use shaftwise_synth::{Channel, Order, PulseTrain, Recipe, Speed, Synth};
use std::error::Error;
use std::path::Path;
use std::sync::atomic::AtomicBool;

const HIGHEST: f64 = 50.0;

/// Highest line at or below the highest order, outside ± 0.5 order of the one planted, in dB of it.
fn left_over(order: f64, folder: &Path) -> Result<f64, Box<dyn Error>> {
    let mut recipe = Recipe::new(
        12_800.0,
        12.0,
        Speed::constant(20.0).with_wobble(4.0, 0.2, 0.0),
    );
    recipe.channels = vec![
        Channel {
            orders: vec![Order::new(order, 1.0, 0.0)],
            ..Channel::new("A", "acceleration", "m/s²")
        },
        Channel::tach(PulseTrain::once_per_rev()),
    ];
    let path = folder.join("recording.csv");
    // Text keeps all digits: 32-bit samples would stop at −150 dB.
    let rendered = Synth::render(&recipe)?;
    let mut text = String::from("A [m/s2];tach [V]\n");
    for (a, t) in rendered.channels[0].iter().zip(&rendered.channels[1]) {
        text.push_str(&format!("{a:e};{t:e}\n"));
    }
    std::fs::write(&path, text)?;
    let settings = SpectrumSettings {
        window: WindowChoice::Kaiser,
        max_order: Some(HIGHEST),
        channel: Some(vec![ChannelPick::Number(1)]),
        ..Default::default()
    };
    let job = Job {
        recording: RecordingSettings {
            file: "recording.csv".to_owned(),
            sample_rate_hz: Some(recipe.sample_rate_hz),
            ..Default::default()
        },
        tach: TachSettings {
            channel: Some(ChannelPick::Number(2)),
            ..Default::default()
        },
        select: Default::default(),
        analyses: vec![Analysis::Spectrum(settings)],
        base: folder.to_owned(),
        threads: 2,
    };
    let result = execute(
        &job,
        &Control {
            progress: &|_| {},
            cancel: &AtomicBool::new(false),
        },
    )?;
    let AnalysisResult::Spectrum(spectrum) = &result.analyses[0].result else {
        return Err("no spectrum".into());
    };
    let channel = &spectrum.channels[0];
    let orders = channel.orders.as_deref().unwrap_or_default();
    let highest = orders
        .iter()
        .zip(&channel.rms)
        .filter(|(place, _)| (*place - order).abs() > 0.5)
        .map(|(_, rms)| *rms)
        .fold(1e-12, f64::max);
    Ok(20.0 * (highest * std::f64::consts::SQRT_2).log10())
}

/// Sweeps the order and writes the picture.
pub fn draw(file: &Path, points: usize) -> Result<(), Box<dyn Error>> {
    let folder = tempfile::tempdir()?;
    let shares: Vec<f64> = (0..points)
        .map(|i| 0.9 + 0.8 * i as f64 / (points - 1) as f64)
        .collect();
    let left = shares
        .iter()
        .map(|s| left_over(s * HIGHEST, folder.path()))
        .collect::<Result<Vec<_>, _>>()?;
    let mut panel = Panel::new(
        Axis::linear("order of the tone, in units of the highest order asked for").over(0.9, 1.7),
        Axis::linear("highest other line at or below the highest order, dB").over(-200.0, -80.0),
    );
    panel
        .series
        .push(Series::line("left over", Role::Primary, shares, left));
    panel.rules.push(Rule {
        at: -100.0,
        way: RuleWay::Across,
        text: "asked for: −100 dB".to_owned(),
        role: Role::Limit,
    });
    let figure = Figure {
        title: "The cut-off follows the speed".to_owned(),
        subtitle: "a pure order of amplitude 1; speed 20 rev/s ± 20 % at 0.2 Hz".to_owned(),
        panels: vec![panel],
        foot: vec![
            "made from a recipe, 12 800 Hz, 12 s; highest order 50, 1/16 order, Kaiser window β 18, 50 % overlap".to_owned(),
        ],
        ..Default::default()
    };
    std::fs::write(file, render(&figure, &RenderOptions { dpi: 150.0 })?)?;
    Ok(())
}

/// Reads the command line.
pub fn main() -> Result<(), Box<dyn Error>> {
    let mut args = std::env::args().skip(1);
    let file = args
        .next()
        .ok_or("usage: swept_cut_off FILE.png [POINTS]")?;
    let points = args.next().map_or(Ok(41), |p| p.parse())?;
    draw(Path::new(&file), points)
}
