//! The fingerprint of a packed machine.

use super::DIGEST;
use crate::fixed::{Arc, Interval};
use crate::machine::{Machine, Motion, Placement};

/// Identifies a packed machine: CRC-64/XZ of every number the proofs depend on.
///
/// Each number counts as eight bytes, little-endian: the exponent; of each joint its motion (slide
/// 0, turn 1), variable, multiple, turn, shift and placement; of each variable its motion, arc and
/// length; the tip's placement. An arc is whether it is full (0 or 1) and its two directions, a
/// placement its rotation row by row, turn slack, origin, back and square. Not a hash against
/// attacks: machines that differ by mishap have different fingerprints but for one case in 2^64.
pub fn fingerprint<const N: usize>(machine: &Machine<N>) -> u64 {
    let mut digest = DIGEST.digest();
    let mut sum = |value: i64| digest.update(&value.to_le_bytes());
    sum(machine.exponent.into());
    for joint in &machine.joints {
        sum(motion(joint.motion));
        sum(joint.variable.into());
        sum(joint.multiple.into());
        arc(&mut sum, joint.turn);
        interval(&mut sum, joint.shift);
        placement(&mut sum, &joint.placement);
    }
    for variable in &machine.variables {
        sum(motion(variable.motion));
        arc(&mut sum, variable.arc);
        interval(&mut sum, variable.length);
    }
    placement(&mut sum, &machine.tip);
    digest.finalize()
}

fn motion(motion: Motion) -> i64 {
    match motion {
        Motion::Slide => 0,
        Motion::Turn => 1,
    }
}

fn interval(sum: &mut impl FnMut(i64), interval: Interval) {
    sum(interval.lo.into());
    sum(interval.hi.into());
}

fn arc(sum: &mut impl FnMut(i64), arc: Arc) {
    sum(arc.full.into());
    for direction in [arc.lo, arc.hi] {
        sum(direction.x.into());
        sum(direction.y.into());
    }
}

fn placement(sum: &mut impl FnMut(i64), placement: &Placement) {
    for entry in placement.rotation.iter().flatten() {
        sum((*entry).into());
    }
    sum(placement.turn_slack.into());
    for bounds in placement.origin.iter().chain(&placement.back) {
        interval(sum, *bounds);
    }
    sum(placement.square.lo);
    sum(placement.square.hi);
}
