//! The boxes a target starts propagation with, against sampled directions and rotations.

use crate::{seeded, target};
use balk::model::{Cone, Orientation};
use balk::pack::pack_target;
use balk_core::fixed::{Interval, ONE, ONE_SQUARED};
use balk_core::propagate::Goal;
use balk_tests::rotation::{random, random_direction};
use nalgebra::{Matrix3, Rotation3, Unit, UnitQuaternion, Vector3};
use rand::Rng;
use rand_chacha::ChaCha8Rng;
use std::f64::consts::{FRAC_PI_2, PI};

fn goal(orientation: Orientation) -> Goal {
    Goal::new(&pack_target(&target(orientation), 1.0))
}

/// Whether the interval holds the number. The number is a double near one, off by a few 1e-16;
/// a unit of the interval is 9e-10 and the allowance a millionth of it.
fn holds(interval: Interval, value: f64) -> bool {
    const ALLOWANCE: f64 = 1e-6;
    let units = value * ONE as f64;
    interval.lo as f64 <= units + ALLOWANCE && units - ALLOWANCE <= interval.hi as f64
}

/// Angles a target may allow, from nothing to more than any rotation has.
const ANGLES: [f64; 14] = [
    0.0,
    1e-12,
    1e-9,
    3e-9,
    1e-7,
    1e-4,
    0.01,
    0.35,
    1.0,
    FRAC_PI_2,
    2.5,
    179.9 * PI / 180.0,
    PI,
    4.0,
];

/// Directions in general and along or close to the axes.
fn directions(rng: &mut ChaCha8Rng) -> Vec<Unit<Vector3<f64>>> {
    let mut all: Vec<Unit<Vector3<f64>>> = Vec::new();
    for k in 0..3 {
        for sign in [1.0, -1.0] {
            let mut v = Vector3::zeros();
            v[k] = sign;
            all.push(Unit::new_normalize(v));
            for tilt in [1e-10, 3e-9, 1e-5] {
                v[(k + 1) % 3] = tilt;
                all.push(Unit::new_normalize(v));
            }
        }
    }
    all.extend((0..40).map(|_| random_direction(rng)));
    all
}

#[test]
fn the_box_of_a_cone_holds_its_directions() {
    let mut rng = seeded(8);
    for base in directions(&mut rng) {
        for within in ANGLES {
            let tip = random_direction(&mut rng);
            let Goal::Axes { cones, .. } =
                goal(Orientation::Axes(vec![Cone { tip, base, within }]))
            else {
                panic!("a cone was asked for")
            };
            let cone = &cones[0];
            assert!((0..3).all(|k| holds(cone.in_tip[k], tip[k])));
            for sample in 0..60 {
                // Half on the rim, in particular towards the axes.
                let across = match sample {
                    0..6 => Vector3::ith(sample % 3, if sample < 3 { 1.0 } else { -1.0 }),
                    _ => random_direction(&mut rng).into_inner(),
                };
                let about = base.cross(&across);
                if about.norm() < 1e-3 {
                    continue;
                }
                let part = if sample < 30 {
                    1.0
                } else {
                    rng.random::<f64>()
                };
                let angle = within.min(PI) * part;
                let axis = Rotation3::from_axis_angle(&Unit::new_normalize(about), angle) * base;
                for k in 0..3 {
                    assert!(
                        holds(cone.in_base[k], axis[k]),
                        "base {base:?} within {within} axis {axis:?} {:?}",
                        cone.in_base
                    );
                }
                assert!(
                    cone.least.lo as f64 <= (axis.dot(&base) + 1e-15) * ONE_SQUARED as f64,
                    "base {base:?} within {within}"
                );
            }
        }
    }
}

/// The spread of a component `cos(a)` is `[cos(a + w), cos(a - w)]`: the box is that and no more
/// than a micro-unit beyond.
#[test]
fn the_box_of_a_cone_is_tight() {
    let mut rng = seeded(9);
    for base in directions(&mut rng) {
        for within in ANGLES.into_iter().filter(|angle| *angle < 3.0) {
            let tip = Vector3::z_axis();
            let Goal::Axes { cones, .. } =
                goal(Orientation::Axes(vec![Cone { tip, base, within }]))
            else {
                panic!("a cone was asked for")
            };
            for k in 0..3 {
                let a = base[k].clamp(-1.0, 1.0).acos();
                let lo = (a + within).min(PI).cos();
                let hi = (a - within).max(0.0).cos();
                let own = cones[0].in_base[k];
                // Near an axis the rounding of a component by two units is worth its root.
                let spare = 1e-7 + 8.0 * within.sin() * (2f64.powi(-30)).sqrt();
                assert!(
                    own.lo as f64 / ONE as f64 >= lo - spare,
                    "{base:?} {within} {k}"
                );
                assert!(
                    own.hi as f64 / ONE as f64 <= hi + spare,
                    "{base:?} {within} {k}"
                );
            }
        }
    }
}

