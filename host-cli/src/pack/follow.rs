//! Joints that follow another: variables and whole multiples of them.

use super::{Drive, PackError};
use crate::model::{self, Kind};

/// Largest numerator and denominator of a ratio between a joint and the one it follows.
pub(super) const MOST_RATIO: i32 = 16;

/// Largest multiple of a variable that the core takes.
pub(super) const MOST_MULTIPLE: f64 = i8::MAX as f64;

/// The joint a joint follows in the end: (leader, ratio, offset). Itself if it follows none.
pub fn leader(machine: &model::Machine, joint: usize) -> (usize, f64, f64) {
    let (mut at, mut ratio, mut offset) = (joint, 1.0, 0.0);
    while let Some(follows) = machine.joints[at].follows {
        offset += ratio * follows.offset;
        ratio *= follows.ratio;
        at = follows.joint;
    }
    (at, ratio, offset)
}

/// Least and greatest value a leading joint may take so that it and all that follow it stay
/// within their limits.
pub fn range(machine: &model::Machine, lead: usize) -> [f64; 2] {
    let mut range = [f64::NEG_INFINITY, f64::INFINITY];
    for (i, joint) in machine.joints.iter().enumerate() {
        let (leads, ratio, offset) = leader(machine, i);
        let Some([lo, hi]) = joint.limits else {
            continue;
        };
        if leads != lead || joint.kind == Kind::Fixed || ratio == 0.0 {
            continue;
        }
        let (a, b) = ((lo - offset) / ratio, (hi - offset) / ratio);
        range[0] = range[0].max(a.min(b));
        range[1] = range[1].min(a.max(b));
    }
    range
}

/// How a joint hangs on its variable: its value is `multiple * variable + rest`, give or take the
/// residual.
pub(super) struct Hold {
    pub variable: usize,
    pub multiple: i8,
    pub rest: f64,
    pub residual: f64,
}

pub(super) fn hold(
    machine: &model::Machine,
    joint: usize,
    drives: &[Drive],
) -> Result<Hold, PackError> {
    let (lead, ratio, rest) = leader(machine, joint);
    let variable = drives.iter().position(|d| d.joint == lead).unwrap_or(0);
    let drive = &drives[variable];
    let exact = ratio * drive.multiple;
    let multiple = exact.round().clamp(-MOST_MULTIPLE, MOST_MULTIPLE);
    let residual = if exact == multiple {
        0.0
    } else {
        let most = drive.limits[0].abs().max(drive.limits[1].abs());
        if !most.is_finite() {
            return Err(PackError::Ratio {
                joint: machine.joints[joint].name.clone(),
                ratio,
            });
        }
        // |exact - multiple| * |variable|
        (exact - multiple).abs() * most / drive.multiple
    };
    Ok(Hold {
        variable,
        multiple: multiple as i8,
        rest,
        residual,
    })
}

/// The variables of a chain: one for every leader. Ratios become small whole multiples.
pub(super) fn variables(
    machine: &model::Machine,
    moving: &[usize],
) -> Result<(Vec<Kind>, Vec<Drive>), PackError> {
    let mut kinds = Vec::new();
    let mut drives: Vec<Drive> = Vec::new();
    for &index in moving {
        let joint = &machine.joints[index];
        let (lead, ratio, _) = leader(machine, index);
        let kind = machine.joints[lead].kind;
        if kind != joint.kind {
            return Err(PackError::MixedFollower {
                joint: joint.name.clone(),
                kind: joint.kind,
            });
        }
        let denominator = fraction(ratio).1 as f64;
        if let Some(known) = drives.iter_mut().find(|d| d.joint == lead) {
            let common = known.multiple * denominator / gcd(known.multiple, denominator);
            if common <= MOST_MULTIPLE {
                known.multiple = common;
            }
            continue;
        }
        let limits = range(machine, lead);
        if limits[0] > limits[1] {
            return Err(PackError::NoRange {
                joint: machine.joints[lead].name.clone(),
            });
        }
        kinds.push(kind);
        drives.push(Drive {
            joint: lead,
            multiple: denominator,
            offset: 0.0,
            limits,
        });
    }
    Ok((kinds, drives))
}

pub(super) fn gcd(a: f64, b: f64) -> f64 {
    if b < 0.5 { a } else { gcd(b, a % b) }
}

/// The fraction with numerator and denominator up to [`MOST_RATIO`] nearest to a ratio.
pub(super) fn fraction(ratio: f64) -> (i32, i32) {
    (1..=MOST_RATIO)
        .map(|q| ((ratio * q as f64).round() as i32, q))
        .filter(|(p, _)| p.abs() <= MOST_RATIO)
        .min_by(|a, b| {
            let error = |(p, q): &(i32, i32)| (ratio - *p as f64 / *q as f64).abs();
            error(a).total_cmp(&error(b)).then(a.1.cmp(&b.1))
        })
        .unwrap_or((0, 1))
}
