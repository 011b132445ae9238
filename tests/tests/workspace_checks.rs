//! Published and computed working spaces: planar arms, dexterous sets, a spherical shell.

use balk::kinematics::meets;
use balk::model::{Machine, Orientation, Target};
use balk::search::{Screening, Solver, Verdict};
use balk_tests::families::published as machine;
use nalgebra::{Rotation3, Vector3};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::f64::consts::{PI, TAU};

/// Nodes any of these questions may take.
const NODES: u64 = 2000;

/// A point of the plane, with the heading of the last link when one is asked for.
fn planar(x: f64, y: f64, heading: Option<f64>, within: f64) -> Target {
    Target {
        id: String::new(),
        tip: 0,
        xyz: Vector3::new(x, y, 0.0),
        xyz_within: Vector3::repeat(within),
        orientation: heading.map_or(Orientation::Free, |angle| Orientation::Near {
            rotation: Rotation3::from_axis_angle(&Vector3::z_axis(), angle),
            within,
        }),
    }
}

/// What the search says: `None` when it leaves the question open.
fn reaches(machine: &Machine, solver: &Solver, target: &Target) -> Option<bool> {
    match solver.decide(target, NODES).verdict {
        Verdict::Reachable { joints } => {
            assert!(meets(machine, target, &joints, 1e-9));
            Some(true)
        }
        Verdict::Unreachable { .. } => Some(false),
        Verdict::Undecided { .. } => None,
    }
}

/// Whether the controller refuses the target at so many splits.
fn refused(solver: &Solver, target: &Target, splits: u16) -> bool {
    matches!(solver.screen(target, splits), Screening::Refused { .. })
}

/// Cosine of the second angle of a planar arm with two joints: reachable exactly when its size is
/// at most one (Craig, *Introduction to Robotics*, ch. 4; Spong, Hutchinson & Vidyasagar, *Robot
/// Modeling and Control*, ch. 5; from memory).
fn elbow_cosine(l1: f64, l2: f64, x: f64, y: f64) -> f64 {
    (x * x + y * y - l1 * l1 - l2 * l2) / (2.0 * l1 * l2)
}

/// Published and computed points inside, outside and on the edge of the ring. On the edge the
/// arm is stretched or folded: the search may leave that open, but must not call it unreachable.
#[test]
fn two_link_arms_inside_outside_and_on_the_edge_of_their_ring() {
    assert!((elbow_cosine(2.0, 1.0, 0.999, 0.0) + 1.00049975).abs() < 1e-12);
    assert!(elbow_cosine(3.0, 4.0, 5.0, 0.0).abs() < 1e-15);
    let inside = [
        ("planar_3_4", [3.0, 4.0], [5.0, 0.0]),
        ("planar_2_1", [2.0, 1.0], [1.001, 0.0]),
        ("planar_2_1", [2.0, 1.0], [2.999, 0.0]),
        ("planar_2_1", [2.0, 1.0], [0.0, -2.0]),
    ];
    for (name, [l1, l2], [x, y]) in inside {
        let arm = machine(name);
        let solver = Solver::new(&arm, 0).unwrap();
        let target = planar(x, y, None, 0.0);
        let Verdict::Reachable { joints } = solver.decide(&target, NODES).verdict else {
            panic!("{name}: ({x}, {y})")
        };
        assert!(meets(&arm, &target, &joints, 1e-9));
        let second = elbow_cosine(l1, l2, x, y);
        assert!(
            (joints[1].cos() - second).abs() < 1e-8,
            "{name}: {}",
            joints[1]
        );
    }
    let outside = [
        ("planar_2_1", [0.999, 0.0]),
        ("planar_2_1", [3.001, 0.0]),
        ("planar_2_1", [0.0, 0.0]),
        ("planar_3_4", [0.6, 0.79]),
        ("planar_3_4", [-5.0, 4.91]),
        ("planar_1_1", [0.0, 2.0001]),
    ];
    for (name, [x, y]) in outside {
        let arm = machine(name);
        let solver = Solver::new(&arm, 0).unwrap();
        let target = planar(x, y, None, 0.0);
        assert_eq!(
            reaches(&arm, &solver, &target),
            Some(false),
            "{name}: ({x}, {y})"
        );
        assert!(refused(&solver, &target, 1), "{name}: ({x}, {y})");
    }
    let edge = [
        ("planar_2_1", [1.0, 0.0]),
        ("planar_2_1", [3.0, 0.0]),
        ("planar_2_1", [-1.8, 2.4]),
        ("planar_3_4", [7.0, 0.0]),
        ("planar_3_4", [0.0, -1.0]),
        ("planar_1_1", [0.0, 0.0]),
    ];
    for (name, [x, y]) in edge {
        let arm = machine(name);
        let solver = Solver::new(&arm, 0).unwrap();
        for within in [0.0, 1e-12, 1e-9, 1e-6, 1e-3] {
            let target = planar(x, y, None, within);
            let answer = reaches(&arm, &solver, &target);
            assert_ne!(answer, Some(false), "{name}: ({x}, {y}) within {within}");
            assert!(
                within < 1e-6 || answer == Some(true),
                "{name}: ({x}, {y}) within {within}"
            );
            for splits in [1, 8, 32] {
                assert!(
                    !refused(&solver, &target, splits),
                    "{name}: ({x}, {y}) within {within}"
                );
            }
        }
    }
}

