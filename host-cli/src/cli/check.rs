//! `balk check`: proofs against the independent checker.

use std::collections::HashMap;
use std::fmt::Write as _;
use std::fs;
use std::io;
use std::path::Path;
use std::time::Instant;

use anstyle::{AnsiColor, Style};
use balk_checker::proof::Proof;
use balk_checker::{Checker, binary, text};
use serde_json::json;

use crate::read::{Lines, printable};

use super::arguments::{CAUTION, CheckInputs};
use super::output::print;
use super::tally::Status;
use super::{Failure, name_of, open, read_machine};

/// Largest proof file read, bytes.
const MAX_PROOF_BYTES: u64 = 1 << 30;

/// What is said of one proof.
enum Answer {
    Valid { steps: usize, splits: usize },
    Invalid(String),
    Error(String),
}

impl Answer {
    fn word(&self) -> (&'static str, AnsiColor) {
        match self {
            Answer::Valid { .. } => ("valid", AnsiColor::Green),
            Answer::Invalid(_) => ("invalid", AnsiColor::Red),
            Answer::Error(_) => ("error", AnsiColor::Red),
        }
    }
}

/// Checks every proof of `inputs`, in order.
pub(super) fn run(inputs: &CheckInputs) -> Result<Status, Failure> {
    let start = Instant::now();
    let machine = read_machine(&inputs.machine)?;
    let targets = target_lines(&inputs.targets)?;
    let mut checkers = HashMap::new();
    let mut counts = [0u64; 3];
    for path in &inputs.proofs {
        let (id, answer) = match read_proof(path) {
            Err(reason) => (String::new(), Answer::Error(reason)),
            Ok(proof) => {
                let id = id_of(&proof.target).unwrap_or_default();
                let checker = checkers
                    .entry(proof.tip.clone())
                    .or_insert_with(|| Checker::new(&machine.text, &proof.tip));
                let answer = match (checker, targets.get(&id)) {
                    (Err(error), _) => Answer::Invalid(error.to_string()),
                    (_, None) => Answer::Invalid(format!(
                        "the proof is of target {id:?}, which {} does not name",
                        name_of(&inputs.targets)
                    )),
                    (Ok(checker), Some(line)) => match checker.check(&proof, line) {
                        Ok(report) => Answer::Valid {
                            steps: report.steps,
                            splits: report.splits,
                        },
                        Err(rejection) => Answer::Invalid(rejection.to_string()),
                    },
                };
                (id, answer)
            }
        };
        counts[match answer {
            Answer::Valid { .. } => 0,
            Answer::Invalid(_) => 1,
            Answer::Error(_) => 2,
        }] += 1;
        match print(&row(inputs, path, &id, &answer), inputs.json) {
            Err(error) if error.kind() == io::ErrorKind::BrokenPipe => break,
            printed => printed.map_err(Failure::Output)?,
        }
    }
    let [valid, invalid, errors] = counts;
    if !inputs.json && !inputs.quiet {
        let seconds = start.elapsed().as_secs_f64();
        let summary = format!(
            "\n{} proofs in {seconds:.2} s: {valid} valid, {invalid} invalid, {errors} errors\n\n{CAUTION}\n",
            inputs.proofs.len()
        );
        match print(&summary, false) {
            Err(error) if error.kind() != io::ErrorKind::BrokenPipe => {
                return Err(Failure::Output(error));
            }
            _ => {}
        }
    }
    Ok(match (invalid, errors) {
        (_, 1..) => Status::Input,
        (1.., _) => Status::Negative,
        _ => Status::Clear,
    })
}

/// The line of every target by its name; the first where a name is used twice.
fn target_lines(path: &Path) -> Result<HashMap<String, String>, Failure> {
    let failure = |source| Failure::Input {
        file: name_of(path),
        source,
    };
    let (source, _) = open(path).map_err(failure)?;
    let mut lines = Lines::new(io::BufReader::new(source));
    let mut found = HashMap::new();
    while let Some(line) = lines.next_line().map_err(failure)? {
        // A line that is no target is no proof's target either.
        let text = line.bytes.and_then(|bytes| String::from_utf8(bytes).ok());
        if let Some(text) = text
            && let Some(id) = id_of(&text)
        {
            found.entry(id).or_insert_with(|| text.trim().to_owned());
        }
    }
    Ok(found)
}

/// The name in a target's line.
fn id_of(line: &str) -> Option<String> {
    let value: serde_json::Value = serde_json::from_str(line).ok()?;
    Some(value.get("id")?.as_str()?.to_owned())
}

/// The proof in a file, in either form.
fn read_proof(path: &Path) -> Result<Proof, String> {
    let size = fs::metadata(path).map_err(|error| error.to_string())?.len();
    if size > MAX_PROOF_BYTES {
        return Err(format!("{size} bytes are more than {MAX_PROOF_BYTES}"));
    }
    let bytes = fs::read(path).map_err(|error| error.to_string())?;
    // Text begins with the same four letters and a hyphen.
    if bytes.starts_with(b"balk-proof") {
        let words = String::from_utf8(bytes).map_err(|_| "not UTF-8".to_owned())?;
        text::read(&words).map_err(|error| error.to_string())
    } else {
        binary::read(&bytes).map_err(|error| format!("not a proof: {error}"))
    }
}

fn row(inputs: &CheckInputs, path: &Path, id: &str, answer: &Answer) -> String {
    let (word, colour) = answer.word();
    if inputs.json {
        let mut row = json!({
            "schema": 1,
            "file": path.display().to_string(),
            "id": id,
            "verdict": word,
        });
        match answer {
            Answer::Valid { steps, splits } => {
                row["steps"] = json!(steps);
                row["splits"] = json!(splits);
            }
            Answer::Invalid(reason) | Answer::Error(reason) => row["reason"] = json!(reason),
        }
        return format!("{row}\n");
    }
    let style: Style = colour.on_default();
    let mut line = format!(
        "{style}{word:7}{style:#}  {}",
        printable(&path.display().to_string())
    );
    let _ = match answer {
        Answer::Valid { steps, splits } => {
            write!(
                line,
                "  {}; {steps} steps, {} parts",
                printable(id),
                splits + 1
            )
        }
        Answer::Invalid(reason) | Answer::Error(reason) => write!(line, "  {reason}"),
    };
    line.push('\n');
    line
}
