//! Reads target lines.

use std::io::{self, BufRead, BufReader, Read};

use nalgebra::Vector3;

use crate::model::{Cone, Machine, Orientation, Target};

use super::fields::{Field, Fields};
use super::pose::{direction, matrix, quaternion, roll_pitch_yaw};
use super::tree::from_json;
use super::{Defect, Flaw};

/// Longest target line, bytes. A target with every field takes some hundred.
pub const MAX_LINE_BYTES: usize = 1 << 16;
/// Most axes one target may ask for.
pub const MAX_CONES: usize = balk_core::target::MOST_CONES;

/// One line of a targets file.
#[derive(Clone, Debug)]
pub struct Line {
    /// Its number in the file, from 1.
    pub number: usize,
    /// Its bytes without the line end; `None` when it is longer than [`MAX_LINE_BYTES`].
    pub bytes: Option<Vec<u8>>,
}

/// The lines of a targets file that hold anything, read one by one in bounded memory.
#[derive(Debug)]
pub struct Lines<R> {
    source: R,
    number: usize,
    bytes: u64,
}

impl<R: BufRead> Lines<R> {
    /// Lines of `source`, from its current position on.
    pub fn new(source: R) -> Self {
        Lines {
            source,
            number: 0,
            bytes: 0,
        }
    }

    /// Bytes read so far.
    pub fn bytes(&self) -> u64 {
        self.bytes
    }

    /// The next line that is not blank, or `None` at the end. A line that is too long is skipped
    /// over without being held.
    ///
    /// # Errors
    ///
    /// Those of the source.
    pub fn next_line(&mut self) -> io::Result<Option<Line>> {
        let mut bytes = Vec::new();
        while self.read_line(&mut bytes)? {
            self.number += 1;
            let number = self.number;
            if bytes.len() > MAX_LINE_BYTES {
                return Ok(Some(Line {
                    number,
                    bytes: None,
                }));
            }
            let start = if number == 1 && bytes.starts_with(b"\xef\xbb\xbf") {
                3
            } else {
                0
            };
            let content = bytes[start..].trim_ascii();
            if !content.is_empty() {
                return Ok(Some(Line {
                    number,
                    bytes: Some(content.to_vec()),
                }));
            }
        }
        Ok(None)
    }

    /// Puts the next line without its end into `bytes`, but never more than one byte beyond
    /// [`MAX_LINE_BYTES`]; false at the end of the source.
    fn read_line(&mut self, bytes: &mut Vec<u8>) -> io::Result<bool> {
        bytes.clear();
        let mut any = false;
        loop {
            let available = match self.source.fill_buf() {
                Err(error) if error.kind() == io::ErrorKind::Interrupted => continue,
                other => other?,
            };
            if available.is_empty() {
                return Ok(any);
            }
            any = true;
            let end = available.iter().position(|byte| *byte == b'\n');
            let part = &available[..end.unwrap_or(available.len())];
            let room = MAX_LINE_BYTES + 1 - bytes.len();
            bytes.extend_from_slice(&part[..part.len().min(room)]);
            let used = end.map_or(available.len(), |end| end + 1);
            self.source.consume(used);
            self.bytes += used as u64;
            if end.is_some() {
                return Ok(true);
            }
        }
    }
}

impl<R: Read> Lines<BufReader<R>> {
    /// The lines that can be had without waiting for more than the first, at most `most`; none at
    /// the end. A program that asks about one target at a time is so answered one at a time.
    ///
    /// # Errors
    ///
    /// Those of the source.
    pub fn next_chunk(&mut self, most: usize) -> io::Result<Vec<Line>> {
        let mut chunk: Vec<Line> = self.next_line()?.into_iter().collect();
        while !chunk.is_empty() && chunk.len() < most && self.source.buffer().contains(&b'\n') {
            match self.next_line()? {
                Some(line) => chunk.push(line),
                None => break,
            }
        }
        Ok(chunk)
    }
}

/// Reads the target on `line` of `file` for `machine`. Without an `id` its id is the line number.
///
/// # Errors
///
/// The id as far as it could be read, and the first [`Defect`] found.
pub fn target(line: &Line, file: &str, machine: &Machine) -> Result<Target, (String, Defect)> {
    let mut id = line.number.to_string();
    parse(line, machine, &mut id).map_err(|flaw| (id, flaw.in_file(file)))
}

