//! Delimited text: rows of numbers, decoded once into a spool of 64-bit floats.
//!
//! Separator, header row, units row and the time column are told from the
//! first lines. From the first row of numbers on every line must be a comment,
//! blank or a row of as many finite numbers; anything else is an error with its
//! place, never skipped.

use std::fs::File;
use std::io::{BufRead, BufReader, Cursor, Read, Write};

use crate::Error;
use crate::channel::Origin;
use crate::error::printable;
use crate::recording::{HEAD_BYTES, Layout, Parsed};
use crate::sample::{Encoding, SampleFormat};
use crate::time_column::{MeasuredRate, TimeColumn};
use crate::unit::Unit;

/// Longest line accepted; a thousand columns take some 25 kB.
const MAX_LINE_BYTES: usize = 1 << 20;

/// Lines looked at to tell separator and header.
const HEAD_LINES: usize = 2000;

const MAX_COLUMNS: usize = 1025;

/// Bytes collected before they go to the spool.
const SPOOL_BYTES: usize = 1 << 18;

#[derive(Debug, Clone, Copy, PartialEq)]
enum Separator {
    Tab,
    Semicolon,
    Comma,
    Blanks,
}

impl Separator {
    /// In the order they win ties.
    const ALL: [Self; 4] = [Self::Tab, Self::Semicolon, Self::Comma, Self::Blanks];

    fn byte(self) -> u8 {
        match self {
            Self::Tab => b'\t',
            Self::Semicolon => b';',
            Self::Comma => b',',
            Self::Blanks => b' ',
        }
    }

    fn fields(self, line: &[u8]) -> Fields<'_> {
        let line = match self {
            Self::Blanks => line.trim_ascii(),
            _ => line.strip_suffix(b"\n").unwrap_or(line),
        };
        Fields {
            rest: Some(line),
            separator: self,
        }
    }
}

/// The fields of a line, trimmed, without their quotes.
struct Fields<'a> {
    rest: Option<&'a [u8]>,
    separator: Separator,
}

impl<'a> Iterator for Fields<'a> {
    type Item = &'a [u8];

    fn next(&mut self) -> Option<&'a [u8]> {
        let rest = self.rest?;
        let is_end = |&b: &u8| match self.separator {
            Separator::Blanks => b.is_ascii_whitespace(),
            separator => b == separator.byte(),
        };
        let opening = rest
            .iter()
            .position(|b| !matches!(b, b' ' | b'"'))
            .unwrap_or(rest.len());
        let quoted = rest[..opening].contains(&b'"');
        let end = if quoted {
            let start = rest.iter().position(|&b| b == b'"').map_or(0, |at| at + 1);
            let close = rest[start..]
                .iter()
                .position(|&b| b == b'"')
                .map_or(rest.len(), |at| start + at);
            rest[close..].iter().position(is_end).map(|at| close + at)
        } else {
            rest.iter().position(is_end)
        };
        let field = &rest[..end.unwrap_or(rest.len())];
        self.rest = end.map(|end| match self.separator {
            Separator::Blanks => rest[end..].trim_ascii_start(),
            _ => &rest[end + 1..],
        });
        let field = field.trim_ascii();
        let unquoted = field
            .strip_prefix(b"\"")
            .and_then(|field| field.strip_suffix(b"\""));
        Some(unquoted.map_or(field, <[u8]>::trim_ascii))
    }
}

/// The number in a field, and whether it has a decimal comma (`Some(true)`),
/// point (`Some(false)`) or neither.
fn number(field: &[u8]) -> Option<(f64, Option<bool>)> {
    let text = std::str::from_utf8(field).ok()?;
    if field.contains(&b',') {
        let value = text.replacen(',', ".", 1).parse().ok()?;
        return Some((value, Some(true)));
    }
    let value = text.parse().ok()?;
    Some((value, field.contains(&b'.').then_some(false)))
}

fn is_comment(line: &[u8]) -> bool {
    matches!(line.trim_ascii_start().first(), Some(b'#' | b'%'))
}

