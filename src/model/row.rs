//! One row of a chain as whole-number weights over a common denominator.
//!
//! Both engines start from these weights, each in its own way, so neither sees a rounded probability.

use std::collections::BTreeMap;

use dashu_int::ops::{Gcd, UnsignedAbs};
use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

use super::number::Number;

/// Rows whose sum is off by no more than this are corrected exactly, with a warning; others are refused.
pub const LARGEST_CORRECTION: f64 = 1.0 / CORRECTION_PARTS as f64;
/// The same as a number of parts of one, so that the limit is exact.
const CORRECTION_PARTS: u32 = 1_000_000_000;

/// The probabilities of a row: `numerators[i] / denominator`, exactly.
#[derive(Debug, Clone, Copy)]
pub enum Weights<'a> {
    /// Everything fits into 64 bits: nearly every row.
    Narrow {
        /// One numerator a move.
        numerators: &'a [u64],
        /// Their sum.
        denominator: u64,
    },
    /// Long decimals or awkward fractions.
    Wide {
        /// One numerator a move.
        numerators: &'a [UBig],
        /// Their sum.
        denominator: &'a UBig,
    },
}

/// A row: where its moves lead and their exact weights. A move to the state itself is a stay.
#[derive(Debug, Clone, Copy)]
pub struct Row<'a> {
    /// State numbers, in the order of the model.
    pub targets: &'a [u32],
    /// The exact probabilities, in the same order.
    pub weights: Weights<'a>,
}

impl Row<'_> {
    /// The exact probability of move `i` of the row.
    ///
    /// # Panics
    /// When the row has no such move.
    pub fn probability(&self, i: usize) -> RBig {
        match self.weights {
            Weights::Narrow { numerators, denominator } => {
                RBig::from_parts(IBig::from(numerators[i]), UBig::from(denominator))
            }
            Weights::Wide { numerators, denominator } => {
                RBig::from_parts(IBig::from(numerators[i].clone()), denominator.clone())
            }
        }
    }
}

/// Many rows, stored one after another; wide ones in a side table.
#[derive(Debug, Clone, Default)]
pub(super) struct Rows {
    offsets: Vec<usize>,
    targets: Vec<u32>,
    numerators: Vec<u64>,
    denominators: Vec<u64>,
    wide: BTreeMap<usize, WideRow>,
}

#[derive(Debug, Clone)]
struct WideRow {
    numerators: Vec<UBig>,
    denominator: UBig,
}

impl Rows {
    pub(super) fn with_capacity(rows: usize, moves: usize) -> Self {
        let mut offsets = Vec::with_capacity(rows + 1);
        offsets.push(0);
        Self {
            offsets,
            targets: Vec::with_capacity(moves),
            numerators: Vec::with_capacity(moves),
            denominators: Vec::with_capacity(rows),
            wide: BTreeMap::new(),
        }
    }

    pub(super) fn push(&mut self, row: ExactRow) {
        let number = self.denominators.len();
        self.targets.extend_from_slice(&row.targets);
        match row.values {
            Values::Narrow { numerators, denominator } => {
                self.numerators.extend_from_slice(&numerators);
                self.denominators.push(denominator);
            }
            Values::Wide { numerators, denominator } => {
                self.numerators.resize(self.targets.len(), 0);
                self.denominators.push(0);
                self.wide.insert(number, WideRow { numerators, denominator });
            }
        }
        self.offsets.push(self.targets.len());
    }

    /// Appends a row of another table.
    pub(super) fn copy_from(&mut self, other: &Rows, number: usize) {
        let range = other.offsets[number]..other.offsets[number + 1];
        self.targets.extend_from_slice(&other.targets[range.clone()]);
        self.numerators.extend_from_slice(&other.numerators[range]);
        if let Some(wide) = other.wide.get(&number) {
            self.wide.insert(self.denominators.len(), wide.clone());
        }
        self.denominators.push(other.denominators[number]);
        self.offsets.push(self.targets.len());
    }

