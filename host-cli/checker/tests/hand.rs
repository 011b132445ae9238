//! A proof written by hand, and forged variants that must each be refused for the right reason.

mod common;

use balk_checker::proof::Claim;
use balk_checker::{Checker, Reason, Rejection, Report, TargetError};
use common::{HEADER, MACHINE, STEPS, TARGET, checker, proof};

/// Why the proof with `items` is refused.
fn refusal(header: &str, items: &str) -> Rejection {
    checker()
        .check(&proof(header, items), TARGET)
        .expect_err("a forged proof")
}

/// Why the last of `items` is refused.
fn reason(items: &str) -> Reason {
    match refusal(HEADER, items) {
        Rejection::Item { index, reason, .. } => {
            assert_eq!(index + 1, items.lines().count(), "{reason}");
            reason
        }
        other => panic!("{other}"),
    }
}

#[test]
fn holds() {
    let report = checker().check(&proof(HEADER, STEPS), TARGET);
    assert_eq!(
        report,
        Ok(Report {
            steps: 11,
            splits: 0
        })
    );
    let same = balk_checker::check(&proof(HEADER, STEPS), MACHINE, "cup", TARGET);
    assert_eq!(same, Ok(report));
}

#[test]
fn holds_on_both_sides_of_a_split() {
    let items = format!("split 1 at 0.5\n{STEPS}{STEPS}");
    let report = checker().check(&proof(HEADER, &items), TARGET);
    assert_eq!(
        report,
        Ok(Report {
            steps: 22,
            splits: 1
        })
    );
}

#[test]
fn what_is_found_before_a_split_holds_on_both_sides() {
    let last = STEPS.lines().last().expect("steps");
    let shared = STEPS.strip_suffix(&format!("{last}\n")).expect("the last");
    let items = format!("{shared}split 1 at 0.5\n{last}\n{last}\n");
    let report = checker().check(&proof(HEADER, &items), TARGET);
    assert_eq!(
        report,
        Ok(Report {
            steps: 12,
            splits: 1
        })
    );
}

#[test]
fn what_one_side_finds_is_forgotten_on_the_other() {
    let last = STEPS.lines().last().expect("steps");
    let items = format!("split 2 at 0\n{STEPS}{last}\n");
    assert!(matches!(reason(&items), Reason::DoesNotFollow(_)));
}

#[test]
fn every_step_is_needed() {
    let lines: Vec<&str> = STEPS.lines().collect();
    for left_out in 0..lines.len() {
        let kept = lines
            .iter()
            .enumerate()
            .filter(|(place, _)| *place != left_out);
        let items: String = kept.map(|(_, line)| format!("{line}\n")).collect();
        refusal(HEADER, &items);
    }
}

#[test]
fn a_bound_may_be_weaker_but_not_stronger() {
    let weaker = STEPS.replace("t@1+.s <= 0.49", "t@1+.s <= 0.490000000001");
    let weaker = weaker.replace("t@1-.s <= 0.49", "t@1-.s <= 0.491");
    assert!(checker().check(&proof(HEADER, &weaker), TARGET).is_ok());
    let stronger = STEPS.replace("t@1+.s <= 0.49", "t@1+.s <= 0.489999999999");
    let Rejection::Item {
        index,
        text,
        reason,
    } = refusal(HEADER, &stronger)
    else {
        panic!("an item is wrong");
    };
    assert_eq!(index, 7);
    assert_eq!(text, "step t@1+.s <= 0.489999999999 by far 1 t");
    assert_eq!(reason, Reason::DoesNotFollow("in [0, 0.49]".to_owned()));
}

#[test]
fn rules_that_do_not_apply() {
    for relation in ["length 3+ t", "length 2+ o3"] {
        let items = format!("step t@1-.s >= 0 by {relation}\n");
        assert_eq!(reason(&items), Reason::NoSuch, "{relation}");
    }
    assert_eq!(reason("step t@3+.x <= 0 by out.x 2 t\n"), Reason::NoSuch);
    assert_eq!(reason("step t@2+.x <= 0 by out.x 3 t\n"), Reason::NoSuch);
    assert_eq!(reason("step t@2-.x <= 0 by slide.x 2 t\n"), Reason::NoSuch);
    assert_eq!(reason("step x@2+.s <= 0 by far 1 x\n"), Reason::NoSuch);
    assert_eq!(reason("step x@b.x <= 0 by trace\n"), Reason::NoSuch);
    assert_eq!(reason("step k1@b.x <= 0 by tilt 1\n"), Reason::NoSuch);
    assert_eq!(
        reason("step t@2+.x <= 0 by out.y 2 t\n"),
        Reason::NotInRelation
    );
    assert_eq!(reason("step q1 <= 0 by cosine 1\n"), Reason::NotInRelation);
    assert_eq!(reason("step q2 <= 0 by angle 1 t\n"), Reason::NotInRelation);
    assert_eq!(reason("step c1 <= 0 by dot 1 o1\n"), Reason::TouchesZero);
    assert_eq!(reason("step q1 <= 0 by angle 1 t\n"), Reason::TouchesZero);
    assert_eq!(
        reason("step o1@1+.s none by pair.s 1 1\n"),
        Reason::Ambiguous
    );
    assert_eq!(
        reason("step c1 <= 0 by sum 1 circle 1\n"),
        Reason::Ambiguous
    );
    assert_eq!(
        reason("step t@2+.x <= 0 by sum 1 out.x 2 t -1 out.x 2 t\n"),
        Reason::NotInRelation
    );
}