/// The same formula at random points, and just beside the edge.
#[test]
fn two_link_arms_agree_with_the_formula() {
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    let arms: [(&str, f64, f64); 3] = [
        ("planar_3_4", 3.0, 4.0),
        ("planar_2_1", 2.0, 1.0),
        ("planar_1_1", 1.0, 1.0),
    ];
    for (name, l1, l2) in arms {
        let arm = machine(name);
        let solver = Solver::new(&arm, 0).unwrap();
        let mut undecided = 0;
        for sample in 0..300 {
            let about: f64 = rng.random_range(0.0..TAU);
            let r = match sample % 6 {
                0 => l1 + l2 - 1e-6,
                1 => l1 + l2 + 1e-6,
                2 => (l1 - l2).abs() + 1e-6,
                3 if l1 != l2 => (l1 - l2).abs() - 1e-6,
                _ => rng.random_range(0.0..1.2 * (l1 + l2)),
            };
            let target = planar(r * about.cos(), r * about.sin(), None, 0.0);
            let expected = elbow_cosine(l1, l2, target.xyz.x, target.xyz.y).abs() <= 1.0;
            match reaches(&arm, &solver, &target) {
                Some(answer) => assert_eq!(answer, expected, "{name}: r {r} about {about}"),
                None => undecided += 1,
            }
        }
        assert_eq!(undecided, 0, "{name}");
    }
}

/// Craig, *Introduction to Robotics*, MATLAB exercise of chapter 4, last case (from memory;
/// radii and cosine recomputed).
#[test]
fn the_published_unreachable_target_is_refused() {
    let (x, y, heading) = (-3.1245f64, 9.1674f64, -30f64.to_radians());
    assert!((x.hypot(y) - 9.685232).abs() < 1e-6);
    let (wx, wy) = (x - 2.0 * heading.cos(), y - 2.0 * heading.sin());
    assert!((wx.hypot(wy) - 11.267746).abs() < 1e-6);
    assert!((elbow_cosine(4.0, 3.0, wx, wy) - 4.248421).abs() < 1e-6);
    let arm = machine("planar_4_3_2");
    let solver = Solver::new(&arm, 0).unwrap();
    for heading in [Some(heading), None] {
        let target = planar(x, y, heading, 0.0);
        assert_eq!(reaches(&arm, &solver, &target), Some(false));
        assert!(refused(&solver, &target, 1));
    }
}

/// The dexterous set of the arm with lengths 4, 3, 2 (definition: Kumar & Waldron, *The
/// workspaces of a mechanical manipulator*, J. Mech. Design 103, 1981, 665-672, title from
/// memory; values computed): every heading is reachable where the circle of radius 2 lies in the
/// ring from 1 to 7, that is up to 1 and from 3 to 5; up to 9 some headings are.
#[test]
fn all_headings_only_in_the_dexterous_set() {
    const HEADINGS: usize = 24;
    let arm = machine("planar_4_3_2");
    let solver = Solver::new(&arm, 0).unwrap();
    for (r, dexterous) in [
        (0.0, true),
        (0.5, true),
        (0.999, true),
        (1.03, false),
        (2.0, false),
        (2.97, false),
        (3.001, true),
        (4.0, true),
        (4.999, true),
        (5.03, false),
        (7.0, false),
        (8.9, false),
        (9.1, false),
    ] {
        let about: f64 = 0.3 + r;
        let (x, y) = (r * about.cos(), r * about.sin());
        let mut reachable = 0;
        for k in 0..HEADINGS {
            // Among them the outward and the inward heading, where the circle comes closest.
            let heading = about + TAU * k as f64 / HEADINGS as f64;
            let wrist = (x - 2.0 * heading.cos()).hypot(y - 2.0 * heading.sin());
            let expected = (1.0..=7.0).contains(&wrist);
            let target = planar(x, y, Some(heading), 0.0);
            let answer = reaches(&arm, &solver, &target);
            assert_eq!(answer, Some(expected), "r {r}, heading {k}, wrist {wrist}");
            assert!(
                !expected || !refused(&solver, &target, 1),
                "r {r}, heading {k}"
            );
            reachable += expected as usize;
        }
        assert_eq!(reachable == HEADINGS, dexterous, "r {r}: {reachable}");
        let free = reaches(&arm, &solver, &planar(x, y, None, 0.0));
        assert_eq!(free, Some(r <= 9.0), "r {r}");
        assert_eq!(reachable > 0, r <= 9.0, "r {r}");
    }
}

