//! A packed machine outside the workstation: as a table in Rust source, or as a binary image that
//! a controller loads at run time.
//!
//! # Layout of an image, version 1
//!
//! Numbers are little-endian two's complement.
//!
//! | at | bytes | field |
//! |---|---|---|
//! | 0 | 4 | `balk` |
//! | 4 | 1 | version: 1 |
//! | 5 | 1 | number v of variables |
//! | 6 | 1 | number j of joints |
//! | 7 | 1 | exponent: metres are `value * 2^(exponent - 30)` |
//! | 8 | 8 | [`fingerprint`] of the machine |
//! | 16 | 26 v | variables: motion (0 slides, 1 turns), arc, length |
//! | | 132 j | joints: motion, variable, multiple, arc, shift, placement |
//! | | 104 | the tip's placement |
//! | | 4 | checksum: CRC-32C of all bytes before |
//!
//! An arc is a byte that tells the full circle (1) from a piece of it (0), and the first and last
//! direction; a direction is x and y, an interval its lower and upper bound. A placement is nine
//! rotation entries row by row, the turn slack, three intervals of the origin and three of its
//! back vector, and two 64-bit bounds of the square.

use crate::fixed::{Arc, Direction, Interval, ONE, ONE_SQUARED, Product};
use crate::machine::{Joint, Machine, Motion, Placement, Variable};
use crate::propagate::MOST_JOINTS;
use crate::record::{CHECKSUM, fingerprint};
use core::fmt;
use heapless::Vec;

/// Version of the layout.
pub const VERSION: u8 = 1;
/// Length of the image of a machine with that many joints and variables, bytes.
pub const fn bytes_for(joints: usize, variables: usize) -> usize {
    HEAD_BYTES
        + variables * VARIABLE_BYTES
        + joints * JOINT_BYTES
        + PLACEMENT_BYTES
        + CHECKSUM_BYTES
}
/// Longest image.
pub const MOST_BYTES: usize = bytes_for(MOST_JOINTS, MOST_JOINTS);

const MAGIC: [u8; 4] = *b"balk";
const HEAD_BYTES: usize = 16;
const VARIABLE_BYTES: usize = 26;
const JOINT_BYTES: usize = 28 + PLACEMENT_BYTES;
const PLACEMENT_BYTES: usize = 104;
const CHECKSUM_BYTES: usize = 4;
/// How far the square of a placement may lie below zero: what packing rounds.
const SQUARE_SLACK: i64 = 1 << 12;
/// How far it stays below one, so that sums of eight products fit: packing leaves more.
const SQUARE_ROOM: i64 = 1 << 40;

/// Why bytes are no image of a machine.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum ImageError {
    /// The machine has this many joints or variables, more than the memory given holds.
    Capacity(u8),
    /// The checksum is not that of the bytes: damaged.
    Checksum,
    /// The machine is not the one whose fingerprint the image states.
    Fingerprint,
    /// This many bytes are left over.
    Leftover(usize),
    /// It does not begin as an image does: something else.
    NotAnImage,
    /// A value is outside its range.
    Range {
        /// Which kind of value.
        field: Field,
        /// Index of the variable or joint; the tip counts as one more joint.
        index: u8,
    },
    /// The bytes end before the content does.
    TooShort,
    /// The layout is of this unknown version.
    Version(u8),
}

/// A value of an image that has a range.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Field {
    /// A lower and an upper bound: in order, and at most one in size.
    Bounds,
    /// A direction: length one within two units.
    Direction,
    /// Whether an arc is the full circle: 0 or 1.
    Full,
    /// A joint's motion: 0 or 1, and that of its variable.
    Motion,
    /// The multiple of a variable: from -127 to 127.
    Multiple,
    /// An entry of a rotation: at most one in size.
    Rotation,
    /// A squared length: bounds in order, from zero but for rounding to a little below one.
    Square,
    /// The slack of a rotation: from zero to one, and one unit.
    TurnSlack,
    /// The index of a joint's variable.
    Variable,
}

impl fmt::Display for ImageError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ImageError::Capacity(count) => write!(f, "{count} joints or variables do not fit"),
            ImageError::Checksum => write!(f, "the checksum differs: the image is damaged"),
            ImageError::Fingerprint => write!(f, "the fingerprint is not the machine's"),
            ImageError::Leftover(count) => write!(f, "{count} bytes too long"),
            ImageError::NotAnImage => write!(f, "not an image of a machine"),
            ImageError::Range { field, index } => {
                write!(f, "{field:?} of joint or variable {index} is out of range")
            }
            ImageError::TooShort => write!(f, "too short"),
            ImageError::Version(version) => {
                write!(f, "layout {version}; this program reads layout {VERSION}")
            }
        }
    }
}

impl core::error::Error for ImageError {}

