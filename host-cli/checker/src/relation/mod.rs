//! Relations as polynomials: `FORMAT.md`, section 4.

mod tip;

use dashu_int::IBig;

use crate::exact::interval::{Interval, ONE, ceil};
use crate::geometry::{Constant, Link};
use crate::problem::{Problem, is_point};
use crate::proof::{Feature, Part, Place, Quantity, Relation};
use crate::space::Vector;

/// A product of one or two quantities, the lesser one first.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Monomial {
    /// Only one.
    One(Quantity),
    /// Two, perhaps equal.
    Two(Quantity, Quantity),
}

/// A monomial with its coefficient.
#[derive(Clone, Debug)]
pub struct Term {
    /// In the polynomial's unit, and how far the true coefficient may be from it.
    pub by: Constant,
    /// Times this.
    pub of: Monomial,
}

/// A sum of terms that lies in a range.
#[derive(Clone, Debug)]
pub struct Polynomial {
    /// The sum.
    pub terms: Vec<Term>,
    /// Grains.
    pub range: Interval,
    /// Unit of the coefficients: whole numbers are cheaper than grains.
    pub unit: Unit,
}

/// Unit of a polynomial's coefficients.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Unit {
    /// Whole numbers.
    Whole,
    /// Grains.
    Grain,
}

impl Unit {
    /// One, counted in this unit.
    pub fn one(self) -> &'static IBig {
        static WHOLE: IBig = IBig::ONE;
        match self {
            Self::Whole => &WHOLE,
            Self::Grain => &ONE,
        }
    }
}

const AXES: [Part; 3] = [Part::X, Part::Y, Part::Z];

impl Polynomial {
    fn new(range: Interval) -> Self {
        Self {
            terms: Vec::with_capacity(4),
            range,
            unit: Unit::Whole,
        }
    }

    /// Nothing, with coefficients in grains.
    fn fine(range: Interval) -> Self {
        Self {
            unit: Unit::Grain,
            ..Self::new(range)
        }
    }

    /// Whether a product of two quantities is in it.
    pub fn has_products(&self) -> bool {
        let mut terms = self.terms.iter();
        terms.any(|term| matches!(term.of, Monomial::Two(..)))
    }

    fn zero() -> Self {
        Self::new(Interval::zero())
    }

    /// Plus `by` times `quantity`.
    fn one(self, by: i8, quantity: Quantity) -> Self {
        {
            let by = self.whole(by);
            self.add(by, Monomial::One(quantity))
        }
    }

    /// Plus `by` times the product of `a` and `b`.
    fn two(self, by: i8, a: Quantity, b: Quantity) -> Self {
        {
            let by = self.whole(by);
            self.add(by, Monomial::Two(a.min(b), a.max(b)))
        }
    }

    /// The whole number `number` as a coefficient.
    fn whole(&self, number: i8) -> Constant {
        Constant {
            middle: IBig::from(number) * self.unit.one(),
            error: IBig::ZERO,
        }
    }

    fn add(mut self, by: Constant, of: Monomial) -> Self {
        self.terms.push(Term { by, of });
        self
    }

    /// Plus `sign` times the inner product of constants with what `part` gives for each axis.
    fn dot(self, sign: i8, constants: [Constant; 3], part: impl Fn(Part) -> Quantity) -> Self {
        constants
            .into_iter()
            .zip(AXES)
            .fold(self, |sum, (by, axis)| {
                let by = Constant {
                    middle: by.middle * IBig::from(sign),
                    error: by.error,
                };
                if by.middle.is_zero() && by.error.is_zero() {
                    sum
                } else {
                    sum.add(by, Monomial::One(part(axis)))
                }
            })
    }
}

fn constants(vector: &Vector) -> [Constant; 3] {
    vector.each_ref().map(Constant::new)
}

