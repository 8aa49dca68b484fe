//! Where the derivatives' sums gather: by column, and by pattern for index columns.

use crate::model::blocks::Eight;
use crate::model::patterns::{IndexColumn, Split};
use crate::numeric::add_up;

/// Sums over rows; `T` is a lane register while rows are added, a number afterwards.
#[derive(Debug, Clone)]
pub struct Sums<T> {
    /// The value's terms that depend on the mean, without `Y log mu`.
    pub value: T,
    /// First derivative by a.
    pub by_a: T,
    /// Second derivative by a.
    pub by_a_twice: T,
    /// By the intercept and the columns that stay.
    pub first: Vec<T>,
    /// By a and each of these.
    pub mixed: Vec<T>,
    /// By pairs of these: (0,0), (1,0), (1,1), (2,0), ...
    pub second: Vec<T>,
    /// For each index column.
    pub index: Vec<IndexSums>,
    /// For each pair of index columns (1,0), (2,0), (2,1), ...: second derivatives, summed for each
    /// pattern of the first and each of the second.
    pub pairs: Vec<Vec<f64>>,
}

/// Sums for the patterns of one index column.
#[derive(Debug, Clone)]
pub struct IndexSums {
    /// First derivatives by the linear predictor, for each pattern.
    pub first: Vec<f64>,
    /// Mixed derivatives, for each pattern.
    pub mixed: Vec<f64>,
    /// Second derivatives, for each pattern.
    pub second: Vec<f64>,
    /// Second derivatives times each column that stays, pattern by pattern.
    pub cross: Vec<f64>,
}

/// The place of the pair (i, k), k <= i, in a list of pairs.
#[inline(always)]
pub fn pair(i: usize, k: usize) -> usize {
    i * (i + 1) / 2 + k
}

impl Sums<Eight> {
    /// Nothing summed yet.
    pub fn zero(split: &Split) -> Self {
        let size = split.dense.len() + 1;
        let patterns: Vec<usize> = split.index.iter().map(IndexColumn::patterns).collect();
        Sums {
            value: Eight::ZERO,
            by_a: Eight::ZERO,
            by_a_twice: Eight::ZERO,
            first: vec![Eight::ZERO; size],
            mixed: vec![Eight::ZERO; size],
            second: vec![Eight::ZERO; pair(size, 0)],
            index: patterns
                .iter()
                .map(|&patterns| IndexSums {
                    first: vec![0.0; patterns],
                    mixed: vec![0.0; patterns],
                    second: vec![0.0; patterns],
                    cross: vec![0.0; patterns * (size - 1)],
                })
                .collect(),
            pairs: (0..patterns.len())
                .flat_map(|g| (0..g).map(move |h| (g, h)))
                .map(|(g, h)| vec![0.0; patterns[g] * patterns[h]])
                .collect(),
        }
    }

    /// The lanes added up.
    pub fn added_up(self) -> Sums<f64> {
        let all = |lanes: Vec<Eight>| lanes.iter().map(|eight| add_up(&eight.0)).collect();
        Sums {
            value: add_up(&self.value.0),
            by_a: add_up(&self.by_a.0),
            by_a_twice: add_up(&self.by_a_twice.0),
            first: all(self.first),
            mixed: all(self.mixed),
            second: all(self.second),
            index: self.index,
            pairs: self.pairs,
        }
    }
}

impl Sums<f64> {
    /// Adds another share's sums.
    pub fn add(&mut self, other: &Sums<f64>) {
        self.value += other.value;
        self.by_a += other.by_a;
        self.by_a_twice += other.by_a_twice;
        add_each(&mut self.first, &other.first);
        add_each(&mut self.mixed, &other.mixed);
        add_each(&mut self.second, &other.second);
        for (mine, others) in self.index.iter_mut().zip(&other.index) {
            add_each(&mut mine.first, &others.first);
            add_each(&mut mine.mixed, &others.mixed);
            add_each(&mut mine.second, &others.second);
            add_each(&mut mine.cross, &others.cross);
        }
        for (mine, others) in self.pairs.iter_mut().zip(&other.pairs) {
            add_each(mine, others);
        }
    }

    /// The same by coefficient, each index column resolved into the terms that it stands for.
    pub fn by_coefficient(&self, split: &Split) -> RowSums {
        let size = split.terms() + 1;
        let mut out = RowSums {
            value: self.value,
            gradient: vec![0.0; size],
            hessian: vec![0.0; size * size],
            by_dispersion: self.by_a,
            by_dispersion_twice: self.by_a_twice,
            mixed: vec![0.0; size],
        };
        // Place among the coefficients of the intercept and of each column that stays.
        let places: Vec<usize> = std::iter::once(0)
            .chain(split.dense.iter().map(|term| term + 1))
            .collect();
        for (i, place) in places.iter().enumerate() {
            out.gradient[*place] = self.first[i];
            out.mixed[*place] = self.mixed[i];
            for k in 0..=i {
                out.add(*place, places[k], self.second[pair(i, k)]);
            }
        }
        let dense = places.len() - 1;
        for (g, (column, sums)) in split.index.iter().zip(&self.index).enumerate() {
            for pattern in 0..column.patterns() {
                let entries = column.pattern(pattern);
                for (i, (term, value)) in entries.iter().enumerate() {
                    let place = term + 1;
                    out.gradient[place] += value * sums.first[pattern];
                    out.mixed[place] += value * sums.mixed[pattern];
                    out.add(place, 0, value * sums.second[pattern]);
                    for (column, other) in places[1..].iter().enumerate() {
                        out.add(place, *other, value * sums.cross[pattern * dense + column]);
                    }
                    for (other, other_value) in &entries[..=i] {
                        out.add(place, other + 1, value * other_value * sums.second[pattern]);
                    }
                }
                for (h, before) in split.index[..g].iter().enumerate() {
                    let table = &self.pairs[pair(g, h) - g];
                    for other_pattern in 0..before.patterns() {
                        let second = table[pattern * before.patterns() + other_pattern];
                        for (term, value) in entries {
                            for (other, other_value) in before.pattern(other_pattern) {
                                out.add(term + 1, other + 1, value * other_value * second);
                            }
                        }
                    }
                }
            }
        }
        out
    }
}

fn add_each(to: &mut [f64], from: &[f64]) {
    for (to, from) in to.iter_mut().zip(from) {
        *to += from;
    }
}

/// First and second derivatives of the rows' log likelihood, summed, by coefficient.
#[derive(Debug, Clone)]
pub struct RowSums {
    /// Sum of the value's terms that depend on the mean.
    pub value: f64,
    /// By the intercept and the coefficients: `terms + 1` values.
    pub gradient: Vec<f64>,
    /// By the same, row-major, lower triangle filled.
    pub hessian: Vec<f64>,
    /// By c^2.
    pub by_dispersion: f64,
    /// Second derivative by c^2.
    pub by_dispersion_twice: f64,
    /// Mixed derivatives, by c^2 and each of the intercept and coefficients.
    pub mixed: Vec<f64>,
}

impl RowSums {
    /// Adds to an entry of the Hessian, in its lower triangle.
    fn add(&mut self, i: usize, k: usize, value: f64) {
        let size = self.gradient.len();
        self.hessian[i.max(k) * size + i.min(k)] += value;
    }
}
