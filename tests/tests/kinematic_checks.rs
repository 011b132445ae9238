//! Published arms: sixteen postures for one pose, closed forms, and what the search says of them.

#[path = "kinematic_checks/closed_form.rs"]
mod closed_form;

use balk::kinematics::{meets, tip_pose};
use balk::model::{Machine, Orientation, Target};
use balk::pack::pack_target;
use balk::posture::Linkage;
use balk::read;
use balk::search::{Screening, Solver, Verdict};
use balk_core::fixed::{Arc, Direction, ONE};
use balk_core::propagate::cell::{Cell, JointSpan};
use balk_core::propagate::{Goal, Network};
use balk_core::screen::{cells_for, limits};
use balk_tests::families::published as machine;
use balk_tests::rotation;
use closed_form::{horizontal_reaches, textbook_postures, textbook_reaches};
use nalgebra::{Isometry3, Matrix3, Rotation3, Vector3};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::f64::consts::{PI, TAU};

/// Nodes any of these questions may take.
const NODES: u64 = 2000;

fn degrees<const N: usize>(values: [f64; N]) -> [f64; N] {
    values.map(f64::to_radians)
}

fn target(pose: &Isometry3<f64>, xyz_within: f64, turn_within: f64) -> Target {
    Target {
        id: String::new(),
        tip: 0,
        xyz: pose.translation.vector,
        xyz_within: Vector3::repeat(xyz_within),
        orientation: Orientation::Near {
            rotation: pose.rotation.to_rotation_matrix(),
            within: turn_within,
        },
    }
}

/// The joint values of the posture found, `None` when there is none.
///
/// # Panics
/// When the search leaves the question open.
fn decide(solver: &Solver, target: &Target) -> Option<Vec<f64>> {
    match solver.decide(target, NODES).verdict {
        Verdict::Reachable { joints } => Some(joints),
        Verdict::Unreachable { .. } => None,
        Verdict::Undecided { reason } => panic!("undecided: {reason}"),
    }
}

/// Whether the controller refuses the target at so many splits.
fn refused(solver: &Solver, target: &Target, splits: u16) -> bool {
    matches!(solver.screen(target, splits), Screening::Refused { .. })
}

/// The difference of two angles, at most half a turn.
fn apart(a: f64, b: f64) -> f64 {
    let turns = (a - b) / TAU;
    (turns - turns.round()).abs() * TAU
}

/// One pose of each file: the textbook arm's as printed in Fu, Gonzalez & Lee 1987, sec. 2.2; the
/// modified table's (Craig, *Introduction to Robotics*, Fig. 3.21) and the horizontal arm's
/// (Schilling, *Fundamentals of Robotics*, 1990) computed. The search finds postures for them.
#[test]
fn the_files_give_their_poses_and_the_search_takes_them_back() {
    let cases: [(&str, Vec<f64>, [f64; 3]); 3] = [
        (
            "textbook_six",
            degrees([90.0, 0.0, 90.0, 0.0, 0.0, 0.0]).to_vec(),
            [-0.14909, 0.92112, 0.02032],
        ),
        (
            "textbook_six_modified",
            degrees([10.0, 20.0, 30.0, 40.0, 50.0, 60.0]).to_vec(),
            [0.034131834330, 0.157408316859, -0.410490304931],
        ),
        (
            "horizontal",
            [&degrees([30.0, -60.0])[..], &[0.1], &degrees([45.0])].concat(),
            [0.368060797, 0.5875, 0.577],
        ),
    ];
    for (name, q, origin) in cases {
        let arm = machine(name);
        let pose = tip_pose(&arm, &q, 0);
        let miss = (pose.translation.vector - Vector3::from(origin)).amax();
        assert!(miss < 1e-9, "{name}: off by {miss}");
        let target = target(&pose, 0.0, 0.0);
        let solver = Solver::new(&arm, 0).unwrap();
        let joints = decide(&solver, &target).expect(name);
        assert!(meets(&arm, &target, &joints, 1e-9), "{name}");
        assert!(!refused(&solver, &target, 32), "{name}");
    }
}

/// Manseur & Doty, *A robot manipulator with 16 real inverse kinematic solution sets*, Int. J.
/// Robotics Research 8(5), 1989, 75-79: the target, as printed to six decimals (from memory).
const SIXTEEN_ROTATION: [f64; 9] = [
    -0.760117, -0.641689, 0.102262, 0.133333, 0.0, 0.991071, -0.635959, 0.766965, 0.085558,
];
const SIXTEEN_ORIGIN: [f64; 3] = [-1.140175, 0.0, 0.0];

