//! The rows as the kernels read them.
//!
//! Rows stand in blocks of [`BLOCK`] = 8 x 8: eight chunks of eight lanes. A lane is a row's place in
//! a vector register: eight doubles fill four registers of SSE2, two of AVX2, one of AVX-512, and a
//! loop over eight lanes becomes the same additions and multiplications on each. Within a chunk the
//! columns follow one another, so a chunk is read from front to back, once, in whole cache lines.
//!
//! Under the negative binomial the rows are sorted so that as many blocks as possible are *deep*: in
//! a deep block the eight rows of a lane (one in each chunk) have the same count and weight, and then
//! their eight logarithms are one (see `kernel`).

use super::patterns::{Split, split};
use crate::design::LikelihoodRows;
use std::ops::Range;

pub(crate) use crate::numeric::LANES;

/// Chunks of a block: the rows of one lane.
pub const DEPTH: usize = 8;
/// Rows in a block.
pub const BLOCK: usize = LANES * DEPTH;

/// One value for each lane, in one cache line.
#[derive(Debug, Clone, Copy, PartialEq)]
#[repr(C, align(64))]
pub struct Eight(pub [f64; LANES]);

impl Eight {
    /// Zero in every lane.
    pub const ZERO: Eight = Eight([0.0; LANES]);
}

/// Which rows may stand next to one another.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Order {
    /// As they come: the Poisson does not ask for more.
    AsGiven,
    /// Rows of equal count and weight together, for deep blocks.
    ByCount,
}

/// The rows in blocks.
#[derive(Debug, Clone)]
pub struct Blocks {
    /// Number of blocks.
    pub blocks: usize,
    /// For each deep block (they come first), whether its lanes have the counts and weights of those of
    /// the block before.
    pub continues: Vec<bool>,
    /// Where the terms' columns are.
    pub split: Split,
    /// For each chunk, the columns that stay.
    dense: Vec<Eight>,
    /// For each chunk, the patterns of each index column.
    patterns: Vec<[u8; LANES]>,
    log_exposure: Vec<[Eight; DEPTH]>,
    counts: Vec<[Eight; DEPTH]>,
    weights: Vec<[Eight; DEPTH]>,
    /// Largest absolute log exposure.
    pub largest_offset: f64,
    /// Largest absolute value of each column that stays.
    pub largest: Vec<f64>,
}

/// What the kernels read of one block.
#[derive(Clone, Copy)]
pub struct Block<'a> {
    /// Columns that stay; `dense` holds one value of each, chunk after chunk.
    pub columns: usize,
    dense: &'a [Eight],
    index: usize,
    patterns: &'a [[u8; LANES]],
    /// Log exposures.
    pub log_exposure: &'a [Eight; DEPTH],
    /// Incidents: the sum over all rows that a row stands for.
    pub counts: &'a [Eight; DEPTH],
    /// How many rows each row stands for.
    pub weights: &'a [Eight; DEPTH],
}

impl<'a> Block<'a> {
    /// The columns that stay, in the chunk at `depth`.
    #[inline(always)]
    pub fn dense(&self, depth: usize) -> &'a [Eight] {
        &self.dense[depth * self.columns..(depth + 1) * self.columns]
    }

    /// The patterns of the index columns, in the chunk at `depth`.
    #[inline(always)]
    pub fn patterns(&self, depth: usize) -> &'a [[u8; LANES]] {
        &self.patterns[depth * self.index..(depth + 1) * self.index]
    }
}

impl Blocks {
    /// Lays out rows.
    pub fn new(likelihood_rows: &LikelihoodRows, order: Order) -> Self {
        let LikelihoodRows {
            columns,
            log_exposure,
            counts,
            weights,
        } = likelihood_rows;
        let rows = counts.len();
        let blocks = rows.div_ceil(BLOCK);
        let (split, patterns_of_rows) = split(columns);
        let (order, deep) = match order {
            Order::AsGiven => ((0..rows).collect(), 0),
            Order::ByCount => deep_first(counts, weights),
        };
        // What fills up the last block is the last row again, without count and weight: its linear
        // predictor is then one of a real row, and 0 times its mean is 0.
        let rows_in_blocks = || (0..blocks * BLOCK).map(|place| (place, order[place.min(rows - 1)]));
        let laid = |values: &[f64]| {
            let mut out = vec![[Eight::ZERO; DEPTH]; blocks];
            for (place, row) in rows_in_blocks() {
                out[place / BLOCK][place % BLOCK / LANES].0[place % LANES] = values[row];
            }
            out
        };
        let laid_once = |values: &[f64]| {
            let mut out = laid(values);
            for place in rows..blocks * BLOCK {
                out[place / BLOCK][place % BLOCK / LANES].0[place % LANES] = 0.0;
            }
            out
        };
        let mut dense = vec![Eight::ZERO; blocks * DEPTH * split.dense.len()];
        for (column, term) in split.dense.iter().enumerate() {
            for (place, row) in rows_in_blocks() {
                dense[place / LANES * split.dense.len() + column].0[place % LANES] = columns[*term][row];
            }
        }
        let mut patterns = vec![[0; LANES]; blocks * DEPTH * split.index.len()];
        for (column, of_row) in patterns_of_rows.iter().enumerate() {
            for (place, row) in rows_in_blocks() {
                patterns[place / LANES * split.index.len() + column][place % LANES] = of_row[row];
            }
        }
        let (counts, weights) = (laid_once(counts), laid_once(weights));
        let key = |block: usize| (counts[block][0], weights[block][0]);
        let largest = |values: &[f64]| values.iter().fold(0.0_f64, |most, value| most.max(value.abs()));
        Blocks {
            blocks,
            dense,
            patterns,
            log_exposure: laid(log_exposure),
            continues: (0..deep)
                .map(|block| block > 0 && key(block) == key(block - 1))
                .collect(),
            counts,
            weights,
            largest_offset: largest(log_exposure),
            largest: split.dense.iter().map(|term| largest(&columns[*term])).collect(),
            split,
        }
    }

