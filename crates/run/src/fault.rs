//! What is wrong with settings, found by walking their schema, and by a few rules between them.
//!
//! The run file and the flags end in the same settings and are checked here alike; only the name
//! and the place of a fault are shown differently.

use crate::place::step;
use crate::schema::schema;
use crate::settings::{Analysis, ChannelSettings, RecordingSettings, RunFile, Selection};
use serde_json::Value;
use shaftwise_machine::Ratio;
use shaftwise_recording::{Quantity, Unit};
use std::collections::HashSet;

/// In what way settings are wrong.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum FaultKind {
    /// A value of the wrong type or out of range.
    Value,
    /// A value that is needed and not there.
    Missing,
    /// A key that means nothing here.
    UnknownKey,
    /// A key written twice in one object.
    RepeatedKey,
}

/// One thing wrong with settings.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Where: JSON pointer (RFC 6901) in the run file, such as `/analyses/0/overlap`.
    pub pointer: String,
    /// In what way.
    pub kind: FaultKind,
    /// The value found, as it would be written; empty where none is.
    pub found: String,
    /// What is allowed, with range and unit.
    pub expected: String,
    /// What to do about it; may be empty.
    pub hint: String,
}

impl Fault {
    fn value(pointer: &str, found: impl Into<String>, expected: impl Into<String>) -> Self {
        Self {
            pointer: pointer.to_owned(),
            kind: FaultKind::Value,
            found: found.into(),
            expected: expected.into(),
            hint: String::new(),
        }
    }

    pub(crate) fn repeated(pointer: &str) -> Self {
        Self {
            kind: FaultKind::RepeatedKey,
            ..Self::value(pointer, "", "each key once")
        }
    }

    fn with_hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = hint.into();
        self
    }

    /// What was found and what was expected, for the run file.
    #[must_use]
    pub fn message(&self) -> String {
        self.message_about(&subject(&self.pointer))
    }

    /// The same, of a value under another name, such as that of a flag.
    #[must_use]
    pub fn message_about(&self, subject: &str) -> String {
        let (found, expected) = (&self.found, &self.expected);
        match self.kind {
            FaultKind::Value => format!("{subject} is {found}; expected {expected}"),
            FaultKind::Missing => format!("{subject} is missing; expected {expected}"),
            FaultKind::UnknownKey => format!("unknown key {subject}; expected {expected}"),
            FaultKind::RepeatedKey => format!("key {subject} is here twice; expected {expected}"),
        }
    }
}

/// What a pointer points at, in words.
fn subject(pointer: &str) -> String {
    let mut tokens = pointer.rsplit('/').map(plain_token);
    match tokens.next() {
        None => "the run file".to_owned(),
        Some(last) if last.is_empty() => "the run file".to_owned(),
        Some(last) => match last.parse::<usize>() {
            Ok(index) => format!(
                "entry {} of `{}`",
                index.saturating_add(1),
                tokens.next().unwrap_or_default()
            ),
            Err(_) => format!("`{last}`"),
        },
    }
}

fn plain_token(token: &str) -> String {
    token.replace("~1", "/").replace("~0", "~")
}

impl Analysis {
    /// Checks the settings; pointers start at the analysis, such as `/overlap`.
    ///
    /// # Errors
    /// The first thing wrong.
    pub fn check(&self) -> Result<(), Fault> {
        let value = serde_json::to_value(self).unwrap_or_default();
        let mut faults = Vec::new();
        // the rules first: they see a NaN that has become null in the value
        analysis_rules(self, "", &mut faults);
        walk(&schema()["$defs"]["Analysis"], &value, "", &mut faults);
        faults.into_iter().next().map_or(Ok(()), Err)
    }
}

impl RunFile {
    /// Checks everything a run file says, as reading it does; for one that flags have changed.
    ///
    /// # Errors
    /// The first thing wrong.
    pub fn check(&self) -> Result<(), Fault> {
        let value = serde_json::to_value(self).unwrap_or_default();
        let mut faults = rule_faults(self);
        faults.extend(form_faults(&value));
        faults.into_iter().next().map_or(Ok(()), Err)
    }
}

