//! Doubles to integers, rounded outward.

use super::frames::Stretch;
use crate::model;
use balk_core::fixed::{Arc, Direction, Interval, ONE, Product};
use balk_core::machine::Placement;
use balk_core::target::{Cone, Orientation, Target};
use nalgebra::{UnitQuaternion, Vector3};
use std::f64::consts::{PI, TAU};

/// Angles are rounded outward by this much, radians: several units of the fixed point.
const ANGLE_MARGIN: f64 = 4.0 / (1u64 << 30) as f64;

/// Integer bounds of a range of lengths.
pub(super) fn length(lo: f64, hi: f64, scale: f64) -> Interval {
    Interval::clamped(
        (lo / scale * ONE as f64 - 1e-3).floor() as i64,
        (hi / scale * ONE as f64 + 1e-3).ceil() as i64,
    )
}

/// The arc from one angle to another, rounded outward.
pub(super) fn arc(lo: f64, hi: f64) -> Arc {
    if !(hi - lo).is_finite() || hi - lo >= TAU - 4.0 * ANGLE_MARGIN {
        return Arc::FULL;
    }
    Arc::new(direction(lo - ANGLE_MARGIN), direction(hi + ANGLE_MARGIN))
}

pub(super) fn direction(angle: f64) -> Direction {
    let (y, x) = angle.sin_cos();
    Direction {
        x: (x * ONE as f64).round() as i32,
        y: (y * ONE as f64).round() as i32,
    }
}

pub(super) fn placement(stretch: &Stretch, scale: f64) -> Placement {
    let rotation = stretch.placement.rotation.to_rotation_matrix();
    let t = stretch.placement.translation.vector / scale;
    let (xyz, angle) = (stretch.xyz / scale, stretch.angle);
    let bounds = |v: f64, slack: f64| length(v - slack, v + slack, 1.0);
    let back = rotation.inverse_transform_vector(&t);
    // The largest change of a unit vector by the angle, and three roundings of half a unit.
    let chord = 2.0 * (angle.min(PI) / 2.0).sin();
    // When that may be one or more, knowing only that it is a unit vector is worth more.
    let known = if chord < 1.0 { 1.0 } else { 0.0 };
    let size = t.norm();
    let square = |v: f64| v * v * (1u64 << 60) as f64;
    Placement {
        rotation: [0, 1, 2].map(|i| {
            [0, 1, 2].map(|j| {
                let entry = rotation[(i, j)];
                let snapped = if entry.abs() < 1e-15 { 0.0 } else { entry };
                (known * snapped * ONE as f64).round() as i32
            })
        }),
        turn_slack: 1 + (chord.min(1.0) * ONE as f64).ceil() as i32,
        origin: [0, 1, 2].map(|k| bounds(t[k], xyz)),
        back: [0, 1, 2].map(|k| bounds(back[k], xyz + chord * size)),
        // 2^12 units are several roundings of a double near one.
        square: Product {
            lo: square((size - xyz).max(0.0)) as i64 - (1 << 12),
            hi: square(size + xyz) as i64 + (1 << 12),
        },
    }
}

/// Packs a target for a chain of the given scale.
pub fn pack_target(target: &model::Target, scale: f64) -> Target {
    let position = [0, 1, 2].map(|k| {
        length(
            target.xyz[k] - target.xyz_within[k],
            target.xyz[k] + target.xyz_within[k],
            scale,
        )
    });
    let half_sine = |within: f64| {
        let half = ((within + ANGLE_MARGIN).min(PI) / 2.0).sin();
        ((half * ONE as f64).ceil() as i32).min(ONE)
    };
    let unit = |v: &Vector3<f64>| [0, 1, 2].map(|k| (v[k] * ONE as f64).round() as i32);
    Target {
        position,
        orientation: match &target.orientation {
            model::Orientation::Free => Orientation::Free,
            model::Orientation::Axes(cones) => Orientation::Axes(
                cones
                    .iter()
                    .map(|cone| Cone {
                        tip: unit(&cone.tip),
                        base: unit(&cone.base),
                        half_sine: half_sine(cone.within),
                    })
                    .collect(),
            ),
            model::Orientation::Near { rotation, within } => {
                let q = UnitQuaternion::from_rotation_matrix(rotation);
                Orientation::Near {
                    quaternion: [q.w, q.i, q.j, q.k].map(|c| (c * ONE as f64).round() as i32),
                    half_sine: half_sine(*within),
                }
            }
        },
    }
}