/// Eight of the postures of the orthogonal arm, degrees (computed).
const BASE_POSTURES: [[f64; 6]; 8] = [
    [-120.7479, 173.0661, 1.5275, 148.6724, -33.9130, -37.3954],
    [-96.2923, -5.7663, 0.8581, 141.5227, 128.0776, 140.3692],
    [-11.7682, -105.4953, 65.5104, 178.7569, 173.5916, 100.6020],
    [0.0, 107.4576, 112.4603, -7.6622, 0.0, 0.0],
    [88.6703, -176.6820, 1.6056, -116.7161, 22.1714, -40.0563],
    [113.8414, 4.7406, 0.9071, -124.0461, -116.3413, 137.5373],
    [168.7033, -104.2054, 146.5562, -16.3935, -170.9030, 98.2158],
    [180.0, 107.4576, -147.3755, -7.6623, -164.6755, 180.0],
];

/// All sixteen, radians: those above and their twins (computed).
fn sixteen_postures() -> Vec<[f64; 6]> {
    BASE_POSTURES
        .into_iter()
        .flat_map(|q| {
            let [a, b, c, d, e, f] = q;
            [q, [a, b, c + 180.0, 180.0 - d, 180.0 - e, f + 180.0]]
        })
        .map(degrees)
        .collect()
}

/// The target through the reader, which projects the printed rotation. Tolerances of a few units
/// of the last printed decimal: below that the print is no pose of the arm at all.
fn sixteen_target(machine: &Machine) -> Target {
    let text = format!(
        "{{\"xyz\":{SIXTEEN_ORIGIN:?},\"xyz_within\":4e-6,\"rotation\":{SIXTEEN_ROTATION:?},\
         \"turn_within\":4e-6}}"
    );
    let line = read::Line {
        number: 1,
        bytes: Some(text.into_bytes()),
    };
    read::target(&line, "test.jsonl", machine).unwrap()
}

#[test]
fn all_sixteen_postures_give_the_printed_pose() {
    let arm = machine("sixteen");
    let target = sixteen_target(&arm);
    for q in sixteen_postures() {
        let pose = tip_pose(&arm, &q, 0);
        let turn = pose.rotation.to_rotation_matrix().into_inner();
        let miss = (turn - Matrix3::from_row_slice(&SIXTEEN_ROTATION)).amax();
        assert!(miss < 2e-6, "{q:?}: rotation off by {miss}");
        let miss = (pose.translation.vector - Vector3::from(SIXTEEN_ORIGIN)).amax();
        assert!(miss < 2e-6, "{q:?}: origin off by {miss}");
        assert!(meets(&arm, &target, &q, 0.0), "{q:?}");
    }
    // Exact anchor of the fourth (computed): the sine of its fourth angle is -0.2 / 1.5.
    let fourth = BASE_POSTURES[3][3].to_radians();
    assert!((fourth.sin() + 0.2 / 1.5).abs() < 1e-6);
}

#[test]
fn the_pose_with_sixteen_postures_is_never_refused() {
    for name in ["sixteen", "sixteen_twisted"] {
        let arm = machine(name);
        let target = sixteen_target(&arm);
        let solver = Solver::new(&arm, 0).unwrap();
        for splits in [1, 4, 8, 16, 32] {
            assert!(
                !refused(&solver, &target, splits),
                "{name} at {splits} splits"
            );
        }
        let joints = decide(&solver, &target).expect(name);
        assert!(meets(&arm, &target, &joints, 1e-9), "{name}");
    }
}

/// The arc of a variable about one value of its joint, `half` to either side.
fn arc_about(solver: &Solver, variable: usize, value: f64, half: f64) -> (Arc, Direction) {
    let drive = &solver.pack.drives[variable];
    let middle = (value - drive.offset) / drive.multiple;
    let direction = |angle: f64| Direction {
        x: (angle.cos() * ONE as f64).round() as i32,
        y: (angle.sin() * ONE as f64).round() as i32,
    };
    let arc = Arc::new(direction(middle - half), direction(middle + half));
    (arc, direction(middle))
}

