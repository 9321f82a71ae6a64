//! Why the program ends without having done its work.

use std::process::ExitCode;

/// Exit status.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Status {
    /// The data or the run file does not allow it.
    Failed = 1,
    /// The command line is wrong.
    Usage = 2,
    /// Stopped by the user.
    Interrupted = 130,
}

impl From<Status> for ExitCode {
    fn from(status: Status) -> Self {
        Self::from(status as u8)
    }
}

/// What is said on standard error, and the status.
#[derive(Debug)]
pub(crate) struct Failure {
    pub(crate) status: Status,
    pub(crate) message: String,
    pub(crate) hint: Option<String>,
}

impl Failure {
    pub(crate) fn new(status: Status, message: impl Into<String>) -> Self {
        Self {
            status,
            message: message.into(),
            hint: None,
        }
    }

    pub(crate) fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into()).filter(|hint: &String| !hint.is_empty());
        self
    }
}

impl From<shaftwise_run::Error> for Failure {
    fn from(error: shaftwise_run::Error) -> Self {
        let status = match error {
            shaftwise_run::Error::Cancelled => Status::Interrupted,
            _ => Status::Failed,
        };
        Self::new(status, error.to_string()).hint(error.hint().unwrap_or_default())
    }
}

impl From<shaftwise_report::Error> for Failure {
    fn from(error: shaftwise_report::Error) -> Self {
        let status = match error {
            shaftwise_report::Error::Cancelled => Status::Interrupted,
            _ => Status::Failed,
        };
        Self::new(status, error.to_string()).hint(error.hint().unwrap_or_default())
    }
}
