//! The textbook propagation to compare with: every link's axes and origin as boxes in the base
//! frame, single interval per joint, double precision. It refuses nothing outside this table.

use balk::model::{Kind, Machine, Orientation, Target};
use nalgebra::{Isometry3, Matrix3, Vector3};

/// Rounds of propagation.
const ROUNDS: usize = 30;
/// Rounding errors stay far below this.
const SLACK: f64 = 1e-9;

#[derive(Clone, Copy)]
struct Box1 {
    lo: f64,
    hi: f64,
}

/// Nothing is left.
struct Empty;

impl Box1 {
    fn new(lo: f64, hi: f64) -> Box1 {
        Box1 { lo, hi }
    }

    fn about(value: f64, within: f64) -> Box1 {
        Box1::new(value - within, value + within)
    }

    fn plus(self, other: Box1) -> Box1 {
        Box1::new(self.lo + other.lo, self.hi + other.hi)
    }

    fn negate(self) -> Box1 {
        Box1::new(-self.hi, -self.lo)
    }

    fn times(self, other: Box1) -> Box1 {
        let ends = [
            self.lo * other.lo,
            self.lo * other.hi,
            self.hi * other.lo,
            self.hi * other.hi,
        ];
        Box1::new(
            ends.into_iter().fold(f64::INFINITY, f64::min),
            ends.into_iter().fold(f64::NEG_INFINITY, f64::max),
        )
    }

    fn scale(self, factor: f64) -> Box1 {
        self.times(Box1::new(factor, factor))
    }

    fn square(self) -> Box1 {
        let all = self.times(self);
        if self.lo <= 0.0 && self.hi >= 0.0 {
            Box1::new(0.0, all.hi)
        } else {
            all
        }
    }

    fn meet(&mut self, other: Box1) -> Result<(), Empty> {
        self.lo = self.lo.max(other.lo - SLACK);
        self.hi = self.hi.min(other.hi + SLACK);
        if self.lo > self.hi {
            return Err(Empty);
        }
        Ok(())
    }

    /// Keeps the values whose square is at most `most` and, one sign being excluded, at least
    /// `least`.
    fn meet_square(&mut self, least: f64, most: f64) -> Result<(), Empty> {
        if most < -SLACK {
            return Err(Empty);
        }
        let root = most.max(0.0).sqrt();
        self.meet(Box1::new(-root, root))?;
        let root = (least - SLACK).max(0.0).sqrt();
        if self.lo > -root {
            self.meet(Box1::new(root, f64::INFINITY))?;
        } else if self.hi < root {
            self.meet(Box1::new(f64::NEG_INFINITY, -root))?;
        }
        Ok(())
    }
}

type Vector = [Box1; 3];

fn dot(a: &Vector, b: &Vector) -> Box1 {
    a[0].times(b[0])
        .plus(a[1].times(b[1]))
        .plus(a[2].times(b[2]))
}

/// Unit length of three components.
fn unit(v: [&mut Box1; 3]) -> Result<(), Empty> {
    let squares = [v[0].square(), v[1].square(), v[2].square()];
    let sum = squares.iter().fold(Box1::new(0.0, 0.0), |s, q| s.plus(*q));
    for (own, square) in v.into_iter().zip(squares) {
        own.meet_square(1.0 - (sum.hi - square.hi), 1.0 - (sum.lo - square.lo))?;
    }
    Ok(())
}

/// A rotation matrix by columns.
#[derive(Clone, Copy)]
struct Frame {
    columns: [Vector; 3],
    origin: Vector,
}

impl Frame {
    fn unknown(reach: f64) -> Frame {
        Frame {
            columns: [[Box1::new(-1.0, 1.0); 3]; 3],
            origin: [Box1::new(-reach, reach); 3],
        }
    }

    /// Unit columns and rows, each column the cross product of the other two.
    fn orthonormal(&mut self) -> Result<(), Empty> {
        for column in &mut self.columns {
            let [x, y, z] = column;
            unit([x, y, z])?;
        }
        for k in 0..3 {
            let [a, b, c] = &mut self.columns;
            unit([&mut a[k], &mut b[k], &mut c[k]])?;
        }
        for j in 0..3 {
            let (a, b) = (self.columns[(j + 1) % 3], self.columns[(j + 2) % 3]);
            for k in 0..3 {
                let (m, n) = ((k + 1) % 3, (k + 2) % 3);
                let cross = a[m].times(b[n]).plus(a[n].times(b[m]).negate());
                self.columns[j][k].meet(cross)?;
            }
        }
        Ok(())
    }

