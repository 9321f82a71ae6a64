//! Which pulse belongs to which tooth.

use crate::LedgerEntry;
use crate::smoother::Pulse;
use shaftwise_signal::SamplePosition;

/// Pulses with their teeth, in stretches whose count is sure.
#[derive(Debug, Default)]
pub(crate) struct Numbering {
    pub(crate) stretches: Vec<Vec<Pulse>>,
    pub(crate) ledger: Vec<LedgerEntry>,
    pub(crate) rejected: u64,
    pub(crate) warnings: Vec<String>,
}

pub(crate) fn number(positions: &[SamplePosition]) -> Numbering {
    let pulses = positions
        .iter()
        .zip(0..)
        .map(|(&position, tooth)| Pulse {
            tooth,
            position,
            used: true,
        })
        .collect();
    Numbering {
        stretches: vec![pulses],
        ..Numbering::default()
    }
}
