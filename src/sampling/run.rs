//! Samples many blocks on all threads of the current pool.

use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use rayon::iter::{IntoParallelIterator, ParallelIterator};
use thiserror::Error;

use super::grid::Grid;
use super::observed::Observable;
use super::sampler::Sampler;
use super::streams::{BLOCK, Streams};
use super::tally::Tally;
use crate::model::{Progress, Ticks};

/// How much to sample.
#[derive(Debug, Clone)]
pub struct Plan {
    /// Number of replications.
    pub replications: u64,
    /// Seed of the streams.
    pub seed: u64,
    /// Where times are cut.
    pub grid: Arc<Grid>,
}

impl Plan {
    /// Number of blocks, the last of which may be short.
    pub fn blocks(&self) -> u64 {
        self.replications.div_ceil(BLOCK)
    }

    /// Replications in a block of the plan.
    pub fn replications_in(&self, block: u64) -> u64 {
        self.replications.saturating_sub(block.saturating_mul(BLOCK)).min(BLOCK)
    }
}

/// The user asked to stop.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Error)]
#[error("interrupted after {done} replications")]
pub struct Interrupted {
    /// Replications that were finished; their outcomes are gone.
    pub done: u64,
}

/// Where outcomes come from: the [`Sampler`], or another simulator in memory, a broken one in a test for example.
///
/// The outcomes of a block must be a function of the block's stream and number alone, so that a tally does not depend on
/// the threads or on how many blocks there are; and those of fewer replications must be the first of those of more.
///
/// ```
/// use std::sync::Arc;
/// use rand_pcg::rand_core::Rng;
/// use tallystone::model::{Progress, Silent};
/// use tallystone::sampling::{Grid, Interrupted, OutcomeSource, Plan, Streams, Tally, sample_with};
///
/// /// Tosses a coin once.
/// struct Coin;
/// impl OutcomeSource for Coin {
///     fn ends(&self) -> usize {
///         2
///     }
///     fn block(
///         &self, streams: Streams, block: u64, replications: u64, tally: &mut Tally, _progress: &dyn Progress,
///     ) -> Result<(), Interrupted> {
///         let mut rng = streams.block(block);
///         (0..replications).for_each(|_| tally.add((rng.next_u64() >> 63) as usize, 1));
///         Ok(())
///     }
/// }
/// let plan = Plan { replications: 10_000, seed: 1, grid: Arc::new(Grid::new(vec![1])) };
/// let tally = sample_with(&Coin, &plan, &Silent)?;
/// assert!(tally.count(0).abs_diff(5_000) < 300);
/// # Ok::<(), Interrupted>(())
/// ```
pub trait OutcomeSource: Sync {
    /// Number of ends.
    fn ends(&self) -> usize;

    /// What is recorded of every replication besides end and time.
    fn observed(&self) -> Arc<[Observable]> {
        Arc::from([])
    }

    /// The unit in which times are counted.
    fn ticks(&self) -> Ticks {
        Ticks::STEPS
    }

    /// Adds the first `replications` outcomes of a block to a tally.
    ///
    /// # Errors
    /// [`Interrupted`], with the replications of this block that were finished, if `progress` says so half-way. Need only
    /// be looked at when a block can take long.
    fn block(
        &self,
        streams: Streams,
        block: u64,
        replications: u64,
        tally: &mut Tally,
        progress: &dyn Progress,
    ) -> Result<(), Interrupted>;
}

/// Samples a chain.
///
/// The tally is a function of chain, seed, number of replications and [stream version](super::STREAM_VERSION) alone: the
/// same bits on any number of threads. Runs on the current rayon pool.
///
/// # Errors
/// [`Interrupted`] if the user asked to stop.
pub fn sample(sampler: &Sampler, plan: &Plan, progress: &dyn Progress) -> Result<Tally, Interrupted> {
    sample_with(sampler, plan, progress)
}

/// [`sample`] from any source of outcomes.
///
/// # Complexity
/// Memory: a few tallies per thread, however many replications there are.
///
/// # Errors
/// [`Interrupted`] if the user asked to stop.
pub fn sample_with<S: OutcomeSource + ?Sized>(
    source: &S,
    plan: &Plan,
    progress: &dyn Progress,
) -> Result<Tally, Interrupted> {
    progress.begin("sampling", "replications", Some(plan.replications));
    let streams = Streams::new(plan.seed);
    let done = AtomicU64::new(0);
    let observed = source.observed();
    let empty =
        || Tally::observing(source.ends(), Arc::clone(&plan.grid), Arc::clone(&observed)).in_ticks(source.ticks());
    let sampled = (0..plan.blocks())
        .into_par_iter()
        // One tally for each run of consecutive blocks that a thread takes, not for each block: tallies may be large.
        .try_fold(empty, |mut tally, block| {
            if progress.interrupted() {
                return Err(Interrupted { done: 0 });
            }
            let replications = plan.replications_in(block);
            let walked = source.block(streams, block, replications, &mut tally, progress);
            let finished = walked.map_or_else(|stopped| stopped.done, |()| replications);
            done.fetch_add(finished, Ordering::Relaxed);
            progress.advance(finished);
            walked.map(|()| tally)
        })
        // Neighbours are joined in order. The sums are exact, so how the blocks were grouped leaves no trace.
        .try_reduce_with(|mut tally, next| {
            let merged = tally.merge(&next);
            debug_assert_eq!(merged, Ok(()), "all tallies of a run are made alike");
            Ok(tally)
        });
    progress.end();
    let stopped = |_| Interrupted { done: done.load(Ordering::Relaxed) };
    sampled.unwrap_or_else(|| Ok(empty())).map_err(stopped)
}

