//! The loops over rows: they take almost all of a fit's time, and every bit of a result passes them.
//!
//! Three things make them fast, and none of them costs exactness.
//!
//! 1. **Lanes.** Eight rows side by side, each sum in eight partial sums that are added up at the end
//!    in one fixed order. A vector register of any width does the same additions on the same
//!    numbers; no multiplication is fused with an addition, which would round once instead of twice.
//!    So the same source, compiled for SSE2, AVX2 and AVX-512, gives the same bits ([`Instructions`]),
//!    and there is no hand-written vector code: plain loops over eight lanes that the compiler
//!    turns into it.
//! 2. **Lockstep.** Several points of the parameter space on one block of rows ([`LOCKSTEP`]): the rows
//!    are read from memory once, and a register that holds eight values of a column serves several
//!    points (`predictor`). Each point's sum is computed as if it were alone.
//! 3. **Fewer operations, exactly.** Rows of equal count share one logarithm (`values`); columns of
//!    few values share one table entry (`patterns`); the terms in the counts alone are a short table
//!    (`count_table`). Each is the same sum, reordered.
//!
//! `exp` and `log(1 + x)` are our own, branchless and accurate to 5e-16 (`numeric::elementary`), so
//! that they too become vector code with the same bits everywhere.

mod derivatives;
mod instructions;
mod predictor;
mod sums;
mod values;

pub use derivatives::derivatives;
pub use instructions::Instructions;
pub use predictor::Points;
pub use values::{furthest, sum_of_count_logs, sums_of_logs, sums_of_means};

/// Points evaluated on a block while it is in the first-level cache. Their linear predictors take
/// 4 KB beside the block's columns; more points would gain nothing, since arithmetic is the limit
/// from about four on.
pub const LOCKSTEP: usize = 8;
