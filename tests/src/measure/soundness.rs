//! Targets that a planted posture meets: none may be refused or called unreachable.

use crate::families::{Family, NAMES};
use crate::random::{Sample, posture, target};
use balk::model::Target;
use balk::search::{Screening, Solver, Verdict};
use indicatif::ProgressBar;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;

/// Splits at which refusals are tried.
const SPLITS: [u16; 3] = [1, 4, 16];

/// What a run found.
#[derive(Clone, Debug, Default)]
pub struct Tally {
    /// Machines drawn that the packer takes.
    pub machines: u32,
    /// Targets, each met by a posture.
    pub targets: u32,
    /// Refused at each of the splits.
    pub refused: [u32; 3],
    /// Called unreachable.
    pub unreachable: u32,
    /// Called reachable.
    pub reachable: u32,
    /// The first few failures: everything needed to repeat them.
    pub failures: Vec<String>,
}

impl Tally {
    /// Number of false answers.
    pub fn wrong(&self) -> u32 {
        self.refused.iter().sum::<u32>() + self.unreachable
    }

    fn plus(mut self, other: Tally) -> Tally {
        self.machines += other.machines;
        self.targets += other.targets;
        for (own, others) in self.refused.iter_mut().zip(other.refused) {
            *own += others;
        }
        self.unreachable += other.unreachable;
        self.reachable += other.reachable;
        self.failures.extend(other.failures);
        self.failures.truncate(8);
        self
    }
}

/// One machine with the given seed and `targets` planted targets.
pub fn machine(seed: u64, targets: u32, nodes: u64) -> Tally {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    let mut tally = Tally::default();
    // Every sixteenth is one of the measured arms.
    let sample = if seed.is_multiple_of(16) {
        let arm = Family::read(NAMES[seed as usize / 16 % NAMES.len()]).machine;
        Some(Sample {
            built: arm.clone(),
            written: arm,
        })
    } else {
        Sample::draw(&mut random)
    };
    let Some(sample) = sample else {
        return tally;
    };
    let Ok(solver) = Solver::new(&sample.written, 0) else {
        return tally;
    };
    tally.machines = 1;
    for number in 0..targets {
        let Some(values) = posture(&mut random, &sample.written) else {
            break;
        };
        let Some(wanted) = target(&mut random, &sample.built, &values) else {
            break;
        };
        let before = tally.wrong();
        judge(&solver, &wanted, nodes, &mut tally);
        if tally.wrong() > before && tally.failures.len() < 2 {
            tally.failures.push(format!(
                "seed {seed} target {number} (tolerances {}): {}; posture {values:?}; {wanted:?}",
                sample
                    .written
                    .joints
                    .iter()
                    .any(|j| j.tolerance.angle > 0.0),
                followers(&solver),
            ));
        }
    }
    tally
}

fn followers(solver: &Solver) -> String {
    let joints = &solver.pack.machine.joints;
    let parts: Vec<String> = joints
        .iter()
        .map(|j| format!("{:?} {} x{}", j.motion, j.variable, j.multiple))
        .collect();
    parts.join(", ")
}

fn judge(solver: &Solver, wanted: &Target, nodes: u64, tally: &mut Tally) {
    tally.targets += 1;
    // The larger the budget the rarer, so that many targets are tried in a given time.
    let every = [1, 2, 8];
    let number = tally.targets;
    for ((count, splits), every) in tally.refused.iter_mut().zip(SPLITS).zip(every) {
        if !number.is_multiple_of(every) {
            continue;
        }
        *count += u32::from(matches!(
            solver.screen(wanted, splits),
            Screening::Refused { .. }
        ));
    }
    match solver.decide(wanted, nodes).verdict {
        Verdict::Unreachable { .. } => tally.unreachable += 1,
        Verdict::Reachable { .. } => tally.reachable += 1,
        Verdict::Undecided { .. } => {}
    }
}

/// Many machines on every processor; the same answers for any number of them.
pub fn run(machines: u64, targets: u32, nodes: u64, seed: u64, progress: &ProgressBar) -> Tally {
    progress.set_length(machines);
    let tallies: Vec<Tally> = (0..machines)
        .into_par_iter()
        .map(|i| {
            let seed = seed.wrapping_mul(1_000_003).wrapping_add(i);
            let tally = machine(seed, targets, nodes);
            progress.inc(1);
            if tally.wrong() > 0 {
                progress.suspend(|| eprintln!("{}", tally.failures.join("\n")));
            }
            tally
        })
        .collect();
    progress.finish_and_clear();
    tallies.into_iter().fold(Tally::default(), Tally::plus)
}

/// Runs and prints one table, then what is needed to repeat the first failures.
pub fn print(machines: u64, targets: u32, nodes: u64, seed: u64) {
    let tally = run(machines, targets, nodes, seed, &ProgressBar::new(0));
    println!("| machines | targets | refused at 1 / 4 / 16 splits | unreachable | reachable |");
    println!("|{}", "---|".repeat(5));
    let [one, four, sixteen] = tally.refused;
    println!(
        "| {} | {} | {one} / {four} / {sixteen} | {} | {} |",
        tally.machines, tally.targets, tally.unreachable, tally.reachable
    );
    for failure in &tally.failures {
        println!("\n{failure}");
    }
}
