//! From the machine and target of a file to the integers of the core, rounded outward.
//!
//! Every number the core gets encloses the number in the file: a refusal of the packed target by
//! the packed machine is a refusal of the real target by every machine within its tolerances.

mod follow;
mod frames;
mod integers;

pub use follow::{leader, range};
pub use integers::pack_target;

use crate::model::{self, Kind};
use balk_core::fixed::{Arc, Direction, Interval};
use balk_core::machine::{Joint, Machine, Motion, Variable};
use balk_core::propagate::MOST_JOINTS;
use follow::{Hold, MOST_MULTIPLE, MOST_RATIO, hold, variables};
use frames::{Stretch, choose_frames, to_axis};
use integers::{arc, length, placement};
use nalgebra::{Isometry3, Translation3};

/// The machine type every chain of the workstation is packed into.
pub type Packed = Machine<MOST_JOINTS>;

/// Why a chain cannot be packed.
#[derive(Clone, Debug, thiserror::Error)]
pub enum PackError {
    /// A joint follows one of the other kind of motion.
    #[error("joint {joint:?}: a {kind:?} joint cannot follow a joint of another kind")]
    MixedFollower {
        /// The follower.
        joint: String,
        /// Its kind.
        kind: Kind,
    },
    /// Limits of a joint and of those that follow it exclude each other.
    #[error("joint {joint:?}: its limits and those of the joints that follow it leave no value")]
    NoRange {
        /// The joint that leads.
        joint: String,
    },
    /// The ratio has no small fraction and the leader no limits.
    #[error(
        "joint {joint:?}: ratio {ratio} is not a fraction with numerator and denominator up to {MOST_RATIO} and a common denominator with the leader's other followers up to {MOST_MULTIPLE}, which a joint without limits needs"
    )]
    Ratio {
        /// The follower.
        joint: String,
        /// Its ratio.
        ratio: f64,
    },
    /// More moving joints than the largest preset.
    #[error("tip {tip:?} hangs on {joints} moving joints; at most {MOST_JOINTS} are supported")]
    TooManyJoints {
        /// The tip.
        tip: String,
        /// Moving joints between it and the base.
        joints: usize,
    },
    /// Nothing moves and nothing has a length.
    #[error("tip {tip:?} has no extent: every length is zero")]
    NoExtent {
        /// The tip.
        tip: String,
    },
}

/// A chain packed for the core, with what is needed to read its variables back.
#[derive(Clone, Debug)]
pub struct Pack {
    /// The integers.
    pub machine: Packed,
    /// Metres per unit length of the core.
    pub scale: f64,
    /// For every variable, how to turn it into a joint value of the model.
    pub drives: Vec<Drive>,
}

/// A variable of the core in terms of the model.
#[derive(Clone, Copy, Debug)]
pub struct Drive {
    /// Index of the joint of the model that leads.
    pub joint: usize,
    /// The joint's value is this multiple of the variable ...
    pub multiple: f64,
    /// ... plus this (radians or metres).
    pub offset: f64,
    /// Least and greatest value of the joint (infinite: none).
    pub limits: [f64; 2],
}

