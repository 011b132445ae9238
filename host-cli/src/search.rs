//! Complete decision by branch and bound over the core's node test.
//!
//! The root is the controller's single interval, tested by the same code with the same integers.
//! Parts that stay open are searched for a posture, then cut. Parts are taken in an order that
//! does not depend on the number of threads, so neither does the answer.

use crate::kinematics;
use crate::model::{Machine, Target};
use crate::pack::{Pack, PackError, pack, pack_target};
use crate::posture::Linkage;
use balk_core::machine::Motion;
use balk_core::propagate::cell::{Cell, JointSpan};
use balk_core::propagate::{Branch, Goal, Network, Spans};
use balk_core::record::{RecordBytes, fingerprint, record};
use balk_core::relaxation::{NodeSimplex, Relaxed, guess};
use balk_core::screen::{self, Options, Step, Tested, Workspace8, cells_for};
use rayon::prelude::*;
use sha2::{Digest, Sha256};
use std::f64::consts::TAU;
use std::time::Instant;

/// Parts looked at one after the other before several are looked at at once.
const ALONE: u64 = 64;
/// Parts looked at at once. Fixed, so that the answer does not depend on the threads.
const BATCH: usize = 16;
/// Postures tried at the root, and at every other part.
const STARTS: (u32, u32) = (8, 2);
/// Squared residual (metres and radians) below which a posture is worth verifying.
const CLOSE: f64 = 1e-18;
/// One as the core's fixed point has it.
const ONE: f64 = (1u64 << 30) as f64;

/// Answers questions about one tip of one machine. Cheap to share between threads.
pub struct Solver {
    machine: Machine,
    fingerprint: u64,
    linkage: Linkage,
    /// The packed chain.
    pub pack: Pack,
    /// What a node test may spend and by which rules; `splits` is not looked at.
    pub options: Options,
}

/// Answer of the complete search.
#[derive(Clone, Debug)]
pub struct Decision {
    /// What was found.
    pub verdict: Verdict,
    /// Parts of the joint space tested.
    pub nodes: u64,
    /// Wall-clock time.
    pub seconds: f64,
}

/// The three answers.
#[derive(Clone, Debug, PartialEq)]
pub enum Verdict {
    /// This posture meets the target.
    Reachable {
        /// Value of every joint of the machine in file order, radians or metres; 0 where fixed.
        joints: Vec<f64>,
    },
    /// Neither was shown.
    Undecided {
        /// Why the search stopped.
        reason: &'static str,
    },
    /// No posture within limits meets the target.
    Unreachable {
        /// SHA-256 of machine, target and the tree of parts.
        proof: [u8; 32],
    },
}

/// The controller's answer.
#[derive(Clone, Debug, PartialEq)]
pub enum Screening {
    /// Nothing was proved.
    Passed {
        /// Why.
        reason: &'static str,
    },
    /// Proved unreachable.
    Refused {
        /// The record a controller would log, as the first of its log.
        record: RecordBytes,
    },
}

/// What became of a part.
enum Outcome {
    /// Shown empty.
    Closed(Step),
    /// Cut; the parts that are still open, the one with most left to do last.
    Cut { variable: usize, open: Vec<Spans> },
    /// A posture meets the target.
    Found(Vec<f64>),
    /// Too narrow to cut.
    Narrow,
}

/// One thread's working memory.
struct Scratch {
    cells: Vec<Cell>,
    simplex: NodeSimplex,
}

impl Solver {
    /// Packs the chain to a tip.
    ///
    /// # Errors
    /// See [`PackError`].
    pub fn new(machine: &Machine, tip: usize) -> Result<Solver, PackError> {
        let pack = pack(machine, tip)?;
        Ok(Solver {
            fingerprint: fingerprint(&pack.machine),
            linkage: Linkage::new(machine, tip, &pack.drives),
            machine: machine.clone(),
            pack,
            options: Options::default(),
        })
    }

    /// What a controller answers with at most `splits` parts of the joint space.
    pub fn screen(&self, target: &Target, splits: u16) -> Screening {
        let options = Options {
            splits,
            ..self.options
        };
        self.screen_packed(&pack_target(target, self.pack.scale), &options)
    }

