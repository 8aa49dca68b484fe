//! Signals: the first Ctrl-C asks the work to end and leave nothing, the second ends the process at once; a
//! limit on the size of files is an error of the write that meets it.

use crate::error::Error;
use signal_hook::consts::{SIGINT, SIGTERM};
use signal_hook::flag;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

/// Exit code of an interrupted process, as shells count it.
const INTERRUPTED: i32 = 130;

/// Whether the person has asked to stop.
#[derive(Debug, Clone)]
pub struct Interrupt {
    asked: Arc<AtomicBool>,
}

impl Interrupt {
    /// Begins to watch. Once in a process.
    ///
    /// # Errors
    /// The system does not let us watch.
    pub fn watched() -> Result<Interrupt, Error> {
        let asked = Arc::new(AtomicBool::new(false));
        let mut signals = vec![SIGINT, SIGTERM];
        #[cfg(unix)]
        signals.push(signal_hook::consts::SIGHUP);
        for signal in signals {
            // In this order: the second signal finds the flag that the first has set. Then the person
            // means it: no tidying, no waiting.
            flag::register_conditional_shutdown(signal, INTERRUPTED, Arc::clone(&asked))
                .and_then(|_| flag::register(signal, Arc::clone(&asked)))
                .map_err(cannot_watch)?;
        }
        Ok(Interrupt { asked })
    }

    /// Whether to stop.
    pub fn is_asked(&self) -> bool {
        self.asked.load(Ordering::SeqCst)
    }

    /// An error where the person has asked to stop.
    ///
    /// # Errors
    /// [`Error::Interrupted`], then.
    pub fn check(&self) -> Result<(), Error> {
        if self.is_asked() {
            Err(Error::Interrupted)
        } else {
            Ok(())
        }
    }
}

/// Lets a write that passes the limit on the size of files (`ulimit -f`) fail with an error.
///
/// Unwatched, the signal of that limit ends the process without a word, its temporary folder left behind.
///
/// # Errors
/// The system does not let us watch.
pub fn let_large_writes_fail() -> Result<(), Error> {
    #[cfg(unix)]
    flag::register(signal_hook::consts::SIGXFSZ, Arc::new(AtomicBool::new(false))).map_err(cannot_watch)?;
    Ok(())
}

fn cannot_watch(error: std::io::Error) -> Error {
    Error::NoInterrupt(error.to_string())
}
