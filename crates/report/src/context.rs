use serde_json::{Map, Value};

use crate::shown::clean;

/// What stands around the results: who asks, on what machine, under which conditions.
#[derive(Debug, Clone, PartialEq)]
pub struct Context {
    /// Version of the program.
    pub version: &'static str,
    /// The line that was typed, quoted so that it can be typed again.
    pub command_line: String,
    /// The machine, as the run file names it; shown in its order.
    pub machine: Map<String, Value>,
    /// Load, flow, temperature and the like, as the run file names them.
    pub conditions: Map<String, Value>,
}

impl Context {
    /// The machine's name for headings: its `name` and `site`; empty where neither is given.
    pub(crate) fn machine_name(&self) -> String {
        let part = |key: &str| self.machine.get(key).map(value_text);
        [part("name"), part("site")]
            .into_iter()
            .flatten()
            .filter(|text| !text.is_empty())
            .collect::<Vec<_>>()
            .join(", ")
    }
}

/// `flow 310 m³/h; valve 60 %`, or "not stated".
pub(crate) fn stated(map: &Map<String, Value>) -> String {
    if map.is_empty() {
        return "not stated".to_owned();
    }
    let entries: Vec<String> = map
        .iter()
        .map(|(key, value)| format!("{} {}", key_text(key), value_text(value)))
        .collect();
    entries.join("; ")
}

/// A key as people write it.
pub(crate) fn key_text(key: &str) -> String {
    clean(&key.replace('_', " "))
}

/// A value in one line.
pub(crate) fn value_text(value: &Value) -> String {
    match value {
        Value::String(text) => clean(text),
        Value::Null => "not stated".to_owned(),
        other => clean(&other.to_string()),
    }
}