fn is_blank(line: &[u8]) -> bool {
    line.trim_ascii().is_empty()
}

/// Text as people typed it: UTF-8, else Latin-1 (a lone 0xB2 is ² there).
fn words(field: &[u8]) -> String {
    match std::str::from_utf8(field) {
        Ok(text) => text.to_owned(),
        Err(_) => field.iter().map(|&b| char::from(b)).collect(),
    }
}

/// What the first lines say about the rest.
#[derive(Debug)]
struct Shape {
    separator: Separator,
    columns: usize,
    /// First row of numbers, from 0.
    first_row: usize,
    names: Vec<String>,
    units: Vec<String>,
    warnings: Vec<String>,
}

/// How many numbers a line holds if it holds nothing else; a separator at its
/// end is allowed.
fn row_columns(separator: Separator, line: &[u8]) -> Option<usize> {
    if is_blank(line) || is_comment(line) {
        return None;
    }
    let mut columns = 0;
    let mut ended = false;
    for field in separator.fields(line) {
        if ended {
            return None;
        }
        match number(field) {
            Some(_) => columns += 1,
            None if field.is_empty() && columns > 0 => ended = true,
            None => return None,
        }
    }
    Some(columns)
}

fn shape(head: &[u8]) -> Result<Shape, Error> {
    let lines: Vec<&[u8]> = head
        .split_inclusive(|&b| b == b'\n')
        .take(HEAD_LINES)
        .collect();
    let mut best: Option<(usize, usize, Separator)> = None;
    for separator in Separator::ALL {
        let columns: Vec<usize> = lines
            .iter()
            .filter_map(|line| row_columns(separator, line))
            .collect();
        // the number of columns most rows have; rows of another length are
        // faults to be reported, or numbers in a preamble
        let usual = columns
            .iter()
            .map(|&c| (columns.iter().filter(|&&other| other == c).count(), c))
            .max();
        if let Some((rows, columns)) = usual
            && best.is_none_or(|(r, c, _)| (rows, columns) > (r, c))
        {
            best = Some((rows, columns, separator));
        }
    }
    let Some((_, columns, separator)) = best else {
        return Err(Error::NoNumbers {
            lines: lines.len() as u64,
            found: printable(lines.first().copied().unwrap_or_default().trim_ascii()),
        });
    };
    if columns > MAX_COLUMNS {
        return Err(Error::Setting {
            what: "number of columns".into(),
            found: columns.to_string(),
            expected: format!("at most {MAX_COLUMNS}"),
        });
    }
    let mut first_row = lines
        .iter()
        .position(|line| row_columns(separator, line) == Some(columns))
        .unwrap_or_default();
    let header = |line: &[u8]| -> Option<Vec<String>> {
        let mut fields: Vec<String> = separator.fields(line).map(words).collect();
        if fields.len() == columns + 1 && fields[columns].is_empty() {
            fields.pop();
        }
        (fields.len() == columns).then_some(fields)
    };
    // The rows of as many fields directly before the first row: names, units.
    let mut rows = Vec::new();
    let mut preamble = 0;
    for (i, line) in lines[..first_row].iter().enumerate() {
        if is_blank(line) || is_comment(line) {
            continue;
        }
        // A title over a single column has one field too.
        let fields = header(line).filter(|_| columns > 1 || i + 1 == first_row);
        match fields {
            Some(fields) => {
                let numbers = fields
                    .iter()
                    .filter(|f| number(f.as_bytes()).is_some())
                    .count();
                // A row with a fault, not a header: the reader will stop at it.
                if columns > 1 && 2 * numbers >= columns && !rows.is_empty() {
                    first_row = i;
                    break;
                }
                rows.push(fields);
            }
            None => {
                preamble += 1 + rows.len();
                rows.clear();
            }
        }
    }
    let mut warnings = Vec::new();
    if preamble > 0 {
        warnings.push(format!(
            "{preamble} lines before the rows of numbers were not read"
        ));
    }
    if rows.len() > 2 {
        warnings.push(format!(
            "{} header rows found; the first was read as names, the second as units",
            rows.len()
        ));
    }
    let mut rows = rows.into_iter();
    let mut names = rows.next().unwrap_or_default();
    let units = rows.next().unwrap_or_default();
    if names.is_empty() {
        // Numeric tools write the header as a comment.
        let comment = lines[..first_row]
            .iter()
            .rev()
            .find(|line| is_comment(line));
        if let Some(comment) = comment {
            let comment = comment.trim_ascii_start();
            let marks = comment
                .iter()
                .take_while(|b| matches!(b, b'#' | b'%'))
                .count();
            names = header(&comment[marks..]).unwrap_or_default();
        }
    }
    Ok(Shape {
        separator,
        columns,
        first_row,
        names,
        units,
        warnings,
    })
}

