//! The command line: arguments in, answers on standard output, an exit status back.

mod answer;
mod arguments;
mod output;
mod progress;
mod tally;

pub use tally::Status;

use std::ffi::OsString;
use std::fs::File;
use std::io::{self, BufReader, IsTerminal, Read, Write};
use std::path::Path;

use clap::Parser;
use rayon::prelude::*;

use crate::model::Machine;
use crate::pack::PackError;
use crate::read::{self, Defect, Lines};

use answer::Solvers;
use arguments::{Arguments, Inputs, Job};
use output::Printer;
use progress::Progress;
use tally::Tally;

/// Bytes read from a targets file at a time; also bounds what a chunk of short lines holds.
const READ_BYTES: usize = 1 << 18;
/// Most targets answered between two writes. Large enough to keep every thread busy, small enough
/// that answers appear while the rest is being worked on.
const CHUNK_LINES: usize = 512;
/// Stack of a worker thread, the same as a main thread's usual one.
const STACK_BYTES: usize = 8 << 20;

/// Runs the program with `arguments`, the first being its own name, and returns how it ended.
/// Messages go to standard error, answers to standard output.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> Status {
    let arguments = match Arguments::try_parse_from(arguments).and_then(Arguments::checked) {
        Ok(arguments) => arguments,
        Err(message) => {
            // Nothing is left to tell the user with if this cannot be printed.
            let _ = message.print();
            return if message.use_stderr() {
                Status::Usage
            } else {
                Status::Clear
            };
        }
    };
    match answer_all(&arguments.command.into()) {
        Ok(tally) => tally.status(),
        Err(failure) => {
            complain(&failure);
            failure.status()
        }
    }
}

/// Why a run ended before its last target.
#[derive(Debug, thiserror::Error)]
enum Failure {
    #[error("{0}")]
    Defect(#[from] Defect),
    #[error("{file}: {source}")]
    Input { file: String, source: io::Error },
    #[error("{file}: {source}")]
    Machine { file: String, source: PackError },
    #[error("standard output: {0}")]
    Output(io::Error),
    #[error("cannot start threads: {0}")]
    Threads(#[from] rayon::ThreadPoolBuildError),
}

impl Failure {
    fn status(&self) -> Status {
        match self {
            Failure::Defect(_) | Failure::Input { .. } | Failure::Machine { .. } => Status::Input,
            Failure::Output(_) | Failure::Threads(_) => Status::Fault,
        }
    }
}

/// Says `message` on standard error; a closed standard error is no reason to stop.
fn complain(message: &dyn std::fmt::Display) {
    let _ = writeln!(io::stderr(), "{message}");
}

/// Answers every target of the job's file, in order.
fn answer_all(job: &Job) -> Result<Tally, Failure> {
    let Inputs {
        machine,
        targets,
        json,
        threads,
        quiet,
    } = &job.inputs;
    let (machine, machine_file) = read_machine(machine)?;
    let solvers = Solvers::new(&machine, job.task).map_err(|source| Failure::Machine {
        file: machine_file,
        source,
    })?;
    let targets_file = name_of(targets);
    let input_failure = |source| Failure::Input {
        file: targets_file.clone(),
        source,
    };
    let (source, size) = open(targets).map_err(input_failure)?;
    let mut lines = Lines::new(BufReader::with_capacity(READ_BYTES, source));
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads.map_or(0, |n| n.get()))
        .stack_size(STACK_BYTES)
        .build()?;
    let mut printer = Printer::new(*json, *quiet);
    let mut progress = Progress::new(size, *quiet || io::stdout().is_terminal());
    let mut tally = Tally::default();
    loop {
        let chunk = lines.next_chunk(CHUNK_LINES).map_err(input_failure)?;
        if chunk.is_empty() {
            break;
        }
        let rows: Vec<_> = pool.install(|| {
            let answer = |line| solvers.answer(line, &targets_file);
            chunk
                .par_iter()
                .map(|line| printer.row(&answer(line), &machine))
                .collect()
        });
        progress.pause(|| {
            for complaint in rows.iter().filter_map(|row| row.complaint.as_ref()) {
                complain(complaint);
            }
        });
        rows.iter().for_each(|row| tally.add(row.word));
        match printer.write(&rows) {
            Err(error) if error.kind() == io::ErrorKind::BrokenPipe => return Ok(tally),
            written => written.map_err(Failure::Output)?,
        }
        progress.advance(lines.bytes(), tally.total());
    }
    progress.finish();
    match printer.end(&tally) {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => Err(Failure::Output(error)),
        _ => Ok(tally),
    }
}

/// The machine in `path` and the file's name for messages.
fn read_machine(path: &Path) -> Result<(Machine, String), Failure> {
    let file = name_of(path);
    let mut bytes = Vec::new();
    let most = read::MAX_MACHINE_BYTES as u64 + 1;
    match open(path).and_then(|(source, _)| source.take(most).read_to_end(&mut bytes)) {
        Err(source) => Err(Failure::Input { file, source }),
        Ok(_) => Ok((read::machine(&bytes, &file)?, file)),
    }
}

/// What messages call the file `path`.
fn name_of(path: &Path) -> String {
    if is_standard_input(path) {
        "<stdin>".to_owned()
    } else {
        path.display().to_string()
    }
}

fn is_standard_input(path: &Path) -> bool {
    path.as_os_str() == "-"
}

/// The content of `path` and, for an ordinary file, its size in bytes.
fn open(path: &Path) -> io::Result<(Box<dyn Read>, Option<u64>)> {
    if is_standard_input(path) {
        return Ok((Box::new(io::stdin()), None));
    }
    let file = File::open(path)?;
    let size = file
        .metadata()
        .ok()
        .filter(|meta| meta.is_file())
        .map(|meta| meta.len());
    Ok((Box::new(file), size))
}
