//! A proof as data: `FORMAT.md`, sections 2 to 6.

/// A number of a proof: multiples of 10^-12 of a metre, radian, square metre or one.
pub type Pico = i64;
/// How many make one.
pub const PICO: i64 = 1_000_000_000_000;

/// A proof that one target of one tip is unreachable.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Proof {
    /// SHA-256 of the chain (section 9).
    pub machine: [u8; 32],
    /// Name of the tip.
    pub tip: String,
    /// The target's line, as read.
    pub target: String,
    /// What the search printed beside its answer.
    pub search: [u8; 32],
    /// One for every moving joint.
    pub frames: Vec<Frame>,
    /// One for every variable.
    pub root: Vec<Span>,
    /// The tree in the order of a walk that takes the lower part first.
    pub items: Vec<Item>,
}

/// Where a moving joint's frame sits (section 2).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Frame {
    /// Quaternion w, x, y, z of any length, in the joint's own frame.
    pub turn: [i64; 4],
    /// Along the axis.
    pub shift: Pico,
}

/// An interval.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Span {
    /// Lower end.
    pub lo: Pico,
    /// Upper end.
    pub hi: Pico,
}

/// One line of the tree.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Item {
    /// Both parts of a variable's span follow, the lower one first.
    Split {
        /// Counted from 1.
        variable: u8,
        /// Where.
        at: Pico,
    },
    /// A bound, or the end of a branch.
    Step(Step),
}

/// One derivation.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Step {
    /// Why.
    pub rule: Rule,
    /// Of what; `None` only for a `sum` that ends a branch.
    pub quantity: Option<Quantity>,
    /// What is said of it.
    pub claim: Claim,
}

/// What a step says of its quantity.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Claim {
    /// Not below.
    AtLeast(Pico),
    /// Not above.
    AtMost(Pico),
    /// Between.
    Within(Span),
    /// No value is left.
    Nothing,
}

/// A body's point or direction.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Feature {
    /// `o1`, ...: origin of a joint's frame after motion, counted from 1.
    Origin(u8),
    /// `a1`, ...: third axis of a joint's frame.
    Axis(u8),
    /// `t`: the tip's origin.
    Tip,
    /// `x`, `y`, `z`: the tip frame's axes, 0 to 2.
    TipAxis(u8),
    /// `k1`, ...: tip axis of a cone of the target, counted from 1.
    Cone(u8),
}

/// From where a feature is seen.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Place {
    /// `b`: the base.
    Base,
    /// `1-`, ...: a joint's frame before motion.
    Before(u8),
    /// `1+`, ...: and after.
    After(u8),
    /// `e`: the tip frame.
    End,
    /// `d`: from the tip's origin along the base's axes.
    Difference,
}

/// Part of a view.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Part {
    /// `.x`
    X,
    /// `.y`
    Y,
    /// `.z`
    Z,
    /// `.s`: squared length.
    Square,
}

/// What a step bounds (section 3). Joints, variables and cones are counted from 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Quantity {
    /// `u1`, ...
    Variable(u8),
    /// `q1`, ...
    Value(u8),
    /// `c1`, ...
    Cosine(u8),
    /// `s1`, ...
    Sine(u8),
    /// `F@P.x`, ...
    View(Feature, Place, Part),
    /// `F@i.r`
    Radius(Feature, u8),
    /// `F.p1`, ...
    Along(Feature, u8),
    /// `F.g1`, ...
    Aim(Feature, u8),
}

/// A relation (section 4): joints, links (from 0), features, cones.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Relation {
    /// `turn.x`, `.y`, `.z` (0 to 2) of a joint.
    Turn(u8, u8, Feature),
    /// `back.x`, `.y` (0 to 1) of a joint.
    Back(u8, u8, Feature),
    /// `turn.s` of a joint.
    TurnSquare(u8, Feature),
    /// `plane-` of a joint.
    PlaneBefore(u8, Feature),
    /// `plane+` of a joint.
    PlaneAfter(u8, Feature),
    /// `height-` of a joint.
    HeightBefore(u8, Feature),
    /// `height+` of a joint.
    HeightAfter(u8, Feature),
    /// `dot` of a joint.
    Dot(u8, Feature),
    /// `cross` of a joint.
    Cross(u8, Feature),
    /// `circle` of a joint.
    Circle(u8),
    /// `slide.x`, `.y`, `.z` (0 to 2) of a joint.
    Slide(u8, u8, Feature),
    /// `length`
    Length(Place, Feature),
    /// `out.x`, ... (0 to 2) of a link.
    Out(u8, u8, Feature),
    /// `in.x`, ... (0 to 2) of a link.
    In(u8, u8, Feature),
    /// `far` of a link.
    Far(u8, Feature),
    /// `near` of a link.
    Near(u8, Feature),
    /// `shift.x`, ... (0 to 2)
    Shift(u8, Feature),
    /// `close.x`, ... (0 to 2)
    Close(u8, Feature),
    /// `open.x`, ... (0 to 2)
    Open(u8, Feature),
    /// `rigid`
    Rigid(Feature),
    /// `pair.s` of two joints.
    PairSquare(u8, u8),
    /// `pair.z` of two joints.
    PairAxis(u8, u8),
    /// `trace`
    Trace,
    /// `cone`
    Cone(u8),
    /// `along` of a cone.
    Along(u8, Feature),
    /// `along.d` of a cone.
    AlongDifference(u8, Feature),
    /// `aim` of a cone.
    Aim(u8, Feature),
}

/// Why a step follows (section 5).
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Rule {
    /// One relation, solved for the quantity.
    One(Relation),
    /// A combination with multipliers.
    Sum(Vec<(i64, Relation)>),
    /// `cosine` of a joint.
    Cosine(u8),
    /// `sine` of a joint.
    Sine(u8),
    /// `angle` of a joint from a feature.
    Angle(u8, Feature),
    /// `angle.c` of a joint.
    AngleOfCircle(u8),
    /// `sector` of a joint and a feature.
    Sector(u8, Feature),
    /// `spread` of a feature.
    Spread(Feature),
    /// `spread.k` of a cone and a feature.
    SpreadCone(u8, Feature),
    /// `tilt` of a cone.
    Tilt(u8),
}
