//! Complete decision and screening on the three arms, beside the checks people use today.

use crate::families::{Family, Kind};
use balk::kinematics;
use balk::model::Target;
use balk::posture::Linkage;
use balk::search::{Screening, Verdict};
use indicatif::{ProgressBar, ProgressStyle};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::time::Instant;

/// Split budgets of the catch rates.
const SPLITS: [u16; 4] = [1, 4, 8, 16];
/// Starts of the damped least squares that stands for common practice.
const STARTS: [usize; 3] = [1, 10, 100];
/// Squared residual that counts as converged.
const CONVERGED: f64 = 1e-18;

/// What to measure.
pub struct Options {
    /// Kinds of target.
    pub kinds: Vec<Kind>,
    /// Targets per arm and kind.
    pub targets: usize,
    /// Of those, how many the damped least squares is tried on.
    pub baseline: usize,
    /// Node budget of a decision.
    pub nodes: u64,
    /// Seed of the targets.
    pub seed: u64,
}

/// Times and nodes of one kind of answer.
#[derive(Default)]
struct Sample {
    milliseconds: Vec<f64>,
    nodes: Vec<f64>,
}

/// A share of a sorted sample: its value at that quantile.
fn quantile(sorted: &[f64], share: f64) -> f64 {
    let last = sorted.len().saturating_sub(1);
    sorted
        .get(((sorted.len() as f64 * share) as usize).min(last))
        .copied()
        .unwrap_or(f64::NAN)
}

/// A baseline's errors and cost.
#[derive(Default)]
struct Baseline {
    reachable: usize,
    unreachable: usize,
    false_refusals: usize,
    caught: usize,
    seconds: f64,
}

impl Baseline {
    fn add(&mut self, reachable: bool, refused: bool, seconds: f64) {
        self.seconds += seconds;
        if reachable {
            self.reachable += 1;
            self.false_refusals += usize::from(refused);
        } else {
            self.unreachable += 1;
            self.caught += usize::from(refused);
        }
    }

    fn row(&self, arm: &str, name: &str, ours: f64) -> String {
        let count = (self.reachable + self.unreachable).max(1) as f64;
        let each = self.seconds / count;
        format!(
            "| {arm} | {name} | {:.2} % | {:.2} % | {:.4} | {:.2} |",
            percent(self.false_refusals, self.reachable),
            percent(self.caught, self.unreachable),
            each * 1e3,
            each / ours,
        )
    }
}

fn percent(part: usize, whole: usize) -> f64 {
    part as f64 / whole.max(1) as f64 * 100.0
}

/// Prints three tables for every kind: decisions, catch rates, baselines. One thread.
pub fn run(options: &Options) {
    for &kind in &options.kinds {
        println!("\n### {}\n", kind.name());
        let mut catches = Vec::new();
        let mut baselines = Vec::new();
        println!(
            "| arm | answer | share | ms median | 99 % | most | nodes median | 99 % | most |\n\
             |---|---|---|---|---|---|---|---|---|"
        );
        for family in Family::all() {
            arm(&family, kind, options, &mut catches, &mut baselines);
        }
        println!(
            "\n| arm | splits | refused of the unreachable | of the reachable | ms mean |\n|---|---|---|---|---|"
        );
        catches.iter().for_each(|row| println!("{row}"));
        println!(
            "\n| arm | check | false refusals | caught | ms mean | time / ours |\n|---|---|---|---|---|---|"
        );
        baselines.iter().for_each(|row| println!("{row}"));
    }
}

