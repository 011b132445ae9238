//! First-order rows: each feature's place in the base frame as a linear form in small joint
//! deviations, with a rigorous remainder.
//!
//! Let `m` be a posture in the middle of a node and `d_i` the deviation of joint `i`. Replacing one
//! joint after the other by its middle value gives, without any approximation,
//!
//! `f(q) = f(m) + sum_i L_i (sin d_i J - (1 - cos d_i) P) a_i`
//!
//! where `L_i` is the rotation from the base to the frame after joint `i` at `m`, `a_i` the feature
//! seen from there at `q`, `J` a quarter turn about the axis and `P` the projection along it. The
//! node's boxes enclose every `a_i`, so with `s_i = sin d_i` as unknowns the coefficients `L_i J a_i`
//! are known up to the widths of the boxes: what is left over shrinks with the square of the node.
//! (Telescoped mean value form; compare Moore, *Interval Analysis*, 1966.)
//!
//! Rows are integers with outward rounding: the simplex may propose anything over them.

use crate::certificate::{Range, Row, Term};
use crate::fixed::{Arc, Direction, FRACTION_BITS, Interval, ONE, ONE_SQUARED, root_down};
use crate::machine::{Joint, Motion};
use crate::propagate::cell::{JointSpan, Vector};
use crate::propagate::{Chain, MOST_JOINTS, Network, Spans};
use heapless::Vec;

/// Room for the rounding of frames and middle directions: the errors of sixteen products of
/// matrices, each below 15 units in the Frobenius norm, twice.
const ROUNDING: i64 = 512;

/// Bounds beyond this many units (four times one) say nothing and would not fit 64 bits.
const FARTHEST: i64 = 4 * ONE as i64;

type Matrix = [[i32; 3]; 3];

/// One joint at the middle posture.
#[derive(Clone, Copy)]
struct Middle {
    /// From the frame after motion to the base.
    rotation: Matrix,
    /// Sum over the links up to here of what the placements may be off, units.
    noise: i64,
    /// Largest sine of the deviation in size.
    sine: i64,
    /// Largest one minus cosine of the deviation.
    versine: i64,
}

/// The unknowns of the rows and the middle posture of a node.
pub struct Expansion {
    middles: Vec<Middle, MOST_JOINTS>,
    origins: Vec<[i64; 3], { MOST_JOINTS + 1 }>,
    boxes: Vec<Range, MOST_JOINTS>,
}

/// A row with its own terms.
pub struct Linear {
    terms: [Term; MOST_JOINTS],
    count: usize,
    range: Range,
}

impl Linear {
    /// As the kernel and the simplex read it. Coefficients have 30 fraction bits, the range 60.
    pub fn row(&self) -> Row<'_> {
        Row {
            terms: &self.terms[..self.count],
            range: self.range,
        }
    }
}

fn product(a: &Matrix, b: &Matrix) -> Matrix {
    let mut result = [[0; 3]; 3];
    for i in 0..3 {
        for j in 0..3 {
            let sum: i64 = (0..3).map(|k| a[i][k] as i64 * b[k][j] as i64).sum();
            result[i][j] = rounded(sum);
        }
    }
    result
}

/// To the nearest unit.
fn rounded(sum: i64) -> i32 {
    ((sum + (1 << (FRACTION_BITS - 1))) >> FRACTION_BITS) as i32
}

fn apply(a: &Matrix, v: [i32; 3]) -> [i64; 3] {
    [0, 1, 2].map(|i| {
        let sum: i64 = (0..3).map(|k| a[i][k] as i64 * v[k] as i64).sum();
        rounded(sum) as i64
    })
}

fn centre(v: &Vector) -> [i32; 3] {
    v.map(|i| ((i.lo as i64 + i.hi as i64) >> 1) as i32)
}

/// Turns the plane by a direction.
fn about_axis(d: Direction) -> Matrix {
    [[d.x, -d.y, 0], [d.y, d.x, 0], [0, 0, ONE]]
}