/// Unknown keys, wrong types and values out of range.
pub(crate) fn form_faults(value: &Value) -> Vec<Fault> {
    let mut faults = Vec::new();
    walk(schema(), value, "", &mut faults);
    faults
}

/// What a schema cannot say.
pub(crate) fn rule_faults(run: &RunFile) -> Vec<Fault> {
    let mut faults = Vec::new();
    for (index, recording) in run.recordings.iter().enumerate() {
        recording_rules(recording, &format!("/recordings/{index}"), &mut faults);
    }
    finite("/tach/threshold", run.tach.threshold, &mut faults);
    finite(
        "/tach/tach_delay_s",
        Some(run.tach.tach_delay_s),
        &mut faults,
    );
    if let (Some(_), Some(times)) = (&run.tach.channel, &run.tach.times) {
        let fault = Fault::value(
            "/tach/times",
            format!("\"{times}\" beside `channel`"),
            "either `channel` or `times`",
        );
        faults.push(fault.with_hint("a rotation comes from one source; take one of the two out"));
    }
    selection_rules(&run.select, &mut faults);
    for (index, analysis) in run.analyses.iter().enumerate() {
        analysis_rules(analysis, &format!("/analyses/{index}"), &mut faults);
    }
    faults
}

fn recording_rules(recording: &RecordingSettings, at: &str, faults: &mut Vec<Fault>) {
    finite(
        &step(at, "sample_rate_hz"),
        recording.sample_rate_hz,
        faults,
    );
    let (mut numbers, mut names) = (HashSet::new(), HashSet::new());
    for (index, channel) in recording.channels.iter().enumerate() {
        let at = format!("{at}/channels/{index}");
        let place = u32::try_from(index).unwrap_or(u32::MAX).saturating_add(1);
        let number = channel.number.unwrap_or(place);
        if !numbers.insert(number) {
            let fault = Fault::value(&step(&at, "number"), number.to_string(), "each number once");
            faults.push(
                fault.with_hint("a channel without `number` has that of its place in the list"),
            );
        }
        if let Some(name) = channel.name.as_deref()
            && !names.insert(name)
        {
            let found = Value::from(name).to_string();
            faults.push(Fault::value(&step(&at, "name"), found, "each name once"));
        }
        channel_rules(channel, &at, faults);
    }
}

fn channel_rules(channel: &ChannelSettings, at: &str, faults: &mut Vec<Fault>) {
    let sensitivities = [
        ("factor", channel.factor),
        ("mv_per_unit", channel.mv_per_unit),
        ("range_v", channel.range_v),
    ];
    for (key, value) in sensitivities {
        finite(&step(at, key), value, faults);
    }
    if let Some(factor) = channel.factor {
        for (key, value) in &sensitivities[1..] {
            if let Some(value) = value {
                let fault = Fault::value(
                    &step(at, key),
                    format!("{value} beside `factor` {factor}"),
                    "either `factor`, or `mv_per_unit` with `range_v`",
                );
                faults.push(fault.with_hint("`factor` is units per sample value; `mv_per_unit` and `range_v` give it from sensor and converter"));
            }
        }
    }
    let quantity = channel.quantity.as_deref().and_then(Quantity::from_name);
    if let (Some(quantity), Some(unit)) = (quantity, channel.unit.as_deref())
        && quantity != Quantity::Other
        && Unit::of(quantity, unit).is_err()
    {
        let known = Unit::all().iter().filter(|unit| unit.quantity == quantity);
        let known: Vec<String> = known.map(|unit| unit.name.to_owned()).collect();
        let fault = Fault::value(
            &step(at, "unit"),
            Value::from(unit).to_string(),
            format!("a unit of {}: {}", quantity.name(), one_of(&known)),
        );
        faults.push(fault.with_hint("quantity `other` keeps any unit as it is written"));
    }
}

fn selection_rules(select: &Selection, faults: &mut Vec<Fault>) {
    finite("/select/from_s", select.from_s, faults);
    finite("/select/to_s", select.to_s, faults);
    if let (Some(from), Some(to)) = (select.from_s, select.to_s) {
        stretch("/select/to_s", from, to, faults);
    }
    for (index, exclusion) in select.exclude.iter().enumerate() {
        let at = format!("/select/exclude/{index}");
        finite(&step(&at, "from_s"), Some(exclusion.from_s), faults);
        finite(&step(&at, "to_s"), Some(exclusion.to_s), faults);
        stretch(&step(&at, "to_s"), exclusion.from_s, exclusion.to_s, faults);
    }
}

