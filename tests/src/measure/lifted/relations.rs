//! The relations between the lifted unknowns, and the rows that enclose them at a point.

use super::envelope::{Line, chord, product, secant, sphere_tangent, tangent};
use super::form::Form;
use super::hull;
use super::program::{Families, LEAST, Pool};
use super::unknowns::Lifted;
use balk_core::fixed::{FRACTION_BITS, Interval, ONE, ONE_SQUARED};
use balk_core::machine::Motion;
use balk_core::propagate::cell::Vector;
use balk_core::propagate::{Feature, Goal};

/// One factor of a product.
struct Factor {
    form: Form,
    bounds: Interval,
    at: i32,
}

impl Factor {
    fn new(form: Form, bounds: Interval, point: &[i32]) -> Factor {
        let at = (form.at(point) >> FRACTION_BITS).clamp(-(ONE as i64), ONE as i64) as i32;
        Factor { form, bounds, at }
    }
}

/// The most violated rows of some families at a point (30 fraction bits).
pub fn violated(lifted: &Lifted, point: &[i32], families: Families) -> Pool {
    let mut search = Search {
        lifted,
        families,
        point,
        pool: Pool::default(),
    };
    search.run();
    search.pool
}

/// A pass over all relations at one point.
struct Search<'s, 'n, 'a> {
    lifted: &'s Lifted<'n, 'a>,
    families: Families,
    point: &'s [i32],
    pool: Pool,
}

