//! Where in a JSON text each value and key stands.
//!
//! The JSON library forgets positions once it has parsed a text, but a value found to be out of
//! range afterwards must still be shown where the user wrote it. So the text is scanned again.

use std::collections::HashMap;
use std::ops::Range;

/// A position in a text, for people.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct LineColumn {
    /// Line from 1; lines end with a line feed, with or without a carriage return before it.
    pub(crate) line: usize,
    /// Column from 1, in characters; a tab is one.
    pub(crate) column: usize,
}

/// Line and column of a byte. Past the end counts as the end; inside a character as its start.
pub(crate) fn line_column(text: &str, byte: usize) -> LineColumn {
    let mut byte = byte.min(text.len());
    while !text.is_char_boundary(byte) {
        byte -= 1;
    }
    let before = &text[..byte];
    let start = before.rfind('\n').map_or(0, |feed| feed + 1);
    LineColumn {
        line: before.bytes().filter(|&byte| byte == b'\n').count() + 1,
        column: before[start..].chars().count() + 1,
    }
}

/// The byte that the JSON library means by its line and column (bytes, from 1; 0 is the line feed
/// before).
pub(crate) fn byte_of(text: &str, line: usize, column: usize) -> usize {
    let before = text.split_inclusive('\n').take(line.saturating_sub(1));
    let start: usize = before.map(str::len).sum();
    (start + column).saturating_sub(1).min(text.len())
}

/// One value and, in an object, its key.
#[derive(Debug, Clone, PartialEq, Eq)]
struct Place {
    key: Option<Range<usize>>,
    value: Range<usize>,
}

/// The places of everything in a valid JSON text, by JSON pointer (RFC 6901).
#[derive(Debug, Default)]
pub(crate) struct Places {
    by_pointer: HashMap<String, Place>,
    /// Pointer and bytes of each key that its object holds already.
    pub(crate) repeated: Vec<(String, Range<usize>)>,
}

impl Places {
    /// Scans a text that the JSON library has accepted; of any other text some places are missing.
    pub(crate) fn scan(text: &str) -> Self {
        let mut scan = Scan {
            bytes: text.as_bytes(),
            at: 0,
            text,
            places: Self::default(),
        };
        let _ = scan.value("", None);
        scan.places
    }

    /// Bytes of the value, or of the nearest one around it that the text holds.
    pub(crate) fn value(&self, pointer: &str) -> Range<usize> {
        let mut pointer = pointer;
        loop {
            if let Some(place) = self.by_pointer.get(pointer) {
                return place.value.clone();
            }
            match pointer.rfind('/') {
                Some(slash) => pointer = &pointer[..slash],
                None => return 0..0,
            }
        }
    }

    /// Bytes of the key, quotes included.
    pub(crate) fn key(&self, pointer: &str) -> Option<Range<usize>> {
        self.by_pointer.get(pointer)?.key.clone()
    }
}

/// Adds a key or an index to a pointer.
pub(crate) fn step(pointer: &str, token: &str) -> String {
    format!("{pointer}/{}", token.replace('~', "~0").replace('/', "~1"))
}

struct Scan<'a> {
    bytes: &'a [u8],
    text: &'a str,
    at: usize,
    places: Places,
}

