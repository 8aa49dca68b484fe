//! The choice of vector instructions, at run time.

use crate::model::blocks::Eight;
use std::fmt;

/// Which vector instructions the kernels use. All of them give the same bits: they add, multiply and
/// divide the same numbers in the same order, only more of them at a time, and none fuses a
/// multiplication with an addition. A value of this type exists only for what the processor has.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Instructions(pub(super) Set);

/// The sets.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Set {
    /// What every processor of the kind has: two doubles at a time (SSE2) on x86-64.
    Baseline,
    /// Four doubles at a time.
    Avx2,
    /// Eight doubles at a time.
    Avx512,
}

impl Instructions {
    /// Those that this machine has, narrow ones first: never none.
    pub fn available() -> Vec<Instructions> {
        let sets = [Set::Baseline, Set::Avx2, Set::Avx512];
        sets.into_iter().filter(|set| set.is_here()).map(Instructions).collect()
    }

    /// The widest that this machine has.
    pub fn widest() -> Instructions {
        Self::available().pop().unwrap_or(Instructions(Set::Baseline))
    }
}

impl fmt::Display for Instructions {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self.0 {
            Set::Baseline => "baseline",
            Set::Avx2 => "AVX2",
            Set::Avx512 => "AVX-512",
        })
    }
}

impl Set {
    #[cfg(target_arch = "x86_64")]
    fn is_here(self) -> bool {
        match self {
            Set::Baseline => true,
            Set::Avx2 => is_x86_feature_detected!("avx2"),
            // The kernels move whole numbers too, and in halves of a register: hence DQ, BW and VL.
            Set::Avx512 => {
                is_x86_feature_detected!("avx512f")
                    && is_x86_feature_detected!("avx512dq")
                    && is_x86_feature_detected!("avx512bw")
                    && is_x86_feature_detected!("avx512vl")
            }
        }
    }

    #[cfg(not(target_arch = "x86_64"))]
    fn is_here(self) -> bool {
        self == Set::Baseline
    }
}

/// Asks for values that will be read soon to be brought into the second-level cache, while the
/// processor works on others. A block of rows is read in one burst and then worked on at length: from
/// 100,000 rows on, when they no longer fit in the caches, each burst would wait for memory.
#[inline(always)]
pub(super) fn fetch_ahead(values: &[Eight]) {
    #[cfg(target_arch = "x86_64")]
    for value in values {
        use std::arch::x86_64::{_MM_HINT_T1, _mm_prefetch};
        // SAFETY: a hint; it reads and writes nothing that the program could see.
        unsafe { _mm_prefetch::<_MM_HINT_T1>(std::ptr::from_ref(value).cast()) };
    }
    #[cfg(not(target_arch = "x86_64"))]
    let _ = values;
}

/// Compiles a kernel once for each set of instructions and writes the function that chooses.
///
/// `fn name(arguments) = kernel;` makes `name(instructions, arguments)`, which calls
/// `kernel::<TILE>(arguments)`: `kernel` is generic over the number of points that share a load of a
/// column, and must be `#[inline(always)]` with all that it calls, since only inlined code takes over
/// the instructions of its caller. TILE is such that eight registers hold the sums of a tile.
macro_rules! for_each_set {
    ($(#[$doc:meta])* fn $name:ident($($argument:ident: $type:ty),* $(,)?) = $kernel:ident;) => {
        $(#[$doc])*
        pub fn $name(instructions: $crate::model::kernel::instructions::Instructions, $($argument: $type),*) {
            use $crate::model::kernel::instructions::Set;

            #[cfg(target_arch = "x86_64")]
            #[target_feature(enable = "avx2")]
            fn avx2($($argument: $type),*) {
                $kernel::<4>($($argument),*)
            }

            #[cfg(target_arch = "x86_64")]
            #[target_feature(enable = "avx512f,avx512dq,avx512bw,avx512vl")]
            fn avx512($($argument: $type),*) {
                $kernel::<8>($($argument),*)
            }

            match instructions.0 {
                // SAFETY: an `Instructions` is only made of a set that the processor was asked for.
                #[cfg(target_arch = "x86_64")]
                Set::Avx2 => unsafe { avx2($($argument),*) },
                // SAFETY: as above.
                #[cfg(target_arch = "x86_64")]
                Set::Avx512 => unsafe { avx512($($argument),*) },
                _ => $kernel::<2>($($argument),*),
            }
        }
    };
}
pub(super) use for_each_set;
