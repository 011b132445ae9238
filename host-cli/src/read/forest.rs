//! Turns joints that name each other into joints that know each other's places.

use std::collections::HashMap;

use nalgebra::Isometry3;

use crate::model::{Follows, Joint, Kind};

use super::Flaw;
use super::fields::Field;

/// A joint as it stands in the file, its references not yet resolved.
pub(super) struct Draft {
    pub joint: Joint,
    pub parent: Parent,
    pub follows: Option<FollowsDraft>,
    /// Path of the joint in the file.
    pub path: String,
    /// Where a defect of the joint's name is reported.
    pub name_place: Flaw,
    /// From the joint's own frame to the frame that a child or a tip naming this joint means.
    pub end: Isometry3<f64>,
}

/// What a joint or tip says of its parent.
pub(super) enum Parent {
    /// The joint above in the file.
    Above,
    /// The named joint, or the base.
    Named(Field),
}

/// A `follows` table whose joint is still a name.
pub(super) struct FollowsDraft {
    pub other: Field,
    pub ratio: f64,
    pub offset: f64,
}

/// Place in the file of every joint name.
pub(super) fn names_of(drafts: &[Draft]) -> Result<HashMap<String, usize>, Flaw> {
    let mut names = HashMap::new();
    for (place, draft) in drafts.iter().enumerate() {
        let name = &draft.joint.name;
        if let Some(first) = names.insert(name.clone(), place) {
            let reason = format!("{name:?} is already the name of {}", drafts[first].path);
            return Err(Flaw {
                reason,
                ..draft.name_place.clone()
            });
        }
    }
    Ok(names)
}

/// Place in the file of the joint that `field` names, `None` for the base.
pub(super) fn lookup(field: &Field, names: &HashMap<String, usize>) -> Result<Option<usize>, Flaw> {
    match field.text()? {
        "base" => Ok(None),
        name => match names.get(name) {
            Some(place) => Ok(Some(*place)),
            None => Err(field.flaw(format!("no joint is named {name:?}"))),
        },
    }
}

/// Joints that know each other's places.
pub(super) struct Forest {
    /// Each after its parent.
    pub joints: Vec<Joint>,
    /// Place in `joints` of each joint of the file.
    pub place_of: Vec<usize>,
    /// [`Draft::end`] of each joint of the file.
    pub ends: Vec<Isometry3<f64>>,
}

/// Looks up every name in `drafts`, which stand as in the file, and puts parents first.
pub(super) fn resolve(drafts: Vec<Draft>, names: &HashMap<String, usize>) -> Result<Forest, Flaw> {
    let (parents, leaders) = places(&drafts, names)?;
    refuse_cycles(&drafts, &parents, &leaders)?;
    let order = parents_first(&parents);
    let mut place_of = vec![0; drafts.len()];
    for (place, from) in order.iter().enumerate() {
        place_of[*from] = place;
    }
    let ends: Vec<_> = drafts.iter().map(|draft| draft.end).collect();
    let mut joints: Vec<(usize, Joint)> = Vec::with_capacity(drafts.len());
    for (from, draft) in drafts.into_iter().enumerate() {
        let mut joint = draft.joint;
        joint.parent = parents[from].map(|parent| place_of[parent]);
        joint.follows = draft
            .follows
            .zip(leaders[from])
            .map(|(follows, leader)| Follows {
                joint: place_of[leader],
                ratio: follows.ratio,
                offset: follows.offset,
            });
        joints.push((place_of[from], joint));
    }
    joints.sort_by_key(|(place, _)| *place);
    Ok(Forest {
        joints: joints.into_iter().map(|(_, joint)| joint).collect(),
        place_of,
        ends,
    })
}

/// Places in the file of each joint's parent and of the joint it follows.
type Places = (Vec<Option<usize>>, Vec<Option<usize>>);

fn places(drafts: &[Draft], names: &HashMap<String, usize>) -> Result<Places, Flaw> {
    let mut parents = Vec::with_capacity(drafts.len());
    let mut leaders = Vec::with_capacity(drafts.len());
    for (place, draft) in drafts.iter().enumerate() {
        parents.push(match &draft.parent {
            Parent::Above => place.checked_sub(1),
            Parent::Named(field) => lookup(field, names)?,
        });
        leaders.push(match &draft.follows {
            None => None,
            Some(follows) => Some(leader(&follows.other, names, drafts)?),
        });
    }
    Ok((parents, leaders))
}

/// An error if parents or followers go round. Every cycle of parents has a joint that names its
/// parent, since the joint above is nearer to the top.
fn refuse_cycles(
    drafts: &[Draft],
    parents: &[Option<usize>],
    leaders: &[Option<usize>],
) -> Result<(), Flaw> {
    for (place, draft) in drafts.iter().enumerate() {
        if let (Parent::Named(field), Some(cycle)) = (&draft.parent, cycle(place, parents)) {
            return Err(field.flaw(format!("parents form a cycle: {}", path(&cycle, drafts))));
        }
        if let (Some(follows), Some(cycle)) = (&draft.follows, cycle(place, leaders)) {
            let around = path(&cycle, drafts);
            let reason = format!("joints follow each other in a cycle: {around}");
            return Err(follows.other.flaw(reason));
        }
    }
    Ok(())
}

/// Place in the file of the joint that a follower names; it must be able to move.
fn leader(field: &Field, names: &HashMap<String, usize>, drafts: &[Draft]) -> Result<usize, Flaw> {
    match lookup(field, names)? {
        None => Err(field.flaw("the base does not move")),
        Some(place) if drafts[place].joint.kind == Kind::Fixed => {
            Err(field.flaw(format!("joint {:?} is fixed", drafts[place].joint.name)))
        }
        Some(place) => Ok(place),
    }
}

/// The cycle that starting at `start` and going on to `next` runs through, if it comes back to
/// `start`.
fn cycle(start: usize, next: &[Option<usize>]) -> Option<Vec<usize>> {
    let walk = std::iter::successors(next[start], |place| next[*place]);
    let until_back: Vec<usize> = walk.take(next.len()).collect();
    let back = until_back.iter().position(|place| *place == start)?;
    Some([&[start], &until_back[..=back]].concat())
}

fn path(cycle: &[usize], drafts: &[Draft]) -> String {
    let names: Vec<&str> = cycle
        .iter()
        .map(|place| drafts[*place].joint.name.as_str())
        .collect();
    names.join(" -> ")
}

/// Places of the file, each after its parent, otherwise rising. `parents` has no cycle.
fn parents_first(parents: &[Option<usize>]) -> Vec<usize> {
    let mut order: Vec<usize> = Vec::with_capacity(parents.len());
    while let Some(next) = (0..parents.len()).find(|place| {
        !order.contains(place) && parents[*place].is_none_or(|parent| order.contains(&parent))
    }) {
        order.push(next);
    }
    order
}
