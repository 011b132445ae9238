//! Where every feature of a chain truly is, seen from every joint, in double precision.
//!
//! The core's boxes speak of frames the packer chooses: each joint turns about, or slides along,
//! its third axis; its origin is the foot of the next origin on that axis; its first axis lies
//! along the offset from the previous origin before motion and along the offset to the next one
//! after it. Here those frames are found anew from the axes and points of the machine at joint
//! values zero, without the packer's placements, and carried along with the bodies of the built
//! machine. Nothing is shared with the core or the packer but plain forward kinematics.
//!
//! Foot and heading are constants of the written machine. On a machine built within tolerance the
//! frames are the same constants applied to its own axes, because a placement's slack speaks of
//! that product.

use balk::kinematics::{joint_frames, joint_values};
use balk::model::{Kind, Machine};
use balk_core::propagate::Feature;
use nalgebra::{Isometry3, Matrix3, Rotation3, Translation3, UnitQuaternion, Vector3};

/// Offsets across an axis shorter than this share of the reach have no heading ...
const NO_HEADING: f64 = 1e-11;
/// ... and those in between have none that doubles determine to a thousandth of a unit.
const CLEAR_HEADING: f64 = 1e-4;

/// The frame constants of one joint.
#[derive(Clone, Copy, Debug)]
struct Constants {
    /// Index of the joint in the machine.
    joint: usize,
    /// From the joint frame to one whose third axis is the joint's.
    to_axis: UnitQuaternion<f64>,
    /// How far the origin moves along the axis, metres.
    foot: f64,
    /// How far the first axis turns about it before motion, radians ...
    before: f64,
    /// ... and after.
    after: f64,
}

/// The frame constants of the chain to tip 0.
#[derive(Clone, Debug)]
pub struct Frames(Vec<Constants>);

/// Rotation that takes the third axis to `axis`; its first axis is across both.
fn to_axis(axis: &Vector3<f64>) -> UnitQuaternion<f64> {
    let across = Vector3::z().cross(axis);
    let first = if across.norm() < 1e-15 {
        Vector3::x()
    } else {
        across.normalize()
    };
    let columns = [first, axis.cross(&first), *axis];
    let matrix = Rotation3::from_matrix_unchecked(Matrix3::from_columns(&columns));
    UnitQuaternion::from_rotation_matrix(&matrix)
}

impl Frames {
    /// Finds the frames of a machine as written. `None` when an offset is so short that its
    /// direction is lost in double precision.
    pub fn of(written: &Machine) -> Option<Frames> {
        let mut path = Vec::new();
        let mut at = written.tips[0].parent;
        while let Some(joint) = at {
            path.push(joint);
            at = written.joints[joint].parent;
        }
        path.retain(|&joint| written.joints[joint].kind != Kind::Fixed);
        path.reverse();

        let mut still = written.clone();
        for joint in &mut still.joints {
            joint.follows = None;
        }
        let bodies = joint_frames(&still, &vec![0.0; still.joints.len()]);
        let tip = written.tips[0]
            .parent
            .map_or_else(Isometry3::identity, |j| bodies[j])
            * written.tips[0].placement;

        // From the tip back: the foot of the next origin.
        let mut next = tip.translation.vector;
        let mut lines: Vec<(Constants, Vector3<f64>, UnitQuaternion<f64>)> = Vec::new();
        for &joint in path.iter().rev() {
            let to_axis = to_axis(&written.joints[joint].axis);
            let turn = bodies[joint].rotation * to_axis;
            let axis = turn * Vector3::z();
            let foot = axis.dot(&(next - bodies[joint].translation.vector));
            next = bodies[joint].translation.vector + axis * foot;
            let constants = Constants {
                joint,
                to_axis,
                foot,
                before: 0.0,
                after: 0.0,
            };
            lines.push((constants, next, turn));
        }
        lines.reverse();

        // From the base on: first axes along the offsets.
        let points: Vec<Vector3<f64>> = std::iter::once(Vector3::zeros())
            .chain(lines.iter().map(|line| line.1))
            .chain([tip.translation.vector])
            .collect();
        let reach: f64 = points.windows(2).map(|p| (p[1] - p[0]).norm()).sum();
        let heading = |turn: &UnitQuaternion<f64>, offset: Vector3<f64>| {
            let v = turn.inverse() * offset;
            let across = v.x.hypot(v.y);
            if across < NO_HEADING * reach {
                Some(0.0)
            } else {
                (across > CLEAR_HEADING * reach).then(|| v.y.atan2(v.x))
            }
        };
        let mut frames = Vec::new();
        for (i, (mut constants, point, turn)) in lines.into_iter().enumerate() {
            constants.before = heading(&turn, point - points[i])?;
            constants.after = match written.joints[constants.joint].kind {
                Kind::Prismatic => constants.before,
                _ => heading(&turn, points[i + 2] - point)?,
            };
            frames.push(constants);
        }
        Some(Frames(frames))
    }
}