/// The polynomial of `relation`; `None` if the machine and the target have no such relation.
pub fn polynomial(problem: &Problem, relation: Relation) -> Option<Polynomial> {
    use Relation as R;
    match relation {
        R::Turn(axis, i, f) => turn(problem, axis, i, f),
        R::Back(axis, i, f) => {
            let [w, v] = sides(problem, i, f, true)?;
            let (c, s) = (Quantity::Cosine(i), Quantity::Sine(i));
            let zero = Polynomial::zero();
            match axis {
                0 => Some(
                    zero.one(1, v(Part::X))
                        .two(-1, c, w(Part::X))
                        .two(-1, s, w(Part::Y)),
                ),
                1 => Some(
                    zero.one(1, v(Part::Y))
                        .two(-1, c, w(Part::Y))
                        .two(1, s, w(Part::X)),
                ),
                _ => None,
            }
        }
        R::TurnSquare(i, f) => {
            let [w, v] = sides(problem, i, f, true)?;
            Some(
                Polynomial::zero()
                    .one(1, w(Part::Square))
                    .one(-1, v(Part::Square)),
            )
        }
        R::PlaneBefore(i, f) | R::PlaneAfter(i, f) => {
            let [w, v] = sides(problem, i, f, true)?;
            let seen = if matches!(relation, R::PlaneBefore(..)) {
                w
            } else {
                v
            };
            let (x, y) = (seen(Part::X), seen(Part::Y));
            let radius = Polynomial::zero().one(1, Quantity::Radius(f, i));
            Some(radius.two(-1, x, x).two(-1, y, y))
        }
        R::HeightBefore(i, f) | R::HeightAfter(i, f) => {
            let [w, v] = sides(problem, i, f, true)?;
            let seen = if matches!(relation, R::HeightBefore(..)) {
                w
            } else {
                v
            };
            let z = seen(Part::Z);
            let square = Polynomial::zero().one(1, seen(Part::Square));
            Some(square.one(-1, Quantity::Radius(f, i)).two(-1, z, z))
        }
        R::Dot(i, f) => {
            let [w, v] = sides(problem, i, f, true)?;
            let product = Polynomial::zero().two(1, Quantity::Cosine(i), Quantity::Radius(f, i));
            let along = product.two(-1, w(Part::X), v(Part::X));
            Some(along.two(-1, w(Part::Y), v(Part::Y)))
        }
        R::Cross(i, f) => {
            let [w, v] = sides(problem, i, f, true)?;
            let product = Polynomial::zero().two(1, Quantity::Sine(i), Quantity::Radius(f, i));
            let across = product.two(-1, w(Part::Y), v(Part::X));
            Some(across.two(1, w(Part::X), v(Part::Y)))
        }
        R::Circle(i) => {
            let (c, s) = (Quantity::Cosine(i), Quantity::Sine(i));
            let one = Polynomial::new(Interval::one());
            problem
                .is_revolute(i)
                .then(|| one.two(1, c, c).two(1, s, s))
        }
        R::Slide(axis, i, f) => {
            let [w, v] = sides(problem, i, f, false)?;
            let part = *AXES.get(usize::from(axis))?;
            let same = Polynomial::zero().one(1, w(part)).one(-1, v(part));
            match axis {
                2 => is_point(f).then(|| same.one(-1, Quantity::Value(i))),
                _ => Some(same),
            }
        }
        R::Length(p, f) => {
            if !problem.has_place(p) || !problem.has_feature(f) {
                return None;
            }
            let square = Polynomial::zero().one(1, Quantity::View(f, p, Part::Square));
            Some(AXES.iter().fold(square, |sum, axis| {
                let part = Quantity::View(f, p, *axis);
                sum.two(-1, part, part)
            }))
        }
        R::Out(axis, l, f) | R::In(axis, l, f) => {
            let (link, first, second) = link(problem, l)?;
            let (axis, part) = (usize::from(axis), *AXES.get(usize::from(axis))?);
            problem.has_feature(f).then_some(())?;
            let v = |part| Quantity::View(f, first, part);
            let w = |part| Quantity::View(f, second, part);
            let point = is_point(f);
            let slack = Interval::around_zero(slack(problem, link, point));
            let offset = |shift: &Vector| {
                if point {
                    shift[axis].clone()
                } else {
                    Interval::zero()
                }
            };
            Some(if matches!(relation, R::Out(..)) {
                let row = link.rotation[axis].clone();
                let sum = Polynomial::fine(&offset(&link.origin) + &slack);
                sum.one(1, v(part)).dot(-1, row, w)
            } else {
                let column = link.rotation.each_ref().map(|row| row[axis].clone());
                let sum = Polynomial::fine(&slack - &offset(&link.back));
                sum.one(1, w(part)).dot(-1, column, v)
            })
        }
        R::Far(l, f) | R::Near(l, f) => {
            let (link, first, second) = link(problem, l)?;
            (is_point(f) && problem.has_feature(f)).then_some(())?;
            let v = |part| Quantity::View(f, first, part);
            let w = |part| Quantity::View(f, second, part);
            let twice = |vector: &Vector| constants(&vector.each_ref().map(|x| x.scale(&2.into())));
            let far = matches!(relation, R::Far(..));
            let around = Interval::around_zero(squared_slack(problem, link, far));
            let sum = Polynomial::fine(&link.square + &around);
            Some(if far {
                let ends = sum.one(1, v(Part::Square)).one(-1, w(Part::Square));
                ends.dot(-1, twice(&link.back), w)
            } else {
                let ends = sum.one(1, w(Part::Square)).one(-1, v(Part::Square));
                ends.dot(1, twice(&link.origin), v)
            })
        }
        R::PairSquare(i, j) => pair(
            problem,
            [Feature::Origin(i), Feature::Origin(j)],
            i,
            j,
            Part::Square,
        ),
        R::PairAxis(i, j) => pair(problem, [Feature::Axis(i), Feature::Axis(j)], i, j, Part::Z),
        _ => tip::polynomial(problem, relation),
    }
}

