//! Walks through a proof.

use std::sync::{Arc, Mutex};

use crate::exact::function;
use crate::exact::interval::{Interval, grains};
use crate::geometry::{FrameError, Geometry};
use crate::known::{Known, image};
use crate::machine::{self, Amount, Chain, Kind, Machine, ReadError, Variable};
use crate::problem::Problem;
use crate::proof::{Claim, Frame, Item, Proof, Quantity, Span, Step};
use crate::rule;
use crate::target::{Target, TargetError};
use crate::text;
use crate::wanted::Wanted;

/// Deepest nesting of splits.
const MAX_DEPTH: usize = 200;

/// What was checked.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Report {
    /// Steps.
    pub steps: usize,
    /// Splits.
    pub splits: usize,
}

/// Why a proof is not accepted.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Rejection {
    /// The digest is not this chain's.
    #[error("the proof is of another machine")]
    Machine,
    /// Another tip.
    #[error("the proof is of another tip")]
    Tip,
    /// The proof's target is not the one given.
    #[error("the proof is of another target")]
    Target,
    /// A target is not read.
    #[error("the target is not read: {0}")]
    Unread(#[from] TargetError),
    /// Not one frame for each moving joint, or not one span for each variable.
    #[error("wrong number of frames or root spans")]
    Count,
    /// A frame's third axis is not the joint's axis.
    #[error("frame {0} is off the joint's axis")]
    FrameOffAxis(usize),
    /// The root does not cover what a variable may be.
    #[error("the root does not cover variable {0}")]
    Root(usize),
    /// An item is wrong.
    #[error("item {index}, `{text}`: {reason}")]
    Item {
        /// Place in the list of items, from 0.
        index: usize,
        /// The item as text.
        text: String,
        /// What is wrong.
        reason: Reason,
    },
    /// The items end before every branch does.
    #[error("{0} branches have no end")]
    Unclosed(usize),
}

/// Why an item is not accepted.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Reason {
    /// This machine and target have no such relation, quantity or variable.
    #[error("there is no such relation or quantity here")]
    NoSuch,
    /// The rule says nothing of the quantity.
    #[error("the rule says nothing of the quantity")]
    NotInRelation,
    /// The quantity stands in more than one product, or in a square of a sum.
    #[error("the quantity stands in more than one product")]
    Ambiguous,
    /// A factor of the quantity may be zero, or a direction is that of a box with zero.
    #[error("a factor may be zero")]
    TouchesZero,
    /// The claim says more than what follows.
    #[error("only this follows: {0}")]
    DoesNotFollow(String),
    /// The claim leaves no value of its quantity or a coupled one, but does not say so.
    #[error("the claim leaves nothing and should say none")]
    LeavesNothing,
    /// A split at a place that the variable cannot take.
    #[error("the split is outside of what is known")]
    SplitOutside,
    /// Too many splits in each other.
    #[error("too deep")]
    TooDeep,
    /// Every branch has ended before.
    #[error("every branch has ended before")]
    AfterEnd,
}

/// Checks proofs of one tip of one machine.
pub struct Checker {
    chain: Chain,
    tip: String,
    only_tip: bool,
    digest: [u8; 32],
    geometry: Mutex<Option<(Vec<Frame>, Arc<Geometry>)>>,
}

/// Checks `proof` for one tip of the machine that `machine` writes and for the target on `line`.
///
/// # Errors
///
/// The machine cannot be read, or the proof does not hold.
pub fn check(
    proof: &Proof,
    machine: &str,
    tip: &str,
    line: &str,
) -> Result<Result<Report, Rejection>, ReadError> {
    Ok(Checker::new(machine, tip)?.check(proof, line))
}

/// SHA-256 of the chain of `tip` (`FORMAT.md`, section 9).
///
/// # Errors
///
/// The machine cannot be read or has no such tip.
pub fn chain_digest(machine: &str, tip: &str) -> Result<[u8; 32], ReadError> {
    Ok(machine::digest(&Chain::new(&Machine::read(machine)?, tip)?))
}

