//! The schema of the run file, made from the types that read it.

use crate::settings::RunFile;
use serde_json::Value;
use std::sync::OnceLock;

/// The schema as a value. Faults are found by walking it, so what an editor marks and what the
/// program refuses cannot differ.
pub(crate) fn schema() -> &'static Value {
    static SCHEMA: OnceLock<Value> = OnceLock::new();
    SCHEMA.get_or_init(|| schemars::schema_for!(RunFile).to_value())
}

/// JSON Schema (draft 2020-12) of the run file, for editors that check and complete while typing.
#[must_use]
pub fn schema_json() -> String {
    format!("{:#}\n", schema())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]

    use super::*;

    /// `SHAFTWISE_UPDATE=1 cargo test -p shaftwise-run schema` writes the file anew.
    #[test]
    fn the_committed_schema_is_the_one_made_from_the_types() {
        let path = concat!(env!("CARGO_MANIFEST_DIR"), "/../../run-file.schema.json");
        if std::env::var_os("SHAFTWISE_UPDATE").is_some() {
            std::fs::write(path, schema_json()).unwrap();
        }
        let committed = std::fs::read_to_string(path).unwrap_or_default();
        assert!(
            committed == schema_json(),
            "run-file.schema.json is out of step with crates/run/src/settings.rs; \
             SHAFTWISE_UPDATE=1 cargo test -p shaftwise-run schema writes it anew"
        );
    }
}
