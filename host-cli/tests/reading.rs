//! What the readers make of sound input, and that no input makes them fail in another way than by
//! an error.

use std::f64::consts::{FRAC_PI_2, PI};
use std::io::BufReader;

use balk::kinematics::tip_pose;
use balk::model::{Kind, Machine, Orientation, Target};
use balk::read::{self, Line, Lines, MAX_LINE_BYTES};
use nalgebra::{Rotation3, Vector3};

const ORCHARD: &str = include_str!("../demo/orchard.toml");
const CAMERA: &str = include_str!("../demo/camera.jsonl");

fn machine(text: &str) -> Machine {
    read::machine(text.as_bytes(), "some/where/m.toml").unwrap()
}

fn line(text: &str) -> Line {
    Line {
        number: 7,
        bytes: Some(text.as_bytes().to_vec()),
    }
}

fn target(text: &str) -> Target {
    read::target(&line(text), "t.jsonl", &machine(ORCHARD)).unwrap()
}

#[test]
fn a_joint_with_everything_left_out_has_the_defaults() {
    let machine = machine(
        "[[joint]]\nname = \"a\"\nkind = \"revolute\"\n[[joint]]\nname = \"b\"\nkind = \"fixed\"\n\
         [[tip]]\nname = \"end\"\n",
    );
    assert_eq!(machine.name, "m");
    let [a, b] = machine.joints.as_slice() else {
        panic!()
    };
    assert_eq!(
        (a.parent, b.parent, machine.tips[0].parent),
        (None, Some(0), Some(1))
    );
    assert_eq!((a.kind, b.kind), (Kind::Revolute, Kind::Fixed));
    assert_eq!(
        (a.limits, a.axis, a.placement),
        (None, Vector3::z_axis(), Default::default())
    );
    assert_eq!((a.tolerance.xyz, a.tolerance.angle), (0.0, 0.0));
    assert!(a.follows.is_none());
}

#[test]
fn a_joint_with_everything_given_is_read_in_si_units() {
    let machine = machine(
        r#"
        [[joint]]
        name = "a"
        kind = "revolute"
        [[joint]]
        name = "b"
        kind = "revolute"
        parent = "base"
        xyz = [1, 2.5, -3e-1]
        axis = [0, -2, 0]
        limits_deg = [-90, 0x5A]
        tolerance = { xyz = 0.001, angle_deg = 180 }
        follows = { joint = "a", ratio = -2, offset_deg = 90 }
        [[tip]]
        name = "end"
        parent = "base"
        "#,
    );
    let b = &machine.joints[1];
    assert_eq!((b.parent, machine.tips[0].parent), (None, None));
    assert_eq!(b.placement.translation.vector, Vector3::new(1.0, 2.5, -0.3));
    assert_eq!(b.axis.into_inner(), Vector3::new(0.0, -1.0, 0.0));
    assert_eq!(b.limits, Some([-FRAC_PI_2, FRAC_PI_2]));
    assert_eq!((b.tolerance.xyz, b.tolerance.angle), (0.001, PI));
    let follows = b.follows.unwrap();
    assert_eq!(
        (follows.joint, follows.ratio, follows.offset),
        (0, -2.0, FRAC_PI_2)
    );
}

#[test]
fn a_table_in_radians_is_the_table_in_degrees() {
    let table = |angles: &str, quarter: f64| {
        machine(&format!(
            "[dh]\nconvention = \"standard\"\nangles = \"{angles}\"\nrows = [\
             {{ name = \"swing\", a = 1, alpha = {quarter}, limits = [-{quarter}, {quarter}] }},\
             {{ d = 2, theta = {quarter}, kind = \"prismatic\", limits = [0, 0.5] }}]"
        ))
    };
    let [degrees, radians] = [table("degrees", 90.0), table("radians", FRAC_PI_2)];
    for machine in [&degrees, &radians] {
        let names: Vec<&str> = machine
            .joints
            .iter()
            .map(|joint| joint.name.as_str())
            .collect();
        assert_eq!(names, ["swing", "joint2"]);
        assert_eq!(machine.joints[0].limits, Some([-FRAC_PI_2, FRAC_PI_2]));
        assert_eq!(machine.joints[1].limits, Some([0.0, 0.5]));
        assert_eq!(machine.tips.len(), 1);
        assert_eq!(machine.tips[0].name, "flange");
    }
    let pose = |machine| tip_pose(machine, &[0.3, 0.2], 0);
    assert!(
        (pose(&degrees).inverse() * pose(&radians))
            .translation
            .vector
            .amax()
            < 1e-15
    );
}

