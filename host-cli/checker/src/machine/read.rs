//! Reads a machine file.

use dashu_ratio::RBig;
use toml_edit::DocumentMut;

use super::Amount;
use super::chain::Pose;
use super::fields::{Field, Fields, ReadError, amount};

/// Largest machine file, bytes.
const MAX_SIZE: usize = 1 << 20;

/// Most joints of a machine file.
const MAX_JOINTS: usize = 1000;

/// How a joint moves.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// About its axis.
    Revolute,
    /// Along its axis.
    Prismatic,
    /// Not at all.
    Fixed,
}

/// A joint's value as a multiple of another's.
#[derive(Clone, Debug)]
pub struct Follow {
    /// Place of the other joint in the file.
    pub joint: usize,
    /// Times.
    pub ratio: RBig,
    /// Plus.
    pub offset: Amount,
}

/// A joint of the file.
#[derive(Clone, Debug)]
pub struct Joint {
    /// Its kind.
    pub kind: Kind,
    /// Place of its parent, `None` for the base.
    pub parent: Option<usize>,
    /// From the parent's moved frame to its own, at rest.
    pub poses: Vec<Pose>,
    /// Of any length but zero.
    pub axis: [RBig; 3],
    /// Least and greatest value.
    pub limits: Option<[Amount; 2]>,
    /// Half-width of the cube that has its origin.
    pub tolerance_xyz: RBig,
    /// Largest angle of its orientation.
    pub tolerance_angle: Amount,
    /// What drives it.
    pub follows: Option<Follow>,
}

/// A tip of the file.
#[derive(Clone, Debug)]
pub struct Tip {
    /// Its name.
    pub name: String,
    /// Place of the joint that carries it, `None` for the base.
    pub parent: Option<usize>,
    /// From the carrier's moved frame.
    pub poses: Vec<Pose>,
}

/// A machine file.
#[derive(Clone, Debug)]
pub struct Machine {
    /// In the order of the file.
    pub joints: Vec<Joint>,
    /// In the order of the file.
    pub tips: Vec<Tip>,
}

impl Machine {
    /// Reads `text`. Cost: quadratic in the number of joints.
    ///
    /// # Errors
    ///
    /// The first flaw found.
    pub fn read(text: &str) -> Result<Self, ReadError> {
        if text.len() > MAX_SIZE {
            return Err(ReadError::Syntax("too long".to_owned()));
        }
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        let document: DocumentMut = text
            .parse()
            .map_err(|error: toml_edit::TomlError| ReadError::Syntax(error.message().to_owned()))?;
        let root = Fields::new("", document.as_table(), &["name", "joint", "dh", "tip"])?;
        if let Some(name) = root.take("name") {
            name.text()?;
        }
        let (names, joints, ends) = match (root.take("joint"), root.take("dh")) {
            (Some(joints), None) => read_joints(&joints)?,
            (None, Some(table)) => read_rows(&table)?,
            (Some(_), Some(dh)) => return dh.flaw("stands beside joints"),
            (None, None) => return root.flaw("joint", "missing"),
        };
        let tips = match root.take("tip") {
            Some(field) => read_tips(&field, &names, &ends)?,
            None if root.take("dh").is_some() => vec![Tip {
                name: "flange".to_owned(),
                parent: joints.len().checked_sub(1),
                poses: ends.last().cloned().unwrap_or_default(),
            }],
            None => return root.flaw("tip", "missing"),
        };
        Ok(Self { joints, tips })
    }
}

/// Names, joints, and what leads from each joint's frame to the one its children hang on.
type Joints = (Vec<String>, Vec<Joint>, Vec<Vec<Pose>>);

