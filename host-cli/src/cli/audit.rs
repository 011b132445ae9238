//! `balk audit`: every record of a log proved again, and what is missing between them.

mod report;

pub(super) use report::Word;

use std::io::{self, IsTerminal};
use std::time::Instant;

use balk_core::record::Record;
use rayon::prelude::*;

use crate::evidence::Evidence;
use crate::log::{Content, Item, Items, LogError, replay};
use crate::model::Machine;
use crate::pack::PackError;
use crate::search::Solver;

use super::arguments::AuditInputs;
use super::progress::Progress;
use super::tally::Status;
use super::{Failure, MachineFile, name_of, open, read_machine, worker_threads};
use report::Report;

/// Most items looked at between two writes.
const CHUNK_ITEMS: usize = 512;

/// Proves the refusal that `record` claims for the tip named `tip`; the reason, if that fails.
///
/// The one place that says what a proved record is: it replays bit for bit (see [`replay`]), and
/// the independent checker accepts a proof that nothing meets the recorded target.
fn prove(tip: &Tip, record: &Record) -> Result<(), String> {
    let Tip {
        name,
        solver,
        evidence,
    } = tip;
    replay(solver, record).map_err(|mismatch| format!("tip {name}: {mismatch}"))?;
    let evidence = evidence.as_ref()?;
    evidence
        .prove_packed(
            format!("record {}", record.sequence),
            &record.target,
            solver.pack.scale,
        )
        .map(|_| ())
        .map_err(|error| format!("tip {name}: replayed, but not proved independently: {error}"))
}

/// Audits the log of `inputs`, item by item, in order.
pub(super) fn run(inputs: &AuditInputs) -> Result<Status, Failure> {
    let start = Instant::now();
    let MachineFile {
        machine,
        file: machine_file,
        text,
    } = read_machine(&inputs.machine)?;
    let solvers = Solvers::new(&machine, &text).map_err(|source| Failure::Machine {
        file: machine_file,
        source,
    })?;
    let file = name_of(&inputs.log);
    let failure = |source| Failure::Log {
        file: file.clone(),
        source,
    };
    let (source, size) = open(&inputs.log).map_err(|source| failure(source.into()))?;
    let mut items = Items::open(source).map_err(failure)?;
    let pool = worker_threads(inputs.threads)?;
    let mut progress = Progress::new(size, "items", inputs.quiet || io::stdout().is_terminal());
    let mut report = Report::new(inputs);
    loop {
        let chunk: io::Result<Vec<Item>> = items.by_ref().take(CHUNK_ITEMS).collect();
        let chunk = chunk.map_err(|source| failure(source.into()))?;
        if chunk.is_empty() {
            break;
        }
        let answer = |item: &Item| match &item.content {
            Content::Record(record) => Some(solvers.answer(record)),
            _ => None,
        };
        let answers: Vec<_> = pool.install(|| chunk.par_iter().map(answer).collect());
        for (item, answer) in chunk.iter().zip(answers) {
            report.add(item, answer);
        }
        match report.write() {
            Err(error) if error.kind() == io::ErrorKind::BrokenPipe => return Ok(report.status()),
            written => written.map_err(Failure::Output)?,
        }
        progress.advance(items.bytes(), report.items());
    }
    progress.finish();
    if !report.begun() {
        return Err(failure(LogError::Nothing));
    }
    report.end(start);
    match report.write() {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => Err(Failure::Output(error)),
        _ => Ok(report.status()),
    }
}

/// A tip that can be packed, and what answers for it.
struct Tip<'a> {
    name: &'a str,
    solver: Solver,
    evidence: Result<Evidence, String>,
}

/// All tips of a machine that can be packed.
struct Solvers<'a>(Vec<Tip<'a>>);

impl<'a> Solvers<'a> {
    /// # Errors
    ///
    /// No tip can be packed; why the last cannot.
    fn new(machine: &'a Machine, text: &str) -> Result<Self, PackError> {
        let mut solvers = Vec::new();
        let mut failed = Ok(());
        for (tip, named) in machine.tips.iter().enumerate() {
            match Solver::new(machine, tip) {
                Ok(solver) => solvers.push(Tip {
                    name: &named.name,
                    solver,
                    evidence: Evidence::new(machine, tip, text).map_err(|error| error.to_string()),
                }),
                Err(error) => failed = Err(error),
            }
        }
        if solvers.is_empty() {
            failed?;
        }
        Ok(Solvers(solvers))
    }

    /// The tip whose refusal `record` claims, once that is proved; else why it is not.
    fn answer(&self, record: &Record) -> Result<&'a str, String> {
        let same = |tip: &&Tip| tip.solver.fingerprint() == record.fingerprint;
        match self.0.iter().find(same) {
            Some(tip) => prove(tip, record).map(|()| tip.name),
            None => Err(format!(
                "another machine: no tip of this one has the fingerprint {:016x}",
                record.fingerprint
            )),
        }
    }
}
