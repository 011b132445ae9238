//! Published checks on rotations, and the target's boxes against sampled rotations.

#[path = "../src/rotation.rs"]
mod rotation;

use balk::kinematics::{angle_between, turn_between, turn_excess};
use balk::model::{Cone, Machine, Orientation, Target};
use balk::pack::pack_target;
use balk::read;
use balk_core::fixed::{Interval, ONE, ONE_SQUARED};
use balk_core::propagate::Goal;
use nalgebra::{
    Isometry3, Matrix2, Matrix3, Rotation3, Unit, UnitQuaternion, Vector2, Vector3, Vector4,
};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rotation::{
    hull_margin, hull_margin_spectral, hull_matrix, nearest, random, random_direction, shoemake,
};
use std::f64::consts::{FRAC_PI_2, PI};

fn seeded(seed: u64) -> ChaCha8Rng {
    ChaCha8Rng::seed_from_u64(seed)
}

fn diagonal(a: f64, b: f64, c: f64) -> Matrix3<f64> {
    Matrix3::from_diagonal(&Vector3::new(a, b, c))
}

/// Entries of both signs and sizes that fall on either side of the hull about equally often.
fn random_matrix(rng: &mut ChaCha8Rng) -> Matrix3<f64> {
    let size = rng.random_range(0.1..0.9);
    Matrix3::from_fn(|_, _| rng.random_range(-size..size))
}

/// The matrix is four times the outer product of a quaternion with itself (Saunderson, Parrilo &
/// Willsky, *Semidefinite descriptions of the convex hull of rotation matrices*, SIAM J. Optim.
/// 25(3), 2015, 1314-1343; entries from memory, recomputed).
#[test]
fn rotations_have_rank_one_hull_matrices() {
    let mut rng = seeded(1);
    for _ in 0..200 {
        let r = random(&mut rng);
        let q = UnitQuaternion::from_rotation_matrix(&r);
        let q = Vector4::new(q.k, q.i, -q.w, q.j);
        let m = hull_matrix(r.matrix());
        assert!((m - 4.0 * q * q.transpose()).amax() < 1e-14, "{m}");
    }
}

/// Computed from the matrix; the diagonal's tetrahedron is Horn, *Doubly stochastic matrices and
/// the diagonal of a rotation matrix*, Amer. J. Math. 76, 1954 (title from memory).
#[test]
fn linear_consequences_of_the_hull_hold_on_rotations_and_their_means() {
    let mut rng = seeded(2);
    for _ in 0..500 {
        let share: f64 = rng.random();
        let x = random(&mut rng).matrix() * share + random(&mut rng).matrix() * (1.0 - share);
        let m = hull_matrix(&x);
        assert!(m.diagonal().min() >= -1e-14);
        assert!(x.trace() >= -1.0 - 1e-14);
        for _ in 0..10 {
            let u = Vector4::from_fn(|_, _| rng.random_range(-1.0..1.0));
            assert!((u.transpose() * m * u)[0] >= -1e-13);
        }
    }
}

/// Computed: the spectral form follows from the matrix.
#[test]
fn both_forms_of_hull_membership_agree() {
    let mut rng = seeded(3);
    let mut members = 0;
    for _ in 0..4000 {
        let x = random_matrix(&mut rng);
        let (margin, spectral) = (hull_margin(&x), hull_margin_spectral(&x));
        assert!((margin - spectral).abs() < 1e-12, "{margin} {spectral}");
        members += (margin >= 0.0) as usize;
    }
    assert!((1000..3000).contains(&members), "{members}");
}

