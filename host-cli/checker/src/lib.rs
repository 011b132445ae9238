//! Independent, exact checker of proofs that no posture within limits meets a target.
//!
//! `FORMAT.md` beside this crate defines what a proof is. Nothing here is shared with the search
//! that finds proofs: the machine and the target are read again, every step is checked in exact
//! arithmetic on whole multiples of 10^-24, rounded outward where a quotient, a root, a sine or an
//! irrational constant needs it. No floating point takes part.
//!
//! [`Checker::new`] reads a machine once for many proofs; [`binary`] and [`text`] read and write
//! proofs. A proof that is accepted is a theorem about the model in the machine file; it is a
//! planning aid, not a safety function.

mod arc;
pub mod binary;
mod check;
mod combine;
mod exact;
mod geometry;
mod grammar;
mod known;
mod machine;
mod problem;
pub mod proof;
mod relation;
mod rule;
mod space;
mod spread;
mod target;
pub mod text;
mod wanted;
mod words;

#[cfg(test)]
mod tests;

pub use check::{Checker, Reason, Rejection, Report, chain_digest, check};
pub use grammar::Malformed;
pub use machine::ReadError;
pub use target::TargetError;
