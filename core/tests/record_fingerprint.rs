//! Every number of a machine counts in its fingerprint.

use balk_core::fixed::{Arc, Direction, Interval, ONE, Product};
use balk_core::machine::{Joint, Machine, Motion, Placement, Variable};
use balk_core::record::fingerprint;
use std::collections::BTreeSet;

fn machine() -> Machine<2> {
    let placement = Placement {
        rotation: [[ONE, 0, 0], [0, ONE, 0], [0, 0, ONE]],
        turn_slack: 1,
        origin: [Interval::point(5); 3],
        back: [Interval::point(6); 3],
        square: Product { lo: 7, hi: 8 },
    };
    let joint = Joint {
        motion: Motion::Turn,
        placement,
        variable: 0,
        multiple: 1,
        turn: Arc::new(Direction::EAST, Direction::EAST),
        shift: Interval::ZERO,
    };
    let variable = Variable {
        arc: Arc::FULL,
        length: Interval::ZERO,
        motion: Motion::Turn,
    };
    Machine {
        joints: [joint, joint].into_iter().collect(),
        variables: [variable, variable].into_iter().collect(),
        tip: placement,
        exponent: 0,
    }
}

/// Changes of one number each.
fn changes() -> Vec<fn(&mut Machine<2>)> {
    vec![
        |m| m.exponent = 1,
        |m| m.joints[0].motion = Motion::Slide,
        |m| m.joints[1].motion = Motion::Slide,
        |m| m.joints[1].variable = 1,
        |m| m.joints[1].multiple = -1,
        |m| m.joints[1].turn.full = true,
        |m| m.joints[1].turn.lo.x -= 1,
        |m| m.joints[1].turn.lo.y -= 1,
        |m| m.joints[1].turn.hi.x -= 1,
        |m| m.joints[1].turn.hi.y -= 1,
        |m| m.joints[1].shift.lo -= 1,
        |m| m.joints[1].shift.hi += 1,
        |m| m.joints[1].placement.rotation[0][1] += 1,
        |m| m.joints[1].placement.rotation[1][0] += 1,
        |m| m.joints[1].placement.turn_slack += 1,
        |m| m.joints[1].placement.origin[2].lo -= 1,
        |m| m.joints[1].placement.origin[2].hi += 1,
        |m| m.joints[1].placement.back[2].lo -= 1,
        |m| m.joints[1].placement.back[2].hi += 1,
        |m| m.joints[1].placement.square.lo -= 1,
        |m| m.joints[1].placement.square.hi += 1,
        |m| m.variables[1].motion = Motion::Slide,
        |m| m.variables[1].arc.full = false,
        |m| m.variables[1].arc.lo.x -= 1,
        |m| m.variables[1].arc.hi.y -= 1,
        |m| m.variables[1].length.lo -= 1,
        |m| m.variables[1].length.hi += 1,
        |m| m.tip.rotation[2][2] -= 1,
        |m| m.tip.origin[0].hi += 1,
        |m| m.joints.truncate(1),
        |m| m.variables.truncate(1),
    ]
}

#[test]
fn a_change_of_any_number_changes_the_fingerprint() {
    let mut found = BTreeSet::from([fingerprint(&machine())]);
    assert!(!found.contains(&0));
    for (number, change) in changes().into_iter().enumerate() {
        let mut other = machine();
        change(&mut other);
        assert!(found.insert(fingerprint(&other)), "change {number}");
    }
}

#[test]
fn the_same_machine_has_the_same_fingerprint_whatever_the_capacity() {
    let Machine {
        joints,
        variables,
        tip,
        exponent,
    } = machine();
    let larger = Machine::<7> {
        joints: joints.into_iter().collect(),
        variables: variables.into_iter().collect(),
        tip,
        exponent,
    };
    assert_eq!(fingerprint(&larger), fingerprint(&machine()));
}
