//! What is said of a log: the words, the rows, the summary, the exit status.

use std::io;
use std::time::Instant;

use anstyle::{AnsiColor, Style};
use serde::{Serialize, Serializer};

use crate::log::{Content, Continuity, Finding, Item, Place};
use crate::read::printable;

use super::super::arguments::{AuditInputs, CAUTION};
use super::super::output::{SCHEMA, print};
use super::super::tally::Status;

const WORD_WIDTH: usize = 12;
const PLACE_WIDTH: usize = 12;

/// The words said of a log, in the order of the summary.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(in super::super) enum Word {
    Proved,
    NotProved,
    Damaged,
    Missing,
    Repeated,
    OutOfOrder,
    ChainBroken,
    NotSealed,
}

impl Word {
    const ALL: [Word; 8] = [
        Word::Proved,
        Word::NotProved,
        Word::Damaged,
        Word::Missing,
        Word::Repeated,
        Word::OutOfOrder,
        Word::ChainBroken,
        Word::NotSealed,
    ];

    /// As printed, and what it means.
    const fn texts(self) -> (&'static str, &'static str) {
        match self {
            Word::Proved => (
                "proved",
                "screened again it gives the same bytes, and a full proof passes the checker",
            ),
            Word::NotProved => (
                "not proved",
                "one of these does not hold, or the record is of another machine",
            ),
            Word::Damaged => ("damaged", "neither a record nor a seal can be read"),
            Word::Missing => ("missing", "records that should be here are not"),
            Word::Repeated => ("repeated", "a record with this number has come before"),
            Word::OutOfOrder => ("out of order", "a record or seal that belongs further up"),
            Word::ChainBroken => (
                "chain broken",
                "the digest does not follow from the record before",
            ),
            Word::NotSealed => ("not sealed", "records may be missing at the end"),
        }
    }

    pub fn text(self) -> &'static str {
        self.texts().0
    }

    /// The exit status of a log of which this is said.
    fn status(self) -> Status {
        match self {
            Word::Proved => Status::Clear,
            Word::NotSealed => Status::Undecided,
            _ => Status::Negative,
        }
    }

    fn style(self) -> Style {
        let colour = match self.status() {
            Status::Clear => AnsiColor::Green,
            Status::Undecided => AnsiColor::Cyan,
            _ => AnsiColor::Red,
        };
        colour.on_default()
    }

    /// The words and what they mean, for the help.
    pub fn explained() -> String {
        let line = |word: Word| {
            let (text, meaning) = word.texts();
            format!("  {text:WORD_WIDTH$}  {meaning}\n")
        };
        Word::ALL.map(line).concat()
    }
}

impl From<&Finding> for Word {
    fn from(finding: &Finding) -> Word {
        match finding {
            Finding::ChainBroken { .. } => Word::ChainBroken,
            Finding::Missing { .. } => Word::Missing,
            Finding::NotSealed { .. } => Word::NotSealed,
            Finding::OutOfOrder { .. } => Word::OutOfOrder,
            Finding::Repeated => Word::Repeated,
        }
    }
}

/// What has been said of a log, and what is still to be printed.
pub(super) struct Report {
    json: bool,
    quiet: bool,
    /// Rows not yet printed.
    text: String,
    counts: [u64; Word::ALL.len()],
    items: u64,
    continuity: Continuity,
}

impl Report {
    pub fn new(inputs: &AuditInputs) -> Report {
        let mut text = String::new();
        if !inputs.json && !inputs.quiet {
            let style = Style::new().bold();
            text = format!(
                "{style}{:WORD_WIDTH$}  {:PLACE_WIDTH$}  details{style:#}\n",
                "answer", "place"
            );
        }
        Report {
            json: inputs.json,
            quiet: inputs.quiet,
            text,
            counts: [0; Word::ALL.len()],
            items: 0,
            continuity: Continuity::new(),
        }
    }

    /// Says what does not follow before `item`, then what is to be said of the item itself;
    /// `answer` goes with a record.
    pub fn add(&mut self, item: &Item, answer: Option<Result<&str, String>>) {
        self.items += 1;
        if let Some(finding) = self.continuity.see(&item.content) {
            self.find(&finding, Some(item.place));
        }
        let place = Some(item.place);
        match (&item.content, answer) {
            (Content::Record(record), Some(Ok(tip))) => self.row(&Row {
                number: Some(record.sequence),
                tip: Some(tip),
                ..Row::new(Word::Proved, place)
            }),
            (Content::Record(record), Some(Err(reason))) => self.row(&Row {
                number: Some(record.sequence),
                reason: Some(reason),
                ..Row::new(Word::NotProved, place)
            }),
            (Content::Damaged(reason), _) => self.row(&Row {
                reason: Some(reason.clone()),
                ..Row::new(Word::Damaged, place)
            }),
            _ => {}
        }
    }

