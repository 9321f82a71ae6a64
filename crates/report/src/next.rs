//! The next command to type, from the line that was typed.

/// Flags that say what is read and which part of it counts: they mean the same for every command.
const COMMON: [&str; 14] = [
    "--tach",
    "--tach-times",
    "--pulses-per-rev",
    "--edge",
    "--threshold",
    "--tach-delay",
    "--channel",
    "--from",
    "--to",
    "--exclude",
    "--ratio",
    "--sample-rate",
    "--calibration",
    "--threads",
];

/// Flags that stand alone.
const BARE: [&str; 5] = [
    "--json",
    "--quiet",
    "--density",
    "--write-wav",
    "--no-figures",
];

/// The same recording, tach and stretch under another command. `None` where the line typed is not
/// one of this program's.
pub(crate) fn same_input(command_line: &str, command: &str) -> Option<String> {
    let words = words(command_line);
    let mut words = words.iter().map(String::as_str);
    let mut line = format!("{} {command}", words.next()?);
    words.next()?;
    while let Some(word) = words.next() {
        let mut keep = true;
        let mut value = None;
        if word.starts_with("--") {
            let name = word.split('=').next().unwrap_or(word);
            keep = COMMON.contains(&name);
            if !word.contains('=') && !BARE.contains(&name) {
                value = words.next();
            }
        }
        if keep {
            for part in [Some(word), value].into_iter().flatten() {
                line.push(' ');
                line.push_str(part);
            }
        }
    }
    Some(line)
}

/// Words of a shell line, each still in its quotes.
fn words(line: &str) -> Vec<String> {
    let mut words = Vec::new();
    let mut word = String::new();
    let mut quote = None;
    let mut escaped = false;
    for c in line.chars() {
        if c.is_whitespace() && quote.is_none() && !escaped {
            if !word.is_empty() {
                words.push(std::mem::take(&mut word));
            }
            continue;
        }
        word.push(c);
        if escaped {
            escaped = false;
        } else if c == '\\' && quote != Some('\'') {
            escaped = true;
        } else if quote == Some(c) {
            quote = None;
        } else if quote.is_none() && matches!(c, '\'' | '"') {
            quote = Some(c);
        }
    }
    if !word.is_empty() {
        words.push(word);
    }
    words
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_was_read_stays_and_what_was_asked_goes() {
        let line = "shaftwise spectrum 'pump P-3.wav' --tach 4 --window=flat-top --density --overlap 75 --from=2.5 --out 'my folder'";
        assert_eq!(
            same_input(line, "compare").as_deref(),
            Some("shaftwise compare 'pump P-3.wav' --tach 4 --from=2.5")
        );
        assert_eq!(same_input("", "compare"), None);
        assert_eq!(
            same_input("shaftwise speed run.json --json", "spectrum").as_deref(),
            Some("shaftwise spectrum run.json")
        );
    }
}