fn turn(problem: &Problem, axis: u8, i: u8, f: Feature) -> Option<Polynomial> {
    let zero = Polynomial::zero();
    if axis == 2 {
        // A prismatic joint leaves directions as they are.
        let revolute = problem.is_revolute(i) || is_point(f);
        let [w, v] = sides(problem, i, f, revolute)?;
        return Some(zero.one(1, w(Part::Z)).one(-1, v(Part::Z)));
    }
    let [w, v] = sides(problem, i, f, true)?;
    let (c, s) = (Quantity::Cosine(i), Quantity::Sine(i));
    match axis {
        0 => Some(
            zero.one(1, w(Part::X))
                .two(-1, c, v(Part::X))
                .two(1, s, v(Part::Y)),
        ),
        1 => Some(
            zero.one(1, w(Part::Y))
                .two(-1, s, v(Part::X))
                .two(-1, c, v(Part::Y)),
        ),
        _ => None,
    }
}

/// Parts of the feature `f` seen from the joint `i`, before (w) and after (v) its motion, if there
/// are such a feature and such a joint of the kind wanted.
fn sides(
    problem: &Problem,
    i: u8,
    f: Feature,
    revolute: bool,
) -> Option<[impl Fn(Part) -> Quantity + use<>; 2]> {
    let fits = if revolute {
        problem.is_revolute(i)
    } else {
        problem.is_prismatic(i)
    };
    let seen = |place| move |part| Quantity::View(f, place, part);
    (fits && problem.has_feature(f)).then(|| [Place::Before(i), Place::After(i)].map(seen))
}

/// Features of two joints, each seen from the other.
fn pair(problem: &Problem, features: [Feature; 2], i: u8, j: u8, part: Part) -> Option<Polynomial> {
    problem.kind(i)?;
    problem.kind(j)?;
    let sum = Polynomial::zero().one(1, Quantity::View(features[0], Place::After(j), part));
    Some(sum.one(-1, Quantity::View(features[1], Place::After(i), part)))
}

/// The link `number` with its first and second place.
fn link<'a>(problem: &'a Problem, number: u8) -> Option<(&'a Link, Place, Place)> {
    let link = problem.geometry.links.get(usize::from(number))?;
    let first = if number == 0 {
        Place::Base
    } else {
        Place::After(number)
    };
    let second = if usize::from(number) == problem.joints() {
        Place::End
    } else {
        Place::Before(number + 1)
    };
    Some((link, first, second))
}

/// `lambda + a rho` for points, `a` for directions.
fn slack(problem: &Problem, link: &Link, point: bool) -> IBig {
    if point {
        &link.lambda + ceil(&(&link.chord * &problem.rho), &ONE)
    } else {
        link.chord.clone()
    }
}

/// For `far`, `2 |t| lambda + lambda^2 + 2 (lambda + |t| a) rho`. For `near`, the vector from the
/// first place to F is `t + e + y` with `|y| = |w|`, so
/// `w.s = |v - t|^2 - 2 e.(v - t) + e.e = |v - t|^2 - 2 e.y - e.e` and `2 lambda rho + lambda^2` do.
fn squared_slack(problem: &Problem, link: &Link, far: bool) -> IBig {
    let (lambda, rho, length) = (&link.lambda, &problem.rho, &link.length);
    let two = IBig::from(2);
    let near = lambda * lambda + &two * lambda * rho;
    let sum = if far {
        let swung = ceil(&(length * &link.chord * rho), &ONE);
        near + &two * length * lambda + two * swung
    } else {
        near
    };
    ceil(&sum, &ONE)
}
