//! Published poses, put through the reader and through forward kinematics.

use balk::kinematics::{meets, tip_pose};
use balk::model::{Machine, Target};
use balk::read;
use nalgebra::{Isometry3, Matrix3, Vector3};

fn machine(text: &str) -> Machine {
    read::machine(text.as_bytes(), "test.toml").unwrap()
}

fn degrees<const N: usize>(values: [f64; N]) -> [f64; N] {
    values.map(f64::to_radians)
}

fn flange(machine: &Machine, values: &[f64]) -> Isometry3<f64> {
    tip_pose(machine, values, 0)
}

fn assert_origin(pose: &Isometry3<f64>, expected: [f64; 3], within: f64) {
    let miss = (pose.translation.vector - Vector3::from(expected)).amax();
    assert!(
        miss <= within,
        "origin {:?}, expected {expected:?}",
        pose.translation.vector
    );
}

fn assert_rotation(pose: &Isometry3<f64>, rows: [f64; 9], within: f64) {
    let actual = pose.rotation.to_rotation_matrix().into_inner();
    let miss = (actual - Matrix3::from_row_slice(&rows)).amax();
    assert!(miss <= within, "rotation {actual}, expected {rows:?}");
}

/// A small deterministic spread of joint values in degrees; sizes do not matter.
fn spread(joints: usize, sample: usize) -> Vec<f64> {
    (0..joints)
        .map(|k| (((sample * 7919 + k * 104_729) % 3600) as f64 * 0.1 - 180.0).to_radians())
        .collect()
}

/// The textbook six-joint arm in the standard convention, lengths in metres: Fu, Gonzalez & Lee,
/// *Robotics: Control, Sensing, Vision and Intelligence*, McGraw-Hill 1987, sec. 2.2 (table from
/// memory, poses recomputed; the pose at (90, 0, 90, 0, 0, 0) is the book's own check).
const TEXTBOOK_STANDARD: &str = r#"
[dh]
convention = "standard"
angles = "degrees"
rows = [
  { a = 0, alpha = -90, d = 0, theta = 0, limits = [-160, 160] },
  { a = 0.4318, alpha = 0, d = 0.14909, theta = 0, limits = [-225, 45] },
  { a = -0.02032, alpha = 90, d = 0, theta = 0, limits = [-45, 225] },
  { a = 0, alpha = -90, d = 0.43307, theta = 0, limits = [-110, 170] },
  { a = 0, alpha = 90, d = 0, theta = 0, limits = [-100, 100] },
  { a = 0, alpha = 0, d = 0.05625, theta = 0, limits = [-266, 266] },
]
"#;

/// The same arm in the modified convention: its `a` and `alpha` columns moved down one row, and
/// the last pair given to the tip. Follows from the two definitions.
const TEXTBOOK_SHIFTED: &str = r#"
[dh]
convention = "modified"
angles = "degrees"
rows = [
  { a = 0, alpha = 0, d = 0, theta = 0 },
  { a = 0, alpha = -90, d = 0.14909, theta = 0 },
  { a = 0.4318, alpha = 0, d = 0, theta = 0 },
  { a = -0.02032, alpha = 90, d = 0.43307, theta = 0 },
  { a = 0, alpha = -90, d = 0, theta = 0 },
  { a = 0, alpha = 90, d = 0.05625, theta = 0 },
]
"#;

#[test]
fn both_conventions_give_one_chain() {
    let standard = machine(TEXTBOOK_STANDARD);
    let modified = machine(TEXTBOOK_SHIFTED);
    for sample in 0..100 {
        let values = spread(6, sample);
        let [a, b] = [flange(&standard, &values), flange(&modified, &values)];
        let b_origin = b.translation.vector;
        assert_origin(&a, [b_origin.x, b_origin.y, b_origin.z], 1e-14);
        let rows = b.rotation.to_rotation_matrix().into_inner().transpose();
        assert_rotation(&a, rows.as_slice().try_into().unwrap(), 1e-14);
    }
}