fn read_joints(field: &Field) -> Result<Joints, ReadError> {
    let known = [
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
    ];
    let tables = field.tables(&known)?;
    let mut names = Vec::new();
    for fields in &tables {
        let name = fields.need("name")?;
        add_name(&mut names, name.name()?, &name)?;
    }
    let mut joints = Vec::new();
    for (place, fields) in tables.iter().enumerate() {
        let kind = kind(&fields.need("kind")?)?;
        let axis = fields
            .vector("axis")?
            .unwrap_or([RBig::ZERO, RBig::ZERO, RBig::ONE]);
        if axis.iter().all(|number| *number == RBig::ZERO) {
            return fields.flaw("axis", "must not be zero");
        }
        let limits = match fields.either("limits")? {
            Some((field, degrees)) => Some(limits(&field, kind, degrees)?),
            None => None,
        };
        let follows = match fields.take("follows") {
            Some(field) => Some(follow(&field, kind, &names)?),
            None => None,
        };
        if kind == Kind::Prismatic && limits.is_none() {
            return fields.flaw("limits", "missing: a prismatic joint needs limits");
        }
        let (tolerance_xyz, tolerance_angle) = tolerance(fields)?;
        joints.push(Joint {
            kind,
            parent: match fields.take("parent") {
                Some(field) => parent(&field, &names)?,
                None => place.checked_sub(1),
            },
            poses: vec![pose(fields)?],
            axis,
            limits,
            tolerance_xyz,
            tolerance_angle,
            follows,
        });
    }
    for joint in &joints {
        if let Some(follow) = &joint.follows
            && joints[follow.joint].kind != joint.kind
        {
            return field.flaw("a joint follows one of another kind");
        }
    }
    let ends = vec![Vec::new(); joints.len()];
    Ok((names, joints, ends))
}

fn read_rows(field: &Field) -> Result<Joints, ReadError> {
    let table = field.table(&["convention", "angles", "rows"])?;
    let convention = table.need("convention")?;
    let standard = match convention.text()? {
        "standard" => true,
        "modified" => false,
        _ => return convention.flaw("must be \"standard\" or \"modified\""),
    };
    let unit = table.need("angles")?;
    let degrees = match unit.text()? {
        "degrees" => true,
        "radians" => false,
        _ => return unit.flaw("must be \"degrees\" or \"radians\""),
    };
    let known = [
        "name",
        "a",
        "alpha",
        "d",
        "theta",
        "kind",
        "limits",
        "tolerance",
    ];
    let (mut names, mut joints, mut ends) = (Vec::new(), Vec::new(), Vec::new());
    let mut above = (RBig::ZERO, Amount::zero());
    for (place, fields) in table.need("rows")?.tables(&known)?.iter().enumerate() {
        let row = (
            fields.number("a")?,
            amount(fields.number("alpha")?, degrees),
        );
        let kind = match fields.take("kind") {
            Some(field) => kind(&field)?,
            None => Kind::Revolute,
        };
        let limits = match fields.take("limits") {
            Some(field) => Some(limits(&field, kind, degrees && kind == Kind::Revolute)?),
            None if kind == Kind::Prismatic => {
                return fields.flaw("limits", "missing: a prismatic joint needs limits");
            }
            None => None,
        };
        let name = match fields.take("name") {
            Some(field) => field.name()?,
            None => format!("joint{}", place + 1),
        };
        add_name(&mut names, name, field)?;
        let (a, alpha) = if standard { above } else { row.clone() };
        let (tolerance_xyz, tolerance_angle) = tolerance(fields)?;
        joints.push(Joint {
            kind,
            parent: place.checked_sub(1),
            poses: vec![Pose::Row {
                a,
                alpha,
                d: fields.number("d")?,
                theta: amount(fields.number("theta")?, degrees),
            }],
            axis: [RBig::ZERO, RBig::ZERO, RBig::ONE],
            limits,
            tolerance_xyz,
            tolerance_angle,
            follows: None,
        });
        ends.push(if standard {
            vec![Pose::Row {
                a: row.0.clone(),
                alpha: row.1.clone(),
                d: RBig::ZERO,
                theta: Amount::zero(),
            }]
        } else {
            Vec::new()
        });
        above = row;
    }
    Ok((names, joints, ends))
}