    fn times(&self, m: &Matrix3<f64>) -> [Vector; 3] {
        [0, 1, 2].map(|j| {
            [0, 1, 2].map(|k| {
                (0..3).fold(Box1::new(0.0, 0.0), |sum, i| {
                    sum.plus(self.columns[i][k].scale(m[(i, j)]))
                })
            })
        })
    }

    fn point(&self, t: &Vector3<f64>) -> Vector {
        [0, 1, 2].map(|k| {
            (0..3).fold(self.origin[k], |sum, i| {
                sum.plus(self.columns[i][k].scale(t[i]))
            })
        })
    }
}

/// A chain of turning joints about their third axes.
pub struct BaseFrame {
    placements: Vec<Isometry3<f64>>,
    limits: Vec<[f64; 2]>,
    tip: Isometry3<f64>,
    reach: f64,
}

fn meet_all(own: &mut Vector, other: Vector) -> Result<(), Empty> {
    for (own, other) in own.iter_mut().zip(other) {
        own.meet(other)?;
    }
    Ok(())
}

impl BaseFrame {
    /// Takes a machine that is one chain of turning joints.
    pub fn new(machine: &Machine) -> BaseFrame {
        let mut open = Isometry3::identity();
        let mut placements = Vec::new();
        let mut limits = Vec::new();
        for joint in machine.joints.iter().filter(|j| j.kind == Kind::Revolute) {
            let to_axis = nalgebra::UnitQuaternion::rotation_between(&Vector3::z(), &joint.axis)
                .unwrap_or_else(|| {
                    nalgebra::UnitQuaternion::from_axis_angle(
                        &Vector3::x_axis(),
                        std::f64::consts::PI,
                    )
                });
            let turn = Isometry3::from_parts(nalgebra::Translation3::identity(), to_axis);
            placements.push(open * joint.placement * turn);
            limits.push(joint.limits.unwrap_or([-4.0, 4.0]));
            open = turn.inverse();
        }
        let tip = open * machine.tips[0].placement;
        let reach = placements
            .iter()
            .chain([&tip])
            .map(|p| p.translation.vector.norm())
            .sum();
        BaseFrame {
            placements,
            limits,
            tip,
            reach,
        }
    }

    /// Whether single-interval propagation in the base frame refuses a full pose.
    pub fn refuses(&self, target: &Target) -> bool {
        self.propagate(target).is_err()
    }

    fn propagate(&self, target: &Target) -> Result<(), Empty> {
        let count = self.placements.len();
        let mut frames = vec![Frame::unknown(self.reach); count + 2];
        frames[0] = Frame {
            columns: [0, 1, 2]
                .map(|j| [0, 1, 2].map(|k| Box1::about(if j == k { 1.0 } else { 0.0 }, 0.0))),
            origin: [Box1::about(0.0, 0.0); 3],
        };
        if let Orientation::Near { rotation, within } = &target.orientation {
            for j in 0..3 {
                for k in 0..3 {
                    let angle = rotation[(k, j)].clamp(-1.0, 1.0).acos();
                    let (near, far) = ((angle - within).max(0.0), angle + within);
                    frames[count + 1].columns[j][k] =
                        Box1::new(far.min(std::f64::consts::PI).cos(), near.cos());
                }
            }
        }
        frames[count + 1].origin =
            [0, 1, 2].map(|k| Box1::about(target.xyz[k], target.xyz_within[k]));
        let mut circles: Vec<(Box1, Box1)> = self
            .limits
            .iter()
            .map(|&[lo, hi]| (range(lo, hi), range(lo - QUARTER, hi - QUARTER)))
            .collect();
        for _ in 0..ROUNDS {
            for i in 0..count {
                self.joint(&mut frames, i, &mut circles[i])?;
            }
            self.hand(&mut frames)?;
            for i in (0..count).rev() {
                self.joint(&mut frames, i, &mut circles[i])?;
            }
        }
        Ok(())
    }

