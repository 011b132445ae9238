//! Complete decision by branch and bound over the core's node test.

use crate::model::{Machine, Target};
use crate::pack::{Pack, PackError, pack, pack_target};
use crate::posture::Linkage;
use balk_core::propagate::cell::{Cell, JointSpan};
use balk_core::propagate::{Branch, Chain, Goal, Network, Rules, Spans};
use balk_core::relaxation::NodeSimplex;
use std::f64::consts::TAU;

/// Answers questions about one tip of one machine.
pub struct Solver {
    machine: Machine,
    tip: usize,
    /// The packed chain.
    pub pack: Pack,
    linkage: Linkage,
    /// Rules in use.
    pub rules: Rules,
    /// Pivots of the simplex at a node.
    pub pivots: u32,
    /// Cuts tried at each node.
    pub candidates: usize,
}

/// Answer of the complete search.
#[derive(Clone, Debug)]
pub struct Decision {
    /// What was found.
    pub verdict: Verdict,
    /// Nodes examined.
    pub nodes: u64,
    /// Time taken.
    pub seconds: f64,
}

/// The three answers.
#[derive(Clone, Debug)]
pub enum Verdict {
    /// A posture meets the target.
    Reachable {
        /// Value of every joint of the machine, file order.
        joints: Vec<f64>,
    },
    /// Neither was shown.
    Undecided {
        /// Why.
        reason: &'static str,
    },
    /// No posture meets it.
    Unreachable {
        /// Digest of the proof.
        proof: [u8; 32],
    },
}

impl Solver {
    /// Packs the chain to a tip.
    ///
    /// # Errors
    /// See [`PackError`].
    pub fn new(machine: &Machine, tip: usize) -> Result<Solver, PackError> {
        let pack = pack(machine, tip)?;
        let linkage = Linkage::new(machine, tip, &pack.drives);
        Ok(Solver {
            machine: machine.clone(),
            tip,
            pack,
            linkage,
            rules: Rules::ALL,
            pivots: 60,
            candidates: 3,
        })
    }

