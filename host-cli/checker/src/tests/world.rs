//! A random machine in a random posture: what every quantity truly is, in floating point.

use core::fmt::Write;

use crate::proof::{Feature, Frame, Part, Place, Quantity};

pub type V = [f64; 3];
pub type M = [[f64; 3]; 3];

/// Pseudo-random numbers: xorshift (Marsaglia 2003).
pub struct Dice(pub u64);

impl Dice {
    pub fn below(&mut self, limit: u64) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) % limit
    }

    pub fn between(&mut self, lo: f64, hi: f64) -> f64 {
        lo + (hi - lo) * self.below(1 << 40) as f64 / (1u64 << 40) as f64
    }

    fn vector(&mut self, size: f64) -> V {
        [0; 3].map(|_: i32| self.between(-size, size))
    }

    /// Rounded to four places, often zero.
    fn decimals(&mut self, size: f64) -> V {
        self.vector(size).map(|x| {
            if self.below(3) == 0 {
                0.0
            } else {
                (x * 1e4).round() / 1e4
            }
        })
    }
}

pub fn dot(a: V, b: V) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

fn add(a: V, b: V, times: f64) -> V {
    [0, 1, 2].map(|i| a[i] + times * b[i])
}

fn cross(a: V, b: V) -> V {
    [0, 1, 2].map(|i| {
        let (j, k) = ((i + 1) % 3, (i + 2) % 3);
        a[j] * b[k] - a[k] * b[j]
    })
}

fn unit(a: V) -> V {
    let norm = dot(a, a).sqrt();
    a.map(|x| x / norm)
}

pub fn apply(m: M, v: V) -> V {
    m.map(|row| dot(row, v))
}

pub fn transpose(m: M) -> M {
    [0, 1, 2].map(|i| [0, 1, 2].map(|j| m[j][i]))
}

pub fn multiply(a: M, b: M) -> M {
    let columns = transpose(b);
    a.map(|row| columns.map(|column| dot(row, column)))
}

/// Rotation about a unit axis: Rodrigues' formula.
pub fn about(axis: V, angle: f64) -> M {
    let (s, c) = angle.sin_cos();
    let columns = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]].map(|e| {
        let turned = add(e.map(|x| x * c), cross(axis, e), s);
        add(turned, axis, dot(axis, e) * (1.0 - c))
    });
    transpose(columns)
}

const X: V = [1.0, 0.0, 0.0];
const Y: V = [0.0, 1.0, 0.0];
const Z: V = [0.0, 0.0, 1.0];

fn of_quaternion(q: [f64; 4]) -> M {
    let axis = [q[1], q[2], q[3]];
    let sine = dot(axis, axis).sqrt();
    if sine == 0.0 {
        about(Z, 0.0)
    } else {
        about(unit(axis), 2.0 * sine.atan2(q[0]))
    }
}

/// A random machine of `joints` joints, its file, and one posture of one machine within tolerances.
pub struct World {
    pub machine: String,
    pub target: String,
    pub tip: &'static str,
    pub frames: Vec<Frame>,
    /// Of every moving joint.
    pub values: Vec<f64>,
    /// Of every variable, and its limits.
    pub variables: Vec<(f64, f64, f64)>,
    places: Vec<(Place, M, V)>,
    cones: Vec<(V, V)>,
}

impl World {
    fn seen(&self, place: Place) -> (M, V) {
        let found = self.places.iter().find(|known| known.0 == place);
        let (_, turn, at) = found.expect("a place of the machine");
        (*turn, *at)
    }

    /// Origin of the second place of the link `number`, seen from the first, of `joints` joints.
    pub fn shift(&self, number: usize, joints: usize) -> V {
        let first = match number {
            0 => Place::Base,
            number => Place::After(number as u8),
        };
        let second = if number == joints {
            Place::End
        } else {
            Place::Before(number as u8 + 1)
        };
        let (turn, at) = self.seen(first);
        apply(transpose(turn), add(self.seen(second).1, at, -1.0))
    }

    fn feature(&self, feature: Feature) -> (V, bool) {
        let (turn, at) = self.seen(Place::End);
        let column = |m: M, i: usize| transpose(m)[i];
        match feature {
            Feature::Tip => (at, true),
            Feature::Origin(i) => (self.seen(Place::After(i)).1, true),
            Feature::Axis(i) => (column(self.seen(Place::After(i)).0, 2), false),
            Feature::TipAxis(i) => (column(turn, usize::from(i)), false),
            Feature::Cone(k) => (apply(turn, self.cones[usize::from(k) - 1].0), false),
        }
    }

