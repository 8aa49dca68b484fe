//! Sums in a fixed order: eight lanes side by side, then the lanes together.
//!
//! The lanes let the compiler use vector instructions of any width without changing a bit, and
//! make the rounding error of a long sum an eighth of the plain loop's.

/// Number of lanes. Part of every run's result: never change it.
pub(crate) const LANES: usize = 8;

/// Sum of the values.
pub fn sum(values: &[f64]) -> f64 {
    sum_of(values, |value| value)
}

/// Sum of what `of` makes of each value: the same bits as the sum of those, without room for them.
#[inline]
pub fn sum_of(values: &[f64], of: impl Fn(f64) -> f64) -> f64 {
    sum_with(values, |so_far, value| so_far + of(value))
}

/// Sum that `add` takes each value into, given what its lane has summed so far.
#[inline]
pub fn sum_with(values: &[f64], add: impl Fn(f64, f64) -> f64) -> f64 {
    let (blocks, rest) = values.as_chunks::<LANES>();
    let mut lanes = [0.0; LANES];
    for block in blocks {
        for lane in 0..LANES {
            lanes[lane] = add(lanes[lane], block[lane]);
        }
    }
    for (lane, value) in rest.iter().enumerate() {
        lanes[lane] = add(lanes[lane], *value);
    }
    add_up(&lanes)
}

/// Sum of the products of two slices, over the length of the shorter.
pub fn dot(left: &[f64], right: &[f64]) -> f64 {
    let length = left.len().min(right.len());
    let (left_blocks, left_rest) = left[..length].as_chunks::<LANES>();
    let (right_blocks, right_rest) = right[..length].as_chunks::<LANES>();
    let mut lanes = [0.0; LANES];
    for (l, r) in left_blocks.iter().zip(right_blocks) {
        for lane in 0..LANES {
            lanes[lane] += l[lane] * r[lane];
        }
    }
    for (lane, (l, r)) in left_rest.iter().zip(right_rest).enumerate() {
        lanes[lane] += l * r;
    }
    add_up(&lanes)
}

/// Mean of the values; 0 for none.
pub fn mean(values: &[f64]) -> f64 {
    if values.is_empty() {
        0.0
    } else {
        sum(values) / values.len() as f64
    }
}

/// The eight lanes of a sum, always in this order.
#[inline(always)]
pub(crate) fn add_up(l: &[f64; LANES]) -> f64 {
    ((l[0] + l[1]) + (l[2] + l[3])) + ((l[4] + l[5]) + (l[6] + l[7]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_value_is_counted_once_whatever_the_length() {
        for length in 0..40 {
            let values: Vec<f64> = (1..=length).map(f64::from).collect();
            let n = f64::from(length);
            assert_eq!(sum(&values), n * (n + 1.0) / 2.0);
            let squares = n * (n + 1.0) * (2.0 * n + 1.0) / 6.0;
            assert_eq!(dot(&values, &values), squares);
            assert_eq!(sum_of(&values, |value| value * value), squares);
        }
        assert_eq!(dot(&[1.0, 2.0, 3.0], &[10.0]), 10.0);
        assert_eq!(mean(&[]), 0.0);
        assert_eq!(mean(&[1.0, 4.0]), 2.5);
    }
}