impl Scan<'_> {
    /// Every step is an `Option`, `None` where the text is not JSON after all.
    fn value(&mut self, pointer: &str, key: Option<Range<usize>>) -> Option<()> {
        self.space();
        let start = self.at;
        match self.bytes.get(start)? {
            b'{' => self.object(pointer)?,
            b'[' => self.array(pointer)?,
            b'"' => {
                self.string()?;
            }
            _ => {
                let rest = &self.bytes[start..];
                let plain = rest.iter().position(|byte| b",]} \t\r\n".contains(byte));
                self.at += plain.unwrap_or(rest.len());
            }
        }
        let value = start..self.at;
        let place = Place { key, value };
        self.places.by_pointer.insert(pointer.to_owned(), place);
        Some(())
    }

    fn object(&mut self, pointer: &str) -> Option<()> {
        self.at += 1;
        while self.next()? != b'}' {
            if self.next()? == b',' {
                self.at += 1;
                self.space();
            }
            let key = self.string()?;
            let name: String = serde_json::from_str(&self.text[key.clone()]).ok()?;
            (self.next()? == b':').then_some(())?;
            self.at += 1;
            let inner = step(pointer, &name);
            if self.places.by_pointer.contains_key(&inner) {
                self.places.repeated.push((inner.clone(), key.clone()));
            }
            self.value(&inner, Some(key))?;
        }
        self.at += 1;
        Some(())
    }

    fn array(&mut self, pointer: &str) -> Option<()> {
        self.at += 1;
        let mut index = 0;
        while self.next()? != b']' {
            if self.next()? == b',' {
                self.at += 1;
            }
            self.value(&step(pointer, &index.to_string()), None)?;
            index += 1;
        }
        self.at += 1;
        Some(())
    }

    /// Bytes of a string, quotes included.
    fn string(&mut self) -> Option<Range<usize>> {
        let start = self.at;
        (self.bytes.get(start)? == &b'"').then_some(())?;
        self.at += 1;
        loop {
            match self.bytes.get(self.at)? {
                b'"' => break,
                b'\\' => self.at += 2,
                _ => self.at += 1,
            }
        }
        self.at += 1;
        self.text
            .is_char_boundary(self.at)
            .then_some(start..self.at)
    }

    fn space(&mut self) {
        while matches!(self.bytes.get(self.at), Some(b' ' | b'\t' | b'\r' | b'\n')) {
            self.at += 1;
        }
    }

    /// The next byte that is not space, not taken.
    fn next(&mut self) -> Option<u8> {
        self.space();
        self.bytes.get(self.at).copied()
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]

    use super::*;

    fn value_at(text: &str, pointer: &str) -> (usize, usize) {
        let place = line_column(text, Places::scan(text).value(pointer).start);
        (place.line, place.column)
    }

    #[test]
    fn values_and_keys_are_found_where_they_stand() {
        let text = "{\"a\": [1, {\"b\" : true}],\n \"c/~\": -2.5e3 }";
        let places = Places::scan(text);
        let part = |range: Range<usize>| &text[range];
        assert_eq!(part(places.value("/a/0")), "1");
        assert_eq!(part(places.value("/a/1/b")), "true");
        assert_eq!(part(places.key("/a/1/b").unwrap()), "\"b\"");
        assert_eq!(part(places.value("/c~1~0")), "-2.5e3");
        assert_eq!(value_at(text, "/c~1~0"), (2, 9));
        assert_eq!(part(places.value("")), text);
    }

    #[test]
    fn a_missing_value_is_placed_at_what_lies_around_it() {
        assert_eq!(value_at("{\n  \"a\": {\"b\": 1}}", "/a/c/0"), (2, 8));
    }

    #[test]
    fn tabs_carriage_returns_and_letters_of_many_bytes_count_as_one_column() {
        let text = "{\r\n\t\"größe µ\":\t\"²\",\r\n\t\t\"b\":\t7\r\n}";
        assert_eq!(value_at(text, "/größe µ"), (2, 13));
        assert_eq!(value_at(text, "/b"), (3, 8));
    }

    #[test]
    fn escaped_quotes_do_not_end_a_string() {
        let text = r#"{"a\"b\\": "}\"", "x": 3}"#;
        let places = Places::scan(text);
        assert_eq!(&text[places.value("/a\"b\\")], r#""}\"""#);
        assert_eq!(&text[places.value("/x")], "3");
    }

    #[test]
    fn a_key_written_twice_is_noted_at_its_second_place() {
        let text = r#"{"a": 1, "b": {"a": 2}, "a": 3}"#;
        let repeated = Places::scan(text).repeated;
        assert_eq!(repeated, [("/a".to_owned(), 24..27)]);
    }

    #[test]
    fn the_librarys_line_and_column_become_a_byte() {
        let text = "{\n\"é\": x}";
        let error = serde_json::from_str::<serde_json::Value>(text).unwrap_err();
        let byte = byte_of(text, error.line(), error.column());
        assert_eq!(&text[byte..=byte], "x");
        assert_eq!(line_column(text, byte), LineColumn { line: 2, column: 6 });
        assert_eq!(byte_of("a\nb", 2, 0), 1);
        assert_eq!(byte_of("", 1, 0), 0);
    }
}
