//! The record of one refusal, and the fingerprint of a machine.
//!
//! Bytes, little-endian: version, fingerprint (8), splits (2), pivots (2), candidates (1), the
//! target, the number of steps (2), the steps as half bytes, CRC-32C (4). The target is its
//! position box (lower and upper bound of each coordinate) and its orientation: 0 for free, 1 for
//! a quaternion and half sine, 2 with a count for cones.

use crate::fixed::{Arc, Interval};
use crate::machine::{Machine, Motion, Placement};
use crate::screen::{Options, Refusal, Step};
use crate::target::{Orientation, Target};
use crc::{CRC_32_ISCSI, CRC_64_XZ, Crc, Digest, Table};
use heapless::Vec;

/// Version of the record's layout and of the rules that made it.
pub const VERSION: u8 = 1;
/// Longest record.
pub const MOST_BYTES: usize = 256;

static CHECKSUM: Crc<u32, Table<1>> = Crc::<u32, Table<1>>::new(&CRC_32_ISCSI);
static FINGERPRINT: Crc<u64, Table<1>> = Crc::<u64, Table<1>>::new(&CRC_64_XZ);

/// The record does not fit [`MOST_BYTES`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct TooLong;

/// Identifies a packed machine: CRC-64/XZ of every number the proofs depend on.
pub fn fingerprint<const N: usize>(machine: &Machine<N>) -> u64 {
    let mut digest = FINGERPRINT.digest();
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
    finish(digest)
}

fn finish(digest: Digest<'_, u64, Table<1>>) -> u64 {
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

/// Writes the record of a refusal.
///
/// # Errors
/// [`TooLong`] when the target names more cones or the tree has more steps than fit.
pub fn record(
    fingerprint: u64,
    target: &Target,
    options: &Options,
    refusal: &Refusal<'_>,
) -> Result<Vec<u8, MOST_BYTES>, TooLong> {
    let mut bytes = Vec::new();
    let mut put = |part: &[u8]| bytes.extend_from_slice(part).map_err(|_| TooLong);
    put(&[VERSION])?;
    put(&fingerprint.to_le_bytes())?;
    put(&options.splits.to_le_bytes())?;
    put(&options.pivots.to_le_bytes())?;
    put(&[options.candidates])?;
    for bounds in &target.position {
        put(&bounds.lo.to_le_bytes())?;
        put(&bounds.hi.to_le_bytes())?;
    }
    match &target.orientation {
        Orientation::Free => put(&[0])?,
        Orientation::Near {
            quaternion,
            half_sine,
        } => {
            put(&[1])?;
            for value in quaternion.iter().chain([half_sine]) {
                put(&value.to_le_bytes())?;
            }
        }
        Orientation::Axes(cones) => {
            put(&[2, cones.len() as u8])?;
            for cone in cones {
                for value in cone.tip.iter().chain(&cone.base).chain([&cone.half_sine]) {
                    put(&value.to_le_bytes())?;
                }
            }
        }
    }
    let steps = refusal.steps();
    put(&(steps.len() as u16).to_le_bytes())?;
    for pair in steps.chunks(2) {
        let half = |step: Option<&Step>| match step {
            Some(Step::Cut(variable)) => *variable,
            Some(Step::Bounds) => 14,
            Some(Step::Rows) => 15,
            None => 0,
        };
        put(&[half(pair.first()) | (half(pair.get(1)) << 4)])?;
    }
    let checksum = CHECKSUM.checksum(&bytes);
    bytes
        .extend_from_slice(&checksum.to_le_bytes())
        .map_err(|_| TooLong)?;
    Ok(bytes)
}
