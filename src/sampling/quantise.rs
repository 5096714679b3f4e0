//! Rows as whole numbers of 64-bit draws.

use std::cmp::Reverse;

use dashu_int::UBig;

use crate::model::{Row, Weights};

/// Probabilities below 2⁻⁴⁰ are decided by a further draw.
const RARE_BITS: usize = 40;

/// The number of 64-bit draws.
pub(super) const DRAWS: u128 = 1 << 64;

/// Where one 64-bit draw leads: `draws[i]` of the 2⁶⁴ draws to `targets[i]`, `escape` of them to the next level.
///
/// The draws and the escape sum to 2⁶⁴ exactly; every entry is positive.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Level {
    pub(super) targets: Vec<u32>,
    pub(super) draws: Vec<u128>,
    pub(super) escape: u128,
}

/// Quantises a row to whole numbers of draws by largest remainder, from its exact weights; ties go to the lower index.
///
/// # Rare moves
/// Moves with a probability below 2⁻⁴⁰ would be rounded badly, or away. They are lumped into one escape of
/// E = ⌈2⁶⁴ Σ p⌉ + 2²⁴ draws, and a draw that escapes is followed by another one at the next level, where they have
/// probability 2⁶⁴ p/E. What E exceeds their sum by is taken from the row's heaviest move and given back to it at the next
/// level, so E is exact and errors do not pile up. Levels follow one another until no move is rare: one more for every
/// 40 bits or so.
///
/// # Accuracy
/// A move of probability p is taken with probability p(1 + ε), |ε| < 2⁻²⁴, and its absolute error is below 2⁻⁶⁴ (for the
/// heaviest move of a row with escapes, below 2⁻⁶³). A path of S steps over rows of at most d moves therefore differs from
/// the model by less than (d + 1) S 2⁻⁶⁵ in total variation.
///
/// # Complexity
/// O(d log d) for a row of d moves.
pub(super) fn quantise(row: Row<'_>) -> Vec<Level> {
    match row.weights {
        Weights::Narrow { numerators, denominator } => {
            let is_rare = |weight: u64| u128::from(weight) << RARE_BITS < u128::from(denominator);
            if numerators.iter().any(|weight| is_rare(*weight)) {
                let numerators = numerators.iter().map(|weight| UBig::from(*weight)).collect();
                return levels(row.targets.to_vec(), numerators, UBig::from(denominator));
            }
            let denominator = u128::from(denominator);
            let scaled = numerators.iter().map(|weight| u128::from(*weight) << 64);
            let (floors, remainders): (Vec<_>, Vec<_>) =
                scaled.map(|part| (part / denominator, part % denominator)).unzip();
            let draws = hand_out_remainders(floors, &remainders, DRAWS);
            vec![Level { targets: row.targets.to_vec(), draws, escape: 0 }]
        }
        Weights::Wide { numerators, denominator } => {
            levels(row.targets.to_vec(), numerators.to_vec(), denominator.clone())
        }
    }
}

/// The general case: any size of weights, rare ones among them.
fn levels(mut targets: Vec<u32>, mut numerators: Vec<UBig>, mut denominator: UBig) -> Vec<Level> {
    let mut levels = Vec::with_capacity(2);
    loop {
        let is_rare = |weight: &UBig| weight << RARE_BITS < denominator;
        let rare: UBig = numerators.iter().filter(|weight| is_rare(weight)).sum::<UBig>() << 64;
        let escape = if rare == UBig::ZERO {
            0
        } else {
            let needed = (&rare + &denominator - UBig::ONE) / &denominator;
            // The padding is large enough not to be rare itself at the next level, which could go on for ever.
            to_draws(&needed) + (DRAWS >> RARE_BITS)
        };
        let escaping = &denominator * UBig::from(escape);
        // Rows have fewer than 2³² moves, so the heaviest is far from rare and can lend the padding.
        let heaviest = (0..numerators.len()).max_by_key(|i| (&numerators[*i], Reverse(*i))).unwrap_or(0);
        let padding = &escaping - &rare;

        let mut level = Level { targets: Vec::new(), draws: Vec::new(), escape };
        let (mut floors, mut remainders) = (Vec::new(), Vec::new());
        let (mut next_targets, mut next_numerators) = (Vec::new(), Vec::new());
        for (i, (target, weight)) in targets.iter().zip(&numerators).enumerate() {
            let mut scaled = weight << 64;
            if is_rare(weight) {
                next_targets.push(*target);
                next_numerators.push(scaled);
                continue;
            }
            if i == heaviest {
                scaled -= &padding;
            }
            level.targets.push(*target);
            floors.push(to_draws(&(&scaled / &denominator)));
            remainders.push(scaled % &denominator);
        }
        level.draws = hand_out_remainders(floors, &remainders, DRAWS - escape);
        levels.push(level);
        if escape == 0 {
            return levels;
        }
        next_targets.push(targets[heaviest]);
        next_numerators.push(padding);
        (targets, numerators, denominator) = (next_targets, next_numerators, escaping);
    }
}

