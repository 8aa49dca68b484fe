//! The sums that a log density needs at each point.

use super::LOCKSTEP;
use super::instructions::{Instructions, for_each_set};
use super::predictor::{BlockValues, Part, Points, predict};
use crate::model::blocks::{BLOCK, Block, Blocks, DEPTH, LANES};
use crate::numeric::{exp_within, ln, ln_1p};

/// The logarithm of a product of [`DEPTH`] factors 1 + a mu is taken at once where the linear
/// predictor plus log a is at most this: the product is then below exp(8 * 85) = exp(680), and a
/// double ends at exp(709).
const PRODUCT_LIMIT: f64 = 85.0;

/// For each point, the sum over rows of `weight * mu`.
pub fn sums_of_means(instructions: Instructions, blocks: &Blocks, points: &Points, out: &mut [f64]) {
    for (batch, out) in out.chunks_mut(LOCKSTEP).enumerate() {
        let part = points.part(batch * LOCKSTEP, out.len());
        means(instructions, blocks, &part, out);
    }
}

/// For each point, the sum over rows of `(count + weight/a) * log(1 + a mu)`, with a = c^2 of that
/// point in `dispersions`, each above 0.
pub fn sums_of_logs(
    instructions: Instructions,
    blocks: &Blocks,
    points: &Points,
    dispersions: &[f64],
    out: &mut [f64],
) {
    for (batch, out) in out.chunks_mut(LOCKSTEP).enumerate() {
        let first = batch * LOCKSTEP;
        let part = points.part(first, out.len());
        let dispersions = &dispersions[first..first + out.len()];
        let mut products = [true; LOCKSTEP];
        for (place, a) in dispersions.iter().enumerate() {
            products[place] = points.bound(first + place) + ln(*a) <= PRODUCT_LIMIT;
        }
        logs(instructions, blocks, &part, dispersions, &products, out);
    }
}

/// The largest absolute linear predictor of any row at the one point of `point`.
pub fn furthest(instructions: Instructions, blocks: &Blocks, point: &Points) -> f64 {
    let mut out = 0.0;
    furthest_of(instructions, blocks, &point.part(0, 1), &mut out);
    out
}

for_each_set! {
    /// [`furthest`].
    fn furthest_of(blocks: &Blocks, point: &Part, out: &mut f64) = furthest_kernel;
}

#[inline(always)]
fn furthest_kernel<const TILE: usize>(blocks: &Blocks, point: &Part, out: &mut f64) {
    let mut values: BlockValues = [[0.0; BLOCK]; LOCKSTEP];
    for block in 0..blocks.blocks {
        predict::<TILE>(&blocks.block(block), point, &mut values);
        for value in &values[0] {
            *out = out.max(value.abs());
        }
    }
}

for_each_set! {
    /// [`sums_of_means`] for one part.
    fn means(blocks: &Blocks, points: &Part, out: &mut [f64]) = means_kernel;
}

#[inline(always)]
fn means_kernel<const TILE: usize>(blocks: &Blocks, points: &Part, out: &mut [f64]) {
    let mut values: BlockValues = [[0.0; BLOCK]; LOCKSTEP];
    let mut sums = [[0.0; LANES]; LOCKSTEP];
    for block in 0..blocks.blocks {
        let block = blocks.block(block);
        predict::<TILE>(&block, points, &mut values);
        for (values, sums) in values[..points.count].iter_mut().zip(&mut sums) {
            for value in values.iter_mut() {
                *value = exp_within(*value);
            }
            for depth in 0..DEPTH {
                for lane in 0..LANES {
                    sums[lane] += block.weights[depth].0[lane] * values[depth * LANES + lane];
                }
            }
        }
    }
    for (out, sums) in out.iter_mut().zip(&sums) {
        *out = add_up(sums);
    }
}

for_each_set! {
    /// [`sums_of_logs`] for one part. `products` says where the product of a lane's factors cannot
    /// overflow.
    fn logs(
        blocks: &Blocks,
        points: &Part,
        dispersions: &[f64],
        products: &[bool; LOCKSTEP],
        out: &mut [f64],
    ) = logs_kernel;
}

/// In a deep block the rows of a lane share count and weight, so with x = a mu of each
///
/// `sum (count + weight/a) log(1 + x) = (count + weight/a) log(product of (1 + x))`,
///
/// and one logarithm serves eight rows. The product is carried as its difference from 1, since
/// (1 + P)(1 + x) - 1 = P + x + P x has no cancellation: 1 + x would lose the digits of a small x,
/// and with them the likelihood near a scatter of 0.
#[inline(always)]
fn logs_kernel<const TILE: usize>(
    blocks: &Blocks,
    points: &Part,
    dispersions: &[f64],
    products: &[bool; LOCKSTEP],
    out: &mut [f64],
) {
    let mut values: BlockValues = [[0.0; BLOCK]; LOCKSTEP];
    let mut logs = [[0.0; LANES]; LOCKSTEP];
    let mut sums = [[0.0; LANES]; LOCKSTEP];
    for number in 0..blocks.blocks {
        let block = blocks.block(number);
        predict::<TILE>(&block, points, &mut values);
        for p in 0..points.count {
            let a = dispersions[p];
            for value in &mut values[p] {
                *value = a * exp_within(*value);
            }
            if number < blocks.deep && products[p] {
                logs[p] = product_of_lanes(&values[p]);
            } else {
                add_logs_of_rows(&block, 1.0 / a, &mut values[p], &mut sums[p]);
            }
        }
        if number < blocks.deep {
            // All points in one loop: a logarithm is a long chain, and the processor works on those
            // of several points side by side.
            for value in logs[..points.count].as_flattened_mut() {
                *value = ln_1p(*value);
            }
            for p in 0..points.count {
                if products[p] {
                    let size = 1.0 / dispersions[p];
                    for lane in 0..LANES {
                        let factor = block.counts[0].0[lane] + block.weights[0].0[lane] * size;
                        sums[p][lane] += factor * logs[p][lane];
                    }
                }
            }
        }
    }
    for (out, sums) in out.iter_mut().zip(&sums) {
        *out = add_up(sums);
    }
}

/// For each lane the product of (1 + x) over its rows, less 1: by pairs, so that no chain is longer
/// than three steps.
#[inline(always)]
fn product_of_lanes(x: &[f64; BLOCK]) -> [f64; LANES] {
    let mut products = *x;
    let mut chunks = DEPTH;
    while chunks > 1 {
        chunks /= 2;
        for place in 0..chunks * LANES {
            let (left, right) = (products[place], products[place + chunks * LANES]);
            products[place] = (left + right) + left * right;
        }
    }
    let mut out = [0.0; LANES];
    out.copy_from_slice(&products[..LANES]);
    out
}

/// Adds `(count + weight * size) * log(1 + x)` of every row to its lane.
#[inline(always)]
fn add_logs_of_rows(block: &Block, size: f64, x: &mut [f64; BLOCK], sums: &mut [f64; LANES]) {
    for value in x.iter_mut() {
        *value = ln_1p(*value);
    }
    for depth in 0..DEPTH {
        for lane in 0..LANES {
            let factor = block.counts[depth].0[lane] + block.weights[depth].0[lane] * size;
            sums[lane] += factor * x[depth * LANES + lane];
        }
    }
}

/// The eight lanes of a sum, always in this order.
#[inline(always)]
pub fn add_up(l: &[f64; LANES]) -> f64 {
    ((l[0] + l[1]) + (l[2] + l[3])) + ((l[4] + l[5]) + (l[6] + l[7]))
}