#[test]
fn claims_that_leave_nothing_must_say_so() {
    let end = STEPS.replace("t@1-.s none", "t@1-.s >= 0.5");
    assert_eq!(reason(&end), Reason::LeavesNothing);
    let nothing = STEPS.replace("t@1+.s <= 0.49", "t@1+.s none");
    assert!(matches!(
        refusal(HEADER, &nothing),
        Rejection::Item {
            index: 7,
            reason: Reason::DoesNotFollow(_),
            ..
        }
    ));
    assert_eq!(
        reason("step * none by sum 1 out.x 2 t\n"),
        Reason::DoesNotFollow("anything".to_owned())
    );
}

#[test]
fn the_tree_must_be_closed() {
    let open = STEPS.lines().take(10).map(|line| format!("{line}\n"));
    assert_eq!(
        refusal(HEADER, &open.collect::<String>()),
        Rejection::Unclosed(1)
    );
    let half = format!("split 1 at 0\n{STEPS}");
    assert_eq!(refusal(HEADER, &half), Rejection::Unclosed(1));
    assert_eq!(refusal(HEADER, ""), Rejection::Unclosed(1));
    let more = format!("{STEPS}step c1 <= 1 by cosine 1\n");
    assert_eq!(reason(&more), Reason::AfterEnd);
    assert_eq!(reason("split 1 at 3\n"), Reason::SplitOutside);
    assert_eq!(reason("split 3 at 0\n"), Reason::NoSuch);
    assert_eq!(reason(&"split 1 at -2\n".repeat(201)), Reason::TooDeep);
}

#[test]
fn the_root_must_cover_the_limits() {
    let small = HEADER.replace("root 1 -2.617993877992", "root 1 -2.617993877991");
    assert_eq!(refusal(&small, STEPS), Rejection::Root(1));
    let small = HEADER.replace("2.443460952793\n", "2.44346095279\n");
    assert_eq!(refusal(&small, STEPS), Rejection::Root(2));
    let few = HEADER.lines().take(3).map(|line| format!("{line}\n"));
    assert_eq!(refusal(&few.collect::<String>(), STEPS), Rejection::Count);
}

/// A free joint that two others follow at a half and a quarter of its turns: the machine repeats
/// itself after four, not eight.
#[test]
fn a_root_without_limits_must_be_as_long_as_the_machine_repeats_itself() {
    let joint = |name: &str, more: &str| {
        format!("[[joint]]\nname = \"{name}\"\nkind = \"revolute\"\n{more}")
    };
    let follows = |ratio: &str| format!("follows = {{ joint = \"a\", ratio = {ratio} }}\n");
    let machine = [
        joint("a", ""),
        joint("b", &format!("xyz = [0.1, 0, 0]\n{}", follows("0.5"))),
        joint("c", &format!("xyz = [0.1, 0, 0]\n{}", follows("0.25"))),
        "[[tip]]\nname = \"cup\"\nxyz = [0.1, 0, 0]\n".to_owned(),
    ]
    .concat();
    let checker = Checker::new(&machine, "cup").expect("well written");
    let frames = "frame 1 1 0 0 0 0\nframe 2 1 0 0 0 0\nframe 3 1 0 0 0 0\n";
    let judge = |root: &str| {
        let mut proof = proof(&format!("{frames}root 1 {root}\n"), "");
        proof.machine = checker.digest();
        checker.check(&proof, TARGET)
    };
    // Four turns are 25.132741228718...
    assert_eq!(judge("-12 13.132741228718"), Err(Rejection::Root(1)));
    assert_eq!(judge("-12 13.132741228719"), Err(Rejection::Unclosed(1)));
}

