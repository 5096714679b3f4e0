//! Exact sums of pairs of whole numbers: moments of a value, and how it varies together with a time.

use dashu_int::{IBig, UBig};

use super::moments::PowerSums;
use super::rounding::ratio_to_f64;

/// Values and times below this in size are held back in plain 128-bit sums.
const SMALL: u64 = 1 << 29;
/// Pairs held back at most: products of four numbers of 29 bits, 2¹⁰ of them, are below 2¹²⁶.
const CAPACITY: u32 = 1 << 10;

/// Sums over pairs of a value `x` and a time `t`: the powers 1 to 4 of x, 1 and 2 of t, and the products x t, x² t, x t²
/// and x² t², all exact. They merge by addition, in any order, to the same result.
///
/// ```
/// use tallystone::statistics::JointSums;
/// let mut sums = JointSums::default();
/// [(-1, 1), (0, 2), (4, 3)].iter().for_each(|(x, t)| sums.add(*x, *t));
/// assert_eq!(sums.values().mean(), Some(1.0));
/// assert_eq!(sums.covariance(), Some(2.5));
/// ```
#[derive(Debug, Clone, Default)]
pub struct JointSums {
    count: u64,
    held: u32,
    /// Sums that are held back, in the order of `settled`.
    recent: [i128; 10],
    /// x, x², x³, x⁴, t, t², x t, x² t, x t², x² t².
    settled: [IBig; 10],
}

impl JointSums {
    /// Adds one pair.
    pub fn add(&mut self, x: i128, t: u64) {
        self.count += 1;
        if x.unsigned_abs() >= u128::from(SMALL) || t >= SMALL {
            let terms = products(&IBig::from(x), &IBig::from(t));
            self.settled.iter_mut().zip(terms).for_each(|(sum, term)| *sum += term);
            return;
        }
        if self.held == CAPACITY {
            self.settle();
        }
        self.held += 1;
        let terms = products(&x, &i128::from(t));
        self.recent.iter_mut().zip(terms).for_each(|(sum, term)| *sum += term);
    }

    fn settle(&mut self) {
        self.held = 0;
        let recent = std::mem::take(&mut self.recent);
        self.settled.iter_mut().zip(recent).for_each(|(sum, more)| *sum += more);
    }

    /// Adds all pairs of another.
    pub fn merge(&mut self, other: &Self) {
        self.count += other.count;
        self.settled.iter_mut().zip(other.sums()).for_each(|(sum, more)| *sum += more);
    }

    /// Number of pairs.
    #[must_use]
    pub fn count(&self) -> u64 {
        self.count
    }

    /// The sums of x, x², x³, x⁴, t, t², x t, x² t, x t², x² t².
    #[must_use]
    pub fn sums(&self) -> [IBig; 10] {
        let mut sums = self.settled.clone();
        sums.iter_mut().zip(self.recent).for_each(|(sum, more)| *sum += more);
        sums
    }

    /// The power sums of the values alone.
    #[must_use]
    pub fn values(&self) -> PowerSums {
        let [x1, x2, x3, x4, ..] = self.sums();
        PowerSums::from_parts(self.count, [x1, x2, x3, x4])
    }

    /// The sample covariance, divisor n − 1, correctly rounded; `None` below two pairs.
    #[must_use]
    pub fn covariance(&self) -> Option<f64> {
        let fewer = self.count.checked_sub(1)?;
        let [x, _, _, _, t, _, xt, ..] = self.sums();
        ratio_to_f64(&(IBig::from(self.count) * xt - x * t), &(UBig::from(self.count) * fewer))
    }

