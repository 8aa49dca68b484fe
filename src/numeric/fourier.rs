//! The discrete Fourier transform, for autocovariances at thousands of lags.

/// The roots of unity that a transform of one length needs.
#[derive(Debug, Clone)]
pub struct Fourier {
    /// exp(-2 pi i k / length) for k below length / 2, as cosines and sines.
    roots: Vec<[f64; 2]>,
    length: usize,
}

impl Fourier {
    /// For the smallest power of two that is at least `at_least`, and at least 2.
    pub fn new(at_least: usize) -> Fourier {
        let length = at_least.next_power_of_two().max(2);
        // Root by root from half angles: square roots are the same bits everywhere, sines are not.
        // halves[j] is the turn by 1/2^(j+1) of the circle.
        let mut halves: Vec<[f64; 2]> = vec![[-1.0, 0.0]];
        while 1 << halves.len() < length {
            let next = match halves.last() {
                Some([cosine, sine]) if halves.len() > 1 => {
                    let half = (0.5 * (1.0 + cosine)).sqrt();
                    [half, sine / (2.0 * half)]
                }
                _ => [0.0, -1.0],
            };
            halves.push(next);
        }
        let mut roots = vec![[1.0, 0.0]];
        // roots[2^j + i] = (turn by 2^j / length) * roots[i]
        for j in 0..length.trailing_zeros().saturating_sub(1) as usize {
            let turn = halves[halves.len() - 1 - j];
            for i in 0..1 << j {
                roots.push(product(turn, roots[i]));
            }
        }
        Fourier { roots, length }
    }

    /// Length of the transform.
    pub fn length(&self) -> usize {
        self.length
    }

    /// Transforms `values` in place: out_k = sum_j values_j exp(-2 pi i j k / length).
    ///
    /// `values` holds [`Fourier::length`] pairs of real and imaginary part; with any other length nothing is done.
    pub fn transform(&self, values: &mut [[f64; 2]]) {
        if values.len() != self.length {
            return;
        }
        let bits = self.length.trailing_zeros();
        for i in 0..self.length {
            let mirrored = i.reverse_bits() >> (usize::BITS - bits);
            if i < mirrored {
                values.swap(i, mirrored);
            }
        }
        let mut half = 1;
        while half < self.length {
            let stride = self.length / (2 * half);
            for block in values.chunks_exact_mut(2 * half) {
                let (low, high) = block.split_at_mut(half);
                for (k, (a, b)) in low.iter_mut().zip(high).enumerate() {
                    let turned = product(*b, self.roots[k * stride]);
                    *b = [a[0] - turned[0], a[1] - turned[1]];
                    *a = [a[0] + turned[0], a[1] + turned[1]];
                }
            }
            half *= 2;
        }
    }
}

fn product(a: [f64; 2], b: [f64; 2]) -> [f64; 2] {
    [a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]]
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against the defining sum, with the cosines of the standard library as the second route.
    #[test]
    #[allow(clippy::disallowed_methods, reason = "the second route")]
    fn the_transform_is_its_defining_sum() {
        for at_least in [1, 2, 3, 8, 60, 256] {
            let fourier = Fourier::new(at_least);
            let n = fourier.length();
            let values: Vec<[f64; 2]> = (0..n)
                .map(|j| [((j * j) % 7) as f64 - 2.0, ((3 * j) % 5) as f64])
                .collect();
            let mut transformed = values.clone();
            fourier.transform(&mut transformed);
            for k in 0..n {
                let mut expected = [0.0, 0.0];
                for (j, v) in values.iter().enumerate() {
                    let angle = -2.0 * std::f64::consts::PI * ((j * k) % n) as f64 / n as f64;
                    let term = product(*v, [angle.cos(), angle.sin()]);
                    expected = [expected[0] + term[0], expected[1] + term[1]];
                }
                for part in 0..2 {
                    let difference = transformed[k][part] - expected[part];
                    assert!(difference.abs() < 1e-13 * n as f64, "{n} {k}: {difference:e}");
                }
            }
        }
    }
}
