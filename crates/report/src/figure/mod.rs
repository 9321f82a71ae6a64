//! Results composed into figures. Each says in its title what it shows, within the evidence, and
//! in its foot what it rests on.

mod compare;
mod foot;
mod spectrum;
mod speed;
mod synchronous;

use serde_json::Value;
use shaftwise_figures::Figure;
use shaftwise_run::{AnalysisResult, ChannelFacts, RunResult};

use crate::Context;
use crate::shown::channel_title;

pub(crate) use speed::speed_figure;

/// A figure and what its file's name ends with.
pub(crate) struct Drawing {
    pub(crate) suffix: &'static str,
    pub(crate) figure: Figure,
}

/// What stands around an analysis.
#[derive(Clone, Copy)]
pub(crate) struct Scene<'r> {
    pub(crate) result: &'r RunResult,
    /// Settings of the analysis; null where there is none.
    pub(crate) settings: &'r Value,
    pub(crate) context: &'r Context,
}

impl Scene<'_> {
    /// The highest order asked for or, if that is higher, drawn.
    fn highest_order(&self, orders: &[f64]) -> f64 {
        let asked = self.settings.get("max_order").and_then(Value::as_f64);
        let drawn = orders.last().copied().unwrap_or(0.0);
        asked.unwrap_or(drawn).max(drawn)
    }
}

/// The figures of one channel of an analysis (`speed`: channel 0).
pub(crate) fn analysis_figures(
    result: &RunResult,
    index: usize,
    channel: usize,
    context: &Context,
) -> Vec<Drawing> {
    let outcome = &result.analyses[index];
    let scene = Scene {
        result,
        settings: &outcome.settings,
        context,
    };
    match &outcome.result {
        AnalysisResult::Speed(speed) => vec![speed_figure(speed, scene)],
        AnalysisResult::Spectrum(r) => vec![spectrum::figure(r, channel, scene)],
        AnalysisResult::Synchronous(r) => synchronous::figures(r, channel, scene),
        AnalysisResult::Compare(r) => vec![compare::figure(r, channel, scene)],
    }
}

/// Under the title: machine, channel, conditions.
fn subtitle(channel: Option<&ChannelFacts>, context: &Context) -> String {
    let conditions = format!(
        "conditions: {}",
        crate::context::stated(&context.conditions)
    );
    let parts = [
        context.machine_name(),
        channel.map(channel_title).unwrap_or_default(),
        conditions,
    ];
    parts
        .into_iter()
        .filter(|part| !part.is_empty())
        .collect::<Vec<_>>()
        .join("; ")
}