/// Packs the chain from the base to a tip.
///
/// # Errors
/// [`PackError`] names the joint or tip and the reason.
pub fn pack(machine: &model::Machine, tip: usize) -> Result<Pack, PackError> {
    let path = machine.chain(tip);
    let tip = &machine.tips[tip];

    // Stretches between moving joints, each ending with the joint's axis along z.
    let mut stretches = Vec::new();
    let mut moving = Vec::new();
    let mut open = Stretch::from(Isometry3::identity());
    for &index in &path {
        let joint = &machine.joints[index];
        open = open.then(joint.placement, joint.tolerance);
        if joint.kind == Kind::Fixed {
            continue;
        }
        let turn = Isometry3::from_parts(Translation3::identity(), to_axis(&joint.axis));
        stretches.push(Stretch {
            placement: open.placement * turn,
            ..open
        });
        moving.push(index);
        open = Stretch::from(turn.inverse());
    }
    stretches.push(open.then(tip.placement, model::Tolerance::default()));
    if moving.len() > MOST_JOINTS {
        return Err(PackError::TooManyJoints {
            tip: tip.name.clone(),
            joints: moving.len(),
        });
    }

    let shifts = choose_frames(machine, &moving, &mut stretches);
    let (variables, drives) = variables(machine, &moving)?;

    let mut reach: f64 = stretches
        .iter()
        .map(|s| s.placement.translation.vector.norm() + s.xyz)
        .sum();
    for &index in &moving {
        if machine.joints[index].kind == Kind::Prismatic {
            let [lo, hi] = machine.joints[index].limits.unwrap_or([0.0, 0.0]);
            reach += lo.abs().max(hi.abs());
        }
    }
    // Variables of sliding joints are lengths too, though their joints may be elsewhere.
    for (kind, drive) in variables.iter().zip(&drives) {
        if *kind == Kind::Prismatic {
            let most = drive.limits[0].abs().max(drive.limits[1].abs());
            reach = reach.max(most / drive.multiple);
        }
    }
    for &index in &moving {
        if machine.joints[index].kind == Kind::Prismatic {
            let hold = hold(machine, index, &drives)?;
            reach = reach.max(hold.rest.abs() + hold.residual);
        }
    }
    if reach <= 0.0 {
        return Err(PackError::NoExtent {
            tip: tip.name.clone(),
        });
    }
    let exponent = (reach * (1.0 + 1e-6)).log2().ceil() as i8;
    let scale = (exponent as f64).exp2();

    let mut packed = Packed {
        joints: Default::default(),
        variables: Default::default(),
        tip: placement(&stretches[moving.len()], scale),
        exponent,
    };
    for (k, &index) in moving.iter().enumerate() {
        let Hold {
            variable,
            multiple,
            rest,
            residual,
        } = hold(machine, index, &drives)?;
        let (motion, turn, shift) = match machine.joints[index].kind {
            Kind::Prismatic => (
                Motion::Slide,
                Arc::FULL,
                length(rest - residual, rest + residual, scale),
            ),
            _ => {
                let rest = rest + shifts[k];
                let turn = if rest == 0.0 && residual == 0.0 {
                    Arc::new(Direction::EAST, Direction::EAST)
                } else {
                    arc(rest - residual, rest + residual)
                };
                (Motion::Turn, turn, Interval::ZERO)
            }
        };
        let _ = packed.joints.push(Joint {
            motion,
            placement: placement(&stretches[k], scale),
            variable: variable as u8,
            multiple,
            turn,
            shift,
        });
    }
    let mut packed_drives = drives.clone();
    for (v, (kind, drive)) in variables.iter().zip(&mut packed_drives).enumerate() {
        // A variable that drives one joint alone takes the joint's shift into its own origin.
        let single = packed
            .joints
            .iter()
            .filter(|j| j.variable as usize == v)
            .count()
            == 1;
        if let (true, Kind::Revolute) = (single, kind) {
            for (k, joint) in packed.joints.iter_mut().enumerate() {
                let hold = hold(machine, moving[k], &drives)?;
                if hold.variable == v && hold.multiple == 1 && hold.residual == 0.0 {
                    drive.offset = -(hold.rest + shifts[k]) * drive.multiple;
                    joint.turn = Arc::new(Direction::EAST, Direction::EAST);
                }
            }
        }
        let ends = drive
            .limits
            .map(|limit| (limit - drive.offset) / drive.multiple);
        let (lo, hi) = (ends[0].min(ends[1]), ends[0].max(ends[1]));
        let _ = packed.variables.push(match kind {
            Kind::Prismatic => Variable {
                arc: Arc::FULL,
                length: length(lo, hi, scale),
                motion: Motion::Slide,
            },
            _ => Variable {
                arc: arc(lo, hi),
                length: Interval::ZERO,
                motion: Motion::Turn,
            },
        });
    }
    Ok(Pack {
        machine: packed,
        scale,
        drives: packed_drives,
    })
}
