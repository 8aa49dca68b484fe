//! The sums that a log density needs at each point.

use super::LOCKSTEP;
use super::instructions::{Instructions, fetch_ahead, for_each_set};
use super::predictor::{BlockValues, Part, Points, predict};
use crate::model::blocks::{BLOCK, Block, Blocks, DEPTH, Eight, LANES};
use crate::numeric::{add_up, exp_within, ln_1p};

/// A running product of factors 1 + a mu goes on below this: one more block's may then be as large as
/// [`OVERFLOW`] before a double ends at 1.8e308.
const FULL: f64 = 1e100;
/// Where a product comes to this, its factors take a logarithm each.
const OVERFLOW: f64 = 1e200;

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
        logs(instructions, blocks, &part, &dispersions[first..first + out.len()], out);
    }
}

/// The largest absolute linear predictor of any row at one of the points.
pub fn furthest(instructions: Instructions, blocks: &Blocks, points: &Points, place: usize) -> f64 {
    let mut out = 0.0;
    furthest_of(instructions, blocks, &points.part(place, 1), &mut out);
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
    for number in 0..blocks.blocks {
        let block = blocks.block(number);
        predict::<TILE>(&block, points, &mut values);
        for (p, (values, sums)) in values[..points.count].iter_mut().zip(&mut sums).enumerate() {
            fetch_ahead(blocks.share(number + 1, p, points.count));
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
    /// [`sums_of_logs`] for one part.
    fn logs(blocks: &Blocks, points: &Part, dispersions: &[f64], out: &mut [f64]) = logs_kernel;
}

/// In a deep block the rows of a lane share count and weight, so with x = a mu of each
///
/// `sum (count + weight/a) log(1 + x) = (count + weight/a) log(product of (1 + x))`,
///
/// and one logarithm serves eight rows; and where the next block's lanes have the same counts and
/// weights again, the product goes on, until it is too large. The product is carried as its difference
/// from 1, since (1 + P)(1 + x) - 1 = P + x + P x has no cancellation: 1 + x would lose the digits of
/// a small x, and with them the likelihood near a scatter of 0.
#[inline(always)]
fn logs_kernel<const TILE: usize>(blocks: &Blocks, points: &Part, dispersions: &[f64], out: &mut [f64]) {
    let mut values: BlockValues = [[0.0; BLOCK]; LOCKSTEP];
    let mut sums = [[0.0; LANES]; LOCKSTEP];
    // For each point, the products of the lanes so far, less 1.
    let mut products = [[0.0; LANES]; LOCKSTEP];
    for number in 0..blocks.blocks {
        let block = blocks.block(number);
        predict::<TILE>(&block, points, &mut values);
        for p in 0..points.count {
            fetch_ahead(blocks.share(number + 1, p, points.count));
            for value in &mut values[p] {
                *value = dispersions[p] * exp_within(*value);
            }
        }
        if number >= blocks.deep() {
            for p in 0..points.count {
                add_logs_of_rows(&block, 1.0 / dispersions[p], &mut values[p], &mut sums[p]);
            }
            continue;
        }
        for p in 0..points.count {
            let size = 1.0 / dispersions[p];
            let with_block = product(&products[p], &product_of_lanes(&values[p]));
            let together = add_up(&with_block);
            if together < FULL {
                products[p] = with_block;
            } else if together < OVERFLOW {
                add_logs_of_products(&block, size, &with_block, &mut sums[p]);
                products[p] = [0.0; LANES];
            } else {
                // Too large, infinite or, times 0, no number: the product so far and the rows apart.
                add_logs_of_products(&block, size, &products[p], &mut sums[p]);
                products[p] = [0.0; LANES];
                add_logs_of_rows(&block, size, &mut values[p], &mut sums[p]);
            }
        }
        if !blocks.continues.get(number + 1).is_some_and(|continues| *continues) {
            for p in 0..points.count {
                add_logs_of_products(&block, 1.0 / dispersions[p], &products[p], &mut sums[p]);
                products[p] = [0.0; LANES];
            }
        }
    }
    for (out, sums) in out.iter_mut().zip(&sums) {
        *out = add_up(sums);
    }
}

/// (1 + p)(1 + q) - 1, lane by lane.
#[inline(always)]
fn product(p: &[f64; LANES], q: &[f64; LANES]) -> [f64; LANES] {
    let mut out = [0.0; LANES];
    for lane in 0..LANES {
        out[lane] = (p[lane] + q[lane]) + p[lane] * q[lane];
    }
    out
}

/// Adds `(count + weight * size) * log(1 + product)` of every lane of a deep block.
#[inline(always)]
fn add_logs_of_products(block: &Block, size: f64, products: &[f64; LANES], sums: &mut [f64; LANES]) {
    for lane in 0..LANES {
        let factor = block.counts[0].0[lane] + block.weights[0].0[lane] * size;
        sums[lane] += factor * ln_1p(products[lane]);
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

/// The sum over j of `above_j * log(1 + a j)`, eight entries to a chunk from j = 0 on.
pub fn sum_of_count_logs(instructions: Instructions, above: &[Eight], a: f64) -> f64 {
    let mut out = 0.0;
    count_logs(instructions, above, a, &mut out);
    out
}

for_each_set! {
    /// [`sum_of_count_logs`].
    fn count_logs(above: &[Eight], a: f64, out: &mut f64) = count_logs_kernel;
}

#[inline(always)]
fn count_logs_kernel<const TILE: usize>(above: &[Eight], a: f64, out: &mut f64) {
    let mut sums = [0.0; LANES];
    let mut j: [f64; LANES] = std::array::from_fn(|lane| lane as f64);
    for chunk in above {
        for lane in 0..LANES {
            sums[lane] += chunk.0[lane] * ln_1p(a * j[lane]);
            j[lane] += LANES as f64;
        }
    }
    *out = add_up(&sums);
}
