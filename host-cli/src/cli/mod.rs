//! The command line: arguments in, answers on standard output, an exit status back.

mod answer;
mod arguments;
mod audit;
mod check;
mod output;
mod pack;
mod progress;
mod tally;

pub use tally::Status;

use std::ffi::OsString;
use std::fs::{self, File};
use std::io::{self, BufReader, IsTerminal, Read, Write};
use std::num::NonZeroUsize;
use std::path::Path;

use balk_core::record::Chain;
use clap::Parser;
use rayon::prelude::*;

use crate::log::LogError;
use crate::model::Machine;
use crate::pack::PackError;
use crate::read::{self, Defect, Lines};

use answer::{Answer, Solvers};
use arguments::{Arguments, Command, Inputs, Proofs, Task};
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
    let ended = match arguments.command {
        Command::Audit(inputs) => audit::run(&inputs),
        Command::Check(inputs) => check::run(&inputs),
        Command::Pack(inputs) => pack::run(&inputs),
        Command::Decide {
            inputs,
            nodes,
            proofs,
            text,
        } => {
            let proofs = proofs.map(|folder| Proofs { folder, text });
            let nodes = nodes.get();
            answer_all(&inputs, Task::Decide { nodes, proofs })
        }
        Command::Screen { inputs, splits } => answer_all(&inputs, Task::Screen { splits }),
    };
    match ended {
        Ok(status) => status,
        Err(failure) => {
            complain(&failure);
            failure.status()
        }
    }
}

/// Why a run ended before its last target or record.
#[derive(Debug, thiserror::Error)]
enum Failure {
    #[error("{0}")]
    Defect(#[from] Defect),
    #[error("{folder}: {source}")]
    Folder { folder: String, source: io::Error },
    #[error("the image does not load: {0}")]
    Image(String),
    #[error("{file}: {source}")]
    Input { file: String, source: io::Error },
    #[error("{file}: {source}")]
    Log { file: String, source: LogError },
    #[error("{file}: {source}")]
    Machine { file: String, source: PackError },
    #[error("standard output: {0}")]
    Output(io::Error),
    #[error("{file}: tip: {} (tips: {names})", wanted.as_ref().map_or_else(|| "say which with --tip".to_owned(), |name| format!("there is no {name:?}")))]
    Tip {
        file: String,
        wanted: Option<String>,
        names: String,
    },
    #[error("cannot start threads: {0}")]
    Threads(#[from] rayon::ThreadPoolBuildError),
}

impl Failure {
    fn status(&self) -> Status {
        match self {
            Failure::Defect(_)
            | Failure::Input { .. }
            | Failure::Log { .. }
            | Failure::Machine { .. }
            | Failure::Tip { .. } => Status::Input,
            Failure::Folder { .. }
            | Failure::Image(_)
            | Failure::Output(_)
            | Failure::Threads(_) => Status::Fault,
        }
    }
}

/// Says `message` on standard error; a closed standard error is no reason to stop.
fn complain(message: &dyn std::fmt::Display) {
    let _ = writeln!(io::stderr(), "{message}");
}

/// Answers every target of a file, in order.
fn answer_all(inputs: &Inputs, task: Task) -> Result<Status, Failure> {
    let Inputs {
        machine,
        targets,
        json,
        threads,
        quiet,
    } = inputs;
    let MachineFile {
        machine,
        file,
        text,
    } = read_machine(machine)?;
    let screening = matches!(task, Task::Screen { .. });
    if let Task::Decide {
        proofs: Some(Proofs { folder, .. }),
        ..
    } = &task
    {
        fs::create_dir_all(folder).map_err(|source| Failure::Folder {
            folder: folder.display().to_string(),
            source,
        })?;
    }
    let solvers =
        Solvers::new(&machine, &text, task).map_err(|source| Failure::Machine { file, source })?;
    let targets_file = name_of(targets);
    let input_failure = |source| Failure::Input {
        file: targets_file.clone(),
        source,
    };
    let (source, size) = open(targets).map_err(input_failure)?;
    let mut lines = Lines::new(BufReader::with_capacity(READ_BYTES, source));
    let pool = worker_threads(*threads)?;
    let mut printer = Printer::new(*json, *quiet);
    let mut progress = Progress::new(size, "targets", *quiet || io::stdout().is_terminal());
    let mut tally = Tally::default();
    let mut chain = Chain::new();
    let mut unproved = false;
    loop {
        let chunk = lines.next_chunk(CHUNK_LINES).map_err(input_failure)?;
        if chunk.is_empty() {
            break;
        }
        let answer = |line| solvers.answer(line, &targets_file);
        let mut answers: Vec<_> = pool.install(|| chunk.par_iter().map(answer).collect());
        // In the order of the input, whatever the number of threads.
        for answer in &mut answers {
            answer.log(&mut chain);
        }
        let row = |answer| printer.row(answer, &machine);
        let rows: Vec<_> = pool.install(|| answers.par_iter().map(row).collect());
        progress.pause(|| {
            for complaint in rows.iter().filter_map(|row| row.complaint.as_ref()) {
                complain(complaint);
            }
            for missing in answers.iter().filter_map(Answer::missing_proof) {
                complain(&missing);
            }
        });
        unproved |= answers
            .iter()
            .any(|answer| answer.missing_proof().is_some());
        rows.iter().for_each(|row| tally.add(row.word));
        match printer.write(&rows) {
            Err(error) if error.kind() == io::ErrorKind::BrokenPipe => return Ok(tally.status()),
            written => written.map_err(Failure::Output)?,
        }
        progress.advance(lines.bytes(), tally.total());
    }
    progress.finish();
    let seal = screening.then(|| chain.seal(0));
    match printer.end(&tally, seal) {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => Err(Failure::Output(error)),
        // Proofs were asked for and one could not be written.
        _ if unproved => Ok(Status::Fault),
        _ => Ok(tally.status()),
    }
}

/// Worker threads, `count` of them or one a processor.
fn worker_threads(
    count: Option<NonZeroUsize>,
) -> Result<rayon::ThreadPool, rayon::ThreadPoolBuildError> {
    rayon::ThreadPoolBuilder::new()
        .num_threads(count.map_or(0, NonZeroUsize::get))
        .stack_size(STACK_BYTES)
        .build()
}

/// A machine that was read.
struct MachineFile {
    machine: Machine,
    /// The file's name for messages.
    file: String,
    text: String,
}

/// The machine in `path`.
fn read_machine(path: &Path) -> Result<MachineFile, Failure> {
    let file = name_of(path);
    let mut bytes = Vec::new();
    let most = read::MAX_MACHINE_BYTES as u64 + 1;
    match open(path).and_then(|(source, _)| source.take(most).read_to_end(&mut bytes)) {
        Err(source) => Err(Failure::Input { file, source }),
        Ok(_) => Ok(MachineFile {
            machine: read::machine(&bytes, &file)?,
            file,
            text: String::from_utf8_lossy(&bytes).into_owned(),
        }),
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