    fn view(&self, feature: Feature, place: Place) -> V {
        let (vector, point) = self.feature(feature);
        let (turn, at) = match place {
            Place::Difference => (about(Z, 0.0), self.seen(Place::End).1),
            place => self.seen(place),
        };
        apply(
            transpose(turn),
            if point { add(vector, at, -1.0) } else { vector },
        )
    }

    /// What `quantity` truly is.
    pub fn truth(&self, quantity: Quantity) -> f64 {
        let at = |i: u8| usize::from(i) - 1;
        match quantity {
            Quantity::Variable(i) => self.variables[at(i)].0,
            Quantity::Value(i) => self.values[at(i)],
            Quantity::Cosine(i) => self.values[at(i)].cos(),
            Quantity::Sine(i) => self.values[at(i)].sin(),
            Quantity::View(feature, place, part) => {
                let v = self.view(feature, place);
                match part {
                    Part::X => v[0],
                    Part::Y => v[1],
                    Part::Z => v[2],
                    Part::Square => dot(v, v),
                }
            }
            Quantity::Radius(feature, i) => {
                let v = self.view(feature, Place::After(i));
                v[0] * v[0] + v[1] * v[1]
            }
            Quantity::Along(feature, k) => dot(self.view(feature, Place::End), self.cones[at(k)].0),
            Quantity::Aim(feature, k) => {
                dot(self.view(feature, Place::Difference), self.cones[at(k)].1)
            }
        }
    }
}

struct Build {
    text: String,
    turn: M,
    at: V,
    world: World,
    loose: bool,
    dice: Dice,
}

impl Build {
    /// A frame as the file writes it and as it truly is, within tolerances.
    fn step(&mut self, turn: M, by: V, tolerance: (f64, f64)) {
        let error = [0; 3].map(|_: i32| self.dice.between(-tolerance.0, tolerance.0));
        let axis = unit(self.dice.vector(1.0));
        let tilt = about(axis, self.dice.between(-tolerance.1, tolerance.1));
        self.at = add(self.at, apply(self.turn, add(by, error, 1.0)), 1.0);
        self.turn = multiply(self.turn, multiply(tilt, turn));
    }

    fn tolerance(&mut self) -> (f64, f64) {
        if self.loose && self.dice.below(2) == 0 {
            [(0.002, 0.01), (0.002, 0.0), (0.0, 0.01)][self.dice.below(3) as usize]
        } else {
            (0.0, 0.0)
        }
    }

    /// Place before, motion by `value`, place after.
    fn motion(&mut self, axis: V, revolute: bool, value: f64) {
        let number = self.world.frames.len() as u8 + 1;
        let axis = unit(axis);
        // Some rotation that takes z to the axis, rounded to a quaternion of whole numbers.
        let spin = about(Z, self.dice.between(-3.0, 3.0));
        let side = unit(cross(axis, if axis[0].abs() < 0.9 { X } else { Y }));
        let near = multiply(transpose([side, cross(axis, side), axis]), spin);
        let quaternion = to_quaternion(near);
        let exact = axis == Z && self.dice.below(2) == 0;
        let whole = if exact {
            [1, 0, 0, 0]
        } else {
            quaternion.map(|q| (q * 4e6).round() as i64)
        };
        let shift = self.dice.below(2) as i64 * 123_456_789_012;
        self.world.frames.push(Frame { turn: whole, shift });
        let mut seat = of_quaternion(whole.map(|q| q as f64));
        let third = transpose(seat)[2];
        let off = cross(third, axis);
        let sine = dot(off, off).sqrt();
        if sine > 0.0 {
            seat = multiply(about(unit(off), sine.asin()), seat);
        }
        let at = add(self.at, apply(self.turn, axis), shift as f64 * 1e-12);
        let before = multiply(self.turn, seat);
        self.world.places.push((Place::Before(number), before, at));
        let (mut after, mut end) = (before, at);
        if revolute {
            after = multiply(before, about(Z, value));
            self.turn = multiply(self.turn, about(axis, value));
        } else {
            let by = apply(self.turn, axis);
            end = add(at, by, value);
            self.at = add(self.at, by, value);
        }
        self.world.places.push((Place::After(number), after, end));
        self.world.values.push(value);
    }

    fn line(&mut self, line: &str) {
        writeln!(self.text, "{line}").expect("a string");
    }
}

