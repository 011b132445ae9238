//! Writing proofs that `balk check` verifies.
//!
//! The prover knows nothing of the search: it narrows the quantities of the proof format over the
//! relations of the proof format (`FORMAT.md` of the checker), in double precision, rounds every
//! claim outward, keeps the steps that are needed and cuts a part in two where it finds no
//! contradiction. It need not be trusted: whoever reads the proof checks it in exact arithmetic.

mod contract;
mod geometry;
mod interval;
mod leaf;
mod network;
mod relations;
mod sum;
mod tree;

use crate::model::{Machine, Target};
use crate::pack::range;
use balk_checker::proof::{PICO, Proof, Span};
use geometry::Chain;
use interval::Interval;
use network::Network;
use std::f64::consts::PI;

/// Why there is no proof. It says nothing about the target.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Unproved {
    /// The budget of parts ran out.
    #[error("the proof would need more than {0} parts")]
    Parts(u64),
    /// A part became too narrow to cut.
    #[error("a part is too narrow to cut")]
    Narrow,
}

/// Writes proofs for one tip of one machine.
pub struct Prover {
    chain: Chain,
    tip: String,
    digest: [u8; 32],
    root: Vec<Span>,
}

/// What a proof is about beside the machine.
pub struct Subject<'a> {
    /// The target.
    pub target: &'a Target,
    /// Its line in the targets file.
    pub line: &'a str,
    /// What the search printed.
    pub search: [u8; 32],
}

impl Prover {
    /// Prepares the chain to a tip; `digest` is the checker's for that chain.
    pub fn new(machine: &Machine, tip: usize, digest: [u8; 32]) -> Prover {
        let chain = Chain::new(machine, tip);
        let unit = PICO as f64;
        let root = chain
            .leaders
            .iter()
            .map(|&lead| {
                let [lo, hi] = range(machine, lead);
                let turns = chain.turns(lead);
                let (lo, hi) = match (lo.is_finite(), hi.is_finite()) {
                    (true, true) => (lo, hi),
                    (true, false) => (lo, lo + 2.0 * PI * turns),
                    (false, true) => (hi - 2.0 * PI * turns, hi),
                    (false, false) => (-PI * turns, PI * turns),
                };
                Span {
                    lo: (lo * unit).floor() as i64 - 2,
                    hi: (hi * unit).ceil() as i64 + 2,
                }
            })
            .collect();
        Prover {
            chain,
            tip: machine.tips[tip].name.clone(),
            digest,
            root,
        }
    }

    /// Proves a target unreachable with at most `parts` parts of the joint space.
    ///
    /// # Errors
    /// [`Unproved`].
    pub fn prove(&self, subject: &Subject, parts: u64) -> Result<Proof, Unproved> {
        let root: Vec<Interval> = self.root.iter().map(tree::interval).collect();
        let network = Network::new(&self.chain, subject.target, &root);
        let items = network.tree(&self.root, parts)?;
        Ok(Proof {
            machine: self.digest,
            tip: self.tip.clone(),
            target: subject.line.to_owned(),
            search: subject.search,
            frames: self.chain.frames.clone(),
            root: self.root.clone(),
            items,
        })
    }
}
