//! From a target line to what is said of it.

use balk_core::record::Chain;

use std::fs;
use std::path::PathBuf;

use balk_checker::{binary, text};

use crate::evidence::Evidence;
use crate::model::{Machine, Target};
use crate::pack::PackError;
use crate::prove::Subject;
use crate::read::{self, Defect, Line};
use crate::search::{Decision, Screening, Solver, Verdict};

use super::arguments::{Proofs, Task};
use super::output::hex;

/// A machine made ready to be asked about any of its tips.
pub(super) struct Solvers<'a> {
    machine: &'a Machine,
    of_tip: Vec<Result<Solver, PackError>>,
    /// One a tip when proofs are wanted.
    evidence: Vec<Result<Evidence, String>>,
    task: Task,
}

/// What is said of one target.
pub(super) struct Answer {
    pub id: String,
    pub outcome: Outcome,
}

impl Answer {
    /// What to say when a proof was wanted and there is none.
    pub fn missing_proof(&self) -> Option<String> {
        match &self.outcome {
            Outcome::Decided {
                proof: Some(Err(reason)),
                ..
            } => Some(format!(
                "{}: no proof written: {reason}",
                read::printable(&self.id)
            )),
            _ => None,
        }
    }

    /// Makes the record of a refusal the next of the log whose chain is given.
    pub fn log(&mut self, chain: &mut Chain) {
        if let Outcome::Screened {
            screening: Screening::Refused { record },
            ..
        } = &mut self.outcome
        {
            chain.add(record);
        }
    }
}

pub(super) enum Outcome {
    Decided {
        decision: Decision,
        /// Where the proof is, or why there is none; none when none is wanted.
        proof: Option<Result<PathBuf, String>>,
    },
    Screened {
        splits: u16,
        screening: Screening,
    },
    Wrong(Defect),
}

impl<'a> Solvers<'a> {
    /// One solver a tip, for `task`. A tip that cannot be packed is an error of the targets that
    /// ask for it.
    ///
    /// # Errors
    ///
    /// No tip can be packed; why the first cannot.
    pub fn new(machine: &'a Machine, text: &str, task: Task) -> Result<Self, PackError> {
        let mut of_tip: Vec<_> = (0..machine.tips.len())
            .map(|tip| Solver::new(machine, tip))
            .collect();
        if of_tip.iter().all(Result::is_err) {
            of_tip.swap_remove(0)?;
        }
        let wanted = matches!(&task, Task::Decide { proofs, .. } if proofs.is_some());
        let tips = if wanted { machine.tips.len() } else { 0 };
        let evidence = (0..tips)
            .map(|tip| Evidence::new(machine, tip, text).map_err(|error| error.to_string()))
            .collect();
        Ok(Solvers {
            machine,
            of_tip,
            evidence,
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
        let outcome = match (&self.of_tip[target.tip], &self.task) {
            (Err(error), _) => Outcome::Wrong(Defect {
                file: file.to_owned(),
                line: Some(line.number),
                field: "tip".to_owned(),
                reason: error.to_string(),
            }),
            (Ok(solver), Task::Decide { nodes, proofs }) => {
                let decision = solver.decide(&target, *nodes);
                let proof = match (&decision.verdict, proofs) {
                    (Verdict::Unreachable { proof }, Some(proofs)) => {
                        Some(self.prove(&target, line, *proof, proofs))
                    }
                    _ => None,
                };
                Outcome::Decided { decision, proof }
            }
            (Ok(solver), Task::Screen { splits }) => Outcome::Screened {
                splits: *splits,
                screening: solver.screen(&target, *splits),
            },
        };
        Answer {
            id: target.id,
            outcome,
        }
    }

    /// Writes the proof of a target the search called unreachable; returns where it is.
    fn prove(
        &self,
        target: &Target,
        line: &Line,
        search: [u8; 32],
        proofs: &Proofs,
    ) -> Result<PathBuf, String> {
        let evidence = self.evidence[target.tip].as_ref()?;
        let words = line.bytes.as_deref().unwrap_or_default();
        let words = String::from_utf8_lossy(words);
        let proof = evidence
            .prove(&Subject {
                target,
                line: words.trim(),
                search,
            })
            .map_err(|error| error.to_string())?;
        let written = |error| format!("{error}");
        let (bytes, ending) = if proofs.text {
            (
                text::write(&proof).map_err(written)?.into_bytes(),
                "proof.txt",
            )
        } else {
            (binary::write(&proof).map_err(written)?, "proof")
        };
        let name = format!("{}-{}.{ending}", line.number, &hex(&search)[..16]);
        let path = proofs.folder.join(name);
        fs::write(&path, bytes).map_err(|error| format!("{}: {error}", path.display()))?;
        Ok(path)
    }
}
