//! Forward kinematics in double precision, and what it says of a target.
//!
//! This is the workstation's own yardstick: plain products of poses, sharing nothing with the
//! core. A claim of *reachable* must pass [`meets`].

use nalgebra::{Isometry3, Rotation3, Translation3, UnitQuaternion, Vector3};

use crate::model::{Joint, Kind, Machine, Orientation, Target};

/// How far a posture found on the workstation may miss a target, metres and radians. It covers the
/// rounding of doubles on any machine of ordinary size and nothing that could be measured.
pub const ALLOWANCE: f64 = 1e-9;

/// Pose of tip `tip` in the base frame.
///
/// `values` has one entry a joint, in the machine's order: radians or metres. Entries of fixed
/// joints and of followers are not looked at. Cost: one product of poses a joint.
///
/// # Panics
///
/// When `values` is shorter than the machine's joints, or there is no tip `tip`.
pub fn tip_pose(machine: &Machine, values: &[f64], tip: usize) -> Isometry3<f64> {
    let tip = &machine.tips[tip];
    match tip.parent {
        None => tip.placement,
        Some(joint) => joint_frames(machine, values)[joint] * tip.placement,
    }
}

/// Frame of every joint in the base frame, after the joint's own motion.
///
/// # Panics
///
/// When `values` is shorter than the machine's joints.
pub fn joint_frames(machine: &Machine, values: &[f64]) -> Vec<Isometry3<f64>> {
    let values = joint_values(machine, values);
    let mut frames: Vec<Isometry3<f64>> = Vec::with_capacity(machine.joints.len());
    for (joint, value) in machine.joints.iter().zip(values) {
        let parent = joint
            .parent
            .map_or_else(Isometry3::identity, |parent| frames[parent]);
        frames.push(parent * joint.placement * motion(joint, value));
    }
    frames
}

/// The value of every joint when the driven ones have `values`: followers follow, fixed joints
/// have 0.
///
/// # Panics
///
/// When `values` is shorter than the machine's joints.
pub fn joint_values(machine: &Machine, values: &[f64]) -> Vec<f64> {
    (0..machine.joints.len())
        .map(|joint| joint_value(machine, values, joint))
        .collect()
}

fn joint_value(machine: &Machine, values: &[f64], joint: usize) -> f64 {
    match (machine.joints[joint].kind, machine.joints[joint].follows) {
        (Kind::Fixed, _) => 0.0,
        (_, None) => values[joint],
        (_, Some(follows)) => {
            follows.ratio * joint_value(machine, values, follows.joint) + follows.offset
        }
    }
}

/// The motion of `joint` at `value`, in its own frame.
fn motion(joint: &Joint, value: f64) -> Isometry3<f64> {
    match joint.kind {
        Kind::Fixed => Isometry3::identity(),
        Kind::Prismatic => Translation3::from(joint.axis.into_inner() * value).into(),
        Kind::Revolute => {
            let turn = UnitQuaternion::from_axis_angle(&joint.axis, value);
            Isometry3::from_parts(Translation3::identity(), turn)
        }
    }
}

/// Whether `values` are within limits and put the target's tip inside the target, each with
/// `allowance` (metres, radians) to spare for rounding. Limits of driven joints are kept exactly;
/// a follower's value is itself a rounded product, so the allowance applies to it.
///
/// # Panics
///
/// As [`tip_pose`].
pub fn meets(machine: &Machine, target: &Target, values: &[f64], allowance: f64) -> bool {
    let pose = tip_pose(machine, values, target.tip);
    within_limits(machine, values, allowance)
        && position_excess(target, &pose) <= allowance
        && turn_excess(target, &pose) <= allowance
}

/// Whether every joint that moves is within its limits; see [`meets`].
///
/// # Panics
///
/// When `values` is shorter than the machine's joints.
pub fn within_limits(machine: &Machine, values: &[f64], allowance: f64) -> bool {
    let values = joint_values(machine, values);
    machine.joints.iter().zip(values).all(|(joint, value)| {
        let spare = if joint.follows.is_some() {
            allowance
        } else {
            0.0
        };
        match joint.limits {
            _ if joint.kind == Kind::Fixed => true,
            None => value.is_finite(),
            Some([lower, upper]) => lower - spare <= value && value <= upper + spare,
        }
    })
}

/// How far the pose's origin lies outside the target's box, metres along the worst base axis;
/// negative inside.
pub fn position_excess(target: &Target, pose: &Isometry3<f64>) -> f64 {
    let miss = (pose.translation.vector - target.xyz).abs() - target.xyz_within;
    miss.max()
}

/// How far the pose is turned beyond what the target allows, radians; negative inside.
pub fn turn_excess(target: &Target, pose: &Isometry3<f64>) -> f64 {
    let actual = pose.rotation.to_rotation_matrix();
    match &target.orientation {
        Orientation::Free => f64::NEG_INFINITY,
        Orientation::Near { rotation, within } => turn_between(rotation, &actual) - within,
        Orientation::Axes(cones) => cones
            .iter()
            .map(|cone| angle_between(&(actual * *cone.tip), &cone.base) - cone.within)
            .fold(f64::NEG_INFINITY, f64::max),
    }
}

/// Angle of the rotation that takes `a` to `b`, radians, 0 to pi.
///
/// The antisymmetric part of the difference is twice the sine times the axis, the trace gives the
/// cosine; together they are accurate at every angle, where the trace alone is not near 0 and pi.
pub fn turn_between(a: &Rotation3<f64>, b: &Rotation3<f64>) -> f64 {
    let difference = a.inverse() * b;
    let m = difference.matrix();
    let twice_sine = Vector3::new(
        m[(2, 1)] - m[(1, 2)],
        m[(0, 2)] - m[(2, 0)],
        m[(1, 0)] - m[(0, 1)],
    );
    twice_sine.norm().atan2(m.trace() - 1.0)
}

/// Angle between two vectors, radians, 0 to pi.
pub fn angle_between(a: &Vector3<f64>, b: &Vector3<f64>) -> f64 {
    a.cross(b).norm().atan2(a.dot(b))
}
