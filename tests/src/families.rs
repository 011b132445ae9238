//! The three measured arms and random targets for them.

use crate::rotation;
use balk::model::{Cone, Machine, Orientation, Target};
use balk::search::Solver;
use nalgebra::{Unit, Vector3};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::path::Path;

/// Names of the arms, which are also their files in `machines/`.
pub const NAMES: [&str; 3] = ["spherical", "offset", "seven"];

/// One arm ready to be asked.
pub struct Family {
    /// Its name.
    pub name: &'static str,
    /// Its file.
    pub text: String,
    /// As read from it.
    pub machine: Machine,
    /// Answers questions about its tip.
    pub solver: Solver,
    /// Origin of the first joint.
    pub centre: Vector3<f64>,
    /// Sum of the lengths from there to the tip.
    pub reach: f64,
}

/// What is asked of the tip.
#[derive(Clone, Copy, Debug, PartialEq, Eq, clap::ValueEnum)]
pub enum Kind {
    /// A box of 5 cm and 20 degrees about a pose.
    Box,
    /// 1 mm, and the tip's third axis within 10 mrad of a direction; roll free.
    Cone,
    /// 1 mm, orientation free.
    Point,
    /// 1 mm and 10 mrad about a pose.
    Pose,
}

impl Kind {
    /// Every kind, the main one first.
    pub const ALL: [Kind; 4] = [Kind::Pose, Kind::Point, Kind::Cone, Kind::Box];

    /// As tables name it.
    pub fn name(self) -> &'static str {
        match self {
            Kind::Box => "box 5 cm, 20 deg",
            Kind::Cone => "axis cone 10 mrad, 1 mm",
            Kind::Point => "position only, 1 mm",
            Kind::Pose => "pose 1 mm, 10 mrad",
        }
    }
}

/// Reads a file of `machines/`, without its ending.
fn machine(name: &str) -> (String, Machine) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("machines/{name}.toml"));
    let text = std::fs::read_to_string(&path).expect("the machine's file is there");
    let machine = balk::read::machine(text.as_bytes(), name).expect("it is well formed");
    (text, machine)
}

/// Reads an arm of `machines/published/`.
pub fn published(name: &str) -> Machine {
    machine(&format!("published/{name}")).1
}

impl Family {
    /// Reads an arm of `machines/`.
    pub fn read(name: &'static str) -> Family {
        let (text, machine) = machine(name);
        let length = |v: &Vector3<f64>| v.norm();
        let reach = machine
            .joints
            .iter()
            .skip(1)
            .map(|joint| length(&joint.placement.translation.vector))
            .sum::<f64>()
            + length(&machine.tips[0].placement.translation.vector);
        Family {
            name,
            solver: Solver::new(&machine, 0).expect("the arm can be packed"),
            centre: machine.joints[0].placement.translation.vector,
            reach,
            text,
            machine,
        }
    }

    /// All three.
    pub fn all() -> Vec<Family> {
        NAMES.into_iter().map(Family::read).collect()
    }

    /// Targets spread evenly over the reach ball and all orientations, the same for a seed.
    pub fn targets(&self, kind: Kind, count: usize, seed: u64) -> Vec<Target> {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        (0..count)
            .map(|number| self.target(kind, number, &mut rng))
            .collect()
    }

    fn target(&self, kind: Kind, number: usize, rng: &mut impl Rng) -> Target {
        let place = loop {
            let v = Vector3::from_fn(|_, _| rng.random_range(-1.0..1.0));
            if v.norm_squared() < 1.0 {
                break v * self.reach;
            }
        };
        let rotation = rotation::random(rng);
        let (within, orientation) = match kind {
            Kind::Box => (
                0.05,
                Orientation::Near {
                    rotation,
                    within: 20f64.to_radians(),
                },
            ),
            Kind::Cone => (
                0.001,
                Orientation::Axes(vec![Cone {
                    tip: Vector3::z_axis(),
                    base: Unit::new_normalize(rotation * Vector3::z()),
                    within: 0.01,
                }]),
            ),
            Kind::Point => (0.001, Orientation::Free),
            Kind::Pose => (
                0.001,
                Orientation::Near {
                    rotation,
                    within: 0.01,
                },
            ),
        };
        Target {
            id: number.to_string(),
            tip: 0,
            xyz: self.centre + place,
            xyz_within: Vector3::repeat(within),
            orientation,
        }
    }
}
