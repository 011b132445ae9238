//! After every step of a node test every box, span and row still holds the truth.

#[path = "containment/arithmetic.rs"]
mod arithmetic;

use balk_tests::measure::containment::{Kinds, Lie, Tally, run};
use indicatif::ProgressBar;

fn checks(count: u64, seed: u64, lie: Lie) -> Tally {
    run(count, seed, lie, &ProgressBar::hidden())
}

/// Random chains of every kind of joint and the three arms, with and without tolerances, postures
/// at limits and at right angles, targets from a point to the whole reach, spans from the full
/// limits to two units.
#[test]
fn boxes_hold_the_truth() {
    let tally = checks(100_000, 1, Lie::default());
    assert!(tally.checks >= 100_000, "{} checks", tally.checks);
    for kind in Kinds::ALL {
        let compared = tally.of(kind).compared;
        assert!(compared > tally.checks, "{}: {compared}", kind.name());
    }
    assert_eq!(tally.violations(), 0, "{}", tally.failures.join("\n"));
}

/// The comparison itself: a truth a ten-millionth off is found missing in every kind of box, and
/// one a hundred-thousandth off in the rows, which have 512 units of 2^-30 of room for rounding.
#[test]
fn a_false_truth_is_found_out() {
    for (values, rows, count) in [(1e-7, false, 2_000), (1e-5, true, 5_000)] {
        let tally = checks(count, 2, Lie { values });
        for kind in Kinds::ALL
            .into_iter()
            .filter(|&kind| kind != Kinds::Open && (rows || kind != Kinds::Row))
        {
            let found = tally.of(kind).violations;
            assert!(found > 100, "{} moved by {values}: {found}", kind.name());
        }
    }
}