#[cfg(test)]
mod tests {
    use std::sync::atomic::AtomicBool;

    use super::*;
    use crate::model::{Model, Silent};

    fn workshop() -> Sampler {
        let model = Model::from_toml(
            r#"
            start = { intake = 0.8, test = "rest" }
            absorbing = ["shipped", "scrapped"]
            [moves]
            intake = { repair = "5/12", test = 0.25, scrapped = 1e-13, intake = "rest" }
            repair = { test = 1 }
            test   = { repair = 0.3, shipped = 0.6, scrapped = "rest" }
            "#,
        );
        Sampler::new(model.unwrap().chain())
    }

    fn plan(replications: u64) -> Plan {
        Plan { replications, seed: 1, grid: Arc::new(Grid::new((0..=20).collect())) }
    }

    fn on_threads(threads: usize, replications: u64) -> Tally {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| sample(&workshop(), &plan(replications), &Silent).unwrap())
    }

    // Any change here is a new stream version.
    #[test]
    fn the_tally_of_stream_version_1() {
        assert_eq!(super::super::STREAM_VERSION, 1);
        assert_eq!(on_threads(1, 10_000).digest(), "c10058f4d8ba845ee324faa6c0bb183374fd48bd6d27a08ca8bc86b1ac3203cd");
    }

    #[test]
    fn any_number_of_threads_gives_the_same_bytes() {
        for replications in [0, 1, BLOCK - 1, BLOCK, BLOCK + 1, 50 * BLOCK + 17] {
            let alone = on_threads(1, replications);
            assert_eq!(alone.replications(), replications);
            for threads in [2, 16] {
                assert_eq!(on_threads(threads, replications).to_string(), alone.to_string());
            }
        }
    }

    // The replications of a shorter run are the first ones of a longer run: what is added lies in the last blocks.
    #[test]
    fn a_longer_run_begins_with_the_shorter_one() {
        let sampler = workshop();
        let (short, long) = (plan(2 * BLOCK + 100), plan(3 * BLOCK));
        let tally_of = |plan: &Plan, blocks: std::ops::Range<u64>| {
            let mut tally = Tally::new(2, Arc::clone(&plan.grid));
            for block in blocks {
                let replications = plan.replications_in(block);
                sampler.block(Streams::new(plan.seed), block, replications, &mut tally, &Silent).unwrap();
            }
            tally
        };
        assert_eq!(sample(&sampler, &short, &Silent).unwrap(), tally_of(&short, 0..3));
        let mut rejoined = tally_of(&short, 0..2);
        rejoined.merge(&tally_of(&long, 2..3)).unwrap();
        assert_eq!(sample(&sampler, &long, &Silent).unwrap(), rejoined);
    }

    #[test]
    fn blocks_fill_the_plan_and_the_last_is_short() {
        let plan = plan(2 * BLOCK + 5);
        assert_eq!(plan.blocks(), 3);
        assert_eq!([0, 1, 2, 3].map(|block| plan.replications_in(block)), [BLOCK, BLOCK, 5, 0]);
        assert_eq!(Plan { replications: u64::MAX, ..plan }.replications_in(u64::MAX / BLOCK), BLOCK - 1);
    }

    #[derive(Default)]
    struct Watch {
        advanced: AtomicU64,
        ended: AtomicBool,
        stop_after: Option<u64>,
    }

    impl Progress for Watch {
        fn begin(&self, phase: &str, unit: &str, total: Option<u64>) {
            assert_eq!((phase, unit, total), ("sampling", "replications", Some(100 * BLOCK + 3)));
        }
        fn advance(&self, done: u64) {
            self.advanced.fetch_add(done, Ordering::Relaxed);
        }
        fn end(&self) {
            self.ended.store(true, Ordering::Relaxed);
        }
        fn interrupted(&self) -> bool {
            self.stop_after.is_some_and(|stop| self.advanced.load(Ordering::Relaxed) >= stop)
        }
    }

    #[test]
    fn progress_counts_replications_and_an_interruption_says_how_many_were_done() {
        let watch = Watch::default();
        sample(&workshop(), &plan(100 * BLOCK + 3), &watch).unwrap();
        assert_eq!(watch.advanced.into_inner(), 100 * BLOCK + 3);
        assert!(watch.ended.into_inner());

        let watch = Watch { stop_after: Some(5 * BLOCK), ..Watch::default() };
        let stopped = sample(&workshop(), &plan(100 * BLOCK + 3), &watch).unwrap_err();
        assert_eq!(stopped.done, watch.advanced.into_inner());
        assert!((5 * BLOCK..100 * BLOCK).contains(&stopped.done));
        assert!(watch.ended.into_inner());
    }
}
