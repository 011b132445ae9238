//! Where each joint's frame is put.

use crate::model::{self, Kind};
use nalgebra::{Isometry3, Matrix3, Rotation3, Translation3, UnitQuaternion, Vector3};

/// A stretch of the chain while it is put together.
#[derive(Clone, Copy)]
pub(super) struct Stretch {
    pub placement: Isometry3<f64>,
    /// Error of the origin (length of the vector) and of the orientation (angle).
    pub xyz: f64,
    pub angle: f64,
}

impl Stretch {
    /// No way at all, known exactly, ending in a frame turned by `placement`.
    pub fn from(placement: Isometry3<f64>) -> Stretch {
        Stretch {
            placement,
            xyz: 0.0,
            angle: 0.0,
        }
    }

    pub fn then(self, placement: Isometry3<f64>, tolerance: model::Tolerance) -> Stretch {
        Stretch {
            placement: self.placement * placement,
            xyz: self.xyz
                + self.angle * placement.translation.vector.norm()
                + tolerance.xyz * 3f64.sqrt()
                // Rounding of double precision, for long links that fold back.
                + 4.0 * f64::EPSILON * placement.translation.vector.norm(),
            angle: self.angle + tolerance.angle,
        }
    }
}

/// Rotation that takes the third axis to `axis`.
pub(super) fn to_axis(axis: &Vector3<f64>) -> UnitQuaternion<f64> {
    // Signed permutations where possible, so that the integers are exact.
    let turn = if axis.x.hypot(axis.y) < 1e-15 {
        if axis.z > 0.0 {
            Matrix3::identity()
        } else {
            Matrix3::new(1.0, 0.0, 0.0, 0.0, -1.0, 0.0, 0.0, 0.0, -1.0)
        }
    } else {
        let x = Vector3::z().cross(axis).normalize();
        Matrix3::from_columns(&[x, axis.cross(&x), *axis])
    };
    UnitQuaternion::from_rotation_matrix(&Rotation3::from_matrix_unchecked(turn))
}

pub(super) fn about_z(angle: f64) -> Isometry3<f64> {
    Isometry3::from_parts(
        Translation3::identity(),
        UnitQuaternion::from_axis_angle(&Vector3::z_axis(), angle),
    )
}

pub(super) fn along_z(length: f64) -> Isometry3<f64> {
    Isometry3::translation(0.0, 0.0, length)
}

/// Angle about the third axis that brings the vector onto the first; zero for a vector along it.
pub(super) fn heading(v: &Vector3<f64>, reach: f64) -> f64 {
    if v.x.hypot(v.y) < 1e-9 * reach {
        0.0
    } else {
        v.y.atan2(v.x)
    }
}

/// Moves every joint's frame along and about its own axis to where the rules are strongest:
/// origins at the foot of the next origin, first axes along the offsets. Returns for every joint
/// what that adds to its angle.
pub(super) fn choose_frames(
    machine: &model::Machine,
    moving: &[usize],
    stretches: &mut [Stretch],
) -> Vec<f64> {
    let count = moving.len();
    let reach: f64 = stretches
        .iter()
        .map(|s| s.placement.translation.vector.norm())
        .sum();
    for k in (0..count).rev() {
        let foot = stretches[k + 1].placement.translation.vector.z;
        stretches[k].xyz += stretches[k].angle * foot.abs();
        stretches[k].placement *= along_z(foot);
        stretches[k + 1].placement = along_z(-foot) * stretches[k + 1].placement;
    }
    let mut shifts = vec![0.0; count];
    for k in 0..count {
        let back = stretches[k]
            .placement
            .rotation
            .inverse_transform_vector(&stretches[k].placement.translation.vector);
        let before = heading(&back, reach);
        let after = if machine.joints[moving[k]].kind == Kind::Prismatic {
            before
        } else {
            heading(&stretches[k + 1].placement.translation.vector, reach)
        };
        stretches[k].placement *= about_z(before);
        stretches[k + 1].placement = about_z(-after) * stretches[k + 1].placement;
        shifts[k] = after - before;
    }
    shifts
}