/// At most 2⁶⁴ by construction.
fn to_draws(value: &UBig) -> u128 {
    u128::try_from(value).unwrap_or(DRAWS)
}

/// Largest remainder: what the floors leave of `total` goes to the largest remainders, one each.
fn hand_out_remainders<R: Ord>(mut floors: Vec<u128>, remainders: &[R], total: u128) -> Vec<u128> {
    // The remainders are below the divisor and sum to `left` times it, so more than `left` of them are positive.
    let left = (total - floors.iter().sum::<u128>()) as usize;
    if left > 0 {
        let mut order: Vec<usize> = (0..floors.len()).collect();
        order.sort_by_key(|i| (Reverse(&remainders[*i]), *i));
        order[..left].iter().for_each(|i| floors[*i] += 1);
    }
    floors
}

#[cfg(test)]
pub(super) mod tests {
    use dashu_int::IBig;
    use dashu_ratio::RBig;
    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::*;

    /// Weights with their own sum as the denominator, of any spread.
    pub(in super::super) struct OwnedRow {
        targets: Vec<u32>,
        narrow: Vec<u64>,
        wide: Vec<UBig>,
        sum: UBig,
    }

    impl OwnedRow {
        pub(in super::super) fn narrow(weights: &[u64]) -> Self {
            let sum: u64 = weights.iter().sum();
            Self { targets: targets(weights.len()), narrow: weights.to_vec(), wide: Vec::new(), sum: sum.into() }
        }

        pub(in super::super) fn wide(weights: Vec<UBig>) -> Self {
            let sum = weights.iter().sum();
            Self { targets: targets(weights.len()), narrow: Vec::new(), wide: weights, sum }
        }

