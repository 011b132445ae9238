//! A target that some posture meets is never refused and never called unreachable.

use balk::kinematics::{meets, tip_pose};
use balk::model::{Orientation, Target};
use balk::search::{Screening, Solver, Verdict};
use balk_tests::measure::soundness;
use indicatif::ProgressBar;
use nalgebra::Vector3;

/// The packed machine must admit the posture; one the packer turns away claims nothing.
fn admits(toml: &str, lead: f64, within: f64) {
    let machine = balk::read::machine(toml.as_bytes(), "case.toml").expect("a valid machine");
    let values = balk::kinematics::joint_values(&machine, &[lead, 0.0]);
    let Ok(solver) = Solver::new(&machine, 0) else {
        return;
    };
    let pose = tip_pose(&machine, &values, 0);
    let target = Target {
        id: "planted".into(),
        tip: 0,
        xyz: pose.translation.vector,
        xyz_within: Vector3::repeat(within),
        orientation: Orientation::Near {
            rotation: pose.rotation.to_rotation_matrix(),
            within,
        },
    };
    assert!(meets(&machine, &target, &values, 1e-12), "the case itself");
    for splits in [1, 4, 16] {
        let answer = solver.screen(&target, splits);
        assert!(
            matches!(answer, Screening::Passed { .. }),
            "refused at {splits} splits"
        );
    }
    let verdict = solver.decide(&target, 40).verdict;
    assert!(
        !matches!(verdict, Verdict::Unreachable { .. }),
        "called unreachable"
    );
}

/// Two links in a plane, the second following the first.
fn pair(ratio: f64, limit: f64) -> String {
    format!(
        r#"name = "pair"
        [[joint]]
        name = "a"
        kind = "revolute"
        limits = [-{limit:?}, {limit:?}]
        [[joint]]
        name = "b"
        kind = "revolute"
        xyz = [0.5, 0, 0]
        follows = {{ joint = "a", ratio = {ratio:?} }}
        [[tip]]
        name = "t"
        xyz = [0.4, 0, 0]"#
    )
}

/// One link that follows a joint which is not on its way to the base.
fn aside(ratio: f64) -> String {
    format!(
        r#"name = "aside"
        [[joint]]
        name = "a"
        kind = "revolute"
        limits = [-3, 3]
        [[joint]]
        name = "b"
        kind = "revolute"
        parent = "base"
        follows = {{ joint = "a", ratio = {ratio:?} }}
        [[tip]]
        name = "t"
        xyz = [0.4, 0, 0]"#
    )
}

/// The multiple was cut off at 127.
#[test]
fn large_ratio() {
    admits(&pair(200.0, 1.0), 0.5, 1e-3);
    admits(&pair(-130.0, 0.01), 0.007, 1e-3);
}

/// What a whole multiple leaves of the ratio was forgotten when a variable drives one joint.
#[test]
fn crooked_ratio_of_a_leader_aside() {
    admits(&aside(1.01), 3.0, 1e-6);
    admits(&aside(0.334), 3.0, 1e-6);
}

/// The first-order rows took no account of what a whole multiple leaves of the ratio.
#[test]
fn crooked_ratio_in_rows() {
    admits(&pair(1.01, 3.0), 2.9, 0.0);
    admits(&aside(-1.01), 3.0, 1e-6);
}

/// The first-order rows took a follower's own span for a bound of its leader's.
#[test]
fn exact_ratio_in_rows() {
    admits(&pair(1.5, 3.0), -2.3, 0.001);
}

/// Random chains of every kind of joint, a third of the driven joints at a limit, geometry off by up
/// to the tolerance, targets from a point to the whole reach.
#[test]
fn random_machines() {
    let tally = soundness::run(1000, 10, 6, 3, &ProgressBar::hidden());
    assert!(tally.machines >= 800, "{} machines", tally.machines);
    assert!(
        tally.reachable > tally.targets / 10,
        "{} reachable",
        tally.reachable
    );
    assert_eq!(tally.wrong(), 0, "{}", tally.failures.join("\n"));
}
