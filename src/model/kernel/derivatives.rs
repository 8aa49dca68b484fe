//! First and second derivatives of the rows' log likelihood at one point.
//!
//! Poisson (`dispersion` absent): of `Y log mu - W mu`; negative binomial with a = c^2 =
//! `dispersion`: of `Y log mu - (Y + W/a) log(1 + a mu)`, where Y is the count and W the weight of a
//! row. At a = 0 the latter is its limit, the Poisson, but the derivatives by a are there.
//!
//! With m = mu, x = a m and D = 1 + x (Cameron & Trivedi 2013, section 3.3, for the first
//! derivatives):
//!
//! | by | value |
//! | --- | --- |
//! | the linear predictor | (Y - W m)/D |
//! | twice | -m (W + a Y)/D^2 |
//! | a | W m^2 h(x) - Y m/D, with h(x) = (log(1+x) - x/(1+x))/x^2 |
//! | a twice | W m^3 h'(x) + Y m^2/D^2 |
//! | both | -(Y - W m) m/D^2 |
//!
//! The sums over rows of these, times columns, are taken in lanes, over [`SHARES`] shares of the rows
//! whose sums are added in their order: threads may take shares in any order and change no bit.

use super::LOCKSTEP;
use super::instructions::{Instructions, fetch_ahead, for_each_set};
use super::predictor::{BlockValues, Part, Points, predict};
use super::sums::{RowSums, Sums, pair};
use crate::model::blocks::{BLOCK, Block, Blocks, DEPTH, Eight, LANES};
use crate::numeric::{exp_within, ln_1p};
use crate::threads::in_order;
use std::ops::Range;

/// Shares whose sums are taken apart, at most, and blocks of a share, at least. Part of every result: never
/// change them. Few shares, because with many index columns the sums of one take megabytes.
const SHARES: usize = 16;
const BLOCKS_OF_A_SHARE: usize = 64;
/// A thread is started for each so many products: of pairs of columns, and what a row takes besides. That
/// is a millisecond or two of work, some ten times as long as the start takes. With 10,000 rows of 20
/// columns a second thread made the mode take twice as long.
const PRODUCTS_OF_A_THREAD: usize = 10_000_000;
/// What a row takes besides the pairs: its predictor, exponential and derivatives.
const PRODUCTS_OF_A_ROW: usize = 60;
/// Blocks whose second derivatives are summed together: two, so that each sum is fetched and stored
/// half as often. (And with eight chunks at most, the compiler would write the innermost loop out
/// eight times, run out of registers and be half as fast.)
const STRIP: usize = 2;

/// The derivatives at the one point of `point`, summed over all rows, on at most `threads` threads. The
/// value leaves out `Y log mu`, which the model knows in closed form.
pub fn derivatives(
    instructions: Instructions,
    blocks: &Blocks,
    point: &Points,
    dispersion: Option<f64>,
    threads: usize,
) -> RowSums {
    let size = blocks.blocks.div_ceil(SHARES).max(BLOCKS_OF_A_SHARE);
    let shares = blocks.blocks.div_ceil(size);
    let of_share = |share: usize| -> Sums<f64> {
        let mut sums = Sums::zero(&blocks.split);
        let range = share * size..((share + 1) * size).min(blocks.blocks);
        add_rows(instructions, blocks, range, &point.part(0, 1), dispersion, &mut sums);
        sums.added_up()
    };
    let columns = blocks.split.dense.len() + 1;
    let worth = blocks.blocks * BLOCK * (columns * columns + PRODUCTS_OF_A_ROW) / PRODUCTS_OF_A_THREAD;
    let parts = in_order(shares, threads.min(worth), of_share);
    let mut total = Sums::zero(&blocks.split).added_up();
    for part in &parts {
        total.add(part);
    }
    total.by_coefficient(&blocks.split)
}

