//! Target lines, read exactly.

use dashu_ratio::RBig;
use serde::{Deserialize, Deserializer};
use serde_json::value::RawValue;

use crate::exact::decimal;
use crate::machine::Amount;
use crate::space;

/// Longest target line, bytes.
const MAX_LINE: usize = 1 << 16;
/// Most axes of a target.
const MAX_CONES: usize = 16;
/// How far a written rotation may be from one: largest difference of an entry, or of a
/// quaternion's length from 1.
const MAX_ERROR: (i64, i64) = (1, 1000);

/// Why a target line is not read.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum TargetError {
    /// No JSON object of the known fields, or one of them is of the wrong shape.
    #[error("{0}")]
    Syntax(String),
    /// A field is wrong.
    #[error("{field}: {reason}")]
    Field {
        /// Its name.
        field: &'static str,
        /// What is wrong.
        reason: &'static str,
    },
}

/// A wanted orientation as written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Written {
    /// w, x, y, z of nearly unit length.
    Quaternion([RBig; 4]),
    /// Row by row, nearly a rotation.
    Matrix([RBig; 9]),
    /// `Rz(yaw) Ry(pitch) Rx(roll)`.
    RollPitchYaw([Amount; 3]),
}

/// One axis within an angle of a direction.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Cone {
    /// In the tip frame, of any length but zero.
    pub tip: [RBig; 3],
    /// In the base frame, of any length but zero.
    pub base: [RBig; 3],
    /// Largest angle between them, not negative.
    pub within: Amount,
}

/// What is asked of the orientation.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Orientation {
    /// Nothing.
    Free,
    /// An orientation within an angle.
    Near(Box<Written>, Amount),
    /// Axes within angles.
    Cones(Vec<Cone>),
}

/// A target; two are equal if they say the same.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Target {
    /// Its name, if written.
    pub id: Option<String>,
    /// Its tip, if written.
    pub tip: Option<String>,
    /// Middle of the box.
    pub xyz: [RBig; 3],
    /// Half-widths of the box.
    pub within: [RBig; 3],
    /// What is asked of the orientation.
    pub orientation: Orientation,
}

type Raw = Option<Box<RawValue>>;