impl Checker {
    /// Reads the machine that `machine` writes and the chain of `tip`.
    ///
    /// # Errors
    ///
    /// The machine cannot be read or has no such tip.
    pub fn new(machine: &str, tip: &str) -> Result<Self, ReadError> {
        let machine = Machine::read(machine)?;
        let chain = Chain::new(&machine, tip)?;
        Ok(Self {
            digest: machine::digest(&chain),
            chain,
            tip: tip.to_owned(),
            only_tip: machine.tips.len() == 1,
            geometry: Mutex::new(None),
        })
    }

    /// SHA-256 of the chain.
    pub fn digest(&self) -> [u8; 32] {
        self.digest
    }

    /// Checks `proof` for the target on `line`. Cost: linear in the size of the proof.
    ///
    /// # Errors
    ///
    /// The first thing that is wrong.
    pub fn check(&self, proof: &Proof, line: &str) -> Result<Report, Rejection> {
        if proof.machine != self.digest {
            return Err(Rejection::Machine);
        }
        if proof.tip != self.tip {
            return Err(Rejection::Tip);
        }
        let target = Target::read(line)?;
        let wanted = Wanted::new(&target)?;
        if proof.target != line && Target::read(&proof.target)? != target {
            return Err(Rejection::Target);
        }
        match &target.tip {
            Some(tip) if *tip != self.tip => return Err(Rejection::Tip),
            None if !self.only_tip => return Err(Rejection::Tip),
            _ => {}
        }
        let geometry = self.geometry(&proof.frames)?;
        let root = self.root(&proof.root)?;
        let slides = self.chain.moving.iter().filter_map(|joint| {
            let span = root.get(joint.drive.variable)?;
            (joint.kind == Kind::Prismatic).then(|| image(&joint.drive, span).size())
        });
        let problem = Problem {
            rho: slides.fold(geometry.reach.clone(), |sum, size| sum + size),
            chain: &self.chain,
            geometry: &geometry,
            wanted: &wanted,
        };
        walk(&problem, &root, &proof.items)
    }

    /// The links between the places of `frames`; those of the last proof are kept.
    fn geometry(&self, frames: &[Frame]) -> Result<Arc<Geometry>, Rejection> {
        let mut kept = match self.geometry.lock() {
            Ok(kept) => kept,
            // Another thread stopped while holding it; what it holds is always whole.
            Err(poisoned) => poisoned.into_inner(),
        };
        if let Some((of, geometry)) = &*kept
            && of == frames
        {
            return Ok(Arc::clone(geometry));
        }
        let geometry = match Geometry::new(&self.chain, frames) {
            Ok(geometry) => Arc::new(geometry),
            Err(FrameError::Count) => return Err(Rejection::Count),
            Err(FrameError::OffAxis(joint)) => return Err(Rejection::FrameOffAxis(joint)),
        };
        *kept = Some((frames.to_vec(), Arc::clone(&geometry)));
        Ok(geometry)
    }

    /// The root's spans, if they cover what the variables may be.
    fn root(&self, root: &[Span]) -> Result<Vec<Interval>, Rejection> {
        if root.len() != self.chain.variables.len() {
            return Err(Rejection::Count);
        }
        let mut spans = Vec::new();
        for (place, (span, variable)) in root.iter().zip(&self.chain.variables).enumerate() {
            let span = Interval::of_span(*span);
            if span.is_empty() || !self.covers(&span, place, variable) {
                return Err(Rejection::Root(place + 1));
            }
            spans.push(span);
        }
        Ok(spans)
    }

    /// Whether `span` has every value of the variable, or as many as the machine has postures.
    fn covers(&self, span: &Interval, place: usize, variable: &Variable) -> bool {
        if variable.limits.is_empty() {
            let driven = self.chain.moving.iter();
            let mut driven = driven.filter(|joint| joint.drive.variable == place);
            if driven.clone().any(|joint| joint.kind != Kind::Revolute) {
                return false;
            }
            let turns = driven.try_fold(dashu_int::UBig::ONE, |all, joint| {
                let denominator = joint.drive.ratio.denominator();
                let divisor = dashu_int::ops::Gcd::gcd(&all, denominator);
                Some(all / divisor * denominator)
            });
            return turns
                .is_some_and(|turns| span.width() >= function::turn().scale(&turns.into()).hi);
        }
        // The values within all limits lie between the largest lower and the least upper one.
        let ends: Vec<Interval> = variable.limits.iter().map(allowed).collect();
        let lower = ends.iter().map(|range| &range.lo).max();
        let upper = ends.iter().map(|range| &range.hi).min();
        lower.is_some_and(|lower| span.lo <= *lower) && upper.is_some_and(|upper| span.hi >= *upper)
    }
}