impl Expansion {
    /// Expands about the middle of a node that was propagated last.
    pub fn new(network: &Network, spans: &Spans) -> Expansion {
        let chain = network.chain();
        let mut expansion = Expansion {
            middles: Vec::new(),
            origins: Vec::new(),
            boxes: Vec::new(),
        };
        let middles: Vec<Direction, MOST_JOINTS> =
            spans.iter().map(|span| span.arc.middle()).collect();
        for ((span, variable), &middle) in spans.iter().zip(chain.variables).zip(&middles) {
            let range = match variable.motion {
                Motion::Turn => {
                    let sine = span.arc.about(middle).sine();
                    Range::between(sine.lo as i64, sine.hi as i64)
                }
                Motion::Slide => {
                    let middle = half_way(span.length);
                    Range::between(
                        span.length.lo as i64 - middle,
                        span.length.hi as i64 - middle,
                    )
                }
            };
            let _ = expansion.boxes.push(range);
        }
        let mut at: Matrix = [[ONE, 0, 0], [0, ONE, 0], [0, 0, ONE]];
        let mut origin = [0i64; 3];
        let mut noise = 0;
        for (joint, span) in chain.joints.iter().zip(network.joint_spans()) {
            let placement = &joint.placement;
            let step = apply(&at, centre(&placement.origin));
            origin = [0, 1, 2].map(|k| origin[k] + step[k]);
            noise += 2 * placement_noise(placement.turn_slack, &placement.origin);
            at = product(&at, &placement.rotation);
            let variable = &spans[joint.variable as usize];
            let (mut sine, mut versine) = (0, 0);
            match joint.motion {
                Motion::Turn => {
                    let own = middles[joint.variable as usize];
                    let middle = joint.middle(own);
                    at = product(&at, &about_axis(middle));
                    let about = span.arc.about(middle);
                    sine = about.sine().magnitude();
                    versine = ONE as i64 - about.cosine().lo as i64;
                }
                Motion::Slide => {
                    // Spans wider than the limits may put the middle far outside the reach: nothing
                    // wraps, and the noise grows with the length.
                    let multiple = joint.multiple as i64;
                    let length = half_way(variable.length) * multiple + half_way(joint.shift);
                    origin = [0, 1, 2].map(|k| origin[k] + scaled(at[k][2] as i64, length));
                    let extent =
                        variable.length.magnitude() * multiple.abs() + joint.shift.magnitude();
                    noise += joint.shift.width() + 2 * ROUNDING * (extent >> FRACTION_BITS);
                }
            }
            let _ = expansion.origins.push(origin);
            let _ = expansion.middles.push(Middle {
                rotation: at,
                noise,
                sine,
                versine,
            });
        }
        expansion
    }

    /// Bounds of the unknowns, one per variable: 30 fraction bits.
    pub fn boxes(&self) -> &[Range] {
        &self.boxes
    }

