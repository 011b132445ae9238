//! What is asked of the tip, as integers.

use crate::fixed::Interval;
use heapless::Vec;

/// Most cones one target may name.
pub const MOST_CONES: usize = 3;

/// A set of poses of the tip.
#[derive(Clone, Debug)]
pub struct Target {
    /// Position box in the base frame, scaled like the machine's lengths.
    pub position: [Interval; 3],
    /// What is asked of the orientation.
    pub orientation: Orientation,
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
