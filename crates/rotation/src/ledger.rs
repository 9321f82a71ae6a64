//! What was done to the pulses, one by one.

/// What happened to a pulse or a tooth.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LedgerAction {
    /// A tooth gave no pulse; it is counted, and the motion bridges it without a time of its own.
    Inserted,
    /// A pulse belongs to no tooth and is left out.
    Rejected,
    /// A tooth's pulse came at an implausible instant; the tooth is counted, the instant not used.
    Moved,
}

/// One repair.
#[derive(Debug, Clone, PartialEq)]
pub struct LedgerEntry {
    /// Seconds from the first sample; of an inserted tooth the instant worked out for it.
    pub time_s: f64,
    /// What was done.
    pub action: LedgerAction,
    /// Why, in words.
    pub reason: String,
}
