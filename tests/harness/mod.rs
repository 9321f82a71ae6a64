//! Runs the binary in a folder of its own and checks what it says; a failure shows everything.
#![allow(clippy::unwrap_used)]

use serde_json::Value;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::sync::OnceLock;
use tempfile::TempDir;

/// A folder that is gone when the test is over.
pub(crate) struct Folder(TempDir);

impl Folder {
    /// Holds nothing.
    pub(crate) fn empty() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    /// Holds `small.wav` (two accelerometers, the tach is channel 3) and its `run.json`, as `demo`
    /// writes them.
    pub(crate) fn with_recording() -> Self {
        static MADE: OnceLock<PathBuf> = OnceLock::new();
        let made = MADE.get_or_init(|| {
            let made = Path::new(env!("CARGO_TARGET_TMPDIR")).join("small");
            let recipe = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/recipes/small.json");
            let out = made.to_str().unwrap();
            let here = Self::empty();
            here.call(&["demo", recipe, "--out", out]).done();
            made
        });
        let folder = Self::empty();
        std::fs::copy(made.join("recording.wav"), folder.path("small.wav")).unwrap();
        std::fs::copy(made.join("run.json"), folder.path("run.json")).unwrap();
        folder.change("run.json", "recording.wav", "small.wav");
        folder
    }

    pub(crate) fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    pub(crate) fn write(&self, name: &str, content: impl AsRef<[u8]>) -> &Self {
        std::fs::write(self.path(name), content).unwrap();
        self
    }

    /// Changes a file's text.
    pub(crate) fn change(&self, name: &str, from: &str, to: &str) -> &Self {
        let text = std::fs::read_to_string(self.path(name)).unwrap();
        assert!(text.contains(from), "{from} in {text}");
        self.write(name, text.replacen(from, to, 1))
    }

    /// Names of everything in the folder below it, sorted.
    pub(crate) fn names(&self, below: &str) -> Vec<String> {
        let entries = std::fs::read_dir(self.path(below)).unwrap();
        let mut names: Vec<String> = entries
            .map(|entry| entry.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        names
    }

    /// Runs a line of words without blanks in them.
    pub(crate) fn run(&self, line: &str) -> Outcome {
        self.call(&line.split_whitespace().collect::<Vec<_>>())
    }

    pub(crate) fn call(&self, words: &[&str]) -> Outcome {
        self.call_with(words, |_| (), b"")
    }

    pub(crate) fn call_with(
        &self,
        words: &[&str],
        prepare: impl Fn(&mut Command),
        input: &[u8],
    ) -> Outcome {
        let mut child = self.start(words, prepare);
        let mut stdin = child.stdin.take().unwrap();
        let input = input.to_vec();
        // a program that reads nothing closes its end
        let feeding = std::thread::spawn(move || drop(stdin.write_all(&input)));
        let output = child.wait_with_output().unwrap();
        feeding.join().unwrap();
        Outcome {
            line: words.join(" "),
            status: output.status.code(),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }

    pub(crate) fn start(&self, words: &[&str], prepare: impl Fn(&mut Command)) -> Child {
        let mut command = Command::new(env!("CARGO_BIN_EXE_shaftwise"));
        command
            .args(words)
            .current_dir(self.0.path())
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped());
        prepare(&mut command);
        command.spawn().unwrap()
    }
}

/// What a run left.
pub(crate) struct Outcome {
    line: String,
    status: Option<i32>,
    pub(crate) stdout: String,
    pub(crate) stderr: String,
}

impl Outcome {
    #[track_caller]
    fn check(&self, held: bool, wanted: &str) -> &Self {
        assert!(
            held,
            "\nwanted: {wanted}\n$ shaftwise {}\n-- status {:?}\n-- stdout\n{}\n-- stderr\n{}",
            self.line, self.status, self.stdout, self.stderr
        );
        self
    }

    #[track_caller]
    pub(crate) fn exits(&self, status: i32) -> &Self {
        self.check(
            self.status == Some(status),
            &format!("exit status {status}"),
        )
    }

    /// Exit status 0 and nothing to complain about.
    #[track_caller]
    pub(crate) fn done(&self) -> &Self {
        self.exits(0);
        self.check(!self.stderr.contains("error:"), "no error")
    }

    /// Exit status, an error in one line with these words, and nothing on standard output.
    #[track_caller]
    pub(crate) fn fails(&self, status: i32, words: &str) -> &Self {
        self.exits(status);
        self.check(self.stdout.is_empty(), "nothing on standard output");
        let errors = self
            .stderr
            .lines()
            .filter(|line| line.starts_with("error: "));
        self.check(errors.count() == 1, "one line of error");
        self.check(!self.stderr.contains("panicked"), "no panic");
        self.check(self.stderr.contains(words), words)
    }

    #[track_caller]
    pub(crate) fn hints(&self, words: &str) -> &Self {
        let mut hints = self
            .stderr
            .lines()
            .filter(|line| line.starts_with("hint: "));
        self.check(
            hints.any(|hint| hint.contains(words)),
            &format!("hint: {words}"),
        )
    }

    #[track_caller]
    pub(crate) fn warns(&self, words: &str) -> &Self {
        let mut warnings = self
            .stderr
            .lines()
            .filter(|line| line.starts_with("warning: "));
        self.check(
            warnings.any(|line| line.contains(words)),
            &format!("warning: {words}"),
        )
    }

    #[track_caller]
    pub(crate) fn says(&self, words: &str) -> &Self {
        self.check(self.stdout.contains(words), words)
    }

    #[track_caller]
    pub(crate) fn json(&self) -> Value {
        self.exits(0);
        let value = serde_json::from_str(&self.stdout);
        self.check(value.is_ok(), "JSON and nothing else on standard output");
        value.unwrap()
    }
}

/// Fails unless every key is there; `null` counts as there.
#[track_caller]
pub(crate) fn has(value: &Value, keys: &str) {
    for key in keys.split_whitespace() {
        assert!(value.get(key).is_some(), "no `{key}` in {value:.300}");
    }
}

/// Length of each list, all alike.
#[track_caller]
pub(crate) fn equal_lists(value: &Value, keys: &str) -> usize {
    let lengths: Vec<usize> = keys
        .split_whitespace()
        .map(|key| {
            value[key]
                .as_array()
                .unwrap_or_else(|| panic!("no list `{key}`"))
                .len()
        })
        .collect();
    assert!(
        lengths.iter().all(|length| *length == lengths[0]),
        "{keys}: {lengths:?}"
    );
    lengths[0]
}
