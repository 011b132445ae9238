//! What is missing between the items of a log.

use std::fmt;

use balk_core::record::{Record, Seal, chained};

use super::Content;

/// What does not follow from the items before.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Finding {
    /// The digest does not follow from that of the record before: one of the two was exchanged.
    ChainBroken {
        /// Number of the record before; `None` when this is the first.
        after: Option<u32>,
    },
    /// Records are missing before this item.
    Missing {
        /// How many.
        count: u32,
        /// Number of the last record before them; `None` when they are the first of the log.
        after: Option<u32>,
    },
    /// Nothing says where the log ends here: records after the last may be missing.
    NotSealed {
        /// Number of the last record; `None` when there was none.
        after: Option<u32>,
    },
    /// The item belongs before one that has been read.
    OutOfOrder {
        /// Number of the last record in order.
        after: Option<u32>,
    },
    /// A record of this number has been read before.
    Repeated,
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let number = |after: &Option<u32>| {
            after.map_or("the beginning".to_owned(), |after| {
                format!("number {after}")
            })
        };
        match self {
            Finding::ChainBroken { after } => {
                write!(f, "the digest does not follow from {}", number(after))
            }
            Finding::Missing { count, after } => {
                let plural = if *count == 1 { "" } else { "s" };
                write!(f, "{count} record{plural} after {}", number(after))
            }
            Finding::NotSealed { after } => {
                write!(f, "records after {} may be missing", number(after))
            }
            Finding::OutOfOrder { after } => write!(f, "comes after {}", number(after)),
            Finding::Repeated => write!(f, "a record of this number came before"),
        }
    }
}

/// Follows the numbers and digests of a log, in memory that does not grow.
///
/// A controller that starts again begins at number 0; a log may hold several such runs.
#[derive(Clone, Debug, Default)]
pub struct Continuity {
    /// Number of the next record in order.
    next: u32,
    /// Digest of the record before, if it is known.
    digest: Option<u64>,
    /// Which of the 64 numbers before `next` have been read: a sliding window as in RFC 4303
    /// (Kent, *IP Encapsulating Security Payload*, 2005, section 3.4.3).
    read: u64,
    /// Whether a seal came last.
    sealed: bool,
    /// Whether any record or seal has been read.
    begun: bool,
    missing: u64,
    /// What the controller counted as lost, in earlier runs and in this one.
    lost: (u64, u32),
}

impl Continuity {
    /// Of a log of which nothing has been read.
    pub fn new() -> Continuity {
        Continuity {
            digest: Some(0),
            ..Continuity::default()
        }
    }

    /// Takes the next item; says what does not follow from those before.
    pub fn see(&mut self, content: &Content) -> Option<Finding> {
        match content {
            // It may have been a record after the seal.
            Content::Damaged(_) => {
                self.sealed = false;
                None
            }
            Content::Record(record) => self.record(record),
            Content::Seal(seal) => self.seal(seal),
        }
    }

    /// What is to be said at the end of the log.
    pub fn end(&self) -> Option<Finding> {
        let after = self.last();
        (!self.sealed).then_some(Finding::NotSealed { after })
    }

    /// Records that are missing so far: numbers passed over that have not come late.
    pub fn missing(&self) -> u64 {
        self.missing
    }

    /// Records that the controller itself counted as lost, by the last seal of each run.
    pub fn lost(&self) -> u64 {
        self.lost.0 + u64::from(self.lost.1)
    }

    /// Whether any record or seal has been read.
    pub fn begun(&self) -> bool {
        self.begun
    }

    /// The number before the next, if there is one.
    fn last(&self) -> Option<u32> {
        self.next.checked_sub(1)
    }

    fn record(&mut self, record: &Record) -> Option<Finding> {
        let bytes = record.bytes();
        let first = record.sequence == 0 && record.digest == chained(0, &bytes);
        let restarts = first && self.begun && self.next != 0;
        let unsealed = self.end().filter(|_| restarts);
        if restarts {
            *self = Continuity {
                missing: self.missing,
                lost: (self.lost(), 0),
                ..Continuity::new()
            };
        }
        self.sealed = false;
        let behind = self.behind(record.sequence);
        self.begun = true;
        if behind > 0 {
            return Some(self.late(behind));
        }
        let finding = self.advance(record.sequence).or_else(|| {
            let follows = |before| record.digest == chained(before, &bytes);
            self.broken(!self.digest.is_none_or(follows))
        });
        self.next = record.sequence.wrapping_add(1);
        self.read = (self.read << 1) | 1;
        self.digest = Some(record.digest);
        unsealed.or(finding)
    }

    /// How many places `number` lies before the next, if it does. The first number read does not.
    fn behind(&self, number: u32) -> u32 {
        let ahead = number.wrapping_sub(self.next) as i32;
        if self.begun && ahead < 0 {
            ahead.unsigned_abs()
        } else {
            0
        }
    }

    fn broken(&self, broken: bool) -> Option<Finding> {
        let after = self.last();
        broken.then_some(Finding::ChainBroken { after })
    }

    /// A record that many places before the next.
    fn late(&mut self, behind: u32) -> Finding {
        let after = self.last();
        match 1u64.checked_shl(behind - 1) {
            Some(bit) if self.read & bit != 0 => Finding::Repeated,
            Some(bit) => {
                self.read |= bit;
                self.missing = self.missing.saturating_sub(1);
                Finding::OutOfOrder { after }
            }
            None => Finding::OutOfOrder { after },
        }
    }

    fn seal(&mut self, seal: &Seal) -> Option<Finding> {
        let behind = self.behind(seal.next);
        self.begun = true;
        self.sealed = behind == 0;
        if behind > 0 {
            let after = self.last();
            return Some(Finding::OutOfOrder { after });
        }
        self.lost.1 = seal.lost;
        let finding = self
            .advance(seal.next)
            .or_else(|| self.broken(self.digest.is_some_and(|digest| digest != seal.digest)));
        self.digest = Some(seal.digest);
        finding
    }

    /// Passes over the numbers up to `next`, which are missing.
    fn advance(&mut self, next: u32) -> Option<Finding> {
        let count = next.wrapping_sub(self.next);
        if count == 0 {
            return None;
        }
        let after = self.last();
        self.missing += u64::from(count);
        self.next = next;
        self.read = self.read.checked_shl(count).unwrap_or(0);
        self.digest = None;
        Some(Finding::Missing { count, after })
    }
}
