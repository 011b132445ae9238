//! Containment: after every step of a node test, every box still holds the truth.
//!
//! A posture is planted on a random machine built within its tolerances, a target is drawn that
//! the posture meets, and the node test runs on the full limits, on spans cut around the posture
//! and on the halves that hold it. Then every box of every feature seen from every joint, every
//! span, every squared length and every first-order row is compared with the double-precision
//! value of [`crate::truth`].

mod case;
mod tally;

use crate::families::Family as Arm;
use crate::random::{Sample, build, posture, target};
use crate::truth::{Frames, Truth};
use balk::kinematics::joint_values;
use balk::model::{Kind, Machine, Orientation, Target, Tolerance};
use balk::pack::{pack, pack_target, range};
use balk_core::machine::Motion;
use balk_core::propagate::cell::Cell;
use balk_core::propagate::{Goal, Network, Rules};
use balk_core::relaxation::NodeSimplex;
use balk_core::screen::{cells_for, limits};
use case::Case;
use indicatif::ProgressBar;
use nalgebra::Vector3;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;
use std::f64::consts::{FRAC_PI_2, PI};
pub use tally::{Kinds, Margins, Tally};

/// Postures on each machine, each with a target of its own.
const POSTURES: u32 = 5;
/// Boxes of spans cut around the posture, halvings, and cuts chosen by the core.
const STEPS: [u32; 3] = [3, 4, 2];
/// Checks on each machine: those and the full limits.
pub const CHECKS_PER_MACHINE: u64 = (POSTURES * (1 + STEPS[0] + STEPS[1] + STEPS[2])) as u64;
/// One machine in so many is an arm of `machines/`.
const ARMS_EVERY: u64 = 8;

/// A posture whose joints often have special values or lie close to them.
fn special(random: &mut impl Rng, sample: &Sample) -> Option<Vec<f64>> {
    let mut values = posture(random, &sample.written)?;
    for (i, joint) in sample.written.joints.iter().enumerate() {
        if joint.kind != Kind::Revolute || joint.follows.is_some() || random.random() {
            continue;
        }
        let [lo, hi] = range(&sample.written, i);
        let exact = [0.0, FRAC_PI_2, -FRAC_PI_2, PI, -PI][random.random_range(0..5)];
        let near = match random.random_range(0..3) {
            0 => {
                exact + random.random_range(-1.0..1.0) * f64::exp2(random.random_range(-32.0..-4.0))
            }
            _ => exact,
        };
        if lo <= near && near <= hi {
            values[i] = near;
        }
    }
    Some(joint_values(&sample.written, &values))
}

/// Tip axes a target speaks of, in the tip frame.
fn axes(target: &Target) -> Vec<Vector3<f64>> {
    match &target.orientation {
        Orientation::Free => Vec::new(),
        Orientation::Axes(cones) => cones.iter().map(|cone| *cone.tip).collect(),
        Orientation::Near { .. } => vec![Vector3::x(), Vector3::y(), Vector3::z()],
    }
}

/// The machine with other tolerances, and one built within them. Tolerances of one kind alone on a
/// few joints leave no room for an error in the sums over a chain.
fn loosened(random: &mut impl Rng, mut written: Machine) -> Sample {
    let share = random.random();
    for joint in &mut written.joints {
        joint.tolerance = Tolerance::default();
        if random.random_bool(share) {
            let size = f64::exp2(random.random_range(-20.0..-5.0));
            if random.random() {
                joint.tolerance.xyz = size;
            } else {
                joint.tolerance.angle = size;
            }
        }
    }
    let built = build(random, &written);
    Sample { written, built }
}

/// An arm or a random machine, half the time with tolerances of [`loosened`].
fn sample(random: &mut impl Rng, arm: Option<&Arm>) -> Option<Sample> {
    let drawn = match arm {
        Some(arm) => Sample {
            written: arm.machine.clone(),
            built: arm.machine.clone(),
        },
        None => Sample::draw(random)?,
    };
    Some(if random.random() {
        loosened(random, drawn.written)
    } else {
        drawn
    })
}

/// How far the planted truth is moved before it is compared: nothing, but where the comparison
/// itself is tested.
#[derive(Clone, Copy, Debug, Default)]
pub struct Lie {
    /// Added to every joint's value, radians.
    pub values: f64,
}