    fn find(&mut self, finding: &Finding, place: Option<Place>) {
        let count = match finding {
            Finding::Missing { count, .. } => Some(*count),
            _ => None,
        };
        self.row(&Row {
            count,
            reason: Some(finding.to_string()),
            ..Row::new(Word::from(finding), place)
        });
    }

    fn row(&mut self, row: &Row) {
        self.counts[row.word as usize] += 1;
        let text = if self.json {
            serde_json::to_string(row).expect("a row has only plain fields")
        } else {
            row.for_people()
        };
        self.text.push_str(&text);
        self.text.push('\n');
    }

    /// How often `word` is to be said in the end. Records that came late are not missing.
    fn count(&self, word: Word) -> u64 {
        match word {
            Word::Missing => self.continuity.missing(),
            _ => self.counts[word as usize],
        }
    }

    /// Items added so far.
    pub fn items(&self) -> u64 {
        self.items
    }

    /// Whether any record or seal was among them.
    pub fn begun(&self) -> bool {
        self.continuity.begun()
    }

    /// What follows the last item.
    pub fn end(&mut self, start: Instant) {
        if let Some(finding) = self.continuity.end() {
            self.find(&finding, None);
        }
        if !self.quiet {
            let summary = if self.json {
                self.summary_for_programs()
            } else {
                self.summary_for_people(start.elapsed().as_secs_f64())
            };
            self.text.push_str(&summary);
        }
    }

    fn summary_for_programs(&self) -> String {
        let counts = Word::ALL.map(|word| (word.text(), self.count(word)));
        let all: serde_json::Map<_, _> = counts
            .into_iter()
            .chain([("lost", self.continuity.lost())])
            .map(|(text, count)| (text.to_owned(), count.into()))
            .collect();
        let row = serde_json::json!({ "schema": SCHEMA, "summary": all });
        format!("{row}\n")
    }

    fn summary_for_people(&self, seconds: f64) -> String {
        let said: Vec<String> = Word::ALL
            .into_iter()
            .filter(|word| self.count(*word) > 0)
            .map(|word| {
                let style = word.style();
                format!("{style}{} {}{style:#}", self.count(word), word.text())
            })
            .collect();
        let colon = if said.is_empty() { "" } else { ": " };
        let lost = match self.continuity.lost() {
            0 => String::new(),
            lost => {
                format!(
                    "The controller counted {lost} of its records as lost before they were sent.\n"
                )
            }
        };
        let (items, said) = (self.items, said.join(", "));
        format!("\n{items} items in {seconds:.2} s{colon}{said}\n{lost}\n{CAUTION}\n")
    }

    /// Prints the rows that have not been printed.
    pub fn write(&mut self) -> io::Result<()> {
        print(&std::mem::take(&mut self.text), self.json)
    }

    /// The exit status so far.
    pub fn status(&self) -> Status {
        let said = |word: &Word| self.count(*word) > 0;
        let statuses = Word::ALL
            .iter()
            .filter(|word| said(word))
            .map(|word| word.status());
        // Of the three, invalid goes first and clear last.
        statuses
            .max_by_key(|status| (*status == Status::Negative, *status == Status::Undecided))
            .unwrap_or(Status::Clear)
    }
}

/// The fields of a row; those that do not apply are left out.
#[derive(Serialize)]
struct Row<'a> {
    schema: u32,
    #[serde(rename = "verdict")]
    word: Word,
    #[serde(skip_serializing_if = "Option::is_none")]
    byte: Option<u64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    line: Option<usize>,
    #[serde(skip_serializing_if = "Option::is_none")]
    number: Option<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    tip: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    count: Option<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<String>,
}

impl Row<'_> {
    fn new(word: Word, place: Option<Place>) -> Self {
        let (byte, line) = match place {
            Some(Place::Byte(offset)) => (Some(offset), None),
            Some(Place::Line(number)) => (None, Some(number)),
            None => (None, None),
        };
        Row {
            schema: SCHEMA,
            word,
            byte,
            line,
            number: None,
            tip: None,
            count: None,
            reason: None,
        }
    }

    fn for_people(&self) -> String {
        let style = self.word.style();
        let place = match (self.byte, self.line) {
            (Some(offset), _) => Place::Byte(offset).to_string(),
            (_, Some(number)) => Place::Line(number).to_string(),
            _ => "end".to_owned(),
        };
        let number = self.number.map(|number| format!("number {number}"));
        let tip = self.tip.map(|tip| format!("tip {tip}"));
        let details: Vec<String> = [number, tip, self.reason.clone()]
            .into_iter()
            .flatten()
            .collect();
        format!(
            "{style}{:WORD_WIDTH$}{style:#}  {place:PLACE_WIDTH$}  {}",
            self.word.text(),
            printable(&details.join(": "))
        )
    }
}

impl Serialize for Word {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(self.text())
    }
}
