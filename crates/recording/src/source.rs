//! Bytes read by position, and the unnamed spool file for what cannot be.

use std::fs::File;
use std::io::{self, ErrorKind, Read};

use sha2::{Digest, Sha256};

/// Reads into `bytes` from `offset` on until it is full or the file ends, and
/// returns how much was read.
pub(crate) fn read_at(file: &File, mut bytes: &mut [u8], mut offset: u64) -> io::Result<usize> {
    let wanted = bytes.len();
    while !bytes.is_empty() {
        match read_some_at(file, bytes, offset) {
            Ok(0) => break,
            Ok(n) => {
                bytes = &mut bytes[n..];
                offset += n as u64;
            }
            Err(error) if error.kind() == ErrorKind::Interrupted => {}
            Err(error) => return Err(error),
        }
    }
    Ok(wanted - bytes.len())
}

#[cfg(unix)]
fn read_some_at(file: &File, bytes: &mut [u8], offset: u64) -> io::Result<usize> {
    std::os::unix::fs::FileExt::read_at(file, bytes, offset)
}

#[cfg(windows)]
fn read_some_at(file: &File, bytes: &mut [u8], offset: u64) -> io::Result<usize> {
    std::os::windows::fs::FileExt::seek_read(file, bytes, offset)
}

/// A reader that hashes what passes through it.
pub(crate) struct Hashed<R> {
    inner: R,
    sha256: Sha256,
}

impl<R: Read> Hashed<R> {
    pub(crate) fn new(inner: R) -> Self {
        Self {
            inner,
            sha256: Sha256::new(),
        }
    }

    pub(crate) fn finish(self) -> String {
        hex(self.sha256)
    }
}

impl<R: Read> Read for Hashed<R> {
    fn read(&mut self, bytes: &mut [u8]) -> io::Result<usize> {
        let n = self.inner.read(bytes)?;
        self.sha256.update(&bytes[..n]);
        Ok(n)
    }
}

/// The digest as `sha256sum` prints it.
pub(crate) fn hex(sha256: Sha256) -> String {
    sha256
        .finalize()
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}
