use std::fs::File;
use std::sync::Arc;

use sha2::{Digest, Sha256};

use crate::Error;
use crate::source::{hex, read_at};

/// Where the hash of a recording comes from.
#[derive(Debug)]
pub enum HashParts {
    /// Already taken while the recording was spooled: the sha256 in hex.
    Taken(String),
    /// To be taken along with the first sequential read.
    Sequential(FileHasher),
}

/// Takes the sha256 of a recording's file from the raw buffers that are being
/// decoded anyway, so that the file is read once.
///
/// It starts with what lies before the samples, is fed every buffer of
/// [`Recording::read_raw`](crate::Recording::read_raw) in ascending order
/// without a gap, and ends with whatever was not fed to it. A hasher that is
/// fed nothing hashes the whole file by itself. It owns a handle to the file
/// and may live on a thread of its own.
#[derive(Debug)]
pub struct FileHasher {
    sha256: Sha256,
    file: Arc<File>,
    hashed_bytes: u64,
}

const BUFFER_BYTES: usize = 1 << 20;

impl FileHasher {
    pub(crate) fn new(file: Arc<File>, prefix_bytes: u64) -> Result<Self, Error> {
        let mut hasher = Self {
            sha256: Sha256::new(),
            file,
            hashed_bytes: 0,
        };
        hasher.read_up_to(prefix_bytes)?;
        Ok(hasher)
    }

    /// Takes the next buffer of raw frames.
    pub fn update(&mut self, frames: &[u8]) {
        self.sha256.update(frames);
        self.hashed_bytes += frames.len() as u64;
    }

    /// Reads the rest of the file and returns the digest in hex, as
    /// `sha256sum` prints it.
    ///
    /// # Errors
    ///
    /// [`Error::Io`].
    pub fn finish(mut self) -> Result<String, Error> {
        self.read_up_to(u64::MAX)?;
        Ok(hex(self.sha256))
    }

    fn read_up_to(&mut self, end: u64) -> Result<(), Error> {
        let mut buffer = Vec::new();
        while self.hashed_bytes < end {
            let left = usize::try_from(end - self.hashed_bytes).unwrap_or(BUFFER_BYTES);
            buffer.resize(left.min(BUFFER_BYTES), 0);
            let n = read_at(&self.file, &mut buffer, self.hashed_bytes).map_err(Error::reading)?;
            self.update(&buffer[..n]);
            if n < buffer.len() {
                break;
            }
        }
        Ok(())
    }
}
