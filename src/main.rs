//! The program: arguments, output and exit status are the work of `cli`.

use std::process::ExitCode;

fn main() -> ExitCode {
    counterfoil::cli::main()
}