impl Search<'_, '_, '_> {
    fn run(&mut self) {
        let lifted = self.lifted;
        let count = lifted.joints;
        if self.families.has(Families::ARCS) {
            (1..=count).for_each(|i| self.arc(i));
        }
        if self.families.has(Families::LINEAR) {
            self.turn_limits();
        }
        for slot in 0..lifted.features().len() {
            for i in 1..=count + 1 {
                self.joint(slot, i);
            }
            if self.families.has(Families::SQUARES) {
                self.squares(slot);
            }
            if self.families.has(Families::CLOSING) {
                self.closing(slot);
            }
        }
        if matches!(lifted.network.goal(), Goal::Near { .. }) && lifted.features().len() > 3 {
            (0..=count).for_each(|i| self.frame(i));
        }
    }

    fn row(&mut self, form: &Form, least: Option<i64>, most: Option<i64>) {
        self.pool.offer(form.between(least, most), self.point);
    }

    fn factor(&self, form: &Form, bounds: Interval) -> Factor {
        Factor::new(form.clone(), bounds, self.point)
    }

    /// The rows of `linear + sum of signed products = 0`.
    fn relation(&mut self, linear: &Form, products: &[(i64, &Factor, &Factor)]) {
        let start = linear.at(self.point);
        for above in [true, false] {
            let planes: Vec<_> = products
                .iter()
                .map(|&(sign, x, y)| {
                    let plane = product(x.bounds, y.bounds, (x.at, y.at), above == (sign > 0));
                    (sign, plane, x, y)
                })
                .collect();
            let value: i128 = planes
                .iter()
                .map(|(sign, plane, x, y)| *sign as i128 * plane.at(x.at, y.at) as i128)
                .sum::<i128>()
                + start as i128;
            let miss = if above { -value } else { value };
            if miss >> FRACTION_BITS < (LEAST >> 8) as i128 {
                continue;
            }
            let mut sum = linear.clone();
            for (sign, plane, x, y) in planes {
                sum.add(&x.form, sign * plane.of_x as i64);
                sum.add(&y.form, sign * plane.of_y as i64);
                sum.rest(sign * plane.constant, sign * plane.constant);
            }
            if above {
                self.row(&sum, Some(0), None);
            } else {
                self.row(&sum, None, Some(0));
            }
        }
    }

    /// What a joint (or the link to the tip) says of a feature.
    fn joint(&mut self, slot: usize, i: usize) {
        let lifted = self.lifted;
        let feature = lifted.features()[slot];
        let before = lifted.before(slot, i);
        let (before_box, after_box) = lifted.network.view(feature, i);
        if self.families.has(Families::LINEAR) {
            for (form, bound) in before.iter().zip(before_box) {
                let bound = bound.widen();
                self.row(form, Some(bound.lo), Some(bound.hi));
            }
        }
        if i > lifted.joints {
            return;
        }
        let after = lifted.after(slot, i);
        let [c, s] = [0, 1].map(|k| Form::unknown(2 * (i - 1) + k));
        let turns = lifted.network.chain().joints[i - 1].motion == Motion::Turn;
        if self.families.has(Families::LINEAR) {
            for k in if turns { 2..3 } else { 0..3 } {
                let mut same = before[k].clone();
                same.add(&after[k], -(ONE as i64));
                if !turns && k == 2 && lifted.is_point(slot) {
                    same.add(&c, -(ONE as i64));
                }
                self.row(&same, Some(0), Some(0));
            }
        }
        if !turns {
            return;
        }
        let span = lifted.network.joint_spans()[i - 1];
        let (cosine, sine) = (self.factor(&c, span.cosine), self.factor(&s, span.sine));
        let b = [0, 1].map(|k| self.factor(&before[k], before_box[k]));
        let a = [0, 1].map(|k| self.factor(&after[k], after_box[k]));
        if self.families.has(Families::ROTATION) {
            self.relation(&before[0], &[(-1, &cosine, &a[0]), (1, &sine, &a[1])]);
            self.relation(&before[1], &[(-1, &sine, &a[0]), (-1, &cosine, &a[1])]);
            self.relation(&after[0], &[(-1, &cosine, &b[0]), (-1, &sine, &b[1])]);
            self.relation(&after[1], &[(1, &sine, &b[0]), (-1, &cosine, &b[1])]);
        }
        if self.families.has(Families::DOT_CROSS) {
            self.radius(&[(1, &b[0], &a[0]), (1, &b[1], &a[1])], &cosine, &a);
            self.radius(&[(1, &b[1], &a[0]), (-1, &b[0], &a[1])], &sine, &a);
        }
    }

    /// The rows of `sum of signed products = turn * (x^2 + y^2)`.
    fn radius(
        &mut self,
        products: &[(i64, &Factor, &Factor); 2],
        turn: &Factor,
        own: &[Factor; 2],
    ) {
        let square = own[0].bounds.square().plus(own[1].bounds.square()).round(0);
        let at = own
            .iter()
            .map(|x| (x.at as i64 * x.at as i64) >> FRACTION_BITS)
            .sum::<i64>()
            .min(ONE as i64) as i32;
        for above in [true, false] {
            let mut sum = Form::default();
            for &(sign, x, y) in products {
                let plane = product(x.bounds, y.bounds, (x.at, y.at), above == (sign > 0));
                sum.add(&x.form, sign * plane.of_x as i64);
                sum.add(&y.form, sign * plane.of_y as i64);
                sum.rest(sign * plane.constant, sign * plane.constant);
            }
            let plane = product(turn.bounds, square, (turn.at, at), !above);
            sum.add(&turn.form, -(plane.of_x as i64));
            sum.rest(-plane.constant, -plane.constant);
            let weight = -(plane.of_y as i64);
            for x in own {
                let mut estimate = Form::default();
                add_line(&mut estimate, x, square_line(x, above == (weight > 0)));
                sum.add(&estimate, weight);
            }
            if above {
                self.row(&sum, Some(0), None);
            } else {
                self.row(&sum, None, Some(0));
            }
        }
    }

    /// Chord of the arc, secants and tangent of the circle.
    fn arc(&mut self, i: usize) {
        if self.lifted.network.chain().joints[i - 1].motion == Motion::Slide {
            return;
        }
        let span = &self.lifted.network.joint_spans()[i - 1];
        let pair = [0, 1].map(|k| Form::unknown(2 * (i - 1) + k));
        if let Some((middle, least)) = chord(span.arc) {
            let mut sum = Form::default();
            sum.add(&pair[0], middle.x as i64);
            sum.add(&pair[1], middle.y as i64);
            self.row(&sum, Some(least), None);
        }
        let pair = [(&pair[0], span.cosine), (&pair[1], span.sine)].map(|(f, b)| self.factor(f, b));
        self.sphere(&pair);
        self.secants(&pair, &Form::default(), ONE_SQUARED);
    }

    /// The row of `sum of squares >= form + least` with a secant for every square.
    fn secants(&mut self, own: &[Factor], square: &Form, least: i64) {
        let mut sum = Form::default();
        for x in own {
            add_line(&mut sum, x, secant(x.bounds));
        }
        sum.add(square, -(ONE as i64));
        self.row(&sum, Some(least), None);
    }

    /// The row of `sum of squares <= form` with a tangent for every square.
    fn tangents(&mut self, own: &[Factor], square: &Form) {
        let mut sum = Form::default();
        for x in own {
            add_line(&mut sum, x, tangent(x.at));
        }
        sum.add(square, -(ONE as i64));
        self.row(&sum, None, Some(0));
    }

    /// The tangent of the unit sphere in the direction of a point.
    fn sphere<const N: usize>(&mut self, own: &[Factor; N]) {
        let at = own.each_ref().map(|x| x.at);
        let mut sum = Form::default();
        for x in own {
            sum.add(&x.form, x.at as i64);
        }
        self.row(&sum, None, Some(sphere_tangent(&at)));
    }

    /// Length of a feature's view after every joint.
    fn squares(&mut self, slot: usize) {
        let lifted = self.lifted;
        for i in 0..=lifted.joints {
            let bounds = lifted.network.view(lifted.features()[slot], i).1;
            let forms = lifted.after(slot, i);
            let own = [0, 1, 2].map(|k| self.factor(&forms[k], bounds[k]));
            if lifted.is_point(slot) {
                if let Some(square) = lifted.square(slot, i) {
                    self.secants(&own, &square, 0);
                    self.tangents(&own, &square);
                }
            } else {
                self.sphere(&own);
                self.secants(&own, &Form::default(), ONE_SQUARED);
            }
        }
    }

    /// Trace of the turn from the wanted orientation, cosine from the middle of a cone.
    fn turn_limits(&mut self) {
        let lifted = self.lifted;
        let slot_of = |k: usize| {
            lifted
                .features()
                .iter()
                .position(|&f| lifted.network.features()[f] == Feature::TipAxis(k as u8))
        };
        let weighted = |sum: &mut Form, k: usize, wanted: &Vector| {
            let Some(slot) = slot_of(k) else { return false };
            for (form, wanted) in lifted.after(slot, 0).iter().zip(wanted) {
                sum.add_between(form, *wanted);
            }
            true
        };
        match lifted.network.goal() {
            Goal::Near { wanted, least, .. } => {
                let mut sum = Form::default();
                if wanted
                    .iter()
                    .enumerate()
                    .all(|(k, w)| weighted(&mut sum, k, w))
                {
                    self.row(&sum, Some(least.lo), None);
                }
            }
            Goal::Axes { cones, .. } => {
                for (k, cone) in cones.iter().enumerate() {
                    let mut sum = Form::default();
                    if weighted(&mut sum, k, &cone.wanted) {
                        self.row(&sum, Some(cone.least.lo), None);
                    }
                }
            }
        }
    }

    /// The closing relation of a joint's origin or axis, both ways.
    fn closing(&mut self, slot: usize) {
        let lifted = self.lifted;
        let network = lifted.network;
        let joint = matches!(
            network.features()[lifted.features()[slot]],
            Feature::Origin(_) | Feature::Axis(_)
        );
        if !joint || !matches!(network.goal(), Goal::Near { .. }) {
            return;
        }
        // The tip's origin and axes come first in every network.
        let point = lifted.is_point(slot);
        let local_form = lifted.before(slot, lifted.joints + 1);
        let local_box = network.view(lifted.features()[slot], lifted.joints + 1).0;
        let local = [0, 1, 2].map(|k| self.factor(&local_form[k], local_box[k]));
        let base_form = lifted.after(slot, 0);
        let base_box = network.view(lifted.features()[slot], 0).1;
        let tip_form = lifted.after(0, 0);
        let tip_box = network.view(lifted.features()[0], 0).1;
        let relative = [0, 1, 2].map(|k| {
            let mut form = base_form[k].clone();
            let mut bounds = base_box[k];
            if point {
                form.add(&tip_form[k], -(ONE as i64));
                bounds = bounds.less(tip_box[k]);
            }
            self.factor(&form, bounds)
        });
        let axes = [0, 1, 2].map(|k| {
            let bounds = network.view(lifted.features()[1 + k], 0).1;
            let forms = lifted.after(1 + k, 0);
            [0, 1, 2].map(|j| self.factor(&forms[j], bounds[j]))
        });
        for j in 0..3 {
            let products = [0, 1, 2].map(|k| (-1, &axes[k][j], &local[k]));
            self.relation(&relative[j].form, &products);
            let products = [0, 1, 2].map(|k| (-1, &axes[j][k], &relative[k]));
            self.relation(&local[j].form, &products);
        }
    }

    /// The tip's three axes seen after joint `i`: their rows' lengths, right angles, and the hull.
    fn frame(&mut self, i: usize) {
        let lifted = self.lifted;
        let axes = [1, 2, 3].map(|slot| {
            let bounds = lifted.network.view(lifted.features()[slot], i).1;
            let forms = lifted.after(slot, i);
            [0, 1, 2].map(|j| self.factor(&forms[j], bounds[j]))
        });
        if self.families.has(Families::ORTHOGONAL) {
            for k in 0..3 {
                let [x, y, z] = [k, (k + 1) % 3, (k + 2) % 3];
                let products = [0, 1, 2].map(|j| (1, &axes[x][j], &axes[y][j]));
                self.relation(&Form::default(), &products);
                let products = [0, 1, 2].map(|j| (1, &axes[j][x], &axes[j][y]));
                self.relation(&Form::default(), &products);
                for j in 0..3 {
                    let [m, n] = [(j + 1) % 3, (j + 2) % 3];
                    let cross = [
                        (-1, &axes[x][m], &axes[y][n]),
                        (1, &axes[x][n], &axes[y][m]),
                    ];
                    self.relation(&axes[z][j].form, &cross);
                }
            }
        }
        if self.families.has(Families::HULL) {
            let unit = |x: &Factor| x.at as f32 / ONE as f32;
            let matrix = [0, 1, 2].map(|j| [0, 1, 2].map(|k| unit(&axes[k][j])));
            let (norm, rotation) = hull::rotation(hull::worst(&matrix));
            let mut trace = Form::default();
            for (j, row) in rotation.iter().enumerate() {
                for (k, &entry) in row.iter().enumerate() {
                    trace.add(&axes[k][j].form, entry as i64);
                }
            }
            self.row(&trace, Some(-((norm as i64) << FRACTION_BITS)), None);
        }
    }
}

/// A line above or below the square of a factor.
fn square_line(x: &Factor, above: bool) -> Line {
    if above {
        secant(x.bounds)
    } else {
        tangent(x.at)
    }
}

/// Adds a line of a factor.
fn add_line(sum: &mut Form, x: &Factor, line: Line) {
    sum.add(&x.form, line.slope);
    sum.rest(line.constant, line.constant);
}