#[test]
fn a_tip_on_a_table_sits_on_the_frame_after_its_row() {
    // In the standard convention that frame lies beyond the row's a and alpha; frame 2 of the
    // textbook arm at zero is 431.8 mm along x.
    let text = format!("{TEXTBOOK_STANDARD}\n[[tip]]\nname = \"upper\"\nparent = \"joint2\"\n");
    let arm = machine(&text);
    assert_origin(&flange(&arm, &[0.0; 6]), [0.4318, 0.14909, 0.0], 1e-14);
}

#[test]
fn textbook_arm_at_the_published_pose() {
    let pose = flange(
        &machine(TEXTBOOK_STANDARD),
        &degrees([90.0, 0.0, 90.0, 0.0, 0.0, 0.0]),
    );
    assert_rotation(
        &pose,
        [0.0, -1.0, 0.0, 0.0, 0.0, 1.0, -1.0, 0.0, 0.0],
        1e-14,
    );
    assert_origin(&pose, [-0.14909, 0.92112, 0.02032], 1e-14);
}

#[test]
fn textbook_arm_at_recomputed_poses() {
    let arm = machine(TEXTBOOK_STANDARD);
    let zero = flange(&arm, &[0.0; 6]);
    assert_rotation(&zero, [1.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 0.0, 1.0], 1e-14);
    assert_origin(&zero, [0.41148, 0.14909, 0.48932], 1e-14);
    let pose = flange(&arm, &degrees([10.0, 20.0, 30.0, 40.0, 50.0, 60.0]));
    let rows = [
        -0.636562136,
        0.022715838,
        0.770890808,
        0.771180006,
        0.029595573,
        0.635928849,
        -0.008369299,
        0.999303804,
        -0.036357421,
    ];
    assert_rotation(&pose, rows, 1e-9);
    assert_origin(
        &pose,
        [0.730916094009, 0.308395181574, 0.144208650382],
        1e-12,
    );
}

/// Craig, *Introduction to Robotics: Mechanics and Control*, Fig. 3.21 and eqs 3.14 (table and
/// formula from memory, digits recomputed).
#[test]
fn textbook_arm_in_the_modified_convention() {
    let [a2, a3, d3, d4] = [0.4318, -0.02032, 0.14909, 0.43307];
    let arm = machine(&format!(
        r#"
        [dh]
        convention = "modified"
        angles = "degrees"
        rows = [
          {{ alpha = 0 }}, {{ alpha = -90 }}, {{ a = {a2}, d = {d3} }},
          {{ a = {a3}, alpha = -90, d = {d4} }}, {{ alpha = 90 }}, {{ alpha = -90 }},
        ]"#
    ));
    let values = degrees([10.0, 20.0, 30.0, 40.0, 50.0, 60.0]);
    assert_origin(
        &flange(&arm, &values),
        [0.034131834330, 0.157408316859, -0.410490304931],
        1e-12,
    );
    for sample in 0..100 {
        let values = spread(6, sample);
        let (s1, c1) = values[0].sin_cos();
        let (s2, c2) = values[1].sin_cos();
        let (s23, c23) = (values[1] + values[2]).sin_cos();
        let radius = a2 * c2 + a3 * c23 - d4 * s23;
        let expected = [
            c1 * radius - d3 * s1,
            s1 * radius + d3 * c1,
            -a3 * s23 - a2 * s2 - d4 * c23,
        ];
        assert_origin(&flange(&arm, &values), expected, 1e-14);
    }
}

