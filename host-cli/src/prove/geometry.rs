//! The chain as the proof format sees it: frames on the joints' axes, links between them.

use crate::model::{Kind, Machine};
use crate::pack::leader;
use balk_checker::proof::{Frame, PICO};
use nalgebra::{Isometry3, Quaternion, Rotation3, Translation3, UnitQuaternion, Vector3};

/// Added to every bound that the checker derives exactly.
const MARGIN: f64 = 1e-12;

/// One link: `v = t + e + E R w`.
pub(super) struct Link {
    pub rotation: Rotation3<f64>,
    pub origin: Vector3<f64>,
    /// Bound of `2 sin(alpha / 2)`.
    pub turn: f64,
    /// Bound of `|e|`.
    pub shift: f64,
}

/// A moving joint.
pub(super) struct Joint {
    pub revolute: bool,
    /// Variable that drives it, counted from 0.
    pub variable: usize,
    pub ratio: f64,
    pub offset: f64,
}

/// A chain with its frames chosen.
pub(super) struct Chain {
    pub joints: Vec<Joint>,
    pub links: Vec<Link>,
    pub frames: Vec<Frame>,
    /// Leader of every variable.
    pub leaders: Vec<usize>,
    /// Sum of the lengths of the links.
    pub length: f64,
}

/// A quaternion of small integers that turns the third axis onto `axis`, or a large one near it.
fn onto(axis: &Vector3<f64>) -> [i64; 4] {
    let along = |v: Vector3<f64>| (axis - v).norm() < 1e-15;
    let table = [
        (Vector3::z(), [1, 0, 0, 0]),
        (-Vector3::z(), [0, 1, 0, 0]),
        (Vector3::x(), [1, 0, 1, 0]),
        (-Vector3::x(), [1, 0, -1, 0]),
        (Vector3::y(), [1, -1, 0, 0]),
        (-Vector3::y(), [1, 1, 0, 0]),
    ];
    if let Some((_, exact)) = table.iter().find(|(v, _)| along(*v)) {
        return *exact;
    }
    let turn = UnitQuaternion::rotation_between(&Vector3::z(), axis).unwrap_or_else(|| {
        UnitQuaternion::from_axis_angle(&Vector3::x_axis(), std::f64::consts::PI)
    });
    [turn.w, turn.i, turn.j, turn.k].map(|c| (c * (1u64 << 40) as f64).round() as i64)
}

/// Integers whose quaternion turns about the third axis by about `angle`; exact for quarter turns.
fn about_axis(angle: f64) -> [i64; 2] {
    let quarters = angle / std::f64::consts::FRAC_PI_2;
    if (quarters - quarters.round()).abs() < 1e-9 {
        return [[1, 0], [1, 1], [0, 1], [1, -1]][quarters.round().rem_euclid(4.0) as usize];
    }
    let (sine, cosine) = (angle / 2.0).sin_cos();
    [cosine, sine].map(|c| (c * (1 << 20) as f64).round() as i64)
}

/// The product of a quaternion and a turn about the third axis.
fn product(q: [i64; 4], [a, b]: [i64; 2]) -> [i64; 4] {
    let [w, x, y, z] = q;
    [w * a - z * b, x * a + y * b, y * a - x * b, z * a + w * b]
}

fn rotation(turn: [i64; 4]) -> UnitQuaternion<f64> {
    let [w, x, y, z] = turn.map(|c| c as f64);
    UnitQuaternion::from_quaternion(Quaternion::new(w, x, y, z))
}

/// A stretch of the chain between two moving joints' own frames.
struct Stretch {
    placement: Isometry3<f64>,
    /// Tolerances on the way, each with the length that follows it.
    tolerances: Vec<(crate::model::Tolerance, f64)>,
}

impl Stretch {
    fn start() -> Stretch {
        Stretch {
            placement: Isometry3::identity(),
            tolerances: Vec::new(),
        }
    }

    fn then(&mut self, placement: &Isometry3<f64>) {
        self.placement *= placement;
        let length = placement.translation.vector.norm();
        for (_, follows) in &mut self.tolerances {
            *follows += length;
        }
    }
}

