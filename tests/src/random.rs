//! Random machines, postures on them and targets that those postures meet.

use balk::kinematics::{joint_values, tip_pose};
use balk::model::{Cone, Follows, Joint, Kind, Machine, Orientation, Target, Tip, Tolerance};
use nalgebra::{Isometry3, Quaternion, Rotation3, Translation3, Unit, UnitQuaternion, Vector3};
use rand::Rng;
use rand::seq::IndexedRandom;
use std::f64::consts::{FRAC_PI_2, PI, TAU};

/// Ratios of followers: small fractions, and some that no small fraction equals.
const RATIOS: [f64; 9] = [1.0, -1.0, 2.0, -0.5, 1.5, -3.0, 1.01, -0.334, 0.75];
/// Half-widths of targets, metres.
const WITHIN: [f64; 6] = [0.0, 1e-8, 1e-6, 1e-3, 0.05, 10.0];
/// Greatest turns of targets, radians.
const TURNS: [f64; 8] = [0.0, 1e-8, 1e-6, 0.01, 0.35, 1.5, 3.0, 4.0];

/// A machine as written and one built within its tolerances.
#[derive(Clone, Debug)]
pub struct Sample {
    /// As written: what the packer reads.
    pub written: Machine,
    /// As built: what moves. The same as `written` where tolerances are zero.
    pub built: Machine,
}

/// A uniform rotation. Source: K. Shoemake, *Uniform random rotations*, Graphics Gems III, 1992.
pub fn rotation(random: &mut impl Rng) -> UnitQuaternion<f64> {
    let [u, v, w]: [f64; 3] = random.random();
    let (a, b) = ((1.0 - u).sqrt(), u.sqrt());
    let (v, w) = (TAU * v, TAU * w);
    UnitQuaternion::from_quaternion(Quaternion::new(
        b * w.cos(),
        a * v.sin(),
        a * v.cos(),
        b * w.sin(),
    ))
}

/// A vector with every component in `[-size, size]`.
fn cube(random: &mut impl Rng, size: f64) -> Vector3<f64> {
    Vector3::from_fn(|_, _| size * random.random_range(-1.0..=1.0))
}

/// A direction: a coordinate axis half the time.
fn direction(random: &mut impl Rng) -> Unit<Vector3<f64>> {
    if random.random() {
        let axis =
            [Vector3::x_axis(), Vector3::y_axis(), Vector3::z_axis()][random.random_range(0..3)];
        return if random.random() { axis } else { -axis };
    }
    Unit::new_normalize(rotation(random) * Vector3::z())
}

/// A placement whose offsets are often exactly zero and whose angles are often right.
fn placement(random: &mut impl Rng) -> Isometry3<f64> {
    let offset = Vector3::from_fn(|_, _| {
        if random.random_bool(0.5) {
            0.0
        } else {
            random.random_range(-0.5..0.5)
        }
    });
    let turn = match random.random_range(0..3) {
        0 => UnitQuaternion::identity(),
        1 => {
            let quarters = f64::from(random.random_range(1..4));
            UnitQuaternion::from_axis_angle(&direction(random), FRAC_PI_2 * quarters)
        }
        _ => rotation(random),
    };
    Isometry3::from_parts(Translation3::from(offset), turn)
}

/// Narrow, wide or no limits.
fn limits(random: &mut impl Rng, kind: Kind) -> Option<[f64; 2]> {
    let (widths, centre) = match kind {
        Kind::Fixed => return None,
        Kind::Prismatic => ([0.0, 0.02, 0.3, 0.8], 0.4),
        Kind::Revolute => ([0.01, 0.5, 2.5, 6.0], 2.0),
    };
    if kind == Kind::Revolute && random.random_bool(0.2) {
        return None;
    }
    let width = widths[random.random_range(0..4)] * random.random_range(0.5..1.5);
    let centre = random.random_range(-centre..centre);
    Some([centre - width / 2.0, centre + width / 2.0])
}

