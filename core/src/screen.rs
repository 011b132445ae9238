//! The controller's entry: refuse a target with proof, or let it pass with the reason.

use crate::fixed::{Arc, Direction, Empty, Interval};
use crate::machine::{Machine, Motion, Variable};
use crate::propagate::cell::{Cell, JointSpan};
use crate::propagate::{Branch, Chain, Goal, MOST_JOINTS, Network, Rules, Spans};
use crate::relaxation::{NodeSimplex, Relaxed, relax};
use crate::target::Target;
use heapless::Vec;

/// Most steps of the tree of one refusal: twice the most splits.
pub const MOST_STEPS: usize = 128;
/// Most parts the joint space is ever cut into on a controller.
pub const MOST_SPLITS: u16 = (MOST_STEPS / 2) as u16;

/// What a screening may spend, and by which rules.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Options {
    /// Parts the joint space may be cut into: 1 is a single interval per joint. At most
    /// [`MOST_SPLITS`].
    pub splits: u16,
    /// Pivots of the simplex at each part; 0 leaves the linear program out.
    pub pivots: u16,
    /// Variables tried before each cut.
    pub candidates: u8,
    /// Rules of propagation; all of them but in ablations.
    pub rules: Rules,
}

impl Default for Options {
    fn default() -> Self {
        Options {
            splits: 1,
            pivots: 200,
            candidates: 2,
            rules: Rules::ALL,
        }
    }
}

/// Working memory of a screening: no other is used but the stack.
///
/// `CELLS` bounds joints times features ([`cells_for`]), `PARTS` the open parts of the joint
/// space.
pub struct Workspace<const CELLS: usize, const PARTS: usize> {
    cells: [Cell; CELLS],
    parts: Vec<Part, PARTS>,
    steps: Vec<Step, MOST_STEPS>,
    simplex: NodeSimplex,
}

/// Cells a chain of that many moving joints needs.
pub const fn cells_for(joints: usize) -> usize {
    (joints + 2) * (2 * joints + 4)
}

/// Working memory for up to four joints: at most 9,864 bytes.
pub type Workspace4 = Workspace<{ cells_for(4) }, 16>;
/// Working memory for up to six joints: at most 14,792 bytes.
pub type Workspace6 = Workspace<{ cells_for(6) }, 16>;
/// Working memory for up to seven joints: at most 17,784 bytes.
pub type Workspace7 = Workspace<{ cells_for(7) }, 16>;
/// Working memory for up to eight joints: at most 21,128 bytes.
pub type Workspace8 = Workspace<{ cells_for(8) }, 16>;

/// A part of the joint space waiting to be shown empty.
#[allow(
    clippy::large_enum_variant,
    reason = "there is no heap to put the spans on"
)]
enum Part {
    /// Already shown, when it was cut off.
    Closed(Empty),
    /// Still to be looked at.
    Open(Waiting),
}

/// Spans while they wait: the ends of every arc or length and nothing that follows from them, to
/// save memory.
struct Waiting {
    ends: [[i32; 4]; MOST_JOINTS],
    /// One bit for every arc that is the full circle.
    full: u8,
}

impl Waiting {
    fn new(spans: &Spans, variables: &[Variable]) -> Waiting {
        let mut waiting = Waiting {
            ends: [[0; 4]; MOST_JOINTS],
            full: 0,
        };
        let own = spans.iter().zip(variables).zip(&mut waiting.ends);
        for (v, ((span, variable), ends)) in own.enumerate() {
            match variable.motion {
                Motion::Turn => {
                    let Arc { lo, hi, full } = span.arc;
                    *ends = [lo.x, lo.y, hi.x, hi.y];
                    waiting.full |= u8::from(full) << v;
                }
                Motion::Slide => *ends = [span.length.lo, span.length.hi, 0, 0],
            }
        }
        waiting
    }

    fn spans(&self, variables: &[Variable]) -> Spans {
        let own = variables.iter().zip(&self.ends).enumerate();
        own.map(|(v, (variable, &[a, b, c, d]))| match variable.motion {
            Motion::Turn => JointSpan::of_arc(Arc {
                lo: Direction { x: a, y: b },
                hi: Direction { x: c, y: d },
                full: self.full >> v & 1 == 1,
            }),
            Motion::Slide => JointSpan::of_length(Interval { lo: a, hi: b }),
        })
        .collect()
    }
}

