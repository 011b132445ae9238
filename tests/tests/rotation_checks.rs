//! Published checks on rotations, and the target's boxes against sampled rotations.

#[path = "rotation_checks/target_boxes.rs"]
mod target_boxes;

use balk::kinematics::{angle_between, turn_between, turn_excess};
use balk::model::{Cone, Machine, Orientation, Target};
use balk::read;
use balk_tests::rotation::{
    hull_margin, hull_margin_spectral, hull_matrix, nearest, random, random_direction, shoemake,
};
use nalgebra::{Isometry3, Matrix2, Matrix3, Rotation3, UnitQuaternion, Vector2, Vector3, Vector4};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
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
    let mut inside = 0.0;
    for _ in 0..SAMPLES {
        let actual = random(&mut rng);
        let pose = Isometry3::from_parts(Default::default(), actual.into());
        let meets = turn_excess(&target, &pose) <= 0.0;
        // Every sample by the cosine as well, away from the rim.
        let excess = base.dot(&(actual * *tip)) - within.cos();
        assert!(excess.abs() < 1e-12 || meets == (excess > 0.0));
        inside += meets as u8 as f64;
    }
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
