//! Central moments for planning: guides, not answers.

use super::dd::{Dd, U2};

/// Rising-factorial moments that are computed, from the zeroth to the eighth.
pub(super) const ORDERS: usize = 9;
/// A moment may be off by this share of itself, or of the matching power of the standard deviation.
const LARGEST_ERROR: f64 = 0.01;

/// Mean and central moments of a time, for least sizes and sample sizes. Unlike an answer they carry no bound; a moment
/// that cancellation could have spoilt by more than a hundredth is `None`.
#[derive(Debug, Clone, PartialEq)]
pub struct Shape {
    mean: f64,
    /// Central moments 2 to 8.
    central: [Option<f64>; ORDERS - 2],
}

impl Shape {
    /// From `E[C(T + j − 1, j)]` for `j` from 0, or in continuous time (not `in_steps`) from `E[T^j]/j!`, up to a common
    /// factor, each within a relative error.
    ///
    /// # Formula
    /// `j! C(T + j − 1, j) = T (T + 1) … (T + j − 1)`, and `T^k = Σ_j (−1)^(k−j) S(k, j) T (T + 1) … (T + j − 1)` with
    /// Stirling numbers of the second kind; then the binomial theorem about the mean. Both cancel, in double-double, and
    /// the sums of absolute values say by how much.
    pub(super) fn of_sums(sums: &[Dd], errors: &[f64], in_steps: bool) -> Self {
        let mut rising = Vec::with_capacity(sums.len());
        let mut factorial = Dd::ONE;
        for (j, sum) in sums.iter().enumerate() {
            factorial = factorial.times(Dd::of(j.max(1) as f64));
            rising.push(sum.times(factorial).over(sums[0]));
        }
        let error = errors.iter().fold(0.0f64, |most, error| most.max(*error)) * 2.0 + 1e3 * U2;
        let mean = rising.get(1).copied().unwrap_or(Dd::ZERO);
        let (mut raw, mut raw_size) = (Vec::new(), Vec::new());
        let mut stirling = vec![1.0];
        for k in 0..rising.len() {
            let term = |j: usize| rising[j].times(Dd::of(stirling[j]));
            if !in_steps {
                raw.push(rising[k]);
                raw_size.push(rising[k].hi);
                continue;
            }
            let alternating = (0..=k).map(|j| if (k - j) % 2 == 0 { term(j) } else { Dd::ZERO.minus(term(j)) });
            raw.push(alternating.fold(Dd::ZERO, Dd::sum));
            raw_size.push((0..=k).map(|j| term(j).hi).sum::<f64>());
            let next = |j: usize| {
                let (same, before) = (stirling.get(j).copied().unwrap_or(0.0), j.checked_sub(1).map(|j| stirling[j]));
                j as f64 * same + before.unwrap_or(0.0)
            };
            stirling = (0..=k + 1).map(next).collect();
        }
        let mut shape = Self { mean: mean.hi, central: [None; ORDERS - 2] };
        for k in 2..raw.len() {
            let (mut sum, mut size) = (Dd::ZERO, 0.0);
            let mut power = Dd::ONE;
            let mut binomial = 1.0;
            for i in 0..=k {
                // C(k, i) (−μ)^i E[T^(k−i)].
                let factor = power.times(Dd::of(binomial));
                let term = factor.times(raw[k - i]);
                sum = if i % 2 == 0 { sum.sum(term) } else { sum.minus(term) };
                size += factor.hi * raw_size[k - i];
                power = power.times(mean);
                binomial = binomial * (k - i) as f64 / (i + 1) as f64;
            }
            let spread = if k == 2 { 0.0 } else { shape.central[0].unwrap_or(0.0).powf(k as f64 / 2.0) };
            let good = size.is_finite() && size * error * (k as f64) <= LARGEST_ERROR * sum.hi.abs().max(spread);
            shape.central[k - 2] = good.then_some(sum.hi);
        }
        shape
    }

    /// From the mean and the central moments from the second on, as far as they are known.
    pub(super) fn of_central(mean: f64, known: &[Option<f64>]) -> Self {
        let mut central = [None; ORDERS - 2];
        central.iter_mut().zip(known).for_each(|(moment, known)| *moment = *known);
        Self { mean, central }
    }

    /// The shape of a time that does not vary.
    pub(super) fn constant(time: f64) -> Self {
        Self { mean: time, central: [Some(0.0); ORDERS - 2] }
    }