/// Splits `Acc DE [m/s2]` into name and unit. Round brackets count only when a
/// known unit stands in them: `Acc (DE)` is a name.
fn name_and_unit(text: &str) -> (String, Option<String>) {
    for (open, close) in [('[', ']'), ('(', ')')] {
        if let Some(body) = text.strip_suffix(close)
            && let Some((name, unit)) = body.rsplit_once(open)
        {
            let unit = unit.trim();
            if open == '[' || Unit::find(unit).is_some() || seconds_per(unit).is_some() {
                let unit = (!unit.is_empty()).then(|| unit.to_owned());
                return (name.trim().to_owned(), unit);
            }
        }
    }
    (text.to_owned(), None)
}

/// Seconds per unit of time.
fn seconds_per(unit: &str) -> Option<f64> {
    match unit.trim_matches(['[', ']', '(', ')', ' ']) {
        "s" | "sec" | "seconds" => Some(1.0),
        "ms" => Some(1e-3),
        "us" | "µs" | "μs" => Some(1e-6),
        "min" => Some(60.0),
        "h" => Some(3600.0),
        _ => None,
    }
}

/// What a column is for.
enum Role {
    /// Seconds per unit.
    Time(f64),
    /// A count of rows: neither time nor a channel.
    Counter,
    Channel(Origin),
}

fn role(name: &str, unit: Option<&str>) -> Role {
    let (bare, bracket) = name_and_unit(name);
    let unit = unit
        .map(|unit| unit.trim_matches(['[', ']', '(', ')', ' ']))
        .filter(|unit| !unit.is_empty());
    let unit = unit.map(str::to_owned).or(bracket);
    let lower = bare.to_lowercase();
    match lower.as_str() {
        "time" | "t" | "zeit" | "temps" | "tempo" | "tiempo" | "timestamp" | "elapsed"
        | "elapsed time" | "time_s" | "t_s" | "seconds" | "sec" | "s" => {
            return Role::Time(unit.as_deref().and_then(seconds_per).unwrap_or(1.0));
        }
        "time_ms" | "t_ms" | "ms" => return Role::Time(1e-3),
        "time_us" | "t_us" | "us" => return Role::Time(1e-6),
        "index" | "sample" | "sample number" | "row" => return Role::Counter,
        _ => {}
    }
    Role::Channel(Origin {
        name: (!bare.is_empty()).then_some(bare),
        unit,
        text: true,
    })
}

/// What each column is for, and where it goes in the spool: time first, then
/// the channels in file order.
struct Columns {
    roles: Vec<Role>,
    /// The time column, or the column that may turn out to be one.
    time_at: Option<usize>,
    time_is_named: bool,
    seconds_per_unit: f64,
    slot: Vec<Option<usize>>,
    slots: usize,
}