    /// What a controller answers to a target it has received.
    pub fn screen_packed(
        &self,
        target: &balk_core::target::Target,
        options: &Options,
    ) -> Screening {
        let mut workspace = Box::new(Workspace8::new());
        match screen::screen(&self.pack.machine, target, options, &mut workspace) {
            screen::Verdict::Passed(reason) => Screening::Passed {
                reason: reason.text(),
            },
            screen::Verdict::Refused(refusal) => Screening::Refused {
                record: record(self.fingerprint, target, options, &refusal),
            },
        }
    }

    /// Fingerprint of the packed chain, as records carry it.
    pub fn fingerprint(&self) -> u64 {
        self.fingerprint
    }

    /// Decides one target with at most `nodes` parts of the joint space.
    pub fn decide(&self, target: &Target, nodes: u64) -> Decision {
        let clock = Instant::now();
        let packed = pack_target(target, self.pack.scale);
        let goal = Goal::new(&packed);
        let mut scratch = self.scratch();
        let mut tree = Sha256::new();
        tree.update(self.fingerprint.to_le_bytes());
        tree.update(format!("{packed:?}"));
        let mut count = 0;
        let mut open = vec![screen::limits(self.pack.machine.chain())];
        let verdict = loop {
            if open.is_empty() {
                break Verdict::Unreachable {
                    proof: tree.finalize().into(),
                };
            }
            if count >= nodes {
                break Verdict::Undecided {
                    reason: "node budget",
                };
            }
            let batch = if count < ALONE { 1 } else { BATCH };
            let taken = open.split_off(open.len().saturating_sub(batch));
            let starts = if count == 0 { STARTS.0 } else { STARTS.1 };
            count += taken.len() as u64;
            let outcomes: Vec<Outcome> = if let [spans] = &taken[..] {
                vec![self.examine(target, &goal, spans, starts, &mut scratch)]
            } else {
                taken
                    .par_iter()
                    .map_init(
                        || self.scratch(),
                        |scratch, spans| self.examine(target, &goal, spans, starts, scratch),
                    )
                    .collect()
            };
            let mut stopped = None;
            for outcome in outcomes {
                match outcome {
                    Outcome::Closed(step) => tree.update(format!("{step:?}")),
                    Outcome::Cut {
                        variable,
                        open: parts,
                    } => {
                        tree.update(format!("{variable}/{}", parts.len()));
                        // Parts closed by the cut itself were looked at too.
                        count += 2 - parts.len() as u64;
                        open.extend(parts);
                    }
                    Outcome::Found(joints) => {
                        stopped.get_or_insert(Verdict::Reachable { joints });
                    }
                    Outcome::Narrow => {
                        stopped.get_or_insert(Verdict::Undecided {
                            reason: "a part is too narrow to cut",
                        });
                    }
                }
            }
            if let Some(verdict) = stopped {
                break verdict;
            }
        };
        Decision {
            verdict,
            nodes: count,
            seconds: clock.elapsed().as_secs_f64(),
        }
    }

    fn scratch(&self) -> Scratch {
        Scratch {
            cells: vec![Cell::ANYTHING; cells_for(self.pack.machine.joints.len())],
            simplex: NodeSimplex::new(),
        }
    }

