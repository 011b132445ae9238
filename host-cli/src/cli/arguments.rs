//! What the user may write on the command line.

use std::num::{NonZeroU64, NonZeroUsize};
use std::path::PathBuf;

use balk_core::screen::MOST_SPLITS;
use clap::builder::styling::{AnsiColor, Styles};
use clap::error::ErrorKind;
use clap::{Args, CommandFactory, Parser, Subcommand};

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
    /// Decide targets completely: reachable with a posture, or unreachable with a proof
    #[command(after_help = format!("{EXIT_STATUS}\n\nCaution:\n{CAUTION}"))]
    Decide {
        #[command(flatten)]
        inputs: Inputs,
        /// Nodes of the search tree to spend on one target before it stays undecided
        #[arg(long, value_name = "N", default_value_t = DEFAULT_NODES)]
        nodes: NonZeroU64,
    },
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

/// What is to be done with the targets.
#[derive(Debug)]
pub(super) struct Job {
    pub inputs: Inputs,
    pub task: Task,
}

/// What is asked of each target, and how much may be spent on it.
#[derive(Clone, Copy, Debug)]
pub(super) enum Task {
    Decide { nodes: u64 },
    Screen { splits: u16 },
}

impl From<Command> for Job {
    fn from(command: Command) -> Job {
        match command {
            Command::Decide { inputs, nodes } => Job {
                inputs,
                task: Task::Decide { nodes: nodes.get() },
            },
            Command::Screen { inputs, splits } => Job {
                inputs,
                task: Task::Screen { splits },
            },
        }
    }
}

impl Arguments {
    /// The arguments, if they do not contradict each other.
    pub fn checked(self) -> Result<Arguments, clap::Error> {
        let (Command::Decide { inputs, .. } | Command::Screen { inputs, .. }) = &self.command;
        if is_standard_input(&inputs.machine) && is_standard_input(&inputs.targets) {
            return Err(Arguments::command().error(
                ErrorKind::ArgumentConflict,
                "MACHINE and TARGETS cannot both be standard input",
            ));
        }
        Ok(self)
    }
}
