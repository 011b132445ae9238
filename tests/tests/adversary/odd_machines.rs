//! Machines as a file may describe them and no builder would: lengths from nothing to a hundred
//! kilometres, axes a hair off, followers of followers at any ratio, tolerances up to half a turn,
//! limits from a billionth of a radian to many turns. The built machine is as far off as its
//! tolerances allow, the target as far off as its own do.

use super::{Orientation, Screening, Solver, within_limits};
use balk::kinematics::{joint_values, tip_pose};
use balk::model::{Cone, Follows, Joint, Kind, Machine, Target, Tip, Tolerance};
use balk_tests::rotation::{random, random_direction};
use nalgebra::{Isometry3, Translation3, Unit, UnitQuaternion, Vector3};
use rand::seq::IndexedRandom;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, PI};

const RATIOS: [f64; 21] = [
    1.0,
    1.0,
    -1.0,
    -1.0,
    2.0,
    -2.0,
    0.5,
    3.0,
    4.0,
    5.0,
    16.0,
    200.0,
    0.0,
    1e-3,
    1.0 / 16.0,
    1.0 / 15.0,
    7.0 / 13.0,
    0.97,
    1.03,
    -0.331,
    PI,
];

fn pick<T: Copy>(random: &mut impl Rng, from: &[T]) -> T {
    *from.choose(random).expect("not empty")
}

/// A turn about any direction.
fn turn(random: &mut impl Rng, angle: f64) -> UnitQuaternion<f64> {
    UnitQuaternion::from_axis_angle(&random_direction(random), angle)
}

fn pose(rng: &mut ChaCha8Rng, longest: f64) -> Isometry3<f64> {
    let [roll, pitch, yaw] = [(); 3].map(|()| f64::from(rng.random_range(0..4)) * FRAC_PI_2);
    let square = UnitQuaternion::from_euler_angles(roll, pitch, yaw);
    let hair = pick(rng, &[1e-3, 1e-6, 4e-8, 1e-9, 1e-15]);
    let rotation = match rng.random_range(0..4) {
        0 => UnitQuaternion::identity(),
        1 => square,
        2 => square * turn(rng, hair),
        _ => random(rng).into(),
    };
    let [x, y, z] = [(); 3].map(|()| {
        let part = pick(rng, &[0.0, 0.0, 1e-9, 1e-6, 1e-3, 1.0, 1.0]);
        rng.random_range(-1.0..1.0) * part * longest
    });
    Isometry3::from_parts(Translation3::new(x, y, z), rotation)
}

/// A machine as written, one as built, and a posture within limits.
struct Planted {
    written: Machine,
    built: Machine,
    values: Vec<f64>,
}

impl Planted {
    fn draw(random: &mut ChaCha8Rng) -> Planted {
        let longest = pick(random, &[1.0, 1.0, 1.0, 20.0, 1e5]);
        let sliding = pick(random, &[0.0, 0.2, 0.6]);
        let followers = pick(random, &[0.0, 0.5]);
        let widest = pick(random, &[1e-9, 1e-6, 1e-3, 0.1, 1.0, 3.0, 7.0]);
        let count = random.random_range(1..=8);
        let mut joints: Vec<Joint> = Vec::new();
        let mut values: Vec<f64> = Vec::new();
        for index in 0..count {
            let kind = match random.random::<f64>() {
                part if part < 0.1 => Kind::Fixed,
                part if part < 0.1 + sliding => Kind::Prismatic,
                _ => Kind::Revolute,
            };
            let leads = (0..index).filter(|&j| kind != Kind::Fixed && joints[j].kind == kind);
            let leads: Vec<usize> = leads.collect();
            let follows = (!leads.is_empty() && random.random_bool(followers)).then(|| Follows {
                joint: pick(random, &leads),
                ratio: pick(random, &RATIOS),
                offset: pick(random, &[0.0, 0.0, 0.1, -1.0, 3.0, FRAC_PI_2]),
            });
            let value = match (kind, follows) {
                (Kind::Fixed, _) => 0.0,
                (_, Some(f)) => f.ratio * values[f.joint] + f.offset,
                (Kind::Prismatic, None) => {
                    random.random_range(-1.0..1.0) * pick(random, &[0.1, 1.0, 5.0])
                }
                (Kind::Revolute, None) => {
                    let eighths = f64::from(random.random_range(0..8)) * FRAC_PI_4;
                    let any = random.random_range(-10.0..10.0);
                    pick(random, &[eighths, any])
                }
            };
            let limits = limits(random, kind, value, widest, follows.is_some());
            values.push(value);
            joints.push(Joint {
                name: format!("joint {index}"),
                kind,
                // Now and then a branch, so that leaders lie outside the chain.
                parent: index.checked_sub(if random.random_bool(0.1) { 2 } else { 1 }),
                placement: pose(random, longest),
                axis: axis(random),
                limits,
                tolerance: tolerance(random),
                follows,
            });
        }
        let written = Machine {
            name: "odd".into(),
            joints,
            tips: vec![Tip {
                name: "tip".into(),
                parent: Some(count - 1),
                placement: pose(random, longest),
            }],
        };
        let built = build(random, &written);
        let values = joint_values(&written, &values);
        Planted {
            written,
            built,
            values,
        }
    }