/// A value that is there, `null` included.
fn present<'de, D: Deserializer<'de>>(deserializer: D) -> Result<Raw, D::Error> {
    Box::<RawValue>::deserialize(deserializer).map(Some)
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Line {
    #[serde(default, deserialize_with = "present")]
    id: Raw,
    #[serde(default, deserialize_with = "present")]
    tip: Raw,
    xyz: Box<RawValue>,
    xyz_within: Box<RawValue>,
    #[serde(default, deserialize_with = "present")]
    quat: Raw,
    #[serde(default, deserialize_with = "present")]
    rotation: Raw,
    #[serde(default, deserialize_with = "present")]
    rpy: Raw,
    #[serde(default, deserialize_with = "present")]
    rpy_deg: Raw,
    #[serde(default, deserialize_with = "present")]
    turn_within: Raw,
    #[serde(default, deserialize_with = "present")]
    turn_within_deg: Raw,
    #[serde(default, deserialize_with = "present")]
    axis: Raw,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct AxisFields {
    tip: Box<RawValue>,
    base: Box<RawValue>,
    #[serde(default, deserialize_with = "present")]
    within: Raw,
    #[serde(default, deserialize_with = "present")]
    within_deg: Raw,
}

impl Target {
    /// Reads one line of a targets file. Cost: linear.
    ///
    /// # Errors
    ///
    /// The first flaw found.
    pub fn read(line: &str) -> Result<Self, TargetError> {
        if line.len() > MAX_LINE {
            return Err(TargetError::Syntax("too long".to_owned()));
        }
        let line: Line = parse(line)?;
        let within = match list::<3>("xyz_within", &line.xyz_within) {
            Ok(within) => within,
            Err(_) => {
                let width = number("xyz_within", &line.xyz_within)?;
                [width.clone(), width.clone(), width]
            }
        };
        if within.iter().any(|width| *width < RBig::ZERO) {
            return flaw("xyz_within", "must not be negative");
        }
        Ok(Self {
            id: line.id.as_deref().map(|id| text("id", id)).transpose()?,
            tip: line
                .tip
                .as_deref()
                .map(|tip| text("tip", tip))
                .transpose()?,
            xyz: list("xyz", &line.xyz)?,
            within,
            orientation: orientation(&line)?,
        })
    }
}

fn orientation(line: &Line) -> Result<Orientation, TargetError> {
    let mut asked = Vec::new();
    if let Some(raw) = &line.quat {
        let quaternion: [RBig; 4] = list("quat", raw)?;
        // |n - 1| <= e means (1 - e)^2 <= n^2 <= (1 + e)^2.
        let square = space::square(&quaternion);
        let error = RBig::from_parts(MAX_ERROR.0.into(), MAX_ERROR.1.unsigned_abs().into());
        let (low, high) = (RBig::ONE - &error, RBig::ONE + &error);
        if square < &low * &low || square > &high * &high {
            return flaw("quat", "must be of unit length");
        }
        asked.push(Written::Quaternion(quaternion));
    }
    if let Some(raw) = &line.rotation {
        asked.push(Written::Matrix(list("rotation", raw)?));
    }
    if let Some(raw) = &line.rpy {
        asked.push(Written::RollPitchYaw(list("rpy", raw)?.map(Amount::plain)));
    }
    if let Some(raw) = &line.rpy_deg {
        asked.push(Written::RollPitchYaw(
            list("rpy_deg", raw)?.map(Amount::degrees),
        ));
    }
    let within = angle("turn_within", &line.turn_within, &line.turn_within_deg)?;
    match (asked.pop(), within, &line.axis) {
        _ if !asked.is_empty() => flaw("quat", "more than one orientation"),
        (None, None, None) => Ok(Orientation::Free),
        (None, None, Some(raw)) => cones(raw),
        (Some(written), Some(within), None) => Ok(Orientation::Near(Box::new(written), within)),
        (Some(_), None, _) => flaw("turn_within", "missing"),
        (None, Some(_), _) => flaw("turn_within", "given without an orientation"),
        (Some(_), Some(_), Some(_)) => flaw("axis", "given beside an orientation"),
    }
}

fn cones(raw: &RawValue) -> Result<Orientation, TargetError> {
    let list: Vec<AxisFields> = if raw.get().starts_with('[') {
        parse(raw.get())?
    } else {
        vec![parse(raw.get())?]
    };
    if list.is_empty() || list.len() > MAX_CONES {
        return flaw("axis", "too many or too few");
    }
    let cone = |fields: &AxisFields| {
        Ok(Cone {
            tip: axis(&fields.tip)?,
            base: axis(&fields.base)?,
            within: match angle("within", &fields.within, &fields.within_deg)? {
                Some(within) => within,
                None => return flaw("within", "missing"),
            },
        })
    };
    list.iter()
        .map(cone)
        .collect::<Result<_, _>>()
        .map(Orientation::Cones)
}

fn axis(raw: &RawValue) -> Result<[RBig; 3], TargetError> {
    let axis = list("axis", raw)?;
    if axis.iter().all(|number| *number == RBig::ZERO) {
        return flaw("axis", "must not be zero");
    }
    Ok(axis)
}

/// An angle in one of two units, not negative.
fn angle(field: &'static str, plain: &Raw, degrees: &Raw) -> Result<Option<Amount>, TargetError> {
    let (number, amount) = match (plain, degrees) {
        (Some(_), Some(_)) => return flaw(field, "given in both units"),
        (Some(raw), None) => {
            let number = number(field, raw)?;
            (number.clone(), Amount::plain(number))
        }
        (None, Some(raw)) => {
            let number = number(field, raw)?;
            (number.clone(), Amount::degrees(number))
        }
        (None, None) => return Ok(None),
    };
    if number < RBig::ZERO {
        return flaw(field, "must not be negative");
    }
    Ok(Some(amount))
}

fn flaw<T>(field: &'static str, reason: &'static str) -> Result<T, TargetError> {
    Err(TargetError::Field { field, reason })
}

fn parse<'a, T: Deserialize<'a>>(text: &'a str) -> Result<T, TargetError> {
    serde_json::from_str(text).map_err(|error| TargetError::Syntax(error.to_string()))
}

fn text(field: &'static str, raw: &RawValue) -> Result<String, TargetError> {
    serde_json::from_str(raw.get()).or_else(|_| flaw(field, "must be a text"))
}

fn number(field: &'static str, raw: &RawValue) -> Result<RBig, TargetError> {
    match decimal::parse(raw.get()) {
        Some(number) => Ok(number),
        None => flaw(field, "must be a number"),
    }
}

fn list<const N: usize>(field: &'static str, raw: &RawValue) -> Result<[RBig; N], TargetError> {
    let list: Vec<&RawValue> = match serde_json::from_str(raw.get()) {
        Ok(list) => list,
        Err(_) => return flaw(field, "must be a list of numbers"),
    };
    let numbers: Result<Vec<RBig>, _> = list.iter().map(|raw| number(field, raw)).collect();
    match numbers?.try_into() {
        Ok(numbers) => Ok(numbers),
        Err(_) => flaw(field, "must have another length"),
    }
}