/// Computed.
#[test]
fn members_and_strangers_of_the_hull() {
    let cases = [
        (Matrix3::zeros(), 1.0),
        (Matrix3::identity() * 0.5, 0.5),
        (diagonal(1.0, 0.0, 0.0), 0.0),
        (Matrix3::identity() / -3.0, 0.0),
        (diagonal(1.0, 1.0, -1.0) / 3.0, 0.0),
        (-Matrix3::identity(), -2.0),
        (diagonal(1.0, 1.0, -1.0), -2.0),
        (diagonal(1.0, 1.0, 0.0), -1.0),
        (diagonal(0.5, 0.5, -0.5), -0.5),
    ];
    for (x, margin) in cases {
        assert!((hull_margin(&x) - margin).abs() < 1e-14, "{x}");
        assert!((hull_margin_spectral(&x) - margin).abs() < 1e-14, "{x}");
    }
}

/// Kabsch 1976; Markley, *J. Astronaut. Sci.* 36, 1988, 245-258; Higham 1986 (from memory,
/// recomputed).
#[test]
fn nearest_rotations_of_small_examples() {
    let x = diagonal(3.0, 2.0, -1.0);
    let r = nearest(&x);
    assert!((r.matrix() - Matrix3::identity()).amax() < 1e-15);
    assert!(((x.transpose() * r.matrix()).trace() - 4.0).abs() < 1e-14);

    let x = Matrix2::new(1.0, 1.0, 0.0, 1.0);
    let svd = x.svd(true, true);
    let q = svd.u.unwrap() * svd.v_t.unwrap();
    let expected = Matrix2::new(2.0, 1.0, -1.0, 2.0) / 5f64.sqrt();
    assert!((q - expected).amax() < 1e-15);
    let values = svd.singular_values;
    assert!((values - Vector2::new(1.618033989, 0.618033989)).amax() < 1e-9);
    assert!(((x - q).norm() - 0.726542528).abs() < 1e-9);
}

#[test]
fn no_random_rotation_is_nearer_than_the_nearest() {
    let mut rng = seeded(4);
    for _ in 0..200 {
        let x = random_matrix(&mut rng);
        let least = (nearest(&x).matrix() - x).norm();
        for _ in 0..50 {
            assert!((random(&mut rng).matrix() - x).norm() >= least - 1e-14);
        }
    }
}

/// Umeyama, *Least-squares estimation of transformation parameters between two point patterns*,
/// IEEE T-PAMI 13(4), 1991, 376-380 (example from memory, digits recomputed).
#[test]
fn reflected_points_are_fitted_by_a_rotation() {
    let from = [[0.0, 0.0], [1.0, 0.0], [0.0, 2.0]].map(Vector2::from);
    let to = [[0.0, 0.0], [-1.0, 0.0], [0.0, 2.0]].map(Vector2::from);
    let mean = |points: &[Vector2<f64>; 3]| points.iter().sum::<Vector2<f64>>() / 3.0;
    let (from_mean, to_mean) = (mean(&from), mean(&to));
    // The plane case of a 3 x 3 fit: a third axis that outweighs the other two stays where it is,
    // so that a reflection has to be given up in the plane.
    let mut covariance = Matrix3::zeros();
    covariance[(2, 2)] = 100.0;
    let mut spread = 0.0;
    for (a, b) in from.iter().zip(&to) {
        let (a, b) = (a - from_mean, b - to_mean);
        spread += a.norm_squared() / 3.0;
        for i in 0..2 {
            for j in 0..2 {
                covariance[(i, j)] += b[i] * a[j] / 3.0;
            }
        }
    }
    let r = nearest(&covariance);
    let turn = r.matrix().fixed_view::<2, 2>(0, 0).into_owned();
    let expected = Matrix2::new(3.0, 2.0, -2.0, 3.0) / 13f64.sqrt();
    assert!((turn - expected).amax() < 1e-14);
    let scale = (turn.transpose() * covariance.fixed_view::<2, 2>(0, 0)).trace() / spread;
    assert!((scale - 13f64.sqrt() / 5.0).abs() < 1e-14);
    let shift = to_mean - scale * turn * from_mean;
    assert!((shift - Vector2::new(-0.8, 0.4)).amax() < 1e-14);
    let error: f64 = from
        .iter()
        .zip(&to)
        .map(|(a, b)| (b - scale * turn * a - shift).norm_squared())
        .sum();
    assert!((error / 3.0 - 8.0 / 15.0).abs() < 1e-14);
}

