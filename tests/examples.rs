//! Every example runs.
#![allow(
    clippy::unwrap_used,
    clippy::print_stdout,
    missing_docs,
    dead_code,
    unreachable_pub
)]

#[path = "../examples/engine.rs"]
mod engine;
#[path = "../examples/swept_cut_off.rs"]
mod swept_cut_off;

#[test]
fn the_engine_example_runs() {
    engine::main().unwrap();
}

#[test]
fn the_cut_off_picture_is_drawn() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("cut-off.png");
    swept_cut_off::draw(&file, 3).unwrap();
    assert!(std::fs::read(&file).unwrap().starts_with(b"\x89PNG"));
}
