//! Nodes that are empty but that propagation leaves open: what each family of rows refutes of them.

use super::arm::Arm;
use super::program::{self, End};
use super::{MACHINES, NARROW, PIVOTS, Programs, SETS, median};
use balk::pack::pack_target;
use balk_core::propagate::cell::Cell;
use balk_core::propagate::{Branch, Goal, Network, Rules, Spans};
use balk_core::relaxation::relax;
use balk_core::screen::{cells_for, limits};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use std::time::Instant;

/// Most targets drawn for one table.
const MOST_TARGETS: usize = 4000;

/// Nodes that propagation leaves open in the search of an unreachable target: the root, then others.
/// `None` when the search does not end.
fn open_nodes(arm: &Arm, goal: &Goal, most: u64) -> Option<Vec<Spans>> {
    let chain = arm.chain();
    let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
    let mut network = Network::new(chain, goal, Rules::ALL, &mut cells);
    let mut root = limits(chain);
    let mut open = Vec::new();
    if network.propagate(&mut root).is_ok() {
        open.push(root);
    }
    let mut met = Vec::new();
    let mut nodes = 0;
    while let Some(spans) = open.pop() {
        nodes += 1;
        if nodes > most {
            return None;
        }
        met.push(spans.clone());
        match network.branch(&spans, 3) {
            Branch::Narrow => return None,
            Branch::Cut { lower, upper, .. } => open.extend([lower, upper].into_iter().flatten()),
        }
    }
    Some(met)
}

/// One method over a set of nodes.
#[derive(Clone, Default)]
struct Score {
    tried: u64,
    refuted: u64,
    /// Refuted here but not by first-order rows.
    new: u64,
    seconds: Vec<f64>,
    rows: u64,
    pivots: u64,
    ends: [u64; 5],
}

impl Score {
    fn line(&self) -> String {
        let n = self.tried.max(1) as f64;
        format!(
            "{:5.1} % | {:5.1} % | {:7.0} | {:4.0} | {:5.0} | {:?}",
            100.0 * self.refuted as f64 / n,
            100.0 * self.new as f64 / n,
            1e6 * median(&self.seconds),
            self.rows as f64 / n,
            self.pivots as f64 / n,
            self.ends,
        )
    }
}

/// Scores of propagation alone, first-order rows, and every step of lifted rows.
#[derive(Clone, Default)]
struct Scores {
    propagation: Score,
    first_order: Score,
    steps: [Score; SETS.len()],
}

fn measure_node(
    arm: &Arm,
    goal: &Goal,
    spans: &Spans,
    (wide, narrow, small): &mut Programs,
    scores: &mut Scores,
) {
    let chain = arm.chain();
    let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
    let mut network = Network::new(chain, goal, Rules::ALL, &mut cells);
    let mut spans = spans.clone();
    let clock = Instant::now();
    let closed = network.propagate(&mut spans).is_err();
    scores
        .propagation
        .seconds
        .push(clock.elapsed().as_secs_f64());
    scores.propagation.tried += 1;
    if closed {
        scores.propagation.refuted += 1;
        return;
    }
    let clock = Instant::now();
    let first = relax(&network, &mut spans.clone(), small, 60).is_ok();
    let score = &mut scores.first_order;
    score.seconds.push(clock.elapsed().as_secs_f64());
    score.tried += 1;
    score.refuted += u64::from(first);
    for (k, ((_, families), score)) in SETS.iter().zip(&mut scores.steps).enumerate() {
        let clock = Instant::now();
        let attempt = if k + NARROW >= SETS.len() {
            program::refute(&network, *families, narrow, PIVOTS)
        } else {
            program::refute(&network, *families, wide, PIVOTS)
        };
        score.seconds.push(clock.elapsed().as_secs_f64());
        score.tried += 1;
        score.rows += attempt.rows as u64;
        score.pivots += u64::from(attempt.pivots);
        score.ends[match attempt.end {
            End::Refuted => 0,
            End::Unconfirmed => 1,
            End::Feasible => 2,
            End::Full => 3,
            End::Stopped => 4,
        }] += 1;
        if attempt.refuted.is_some() {
            score.refuted += 1;
            score.new += u64::from(!first);
        }
    }
}

/// Prints, for every arm and kind of task, what each family of rows refutes of the nodes that are
/// empty but that propagation leaves open: at the root (`roots` of them) and below, there at most
/// `below` of one target.
pub fn run(roots: u64, below: usize, kinds: &[&str]) {
    for kind in kinds {
        for name in MACHINES {
            let arm = Arm::read(name);
            let mut rng = ChaCha8Rng::seed_from_u64(7);
            let mut programs = (Box::default(), Box::default(), Default::default());
            let mut at_root = Scores::default();
            let mut in_tree = Scores::default();
            let mut targets = 0;
            let mut drawn = 0;
            while at_root.first_order.tried < roots && drawn < MOST_TARGETS {
                drawn += 1;
                let target = arm.target(kind, &mut rng);
                if arm.easily_reached(&target, &mut rng) {
                    continue;
                }
                let packed = pack_target(&target, arm.pack.scale);
                let goal = Goal::new(&packed);
                let Some(nodes) = open_nodes(&arm, &goal, 600) else {
                    continue;
                };
                targets += 1;
                let Some((root, others)) = nodes.split_first() else {
                    continue;
                };
                measure_node(&arm, &goal, root, &mut programs, &mut at_root);
                // Evenly spread over the search.
                let step = others.len().div_ceil(below.max(1)).max(1);
                for node in others.iter().step_by(step) {
                    measure_node(&arm, &goal, node, &mut programs, &mut in_tree);
                }
            }
            println!("\n### {kind}, {name}: {targets} unreachable targets of {drawn}\n");
            for (place, scores) in [("root", &at_root), ("tree", &in_tree)] {
                println!(
                    "{place}: {} nodes open after propagation\n",
                    scores.first_order.tried
                );
                println!(
                    "| rows | refuted | not by first order | us, median | rows | pivots | refuted, unconfirmed, feasible, full, stopped |"
                );
                println!("|---|---|---|---|---|---|---|");
                println!("| propagation again | {} |", scores.propagation.line());
                println!("| first order | {} |", scores.first_order.line());
                for ((label, _), score) in SETS.iter().zip(&scores.steps) {
                    println!("| {label} | {} |", score.line());
                }
                println!();
            }
        }
    }
}