    /// The built machine's pose, moved to where the target just still holds it.
    fn target(&self, random: &mut ChaCha8Rng) -> Target {
        let pose = tip_pose(&self.built, &self.values, 0);
        let xyz_within = Vector3::from_fn(|_, _| pick(random, &[0.0, 0.0, 1e-3, 0.05, 10.0, 1e9]));
        let off = xyz_within.map(|w| w * pick(random, &[0.0, 1.0, -1.0]) * (1.0 - 1e-9));
        let within = pick(
            random,
            &[
                0.0, 0.0, 1e-6, 1e-3, 0.01, 0.3, 1.0, FRAC_PI_2, 2.0, 3.0, PI, 4.0,
            ],
        );
        let turned = within.min(PI) * pick(random, &[0.0, 0.5, 1.0]) * (1.0 - 1e-12);
        let orientation = match random.random_range(0..6) {
            0 => Orientation::Free,
            1..=3 => Orientation::Near {
                rotation: (turn(random, turned) * pose.rotation).to_rotation_matrix(),
                within,
            },
            count => {
                let cone = |_| {
                    let any = random_direction(random);
                    let tip = pick(random, &[any, Vector3::x_axis(), Vector3::z_axis()]);
                    let at = pose.rotation * tip;
                    let about = Unit::new_normalize(at.cross(&random_direction(random)));
                    let base = UnitQuaternion::from_axis_angle(&about, turned) * at;
                    Cone { tip, base, within }
                };
                Orientation::Axes((3..count).map(cone).collect())
            }
        };
        Target {
            id: "planted".into(),
            tip: 0,
            xyz: pose.translation.vector + off,
            xyz_within,
            orientation,
        }
    }
}

fn axis(random: &mut ChaCha8Rng) -> Unit<Vector3<f64>> {
    let any = random_direction(random);
    let off = pick(random, &[-4.371_139e-8, 1e-8, 2e-9]);
    let hair = Unit::new_normalize(Vector3::new(off, 0.0, 1.0));
    let [x, y, z] = [Vector3::x_axis(), Vector3::y_axis(), Vector3::z_axis()];
    pick(random, &[any, hair, x, -y, -z, z, z, z])
}

fn limits(
    random: &mut ChaCha8Rng,
    kind: Kind,
    value: f64,
    widest: f64,
    follows: bool,
) -> Option<[f64; 2]> {
    if kind == Kind::Fixed || kind == Kind::Revolute && random.random_bool(0.15) {
        return None;
    }
    if follows && random.random() {
        return Some([value - 40.0, value + 40.0]);
    }
    // A follower's value is a rounded product.
    let rounding = if follows {
        1e-9 + 1e-12 * value.abs()
    } else {
        0.0
    };
    let [below, above] =
        [(); 2].map(|()| widest * random.random::<f64>() * pick(random, &[0.0, 1.0, 1.0]));
    Some([value - below - rounding, value + above + rounding])
}

fn tolerance(random: &mut ChaCha8Rng) -> Tolerance {
    if random.random_bool(0.8) {
        return Tolerance::default();
    }
    Tolerance {
        xyz: pick(random, &[0.0, 1e-4, 1e-2, 0.5]),
        angle: pick(random, &[0.0, 1e-4, 1e-2, 0.5, 1.2, PI]),
    }
}

/// The same machine with every placement off by as much as it may be.
fn build(random: &mut ChaCha8Rng, written: &Machine) -> Machine {
    let mut built = written.clone();
    for joint in &mut built.joints {
        let Tolerance { xyz, angle } = joint.tolerance;
        let corner = Vector3::from_fn(|_, _| pick(random, &[-xyz, 0.0, xyz]));
        joint.placement.translation.vector += corner;
        let off = turn(random, angle);
        let rotation = joint.placement.rotation;
        joint.placement.rotation = pick(random, &[off * rotation, rotation * off]);
    }
    built
}

#[test]
fn planted_postures_of_odd_machines_pass() {
    let mut answered = 0;
    for seed in 0..4000 {
        let mut random = ChaCha8Rng::seed_from_u64(seed);
        let planted = Planted::draw(&mut random);
        let target = planted.target(&mut random);
        assert!(
            within_limits(&planted.written, &planted.values, 2e-9),
            "{seed}"
        );
        // Ratios without limits that no small fraction meets, and chains of no length.
        let Ok(solver) = Solver::new(&planted.written, 0) else {
            continue;
        };
        answered += 1;
        for splits in [1, 4] {
            let screening = solver.screen(&target, splits);
            assert!(
                matches!(screening, Screening::Passed { .. }),
                "{seed}: {splits}"
            );
        }
    }
    assert!(answered > 3900, "{answered}");
}