/// Everything about one posture of a built machine that a box may be compared with.
///
/// Directions and angles are plain numbers, lengths are divided by the packed machine's scale.
#[derive(Clone, Debug)]
pub struct Truth {
    /// Frames before each joint's motion, from number 1; number 0 is the base.
    before: Vec<Isometry3<f64>>,
    /// Frames after it.
    after: Vec<Isometry3<f64>>,
    /// The tip.
    tip: Isometry3<f64>,
    /// Joint values in the chosen frames.
    values: Vec<f64>,
}

impl Truth {
    /// The built machine in the posture of `values`, metres divided by `scale`.
    pub fn of(frames: &Frames, built: &Machine, values: &[f64], scale: f64) -> Truth {
        let bodies = joint_frames(built, values);
        let values = joint_values(built, values);
        let shrink = |frame: Isometry3<f64>| {
            Isometry3::from_parts((frame.translation.vector / scale).into(), frame.rotation)
        };
        let mut truth = Truth {
            before: vec![Isometry3::identity()],
            after: vec![Isometry3::identity()],
            tip: Isometry3::identity(),
            values: Vec::new(),
        };
        for constants in &frames.0 {
            let joint = &built.joints[constants.joint];
            let parent = joint.parent.map_or_else(Isometry3::identity, |j| bodies[j]);
            let place = |body: Isometry3<f64>, heading: f64| {
                shrink(
                    body * constants.to_axis
                        * Translation3::new(0.0, 0.0, constants.foot)
                        * UnitQuaternion::from_axis_angle(&Vector3::z_axis(), heading),
                )
            };
            truth
                .before
                .push(place(parent * joint.placement, constants.before));
            truth
                .after
                .push(place(bodies[constants.joint], constants.after));
            truth.values.push(match joint.kind {
                Kind::Prismatic => values[constants.joint] / scale,
                _ => values[constants.joint] + constants.after - constants.before,
            });
        }
        let tip = &built.tips[0];
        let body = tip.parent.map_or_else(Isometry3::identity, |j| bodies[j]);
        truth.tip = shrink(body * tip.placement);
        truth
    }

    /// Number of moving joints.
    pub fn joints(&self) -> usize {
        self.values.len()
    }

    /// Value of a joint, from number 1, in the chosen frames: radians, or a scaled length.
    pub fn value(&self, joint: usize) -> f64 {
        self.values[joint - 1]
    }

    /// The tip's orientation in the base frame.
    pub fn tip_rotation(&self) -> UnitQuaternion<f64> {
        self.tip.rotation
    }

    /// A feature in the base frame. `axes` are the tip axes the target speaks of, in the tip frame.
    pub fn in_base(&self, feature: Feature, axes: &[Vector3<f64>]) -> Vector3<f64> {
        match feature {
            Feature::Axis(joint) => self.before[joint as usize].rotation * Vector3::z(),
            Feature::Origin(joint) => self.after[joint as usize].translation.vector,
            Feature::TipAxis(k) => self.tip.rotation * axes[k as usize],
            Feature::TipOrigin => self.tip.translation.vector,
        }
    }

    /// A point or direction of the base frame as joint `joint` sees it before and after motion;
    /// number 0 is the base and one more than the joints' number is the tip, where both are equal.
    pub fn view(&self, in_base: &Vector3<f64>, point: bool, joint: usize) -> [Vector3<f64>; 2] {
        let frames = match self.before.get(joint) {
            Some(before) => [before, &self.after[joint]],
            None => [&self.tip; 2],
        };
        frames.map(|frame| {
            let offset = if point {
                in_base - frame.translation.vector
            } else {
                *in_base
            };
            frame.rotation.inverse_transform_vector(&offset)
        })
    }
}
