//! Starts the program; everything else is the library's.

use std::process::ExitCode;

fn main() -> ExitCode {
    ratewright::command::run(std::env::args_os())
}