/// Headings of the last link that reach a point with two joints.
fn two_link_headings(l1: f64, l2: f64, x: f64, y: f64) -> Vec<f64> {
    let fold = elbow_cosine(l1, l2, x, y).acos();
    [fold, -fold]
        .into_iter()
        .map(|second| {
            let first = y.atan2(x) - (l2 * second.sin()).atan2(l1 + l2 * second.cos());
            first + second
        })
        .collect()
}

/// With two joints (Craig, *Introduction to Robotics*, sec. 4.2, from memory): equal lengths have
/// the centre alone as their dexterous set, unequal ones have none.
#[test]
fn two_joints_have_at_most_the_centre_as_dexterous_set() {
    let equal = machine("planar_1_1");
    let solver = Solver::new(&equal, 0).unwrap();
    for k in 0..24 {
        // Folded flat: the tip is at the centre only to within rounding.
        let target = planar(0.0, 0.0, Some(TAU * k as f64 / 24.0), 1e-9);
        assert_eq!(reaches(&equal, &solver, &target), Some(true), "heading {k}");
        assert!(!refused(&solver, &target, 8));
    }
    for (name, l1, l2, radii) in [
        ("planar_1_1", 1.0, 1.0, [0.01, 0.5, 1.0, 1.9]),
        ("planar_2_1", 2.0, 1.0, [1.01, 1.5, 2.0, 2.9]),
    ] {
        let arm = machine(name);
        let solver = Solver::new(&arm, 0).unwrap();
        for r in radii {
            let (x, y) = (r * f64::cos(r), r * f64::sin(r));
            let headings = two_link_headings(l1, l2, x, y);
            for &heading in &headings {
                for (off, expected) in [(0.0, true), (1e-3, false), (-1e-6, false)] {
                    let target = planar(x, y, Some(heading + off), 0.0);
                    let answer = reaches(&arm, &solver, &target);
                    assert_eq!(
                        answer,
                        Some(expected),
                        "{name}: r {r}, heading {heading} + {off}"
                    );
                }
            }
            let some = (0..24).any(|k| {
                let target = planar(x, y, Some(TAU * k as f64 / 24.0), 0.0);
                reaches(&arm, &solver, &target) == Some(false)
            });
            assert!(some, "{name}: r {r} has every heading");
        }
    }
}

/// Working space of an elbow arm without limits: a spherical shell of volume
/// `4/3 pi ((l1 + l2)^3 - |l1 - l2|^3)` (handbook formula, computed). A cloud of random points
/// gives it back within four standard deviations, and every point agrees with its radius.
#[test]
fn the_elbow_arm_reaches_a_spherical_shell() {
    const POINTS: usize = 4000;
    const HALF: f64 = 0.75;
    let volume = 4.0 / 3.0 * PI * (0.7f64.powi(3) - 0.1f64.powi(3));
    assert!((volume - 1.4325662500).abs() < 1e-10);
    let arm = machine("elbow");
    let solver = Solver::new(&arm, 0).unwrap();
    let mut rng = ChaCha8Rng::seed_from_u64(2);
    let [mut reachable, mut undecided] = [0.0; 2];
    for _ in 0..POINTS {
        let xyz = Vector3::from_fn(|_, _| rng.random_range(-HALF..HALF));
        let target = Target {
            xyz,
            ..planar(0.0, 0.0, None, 0.0)
        };
        let expected = (0.1..=0.7).contains(&xyz.norm());
        match reaches(&arm, &solver, &target) {
            Some(answer) => {
                assert_eq!(answer, expected, "{xyz:?} at {}", xyz.norm());
                reachable += answer as u8 as f64;
            }
            None => undecided += 1.0,
        }
        assert!(
            !expected || !refused(&solver, &target, 1),
            "{xyz:?} refused"
        );
    }
    assert_eq!(undecided, 0.0);
    let cube = (2.0 * HALF).powi(3);
    let share = volume / cube;
    let deviation = cube * (share * (1.0 - share) / POINTS as f64).sqrt();
    let estimate = cube * reachable / POINTS as f64;
    println!("volume {estimate} +- {deviation}, exact {volume}");
    assert!((estimate - volume).abs() < 4.0 * deviation);
}
