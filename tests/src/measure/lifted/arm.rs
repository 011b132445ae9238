//! The three arms and random targets for them.

use balk::model::{Cone, Machine, Orientation, Target};
use balk::pack::{Pack, pack};
use balk::posture::Linkage;
use balk_core::propagate::{Chain, Spans};
use nalgebra::{Quaternion, Rotation3, Unit, UnitQuaternion, Vector3};
use rand::Rng;
use rand_chacha::ChaCha8Rng;
use std::f64::consts::TAU;

/// A machine with its chain packed.
pub struct Arm {
    /// As read.
    pub machine: Machine,
    /// For the core.
    pub pack: Pack,
    /// For seeking postures.
    pub linkage: Linkage,
    reach: f64,
}

impl Arm {
    /// Reads one of the arms in tests/machines.
    pub fn read(name: &str) -> Arm {
        let file = format!("{}/machines/{name}.toml", env!("CARGO_MANIFEST_DIR"));
        let text = std::fs::read(&file).expect("machine file");
        let machine = balk::read::machine(&text, &file).expect("machine");
        let pack = pack(&machine, 0).expect("chain");
        let offsets = machine.joints.iter().skip(1).map(|j| j.placement);
        let reach = offsets
            .chain([machine.tips[0].placement])
            .map(|p| p.translation.vector.norm())
            .sum();
        let linkage = Linkage::new(&machine, 0, &pack.drives);
        Arm {
            machine,
            pack,
            linkage,
            reach,
        }
    }

    /// Leading joint values in the middle of the spans (all three arms turn only).
    pub fn middle(&self, spans: &Spans) -> Vec<f64> {
        spans
            .iter()
            .zip(&self.pack.drives)
            .map(|(span, drive)| {
                let middle = span.arc.middle();
                let angle = f64::from(middle.y).atan2(f64::from(middle.x));
                let value = drive.multiple * angle + drive.offset;
                let [lo, hi] = drive.limits;
                let turns = ((lo - value) / TAU).ceil();
                (value + turns * TAU).clamp(lo, hi)
            })
            .collect()
    }

    /// Whether a posture is found at once, so that no search needs to run empty.
    pub fn easily_reached(&self, target: &Target, rng: &mut ChaCha8Rng) -> bool {
        (0..20).any(|_| {
            let mut values: Vec<f64> = self
                .linkage
                .limits
                .iter()
                .map(|&[lo, hi]| rng.random_range(lo..hi))
                .collect();
            self.linkage.seek(target, &mut values) < 1e-18
        })
    }

    /// The packed chain.
    pub fn chain(&self) -> Chain<'_> {
        Chain {
            joints: &self.pack.machine.joints,
            variables: &self.pack.machine.variables,
            tip: &self.pack.machine.tip,
        }
    }

    /// A random target in the reach ball about the first joint.
    pub fn target(&self, kind: &str, rng: &mut ChaCha8Rng) -> Target {
        let place = loop {
            let p = Vector3::from_fn(|_, _| rng.random_range(-1.0..1.0f64));
            if p.norm() < 1.0 {
                break p;
            }
        };
        let rotation = random_rotation(rng);
        let (within, orientation) = match kind {
            "pose" => (
                0.001,
                Orientation::Near {
                    rotation,
                    within: 0.01,
                },
            ),
            "box" => (
                0.05,
                Orientation::Near {
                    rotation,
                    within: 20f64.to_radians(),
                },
            ),
            "point" => (0.001, Orientation::Free),
            _ => {
                let cone = Cone {
                    tip: Vector3::z_axis(),
                    base: Unit::new_normalize(rotation * Vector3::z()),
                    within: 0.01,
                };
                (0.001, Orientation::Axes(vec![cone]))
            }
        };
        Target {
            id: String::new(),
            tip: 0,
            xyz: self.machine.joints[0].placement.translation.vector + place * self.reach,
            xyz_within: Vector3::repeat(within),
            orientation,
        }
    }
}

/// Uniform over all rotations (Shoemake, *Uniform random rotations*, Graphics Gems III, 1992).
fn random_rotation(rng: &mut ChaCha8Rng) -> Rotation3<f64> {
    let [u, v, w]: [f64; 3] = rng.random();
    let (a, b) = ((1.0 - u).sqrt(), u.sqrt());
    let (sv, cv) = (v * TAU).sin_cos();
    let (sw, cw) = (w * TAU).sin_cos();
    let q = Quaternion::new(b * cw, a * sv, a * cv, b * sw);
    UnitQuaternion::from_quaternion(q).to_rotation_matrix()
}