/// Schilling, *Fundamentals of Robotics*, 1990 (table and limits from memory, poses recomputed).
#[test]
fn horizontal_arm_with_a_prismatic_joint() {
    let arm = machine(
        r#"
        [dh]
        convention = "standard"
        angles = "degrees"
        rows = [
          { a = 0.425, alpha = 180, d = 0.877, limits = [-150, 150] },
          { a = 0.375, limits = [-147, 147] },
          { kind = "prismatic", limits = [0, 0.195] },
          { d = 0.2 },
        ]"#,
    );
    let zero = flange(&arm, &[0.0; 4]);
    assert_rotation(
        &zero,
        [1.0, 0.0, 0.0, 0.0, -1.0, 0.0, 0.0, 0.0, -1.0],
        1e-14,
    );
    assert_origin(&zero, [0.8, 0.0, 0.677], 1e-14);
    let [a, b, d] = degrees([30.0, -60.0, 45.0]);
    assert_origin(
        &flange(&arm, &[a, b, 0.1, d]),
        [0.368060797, 0.5875, 0.577],
        1e-9,
    );
}

/// Craig, MATLAB exercises of chapters 3 and 4 (from memory, recomputed).
#[test]
fn planar_arm_with_three_joints() {
    let arm = machine(
        r#"
        [[joint]]
        name = "a"
        kind = "revolute"
        [[joint]]
        name = "b"
        kind = "revolute"
        xyz = [4, 0, 0]
        [[joint]]
        name = "c"
        kind = "revolute"
        xyz = [3, 0, 0]
        [[tip]]
        name = "end"
        xyz = [2, 0, 0]
        "#,
    );
    assert_origin(&flange(&arm, &[0.0; 3]), [9.0, 0.0, 0.0], 1e-14);
    let pose = flange(&arm, &degrees([10.0, 20.0, 30.0]));
    assert_origin(&pose, [7.537307, 3.926644, 0.0], 1e-6);
    assert!((pose.rotation.angle().to_degrees() - 60.0).abs() < 1e-12);
    let pose = flange(&arm, &degrees([90.0, 90.0, 90.0]));
    assert_origin(&pose, [-3.0, 2.0, 0.0], 1e-14);
    assert_rotation(&pose, [0.0, 1.0, 0.0, -1.0, 0.0, 0.0, 0.0, 0.0, 1.0], 1e-14);
}

/// Rodrigues 1840; exact rationals.
#[test]
fn turns_about_slanted_axes() {
    let about = |axis: &str, degrees: f64| {
        let text = format!(
            "[[joint]]\nname = \"a\"\nkind = \"revolute\"\naxis = {axis}\n[[tip]]\nname = \"end\"\n"
        );
        flange(&machine(&text), &[degrees.to_radians()])
    };
    assert_rotation(
        &about("[1, 1, 1]", 120.0),
        [0.0, 0.0, 1.0, 1.0, 0.0, 0.0, 0.0, 1.0, 0.0],
        1e-15,
    );
    let ninths = [1.0, -4.0, 8.0, 8.0, 4.0, 1.0, -4.0, 7.0, 4.0].map(|k: f64| k / 9.0);
    assert_rotation(&about("[1e-200, 2e-200, 2e-200]", 90.0), ninths, 1e-14);
}

/// Fixed-axis roll, pitch, yaw as in the open robot description format: first roll about x, then
/// pitch about y, finally yaw about z (joint page of the specification; digits recomputed).
#[test]
fn roll_pitch_yaw_is_about_fixed_axes_in_that_order() {
    let turned = |rpy: &str| {
        let text =
            format!("[[joint]]\nname = \"a\"\nkind = \"fixed\"\n{rpy}\n[[tip]]\nname = \"end\"\n");
        flange(&machine(&text), &[0.0])
    };
    let rows = [
        0.936293363584199,
        -0.275095847318244,
        0.218350663146334,
        0.289629477625516,
        0.956425085849232,
        -0.036957013524625,
        -0.198669330795061,
        0.097843395007256,
        0.975170327201816,
    ];
    assert_rotation(&turned("rpy = [0.1, 0.2, 0.3]"), rows, 1e-14);
    assert_rotation(
        &turned("rpy_deg = [90, 90, 90]"),
        [0.0, 0.0, 1.0, 0.0, 1.0, 0.0, -1.0, 0.0, 0.0],
        1e-15,
    );
}