    /// Tests a part, looks for a posture in it, cuts it.
    fn examine(
        &self,
        target: &Target,
        goal: &Goal,
        spans: &Spans,
        starts: u32,
        scratch: &mut Scratch,
    ) -> Outcome {
        let chain = self.pack.machine.chain();
        let mut network = Network::new(chain, goal, self.options.rules, &mut scratch.cells);
        let mut spans = spans.clone();
        let simplex = &mut scratch.simplex;
        let relaxed = match screen::test(&mut network, &mut spans, simplex, self.options.pivots) {
            Tested::Bounds(_) => return Outcome::Closed(Step::Bounds),
            Tested::Rows(_) => return Outcome::Closed(Step::Rows),
            Tested::Open(relaxed) => relaxed,
        };
        let point = (relaxed == Relaxed::Feasible && self.options.pivots > 0)
            .then(|| guess(simplex, chain.variables.len()));
        for start in 0..starts {
            let at = match (&point, start) {
                (Some(sines), 0) => self.values(&spans, |v, _| Place::Sine(sines[v] as f64 / ONE)),
                _ => self.values(&spans, |v, _| Place::Part(spread(start, v))),
            };
            if let Some(joints) = self.verified(target, at) {
                return Outcome::Found(joints);
            }
        }
        match network.branch(&spans, self.options.candidates.into()) {
            Branch::Narrow => Outcome::Narrow,
            Branch::Cut {
                variable,
                lower,
                upper,
            } => {
                let mut open: Vec<Spans> = [lower, upper].into_iter().flatten().collect();
                open.sort_by(|a, b| network.effort(a).total_cmp(&network.effort(b)));
                Outcome::Cut { variable, open }
            }
        }
    }

    /// Seeks a posture from the given leading joint values and verifies it.
    fn verified(&self, target: &Target, mut values: Vec<f64>) -> Option<Vec<f64>> {
        if self.linkage.seek(target, &mut values) > CLOSE {
            return None;
        }
        let mut joints = vec![0.0; self.machine.joints.len()];
        for (drive, value) in self.pack.drives.iter().zip(values) {
            joints[drive.joint] = value;
        }
        let joints = kinematics::joint_values(&self.machine, &joints);
        kinematics::meets(&self.machine, target, &joints, kinematics::ALLOWANCE).then_some(joints)
    }

    /// Leading joint values at a place in every span, brought within limits.
    fn values(&self, spans: &Spans, place: impl Fn(usize, &JointSpan) -> Place) -> Vec<f64> {
        spans
            .iter()
            .zip(&self.pack.drives)
            .zip(&self.pack.machine.variables)
            .enumerate()
            .map(|(v, ((span, drive), variable))| {
                let place = place(v, span);
                let value = match variable.motion {
                    Motion::Slide => {
                        let (lo, hi) = (span.length.lo as f64 / ONE, span.length.hi as f64 / ONE);
                        let at = match place {
                            Place::Part(part) => lo + (hi - lo) * part,
                            Place::Sine(off) => (lo + hi) / 2.0 + off,
                        };
                        at * self.pack.scale
                    }
                    Motion::Turn => {
                        let angle = |d: balk_core::fixed::Direction| (d.y as f64).atan2(d.x as f64);
                        let lo = angle(span.arc.lo);
                        let width = if span.arc.full {
                            TAU
                        } else {
                            (angle(span.arc.hi) - lo).rem_euclid(TAU)
                        };
                        match place {
                            Place::Part(part) => lo + width * part,
                            Place::Sine(sine) => lo + width / 2.0 + sine.clamp(-1.0, 1.0).asin(),
                        }
                    }
                };
                let joint = drive.multiple * value + drive.offset;
                match variable.motion {
                    Motion::Slide => joint.clamp(drive.limits[0], drive.limits[1]),
                    Motion::Turn => within(joint, drive.limits, TAU * drive.multiple),
                }
            })
            .collect()
    }
}

/// Where in a span a start lies.
enum Place {
    /// At this share of the width from the lower end.
    Part(f64),
    /// At this sine of the angle (or this length) from the middle.
    Sine(f64),
}

/// The middle first, then an even spread over the spans (additive recurrence with the roots of
/// `x^9 = x + 1`, which suits up to eight dimensions).
fn spread(start: u32, variable: usize) -> f64 {
    const ROOT: f64 = 1.085_070_245_491_450_8;
    (0.5 + f64::from(start) * ROOT.powi(-(variable as i32 + 1))).fract()
}

/// The same direction within the limits, or the nearest limit.
fn within(joint: f64, [lo, hi]: [f64; 2], period: f64) -> f64 {
    if !lo.is_finite() {
        return joint.min(hi);
    }
    let up = joint + ((lo - joint) / period).ceil() * period;
    if up <= hi {
        up
    } else if up - hi < lo - (up - period) {
        hi
    } else {
        lo
    }
}
