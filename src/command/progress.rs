//! Shows on a terminal how far a fit is, and passes on the wish to stop.

use crate::command::interrupt::Interrupt;
use crate::fit::{Stage, Watch};
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::IsTerminal;

/// Whether progress may be shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Chatter {
    /// On a terminal.
    Allowed,
    /// Never.
    Quiet,
}

/// The watch of a fit.
#[derive(Debug)]
pub struct Progress {
    bar: ProgressBar,
    interrupt: Interrupt,
}

impl Progress {
    /// Progress on standard error, where that is a terminal and chatter is allowed.
    pub fn new(chatter: Chatter, interrupt: Interrupt) -> Progress {
        let target = if chatter == Chatter::Allowed && std::io::stderr().is_terminal() {
            ProgressDrawTarget::stderr()
        } else {
            ProgressDrawTarget::hidden()
        };
        let bar = ProgressBar::with_draw_target(Some(0), target);
        // Plain characters: a bar is no place for block letters that a screen reader spells out.
        if let Ok(style) = ProgressStyle::with_template("{msg} {bar:30} {human_pos} of {human_len}") {
            bar.set_style(style.progress_chars("=> "));
        }
        Progress { bar, interrupt }
    }

    /// Takes the bar off the screen.
    pub fn clear(&self) {
        self.bar.finish_and_clear();
    }
}

impl Watch for Progress {
    fn told(&self, stage: Stage) {
        let (message, done, of) = match stage {
            Stage::Mode => ("Finding the mode", 0, 1),
            Stage::WarmUp { done, of } => ("Warming up", done, of),
            Stage::Drawing { done, next, .. } => ("Drawing, until the next look at the precision", done, next),
        };
        self.bar.set_message(message);
        self.bar.set_length(of as u64);
        self.bar.set_position(done as u64);
    }

    fn stop_asked(&self) -> bool {
        self.interrupt.is_asked()
    }
}