/// Whether propagation over spans about a posture keeps the posture.
fn keeps(solver: &Solver, target: &Target, posture: &[f64], half: f64) -> bool {
    let packed = pack_target(target, solver.pack.scale);
    let goal = Goal::new(&packed);
    let chain = solver.pack.machine.chain();
    let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
    let mut network = Network::new(chain, &goal, solver.options.rules, &mut cells);
    let mut spans = limits(chain);
    let mut at = Vec::new();
    for (variable, span) in spans.iter_mut().enumerate() {
        let value = posture[solver.pack.drives[variable].joint];
        let (arc, middle) = arc_about(solver, variable, value, half);
        *span = JointSpan::of_arc(arc);
        at.push(middle);
    }
    network.propagate(&mut spans).is_ok()
        && spans
            .iter()
            .zip(at)
            .all(|(span, middle)| span.arc.contains(middle))
}

#[test]
fn propagation_keeps_each_of_the_sixteen_postures() {
    let arm = machine("sixteen");
    let target = sixteen_target(&arm);
    let solver = Solver::new(&arm, 0).unwrap();
    for q in sixteen_postures() {
        for half in [1.0, 0.1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6, 1e-8] {
            assert!(keeps(&solver, &target, &q, half), "{q:?} within {half}");
        }
    }
}

/// Spans that leave every posture out by one milliradian are closed in the end.
#[test]
fn spans_beside_the_sixteen_postures_hold_none() {
    let mut arm = machine("sixteen");
    let target = sixteen_target(&arm);
    let mut first: Vec<f64> = sixteen_postures().iter().map(|q| q[0]).collect();
    first.sort_by(f64::total_cmp);
    first.dedup();
    first.push(first[0] + TAU);
    for pair in first.windows(2).filter(|pair| pair[1] - pair[0] > 0.01) {
        arm.joints[0].limits = Some([pair[0] + 1e-3, pair[1] - 1e-3]);
        let solver = Solver::new(&arm, 0).unwrap();
        assert_eq!(decide(&solver, &target), None, "{pair:?}");
        arm.joints[0].limits = Some([pair[0] + 1e-3, pair[1] + 1e-3]);
        let solver = Solver::new(&arm, 0).unwrap();
        assert!(decide(&solver, &target).is_some(), "{pair:?}");
    }
}

/// Distinct postures for one pose, found by descent from random starts.
fn postures(
    solver: &Solver,
    linkage: &Linkage,
    target: &Target,
    starts: usize,
    rng: &mut ChaCha8Rng,
) -> Vec<Vec<f64>> {
    let mut found: Vec<Vec<f64>> = Vec::new();
    for _ in 0..starts {
        let mut values: Vec<f64> = linkage
            .limits
            .iter()
            .map(|_| rng.random_range(-PI..PI))
            .collect();
        if linkage.seek(target, &mut values) > 1e-20 {
            continue;
        }
        let near = |known: &Vec<f64>| known.iter().zip(&values).all(|(a, b)| apart(*a, *b) < 1e-4);
        if !found.iter().any(near) {
            let mut joints = values.clone();
            for (value, drive) in values.iter().zip(&solver.pack.drives) {
                joints[drive.joint] = *value;
            }
            found.push(joints);
        }
    }
    found
}

/// At most sixteen: Primrose, *Mech. Mach. Theory* 21, 1986, 509-512; Lee & Liang, ibid. 23,
/// 1988, 219-226 (from memory). That the pose of Manseur & Doty has exactly sixteen, for either
/// reading of the twists, was computed by another root finder.
#[test]
fn the_pose_has_exactly_sixteen_postures() {
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    for name in ["sixteen", "sixteen_twisted"] {
        let arm = machine(name);
        let mut target = sixteen_target(&arm);
        target.xyz_within = Vector3::zeros();
        if let Orientation::Near { within, .. } = &mut target.orientation {
            *within = 0.0;
        }
        let solver = Solver::new(&arm, 0).unwrap();
        let linkage = Linkage::new(&arm, 0, &solver.pack.drives);
        let found = postures(&solver, &linkage, &target, 4000, &mut rng);
        assert_eq!(found.len(), 16, "{name}");
        for q in &found {
            assert!(meets(&arm, &target, q, 1e-9));
            if name == "sixteen" {
                let known = |p: &[f64; 6]| p.iter().zip(q).all(|(a, b)| apart(*a, *b) < 1e-5);
                assert!(sixteen_postures().iter().any(known), "{q:?}");
            }
        }
    }
}