    /// One joint, forward and backward: `u = c a + s b`, `v = -s a + c b`, and the reverse.
    fn joint(
        &self,
        frames: &mut [Frame],
        i: usize,
        circle: &mut (Box1, Box1),
    ) -> Result<(), Empty> {
        let placement = &self.placements[i];
        let matrix = placement.rotation.to_rotation_matrix().into_inner();
        let mut before = Frame {
            columns: frames[i].times(&matrix),
            origin: frames[i].point(&placement.translation.vector),
        };
        let mut after = frames[i + 1];
        let (c, s) = *circle;
        let combine = |p: Box1, x: &Vector, q: Box1, y: &Vector| {
            [0, 1, 2].map(|k| p.times(x[k]).plus(q.times(y[k])))
        };
        let [a, b, w] = before.columns;
        meet_all(&mut after.columns[0], combine(c, &a, s, &b))?;
        meet_all(&mut after.columns[1], combine(s.negate(), &a, c, &b))?;
        meet_all(&mut after.columns[2], w)?;
        meet_all(&mut after.origin, before.origin)?;
        after.orthonormal()?;
        let [u, v, w] = after.columns;
        meet_all(&mut before.columns[0], combine(c, &u, s.negate(), &v))?;
        meet_all(&mut before.columns[1], combine(s, &u, c, &v))?;
        meet_all(&mut before.columns[2], w)?;
        meet_all(&mut before.origin, after.origin)?;
        before.orthonormal()?;
        let [a, b, _] = before.columns;
        for (own, dots) in [
            (&mut circle.0, [dot(&u, &a), dot(&v, &b)]),
            (&mut circle.1, [dot(&u, &b), dot(&v, &a).negate()]),
        ] {
            own.meet(dots[0])?;
            own.meet(dots[1])?;
        }
        let (c, s) = circle;
        let (cc, ss) = (c.square(), s.square());
        c.meet_square(1.0 - ss.hi, 1.0 - ss.lo)?;
        s.meet_square(1.0 - cc.hi, 1.0 - cc.lo)?;
        let back = before.times(&matrix.transpose());
        for j in 0..3 {
            meet_all(&mut frames[i].columns[j], back[j])?;
        }
        let step = Frame {
            origin: [Box1::about(0.0, 0.0); 3],
            ..frames[i]
        }
        .point(&placement.translation.vector);
        let origin = [0, 1, 2].map(|k| before.origin[k].plus(step[k].negate()));
        meet_all(&mut frames[i].origin, origin)?;
        frames[i + 1] = after;
        Ok(())
    }

    /// The rigid link from the last joint to the tip.
    fn hand(&self, frames: &mut [Frame]) -> Result<(), Empty> {
        let count = self.placements.len();
        let matrix = self.tip.rotation.to_rotation_matrix().into_inner();
        let (columns, origin) = (
            frames[count].times(&matrix),
            frames[count].point(&self.tip.translation.vector),
        );
        for (own, other) in frames[count + 1].columns.iter_mut().zip(columns) {
            meet_all(own, other)?;
        }
        meet_all(&mut frames[count + 1].origin, origin)?;
        frames[count + 1].orthonormal()?;
        let back = frames[count + 1].times(&matrix.transpose());
        for (own, other) in frames[count].columns.iter_mut().zip(back) {
            meet_all(own, other)?;
        }
        let step = Frame {
            origin: [Box1::about(0.0, 0.0); 3],
            ..frames[count]
        }
        .point(&self.tip.translation.vector);
        let origin = [0, 1, 2].map(|k| frames[count + 1].origin[k].plus(step[k].negate()));
        meet_all(&mut frames[count].origin, origin)
    }
}

const QUARTER: f64 = std::f64::consts::FRAC_PI_2;

/// Range of the cosine over an interval of angles.
fn range(lo: f64, hi: f64) -> Box1 {
    let turn = std::f64::consts::TAU;
    let holds = |angle: f64| ((lo - angle) / turn).ceil() * turn + angle <= hi;
    Box1::new(
        if holds(std::f64::consts::PI) {
            -1.0
        } else {
            lo.cos().min(hi.cos())
        },
        if holds(0.0) {
            1.0
        } else {
            lo.cos().max(hi.cos())
        },
    )
}
