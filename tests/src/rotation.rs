//! Rotations: random ones, the nearest one to a matrix, and membership of their convex hull.
//!
//! Plain double precision over `nalgebra`, sharing nothing with what it is compared with.

use nalgebra::{Matrix3, Matrix4, Quaternion, Rotation3, Unit, UnitQuaternion, Vector3};
use rand::Rng;
use std::f64::consts::TAU;

/// The rotation of three numbers in `[0, 1)`; uniform numbers give uniform rotations.
///
/// Shoemake, *Uniform random rotations*, Graphics Gems III, 1992, 124-132.
pub fn shoemake([u1, u2, u3]: [f64; 3]) -> UnitQuaternion<f64> {
    let (a, b) = ((1.0 - u1).sqrt(), u1.sqrt());
    let ((sin2, cos2), (sin3, cos3)) = ((TAU * u2).sin_cos(), (TAU * u3).sin_cos());
    UnitQuaternion::from_quaternion(Quaternion::new(b * cos3, a * sin2, a * cos2, b * sin3))
}

/// A uniform random rotation.
pub fn random(rng: &mut impl Rng) -> Rotation3<f64> {
    shoemake(rng.random()).to_rotation_matrix()
}

/// A uniform random direction.
pub fn random_direction(rng: &mut impl Rng) -> Unit<Vector3<f64>> {
    random(rng) * Vector3::z_axis()
}

/// Singular value decomposition `(U, s, V^T)` with the values in falling order, and the
/// determinant of `U V^T`, 1 or -1.
fn signed_decomposition(x: &Matrix3<f64>) -> (Matrix3<f64>, Vector3<f64>, Matrix3<f64>, f64) {
    let svd = x.svd(true, true);
    let (u, v_t) = (svd.u.expect("asked for"), svd.v_t.expect("asked for"));
    (
        u,
        svd.singular_values,
        v_t,
        (u * v_t).determinant().signum(),
    )
}

/// The rotation nearest to a matrix in the Frobenius norm.
///
/// Kabsch, *Acta Cryst.* A32, 1976, 922; Markley, *J. Astronaut. Sci.* 36, 1988, 245-258.
pub fn nearest(x: &Matrix3<f64>) -> Rotation3<f64> {
    let (u, _, v_t, sign) = signed_decomposition(x);
    let r = u * Matrix3::from_diagonal(&Vector3::new(1.0, 1.0, sign)) * v_t;
    Rotation3::from_matrix_unchecked(r)
}

/// The symmetric matrix that is positive semidefinite exactly for the convex hull of rotations.
///
/// Saunderson, Parrilo & Willsky, *Semidefinite descriptions of the convex hull of rotation
/// matrices*, SIAM J. Optim. 25(3), 2015, 1314-1343.
pub fn hull_matrix(x: &Matrix3<f64>) -> Matrix4<f64> {
    let [a, b, c] = [x[(0, 0)], x[(1, 1)], x[(2, 2)]];
    let sum = |i, j| x[(i, j)] + x[(j, i)];
    let difference = |i, j| x[(i, j)] - x[(j, i)];
    #[rustfmt::skip]
    let upper = Matrix4::new(
        1.0 - a - b + c, sum(0, 2),       difference(0, 1), sum(1, 2),
        0.0,             1.0 + a - b - c, difference(1, 2), sum(0, 1),
        0.0,             0.0,             1.0 + a + b + c,  difference(2, 0),
        0.0,             0.0,             0.0,              1.0 - a + b - c,
    );
    Matrix4::from_fn(|i, j| upper[(i.min(j), i.max(j))])
}

/// Least eigenvalue of [`hull_matrix`]: not negative exactly for members of the hull.
pub fn hull_margin(x: &Matrix3<f64>) -> f64 {
    hull_matrix(x).symmetric_eigenvalues().min()
}

/// The same margin from singular values: `1 - s1 - s2 + s3`, with `s3` signed like the
/// determinant. Follows from the theorem behind [`hull_matrix`] (computed).
pub fn hull_margin_spectral(x: &Matrix3<f64>) -> f64 {
    let (_, s, _, sign) = signed_decomposition(x);
    1.0 - s[0] - s[1] + s[2] * sign
}
