//! What every quantity of a proof truly is at a posture, in double precision: an oracle that shares
//! nothing with the checker but the meaning of the words in `FORMAT.md`, sections 2 and 3.

use balk::kinematics::{joint_frames, joint_values, tip_pose};
use balk::model::{Kind, Machine, Orientation, Target};
use balk::pack::leader;
use balk_checker::Rejection;
use balk_checker::proof::{Claim, Feature, Frame, Item, PICO, Part, Place, Proof, Quantity};
use nalgebra::{Isometry3, Quaternion, Translation3, UnitQuaternion, Vector3};

/// What double precision may be off by, metres and radians.
const ALLOWANCE: f64 = 1e-9;

/// A posture that meets a target, with the frames that a proof chose.
pub struct Truth {
    variables: Vec<f64>,
    values: Vec<f64>,
    revolute: Vec<bool>,
    before: Vec<Isometry3<f64>>,
    after: Vec<Isometry3<f64>>,
    tip: Isometry3<f64>,
    /// Tip axis and base direction.
    cones: Vec<[Vector3<f64>; 2]>,
}

/// A proof's frame in the joint's own: the quaternion, then the smallest turn onto the axis.
fn place(frame: &Frame, axis: &Vector3<f64>) -> Isometry3<f64> {
    let [w, x, y, z] = frame.turn.map(|part| part as f64);
    let turn = UnitQuaternion::from_quaternion(Quaternion::new(w, x, y, z));
    // At most 1e-6, so that the sine is the angle.
    let rest = UnitQuaternion::from_scaled_axis((turn * Vector3::z()).cross(axis));
    let shift = axis * (frame.shift as f64 / PICO as f64);
    Isometry3::from_parts(Translation3::from(shift), rest * turn)
}

impl Truth {
    /// At a value of every joint of the machine, in file order, for tip 0.
    pub fn of(machine: &Machine, values: &[f64], target: &Target, frames: &[Frame]) -> Truth {
        let bodies = joint_frames(machine, values);
        let all = joint_values(machine, values);
        let mut truth = Truth {
            variables: Vec::new(),
            values: Vec::new(),
            revolute: Vec::new(),
            before: Vec::new(),
            after: Vec::new(),
            tip: tip_pose(machine, values, 0),
            cones: match &target.orientation {
                Orientation::Axes(cones) => cones.iter().map(|c| [*c.tip, *c.base]).collect(),
                _ => Vec::new(),
            },
        };
        let mut leaders = Vec::new();
        let moving = machine.chain(0).into_iter();
        let moving = moving.filter(|joint| machine.joints[*joint].kind != Kind::Fixed);
        for (index, frame) in moving.zip(frames) {
            let joint = &machine.joints[index];
            let value = all[index];
            let revolute = joint.kind == Kind::Revolute;
            let after = bodies[index] * place(frame, &joint.axis);
            let back = if revolute {
                let turn = UnitQuaternion::from_axis_angle(&Vector3::z_axis(), -value);
                Isometry3::from_parts(Translation3::identity(), turn)
            } else {
                Isometry3::translation(0.0, 0.0, -value)
            };
            let (lead, _, _) = leader(machine, index);
            if !leaders.contains(&lead) {
                leaders.push(lead);
                truth.variables.push(all[lead]);
            }
            truth.values.push(value);
            truth.revolute.push(revolute);
            truth.before.push(after * back);
            truth.after.push(after);
        }
        truth
    }

    /// A feature in the base frame, and whether it is a point.
    fn feature(&self, feature: Feature) -> Option<(Vector3<f64>, bool)> {
        Some(match feature {
            Feature::Origin(joint) => (nth(&self.after, joint)?.translation.vector, true),
            Feature::Axis(joint) => (nth(&self.after, joint)?.rotation * Vector3::z(), false),
            Feature::Tip => (self.tip.translation.vector, true),
            Feature::TipAxis(axis) => {
                let mut unit = Vector3::zeros();
                *unit.get_mut(usize::from(axis))? = 1.0;
                (self.tip.rotation * unit, false)
            }
            Feature::Cone(cone) => (self.tip.rotation * nth(&self.cones, cone)?[0], false),
        })
    }