    pub(super) fn row(&self, number: usize) -> Row<'_> {
        let range = self.offsets[number]..self.offsets[number + 1];
        let weights = if self.denominators[number] == 0 && !range.is_empty() {
            let wide = &self.wide[&number];
            Weights::Wide { numerators: &wide.numerators, denominator: &wide.denominator }
        } else {
            Weights::Narrow { numerators: &self.numerators[range.clone()], denominator: self.denominators[number] }
        };
        Row { targets: &self.targets[range], weights }
    }

    pub(super) fn targets(&self, number: usize) -> &[u32] {
        &self.targets[self.offsets[number]..self.offsets[number + 1]]
    }

    pub(super) fn moves(&self) -> usize {
        self.targets.len()
    }

    pub(super) fn len(&self) -> usize {
        self.denominators.len()
    }
}

/// A row whose weights sum to one exactly.
#[derive(Debug, Clone)]
pub(super) struct ExactRow {
    targets: Vec<u32>,
    values: Values,
}

#[derive(Debug, Clone)]
enum Values {
    Narrow { numerators: Vec<u64>, denominator: u64 },
    Wide { numerators: Vec<UBig>, denominator: UBig },
}

/// Where the "rest" of a row goes.
#[derive(Debug, Clone, Copy)]
pub(super) struct Rest {
    /// Its place among the moves.
    pub(super) place: usize,
    /// Its target.
    pub(super) to: u32,
}

/// What a written row turned out to be.
#[derive(Debug)]
pub(super) enum RowOutcome {
    /// As written, it sums to one.
    Exact(ExactRow),
    /// It summed to `sum`, near enough to one, and was corrected.
    Corrected { row: ExactRow, sum: RBig },
    /// It does not sum to one.
    WrongSum { sum: RBig },
    /// The other moves sum to more than one, so nothing is left for "rest".
    NothingLeft { sum: RBig },
}

impl ExactRow {
    /// The row of a state that is never left.
    pub(super) fn none() -> Self {
        Self { targets: Vec::new(), values: Values::Narrow { numerators: Vec::new(), denominator: 1 } }
    }

    /// A stand-in for a faulty row: where it leads, with weights that mean nothing.
    pub(super) fn targets_only(targets: impl Iterator<Item = u32>) -> Self {
        let targets: Vec<u32> = targets.collect();
        let denominator = targets.len() as u64;
        Self { values: Values::Narrow { numerators: vec![1; targets.len()], denominator }, targets }
    }

    /// Normalises a written row. `stay` is the target that means "remain here"; `rest`, if any, takes what is left to
    /// one, at its place among the moves. Moves of probability zero are dropped.
    ///
    /// A row that is off by at most [`LARGEST_CORRECTION`] keeps its leaves when it has a stay that can absorb the
    /// difference, and is divided by its sum otherwise: no stay and no exit is ever created.
    /// Where `rescale` allows a larger difference, the row is divided by its sum as well.
    pub(super) fn normalise(
        moves: &[(u32, Number)],
        stay: Option<u32>,
        rest: Option<Rest>,
        rescale: Option<&Number>,
    ) -> RowOutcome {
        if let Some(row) = Self::short(moves, rest) {
            return RowOutcome::Exact(row);
        }
        let common = moves.iter().fold(UBig::ONE, |common, (_, value)| lcm(common, &denominator(value)));
        let mut targets: Vec<u32> = moves.iter().map(|(to, _)| *to).collect();
        let mut numerators: Vec<UBig> = moves.iter().map(|(_, value)| numerator_over(value, &common)).collect();
        let total: UBig = numerators.iter().sum();
        let as_sum = |total: &UBig| RBig::from_parts(IBig::from(total.clone()), common.clone());
        if let Some(rest) = rest {
            if total > common {
                return RowOutcome::NothingLeft { sum: as_sum(&total) };
            }
            targets.insert(rest.place, rest.to);
            numerators.insert(rest.place, &common - &total);
            return RowOutcome::Exact(Self::reduced(targets, numerators, common));
        }
        if total == common {
            return RowOutcome::Exact(Self::reduced(targets, numerators, common));
        }
        let sum = as_sum(&total);
        let off = if total > common { &total - &common } else { &common - &total };
        if &off * UBig::from(CORRECTION_PARTS) > common {
            if total == UBig::ZERO || rescale.is_none_or(|limit| as_sum(&off) > limit.to_ratio()) {
                return RowOutcome::WrongSum { sum };
            }
            return RowOutcome::Corrected { row: Self::reduced(targets, numerators, total), sum };
        }
        let at_stay = stay.and_then(|stay| targets.iter().position(|to| *to == stay));
        // A stay written as zero is none, and none is created.
        if let Some(at) = at_stay.filter(|at| numerators[*at] != UBig::ZERO) {
            let leaves = &total - &numerators[at];
            if leaves <= common {
                numerators[at] = &common - leaves;
                return RowOutcome::Corrected { row: Self::reduced(targets, numerators, common), sum };
            }
        }
        RowOutcome::Corrected { row: Self::reduced(targets, numerators, total), sum }
    }