fn stretch(pointer: &str, from: f64, to: f64, faults: &mut Vec<Fault>) {
    if from >= to {
        faults.push(Fault::value(
            pointer,
            to.to_string(),
            format!("a time after the start, {from} s"),
        ));
    }
}

fn analysis_rules(analysis: &Analysis, at: &str, faults: &mut Vec<Fault>) {
    let (numbers, ratio) = match analysis {
        Analysis::Speed(speed) => (vec![("step", Some(speed.step))], &None),
        Analysis::Spectrum(spectrum) => (
            vec![
                ("max_order", spectrum.max_order),
                ("order_step", Some(spectrum.order_step)),
                ("overlap", Some(spectrum.overlap)),
                ("repeatability", Some(spectrum.repeatability)),
            ],
            &spectrum.ratio,
        ),
        Analysis::Synchronous(synchronous) => (
            vec![("max_order", synchronous.max_order)],
            &synchronous.ratio,
        ),
        Analysis::Compare(compare) => (
            vec![
                ("max_order", compare.max_order),
                ("order_step", Some(compare.order_step)),
                ("overlap", Some(compare.overlap)),
            ],
            &compare.ratio,
        ),
    };
    for (key, value) in numbers {
        finite(&step(at, key), value, faults);
    }
    if let Some(ratio) = ratio
        && Ratio::parse(ratio).is_err()
    {
        faults.push(Fault::value(
            &step(at, "ratio"),
            Value::from(ratio.as_str()).to_string(),
            "two whole numbers above 0, \"A/B\"",
        ));
    }
}

/// JSON has no such numbers; settings made by a program may.
fn finite(pointer: &str, value: Option<f64>, faults: &mut Vec<Fault>) {
    if let Some(value) = value.filter(|value| !value.is_finite()) {
        faults.push(Fault::value(pointer, value.to_string(), "a finite number"));
    }
}

/// Compares a value with its schema. Knows the words of JSON Schema that the settings' types use;
/// a test sees to it that there are no others.
fn walk(schema: &Value, value: &Value, at: &str, faults: &mut Vec<Fault>) {
    let schema = resolve(schema);
    if value.is_null() && allows_null(schema) {
        return;
    }
    if let Some(commands) = commands(schema) {
        return walk_command(&commands, value, at, faults);
    }
    let words = words(schema);
    if !words.is_empty() {
        if !value
            .as_str()
            .is_some_and(|text| words.iter().any(|word| word == text))
        {
            let fault = Fault::value(at, shown(value), one_of(&words));
            let nearest = value.as_str().and_then(|text| nearest(text, &words));
            faults.push(fault.with_hint(did_you_mean(nearest)));
        }
        return;
    }
    let choices = choices(schema);
    if !choices.is_empty() {
        match choices.into_iter().find(|choice| has_type(choice, value)) {
            Some(choice) => walk(choice, value, at, faults),
            None => faults.push(Fault::value(at, shown(value), described(schema))),
        }
        return;
    }
    if !has_type(schema, value) || !in_range(schema, value) {
        let mut fault = Fault::value(at, shown(value), described(schema));
        if value
            .as_str()
            .is_some_and(|text| text.parse::<f64>().is_ok())
        {
            fault = fault.with_hint("numbers stand without quotes");
        }
        faults.push(fault);
        return;
    }
    match value {
        Value::Array(items) => {
            for (index, item) in items.iter().enumerate() {
                walk(
                    &schema["items"],
                    item,
                    &step(at, &index.to_string()),
                    faults,
                );
            }
        }
        Value::Object(_) => walk_object(schema, value, at, faults),
        _ => {}
    }
}

