//! The chain of one tip: moving joints with the links between them, and what drives them.

use dashu_ratio::RBig;

use super::read::{Joint, Kind, Machine};
use super::{Amount, ReadError};

/// A frame in another.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Pose {
    /// Translation, then `Rz(yaw) Ry(pitch) Rx(roll)`.
    Placed {
        /// Metres.
        xyz: [RBig; 3],
        /// Roll, pitch, yaw.
        rpy: [Amount; 3],
    },
    /// `Tx(a) Rx(alpha) Rz(theta) Tz(d)`.
    Row {
        /// Metres.
        a: RBig,
        /// Angle.
        alpha: Amount,
        /// Metres.
        d: RBig,
        /// Angle.
        theta: Amount,
    },
}

/// One joint's or the tip's fixed frame on a link, with its tolerances.
#[derive(Clone, Debug)]
pub struct Stage {
    /// From the frame before it.
    pub poses: Vec<Pose>,
    /// Half-width of the cube that has its origin.
    pub tolerance_xyz: RBig,
    /// Largest angle of its orientation.
    pub tolerance_angle: Amount,
}

/// What lies between two moving joints, the second one's frame included.
pub type Link = Vec<Stage>;

/// How a variable drives a joint.
#[derive(Clone, Debug)]
pub struct Drive {
    /// Place in the list of variables.
    pub variable: usize,
    /// Times.
    pub ratio: RBig,
    /// Plus.
    pub offset: Amount,
}

/// A moving joint.
#[derive(Clone, Debug)]
pub struct Moving {
    /// Its kind, never fixed.
    pub kind: Kind,
    /// Of any length but zero.
    pub axis: [RBig; 3],
    /// What drives it.
    pub drive: Drive,
}

/// Limits of a joint that follows a variable.
#[derive(Clone, Debug)]
pub struct Limit {
    /// Least and greatest value of the joint.
    pub range: [Amount; 2],
    /// The joint's ratio.
    pub ratio: RBig,
    /// The joint's offset.
    pub offset: Amount,
}

/// A leader.
#[derive(Clone, Debug)]
pub struct Variable {
    /// Its place in the file.
    pub leader: usize,
    /// Limits of everything that follows it, ratio zero excepted.
    pub limits: Vec<Limit>,
}

/// The chain of a tip.
#[derive(Clone, Debug)]
pub struct Chain {
    /// One more than moving joints; the last ends in the tip.
    pub links: Vec<Link>,
    /// From the base to the tip.
    pub moving: Vec<Moving>,
    /// In the order in which the joints need them.
    pub variables: Vec<Variable>,
}

/// Most moving joints of a chain: they are counted in one byte.
const MAX_MOVING: usize = 100;

impl Chain {
    /// The chain of the tip called `name`. Cost: quadratic in the number of joints.
    ///
    /// # Errors
    ///
    /// No such tip, joints that go round, or too many of them.
    pub fn new(machine: &Machine, name: &str) -> Result<Self, ReadError> {
        let tip = machine
            .tips
            .iter()
            .find(|tip| tip.name == name)
            .ok_or_else(|| ReadError::Tip(name.to_owned()))?;
        let mut chain = Self {
            links: Vec::new(),
            moving: Vec::new(),
            variables: Vec::new(),
        };
        let mut link = Link::new();
        for joint in ancestors(machine, tip.parent)? {
            let read = &machine.joints[joint];
            link.push(stage(read));
            if read.kind == Kind::Fixed {
                continue;
            }
            chain.links.push(core::mem::take(&mut link));
            let drive = chain.drive(machine, joint)?;
            chain.moving.push(Moving {
                kind: read.kind,
                axis: read.axis.clone(),
                drive,
            });
        }
        if chain.moving.len() > MAX_MOVING {
            return flaw("has too many moving joints");
        }
        link.push(Stage {
            poses: tip.poses.clone(),
            tolerance_xyz: RBig::ZERO,
            tolerance_angle: Amount::zero(),
        });
        chain.links.push(link);
        for (place, joint) in machine.joints.iter().enumerate() {
            let (leader, ratio, offset) = leader(machine, place)?;
            let variable = chain.variables.iter_mut().find(|v| v.leader == leader);
            if let (Some(variable), Some(range)) = (variable, &joint.limits)
                && ratio != RBig::ZERO
            {
                variable.limits.push(Limit {
                    range: range.clone(),
                    ratio,
                    offset,
                });
            }
        }
        Ok(chain)
    }

    fn drive(&mut self, machine: &Machine, joint: usize) -> Result<Drive, ReadError> {
        let (leader, ratio, offset) = leader(machine, joint)?;
        let known = self.variables.iter().position(|v| v.leader == leader);
        let variable = known.unwrap_or(self.variables.len());
        if known.is_none() {
            self.variables.push(Variable {
                leader,
                limits: Vec::new(),
            });
        }
        Ok(Drive {
            variable,
            ratio,
            offset,
        })
    }
}

fn flaw<T>(reason: &'static str) -> Result<T, ReadError> {
    Err(ReadError::Field {
        field: "joint".to_owned(),
        reason,
    })
}

fn stage(joint: &Joint) -> Stage {
    Stage {
        poses: joint.poses.clone(),
        tolerance_xyz: joint.tolerance_xyz.clone(),
        tolerance_angle: joint.tolerance_angle.clone(),
    }
}

/// Places of the joints from the base to `last`.
fn ancestors(machine: &Machine, last: Option<usize>) -> Result<Vec<usize>, ReadError> {
    let mut path = Vec::new();
    let mut at = last;
    while let Some(joint) = at {
        if path.len() == machine.joints.len() {
            return flaw("the parents go round");
        }
        path.push(joint);
        at = machine.joints[joint].parent;
    }
    path.reverse();
    Ok(path)
}

/// The joint that `joint` follows in the end, with ratio and offset.
fn leader(machine: &Machine, joint: usize) -> Result<(usize, RBig, Amount), ReadError> {
    let (mut at, mut ratio, mut offset) = (joint, RBig::ONE, Amount::zero());
    let mut steps = 0;
    while let Some(follow) = &machine.joints[at].follows {
        offset = follow.offset.times_plus(&ratio, &offset);
        ratio *= &follow.ratio;
        at = follow.joint;
        steps += 1;
        if steps > machine.joints.len() {
            return flaw("the followers go round");
        }
    }
    Ok((at, ratio, offset))
}
