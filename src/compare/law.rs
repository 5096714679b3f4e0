//! The law of end and time: the band of its distance, and chi-square where no distance is tolerated.

use crate::sampling::Tally;
use crate::statistics::{Interval, dkw_half_width, dkw_level, law_size};

use super::Guarantee;
use super::curves::{Curves, steps};
use super::method::{Evidence, Method};
use super::words::rounded;

/// The level of the note that the law differs detectably. It is the note's own: no verdict rests on it.
const NOTE_LEVEL: f64 = 1e-3;

/// The distance D with the band of Dvoretzky, Kiefer, Wolfowitz and Massart.
#[derive(Debug)]
pub(super) struct Band<'a>(pub(super) Curves<'a>);

impl Method for Band<'_> {
    fn name(&self) -> &'static str {
        "Dvoretzky–Kiefer–Wolfowitz–Massart band"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Exact
    }

    fn cuts(&self, _tolerance: f64) -> Vec<u64> {
        steps(self.0.edges()).collect()
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let bands = self.0.bands();
        dkw_level(tolerance - self.0.widest_gap() - dkw_half_width(n, bands, alpha), n, bands)
    }

    fn never_agrees(&self, tolerance: f64) -> Option<String> {
        let gap = self.0.widest_gap();
        (gap >= tolerance).then(|| format!("the exact law is kept in cells of up to {} only", rounded(gap)))
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let n = tally.replications();
        if n == 0 {
            return Evidence::default();
        }
        let (distance, bands) = (self.0.distance(tally), self.0.bands());
        let half_width = dkw_half_width(n, bands, alpha);
        let interval =
            Interval { low: (distance.at_least - half_width).max(0.0), high: (distance.at_most + half_width).min(1.0) };
        let detectable = self.0.chi_square(tally).filter(|fit| fit.p_value <= NOTE_LEVEL);
        Evidence {
            estimate: Some(distance.seen),
            standard_error: None,
            interval: Some(interval),
            p_value: Some(dkw_level(distance.at_least - tolerance, n, bands)),
            premature: None,
            note: detectable.map(|fit| {
                // A p-value below every double is small, but not zero.
                let p = if fit.p_value < 1e-300 {
                    "p < 1e-300".to_owned()
                } else {
                    format!("p = {}", rounded(fit.p_value))
                };
                format!("the law differs detectably (pooled chi-square, {p})")
            }),
        }
    }
}

/// The pooled chi-square test, where no difference at all is tolerated.
#[derive(Debug)]
pub(super) struct ChiSquare<'a>(pub(super) Curves<'a>);