    /// The base coordinates of a feature as linear forms.
    ///
    /// `views[i]` is the feature after joint `i + 1`, up to the last joint that moves it.
    pub fn forms(&self, chain: &Chain, views: &[Vector], point: bool) -> [Form; 3] {
        let joints = views.len();
        let fixed = &views[joints - 1];
        let last = &self.middles[joints - 1];
        let at_middle = apply(&last.rotation, centre(fixed));
        // The end box is a constant of the machine, known to within rounding and tolerance.
        let spread: i64 = fixed.iter().map(|v| v.width()).max().unwrap_or(0);
        let noise = ROUNDING + last.noise + 2 * spread;
        let mut forms = [0, 1, 2].map(|k| {
            let origin = if point {
                self.origins[joints - 1][k]
            } else {
                0
            };
            let value = at_middle[k] + origin;
            Form {
                coefficients: [0; MOST_JOINTS],
                lo: value - noise,
                hi: value + noise,
            }
        });
        for ((joint, view), middle) in chain.joints.iter().zip(views).zip(&self.middles) {
            let variable = joint.variable as usize;
            if joint.motion == Motion::Slide {
                if point {
                    for (form, row) in forms.iter_mut().zip(&middle.rotation) {
                        form.coefficients[variable] += row[2] as i64 * joint.multiple as i64;
                    }
                }
                continue;
            }
            let [x, y, _] = view;
            let (cx, cy) = (half_way(*x), half_way(*y));
            let (rx, ry) = ((x.width() + 1) / 2 + 1, (y.width() + 1) / 2 + 1);
            let own = self.boxes[variable];
            let bent = joint.bend(
                own.lower
                    .zip(own.upper)
                    .map_or(ONE as i64, |(lo, hi)| hi.max(-lo)),
            );
            for (form, &[l0, l1, _]) in forms.iter_mut().zip(&middle.rotation) {
                // L J a = -l0 a_y + l1 a_x, L P a = l0 a_x + l1 a_y.
                let along = rounded(l1 as i64 * cx - l0 as i64 * cy) as i64;
                form.coefficients[variable] += along * joint.multiple as i64;
                let left = ((l1.unsigned_abs() as i64 * rx + l0.unsigned_abs() as i64 * ry)
                    >> FRACTION_BITS)
                    + 2;
                // What the coefficient may be off, times the sine.
                let error = ((left * middle.sine) >> FRACTION_BITS) + scaled(along.abs(), bent) + 2;
                // Minus one minus cosine, which may be up to two, times what lies across.
                let across = x.scale(l0).plus(y.scale(l1)).round(0);
                let half = Interval {
                    lo: 0,
                    hi: ((middle.versine + 1) >> 1) as i32,
                };
                let bend = across.times(half).double();
                form.lo += ((-bend.hi) >> FRACTION_BITS) - error;
                form.hi += -(bend.lo >> FRACTION_BITS) + error;
            }
        }
        forms
    }
}

/// A quantity as a linear form in the unknowns with a remainder: 30 fraction bits.
#[derive(Clone, Copy)]
pub struct Form {
    coefficients: [i64; MOST_JOINTS],
    /// The quantity minus the linear part is at least this ...
    lo: i64,
    /// ... and at most this.
    hi: i64,
}

impl Form {
    /// Nothing.
    pub const ZERO: Form = Form {
        coefficients: [0; MOST_JOINTS],
        lo: 0,
        hi: 0,
    };

    /// Adds a form times a number with 30 fraction bits that is known to within `slack` units.
    /// The form's value is at most one in size.
    pub fn add(&mut self, other: &Form, factor: i64, slack: i64) {
        for (own, c) in self.coefficients.iter_mut().zip(&other.coefficients) {
            *own += scaled(*c, factor);
        }
        // Remainders of wide nodes may be many times one.
        let product = |bound: i64| bound as i128 * factor as i128;
        let (a, b) = (product(other.lo), product(other.hi));
        // One unit of rounding per coefficient, whose unknown is at most one in size.
        let slack = slack + MOST_JOINTS as i64;
        self.lo += (a.min(b) >> FRACTION_BITS) as i64 - slack;
        self.hi += -((-a.max(b)) >> FRACTION_BITS) as i64 + slack;
    }

    /// The row that says the quantity lies between the bounds (30 fraction bits).
    pub fn between(&self, least: Option<i64>, most: Option<i64>) -> Linear {
        let lo = least.map(|l| l - self.hi).filter(|l| *l > -FARTHEST);
        let hi = most.map(|h| h - self.lo).filter(|h| *h < FARTHEST);
        let mut linear = Linear {
            terms: [Term {
                unknown: 0,
                coefficient: 0,
            }; MOST_JOINTS],
            count: 0,
            range: Range {
                lower: lo.map(|l| l.min(FARTHEST) << FRACTION_BITS),
                upper: hi.map(|h| h.max(-FARTHEST) << FRACTION_BITS),
            },
        };
        for (unknown, &coefficient) in self.coefficients.iter().enumerate() {
            let Ok(coefficient) = i32::try_from(coefficient) else {
                linear.range = Range::FREE;
                continue;
            };
            if coefficient != 0 {
                linear.terms[linear.count] = Term {
                    unknown: unknown as u16,
                    coefficient,
                };
                linear.count += 1;
            }
        }
        linear
    }