#[test]
fn a_target_is_read_in_si_units() {
    let read = target(
        r#"{"id":"bin","tip":"gripper","xyz":[1,2e-1,-3],"xyz_within":[0,0.5,1],
            "rpy_deg":[90,0,0],"turn_within_deg":180}"#,
    );
    assert_eq!((read.id.as_str(), read.tip), ("bin", 0));
    assert_eq!(read.xyz, Vector3::new(1.0, 0.2, -3.0));
    assert_eq!(read.xyz_within, Vector3::new(0.0, 0.5, 1.0));
    let Orientation::Near { rotation, within } = read.orientation else {
        panic!()
    };
    assert!((rotation * Vector3::y() - Vector3::z()).amax() < 1e-15);
    assert_eq!(within, PI);
}

#[test]
fn a_target_without_an_id_or_orientation_has_its_line_and_is_free() {
    let read = target(r#"{"xyz":[0,0,0],"xyz_within":0.5}"#);
    assert_eq!(
        (read.id.as_str(), read.xyz_within),
        ("7", Vector3::repeat(0.5))
    );
    assert!(matches!(read.orientation, Orientation::Free));
}

#[test]
fn axes_are_brought_to_unit_length() {
    let read = target(
        r#"{"xyz":[0,0,0],"xyz_within":1,"axis":[{"tip":[0,0,1e-300],"base":[3,0,4],"within":0.5},
            {"tip":[1e300,0,0],"base":[0,1,0],"within_deg":90}]}"#,
    );
    let Orientation::Axes(cones) = read.orientation else {
        panic!()
    };
    assert_eq!(cones[0].tip, Vector3::z_axis());
    assert!((cones[0].base.into_inner() - Vector3::new(0.6, 0.0, 0.8)).amax() < 1e-15);
    assert_eq!((cones[0].within, cones[1].within), (0.5, FRAC_PI_2));
    assert_eq!(cones[1].tip, Vector3::x_axis());
}