/// One step of a refusal's tree, in the order of a walk that takes the lower part first.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Step {
    /// The part is empty by propagation.
    Bounds,
    /// The span of this variable is cut in its middle.
    Cut(u8),
    /// The part is empty by a combination of rows.
    Rows,
}

/// Proof that no posture within limits meets the target.
///
/// Only [`screen`] makes one, after integer arithmetic has shown every part of the joint space
/// empty:
///
/// ```compile_fail,E0451
/// let forged = balk_core::screen::Refusal { steps: &[], _only_made_here: () };
/// ```
#[derive(Debug)]
#[must_use]
pub struct Refusal<'w> {
    steps: &'w [Step],
    _only_made_here: (),
}

impl Refusal<'_> {
    /// The tree of cuts and the way each part was shown empty.
    pub fn steps(&self) -> &[Step] {
        self.steps
    }
}

/// The controller's answer.
#[derive(Debug)]
#[must_use]
pub enum Verdict<'w> {
    /// Nothing was proved. The target may or may not be within reach.
    Passed(Reason),
    /// No posture within limits meets the target, for any machine within tolerance.
    Refused(Refusal<'w>),
}

/// Why a target passed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Reason {
    /// The working memory is too small for the machine or the splits.
    Capacity,
    /// A part could not be shown empty and is too narrow to cut.
    NothingFound,
    /// The simplex ran out of pivots on the part that stayed open.
    PivotBudget,
    /// A part stayed open and no more cuts are allowed.
    SplitBudget,
    /// A number of the target lies outside its documented range.
    OutOfRange,
}

impl Reason {
    /// The reason in words.
    pub const fn text(self) -> &'static str {
        match self {
            Reason::Capacity => "capacity",
            Reason::NothingFound => "nothing found",
            Reason::PivotBudget => "pivot budget",
            Reason::SplitBudget => "split budget",
            Reason::OutOfRange => "target out of range",
        }
    }
}

impl<const CELLS: usize, const PARTS: usize> Workspace<CELLS, PARTS> {
    /// Empty working memory.
    pub const fn new() -> Self {
        Workspace {
            cells: [Cell::ANYTHING; CELLS],
            parts: Vec::new(),
            steps: Vec::new(),
            simplex: NodeSimplex::new(),
        }
    }
}

impl<const CELLS: usize, const PARTS: usize> Default for Workspace<CELLS, PARTS> {
    fn default() -> Self {
        Self::new()
    }
}

/// What a node test found.
pub enum Tested {
    /// Empty by propagation.
    Bounds(Empty),
    /// Not shown empty; whether the simplex finished.
    Open(Relaxed),
    /// Empty by rows.
    Rows(crate::certificate::Refuted),
}

/// The node test: propagation, then the linear program. Shrinks `spans`.
pub fn test(
    network: &mut Network,
    spans: &mut Spans,
    simplex: &mut NodeSimplex,
    pivots: u16,
) -> Tested {
    examine::<true>(network, spans, simplex, pivots)
}

/// The node test; without `ROWS` the linear program is not compiled in.
fn examine<const ROWS: bool>(
    network: &mut Network,
    spans: &mut Spans,
    simplex: &mut NodeSimplex,
    pivots: u16,
) -> Tested {
    if let Err(empty) = network.propagate(spans) {
        return Tested::Bounds(empty);
    }
    if !ROWS || pivots == 0 {
        return Tested::Open(Relaxed::Feasible);
    }
    match relax(network, spans, simplex, pivots.into()) {
        Ok(refuted) => Tested::Rows(refuted),
        Err(open) => Tested::Open(open),
    }
}

/// Screens a target: refuses it only with proof.
///
/// Takes at most `splits` node tests and twice as many propagations per cut and candidate; no
/// heap, no recursion.
pub fn screen<'w, const N: usize, const CELLS: usize, const PARTS: usize>(
    machine: &Machine<N>,
    target: &Target,
    options: &Options,
    workspace: &'w mut Workspace<CELLS, PARTS>,
) -> Verdict<'w> {
    refuse::<true, N, CELLS, PARTS>(machine, target, options, workspace)
}

