//! Why a run could not be done, with a hint.

/// What stopped a run.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// The recording could not be read.
    #[error("{file}: {source}")]
    Recording {
        /// Its name.
        file: String,
        /// Why.
        source: shaftwise_recording::Error,
    },
    /// The pulses give no rotation.
    #[error("{0}")]
    Rotation(#[from] shaftwise_rotation::Error),
    /// A setting the data does not allow.
    #[error("{what}")]
    Setting {
        /// What, where, found and expected.
        what: String,
        /// What to do about it.
        hint: String,
    },
    /// The run file is wrong somewhere.
    #[error("{file}:{line}:{column}: {what}")]
    RunFile {
        /// File's name.
        file: String,
        /// Line from 1.
        line: usize,
        /// Column from 1, in characters.
        column: usize,
        /// What was found and what was expected.
        what: String,
        /// What to do about it.
        hint: String,
    },
    /// A file could not be read.
    #[error("{file}: {source}")]
    File {
        /// File's name.
        file: String,
        /// The system's word.
        source: std::io::Error,
    },
    /// The user stopped the run.
    #[error("interrupted; nothing was written")]
    Cancelled,
}

impl Error {
    /// Puts the recording's name to what its reader says.
    pub(crate) fn in_recording(file: &str) -> impl Fn(shaftwise_recording::Error) -> Self {
        move |source| Self::Recording {
            file: file.to_owned(),
            source,
        }
    }

    /// What the user can do about it.
    #[must_use]
    pub fn hint(&self) -> Option<String> {
        match self {
            Self::Setting { hint, .. } | Self::RunFile { hint, .. } if !hint.is_empty() => Some(hint.clone()),
            Self::Rotation(_) => Some(
                "look at the tach channel: `--edge`, `--threshold` and `--pulses-per-rev` say how it is read".to_owned(),
            ),
            _ => None,
        }
    }
}