const ONE_JOINT: &str =
    "[[joint]]\nname = \"a\"\nkind = \"revolute\"\n[[tip]]\nname = \"end\"\nxyz = [1, 0, 0]\n";

fn read_rotation(machine: &Machine, x: &Matrix3<f64>, within: f64) -> Result<Target, String> {
    let rows: Vec<f64> = x.transpose().iter().copied().collect();
    let text = format!(
        "{{\"xyz\":[1,0,0],\"xyz_within\":0,\"rotation\":{rows:?},\"turn_within\":{within:?}}}"
    );
    let line = read::Line {
        number: 1,
        bytes: Some(text.into_bytes()),
    };
    read::target(&line, "test.jsonl", machine).map_err(|(_, defect)| defect.reason)
}

/// The reader's projection, found by another method, against the singular value form.
#[test]
fn the_reader_projects_to_the_nearest_rotation_and_adds_the_distance() {
    let machine = read::machine(ONE_JOINT.as_bytes(), "test.toml").unwrap();
    let mut rng = seeded(5);
    for sample in 0..500 {
        let size = [0.0, 1e-12, 1e-6, 3e-4][sample % 4];
        let noise = Matrix3::from_fn(|_, _| rng.random_range(-1.0..1.0) * size);
        let written = random(&mut rng).matrix() + noise;
        let target = read_rotation(&machine, &written, 0.25).unwrap();
        let Orientation::Near { rotation, within } = target.orientation else {
            panic!("an orientation was asked for")
        };
        let expected = nearest(&written);
        assert!((rotation.matrix() - expected.matrix()).amax() < 1e-14);
        let distance = (written - expected.matrix()).norm();
        assert!((within - 0.25 - distance).abs() < 1e-14);
        // Rotations as far from what was written as was asked stay allowed.
        let about = random_direction(&mut rng);
        let edge = expected * Rotation3::from_axis_angle(&about, 0.25);
        assert!(turn_between(&rotation, &edge) <= within + 1e-14);
    }
}

#[test]
fn the_reader_takes_no_stranger_for_a_rotation() {
    let machine = read::machine(ONE_JOINT.as_bytes(), "test.toml").unwrap();
    for x in [
        Matrix3::zeros(),
        Matrix3::identity() * 0.5,
        diagonal(1.0, 1.0, 0.0),
        diagonal(1.0, 1.0, 1.0021),
        -Matrix3::identity(),
        diagonal(1.0, 1.0, -1.0),
    ] {
        assert!(read_rotation(&machine, &x, 0.0).is_err(), "{x}");
    }
}

/// Shoemake, *Uniform random rotations*, Graphics Gems III, 1992, 124-132 (digits recomputed).
#[test]
fn the_generator_of_uniform_rotations_at_one_point() {
    let q = shoemake([0.25, 0.125, 0.5]);
    let expected = Vector4::new(0.612372436, 0.612372436, 0.0, -0.5);
    assert!((q.coords - expected).amax() < 1e-9);
}

