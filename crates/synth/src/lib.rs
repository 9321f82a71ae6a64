//! Recordings with exactly known content.
