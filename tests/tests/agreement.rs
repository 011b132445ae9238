//! Screening and complete decision never contradict each other, and begin with the same node.

use balk::search::{Screening, Verdict};
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