#[test]
fn frames_must_sit_on_their_axes() {
    let tilted = HEADER.replace("frame 2 1 0 0 0 0", "frame 2 1000000 1 0 0 0");
    assert_eq!(refusal(&tilted, STEPS), Rejection::FrameOffAxis(2));
    let upside_down = HEADER.replace("frame 1 1 0 0 0 0", "frame 1 0 1 0 0 0");
    assert_eq!(refusal(&upside_down, STEPS), Rejection::FrameOffAxis(1));
    let zero = HEADER.replace("frame 1 1 0 0 0 0", "frame 1 0 0 0 0 0");
    assert_eq!(refusal(&zero, STEPS), Rejection::FrameOffAxis(1));
    // A turn about the axis and a shift along it change nothing here but the third coordinate.
    let moved = HEADER.replace("frame 1 1 0 0 0 0", "frame 1 1 0 0 0 0.3");
    let moved = moved.replace("frame 2 1 0 0 0 0", "frame 2 1 0 0 0 0.3");
    let steps = STEPS.replace("t@2+.z in [0, 0]", "t@2+.z in [-0.3, -0.3]");
    let steps = steps.replace("s in [0.09, 0.09]", "s in [0.18, 0.18]");
    let steps = steps.replace("0.49", "0.58");
    let steps = steps.replace(
        "step t@1-.s none",
        "step t@1-.z <= -0.299 by in.z 0 t\nstep t@1-.s none",
    );
    assert!(checker().check(&proof(&moved, &steps), TARGET).is_ok());
}

#[test]
fn another_machine_tip_or_target() {
    let good = proof(HEADER, STEPS);
    let check = |proof, line| checker().check(proof, line);
    let mut other = good.clone();
    other.machine[0] ^= 1;
    assert_eq!(check(&other, TARGET), Err(Rejection::Machine));
    let mut other = good.clone();
    other.tip = "hook".to_owned();
    assert_eq!(check(&other, TARGET), Err(Rejection::Tip));
    let same = r#"{"xyz_within":[1e-3,0.0010,0.001],"xyz":[0.80,0,3e-1], "id":"far" }"#;
    assert!(check(&good, same).is_ok());
    let near = TARGET.replace("0.8", "0.800000000000000000001");
    assert_eq!(check(&good, &near), Err(Rejection::Target));
    let renamed = TARGET.replace("far", "near");
    assert_eq!(check(&good, &renamed), Err(Rejection::Target));
    let unread = TARGET.replace("0.8", "null");
    assert_eq!(
        check(&good, &unread),
        Err(Rejection::Unread(TargetError::Field {
            field: "xyz",
            reason: "must be a number"
        }))
    );
    let longer = MACHINE.replace("0.4,", "0.5,");
    let longer = balk_checker::Checker::new(&longer, "cup").expect("well written");
    assert_eq!(longer.check(&good, TARGET), Err(Rejection::Machine));
    let renamed = MACHINE
        .replace("two links", "two-link arm")
        .replace("elbow", "knee");
    let renamed = balk_checker::Checker::new(&renamed, "cup").expect("well written");
    assert!(renamed.check(&good, TARGET).is_ok());
}

#[test]
fn a_longer_arm_reaches() {
    // The same steps do not follow for an arm of 0.51 m and 0.3 m.
    let longer = MACHINE.replace("0.4,", "0.51,");
    let longer = balk_checker::Checker::new(&longer, "cup").expect("well written");
    let mut forged = proof(HEADER, STEPS);
    forged.machine = longer.digest();
    let Err(Rejection::Item { index, .. }) = longer.check(&forged, TARGET) else {
        panic!("the arm reaches");
    };
    assert_eq!(index, 7);
}

#[test]
fn tolerances_widen_what_follows() {
    let loose = MACHINE.replace(
        "xyz = [0.4, 0.0, 0.0]",
        "xyz = [0.4, 0.0, 0.0]\ntolerance = { xyz = 0.001, angle_deg = 0.1 }",
    );
    let loose = balk_checker::Checker::new(&loose, "cup").expect("well written");
    let mut same = proof(HEADER, STEPS);
    same.machine = loose.digest();
    assert!(matches!(
        loose.check(&same, TARGET),
        Err(Rejection::Item {
            index: 7,
            reason: Reason::DoesNotFollow(_),
            ..
        })
    ));
    // 0.49 + 2 * 0.4 lambda + lambda^2 + 2 (lambda + 0.4 a) rho < 0.51.
    let steps = STEPS.replace("0.49", "0.51");
    let mut wider = proof(HEADER, &steps);
    wider.machine = loose.digest();
    assert!(loose.check(&wider, TARGET).is_ok());
}

#[test]
fn only_sums_that_end_a_branch_may_lack_a_quantity() {
    let mut proof = proof(HEADER, STEPS);
    for item in &mut proof.items {
        if let balk_checker::proof::Item::Step(step) = item {
            step.quantity = None;
            step.claim = Claim::Nothing;
        }
    }
    assert!(matches!(
        checker().check(&proof, TARGET),
        Err(Rejection::Item {
            index: 0,
            reason: Reason::NotInRelation,
            ..
        })
    ));
}
