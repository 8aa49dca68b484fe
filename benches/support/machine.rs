//! The limits of the machine at hand, measured in the same run as what is compared with them: how fast memory and caches
//! can be read, and how many multiplications and additions a core can do in a second.
//!
//! Each figure is the best of several tries: a limit is what the machine can do when nothing else disturbs it.

use super::clock::Clock;
use ratewright::model::Instructions;
use std::arch::x86_64::{
    _mm_add_pd, _mm_cvtsd_f64, _mm_mul_pd, _mm_set1_pd, _mm256_add_pd, _mm256_cvtsd_f64, _mm256_mul_pd, _mm256_set1_pd,
    _mm512_add_pd, _mm512_cvtsd_f64, _mm512_mul_pd, _mm512_set1_pd,
};
use std::fmt::Write;
use std::hint::black_box;
use std::sync::Barrier;

/// Tries of each probe.
const TRIES: usize = 7;

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
    /// Multiplications and additions a second on one core, by the vector instructions used.
    pub arithmetic: Vec<(Instructions, f64)>,
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
            arithmetic: Instructions::available().into_iter().zip(arithmetic_rates()).collect(),
            cores,
        }
    }

    /// Bytes a second at which one core can read an array of this size again and again.
    pub fn read_rate(&self, bytes: usize) -> f64 {
        let level = self.levels.iter().find(|level| bytes <= level.holds);
        level.map_or(f64::NAN, |level| level.one_core)
    }

    /// Multiplications and additions a second on one core with these instructions.
    pub fn arithmetic_with(&self, instructions: Instructions) -> f64 {
        let known = self.arithmetic.iter().find(|(set, _)| *set == instructions);
        known.map_or(f64::NAN, |(_, rate)| *rate)
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
            let _ = writeln!(text, "| multiply and add, {set} | {rate:.1} G/s | |");
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
    let rates = std::thread::scope(|scope| {
        let readers: Vec<_> = (0..threads)
            .map(|_| scope.spawn(|| read_rates(bytes, &together)))
            .collect();
        let mut sums = [0.0; TRIES];
        for reader in readers {
            let rates = reader.join().unwrap_or([f64::NAN; TRIES]);
            for (sum, rate) in sums.iter_mut().zip(rates) {
                *sum += rate;
            }
        }
        sums
    });
    rates.into_iter().fold(f64::NAN, f64::max)
}

/// Bytes a second of this thread in each try, by its own time: who else runs on the core does not count.
fn read_rates(bytes: usize, together: &Barrier) -> [f64; TRIES] {
    let values = vec![1.0; bytes / size_of::<f64>()];
    let passes = ((256 << 20) / bytes).max(1);
    std::array::from_fn(|_| {
        together.wait();
        let time = Clock::Thread.time(|| {
            for _ in 0..passes {
                black_box(sum(black_box(&values)));
            }
        });
        (passes * bytes) as f64 / time
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

/// Multiplications and additions a second on one core, with vectors of two, four and eight numbers, as far as
/// the processor has them.
fn arithmetic_rates() -> Vec<f64> {
    // SAFETY: every x86-64 processor has SSE2.
    let mut rates = vec![arithmetic_rate(2, || unsafe { chains_sse2() })];
    if is_x86_feature_detected!("avx2") {
        // SAFETY: it was just found.
        rates.push(arithmetic_rate(4, || unsafe { chains_avx2() }));
    }
    if is_x86_feature_detected!("avx512f") {
        // SAFETY: it was just found.
        rates.push(arithmetic_rate(8, || unsafe { chains_avx512() }));
    }
    rates
}

fn arithmetic_rate(lanes: usize, work: fn() -> f64) -> f64 {
    let time = || {
        Clock::Thread.time(|| {
            black_box(work());
        })
    };
    let best = (0..TRIES).map(|_| time()).fold(f64::INFINITY, f64::min);
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
