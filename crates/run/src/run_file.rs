//! Reading a run file, with the place of every fault.

use crate::error::Error;
use crate::fault::{Fault, FaultKind, form_faults, rule_faults};
use crate::place::{Places, byte_of, line_column};
use crate::settings::RunFile;
use serde_json::error::Category;
use std::path::Path;

impl RunFile {
    /// Reads a run file.
    ///
    /// # Errors
    /// [`Error::File`] when it cannot be read, else as [`RunFile::parse`].
    pub fn read(path: &Path) -> Result<Self, Error> {
        let name = path.display().to_string();
        let bytes = std::fs::read(path).map_err(|source| Error::File {
            file: name.clone(),
            source,
        })?;
        let text = std::str::from_utf8(&bytes).map_err(|error| {
            let valid = &bytes[..error.valid_up_to()];
            let valid = String::from_utf8_lossy(valid);
            let found = bytes[error.valid_up_to()];
            let what = format!("byte 0x{found:02X} is no UTF-8 text; expected JSON in UTF-8");
            let hint = "save the file as UTF-8";
            at_byte(&valid, valid.len(), &name, what, hint.to_owned())
        })?;
        Self::parse(text, &name)
    }

    /// Reads the text of a run file; a byte order mark before it is passed over.
    ///
    /// # Errors
    /// [`Error::RunFile`] with the place of the fault that stands first in the text: a syntax
    /// error, a key that is unknown or repeated, a value that is missing, of the wrong type, out of
    /// range or at odds with another.
    pub fn parse(text: &str, file_name: &str) -> Result<Self, Error> {
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        let syntax = |error: serde_json::Error| syntax_error(text, &error, file_name);
        let value: serde_json::Value = serde_json::from_str(text).map_err(syntax)?;
        let places = Places::scan(text);
        let repeated = places.repeated.iter();
        let mut faults: Vec<Fault> = repeated.map(|(at, _)| Fault::repeated(at)).collect();
        faults.extend(form_faults(&value));
        if !faults.is_empty() {
            return Err(first(&faults, text, &places, file_name));
        }
        let run: Self = serde_json::from_str(text).map_err(syntax)?;
        let faults = rule_faults(&run);
        if !faults.is_empty() {
            return Err(first(&faults, text, &places, file_name));
        }
        Ok(run)
    }
}

/// The fault that stands first in the text.
fn first(faults: &[Fault], text: &str, places: &Places, file: &str) -> Error {
    let byte = |fault: &Fault| match fault.kind {
        FaultKind::UnknownKey => places
            .key(&fault.pointer)
            .map_or_else(|| places.value(&fault.pointer).start, |key| key.start),
        FaultKind::RepeatedKey => places
            .repeated
            .iter()
            .find(|(pointer, _)| *pointer == fault.pointer)
            .map_or(0, |(_, key)| key.start),
        _ => places.value(&fault.pointer).start,
    };
    let placed = faults.iter().map(|fault| (byte(fault), fault));
    match placed.min_by_key(|(byte, _)| *byte) {
        Some((byte, fault)) => at_byte(text, byte, file, fault.message(), fault.hint.clone()),
        None => at_byte(text, 0, file, String::new(), String::new()),
    }
}

fn at_byte(text: &str, byte: usize, file: &str, what: String, hint: String) -> Error {
    let place = line_column(text, byte);
    Error::RunFile {
        file: file.to_owned(),
        line: place.line,
        column: place.column,
        what,
        hint,
    }
}

fn syntax_error(text: &str, error: &serde_json::Error, file: &str) -> Error {
    if text.trim().is_empty() {
        let what = "the file is empty; expected a JSON object".to_owned();
        let hint =
            "a run file begins {\"recordings\": [{\"file\": \"…\"}], \"tach\": {\"channel\": 1}"
                .to_owned();
        return at_byte(text, 0, file, what, hint + ", …");
    }
    let byte = match error.classify() {
        Category::Eof => text.trim_end().len(),
        _ => byte_of(text, error.line(), error.column()),
    };
    let found = match text.get(byte..).and_then(|rest| rest.chars().next()) {
        _ if error.is_eof() => "the end of the file".to_owned(),
        None => "the end of the file".to_owned(),
        Some('\n' | '\r') => "the end of the line".to_owned(),
        Some(letter) => format!("`{letter}`"),
    };
    let said = error.to_string();
    let said = said.split(" at line ").next().unwrap_or_default();
    let (expected, hint) = explained(said);
    at_byte(
        text,
        byte,
        file,
        format!("found {found}; {expected}"),
        hint.to_owned(),
    )
}

/// The library's words for a syntax error as what was expected, and what to do.
fn explained(said: &str) -> (String, &'static str) {
    let (expected, hint) = match said {
        "trailing comma" => (
            "expected another entry after the comma",
            "take out the comma after the last entry",
        ),
        "trailing characters" => (
            "expected nothing after the run file's object",
            "a run file is one object, from { to its }",
        ),
        "key must be a string" => (
            "expected a key in double quotes",
            "JSON has no comments and no single quotes",
        ),
        "expected value" => (
            "expected a value",
            "JSON knows numbers, texts in double quotes, true, false, null, [lists] and {objects}; no NaN, no comments",
        ),
        "expected ident" => (
            "expected true, false or null",
            "texts stand in double quotes",
        ),
        "invalid number" => (
            "expected a number such as 0.5 or 1e3",
            "no leading zeros, no leading or trailing point",
        ),
        "number out of range" => ("expected a number below 1.8e308", ""),
        "invalid escape" => (
            "expected \\\\, \\\", \\/, \\n, \\t or \\u",
            "write \\ in a file name as / or as \\\\",
        ),
        "EOF while parsing an object" => ("expected `,` or `}`", "a { is not closed"),
        "EOF while parsing a list" => ("expected `,` or `]`", "a [ is not closed"),
        "EOF while parsing a string" => ("expected the closing \"", "a text is not closed"),
        "EOF while parsing a value" => ("expected a value", ""),
        "recursion limit exceeded" => ("expected at most 127 levels", ""),
        _ if said.starts_with("control character") => (
            "expected the closing \" on the same line",
            "a line feed or tab in a text is written \\n or \\t",
        ),
        _ => ("", ""),
    };
    match expected {
        "" => (said.to_owned(), hint),
        _ => (expected.to_owned(), hint),
    }
}