/// Moments of the uniform distribution (standard; computed), each within four and a half standard
/// deviations of the mean of the samples.
#[test]
fn the_generator_of_uniform_rotations_is_uniform() {
    const SAMPLES: usize = 200_000;
    let mut rng = seeded(6);
    let mut moments: Vec<(&str, f64, f64, f64)> = vec![
        ("angle", FRAC_PI_2 + 2.0 / PI, 0.0, 0.0),
        ("share up to a quarter turn", 0.5 - 1.0 / PI, 0.0, 0.0),
        ("trace", 0.0, 0.0, 0.0),
        ("squared trace", 1.0, 0.0, 0.0),
    ];
    moments.extend([("squared quaternion", 0.25, 0.0, 0.0); 4]);
    moments.extend([("squared entry", 1.0 / 3.0, 0.0, 0.0); 9]);
    for _ in 0..SAMPLES {
        let q = shoemake(rng.random());
        let r = q.to_rotation_matrix();
        let angle = turn_between(&Rotation3::identity(), &r);
        let trace = r.matrix().trace();
        let values = [
            angle,
            (angle <= FRAC_PI_2) as u8 as f64,
            trace,
            trace * trace,
        ];
        let squares = q.coords.iter().chain(r.matrix().iter()).map(|x| x * x);
        for (moment, value) in moments.iter_mut().zip(values.into_iter().chain(squares)) {
            moment.2 += value;
            moment.3 += value * value;
        }
    }
    assert!((moments[0].1.to_degrees() - 126.475626).abs() < 1e-6);
    assert!((moments[1].1 - 0.181690114).abs() < 1e-9);
    for (name, expected, sum, squares) in moments {
        let mean = sum / SAMPLES as f64;
        let deviation = (squares / SAMPLES as f64 - mean * mean).sqrt() / (SAMPLES as f64).sqrt();
        assert!(
            (mean - expected).abs() < 4.5 * deviation,
            "{name}: {mean}, expected {expected} within {deviation}"
        );
    }
}

/// Solid angle of a cone of half-angle 30 degrees (geometry, computed): the share of uniform
/// orientations that meet it, within four standard deviations.
#[test]
fn a_cone_takes_its_share_of_orientations() {
    const SAMPLES: usize = 200_000;
    let within = 30f64.to_radians();
    let share = (1.0 - within.cos()) / 2.0;
    assert!((share - 0.0669872981).abs() < 1e-10);
    assert!((4.0 * PI * share - 0.8417872145).abs() < 1e-10);
    let mut rng = seeded(7);
    let (tip, base) = (random_direction(&mut rng), random_direction(&mut rng));
    let target = target(Orientation::Axes(vec![Cone { tip, base, within }]));
    let inside = (0..SAMPLES)
        .filter(|_| {
            let pose = Isometry3::from_parts(Default::default(), random(&mut rng).into());
            turn_excess(&target, &pose) <= 0.0
        })
        .count() as f64;
    let deviation = (SAMPLES as f64 * share * (1.0 - share)).sqrt();
    assert!(
        (inside - SAMPLES as f64 * share).abs() < 4.0 * deviation,
        "{inside}"
    );
}

/// Half-angles of the pyramids that touch a cone of 30 degrees from outside (geometry, computed).
#[test]
fn outer_pyramids_touch_their_cone() {
    let cone = 30f64.to_radians();
    for (facets, degrees) in [(4, 39.2315), (6, 33.6901), (8, 32.0021), (12, 30.8675)] {
        let half_angle = (cone.tan() / (PI / facets as f64).cos()).atan();
        assert!((half_angle.to_degrees() - degrees).abs() < 5e-5);
        // Edges of the pyramid lie at that angle; a facet between two of them has its nearest
        // line half way, at the angle of the cone.
        let edge = |k: usize| {
            let about = 2.0 * PI * k as f64 / facets as f64;
            Vector3::new(
                half_angle.tan() * about.cos(),
                half_angle.tan() * about.sin(),
                1.0,
            )
        };
        let normal = edge(0).cross(&edge(1)).normalize();
        let nearest = PI / 2.0 - angle_between(&normal, &Vector3::z());
        assert!((nearest.abs() - cone).abs() < 1e-14);
    }
}

fn target(orientation: Orientation) -> Target {
    Target {
        id: String::new(),
        tip: 0,
        xyz: Vector3::zeros(),
        xyz_within: Vector3::zeros(),
        orientation,
    }
}

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
const ROUNDED_QUATERNION: f64 = 5.2;