impl Columns {
    fn plan(columns: usize, names: &[String], units: &[String]) -> Result<Self, Error> {
        let mut roles = Vec::with_capacity(columns);
        let mut time = None;
        for i in 0..columns {
            let name = names.get(i).map_or("", String::as_str);
            let role = match role(name, units.get(i).map(String::as_str)) {
                // A second time is a channel like any other.
                Role::Time(_) if time.is_some() => Role::Channel(Origin {
                    name: Some(name.to_owned()),
                    unit: None,
                    text: true,
                }),
                role => role,
            };
            if let Role::Time(seconds_per_unit) = role {
                time = Some((i, seconds_per_unit));
            }
            roles.push(role);
        }
        let time_is_named = time.is_some();
        if let (None, true, Role::Channel(origin)) = (time, columns > 1, &roles[0]) {
            let unit = origin.unit.as_deref().and_then(seconds_per);
            time = Some((0, unit.unwrap_or(1.0)));
        }
        let time_at = time.map(|(at, _)| at);

        let mut slots = 0;
        let mut slot = vec![None; columns];
        let channels =
            (0..columns).filter(|&i| Some(i) != time_at && !matches!(roles[i], Role::Counter));
        for i in time_at.into_iter().chain(channels) {
            slot[i] = Some(slots);
            slots += 1;
        }
        if slots == usize::from(time_at.is_some()) {
            return Err(Error::Setting {
                what: "number of channels".into(),
                found: "none beside the time column".into(),
                expected: "at least one column of samples".into(),
            });
        }
        Ok(Self {
            roles,
            time_at,
            time_is_named,
            seconds_per_unit: time.map_or(1.0, |(_, seconds)| seconds),
            slot,
            slots,
        })
    }
}

/// Decodes `head` and `rest` into `spool`. A given rate stands in place of the
/// time column's.
pub(crate) fn parse(
    head: &[u8],
    rest: impl Read,
    spool: &File,
    sample_rate_hz: Option<f64>,
) -> Result<Parsed, Error> {
    const BYTE_ORDER_MARK: &[u8] = b"\xEF\xBB\xBF";
    let head = head.strip_prefix(BYTE_ORDER_MARK).unwrap_or(head);
    let whole_lines = if (head.len() as u64) < HEAD_BYTES - BYTE_ORDER_MARK.len() as u64 {
        head
    } else {
        // the last line is cut off by the end of the head
        &head[..head
            .iter()
            .rposition(|&b| b == b'\n')
            .map_or(head.len(), |at| at + 1)]
    };
    let Shape {
        separator,
        columns,
        first_row,
        names,
        units,
        mut warnings,
    } = shape(whole_lines)?;

    let plan = Columns::plan(columns, &names, &units)?;
    let (time_at, slots) = (plan.time_at, plan.slots);

    let reader = BufReader::with_capacity(1 << 18, Cursor::new(head).chain(rest));
    let mut time = TimeColumn::new(plan.seconds_per_unit);
    let rows = Rows {
        separator,
        columns,
        first_line: first_row as u64 + 1,
        slot: &plan.slot,
        slots,
        time_at,
    };
    let frames = rows.spool(reader, spool, &mut time)?;

    let format = SampleFormat {
        encoding: Encoding::Float,
        bytes: 8,
        valid_bits: 64,
    };
    let frame_bytes = slots * format.bytes;
    if frames == 0 {
        return Err(Error::NoSamples {
            found_bytes: 0,
            frame_bytes,
        });
    }
    let measured = match time_at {
        Some(_) => time.rate(spool, frame_bytes),
        None => Err(Error::NoSampleRate),
    };
    // Counting rows by one is even, too; nothing measured here runs at 1 Hz.
    let counts_rows = |rate: &MeasuredRate| !plan.time_is_named && rate.rate_hz == 1.0;
    let is_time = time_at.is_some() && (plan.time_is_named || measured.is_ok());
    let rate = match (sample_rate_hz, measured) {
        (Some(given), Ok(measured)) => {
            let apart = (measured.rate_hz / given - 1.0).abs();
            if apart > measured.uncertainty + 1e-4 && !counts_rows(&measured) {
                warnings.push(format!(
                    "sample rate {given} Hz taken as given; the time column says {} Hz",
                    measured.rate_hz
                ));
            }
            given
        }
        (Some(given), Err(error)) => {
            if plan.time_is_named {
                warnings.push(format!("{error}; the given sample rate was taken"));
            }
            given
        }
        (None, Ok(measured)) if !counts_rows(&measured) => {
            warnings.extend(measured.warning());
            measured.rate_hz
        }
        (None, Err(error)) if plan.time_is_named => return Err(error),
        (None, _) => return Err(Error::NoSampleRate),
    };

    let origins = plan
        .roles
        .into_iter()
        .enumerate()
        .filter(|&(i, _)| !(is_time && Some(i) == time_at))
        .filter_map(|(_, role)| match role {
            Role::Channel(origin) => Some(origin),
            Role::Time(_) | Role::Counter => None,
        })
        .collect();
    Ok(Parsed {
        layout: Layout {
            data_offset: 0,
            frames,
            frame_bytes,
            format,
            skipped_columns: usize::from(is_time),
        },
        sample_rate_hz: rate,
        origins,
        warnings,
    })
}

