//! Tallystone checks that a stochastic simulation computes what its model says.
#![cfg_attr(test, allow(missing_docs))]

pub mod model;
