use serde::Serialize;
use serde_json::{Map, Value, json};
use shaftwise_run::{AnalysisResult, Outcome, RunResult, SpeedResult};

use crate::Context;

/// One analysis as JSON: the fields every command has (`command`, `version`, `recording`,
/// `settings`, `warnings`), then its own. All but `speed` itself carry `speed`, without its curve.
/// What could not be worked out is `null`.
///
/// # Panics
///
/// If there is no analysis of that index.
#[must_use]
pub fn command_json(result: &RunResult, index: usize, version: &str) -> Value {
    let outcome = &result.analyses[index];
    let warnings: Vec<&String> = result.warnings.iter().chain(&outcome.warnings).collect();
    let mut object = Map::new();
    object.insert("command".into(), outcome.command.into());
    object.insert("version".into(), version.into());
    object.insert("recording".into(), plain(&result.recording));
    object.insert("settings".into(), outcome.settings.clone());
    object.insert("warnings".into(), json!(warnings));
    object.append(&mut fields(outcome));
    if !matches!(outcome.result, AnalysisResult::Speed(_)) {
        object.insert("speed".into(), speed_facts(&result.speed));
    }
    Value::Object(object)
}

/// A whole report as JSON (`results.json`): the common fields, `cpu_level`, `machine`,
/// `conditions`, `speed` without its curve, and under `results` each analysis with its `command`,
/// `settings` and `warnings`.
#[must_use]
pub fn report_json(result: &RunResult, context: &Context) -> Value {
    let commands: Vec<&str> = result.analyses.iter().map(|o| o.command).collect();
    let results: Vec<Value> = result
        .analyses
        .iter()
        .map(|outcome| {
            let mut object = Map::new();
            object.insert("command".into(), outcome.command.into());
            object.insert("settings".into(), outcome.settings.clone());
            object.insert("warnings".into(), json!(outcome.warnings));
            object.append(&mut fields(outcome));
            Value::Object(object)
        })
        .collect();
    json!({
        "command": "report",
        "version": context.version,
        "recording": plain(&result.recording),
        "settings": { "analyses": commands },
        "warnings": result.warnings,
        "cpu_level": result.cpu_level,
        "machine": context.machine,
        "conditions": context.conditions,
        "speed": speed_facts(&result.speed),
        "results": results,
    })
}

/// JSON laid out for people and for comparing line by line: objects and lists of objects over
/// several lines, lists of plain values in one. Ends with a line feed.
#[must_use]
pub fn json_text(value: &Value) -> String {
    let mut out = String::new();
    lay_out(value, 0, &mut out);
    out.push('\n');
    out
}

fn lay_out(value: &Value, depth: usize, out: &mut String) {
    let nested = |v: &Value| v.is_object() || v.is_array();
    let line = |out: &mut String, depth: usize| {
        out.push('\n');
        out.extend(std::iter::repeat_n("  ", depth));
    };
    match value {
        Value::Object(map) if !map.is_empty() => {
            out.push('{');
            for (i, (key, value)) in map.iter().enumerate() {
                if i > 0 {
                    out.push(',');
                }
                line(out, depth + 1);
                out.push_str(&Value::from(key.as_str()).to_string());
                out.push_str(": ");
                lay_out(value, depth + 1, out);
            }
            line(out, depth);
            out.push('}');
        }
        Value::Array(values) if values.iter().any(nested) => {
            out.push('[');
            for (i, value) in values.iter().enumerate() {
                if i > 0 {
                    out.push(',');
                }
                line(out, depth + 1);
                lay_out(value, depth + 1, out);
            }
            line(out, depth);
            out.push(']');
        }
        Value::Array(values) => {
            out.push('[');
            for (i, value) in values.iter().enumerate() {
                if i > 0 {
                    out.push_str(", ");
                }
                out.push_str(&value.to_string());
            }
            out.push(']');
        }
        other => out.push_str(&other.to_string()),
    }
}

/// The fields of an analysis itself.
fn fields(outcome: &Outcome) -> Map<String, Value> {
    match plain(&outcome.result) {
        Value::Object(map) => map,
        other => Map::from_iter([("result".to_owned(), other)]),
    }
}

fn speed_facts(speed: &SpeedResult) -> Value {
    let facts = SpeedResult {
        curve: Default::default(),
        ..speed.clone()
    };
    let mut value = plain(&facts);
    if let Value::Object(map) = &mut value {
        map.shift_remove("curve");
    }
    value
}

/// Results hold nothing but numbers, texts, lists and structures with named fields, so that
/// turning them into a value cannot fail.
fn plain(value: &impl Serialize) -> Value {
    serde_json::to_value(value).unwrap_or(Value::Null)
}