/// The rotation and tolerance of a target with the orientation `text` and `turn_within` 0.25.
fn near(text: &str) -> (Rotation3<f64>, f64) {
    let text = format!(r#"{{"xyz":[0,0,0],"xyz_within":1,{text},"turn_within":0.25}}"#);
    match target(&text).orientation {
        Orientation::Near { rotation, within } => (rotation, within),
        other => panic!("{other:?}"),
    }
}

fn assert_is_rotation(rotation: &Rotation3<f64>) {
    let m = rotation.matrix();
    assert!(
        (m * m.transpose() - nalgebra::Matrix3::identity()).amax() < 1e-15,
        "{m}"
    );
    assert!(m.determinant() > 0.0);
}

#[test]
fn a_quaternion_slightly_too_long_widens_the_tolerance() {
    let (rotation, within) = near(r#""quat":[0,0,0,1.0005]"#);
    assert_is_rotation(&rotation);
    assert_eq!(rotation * Vector3::x(), -Vector3::x());
    assert!((within - 0.251).abs() < 1e-15, "{within}");
    assert_eq!(near(r#""quat":[0.6,0,0.8,0]"#).1, 0.25);
}

#[test]
fn a_rotation_slightly_off_is_projected_and_widens_the_tolerance() {
    let (rotation, within) = near(r#""rotation":[0,-1.0009,0, 1.0009,0,0, 0,0,1.0009]"#);
    assert_is_rotation(&rotation);
    assert!((rotation * Vector3::x() - Vector3::y()).amax() < 1e-15);
    assert!(
        (within - 0.25 - 0.0009 * 3f64.sqrt()).abs() < 1e-12,
        "{within}"
    );

    // Rounded to six decimals, as cameras print them: a turn of 0.3 about (1, 2, 3).
    let exact = Rotation3::new(Vector3::new(1.0, 2.0, 3.0).normalize() * 0.3);
    let rows: Vec<String> = exact
        .matrix()
        .transpose()
        .iter()
        .map(|entry| format!("{entry:.6}"))
        .collect();
    let (rotation, within) = near(&format!(r#""rotation":[{}]"#, rows.join(",")));
    assert_is_rotation(&rotation);
    assert!(exact.angle_to(&rotation) < 1.5e-6);
    assert!((0.0..3e-6).contains(&(within - 0.25)));
}

/// Markley, *Attitude determination using vector observations and the singular value
/// decomposition*, J. Astronaut. Sci. 36, 1988: the nearest rotation is the orthogonal factor.
#[test]
fn the_projection_is_the_nearest_rotation() {
    let text =
        r#""rotation":[1.0004,0.0005,-0.0003, -0.0002,0.9997,0.0006, 0.0001,-0.0004,1.0002]"#;
    let (rotation, within) = near(text);
    let written = nalgebra::Matrix3::new(
        1.0004, 0.0005, -0.0003, -0.0002, 0.9997, 0.0006, 0.0001, -0.0004, 1.0002,
    );
    let distance = (written - rotation.matrix()).norm();
    assert!((within - 0.25 - distance).abs() < 1e-15);
    for axis in [Vector3::x(), Vector3::y(), Vector3::z()] {
        for step in [-1e-5, 1e-5] {
            let other = Rotation3::new(axis * step) * rotation;
            assert!((written - other.matrix()).norm() > distance);
        }
    }
}

fn lines_of(text: &[u8]) -> Vec<(usize, Option<Vec<u8>>)> {
    let mut lines = Lines::new(BufReader::with_capacity(16, text));
    let all = std::iter::from_fn(|| lines.next_line().unwrap()).map(|l| (l.number, l.bytes));
    let all = all.collect();
    assert_eq!(lines.bytes(), text.len() as u64);
    all
}

#[test]
fn lines_are_numbered_as_an_editor_does() {
    assert_eq!(lines_of(b""), []);
    assert_eq!(lines_of(b"\n \n\r\n"), []);
    let some = |text: &str| Some(text.as_bytes().to_vec());
    assert_eq!(
        lines_of("\u{feff}one\n\ntwo, which is longer than the buffer\r\n\n last".as_bytes()),
        [
            (1, some("one")),
            (3, some("two, which is longer than the buffer")),
            (5, some("last"))
        ]
    );
}

#[test]
fn the_longest_line_is_held_and_a_longer_one_is_not() {
    let mut text = vec![b'x'; MAX_LINE_BYTES];
    text.extend(b"\ny\n");
    text.extend(vec![b'x'; MAX_LINE_BYTES + 1]);
    text.extend(b"\nz");
    let lengths: Vec<_> = lines_of(&text)
        .into_iter()
        .map(|(n, bytes)| (n, bytes.map(|b| b.len())))
        .collect();
    assert_eq!(
        lengths,
        [
            (1, Some(MAX_LINE_BYTES)),
            (2, Some(1)),
            (3, None),
            (4, Some(1))
        ]
    );
}

#[test]
fn a_chunk_is_what_has_arrived() {
    let mut lines = Lines::new(BufReader::with_capacity(8, &b"1\n2\n3\n4\n5\n6\n7"[..]));
    let mut sizes = Vec::new();
    loop {
        let chunk = lines.next_chunk(3).unwrap();
        if chunk.is_empty() {
            break;
        }
        sizes.push(chunk.len());
    }
    // The buffer holds four lines at a time.
    assert_eq!(sizes, [3, 1, 2, 1]);
}

/// Every text that `text` becomes by one small accident, some thousands of them.
fn accidents(text: &str) -> impl Iterator<Item = Vec<u8>> {
    let bytes = text.as_bytes();
    let inserts: [&[u8]; 10] = [
        b"",
        b"\"",
        b"[",
        b"}",
        b"-",
        b"9e99",
        b"\n",
        b"\xff",
        b"\xc3\xa9",
        b"nan",
    ];
    (0..bytes.len()).flat_map(move |at| {
        inserts.into_iter().flat_map(move |insert| {
            [0, 1, 9].map(|cut| {
                let rest = &bytes[(at + cut).min(bytes.len())..];
                [&bytes[..at], insert, rest].concat()
            })
        })
    })
}

#[test]
fn damaged_machines_are_errors_or_machines() {
    let joints: Vec<usize> = ORCHARD
        .match_indices("[[joint]]")
        .map(|(at, _)| at)
        .collect();
    let two_joints = &ORCHARD[joints[0]..joints[2]];
    let (mut errors, mut machines) = (0, 0);
    for bytes in accidents(two_joints) {
        let whole = [&bytes, &b"\n[[tip]]\nname = \"end\"\n"[..]].concat();
        match read::machine(&whole, "m.toml") {
            Err(defect) => {
                assert!(!defect.reason.is_empty());
                errors += 1;
            }
            Ok(machine) => {
                let pose = tip_pose(&machine, &vec![0.5; machine.joints.len()], 0);
                assert!(pose.translation.vector.iter().all(|x| x.is_finite()));
                machines += 1;
            }
        }
    }
    assert!(
        errors > 1000 && machines > 100,
        "{errors} errors, {machines} machines"
    );
}

#[test]
fn damaged_targets_are_errors_or_targets() {
    let machine = machine(ORCHARD);
    let (mut errors, mut targets) = (0, 0);
    for text in CAMERA.lines().skip(2).take(2) {
        for bytes in accidents(text) {
            match read::target(
                &Line {
                    number: 3,
                    bytes: Some(bytes),
                },
                "t.jsonl",
                &machine,
            ) {
                Err((_, defect)) => {
                    assert!(defect.line == Some(3) && !defect.reason.is_empty());
                    errors += 1;
                }
                Ok(target) => {
                    assert!(target.xyz_within.min() >= 0.0 && target.xyz.amax().is_finite());
                    targets += 1;
                }
            }
        }
    }
    assert!(
        errors > 1000 && targets > 100,
        "{errors} errors, {targets} targets"
    );
}
