use std::io;
use std::path::PathBuf;

/// Why results could not be written.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// The user stopped the run.
    #[error("interrupted; nothing was written")]
    Cancelled,
    /// The output folder is there, but it is no folder.
    #[error("{}: found a file, expected a folder for the results", path.display())]
    NotAFolder {
        /// The path.
        path: PathBuf,
    },
    /// The output folder could not be made or takes no files.
    #[error("{}: could not {action}: {source}", path.display())]
    Folder {
        /// The path.
        path: PathBuf,
        /// What was being done, as an infinitive.
        action: &'static str,
        /// What the operating system said.
        source: io::Error,
    },
    /// A setting of the figures out of range.
    #[error("{what} is {found}, expected {expected}")]
    Setting {
        /// The setting.
        what: &'static str,
        /// The value found.
        found: String,
        /// The values allowed.
        expected: &'static str,
    },
    /// A file could not be written.
    #[error("{}: could not {action}: {source}", path.display())]
    File {
        /// The file.
        path: PathBuf,
        /// What was being done, as an infinitive.
        action: &'static str,
        /// What the operating system said.
        source: io::Error,
    },
    /// A table or a WAV could not be encoded.
    #[error("{}: {source}", path.display())]
    Encode {
        /// The file.
        path: PathBuf,
        /// What the encoder said.
        source: shaftwise_recording::Error,
    },
    /// A figure could not be drawn.
    #[error("{}: {source}", path.display())]
    Figure {
        /// The file.
        path: PathBuf,
        /// What the drawing said.
        source: shaftwise_figures::Error,
    },
}

impl Error {
    /// What the user can do about it, where there is something to do.
    #[must_use]
    pub fn hint(&self) -> Option<&'static str> {
        match self {
            Self::NotAFolder { .. } => Some("name another folder with --out DIR"),
            Self::Folder { .. } => Some("name a folder you may write into with --out DIR"),
            Self::File { .. } | Self::Encode { .. } => {
                Some("look whether the disk is full; files from before this run are untouched")
            }
            Self::Cancelled | Self::Setting { .. } | Self::Figure { .. } => None,
        }
    }
}