    /// How many of the blocks, the first ones, are deep.
    #[inline(always)]
    pub fn deep(&self) -> usize {
        self.continues.len()
    }

    /// The columns that stay in a range of blocks: one value of each, chunk after chunk.
    #[inline(always)]
    pub fn dense(&self, range: Range<usize>) -> &[Eight] {
        let size = DEPTH * self.split.dense.len();
        &self.dense[range.start * size..range.end * size]
    }

    /// One of `shares` shares of the columns of a block; nothing beyond the last.
    #[inline(always)]
    pub fn share(&self, block: usize, share: usize, shares: usize) -> &[Eight] {
        let size = DEPTH * self.split.dense.len();
        let (from, to) = (size * share / shares, size * (share + 1) / shares);
        self.dense.get(block * size + from..block * size + to).unwrap_or(&[])
    }

    /// One of the blocks.
    #[inline(always)]
    pub fn block(&self, block: usize) -> Block<'_> {
        let (columns, index) = (self.split.dense.len(), self.split.index.len());
        Block {
            columns,
            dense: &self.dense[block * DEPTH * columns..(block + 1) * DEPTH * columns],
            index,
            patterns: &self.patterns[block * DEPTH * index..(block + 1) * DEPTH * index],
            log_exposure: &self.log_exposure[block],
            counts: &self.counts[block],
            weights: &self.weights[block],
        }
    }
}

/// An order of the rows that begins with deep blocks, and how many these are.
fn deep_first(counts: &[f64], weights: &[f64]) -> (Vec<usize>, usize) {
    let mut sorted: Vec<usize> = (0..counts.len()).collect();
    // Neither is negative, so their bits are in the order of their values.
    let key = |row: usize| (weights[row].to_bits(), counts[row].to_bits());
    sorted.sort_unstable_by_key(|row| (key(*row), *row));
    let mut lanes: Vec<&[usize]> = Vec::new();
    let mut rest: Vec<usize> = Vec::new();
    for alike in sorted.chunk_by(|a, b| key(*a) == key(*b)) {
        let (whole, left) = alike.as_chunks::<DEPTH>();
        lanes.extend(whole.iter().map(|lane| lane.as_slice()));
        rest.extend(left);
    }
    let deep = lanes.len() / LANES;
    let (filled, over) = lanes.split_at(deep * LANES);
    let mut order = Vec::with_capacity(counts.len());
    for block in filled.chunks_exact(LANES) {
        for depth in 0..DEPTH {
            order.extend(block.iter().map(|lane| lane[depth]));
        }
    }
    order.extend(over.iter().copied().flatten());
    order.append(&mut rest);
    (order, deep)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_deep_block_holds_lanes_of_equal_counts_and_every_row_is_there_once() {
        let rows = 1_000;
        let counts: Vec<f64> = (0..rows).map(|row| f64::from(row * row % 7)).collect();
        let weights: Vec<f64> = (0..rows).map(|row| f64::from(1 + row % 2)).collect();
        let numbers: Vec<f64> = (0..rows).map(f64::from).collect();
        let likelihood_rows = LikelihoodRows {
            columns: vec![numbers.clone()].into(),
            log_exposure: numbers.clone().into(),
            counts: counts.clone(),
            weights: weights.clone().into(),
        };
        let blocks = Blocks::new(&likelihood_rows, Order::ByCount);
        assert!(
            blocks.deep() >= 13 && blocks.deep() < blocks.blocks,
            "{}",
            blocks.deep()
        );
        for block in (0..blocks.deep()).map(|block| blocks.block(block)) {
            assert!(block.counts.iter().all(|chunk| *chunk == block.counts[0]));
            assert!(block.weights.iter().all(|chunk| *chunk == block.weights[0]));
        }
        let mut seen = vec![0; rows as usize];
        for block in (0..blocks.blocks).map(|block| blocks.block(block)) {
            for depth in 0..DEPTH {
                assert_eq!(block.dense(depth)[0], block.log_exposure[depth]);
                for lane in 0..LANES {
                    let (count, weight) = (block.counts[depth].0[lane], block.weights[depth].0[lane]);
                    if weight > 0.0 {
                        let row = block.dense(depth)[0].0[lane] as usize;
                        assert_eq!((count, weight), (counts[row], weights[row]));
                        seen[row] += 1;
                    }
                }
            }
        }
        assert!(seen.iter().all(|times| *times == 1));
    }
}