impl Method for ChiSquare<'_> {
    fn name(&self) -> &'static str {
        "pooled chi-square"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Approximate
    }

    fn cuts(&self, _tolerance: f64) -> Vec<u64> {
        steps(self.0.edges()).collect()
    }

    /// The size from which the band of D would see the tolerance: chi-square has no size for a distance.
    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let size = law_size(self.0.bands(), alpha, 0.1, tolerance - self.0.widest_gap());
        f64::from(u8::from(size.is_none_or(|size| n < size)))
    }

    fn evaluate(&self, tally: &Tally, _tolerance: f64, _alpha: f64) -> Evidence {
        if tally.replications() == 0 {
            return Evidence::default();
        }
        Evidence {
            estimate: Some(self.0.distance(tally).seen),
            p_value: self.0.chi_square(tally).map(|fit| fit.p_value),
            ..Evidence::default()
        }
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::curves::tests::{grid, outcomes, tally, with_curves};
    use super::super::verdict::{Verdict, of_interval};
    use super::*;
    use crate::exact::Bounded;

    const ALPHA: f64 = 0.01 / 14.0;

    #[test]
    fn the_band_and_its_p_value_agree_and_decide() {
        with_curves(|curves| {
            let grid = grid(&curves);
            let band = Band(curves);
            let mut decided = [0; 4];
            for i in 0..300_u64 {
                let outcomes = outcomes(1000 + 20 * i, i % 5 * 60, [0, 9, 3][i as usize % 3], 100 + u128::from(i));
                let tolerance = [0.01, 0.05, 0.2][i as usize / 3 % 3];
                let tally = tally(&outcomes, Arc::clone(&grid));
                let evidence = band.evaluate(&tally, tolerance, ALPHA);
                let verdict = of_interval(evidence.interval.unwrap(), Bounded::exactly(0.0), tolerance, false);
                assert_eq!(evidence.p_value.unwrap() <= ALPHA, verdict == Verdict::Disagree);
                // Just below and just above the lower end, too.
                let low = evidence.interval.unwrap().low;
                let p_value = |tolerance: f64| band.evaluate(&tally, tolerance, ALPHA).p_value.unwrap();
                assert!(low == 0.0 || (p_value(low - 1e-9) <= ALPHA && ALPHA < p_value(low + 1e-9)));
                decided[verdict as usize] += 1;
            }
            assert!([0, 2, 3].iter().all(|verdict| decided[*verdict] > 30), "{decided:?}");
        });
    }

    #[test]
    fn the_size_is_that_of_the_formula_with_what_the_cells_hide_taken_off() {
        with_curves(|curves| {
            let gap = curves.widest_gap();
            let band = Band(curves);
            let size = law_size(3, ALPHA, 0.05, 0.01 - gap).unwrap();
            assert!(band.miss_probability(0.01, size, ALPHA) <= 0.05);
            assert!(band.miss_probability(0.01, size - 2, ALPHA) > 0.05);
            assert!(band.never_agrees(gap).is_some() && band.never_agrees(0.01).is_none());
        });
    }

    // A right program: 20 tables, each noted with probability about 0.001, so at most one with probability 0.9998. A wrong
    // one whose law is half a per cent off is noted at 200,000 replications.
    #[test]
    fn a_law_that_differs_detectably_is_noted() {
        with_curves(|curves| {
            let grid = grid(&curves);
            let band = Band(curves);
            let noted = |outcomes: &[(usize, u64)]| {
                let evidence = band.evaluate(&tally(outcomes, Arc::clone(&grid)), 0.02, ALPHA);
                evidence.note.is_some_and(|note| note.contains("differs detectably"))
            };
            let right = (0..20).filter(|seed| noted(&outcomes(2000, 0, 0, 1000 + seed))).count();
            assert!(right <= 1, "{right} of 20");
            assert!(noted(&outcomes(100_000, 0, 50, 1)));
        });
    }

    // The true level of the chi-square test: 4,000 right programs, alarms at level 0.01 between 19 and 65 with probability
    // above 1 − 1e-3 (Bin(4000, 0.01)).
    #[test]
    fn chi_square_keeps_its_level() {
        with_curves(|curves| {
            let grid = grid(&curves);
            let test = ChiSquare(curves);
            let alarms = (0..4000)
                .filter(|seed| {
                    let tally = tally(&outcomes(300, 0, 0, 5000 + seed), Arc::clone(&grid));
                    test.evaluate(&tally, 0.0, ALPHA).p_value.unwrap() <= 0.01
                })
                .count();
            assert!((19..=65).contains(&alarms), "{alarms}");
        });
    }

    #[test]
    fn without_replications_nothing_is_said() {
        with_curves(|curves| {
            let empty = tally(&[], grid(&curves));
            assert_eq!(Band(curves).evaluate(&empty, 0.01, ALPHA), Evidence::default());
        });
        with_curves(|curves| {
            let grid = grid(&curves);
            let test = ChiSquare(curves);
            assert_eq!(test.evaluate(&tally(&[], Arc::clone(&grid)), 0.0, ALPHA), Evidence::default());
            // Too few for two cells of 25.
            assert_eq!(test.evaluate(&tally(&outcomes(30, 0, 0, 1), grid), 0.0, ALPHA).p_value, None);
        });
    }
}