impl Chain {
    /// Chooses the frames: origins at the foot of the next one, first axes along the offsets.
    pub fn new(machine: &Machine, tip: usize) -> Chain {
        let mut stretches = Vec::new();
        let mut moving = Vec::new();
        let mut open = Stretch::start();
        for index in machine.chain(tip) {
            let joint = &machine.joints[index];
            open.then(&joint.placement);
            open.tolerances.push((joint.tolerance, 0.0));
            if joint.kind != Kind::Fixed {
                moving.push(index);
                stretches.push(std::mem::replace(&mut open, Stretch::start()));
            }
        }
        open.then(&machine.tips[tip].placement);
        stretches.push(open);

        let mut leaders: Vec<usize> = Vec::new();
        let joints = moving
            .iter()
            .map(|&index| {
                let (lead, ratio, offset) = leader(machine, index);
                let variable = leaders.iter().position(|&l| l == lead).unwrap_or_else(|| {
                    leaders.push(lead);
                    leaders.len() - 1
                });
                Joint {
                    revolute: machine.joints[index].kind == Kind::Revolute,
                    variable,
                    ratio,
                    offset,
                }
            })
            .collect();
        let (frames, placements) = choose(machine, &moving, &stretches);
        let links: Vec<Link> = (0..stretches.len())
            .map(|l| link(&stretches[l], &placements, &frames, l))
            .collect();
        let length = links
            .iter()
            .map(|link| link.origin.norm() + link.shift)
            .sum();
        Chain {
            joints,
            links,
            frames,
            leaders,
            length,
        }
    }
}

/// The frames of the moving joints, and each as a placement in the joint's own frame.
fn choose(
    machine: &Machine,
    moving: &[usize],
    stretches: &[Stretch],
) -> (Vec<Frame>, Vec<Isometry3<f64>>) {
    let mut frames: Vec<Frame> = moving
        .iter()
        .map(|&index| Frame {
            turn: onto(&machine.joints[index].axis),
            shift: 0,
        })
        .collect();
    let placed = |frame: &Frame| {
        let turn = rotation(frame.turn);
        let along = turn * Vector3::new(0.0, 0.0, frame.shift as f64 / PICO as f64);
        Isometry3::from_parts(Translation3::from(along), turn)
    };
    for k in (0..frames.len()).rev() {
        // The next origin, seen from this joint's frame.
        let next = frames.get(k + 1).map_or_else(Isometry3::identity, placed);
        let seen = rotation(frames[k].turn).inverse()
            * (stretches[k + 1].placement * next).translation.vector;
        frames[k].shift = (seen.z * PICO as f64).round() as i64;
        let back = || {
            let own = stretches[k].placement * placed(&frames[k]);
            own.rotation.inverse() * own.translation.vector
        };
        let from = if seen.xy().norm() > 1e-9 {
            seen
        } else {
            back()
        };
        if from.xy().norm() > 1e-9 {
            frames[k].turn = product(frames[k].turn, about_axis(from.y.atan2(from.x)));
        }
    }
    let placements = frames.iter().map(placed).collect();
    (frames, placements)
}

fn link(stretch: &Stretch, placements: &[Isometry3<f64>], frames: &[Frame], l: usize) -> Link {
    // How far a written frame's third axis may be off: nothing where the integers are exact.
    let off = |k: usize| {
        if frames[k].turn.iter().any(|c| c.abs() > 1 << 30) {
            4e-12
        } else {
            0.0
        }
    };
    let before = l.checked_sub(1);
    let after = (l < placements.len()).then_some(l);
    let own = before.map_or_else(Isometry3::identity, |k| placements[k].inverse());
    let next = after.map_or_else(Isometry3::identity, |k| placements[k]);
    let whole = own * stretch.placement * next;
    let origin = whole.translation.vector;
    let tilt = before.map_or(0.0, off);
    let angle: f64 = stretch.tolerances.iter().map(|(t, _)| t.angle).sum::<f64>()
        + tilt
        + after.map_or(0.0, off);
    let last = after.map_or(0.0, |k| frames[k].shift.abs() as f64 / PICO as f64);
    let shift: f64 = stretch
        .tolerances
        .iter()
        .map(|(t, follows)| 3f64.sqrt() * t.xyz + t.angle * (follows + last))
        .sum::<f64>()
        + tilt * origin.norm();
    Link {
        rotation: whole.rotation.to_rotation_matrix(),
        origin,
        turn: 2.0 * (angle.min(std::f64::consts::PI) / 2.0).sin() * (1.0 + 1e-9) + MARGIN,
        shift: shift * (1.0 + 1e-9) + MARGIN,
    }
}

impl Chain {
    /// After how many turns of an unlimited leader the chain repeats itself.
    pub fn turns(&self, lead: usize) -> f64 {
        let denominator = |ratio: f64| {
            (1..=1000u64)
                .find(|d| (ratio * *d as f64 - (ratio * *d as f64).round()).abs() < 1e-12)
                .unwrap_or(1000)
        };
        let gcd = |mut a: u64, mut b: u64| {
            while b > 0 {
                (a, b) = (b, a % b);
            }
            a
        };
        self.joints
            .iter()
            .filter(|joint| self.leaders[joint.variable] == lead)
            .map(|joint| denominator(joint.ratio))
            .fold(1, |all, one| all / gcd(all, one) * one) as f64
    }
}
