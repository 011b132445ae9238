//! Rows, for people and for programs.

use std::fmt::Write as _;
use std::io::{self, Write};
use std::time::Instant;

use anstream::AutoStream;
use anstyle::Style;
use balk_core::record::Seal;
use serde::{Serialize, Serializer};

use crate::kinematics::joint_values;
use crate::model::{Kind, Machine};
use crate::read::{Defect, printable};
use crate::search::{Decision, Verdict};

use super::answer::{Answer, Outcome};
use super::arguments::CAUTION;
use super::tally::{Tally, Word};
use crate::search::Screening;

/// Version of the JSON rows; rises when a field changes its meaning.
pub(super) const SCHEMA: u32 = 1;
/// Columns of a person's row.
const WORD_WIDTH: usize = 11;
const ID_WIDTH: usize = 20;

/// Prints answers in one of the two forms.
pub(super) struct Printer {
    json: bool,
    quiet: bool,
    start: Instant,
    header_due: bool,
}

/// One printed answer.
pub(super) struct Row {
    pub word: Word,
    /// With its line end.
    text: String,
    /// What standard error is to say about it.
    pub complaint: Option<Defect>,
}

impl Printer {
    pub fn new(json: bool, quiet: bool) -> Self {
        Printer {
            json,
            quiet,
            start: Instant::now(),
            header_due: !json && !quiet,
        }
    }

    /// The row for `answer`; needs no access to the output, so that it can be made anywhere.
    pub fn row(&self, answer: &Answer, machine: &Machine) -> Row {
        let record = Record::new(answer, machine);
        let text = if self.json {
            format!(
                "{}\n",
                serde_json::to_string(&record).expect("a record has only plain fields")
            )
        } else {
            record.for_people()
        };
        let complaint = match &answer.outcome {
            Outcome::Wrong(defect) if !self.quiet => Some(defect.clone()),
            _ => None,
        };
        Row {
            word: record.word,
            text,
            complaint,
        }
    }

    /// Writes `rows` at once, so that whoever reads them sees whole lines soon.
    pub fn write(&mut self, rows: &[Row]) -> io::Result<()> {
        let mut text = String::new();
        if std::mem::take(&mut self.header_due) {
            let style = Style::new().bold();
            let _ = writeln!(
                text,
                "{style}{:WORD_WIDTH$}  {:ID_WIDTH$}  details{style:#}",
                "answer", "target"
            );
        }
        text.extend(rows.iter().map(|row| row.text.as_str()));
        print(&text, self.json)
    }

    /// Writes what follows the last row; the seal of the log, if the rows are one.
    pub fn end(&self, tally: &Tally, seal: Option<Seal>) -> io::Result<()> {
        match seal {
            Some(seal) if self.json => {
                let seal = hex(&seal.bytes());
                return print(
                    &format!("{{\"schema\":{SCHEMA},\"seal\":\"{seal}\"}}\n"),
                    true,
                );
            }
            _ if self.json || self.quiet => return Ok(()),
            _ => {}
        }
        let counts: Vec<String> = tally
            .said()
            .map(|(word, count)| {
                let style = word.style();
                let plural = if word == Word::Error && count > 1 {
                    "s"
                } else {
                    ""
                };
                format!("{style}{count} {}{plural}{style:#}", word.text())
            })
            .collect();
        let colon = if counts.is_empty() { "" } else { ": " };
        let seconds = self.start.elapsed().as_secs_f64();
        print(
            &format!(
                "\n{} targets in {seconds:.2} s{colon}{}\n\n{CAUTION}\n",
                tally.total(),
                counts.join(", ")
            ),
            false,
        )
    }
}

/// Writes `text` to standard output at once; unless it is `plain`, with colours where they are
/// wanted.
pub(super) fn print(text: &str, plain: bool) -> io::Result<()> {
    let all = |output: &mut dyn Write| {
        output
            .write_all(text.as_bytes())
            .and_then(|()| output.flush())
    };
    let output = io::stdout().lock();
    if plain {
        all(&mut { output })
    } else {
        all(&mut AutoStream::auto(output))
    }
}

/// The fields of a row; those that do not apply are left out.
#[derive(Serialize)]
struct Record<'a> {
    schema: u32,
    id: &'a str,
    #[serde(rename = "verdict")]
    word: Word,
    #[serde(skip_serializing_if = "Option::is_none")]
    joints: Option<Joints<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    proof: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    proof_file: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    splits: Option<u16>,
    #[serde(skip_serializing_if = "Option::is_none")]
    record: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    nodes: Option<u64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    seconds: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    file: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    line: Option<usize>,
    #[serde(skip_serializing_if = "Option::is_none")]
    field: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<&'a str>,
}

