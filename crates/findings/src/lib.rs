//! Peaks, verdicts and comparisons drawn from averages.
