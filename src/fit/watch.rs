//! How a long fit is watched: who shows progress, and who may ask it to stop.

/// Watches a fit. The fit calls it often; it must be quick.
pub trait Watch: Sync {
    /// Told at each stage and now and then within it.
    fn told(&self, stage: Stage);

    /// Whether the fit shall end as soon as it can, leaving nothing.
    fn stop_asked(&self) -> bool;
}

/// Where a fit stands.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Stage {
    /// The mode is looked for.
    Mode,
    /// Iterations of each chain that only adapt.
    WarmUp {
        /// Iterations done.
        done: usize,
        /// Iterations in all.
        of: usize,
    },
    /// Kept draws, all chains together.
    Drawing {
        /// Draws so far.
        done: usize,
        /// The next count at which precision is judged.
        next: usize,
        /// The most draws that the spec allows.
        most: usize,
    },
}

/// Watches nothing and never stops: for tests and for use as a library.
#[derive(Debug, Clone, Copy, Default)]
pub struct Unwatched;

impl Watch for Unwatched {
    fn told(&self, _stage: Stage) {}

    fn stop_asked(&self) -> bool {
        false
    }
}