/// The same without the code of the linear program, for the smallest controllers.
///
/// Answers as [`screen`] does with no pivots. Options that ask for pivots are beyond its capacity:
/// every target passes.
pub fn screen_by_bounds<'w, const N: usize, const CELLS: usize, const PARTS: usize>(
    machine: &Machine<N>,
    target: &Target,
    options: &Options,
    workspace: &'w mut Workspace<CELLS, PARTS>,
) -> Verdict<'w> {
    if options.pivots > 0 {
        return Verdict::Passed(Reason::Capacity);
    }
    refuse::<false, N, CELLS, PARTS>(machine, target, options, workspace)
}

fn refuse<'w, const ROWS: bool, const N: usize, const CELLS: usize, const PARTS: usize>(
    machine: &Machine<N>,
    target: &Target,
    options: &Options,
    workspace: &'w mut Workspace<CELLS, PARTS>,
) -> Verdict<'w> {
    let chain = machine.chain();
    let Workspace {
        cells,
        parts,
        steps,
        simplex,
    } = workspace;
    parts.clear();
    steps.clear();
    if chain.joints.len() > MOST_JOINTS || cells_for(chain.joints.len()) > CELLS {
        return Verdict::Passed(Reason::Capacity);
    }
    if !target.is_in_range() {
        return Verdict::Passed(Reason::OutOfRange);
    }
    let goal = Goal::new(target);
    let mut network = Network::new(chain, &goal, options.rules, cells);
    match walk::<ROWS, PARTS>(&mut network, options, parts, steps, simplex) {
        // Every part was closed by a proof that `walk` consumed.
        Ok(()) => Verdict::Refused(Refusal {
            steps,
            _only_made_here: (),
        }),
        Err(reason) => Verdict::Passed(reason),
    }
}

/// Walks the tree of parts; `Ok` once every one has been closed with proof.
fn walk<const ROWS: bool, const PARTS: usize>(
    network: &mut Network,
    options: &Options,
    parts: &mut Vec<Part, PARTS>,
    steps: &mut Vec<Step, MOST_STEPS>,
    simplex: &mut NodeSimplex,
) -> Result<(), Reason> {
    let mut splits = 1;
    let full = |_| Reason::Capacity;
    let variables = network.chain().variables;
    let whole = Waiting::new(&limits(network.chain()), variables);
    parts
        .push(Part::Open(whole))
        .map_err(|_| Reason::Capacity)?;
    while let Some(part) = parts.pop() {
        let mut spans = match part {
            Part::Closed(Empty { .. }) => {
                steps.push(Step::Bounds).map_err(full)?;
                continue;
            }
            Part::Open(waiting) => waiting.spans(variables),
        };
        let open = match examine::<ROWS>(network, &mut spans, simplex, options.pivots) {
            Tested::Bounds(Empty { .. }) => {
                steps.push(Step::Bounds).map_err(full)?;
                continue;
            }
            Tested::Rows(crate::certificate::Refuted { .. }) => {
                steps.push(Step::Rows).map_err(full)?;
                continue;
            }
            Tested::Open(open) => open,
        };
        if splits >= options.splits {
            return Err(match open {
                Relaxed::OutOfPivots => Reason::PivotBudget,
                _ => Reason::SplitBudget,
            });
        }
        let Branch::Cut {
            variable,
            lower,
            upper,
        } = network.branch(&spans, options.candidates.into())
        else {
            return Err(Reason::NothingFound);
        };
        splits += 1;
        steps.push(Step::Cut(variable as u8)).map_err(full)?;
        for half in [upper, lower] {
            let part = half.map_or_else(Part::Closed, |spans| {
                Part::Open(Waiting::new(&spans, variables))
            });
            parts.push(part).map_err(|_| Reason::Capacity)?;
        }
    }
    Ok(())
}

/// The span of every variable before any cut.
pub fn limits(chain: Chain) -> Spans {
    chain
        .variables
        .iter()
        .map(|variable| match variable.motion {
            Motion::Turn => JointSpan::of_arc(variable.arc),
            Motion::Slide => JointSpan::of_length(variable.length),
        })
        .collect()
}
