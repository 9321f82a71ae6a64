//! Results composed into figures. Each says in its title what it shows, within the evidence, and
//! in its foot what it rests on.

mod compare;
mod foot;
mod spectrum;
mod speed;
mod synchronous;

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

/// The figures of one channel of an analysis (`speed`: channel 0).
pub(crate) fn analysis_figures(
    result: &RunResult,
    index: usize,
    channel: usize,
    context: &Context,
) -> Vec<Drawing> {
    match &result.analyses[index].result {
        AnalysisResult::Speed(speed) => vec![speed_figure(speed, result, context)],
        AnalysisResult::Spectrum(r) => vec![spectrum::figure(r, channel, result, context)],
        AnalysisResult::Synchronous(r) => synchronous::figures(r, channel, result, context),
        AnalysisResult::Compare(r) => vec![compare::figure(r, channel, result, context)],
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
