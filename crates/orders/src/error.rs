//! What this crate refuses.

/// Why an analysis could not be set up.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// Block, hop and lines do not fit each other.
    #[error(
        "a block of {block} samples with a hop of {hop} and {lines} lines, expected 2 samples or more, a hop of 1 or more, 1 to block/2 + 1 lines"
    )]
    Block {
        /// Samples in a block.
        block: usize,
        /// Samples from block to block.
        hop: usize,
        /// Lines kept.
        lines: usize,
    },
    /// A window or filter could not be made.
    #[error("{0}")]
    Signal(#[from] shaftwise_signal::Error),
}
