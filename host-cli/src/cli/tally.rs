//! What was said how often, and the exit status that follows.

use anstyle::{AnsiColor, Style};

/// How a run ended; the number is the exit status.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[repr(u8)]
pub enum Status {
    /// Answered, and nothing unreachable, refused, invalid or undecided; a log without defects.
    Clear = 0,
    /// At least one target unreachable or refused, or a log with an invalid or missing record.
    Negative = 1,
    /// Wrong usage.
    Usage = 2,
    /// Nothing of that, but at least one target undecided, or a log that is not sealed.
    Undecided = 3,
    /// An input could not be read or had errors.
    Input = 4,
    /// A fault of the program itself, or its output could not be written.
    Fault = 5,
}

/// The one word said of a target.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Word {
    Reachable,
    Unreachable,
    Undecided,
    Passed,
    Refused,
    Error,
}

impl Word {
    const ALL: [Word; 6] = [
        Word::Reachable,
        Word::Unreachable,
        Word::Undecided,
        Word::Passed,
        Word::Refused,
        Word::Error,
    ];

    /// As printed.
    pub fn text(self) -> &'static str {
        match self {
            Word::Reachable => "reachable",
            Word::Unreachable => "unreachable",
            Word::Undecided => "undecided",
            Word::Passed => "passed",
            Word::Refused => "refused",
            Word::Error => "error",
        }
    }

    /// Its colour on a terminal.
    pub fn style(self) -> Style {
        let colour = match self {
            Word::Reachable | Word::Passed => AnsiColor::Green,
            Word::Unreachable | Word::Refused => AnsiColor::Yellow,
            Word::Undecided => AnsiColor::Cyan,
            Word::Error => AnsiColor::Red,
        };
        colour.on_default()
    }
}

/// How often each word was said.
#[derive(Debug, Default)]
pub(super) struct Tally {
    counts: [u64; Word::ALL.len()],
}

impl Tally {
    /// Counts `word` once more.
    pub fn add(&mut self, word: Word) {
        self.counts[word as usize] += 1;
    }

    fn of(&self, word: Word) -> u64 {
        self.counts[word as usize]
    }

    /// Targets answered, those with errors included.
    pub fn total(&self) -> u64 {
        self.counts.iter().sum()
    }

    /// The words that were said, and how often.
    pub fn said(&self) -> impl Iterator<Item = (Word, u64)> {
        Word::ALL
            .into_iter()
            .map(|word| (word, self.of(word)))
            .filter(|(_, count)| *count > 0)
    }

    /// The exit status for these answers. Errors go first: an answer that is missing must not be
    /// taken for one that was given.
    pub fn status(&self) -> Status {
        if self.of(Word::Error) > 0 {
            Status::Input
        } else if self.of(Word::Unreachable) + self.of(Word::Refused) > 0 {
            Status::Negative
        } else if self.of(Word::Undecided) > 0 {
            Status::Undecided
        } else {
            Status::Clear
        }
    }
}
