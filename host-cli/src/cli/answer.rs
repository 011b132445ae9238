//! From a target line to what is said of it.

use crate::model::Machine;
use crate::pack::PackError;
use crate::read::{self, Defect, Line};
use crate::search::{Decision, Screening, Solver};

use super::arguments::Task;

/// A machine made ready to be asked about any of its tips.
pub(super) struct Solvers<'a> {
    machine: &'a Machine,
    of_tip: Vec<Result<Solver, PackError>>,
    task: Task,
}

/// What is said of one target.
pub(super) struct Answer {
    pub id: String,
    pub outcome: Outcome,
}

pub(super) enum Outcome {
    Decided(Decision),
    Screened { splits: u16, screening: Screening },
    Wrong(Defect),
}

impl<'a> Solvers<'a> {
    /// One solver a tip, for `task`. A tip that cannot be packed is an error of the targets that
    /// ask for it.
    ///
    /// # Errors
    ///
    /// No tip can be packed; why the first cannot.
    pub fn new(machine: &'a Machine, task: Task) -> Result<Self, PackError> {
        let mut of_tip: Vec<_> = (0..machine.tips.len())
            .map(|tip| Solver::new(machine, tip))
            .collect();
        if of_tip.iter().all(Result::is_err) {
            of_tip.swap_remove(0)?;
        }
        Ok(Solvers {
            machine,
            of_tip,
            task,
        })
    }

    /// The answer to the target on `line` of `file`.
    pub fn answer(&self, line: &Line, file: &str) -> Answer {
        let target = match read::target(line, file, self.machine) {
            Ok(target) => target,
            Err((id, defect)) => {
                return Answer {
                    id,
                    outcome: Outcome::Wrong(defect),
                };
            }
        };
        let outcome = match (&self.of_tip[target.tip], self.task) {
            (Err(error), _) => Outcome::Wrong(Defect {
                file: file.to_owned(),
                line: Some(line.number),
                field: "tip".to_owned(),
                reason: error.to_string(),
            }),
            (Ok(solver), Task::Decide { nodes }) => Outcome::Decided(solver.decide(&target, nodes)),
            (Ok(solver), Task::Screen { splits }) => Outcome::Screened {
                splits,
                screening: solver.screen(&target, splits),
            },
        };
        Answer {
            id: target.id,
            outcome,
        }
    }
}