fn walk_object(schema: &Value, value: &Value, at: &str, faults: &mut Vec<Fault>) {
    let properties = &schema["properties"];
    let known: Vec<String> = keys(properties);
    for (key, inner) in value.as_object().into_iter().flatten() {
        let at = step(at, key);
        match properties.get(key) {
            Some(property) => walk(property, inner, &at, faults),
            None if schema["additionalProperties"] == Value::Bool(false) => faults.push(Fault {
                kind: FaultKind::UnknownKey,
                hint: did_you_mean(nearest(key, &known)),
                ..Fault::value(&at, "", one_of(&known))
            }),
            None => {}
        }
    }
    for key in schema["required"].as_array().into_iter().flatten() {
        if let Some(key) = key.as_str().filter(|key| value.get(*key).is_none()) {
            faults.push(Fault {
                kind: FaultKind::Missing,
                ..Fault::value(&step(at, key), "", described(&properties[key]))
            });
        }
    }
}

/// Checks an analysis by the schema of its command.
fn walk_command(commands: &[(String, &Value)], value: &Value, at: &str, faults: &mut Vec<Fault>) {
    let names: Vec<String> = commands.iter().map(|(name, _)| name.clone()).collect();
    let Some(object) = value.as_object() else {
        let expected = "an object with `command`";
        return faults.push(Fault::value(at, shown(value), expected));
    };
    let at_command = step(at, "command");
    let Some(command) = object.get("command") else {
        let fault = Fault::value(&at_command, "", one_of(&names));
        return faults.push(Fault {
            kind: FaultKind::Missing,
            ..fault
        });
    };
    match commands.iter().find(|(name, _)| command == name.as_str()) {
        Some((_, schema)) => walk_object(schema, value, at, faults),
        None => {
            let fault = Fault::value(&at_command, shown(command), one_of(&names));
            let nearest = command.as_str().and_then(|text| nearest(text, &names));
            faults.push(fault.with_hint(did_you_mean(nearest)));
        }
    }
}

/// Follows a reference to its definition.
fn resolve(node: &Value) -> &Value {
    match node["$ref"]
        .as_str()
        .and_then(|name| name.strip_prefix('#'))
    {
        Some(pointer) => schema().pointer(pointer).unwrap_or(node),
        None => node,
    }
}

/// The schemas of which one must fit, the one of `null` left out.
fn choices(node: &Value) -> Vec<&Value> {
    let listed = node["anyOf"].as_array().into_iter().flatten();
    listed
        .map(resolve)
        .filter(|choice| choice["type"] != "null")
        .flat_map(|choice| match choices(choice) {
            inner if inner.is_empty() => vec![choice],
            inner => inner,
        })
        .collect()
}

fn allows_null(node: &Value) -> bool {
    let choices = node["anyOf"].as_array().into_iter().flatten();
    types(node).contains(&"null") || choices.map(resolve).any(allows_null)
}

fn types(node: &Value) -> Vec<&str> {
    match &node["type"] {
        Value::String(name) => vec![name.as_str()],
        Value::Array(names) => names.iter().filter_map(Value::as_str).collect(),
        _ => Vec::new(),
    }
}

fn has_type(node: &Value, value: &Value) -> bool {
    if !words(node).is_empty() {
        return value.is_string();
    }
    types(node).into_iter().any(|name| match name {
        "integer" => value.is_u64() || value.is_i64(),
        "number" => value.is_number(),
        "string" => value.is_string(),
        "boolean" => value.is_boolean(),
        "array" => value.is_array(),
        "object" => value.is_object(),
        _ => false,
    })
}

fn in_range(node: &Value, value: &Value) -> bool {
    let length = match value {
        Value::Number(_) => {
            let value = value.as_f64().unwrap_or(f64::NAN);
            return node["minimum"].as_f64().is_none_or(|limit| value >= limit)
                && largest(node).is_none_or(|limit| value <= limit)
                && node["exclusiveMinimum"]
                    .as_f64()
                    .is_none_or(|limit| value > limit)
                && node["not"]["const"]
                    .as_f64()
                    .is_none_or(|barred| value != barred);
        }
        Value::String(text) => (text.chars().count(), "minLength"),
        Value::Array(items) => (items.len(), "minItems"),
        _ => return true,
    };
    node[length.1]
        .as_u64()
        .is_none_or(|least| length.0 as u64 >= least)
}

fn largest(node: &Value) -> Option<f64> {
    let whole = (node["format"] == "uint32").then_some(f64::from(u32::MAX));
    node["maximum"].as_f64().or(whole)
}

