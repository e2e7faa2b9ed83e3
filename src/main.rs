//! The `bismar` command.

use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(bismar::command::main())
}
