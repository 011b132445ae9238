//! Reads a table of link parameters after Denavit and Hartenberg.
//!
//! Standard (Denavit & Hartenberg 1955; Paul 1981): `T = Rz(theta) Tz(d) Tx(a) Rx(alpha)`.
//! Modified (Craig 1986): `T = Rx(alpha) Tx(a) Rz(theta) Tz(d)`, with the `a` and `alpha` of the
//! row before by name, given here in the row where they are used.
//!
//! Both become one chain, because `a` and `alpha` commute and a joint's motion commutes with its
//! own `theta` and `d`: every joint frame is `Tx(a) Rx(alpha) Rz(theta) Tz(d)` in the one before,
//! with `a` and `alpha` taken from the row itself (modified) or from the row above (standard).

use nalgebra::{Isometry3, Translation3, UnitQuaternion, Vector3};

use crate::model::{Joint, Kind};

use super::Flaw;
use super::fields::Field;
use super::forest::{Draft, Parent};
use super::machine::{MAX_ANGLE, MAX_JOINTS, MAX_LENGTH, joint_name, kind, read_limits, tolerance};
use super::pose::within;

#[derive(Clone, Copy, PartialEq, Eq)]
enum Convention {
    Modified,
    Standard,
}

/// The joints of a `[dh]` table, in one chain from the base.
pub(super) fn joints(field: Field) -> Result<Vec<Draft>, Flaw> {
    let mut fields = field.table(&["convention", "angles", "rows"])?;
    let convention = fields.need("convention")?.choice(&[
        ("standard", Convention::Standard),
        ("modified", Convention::Modified),
    ])?;
    let unit = fields
        .need("angles")?
        .choice(&[("degrees", 1f64.to_radians()), ("radians", 1.0)])?;
    let rows = fields.need("rows")?.bounded(MAX_JOINTS, "rows")?;
    let mut drafts: Vec<Draft> = Vec::with_capacity(rows.len());
    for (place, row) in rows.into_iter().enumerate() {
        let before = drafts
            .last()
            .map_or_else(Isometry3::identity, |draft| draft.end);
        drafts.push(joint(row, place, convention, unit, before)?);
    }
    Ok(drafts)
}

fn joint(
    row: Field,
    place: usize,
    convention: Convention,
    unit: f64,
    before: Isometry3<f64>,
) -> Result<Draft, Flaw> {
    let path = row.path().to_owned();
    let mut fields = row.table(&[
        "name",
        "a",
        "alpha",
        "d",
        "theta",
        "kind",
        "limits",
        "tolerance",
    ])?;
    let (max, unit_name) = (
        MAX_ANGLE / unit,
        if unit == 1.0 { "radians" } else { "degrees" },
    );
    let mut number = |key, max, unit| {
        fields
            .take(key)
            .map_or(Ok(0.0), |field| within(&field, max, unit))
    };
    let a = number("a", MAX_LENGTH, "metres")?;
    let alpha = number("alpha", max, unit_name)? * unit;
    let d = number("d", MAX_LENGTH, "metres")?;
    let theta = number("theta", max, unit_name)? * unit;
    let kind = fields
        .take("kind")
        .map_or(Ok(Kind::Revolute), |field| kind(&field))?;
    let limits = match (fields.take("limits"), kind) {
        (Some(field), Kind::Fixed) => return Err(field.flaw("a fixed joint has no limits")),
        (Some(field), Kind::Prismatic) => Some(read_limits(field, kind, 1.0)?),
        (Some(field), Kind::Revolute) => Some(read_limits(field, kind, unit)?),
        (None, Kind::Prismatic) => {
            return Err(fields.flaw("limits", "missing: a prismatic joint needs limits"));
        }
        (None, _) => None,
    };
    let tolerance = tolerance(&mut fields)?;
    let name_field = fields.take("name");
    let (name, name_place) = match &name_field {
        Some(field) => (joint_name(field)?, field.flaw("")),
        None => (format!("joint{}", place + 1), fields.flaw("name", "")),
    };
    let link = screw(Vector3::x_axis().into_inner(), a, alpha);
    let motion = screw(Vector3::z_axis().into_inner(), d, theta);
    let (placement, end) = match convention {
        Convention::Modified => (link * motion, Isometry3::identity()),
        Convention::Standard => (before * motion, link),
    };
    let axis = Vector3::z_axis();
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
    Ok(Draft {
        joint,
        parent: Parent::Above,
        follows: None,
        path,
        name_place,
        end,
    })
}

/// Translation by `length` along and rotation by `angle` about the unit vector `axis`.
fn screw(axis: Vector3<f64>, length: f64, angle: f64) -> Isometry3<f64> {
    Isometry3::from_parts(
        Translation3::from(axis * length),
        UnitQuaternion::from_scaled_axis(axis * angle),
    )
}
