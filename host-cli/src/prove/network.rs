//! Every relation of the proof format over one chain and one target, in double precision.

use super::geometry::Chain;
use super::interval::Interval;
use crate::model::{Orientation, Target};
use balk_checker::proof::{Feature, Part, Place, Quantity, Relation};
use nalgebra::{Matrix3, Vector3};
use std::collections::HashMap;

/// A product of one or two quantities with a coefficient.
#[derive(Clone, Copy)]
pub(super) struct Term {
    pub factor: f64,
    pub a: usize,
    pub b: Option<usize>,
}

/// A sum of terms in a range.
pub(super) struct Equation {
    pub relation: Relation,
    pub terms: Vec<Term>,
    pub range: Interval,
}

/// A rule that is not a sum of products.
#[derive(Clone, Copy)]
pub(super) enum Special {
    Cosine(usize),
    Sine(usize),
    Angle(usize, Feature),
    AngleOfCircle(usize),
    Sector(usize, Feature),
    Spread(Feature),
    SpreadCone(usize, Feature),
    Tilt(usize),
}

/// What narrows quantities.
pub(super) enum Constraint {
    Equation(Equation),
    Special(Special),
}

/// What a target asks of the orientation.
pub(super) enum Wanted {
    Free,
    Near { columns: Matrix3<f64>, within: f64 },
    Cones(Vec<(Vector3<f64>, Vector3<f64>, f64)>),
}

/// Quantities, what is known of them from the start, and what narrows them.
pub(super) struct Network<'a> {
    pub chain: &'a Chain,
    pub wanted: Wanted,
    pub quantities: Vec<Quantity>,
    pub start: Vec<Interval>,
    pub constraints: Vec<Constraint>,
    /// Constraints that read a quantity.
    pub readers: Vec<Vec<u32>>,
    /// The quantity of every variable, and of every joint's value.
    pub variables: Vec<usize>,
    pub values: Vec<usize>,
    index: HashMap<Quantity, usize>,
    reach: f64,
}

/// The components of a view.
pub(super) const AXES: [Part; 3] = [Part::X, Part::Y, Part::Z];
/// A coefficient that small may be zero in truth; leaving it out changes less than is allowed for
/// rounding.
const TINY: f64 = 1e-15;
/// The same for the rotations of links, whose relations allow for 10^-12.
const TINY_TURN: f64 = 1e-13;

/// Whether it is a point, not a direction.
pub(super) fn is_point(feature: Feature) -> bool {
    matches!(feature, Feature::Origin(_) | Feature::Tip)
}

