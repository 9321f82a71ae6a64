//! The `shaftwise` program.
fn main() {}
