//! Reading files of cases, which `balk-board-cases` makes on the workstation.
//!
//! A file is a sequence of sections and ends with two zero bytes. A section is the length of a
//! machine's image (2 bytes), the image, the number of cases (4 bytes) and the cases. A case is the
//! kind of its target, whether the complete search found it reachable, the controller's answer as
//! computed on the workstation, the length of a record, and the record. That is the record of the
//! refusal, or, of a target that passed, one with the same target and options and an invented
//! tree. Numbers are little-endian.

use balk_core::image::{self, ImageError};
use balk_core::machine::Machine;
use balk_core::propagate::MOST_JOINTS;
use balk_core::record::{self, Frame, Record};
use balk_core::screen::{Reason, Verdict};
use core::ffi::CStr;
use support::File;

/// What the complete search on the workstation found, as a byte of a case.
pub const UNREACHABLE: u8 = 2;

/// Why a file of cases cannot be read.
#[derive(Debug)]
pub enum CaseError {
    /// A record does not read.
    Record(record::ReadError),
    /// The image does not load.
    Image(ImageError),
    /// The file is missing, or ends early.
    Ended,
    /// What stands where a record should be is none.
    NoRecord,
}

/// A machine and the number of cases that follow.
pub struct Section {
    /// The machine, loaded from its image.
    pub machine: Machine<MOST_JOINTS>,
    /// Cases that follow.
    pub cases: u32,
}

/// One case.
pub struct Case {
    /// Kind of target: an index of the kinds as the maker lists them.
    pub kind: u8,
    /// What the complete search found.
    pub truth: u8,
    /// The controller's answer, see [`answer`].
    pub answer: u8,
    /// The record's bytes; only the first `length` count.
    bytes: [u8; record::MOST_BYTES],
    length: usize,
    /// The record as read from them.
    pub record: Record,
}

impl Case {
    /// The record's bytes.
    pub fn bytes(&self) -> &[u8] {
        self.bytes.get(..self.length).unwrap_or_default()
    }
}

/// A file of cases being read.
pub struct Cases(File);

impl Cases {
    /// Opens a file.
    ///
    /// # Errors
    /// [`CaseError::Ended`] when it is missing.
    pub fn open(name: &CStr) -> Result<Cases, CaseError> {
        File::open(name).map(Cases).ok_or(CaseError::Ended)
    }

    /// The next section; `None` at the end.
    ///
    /// # Errors
    /// When the file ends early or the image does not load.
    pub fn section(&mut self) -> Result<Option<Section>, CaseError> {
        let length = self.0.take().map(u16::from_le_bytes);
        let length = usize::from(length.ok_or(CaseError::Ended)?);
        if length == 0 {
            return Ok(None);
        }
        let mut bytes = [0; image::MOST_BYTES];
        let bytes = bytes.get_mut(..length).ok_or(CaseError::Ended)?;
        self.0.fill(bytes).ok_or(CaseError::Ended)?;
        Ok(Some(Section {
            machine: image::load(bytes).map_err(CaseError::Image)?,
            cases: self
                .0
                .take()
                .map(u32::from_le_bytes)
                .ok_or(CaseError::Ended)?,
        }))
    }

    /// The next case of a section.
    ///
    /// # Errors
    /// When the file ends early or the record does not read.
    pub fn case(&mut self) -> Result<Case, CaseError> {
        let [kind, truth, answer, length] = self.0.take().ok_or(CaseError::Ended)?;
        let length = usize::from(length);
        let mut bytes = [0; record::MOST_BYTES];
        let used = bytes.get_mut(..length).ok_or(CaseError::NoRecord)?;
        self.0.fill(used).ok_or(CaseError::Ended)?;
        let record = match record::read(used).map_err(CaseError::Record)? {
            Frame::Record(record) => record,
            Frame::Seal(_) => return Err(CaseError::NoRecord),
        };
        Ok(Case {
            kind,
            truth,
            answer,
            bytes,
            length,
            record,
        })
    }
}

/// A verdict as the byte of a case.
pub fn answer(verdict: &Verdict) -> u8 {
    match verdict {
        Verdict::Refused(_) => 0,
        Verdict::Passed(Reason::Capacity) => 1,
        Verdict::Passed(Reason::NothingFound) => 2,
        Verdict::Passed(Reason::PivotBudget) => 3,
        Verdict::Passed(Reason::SplitBudget) => 4,
        Verdict::Passed(Reason::OutOfRange) => 5,
    }
}
