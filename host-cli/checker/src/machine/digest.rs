//! The chain in a fixed spelling, and its SHA-256.

use core::fmt::Write;

use sha2::{Digest, Sha256};

use super::chain::{Chain, Pose};
use super::read::Kind;
use super::{Amount, Drive};
use crate::exact::decimal::lowest;
use dashu_ratio::RBig;

/// SHA-256 of the lines that write `chain` exactly.
///
/// Numbers are fractions in lowest terms. An angle is `p/q rad`, or `p/q deg` when degrees make it,
/// or both with a `+` for the offset of a follower's follower; a length is written like radians.
/// Every line ends with a line feed. In the order of the chain, a joint's line is
///
/// `KIND frames POSE tolerance P/Q ANGLE [axis P/Q P/Q P/Q variable N ratio P/Q offset ANGLE]`
///
/// with the last part for moving joints. A pose is `xyz P/Q P/Q P/Q rpy ANGLE ANGLE ANGLE` or
/// `row a P/Q alpha ANGLE d P/Q theta ANGLE`, with a blank before each. Then
/// `variable N [limits ANGLE ANGLE ratio P/Q offset ANGLE]...` for every variable, or
/// `variable N none`, and `tip frames POSE...`.
pub fn digest(chain: &Chain) -> [u8; 32] {
    Sha256::digest(spelling(chain)).into()
}

fn spelling(chain: &Chain) -> String {
    let mut text = String::new();
    for (place, link) in chain.links.iter().enumerate() {
        let moving = chain.moving.get(place);
        for (stage_place, stage) in link.iter().enumerate() {
            let last = stage_place + 1 == link.len();
            let kind = match (last, moving) {
                (false, _) => "fixed",
                (true, Some(joint)) if joint.kind == Kind::Prismatic => "prismatic",
                (true, Some(_)) => "revolute",
                (true, None) => "tip",
            };
            text.push_str(kind);
            text.push_str(" frames");
            stage
                .poses
                .iter()
                .for_each(|pose| add_pose(&mut text, pose));
            if kind != "tip" {
                add(&mut text, "tolerance", &[&stage.tolerance_xyz]);
                add_angle(&mut text, &stage.tolerance_angle);
            }
            if let (true, Some(joint)) = (last, moving) {
                add(&mut text, "axis", &joint.axis.each_ref());
                add_drive(&mut text, &joint.drive);
            }
            text.push('\n');
        }
    }
    for (place, variable) in chain.variables.iter().enumerate() {
        add_name(&mut text, "variable", place + 1);
        if variable.limits.is_empty() {
            text.push_str(" none");
        }
        for limit in &variable.limits {
            text.push_str(" limits");
            limit.range.iter().for_each(|end| add_angle(&mut text, end));
            add(&mut text, "ratio", &[&limit.ratio]);
            text.push_str(" offset");
            add_angle(&mut text, &limit.offset);
        }
        text.push('\n');
    }
    text
}

fn add_drive(text: &mut String, drive: &Drive) {
    text.push(' ');
    add_name(text, "variable", drive.variable + 1);
    add(text, "ratio", &[&drive.ratio]);
    text.push_str(" offset");
    add_angle(text, &drive.offset);
}

fn add_pose(text: &mut String, pose: &Pose) {
    match pose {
        Pose::Placed { xyz, rpy } => {
            add(text, "xyz", &xyz.each_ref());
            text.push_str(" rpy");
            rpy.iter().for_each(|angle| add_angle(text, angle));
        }
        Pose::Row { a, alpha, d, theta } => {
            add(text, "row a", &[a]);
            text.push_str(" alpha");
            add_angle(text, alpha);
            add(text, "d", &[d]);
            text.push_str(" theta");
            add_angle(text, theta);
        }
    }
}

fn add_name(text: &mut String, word: &str, number: usize) {
    // Writing to a string cannot fail.
    let _ = write!(text, "{word} {number}");
}

fn add(text: &mut String, word: &str, numbers: &[&RBig]) {
    text.push(' ');
    text.push_str(word);
    for number in numbers {
        text.push(' ');
        text.push_str(&lowest(number));
    }
}

fn add_angle(text: &mut String, angle: &Amount) {
    let zero = RBig::ZERO;
    text.push(' ');
    if angle.degrees == zero || angle.plain != zero {
        text.push_str(&lowest(&angle.plain));
        text.push_str(" rad");
    }
    if angle.degrees != zero {
        if angle.plain != zero {
            text.push('+');
        }
        text.push_str(&lowest(&angle.degrees));
        text.push_str(" deg");
    }
}
