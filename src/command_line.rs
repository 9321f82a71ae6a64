//! The command line as the results state it.

use std::ffi::OsString;
use std::path::Path;

/// Flags without influence on a result, and whether a value follows.
const LEFT_OUT: [(&str, bool); 4] = [
    ("--threads", true),
    ("--out", true),
    ("--json", false),
    ("--quiet", false),
];

/// How files stand in a command line.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Paths {
    /// As they were typed, to be typed again at the same place.
    AsTyped,
    /// Without their folders, so that a result does not depend on where it was worked out.
    Bare,
}

/// The words that led to a result; the number of threads and the like are not among them.
pub(crate) fn command_line(words: impl Iterator<Item = OsString>, paths: Paths) -> String {
    let mut line = vec!["shaftwise".to_owned()];
    let mut words = words
        .skip(1)
        .map(|word| word.to_string_lossy().into_owned());
    while let Some(word) = words.next() {
        let name = word.split('=').next().unwrap_or_default();
        if let Some((_, valued)) = LEFT_OUT.iter().find(|(flag, _)| *flag == name) {
            if *valued && name == word {
                words.next();
            }
            continue;
        }
        line.push(quoted(match paths {
            Paths::AsTyped => &word,
            Paths::Bare => bare(&word),
        }));
    }
    line.join(" ")
}

/// A path's own name, without the folders.
fn bare(word: &str) -> &str {
    let path = Path::new(word);
    match path.file_name().and_then(|name| name.to_str()) {
        Some(name) if !word.starts_with('-') && path.exists() => name,
        _ => word,
    }
}

fn quoted(word: &str) -> String {
    let plain = |letter: char| letter.is_alphanumeric() || "-_=.,:/+%".contains(letter);
    match !word.is_empty() && word.chars().all(plain) {
        true => word.to_owned(),
        false => format!("'{}'", word.replace('\'', "'\\''")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(words: &[&str]) -> String {
        command_line(words.iter().map(|word| (*word).into()), Paths::Bare)
    }

    #[test]
    fn what_does_not_change_a_result_is_left_out() {
        assert_eq!(
            line(&[
                "/bin/x",
                "spectrum",
                "a.wav",
                "--threads",
                "3",
                "--tach",
                "4",
                "--out=b",
                "--json"
            ]),
            "shaftwise spectrum a.wav --tach 4"
        );
    }

    #[test]
    fn folders_stay_only_where_they_are_wanted() {
        let words = || {
            ["x", "speed", "src/main.rs"]
                .map(OsString::from)
                .into_iter()
        };
        assert_eq!(
            command_line(words(), Paths::AsTyped),
            "shaftwise speed src/main.rs"
        );
        assert_eq!(
            command_line(words(), Paths::Bare),
            "shaftwise speed main.rs"
        );
    }

    #[test]
    fn words_with_spaces_are_quoted() {
        assert_eq!(
            line(&["x", "speed", "a b.wav", "--exclude", "1:2=it's off"]),
            "shaftwise speed 'a b.wav' --exclude '1:2=it'\\''s off'"
        );
    }
}
