//! Results to standard output, everything else to standard error.
//!
//! Text carries its bold headings as escapes; they are taken out wherever the stream is no
//! terminal, or NO_COLOR is set.

use crate::error::Error;
use crate::output::diagnostic::{Look, render};
use std::io::{ErrorKind, Write};

/// Writes a result to standard output.
///
/// A closed pipe (`ratewright fit … | head`) ends quietly: the reader has had enough.
///
/// # Errors
/// Standard output cannot be written to for any other reason.
pub fn print(text: &str) -> Result<(), Error> {
    let mut stream = anstream::stdout();
    match stream.write_all(text.as_bytes()).and_then(|()| stream.flush()) {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => Err(Error::Stdout(error)),
        _ => Ok(()),
    }
}

/// Writes a message to standard error; there is nobody left to tell when that fails.
pub fn tell(text: &str) {
    let mut stream = anstream::stderr();
    let _ = stream.write_all(text.as_bytes()).and_then(|()| stream.flush());
}

/// Tells what kept a command from its result.
pub fn tell_error(error: &Error) {
    let diagnostics = error.diagnostics();
    if diagnostics.is_empty() {
        tell("Interrupted: nothing was written.\n");
    } else {
        tell(&render(&diagnostics, error.spec_source(), Look::Styled));
    }
}