    /// The packed chain for the core.
    pub fn chain(&self) -> Chain<'_> {
        Chain {
            joints: &self.pack.machine.joints,
            variables: &self.pack.machine.variables,
            tip: &self.pack.machine.tip,
        }
    }

    /// Leading joint values in the middle of the spans.
    fn middle(&self, spans: &Spans) -> Vec<f64> {
        spans
            .iter()
            .zip(&self.pack.drives)
            .zip(&self.pack.machine.variables)
            .map(|((span, drive), variable)| {
                let value = match variable.motion {
                    balk_core::machine::Motion::Slide => {
                        (span.length.lo as f64 + span.length.hi as f64) / 2.0
                            / (1u64 << 30) as f64
                            * self.pack.scale
                    }
                    _ => {
                        let lo = (span.arc.lo.y as f64).atan2(span.arc.lo.x as f64);
                        let mut width =
                            (span.arc.hi.y as f64).atan2(span.arc.hi.x as f64) - lo;
                        if span.arc.full {
                            width = TAU;
                        } else if width < 0.0 {
                            width += TAU;
                        }
                        lo + width / 2.0
                    }
                };
                let joint = drive.multiple * value + drive.offset;
                let [lo, hi] = drive.limits;
                if variable.motion == balk_core::machine::Motion::Slide || !lo.is_finite() {
                    return joint.clamp(lo, hi);
                }
                // The same direction within the limits, or the nearest limit.
                let period = TAU * drive.multiple;
                let up = joint + ((lo - joint) / period).ceil() * period;
                if up <= hi {
                    up
                } else if up - hi < lo - (up - period) {
                    hi
                } else {
                    lo
                }
            })
            .collect()
    }

    fn try_posture(&self, target: &Target, spans: &Spans) -> Option<Vec<f64>> {
        let mut values = self.middle(spans);
        if self.linkage.seek(target, &mut values) > 1e-18 {
            return None;
        }
        let mut joints = vec![0.0; self.machine.joints.len()];
        for (drive, value) in self.pack.drives.iter().zip(values) {
            joints[drive.joint] = value;
        }
        let joints = crate::kinematics::joint_values(&self.machine, &joints);
        crate::kinematics::meets(&self.machine, target, &joints, 1e-9).then_some(joints)
    }

    /// Decides one target with at most `nodes` nodes.
    pub fn decide(&self, target: &Target, nodes: u64) -> Decision {
        let clock = std::time::Instant::now();
        let packed = pack_target(target, self.pack.scale);
        let goal = Goal::new(&packed);
        let chain = self.chain();
        let mut cells = vec![Cell::ANYTHING; Network::cells(chain.joints.len())];
        let mut network = Network::new(chain, &goal, self.rules, &mut cells);
        let mut count = 1;
        let mut root = Network::limits(chain);
        let mut open = Vec::new();
        let mut verdict = Verdict::Unreachable { proof: [0; 32] };
        if network.propagate(&mut root).is_ok() {
            open.push((network.effort(&root), root));
        }
        let mut simplex = NodeSimplex::new();
        while let Some((_, mut spans)) = open.pop() {
            if network.propagate(&mut spans).is_err() {
                continue;
            }
            if self.pivots > 0
                && balk_core::relaxation::refute(&network, &spans, &mut simplex, self.pivots)
                    .is_some()
            {
                continue;
            }
            if let Some(joints) = self.try_posture(target, &spans) {
                verdict = Verdict::Reachable { joints };
                break;
            }
            if count >= nodes {
                verdict = Verdict::Undecided { reason: "node budget" };
                break;
            }
            match network.branch(&spans, self.candidates) {
                Branch::Closed => {}
                Branch::Narrow => {
                    if std::env::var("SHOW").is_ok() {
                        let mut v = self.middle(&spans);
                        println!("mid {v:?}");
                        let r = self.linkage.seek(target, &mut v);
                        println!("res {r} {v:?} count {count} widths {:?}", spans.iter().map(|s| s.size(balk_core::machine::Motion::Turn)).collect::<Vec<_>>());
                        let j = crate::kinematics::tip_pose(&self.machine, &v, 0);
                        println!("pos {} turn {}", crate::kinematics::position_excess(target, &j), crate::kinematics::turn_excess(target, &j));
                    }
                    verdict = Verdict::Undecided { reason: "too narrow" };
                    break;
                }
                Branch::Cut { lower, upper, .. } => {
                    count += 2;
                    let mut parts: Vec<_> = [lower, upper]
                        .into_iter()
                        .flatten()
                        .map(|s| (network.effort(&s), s))
                        .collect();
                    parts.sort_by(|a, b| a.0.total_cmp(&b.0));
                    open.extend(parts);
                }
            }
        }
        Decision {
            verdict,
            nodes: count,
            seconds: clock.elapsed().as_secs_f64(),
        }
    }

    /// Whether the target is refused when the joint space may be cut into `splits` parts.
    pub fn refused(&self, target: &Target, splits: usize) -> (bool, u32) {
        let packed = pack_target(target, self.pack.scale);
        let goal = Goal::new(&packed);
        let chain = self.chain();
        let mut cells = vec![Cell::ANYTHING; Network::cells(chain.joints.len())];
        let mut network = Network::new(chain, &goal, self.rules, &mut cells);
        let mut root = Network::limits(chain);
        let mut open = Vec::new();
        if network.propagate(&mut root).is_ok() {
            open.push(root);
        }
        let mut parts = 1;
        while let Some(spans) = open.pop() {
            if parts >= splits {
                return (false, network.rounds);
            }
            match network.branch(&spans, self.candidates) {
                Branch::Closed => {}
                Branch::Narrow => return (false, network.rounds),
                Branch::Cut { lower, upper, .. } => {
                    parts += 1;
                    open.extend([lower, upper].into_iter().flatten());
                }
            }
        }
        (true, network.rounds)
    }
    /// The tip in question.
    pub fn tip(&self) -> usize {
        self.tip
    }
}

/// A span for tests.
pub fn span_of(span: &JointSpan) -> JointSpan {
    *span
}
