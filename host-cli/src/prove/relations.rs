//! The relations of joints and of the target, and what each constraint reads.

use super::geometry::Joint;
use super::interval::Interval;
use super::network::{AXES, Constraint, Network, Special, Wanted, is_point};
use balk_checker::proof::{Feature, Part, Place, Quantity, Relation};

const ZERO: Interval = Interval { lo: 0.0, hi: 0.0 };

impl Joint {
    /// The joint's values over a span of its variable.
    pub fn value(&self, span: Interval) -> Interval {
        if self.ratio == 1.0 && self.offset == 0.0 {
            return span;
        }
        let value = span.scale(self.ratio).plus(Interval::point(self.offset));
        value.widened(1e-15 * value.magnitude().max(1.0))
    }

    /// The variable's values over a range of the joint.
    pub fn variable_of(&self, value: Interval) -> Option<Interval> {
        if self.ratio == 1.0 && self.offset == 0.0 {
            return Some(value);
        }
        let own = value
            .minus(Interval::point(self.offset))
            .over(Interval::point(self.ratio))?;
        Some(own.widened(1e-15 * own.magnitude().max(1.0)))
    }
}

impl Network<'_> {
    /// `w = Rz(q) v` at a revolute joint.
    pub(super) fn turn(&mut self, i: u8, f: Feature) {
        let w = |k: usize| Quantity::View(f, Place::Before(i), AXES[k]);
        let v = |k: usize| Quantity::View(f, Place::After(i), AXES[k]);
        let square = |place| Quantity::View(f, place, Part::Square);
        let (c, s, r) = (
            Quantity::Cosine(i),
            Quantity::Sine(i),
            Quantity::Radius(f, i),
        );
        let mut add = |relation, terms: &[(f64, Quantity, Option<Quantity>)]| {
            self.equation(relation, ZERO, terms.iter().copied());
        };
        add(
            Relation::Turn(0, i, f),
            &[
                (1.0, w(0), None),
                (-1.0, c, Some(v(0))),
                (1.0, s, Some(v(1))),
            ],
        );
        add(
            Relation::Turn(1, i, f),
            &[
                (1.0, w(1), None),
                (-1.0, s, Some(v(0))),
                (-1.0, c, Some(v(1))),
            ],
        );
        add(
            Relation::Turn(2, i, f),
            &[(1.0, w(2), None), (-1.0, v(2), None)],
        );
        add(
            Relation::Back(0, i, f),
            &[
                (1.0, v(0), None),
                (-1.0, c, Some(w(0))),
                (-1.0, s, Some(w(1))),
            ],
        );
        add(
            Relation::Back(1, i, f),
            &[
                (1.0, v(1), None),
                (-1.0, c, Some(w(1))),
                (1.0, s, Some(w(0))),
            ],
        );
        let (before, after) = (square(Place::Before(i)), square(Place::After(i)));
        add(
            Relation::TurnSquare(i, f),
            &[(1.0, before, None), (-1.0, after, None)],
        );
        let both = |x: Quantity| Some(x);
        add(
            Relation::PlaneBefore(i, f),
            &[
                (1.0, r, None),
                (-1.0, w(0), both(w(0))),
                (-1.0, w(1), both(w(1))),
            ],
        );
        add(
            Relation::PlaneAfter(i, f),
            &[
                (1.0, r, None),
                (-1.0, v(0), both(v(0))),
                (-1.0, v(1), both(v(1))),
            ],
        );
        add(
            Relation::HeightBefore(i, f),
            &[
                (1.0, before, None),
                (-1.0, r, None),
                (-1.0, w(2), both(w(2))),
            ],
        );
        add(
            Relation::HeightAfter(i, f),
            &[
                (1.0, after, None),
                (-1.0, r, None),
                (-1.0, v(2), both(v(2))),
            ],
        );
        add(
            Relation::Dot(i, f),
            &[
                (1.0, c, Some(r)),
                (-1.0, w(0), Some(v(0))),
                (-1.0, w(1), Some(v(1))),
            ],
        );
        add(
            Relation::Cross(i, f),
            &[
                (1.0, s, Some(r)),
                (-1.0, w(1), Some(v(0))),
                (1.0, w(0), Some(v(1))),
            ],
        );
        self.special(Special::Angle(i as usize - 1, f));
        self.special(Special::Sector(i as usize - 1, f));
    }

    /// `w = v + (0, 0, q)` at a prismatic joint.
    pub(super) fn slide(&mut self, i: u8, f: Feature) {
        for (k, &part) in AXES.iter().enumerate() {
            let w = Quantity::View(f, Place::Before(i), part);
            let v = Quantity::View(f, Place::After(i), part);
            let q = (k == 2 && is_point(f)).then_some((-1.0, Quantity::Value(i), None));
            let relation = if k == 2 && !is_point(f) {
                Relation::Turn(2, i, f)
            } else {
                Relation::Slide(k as u8, i, f)
            };
            let terms = [(1.0, w, None), (-1.0, v, None)];
            self.equation(relation, ZERO, terms.into_iter().chain(q));
        }
    }

    /// From the base to the tip frame without the joints between.
    pub(super) fn close(&mut self, f: Feature) {
        let view = |place, k: usize| Quantity::View(f, place, AXES[k]);
        for k in 0..3 {
            let tip = Quantity::View(Feature::Tip, Place::Base, AXES[k]);
            let less = is_point(f).then_some((1.0, tip, None));
            let terms = [
                (1.0, view(Place::Difference, k), None),
                (-1.0, view(Place::Base, k), None),
            ];
            self.equation(
                Relation::Shift(k as u8, f),
                ZERO,
                terms.into_iter().chain(less),
            );
        }
        let square = |place| Quantity::View(f, place, Part::Square);
        let squares = [
            (1.0, square(Place::Difference), None),
            (-1.0, square(Place::End), None),
        ];
        self.equation(Relation::Rigid(f), ZERO, squares);
        match &self.wanted {
            Wanted::Free => {}
            Wanted::Near { .. } => {
                self.special(Special::Spread(f));
                if matches!(f, Feature::TipAxis(_)) {
                    return;
                }
                let axis = |m: usize, k: usize| {
                    Quantity::View(Feature::TipAxis(m as u8), Place::Base, AXES[k])
                };
                for k in 0..3 {
                    self.equation(
                        Relation::Close(k as u8, f),
                        ZERO,
                        [0, 1, 2]
                            .map(|m| (-1.0, axis(m, k), Some(view(Place::End, m))))
                            .into_iter()
                            .chain([(1.0, view(Place::Difference, k), None)]),
                    );
                    self.equation(
                        Relation::Open(k as u8, f),
                        ZERO,
                        [0, 1, 2]
                            .map(|j| (-1.0, axis(k, j), Some(view(Place::Difference, j))))
                            .into_iter()
                            .chain([(1.0, view(Place::End, k), None)]),
                    );
                }
            }
            Wanted::Cones(cones) => {
                if matches!(f, Feature::Cone(_)) {
                    return;
                }
                let cones = cones.clone();
                for (number, (tip, base, _)) in (1..).zip(&cones) {
                    let (along, aim) = (Quantity::Along(f, number), Quantity::Aim(f, number));
                    let axis =
                        |k: usize| Quantity::View(Feature::Cone(number), Place::Base, AXES[k]);
                    self.equation(
                        Relation::Along(number, f),
                        ZERO,
                        [0, 1, 2]
                            .map(|k| (-tip[k], view(Place::End, k), None))
                            .into_iter()
                            .chain([(1.0, along, None)]),
                    );
                    self.equation(
                        Relation::AlongDifference(number, f),
                        ZERO,
                        [0, 1, 2]
                            .map(|k| (-1.0, axis(k), Some(view(Place::Difference, k))))
                            .into_iter()
                            .chain([(1.0, along, None)]),
                    );
                    self.equation(
                        Relation::Aim(number, f),
                        ZERO,
                        [0, 1, 2]
                            .map(|k| (-base[k], view(Place::Difference, k), None))
                            .into_iter()
                            .chain([(1.0, aim, None)]),
                    );
                    self.special(Special::SpreadCone(number as usize - 1, f));
                }
            }
        }
    }

    /// The greatest turn or cone angles themselves.
    pub(super) fn target(&mut self) {
        let component = |feature, k: usize| Quantity::View(feature, Place::Base, AXES[k]);
        match &self.wanted {
            Wanted::Free => {}
            Wanted::Near { columns, within } => {
                let least = 1.0 + 2.0 * within.min(std::f64::consts::PI).cos() - 1e-14;
                let columns = *columns;
                let terms = (0..9).map(move |n| {
                    let (m, k) = (n / 3, n % 3);
                    let axis = Feature::TipAxis(m as u8);
                    (columns[(k, m)], component(axis, k), None)
                });
                self.equation(Relation::Trace, Interval::new(least, 3.0 + 1e-12), terms);
            }
            Wanted::Cones(cones) => {
                for (number, (_, base, within)) in (1..).zip(cones.clone()) {
                    let least = within.min(std::f64::consts::PI).cos() - 1e-14;
                    let terms =
                        [0, 1, 2].map(|k| (base[k], component(Feature::Cone(number), k), None));
                    self.equation(
                        Relation::Cone(number),
                        Interval::new(least, 1.0 + 1e-12),
                        terms,
                    );
                    self.special(Special::Tilt(number as usize - 1));
                }
            }
        }
    }

    /// The quantities a constraint reads.
    pub(super) fn inputs(&self, constraint: &Constraint) -> Vec<usize> {
        let special = match constraint {
            Constraint::Equation(equation) => {
                return equation
                    .terms
                    .iter()
                    .flat_map(|t| [Some(t.a), t.b])
                    .flatten()
                    .collect();
            }
            Constraint::Special(special) => *special,
        };
        let plane = |f, i: usize| {
            let number = i as u8 + 1;
            [Place::Before(number), Place::After(number)]
                .into_iter()
                .flat_map(move |place| [(place, Part::X), (place, Part::Y)])
                .map(move |(place, part)| Quantity::View(f, place, part))
        };
        let views = |f, place| AXES.map(|part| Quantity::View(f, place, part));
        let mut inputs: Vec<Quantity> = match special {
            Special::Cosine(i) | Special::Sine(i) => vec![Quantity::Value(i as u8 + 1)],
            Special::AngleOfCircle(i) => {
                vec![Quantity::Cosine(i as u8 + 1), Quantity::Sine(i as u8 + 1)]
            }
            Special::Angle(i, f) => plane(f, i).collect(),
            Special::Sector(i, f) => plane(f, i)
                .chain([
                    Quantity::Radius(f, i as u8 + 1),
                    Quantity::Value(i as u8 + 1),
                ])
                .collect(),
            Special::Spread(f) => {
                let squares = [Place::Difference, Place::End];
                views(f, Place::Difference)
                    .into_iter()
                    .chain(views(f, Place::End))
                    .chain(squares.map(|place| Quantity::View(f, place, Part::Square)))
                    .collect()
            }
            Special::SpreadCone(k, f) => {
                let number = k as u8 + 1;
                let squares = [Place::Difference, Place::End];
                [Quantity::Along(f, number), Quantity::Aim(f, number)]
                    .into_iter()
                    .chain(squares.map(|place| Quantity::View(f, place, Part::Square)))
                    .collect()
            }
            Special::Tilt(k) => views(Feature::Cone(k as u8 + 1), Place::Base).to_vec(),
        };
        inputs.sort_unstable();
        inputs
            .into_iter()
            .map(|quantity| self.at(quantity))
            .collect()
    }
}
