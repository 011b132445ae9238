//! Positions, directions and orientations, as both readers know them.

use nalgebra::{Isometry3, Matrix3, Rotation3, Translation3, Unit, UnitQuaternion, Vector3};

use super::Flaw;
use super::fields::{Field, Fields};

/// How far an entry of a written rotation may lie from the nearest rotation's, and the norm of a
/// written quaternion from 1. Larger differences are mistakes rather than rounding.
const MAX_DISTORTION: f64 = 1e-3;

/// A rotation as written and the angle by which it may differ from what was meant.
pub(super) struct Written {
    pub rotation: Rotation3<f64>,
    /// Radians.
    pub error: f64,
}

/// Pose of a frame in its parent, from `xyz` and `rpy` or `rpy_deg`; each is zero when left out.
pub(super) fn placement(fields: &mut Fields, max_length: f64) -> Result<Isometry3<f64>, Flaw> {
    let mut origin = Vector3::zeros();
    if let Some(field) = fields.take("xyz") {
        for (coordinate, item) in origin.iter_mut().zip(field.list_of::<3>()?) {
            *coordinate = within(&item, max_length, "metres")?;
        }
    }
    let turn = match fields.one_of(&["rpy", "rpy_deg"])? {
        None => UnitQuaternion::identity(),
        Some((0, field)) => UnitQuaternion::from_rotation_matrix(&roll_pitch_yaw(field, 1.0)?),
        Some((_, field)) => {
            UnitQuaternion::from_rotation_matrix(&roll_pitch_yaw(field, 1f64.to_radians())?)
        }
    };
    Ok(Isometry3::from_parts(Translation3::from(origin), turn))
}

/// A finite number of size at most `max`.
pub(super) fn within(field: &Field, max: f64, unit: &str) -> Result<f64, Flaw> {
    let x = field.number()?;
    if x.abs() <= max {
        Ok(x)
    } else {
        Err(field.flaw(format!("{x} is beyond {max} {unit}")))
    }
}

/// Fixed-axis roll, pitch, yaw: `Rz(yaw) Ry(pitch) Rx(roll)`, angles in multiples of `unit`
/// radians.
pub(super) fn roll_pitch_yaw(field: Field, unit: f64) -> Result<Rotation3<f64>, Flaw> {
    let [roll, pitch, yaw] = field.numbers::<3>()?.map(|angle| angle * unit);
    Ok(Rotation3::from_axis_angle(&Vector3::z_axis(), yaw)
        * Rotation3::from_axis_angle(&Vector3::y_axis(), pitch)
        * Rotation3::from_axis_angle(&Vector3::x_axis(), roll))
}

/// A direction of any length but zero.
pub(super) fn direction(field: Field) -> Result<Unit<Vector3<f64>>, Flaw> {
    let zero = field.flaw("a direction cannot be zero");
    let vector = field.vector()?;
    let size = vector.amax();
    if size == 0.0 {
        Err(zero)
    } else {
        Ok(Unit::new_normalize(vector / size))
    }
}

/// The rotation nearest to nine numbers, row by row.
///
/// It is the orthogonal factor of the polar decomposition, found by Newton's iteration (Higham,
/// *Computing the polar decomposition*, SIAM J. Sci. Stat. Comput. 7(4), 1986). The error is the
/// Frobenius norm of the difference, read as an angle: a turn by a small angle `t` moves a
/// rotation matrix by `sqrt(2) t`, so this errs on the generous side.
pub(super) fn matrix(field: Field) -> Result<Written, Flaw> {
    let place = field.flaw("");
    let flaw = |reason: String| Flaw { reason, ..place };
    let written = Matrix3::from_row_slice(&field.numbers::<9>()?);
    // Written so that an entry that is not a number is far.
    let near = |nearest: &Matrix3<f64>| {
        (written - nearest)
            .iter()
            .all(|difference| difference.abs() <= MAX_DISTORTION)
    };
    match polar(written).filter(near) {
        None => Err(flaw(format!(
            "is not a rotation: not orthonormal within {MAX_DISTORTION}"
        ))),
        Some(nearest) if nearest.determinant() < 0.0 => {
            Err(flaw("is a reflection, not a rotation".to_owned()))
        }
        Some(nearest) => Ok(Written {
            rotation: Rotation3::from_matrix_unchecked(nearest),
            error: (written - nearest).norm(),
        }),
    }
}

/// The orthogonal matrix nearest to `matrix`, if that is near one. Eight steps double the digits
/// from far below one to all that a double holds.
fn polar(matrix: Matrix3<f64>) -> Option<Matrix3<f64>> {
    (0..8).try_fold(matrix, |x, _| {
        Some((x + x.try_inverse()?.transpose()) * 0.5)
    })
}

/// The rotation of a quaternion `[w, x, y, z]`, brought to unit length.
///
/// The error is twice the difference of its norm from 1, since a unit quaternion turns half as
/// far as its rotation.
pub(super) fn quaternion(field: Field) -> Result<Written, Flaw> {
    let place = field.flaw("");
    let [w, x, y, z] = field.numbers::<4>()?;
    let written = nalgebra::Quaternion::new(w, x, y, z);
    let distortion = (written.norm() - 1.0).abs();
    if distortion > MAX_DISTORTION {
        let reason = format!("has norm {}, not 1 within {MAX_DISTORTION}", written.norm());
        return Err(Flaw { reason, ..place });
    }
    let rotation = UnitQuaternion::from_quaternion(written).to_rotation_matrix();
    Ok(Written {
        rotation,
        error: 2.0 * distortion,
    })
}
