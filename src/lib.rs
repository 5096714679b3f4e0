//! Tallystone checks that a stochastic simulation computes what its model says.
#![cfg_attr(test, allow(missing_docs))]

pub mod audit;
pub mod compare;
pub mod exact;
pub mod model;
pub mod report;
pub mod sampling;
pub mod statistics;

pub mod cli;
