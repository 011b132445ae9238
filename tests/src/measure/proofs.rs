//! Proofs of everything the search calls unreachable: how many are written, how large they are,
//! what they cost.

use crate::families::{Family, Kind};
use crate::random::{Sample, posture, target};
use balk::model::{Machine, Target};
use balk::prove::{Prover, Subject};
use balk::search::{Decision, Verdict};
use balk::write::target_line;
use balk_checker::proof::{Item, Proof};
use balk_checker::{Checker, binary, text};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;
use std::time::Instant;

/// What became of one unreachable target; times in seconds.
struct Row {
    line: String,
    nodes: u64,
    steps: usize,
    parts: usize,
    bytes: usize,
    find: f64,
    prove: f64,
    check: f64,
    fault: Option<String>,
}

/// Parts of the joint space a proof looks at.
fn parts_of(proof: &Proof) -> usize {
    let split = |item: &&Item| matches!(item, Item::Split { .. });
    1 + proof.items.iter().filter(split).count()
}

/// Targets that a planted posture meets on random machines: how many the prover "proved"
/// unreachable. Any is a fault of the prover, whether or not the checker finds it.
pub fn planted(machines: u64, parts: u64, seed: u64) -> Vec<String> {
    (0..machines)
        .into_par_iter()
        .flat_map_iter(|number| {
            let mut random = ChaCha8Rng::seed_from_u64(seed ^ (number << 20));
            let mut wrong = Vec::new();
            let Some(sample) = Sample::draw(&mut random) else {
                return wrong;
            };
            let prover = Prover::new(&sample.written, 0, [0; 32]);
            for _ in 0..4 {
                let Some(values) = posture(&mut random, &sample.built) else {
                    continue;
                };
                let Some(target) = target(&mut random, &sample.built, &values) else {
                    continue;
                };
                let subject = Subject {
                    target: &target,
                    line: "",
                    search: [0; 32],
                };
                if prover.prove(&subject, parts).is_ok() {
                    wrong.push(format!("machine {number}: {target:?}"));
                }
            }
            wrong
        })
        .collect()
}

/// The machine of an arm as its file says, the prover and the checker for its tip.
pub struct Bench {
    /// Writes.
    pub prover: Prover,
    /// Checks.
    pub checker: Checker,
    tip: String,
}

impl Bench {
    /// For the first tip of a machine and the text of its file.
    pub fn new(machine: &Machine, text: &str) -> Bench {
        let tip = machine.tips[0].name.clone();
        let checker = Checker::new(text, &tip).expect("the machine's file is well formed");
        Bench {
            prover: Prover::new(machine, 0, checker.digest()),
            checker,
            tip,
        }
    }

    /// Writes and checks the proof of a target.
    fn row(&self, target: &Target, decision: &Decision, digest: [u8; 32], parts: u64) -> Row {
        let line = target_line(target, &self.tip);
        let clock = Instant::now();
        let subject = Subject {
            target,
            line: &line,
            search: digest,
        };
        let proof = self.prover.prove(&subject, parts).ok();
        let prove = clock.elapsed().as_secs_f64();
        let clock = Instant::now();
        let report = proof.as_ref().map(|proof| self.checker.check(proof, &line));
        let check = clock.elapsed().as_secs_f64();
        let bytes = proof.as_ref().map(|proof| {
            let bytes = binary::write(proof).expect("the prover writes what the format holds");
            assert_eq!(
                binary::read(&bytes).as_ref(),
                Ok(proof),
                "binary round trip"
            );
            let words = text::write(proof).expect("the prover writes what the format holds");
            assert_eq!(
                text::read(&words).as_ref().ok(),
                Some(proof),
                "text round trip"
            );
            bytes.len()
        });
        Row {
            steps: proof
                .as_ref()
                .map_or(0, |p| p.items.len() + 1 - parts_of(p)),
            parts: proof.as_ref().map_or(0, parts_of),
            bytes: bytes.unwrap_or(0),
            nodes: decision.nodes,
            find: decision.seconds,
            prove,
            check,
            fault: match report {
                None => Some("no proof".to_owned()),
                Some(Err(rejection)) => Some(format!("{rejection}")),
                Some(Ok(_)) => None,
            },
            line,
        }
    }
}

/// Prints the table.
pub fn run(kinds: &[Kind], targets: usize, nodes: u64, parts: u64, seed: u64) {
    println!(
        "| target | arm | unreachable | proved and valid | parts 50 / 99 % | steps 50 / 99 % | bytes 50 / 99 % | find ms | write ms | check ms | check / find of each, 50 / 99 % |\n|---|---|---|---|---|---|---|---|---|---|---|"
    );
    for &kind in kinds {
        for family in Family::all() {
            let bench = Bench::new(&family.machine, &family.text);
            let rows: Vec<Row> = family
                .targets(kind, targets, seed)
                .par_iter()
                .filter_map(|target| {
                    let decision = family.solver.decide(target, nodes);
                    match decision.verdict {
                        Verdict::Unreachable { proof } => {
                            Some(bench.row(target, &decision, proof, parts))
                        }
                        _ => None,
                    }
                })
                .collect();
            let at = |of: &dyn Fn(&Row) -> f64, share: f64| {
                let mut all: Vec<f64> = rows.iter().map(of).collect();
                all.sort_by(f64::total_cmp);
                let place = (all.len() as f64 * share) as usize;
                all.get(place).copied().unwrap_or(f64::NAN)
            };
            let both =
                |of: &dyn Fn(&Row) -> f64| format!("{:.0} / {:.0}", at(of, 0.5), at(of, 0.99));
            println!(
                "| {} | {} | {} | {} | {} | {} | {} | {:.3} | {:.2} | {:.3} | {:.1} / {:.1} |",
                kind.name(),
                family.name,
                rows.len(),
                rows.iter().filter(|row| row.fault.is_none()).count(),
                both(&|row| row.parts as f64),
                both(&|row| row.steps as f64),
                both(&|row| row.bytes as f64),
                1e3 * at(&|row| row.find, 0.5),
                1e3 * at(&|row| row.prove, 0.5),
                1e3 * at(&|row| row.check, 0.5),
                at(&|row| row.check / row.find, 0.5),
                at(&|row| row.check / row.find, 0.99),
            );
            let faults = rows
                .iter()
                .filter_map(|row| Some((row, row.fault.as_ref()?)));
            for (row, fault) in faults.take(5) {
                eprintln!("{} nodes: {fault}: {}", row.nodes, row.line);
            }
        }
    }
}
