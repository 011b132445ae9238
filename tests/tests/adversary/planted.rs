//! Machines made of integers with a posture planted in them, as no file would describe them: joints
//! at multiples up to 16 of a variable, either way or none, angles at variable zero known only
//! roughly, spans from a billionth of a radian to a turn.

use balk_core::fixed::{Arc, Direction, FRACTION_BITS, Interval, Product};
use balk_core::machine::{Joint, Machine, Motion, Placement, Variable};
use balk_core::target::{Cone, Orientation, Target};
use balk_tests::rotation::{random, random_direction};
use nalgebra::{Isometry3, Rotation3, Translation3, Unit, UnitQuaternion, Vector3};
use rand::Rng;
use rand::seq::IndexedRandom;
use rand_chacha::ChaCha8Rng;
use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, PI, TAU};

pub(super) const UNITS: f64 = (1u64 << FRACTION_BITS) as f64;
/// Outward rounding of an angle, radians, as packing does it.
const MARGIN: f64 = 4.0 / UNITS;

type Packed = Machine<8>;

pub(super) fn pick<T: Copy>(random: &mut impl Rng, from: &[T]) -> T {
    *from.choose(random).expect("not empty")
}

fn units(x: f64) -> i32 {
    (x * UNITS).round() as i32
}

fn direction(angle: f64) -> Direction {
    Direction {
        x: units(angle.cos()),
        y: units(angle.sin()),
    }
}

fn arc(lo: f64, hi: f64) -> Arc {
    if hi - lo >= TAU - 4.0 * MARGIN {
        Arc::FULL
    } else {
        Arc::new(direction(lo - MARGIN), direction(hi + MARGIN))
    }
}

fn length(lo: f64, hi: f64) -> Interval {
    Interval::clamped(
        (lo * UNITS - 1e-3).floor() as i64,
        (hi * UNITS + 1e-3).ceil() as i64,
    )
}

fn placement(pose: &Isometry3<f64>) -> Placement {
    let rotation = pose.rotation.to_rotation_matrix();
    let origin = pose.translation.vector;
    let back = rotation.inverse() * origin;
    let square = (origin.norm_squared() * UNITS * UNITS) as i64;
    Placement {
        rotation: [0, 1, 2].map(|i| [0, 1, 2].map(|j| units(rotation[(i, j)]))),
        turn_slack: 1,
        origin: [0, 1, 2].map(|k| length(origin[k], origin[k])),
        back: [0, 1, 2].map(|k| length(back[k], back[k])),
        square: Product {
            lo: square - (1 << 12),
            hi: square + (1 << 12),
        },
    }
}

/// A machine, the true values of its variables, and its frames in the posture they make.
pub(super) struct Planted {
    pub(super) machine: Packed,
    pub(super) variables: Vec<f64>,
    /// Base, then every joint before motion, then the tip.
    pub(super) before: Vec<Isometry3<f64>>,
    /// Base, then every joint after motion, then the tip.
    pub(super) after: Vec<Isometry3<f64>>,
}

impl Planted {
    pub(super) fn draw(random: &mut ChaCha8Rng) -> Planted {
        let count = random.random_range(1..=8);
        // No chain is longer than one, slides included.
        let scale = 0.3 / (f64::from(count) + 1.0);
        let wide = pick(
            random,
            &[1e-9, 1e-6, 1e-3, 0.05, 0.3, 1.0, 2.0, FRAC_PI_2 * 2.0, 6.0],
        );
        let mut planted = Planted {
            machine: Machine {
                joints: Default::default(),
                variables: Default::default(),
                tip: placement(&Isometry3::identity()),
                exponent: 0,
            },
            variables: Vec::new(),
            before: vec![Isometry3::identity()],
            after: vec![Isometry3::identity()],
        };
        for _ in 0..count {
            planted.add_joint(random, scale, wide);
        }
        let tip = pose(random, scale);
        planted.machine.tip = placement(&tip);
        let tip = planted.after.last().expect("the base") * tip;
        planted.before.push(tip);
        planted.after.push(tip);
        planted
    }

    fn add_joint(&mut self, random: &mut ChaCha8Rng, scale: f64, wide: f64) {
        let stroke = scale * 0.05;
        let motion = pick(
            random,
            &[Motion::Slide, Motion::Turn, Motion::Turn, Motion::Turn],
        );
        let mates: Vec<usize> = (0..self.variables.len())
            .filter(|&v| self.machine.variables[v].motion == motion)
            .collect();
        let variable = if random.random() && !mates.is_empty() {
            pick(random, &mates)
        } else {
            self.add_variable(random, motion, stroke, wide)
        };
        let multiple: i8 = pick(random, &[1, 1, 1, -1, 2, -2, 3, 5, -7, 12, 16, -16, 0]);
        let plain: bool = random.random();
        let rest = if plain {
            0.0
        } else {
            random.random_range(-PI..PI)
        };
        let loose = if plain {
            0.0
        } else {
            wide * pick(random, &[0.0, 0.1, 1.0])
        };
        let [below, above] = [(); 2].map(|()| loose * random.random::<f64>());
        let east = Arc::new(Direction::EAST, Direction::EAST);
        let (turn, shift, rest) = match motion {
            Motion::Slide => {
                let rest = rest * stroke;
                let bounds = length(rest - below.min(stroke), rest + above.min(stroke));
                (Arc::FULL, bounds, rest)
            }
            Motion::Turn if plain => (east, Interval::ZERO, rest),
            Motion::Turn => (arc(rest - below, rest + above), Interval::ZERO, rest),
        };
        let link = pose(random, scale);
        let _ = self.machine.joints.push(Joint {
            motion,
            placement: placement(&link),
            variable: variable as u8,
            multiple,
            turn,
            shift,
        });
        let value = f64::from(multiple) * self.variables[variable] + rest;
        let moved = match motion {
            Motion::Slide => Isometry3::translation(0.0, 0.0, value),
            Motion::Turn => Isometry3::rotation(Vector3::z() * value),
        };
        let before = self.after.last().expect("the base") * link;
        self.before.push(before);
        self.after.push(before * moved);
    }

