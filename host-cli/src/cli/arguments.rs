//! What the user may write on the command line.

use std::num::{NonZeroU64, NonZeroUsize};
use std::path::PathBuf;

use balk_core::screen::MOST_SPLITS;
use clap::builder::styling::{AnsiColor, Styles};
use clap::error::ErrorKind;
use clap::{Args, CommandFactory, Parser, Subcommand};

use super::audit::Word;
use super::is_standard_input;

/// Nodes of the search tree a target may use before it is left undecided. In experience all but a
/// few targets in a thousand need fewer than 100; raising it costs time on those few alone.
const DEFAULT_NODES: NonZeroU64 = NonZeroU64::new(10_000).unwrap();

const STYLES: Styles = Styles::styled()
    .header(AnsiColor::Green.on_default().bold())
    .usage(AnsiColor::Green.on_default().bold())
    .literal(AnsiColor::Cyan.on_default())
    .placeholder(AnsiColor::Cyan.on_default());

/// What no answer of this program says; printed below the help and below every report.
pub(super) const CAUTION: &str = "\
A planning aid, not a safety function: it claims no performance level or SIL and replaces no risk
assessment, axis limit or protective stop. An answer holds for the machine, limits and tolerances
as written. Passed does not mean reachable, and neither means free of collisions or safe.";

const EXIT_STATUS: &str = "\
Exit status:
  0  answered, and nothing unreachable, refused, invalid or undecided
  1  at least one unreachable, refused or invalid
  2  wrong usage
  3  none of status 1, but at least one undecided
  4  an input could not be read or had errors (the other targets are still answered;
     this status goes before 1 and 3)
  5  a fault of the program itself, or its output could not be written";

/// Decide tool targets of a jointed machine: reachable with a posture, or proved unreachable.
#[derive(Debug, Parser)]
#[command(name = "balk", version, styles = STYLES, arg_required_else_help = true)]
#[command(after_help = format!("{EXIT_STATUS}\n\nCaution:\n{CAUTION}"))]
pub(super) struct Arguments {
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Prove every refusal record of a log again, and find what is missing
    #[command(after_help = audit_help())]
    Audit(AuditInputs),
    /// Check proofs of unreachable targets in exact arithmetic, independently of the search
    #[command(after_help = check_help())]
    Check(CheckInputs),
    /// Decide targets completely: reachable with a posture, or unreachable with a proof
    #[command(after_help = format!("{EXIT_STATUS}\n\nCaution:\n{CAUTION}"))]
    Decide {
        #[command(flatten)]
        inputs: Inputs,
        /// Nodes of the search tree to spend on one target before it stays undecided
        #[arg(long, value_name = "N", default_value_t = DEFAULT_NODES)]
        nodes: NonZeroU64,
        /// Write the proof of every unreachable target into this folder, for balk check
        #[arg(long, value_name = "DIR")]
        proofs: Option<PathBuf>,
        /// Write proofs as text a person can read, not as compact bytes
        #[arg(long, requires = "proofs")]
        text: bool,
    },
    /// Pack a machine for the controller: a table in Rust source, a binary image
    #[command(after_help = format!("Example:\n  balk pack machine.toml --source src/machine.rs --image machine.bin\n\n{EXIT_STATUS}\n\nCaution:\n{CAUTION}"))]
    Pack(PackInputs),
    /// Answer targets as the controller would: refused with a record, or passed
    #[command(after_help = format!("{EXIT_STATUS}\n\nCaution:\n{CAUTION}"))]
    Screen {
        #[command(flatten)]
        inputs: Inputs,
        /// Parts the joint ranges may be cut into; 1 is the coarsest check
        #[arg(long, value_name = "N", default_value_t = 1, value_parser = clap::value_parser!(u16).range(1..=MOST_SPLITS as i64))]
        splits: u16,
    },
}

/// What is said of `audit` below its options.
fn audit_help() -> String {
    format!(
        "\
A log is what the controller sends (frames), lines that end in a record in hexadecimal, or the
output of balk screen --json; which of them is seen from its content.

Answers:
{}
Example:
  balk screen machine.toml targets.jsonl --json > log.jsonl
  balk audit log.jsonl --machine machine.toml

Exit status:
  0  every record proved again, none missing, the log sealed
  1  a record not proved, damaged, missing, repeated, out of order or out of the chain
  2  wrong usage
  3  none of status 1, but the log is not sealed: records may be missing at its end
  4  the log or the machine could not be read
  5  a fault of the program itself, or its output could not be written

Caution:
{CAUTION}
The digests that chain the records reveal mishaps, not forgery: there is no key.",
        Word::explained()
    )
}

