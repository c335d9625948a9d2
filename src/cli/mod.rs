//! The command line: arguments, the environment, progress, printing, exit
//! status. The only stage that prints, reads the environment or the clock; it
//! holds no logic of the audit.

mod args;
mod audit;
mod checks;
mod clock;
mod exit;
mod fail_on;
mod field;
mod model;
mod pipe;
mod progress;
mod read;
mod settings;
mod summary;

use std::io::{self, Write};
use std::process::ExitCode;

use clap::Parser;

use args::{Arguments, Command};
pub use exit::Exit;
use pipe::Pipe;

/// Runs the program on the process's own arguments and streams.
#[must_use]
pub fn main() -> ExitCode {
    crate::batch::quiet_panics();
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            // clap prints --help and --version to stdout with status 0, errors to stderr with 2.
            let _ = error.print();
            return ExitCode::from(u8::try_from(error.exit_code()).unwrap_or(2));
        }
    };
    let mut out = Pipe::new(io::stdout().lock());
    let mut err = Pipe::new(io::stderr());
    let exit = run(arguments, &mut out, &mut err);
    // Standard output may hold back a line; nobody can be told any more when it cannot be written.
    let _ = out.flush();
    ExitCode::from(exit.status())
}

/// Runs one command. Results go to `out`, everything else to `err`.
fn run(arguments: Arguments, out: &mut dyn Write, err: &mut dyn Write) -> Exit {
    let result = match arguments.command {
        Command::Audit(audit) => audit::run(audit, out, err),
        Command::Read(read) => read::run(read, out),
        Command::Field(field) => field::run(*field, out),
        Command::Model(model) => model::run(model, out),
        Command::Checks => checks::run(out),
    };
    result.unwrap_or_else(|error| {
        let causes: Vec<String> = error.chain().map(ToString::to_string).collect();
        let _ = writeln!(err, "counterfoil: {}", for_terminal(&causes.join(": ")));
        Exit::Failed
    })
}

/// So much of a message is shown; one may quote a cell of megabytes.
const MESSAGE_CHARACTERS: usize = 2_000;

/// A text for the terminal: what a file name or a file's content brings along
/// must not steer it.
fn for_terminal(text: &str) -> String {
    let mut shown = String::new();
    for (count, c) in text.chars().enumerate() {
        if count == MESSAGE_CHARACTERS {
            shown.push_str("...");
            break;
        }
        if c.is_control() && c != '\n' {
            shown.extend(c.escape_default());
        } else {
            shown.push(c);
        }
    }
    shown
}
