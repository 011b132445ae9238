//! What a proof speaks of: the machine's geometry, the target, and what is known from the start
//! (`FORMAT.md`, section 3).

use dashu_int::IBig;

use crate::exact::interval::{Interval, ONE};
use crate::geometry::Geometry;
use crate::machine::{Chain, Kind};
use crate::proof::{Feature, Part, Place, Quantity};
use crate::wanted::Wanted;

/// Everything that stays the same through one proof.
pub struct Problem<'a> {
    /// The machine's.
    pub chain: &'a Chain,
    /// The links between the chosen frames.
    pub geometry: &'a Geometry,
    /// The target.
    pub wanted: &'a Wanted,
    /// No two origins are farther apart, grains.
    pub rho: IBig,
}

impl Problem<'_> {
    /// Number of moving joints.
    pub fn joints(&self) -> usize {
        self.chain.moving.len()
    }

    /// Kind of the joint, counted from 1, if there is one.
    pub fn kind(&self, joint: u8) -> Option<Kind> {
        let place = usize::from(joint).checked_sub(1)?;
        Some(self.chain.moving.get(place)?.kind)
    }

    /// Whether there is a revolute joint of this number.
    pub fn is_revolute(&self, joint: u8) -> bool {
        self.kind(joint) == Some(Kind::Revolute)
    }

    /// Whether there is a prismatic joint of this number.
    pub fn is_prismatic(&self, joint: u8) -> bool {
        self.kind(joint) == Some(Kind::Prismatic)
    }

    /// The cone, counted from 1, if there is one.
    pub fn cone(&self, cone: u8) -> Option<&crate::wanted::Cone> {
        self.wanted.cones.get(usize::from(cone).checked_sub(1)?)
    }

    /// Whether there is such a feature.
    pub fn has_feature(&self, feature: Feature) -> bool {
        match feature {
            Feature::Origin(joint) | Feature::Axis(joint) => self.kind(joint).is_some(),
            Feature::Tip => true,
            Feature::TipAxis(axis) => axis < 3,
            Feature::Cone(cone) => self.cone(cone).is_some(),
        }
    }

    /// Whether there is such a place.
    pub fn has_place(&self, place: Place) -> bool {
        match place {
            Place::Before(joint) | Place::After(joint) => self.kind(joint).is_some(),
            Place::Base | Place::End | Place::Difference => true,
        }
    }

    /// Whether there is such a quantity.
    pub fn has(&self, quantity: Quantity) -> bool {
        match quantity {
            Quantity::Variable(variable) => {
                (1..=self.chain.variables.len()).contains(&usize::from(variable))
            }
            Quantity::Value(joint) => self.kind(joint).is_some(),
            Quantity::Cosine(joint) | Quantity::Sine(joint) => self.is_revolute(joint),
            Quantity::View(feature, place, _) => self.has_feature(feature) && self.has_place(place),
            Quantity::Radius(feature, joint) => {
                self.has_feature(feature) && self.is_revolute(joint)
            }
            Quantity::Along(feature, cone) | Quantity::Aim(feature, cone) => {
                self.has_feature(feature) && self.cone(cone).is_some()
            }
        }
    }

    /// What is known of a quantity from the start. Variables and joint values depend on the node
    /// and are not asked for here: nothing is known of them.
    pub fn start(&self, quantity: Quantity) -> Interval {
        let unit = || Interval::around_zero(ONE.clone());
        match quantity {
            Quantity::Variable(_) | Quantity::Value(_) => self.within_reach(),
            Quantity::Cosine(_) | Quantity::Sine(_) => unit(),
            Quantity::View(feature, place, part) => self.view(feature, place, part),
            Quantity::Radius(feature, joint) => {
                if feature == Feature::Origin(joint) || feature == Feature::Axis(joint) {
                    Interval::zero()
                } else if is_point(feature) {
                    self.squared_reach()
                } else {
                    Interval::new(IBig::ZERO, ONE.clone())
                }
            }
            Quantity::Along(feature, _) | Quantity::Aim(feature, _) => {
                if is_point(feature) {
                    self.within_reach()
                } else {
                    unit()
                }
            }
        }
    }

    fn view(&self, feature: Feature, place: Place, part: Part) -> Interval {
        if is_point(feature) {
            return self.point(feature, place, part);
        }
        let Some(axis) = axis_of(part) else {
            return Interval::one();
        };
        let unit = |third: usize| {
            if axis == third {
                Interval::one()
            } else {
                Interval::zero()
            }
        };
        match (feature, place) {
            (Feature::Axis(joint), Place::Before(at) | Place::After(at)) if joint == at => unit(2),
            (Feature::TipAxis(number), Place::End) => unit(usize::from(number)),
            (Feature::Cone(cone), Place::End) => match self.cone(cone) {
                Some(cone) => cone.tip[axis].clone(),
                None => Interval::around_zero(ONE.clone()),
            },
            _ => Interval::around_zero(ONE.clone()),
        }
    }

    fn point(&self, feature: Feature, place: Place, part: Part) -> Interval {
        let is_zero = match (feature, place) {
            (Feature::Origin(joint), Place::After(at)) => joint == at,
            (Feature::Origin(joint), Place::Before(at)) if joint == at => {
                self.is_revolute(joint) || matches!(part, Part::X | Part::Y)
            }
            (Feature::Tip, Place::End | Place::Difference) => true,
            _ => false,
        };
        if is_zero {
            return Interval::zero();
        }
        match axis_of(part) {
            Some(axis) if feature == Feature::Tip && place == Place::Base => {
                self.wanted.position[axis].clone()
            }
            Some(_) => self.within_reach(),
            None => self.squared_reach(),
        }
    }

    fn within_reach(&self) -> Interval {
        Interval::around_zero(self.rho.clone())
    }

    fn squared_reach(&self) -> Interval {
        let reach = self.within_reach();
        reach.square().shrink(&ONE)
    }
}

/// Whether a feature is a point; else it is a direction.
pub fn is_point(feature: Feature) -> bool {
    matches!(feature, Feature::Origin(_) | Feature::Tip)
}

/// Which coordinate a part is; `None` for the squared length.
pub fn axis_of(part: Part) -> Option<usize> {
    match part {
        Part::X => Some(0),
        Part::Y => Some(1),
        Part::Z => Some(2),
        Part::Square => None,
    }
}