/// At most sixteen as above; at most eight with a spherical wrist (Pieper, thesis, Stanford 1968,
/// from memory).
#[test]
fn no_pose_has_more_postures_than_the_theory_allows() {
    let mut rng = ChaCha8Rng::seed_from_u64(2);
    for (name, most) in [
        ("sixteen", 16),
        ("sixteen_twisted", 16),
        ("textbook_six", 8),
    ] {
        let mut arm = machine(name);
        for joint in &mut arm.joints {
            joint.limits = None;
        }
        let solver = Solver::new(&arm, 0).unwrap();
        let linkage = Linkage::new(&arm, 0, &solver.pack.drives);
        let mut highest = 0;
        for _ in 0..12 {
            let q: Vec<f64> = (0..6).map(|_| rng.random_range(-PI..PI)).collect();
            let target = target(&tip_pose(&arm, &q, 0), 0.0, 0.0);
            let found = postures(&solver, &linkage, &target, 600, &mut rng);
            assert!(
                (1..=most).contains(&found.len()),
                "{name} at {q:?}: {}",
                found.len()
            );
            highest = highest.max(found.len());
        }
        assert!(highest >= 8, "{name}: {highest}");
    }
}

#[test]
fn the_closed_form_reproduces_its_poses() {
    let arm = machine("textbook_six");
    let mut rng = ChaCha8Rng::seed_from_u64(3);
    let mut postures = 0;
    for _ in 0..500 {
        let q: Vec<f64> = (0..6).map(|_| rng.random_range(-PI..PI)).collect();
        let pose = tip_pose(&arm, &q, 0);
        let found = textbook_postures(&pose);
        assert!(
            found
                .iter()
                .any(|p| p.iter().zip(&q).all(|(a, b)| apart(*a, *b) < 1e-7))
        );
        for p in &found {
            let again = tip_pose(&arm, p, 0);
            assert!((again.translation.vector - pose.translation.vector).amax() < 1e-12);
            assert!(again.rotation.angle_to(&pose.rotation) < 1e-7);
        }
        postures += found.len();
    }
    assert!(postures > 2000, "{postures}");
}

/// Random poses: from random joint values, a third of them within limits, and uniform in the
/// reach ball.
fn random_pose(arm: &Machine, rng: &mut ChaCha8Rng, kind: usize) -> Isometry3<f64> {
    if kind == 0 {
        let reach = 0.95;
        let p = loop {
            let p = Vector3::from_fn(|_, _| rng.random_range(-reach..reach));
            if p.norm() < reach {
                break p;
            }
        };
        return Isometry3::from_parts(p.into(), rotation::random(rng).into());
    }
    let q: Vec<f64> = arm
        .joints
        .iter()
        .map(|joint| match joint.limits {
            Some([lo, hi]) if kind == 1 => rng.random_range(lo..hi),
            _ => rng.random_range(-PI..PI),
        })
        .collect();
    tip_pose(arm, &q, 0)
}

/// Compares the search with a closed form that is given a spare on the limits; poses on which
/// the spare makes a difference are left out. Returns (compared, reachable, undecided).
fn compare(
    arm: &Machine,
    poses: impl Iterator<Item = Isometry3<f64>>,
    reaches: impl Fn(&Isometry3<f64>, f64) -> bool,
) -> [usize; 3] {
    let solver = Solver::new(arm, 0).unwrap();
    let [mut compared, mut reachable, mut undecided] = [0; 3];
    for pose in poses {
        let expected = reaches(&pose, 0.0);
        if reaches(&pose, 1e-7) != reaches(&pose, -1e-7) {
            continue;
        }
        compared += 1;
        let target = target(&pose, 0.0, 0.0);
        match solver.decide(&target, NODES).verdict {
            Verdict::Reachable { joints } => {
                assert!(
                    expected,
                    "reachable against the closed form: {pose:?} {joints:?}"
                );
                assert!(meets(arm, &target, &joints, 1e-9));
                reachable += 1;
            }
            Verdict::Unreachable { .. } => {
                assert!(!expected, "unreachable against the closed form: {pose:?}");
            }
            Verdict::Undecided { .. } => undecided += 1,
        }
        // Many splits of a reachable target cost more than the decision.
        let splits: &[u16] = if compared % 16 == 0 { &[1, 8] } else { &[1] };
        for &splits in splits.iter().filter(|_| expected) {
            assert!(
                !refused(&solver, &target, splits),
                "refused at {splits}: {pose:?}"
            );
        }
    }
    [compared, reachable, undecided]
}

