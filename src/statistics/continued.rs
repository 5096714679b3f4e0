//! Continued fractions.

/// More terms than any fraction here takes: √a of them next to the mean, for a up to 1e12.
const MOST: u32 = 1_000_000;

/// `1/(first + α₁/(β₁ + α₂/(β₂ + …)))`, where `terms(k)` gives α and β number k, until it settles or an α is 0.
///
/// # Reference
/// The modified method of W. J. Lentz, Appl. Opt. 15 (1976) 668–671, doi:10.1364/AO.15.000668, and I. J. Thompson & A. R.
/// Barnett (1986), from memory.
pub(super) fn continued_fraction(first: f64, terms: impl Fn(f64) -> (f64, f64)) -> f64 {
    let mut value = first;
    let mut upper = first;
    let mut lower = 0.0;
    for k in 1..MOST {
        let (alpha, beta) = terms(f64::from(k));
        if alpha == 0.0 {
            break;
        }
        lower = 1.0 / (beta + alpha * lower);
        upper = beta + alpha / upper;
        let factor = upper * lower;
        value *= factor;
        if (factor - 1.0).abs() <= f64::EPSILON {
            break;
        }
    }
    1.0 / value
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_golden_ratio_and_a_fraction_that_ends() {
        let golden = f64::midpoint(1.0, 5.0_f64.sqrt());
        assert!((continued_fraction(1.0, |_| (1.0, 1.0)) - 1.0 / golden).abs() < 1e-15);
        // 1/(1 + 2/3) = 3/5.
        assert!((continued_fraction(1.0, |k| (if k < 2.0 { 2.0 } else { 0.0 }, 3.0)) - 0.6).abs() < 1e-15);
    }
}
