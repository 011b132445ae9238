//! What is asked of the tip, as integers.

use crate::fixed::{Interval, ONE};
use heapless::Vec;

/// Most cones one target may name.
pub const MOST_CONES: usize = 3;

/// A set of poses of the tip.
#[derive(Clone, Debug)]
pub struct Target {
    /// Position box in the base frame, scaled like the machine's lengths, as [`Interval::clamped`]
    /// makes it.
    pub position: [Interval; 3],
    /// What is asked of the orientation.
    pub orientation: Orientation,
}

impl Target {
    /// Whether every number lies in its documented range; `screen` passes any other target.
    pub fn is_in_range(&self) -> bool {
        let held =
            |bounds: &Interval| *bounds == Interval::clamped(bounds.lo.into(), bounds.hi.into());
        self.position.iter().all(held)
            && match &self.orientation {
                Orientation::Free => true,
                Orientation::Near { half_sine, .. } => is_half_sine(*half_sine),
                Orientation::Axes(cones) => cones.iter().all(|cone| {
                    is_unit(cone.tip) && is_unit(cone.base) && is_half_sine(cone.half_sine)
                }),
            }
    }
}

/// Whether a number can be the sine of half an angle.
pub fn is_half_sine(value: i32) -> bool {
    (0..=ONE).contains(&value)
}

/// Whether a vector has length one within two units.
pub fn is_unit(axis: [i32; 3]) -> bool {
    // Three squares of at most 2^62 each, as unsigned numbers.
    let square: u64 = axis
        .iter()
        .map(|c| i64::from(*c).unsigned_abs().pow(2))
        .sum();
    let (least, most) = (ONE as u64 - 2, ONE as u64 + 2);
    (least * least..=most * most).contains(&square)
}

/// What is asked of the tip's orientation.
#[derive(Clone, Debug)]
pub enum Orientation {
    /// Every tip axis lies in its cone.
    Axes(Vec<Cone, MOST_CONES>),
    /// Anything.
    Free,
    /// Close to one orientation.
    Near {
        /// Wanted orientation as a quaternion (w, x, y, z) of about unit length; components beyond
        /// one or a length below one half make it unknown, and nothing is refused for it.
        quaternion: [i32; 4],
        /// Sine of half the greatest rotation angle, rounded up, at most one.
        half_sine: i32,
    },
}

/// A tip axis within an angle of a base direction.
#[derive(Clone, Copy, Debug)]
pub struct Cone {
    /// Axis in the tip frame, unit length within two units.
    pub tip: [i32; 3],
    /// Direction in the base frame, unit length within two units.
    pub base: [i32; 3],
    /// Sine of half the greatest angle, rounded up, at most one.
    pub half_sine: i32,
}
