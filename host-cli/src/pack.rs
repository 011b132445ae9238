//! From the machine and target of a file to the integers of the core, rounded outward.
//!
//! Every number the core gets encloses the number in the file: a refusal of the packed target by
//! the packed machine is a refusal of the real target by every machine within its tolerances.

use crate::model::{self, Kind};
use balk_core::fixed::{Arc, Direction, Interval, ONE, Product};
use balk_core::machine::{Joint, Machine, Motion, Placement, Variable};
use balk_core::propagate::MOST_JOINTS;
use balk_core::target::{Cone, Orientation, Target};
use nalgebra::{Isometry3, Matrix3, Rotation3, Translation3, UnitQuaternion, Vector3};
use std::f64::consts::{PI, TAU};

/// The machine type every chain of the workstation is packed into.
pub type Packed = Machine<MOST_JOINTS>;

/// Angles are rounded outward by this much, radians: several units of the fixed point.
const ANGLE_MARGIN: f64 = 4.0 / (1u64 << 30) as f64;
/// Largest numerator and denominator of a ratio between a joint and the one it follows.
const MOST_RATIO: i32 = 16;
/// Largest multiple of a variable that the core takes.
const MOST_MULTIPLE: f64 = i8::MAX as f64;

/// Why a chain cannot be packed.
#[derive(Clone, Debug, thiserror::Error)]
pub enum PackError {
    /// A joint follows one of the other kind of motion.
    #[error("joint {joint:?}: a {kind:?} joint cannot follow a joint of another kind")]
    MixedFollower {
        /// The follower.
        joint: String,
        /// Its kind.
        kind: Kind,
    },
    /// Limits of a joint and of those that follow it exclude each other.
    #[error("joint {joint:?}: its limits and those of the joints that follow it leave no value")]
    NoRange {
        /// The joint that leads.
        joint: String,
    },
    /// The ratio has no small fraction and the leader no limits.
    #[error("joint {joint:?}: ratio {ratio} is not a fraction with numerator and denominator up to {MOST_RATIO} and a common denominator with the leader's other followers up to {MOST_MULTIPLE}, which a joint without limits needs")]
    Ratio {
        /// The follower.
        joint: String,
        /// Its ratio.
        ratio: f64,
    },
    /// More moving joints than the largest preset.
    #[error("tip {tip:?} hangs on {joints} moving joints; at most {MOST_JOINTS} are supported")]
    TooManyJoints {
        /// The tip.
        tip: String,
        /// Moving joints between it and the base.
        joints: usize,
    },
    /// Nothing moves and nothing has a length.
    #[error("tip {tip:?} has no extent: every length is zero")]
    NoExtent {
        /// The tip.
        tip: String,
    },
}

/// A chain packed for the core, with what is needed to read its variables back.
#[derive(Clone, Debug)]
pub struct Pack {
    /// The integers.
    pub machine: Packed,
    /// Metres per unit length of the core.
    pub scale: f64,
    /// For every variable, how to turn it into a joint value of the model.
    pub drives: Vec<Drive>,
}

/// A variable of the core in terms of the model.
#[derive(Clone, Copy, Debug)]
pub struct Drive {
    /// Index of the joint of the model that leads.
    pub joint: usize,
    /// The joint's value is this multiple of the variable ...
    pub multiple: f64,
    /// ... plus this (radians or metres).
    pub offset: f64,
    /// Least and greatest value of the joint (infinite: none).
    pub limits: [f64; 2],
}

/// The joint a joint follows in the end: (leader, ratio, offset). Itself if it follows none.
pub fn leader(machine: &model::Machine, joint: usize) -> (usize, f64, f64) {
    let (mut at, mut ratio, mut offset) = (joint, 1.0, 0.0);
    while let Some(follows) = machine.joints[at].follows {
        offset += ratio * follows.offset;
        ratio *= follows.ratio;
        at = follows.joint;
    }
    (at, ratio, offset)
}