    /// The quantity where every unknown is zero, at the middle posture.
    pub fn middle(&self) -> i64 {
        (self.lo + self.hi) >> 1
    }
}

impl Joint {
    /// The middle angle of the joint from that of its variable.
    fn middle(&self, own: Direction) -> Direction {
        if self.is_plain() {
            return own;
        }
        let step = if self.multiple < 0 {
            own.conjugate()
        } else {
            own
        };
        (0..self.multiple.unsigned_abs())
            .fold(self.turn.middle(), |sum, _| sum.turned(step))
            .normalised()
    }

    /// Bound of `|sin(e) - k sin(d)|`, where the joint deviates by `e` from its middle when its
    /// variable deviates by `d`; `sine` bounds `|sin(d)|`, and `d` is at most a quarter turn
    /// unless that is one.
    fn bend(&self, sine: i64) -> i64 {
        if self.is_plain() {
            return 0;
        }
        let one = ONE as i64;
        let cube = |x: i64| scaled(scaled(x, x), x) + 3;
        let times = self.multiple.unsigned_abs() as i64;
        // |sin(k d) - k sin d| <= |k d|^3 / 6 + k |d|^3 / 6, and d <= (pi / 2) sin d.
        let far = times * sine;
        let bent = match times {
            0 | 1 => 0,
            _ if far < one => cube(far),
            _ => one + far,
        };
        // e is k d but for the arc of the angle at variable zero and the rounding of middles:
        // sines of angles a apart differ by 2 sin(a / 2) <= sin a + (sin a)^3 / 4.
        let loose = self.turn.about(self.turn.middle()).sine().magnitude() + 16 + 4 * times;
        bent + if loose < one * 9 / 10 {
            loose + cube(loose) / 4 + 1
        } else {
            2 * one
        }
    }
}

/// Product with a number of 30 fraction bits, rounded down. Multiples of wide nodes need more than
/// 64 bits on the way.
fn scaled(a: i64, b: i64) -> i64 {
    ((a as i128 * b as i128) >> FRACTION_BITS) as i64
}

fn half_way(i: Interval) -> i64 {
    (i.lo as i64 + i.hi as i64) >> 1
}

/// How far a placement may move a point, beyond its centre, in any component.
fn placement_noise(turn_slack: i32, origin: &Vector) -> i64 {
    turn_slack as i64 + origin.iter().map(|o| o.width()).max().unwrap_or(0)
}

impl JointSpan {
    /// Keeps the deviations from the middle whose sine (or length) lies in the range.
    ///
    /// Leaves a span of more than half a turn as it is: a sine has two angles there.
    pub fn keep(&mut self, range: Range, motion: Motion) {
        let (Some(lo), Some(hi)) = (range.lower, range.upper) else {
            return;
        };
        if motion == Motion::Slide {
            let middle = half_way(self.length);
            self.length = Interval::clamped(middle + lo, middle + hi);
        } else if !self.arc.full && !self.arc.is_wide() {
            let middle = self.arc.middle();
            let end = |sine: i64| {
                let cosine = root_down(ONE_SQUARED - sine * sine);
                middle.turned(Direction {
                    x: cosine as i32,
                    y: sine as i32,
                })
            };
            let kept = Arc::new(end(lo), end(hi)).normalised();
            let _ = self.meet_arc(kept);
        }
    }
}

impl Arc {
    /// The arc as seen from a direction inside it.
    pub fn about(self, middle: Direction) -> Arc {
        if self.is_nearly_full() {
            return Arc::FULL;
        }
        let back = middle.conjugate();
        Arc::new(self.lo.turned(back), self.hi.turned(back)).normalised()
    }
}