for_each_set! {
    /// Adds the rows of a range of blocks.
    fn add_rows(
        blocks: &Blocks,
        range: Range<usize>,
        point: &Part,
        dispersion: Option<f64>,
        sums: &mut Sums<Eight>,
    ) = add_rows_kernel;
}

#[inline(always)]
fn add_rows_kernel<const TILE: usize>(
    blocks: &Blocks,
    range: Range<usize>,
    point: &Part,
    dispersion: Option<f64>,
    sums: &mut Sums<Eight>,
) {
    let mut values: BlockValues = [[0.0; BLOCK]; LOCKSTEP];
    let mut rows = RowDerivatives::zero();
    let mut second = [Eight::ZERO; STRIP * DEPTH];
    for first in range.clone().step_by(STRIP) {
        let strip = first..(first + STRIP).min(range.end);
        for number in strip.clone() {
            let block = blocks.block(number);
            predict::<TILE>(&block, point, &mut values);
            fetch_ahead(blocks.share(number + 1, 0, 1));
            let means = &mut values[0];
            for value in means.iter_mut() {
                *value = exp_within(*value);
            }
            match dispersion {
                None => poisson_rows(&block, means, &mut rows),
                Some(a) => {
                    negative_binomial_rows(&block, means, a, &mut rows);
                    add_lanes(&mut sums.by_a, &rows.by_a);
                    add_lanes(&mut sums.by_a_twice, &rows.by_a_twice);
                    add_lanes(&mut sums.mixed[0], &rows.mixed);
                    for (column, sum) in sums.mixed[1..].iter_mut().enumerate() {
                        add_column(&block, column, &rows.mixed, sum);
                    }
                }
            }
            add_lanes(&mut sums.value, &rows.value);
            add_lanes(&mut sums.first[0], &rows.first);
            for (column, sum) in sums.first[1..].iter_mut().enumerate() {
                add_column(&block, column, &rows.first, sum);
            }
            if !sums.index.is_empty() {
                add_by_pattern(&block, &rows, sums);
            }
            add_lanes(&mut sums.second[0], &rows.second);
            for depth in 0..DEPTH {
                let lanes = &rows.second[depth * LANES..(depth + 1) * LANES];
                second[(number - strip.start) * DEPTH + depth].0.copy_from_slice(lanes);
            }
        }
        let columns = blocks.split.dense.len();
        add_second(
            blocks.dense(strip.clone()),
            columns,
            &second[..strip.len() * DEPTH],
            &mut sums.second,
        );
    }
}

/// What each row of a block brings.
struct RowDerivatives {
    /// The value, without `Y log mu`.
    value: Values,
    /// By the linear predictor.
    first: Values,
    /// By it twice.
    second: Values,
    /// By it and a.
    mixed: Values,
    /// By a.
    by_a: Values,
    /// By a twice.
    by_a_twice: Values,
}

/// A value for each row of a block.
type Values = [f64; BLOCK];

impl RowDerivatives {
    fn zero() -> Self {
        RowDerivatives {
            value: [0.0; BLOCK],
            first: [0.0; BLOCK],
            second: [0.0; BLOCK],
            mixed: [0.0; BLOCK],
            by_a: [0.0; BLOCK],
            by_a_twice: [0.0; BLOCK],
        }
    }
}

/// The lanes of all chunks in one array, which the compiler turns into vector code in any loop.
#[inline(always)]
fn flat(chunks: &[Eight; DEPTH]) -> Values {
    let mut out = [0.0; BLOCK];
    for depth in 0..DEPTH {
        out[depth * LANES..(depth + 1) * LANES].copy_from_slice(&chunks[depth].0);
    }
    out
}

#[inline(always)]
fn poisson_rows(block: &Block, means: &Values, rows: &mut RowDerivatives) {
    let (counts, weights) = (flat(block.counts), flat(block.weights));
    for row in 0..BLOCK {
        let expected = weights[row] * means[row];
        rows.first[row] = counts[row] - expected;
        rows.second[row] = -expected;
        rows.value[row] = -expected;
    }
}

