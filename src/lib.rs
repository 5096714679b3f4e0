//! Tallystone checks that a stochastic simulation computes what its model says.
//!
//! For any model that is a finite Markov chain ending in absorbing states or closed classes it computes the answers
//! exactly, each with a proven bound; samples the same model in parallel from seeded streams; compares the two with
//! confidence intervals at one error rate for the whole table; and audits the outcomes that another simulator left.
//!
//! # The rooms
//! Each knows only those below it.
//!
//! | room | what it does |
//! | --- | --- |
//! | [`cli`] | arguments, commands, exit statuses, progress |
//! | [`report`] | one finished document; text and JSON |
//! | [`audit`] | outcomes of another simulator |
//! | [`compare`] | rows, tolerances, sizes, verdicts |
//! | [`exact`], [`sampling`] | the two engines, which share nothing but the model |
//! | [`model`], [`statistics`] | the checked chain and its readers; intervals, tests, moments |
//!
//! # Example: a chain in code, checked
//! ```
//! use tallystone::compare::{Settings, Study, Verdict};
//! use tallystone::exact::{Exact, Request};
//! use tallystone::model::{Draft, Silent};
//! use tallystone::sampling::{Plan, Sampler, sample};
//!
//! let mut draft = Draft::new("bench");
//! draft.start("test");
//! draft.moves("test", "shipped", "3/4");
//! draft.moves("test", "repair", "rest");
//! draft.moves("repair", "test", "0.9");
//! draft.moves("repair", "scrapped", "rest");
//! draft.absorbing("shipped");
//! draft.absorbing("scrapped");
//! let model = draft.check()?;
//!
//! let settings = Settings::default();
//! let quantities = Study::quantities(&model, &settings);
//! let exact = Exact::solve(&model, &Request::of(&model, &quantities), &Silent)?;
//! let study = Study::new(&exact, &settings)?;
//! let replications = study.plan().replications.expect("every default row can be decided");
//! let plan = Plan { replications, seed: 1, grid: study.grid() };
//! let tally = sample(&Sampler::new(model.chain()), &plan, &Silent)?;
//! let comparison = study.compare(&tally, Vec::new());
//! assert_eq!(comparison.verdict, Verdict::Agree);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```
#![cfg_attr(test, allow(missing_docs))]

pub mod audit;
pub mod cli;
pub mod compare;
pub mod exact;
pub mod model;
pub mod report;
pub mod sampling;
pub mod statistics;
