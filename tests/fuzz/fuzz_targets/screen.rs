//! Screens packed targets of any numbers. Nothing may panic or overflow, the verdict must not
//! depend on what was screened before, and a refusal must be a record that replays.
#![no_main]

use arbitrary::Arbitrary;
use balk::log::replay;
use balk::search::Screening;
use balk_core::fixed::Interval;
use balk_core::propagate::Rules;
use balk_core::record::{Frame, read};
use balk_core::screen::{Options, Verdict, Workspace8, screen};
use balk_core::target::{Cone, Orientation, Target};
use balk_fuzz::SOLVERS;
use libfuzzer_sys::fuzz_target;

#[derive(Arbitrary, Debug)]
enum Wanted {
    Axes([([i32; 3], [i32; 3], i32); 3], u8),
    Free,
    Near([i32; 4], i32),
}

#[derive(Arbitrary, Debug)]
struct Input {
    machine: u8,
    splits: u8,
    pivots: u8,
    candidates: u8,
    rules: u8,
    position: [[i32; 2]; 3],
    wanted: Wanted,
}

fuzz_target!(|input: Input| {
    let solver = &SOLVERS[input.machine as usize % SOLVERS.len()];
    let options = Options {
        splits: input.splits as u16 % 5,
        pivots: input.pivots as u16,
        candidates: input.candidates % 4,
        rules: Rules(input.rules & Rules::ALL.0),
    };
    let target = Target {
        position: input.position.map(|[lo, hi]| Interval { lo, hi }),
        orientation: match input.wanted {
            Wanted::Free => Orientation::Free,
            Wanted::Near(quaternion, half_sine) => Orientation::Near {
                quaternion,
                half_sine,
            },
            Wanted::Axes(cones, count) => Orientation::Axes(
                cones
                    .into_iter()
                    .take(count as usize % 4)
                    .map(|(tip, base, half_sine)| Cone {
                        tip,
                        base,
                        half_sine,
                    })
                    .collect(),
            ),
        },
    };
    let fresh = solver.screen_packed(&target, &options);
    // Once more in memory that held another screening.
    let mut workspace = Box::new(Workspace8::new());
    let other = Target {
        position: [Interval::UNIT; 3],
        orientation: Orientation::Free,
    };
    let _ = screen(
        &solver.pack.machine,
        &other,
        &Options::default(),
        &mut workspace,
    );
    let again = screen(&solver.pack.machine, &target, &options, &mut workspace);
    match (&fresh, again) {
        (Screening::Passed { reason }, Verdict::Passed(other)) => {
            assert_eq!(*reason, other.text());
        }
        (Screening::Refused { record }, Verdict::Refused(_)) => {
            // Numbers outside their ranges give a record that is not read.
            if let Ok(Frame::Record(record)) = read(record) {
                assert_eq!(replay(solver, &record), Ok(()));
            }
        }
        _ => panic!("the verdict depends on what was screened before"),
    }
});
