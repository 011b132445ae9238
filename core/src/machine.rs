//! The geometry of one chain of joints from the base to a tip, as integers.
//!
//! Lengths are scaled so that no distance between two points of the chain exceeds one; the
//! workstation chooses the scale and rounds outward when it packs a machine. Frames are chosen so
//! that every joint turns about, or slides along, its third axis, and so that the offset between
//! two neighbours has no second component in either joint's frame.

use crate::fixed::{Arc, Direction, Interval, Product};
use heapless::Vec;

/// A rigid placement with tolerance: a frame in its parent's frame.
///
/// For every built machine the true vector `v = t + R w` of a point satisfies
/// `|v - (origin + rotation w)| <= slack` in each component when `|w| <= 1`.
#[derive(Clone, Copy, Debug)]
pub struct Placement {
    /// Rotation, rounded to nearest.
    pub rotation: [[i32; 3]; 3],
    /// How far `rotation w` may lie from the true value in any component, units.
    pub turn_slack: i32,
    /// Origin in the parent's frame.
    pub origin: [Interval; 3],
    /// The origin's vector expressed in this frame: transposed rotation times origin.
    pub back: [Interval; 3],
    /// Squared length of the origin's vector, at most 2^60 - 2^40.
    pub square: Product,
}

/// Kind of motion of a joint. Fixed joints are folded into the placements when packing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Motion {
    /// Translation along the third axis.
    Slide,
    /// Rotation about the third axis.
    Turn,
}

/// One joint.
#[derive(Clone, Copy, Debug)]
pub struct Joint {
    /// How it moves.
    pub motion: Motion,
    /// The joint's frame before motion, in the frame after the previous joint's motion.
    pub placement: Placement,
    /// Index of the variable that drives it.
    pub variable: u8,
    /// The joint's value is this multiple of the variable, plus `turn` or `shift`.
    pub multiple: i8,
    /// Angle at variable zero.
    pub turn: Arc,
    /// Length at variable zero.
    pub shift: Interval,
}

/// What drives one or more joints, with its limits.
#[derive(Clone, Copy, Debug)]
pub struct Variable {
    /// Allowed angles, when it drives turning joints.
    pub arc: Arc,
    /// Allowed lengths, when it drives sliding joints.
    pub length: Interval,
    /// Which of the two it is.
    pub motion: Motion,
}

/// A chain of at most `N` joints from the base to a tip.
#[derive(Clone, Debug)]
pub struct Machine<const N: usize> {
    /// Joints from base to tip.
    pub joints: Vec<Joint, N>,
    /// Variables that drive the joints.
    pub variables: Vec<Variable, N>,
    /// The tip in the frame after the last joint's motion.
    pub tip: Placement,
    /// Metres are `value * 2^(exponent - 30)`.
    pub exponent: i8,
}

impl<const N: usize> Machine<N> {
    /// The chain without its capacity.
    pub fn chain(&self) -> Chain<'_> {
        Chain {
            joints: &self.joints,
            variables: &self.variables,
            tip: &self.tip,
        }
    }
}

/// The chain of a machine, whatever its capacity.
#[derive(Clone, Copy)]
pub struct Chain<'a> {
    /// Joints from base to tip.
    pub joints: &'a [Joint],
    /// Variables that drive them.
    pub variables: &'a [Variable],
    /// The tip in the frame after the last joint.
    pub tip: &'a Placement,
}

impl Joint {
    /// Whether the joint's value is the variable itself.
    pub fn is_plain(&self) -> bool {
        self.multiple == 1
            && !self.turn.full
            && self.turn.lo == Direction::EAST
            && self.turn.hi == Direction::EAST
            && self.shift == Interval::ZERO
    }
}