    fn add_variable(
        &mut self,
        random: &mut ChaCha8Rng,
        motion: Motion,
        stroke: f64,
        wide: f64,
    ) -> usize {
        let [below, above] =
            [(); 2].map(|()| wide * random.random::<f64>() * pick(random, &[0.0, 1.0]));
        let (value, arc, length) = match motion {
            Motion::Slide => {
                let value = random.random_range(-stroke..stroke);
                let bounds = length((value - below).max(-stroke), (value + above).min(stroke));
                (value, Arc::FULL, bounds)
            }
            Motion::Turn => {
                let eighths = f64::from(random.random_range(-4..4)) * FRAC_PI_4;
                let any = random.random_range(-PI..PI);
                let value = pick(random, &[eighths, any]);
                (value, arc(value - below, value + above), Interval::ZERO)
            }
        };
        let _ = self.machine.variables.push(Variable {
            arc,
            length,
            motion,
        });
        self.variables.push(value);
        self.variables.len() - 1
    }

    /// A target that the tip just meets, and the true tip axes it speaks of.
    pub(super) fn target(&self, random: &mut ChaCha8Rng) -> (Target, Vec<Vector3<f64>>) {
        let tip = self.after[self.after.len() - 1];
        let position = [0, 1, 2].map(|k| {
            let spare = pick(random, &[0.0, 0.0, 1e-6, 1e-3, 0.05]);
            let at = tip.translation.vector[k];
            length(at - spare * random.random::<f64>(), at + spare)
        });
        let within = pick(random, &[0.0, 1e-7, 1e-3, 0.05, 0.5, FRAC_PI_2, 2.0, PI]);
        let half_sine = ((within + MARGIN) / 2.0).min(FRAC_PI_2).sin();
        let half_sine = (half_sine * UNITS).ceil() as i32;
        let turned = within * pick(random, &[0.0, 0.7, 1.0]);
        let unit = |v: &Vector3<f64>| [v.x, v.y, v.z].map(units);
        let (orientation, axes) = match random.random_range(0..5) {
            0 => (Orientation::Free, Vec::new()),
            1..=3 => {
                let about = random_direction(random);
                let q = UnitQuaternion::from_axis_angle(&about, turned) * tip.rotation;
                let sign = pick(random, &[1.0, -1.0]);
                let quaternion = [q.w, q.i, q.j, q.k].map(|c| units(sign * c));
                let axes = [Vector3::x(), Vector3::y(), Vector3::z()];
                (
                    Orientation::Near {
                        quaternion,
                        half_sine,
                    },
                    axes.map(|a| tip.rotation * a).to_vec(),
                )
            }
            count => {
                let cones: Vec<(Vector3<f64>, Cone)> = (2..=count)
                    .map(|_| {
                        let axis = random_direction(random);
                        let at = tip.rotation * axis.into_inner();
                        let about = at.cross(&random_direction(random));
                        let base =
                            Rotation3::from_axis_angle(&Unit::new_normalize(about), turned) * at;
                        let (tip, base) = (unit(&axis), unit(&base));
                        (
                            at,
                            Cone {
                                tip,
                                base,
                                half_sine,
                            },
                        )
                    })
                    .collect();
                (
                    Orientation::Axes(cones.iter().map(|(_, cone)| *cone).collect()),
                    cones.iter().map(|(at, _)| *at).collect(),
                )
            }
        };
        (
            Target {
                position,
                orientation,
            },
            axes,
        )
    }
}

/// A pose with lengths up to the scale; rotations and offsets are often none.
fn pose(random: &mut ChaCha8Rng, scale: f64) -> Isometry3<f64> {
    let rotation = match random.random_range(0..3) {
        0 => UnitQuaternion::identity(),
        1 => UnitQuaternion::from_euler_angles(FRAC_PI_2, 0.0, 0.0),
        _ => self::random(random).into(),
    };
    let [x, y, z] =
        [(); 3].map(|()| random.random_range(-scale..scale) * pick(random, &[0.0, 1e-4, 1.0]));
    Isometry3::from_parts(Translation3::new(x, y, z), rotation)
}