/// One machine with all its postures: the same for the same seed and number.
///
/// Random draws that cannot be packed, or whose frames doubles do not determine, are drawn again.
pub fn machine(seed: u64, number: u64, arms: &[Arm], lie: Lie) -> Tally {
    let mut random = ChaCha8Rng::seed_from_u64(seed.wrapping_mul(1_000_003).wrapping_add(number));
    let mut tally = Tally::default();
    while tally.postures < POSTURES.into() {
        let which = (number / ARMS_EVERY) as usize % arms.len();
        let arm = number.is_multiple_of(ARMS_EVERY).then(|| &arms[which]);
        let Some(sample) = sample(&mut random, arm) else {
            continue;
        };
        let (Ok(pack), Some(frames)) = (pack(&sample.written, 0), Frames::of(&sample.written))
        else {
            continue;
        };
        tally.machines += 1;
        while tally.postures < POSTURES.into() {
            let Some(values) = special(&mut random, &sample) else {
                break;
            };
            let Some(wanted) = target(&mut random, &sample.built, &values) else {
                break;
            };
            let moved: Vec<f64> = values.iter().map(|v| v + lie.values).collect();
            let variables = pack
                .drives
                .iter()
                .zip(&pack.machine.variables)
                .map(|(drive, variable)| {
                    let value = (moved[drive.joint] - drive.offset) / drive.multiple;
                    match variable.motion {
                        Motion::Turn => value,
                        Motion::Slide => value / pack.scale,
                    }
                })
                .collect();
            let case = Case {
                truth: Truth::of(&frames, &sample.built, &moved, pack.scale),
                variables,
                axes: axes(&wanted),
                name: format!("seed {seed} machine {number} posture {}", tally.postures),
                pack: &pack,
            };
            tally.postures += 1;
            checks(&mut random, &case, &wanted, &mut tally);
        }
    }
    tally
}

/// All checks of one posture and target.
fn checks(random: &mut impl Rng, case: &Case, wanted: &Target, tally: &mut Tally) {
    let chain = case.pack.machine.chain();
    let packed = pack_target(wanted, case.pack.scale);
    let goal = if random.random() {
        Goal::new(&packed)
    } else {
        Goal::new(&case.tight(random, &packed))
    };
    // Some with a random choice of rules, whose boxes others would tighten.
    let rules = if random.random_bool(0.75) {
        Rules::ALL
    } else {
        Rules(random.random())
    };
    let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
    let mut network = Network::new(chain, &goal, rules, &mut cells);
    let mut simplex = NodeSimplex::new();
    let whole = limits(chain);
    let left = case.check(&mut network, &whole, &mut simplex, tally);
    for _ in 0..STEPS[0] {
        let spans = case.around(random, &whole);
        case.check(&mut network, &spans, &mut simplex, tally);
    }
    let mut part = left.clone();
    for _ in 0..STEPS[1] {
        let half = case.half(random, &part, tally);
        part = case.check(&mut network, &half, &mut simplex, tally);
    }
    let mut part = left;
    for _ in 0..STEPS[2] {
        let cut = case.branch(&mut network, &part, tally);
        part = case.check(&mut network, &cut, &mut simplex, tally);
    }
}

/// At least so many checks on every processor; the same for any number of them.
pub fn run(checks: u64, seed: u64, lie: Lie, progress: &ProgressBar) -> Tally {
    let arms = Arm::all();
    let machines = checks.div_ceil(CHECKS_PER_MACHINE);
    progress.set_length(machines);
    let tallies: Vec<Tally> = (0..machines)
        .into_par_iter()
        .map(|number| {
            let tally = machine(seed, number, &arms, lie);
            progress.inc(1);
            tally
        })
        .collect();
    progress.finish_and_clear();
    tallies.into_iter().fold(Tally::default(), Tally::plus)
}

/// Runs and prints a table, then what is needed to repeat the first violations. With `only`, one
/// machine of the run.
pub fn print(checks: u64, seed: u64, only: Option<u64>) {
    let tally = match only {
        Some(number) => machine(seed, number, &Arm::all(), Lie::default()),
        None => run(checks, seed, Lie::default(), &ProgressBar::new(0)),
    };
    println!(
        "{} machines, {} postures, {} checks, {} violations\n",
        tally.machines,
        tally.postures,
        tally.checks,
        tally.violations()
    );
    println!("| compared with the truth | comparisons | violations | least margin, units |");
    println!("|---|---|---|---|");
    for kind in Kinds::ALL {
        let own = tally.of(kind);
        let least = match own.least {
            none if none.is_infinite() => "-".into(),
            least => format!("{least:.2e}"),
        };
        println!(
            "| {} | {} | {} | {least} |",
            kind.name(),
            own.compared,
            own.violations
        );
    }
    for failure in &tally.failures {
        println!("\n{failure}");
    }
}