fn to_quaternion(m: M) -> [f64; 4] {
    // The largest column of 4 q q' (Shepperd 1978).
    let trace = m[0][0] + m[1][1] + m[2][2];
    let columns = [
        [
            1.0 + trace,
            m[2][1] - m[1][2],
            m[0][2] - m[2][0],
            m[1][0] - m[0][1],
        ],
        [
            m[2][1] - m[1][2],
            1.0 + 2.0 * m[0][0] - trace,
            m[0][1] + m[1][0],
            m[0][2] + m[2][0],
        ],
        [
            m[0][2] - m[2][0],
            m[0][1] + m[1][0],
            1.0 + 2.0 * m[1][1] - trace,
            m[1][2] + m[2][1],
        ],
        [
            m[1][0] - m[0][1],
            m[0][2] + m[2][0],
            m[1][2] + m[2][1],
            1.0 + 2.0 * m[2][2] - trace,
        ],
    ];
    let best = (0..4).max_by(|a, b| columns[*a][*a].total_cmp(&columns[*b][*b]));
    let column = columns[best.expect("four")];
    let norm = column.iter().map(|x| x * x).sum::<f64>().sqrt();
    column.map(|x| x / norm)
}

/// Whether the machine of the world `seed` has tolerances.
pub fn is_loose(seed: u64) -> bool {
    seed / 4 % 2 == 1
}

/// The world number `seed`: joints, a table in either convention, tolerances, all kinds of targets.
pub fn world(seed: u64) -> World {
    let dice = Dice(seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1);
    let world = World {
        machine: String::new(),
        target: String::new(),
        tip: "flange",
        frames: Vec::new(),
        values: Vec::new(),
        variables: Vec::new(),
        places: vec![(Place::Base, about(Z, 0.0), [0.0; 3])],
        cones: Vec::new(),
    };
    let mut build = Build {
        text: String::new(),
        turn: about(Z, 0.0),
        at: [0.0; 3],
        world,
        loose: is_loose(seed),
        dice,
    };
    match seed % 5 {
        0 => rows(&mut build, "standard"),
        1 => rows(&mut build, "modified"),
        _ => joints(&mut build),
    }
    build.world.places.push((Place::End, build.turn, build.at));
    target(&mut build, seed);
    build.world.machine = core::mem::take(&mut build.text);
    build.world
}

fn tolerance_field(tolerance: (f64, f64)) -> String {
    format!(
        "tolerance = {{ xyz = {}, angle = {} }}",
        tolerance.0, tolerance.1
    )
}

/// A value between random limits.
fn limited(build: &mut Build, revolute: bool) -> (f64, f64, f64) {
    let size = if revolute { 4.0 } else { 0.5 };
    let lo = (build.dice.between(-size, size) * 1e3).round() / 1e3;
    let hi = lo + (build.dice.between(0.01, size) * 1e3).round() / 1e3;
    (build.dice.between(lo, hi), lo, hi)
}

fn rows(build: &mut Build, convention: &str) {
    build.line(&format!(
        "[dh]\nconvention = \"{convention}\"\nangles = \"radians\"\nrows = ["
    ));
    let mut above = (0.0, 0.0);
    for _ in 0..2 + build.dice.below(4) {
        let [a, alpha, d] = build.dice.decimals(0.6);
        let theta = build.dice.decimals(3.0)[0];
        let revolute = build.dice.below(4) != 0;
        let (value, lo, hi) = limited(build, revolute);
        let kind = if revolute { "revolute" } else { "prismatic" };
        let tolerance = build.tolerance();
        build.line(&format!(
            "{{ a = {a}, alpha = {alpha}, d = {d}, theta = {theta}, kind = \"{kind}\", \
             limits = [{lo}, {hi}], {} }},",
            tolerance_field(tolerance)
        ));
        let (first, twist) = if convention == "modified" {
            (a, alpha)
        } else {
            above
        };
        let turn = multiply(about(X, twist), about(Z, theta));
        let by = add([first, 0.0, 0.0], apply(turn, Z), d);
        build.step(turn, by, tolerance);
        build.motion(Z, revolute, value);
        build.world.variables.push((value, lo, hi));
        above = (a, alpha);
    }
    build.line("]");
    if convention == "standard" {
        build.step(about(X, above.1), [above.0, 0.0, 0.0], (0.0, 0.0));
    }
}

