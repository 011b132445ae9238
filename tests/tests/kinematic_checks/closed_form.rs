//! Closed forms of two textbook arms, written from their tables in plain double precision.

use balk::model::Machine;
use nalgebra::{Isometry3, Rotation3, Vector3};
use std::f64::consts::{PI, TAU};

/// Closed form of the textbook six-joint arm (Fu, Gonzalez & Lee, *Robotics*, McGraw-Hill 1987,
/// sec. 2.3; derived here from the table): every posture, angles modulo a full turn. With the
/// wrist stretched only the sum of the fourth and sixth angles counts; the fourth is then zero.
pub fn textbook_postures(pose: &Isometry3<f64>) -> Vec<[f64; 6]> {
    let [a2, a3, d2, d4, d6]: [f64; 5] = [0.4318, -0.02032, 0.14909, 0.43307, 0.05625];
    let r = pose.rotation.to_rotation_matrix().into_inner();
    let wrist = pose.translation.vector - d6 * r.column(2);
    let across = wrist.x.powi(2) + wrist.y.powi(2) - d2 * d2;
    let mut found = Vec::new();
    if across < 0.0 {
        return found;
    }
    for x in [across.sqrt(), -across.sqrt()] {
        let first = wrist.y.atan2(wrist.x) - d2.atan2(x);
        let y = -wrist.z;
        let bent = (x * x + y * y - a2 * a2 - a3 * a3 - d4 * d4) / (2.0 * a2 * a3.hypot(d4));
        if bent.abs() > 1.0 {
            continue;
        }
        for fold in [bent.acos(), -bent.acos()] {
            let third = d4.atan2(a3) + fold;
            let (s3, c3) = third.sin_cos();
            let second = y.atan2(x) - (a3 * s3 - d4 * c3).atan2(a2 + a3 * c3 + d4 * s3);
            let about = |axis, angle| Rotation3::from_axis_angle(&axis, angle).into_inner();
            let (ax, az) = (Vector3::x_axis(), Vector3::z_axis());
            let forearm = about(az, first)
                * about(ax, -PI / 2.0)
                * about(az, second + third)
                * about(ax, PI / 2.0);
            let m = forearm.transpose() * r;
            let bend = m[(0, 2)].hypot(m[(1, 2)]);
            if bend < 1e-9 {
                let sum =
                    (m[(1, 0)] - m[(0, 1)] * m[(2, 2)]).atan2(m[(0, 0)] + m[(1, 1)] * m[(2, 2)]);
                let fifth = if m[(2, 2)] > 0.0 { 0.0 } else { PI };
                found.push([first, second, third, 0.0, fifth, sum]);
                continue;
            }
            for sign in [1.0, -1.0] {
                found.push([
                    first,
                    second,
                    third,
                    (sign * m[(1, 2)]).atan2(sign * m[(0, 2)]),
                    (sign * bend).atan2(m[(2, 2)]),
                    (sign * m[(2, 1)]).atan2(-sign * m[(2, 0)]),
                ]);
            }
        }
    }
    found
}

/// Whether the angle, give or take full turns, is within limits widened by `spare`.
fn allowed(limits: Option<[f64; 2]>, angle: f64, spare: f64) -> bool {
    let Some([lo, hi]) = limits else { return true };
    let (lo, hi) = (lo - spare, hi + spare);
    angle + ((lo - angle) / TAU).ceil() * TAU <= hi
}

/// What the closed form says of a pose: whether some posture is within the limits widened by
/// `spare` radians.
pub fn textbook_reaches(arm: &Machine, pose: &Isometry3<f64>, spare: f64) -> bool {
    textbook_postures(pose).iter().any(|q| {
        let stretched = q[4] == 0.0 && q[3] == 0.0;
        let limits = |k: usize| arm.joints[k].limits;
        (0..6).all(|k| match k {
            3 if stretched => true,
            5 if stretched => {
                let sum = limits(3)
                    .zip(limits(5))
                    .map(|(a, b)| [a[0] + b[0], a[1] + b[1]]);
                allowed(sum, q[5], spare)
            }
            _ => allowed(limits(k), q[k], spare),
        })
    })
}

/// Closed form of the horizontal arm (Schilling, *Fundamentals of Robotics*, 1990, from memory;
/// derived here from the table): an upside-down tool, two turning joints in the plane and a
/// stroke; the last joint has no limits.
pub fn horizontal_reaches(arm: &Machine, pose: &Isometry3<f64>, spare: f64) -> bool {
    let [l1, l2]: [f64; 2] = [0.425, 0.375];
    let p = pose.translation.vector;
    let m = pose.rotation.to_rotation_matrix().into_inner();
    if m[(2, 2)] > 0.0 || m[(0, 2)].hypot(m[(1, 2)]) > 1e-9 {
        return false;
    }
    let stroke = 0.877 - 0.2 - p.z;
    let [lo, hi] = arm.joints[2].limits.expect("a sliding joint has limits");
    let bent = (p.x * p.x + p.y * p.y - l1 * l1 - l2 * l2) / (2.0 * l1 * l2);
    if stroke < lo - spare || stroke > hi + spare || bent.abs() > 1.0 {
        return false;
    }
    // Turned upside down, the second joint turns the other way.
    [bent.acos(), -bent.acos()].into_iter().any(|fold| {
        let first = p.y.atan2(p.x) - (l2 * fold.sin()).atan2(l1 + l2 * fold.cos());
        allowed(arm.joints[0].limits, first, spare) && allowed(arm.joints[1].limits, -fold, spare)
    })
}