#[test]
fn the_search_agrees_with_the_closed_form_of_the_textbook_arm() {
    let arm = machine("textbook_six");
    let mut rng = ChaCha8Rng::seed_from_u64(4);
    let poses = (0..2100).map(|k| random_pose(&arm, &mut rng, k % 3));
    let counts = compare(&arm, poses, |pose, spare| {
        textbook_reaches(&arm, pose, spare)
    });
    println!("compared, reachable, undecided: {counts:?}");
    let [compared, reachable, undecided] = counts;
    assert!(compared > 2090 && reachable > 700 && compared - reachable > 500);
    assert!(
        undecided * 100 <= compared,
        "{undecided} of {compared} undecided"
    );
}

/// Poses of Fu, Gonzalez & Lee 1987, sec. 2.2 (the first as printed there, the others computed):
/// reachable as they stand, and for each of the first three joints unreachable when its limits
/// leave out every posture of the closed form by one degree.
#[test]
fn limits_beside_the_postures_of_the_textbook_poses_are_told() {
    let arm = machine("textbook_six");
    for q in [
        [90.0, 0.0, 90.0, 0.0, 0.0, 0.0],
        [0.0; 6],
        [10.0, 20.0, 30.0, 40.0, 50.0, 60.0],
    ] {
        let pose = tip_pose(&arm, &degrees(q), 0);
        let target = target(&pose, 0.0, 0.0);
        let solver = Solver::new(&arm, 0).unwrap();
        let joints = decide(&solver, &target).expect("the pose has a posture");
        assert!(meets(&arm, &target, &joints, 1e-9));
        for joint in 0..3 {
            let mut values: Vec<f64> = textbook_postures(&pose)
                .iter()
                .map(|p| p[joint].rem_euclid(TAU))
                .collect();
            values.sort_by(f64::total_cmp);
            values.push(values[0] + TAU);
            let margin = 1f64.to_radians();
            for pair in values
                .windows(2)
                .filter(|pair| pair[1] - pair[0] > 3.0 * margin)
            {
                let mut tight = arm.clone();
                tight.joints[joint].limits = Some([pair[0] + margin, pair[1] - margin]);
                assert!(!textbook_reaches(&tight, &pose, 1e-7));
                let solver = Solver::new(&tight, 0).unwrap();
                assert_eq!(
                    decide(&solver, &target),
                    None,
                    "{q:?} joint {joint}: {pair:?}"
                );
                // With the next value let in, the closed form says which.
                tight.joints[joint].limits = Some([pair[0] + margin, pair[1] + margin]);
                let solver = Solver::new(&tight, 0).unwrap();
                let expected = textbook_reaches(&tight, &pose, 0.0);
                assert_eq!(
                    decide(&solver, &target).is_some(),
                    expected,
                    "{q:?} joint {joint}"
                );
            }
        }
    }
}

#[test]
fn the_search_agrees_with_the_closed_form_of_the_horizontal_arm() {
    let arm = machine("horizontal");
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    let poses = (0..3000).map(|k| {
        if k % 3 == 2 {
            let q: Vec<f64> = vec![
                rng.random_range(-PI..PI),
                rng.random_range(-PI..PI),
                rng.random_range(-0.02..0.215),
                rng.random_range(-PI..PI),
            ];
            return tip_pose(&arm, &q, 0);
        }
        let p = Vector3::new(
            rng.random_range(-0.85..0.85),
            rng.random_range(-0.85..0.85),
            rng.random_range(0.46..0.70),
        );
        let about = Rotation3::from_axis_angle(&Vector3::z_axis(), rng.random_range(-PI..PI));
        // One in six is tilted, by much or little.
        let tilt = if k % 6 == 0 {
            [0.5, 1e-3, 1e-6][k / 6 % 3]
        } else {
            0.0
        };
        let over = Rotation3::from_axis_angle(&Vector3::x_axis(), PI + tilt);
        Isometry3::from_parts(p.into(), (about * over).into())
    });
    let counts = compare(&arm, poses, |pose, spare| {
        horizontal_reaches(&arm, pose, spare)
    });
    println!("compared, reachable, undecided: {counts:?}");
    let [compared, reachable, undecided] = counts;
    assert!(compared > 2990 && reachable > 800 && compared - reachable > 800);
    assert!(
        undecided * 100 <= compared,
        "{undecided} of {compared} undecided"
    );
}
