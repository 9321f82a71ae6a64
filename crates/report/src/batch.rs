use std::fs;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};

use tempfile::NamedTempFile;

use crate::Error;

/// Names of temporary files are this, random letters and digits, and the suffix.
const PREFIX: &str = ".shaftwise-";
const SUFFIX: &str = ".tmp";
const RANDOM_LETTERS: usize = 6;

/// Why the content of a file could not be made.
#[derive(Debug)]
pub(crate) enum Fault {
    Encode(shaftwise_recording::Error),
    Figure(shaftwise_figures::Error),
    Io(io::Error),
}

impl From<shaftwise_recording::Error> for Fault {
    fn from(error: shaftwise_recording::Error) -> Self {
        Self::Encode(error)
    }
}

impl From<shaftwise_figures::Error> for Fault {
    fn from(error: shaftwise_figures::Error) -> Self {
        Self::Figure(error)
    }
}

impl From<io::Error> for Fault {
    fn from(error: io::Error) -> Self {
        Self::Io(error)
    }
}

/// Files that are complete under temporary names in their folder, waiting to be renamed. Dropped,
/// it takes them all away again.
pub(crate) struct Batch {
    folder: PathBuf,
    staged: Vec<(PathBuf, NamedTempFile)>,
    cancel: Option<&'static AtomicBool>,
}

impl Batch {
    pub(crate) fn new(folder: &Path) -> Self {
        Self {
            folder: folder.to_owned(),
            staged: Vec::new(),
            cancel: None,
        }
    }

    /// Gives up before the next file, or before the first gets its name, once this is set.
    pub(crate) fn cancelled_by(self, cancel: Option<&'static AtomicBool>) -> Self {
        Self { cancel, ..self }
    }

    fn go_on(&self) -> Result<(), Error> {
        match self.cancel {
            Some(cancel) if cancel.load(Ordering::Relaxed) => Err(Error::Cancelled),
            _ => Ok(()),
        }
    }

    /// Writes a file whole and brings it to the disk, under a temporary name.
    pub(crate) fn stage(
        &mut self,
        name: impl AsRef<Path>,
        content: impl FnOnce(&mut dyn Write) -> Result<(), Fault>,
    ) -> Result<(), Error> {
        self.go_on()?;
        let path = self.folder.join(name);
        let failed = |action, source| Error::File {
            path: path.clone(),
            action,
            source,
        };
        let file =
            temporary(&self.folder).map_err(|e| failed("make a temporary file beside it", e))?;
        let mut sink = BufWriter::with_capacity(1 << 16, file);
        content(&mut sink).map_err(|fault| match fault {
            Fault::Encode(source) => Error::Encode {
                path: path.clone(),
                source,
            },
            Fault::Figure(source) => Error::Figure {
                path: path.clone(),
                source,
            },
            Fault::Io(source) => failed("write the file", source),
        })?;
        let file = sink
            .into_inner()
            .map_err(|e| failed("write the file", e.into_error()))?;
        file.as_file()
            .sync_all()
            .map_err(|e| failed("bring the file to the disk", e))?;
        self.staged.push((path, file));
        Ok(())
    }

    /// Names of the staged files, in order.
    pub(crate) fn names(&self) -> Vec<String> {
        self.staged
            .iter()
            .filter_map(|(path, _)| path.file_name())
            .map(|name| name.to_string_lossy().into_owned())
            .collect()
    }

    /// Gives every file its name, in the order they were staged.
    pub(crate) fn commit(self) -> Result<Vec<PathBuf>, Error> {
        self.go_on()?;
        let mut written = Vec::new();
        for (path, file) in self.staged {
            file.persist(&path).map_err(|e| Error::File {
                path: path.clone(),
                action: "give the finished file its name",
                source: e.error,
            })?;
            written.push(path);
        }
        Ok(written)
    }
}

/// An empty file of a name of its own in the folder.
pub(crate) fn temporary(folder: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    builder
        .prefix(PREFIX)
        .suffix(SUFFIX)
        .rand_bytes(RANDOM_LETTERS);
    // Temporary files are private by default; results are as open as the user's mask allows.
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    let file = builder.tempfile_in(folder)?;
    // The lock says that somebody is still at work on it. Where there are no locks, no temporary
    // file is ever taken for a stale one.
    let _ = file.as_file().try_lock();
    Ok(file)
}