#[test]
fn joints_may_stand_before_their_parents_and_followers_before_their_leaders() {
    let arm = machine(
        r#"
        [[joint]]
        name = "hand"
        kind = "revolute"
        parent = "arm"
        xyz = [1, 0, 0]
        follows = { joint = "arm", ratio = -0.5, offset_deg = 45 }
        [[joint]]
        name = "arm"
        kind = "revolute"
        parent = "base"
        [[tip]]
        name = "end"
        parent = "hand"
        xyz = [1, 0, 0]
        "#,
    );
    let names: Vec<&str> = arm.joints.iter().map(|joint| joint.name.as_str()).collect();
    assert_eq!(names, ["arm", "hand"]);
    // arm 90, hand 45 - 45 = 0: straight along y. What is said of the follower does not matter.
    assert_origin(
        &flange(&arm, &[90f64.to_radians(), 3.0]),
        [0.0, 2.0, 0.0],
        1e-14,
    );
}

fn target(machine: &Machine, text: &str) -> Target {
    let line = read::Line {
        number: 1,
        bytes: Some(text.as_bytes().to_vec()),
    };
    read::target(&line, "test.jsonl", machine).unwrap()
}

const ONE_JOINT: &str = "[[joint]]\nname = \"a\"\nkind = \"revolute\"\nlimits = [-1, 1]\n\
                         [[tip]]\nname = \"end\"\nxyz = [1, 0, 0]\n";

#[test]
fn a_posture_beyond_a_limit_does_not_meet() {
    let arm = machine(ONE_JOINT);
    let anywhere = target(&arm, r#"{"xyz":[0,0,0],"xyz_within":2}"#);
    assert!(meets(&arm, &anywhere, &[1.0], 0.0));
    assert!(!meets(&arm, &anywhere, &[1f64.next_up()], 1e-9));
    assert!(!meets(&arm, &anywhere, &[f64::NAN], 1e-9));
}

#[test]
fn the_box_is_kept_along_each_axis() {
    let arm = machine(ONE_JOINT);
    let near = target(&arm, r#"{"xyz":[1,0.25,0],"xyz_within":[0.5,0.25,0]}"#);
    assert!(meets(&arm, &near, &[0.0], 0.0));
    assert!(!meets(&arm, &near, &[-1e-8], 1e-9));
    assert!(meets(&arm, &near, &[-1e-10], 1e-9));
}

#[test]
fn small_turns_are_told_apart() {
    // The cosine of 1e-8 is 1 in double precision, so the trace alone would see no turn at all.
    let arm = machine(ONE_JOINT);
    let turned = target(
        &arm,
        r#"{"xyz":[1,0,0],"xyz_within":1,"quat":[1,0,0,0],"turn_within":1e-8}"#,
    );
    assert!(meets(&arm, &turned, &[0.99e-8], 0.0));
    assert!(!meets(&arm, &turned, &[1.01e-8], 0.0));
}

#[test]
fn half_turns_are_told_apart() {
    let arm = machine(&ONE_JOINT.replace("limits = [-1, 1]\n", ""));
    let within = std::f64::consts::PI - 1e-8;
    let turned = target(
        &arm,
        &format!(r#"{{"xyz":[1,0,0],"xyz_within":3,"quat":[1,0,0,0],"turn_within":{within}}}"#),
    );
    assert!(meets(&arm, &turned, &[within - 1e-10], 0.0));
    assert!(!meets(&arm, &turned, &[within + 1e-10], 0.0));
}

#[test]
fn every_cone_must_hold() {
    let arm = machine(ONE_JOINT);
    let two = target(
        &arm,
        r#"{"xyz":[1,0,0],"xyz_within":2,"axis":[
            {"tip":[0,0,5],"base":[0,0,1],"within":0},
            {"tip":[1,0,0],"base":[1,0,0],"within_deg":10}]}"#,
    );
    assert!(meets(&arm, &two, &degrees([9.99]), 0.0));
    assert!(!meets(&arm, &two, &degrees([10.01]), 1e-9));
}