/// The machine of a table in Rust source, for a `const` or a `static`.
///
/// Such tables are written by `balk pack`. A table with more variables than `N` is an error when
/// compiling.
pub const fn table<const N: usize, const VARIABLES: usize>(
    joints: [Joint; N],
    variables: [Variable; VARIABLES],
    tip: Placement,
    exponent: i8,
) -> Machine<N> {
    Machine {
        joints: Vec::from_array(joints),
        variables: Vec::from_array(variables),
        tip,
        exponent,
    }
}

/// The image of a machine.
///
/// Reads back as an equal machine if every value is in its documented range, as packing sees to,
/// and the machine has at most [`MOST_JOINTS`] joints; other images are refused by [`load`].
pub fn image<const N: usize>(machine: &Machine<N>) -> Vec<u8, MOST_BYTES> {
    let mut bytes = Bytes(Vec::new());
    bytes.put(&MAGIC);
    let counts = [machine.variables.len() as u8, machine.joints.len() as u8];
    bytes.put(&[VERSION, counts[0], counts[1], machine.exponent as u8]);
    bytes.put(&fingerprint(machine).to_le_bytes());
    for variable in &machine.variables {
        bytes.put(&[motion_byte(variable.motion)]);
        bytes.arc(variable.arc);
        bytes.interval(variable.length);
    }
    for joint in &machine.joints {
        let multiple = joint.multiple as u8;
        bytes.put(&[motion_byte(joint.motion), joint.variable, multiple]);
        bytes.arc(joint.turn);
        bytes.interval(joint.shift);
        bytes.placement(&joint.placement);
    }
    bytes.placement(&machine.tip);
    let checksum = CHECKSUM.checksum(&bytes.0);
    bytes.put(&checksum.to_le_bytes());
    bytes.0
}

fn motion_byte(motion: Motion) -> u8 {
    match motion {
        Motion::Slide => 0,
        Motion::Turn => 1,
    }
}

/// An image being written.
struct Bytes(Vec<u8, MOST_BYTES>);

impl Bytes {
    /// Adds bytes. Those of every machine up to [`MOST_JOINTS`] fit.
    fn put(&mut self, part: &[u8]) {
        let _ = self.0.extend_from_slice(part);
    }

    fn numbers(&mut self, numbers: &[i32]) {
        for number in numbers {
            self.put(&number.to_le_bytes());
        }
    }

    fn interval(&mut self, interval: Interval) {
        self.numbers(&[interval.lo, interval.hi]);
    }

    fn arc(&mut self, arc: Arc) {
        self.put(&[u8::from(arc.full)]);
        self.numbers(&[arc.lo.x, arc.lo.y, arc.hi.x, arc.hi.y]);
    }

    fn placement(&mut self, placement: &Placement) {
        for row in &placement.rotation {
            self.numbers(row);
        }
        self.numbers(&[placement.turn_slack]);
        for bounds in placement.origin.iter().chain(&placement.back) {
            self.interval(*bounds);
        }
        self.put(&placement.square.lo.to_le_bytes());
        self.put(&placement.square.hi.to_le_bytes());
    }
}

/// Loads a machine from an image.
///
/// Total: any bytes give a machine or an error. A machine that loads can be screened without
/// fault; that it is the machine in front of you is for you to compare, by
/// [`fingerprint`], with what `balk pack` printed. Cost: a few operations a byte, at most
/// [`MOST_BYTES`].
///
/// # Errors
/// See [`ImageError`]; the first defect found.
pub fn load<const N: usize>(bytes: &[u8]) -> Result<Machine<N>, ImageError> {
    let begins_alike = bytes.iter().zip(&MAGIC).all(|(have, want)| have == want);
    if !begins_alike {
        return Err(ImageError::NotAnImage);
    }
    let mut rest = Rest {
        bytes: bytes.get(MAGIC.len()..).ok_or(ImageError::TooShort)?,
        index: 0,
    };
    let [version] = rest.take()?;
    if version != VERSION {
        return Err(ImageError::Version(version));
    }
    let [variables, joints, exponent] = rest.take()?;
    let length = bytes_for(joints.into(), variables.into());
    if bytes.len() < length {
        return Err(ImageError::TooShort);
    }
    if bytes.len() > length {
        return Err(ImageError::Leftover(bytes.len() - length));
    }
    let (body, checksum) = bytes.split_last_chunk().ok_or(ImageError::TooShort)?;
    if CHECKSUM.checksum(body) != u32::from_le_bytes(*checksum) {
        return Err(ImageError::Checksum);
    }
    let stated = rest.take().map(u64::from_le_bytes)?;

    let full = ImageError::Capacity(joints.max(variables));
    if usize::from(joints.max(variables)) > MOST_JOINTS {
        return Err(full);
    }
    let mut read_variables = Vec::new();
    for index in 0..variables {
        rest.index = index;
        read_variables.push(rest.variable()?).map_err(|_| full)?;
    }
    let mut read_joints = Vec::new();
    for index in 0..joints {
        rest.index = index;
        read_joints
            .push(rest.joint(&read_variables)?)
            .map_err(|_| full)?;
    }
    rest.index = joints;
    let machine = Machine {
        joints: read_joints,
        variables: read_variables,
        tip: rest.placement()?,
        exponent: exponent as i8,
    };
    if fingerprint(&machine) != stated {
        return Err(ImageError::Fingerprint);
    }
    Ok(machine)
}

