//! The `bismar` command.
fn main() {}