fn arm(
    family: &Family,
    kind: Kind,
    options: &Options,
    catches: &mut Vec<String>,
    baselines: &mut Vec<String>,
) {
    let targets = family.targets(kind, options.targets, options.seed);
    let bar = ProgressBar::new(targets.len() as u64).with_style(
        ProgressStyle::with_template("{msg} {bar:40} {pos}/{len}, {eta} left")
            .expect("the template is fixed"),
    );
    bar.set_message(family.name);
    let mut samples = [Sample::default(), Sample::default(), Sample::default()];
    let mut screens = SPLITS.map(|_| Baseline::default());
    let mut ball = Baseline::default();
    let mut squares = STARTS.map(|_| Baseline::default());
    let mut ours = Baseline::default();
    let linkage = Linkage::new(&family.machine, 0, &family.solver.pack.drives);
    let mut rng = ChaCha8Rng::seed_from_u64(options.seed ^ 1);
    for (number, target) in targets.iter().enumerate() {
        let decision = family.solver.decide(target, options.nodes);
        let answer = match decision.verdict {
            Verdict::Reachable { .. } => 0,
            Verdict::Unreachable { .. } => 1,
            Verdict::Undecided { .. } => 2,
        };
        samples[answer].milliseconds.push(decision.seconds * 1e3);
        samples[answer].nodes.push(decision.nodes as f64);
        bar.inc(1);
        if answer == 2 {
            continue;
        }
        let reachable = answer == 0;
        ours.add(reachable, !reachable, decision.seconds);
        // A reachable target uses up the whole budget: a tenth of them is enough.
        let screened = !reachable || number.is_multiple_of(10);
        for (screen, splits) in screens.iter_mut().zip(SPLITS).filter(|_| screened) {
            let clock = Instant::now();
            let refused = matches!(
                family.solver.screen(target, splits),
                Screening::Refused { .. }
            );
            screen.add(reachable, refused, clock.elapsed().as_secs_f64());
            assert!(!(reachable && refused), "false refusal of {target:?}");
        }
        let clock = Instant::now();
        let outside = (target.xyz - family.centre).norm() > family.reach + target.xyz_within.norm();
        ball.add(reachable, outside, clock.elapsed().as_secs_f64());
        if number < options.baseline {
            for (square, starts) in squares.iter_mut().zip(STARTS) {
                let clock = Instant::now();
                let found = (0..starts).any(|_| converges(family, &linkage, target, &mut rng));
                square.add(reachable, !found, clock.elapsed().as_secs_f64());
            }
        }
    }
    bar.finish_and_clear();
    for (sample, answer) in samples
        .iter_mut()
        .zip(["reachable", "unreachable", "undecided"])
    {
        let share = percent(sample.nodes.len(), targets.len());
        sample.milliseconds.sort_by(f64::total_cmp);
        sample.nodes.sort_by(f64::total_cmp);
        let (t, n) = (&sample.milliseconds, &sample.nodes);
        if t.is_empty() {
            println!("| {} | {answer} | {share:.2} % | | | | | | |", family.name);
            continue;
        }
        println!(
            "| {} | {answer} | {share:.2} % | {:.4} | {:.3} | {:.2} | {} | {} | {} |",
            family.name,
            quantile(t, 0.5),
            quantile(t, 0.99),
            quantile(t, 1.0),
            quantile(n, 0.5),
            quantile(n, 0.99),
            quantile(n, 1.0),
        );
    }
    for (screen, splits) in screens.iter().zip(SPLITS) {
        catches.push(format!(
            "| {} | {splits} | {:.2} % | {:.2} % | {:.4} |",
            family.name,
            percent(screen.caught, screen.unreachable),
            percent(screen.false_refusals, screen.reachable),
            screen.seconds * 1e3 / (screen.reachable + screen.unreachable).max(1) as f64,
        ));
    }
    let each = ours.seconds / (ours.reachable + ours.unreachable).max(1) as f64;
    baselines.push(ours.row(family.name, "decide", each));
    baselines.push(ball.row(family.name, "reach ball", each));
    for (square, starts) in squares.iter().zip(STARTS) {
        let name = format!("least squares, {starts} starts");
        baselines.push(square.row(family.name, &name, each));
    }
}

/// One attempt of damped least squares from a random start within limits.
fn converges(family: &Family, linkage: &Linkage, target: &Target, rng: &mut impl Rng) -> bool {
    let mut values: Vec<f64> = linkage
        .limits
        .iter()
        .map(|&[lo, hi]| rng.random_range(lo..hi))
        .collect();
    if linkage.seek(target, &mut values) > CONVERGED {
        return false;
    }
    let mut joints = vec![0.0; family.machine.joints.len()];
    for (drive, value) in family.solver.pack.drives.iter().zip(values) {
        joints[drive.joint] = value;
    }
    let joints = kinematics::joint_values(&family.machine, &joints);
    kinematics::meets(&family.machine, target, &joints, kinematics::ALLOWANCE)
}