/// Least and greatest value a leading joint may take so that it and all that follow it stay
/// within their limits.
pub fn range(machine: &model::Machine, lead: usize) -> [f64; 2] {
    let mut range = [f64::NEG_INFINITY, f64::INFINITY];
    for (i, joint) in machine.joints.iter().enumerate() {
        let (leads, ratio, offset) = leader(machine, i);
        let Some([lo, hi]) = joint.limits else {
            continue;
        };
        if leads != lead || joint.kind == Kind::Fixed || ratio == 0.0 {
            continue;
        }
        let (a, b) = ((lo - offset) / ratio, (hi - offset) / ratio);
        range[0] = range[0].max(a.min(b));
        range[1] = range[1].min(a.max(b));
    }
    range
}

/// A stretch of the chain while it is put together.
#[derive(Clone, Copy)]
struct Stretch {
    placement: Isometry3<f64>,
    /// Error of the origin (length of the vector) and of the orientation (angle).
    xyz: f64,
    angle: f64,
}

impl Stretch {
    const NONE: fn() -> Stretch = || Stretch {
        placement: Isometry3::identity(),
        xyz: 0.0,
        angle: 0.0,
    };

    fn then(self, placement: Isometry3<f64>, tolerance: model::Tolerance) -> Stretch {
        Stretch {
            placement: self.placement * placement,
            xyz: self.xyz
                + self.angle * placement.translation.vector.norm()
                + tolerance.xyz * 3f64.sqrt(),
            angle: self.angle + tolerance.angle,
        }
    }
}

