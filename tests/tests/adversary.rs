//! Corners where a reachable target could be refused: each test plants a posture, asks for the
//! pose it has, and requires that the controller's test lets it pass.

#[path = "adversary/arcs.rs"]
mod arcs;
#[path = "adversary/integers.rs"]
mod integers;
#[path = "adversary/odd_machines.rs"]
mod odd_machines;
#[path = "adversary/planted.rs"]
mod planted;

use balk::kinematics::{joint_values, tip_pose, within_limits};
use balk::model::{Follows, Joint, Kind, Machine, Orientation, Target, Tip, Tolerance};
use balk::search::{Screening, Solver};
use nalgebra::{Isometry3, Translation3, Unit, UnitQuaternion, Vector3};
use std::f64::consts::{FRAC_PI_2, PI};

/// A joint one third of a metre from its parent, the joint before it.
fn joint(kind: Kind, index: usize, limits: Option<[f64; 2]>) -> Joint {
    Joint {
        name: format!("joint {index}"),
        kind,
        parent: index.checked_sub(1),
        placement: Isometry3::from_parts(
            Translation3::new(0.3, 0.0, 0.1),
            UnitQuaternion::from_euler_angles(if index == 0 { 0.0 } else { FRAC_PI_2 }, 0.0, 0.0),
        ),
        axis: Vector3::z_axis(),
        limits,
        tolerance: Tolerance::default(),
        follows: None,
    }
}

/// A joint that turns without limit.
fn turning(index: usize) -> Joint {
    joint(Kind::Revolute, index, None)
}

fn following(mut joint: Joint, leader: usize, ratio: f64, offset: f64) -> Joint {
    joint.follows = Some(Follows {
        joint: leader,
        ratio,
        offset,
    });
    joint
}

/// The machine with a tip on its last joint.
fn machine(joints: Vec<Joint>) -> Machine {
    let tip = Tip {
        name: "tip".into(),
        parent: joints.len().checked_sub(1),
        placement: Isometry3::translation(0.2, 0.1, 0.3),
    };
    Machine {
        name: "planted".into(),
        joints,
        tips: vec![tip],
    }
}

/// The very pose the machine takes, nothing to spare.
fn pose_of(machine: &Machine, values: &[f64]) -> Target {
    let pose = tip_pose(machine, values, 0);
    Target {
        id: "planted".into(),
        tip: 0,
        xyz: pose.translation.vector,
        xyz_within: Vector3::zeros(),
        orientation: Orientation::Near {
            rotation: pose.rotation.to_rotation_matrix(),
            within: 0.0,
        },
    }
}

/// Whether the controller lets the machine's own pose pass, as a full pose and as a position.
fn passes(machine: &Machine, values: &[f64]) -> bool {
    assert!(
        within_limits(machine, values, 1e-12),
        "planted out of limits"
    );
    let solver = Solver::new(machine, 0).expect("the machine packs");
    let pose = pose_of(machine, values);
    let position = Target {
        orientation: Orientation::Free,
        ..pose.clone()
    };
    [pose, position].iter().all(|target| {
        [1, 8]
            .iter()
            .all(|&splits| matches!(solver.screen(target, splits), Screening::Passed { .. }))
    })
}

#[test]
fn orientation_tolerance_of_half_a_turn() {
    for angle in [1.0, 1.1, 3.0, PI] {
        let mut joints = vec![turning(0), turning(1)];
        joints[1].tolerance.angle = angle;
        assert!(passes(&machine(joints), &[0.3, 1.0]), "{angle}");
    }
}

/// The cosine of a quarter turn in single precision, which exported machine descriptions carry.
#[test]
fn axis_that_single_precision_left_short_of_vertical() {
    for off in [-4.371_139e-8, 1e-8, 1e-9, 1e-14] {
        let mut joints = vec![turning(0), joint(Kind::Revolute, 1, Some([0.9, 1.1]))];
        joints[0].axis = Unit::new_normalize(Vector3::new(off, 0.0, 1.0));
        joints[0].limits = Some([0.3, 0.3]);
        joints[1].axis = Unit::new_normalize(Vector3::new(0.0, off, -1.0));
        assert!(passes(&machine(joints), &[0.3, 1.0]), "{off}");
    }
}

/// The gap is wider than packing rounds away and narrower than what moving the ends outward takes.
#[test]
fn limits_a_hair_short_of_a_full_turn() {
    for gap in (10..50).map(|k| f64::from(k) * 1e-9) {
        let limits = Some([-PI + gap / 2.0, PI - gap / 2.0]);
        let machine = machine((0..4).map(|k| joint(Kind::Revolute, k, limits)).collect());
        for values in [
            [1.6, 0.2, 0.0, 0.0],
            [1.0, -1.0, 2.0, 0.5],
            [-1.5, 0.1, -0.1, 3.0],
        ] {
            assert!(passes(&machine, &values), "{gap} {values:?}");
        }
    }
}

#[test]
fn follower_geared_beyond_the_largest_multiple() {
    for ratio in [127.0, 128.0, 200.0, -1e4, 0.3 + 1e3] {
        let joints = vec![
            joint(Kind::Revolute, 0, Some([-0.01, 0.01])),
            following(turning(1), 0, ratio, 0.2),
        ];
        let machine = machine(joints);
        let values = joint_values(&machine, &[0.007, 0.0]);
        assert!(passes(&machine, &values), "{ratio}");
    }
}

#[test]
fn leader_of_sixteenths_and_fifteenths() {
    let joints = vec![
        joint(Kind::Revolute, 0, Some([-3.0, 3.0])),
        following(turning(1), 0, 1.0 / 16.0, 0.0),
        following(turning(2), 0, 1.0 / 15.0, 0.5),
        following(turning(3), 1, -13.0, 0.0),
    ];
    let machine = machine(joints);
    let values = joint_values(&machine, &[2.2, 0.0, 0.0, 0.0]);
    assert!(passes(&machine, &values));
}

/// Its variable drives nothing else in the chain, yet does not turn as far as the joint.
#[test]
fn lone_follower_of_a_joint_outside_the_chain() {
    for value in [-2.95, 0.0, 2.95] {
        let mut joints = vec![
            joint(Kind::Revolute, 0, Some([-3.0, 3.0])),
            following(turning(1), 0, 1.03, 0.4),
        ];
        joints[1].parent = None;
        let machine = machine(joints);
        let values = joint_values(&machine, &[value, 0.0]);
        assert!(passes(&machine, &values), "{value}");
    }
}

/// Multiple of the variable and remainder add up to within reach, but the remainder alone does not.
#[test]
fn sliding_follower_whose_remainder_exceeds_the_reach() {
    let mut joints = vec![
        joint(Kind::Prismatic, 0, Some([-0.5, -0.5])),
        following(
            joint(Kind::Prismatic, 1, Some([0.0, 0.999])),
            0,
            0.97,
            0.9995,
        ),
    ];
    joints[1].parent = None;
    joints[1].placement = Isometry3::identity();
    let mut machine = machine(joints);
    machine.tips[0].placement = Isometry3::identity();
    let values = joint_values(&machine, &[-0.5, 0.0]);
    assert!(passes(&machine, &values));
}

#[test]
fn tip_that_nothing_moves() {
    let mut joints = vec![joint(Kind::Fixed, 0, None)];
    assert!(passes(&machine(joints.clone()), &[0.0]));
    joints.clear();
    assert!(passes(&machine(joints), &[]));
}