impl<'a> Network<'a> {
    /// The network of a target; `spans` are the root's, one for every variable.
    pub fn new(chain: &'a Chain, target: &Target, spans: &[Interval]) -> Network<'a> {
        let wanted = match &target.orientation {
            Orientation::Free => Wanted::Free,
            Orientation::Near { rotation, within } => Wanted::Near {
                columns: *rotation.matrix(),
                within: *within,
            },
            Orientation::Axes(cones) => Wanted::Cones(
                cones
                    .iter()
                    .map(|c| (c.tip.into_inner(), c.base.into_inner(), c.within))
                    .collect(),
            ),
        };
        let slides: f64 = chain
            .joints
            .iter()
            .filter(|joint| !joint.revolute)
            .map(|joint| {
                let span = spans[joint.variable];
                span.scale(joint.ratio)
                    .plus(Interval::point(joint.offset))
                    .magnitude()
            })
            .sum();
        let mut network = Network {
            chain,
            wanted,
            quantities: Vec::new(),
            start: Vec::new(),
            constraints: Vec::new(),
            readers: Vec::new(),
            variables: Vec::new(),
            values: Vec::new(),
            index: HashMap::new(),
            reach: (chain.length + slides) * (1.0 + 1e-9) + 1e-9,
        };
        for (v, span) in spans.iter().enumerate() {
            let at = network.quantity(Quantity::Variable(v as u8 + 1));
            network.start[at] = *span;
            network.variables.push(at);
        }
        for (i, joint) in chain.joints.iter().enumerate() {
            let at = network.quantity(Quantity::Value(i as u8 + 1));
            network.start[at] = joint.value(spans[joint.variable]);
            network.values.push(at);
        }
        network.joints();
        network.features(target);
        network.target();
        for (number, constraint) in network.constraints.iter().enumerate() {
            let mut inputs = network.inputs(constraint);
            inputs.sort_unstable();
            inputs.dedup();
            for input in inputs {
                network.readers[input].push(number as u32);
            }
        }
        network
    }

    /// The index of a quantity; a new one starts with what lengths and directions allow.
    fn quantity(&mut self, quantity: Quantity) -> usize {
        if let Some(&at) = self.index.get(&quantity) {
            return at;
        }
        let reach = self.reach;
        let size = |feature| if is_point(feature) { reach } else { 1.0 };
        let start = match quantity {
            Quantity::Variable(_) | Quantity::Value(_) => Interval::new(-1e300, 1e300),
            Quantity::Cosine(_) | Quantity::Sine(_) => Interval::new(-1.0, 1.0),
            Quantity::View(f, _, Part::Square) if is_point(f) => Interval::new(0.0, reach * reach),
            Quantity::View(_, _, Part::Square) => Interval::point(1.0),
            Quantity::Radius(f, _) => Interval::new(0.0, size(f) * size(f)),
            Quantity::View(f, ..) | Quantity::Along(f, _) | Quantity::Aim(f, _) => {
                Interval::new(-size(f), size(f))
            }
        };
        let at = self.quantities.len();
        self.quantities.push(quantity);
        self.start.push(start);
        self.readers.push(Vec::new());
        self.index.insert(quantity, at);
        at
    }

    /// The index of a quantity that some constraint uses.
    pub fn at(&self, quantity: Quantity) -> usize {
        self.index[&quantity]
    }

    fn fix(&mut self, quantity: Quantity, value: Interval) {
        let at = self.quantity(quantity);
        self.start[at] = value;
    }

    /// A view's three components and its squared length.
    fn fix_view(&mut self, feature: Feature, place: Place, value: Vector3<f64>, exact: bool) {
        for (k, part) in AXES.into_iter().enumerate() {
            let slack = if exact { 0.0 } else { 1e-15 };
            let component = Interval::new(value[k] - slack, value[k] + slack);
            self.fix(Quantity::View(feature, place, part), component);
        }
        let square = Interval::point(if is_point(feature) { 0.0 } else { 1.0 });
        self.fix(Quantity::View(feature, place, Part::Square), square);
    }

    /// Adds `sum of factor * a * b` in `range`.
    pub(super) fn equation(
        &mut self,
        relation: Relation,
        range: Interval,
        terms: impl IntoIterator<Item = (f64, Quantity, Option<Quantity>)>,
    ) {
        let terms = terms
            .into_iter()
            .filter(|(factor, ..)| factor.abs() > TINY)
            .map(|(factor, a, b)| Term {
                factor,
                a: self.quantity(a),
                b: b.map(|b| self.quantity(b)),
            })
            .collect();
        self.constraints.push(Constraint::Equation(Equation {
            relation,
            terms,
            range,
        }));
    }

    pub(super) fn special(&mut self, special: Special) {
        self.constraints.push(Constraint::Special(special));
    }

    fn joints(&mut self) {
        for (i, joint) in self.chain.joints.iter().enumerate() {
            let number = i as u8 + 1;
            if joint.revolute {
                let (c, s) = (Quantity::Cosine(number), Quantity::Sine(number));
                self.equation(
                    Relation::Circle(number),
                    Interval::point(1.0),
                    [(1.0, c, Some(c)), (1.0, s, Some(s))],
                );
                self.special(Special::Cosine(i));
                self.special(Special::Sine(i));
                self.special(Special::AngleOfCircle(i));
            }
        }
    }

    fn features(&mut self, target: &Target) {
        let count = self.chain.joints.len() as u8;
        let closed = matches!(self.wanted, Wanted::Near { .. });
        let cones = match &self.wanted {
            Wanted::Cones(cones) => cones.len() as u8,
            _ => 0,
        };
        for (k, part) in AXES.into_iter().enumerate() {
            let (centre, within) = (target.xyz[k], target.xyz_within[k]);
            let wide = Interval::new(centre - within, centre + within);
            self.fix(
                Quantity::View(Feature::Tip, Place::Base, part),
                wide.widened(1e-15),
            );
        }
        let mut features = vec![Feature::Tip];
        if closed {
            features.extend((0..3).map(Feature::TipAxis));
        }
        features.extend((1..=cones).map(Feature::Cone));
        features.extend((1..=count).map(Feature::Origin));
        if closed {
            features.extend((1..=count).map(Feature::Axis));
        }
        for &feature in &features {
            self.start_of(feature);
            self.loop_of(feature);
        }
        for i in 1..=count {
            for j in i + 1..=count {
                let pair = |f: fn(u8) -> Feature, part| {
                    let one = Quantity::View(f(i), Place::After(j), part);
                    let two = Quantity::View(f(j), Place::After(i), part);
                    [(1.0, one, None), (-1.0, two, None)]
                };
                let zero = Interval::point(0.0);
                self.equation(
                    Relation::PairSquare(i, j),
                    zero,
                    pair(Feature::Origin, Part::Square),
                );
                if closed {
                    self.equation(Relation::PairAxis(i, j), zero, pair(Feature::Axis, Part::Z));
                }
            }
        }
    }

    /// What is known of a feature where it does not move.
    fn start_of(&mut self, feature: Feature) {
        match feature {
            Feature::Origin(i) => {
                let zero = Vector3::zeros();
                self.fix_view(feature, Place::After(i), zero, true);
                if self.chain.joints[i as usize - 1].revolute {
                    self.fix_view(feature, Place::Before(i), zero, true);
                    self.fix(Quantity::Radius(feature, i), Interval::point(0.0));
                } else {
                    for part in [Part::X, Part::Y] {
                        let at = Quantity::View(feature, Place::Before(i), part);
                        self.fix(at, Interval::point(0.0));
                    }
                }
            }
            Feature::Axis(i) => {
                self.fix_view(feature, Place::Before(i), Vector3::z(), true);
                self.fix_view(feature, Place::After(i), Vector3::z(), true);
                if self.chain.joints[i as usize - 1].revolute {
                    self.fix(Quantity::Radius(feature, i), Interval::point(0.0));
                }
            }
            Feature::Tip => {
                self.fix_view(feature, Place::End, Vector3::zeros(), true);
            }
            Feature::TipAxis(k) => {
                let mut unit = Vector3::zeros();
                unit[k as usize] = 1.0;
                self.fix_view(feature, Place::End, unit, true);
            }
            Feature::Cone(k) => {
                let Wanted::Cones(cones) = &self.wanted else {
                    return;
                };
                let axis = cones[k as usize - 1].0;
                self.fix_view(feature, Place::End, axis, false);
            }
        }
    }

    /// A feature around the loop base, joints, tip.
    fn loop_of(&mut self, f: Feature) {
        let count = self.chain.joints.len() as u8;
        for link in 0..=count {
            self.link(link, f);
        }
        for i in 1..=count {
            if self.chain.joints[i as usize - 1].revolute {
                self.turn(i, f);
            } else {
                self.slide(i, f);
            }
        }
        let mut places = vec![Place::Base, Place::End];
        for i in 1..=count {
            places.extend([Place::Before(i), Place::After(i)]);
        }
        if f != Feature::Tip {
            places.push(Place::Difference);
            self.close(f);
        }
        for place in places {
            self.length(place, f);
        }
    }

    fn length(&mut self, place: Place, f: Feature) {
        let view = |part| Quantity::View(f, place, part);
        let squares = AXES.map(|part| (-1.0, view(part), Some(view(part))));
        self.equation(
            Relation::Length(place, f),
            Interval::point(0.0),
            squares.into_iter().chain([(1.0, view(Part::Square), None)]),
        );
    }

    fn link(&mut self, l: u8, f: Feature) {
        let link = &self.chain.links[l as usize];
        let count = self.chain.joints.len() as u8;
        let first = if l == 0 { Place::Base } else { Place::After(l) };
        let second = if l == count {
            Place::End
        } else {
            Place::Before(l + 1)
        };
        let (v, w) = (
            |part| Quantity::View(f, first, part),
            |part| Quantity::View(f, second, part),
        );
        let point = is_point(f);
        let (origin, rotation) = (
            if point { link.origin } else { Vector3::zeros() },
            link.rotation
                .matrix()
                .map(|r| if r.abs() < TINY_TURN { 0.0 } else { r }),
        );
        let slack = if point {
            link.shift + link.turn * self.reach
        } else {
            link.turn
        };
        let back = rotation.transpose() * origin;
        let (turn, shift, reach) = (link.turn, link.shift, self.reach);
        for (k, part) in AXES.into_iter().enumerate() {
            let others = |m: Matrix3<f64>, of: &dyn Fn(Part) -> Quantity| {
                [0, 1, 2].map(|j| (-m[(k, j)], of(AXES[j]), None))
            };
            self.equation(
                Relation::Out(k as u8, l, f),
                Interval::new(origin[k] - slack, origin[k] + slack),
                others(rotation, &w)
                    .into_iter()
                    .chain([(1.0, v(part), None)]),
            );
            self.equation(
                Relation::In(k as u8, l, f),
                Interval::new(-back[k] - slack, -back[k] + slack),
                others(rotation.transpose(), &v)
                    .into_iter()
                    .chain([(1.0, w(part), None)]),
            );
        }
        if !point {
            return;
        }
        let (length, square) = (origin.norm(), origin.norm_squared());
        let constant = 2.0 * length * shift + shift * shift;
        let far = constant + 2.0 * (shift + length * turn) * reach + 1e-14;
        let near = constant + 2.0 * shift * reach + 1e-14;
        let squares = |sign: f64| {
            [
                (sign, v(Part::Square), None),
                (-sign, w(Part::Square), None),
            ]
        };
        self.equation(
            Relation::Far(l, f),
            Interval::new(square - far, square + far),
            squares(1.0)
                .into_iter()
                .chain([0, 1, 2].map(|k| (-2.0 * back[k], w(AXES[k]), None))),
        );
        self.equation(
            Relation::Near(l, f),
            Interval::new(square - near, square + near),
            squares(-1.0)
                .into_iter()
                .chain([0, 1, 2].map(|k| (2.0 * origin[k], v(AXES[k]), None))),
        );
    }
}
