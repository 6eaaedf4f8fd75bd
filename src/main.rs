//! The program `tieback`: arguments in, exit code out.

use std::process::ExitCode;

fn main() -> ExitCode {
    tieback::command::run(std::env::args_os())
}
