//! The command line: arguments, the environment, progress, printing, exit
//! status. The only stage that prints, reads the environment or the clock; it
//! holds no logic of the audit.

mod args;
mod audit;
mod checks;
mod clock;
mod exit;
mod field;
mod model;
mod patient_out;
mod progress;
mod read;
mod settings;
mod summary;

use std::io::{self, Write};
use std::process::ExitCode;

use clap::Parser;

use args::{Arguments, Command};
pub use exit::Exit;
use patient_out::PatientOut;

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
    let mut out = io::stdout().lock();
    ExitCode::from(run(arguments, &mut out, &mut io::stderr()).status())
}

/// Runs one command. Results go to `out`, everything else to `err`.
fn run(arguments: Arguments, out: &mut dyn Write, err: &mut dyn Write) -> Exit {
    let result = match arguments.command {
        Command::Audit(audit) => audit::run(audit, &mut PatientOut::new(out), err),
        Command::Read(read) => read::run(read, out),
        Command::Field(field) => field::run(*field, &mut PatientOut::new(out)),
        Command::Model(model) => model::run(model, &mut PatientOut::new(out)),
        Command::Checks => checks::run(out),
    };
    // Standard output may hold back a line; whether it can be written shows only now.
    let result = result.and_then(|exit| {
        PatientOut::new(out).flush()?;
        Ok(exit)
    });
    result.unwrap_or_else(|error| {
        if is_broken_pipe(&error) {
            // Whoever read our output has seen enough; only commands without a judgement end so.
            return Exit::Within;
        }
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

fn is_broken_pipe(error: &anyhow::Error) -> bool {
    error.chain().any(|cause| {
        let of_io = cause.downcast_ref::<io::Error>().map(io::Error::kind);
        let of_json = cause
            .downcast_ref::<serde_json::Error>()
            .and_then(serde_json::Error::io_error_kind);
        of_io.or(of_json) == Some(io::ErrorKind::BrokenPipe)
    })
}