/// Decodes the rows of numbers.
struct Rows<'a> {
    separator: Separator,
    columns: usize,
    /// From 1.
    first_line: u64,
    slot: &'a [Option<usize>],
    slots: usize,
    time_at: Option<usize>,
}

impl Rows<'_> {
    /// Writes all rows to the spool and returns their number.
    fn spool(
        &self,
        mut reader: impl BufRead,
        mut spool: &File,
        time: &mut TimeColumn,
    ) -> Result<u64, Error> {
        let mut bytes = Vec::with_capacity(SPOOL_BYTES + 8 * self.slots);
        let mut row = vec![0.0; self.slots];
        let mut line = Vec::new();
        let mut decimal_comma = None;
        let mut frames = 0u64;
        for number in 1u64.. {
            line.clear();
            (&mut reader)
                .take(MAX_LINE_BYTES as u64 + 1)
                .read_until(b'\n', &mut line)
                .map_err(Error::reading)?;
            if line.is_empty() {
                break;
            }
            if line.len() > MAX_LINE_BYTES {
                return Err(Error::LineTooLong {
                    line: number,
                    limit: MAX_LINE_BYTES,
                });
            }
            if number < self.first_line || is_blank(&line) || is_comment(&line) {
                continue;
            }
            self.row(&line, number, &mut decimal_comma, &mut row, time)?;
            bytes.extend(row.iter().flat_map(|value| value.to_le_bytes()));
            frames += 1;
            if bytes.len() >= SPOOL_BYTES {
                spool.write_all(&bytes).map_err(Error::spooling)?;
                bytes.clear();
            }
        }
        spool.write_all(&bytes).map_err(Error::spooling)?;
        Ok(frames)
    }

    fn row(
        &self,
        line: &[u8],
        line_number: u64,
        decimal_comma: &mut Option<bool>,
        row: &mut [f64],
        time: &mut TimeColumn,
    ) -> Result<(), Error> {
        let mut found = 0;
        let mut surplus = 0;
        for field in self.separator.fields(line) {
            if found == self.columns {
                // one separator at the end of the line is a habit of loggers
                surplus += if field.is_empty() { 1 } else { 2 };
                continue;
            }
            let column = found + 1;
            let fault = |expected| Error::Field {
                line: line_number,
                column,
                found: printable(field),
                expected,
            };
            let Some((value, comma)) = number(field) else {
                // The count says more than the first odd field.
                let fields = self.separator.fields(line).count();
                if fields != self.columns && fields != self.columns + 1 {
                    return Err(self.count(line_number, fields));
                }
                return Err(fault("a number"));
            };
            if !value.is_finite() {
                return Err(fault("a finite number"));
            }
            if let Some(comma) = comma
                && *decimal_comma.get_or_insert(comma) != comma
            {
                return Err(fault(if comma {
                    "a decimal point as in the rows before"
                } else {
                    "a decimal comma as in the rows before"
                }));
            }
            if Some(found) == self.time_at {
                time.push(value, field);
            }
            if let Some(slot) = self.slot[found] {
                row[slot] = value;
            }
            found += 1;
        }
        if found != self.columns || surplus > 1 {
            return Err(self.count(line_number, self.separator.fields(line).count()));
        }
        Ok(())
    }

    fn count(&self, line: u64, found: usize) -> Error {
        Error::FieldCount {
            line,
            found,
            expected: self.columns,
        }
    }
}
