//! Proofs that have been checked before anyone sees them.

use crate::model::{Cone, Machine, Orientation, Target};
use crate::prove::{Prover, Subject, Unproved};
use crate::write::target_line;
use balk_checker::proof::Proof;
use balk_checker::{Checker, ReadError, Rejection};
use balk_core::target as packed;
use nalgebra::{Quaternion, Rotation3, Unit, UnitQuaternion, Vector3};

/// Parts of the joint space a proof may look at.
pub const PARTS: u64 = 2000;

/// Why there is no proof to show.
#[derive(Debug, thiserror::Error)]
pub enum NoProof {
    /// The prover found none. It says nothing about the target.
    #[error("{0}")]
    Unproved(#[from] Unproved),
    /// The checker does not accept what the prover wrote: a fault of the program.
    #[error("the checker rejects the proof: {0}")]
    Rejected(Box<Rejection>),
}

/// Writes and checks proofs for one tip of one machine.
pub struct Evidence {
    prover: Prover,
    checker: Checker,
    tip: String,
}

impl Evidence {
    /// For a tip of the machine that the file `text` describes.
    ///
    /// # Errors
    /// The checker cannot read the file.
    pub fn new(machine: &Machine, tip: usize, text: &str) -> Result<Evidence, ReadError> {
        let name = machine.tips[tip].name.clone();
        let checker = Checker::new(text, &name)?;
        Ok(Evidence {
            prover: Prover::new(machine, tip, checker.digest()),
            checker,
            tip: name,
        })
    }

    /// Proves a target unreachable and has the proof checked.
    ///
    /// # Errors
    /// [`NoProof`].
    pub fn prove(&self, subject: &Subject) -> Result<Proof, NoProof> {
        let proof = self.prover.prove(subject, PARTS)?;
        match self.checker.check(&proof, subject.line) {
            Ok(_) => Ok(proof),
            Err(rejection) => Err(NoProof::Rejected(Box::new(rejection))),
        }
    }

    /// Proves that nothing meets a packed target: the one of a refusal record.
    ///
    /// # Errors
    /// [`NoProof`].
    pub fn prove_packed(
        &self,
        id: String,
        target: &packed::Target,
        scale: f64,
    ) -> Result<Proof, NoProof> {
        let target = unpacked(id, target, scale);
        self.prove(&Subject {
            target: &target,
            line: &target_line(&target, &self.tip),
            search: [0; 32],
        })
    }
}

/// A target that holds every pose of a packed one: each number moved outward by more than the
/// conversion rounds.
fn unpacked(id: String, target: &packed::Target, scale: f64) -> Target {
    let unit = |value: i32| f64::from(value) / f64::from(1u32 << 30);
    let angle = |half_sine: i32| 2.0 * unit(half_sine).clamp(0.0, 1.0).asin() + 1e-15;
    let middle = |k: usize| (unit(target.position[k].lo) + unit(target.position[k].hi)) / 2.0;
    let half = |k: usize| (unit(target.position[k].hi) - unit(target.position[k].lo)) / 2.0;
    Target {
        id,
        tip: 0,
        xyz: Vector3::from_fn(|k, _| middle(k) * scale),
        xyz_within: Vector3::from_fn(|k, _| half(k) * scale * (1.0 + 1e-15) + 1e-15),
        orientation: match &target.orientation {
            packed::Orientation::Free => Orientation::Free,
            packed::Orientation::Near {
                quaternion,
                half_sine,
            } => {
                let [w, x, y, z] = quaternion.map(unit);
                let written = Quaternion::new(w, x, y, z);
                Orientation::Near {
                    rotation: Rotation3::from(UnitQuaternion::from_quaternion(written)),
                    within: angle(*half_sine),
                }
            }
            packed::Orientation::Axes(cones) => Orientation::Axes(
                cones
                    .iter()
                    .map(|cone| {
                        let direction =
                            |v: [i32; 3]| Unit::new_normalize(Vector3::from_fn(|k, _| unit(v[k])));
                        Cone {
                            tip: direction(cone.tip),
                            base: direction(cone.base),
                            // A packed direction is known to within two units of 2^-30.
                            within: angle(cone.half_sine) + 1e-8,
                        }
                    })
                    .collect(),
            ),
        },
    }
}
