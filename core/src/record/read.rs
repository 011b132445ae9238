//! Reads records and seals back, whatever the bytes.

use super::{
    BOUNDS_STEP, CHECKSUM, CHECKSUM_BYTES, HEAD_BYTES, RECORD_KIND, ROWS_STEP, SEAL_BYTES,
    SEAL_KIND, Seal, VERSION,
};
use crate::fixed::Interval;
use crate::propagate::{MOST_JOINTS, Rules};
use crate::screen::{MOST_STEPS, Options, Step};
use crate::target::{Cone, Orientation, Target, is_half_sine, is_unit};
use core::fmt;
use heapless::Vec;

/// What the record of a refusal says. Nothing of it is proved before it is screened again.
#[derive(Clone, Debug)]
pub struct Record {
    /// Its number in the log.
    pub sequence: u32,
    /// Chained digest, see [`chained`](super::chained).
    pub digest: u64,
    /// Fingerprint of the machine that was screened.
    pub fingerprint: u64,
    /// What the screening was allowed to spend.
    pub options: Options,
    /// The target that was refused.
    pub target: Target,
    /// The tree of cuts and the way each part was shown empty, see
    /// [`Refusal::steps`](crate::screen::Refusal::steps).
    pub steps: Vec<Step, MOST_STEPS>,
}

/// One item of a log.
#[derive(Clone, Debug)]
#[allow(
    clippy::large_enum_variant,
    reason = "there is no heap to put the record on"
)]
pub enum Frame {
    /// The record of a refusal.
    Record(Record),
    /// Where the log ends.
    Seal(Seal),
}

/// Why bytes are no record and no seal.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum ReadError {
    /// The checksum is not that of the bytes.
    Checksum,
    /// The target names this many cones, more than fit.
    Cones(u8),
    /// The first byte is this and names no kind.
    Kind(u8),
    /// This many bytes, or an unused half byte, are left over.
    Leftover(usize),
    /// The orientation is of this unknown kind.
    Orientation(u8),
    /// This field holds a value outside its documented range.
    Range(Field),
    /// The tree has this many steps, more than fit.
    Steps(u8),
    /// The bytes end before the content does.
    TooShort,
    /// The tree does not close every part exactly once, or has more parts than the options allow.
    Tree,
    /// The tree cuts this variable, which no machine has.
    Variable(u8),
    /// The layout is of this unknown version.
    Version(u8),
}

/// A field of a record whose values have a range.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Field {
    /// An axis of a cone: unit length within two units.
    Axis,
    /// The half sine of an angle: from zero to one.
    HalfSine,
    /// The position box: bounds as [`Interval::clamped`] makes them.
    Position,
    /// The rules: those of [`Rules::ALL`].
    Rules,
}

impl fmt::Display for ReadError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ReadError::Checksum => write!(f, "the checksum differs"),
            ReadError::Cones(count) => write!(f, "{count} cones are more than fit"),
            ReadError::Kind(kind) => write!(f, "unknown kind {kind:#04x}"),
            ReadError::Leftover(count) => write!(f, "{count} bytes too long, or padded wrongly"),
            ReadError::Orientation(kind) => write!(f, "unknown orientation {kind}"),
            ReadError::Range(Field::Axis) => write!(f, "an axis is not of unit length"),
            ReadError::Range(Field::HalfSine) => write!(f, "a half sine is out of range"),
            ReadError::Range(Field::Position) => write!(f, "the position is out of range"),
            ReadError::Range(Field::Rules) => write!(f, "unknown rules"),
            ReadError::Steps(count) => write!(f, "{count} steps are more than fit"),
            ReadError::TooShort => write!(f, "too short"),
            ReadError::Tree => write!(f, "the tree does not close every part once"),
            ReadError::Variable(variable) => write!(f, "no machine has a variable {variable}"),
            ReadError::Version(version) => write!(f, "unknown version {version}"),
        }
    }
}

impl core::error::Error for ReadError {}

/// Reads a record or a seal.
///
/// Total: any bytes give a frame or an error. What [`RecordBytes`](super::RecordBytes) and
/// [`Seal::bytes`] hold reads back with equal fields, and no other bytes give the same frame.
/// Cost: a few operations a byte.
///
/// # Errors
/// See [`ReadError`]; the first defect found.
pub fn read(bytes: &[u8]) -> Result<Frame, ReadError> {
    let (kind, version) = match bytes {
        [kind, version, ..] => (*kind, *version),
        _ => return Err(ReadError::TooShort),
    };
    if kind != RECORD_KIND && kind != SEAL_KIND {
        return Err(ReadError::Kind(kind));
    }
    if version != VERSION {
        return Err(ReadError::Version(version));
    }
    let shortest = if kind == SEAL_KIND {
        SEAL_BYTES
    } else {
        HEAD_BYTES + CHECKSUM_BYTES
    };
    if bytes.len() < shortest {
        return Err(ReadError::TooShort);
    }
    let Some((body, checksum)) = bytes.split_last_chunk() else {
        return Err(ReadError::TooShort);
    };
    if CHECKSUM.checksum(body) != u32::from_le_bytes(*checksum) {
        return Err(ReadError::Checksum);
    }
    let mut rest = Rest(body.get(2..).unwrap_or_default());
    let frame = if kind == SEAL_KIND {
        Frame::Seal(Seal {
            next: rest.u32()?,
            digest: rest.u64()?,
            lost: rest.u32()?,
        })
    } else {
        Frame::Record(rest.record()?)
    };
    match rest.0.len() {
        0 => Ok(frame),
        count => Err(ReadError::Leftover(count)),
    }
}

