//! Finding joint values that meet a target: damped least squares towards the nearest pose of the
//! whole target set, not its centre.
//!
//! What is found here is only proposed; [`crate::kinematics`] verifies it separately.

use crate::model::{Kind, Machine, Orientation, Target};
use crate::pack::{Drive, leader};
use nalgebra::{Isometry3, Matrix6, Vector3, Vector6};

/// Most steps of one attempt.
const STEPS: usize = 40;
/// An attempt ends when the squared residual is below this (metres and radians).
const DONE: f64 = 1e-22;

/// A chain in double precision, parametrised by the values of its leading joints.
#[derive(Clone, Debug)]
pub struct Linkage {
    links: Vec<Link>,
    tip: Isometry3<f64>,
    /// Least and greatest value of every leading joint.
    pub limits: Vec<[f64; 2]>,
}

#[derive(Clone, Debug)]
struct Link {
    placement: Isometry3<f64>,
    axis: nalgebra::Unit<Vector3<f64>>,
    kind: Kind,
    drive: usize,
    ratio: f64,
    offset: f64,
}

/// Velocity of the tip per unit speed of a leading joint: linear above angular.
type Column = Vector6<f64>;

impl Linkage {
    /// The chain from base to `tip`, driven by `drives`.
    pub fn new(machine: &Machine, tip: usize, drives: &[Drive]) -> Linkage {
        let path = machine.chain(tip);
        let tip = &machine.tips[tip];
        let mut links: Vec<Link> = Vec::new();
        let mut open = Isometry3::identity();
        for index in path {
            let joint = &machine.joints[index];
            open *= joint.placement;
            if joint.kind == Kind::Fixed {
                continue;
            }
            let (lead, ratio, offset) = leader(machine, index);
            let drive = drives.iter().position(|d| d.joint == lead).unwrap_or(0);
            links.push(Link {
                placement: open,
                axis: joint.axis,
                kind: joint.kind,
                drive,
                ratio,
                offset,
            });
            open = Isometry3::identity();
        }
        Linkage {
            links,
            tip: open * tip.placement,
            limits: drives.iter().map(|d| d.limits).collect(),
        }
    }

    /// Pose of the tip and its Jacobian, a column per leading joint.
    fn pose(&self, values: &[f64], columns: &mut [Column]) -> Isometry3<f64> {
        columns.fill(Column::zeros());
        let mut at = Isometry3::identity();
        let mut axes = [(Vector3::zeros(), Vector3::zeros()); 16];
        for (link, slot) in self.links.iter().zip(&mut axes) {
            at *= link.placement;
            let value = link.ratio * values[link.drive] + link.offset;
            *slot = (at.rotation * link.axis.into_inner(), at.translation.vector);
            match link.kind {
                Kind::Prismatic => {
                    at.translation.vector += slot.0 * value;
                }
                _ => at.rotation *= nalgebra::UnitQuaternion::from_axis_angle(&link.axis, value),
            }
        }
        at *= self.tip;
        for (link, (axis, origin)) in self.links.iter().zip(axes) {
            let column = &mut columns[link.drive];
            let (linear, angular) = match link.kind {
                Kind::Prismatic => (axis, Vector3::zeros()),
                _ => (axis.cross(&(at.translation.vector - origin)), axis),
            };
            for k in 0..3 {
                column[k] += linear[k] * link.ratio;
                column[3 + k] += angular[k] * link.ratio;
            }
        }
        at
    }

    /// Looks for values meeting the target from the given start, changing it in place.
    ///
    /// Returns the squared distance to the target set that is left. Cost: at most forty
    /// evaluations of the chain and as many 6 x 6 factorisations.
    pub fn seek(&self, target: &Target, values: &mut [f64]) -> f64 {
        let mut columns = [Column::zeros(); 8];
        let columns = &mut columns[..values.len()];
        let mut trial = [0.0; 8];
        let trial = &mut trial[..values.len()];
        let pose = self.pose(values, columns);
        let (mut error, share) = residual(target, &pose);
        columns.iter_mut().for_each(|c| *c = share * *c);
        let mut size = error.norm_squared();
        let mut damping = 1e-3;
        for _ in 0..STEPS {
            if size < DONE {
                break;
            }
            let step = self.step(values, columns, &error, damping);
            for (k, t) in trial.iter_mut().enumerate() {
                let [lo, hi] = self.limits[k];
                *t = (values[k] + step[k].clamp(-0.7, 0.7)).clamp(lo, hi);
            }
            let mut next = [Column::zeros(); 8];
            let next = &mut next[..values.len()];
            let pose = self.pose(trial, next);
            let (after, share) = residual(target, &pose);
            next.iter_mut().for_each(|c| *c = share * *c);
            let reduced = after.norm_squared();
            if reduced < size {
                // Slow only counts once the damping cannot be the reason.
                if reduced > size * 0.9999 && damping < 1e-11 {
                    size = reduced;
                    values.copy_from_slice(trial);
                    break;
                }
                values.copy_from_slice(trial);
                columns.copy_from_slice(next);
                (error, size) = (after, reduced);
                damping = f64::max(damping * 0.1, 1e-12);
            } else {
                damping *= 10.0;
                if damping > 1e3 {
                    break;
                }
            }
        }
        size
    }

