//! Measurements, one command each: every figure of `tests/README.md` comes from here.

use balk_tests::families::Kind;
use balk_tests::measure;
use clap::{Parser, Subcommand};

#[derive(Parser)]
#[command(
    name = "measure",
    version,
    about = "Measure balk: every command prints a table"
)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// What each rule, row and heuristic gains
    Ablation {
        /// Kinds of target
        #[arg(long, value_enum, value_delimiter = ',', default_values_t = Kind::ALL)]
        kinds: Vec<Kind>,
        /// Targets per arm and kind, of which the unreachable are used
        #[arg(long, default_value_t = 600)]
        targets: usize,
        /// Seed of the targets
        #[arg(long, default_value_t = 11)]
        seed: u64,
    },
    /// Every box, span and row of the node test beside the truth of planted postures
    Containment {
        /// Node tests, each with all its boxes
        #[arg(long, default_value_t = 1_000_000)]
        checks: u64,
        /// Seed of machines, postures and targets
        #[arg(long, default_value_t = 5)]
        seed: u64,
        /// Repeat only this machine of the run
        #[arg(long)]
        machine: Option<u64>,
    },
    /// Complete decision and screening on the three arms, beside common checks
    Families {
        /// Kinds of target
        #[arg(long, value_enum, value_delimiter = ',', default_values_t = Kind::ALL)]
        kinds: Vec<Kind>,
        /// Targets per arm and kind
        #[arg(long, default_value_t = 10_000)]
        targets: usize,
        /// Of those, how many the damped least squares is tried on
        #[arg(long, default_value_t = 500)]
        baseline: usize,
        /// Node budget of a decision
        #[arg(long, default_value_t = 10_000)]
        nodes: u64,
        /// Seed of the targets
        #[arg(long, default_value_t = 7)]
        seed: u64,
    },
    /// Forged proofs: what the checker says of proofs that were tampered with
    Forgeries {
        /// Proofs
        #[arg(long, default_value_t = 200)]
        proofs: usize,
        /// Of those, how many have every bit flipped with the digest made right again
        #[arg(long, default_value_t = 20)]
        flipped: usize,
        /// Changes of one field
        #[arg(long, default_value_t = 100_000)]
        edits: u64,
        /// Seed of targets and changes
        #[arg(long, default_value_t = 3)]
        seed: u64,
    },
    /// The certificate kernel against plain reasoning on every small system
    Kernel,
    /// Lifted envelope and hull rows: what they would add (hours with large numbers)
    Lifted {
        /// Root nodes per arm and kind
        #[arg(long, default_value_t = 5)]
        roots: u64,
        /// Nodes below them
        #[arg(long, default_value_t = 2)]
        below: usize,
        /// Whole decisions per arm and kind
        #[arg(long, default_value_t = 20)]
        targets: usize,
        /// Kinds of target: pose, cone, box, point
        #[arg(long, value_delimiter = ',', default_value = "pose,cone,box,point")]
        kinds: Vec<String>,
    },
    /// Proofs of unreachable targets: size, time, and what the independent checker says
    Proofs {
        /// Kinds of target
        #[arg(long, value_enum, value_delimiter = ',', default_values_t = Kind::ALL)]
        kinds: Vec<Kind>,
        /// Targets per arm and kind
        #[arg(long, default_value_t = 1000)]
        targets: usize,
        /// Node budget of a decision
        #[arg(long, default_value_t = 10_000)]
        nodes: u64,
        /// Most parts of a proof
        #[arg(long, default_value_t = 2000)]
        parts: u64,
        /// Seed of the targets
        #[arg(long, default_value_t = 7)]
        seed: u64,
    },
    /// Damage to logs of refusals, and the size of a record
    Records {
        /// Records of the damaged log
        #[arg(long, default_value_t = 12)]
        records: usize,
        /// Flip every two bits of the log, not only those of one frame (minutes)
        #[arg(long)]
        all_pairs: bool,
        /// Targets per arm and kind for the sizes
        #[arg(long, default_value_t = 1000)]
        targets: usize,
        /// Seed of damages and targets
        #[arg(long, default_value_t = 7)]
        seed: u64,
    },
    /// Planted postures: nothing may be refused or called unreachable
    Soundness {
        /// Random machines
        #[arg(long, default_value_t = 1000)]
        machines: u64,
        /// Targets per machine
        #[arg(long, default_value_t = 10)]
        targets: u32,
        /// Node budget of a decision
        #[arg(long, default_value_t = 8)]
        nodes: u64,
        /// Seed of machines and targets
        #[arg(long, default_value_t = 1)]
        seed: u64,
    },
    /// The simplex beside a general-purpose solver on the same random systems
    Simplex {
        /// Systems per family and size
        #[arg(long, default_value_t = 200)]
        systems: u32,
        /// Seed of the systems
        #[arg(long, default_value_t = 1)]
        seed: u64,
    },
}

fn main() {
    match Arguments::parse().command {
        Command::Ablation {
            kinds,
            targets,
            seed,
        } => measure::ablation::run(&kinds, targets, seed),
        Command::Containment {
            checks,
            seed,
            machine,
        } => measure::containment::print(checks, seed, machine),
        Command::Families {
            kinds,
            targets,
            baseline,
            nodes,
            seed,
        } => measure::families::run(&measure::families::Options {
            kinds,
            targets,
            baseline,
            nodes,
            seed,
        }),
        Command::Forgeries {
            proofs,
            flipped,
            edits,
            seed,
        } => measure::forgeries::run(proofs, flipped, edits, seed),
        Command::Kernel => measure::kernel::run(),
        Command::Lifted {
            roots,
            below,
            targets,
            kinds,
        } => {
            let kinds: Vec<&str> = kinds.iter().map(String::as_str).collect();
            measure::lifted::run(roots, below, targets, &kinds);
        }
        Command::Proofs {
            kinds,
            targets,
            nodes,
            parts,
            seed,
        } => measure::proofs::run(&kinds, targets, nodes, parts, seed),
        Command::Records {
            records,
            all_pairs,
            targets,
            seed,
        } => {
            measure::records::print_damage(records, all_pairs, seed);
            println!();
            measure::records::print_sizes(targets, seed);
        }
        Command::Soundness {
            machines,
            targets,
            nodes,
            seed,
        } => measure::soundness::print(machines, targets, nodes, seed),
        Command::Simplex { systems, seed } => measure::simplex::run(systems, seed),
    }
}