    /// The mean of (x − x̄)² (t − t̄)², correctly rounded; `None` without pairs.
    #[must_use]
    pub fn squared_product_moment(&self) -> Option<f64> {
        let n = IBig::from(self.count);
        let [x, xx, _, _, t, tt, xt, xxt, xtt, xxtt] = self.sums();
        let (square_x, square_t) = (x.pow(2), t.pow(2));
        // n⁴ times the moment, each mean being a sum over n.
        let scaled = n.pow(3) * xxtt - IBig::from(2) * n.pow(2) * (&t * xxt + &x * xtt)
            + &n * (&square_t * xx + &square_x * tt + IBig::from(4) * &x * &t * xt)
            - IBig::from(3) * square_x * square_t;
        ratio_to_f64(&scaled, &UBig::from(self.count).pow(4))
    }
}

/// Equal sums, whatever is held back.
impl PartialEq for JointSums {
    fn eq(&self, other: &Self) -> bool {
        self.count == other.count && self.sums() == other.sums()
    }
}

impl Eq for JointSums {}

/// x, x², x³, x⁴, t, t², x t, x² t, x t², x² t².
fn products<T>(x: &T, t: &T) -> [T; 10]
where
    T: Clone,
    for<'a> &'a T: std::ops::Mul<&'a T, Output = T>,
{
    let (xx, tt) = (x * x, t * t);
    let xt = x * t;
    [x.clone(), xx.clone(), &xx * x, &xx * &xx, t.clone(), tt.clone(), xt.clone(), &xx * t, x * &tt, &xt * &xt]
}

#[cfg(test)]
mod tests {
    use super::*;

    fn pairs() -> Vec<(i128, u64)> {
        let mut state = 7u64;
        let mut next = move || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            state >> 33
        };
        (0..3000)
            .map(|i| (i128::from(next() % 2001) - 1000 + if i % 500 == 0 { 1 << 40 } else { 0 }, next() % 777))
            .collect()
    }

    fn sums_of(pairs: &[(i128, u64)]) -> JointSums {
        let mut sums = JointSums::default();
        pairs.iter().for_each(|(x, t)| sums.add(*x, *t));
        sums
    }

    #[test]
    fn sums_are_those_of_a_plain_recount_and_merge_in_any_split() {
        let pairs = pairs();
        let whole = sums_of(&pairs);
        let plain =
            |f: &dyn Fn(IBig, IBig) -> IBig| pairs.iter().map(|(x, t)| f(IBig::from(*x), IBig::from(*t))).sum::<IBig>();
        assert_eq!(whole.sums()[3], plain(&|x, _| x.pow(4)));
        assert_eq!(whole.sums()[7], plain(&|x, t| x.pow(2) * t));
        assert_eq!(whole.sums()[8], plain(&|x, t| x * t.pow(2)));
        for at in [0, 1, 1024, 1500, 3000] {
            let mut left = sums_of(&pairs[..at]);
            left.merge(&sums_of(&pairs[at..]));
            assert_eq!(left, whole);
        }
    }

    // The two-pass textbook sums in doubles, on data where they are good to 1e-12.
    #[test]
    fn moments_agree_with_two_passes() {
        let pairs: Vec<(i128, u64)> = pairs().into_iter().filter(|(x, _)| *x < 1 << 30).collect();
        let n = pairs.len() as f64;
        let sums = sums_of(&pairs);
        let mean = |f: &dyn Fn(f64, f64) -> f64| pairs.iter().map(|(x, t)| f(*x as f64, *t as f64)).sum::<f64>() / n;
        let (x, t) = (mean(&|x, _| x), mean(&|_, t| t));
        let covariance = mean(&|a, b| (a - x) * (b - t)) * n / (n - 1.0);
        let fourth = mean(&|a, b| ((a - x) * (b - t)).powi(2));
        assert!((sums.covariance().unwrap() - covariance).abs() < 1e-9 * covariance.abs().max(1.0));
        assert!((sums.squared_product_moment().unwrap() / fourth - 1.0).abs() < 1e-11);
        assert_eq!(sums.values().mean(), Some(x));
        assert_eq!(JointSums::default().covariance(), None);
        assert_eq!(sums_of(&[(3, 4)]).covariance(), None);
    }
}