/// Rotations in general and those whose matrices or quaternions are degenerate: signed
/// permutations, half turns, and close to either.
fn orientations(rng: &mut ChaCha8Rng) -> Vec<Rotation3<f64>> {
    let quarter = |k: usize, n: usize| {
        Rotation3::from_axis_angle(
            &Unit::new_unchecked(Vector3::ith(k, 1.0)),
            n as f64 * FRAC_PI_2,
        )
    };
    let mut all = Vec::new();
    for first in 0..3 {
        for n in 0..4 {
            for m in 0..4 {
                all.push(quarter(first, n) * quarter((first + 1) % 3, m));
            }
        }
    }
    for k in 0..all.len() {
        let tilt = [1e-10, 2e-9, 1e-8, 1e-5][k % 4];
        let about = random_direction(rng);
        all.push(Rotation3::from_axis_angle(&about, tilt) * all[k]);
    }
    // Quaternions whose small components fall half-way between two integers of the core, so that
    // all of them are rounded the same way.
    for odd in [1.0, 3.0, 1001.0, 123_456_789.0] {
        for sign in [1.0, -1.0] {
            let [i, j, k] =
                [odd + 0.499, sign * (odd + 2.499), odd + 4.499].map(|units| units / ONE as f64);
            let w = (1.0 - i * i - j * j - k * k).sqrt();
            let q = UnitQuaternion::new_unchecked(nalgebra::Quaternion::new(w, i, j, k));
            all.push(q.to_rotation_matrix());
        }
    }
    all.extend((0..100).map(|_| random(rng)));
    all
}

#[test]
fn the_boxes_of_an_orientation_hold_its_rotations() {
    let mut rng = seeded(10);
    for wanted in orientations(&mut rng) {
        for within in ANGLES {
            let Goal::Near {
                axes,
                least,
                cosine,
                sine,
                wanted: columns,
                ..
            } = goal(Orientation::Near {
                rotation: wanted,
                within,
            })
            else {
                panic!("an orientation was asked for")
            };
            for sample in 0..30 {
                let about = match sample {
                    0..6 => {
                        let sign = if sample < 3 { 1.0 } else { -1.0 };
                        Unit::new_unchecked(Vector3::ith(sample % 3, sign))
                    }
                    _ => random_direction(&mut rng),
                };
                let part = if sample < 15 {
                    1.0
                } else {
                    rng.random::<f64>()
                };
                let angle = within.min(PI) * part;
                let actual = Rotation3::from_axis_angle(&about, angle) * wanted;
                let m = actual.matrix();
                for (j, axis) in axes.iter().enumerate() {
                    for k in 0..3 {
                        assert!(
                            holds(axis[k], m[(k, j)]),
                            "wanted {wanted} within {within} about {about:?} entry {k},{j}"
                        );
                    }
                }
                // The rule on the trace, at the most the boxes of the wanted columns allow.
                let most: f64 = (0..9)
                    .map(|i| {
                        let (j, k) = (i / 3, i % 3);
                        let x = m[(k, j)];
                        let [lo, hi] = [columns[j][k].lo, columns[j][k].hi].map(f64::from);
                        (x * lo).max(x * hi) / ONE as f64
                    })
                    .sum();
                let least = least.lo as f64 / ONE_SQUARED as f64;
                assert!(least <= most + 1e-14, "wanted {wanted} within {within}");
                // Cosine and sine cover the angle asked for and nearly the rounding of the
                // orientation; beyond a quarter turn the sine falls.
                assert!(cosine.lo as f64 <= angle.cos() * ONE as f64 + 1e-6);
                if cosine.lo < 0 {
                    continue;
                }
                assert!(sine.hi as f64 >= angle.sin() * ONE as f64 - 1e-6);
                let middle = Matrix3::from_fn(|k, j| {
                    (columns[j][k].lo as f64 + columns[j][k].hi as f64) / 2.0 / ONE as f64
                });
                let product = m * middle.transpose();
                let turn = Vector3::new(
                    product[(2, 1)] - product[(1, 2)],
                    product[(0, 2)] - product[(2, 0)],
                    product[(1, 0)] - product[(0, 1)],
                );
                let units = turn.norm() / 2.0 * ONE as f64;
                assert!(
                    units <= sine.hi as f64 + ROUNDED_QUATERNION,
                    "wanted {wanted} within {within}: {units} {}",
                    sine.hi
                );
            }
        }
    }
}

/// How far, in units, the core's wanted orientation may be turned from the one asked for: three
/// small quaternion components off by half a unit when packed and another half when halved, three
/// quarters of a unit of the halved ones together, which is twice that as an angle and twice
/// again in whole units: `4 * 0.75 * sqrt(3)`.
const ROUNDED_QUATERNION: f64 = 2.0;