fn read_tips(field: &Field, names: &[String], ends: &[Vec<Pose>]) -> Result<Vec<Tip>, ReadError> {
    let mut tips: Vec<Tip> = Vec::new();
    for fields in field.tables(&["name", "parent", "xyz", "rpy", "rpy_deg"])? {
        let name = fields.need("name")?;
        let text = name.name()?;
        if tips.iter().any(|tip| tip.name == text) {
            return name.flaw("is the name of another tip");
        }
        let parent = match fields.take("parent") {
            Some(field) => parent(&field, names)?,
            None => names.len().checked_sub(1),
        };
        let mut poses = parent.map_or_else(Vec::new, |place| ends[place].clone());
        poses.push(pose(&fields)?);
        tips.push(Tip {
            name: text,
            parent,
            poses,
        });
    }
    Ok(tips)
}

fn add_name(names: &mut Vec<String>, name: String, field: &Field) -> Result<(), ReadError> {
    if names.len() == MAX_JOINTS {
        return field.flaw("too many joints");
    }
    if name == "base" || names.contains(&name) {
        return field.flaw("the name of a joint is taken");
    }
    names.push(name);
    Ok(())
}

fn kind(field: &Field) -> Result<Kind, ReadError> {
    match field.text()? {
        "revolute" => Ok(Kind::Revolute),
        "prismatic" => Ok(Kind::Prismatic),
        "fixed" => Ok(Kind::Fixed),
        _ => field.flaw("must be \"revolute\", \"prismatic\" or \"fixed\""),
    }
}

fn find(field: &Field, names: &[String]) -> Result<usize, ReadError> {
    let name = field.text()?;
    match names.iter().position(|other| other == name) {
        Some(place) => Ok(place),
        None => field.flaw("no joint has this name"),
    }
}

fn parent(field: &Field, names: &[String]) -> Result<Option<usize>, ReadError> {
    match field.text()? {
        "base" => Ok(None),
        _ => find(field, names).map(Some),
    }
}

fn limits(field: &Field, kind: Kind, degrees: bool) -> Result<[Amount; 2], ReadError> {
    if kind == Kind::Fixed || (kind == Kind::Prismatic && degrees) {
        return field.flaw("this kind of joint has no such limits");
    }
    let [lower, upper] = field.numbers()?;
    if lower > upper {
        return field.flaw("the lower limit is above the upper one");
    }
    Ok([lower, upper].map(|limit| amount(limit, degrees)))
}

fn follow(field: &Field, kind: Kind, names: &[String]) -> Result<Follow, ReadError> {
    if kind == Kind::Fixed {
        return field.flaw("a fixed joint cannot follow another");
    }
    let fields = field.table(&["joint", "ratio", "offset", "offset_deg"])?;
    Ok(Follow {
        joint: find(&fields.need("joint")?, names)?,
        ratio: fields
            .take("ratio")
            .map_or(Ok(RBig::ONE), |field| field.number())?,
        offset: match fields.either("offset")? {
            Some((field, true)) if kind == Kind::Prismatic => {
                return field.flaw("a prismatic joint has an offset in metres");
            }
            Some((field, degrees)) => amount(field.number()?, degrees),
            None => Amount::zero(),
        },
    })
}

/// Tolerances of place and angle.
fn tolerance(fields: &Fields) -> Result<(RBig, Amount), ReadError> {
    let Some(field) = fields.take("tolerance") else {
        return Ok((RBig::ZERO, Amount::zero()));
    };
    let inner = field.table(&["xyz", "angle", "angle_deg"])?;
    let xyz = inner.number("xyz")?;
    let (angle, degrees) = match inner.either("angle")? {
        Some((field, degrees)) => (field.number()?, degrees),
        None => (RBig::ZERO, false),
    };
    if xyz < RBig::ZERO || angle < RBig::ZERO {
        return field.flaw("must not be negative");
    }
    Ok((xyz, amount(angle, degrees)))
}

fn pose(fields: &Fields) -> Result<Pose, ReadError> {
    let zero = || [RBig::ZERO, RBig::ZERO, RBig::ZERO];
    let (rpy, degrees) = match fields.either("rpy")? {
        Some((field, degrees)) => (field.numbers()?, degrees),
        None => (zero(), false),
    };
    Ok(Pose::Placed {
        xyz: fields.vector("xyz")?.unwrap_or_else(zero),
        rpy: rpy.map(|angle| amount(angle, degrees)),
    })
}