/// The texts allowed where only some are.
fn words(node: &Value) -> Vec<String> {
    let constants = node["oneOf"].as_array().into_iter().flatten();
    let constants = constants.map(|choice| &choice["const"]);
    let listed = node["enum"].as_array().into_iter().flatten();
    let words = constants.chain(listed).filter_map(Value::as_str);
    words.map(str::to_owned).collect()
}

/// The commands and their schemas where an analysis stands.
fn commands(node: &Value) -> Option<Vec<(String, &Value)>> {
    let choices = node["oneOf"].as_array()?.iter();
    choices
        .map(|choice| {
            let name = choice["properties"]["command"]["const"].as_str()?;
            Some((name.to_owned(), choice))
        })
        .collect()
}

fn keys(properties: &Value) -> Vec<String> {
    properties
        .as_object()
        .into_iter()
        .flatten()
        .map(|(key, _)| key.clone())
        .collect()
}

/// What a schema allows, in words.
fn described(node: &Value) -> String {
    let node = resolve(node);
    let words = words(node);
    if !words.is_empty() {
        return one_of(&words);
    }
    let choices = choices(node);
    if !choices.is_empty() {
        let choices = choices.into_iter().map(described);
        return choices.collect::<Vec<_>>().join(", or ");
    }
    let some = |key: &str| node[key].as_u64().is_some_and(|least| least > 0);
    let kind = match types(node).first().copied().unwrap_or_default() {
        "integer" => "a whole number",
        "number" => "a number",
        "string" if some("minLength") => "a text that is not empty",
        "string" => "a text",
        "boolean" => "true or false",
        "array" if some("minItems") => "a list that is not empty",
        "array" => "a list",
        "object" => "an object",
        _ => "another value",
    };
    let number = |key: &str| node[key].as_f64().map(plain_number);
    let range = match (
        number("minimum"),
        number("exclusiveMinimum"),
        number("maximum"),
    ) {
        (_, Some(low), Some(high)) => format!(" above {low}, to {high}"),
        (_, Some(low), None) => format!(" above {low}"),
        (Some(low), None, Some(high)) => format!(" from {low} to {high}"),
        (Some(low), None, None) => format!(", {low} or more"),
        (None, None, Some(high)) => format!(" up to {high}"),
        (None, None, None) => match node["not"]["const"].as_f64() {
            Some(barred) => format!(" other than {}", plain_number(barred)),
            None => String::new(),
        },
    };
    format!("{kind}{range}")
}

/// Small limits as the fractions they are.
fn plain_number(value: f64) -> String {
    let inverse = 1.0 / value;
    if value > 0.0 && value < 0.01 && inverse.log2() == inverse.log2().round() {
        return format!("1/{inverse}");
    }
    value.to_string()
}

fn one_of(words: &[String]) -> String {
    let quoted: Vec<String> = words.iter().map(|word| format!("`{word}`")).collect();
    match quoted.split_last() {
        Some((last, rest)) if !rest.is_empty() => format!("{} or {last}", rest.join(", ")),
        Some((only, _)) => only.clone(),
        None => "nothing".to_owned(),
    }
}

/// A value as found, short.
fn shown(value: &Value) -> String {
    const LONGEST: usize = 40;
    let text = match value {
        Value::Null => "null".to_owned(),
        Value::Array(items) => format!("a list of {}", items.len()),
        Value::Object(_) => "an object".to_owned(),
        Value::Number(number) => match number.as_f64().filter(|_| number.is_f64()) {
            Some(value) if value.abs() < 1e15 => value.to_string(),
            _ => number.to_string(),
        },
        Value::Bool(_) | Value::String(_) => value.to_string(),
    };
    match text.char_indices().nth(LONGEST) {
        Some((end, _)) => format!("{}…", &text[..end]),
        None => text,
    }
}

fn did_you_mean(nearest: Option<&str>) -> String {
    nearest.map_or_else(String::new, |word| format!("did you mean `{word}`?"))
}

