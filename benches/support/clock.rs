//! Clocks. On a machine that others use too, the processor time of a thread says more than the time on the
//! wall; Linux tells it in files, so that no unsafe call is needed.

use std::sync::OnceLock;
use std::time::Instant;

/// Which time is taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Clock {
    /// On the wall: for work of several threads, and for what waits.
    Wall,
    /// Of the processor on behalf of this thread, where the system tells it; else on the wall.
    Thread,
}

impl Clock {
    /// Seconds since some fixed moment.
    pub fn seconds(self) -> f64 {
        match self {
            Clock::Wall => wall(),
            Clock::Thread => thread().unwrap_or_else(wall),
        }
    }

    /// Seconds that a piece of work takes.
    pub fn time(self, work: impl FnOnce()) -> f64 {
        let start = self.seconds();
        work();
        self.seconds() - start
    }
}

fn wall() -> f64 {
    static START: OnceLock<Instant> = OnceLock::new();
    START.get_or_init(Instant::now).elapsed().as_secs_f64()
}

/// Nanoseconds on the processor: the first number of the thread's `schedstat`.
fn thread() -> Option<f64> {
    // The kernel brings the figure up to date when it chooses what runs next; without the yield it is
    // as old as the last tick, several milliseconds.
    std::thread::yield_now();
    let text = std::fs::read_to_string("/proc/thread-self/schedstat").ok()?;
    let nanoseconds: u64 = text.split_whitespace().next()?.parse().ok()?;
    Some(nanoseconds as f64 * 1e-9)
}

/// Length of the system's tick in seconds: Linux tells times of processes in hundredths on every x86-64.
const TICK: f64 = 0.01;

/// Processor seconds of all child processes that have ended and been waited for; `None` where the system does not
/// tell. Exact to [`TICK`]: take the difference over several of them.
pub fn of_children() -> Option<f64> {
    let text = std::fs::read_to_string("/proc/self/stat").ok()?;
    // The name of the program, in parentheses, may hold spaces; the state is the first field after it.
    let after_name: Vec<&str> = text.rsplit_once(')')?.1.split_whitespace().collect();
    let ticks = |place: usize| after_name.get(place)?.parse::<u64>().ok();
    Some((ticks(13)? + ticks(14)?) as f64 * TICK)
}

/// Most memory that a process held so far, in bytes; `None` once it has ended.
pub fn most_memory(process: u32) -> Option<u64> {
    let text = std::fs::read_to_string(format!("/proc/{process}/status")).ok()?;
    let line = text.lines().find(|line| line.starts_with("VmHWM:"))?;
    let kilobytes: u64 = line.split_whitespace().nth(1)?.parse().ok()?;
    Some(kilobytes * 1_024)
}
