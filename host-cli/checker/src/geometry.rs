//! Links between the places that a proof's frames choose: `FORMAT.md`, section 2.

use core::array::from_fn;

use dashu_int::IBig;
use dashu_ratio::RBig;

use crate::exact::function;
use crate::exact::interval::{Interval, ONE, ceil, grains};
use crate::machine::{Chain, Link as Stages, Moving};
use crate::proof::Frame;
use crate::space::{self, Matrix, Vector};

/// How a frame is not accepted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FrameError {
    /// Not one frame for every moving joint.
    Count,
    /// The third axis is not the joint's axis to 10^-6 radians, or the quaternion is zero. Counted
    /// from 1.
    OffAxis(usize),
}

/// A constant: every number within `error` of `middle`, in grains.
#[derive(Clone, Debug)]
pub struct Constant {
    /// What stands for it.
    pub middle: IBig,
    /// How far it may be.
    pub error: IBig,
}

impl Constant {
    /// Any number of `range`.
    pub fn new(range: &Interval) -> Self {
        let middle = (&range.lo + &range.hi) >> 1;
        let error = (&middle - &range.lo).max(&range.hi - &middle);
        Self { middle, error }
    }
}

/// From one place to the next. Lengths and angles in grains.
#[derive(Clone, Debug)]
pub struct Link {
    /// R.
    pub rotation: [[Constant; 3]; 3],
    /// t.
    pub origin: Vector,
    /// R' t.
    pub back: Vector,
    /// t . t
    pub square: Interval,
    /// Upper bound of |t|.
    pub length: IBig,
    /// Upper bound of 2 sin(alpha / 2), how far E moves a unit vector.
    pub chord: IBig,
    /// Upper bound of |e|.
    pub lambda: IBig,
}

/// All links of a chain with chosen frames.
#[derive(Clone, Debug)]
pub struct Geometry {
    /// From link 0 to the one with the tip.
    pub links: Vec<Link>,
    /// Upper bound of the sum of |t| + |e|.
    pub reach: IBig,
}

/// Where a joint's place sits in its joint's frame.
struct Seat {
    /// W's orientation before the small rotation.
    turn: Matrix,
    /// W's origin.
    origin: Vector,
    /// Upper bound of the small rotation's angle.
    delta: IBig,
}

impl Seat {
    fn base() -> Self {
        Self {
            turn: space::identity(),
            origin: space::zero(),
            delta: IBig::ZERO,
        }
    }

    /// `None` if the third axis is off the joint's.
    fn new(joint: &Moving, frame: &Frame) -> Option<Self> {
        if frame.turn == [0; 4] {
            return None;
        }
        let turn = space::of_quaternion(&frame.turn.map(RBig::from));
        let third: [RBig; 3] = from_fn(|i| turn[i][2].clone());
        let axis = &joint.axis;
        let cross: [RBig; 3] = from_fn(|i| {
            let (j, k) = ((i + 1) % 3, (i + 2) % 3);
            &third[j] * &axis[k] - &third[k] * &axis[j]
        });
        if space::inner(&third, axis) <= RBig::ZERO {
            return None;
        }
        // asin(s) <= s + s^3 for 0 <= s <= 1/2, and s is far smaller.
        let sine = Interval::root_of_fraction(&(space::square(&cross) / space::square(axis))).hi;
        let delta = if sine.is_zero() {
            IBig::ZERO
        } else {
            &sine + ceil(&(&sine * &sine * &sine), &(&ONE * &ONE))
        };
        if delta > grains(1_000_000) {
            return None;
        }
        let unit = if delta.is_zero() {
            third.each_ref().map(Interval::of_fraction)
        } else {
            space::unit(axis)
        };
        let shift = Interval::point(grains(frame.shift));
        Some(Self {
            turn: turn
                .each_ref()
                .map(|row| row.each_ref().map(Interval::of_fraction)),
            origin: unit.each_ref().map(|part| part.times(&shift)),
            delta,
        })
    }
}

impl Geometry {
    /// Links of `chain` between the places that `frames` choose. Cost: linear.
    ///
    /// # Errors
    ///
    /// A frame that does not fit its joint.
    pub fn new(chain: &Chain, frames: &[Frame]) -> Result<Self, FrameError> {
        if frames.len() != chain.moving.len() {
            return Err(FrameError::Count);
        }
        let mut seats = vec![Seat::base()];
        for (place, (joint, frame)) in chain.moving.iter().zip(frames).enumerate() {
            seats.push(Seat::new(joint, frame).ok_or(FrameError::OffAxis(place + 1))?);
        }
        seats.push(Seat::base());
        let links: Vec<Link> = chain
            .links
            .iter()
            .zip(seats.windows(2))
            .map(|(stages, ends)| link(stages, &ends[0], &ends[1]))
            .collect();
        let reach = links.iter().map(|link| &link.length + &link.lambda).sum();
        Ok(Self { links, reach })
    }
}

/// The link from the place `from` to `to`, whose joints' frames `stages` join.
fn link(stages: &Stages, from: &Seat, to: &Seat) -> Link {
    let mut turn = space::identity();
    let mut origin = space::zero();
    let mut alpha = &from.delta + &to.delta;
    let mut lambda = IBig::ZERO;
    // Of angular tolerances so far: what follows is moved by that angle times its length.
    let mut loose = IBig::ZERO;
    let mut follow = |matrix: &Matrix, by: &Vector, lambda: &mut IBig, loose: &IBig| {
        *lambda += ceil(&(loose * space::length(by)), &ONE);
        origin = space::add(&origin, &space::apply(&turn, by));
        turn = space::multiply(&turn, matrix);
    };
    for stage in stages {
        for pose in &stage.poses {
            let (matrix, by) = space::frame(pose);
            follow(&matrix, &by, &mut lambda, &loose);
        }
        let angle = stage
            .tolerance_angle
            .enclosure()
            .hi
            .min(function::pi().hi.clone());
        alpha += &angle;
        loose += &angle;
        let half_width = &stage.tolerance_xyz;
        let diagonal = half_width * half_width * RBig::from(3);
        lambda += Interval::root_of_fraction(&diagonal).hi;
    }
    follow(&to.turn, &to.origin, &mut lambda, &loose);
    let back = space::transpose(&from.turn);
    let origin = space::apply(&back, &space::subtract(&origin, &from.origin));
    let turn = space::multiply(&back, &turn);
    let length = space::length(&origin);
    lambda += ceil(&(&from.delta * &length), &ONE);
    Link {
        back: space::apply(&space::transpose(&turn), &origin),
        square: space::dot(&origin, &origin),
        rotation: turn.each_ref().map(|row| row.each_ref().map(Constant::new)),
        chord: chord(&alpha),
        origin,
        length,
        lambda,
    }
}

/// Upper bound of how far a rotation by at most `alpha` moves a unit vector: `2 sin(alpha / 2)`, 2
/// from half a turn on.
fn chord(alpha: &IBig) -> IBig {
    let two = IBig::from(2);
    if *alpha >= function::pi().lo {
        return two * &ONE;
    }
    let half = ceil(alpha, &two);
    function::sine(&Interval::point(half)).hi * two
}
