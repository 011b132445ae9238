//! Reads a machine file.

use std::collections::HashMap;
use std::f64::consts::PI;

use nalgebra::{Isometry3, Vector3};

use crate::model::{Joint, Kind, Machine, Tip, Tolerance};

use super::fields::{Field, Fields};
use super::forest::{Draft, FollowsDraft, Forest, Parent, lookup, names_of, resolve};
use super::pose::{direction, placement, within};
use super::tree::from_toml;
use super::{Defect, Flaw, dh};

/// Most joints a machine file may have, fixed ones included.
pub const MAX_JOINTS: usize = 64;
/// Most tips a machine file may have.
pub const MAX_TIPS: usize = 64;
/// Largest size of a length or a travel in a machine file, metres. Far above any machine, and
/// small enough that sums of lengths keep their precision.
pub const MAX_LENGTH: f64 = 1e6;
/// Largest size of an angle in a machine file, radians: 150,000 turns, beyond which a double no
/// longer tells a micro-turn.
pub const MAX_ANGLE: f64 = 1e6;
/// Largest size of a follower's ratio in a machine file.
pub const MAX_RATIO: f64 = 1e6;
/// Largest machine file, bytes.
pub const MAX_MACHINE_BYTES: usize = 1 << 20;

/// Reads the machine that `bytes`, the content of `file`, describe.
///
/// Joints come out each after its parent, otherwise in the order of the file. Cost: linear in the
/// text, quadratic in the number of joints.
///
/// # Errors
///
/// The first [`Defect`] found.
pub fn machine(bytes: &[u8], file: &str) -> Result<Machine, Defect> {
    parse(bytes, file).map_err(|flaw| flaw.in_file(file))
}

fn parse(bytes: &[u8], file: &str) -> Result<Machine, Flaw> {
    if bytes.len() > MAX_MACHINE_BYTES {
        return Err(Flaw::of_file(format!(
            "longer than {MAX_MACHINE_BYTES} bytes"
        )));
    }
    let text = std::str::from_utf8(bytes).map_err(|error| Flaw {
        line: Some(
            1 + bytes[..error.valid_up_to()]
                .iter()
                .filter(|b| **b == b'\n')
                .count(),
        ),
        field: String::new(),
        reason: "not a text file (invalid UTF-8)".to_owned(),
    })?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut root = from_toml(text)?.table(&["name", "joint", "dh", "tip"])?;
    let name = match root.take("name") {
        Some(field) => field.name()?,
        None => stem(file),
    };
    let tips = root.take("tip");
    let (drafts, tips) = match root.one_of(&["joint", "dh"])? {
        None => {
            return Err(Flaw::of_file(
                "describes no machine: neither [[joint]] nor [dh]",
            ));
        }
        Some((0, field)) => {
            let tips = tips.ok_or_else(|| Flaw::of_file("has no tip: no [[tip]]"))?;
            (joints(field)?, Some(tips))
        }
        Some((_, field)) => (dh::joints(field)?, tips),
    };
    let names = names_of(&drafts)?;
    let forest = resolve(drafts, &names)?;
    let tips = match tips {
        Some(field) => read_tips(field, &names, &forest)?,
        None => {
            let last = names.len() - 1;
            vec![Tip {
                name: "flange".to_owned(),
                parent: Some(forest.place_of[last]),
                placement: forest.ends[last],
            }]
        }
    };
    Ok(Machine {
        name,
        joints: forest.joints,
        tips,
    })
}

fn stem(file: &str) -> String {
    let path = std::path::Path::new(file);
    path.file_stem()
        .map_or(file.to_owned(), |stem| stem.to_string_lossy().into_owned())
}

fn joints(field: Field) -> Result<Vec<Draft>, Flaw> {
    let items = field.bounded(MAX_JOINTS, "joints")?;
    items.into_iter().map(joint).collect()
}

fn joint(field: Field) -> Result<Draft, Flaw> {
    let path = field.path().to_owned();
    let mut fields = field.table(&[
        "name",
        "kind",
        "parent",
        "xyz",
        "rpy",
        "rpy_deg",
        "axis",
        "limits",
        "limits_deg",
        "tolerance",
        "follows",
    ])?;
    let name_field = fields.need("name")?;
    let kind = kind(&fields.need("kind")?)?;
    let parent = fields.take("parent").map_or(Parent::Above, Parent::Named);
    let placement = placement(&mut fields, MAX_LENGTH)?;
    let axis = match fields.take("axis") {
        Some(field) => direction(field)?,
        None => Vector3::z_axis(),
    };
    let limits = match fields.one_of(&["limits", "limits_deg"])? {
        Some((_, field)) if kind == Kind::Fixed => {
            return Err(field.flaw("a fixed joint has no limits"));
        }
        Some((1, field)) if kind == Kind::Prismatic => {
            return Err(field.flaw("a prismatic joint has limits in metres, not in degrees"));
        }
        Some((0, field)) => Some(read_limits(field, kind, 1.0)?),
        Some((_, field)) => Some(read_limits(field, kind, 1f64.to_radians())?),
        None if kind == Kind::Prismatic => {
            return Err(fields.flaw("limits", "missing: a prismatic joint needs limits"));
        }
        None => None,
    };
    let tolerance = tolerance(&mut fields)?;
    let follows = follows(&mut fields, kind)?;
    let name = joint_name(&name_field)?;
    let joint = Joint {
        name,
        kind,
        parent: None,
        placement,
        axis,
        limits,
        tolerance,
        follows: None,
    };
    let name_place = name_field.flaw("");
    Ok(Draft {
        joint,
        parent,
        follows,
        path,
        name_place,
        end: Isometry3::identity(),
    })
}

