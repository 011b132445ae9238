//! The table in Rust source.

use crate::pack::Packed;
use balk_core::fixed::{Arc, Direction, Interval};
use balk_core::machine::{Joint, Motion, Placement, Variable};
use balk_core::record::fingerprint;
use std::fmt::Write;

/// Source of a module that holds the machine as a `static` made at compile time: it lies in flash,
/// and neither a loader nor a checksum is needed on the controller.
pub(super) fn source(machine: &Packed, name: &str, tip: &str) -> String {
    let joints: String = machine.joints.iter().map(joint).collect();
    let variables: String = machine.variables.iter().map(variable).collect();
    format!(
        "\
//! Machine {name:?}, tip {tip:?}, packed by balk {version}. Pack again instead of editing.

use balk_core::fixed::{{Arc, Direction, Interval, Product}};
use balk_core::image::table;
use balk_core::machine::{{Joint, Machine, Motion, Placement, Variable}};

/// Identity of [`MACHINE`], as its records state it.
pub const FINGERPRINT: u64 = {fingerprint:#018x};

/// The machine.
#[rustfmt::skip]
pub static MACHINE: Machine<{count}> = table(
    [
{joints}    ],
    [
{variables}    ],
    {tip_placement},
    {exponent},
);
",
        version = env!("CARGO_PKG_VERSION"),
        fingerprint = fingerprint(machine),
        count = machine.joints.len(),
        tip_placement = placement(&machine.tip, "    "),
        exponent = machine.exponent,
    )
}

fn motion(motion: Motion) -> &'static str {
    match motion {
        Motion::Slide => "Motion::Slide",
        Motion::Turn => "Motion::Turn",
    }
}

fn interval(Interval { lo, hi }: Interval) -> String {
    format!("Interval {{ lo: {lo}, hi: {hi} }}")
}

fn direction(Direction { x, y }: Direction) -> String {
    format!("Direction {{ x: {x}, y: {y} }}")
}

fn arc(Arc { lo, hi, full }: Arc) -> String {
    let (lo, hi) = (direction(lo), direction(hi));
    format!("Arc {{ lo: {lo}, hi: {hi}, full: {full} }}")
}

fn placement(placement: &Placement, indent: &str) -> String {
    let mut text = String::from("Placement {\n");
    let intervals = |of: [Interval; 3]| of.map(interval).join(", ");
    let lines = [
        format!("rotation: {:?}", placement.rotation),
        format!("turn_slack: {}", placement.turn_slack),
        format!("origin: [{}]", intervals(placement.origin)),
        format!("back: [{}]", intervals(placement.back)),
        format!(
            "square: Product {{ lo: {}, hi: {} }}",
            placement.square.lo, placement.square.hi
        ),
    ];
    for line in lines {
        let _ = writeln!(text, "{indent}    {line},");
    }
    text + indent + "}"
}

fn joint(joint: &Joint) -> String {
    format!(
        "        Joint {{
            motion: {},
            placement: {},
            variable: {},
            multiple: {},
            turn: {},
            shift: {},
        }},
",
        motion(joint.motion),
        placement(&joint.placement, "            "),
        joint.variable,
        joint.multiple,
        arc(joint.turn),
        interval(joint.shift),
    )
}

fn variable(variable: &Variable) -> String {
    format!(
        "        Variable {{ arc: {}, length: {}, motion: {} }},
",
        arc(variable.arc),
        interval(variable.length),
        motion(variable.motion),
    )
}