    /// The row of rates: each over their sum, which is returned too. Rates of zero are dropped; `None` if all are.
    pub(super) fn of_rates(moves: &[(u32, Number)]) -> Option<(Self, RBig)> {
        let common = moves.iter().fold(UBig::ONE, |common, (_, value)| lcm(common, &denominator(value)));
        let numerators: Vec<UBig> = moves.iter().map(|(_, value)| numerator_over(value, &common)).collect();
        let total: UBig = numerators.iter().sum();
        if total == UBig::ZERO {
            return None;
        }
        let rate = RBig::from_parts(IBig::from(total.clone()), common);
        Some((Self::reduced(moves.iter().map(|(to, _)| *to).collect(), numerators, total), rate))
    }

    /// A row of short decimals that sums to one as written: nearly every row, so it is worth its own arithmetic.
    fn short(moves: &[(u32, Number)], rest: Option<Rest>) -> Option<Self> {
        let short = |number: &Number| match number {
            Number::Decimal { mantissa, scale } => Some((*mantissa, *scale)),
            Number::Ratio(_) => None,
        };
        let (mut largest, mut total) = (0, 0u64);
        for (_, number) in moves {
            largest = largest.max(short(number)?.1);
        }
        let mut denominator = 10u64.pow(u32::from(largest));
        let (mut targets, mut numerators) = (Vec::with_capacity(moves.len() + 1), Vec::with_capacity(moves.len() + 1));
        for (to, number) in moves {
            let (mantissa, scale) = short(number)?;
            let numerator = mantissa.checked_mul(10u64.pow(u32::from(largest - scale)))?;
            total = total.checked_add(numerator)?;
            targets.push(*to);
            numerators.push(numerator);
        }
        if let Some(rest) = rest {
            targets.insert(rest.place, rest.to);
            numerators.insert(rest.place, denominator.checked_sub(total)?);
        } else if total != denominator {
            return None;
        }
        let common = numerators.iter().fold(denominator, |common, numerator| common.gcd(*numerator));
        denominator /= common;
        numerators.iter_mut().for_each(|numerator| *numerator /= common);
        if numerators.contains(&0) {
            let mut kept = numerators.iter().map(|numerator| *numerator != 0);
            targets.retain(|_| kept.next() == Some(true));
            numerators.retain(|numerator| *numerator != 0);
        }
        Some(Self { targets, values: Values::Narrow { numerators, denominator } })
    }

    fn reduced(targets: Vec<u32>, numerators: Vec<UBig>, denominator: UBig) -> Self {
        let (targets, numerators): (Vec<u32>, Vec<UBig>) =
            targets.into_iter().zip(numerators).filter(|(_, weight)| *weight != UBig::ZERO).unzip();
        let common = numerators.iter().fold(denominator.clone(), Gcd::gcd);
        let numerators: Vec<UBig> = numerators.into_iter().map(|weight| weight / &common).collect();
        let denominator = denominator / common;
        let values = match u64::try_from(&denominator) {
            // Numerators never exceed the denominator, so they fit as well.
            Ok(denominator) => Values::Narrow {
                numerators: numerators.iter().map(|weight| u64::try_from(weight).unwrap_or(u64::MAX)).collect(),
                denominator,
            },
            Err(_) => Values::Wide { numerators, denominator },
        };
        Self { targets, values }
    }
}

fn lcm(a: UBig, b: &UBig) -> UBig {
    if &a % b == UBig::ZERO {
        return a;
    }
    let common = (&a).gcd(b);
    a / common * b
}

fn denominator(value: &Number) -> UBig {
    match value {
        Number::Decimal { scale, .. } => UBig::from(10u64.pow(u32::from(*scale))),
        Number::Ratio(value) => value.denominator().clone(),
    }
}

