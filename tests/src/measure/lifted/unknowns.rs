//! The unknowns of the lifted program and the linear forms they make.

use super::form::Form;
use super::program::Families;
use balk_core::certificate::Range;
use balk_core::fixed::{FRACTION_BITS, Interval, ONE};
use balk_core::machine::{Motion, Placement};
use balk_core::propagate::{Feature, Network};

/// The unknowns of a propagated node.
pub struct Lifted<'n, 'a> {
    /// The network the node was propagated in.
    pub network: &'n Network<'a>,
    families: Families,
    /// Number of joints.
    pub joints: usize,
    features: Vec<usize>,
}

impl<'n, 'a> Lifted<'n, 'a> {
    /// Takes as many features as fit `columns` unknowns, the tip's first.
    pub fn new(network: &'n Network<'a>, families: Families, columns: usize) -> Lifted<'n, 'a> {
        let joints = network.chain().joints.len();
        let room = columns.saturating_sub(2 * joints) / (3 * (joints + 1));
        let features = network
            .features()
            .iter()
            .enumerate()
            .filter(|(_, feature)| {
                families.has(Families::JOINTS)
                    || matches!(feature, Feature::TipOrigin | Feature::TipAxis(_))
            })
            .map(|(f, _)| f)
            .take(room)
            .collect();
        Lifted {
            network,
            families,
            joints,
            features,
        }
    }

    /// Families of rows in use.
    pub fn families(&self) -> Families {
        self.families
    }

    /// The features in use, as numbered by the network.
    pub fn features(&self) -> &[usize] {
        &self.features
    }

    /// Number of unknowns: cosine and sine (or length and nothing) of every joint, then every
    /// feature's view after joint 0 (the base), 1, 2, ...
    pub fn unknowns(&self) -> usize {
        2 * self.joints + 3 * (self.joints + 1) * self.features.len()
    }

    /// The box of every unknown, 30 fraction bits.
    pub fn boxes(&self) -> impl Iterator<Item = Range> {
        let range = |i: Interval| Range::between(i.lo as i64, i.hi as i64);
        let joints = self.network.chain().joints;
        let spans = self.network.joint_spans();
        let turns = joints.iter().zip(spans).flat_map(move |(joint, span)| {
            match joint.motion {
                Motion::Turn => [span.cosine, span.sine],
                Motion::Slide => [span.length, Interval::ZERO],
            }
            .map(range)
        });
        let views = self.features.iter().flat_map(move |&feature| {
            (0..=self.joints).flat_map(move |i| self.network.view(feature, i).1.map(range))
        });
        turns.chain(views)
    }

    /// A feature (by its place among those in use) after a joint.
    pub fn after(&self, slot: usize, joint: usize) -> [Form; 3] {
        let first = 2 * self.joints + 3 * ((self.joints + 1) * slot + joint);
        [0, 1, 2].map(|k| Form::unknown(first + k))
    }

    /// The link before joint `i`, or to the tip.
    fn placement(&self, i: usize) -> &'a Placement {
        let chain = self.network.chain();
        chain.joints.get(i - 1).map_or(chain.tip, |j| &j.placement)
    }

    /// Whether a feature is a point.
    pub fn is_point(&self, slot: usize) -> bool {
        self.network.features()[self.features[slot]].is_point()
    }

    /// The view before joint `i` (or in the tip's frame): transposed rotation times what the view
    /// after the previous joint is beyond the offset.
    pub fn before(&self, slot: usize, i: usize) -> [Form; 3] {
        let placement = self.placement(i);
        let after = self.after(slot, i - 1);
        let point = self.is_point(slot);
        let slack = (placement.turn_slack as i64) << FRACTION_BITS;
        [0, 1, 2].map(|j| {
            let mut form = Form::default();
            for (k, own) in after.iter().enumerate() {
                let factor = placement.rotation[k][j];
                if factor == 0 {
                    continue;
                }
                form.add(own, factor as i64);
                if point {
                    let offset = placement.origin[k].scale(factor);
                    form.rest(-offset.hi, -offset.lo);
                }
            }
            form.rest(-slack, slack);
            form
        })
    }

    /// The squared length of a point's view after joint `i` as a linear form: the law of cosines
    /// along the chain up to where it is a constant.
    pub fn square(&self, slot: usize, i: usize) -> Option<Form> {
        let feature = self.network.features()[self.features[slot]];
        let zero_at = match feature {
            Feature::TipOrigin => self.joints + 1,
            Feature::Origin(joint) => joint as usize,
            _ => return None,
        };
        let turns = |i: usize| {
            self.network
                .chain()
                .joints
                .get(i - 1)
                .is_none_or(|j| j.motion == Motion::Turn)
        };
        let mut sum = Form::default();
        // |after i|^2 = |t|^2 + |before i + 1|^2 + 2 back . before, and the other way round
        // |before j|^2 = |t|^2 + |after j - 1|^2 - 2 t . after.
        for j in i.min(zero_at) + 1..=i.max(zero_at) {
            if !turns(j) {
                return None;
            }
            let placement = self.placement(j);
            sum.rest(placement.square.lo, placement.square.hi);
            let (forms, along, factor) = if i < zero_at {
                (self.before(slot, j), placement.back, 2)
            } else {
                (self.after(slot, j - 1), placement.origin, -2)
            };
            for (form, along) in forms.iter().zip(along) {
                let mut part = Form::default();
                part.add_between(form, along);
                sum.add(&part, factor * ONE as i64);
            }
        }
        turns(zero_at).then_some(sum)
    }
}
