//! The linear predictor of the rows of a block, for several points of the parameter space.

use super::LOCKSTEP;
use crate::model::blocks::{BLOCK, Block, Blocks, DEPTH, LANES};
use crate::model::patterns::MOST_PATTERNS;

/// Points of the parameter space, ready for the kernels.
#[derive(Debug, Clone)]
pub struct Points {
    /// For each point, the intercept and the coefficients of the columns that stay.
    coefficients: Vec<f64>,
    /// Columns that stay.
    dense: usize,
    /// For each point, a table for each index column: for each pattern, the sum of its products.
    tables: Vec<[f64; MOST_PATTERNS]>,
    index: usize,
    /// For each point, a bound on the absolute linear predictor of any row.
    bounds: Vec<f64>,
}

impl Points {
    /// Takes `points`, each `stride` values apart and beginning with the intercept and the
    /// coefficients of all terms in their order.
    pub fn new(blocks: &Blocks, points: &[f64], stride: usize) -> Self {
        let mut out = Points {
            coefficients: Vec::with_capacity(points.len()),
            dense: blocks.split.dense.len(),
            tables: Vec::new(),
            index: blocks.split.index.len(),
            bounds: Vec::new(),
        };
        for point in points.chunks_exact(stride) {
            let slopes = &point[1..];
            let mut bound = blocks.largest_offset + point[0].abs();
            out.coefficients.push(point[0]);
            for (term, largest) in blocks.split.dense.iter().zip(&blocks.largest) {
                out.coefficients.push(slopes[*term]);
                bound += slopes[*term].abs() * largest;
            }
            for index in &blocks.split.index {
                let mut table = [0.0; MOST_PATTERNS];
                let mut most = 0.0_f64;
                for (pattern, entry) in table[..index.patterns()].iter_mut().enumerate() {
                    for (term, value) in index.pattern(pattern) {
                        *entry += slopes[*term] * value;
                    }
                    most = most.max(entry.abs());
                }
                bound += most;
                out.tables.push(table);
            }
            out.bounds.push(bound);
        }
        out
    }

    /// No row's linear predictor is further from 0 at this point, and often all are much nearer.
    pub fn bound(&self, point: usize) -> f64 {
        self.bounds[point]
    }

    /// The points from `first` on, `count` of them.
    pub fn part(&self, first: usize, count: usize) -> Part<'_> {
        let width = self.dense + 1;
        Part {
            count,
            dense: self.dense,
            coefficients: &self.coefficients[first * width..(first + count) * width],
            index: self.index,
            tables: &self.tables[first * self.index..(first + count) * self.index],
        }
    }
}

/// At most [`LOCKSTEP`] points.
#[derive(Clone, Copy)]
pub struct Part<'a> {
    /// How many.
    pub count: usize,
    dense: usize,
    coefficients: &'a [f64],
    index: usize,
    tables: &'a [[f64; MOST_PATTERNS]],
}

/// A value for each row of a block, for each point.
pub type BlockValues = [[f64; BLOCK]; LOCKSTEP];

/// The linear predictors of one block at all points: log exposure + intercept + table entries +
/// columns times coefficients, added in this order for every row and point, whatever the tile.
#[inline(always)]
pub fn predict<const TILE: usize>(block: &Block, points: &Part, out: &mut BlockValues) {
    let mut first = 0;
    // A tile is as many points as registers allow; what is left over goes in halves of it. The
    // comparisons with TILE are known to the compiler, so a narrow set has no code for wide tiles.
    while TILE >= 8 && points.count - first >= 8 {
        predict_tile::<8>(block, points, first, out);
        first += 8;
    }
    while TILE >= 4 && points.count - first >= 4 {
        predict_tile::<4>(block, points, first, out);
        first += 4;
    }
    while points.count - first >= 2 {
        predict_tile::<2>(block, points, first, out);
        first += 2;
    }
    if first < points.count {
        predict_tile::<1>(block, points, first, out);
    }
}

/// The same for `TILE` points from `first` on: a load of a column serves all of them, and the sums of
/// the tile stay in registers. With one point at a time the loads would be the limit.
#[inline(always)]
fn predict_tile<const TILE: usize>(block: &Block, points: &Part, first: usize, out: &mut BlockValues) {
    let width = points.dense + 1;
    let mut slopes: [&[f64]; TILE] = [&[]; TILE];
    let mut intercepts = [0.0; TILE];
    for p in 0..TILE {
        let point = &points.coefficients[(first + p) * width..(first + p + 1) * width];
        intercepts[p] = point[0];
        // As long as the loop below, so that the compiler sees that no index goes beyond it.
        slopes[p] = &point[1..block.columns + 1];
    }
    for depth in 0..DEPTH {
        let mut sums = [[0.0; LANES]; TILE];
        for p in 0..TILE {
            for lane in 0..LANES {
                sums[p][lane] = block.log_exposure[depth].0[lane] + intercepts[p];
            }
        }
        for (index, patterns) in block.patterns(depth).iter().enumerate() {
            for p in 0..TILE {
                let table = &points.tables[(first + p) * points.index + index];
                for lane in 0..LANES {
                    sums[p][lane] += table[usize::from(patterns[lane])];
                }
            }
        }
        let dense = &block.dense(depth)[..block.columns];
        // Two columns to a sum: the chain of additions is half as long.
        let mut term = 0;
        while term + 2 <= block.columns {
            for p in 0..TILE {
                let (first, second) = (slopes[p][term], slopes[p][term + 1]);
                for lane in 0..LANES {
                    sums[p][lane] += dense[term].0[lane] * first + dense[term + 1].0[lane] * second;
                }
            }
            term += 2;
        }
        if term < block.columns {
            for p in 0..TILE {
                for lane in 0..LANES {
                    sums[p][lane] += dense[term].0[lane] * slopes[p][term];
                }
            }
        }
        for p in 0..TILE {
            out[first + p][depth * LANES..(depth + 1) * LANES].copy_from_slice(&sums[p]);
        }
    }
}
