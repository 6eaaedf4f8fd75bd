//! The program's commands: arguments, files, streams and the exit code.
//!
//! Only here are files opened and streams written. Answers go to files or to
//! standard output, everything that is said about them to standard error.

mod ask;
mod check;
mod document;
mod each;
mod explain;
mod files;
mod fill;
mod input;
mod progress;
mod review;
mod shelf;
mod steps;
mod terminal;
mod verdict;

pub use verdict::Verdict;

use clap::{Parser, Subcommand};
use std::ffi::OsString;
use std::process::ExitCode;
use terminal::Terminal;

const CAUTION: &str = "\
Exit codes:
  0  all well
  1  an answer is stale
  2  an error in what was written, or in the arguments
  3  a file could not be read or written
  4  a requirement not met or undecided

tieback is an aid to calculation. It is no substitute for the codes and
standards in force and the judgement of a licensed engineer.";

/// Fill reliability answers into Markdown notes and parts lists, and change no other byte
#[derive(Parser, Debug)]
#[command(name = "tieback", version, after_long_help = CAUTION, max_term_width = 100)]
struct Cli {
    /// Write what the run found as JSON to standard output
    #[arg(long, global = true)]
    json: bool,

    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand, Debug)]
enum Command {
    Fill(fill::Fill),
    Check(check::Check),
    Ask(ask::Ask),
    Steps(steps::Steps),
    Review(review::Review),
    Explain(explain::Explain),
}

/// How a run speaks.
#[derive(Clone, Copy, Debug)]
struct Voice {
    /// Data on standard output in place of text.
    json: bool,
    terminal: Terminal,
}

/// Runs the program with these arguments; the first is its own name.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let cli = match Cli::try_parse_from(arguments) {
        Ok(cli) => cli,
        Err(error) => return usage(&error),
    };
    let voice = Voice { json: cli.json, terminal: Terminal::new() };
    let done = match &cli.command {
        Command::Fill(command) => command.run(voice),
        Command::Check(command) => Ok(command.run(voice)),
        Command::Ask(command) => Ok(command.run(voice)),
        Command::Steps(command) => Ok(command.run(voice)),
        Command::Review(command) => Ok(command.run(voice)),
        Command::Explain(command) => Ok(command.run(voice)),
    };
    match done {
        Ok(verdict) => ExitCode::from(verdict.code()),
        Err(error) => usage(&error),
    }
}

/// Prints help, the version, or what is wrong with the arguments.
fn usage(error: &clap::Error) -> ExitCode {
    // There is nowhere left to report that this could not be printed.
    let _ = error.print();
    ExitCode::from(u8::try_from(error.exit_code()).unwrap_or(2))
}
