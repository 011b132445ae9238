//! What the programs share.
#![no_std]

pub mod cases;
pub mod spherical;

use balk_core::machine::Machine;
#[cfg(not(feature = "propagation"))]
use balk_core::screen::screen;
#[cfg(feature = "propagation")]
use balk_core::screen::screen_by_bounds as screen;
use balk_core::screen::{Options, Verdict, Workspace};
use balk_core::target::Target;

/// The entry whose stack is bounded and observed: [`screen`] alone, in a frame of its own.
#[inline(never)]
pub fn screen_entry<'w, const N: usize, const CELLS: usize, const PARTS: usize>(
    machine: &Machine<N>,
    target: &Target,
    options: &Options,
    workspace: &'w mut Workspace<CELLS, PARTS>,
) -> Verdict<'w> {
    screen(machine, target, options, workspace)
}
