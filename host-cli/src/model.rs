//! What the workstation knows of a machine and of a target, in double precision and SI units.
//!
//! Readers build these values; [`crate::kinematics`] evaluates them; [`crate::pack`] turns them
//! into the integers of the core.

use nalgebra::{Isometry3, Rotation3, Unit, Vector3};

/// A machine: joints as a forest over the base, and the tips targets may speak of.
#[derive(Clone, Debug)]
pub struct Machine {
    /// Name as written in the file.
    pub name: String,
    /// Joints, each after its parent.
    pub joints: Vec<Joint>,
    /// Tips, at least one.
    pub tips: Vec<Tip>,
}

impl Machine {
    /// Indices of the joints between the base and a tip, in that order.
    pub fn chain(&self, tip: usize) -> Vec<usize> {
        let mut chain = Vec::new();
        let mut at = self.tips[tip].parent;
        while let Some(joint) = at {
            chain.push(joint);
            at = self.joints[joint].parent;
        }
        chain.reverse();
        chain
    }
}

/// One joint with the placement of its frame in its parent's frame.
#[derive(Clone, Debug)]
pub struct Joint {
    /// Unique name.
    pub name: String,
    /// How it moves.
    pub kind: Kind,
    /// Index of the parent joint, `None` for the base.
    pub parent: Option<usize>,
    /// Joint frame in the parent's frame at joint value zero.
    pub placement: Isometry3<f64>,
    /// Axis of rotation or translation in the joint frame.
    pub axis: Unit<Vector3<f64>>,
    /// Least and greatest value (radians or metres); `None`: no limit (revolute only).
    pub limits: Option<[f64; 2]>,
    /// How far the built machine may differ from the placement.
    pub tolerance: Tolerance,
    /// Set when the joint has no drive of its own.
    pub follows: Option<Follows>,
}

/// Kind of motion of a joint.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// No motion.
    Fixed,
    /// Translation along the axis, metres.
    Prismatic,
    /// Rotation about the axis, radians.
    Revolute,
}

/// Bound on the difference between the placement as written and as built.
#[derive(Clone, Copy, Debug, Default)]
pub struct Tolerance {
    /// Each coordinate of the origin, metres.
    pub xyz: f64,
    /// Rotation angle of the orientation error, radians.
    pub angle: f64,
}

/// The joint's value is `ratio * other + offset`.
#[derive(Clone, Copy, Debug)]
pub struct Follows {
    /// Index of the joint that is followed.
    pub joint: usize,
    /// Factor on its value.
    pub ratio: f64,
    /// Added to the product, radians or metres.
    pub offset: f64,
}

/// A named frame that targets speak of.
#[derive(Clone, Debug)]
pub struct Tip {
    /// Unique name.
    pub name: String,
    /// Index of the joint that carries it, `None` for the base.
    pub parent: Option<usize>,
    /// Tip frame in the parent's frame.
    pub placement: Isometry3<f64>,
}

/// A set of poses for one tip.
#[derive(Clone, Debug)]
pub struct Target {
    /// Name used in answers.
    pub id: String,
    /// Index of the tip.
    pub tip: usize,
    /// Centre of the position box in the base frame, metres.
    pub xyz: Vector3<f64>,
    /// Half-widths of the position box along the base axes, metres, not negative.
    pub xyz_within: Vector3<f64>,
    /// What is asked of the orientation.
    pub orientation: Orientation,
}

/// What a target asks of the tip's orientation.
#[derive(Clone, Debug)]
pub enum Orientation {
    /// Every listed tip axis lies in its cone.
    Axes(Vec<Cone>),
    /// Anything.
    Free,
    /// At most `within` radians away from `rotation`.
    Near {
        /// Wanted orientation of the tip in the base frame.
        rotation: Rotation3<f64>,
        /// Greatest rotation angle of the difference, radians.
        within: f64,
    },
}

/// A tip axis within an angle of a base direction.
#[derive(Clone, Copy, Debug)]
pub struct Cone {
    /// Axis in the tip frame.
    pub tip: Unit<Vector3<f64>>,
    /// Direction in the base frame.
    pub base: Unit<Vector3<f64>>,
    /// Greatest angle between them, radians.
    pub within: f64,
}
