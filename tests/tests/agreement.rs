//! Screening and complete decision never contradict each other, and begin with the same node.

use balk::pack::pack_target;
use balk::search::{Screening, Verdict};
use balk_core::fixed::{Interval, ONE};
use balk_core::screen::{self, Options, Reason, Workspace8, screen, screen_by_bounds};
use balk_core::target::{Cone, Orientation};
use balk_tests::families::{Family, Kind};

const NODES: u64 = 400;

#[test]
fn screen_and_decide_agree_on_every_kind_of_target() {
    let mut refused_somewhere = 0;
    for family in Family::all() {
        for kind in Kind::ALL {
            for target in family.targets(kind, 40, 23) {
                let decision = family.solver.decide(&target, NODES);
                let refused =
                    [1, 4, 8, 16].map(|splits| match family.solver.screen(&target, splits) {
                        Screening::Passed { .. } => false,
                        Screening::Refused { record } => {
                            assert!(!record.is_empty());
                            true
                        }
                    });
                // More splits never lose a refusal.
                assert!(refused.is_sorted(), "{target:?}: {refused:?}");
                refused_somewhere += usize::from(refused[3]);
                let what = format!("{} {target:?}: {refused:?} {decision:?}", family.name);
                match decision.verdict {
                    Verdict::Reachable { .. } => assert!(!refused[3], "{what}"),
                    Verdict::Undecided { .. } => assert!(!refused[3], "{what}"),
                    Verdict::Unreachable { .. } => {}
                }
                // The root of the complete search is the controller's single interval.
                let at_root =
                    decision.nodes == 1 && matches!(decision.verdict, Verdict::Unreachable { .. });
                assert_eq!(at_root, refused[0], "{what}");
            }
        }
    }
    assert!(refused_somewhere > 100, "{refused_somewhere}");
}

/// What a verdict says, as far as two of them can be compared.
fn said(verdict: screen::Verdict) -> Result<usize, Reason> {
    match verdict {
        screen::Verdict::Passed(reason) => Err(reason),
        screen::Verdict::Refused(refusal) => Ok(refusal.steps().len()),
    }
}

#[test]
fn without_the_linear_program_the_answer_is_that_of_no_pivots() {
    let mut workspace = Box::new(Workspace8::new());
    let mut refused = 0;
    for family in Family::all() {
        let machine = &family.solver.pack.machine;
        for target in family.targets(Kind::Box, 40, 29) {
            let target = pack_target(&target, family.solver.pack.scale);
            for splits in [1, 8] {
                let options = Options {
                    splits,
                    pivots: 0,
                    ..Options::default()
                };
                let whole = said(screen(machine, &target, &options, &mut workspace));
                let small = said(screen_by_bounds(machine, &target, &options, &mut workspace));
                assert_eq!(whole, small);
                refused += usize::from(small.is_ok());
            }
            let options = Options::default();
            let asked = said(screen_by_bounds(machine, &target, &options, &mut workspace));
            assert_eq!(asked, Err(Reason::Capacity));
        }
    }
    assert!(refused > 30, "{refused}");
}

#[test]
fn a_target_out_of_range_passes() {
    let family = Family::read("spherical");
    let machine = &family.solver.pack.machine;
    let mut workspace = Box::new(Workspace8::new());
    let far = family.targets(Kind::Cone, 1, 1).remove(0);
    let mut target = pack_target(&far, family.solver.pack.scale);
    // Beyond reach, so that every form in range is refused.
    target.position = [Interval::point(ONE); 3];
    let mut answer = |target: &balk_core::target::Target| {
        said(screen(machine, target, &Options::default(), &mut workspace))
    };
    assert!(answer(&target).is_ok());
    let unit = Cone {
        tip: [0, 0, ONE],
        base: [0, 0, ONE],
        half_sine: 0,
    };
    for wrong in [
        Cone {
            half_sine: -1,
            ..unit
        },
        Cone {
            base: [ONE; 3],
            ..unit
        },
        Cone {
            tip: [0; 3],
            ..unit
        },
    ] {
        let mut target = target.clone();
        target.orientation = Orientation::Axes([wrong].into_iter().collect());
        assert_eq!(answer(&target), Err(Reason::OutOfRange), "{wrong:?}");
    }
    target.position[0].lo = i32::MIN;
    assert_eq!(answer(&target), Err(Reason::OutOfRange));
}