    /// One damped step; joints pressed against a limit are held.
    fn step(&self, values: &[f64], columns: &[Column], error: &Column, damping: f64) -> [f64; 8] {
        let mut held = [false; 8];
        let mut step = [0.0; 8];
        for _ in 0..3 {
            let mut normal = Matrix6::identity() * damping;
            for (k, column) in columns.iter().enumerate() {
                if !held[k] {
                    normal.ger(1.0, column, column, 1.0);
                }
            }
            let Some(solved) = normal.cholesky().map(|c| c.solve(error)) else {
                return step;
            };
            let mut more = false;
            for (k, column) in columns.iter().enumerate() {
                step[k] = if held[k] { 0.0 } else { column.dot(&solved) };
                let [lo, hi] = self.limits[k];
                if !held[k]
                    && (values[k] <= lo && step[k] < 0.0 || values[k] >= hi && step[k] > 0.0)
                {
                    held[k] = true;
                    more = true;
                }
            }
            if !more {
                break;
            }
        }
        step
    }
}

/// From the pose to the nearest pose of the target set, translation above rotation vector, and
/// how much of a motion of the tip the difference feels.
fn residual(target: &Target, pose: &Isometry3<f64>) -> (Vector6<f64>, Matrix6<f64>) {
    let mut error = Vector6::zeros();
    // Coordinates that are inside, and turns that are free, do not count: held, they would turn
    // the quadratic convergence of a step into a crawl.
    let mut share = Matrix6::zeros();
    let off = target.xyz - pose.translation.vector;
    for k in 0..3 {
        let within = target.xyz_within[k];
        error[k] = off[k] - off[k].clamp(-within, within);
        if error[k] != 0.0 || within == 0.0 {
            share[(k, k)] = 1.0;
        }
    }
    match &target.orientation {
        Orientation::Free => {}
        Orientation::Near { rotation, within } => {
            let wanted: nalgebra::UnitQuaternion<f64> = (*rotation).into();
            let turn = (wanted * pose.rotation.inverse()).scaled_axis();
            let angle = turn.norm();
            if angle > *within {
                let part = (angle - within) / angle;
                error.fixed_rows_mut::<3>(3).copy_from(&(turn * part));
                let along = turn / angle;
                let m =
                    along * along.transpose() * (1.0 - part) + nalgebra::Matrix3::identity() * part;
                share.fixed_view_mut::<3, 3>(3, 3).copy_from(&m);
            } else if *within == 0.0 {
                share.fixed_view_mut::<3, 3>(3, 3).fill_with_identity();
            }
        }
        Orientation::Axes(cones) => {
            let mut sum = Vector3::zeros();
            let mut m = nalgebra::Matrix3::zeros();
            for cone in cones {
                let axis = pose.rotation * cone.tip.into_inner();
                let cross = axis.cross(&cone.base);
                let angle = cross.norm().atan2(axis.dot(&cone.base));
                if angle > cone.within {
                    let about = if cross.norm() > 1e-12 {
                        cross.normalize()
                    } else {
                        // Opposite directions: any axis across will do.
                        let other = if axis.x.abs() < 0.9 {
                            Vector3::x()
                        } else {
                            Vector3::y()
                        };
                        axis.cross(&other).normalize()
                    };
                    sum += about * (angle - cone.within);
                    let part = (angle - cone.within) / angle.max(1e-300);
                    let across = nalgebra::Matrix3::identity() - axis * axis.transpose();
                    m += about * about.transpose() * (1.0 - part) + across * part;
                }
            }
            error.fixed_rows_mut::<3>(3).copy_from(&sum);
            share.fixed_view_mut::<3, 3>(3, 3).copy_from(&m);
        }
    }
    (error, share)
}