/// The known word nearest to a text, if it is near.
fn nearest<'a>(text: &str, known: &'a [String]) -> Option<&'a str> {
    let text = text.to_lowercase().replace('-', "_");
    let text: Vec<char> = text.chars().take(64).collect();
    let (distance, word) = known
        .iter()
        .map(|word| {
            let plain: Vec<char> = word.replace('-', "_").chars().collect();
            let distance = edits(&text, &plain);
            // one that begins alike is meant, however much is missing
            let begun = text.len() >= 3 && (plain.starts_with(&text) || text.starts_with(&plain));
            (if begun { distance.min(2) } else { distance }, word)
        })
        .min_by_key(|(distance, _)| *distance)?;
    (distance <= (word.chars().count() / 3).max(2)).then_some(word.as_str())
}

/// Letters to add, drop, change or swap with their neighbour (optimal string alignment distance).
fn edits(a: &[char], b: &[char]) -> usize {
    let mut before: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i];
        for j in 1..=b.len() {
            let changed = usize::from(a[i - 1] != b[j - 1]);
            let mut least = (last[j - 1] + changed).min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                least = least.min(before[j - 2] + 1);
            }
            row.push(least);
        }
        before = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]

    use super::*;
    use crate::settings::{SpectrumSettings, SpeedSettings};

    #[test]
    fn the_nearest_known_word_is_offered_only_when_it_is_near() {
        let known = ["max_order", "order_step", "overlap", "as"].map(str::to_owned);
        assert_eq!(nearest("max-order", &known), Some("max_order"));
        assert_eq!(nearest("ordre_step", &known), Some("order_step"));
        assert_eq!(nearest("over", &known), Some("overlap"));
        assert_eq!(nearest("temperature", &known), None);
    }

    #[test]
    fn edits_count_what_a_hand_would_do() {
        let count = |a: &str, b: &str| {
            edits(
                &a.chars().collect::<Vec<_>>(),
                &b.chars().collect::<Vec<_>>(),
            )
        };
        assert_eq!(count("", "abc"), 3);
        assert_eq!(count("kitten", "sitting"), 3);
        assert_eq!(count("tach", "tahc"), 1);
    }

    #[test]
    fn numbers_that_json_cannot_hold_are_faults_too() {
        for wrong in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            let analysis = Analysis::Spectrum(SpectrumSettings {
                max_order: Some(wrong),
                ..SpectrumSettings::default()
            });
            let fault = analysis.check().unwrap_err();
            assert_eq!(fault.pointer, "/max_order");
            assert_eq!(fault.expected, "a finite number");
            let analysis = Analysis::Speed(SpeedSettings { step: wrong });
            assert_eq!(analysis.check().unwrap_err().found, wrong.to_string());
        }
    }

    #[test]
    fn settings_in_range_have_no_fault() {
        for analysis in [
            Analysis::Speed(SpeedSettings::default()),
            Analysis::Spectrum(SpectrumSettings::default()),
            Analysis::Synchronous(crate::SynchronousSettings::default()),
            Analysis::Compare(crate::CompareSettings::default()),
        ] {
            assert_eq!(analysis.check(), Ok(()));
        }
    }

    #[test]
    fn the_walk_knows_every_word_of_the_schema() {
        const KNOWN: [&str; 19] = [
            "$ref",
            "$schema",
            "$defs",
            "title",
            "description",
            "default",
            "type",
            "properties",
            "additionalProperties",
            "required",
            "items",
            "minItems",
            "minLength",
            "minimum",
            "maximum",
            "exclusiveMinimum",
            "anyOf",
            "oneOf",
            "const",
        ];
        // `format` only narrows whole numbers; `pattern` is checked as a ratio
        const ALSO: [&str; 4] = ["format", "enum", "not", "pattern"];
        fn visit(node: &Value) {
            for (key, inner) in node.as_object().into_iter().flatten() {
                assert!(
                    KNOWN.contains(&key.as_str()) || ALSO.contains(&key.as_str()),
                    "{key}"
                );
                match key.as_str() {
                    "properties" | "$defs" => {
                        inner.as_object().unwrap().values().for_each(visit);
                    }
                    "anyOf" | "oneOf" => inner.as_array().unwrap().iter().for_each(visit),
                    "items" | "not" => visit(inner),
                    _ => {}
                }
            }
        }
        visit(schema());
    }
}
