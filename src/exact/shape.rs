//! Central moments for planning: guides, not answers.

/// Mean and central moments of a time, for least sizes and sample sizes. Unlike an answer they carry no bound; a moment
/// that cancellation could have spoilt by more than a hundredth is `None`.
#[derive(Debug, Clone, PartialEq)]
pub struct Shape {
    pub(super) mean: f64,
    /// Central moments 2 to 8.
    pub(super) central: [Option<f64>; 7],
}

impl Shape {
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

    /// Skewness and excess kurtosis of the squared deviation (T − μ)², on which the variance estimate rests.
    pub fn of_squared_deviation(&self) -> Option<(f64, f64)> {
        let [m2, m4, m6, m8] = [2, 4, 6, 8].map(|order| self.central(order));
        let (m2, m4, m6, m8) = (m2?, m4?, m6?, m8?);
        let variance = m4 - m2 * m2;
        if variance <= 0.0 {
            return None;
        }
        let third = m6 - 3.0 * m4 * m2 + 2.0 * m2.powi(3);
        let fourth = m8 - 4.0 * m6 * m2 + 6.0 * m4 * m2 * m2 - 3.0 * m2.powi(4);
        Some((third / variance.powf(1.5), fourth / (variance * variance) - 3.0))
    }
}
