//! Whole decisions with and without lifted rows.

use super::arm::Arm;
use super::program::{self, Families};
use super::{MACHINES, PIVOTS, Programs, SETS, median};
use balk::model::Target;
use balk::pack::pack_target;
use balk_core::propagate::cell::Cell;
use balk_core::propagate::{Branch, Goal, Network, Rules};
use balk_core::relaxation::relax;
use balk_core::screen::{cells_for, limits};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use std::time::Instant;

/// How a search tests its nodes.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Test {
    /// Propagation alone.
    Propagation,
    /// And first-order rows.
    FirstOrder,
    /// And lifted rows after them, where those of the first order fail, in the small program.
    Lifted(Families),
    /// The same in the large program, at the root only.
    AtRoot(Families),
}

/// What a search came to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Found {
    Reachable,
    Unreachable,
    Undecided,
}

/// Branch and bound with postures sought from the middle of every node.
fn search(
    arm: &Arm,
    target: &Target,
    test: Test,
    most: u64,
    (wide, narrow, small): &mut Programs,
) -> (Found, u64) {
    let goal = Goal::new(&pack_target(target, arm.pack.scale));
    let chain = arm.chain();
    let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
    let mut network = Network::new(chain, &goal, Rules::ALL, &mut cells);
    let mut nodes = 1;
    let mut root = limits(chain);
    let mut open = Vec::new();
    if network.propagate(&mut root).is_ok() {
        open.push(root);
    }
    while let Some(mut spans) = open.pop() {
        if network.propagate(&mut spans).is_err() {
            continue;
        }
        let first = test != Test::Propagation;
        if first && relax(&network, &mut spans, small, 60).is_ok() {
            continue;
        }
        let attempt = match test {
            Test::Lifted(families) => {
                Some(program::refute(&network, families, &mut **narrow, PIVOTS))
            }
            Test::AtRoot(families) if nodes == 1 => {
                Some(program::refute(&network, families, &mut **wide, PIVOTS))
            }
            _ => None,
        };
        if attempt.is_some_and(|attempt| attempt.refuted.is_some()) {
            continue;
        }
        let mut values = arm.middle(&spans);
        if arm.linkage.seek(target, &mut values) < 1e-18 {
            return (Found::Reachable, nodes);
        }
        if nodes >= most {
            return (Found::Undecided, nodes);
        }
        match network.branch(&spans, 3) {
            Branch::Narrow => return (Found::Undecided, nodes),
            Branch::Cut { lower, upper, .. } => {
                nodes += 2;
                let mut parts: Vec<_> = [lower, upper]
                    .into_iter()
                    .flatten()
                    .map(|part| (network.effort(&part), part))
                    .collect();
                parts.sort_by(|a, b| a.0.total_cmp(&b.0));
                open.extend(parts.into_iter().map(|part| part.1));
            }
        }
    }
    (Found::Unreachable, nodes)
}

/// Prints nodes and time of whole decisions with each node test, over the same random targets.
pub fn run(targets: usize, kinds: &[&str]) {
    let tests = [
        ("propagation", Test::Propagation),
        ("+ first-order rows", Test::FirstOrder),
        (
            "+ lifted: tip features, arcs, squares",
            Test::Lifted(SETS[2].1),
        ),
        (
            "+ lifted: all, at the root only",
            Test::AtRoot(Families::ALL),
        ),
    ];
    for kind in kinds {
        for name in MACHINES {
            let arm = Arm::read(name);
            let mut programs = (Box::default(), Box::default(), Default::default());
            println!("\n### {kind}, {name}: {targets} targets\n");
            println!(
                "| node test | reachable | unreachable | undecided | nodes, unreachable: mean, 99 %, max | ms, unreachable: median, mean, max | nodes, reachable: mean | ms, reachable: median |"
            );
            println!("|---|---|---|---|---|---|---|---|");
            for (label, test) in tests {
                let mut rng = ChaCha8Rng::seed_from_u64(11);
                let mut found: [Vec<(u64, f64)>; 3] = Default::default();
                for _ in 0..targets {
                    let target = arm.target(kind, &mut rng);
                    let clock = Instant::now();
                    let (answer, nodes) = search(&arm, &target, test, 300, &mut programs);
                    found[answer as usize].push((nodes, clock.elapsed().as_secs_f64() * 1e3));
                }
                let counts = [0, 1, 2].map(|k| found[k].len());
                let mean = |k: usize, of: fn(&(u64, f64)) -> f64| {
                    found[k].iter().map(of).sum::<f64>() / counts[k].max(1) as f64
                };
                let middle = |k: usize| {
                    median(
                        &found[k]
                            .iter()
                            .map(|f: &(u64, f64)| f.1)
                            .collect::<Vec<_>>(),
                    )
                };
                let mut nodes: Vec<u64> = found[1].iter().map(|f| f.0).collect();
                nodes.sort_unstable();
                let slowest = found[1].iter().map(|f| f.1).fold(0.0, f64::max);
                println!(
                    "| {label} | {} | {} | {} | {:.2}, {}, {} | {:.2}, {:.2}, {slowest:.1} | {:.2} | {:.2} |",
                    counts[0],
                    counts[1],
                    counts[2],
                    mean(1, |f| f.0 as f64),
                    nodes.get(nodes.len() * 99 / 100).unwrap_or(&0),
                    nodes.last().unwrap_or(&0),
                    middle(1),
                    mean(1, |f| f.1),
                    mean(0, |f| f.0 as f64),
                    middle(0),
                );
            }
        }
    }
}
