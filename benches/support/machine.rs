//! The limits of the machine at hand, measured in the same run as what is compared with them: how fast memory and caches
//! can be read, and how many multiplications and additions a core can do in a second.
//!
//! Each figure is the best of several tries: a limit is what the machine can do when nothing else disturbs it.

use super::clock::Clock;
use std::arch::x86_64::{
    _mm_add_pd, _mm_cvtsd_f64, _mm_mul_pd, _mm_set1_pd, _mm256_add_pd, _mm256_cvtsd_f64, _mm256_mul_pd, _mm256_set1_pd,
    _mm512_add_pd, _mm512_cvtsd_f64, _mm512_mul_pd, _mm512_set1_pd,
};
use std::fmt::Write;
use std::hint::black_box;
use std::sync::Barrier;

/// Tries of each probe.
const TRIES: usize = 7;

/// Vector instructions of x86-64, by the width of their registers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Vectors {
    /// Two numbers: every x86-64 processor.
    Sse2,
    /// Four.
    Avx2,
    /// Eight.
    Avx512,
}

impl Vectors {
    /// Those that this processor has, narrow ones first.
    pub fn available() -> Vec<Vectors> {
        let mut available = vec![Vectors::Sse2];
        if is_x86_feature_detected!("avx2") {
            available.push(Vectors::Avx2);
        }
        if is_x86_feature_detected!("avx512f") {
            available.push(Vectors::Avx512);
        }
        available
    }

    /// The usual name.
    pub fn name(self) -> &'static str {
        match self {
            Vectors::Sse2 => "SSE2",
            Vectors::Avx2 => "AVX2",
            Vectors::Avx512 => "AVX-512",
        }
    }
}

/// Where an array lies that is read again and again.
#[derive(Debug, Clone, Copy)]
pub struct Level {
    /// Name of the cache, or "memory".
    pub name: &'static str,
    /// Arrays up to this many bytes lie there.
    pub holds: usize,
    /// Bytes a second that one core reads.
    pub one_core: f64,
    /// Bytes a second that all cores read together, each its own array.
    pub all_cores: f64,
}

/// What the machine can do at best.
#[derive(Debug, Clone)]
pub struct Limits {
    /// Caches and memory, small ones first.
    pub levels: Vec<Level>,
    /// Multiplications and additions a second on one core, by the vectors used.
    pub arithmetic: Vec<(Vectors, f64)>,
    cores: usize,
}

impl Limits {
    /// Measures them; takes about two seconds.
    pub fn measure() -> Limits {
        let cores = std::thread::available_parallelism().map_or(1, usize::from);
        let second = cache_bytes(2).unwrap_or(512 << 10);
        let last = cache_bytes(3).unwrap_or(32 << 20);
        let level = |name, holds: usize, probe: usize| Level {
            name,
            holds,
            one_core: read_rate(probe, 1),
            all_cores: read_rate(probe, cores),
        };
        Limits {
            levels: vec![
                level("second-level cache", second, second / 2),
                level("last-level cache", last, last / 2 / cores.max(2)),
                level("memory", usize::MAX, (8 * last).min(512 << 20)),
            ],
            arithmetic: Vectors::available()
                .into_iter()
                .map(|set| (set, arithmetic_rate(set)))
                .collect(),
            cores,
        }
    }

    /// Bytes a second at which one core can read an array of this size again and again.
    pub fn read_rate(&self, bytes: usize) -> f64 {
        let level = self.levels.iter().find(|level| bytes <= level.holds);
        level.map_or(f64::NAN, |level| level.one_core)
    }

    /// Multiplications and additions a second on one core with the widest vectors that the processor has.
    pub fn widest_arithmetic(&self) -> f64 {
        self.arithmetic.last().map_or(f64::NAN, |(_, rate)| *rate)
    }

    /// The limits as a table.
    pub fn told(&self) -> String {
        let mut text = format!(
            "| limit of this machine | one core | {} cores |\n| --- | --- | --- |\n",
            self.cores
        );
        for level in &self.levels {
            let (one, all) = (level.one_core * 1e-9, level.all_cores * 1e-9);
            // Writing into a string cannot fail.
            let _ = writeln!(text, "| read from {} | {one:.1} GB/s | {all:.1} GB/s |", level.name);
        }
        for (set, rate) in &self.arithmetic {
            let rate = rate * 1e-9;
            let _ = writeln!(text, "| multiply and add, {} | {rate:.1} G/s | |", set.name());
        }
        text
    }
}

/// Bytes of this core's cache of a level, where the system tells.
fn cache_bytes(level: u32) -> Option<usize> {
    for entry in std::fs::read_dir("/sys/devices/system/cpu/cpu0/cache").ok()?.flatten() {
        let read = |file: &str| std::fs::read_to_string(entry.path().join(file)).ok();
        let is_level = read("level").is_some_and(|text| text.trim() == level.to_string());
        if is_level && read("type").is_some_and(|text| text.trim() != "Instruction") {
            return read("size")?
                .trim()
                .strip_suffix('K')?
                .parse::<usize>()
                .ok()
                .map(|size| size << 10);
        }
    }
    None
}