fn joints(build: &mut Build) {
    let mut kinds = Vec::new();
    for place in 0..3 + build.dice.below(4) {
        let kind = ["revolute", "revolute", "prismatic", "fixed"][build.dice.below(4) as usize];
        let xyz = build.dice.decimals(0.5);
        let degrees = build.dice.below(2) == 0;
        let rpy = if degrees {
            [0; 3].map(|_: i32| build.dice.below(8) as f64 * 45.0 - 180.0)
        } else {
            build.dice.decimals(3.0)
        };
        let mut axis = build.dice.decimals(1.0);
        if axis == [0.0; 3] || build.dice.below(2) == 0 {
            axis = [X, Y, Z][build.dice.below(3) as usize];
        }
        let tolerance = build.tolerance();
        let unit_name = if degrees { "rpy_deg" } else { "rpy" };
        build.line(&format!(
            "[[joint]]\nname = \"j{place}\"\nkind = \"{kind}\"\nxyz = {xyz:?}\n{unit_name} = {rpy:?}\n\
             axis = {axis:?}\n{}",
            tolerance_field(tolerance)
        ));
        let angles = if degrees {
            rpy.map(f64::to_radians)
        } else {
            rpy
        };
        let turn = multiply(
            multiply(about(Z, angles[2]), about(Y, angles[1])),
            about(X, angles[0]),
        );
        build.step(turn, xyz, tolerance);
        if kind == "fixed" {
            continue;
        }
        let revolute = kind == "revolute";
        let leader = kinds.iter().position(|(other, _, _)| *other == kind);
        let value = match leader {
            Some(leader) if build.dice.below(3) == 0 => {
                let (_, variable, name): &(&str, usize, u64) = &kinds[leader];
                let (ratio, offset) = (build.dice.decimals(1.0)[0], build.dice.decimals(0.3)[0]);
                let (variable, name) = (*variable, *name);
                let leading = build.world.variables[variable];
                let image = [leading.1, leading.2].map(|end| ratio * end + offset);
                let (lo, hi) = (image[0].min(image[1]) - 0.01, image[0].max(image[1]) + 0.01);
                build.line(&format!(
                    "limits = [{lo}, {hi}]\nfollows = {{ joint = \"j{name}\", ratio = {ratio}, \
                     offset = {offset} }}"
                ));
                ratio * leading.0 + offset
            }
            _ => {
                let (value, lo, hi) = limited(build, revolute);
                build.line(&format!("limits = [{lo}, {hi}]"));
                kinds.push((kind, build.world.variables.len(), place));
                build.world.variables.push((value, lo, hi));
                value
            }
        };
        build.motion(axis, revolute, value);
    }
    let xyz = build.dice.decimals(0.4);
    let rpy = build.dice.decimals(3.0);
    build.line(&format!(
        "[[tip]]\nname = \"flange\"\nxyz = {xyz:?}\nrpy = {rpy:?}"
    ));
    let turn = multiply(
        multiply(about(Z, rpy[2]), about(Y, rpy[1])),
        about(X, rpy[0]),
    );
    build.step(turn, xyz, (0.0, 0.0));
}

/// A target that the posture meets.
fn target(build: &mut Build, seed: u64) {
    let within = build.dice.between(0.001, 0.1);
    let off = [0; 3].map(|_: i32| build.dice.between(-within, within));
    let xyz = add(build.at, off, 1.0);
    let angle = build.dice.between(0.01, 3.3);
    let axis = unit(build.dice.vector(1.0));
    let most = angle.min(3.1) * (1.0 - 1e-9);
    // Half of them as far off as may be.
    let off = match build.dice.below(2) {
        0 => about(axis, most),
        _ => about(axis, build.dice.between(-most, most)),
    };
    let orientation = match seed % 4 {
        0 => String::new(),
        1 => {
            let [w, x, y, z] = to_quaternion(multiply(off, build.turn));
            let stretch = build.dice.between(0.9991, 1.0009);
            let [w, x, y, z] = [w, x, y, z].map(|part| part * stretch);
            format!(r#","quat":[{w},{x},{y},{z}],"turn_within":{angle}"#)
        }
        2 => {
            let nine = multiply(off, build.turn).concat();
            let nine: Vec<f64> = nine
                .iter()
                .map(|x| x + build.dice.between(-3e-4, 3e-4))
                .collect();
            format!(r#","rotation":{nine:?},"turn_within":{angle}"#)
        }
        _ => {
            let mut cones = Vec::new();
            for _ in 0..1 + build.dice.below(2) {
                let tip = build.dice.vector(2.0);
                let off = about(
                    unit(build.dice.vector(1.0)),
                    build.dice.between(-angle, angle),
                );
                let base = apply(multiply(off, build.turn), unit(tip));
                cones.push(format!(
                    r#"{{"tip":{tip:?},"base":{base:?},"within":{angle}}}"#
                ));
                build.world.cones.push((unit(tip), unit(base)));
            }
            format!(r#","axis":[{}]"#, cones.join(","))
        }
    };
    build.world.target = format!(r#"{{"xyz":{xyz:?},"xyz_within":{within}{orientation}}}"#);
}