/// `value · common` for a value that is not negative and whose denominator divides `common`.
fn numerator_over(value: &Number, common: &UBig) -> UBig {
    let factor = common / denominator(value);
    match value {
        Number::Decimal { mantissa, .. } => factor * UBig::from(*mantissa),
        Number::Ratio(value) => factor * value.numerator().clone().unsigned_abs(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn written(moves: &[(u32, &str)]) -> Vec<(u32, Number)> {
        moves.iter().map(|(to, text)| (*to, Number::parse(text).unwrap())).collect()
    }

    fn shown(row: ExactRow) -> Vec<(u32, String)> {
        let mut rows = Rows::with_capacity(1, 4);
        rows.push(row);
        let row = rows.row(0);
        (0..row.targets.len()).map(|i| (row.targets[i], row.probability(i).to_string())).collect()
    }

    fn pairs(moves: &[(u32, &str)]) -> Vec<(u32, String)> {
        moves.iter().map(|(to, text)| (*to, (*text).to_owned())).collect()
    }

    #[test]
    fn fractions_and_decimals_meet_exactly_and_rest_takes_what_is_left() {
        let RowOutcome::Exact(row) =
            ExactRow::normalise(&written(&[(1, "5/12"), (2, "0.25")]), Some(0), Some(Rest { place: 1, to: 3 }), None)
        else {
            panic!("sums below one with a rest");
        };
        assert_eq!(shown(row), pairs(&[(1, "5/12"), (3, "1/3"), (2, "1/4")]));
    }

    #[test]
    fn a_written_stay_absorbs_the_difference_and_leaves_are_untouched() {
        let moves = written(&[(0, "0.9999999999"), (1, "0.00000000005")]);
        let RowOutcome::Corrected { row, .. } = ExactRow::normalise(&moves, Some(0), None, None) else {
            panic!("within the largest correction");
        };
        assert_eq!(shown(row), pairs(&[(0, "19999999999/20000000000"), (1, "1/20000000000")]));
    }

    #[test]
    fn a_correction_creates_no_stay() {
        let moves = written(&[(0, "0"), (1, "0.9999999999")]);
        let RowOutcome::Corrected { row, .. } = ExactRow::normalise(&moves, Some(0), None, None) else {
            panic!("within the largest correction");
        };
        assert_eq!(shown(row), pairs(&[(1, "1")]));
    }

    #[test]
    fn without_a_stay_every_entry_is_divided_by_the_sum() {
        let moves = written(&[(1, "0.3333333333"), (2, "0.3333333333"), (3, "0.3333333333")]);
        let RowOutcome::Corrected { row, .. } = ExactRow::normalise(&moves, Some(0), None, None) else {
            panic!("within the largest correction");
        };
        assert_eq!(shown(row), pairs(&[(1, "1/3"), (2, "1/3"), (3, "1/3")]));
    }

    #[test]
    fn a_sum_far_from_one_or_nothing_left_is_said() {
        let off = ExactRow::normalise(&written(&[(1, "0.5"), (2, "0.4")]), None, None, None);
        assert!(matches!(off, RowOutcome::WrongSum { sum } if sum.to_string() == "9/10"));
        let full = ExactRow::normalise(&written(&[(1, "0.8"), (2, "0.4")]), None, Some(Rest { place: 2, to: 3 }), None);
        assert!(matches!(full, RowOutcome::NothingLeft { sum } if sum.to_string() == "6/5"));
    }

    #[test]
    fn rates_are_shares_of_their_sum() {
        let (row, rate) = ExactRow::of_rates(&written(&[(1, "1e6"), (2, "0"), (3, "2.5e-1")])).unwrap();
        assert_eq!(rate.to_string(), "4000001/4");
        assert_eq!(shown(row), pairs(&[(1, "4000000/4000001"), (3, "1/4000001")]));
        assert!(ExactRow::of_rates(&written(&[(1, "0")])).is_none());
    }

    #[test]
    fn long_decimals_stay_exact_in_the_side_table() {
        let moves = written(&[(1, "1e-30")]);
        let RowOutcome::Exact(row) = ExactRow::normalise(&moves, Some(0), Some(Rest { place: 1, to: 0 }), None) else {
            panic!("has a rest")
        };
        let row = shown(row);
        assert_eq!(row[0].1, format!("1/1{}", "0".repeat(30)));
        assert_eq!(row[1].1, format!("{}/1{}", "9".repeat(30), "0".repeat(30)));
    }
}