        pub(in super::super) fn row(&self) -> Row<'_> {
            let weights = if self.wide.is_empty() {
                Weights::Narrow { numerators: &self.narrow, denominator: u64::try_from(&self.sum).unwrap() }
            } else {
                Weights::Wide { numerators: &self.wide, denominator: &self.sum }
            };
            Row { targets: &self.targets, weights }
        }
    }

    fn targets(n: usize) -> Vec<u32> {
        (0..n as u32).collect()
    }

    /// Rows of every shape that the tables must survive; the generator's seed is fixed.
    pub(in super::super) fn assorted_rows() -> Vec<OwnedRow> {
        let mut rng = Lcg128CmDxsm64::new(2024, 7);
        let mut rows = vec![
            OwnedRow::narrow(&[1]),
            OwnedRow::narrow(&[1, 1]),
            OwnedRow::narrow(&[1, 2]),
            OwnedRow::narrow(&[1; 8]),
            OwnedRow::narrow(&[1, u64::MAX - 1]),
            OwnedRow::narrow(&[1, 1 << 40]),
            OwnedRow::narrow(&[1, 1 << 20, 1 << 62, 1 << 30]),
            OwnedRow::wide(vec![UBig::from(10_u8).pow(30) - UBig::ONE, UBig::ONE]),
            OwnedRow::wide(vec![UBig::ONE, UBig::ONE << 41, UBig::ONE << 90, UBig::from(3_u8), UBig::ONE << 500]),
        ];
        for n in [2, 3, 4, 5, 7, 8, 9, 31, 33, 64, 100, 257, 3000] {
            let even = (0..n).map(|_| 1 + rng.next_u64() % 1000).collect::<Vec<_>>();
            let skewed = (0..n).map(|_| 1 + (rng.next_u64() >> (12 + rng.next_u64() % 52))).collect::<Vec<_>>();
            let spread = (0..n).map(|_| UBig::from(rng.next_u64() | 1) << (rng.next_u64() % 200) as usize).collect();
            rows.extend([OwnedRow::narrow(&even), OwnedRow::narrow(&skewed), OwnedRow::wide(spread)]);
        }
        rows
    }

    /// The exact probability of each target under draws from the levels.
    fn realised(levels: &[Level], moves: usize) -> Vec<RBig> {
        let share = |draws: u128| RBig::from_parts(IBig::from(draws), UBig::from(DRAWS));
        let mut probabilities = vec![RBig::ZERO; moves];
        let mut reached = RBig::ONE;
        for level in levels {
            for (target, draws) in level.targets.iter().zip(&level.draws) {
                probabilities[*target as usize] += &reached * share(*draws);
            }
            reached *= share(level.escape);
        }
        probabilities
    }

    #[test]
    fn levels_are_full_and_every_move_keeps_its_relative_size() {
        let mut escapes = 0;
        for owned in assorted_rows() {
            let row = owned.row();
            let levels = quantise(row);
            escapes += levels.len() - 1;
            for level in &levels {
                assert_eq!(level.draws.iter().sum::<u128>() + level.escape, DRAWS);
                assert!(level.draws.iter().all(|draws| *draws > 0));
            }
            assert_eq!(levels.last().unwrap().escape, 0);
            for (i, realised) in realised(&levels, row.targets.len()).into_iter().enumerate() {
                let exact = row.probability(i);
                let error = if realised > exact { &realised - &exact } else { &exact - &realised };
                let units = if levels.len() > 1 { 2_u8 } else { 1 };
                assert!(error < RBig::from_parts(IBig::from(units), UBig::from(DRAWS)), "absolute");
                assert!(error * RBig::from(1_u64 << 24) < exact, "relative");
            }
        }
        assert!(escapes > 20, "rare moves were not tried: {escapes}");
    }

    // 2⁶⁴ = 3 · 6148914691236517205 + 1: the one draw left goes to the first of three equal remainders.
    #[test]
    fn ties_go_to_the_lower_index_and_a_lone_move_takes_every_draw() {
        let third = 6_148_914_691_236_517_205;
        assert_eq!(quantise(OwnedRow::narrow(&[1, 1, 1]).row())[0].draws, [third + 1, third, third]);
        assert_eq!(quantise(OwnedRow::narrow(&[5]).row())[0].draws, [DRAWS]);
    }

    #[test]
    fn both_kinds_of_weights_quantise_alike() {
        for weights in [vec![1, 2, 4], vec![7, 7, 7, 1 << 50], (1..50).collect()] {
            let wide = OwnedRow::wide(weights.iter().map(|weight| UBig::from(*weight)).collect());
            assert_eq!(quantise(OwnedRow::narrow(&weights).row()), quantise(wide.row()));
        }
    }

    // 2⁻⁴¹ asks for 2²³ draws, so E = 2²³ + 2²⁴, of which it keeps a third.
    #[test]
    fn an_escape_holds_the_rare_moves_and_their_padding() {
        let levels = quantise(OwnedRow::narrow(&[1, (1 << 41) - 1]).row());
        assert_eq!(levels[0], Level { targets: vec![1], draws: vec![DRAWS - (3 << 23)], escape: 3 << 23 });
        let third = DRAWS / 3;
        assert_eq!(levels[1], Level { targets: vec![0, 1], draws: vec![third, DRAWS - third], escape: 0 });
    }

    // With an escape of exactly 2⁻⁴⁰ the padding of this row would be as rare as the move, and so on without an end.
    #[test]
    fn levels_come_to_an_end() {
        assert_eq!(quantise(OwnedRow::narrow(&[1, 1 << 40]).row()).len(), 2);
    }
}