/// Removes the temporary files that a killed run left in the folder; those of a living one are
/// locked. Nobody asked for it, so what cannot be removed stays.
pub(crate) fn remove_stale(folder: &Path) {
    for entry in fs::read_dir(folder).into_iter().flatten().flatten() {
        let plain = entry.file_type().is_ok_and(|kind| kind.is_file());
        if !plain || !entry.file_name().to_str().is_some_and(is_temporary) {
            continue;
        }
        let file = fs::OpenOptions::new().write(true).open(entry.path());
        if file.is_ok_and(|file| file.try_lock().is_ok()) {
            let _ = fs::remove_file(entry.path());
        }
    }
}

/// Whether [`temporary`] gives such names.
fn is_temporary(name: &str) -> bool {
    name.strip_prefix(PREFIX)
        .and_then(|rest| rest.strip_suffix(SUFFIX))
        .is_some_and(|random| {
            random.len() == RANDOM_LETTERS && random.bytes().all(|b| b.is_ascii_alphanumeric())
        })
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    fn listing(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(folder)
            .unwrap()
            .map(|entry| entry.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        names
    }

    #[test]
    fn a_disk_that_fills_up_leaves_nothing_of_the_run_and_all_from_before() {
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join("a.csv"), "before").unwrap();
        let mut batch = Batch::new(folder.path());
        batch
            .stage("a.csv", |sink| Ok(sink.write_all(b"after")?))
            .unwrap();
        let error = batch
            .stage("b.csv", |sink| {
                sink.write_all(&[0; 100_000])?;
                Err(io::Error::from(io::ErrorKind::StorageFull).into())
            })
            .unwrap_err();
        assert!(matches!(error, Error::File { .. }), "{error}");
        drop(batch);
        assert_eq!(listing(folder.path()), ["a.csv"]);
        assert_eq!(fs::read(folder.path().join("a.csv")).unwrap(), b"before");
    }

    #[test]
    fn a_name_taken_by_a_folder_leaves_complete_files_and_no_stray_ones() {
        let folder = tempfile::tempdir().unwrap();
        fs::create_dir(folder.path().join("b.csv")).unwrap();
        let mut batch = Batch::new(folder.path());
        for name in ["a.csv", "b.csv", "c.csv"] {
            batch
                .stage(name, |sink| Ok(sink.write_all(name.as_bytes())?))
                .unwrap();
        }
        assert!(batch.commit().is_err());
        assert_eq!(listing(folder.path()), ["a.csv", "b.csv"]);
        assert_eq!(fs::read(folder.path().join("a.csv")).unwrap(), b"a.csv");
    }

    #[test]
    fn a_cancelled_batch_stages_and_renames_nothing() {
        static CANCEL: AtomicBool = AtomicBool::new(false);
        let folder = tempfile::tempdir().unwrap();
        let mut batch = Batch::new(folder.path()).cancelled_by(Some(&CANCEL));
        batch.stage("a.csv", |_| Ok(())).unwrap();
        CANCEL.store(true, Ordering::Relaxed);
        let error = batch.stage("b.csv", |_| Ok(())).unwrap_err();
        assert!(matches!(error, Error::Cancelled), "{error}");
        assert!(matches!(batch.commit(), Err(Error::Cancelled)));
        assert_eq!(listing(folder.path()), [""; 0]);
    }

    #[test]
    fn only_temporary_files_that_nobody_works_on_are_stale() {
        let folder = tempfile::tempdir().unwrap();
        let others = [
            ".shaftwise-.tmp",
            ".shaftwise-abc12.tmp",
            ".shaftwise-abc-12.tmp",
            ".shaftwise-abc123.tmp.csv",
            "shaftwise-abc123.tmp",
        ];
        for name in others {
            fs::write(folder.path().join(name), "").unwrap();
        }
        fs::create_dir(folder.path().join(".shaftwise-folder.tmp")).unwrap();
        let (_, stale) = temporary(folder.path()).unwrap().keep().unwrap();
        let living = temporary(folder.path()).unwrap();
        remove_stale(folder.path());
        assert!(!stale.exists());
        assert!(living.path().exists());
        assert_eq!(listing(folder.path()).len(), others.len() + 2);
    }

    #[cfg(unix)]
    #[test]
    fn results_are_as_open_as_any_other_file() {
        use std::os::unix::fs::PermissionsExt;
        let folder = tempfile::tempdir().unwrap();
        let plain = folder.path().join("plain");
        fs::write(&plain, "").unwrap();
        let mut batch = Batch::new(folder.path());
        batch.stage("a.csv", |_| Ok(())).unwrap();
        let written = batch.commit().unwrap();
        let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode();
        assert_eq!(mode(&written[0]), mode(&plain));
    }
}