#[inline(always)]
fn negative_binomial_rows(block: &Block, means: &Values, a: f64, rows: &mut RowDerivatives) {
    let (counts, weights) = (flat(block.counts), flat(block.weights));
    // At a = 0 the value's limit is taken; 1/a would be infinite.
    let size = if a > 0.0 { 1.0 / a } else { 0.0 };
    let mut logs = *means;
    for log in &mut logs {
        *log = ln_1p(a * *log);
    }
    for row in 0..BLOCK {
        let (y, w, m) = (counts[row], weights[row], means[row]);
        let x = a * m;
        let d = 1.0 / (1.0 + x);
        let residual = (y - w * m) * d;
        let md = m * d;
        let (first, second) = log_remainder(m, size, x, x * d, logs[row]);
        rows.first[row] = residual;
        rows.second[row] = -md * (w + a * y) * d;
        rows.mixed[row] = -residual * md;
        rows.by_a[row] = w * first - y * md;
        rows.by_a_twice[row] = w * second + y * md * md;
    }
    if a > 0.0 {
        for row in 0..BLOCK {
            rows.value[row] = -(counts[row] + weights[row] * size) * logs[row];
        }
    } else {
        for row in 0..BLOCK {
            rows.value[row] = -weights[row] * means[row];
        }
    }
}

/// m^2 h(x) and m^3 h'(x), where h(x) = (log(1+x) - x/(1+x)) / x^2 and x = a m >= 0, from 1/a = `size`,
/// x/(1+x) = `share` and `log` = log(1+x).
///
/// With m = x/a they are (log - share)/a^2 and (share^2 - 2 (log - share))/a^3, in which nothing overflows
/// where m^3 would. Below x = 0.03 these differences lose all digits, so the series
/// h = sum (-1)^k (k+1)/(k+2) x^k is summed there; its first term left out is below 1e-17. Both are
/// computed and one is taken: a branch would end the vector code.
#[inline(always)]
fn log_remainder(m: f64, size: f64, x: f64, share: f64, log: f64) -> (f64, f64) {
    let (mut series, mut series_slope) = (0.0, 0.0);
    for k in (0..12).rev() {
        let k = f64::from(k);
        // Horner in -x: h(x) = c0 - c1 x + c2 x^2 ..., and its derivative alongside.
        series_slope = series - x * series_slope;
        series = (k + 1.0) / (k + 2.0) - x * series;
    }
    let difference = log - share;
    let first = difference * size * size;
    let second = (share * share - 2.0 * difference) * size * size * size;
    if x < 0.03 {
        (m * m * series, -(m * m * m) * series_slope)
    } else {
        (first, second)
    }
}

#[inline(always)]
fn add_lanes(sum: &mut Eight, values: &Values) {
    for depth in 0..DEPTH {
        for lane in 0..LANES {
            sum.0[lane] += values[depth * LANES + lane];
        }
    }
}

#[inline(always)]
fn add_eight(sum: &mut Eight, values: &Eight) {
    for lane in 0..LANES {
        sum.0[lane] += values.0[lane];
    }
}

/// Adds a column times the rows' values to the lanes of their sum.
#[inline(always)]
fn add_column(block: &Block, column: usize, values: &Values, sum: &mut Eight) {
    let mut lanes = sum.0;
    for depth in 0..DEPTH {
        let x = &block.dense(depth)[column].0;
        for lane in 0..LANES {
            lanes[lane] += x[lane] * values[depth * LANES + lane];
        }
    }
    sum.0 = lanes;
}

/// Adds X' diag(values) X, over the rows of a strip, to the sums of pairs: `dense` holds the chunks of
/// `columns` columns, `values` one value for each row.
#[inline(always)]
fn add_second(dense: &[Eight], columns: usize, values: &[Eight], sums: &mut [Eight]) {
    let mut i = 0;
    while i + 2 <= columns {
        add_pairs_of::<2>(dense, columns, i, values, sums);
        i += 2;
    }
    if i < columns {
        add_pairs_of::<1>(dense, columns, i, values, sums);
    }
}