    fn seen(&self, feature: Feature, from: &Isometry3<f64>) -> Option<Vector3<f64>> {
        let (vector, point) = self.feature(feature)?;
        let origin = if point {
            from.translation.vector
        } else {
            Vector3::zeros()
        };
        Some(from.rotation.inverse() * (vector - origin))
    }

    fn place(&self, place: Place) -> Option<Isometry3<f64>> {
        Some(match place {
            Place::Base => Isometry3::identity(),
            Place::Before(joint) => *nth(&self.before, joint)?,
            Place::After(joint) => *nth(&self.after, joint)?,
            Place::End => self.tip,
            Place::Difference => {
                Isometry3::from_parts(self.tip.translation, UnitQuaternion::identity())
            }
        })
    }

    /// The quantity, if there is one of that name.
    fn value(&self, quantity: Quantity) -> Option<f64> {
        let turning =
            |joint| nth(&self.values, joint).filter(|_| nth(&self.revolute, joint) == Some(&true));
        Some(match quantity {
            Quantity::Variable(index) => *nth(&self.variables, index)?,
            Quantity::Value(joint) => *nth(&self.values, joint)?,
            Quantity::Cosine(joint) => turning(joint)?.cos(),
            Quantity::Sine(joint) => turning(joint)?.sin(),
            Quantity::View(feature, from, part) => {
                let vector = self.seen(feature, &self.place(from)?)?;
                match part {
                    Part::X => vector.x,
                    Part::Y => vector.y,
                    Part::Z => vector.z,
                    Part::Square => vector.norm_squared(),
                }
            }
            Quantity::Radius(feature, joint) => {
                turning(joint)?;
                let vector = self.seen(feature, nth(&self.after, joint)?)?;
                vector.xy().norm_squared()
            }
            Quantity::Along(feature, cone) => self
                .seen(feature, &self.tip)?
                .dot(&nth(&self.cones, cone)?[0]),
            Quantity::Aim(feature, cone) => {
                let from = self.place(Place::Difference)?;
                self.seen(feature, &from)?.dot(&nth(&self.cones, cone)?[1])
            }
        })
    }

    /// The first of the proof's first `accepted` items that the posture contradicts: a claim that
    /// excludes the true value, or the end of the branch the posture is in.
    pub fn contradicts(&self, proof: &Proof, accepted: usize) -> Option<usize> {
        let unit = |bound: i64| bound as f64 / PICO as f64;
        let mut spans = proof.root.iter().zip(&self.variables);
        // Whether the posture is in this branch, and in the upper parts that wait.
        let mut inside = spans
            .all(|(span, u)| unit(span.lo) <= u + ALLOWANCE && *u <= unit(span.hi) + ALLOWANCE);
        let mut waiting = Vec::new();
        for (index, item) in proof.items.iter().take(accepted).enumerate() {
            match item {
                Item::Split { variable, at } => {
                    let Some(u) = nth(&self.variables, *variable) else {
                        return Some(index);
                    };
                    waiting.push(inside && *u >= unit(*at));
                    inside &= *u <= unit(*at);
                }
                Item::Step(step) if step.claim == Claim::Nothing => {
                    if inside {
                        return Some(index);
                    }
                    inside = waiting.pop().unwrap_or(false);
                }
                Item::Step(step) if inside => {
                    let Some(value) = step.quantity.and_then(|quantity| self.value(quantity))
                    else {
                        return Some(index);
                    };
                    let holds = match step.claim {
                        Claim::AtLeast(lo) => value >= unit(lo) - ALLOWANCE,
                        Claim::AtMost(hi) => value <= unit(hi) + ALLOWANCE,
                        Claim::Within(span) => {
                            unit(span.lo) - ALLOWANCE <= value && value <= unit(span.hi) + ALLOWANCE
                        }
                        Claim::Nothing => false,
                    };
                    if !holds {
                        return Some(index);
                    }
                }
                Item::Step(_) => {}
            }
        }
        None
    }
}

/// The item of a number counted from 1.
fn nth<T>(list: &[T], number: u8) -> Option<&T> {
    list.get(usize::from(number).checked_sub(1)?)
}

/// How many items of a proof the checker accepted before it stopped.
pub fn accepted<T>(proof: &Proof, result: &Result<T, Rejection>) -> usize {
    match result {
        Ok(_) | Err(Rejection::Unclosed(_)) => proof.items.len(),
        Err(Rejection::Item { index, .. }) => *index,
        Err(_) => 0,
    }
}