/// Bytes a second that `threads` threads read together, each its own array of so many bytes.
fn read_rate(bytes: usize, threads: usize) -> f64 {
    let together = Barrier::new(threads);
    let slowest_of_each_try = std::thread::scope(|scope| {
        let readers: Vec<_> = (0..threads)
            .map(|_| scope.spawn(|| read_times(bytes, &together)))
            .collect();
        let mut slowest = [0.0_f64; TRIES];
        for reader in readers {
            let times = reader.join().unwrap_or([f64::INFINITY; TRIES]);
            for (slowest, time) in slowest.iter_mut().zip(times) {
                *slowest = slowest.max(time);
            }
        }
        slowest
    });
    let best = slowest_of_each_try.into_iter().fold(f64::INFINITY, f64::min);
    (threads * bytes) as f64 / best
}

/// Seconds of one pass over an array of so many bytes, in each try.
fn read_times(bytes: usize, together: &Barrier) -> [f64; TRIES] {
    let values = vec![1.0; bytes / size_of::<f64>()];
    let passes = ((256 << 20) / bytes).max(1);
    std::array::from_fn(|_| {
        together.wait();
        let time = Clock::Wall.time(|| {
            for _ in 0..passes {
                black_box(sum(black_box(&values)));
            }
        });
        time / passes as f64
    })
}

/// Sum of the values as fast as they can be had.
fn sum(values: &[f64]) -> f64 {
    if is_x86_feature_detected!("avx2") {
        // SAFETY: the processor has AVX2, as the line above found.
        unsafe { sum_avx2(values) }
    } else {
        sum_in_lanes(values)
    }
}

#[target_feature(enable = "avx2")]
fn sum_avx2(values: &[f64]) -> f64 {
    sum_in_lanes(values)
}

/// Thirty-two sums side by side: enough that no addition waits for another, in vectors of either width.
#[inline(always)]
fn sum_in_lanes(values: &[f64]) -> f64 {
    let mut lanes = [0.0; 32];
    for chunk in values.as_chunks::<32>().0 {
        for lane in 0..32 {
            lanes[lane] += chunk[lane];
        }
    }
    lanes.iter().sum()
}

/// Steps of each chain in one try.
const STEPS: usize = 2_000_000;
/// Chains that run side by side. A multiplication and the addition that waits for it take some eight cycles, and
/// at most two of each can begin in a cycle; twelve chains and their two constants just fit sixteen registers.
const CHAINS: usize = 12;
/// Each chain goes to `x * FACTOR + SUMMAND`, whose fixed point is 1: no value grows or becomes subnormal.
const FACTOR: f64 = 0.75;
const SUMMAND: f64 = 0.25;

/// Multiplications and additions a second on one core.
fn arithmetic_rate(set: Vectors) -> f64 {
    let (work, lanes): (fn() -> f64, usize) = match set {
        // SAFETY: `Vectors::available` names only what the processor has, here and below.
        Vectors::Sse2 => (|| unsafe { chains_sse2() }, 2),
        // SAFETY: as above.
        Vectors::Avx2 => (|| unsafe { chains_avx2() }, 4),
        // SAFETY: as above.
        Vectors::Avx512 => (|| unsafe { chains_avx512() }, 8),
    };
    let best = (0..TRIES)
        .map(|_| {
            Clock::Thread.time(|| {
                black_box(work());
            })
        })
        .fold(f64::INFINITY, f64::min);
    (2 * STEPS * CHAINS * lanes) as f64 / best
}

/// Written once for each width, since a type of vectors cannot stand for all three.
macro_rules! chains {
    ($(#[$attribute:meta])* $name:ident, $set:ident, $multiply:ident, $add:ident, $first:ident) => {
        $(#[$attribute])*
        fn $name() -> f64 {
            let (factor, summand) = (black_box($set(FACTOR)), black_box($set(SUMMAND)));
            let mut chains = [black_box($set(2.0)); CHAINS];
            for _ in 0..STEPS {
                for chain in &mut chains {
                    *chain = $add($multiply(*chain, factor), summand);
                }
            }
            chains.iter().map(|chain| $first(*chain)).sum()
        }
    };
}

chains!(
    #[target_feature(enable = "sse2")]
    chains_sse2,
    _mm_set1_pd,
    _mm_mul_pd,
    _mm_add_pd,
    _mm_cvtsd_f64
);
chains!(
    #[target_feature(enable = "avx2")]
    chains_avx2,
    _mm256_set1_pd,
    _mm256_mul_pd,
    _mm256_add_pd,
    _mm256_cvtsd_f64
);
chains!(
    #[target_feature(enable = "avx512f")]
    chains_avx512,
    _mm512_set1_pd,
    _mm512_mul_pd,
    _mm512_add_pd,
    _mm512_cvtsd_f64
);
