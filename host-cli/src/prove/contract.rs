//! What each constraint allows of each of its quantities.

use super::interval::{Interval, directions};
use super::network::{AXES, Constraint, Equation, Network, Special, Wanted};
use balk_checker::proof::{Feature, Part, Place, Quantity};

/// Bounds of `D . x` over unit vectors D within an angle of a unit vector u with `u . x` in
/// `nominal`; `square` bounds `x . x`.
fn spread(nominal: Interval, square: Interval, within: f64) -> Interval {
    let length = square.hi.max(0.0).sqrt();
    let (sine, cosine) = within.min(std::f64::consts::PI).sin_cos();
    let upper = |n: f64| {
        let n = n.max(-length);
        if n >= length * cosine {
            return length;
        }
        // The root is steep near zero: what rounds below it is added there.
        let across = length * length * (1.0 + 1e-15) - n * n + 1e-30;
        n * cosine + across.max(0.0).sqrt() * sine
    };
    Interval::new(-upper(-nominal.lo), upper(nominal.hi)).widened(1e-14 * length.max(1.0))
}

impl Network<'_> {
    /// Calls `found` with every quantity a constraint narrows and the set it allows, already
    /// widened by what may have rounded. Stops when `found` says so.
    pub(super) fn narrow(
        &self,
        constraint: &Constraint,
        known: &mut [Interval],
        found: &mut impl FnMut(&mut [Interval], usize, Interval) -> bool,
    ) {
        match constraint {
            Constraint::Equation(equation) => {
                for (k, term) in equation.terms.iter().enumerate() {
                    for x in [Some(term.a), term.b.filter(|b| *b != term.a)]
                        .into_iter()
                        .flatten()
                    {
                        if let Some(allowed) = equation.solve(k, x, known)
                            && !found(known, x, allowed)
                        {
                            return;
                        }
                    }
                }
            }
            Constraint::Special(special) => self.special_rule(*special, known, found),
        }
    }

    /// The set one constraint allows of one quantity, if it says anything.
    pub(super) fn allowed(
        &self,
        constraint: &Constraint,
        x: usize,
        known: &mut [Interval],
    ) -> Option<Interval> {
        if let Constraint::Equation(equation) = constraint {
            let k = equation
                .terms
                .iter()
                .position(|t| t.a == x || t.b == Some(x))?;
            return equation.solve(k, x, known);
        }
        let mut result = None;
        self.narrow(constraint, known, &mut |_, at, allowed| {
            if at == x {
                result = Some(allowed);
            }
            result.is_none()
        });
        result
    }

    fn special_rule(
        &self,
        special: Special,
        known: &mut [Interval],
        found: &mut impl FnMut(&mut [Interval], usize, Interval) -> bool,
    ) {
        let at = |quantity| self.at(quantity);
        let view = |f, place, part| at(Quantity::View(f, place, part));
        match special {
            Special::Cosine(i) => {
                let allowed = known[self.values[i]].cosine().widened(2e-15);
                found(known, at(Quantity::Cosine(i as u8 + 1)), allowed);
            }
            Special::Sine(i) => {
                let allowed = known[self.values[i]].sine().widened(2e-15);
                found(known, at(Quantity::Sine(i as u8 + 1)), allowed);
            }
            Special::AngleOfCircle(i) => {
                let number = i as u8 + 1;
                let (c, s) = (at(Quantity::Cosine(number)), at(Quantity::Sine(number)));
                if let Some(arc) = directions(known[c], known[s]) {
                    let allowed = turned_into(arc, known[self.values[i]]);
                    found(known, self.values[i], allowed);
                }
            }
            Special::Angle(i, f) => {
                let number = i as u8 + 1;
                let plane = |place| {
                    let (x, y) = (view(f, place, Part::X), view(f, place, Part::Y));
                    directions(known[x], known[y])
                };
                if let (Some(to), Some(from)) =
                    (plane(Place::Before(number)), plane(Place::After(number)))
                {
                    let allowed = turned_into(to.minus(from), known[self.values[i]]);
                    found(known, self.values[i], allowed);
                }
            }
            Special::Sector(i, f) => {
                let number = i as u8 + 1;
                let radius = known[at(Quantity::Radius(f, number))];
                let reach = Interval::new(radius.lo.max(0.0).sqrt(), radius.hi.max(0.0).sqrt());
                let value = known[self.values[i]];
                for (from, to, turn) in [
                    (Place::After(number), Place::Before(number), value),
                    (
                        Place::Before(number),
                        Place::After(number),
                        value.scale(-1.0),
                    ),
                ] {
                    let (x, y) = (view(f, from, Part::X), view(f, from, Part::Y));
                    let Some(arc) = directions(known[x], known[y]) else {
                        continue;
                    };
                    let arc = arc.plus(turn).widened(4e-15);
                    if arc.width() >= std::f64::consts::TAU {
                        continue;
                    }
                    let slack = 4e-15 * reach.hi.max(1.0)
                        + 1e-14
                        + if reach.lo < 1e-6 { 1e-8 } else { 0.0 };
                    for (part, range) in [(Part::X, arc.cosine()), (Part::Y, arc.sine())] {
                        let allowed = reach.times(range).widened(slack);
                        if !found(known, view(f, to, part), allowed) {
                            return;
                        }
                    }
                }
            }
            Special::Spread(f) => self.spread(f, known, found),
            Special::SpreadCone(k, f) => {
                let Wanted::Cones(cones) = &self.wanted else {
                    return;
                };
                let within = cones[k].2;
                let number = k as u8 + 1;
                let (along, aim) = (at(Quantity::Along(f, number)), at(Quantity::Aim(f, number)));
                let square = |place| view(f, place, Part::Square);
                let allowed = spread(known[aim], known[square(Place::Difference)], within);
                if !found(known, along, allowed) {
                    return;
                }
                let allowed = spread(known[along], known[square(Place::End)], within);
                found(known, aim, allowed);
            }
            Special::Tilt(k) => {
                let Wanted::Cones(cones) = &self.wanted else {
                    return;
                };
                let (_, base, within) = cones[k];
                for (j, part) in AXES.into_iter().enumerate() {
                    let axis = view(Feature::Cone(k as u8 + 1), Place::Base, part);
                    let allowed = spread(Interval::point(base[j]), Interval::point(1.0), within);
                    if !found(known, axis, allowed) {
                        return;
                    }
                }
            }
        }
    }

    fn spread(
        &self,
        f: Feature,
        known: &mut [Interval],
        found: &mut impl FnMut(&mut [Interval], usize, Interval) -> bool,
    ) {
        let Wanted::Near { columns, within } = &self.wanted else {
            return;
        };
        let views = |place| AXES.map(|part| self.at(Quantity::View(f, place, part)));
        let (difference, end) = (views(Place::Difference), views(Place::End));
        let square = |place| self.at(Quantity::View(f, place, Part::Square));
        let (difference_square, end_square) = (square(Place::Difference), square(Place::End));
        let dot = |row: [f64; 3], at: [usize; 3], known: &[Interval]| {
            (0..3).fold(Interval::point(0.0), |sum, k| {
                sum.plus(known[at[k]].scale(row[k]))
            })
        };
        for m in 0..3 {
            let column = [0, 1, 2].map(|k| columns[(k, m)]);
            let nominal = dot(column, difference, known);
            let allowed = spread(nominal, known[difference_square], *within);
            if !found(known, end[m], allowed) {
                return;
            }
        }
        for k in 0..3 {
            let row = [0, 1, 2].map(|m| columns[(k, m)]);
            let nominal = dot(row, end, known);
            let allowed = spread(nominal, known[end_square], *within);
            if !found(known, difference[k], allowed) {
                return;
            }
        }
    }
}

