//! Proofs as bytes: `FORMAT.md`, section 8.
//!
//! Reading accepts one spelling only: two accepted byte strings that differ hold different proofs.

mod read;
mod write;

pub use read::read;
pub use write::write;

use crate::proof::{Claim, Item};

const MARK: &[u8] = b"balk";
const VERSION: u8 = 1;
/// Bytes of a digest.
const DIGEST: usize = 32;
/// Longest proof, bytes.
const MAX_SIZE: usize = 64 << 20;

/// Branches that have no end after `item`, if `open` of them had none before.
fn after(item: &Item, open: usize) -> usize {
    match item {
        Item::Split { .. } => open + 1,
        Item::Step(step) => open - usize::from(step.claim == Claim::Nothing),
    }
}