impl<'a> Record<'a> {
    fn new(answer: &'a Answer, machine: &'a Machine) -> Self {
        let empty = Record {
            schema: SCHEMA,
            id: &answer.id,
            word: Word::Error,
            joints: None,
            proof: None,
            proof_file: None,
            splits: None,
            record: None,
            nodes: None,
            seconds: None,
            file: None,
            line: None,
            field: None,
            reason: None,
        };
        match &answer.outcome {
            Outcome::Wrong(defect) => Record {
                file: Some(&defect.file),
                line: defect.line,
                field: Some(defect.field.as_str()).filter(|field| !field.is_empty()),
                reason: Some(&defect.reason),
                ..empty
            },
            Outcome::Decided {
                decision:
                    Decision {
                        verdict,
                        nodes,
                        seconds,
                    },
                proof: file,
            } => {
                let decided = Record {
                    nodes: Some(*nodes),
                    seconds: Some(*seconds),
                    ..empty
                };
                match verdict {
                    Verdict::Reachable { joints } => Record {
                        word: Word::Reachable,
                        joints: Some(Joints {
                            machine,
                            values: joint_values(machine, joints),
                        }),
                        ..decided
                    },
                    Verdict::Unreachable { proof } => Record {
                        word: Word::Unreachable,
                        proof: Some(hex(proof)),
                        proof_file: match file {
                            Some(Ok(path)) => Some(path.display().to_string()),
                            _ => None,
                        },
                        reason: match file {
                            Some(Err(reason)) => Some(reason),
                            _ => None,
                        },
                        ..decided
                    },
                    Verdict::Undecided { reason } => Record {
                        word: Word::Undecided,
                        reason: Some(reason),
                        ..decided
                    },
                }
            }
            Outcome::Screened { splits, screening } => {
                let screened = Record {
                    splits: Some(*splits),
                    ..empty
                };
                match screening {
                    Screening::Refused { record } => Record {
                        word: Word::Refused,
                        record: Some(hex(record)),
                        ..screened
                    },
                    Screening::Passed { reason } => Record {
                        word: Word::Passed,
                        reason: Some(reason),
                        ..screened
                    },
                }
            }
        }
    }

    fn for_people(&self) -> String {
        let style = self.word.style();
        let mut details = Vec::new();
        if let Some(line) = self.line {
            let place = self
                .field
                .map_or(String::new(), |field| format!("{}: ", printable(field)));
            details.push(format!(
                "line {line}: {place}{}",
                self.reason.map_or(String::new(), printable)
            ));
        } else if let Some(reason) = self.reason {
            details.push(reason.to_owned());
        }
        if let Some(joints) = &self.joints {
            details.push(joints.for_people());
        }
        if let Some(proof) = &self.proof {
            details.push(format!("proof {}", &proof[..16]));
        }
        if let Some(record) = &self.record {
            details.push(format!("record of {} bytes", record.len() / 2));
        }
        if let (Some(nodes), Some(seconds)) = (self.nodes, self.seconds) {
            let plural = if nodes == 1 { "" } else { "s" };
            details.push(format!("{nodes} node{plural}, {:.2} ms", seconds * 1e3));
        }
        format!(
            "{style}{:WORD_WIDTH$}{style:#}  {:ID_WIDTH$}  {}\n",
            self.word.text(),
            printable(self.id),
            details.join("; ")
        )
    }
}

impl Serialize for Word {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(self.text())
    }
}

/// Values of the joints that move, by name.
struct Joints<'a> {
    machine: &'a Machine,
    values: Vec<f64>,
}

impl Joints<'_> {
    fn moving(&self) -> impl Iterator<Item = (&str, Kind, f64)> {
        let all = self.machine.joints.iter().zip(&self.values);
        all.filter(|(joint, _)| joint.kind != Kind::Fixed)
            .map(|(joint, value)| (joint.name.as_str(), joint.kind, *value))
    }

    fn for_people(&self) -> String {
        let shown: Vec<String> = self
            .moving()
            .map(|(name, kind, value)| match kind {
                Kind::Prismatic => format!("{name} {value:.4} m"),
                _ => format!("{name} {:.2} deg", value.to_degrees()),
            })
            .collect();
        shown.join(", ")
    }
}

impl Serialize for Joints<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.collect_map(self.moving().map(|(name, _, value)| (name, value)))
    }
}

/// Bytes as lower-case hexadecimal digits.
pub(super) fn hex(bytes: &[u8]) -> String {
    bytes
        .iter()
        .fold(String::with_capacity(2 * bytes.len()), |mut text, byte| {
            let _ = write!(text, "{byte:02x}");
            text
        })
}