/// What has not been read yet.
struct Rest<'a>(&'a [u8]);

impl Rest<'_> {
    fn take<const N: usize>(&mut self) -> Result<[u8; N], ReadError> {
        let (head, rest) = self.0.split_first_chunk().ok_or(ReadError::TooShort)?;
        self.0 = rest;
        Ok(*head)
    }

    fn u8(&mut self) -> Result<u8, ReadError> {
        self.take().map(|[byte]| byte)
    }

    fn u16(&mut self) -> Result<u16, ReadError> {
        self.take().map(u16::from_le_bytes)
    }

    fn u32(&mut self) -> Result<u32, ReadError> {
        self.take().map(u32::from_le_bytes)
    }

    fn u64(&mut self) -> Result<u64, ReadError> {
        self.take().map(u64::from_le_bytes)
    }

    fn numbers<const N: usize>(&mut self) -> Result<[i32; N], ReadError> {
        let mut numbers = [0; N];
        for number in &mut numbers {
            *number = self.take().map(i32::from_le_bytes)?;
        }
        Ok(numbers)
    }

    fn record(&mut self) -> Result<Record, ReadError> {
        let (sequence, digest, fingerprint) = (self.u32()?, self.u64()?, self.u64()?);
        let options = Options {
            splits: self.u16()?,
            pivots: self.u16()?,
            candidates: self.u8()?,
            rules: Rules(self.u8()?),
        };
        if !Rules::ALL.has(options.rules) {
            return Err(ReadError::Range(Field::Rules));
        }
        Ok(Record {
            sequence,
            digest,
            fingerprint,
            target: Target {
                position: [self.bounds()?, self.bounds()?, self.bounds()?],
                orientation: self.orientation()?,
            },
            steps: self.steps(options.splits)?,
            options,
        })
    }

    /// Bounds as [`Interval::clamped`] makes them: at most one, but for an empty set's beyond.
    fn bounds(&mut self) -> Result<Interval, ReadError> {
        let [lo, hi] = self.numbers()?;
        let bounds = Interval { lo, hi };
        if bounds != Interval::clamped(lo.into(), hi.into()) {
            return Err(ReadError::Range(Field::Position));
        }
        Ok(bounds)
    }

    fn orientation(&mut self) -> Result<Orientation, ReadError> {
        match self.u8()? {
            0 => Ok(Orientation::Free),
            1 => Ok(Orientation::Near {
                quaternion: self.numbers()?,
                half_sine: self.half_sine()?,
            }),
            2 => {
                let count = self.u8()?;
                let mut cones = Vec::new();
                for _ in 0..count {
                    let cone = Cone {
                        tip: self.axis()?,
                        base: self.axis()?,
                        half_sine: self.half_sine()?,
                    };
                    cones.push(cone).map_err(|_| ReadError::Cones(count))?;
                }
                Ok(Orientation::Axes(cones))
            }
            kind => Err(ReadError::Orientation(kind)),
        }
    }

    fn half_sine(&mut self) -> Result<i32, ReadError> {
        let [value] = self.numbers()?;
        if is_half_sine(value) {
            Ok(value)
        } else {
            Err(ReadError::Range(Field::HalfSine))
        }
    }

    fn axis(&mut self) -> Result<[i32; 3], ReadError> {
        let axis = self.numbers()?;
        if is_unit(axis) {
            Ok(axis)
        } else {
            Err(ReadError::Range(Field::Axis))
        }
    }

    /// The steps of a tree of at most `splits` parts.
    fn steps(&mut self, splits: u16) -> Result<Vec<Step, MOST_STEPS>, ReadError> {
        let count = self.u8()?;
        let mut steps = Vec::new();
        // Parts still to be closed, and all there have been.
        let (mut open, mut parts) = (1u16, 1u16);
        let mut pair = 0;
        for number in 0..count {
            pair = if number % 2 == 0 {
                self.u8()?
            } else {
                pair >> 4
            };
            if open == 0 {
                return Err(ReadError::Tree);
            }
            let step = match pair & 15 {
                BOUNDS_STEP => Step::Bounds,
                ROWS_STEP => Step::Rows,
                variable if usize::from(variable) < MOST_JOINTS => Step::Cut(variable),
                variable => return Err(ReadError::Variable(variable)),
            };
            // At most 255 steps, so that neither leaves its type.
            match step {
                Step::Cut(_) => (open, parts) = (open + 1, parts + 1),
                Step::Bounds | Step::Rows => open -= 1,
            }
            steps.push(step).map_err(|_| ReadError::Steps(count))?;
        }
        if count % 2 == 1 && pair >> 4 != 0 {
            return Err(ReadError::Leftover(0));
        }
        if open != 0 || parts > splits.max(1) {
            return Err(ReadError::Tree);
        }
        Ok(steps)
    }
}
