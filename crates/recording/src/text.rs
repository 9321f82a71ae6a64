//! Delimited text.

use std::fs::File;
use std::io::Read;

use crate::Error;
use crate::error::printable;
use crate::recording::Parsed;

/// Reads text into `spool`.
pub(crate) fn parse(
    head: &[u8],
    _rest: impl Read,
    _spool: &File,
    _sample_rate_hz: Option<f64>,
) -> Result<Parsed, Error> {
    Err(Error::UnknownFormat {
        found: printable(head),
    })
}