/// Values of the variable for which a joint that follows it is within its limits, enclosed.
fn allowed(limit: &machine::Limit) -> Interval {
    let inverse = dashu_ratio::RBig::ONE / &limit.ratio;
    let minus = Amount::zero();
    let ends = limit.range.each_ref().map(|end| {
        let moved = limit.offset.times_plus(&dashu_ratio::RBig::from(-1), end);
        moved.times_plus(&inverse, &minus).enclosure()
    });
    ends[0].hull(&ends[1])
}

/// A split whose second part is still to be walked.
struct Fork {
    mark: usize,
    variable: Quantity,
    upper: Interval,
}

fn walk(problem: &Problem, root: &[Interval], items: &[Item]) -> Result<Report, Rejection> {
    let mut known = Known::new(problem, root);
    let mut forks: Vec<Fork> = Vec::new();
    let mut report = Report {
        steps: 0,
        splits: 0,
    };
    let mut open = true;
    for (index, item) in items.iter().enumerate() {
        let reject = |reason| Rejection::Item {
            index,
            text: text::item(item),
            reason,
        };
        if !open {
            return Err(reject(Reason::AfterEnd));
        }
        match item {
            Item::Split { variable, at } => {
                let quantity = Quantity::Variable(*variable);
                if !problem.has(quantity) {
                    return Err(reject(Reason::NoSuch));
                }
                if forks.len() == MAX_DEPTH {
                    return Err(reject(Reason::TooDeep));
                }
                let (bound, at) = (known.get(quantity), grains(*at));
                if at < bound.lo || at > bound.hi {
                    return Err(reject(Reason::SplitOutside));
                }
                forks.push(Fork {
                    mark: known.mark(),
                    variable: quantity,
                    upper: Interval::new(at.clone(), bound.hi),
                });
                if !known.narrow(quantity, Interval::new(bound.lo, at)) {
                    return Err(reject(Reason::LeavesNothing));
                }
                report.splits += 1;
            }
            Item::Step(step) => {
                report.steps += 1;
                if !derive(problem, &mut known, step).map_err(&reject)? {
                    continue;
                }
                match forks.pop() {
                    Some(fork) => {
                        known.take_back(fork.mark);
                        if !known.narrow(fork.variable, fork.upper) {
                            return Err(reject(Reason::LeavesNothing));
                        }
                    }
                    None => open = false,
                }
            }
        }
    }
    if open {
        return Err(Rejection::Unclosed(forks.len() + 1));
    }
    Ok(report)
}

/// Checks `step` and takes it into what is known; true if it ends the branch.
fn derive(problem: &Problem, known: &mut Known, step: &Step) -> Result<bool, Reason> {
    if step.quantity.is_some_and(|quantity| !problem.has(quantity)) {
        return Err(Reason::NoSuch);
    }
    let confined = rule::confine(problem, known, &step.rule, step.quantity)?;
    let Some(quantity) = step.quantity else {
        return match (&step.claim, confined.is_empty()) {
            (Claim::Nothing, true) => Ok(true),
            (Claim::Nothing, false) => Err(Reason::DoesNotFollow("anything".to_owned())),
            _ => Err(Reason::NotInRelation),
        };
    };
    let before = known.get(quantity);
    let follows = before.meet(&confined);
    let mut after = before;
    match step.claim {
        Claim::AtLeast(lo) => after.lo = after.lo.max(grains(lo)),
        Claim::AtMost(hi) => after.hi = after.hi.min(grains(hi)),
        Claim::Within(span) => after = after.meet(&Interval::of_span(span)),
        Claim::Nothing => {
            return if follows.is_empty() {
                Ok(true)
            } else {
                Err(Reason::DoesNotFollow(text::interval(&follows)))
            };
        }
    }
    // `follows` lies in what was known, so it lies in the claim if it lies in both.
    if !follows.is_empty() && (follows.lo < after.lo || follows.hi > after.hi) {
        return Err(Reason::DoesNotFollow(text::interval(&follows)));
    }
    if known.narrow(quantity, after) {
        Ok(false)
    } else {
        Err(Reason::LeavesNothing)
    }
}