/// Rotation that takes the third axis to `axis`.
fn to_axis(axis: &Vector3<f64>) -> UnitQuaternion<f64> {
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

fn about_z(angle: f64) -> Isometry3<f64> {
    Isometry3::from_parts(
        Translation3::identity(),
        UnitQuaternion::from_axis_angle(&Vector3::z_axis(), angle),
    )
}

fn along_z(length: f64) -> Isometry3<f64> {
    Isometry3::translation(0.0, 0.0, length)
}

/// Angle about the third axis that brings the vector onto the first; zero for a vector along it.
fn heading(v: &Vector3<f64>, reach: f64) -> f64 {
    if v.x.hypot(v.y) < 1e-9 * reach {
        0.0
    } else {
        v.y.atan2(v.x)
    }
}

/// Packs the chain from the base to a tip.
///
/// # Errors
/// [`PackError`] names the joint or tip and the reason.
pub fn pack(machine: &model::Machine, tip: usize) -> Result<Pack, PackError> {
    let tip = &machine.tips[tip];
    let mut path = Vec::new();
    let mut at = tip.parent;
    while let Some(joint) = at {
        path.push(joint);
        at = machine.joints[joint].parent;
    }
    path.reverse();

    // Stretches between moving joints, each ending with the joint's axis along z.
    let mut stretches = Vec::new();
    let mut moving = Vec::new();
    let mut open = Stretch::NONE();
    for &index in &path {
        let joint = &machine.joints[index];
        open = open.then(joint.placement, joint.tolerance);
        if joint.kind == Kind::Fixed {
            continue;
        }
        let turn = Isometry3::from_parts(Translation3::identity(), to_axis(&joint.axis));
        stretches.push(Stretch {
            placement: open.placement * turn,
            ..open
        });
        moving.push(index);
        open = Stretch::NONE();
        open.placement = turn.inverse();
    }
    stretches.push(open.then(tip.placement, model::Tolerance::default()));
    if moving.len() > MOST_JOINTS {
        return Err(PackError::TooManyJoints {
            tip: tip.name.clone(),
            joints: moving.len(),
        });
    }

    let shifts = choose_frames(machine, &moving, &mut stretches);
    let (variables, drives) = variables(machine, &moving)?;

    let mut reach: f64 = stretches
        .iter()
        .map(|s| s.placement.translation.vector.norm() + s.xyz)
        .sum();
    for &index in &moving {
        if machine.joints[index].kind == Kind::Prismatic {
            let [lo, hi] = machine.joints[index].limits.unwrap_or([0.0, 0.0]);
            reach += lo.abs().max(hi.abs());
        }
    }
    // Variables of sliding joints are lengths too, though their joints may be elsewhere.
    for (kind, drive) in variables.iter().zip(&drives) {
        if *kind == Kind::Prismatic {
            let most = drive.limits[0].abs().max(drive.limits[1].abs());
            reach = reach.max(most / drive.multiple);
        }
    }
    for &index in &moving {
        if machine.joints[index].kind == Kind::Prismatic {
            let hold = hold(machine, index, &drives)?;
            reach = reach.max(hold.rest.abs() + hold.residual);
        }
    }
    if reach <= 0.0 {
        return Err(PackError::NoExtent {
            tip: tip.name.clone(),
        });
    }
    let exponent = (reach * (1.0 + 1e-6)).log2().ceil() as i8;
    let scale = (exponent as f64).exp2();

    let mut packed = Packed {
        joints: Default::default(),
        variables: Default::default(),
        tip: placement(&stretches[moving.len()], scale),
        exponent,
    };
    for (k, &index) in moving.iter().enumerate() {
        let Hold {
            variable,
            multiple,
            rest,
            residual,
        } = hold(machine, index, &drives)?;
        let (motion, turn, shift) = match machine.joints[index].kind {
            Kind::Prismatic => (
                Motion::Slide,
                Arc::FULL,
                length(rest - residual, rest + residual, scale),
            ),
            _ => {
                let rest = rest + shifts[k];
                let turn = if rest == 0.0 && residual == 0.0 {
                    Arc::new(Direction::EAST, Direction::EAST)
                } else {
                    arc(rest - residual, rest + residual)
                };
                (Motion::Turn, turn, Interval::ZERO)
            }
        };
        let _ = packed.joints.push(Joint {
            motion,
            placement: placement(&stretches[k], scale),
            variable: variable as u8,
            multiple,
            turn,
            shift,
        });
    }
    let mut packed_drives = drives.clone();
    for (v, (kind, drive)) in variables.iter().zip(&mut packed_drives).enumerate() {
        // A variable that drives one joint alone takes the joint's shift into its own origin.
        let single = packed
            .joints
            .iter()
            .filter(|j| j.variable as usize == v)
            .count()
            == 1;
        if let (true, Kind::Revolute) = (single, kind) {
            for (k, joint) in packed.joints.iter_mut().enumerate() {
                let hold = hold(machine, moving[k], &drives)?;
                if hold.variable == v && hold.multiple == 1 && hold.residual == 0.0 {
                    drive.offset = -(hold.rest + shifts[k]) * drive.multiple;
                    joint.turn = Arc::new(Direction::EAST, Direction::EAST);
                }
            }
        }
        let ends = drive
            .limits
            .map(|limit| (limit - drive.offset) / drive.multiple);
        let (lo, hi) = (ends[0].min(ends[1]), ends[0].max(ends[1]));
        let _ = packed.variables.push(match kind {
            Kind::Prismatic => Variable {
                arc: Arc::FULL,
                length: length(lo, hi, scale),
                motion: Motion::Slide,
            },
            _ => Variable {
                arc: arc(lo, hi),
                length: Interval::ZERO,
                motion: Motion::Turn,
            },
        });
    }
    Ok(Pack {
        machine: packed,
        scale,
        drives: packed_drives,
    })
}

/// How a joint hangs on its variable: its value is `multiple * variable + rest`, give or take the
/// residual.
struct Hold {
    variable: usize,
    multiple: i8,
    rest: f64,
    residual: f64,
}

fn hold(machine: &model::Machine, joint: usize, drives: &[Drive]) -> Result<Hold, PackError> {
    let (lead, ratio, rest) = leader(machine, joint);
    let variable = drives.iter().position(|d| d.joint == lead).unwrap_or(0);
    let drive = &drives[variable];
    let exact = ratio * drive.multiple;
    let multiple = exact.round().clamp(-MOST_MULTIPLE, MOST_MULTIPLE);
    let residual = if exact == multiple {
        0.0
    } else {
        let most = drive.limits[0].abs().max(drive.limits[1].abs());
        if !most.is_finite() {
            return Err(PackError::Ratio {
                joint: machine.joints[joint].name.clone(),
                ratio,
            });
        }
        // |exact - multiple| * |variable|
        (exact - multiple).abs() * most / drive.multiple
    };
    Ok(Hold {
        variable,
        multiple: multiple as i8,
        rest,
        residual,
    })
}

/// Moves every joint's frame along and about its own axis to where the rules are strongest:
/// origins at the foot of the next origin, first axes along the offsets. Returns for every joint
/// what that adds to its angle.
fn choose_frames(
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

/// The variables of a chain: one for every leader. Ratios become small whole multiples.
fn variables(
    machine: &model::Machine,
    moving: &[usize],
) -> Result<(Vec<Kind>, Vec<Drive>), PackError> {
    let mut kinds = Vec::new();
    let mut drives: Vec<Drive> = Vec::new();
    for &index in moving {
        let joint = &machine.joints[index];
        let (lead, ratio, _) = leader(machine, index);
        let kind = machine.joints[lead].kind;
        if kind != joint.kind {
            return Err(PackError::MixedFollower {
                joint: joint.name.clone(),
                kind: joint.kind,
            });
        }
        let denominator = fraction(ratio).1 as f64;
        if let Some(known) = drives.iter_mut().find(|d| d.joint == lead) {
            let common = known.multiple * denominator / gcd(known.multiple, denominator);
            if common <= MOST_MULTIPLE {
                known.multiple = common;
            }
            continue;
        }
        let limits = range(machine, lead);
        if limits[0] > limits[1] {
            return Err(PackError::NoRange {
                joint: machine.joints[lead].name.clone(),
            });
        }
        kinds.push(kind);
        drives.push(Drive {
            joint: lead,
            multiple: denominator,
            offset: 0.0,
            limits,
        });
    }
    Ok((kinds, drives))
}

fn gcd(a: f64, b: f64) -> f64 {
    if b < 0.5 { a } else { gcd(b, a % b) }
}

/// The fraction with numerator and denominator up to [`MOST_RATIO`] nearest to a ratio.
fn fraction(ratio: f64) -> (i32, i32) {
    (1..=MOST_RATIO)
        .map(|q| ((ratio * q as f64).round() as i32, q))
        .filter(|(p, _)| p.abs() <= MOST_RATIO)
        .min_by(|a, b| {
            let error = |(p, q): &(i32, i32)| (ratio - *p as f64 / *q as f64).abs();
            error(a).total_cmp(&error(b)).then(a.1.cmp(&b.1))
        })
        .unwrap_or((0, 1))
}

/// Integer bounds of a range of lengths.
fn length(lo: f64, hi: f64, scale: f64) -> Interval {
    Interval::clamped(
        (lo / scale * ONE as f64 - 1e-3).floor() as i64,
        (hi / scale * ONE as f64 + 1e-3).ceil() as i64,
    )
}

/// The arc from one angle to another, rounded outward.
fn arc(lo: f64, hi: f64) -> Arc {
    if !(hi - lo).is_finite() || hi - lo >= TAU - 4.0 * ANGLE_MARGIN {
        return Arc::FULL;
    }
    Arc::new(direction(lo - ANGLE_MARGIN), direction(hi + ANGLE_MARGIN))
}

fn direction(angle: f64) -> Direction {
    let (y, x) = angle.sin_cos();
    Direction {
        x: (x * ONE as f64).round() as i32,
        y: (y * ONE as f64).round() as i32,
    }
}

fn placement(stretch: &Stretch, scale: f64) -> Placement {
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