impl Sample {
    /// A chain of two to eight moving joints with some fixed ones between, followers, and half the
    /// time tolerances. `None` when the draw has limits that exclude each other.
    pub fn draw(random: &mut impl Rng) -> Option<Sample> {
        let moving = random.random_range(2..=8);
        let loose = random.random_bool(0.5);
        let mut joints: Vec<Joint> = Vec::new();
        let mut moved = 0;
        let mut parent = None;
        while moved < moving {
            let kind = *[
                Kind::Revolute,
                Kind::Revolute,
                Kind::Revolute,
                Kind::Prismatic,
                Kind::Fixed,
            ]
            .choose(random)?;
            // A side branch: its joint may lead one of the chain, but does not count.
            let aside = kind != Kind::Fixed && random.random_bool(0.1);
            let leads: Vec<usize> = (0..joints.len())
                .filter(|&i| joints[i].kind == kind)
                .collect();
            let follows = match leads.choose(random) {
                Some(&joint) if kind != Kind::Fixed && random.random_bool(0.3) => Some(Follows {
                    joint,
                    ratio: *RATIOS.choose(random)?,
                    offset: if random.random() {
                        0.0
                    } else {
                        random.random_range(-0.4..0.4)
                    },
                }),
                _ => None,
            };
            let tolerance = if loose && random.random_bool(0.6) {
                Tolerance {
                    xyz: random.random_range(0.0..0.001),
                    angle: random.random_range(0.0..0.001),
                }
            } else {
                Tolerance::default()
            };
            joints.push(Joint {
                name: format!("j{}", joints.len()),
                kind,
                parent,
                placement: placement(random),
                axis: direction(random),
                limits: match (follows.is_some(), kind) {
                    // Wide enough not to bind, except in reach.
                    (true, Kind::Prismatic) => Some([-3.0, 3.0]),
                    (true, _) => None,
                    _ => limits(random, kind),
                },
                tolerance,
                follows,
            });
            if !aside {
                parent = Some(joints.len() - 1);
                moved += usize::from(kind != Kind::Fixed);
            }
        }
        let tip = Tip {
            name: "tip".into(),
            parent,
            placement: placement(random),
        };
        let written = Machine {
            name: "random".into(),
            joints,
            tips: vec![tip],
        };
        let built = build(random, &written);
        Some(Sample { written, built })
    }
}

/// A machine within the tolerances of the written one, often at their edge.
pub fn build(random: &mut impl Rng, written: &Machine) -> Machine {
    let mut built = written.clone();
    for joint in &mut built.joints {
        let Tolerance { xyz, angle } = joint.tolerance;
        if xyz > 0.0 {
            let mut off = cube(random, xyz);
            if random.random() {
                off = off.map(|v| xyz.copysign(v));
            }
            joint.placement.translation.vector += off;
        }
        if angle > 0.0 {
            let size = if random.random() {
                angle
            } else {
                random.random_range(0.0..angle)
            };
            joint.placement.rotation *= UnitQuaternion::from_axis_angle(&direction(random), size);
        }
    }
    built
}

/// Values for every joint within limits, a third of the driven ones at a limit, some at zero.
/// `None` when limits exclude each other.
pub fn posture(random: &mut impl Rng, machine: &Machine) -> Option<Vec<f64>> {
    let mut values = Vec::new();
    for (i, joint) in machine.joints.iter().enumerate() {
        let [lo, hi] = balk::pack::range(machine, i);
        if lo > hi {
            return None;
        }
        let drawn = if joint.kind == Kind::Fixed || joint.follows.is_some() {
            0.0
        } else if !(lo.is_finite() && hi.is_finite()) {
            *[0.0, FRAC_PI_2, PI, -PI, random.random_range(-4.0..4.0)].choose(random)?
        } else {
            match random.random_range(0..6) {
                0 => lo,
                1 => hi,
                2 => 0f64.clamp(lo, hi),
                _ => lo + (hi - lo) * random.random::<f64>(),
            }
        };
        values.push(drawn);
    }
    Some(joint_values(machine, &values))
}

/// A target that tip 0 meets in the given posture, of any kind and size.
pub fn target(random: &mut impl Rng, machine: &Machine, values: &[f64]) -> Option<Target> {
    let pose = tip_pose(machine, values, 0);
    let within = Vector3::from_fn(|_, _| *WITHIN.choose(random).unwrap_or(&0.0));
    let share = if random.random_bool(0.25) {
        1.0
    } else {
        random.random()
    };
    let mut off = cube(random, share);
    if random.random() {
        off = off.map(|v| share.copysign(v));
    }
    // Not nearer to the edge of a cone or a ball of orientations than doubles can tell.
    let turned = |random: &mut _, axis: Vector3<f64>, angle: f64| {
        let share: f64 = if Rng::random_bool(random, 0.25) {
            1.0
        } else {
            Rng::random(random)
        };
        let size = (angle.min(PI) * share - 4e-16).max(0.0);
        Rotation3::from_axis_angle(&Unit::new_normalize(axis), size)
    };
    let actual = pose.rotation.to_rotation_matrix();
    let orientation = match random.random_range(0..4) {
        0 => Orientation::Free,
        1 => {
            let count = random.random_range(1..=3);
            let mut cones = Vec::new();
            for _ in 0..count {
                let tip = direction(random);
                let points = actual * tip;
                let across = points.cross(&direction(random));
                let within = *TURNS.choose(random)?;
                let base = if across.norm() < 0.1 {
                    points
                } else {
                    turned(random, across, within) * points
                };
                cones.push(Cone { tip, base, within });
            }
            Orientation::Axes(cones)
        }
        _ => {
            let within = *TURNS.choose(random)?;
            let axis = direction(random).into_inner();
            Orientation::Near {
                rotation: turned(random, axis, within) * actual,
                within,
            }
        }
    };
    Some(Target {
        id: String::new(),
        tip: 0,
        xyz: pose.translation.vector + off.component_mul(&within),
        xyz_within: within,
        orientation,
    })
}
