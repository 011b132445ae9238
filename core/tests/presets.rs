//! Memory of the presets, as their documentation states it.

use balk_core::machine::Machine;
use balk_core::screen::{Workspace4, Workspace6, Workspace7, Workspace8};

#[test]
fn presets_take_no_more_than_stated() {
    let sizes = [
        (size_of::<Workspace4>(), 9_864, size_of::<Machine<4>>(), 800),
        (
            size_of::<Workspace6>(),
            14_792,
            size_of::<Machine<6>>(),
            1_136,
        ),
        (
            size_of::<Workspace7>(),
            17_784,
            size_of::<Machine<7>>(),
            1_304,
        ),
        (
            size_of::<Workspace8>(),
            21_128,
            size_of::<Machine<8>>(),
            1_472,
        ),
    ];
    for (workspace, stated, machine, stated_machine) in sizes {
        assert!(workspace <= stated, "{workspace} bytes");
        assert!(machine <= stated_machine, "{machine} bytes");
    }
}