/// The pairs of `TALL` columns from `i` on with the intercept and all columns up to them.
#[inline(always)]
fn add_pairs_of<const TALL: usize>(dense: &[Eight], columns: usize, i: usize, values: &[Eight], sums: &mut [Eight]) {
    let mut scaled = [[Eight::ZERO; TALL]; STRIP * DEPTH];
    let mut own = [Eight::ZERO; TALL];
    for ((chunk, value), scaled) in dense.chunks_exact(columns).zip(values).zip(&mut scaled) {
        let chunk = &chunk[i..i + TALL];
        for t in 0..TALL {
            for lane in 0..LANES {
                scaled[t].0[lane] = chunk[t].0[lane] * value.0[lane];
                own[t].0[lane] += scaled[t].0[lane];
            }
        }
    }
    for t in 0..TALL {
        add_eight(&mut sums[pair(i + t + 1, 0)], &own[t]);
    }
    // Tiles of TALL x 2 pairs: each load serves two sums, and the sums stay in registers. The tile
    // on the diagonal holds one pair twice, the wrong way round; it is left out when sums are stored.
    let scaled = &scaled[..values.len()];
    let mut k = 0;
    while k + 2 <= i + TALL {
        add_tile::<TALL, 2>(dense, columns, i, k, scaled, sums);
        k += 2;
    }
    if k < i + TALL {
        add_tile::<TALL, 1>(dense, columns, i, k, scaled, sums);
    }
}

#[inline(always)]
fn add_tile<const TALL: usize, const WIDE: usize>(
    dense: &[Eight],
    columns: usize,
    i: usize,
    k: usize,
    scaled: &[[Eight; TALL]],
    sums: &mut [Eight],
) {
    let mut tile = [[Eight::ZERO; WIDE]; TALL];
    for (chunk, scaled) in dense.chunks_exact(columns).zip(scaled) {
        let chunk = &chunk[k..k + WIDE];
        for t in 0..TALL {
            for w in 0..WIDE {
                for lane in 0..LANES {
                    tile[t][w].0[lane] += scaled[t].0[lane] * chunk[w].0[lane];
                }
            }
        }
    }
    for t in 0..TALL {
        for w in 0..WIDE {
            if k + w <= i + t {
                add_eight(&mut sums[pair(i + t + 1, k + w + 1)], &tile[t][w]);
            }
        }
    }
}

/// Adds the rows to the sums of their patterns: one addition a row where dense columns of zeros and
/// ones would take a product each.
#[inline(always)]
fn add_by_pattern(block: &Block, rows: &RowDerivatives, sums: &mut Sums<Eight>) {
    for (g, index) in sums.index.iter_mut().enumerate() {
        for depth in 0..DEPTH {
            let dense = block.dense(depth);
            for (lane, pattern) in block.patterns(depth)[g].iter().enumerate() {
                let (row, pattern) = (depth * LANES + lane, usize::from(*pattern));
                index.first[pattern] += rows.first[row];
                index.mixed[pattern] += rows.mixed[row];
                index.second[pattern] += rows.second[row];
                let cross = &mut index.cross[pattern * block.columns..(pattern + 1) * block.columns];
                for (sum, column) in cross.iter_mut().zip(dense) {
                    *sum += rows.second[row] * column.0[lane];
                }
            }
        }
    }
    for g in 1..sums.index.len() {
        for h in 0..g {
            let width = sums.index[h].first.len();
            let table = &mut sums.pairs[pair(g, h) - g];
            for depth in 0..DEPTH {
                let patterns = block.patterns(depth);
                for lane in 0..LANES {
                    let (p, q) = (usize::from(patterns[g][lane]), usize::from(patterns[h][lane]));
                    table[p * width + q] += rows.second[depth * LANES + lane];
                }
            }
        }
    }
}
