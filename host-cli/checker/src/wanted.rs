//! What a target asks, in grains.

use core::array::from_fn;

use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

use crate::exact::function;
use crate::exact::interval::Interval;
use crate::space::{self, Matrix, Vector};
use crate::target::{Orientation, Target, TargetError, Written};

/// A largest angle with its functions.
#[derive(Clone, Debug)]
pub struct Angle {
    /// Its cosine.
    pub cosine: Interval,
    /// Its sine.
    pub sine: Interval,
}

impl Angle {
    /// Of `angle`, which must not be negative; more than half a turn says no more than that.
    fn new(angle: &Interval) -> Self {
        let most = function::pi();
        if angle.hi >= most.lo {
            return Self {
                cosine: -Interval::one(),
                sine: Interval::zero(),
            };
        }
        // A larger angle bounds less, so the upper end stands for all.
        let (sine, cosine) = function::sine_cosine(&angle.hi);
        Self { cosine, sine }
    }
}

/// A cone of directions.
#[derive(Clone, Debug)]
pub struct Cone {
    /// Unit axis in the tip frame.
    pub tip: Vector,
    /// Unit direction in the base frame.
    pub base: Vector,
    /// Largest angle between them.
    pub within: Angle,
}

/// A target in grains.
#[derive(Clone, Debug)]
pub struct Wanted {
    /// Of the tip's origin.
    pub position: Vector,
    /// A rotation and the largest angle from it.
    pub orientation: Option<(Matrix, Angle)>,
    /// Axes within angles.
    pub cones: Vec<Cone>,
}

impl Wanted {
    /// What `target` asks.
    ///
    /// # Errors
    ///
    /// Nine numbers that are no rotation.
    pub fn new(target: &Target) -> Result<Self, TargetError> {
        let mut wanted = Self {
            position: from_fn(|i| {
                let (at, within) = (&target.xyz[i], &target.within[i]);
                let low = Interval::of_fraction(&(at - within));
                low.hull(&Interval::of_fraction(&(at + within)))
            }),
            orientation: None,
            cones: Vec::new(),
        };
        match &target.orientation {
            Orientation::Free => {}
            Orientation::Near(written, within) => {
                let (rotation, error) = rotation(written)?;
                let within = Angle::new(&(&within.enclosure() + &error));
                wanted.orientation = Some((rotation, within));
            }
            Orientation::Cones(cones) => {
                let cones = cones.iter().map(|cone| Cone {
                    tip: space::unit(&cone.tip),
                    base: space::unit(&cone.base),
                    within: Angle::new(&cone.within.enclosure()),
                });
                wanted.cones = cones.collect();
            }
        }
        Ok(wanted)
    }
}

/// The rotation that was meant and how far in angle what was written may be from it.
fn rotation(written: &Written) -> Result<(Matrix, Interval), TargetError> {
    match written {
        Written::Quaternion(quaternion) => {
            let rows = space::of_quaternion(quaternion);
            let norm = Interval::root_of_fraction(&space::square(quaternion));
            let error = (&norm - &Interval::one()).size() * IBig::from(2);
            Ok((enclose(&rows), Interval::point(error)))
        }
        Written::RollPitchYaw(angles) => Ok((space::roll_pitch_yaw(angles), Interval::zero())),
        Written::Matrix(numbers) => nearest(numbers),
    }
}

fn enclose(rows: &[[RBig; 3]; 3]) -> Matrix {
    rows.each_ref()
        .map(|row| row.each_ref().map(Interval::of_fraction))
}

/// The rotation nearest to nine numbers, row by row, and the Frobenius norm of the difference.
///
/// Newton's iteration `X <- (X + X^-T) / 2` keeps the orthogonal polar factor `U` and takes every
/// singular value `s` to `(s + 1/s) / 2` (Higham, *Computing the polar decomposition*, SIAM J. Sci.
/// Stat. Comput. 7(4), 1986). Between steps, X is rounded to a grid of 10^-40, which moves U by at
/// most `2 / (s + s')` times the Frobenius norm of the rounding, s and s' the least singular values
/// before and after (R.-C. Li, *New perturbation bounds for the unitary polar factor*, SIAM J.
/// Matrix Anal. Appl. 16, 1995), here below 1.1 * 3 * 10^-40. When at last every entry of
/// `X' X - 1` is below e, every singular value is within 3 e of one, and X within 9 e of U.
fn nearest(numbers: &[RBig; 9]) -> Result<(Matrix, Interval), TargetError> {
    let no_rotation = || TargetError::Field {
        field: "rotation",
        reason: "must be a rotation",
    };
    let written: [[RBig; 3]; 3] = from_fn(|i| from_fn(|j| numbers[3 * i + j].clone()));
    // Near enough to a rotation for the bounds above: e <= 1/100 and a positive determinant.
    if deviation(&written) > RBig::from_parts(1.into(), 100u8.into()) {
        return Err(no_rotation());
    }
    let mut rows = written.clone();
    for _ in 0..4 {
        let cofactors = cofactors(&rows);
        let determinant = space::inner(&rows[0], &cofactors[0]);
        if determinant <= RBig::ZERO {
            return Err(no_rotation());
        }
        rows = from_fn(|i| {
            from_fn(|j| coarse(&((&rows[i][j] + &cofactors[i][j] / &determinant) / RBig::from(2))))
        });
    }
    let error =
        deviation(&rows) * RBig::from(9) + RBig::from_parts(16.into(), UBig::from(10u8).pow(40));
    let error = Interval::of_fraction(&error).hi;
    let rotation = enclose(&rows)
        .map(|row| row.map(|entry| Interval::new(&entry.lo - &error, &entry.hi + &error)));
    let mut difference = RBig::ZERO;
    for (row, other) in written.iter().zip(&rows) {
        for (a, b) in row.iter().zip(other) {
            let d = a - b;
            if d.clone() * d.clone() > RBig::from_parts(1.into(), 1_000_000u32.into()) {
                return Err(no_rotation());
            }
            difference += &d * &d;
        }
    }
    let size = Interval::root_of_fraction(&difference).hi + error;
    Ok((rotation, Interval::point(size)))
}

/// Largest size of an entry of `X' X - 1`.
fn deviation(rows: &[[RBig; 3]; 3]) -> RBig {
    let mut most = RBig::ZERO;
    for i in 0..3 {
        for j in 0..3 {
            let [a, b] = [i, j].map(|column| rows.each_ref().map(|row| row[column].clone()));
            let product = space::inner(&a, &b);
            let off = if i == j { product - RBig::ONE } else { product };
            most = most.max(if off < RBig::ZERO { -off } else { off });
        }
    }
    most
}

/// Cofactors; divided by the determinant they are the inverse, transposed.
fn cofactors(m: &[[RBig; 3]; 3]) -> [[RBig; 3]; 3] {
    from_fn(|i| {
        from_fn(|j| {
            let (i1, i2, j1, j2) = ((i + 1) % 3, (i + 2) % 3, (j + 1) % 3, (j + 2) % 3);
            &m[i1][j1] * &m[i2][j2] - &m[i1][j2] * &m[i2][j1]
        })
    })
}

/// `number` rounded down to a multiple of 10^-40.
fn coarse(number: &RBig) -> RBig {
    let grid = UBig::from(10u8).pow(40);
    let scaled = number.numerator() * IBig::from(grid.clone());
    let whole = crate::exact::interval::floor(&scaled, &number.denominator().clone().into());
    RBig::from_parts(whole, grid)
}