/// The hull of those angles of `known` that equal one of `arc` up to whole turns.
fn turned_into(arc: Interval, known: Interval) -> Interval {
    use std::f64::consts::TAU;
    let arc = arc.widened(8e-15);
    if arc.width() >= TAU {
        return known;
    }
    // The lowest copy that ends at or above the known lower bound, and the highest that starts at
    // or below the upper one.
    let up = ((known.lo - arc.hi) / TAU).ceil() * TAU;
    let down = ((known.hi - arc.lo) / TAU).floor() * TAU;
    Interval::new(arc.lo + up, arc.hi + down).widened(4e-15)
}

impl Equation {
    /// What the equation leaves for a quantity of its term `k`.
    pub fn solve(&self, k: usize, x: usize, known: &[Interval]) -> Option<Interval> {
        let value = |t: &super::network::Term| {
            let product = match t.b {
                None => known[t.a],
                Some(b) if b == t.a => known[t.a].square(),
                Some(b) => known[t.a].times(known[b]),
            };
            product.scale(t.factor)
        };
        let mut rest = self.range;
        let mut size = rest.magnitude().abs();
        for (other, term) in self.terms.iter().enumerate() {
            if other != k {
                let value = value(term);
                size += value.magnitude().abs().max(value.lo.abs());
                rest = rest.minus(value);
            }
        }
        // More than the roundings of a dozen sums and products.
        let rest = rest.widened(4e-15 * size + 1e-16);
        let term = &self.terms[k];
        match term.b {
            None => Some(if term.factor == 1.0 {
                rest
            } else {
                rest.over(Interval::point(term.factor))?
            }),
            Some(b) if b == term.a => {
                let square = rest.over(Interval::point(term.factor))?;
                Some(rooted(known[x], square))
            }
            Some(b) => {
                let other = if x == term.a { b } else { term.a };
                let cofactor = known[other].scale(term.factor);
                // A tiny divisor says nothing and rounds badly.
                if cofactor.lo.abs().min(cofactor.hi.abs()) < 1e-6 {
                    return None;
                }
                rest.over(cofactor)
            }
        }
    }
}

/// The hull of the values of `known` whose square lies in `square`.
fn rooted(known: Interval, square: Interval) -> Interval {
    if square.hi < 0.0 {
        return Interval::new(f64::INFINITY, f64::NEG_INFINITY);
    }
    let margin = |root: f64| 2e-15 * root.max(1e-3) + if root < 1e-6 { 1e-9 } else { 0.0 };
    let outer = square.hi.sqrt();
    let outer = outer + margin(outer);
    let inner = square.lo.max(0.0).sqrt();
    let inner = (inner - margin(inner)).max(0.0);
    let mut hull = Interval::new(-outer, outer);
    if inner > 0.0 {
        if known.lo > -inner {
            hull.lo = inner;
        }
        if known.hi < inner {
            hull.hi = -inner;
        }
    }
    hull
}