/// A joint's name, which must differ from the base's.
pub(super) fn joint_name(field: &Field) -> Result<String, Flaw> {
    match field.name()? {
        name if name == "base" => Err(field.flaw("\"base\" is the name of the base")),
        name => Ok(name),
    }
}

/// One of the three kinds.
pub(super) fn kind(field: &Field) -> Result<Kind, Flaw> {
    field.choice(&[
        ("revolute", Kind::Revolute),
        ("prismatic", Kind::Prismatic),
        ("fixed", Kind::Fixed),
    ])
}

/// Least and greatest joint value from numbers in multiples of `unit`.
pub(super) fn read_limits(field: Field, kind: Kind, unit: f64) -> Result<[f64; 2], Flaw> {
    let reversed = field.flaw("");
    let (max, name) = match kind {
        Kind::Prismatic => (MAX_LENGTH, "metres"),
        _ => (
            MAX_ANGLE / unit,
            if unit == 1.0 { "radians" } else { "degrees" },
        ),
    };
    let [lower, upper] = field.list_of::<2>()?;
    let (lower, upper) = (within(&lower, max, name)?, within(&upper, max, name)?);
    if lower > upper {
        let reason = format!("lower limit {lower} is above upper limit {upper}");
        return Err(Flaw { reason, ..reversed });
    }
    Ok([lower * unit, upper * unit])
}

/// The optional `tolerance` table. No two orientations differ by more than half a turn, so a
/// larger angle says no more than that one.
pub(super) fn tolerance(fields: &mut Fields) -> Result<Tolerance, Flaw> {
    let Some(field) = fields.take("tolerance") else {
        return Ok(Tolerance::default());
    };
    let mut inner = field.table(&["xyz", "angle", "angle_deg"])?;
    let xyz = match inner.take("xyz") {
        Some(field) => field
            .not_negative()
            .and_then(|_| within(&field, MAX_LENGTH, "metres"))?,
        None => 0.0,
    };
    let angle = match inner.angle("angle")? {
        Some((angle, field)) => field.not_negative().map(|_| angle.min(PI))?,
        None => 0.0,
    };
    Ok(Tolerance { xyz, angle })
}

/// The optional `follows` table of a joint of kind `kind`.
pub(super) fn follows(fields: &mut Fields, kind: Kind) -> Result<Option<FollowsDraft>, Flaw> {
    let Some(field) = fields.take("follows") else {
        return Ok(None);
    };
    if kind == Kind::Fixed {
        return Err(field.flaw("a fixed joint cannot follow another"));
    }
    let mut inner = field.table(&["joint", "ratio", "offset", "offset_deg"])?;
    let other = inner.need("joint")?;
    let ratio = inner
        .take("ratio")
        .map_or(Ok(1.0), |field| within(&field, MAX_RATIO, "times"))?;
    let offset = match inner.one_of(&["offset", "offset_deg"])? {
        None => 0.0,
        Some((1, field)) if kind == Kind::Prismatic => {
            return Err(field.flaw("a prismatic joint has an offset in metres, not in degrees"));
        }
        Some((1, field)) => within(&field, MAX_ANGLE.to_degrees(), "degrees")?.to_radians(),
        Some((_, field)) => within(&field, MAX_ANGLE, "radians or metres")?,
    };
    Ok(Some(FollowsDraft {
        other,
        ratio,
        offset,
    }))
}

fn read_tips(
    field: Field,
    names: &HashMap<String, usize>,
    forest: &Forest,
) -> Result<Vec<Tip>, Flaw> {
    let mut tips: Vec<Tip> = Vec::new();
    for item in field.bounded(MAX_TIPS, "tips")? {
        let mut fields = item.table(&["name", "parent", "xyz", "rpy", "rpy_deg"])?;
        let name_field = fields.need("name")?;
        let name = name_field.name()?;
        if let Some(first) = tips.iter().position(|tip| tip.name == name) {
            return Err(name_field.flaw(format!("{name:?} is already the name of tip[{first}]")));
        }
        let carrier = match fields.take("parent") {
            Some(field) => lookup(&field, names)?,
            None => Some(names.len() - 1),
        };
        let placement = placement(&mut fields, MAX_LENGTH)?;
        tips.push(Tip {
            name,
            parent: carrier.map(|from| forest.place_of[from]),
            placement: carrier.map_or(placement, |from| forest.ends[from] * placement),
        });
    }
    Ok(tips)
}
