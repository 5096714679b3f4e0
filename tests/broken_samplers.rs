//! Samplers that are wrong on purpose are found, and the right one is not accused.

mod chains;

use tallystone::compare::{Comparison, Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Draft, Model, Progress, Silent};
use tallystone::sampling::{Interrupted, OutcomeSource, Plan, Sampler, Streams, Tally, sample_with};

/// A bench with a rework loop, taken with the given probability.
fn bench(rework: &str) -> Model {
    let mut draft = Draft::new("bench");
    draft.start("intake");
    draft.moves("intake", "diagnose", "0.92");
    draft.moves("intake", "scrapped", "rest");
    draft.moves("diagnose", "board", "5/12");
    draft.moves("diagnose", "test", "rest");
    draft.moves("board", "test", "0.9");
    draft.moves("board", "scrapped", "rest");
    draft.moves("test", "diagnose", rework);
    draft.moves("test", "shipped", "rest");
    draft.absorbing("shipped");
    draft.absorbing("scrapped");
    draft.check().unwrap()
}

/// Compares what a source samples with the exact answers of a model.
fn compare(
    model: &Model,
    source: &dyn OutcomeSource,
    settings: &Settings,
    seeds: std::ops::Range<u64>,
) -> Vec<Comparison> {
    let exact = Exact::solve(model, &Request::of(model, &Study::quantities(model, settings)), &Silent).unwrap();
    let study = Study::new(&exact, settings).unwrap();
    let replications = study.plan().replications.expect("default rows can all be decided");
    seeds
        .map(|seed| {
            let plan = Plan { replications, seed, grid: study.grid() };
            study.compare(&sample_with(source, &plan, &Silent).unwrap(), Vec::new())
        })
        .collect()
}

/// Counts one step too many in every replication.
struct OneStepMore(Sampler);

impl OutcomeSource for OneStepMore {
    fn ends(&self) -> usize {
        self.0.ends()
    }

    fn block(
        &self,
        streams: Streams,
        block: u64,
        replications: u64,
        tally: &mut Tally,
        progress: &dyn Progress,
    ) -> Result<(), Interrupted> {
        let mut rng = streams.block(block);
        for _ in 0..replications {
            let outcome = self.0.walk(&mut rng, progress)?;
            tally.add(outcome.end as usize, outcome.time + 1);
        }
        Ok(())
    }
}

#[test]
fn a_biased_move_disagrees() {
    let (right, wrong) = (bench("0.25"), bench("0.28"));
    for comparison in compare(&right, &Sampler::new(wrong.chain()), &Settings::default(), 0..5) {
        assert_eq!(comparison.verdict, Verdict::Disagree);
    }
}

#[test]
fn one_step_too_many_disagrees() {
    let right = bench("0.25");
    for comparison in compare(&right, &OneStepMore(Sampler::new(right.chain())), &Settings::default(), 0..5) {
        assert_eq!(comparison.verdict, Verdict::Disagree);
        let ends: Vec<_> =
            comparison.rows.iter().filter(|row| row.quantity.name() == "absorption_probability").collect();
        assert!(!ends.is_empty() && ends.iter().all(|row| row.verdict == Verdict::Agree), "the ends are right");
    }
}

#[test]
fn hundreds_of_seeds_of_the_correct_sampler_never_disagree_and_mostly_agree() {
    // With tolerances above zero a false "disagree" at the planned size has odds below 1e-12 a table: none may occur in
    // 400. The plan promises "agree" in 95 of 100, and the sum over rows is an upper bound: 400 tables with fewer than 360
    // that agree would have odds below 1e-6 if the promise held (binomial, exact sum).
    let right = bench("0.25");
    let comparisons = compare(&right, &Sampler::new(right.chain()), &Settings::default(), 0..400);
    assert!(comparisons.iter().all(|comparison| comparison.verdict != Verdict::Disagree));
    let agreed = comparisons.iter().filter(|comparison| comparison.verdict == Verdict::Agree).count();
    assert!(agreed >= 360, "{agreed}");
}

#[test]
fn without_tolerance_the_error_rate_is_kept() {
    use tallystone::model::{Tolerance, ToleranceKey};
    // Every tolerance 0: now "disagree" means that some interval misses the truth, which happens in at most one table in
    // ten. At a rate of 0.1, 400 tables disagree more than 65 times with odds below 1e-4 (binomial, exact sum).
    let right = bench("0.25");
    let mut settings = Settings { error_rate: 0.1, ..Settings::default() };
    for name in ["absorption_probability", "mean_time", "variance_time", "mean_time_given", "time_quantile"] {
        settings.tolerances.set(ToleranceKey::All(name.into()), Tolerance::Absolute(0.0));
    }
    let exact = Exact::solve(&right, &Request::of(&right, &Study::quantities(&right, &settings)), &Silent).unwrap();
    let study = Study::new(&exact, &settings).unwrap();
    let sampler = Sampler::new(right.chain());
    let alarms = (0..400)
        .filter(|seed| {
            let plan = Plan { replications: 65_536, seed: 1000 + seed, grid: study.grid() };
            let tally = sample_with(&sampler, &plan, &Silent).unwrap();
            study.compare(&tally, Vec::new()).verdict == Verdict::Disagree
        })
        .count();
    assert!(alarms <= 65, "{alarms}");
}
