//! Exact answers with proven bounds. (Docs to come.)

mod answers;
mod bounded;
mod dd;
mod elimination;
mod envelope;
mod error;
mod kernel;
mod law;
mod linear;
mod reference;
mod shape;
mod support;

pub use answers::{Exact, Request};
pub use bounded::Bounded;
pub use error::{ExactError, LawRefusal};
pub use law::Law;
pub use shape::Shape;
