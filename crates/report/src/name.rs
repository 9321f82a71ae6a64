use std::collections::BTreeSet;

use shaftwise_run::{AnalysisResult, ChannelFacts, RunResult};

use crate::shown::channels;

/// Longest part of a file name that comes from a channel's name.
const LONGEST: usize = 48;

/// File names given out so far; none twice, upper and lower case taken as one.
#[derive(Debug, Default)]
pub(crate) struct FileNames(BTreeSet<String>);

impl FileNames {
    /// `stem.extension`, or `stem-2.extension` and so on where that is taken.
    pub(crate) fn claim(&mut self, stem: &str, extension: &str) -> String {
        let mut name = format!("{stem}.{extension}");
        let mut number = 2;
        while !self.0.insert(name.to_lowercase()) {
            name = format!("{stem}-{number}.{extension}");
            number += 1;
        }
        name
    }
}

/// What the names of an analysis' files begin with.
#[derive(Debug, PartialEq, Eq)]
pub(crate) struct Stems {
    /// The command, with the analysis' number before it where it occurs twice.
    pub(crate) command: String,
    /// One for each channel; for `speed` the command alone.
    pub(crate) channels: Vec<String>,
}

impl Stems {
    pub(crate) fn new(result: &RunResult, index: usize) -> Self {
        let command = result.analyses[index].command;
        let same = result.analyses.iter().filter(|o| o.command == command);
        let command = if same.count() > 1 {
            format!("{}-{command}", index + 1)
        } else {
            command.to_owned()
        };
        let analysis = &result.analyses[index].result;
        let channels = if let AnalysisResult::Speed(_) = analysis {
            vec![command.clone()]
        } else {
            let parts = channel_parts(&channels(analysis));
            parts.iter().map(|p| format!("{command}-{p}")).collect()
        };
        Self { command, channels }
    }
}

/// A part of a file name for each channel, no two alike.
fn channel_parts(channels: &[&ChannelFacts]) -> Vec<String> {
    let plain: Vec<String> = channels
        .iter()
        .map(|c| match sanitised(&c.name) {
            name if name.is_empty() => format!("channel-{}", c.number),
            name => name,
        })
        .collect();
    let alike = |name: &String| plain.iter().filter(|other| *other == name).count() > 1;
    plain
        .iter()
        .zip(channels)
        .map(|(name, channel)| {
            if alike(name) {
                format!("{name}-{}", channel.number)
            } else {
                name.clone()
            }
        })
        .collect()
}

/// Small letters, digits and single hyphens: safe on every file system, in a shell and in a link.
fn sanitised(name: &str) -> String {
    let mut out = String::new();
    for c in name.chars().flat_map(char::to_lowercase) {
        let part = match c {
            'a'..='z' | '0'..='9' => {
                out.push(c);
                continue;
            }
            'µ' | 'μ' => "u",
            'ä' | 'æ' => "ae",
            'ö' | 'ø' | 'œ' => "oe",
            'ü' => "ue",
            'ß' => "ss",
            'à' | 'á' | 'â' | 'ã' | 'å' => "a",
            'è' | 'é' | 'ê' | 'ë' => "e",
            'ì' | 'í' | 'î' | 'ï' => "i",
            'ò' | 'ó' | 'ô' | 'õ' => "o",
            'ù' | 'ú' | 'û' => "u",
            'ç' => "c",
            'ñ' => "n",
            '²' => "2",
            '³' => "3",
            _ => {
                if !out.is_empty() && !out.ends_with('-') {
                    out.push('-');
                }
                continue;
            }
        };
        out.push_str(part);
    }
    out.truncate(LONGEST);
    out.trim_end_matches('-').to_owned()
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    fn facts(number: usize, name: &str) -> ChannelFacts {
        ChannelFacts {
            number,
            name: name.to_owned(),
            unit: "m/s²".to_owned(),
            quantity: "acceleration".to_owned(),
        }
    }

    #[test]
    fn names_of_channels_become_safe_names_of_files() {
        assert_eq!(sanitised("Lager 1/ DE µ"), "lager-1-de-u");
        assert_eq!(sanitised("../../etc/passwd"), "etc-passwd");
        assert_eq!(sanitised("Lüfter, außen [m/s²]"), "luefter-aussen-m-s2");
        assert_eq!(sanitised("軸受"), "");
        assert_eq!(sanitised(&"x".repeat(500)).len(), LONGEST);
        assert_eq!(sanitised("a\u{1b}[31m\nb"), "a-31m-b");
    }

    #[test]
    fn channels_of_one_name_get_their_numbers() {
        let channels = [
            facts(1, "DE"),
            facts(2, "de "),
            facts(5, "軸受"),
            facts(6, ""),
        ];
        let parts = channel_parts(&channels.iter().collect::<Vec<_>>());
        assert_eq!(parts, ["de-1", "de-2", "channel-5", "channel-6"]);
    }

    #[test]
    fn no_name_is_given_out_twice() {
        let mut names = FileNames::default();
        assert_eq!(names.claim("a", "csv"), "a.csv");
        assert_eq!(names.claim("A", "csv"), "A-2.csv");
        assert_eq!(names.claim("a", "png"), "a.png");
        assert_eq!(names.claim("a-2", "csv"), "a-2-2.csv");
    }
}
