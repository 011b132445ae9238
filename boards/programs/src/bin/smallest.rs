//! The check with one packed machine and nothing else: what it takes of flash and memory, and what
//! its symbols are. Ends with success when the target is refused.
#![no_std]
#![no_main]

use balk_board_programs::{screen_entry, spherical};
use balk_core::fixed::{Interval, ONE};
use balk_core::screen::{Options, Verdict, Workspace6};
use balk_core::target::{Orientation, Target};
use core::hint::black_box;
use support::{Status, program};

program!(run);

fn run() -> Status {
    static mut WORKSPACE: Workspace6 = Workspace6::new();
    // Safety: taken once, here.
    #[allow(static_mut_refs, reason = "the only reference to it")]
    let workspace = unsafe { &mut WORKSPACE };
    // The compiler must not know what is asked, or it leaves out what this target does not need.
    let options = Options {
        #[cfg(feature = "propagation")]
        pivots: 0,
        ..black_box(Options::default())
    };
    let target = black_box(Target {
        // Beyond reach.
        position: [Interval::point(ONE / 8 * 7); 3],
        orientation: Orientation::Near {
            quaternion: [ONE, 0, 0, 0],
            half_sine: 1 << 20,
        },
    });
    #[cfg(feature = "planted")]
    let target = Target {
        position: [target.position[black_box(0)]; 3],
        ..target
    };
    match screen_entry(&spherical::MACHINE, &target, &options, workspace) {
        Verdict::Refused(_) => Status::Success,
        Verdict::Passed(_) => Status::Failed,
    }
}