fn parse(line: &Line, machine: &Machine, id: &mut String) -> Result<Target, Flaw> {
    let flaw = |reason: String| Flaw {
        line: Some(line.number),
        field: String::new(),
        reason,
    };
    let bytes = line
        .bytes
        .as_ref()
        .ok_or_else(|| flaw(format!("longer than {MAX_LINE_BYTES} bytes")))?;
    let text = std::str::from_utf8(bytes)
        .map_err(|error| flaw(format!("not UTF-8 at byte {}", error.valid_up_to() + 1)))?;
    let root = from_json(text, line.number)?;
    if let Some(written) = root.peek("id") {
        *id = written.to_owned();
    }
    let mut fields = root.table(&[
        "id",
        "tip",
        "xyz",
        "xyz_within",
        "quat",
        "rotation",
        "rpy",
        "rpy_deg",
        "turn_within",
        "turn_within_deg",
        "axis",
    ])?;
    if let Some(field) = fields.take("id") {
        field.text()?;
    }
    let tip = tip(&mut fields, machine)?;
    let xyz = fields.need("xyz")?.vector()?;
    let xyz_within = half_widths(fields.need("xyz_within")?)?;
    let orientation = orientation(&mut fields)?;
    Ok(Target {
        id: id.clone(),
        tip,
        xyz,
        xyz_within,
        orientation,
    })
}

fn tip(fields: &mut Fields, machine: &Machine) -> Result<usize, Flaw> {
    let Some(field) = fields.take("tip") else {
        return match machine.tips.len() {
            1 => Ok(0),
            n => Err(fields.flaw("tip", format!("missing: the machine has {n} tips"))),
        };
    };
    let name = field.text()?;
    machine
        .tips
        .iter()
        .position(|tip| tip.name == name)
        .ok_or_else(|| {
            let known: Vec<&str> = machine.tips.iter().map(|tip| tip.name.as_str()).collect();
            field.flaw(format!(
                "no tip is named {name:?}; known: {}",
                known.join(", ")
            ))
        })
}

fn half_widths(field: Field) -> Result<Vector3<f64>, Flaw> {
    if !field.is_list() {
        return Ok(Vector3::repeat(field.not_negative()?));
    }
    let [x, y, z] = field.list_of::<3>()?;
    Ok(Vector3::new(
        x.not_negative()?,
        y.not_negative()?,
        z.not_negative()?,
    ))
}

fn orientation(fields: &mut Fields) -> Result<Orientation, Flaw> {
    let turn_within = fields.angle("turn_within")?;
    let asked = fields.one_of(&["quat", "rotation", "rpy", "rpy_deg", "axis"])?;
    let Some((form, field)) = asked else {
        return match turn_within {
            None => Ok(Orientation::Free),
            Some((_, field)) => Err(field.flaw("given without an orientation")),
        };
    };
    if form == 4 {
        return match turn_within {
            None => axes(field),
            Some((_, field)) => Err(field.flaw("an axis has its own within")),
        };
    }
    let (rotation, error) = match form {
        0 => quaternion(field).map(|written| (written.rotation, written.error))?,
        1 => matrix(field).map(|written| (written.rotation, written.error))?,
        2 => (roll_pitch_yaw(field, 1.0)?, 0.0),
        _ => (roll_pitch_yaw(field, 1f64.to_radians())?, 0.0),
    };
    let (within, field) = turn_within
        .ok_or_else(|| fields.flaw("turn_within", "missing: an orientation needs turn_within"))?;
    field.not_negative()?;
    Ok(Orientation::Near {
        rotation,
        within: within + error,
    })
}

fn axes(field: Field) -> Result<Orientation, Flaw> {
    if !field.is_list() {
        return Ok(Orientation::Axes(vec![cone(field)?]));
    }
    let items = field.bounded(MAX_CONES, "axes")?;
    Ok(Orientation::Axes(
        items.into_iter().map(cone).collect::<Result<_, _>>()?,
    ))
}

fn cone(field: Field) -> Result<Cone, Flaw> {
    let mut fields = field.table(&["tip", "base", "within", "within_deg"])?;
    let tip = direction(fields.need("tip")?)?;
    let base = direction(fields.need("base")?)?;
    let (within, field) = fields
        .angle("within")?
        .ok_or_else(|| fields.flaw("within", "missing"))?;
    field.not_negative()?;
    Ok(Cone { tip, base, within })
}