/// What is said of `check` below its options.
fn check_help() -> String {
    format!(
        "\
Answers:
  valid    every step follows, every branch ends, for this machine and this target
  invalid  the first step that is wrong, and why
  error    the file could not be read as a proof

Example:
  balk decide machine.toml targets.jsonl --proofs proofs
  balk check proofs/* --machine machine.toml --targets targets.jsonl

The checker shares no code with the search: it reads the machine and the target again and checks
each step in exact arithmetic. host-cli/checker/FORMAT.md describes proofs.

{EXIT_STATUS}

Caution:
{CAUTION}"
    )
}

/// What `check` takes.
#[derive(Args, Clone, Debug)]
pub(super) struct CheckInputs {
    /// Proof files, as bytes or as text
    #[arg(required = true, value_name = "PROOF")]
    pub proofs: Vec<PathBuf>,
    /// Machine file (TOML); - reads standard input
    #[arg(long, value_name = "MACHINE")]
    pub machine: PathBuf,
    /// Targets file (JSON Lines) with the targets that the proofs are of; - reads standard input
    #[arg(long, value_name = "TARGETS")]
    pub targets: PathBuf,
    /// Print one JSON object a line, in the order of the proofs
    #[arg(long)]
    pub json: bool,
    /// Print answers alone: no summary
    #[arg(long, short)]
    pub quiet: bool,
}

/// What `pack` takes.
#[derive(Args, Clone, Debug)]
pub(super) struct PackInputs {
    /// Machine file (TOML); - reads standard input
    pub machine: PathBuf,
    /// Tip to pack the chain of; may be left out when the machine has one
    #[arg(long, value_name = "NAME")]
    pub tip: Option<String>,
    /// Write Rust source with a constant table here
    #[arg(long, value_name = "FILE")]
    pub source: Option<PathBuf>,
    /// Write the binary image that a controller loads at run time here
    #[arg(long, value_name = "FILE")]
    pub image: Option<PathBuf>,
    /// Print nothing
    #[arg(long, short)]
    pub quiet: bool,
}

/// What `audit` takes.
#[derive(Args, Clone, Debug)]
pub(super) struct AuditInputs {
    /// Log of refusal records; - reads standard input
    pub log: PathBuf,
    /// Machine file (TOML) of the machine that logged; - reads standard input
    #[arg(long, value_name = "MACHINE")]
    pub machine: PathBuf,
    /// Print one JSON object a line, in the order of the log
    #[arg(long)]
    pub json: bool,
    /// Worker threads [default: one a processor]; answers do not depend on it
    #[arg(long, value_name = "N")]
    pub threads: Option<NonZeroUsize>,
    /// Print answers alone: no summary or progress
    #[arg(long, short)]
    pub quiet: bool,
}

/// What every command that answers targets takes.
#[derive(Args, Clone, Debug)]
pub(super) struct Inputs {
    /// Machine file (TOML); - reads standard input
    pub machine: PathBuf,
    /// Targets file (JSON Lines, one target a line); - reads standard input
    pub targets: PathBuf,
    /// Print one JSON object a line, in input order
    #[arg(long)]
    pub json: bool,
    /// Worker threads [default: one a processor]; answers do not depend on it
    #[arg(long, value_name = "N")]
    pub threads: Option<NonZeroUsize>,
    /// Print answers alone: no summary, progress or messages about single targets
    #[arg(long, short)]
    pub quiet: bool,
}

/// What is asked of each target, and how much may be spent on it.
#[derive(Clone, Debug)]
pub(super) enum Task {
    Decide { nodes: u64, proofs: Option<Proofs> },
    Screen { splits: u16 },
}

/// Where proofs go.
#[derive(Clone, Debug)]
pub(super) struct Proofs {
    pub folder: PathBuf,
    /// As text, not as bytes.
    pub text: bool,
}

impl Arguments {
    /// The arguments, if they do not contradict each other.
    pub fn checked(self) -> Result<Arguments, clap::Error> {
        let (machine, other, name) = match &self.command {
            Command::Audit(inputs) => (&inputs.machine, &inputs.log, "LOG"),
            Command::Check(inputs) => (&inputs.machine, &inputs.targets, "TARGETS"),
            Command::Pack(_) => return Ok(self),
            Command::Decide { inputs, .. } | Command::Screen { inputs, .. } => {
                (&inputs.machine, &inputs.targets, "TARGETS")
            }
        };
        if is_standard_input(machine) && is_standard_input(other) {
            return Err(Arguments::command().error(
                ErrorKind::ArgumentConflict,
                format!("MACHINE and {name} cannot both be standard input"),
            ));
        }
        Ok(self)
    }
}
