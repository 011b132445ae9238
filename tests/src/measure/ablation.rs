//! What each rule, row and heuristic gains.

use super::base_frame::BaseFrame;
use crate::families::{Family, Kind};
use balk::model::Target;
use balk::search::{Screening, Verdict};
use balk_core::propagate::Rules;
use balk_core::screen::Options;

/// Node budget while measuring.
const NODES: u64 = 300;
/// Node budget that finds out the truth.
const TRUTH: u64 = 3000;

/// The rules of propagation in the order they are added.
const STEPS: [(&str, Rules); 6] = [
    ("+ joint origins", Rules::ORIGINS),
    ("+ joint axes", Rules::AXES),
    ("+ base origin and axis", Rules::BASE),
    ("+ mutual equalities", Rules::MUTUAL),
    ("+ closing by the angle", Rules::SPREAD),
    ("+ sectors", Rules::SECTOR),
];

/// One line of the table: a name and what runs.
fn variants() -> Vec<(String, Options)> {
    let least = Options {
        rules: Rules(0),
        pivots: 0,
        candidates: 1,
        ..Options::default()
    };
    let mut variants = vec![("tip only, relative frames".to_string(), least)];
    let mut rules = 0;
    for (name, rule) in STEPS {
        rules |= rule.0;
        variants.push((
            name.to_string(),
            Options {
                rules: Rules(rules),
                ..least
            },
        ));
    }
    let rows = Options {
        rules: Rules(rules),
        pivots: Options::default().pivots,
        ..least
    };
    variants.push(("+ first-order rows".to_string(), rows));
    let shaving = Options {
        rules: Rules(rules | Rules::SHAVING.0),
        ..rows
    };
    variants.push(("+ shaving".to_string(), shaving));
    for candidates in [2, 3] {
        variants.push((
            format!("+ best of {candidates} cuts"),
            Options {
                candidates,
                ..Options::default()
            },
        ));
    }
    for (name, rule) in STEPS {
        variants.push((
            format!("all without {}", name.trim_start_matches("+ ")),
            Options {
                rules: Rules(Rules::ALL.0 & !rule.0),
                ..Options::default()
            },
        ));
    }
    for (name, options) in [
        (
            "all without first-order rows",
            Options {
                pivots: 0,
                ..Options::default()
            },
        ),
        (
            "all without shaving",
            Options {
                rules: Rules(Rules::ALL.0 & !Rules::SHAVING.0),
                ..Options::default()
            },
        ),
    ] {
        variants.push((name.to_string(), options));
    }
    variants
}

/// Prints a table for every kind of target: refused at one and eight splits of the truly
/// unreachable, undecided, nodes and time of the unreachable, one row per variant and arm.
pub fn run(kinds: &[Kind], targets: usize, seed: u64) {
    for &kind in kinds {
        println!("\n### {}\n", kind.name());
        println!(
            "| variant | arm | refused at 1 split | at 8 | undecided at {NODES} nodes | \
             nodes mean, unreachable | ms mean, unreachable |\n|---|---|---|---|---|---|---|"
        );
        let mut arms: Vec<(Family, Vec<Target>)> = Family::all()
            .into_iter()
            .map(|family| {
                let impossible = family
                    .targets(kind, targets, seed)
                    .into_iter()
                    .filter(|target| {
                        matches!(
                            family.solver.decide(target, TRUTH).verdict,
                            Verdict::Unreachable { .. }
                        )
                    })
                    .collect();
                (family, impossible)
            })
            .collect();
        if matches!(kind, Kind::Pose) {
            for (family, impossible) in &arms {
                let base = BaseFrame::new(&family.machine);
                let caught = impossible.iter().filter(|t| base.refuses(t)).count();
                println!(
                    "| base frame only | {} | {:.1} % | | | | |",
                    family.name,
                    share(caught, impossible.len())
                );
            }
        }
        for (name, options) in variants() {
            for (family, impossible) in &mut arms {
                family.solver.options = options;
                row(&name, family, impossible);
            }
        }
    }
}

fn share(part: usize, whole: usize) -> f64 {
    part as f64 / whole.max(1) as f64 * 100.0
}

fn row(name: &str, family: &Family, impossible: &[Target]) {
    let refused = |splits| {
        impossible
            .iter()
            .filter(|target| {
                matches!(
                    family.solver.screen(target, splits),
                    Screening::Refused { .. }
                )
            })
            .count()
    };
    let (one, eight) = (refused(1), refused(8));
    let (mut undecided, mut nodes, mut seconds) = (0, 0, 0.0);
    for target in impossible {
        let decision = family.solver.decide(target, NODES);
        nodes += decision.nodes;
        seconds += decision.seconds;
        undecided += usize::from(matches!(decision.verdict, Verdict::Undecided { .. }));
    }
    let count = impossible.len();
    println!(
        "| {name} | {} | {:.1} % | {:.1} % | {:.1} % | {:.2} | {:.3} |",
        family.name,
        share(one, count),
        share(eight, count),
        share(undecided, count),
        nodes as f64 / count.max(1) as f64,
        seconds * 1e3 / count.max(1) as f64,
    );
}
