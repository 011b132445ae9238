//! Vectors and rotations of intervals, in grains.

use core::array::from_fn;

use dashu_int::IBig;
use dashu_ratio::RBig;

use crate::exact::interval::{Interval, root_ceil};
use crate::machine::{Amount, Pose};

/// Three coordinates.
pub type Vector = [Interval; 3];
/// Three rows.
pub type Matrix = [Vector; 3];

/// Zero.
pub fn zero() -> Vector {
    from_fn(|_| Interval::zero())
}

/// No rotation.
pub fn identity() -> Matrix {
    from_fn(|row| {
        from_fn(|column| {
            if row == column {
                Interval::one()
            } else {
                Interval::zero()
            }
        })
    })
}

/// Sum of the exact products of the coordinates, ends moved outward.
pub fn dot(a: &Vector, b: &Vector) -> Interval {
    let products = &(&a[0].product(&b[0]) + &a[1].product(&b[1])) + &a[2].product(&b[2]);
    products.shrink(&crate::exact::interval::ONE)
}

/// Sum.
pub fn add(a: &Vector, b: &Vector) -> Vector {
    from_fn(|i| &a[i] + &b[i])
}

/// Difference.
pub fn subtract(a: &Vector, b: &Vector) -> Vector {
    from_fn(|i| &a[i] - &b[i])
}

/// `matrix * vector`.
pub fn apply(matrix: &Matrix, vector: &Vector) -> Vector {
    from_fn(|row| dot(&matrix[row], vector))
}

/// Rows as columns.
pub fn transpose(matrix: &Matrix) -> Matrix {
    from_fn(|row| from_fn(|column| matrix[column][row].clone()))
}

/// `a * b`.
pub fn multiply(a: &Matrix, b: &Matrix) -> Matrix {
    let columns = transpose(b);
    from_fn(|row| from_fn(|column| dot(&a[row], &columns[column])))
}

/// Upper bound of the length of a vector in the box `vector`.
pub fn length(vector: &Vector) -> IBig {
    let square: IBig = vector
        .iter()
        .map(|part| {
            let size = part.size();
            &size * &size
        })
        .sum();
    root_ceil(&square)
}

/// Sum of the exact products of the coordinates.
pub fn inner(a: &[RBig], b: &[RBig]) -> RBig {
    a.iter().zip(b).fold(RBig::ZERO, |sum, (a, b)| sum + a * b)
}

/// Sum of squares.
pub fn square(vector: &[RBig]) -> RBig {
    inner(vector, vector)
}

/// `vector`, which must not be zero, at unit length. Exact where the result is in whole grains.
pub fn unit(vector: &[RBig; 3]) -> Vector {
    let norm = square(vector);
    from_fn(|i| {
        let size = Interval::root_of_fraction(&(&vector[i] * &vector[i] / &norm));
        if vector[i] < RBig::ZERO { -size } else { size }
    })
}

/// Rotation of the quaternion w, x, y, z of any length but zero.
pub fn of_quaternion(quaternion: &[RBig; 4]) -> [[RBig; 3]; 3] {
    let norm = square(quaternion);
    let [w, x, y, z] = quaternion;
    let two = RBig::from(2);
    let off = |a: &RBig, b: &RBig, c: &RBig, d: &RBig| &two * (a * b + c * d) / &norm;
    let on = |a: &RBig, b: &RBig| RBig::ONE - &two * (a * a + b * b) / &norm;
    let minus = -w;
    [
        [on(y, z), off(x, y, &minus, z), off(x, z, w, y)],
        [off(x, y, w, z), on(x, z), off(y, z, &minus, x)],
        [off(x, z, &minus, y), off(y, z, w, x), on(x, y)],
    ]
}

/// Rotation by `angle` about the coordinate axis `about`.
fn rotation(about: usize, angle: &Amount) -> Matrix {
    let (sine, cosine) = angle.sine_cosine();
    let (next, last) = ((about + 1) % 3, (about + 2) % 3);
    let mut matrix = identity();
    matrix[next][next] = cosine.clone();
    matrix[last][last] = cosine;
    matrix[last][next] = sine.clone();
    matrix[next][last] = -sine;
    matrix
}

/// `Rz(yaw) Ry(pitch) Rx(roll)`.
pub fn roll_pitch_yaw([roll, pitch, yaw]: &[Amount; 3]) -> Matrix {
    multiply(
        &multiply(&rotation(2, yaw), &rotation(1, pitch)),
        &rotation(0, roll),
    )
}

/// Rotation and origin of a frame in the one before it.
pub fn frame(pose: &Pose) -> (Matrix, Vector) {
    match pose {
        Pose::Placed { xyz, rpy } => (
            roll_pitch_yaw(rpy),
            xyz.each_ref().map(Interval::of_fraction),
        ),
        Pose::Row { a, alpha, d, theta } => {
            let turn = multiply(&rotation(0, alpha), &rotation(2, theta));
            let shift = [Interval::zero(), Interval::zero(), Interval::of_fraction(d)];
            let mut origin = apply(&turn, &shift);
            origin[0] = &origin[0] + &Interval::of_fraction(a);
            (turn, origin)
        }
    }
}
