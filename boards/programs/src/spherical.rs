//! Machine "bench arm, spherical wrist", tip "gripper", packed by balk 0.1.0. Pack again instead of editing.

use balk_core::fixed::{Arc, Direction, Interval, Product};
use balk_core::image::table;
use balk_core::machine::{Joint, Machine, Motion, Placement, Variable};

/// Identity of [`MACHINE`], as its records state it.
pub const FINGERPRINT: u64 = 0xbb84fbd8e421ae62;

/// The machine.
#[rustfmt::skip]
pub static MACHINE: Machine<6> = table(
    [
        Joint {
            motion: Motion::Turn,
            placement: Placement {
                rotation: [[1073741824, 0, 0], [0, 1073741824, 0], [0, 0, 1073741824]],
                turn_slack: 1,
                origin: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: 182536110, hi: 182536111 }],
                back: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: 182536110, hi: 182536111 }],
                square: Product { lo: 33319431483133732, hi: 33319431483142032 },
            },
            variable: 0,
            multiple: 1,
            turn: Arc { lo: Direction { x: 1073741824, y: 0 }, hi: Direction { x: 1073741824, y: 0 }, full: false },
            shift: Interval { lo: 0, hi: 0 },
        },
        Joint {
            motion: Motion::Turn,
            placement: Placement {
                rotation: [[1073741824, 0, 0], [0, 0, 1073741824], [0, -1073741824, 0]],
                turn_slack: 1,
                origin: [Interval { lo: 32212254, hi: 32212255 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                back: [Interval { lo: 32212254, hi: 32212255 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                square: Product { lo: 1037629354142064, hi: 1037629354150260 },
            },
            variable: 1,
            multiple: 1,
            turn: Arc { lo: Direction { x: 1073741824, y: 0 }, hi: Direction { x: 1073741824, y: 0 }, full: false },
            shift: Interval { lo: 0, hi: 0 },
        },
        Joint {
            motion: Motion::Turn,
            placement: Placement {
                rotation: [[1073741824, 0, 0], [0, 1073741824, 0], [0, 0, 1073741824]],
                turn_slack: 1,
                origin: [Interval { lo: 246960619, hi: 246960620 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                back: [Interval { lo: 246960619, hi: 246960620 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                square: Product { lo: 60989547593698000, hi: 60989547593706392 },
            },
            variable: 2,
            multiple: 1,
            turn: Arc { lo: Direction { x: 1073741824, y: 0 }, hi: Direction { x: 1073741824, y: 0 }, full: false },
            shift: Interval { lo: 0, hi: 0 },
        },
        Joint {
            motion: Motion::Turn,
            placement: Placement {
                rotation: [[87109508, 0, 1070202522], [-1070202522, 0, 87109508], [0, -1073741824, 0]],
                turn_slack: 1,
                origin: [Interval { lo: 231617958, hi: 231617959 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                back: [Interval { lo: 18790481, hi: 18790482 }, Interval { lo: -1, hi: 1 }, Interval { lo: 230854492, hi: 230854493 }],
                square: Product { lo: 53646878761233232, hi: 53646878761241456 },
            },
            variable: 3,
            multiple: 1,
            turn: Arc { lo: Direction { x: 1073741824, y: 0 }, hi: Direction { x: 1073741824, y: 0 }, full: false },
            shift: Interval { lo: 0, hi: 0 },
        },
        Joint {
            motion: Motion::Turn,
            placement: Placement {
                rotation: [[0, 0, 1073741824], [0, 1073741824, 0], [-1073741824, 0, 0]],
                turn_slack: 1,
                origin: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                back: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                square: Product { lo: -4096, hi: 4096 },
            },
            variable: 4,
            multiple: 1,
            turn: Arc { lo: Direction { x: 1073741824, y: 0 }, hi: Direction { x: 1073741824, y: 0 }, full: false },
            shift: Interval { lo: 0, hi: 0 },
        },
        Joint {
            motion: Motion::Turn,
            placement: Placement {
                rotation: [[0, 0, 1073741824], [0, -1073741824, 0], [1073741824, 0, 0]],
                turn_slack: 1,
                origin: [Interval { lo: 102005473, hi: 102005474 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
                back: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: 102005473, hi: 102005474 }],
                square: Product { lo: 10405116579072696, hi: 10405116579080888 },
            },
            variable: 5,
            multiple: 1,
            turn: Arc { lo: Direction { x: 1073741824, y: 0 }, hi: Direction { x: 1073741824, y: 0 }, full: false },
            shift: Interval { lo: 0, hi: 0 },
        },
    ],
    [
        Variable { arc: Arc { lo: Direction { x: -1037154960, y: -277904830 }, hi: Direction { x: -1037154960, y: 277904830 }, full: false }, length: Interval { lo: 0, hi: 0 }, motion: Motion::Turn },
        Variable { arc: Arc { lo: Direction { x: -1069655912, y: 93582770 }, hi: Direction { x: 879557808, y: 615873012 }, full: false }, length: Interval { lo: 0, hi: 0 }, motion: Motion::Turn },
        Variable { arc: Arc { lo: Direction { x: -271624840, y: -1038817333 }, hi: Direction { x: -933118813, y: 531235151 }, full: false }, length: Interval { lo: 0, hi: 0 }, motion: Motion::Turn },
        Variable { arc: Arc { lo: Direction { x: -1073741824, y: 0 }, hi: Direction { x: -1073741824, y: 0 }, full: true }, length: Interval { lo: 0, hi: 0 }, motion: Motion::Turn },
        Variable { arc: Arc { lo: Direction { x: 453782907, y: 973140575 }, hi: Direction { x: 453782907, y: -973140575 }, full: false }, length: Interval { lo: 0, hi: 0 }, motion: Motion::Turn },
        Variable { arc: Arc { lo: Direction { x: -1073741824, y: 0 }, hi: Direction { x: -1073741824, y: 0 }, full: true }, length: Interval { lo: 0, hi: 0 }, motion: Motion::Turn },
    ],
    Placement {
        rotation: [[0, 1073741824, 0], [0, 0, 1073741824], [1073741824, 0, 0]],
        turn_slack: 1,
        origin: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
        back: [Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }, Interval { lo: -1, hi: 1 }],
        square: Product { lo: -4096, hi: 4096 },
    },
    1,
);