/// What has not been read yet.
struct Rest<'a> {
    bytes: &'a [u8],
    /// Of the joint or variable being read.
    index: u8,
}

impl Rest<'_> {
    fn take<const LENGTH: usize>(&mut self) -> Result<[u8; LENGTH], ImageError> {
        let (head, rest) = self.bytes.split_first_chunk().ok_or(ImageError::TooShort)?;
        self.bytes = rest;
        Ok(*head)
    }

    fn numbers<const COUNT: usize>(&mut self) -> Result<[i32; COUNT], ImageError> {
        let mut numbers = [0; COUNT];
        for number in &mut numbers {
            *number = self.take().map(i32::from_le_bytes)?;
        }
        Ok(numbers)
    }

    /// An error unless the value just read is in its range.
    fn require(&self, in_range: bool, field: Field) -> Result<(), ImageError> {
        if in_range {
            return Ok(());
        }
        let index = self.index;
        Err(ImageError::Range { field, index })
    }

    fn motion(&mut self) -> Result<Motion, ImageError> {
        let [motion] = self.take()?;
        self.require(motion <= 1, Field::Motion)?;
        Ok(if motion == 0 {
            Motion::Slide
        } else {
            Motion::Turn
        })
    }

    fn interval(&mut self) -> Result<Interval, ImageError> {
        let [lo, hi] = self.numbers()?;
        self.require(-ONE <= lo && lo <= hi && hi <= ONE, Field::Bounds)?;
        Ok(Interval { lo, hi })
    }

    fn direction(&mut self) -> Result<Direction, ImageError> {
        let [x, y] = self.numbers()?;
        // Two squares of at most 2^62 each, as unsigned numbers.
        let square = i64::from(x).unsigned_abs().pow(2) + i64::from(y).unsigned_abs().pow(2);
        let (least, most) = (ONE as u64 - 2, ONE as u64 + 2);
        let unit = (least * least..=most * most).contains(&square);
        let small = x.unsigned_abs().max(y.unsigned_abs()) <= ONE as u32;
        self.require(unit && small, Field::Direction)?;
        Ok(Direction { x, y })
    }

    fn arc(&mut self) -> Result<Arc, ImageError> {
        let [full] = self.take()?;
        self.require(full <= 1, Field::Full)?;
        Ok(Arc {
            full: full == 1,
            lo: self.direction()?,
            hi: self.direction()?,
        })
    }

    fn variable(&mut self) -> Result<Variable, ImageError> {
        Ok(Variable {
            motion: self.motion()?,
            arc: self.arc()?,
            length: self.interval()?,
        })
    }

    fn joint(&mut self, variables: &[Variable]) -> Result<Joint, ImageError> {
        let motion = self.motion()?;
        let [variable, multiple] = self.take()?;
        let multiple = multiple as i8;
        let driven_by = variables.get(usize::from(variable));
        self.require(driven_by.is_some(), Field::Variable)?;
        self.require(driven_by.is_some_and(|v| v.motion == motion), Field::Motion)?;
        self.require(multiple > i8::MIN, Field::Multiple)?;
        Ok(Joint {
            motion,
            variable,
            multiple,
            turn: self.arc()?,
            shift: self.interval()?,
            placement: self.placement()?,
        })
    }

    fn placement(&mut self) -> Result<Placement, ImageError> {
        let rotation = [self.numbers()?, self.numbers()?, self.numbers()?];
        let entries = rotation.iter().flatten();
        let small = entries.map(|e| e.unsigned_abs()).all(|e| e <= ONE as u32);
        self.require(small, Field::Rotation)?;
        let [turn_slack] = self.numbers()?;
        self.require((0..=ONE + 1).contains(&turn_slack), Field::TurnSlack)?;
        let origin = [self.interval()?, self.interval()?, self.interval()?];
        let back = [self.interval()?, self.interval()?, self.interval()?];
        let lo = self.take().map(i64::from_le_bytes)?;
        let hi = self.take().map(i64::from_le_bytes)?;
        let most = ONE_SQUARED - SQUARE_ROOM;
        self.require(-SQUARE_SLACK <= lo && lo <= hi && hi <= most, Field::Square)?;
        Ok(Placement {
            rotation,
            turn_slack,
            origin,
            back,
            square: Product { lo, hi },
        })
    }
}