    /// The mean, in clock units.
    pub fn mean(&self) -> f64 {
        self.mean
    }

    /// The central moment of order 2 to 8; `None` for other orders and where it is not known well.
    pub fn central(&self, order: usize) -> Option<f64> {
        self.central.get(order.checked_sub(2)?).copied().flatten()
    }

    /// The variance.
    pub fn variance(&self) -> Option<f64> {
        self.central(2)
    }

    /// The skewness; `None` also when nothing varies.
    pub fn skewness(&self) -> Option<f64> {
        let variance = self.variance().filter(|variance| *variance > 0.0)?;
        Some(self.central(3)? / variance.powf(1.5))
    }

    /// The excess kurtosis; `None` also when nothing varies.
    pub fn excess_kurtosis(&self) -> Option<f64> {
        let variance = self.variance().filter(|variance| *variance > 0.0)?;
        Some(self.central(4)? / (variance * variance) - 3.0)
    }

    /// Whether the time deviates from its mean by one size only, as far as can be told: then (T − μ)² does not vary.
    pub fn has_one_deviation(&self) -> bool {
        // m₄ − m₂² cancels there.
        self.central(2).zip(self.central(4)).is_some_and(|(m2, m4)| m2 > 0.0 && m4 - m2 * m2 <= 1e-9 * m4)
    }

    /// Skewness and excess kurtosis of the squared deviation (T − μ)², on which the variance estimate rests.
    pub fn of_squared_deviation(&self) -> Option<(f64, f64)> {
        let [m2, m4, m6, m8] = [2, 4, 6, 8].map(|order| self.central(order));
        let (m2, m4, m6, m8) = (m2?, m4?, m6?, m8?);
        let variance = m4 - m2 * m2;
        if self.has_one_deviation() {
            return None;
        }
        let third = m6 - 3.0 * m4 * m2 + 2.0 * m2.powi(3);
        let fourth = m8 - 4.0 * m6 * m2 + 6.0 * m4 * m2 * m2 - 3.0 * m2.powi(4);
        Some((third / variance.powf(1.5), fourth / (variance * variance) - 3.0))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Binomial moments of a geometric time: P(T > t) = (1 − p)^t gives E[C(T + j − 1, j)] = p^(−j).
    fn geometric(p: f64) -> Shape {
        let sums: Vec<Dd> = (0..ORDERS).map(|j| Dd::ONE.over(Dd::of(p.powi(j as i32)))).collect();
        Shape::of_sums(&sums, &[0.0; ORDERS], true)
    }

    #[test]
    fn a_geometric_time_has_the_textbook_moments() {
        // Mean 1/p, variance q/p², skewness (2 − p)/√q, excess kurtosis 6 + p²/q: any handbook, from memory.
        let (p, q) = (0.25f64, 0.75f64);
        let shape = geometric(p);
        assert!((shape.mean() - 4.0).abs() < 1e-14);
        assert!((shape.variance().unwrap() - 12.0).abs() < 1e-12);
        assert!((shape.skewness().unwrap() - (2.0 - p) / q.sqrt()).abs() < 1e-12);
        assert!((shape.excess_kurtosis().unwrap() - (6.0 + p * p / q)).abs() < 1e-12);
        // Sixth and eighth: sums of t^k p q^(t−1) (t − 4)^k, here by brute force.
        for order in [5, 6, 7, 8] {
            let brute: f64 = (1..2000).map(|t| p * q.powi(t - 1) * (f64::from(t) - 4.0).powi(order as i32)).sum();
            assert!((shape.central(order).unwrap() / brute - 1.0).abs() < 1e-11, "{order}");
        }
    }

    #[test]
    fn moments_lost_to_cancellation_are_not_given() {
        // Mean 1e12 with a spread of 1e-3 of a step: no double-double holds that eighth moment.
        let mean = 1e12;
        let sums: Vec<Dd> = (0..ORDERS)
            .map(|j| (0..j).fold(Dd::ONE, |c, i| c.times(Dd::of(mean + i as f64)).over(Dd::of(i as f64 + 1.0))))
            .collect();
        let shape = Shape::of_sums(&sums, &[1e-30; ORDERS], true);
        assert_eq!(shape.central(8), None);
        assert_eq!(shape.of_squared_deviation(), None);
    }
}
