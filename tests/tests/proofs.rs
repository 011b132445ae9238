//! Every target called unreachable has a proof that the independent checker accepts, and no target
//! that a posture meets has one.

use balk::evidence::Evidence;
use balk::model::Machine;
use balk::prove::Subject;
use balk::read::Line;
use balk::search::{Solver, Verdict};
use balk::write::{machine_file, target_line};
use balk_tests::families::{Family, Kind};
use balk_tests::measure::proofs::planted;
use balk_tests::random::{Sample, posture, target};
use nalgebra::Vector3;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// The machine as its own file reads.
fn reread(machine: &Machine) -> (String, Machine) {
    let text = machine_file(machine);
    let machine = balk::read::machine(text.as_bytes(), "machine").expect("it was written well");
    (text, machine)
}

#[test]
fn unreachable_targets_of_the_arms_are_proved() {
    for family in Family::all() {
        let evidence = Evidence::new(&family.machine, 0, &family.text).expect("well formed");
        let tip = &family.machine.tips[0].name;
        let mut proved = 0;
        for kind in [Kind::Pose, Kind::Point, Kind::Cone] {
            for target in family.targets(kind, 12, 3) {
                let decision = family.solver.decide(&target, 200);
                if let Verdict::Unreachable { proof } = decision.verdict {
                    let line = target_line(&target, tip);
                    let subject = Subject {
                        target: &target,
                        line: &line,
                        search: proof,
                    };
                    let proof = evidence.prove(&subject);
                    assert!(proof.is_ok(), "{}: {line}: {:?}", family.name, proof.err());
                    proved += 1;
                }
            }
        }
        assert!(proved > 5, "{}: only {proved}", family.name);
    }
}

/// Every way to write a target, angles at their ends: the corpus keeps proofs of them, this asks for
/// new ones.
#[test]
fn unreachable_targets_of_the_corpus_are_proved() {
    let text = include_str!("../corpus/arm.toml");
    let machine = balk::read::machine(text.as_bytes(), "arm.toml").expect("well formed");
    let solver = Solver::new(&machine, 0).expect("can be packed");
    let evidence = Evidence::new(&machine, 0, text).expect("well formed");
    let mut proved = 0;
    for (number, line) in (1..).zip(include_str!("../corpus/arm.jsonl").lines()) {
        let read = Line {
            number,
            bytes: Some(line.as_bytes().to_vec()),
        };
        let target = balk::read::target(&read, "arm.jsonl", &machine).expect("well formed");
        if let Verdict::Unreachable { proof } = solver.decide(&target, 400).verdict {
            let subject = Subject {
                target: &target,
                line,
                search: proof,
            };
            let proof = evidence.prove(&subject);
            assert!(proof.is_ok(), "{line}: {:?}", proof.err());
            proved += 1;
        }
    }
    assert!(proved > 10, "only {proved}");
}

/// Turning, sliding, fixed and following joints, tolerances, every kind of target.
#[test]
fn unreachable_targets_of_random_machines_are_proved() {
    let mut random = ChaCha8Rng::seed_from_u64(20);
    let (mut proved, mut without) = (0, Vec::new());
    for number in 0..40 {
        let Some(sample) = Sample::draw(&mut random) else {
            continue;
        };
        let (text, machine) = reread(&sample.written);
        let Ok(solver) = Solver::new(&machine, 0) else {
            continue;
        };
        let evidence = Evidence::new(&machine, 0, &text).expect("the checker reads it, too");
        let tip = &machine.tips[0].name;
        for _ in 0..4 {
            let Some(values) = posture(&mut random, &machine) else {
                continue;
            };
            let Some(mut target) = target(&mut random, &machine, &values) else {
                continue;
            };
            target.xyz += Vector3::from_fn(|_, _| random.random_range(-1.0..1.0));
            let Verdict::Unreachable { proof } = solver.decide(&target, 60).verdict else {
                continue;
            };
            let line = target_line(&target, tip);
            let subject = Subject {
                target: &target,
                line: &line,
                search: proof,
            };
            match evidence.prove(&subject) {
                Ok(_) => proved += 1,
                Err(reason) => without.push(format!("machine {number}: {line}: {reason}")),
            }
        }
    }
    assert!(without.is_empty(), "{proved} proved, not {without:#?}");
    assert!(proved > 60, "only {proved}");
}

#[test]
fn nothing_that_a_posture_meets_is_proved_unreachable() {
    assert_eq!(planted(16, 1, 9), Vec::<String>::new());
}
