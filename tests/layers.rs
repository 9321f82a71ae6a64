//! The arrows between crates point one way only.
#![allow(clippy::unwrap_used, missing_docs)]

use std::process::Command;

/// Each crate and what of this project it may import.
const LAYERS: &[(&str, &[&str])] = &[
    ("signal", &[]),
    ("machine", &[]),
    ("figures", &[]),
    ("synth", &[]),
    ("recording", &[]),
    ("rotation", &["signal", "machine"]),
    ("orders", &["signal", "rotation"]),
    ("findings", &["signal", "machine", "orders"]),
    (
        "run",
        &[
            "signal",
            "recording",
            "rotation",
            "orders",
            "findings",
            "machine",
        ],
    ),
    ("report", &["run", "recording", "figures"]),
    ("", &["run", "report", "synth"]),
];

#[test]
fn a_crate_imports_only_lower_layers() {
    let output = Command::new(env!("CARGO"))
        .args([
            "metadata",
            "--format-version",
            "1",
            "--no-deps",
            "--offline",
        ])
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .output()
        .unwrap();
    assert!(
        output.status.success(),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    let metadata: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let packages = metadata["packages"].as_array().unwrap();
    assert_eq!(
        packages.len(),
        LAYERS.len(),
        "a crate is missing from the table"
    );
    for package in packages {
        let name = package["name"].as_str().unwrap();
        let short = name.strip_prefix("shaftwise-").unwrap_or("");
        let (_, allowed) = LAYERS
            .iter()
            .find(|(layer, _)| *layer == short)
            .unwrap_or_else(|| panic!("{name} has no layer"));
        for dependency in package["dependencies"].as_array().unwrap() {
            let Some(other) = dependency["name"]
                .as_str()
                .unwrap()
                .strip_prefix("shaftwise-")
            else {
                continue;
            };
            // Tests may use anything below them, and synth everywhere.
            let for_tests = dependency["kind"].as_str() == Some("dev");
            assert!(
                for_tests || allowed.contains(&other),
                "{name} imports shaftwise-{other}"
            );
        }
    }
}
