//! Ctrl-C: the first asks the work to end and leave nothing, the second ends the process at once.

use crate::error::Error;
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
        let flag = Arc::clone(&asked);
        ctrlc::set_handler(move || {
            if flag.swap(true, Ordering::SeqCst) {
                // The person means it: no tidying, no waiting.
                #[allow(clippy::exit)]
                std::process::exit(INTERRUPTED);
            }
        })
        .map_err(|error| Error::NoInterrupt(error.to_string()))?;
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
