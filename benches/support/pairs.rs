//! Several pieces of work timed in turns.
//!
//! A machine's speed drifts from second to second with its heat, its neighbours and its memory. So the pieces take
//! turns, A B C, then C B A, and what is reported is the median of the ratios within a turn, with its quartiles: whatever
//! slows a whole turn leaves its ratios alone. A neighbour on the other half of the same core does not: it halves the
//! speed of code that keeps the arithmetic units busy and hardly touches a loop that waits for its own results. So the
//! ratio of the shortest times is told too: that of a machine left alone.

use super::clock::Clock;
use ratewright::fit::quantile_of_sorted;
use std::hint::black_box;

/// Shortest time of one measurement, in seconds: what disturbs it for microseconds then disappears, and one measurement
/// in many finds the machine idle beside it.
const SHORTEST: f64 = 0.008;

/// A median and its quartiles.
#[derive(Debug, Clone, Copy)]
pub struct Spread {
    /// Lower quartile.
    pub lower: f64,
    /// Median.
    pub median: f64,
    /// Upper quartile.
    pub upper: f64,
}

impl Spread {
    /// The spread of some values; not a number where there are none.
    pub fn of(values: impl IntoIterator<Item = f64>) -> Spread {
        let mut sorted: Vec<f64> = values.into_iter().collect();
        sorted.sort_by(f64::total_cmp);
        let at = |p: f64| {
            if sorted.is_empty() {
                f64::NAN
            } else {
                quantile_of_sorted(&sorted, p)
            }
        };
        Spread {
            lower: at(0.25),
            median: at(0.5),
            upper: at(0.75),
        }
    }
}

impl std::fmt::Display for Spread {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{:.2} ({:.2} to {:.2})", self.median, self.lower, self.upper)
    }
}

/// A piece of work: it returns a number that depends on all of it, so that nothing is optimised away.
pub struct Piece<'a> {
    work: Box<dyn FnMut() -> f64 + 'a>,
    /// How often it is repeated in one measurement.
    repeats: usize,
}

impl<'a> Piece<'a> {
    /// A piece of work.
    pub fn new(work: impl FnMut() -> f64 + 'a) -> Piece<'a> {
        Piece {
            work: Box::new(work),
            repeats: 1,
        }
    }

    /// Seconds of one repetition.
    fn measure(&mut self, clock: Clock) -> f64 {
        // Once untimed: the piece before has left its own rows in the caches.
        black_box((self.work)());
        let start = clock.seconds();
        for _ in 0..self.repeats {
            black_box((self.work)());
        }
        (clock.seconds() - start) / self.repeats as f64
    }
}

/// Seconds of each piece in each turn.
pub struct Turns {
    seconds: Vec<Vec<f64>>,
}

/// Times the pieces in `turns` turns, after one repetition of each to warm up.
pub fn take_turns(mut pieces: Vec<Piece<'_>>, turns: usize, clock: Clock) -> Turns {
    for piece in &mut pieces {
        let first = piece.measure(clock);
        piece.repeats = ((SHORTEST / first.max(1e-9)).ceil() as usize).max(1);
    }
    let mut seconds = vec![Vec::with_capacity(turns); pieces.len()];
    for turn in 0..turns {
        for step in 0..pieces.len() {
            // Forth and back, so that no piece is always the one after a certain other.
            let place = if turn % 2 == 0 { step } else { pieces.len() - 1 - step };
            seconds[place].push(pieces[place].measure(clock));
        }
    }
    Turns { seconds }
}

impl Turns {
    /// Seconds of one repetition of a piece.
    pub fn seconds(&self, piece: usize) -> Spread {
        Spread::of(self.seconds[piece].iter().copied())
    }

    /// How many times as long as `other` the piece `slow` takes.
    pub fn ratio(&self, slow: usize, other: usize) -> Spread {
        Spread::of(self.seconds[slow].iter().zip(&self.seconds[other]).map(|(a, b)| a / b))
    }

    /// The same for the shortest time of each.
    pub fn ratio_at_best(&self, slow: usize, other: usize) -> f64 {
        let least = |piece: usize| self.seconds[piece].iter().copied().fold(f64::INFINITY, f64::min);
        least(slow) / least(other)
    }
}
