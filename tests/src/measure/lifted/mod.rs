//! Lifted rows: a second linear program over a propagated node, kept as an experiment beside the
//! core because it does not earn its place there. [`run`] prints what it refutes and what it costs.
//!
//! Unknowns are the cosine and sine of every joint and the components of every feature's view
//! after every joint and in the base. The view *before* a joint is a linear form in the view after
//! the previous one, so links hold by substitution, to within the placement's slack. What is not
//! linear is enclosed: products by McCormick envelopes, squares by secants and tangents, arcs by
//! chords, rotations by cuts of their convex hull. Rows are made where the present point of the
//! simplex misses them, most violated first, into a fixed number of places; the core's integer
//! kernel has the last word, as everywhere.

mod arm;
mod decisions;
pub mod envelope;
pub mod form;
pub mod hull;
mod nodes;
pub mod program;
pub mod relations;
pub mod unknowns;

use balk_core::relaxation::NodeSimplex;
use balk_core::simplex::Simplex;
use program::Families;

/// Room on a workstation for every feature of seven joints.
type Wide = Simplex<400, 320, f64>;
/// What a controller might afford: single precision, tip features only. For the last [`NARROW`] sets.
type Narrow = Simplex<60, 128>;
/// Working memory of all node tests.
type Programs = (Box<Wide>, Box<Narrow>, NodeSimplex);

/// How many of the sets run in the small program.
const NARROW: usize = 2;
/// The three arms.
const MACHINES: [&str; 3] = ["spherical", "offset", "seven"];
/// The kinds of task.
pub const KINDS: [&str; 4] = ["pose", "cone", "box", "point"];
/// Pivots of one lifted program.
const PIVOTS: u32 = 800;

/// Sets of families: added one after the other, then some left out again.
const SETS: [(&str, Families); 13] = {
    let tip = Families::LINEAR.with(Families::ROTATION);
    let arcs = tip.with(Families::ARCS);
    let squares = arcs.with(Families::SQUARES);
    let dots = squares.with(Families::DOT_CROSS);
    let right = dots.with(Families::ORTHOGONAL);
    let hull = right.with(Families::HULL);
    let joints = hull.with(Families::JOINTS);
    let closing = Families::JOINTS.with(Families::CLOSING);
    [
        ("rotation envelopes of tip features", tip),
        ("+ arcs", arcs),
        ("+ squares", squares),
        ("+ dot and cross", dots),
        ("+ right angles", right),
        ("+ rotation hull", hull),
        ("+ joints' origins and axes", joints),
        ("+ closing: all", joints.with(closing)),
        ("rotation envelopes, joints, closing", tip.with(closing)),
        ("the same and squares, arcs", squares.with(closing)),
        ("joints, closing", Families::LINEAR.with(closing)),
        ("tip, arcs; 60 rows, single precision", arcs),
        ("tip, arcs, squares; the same", squares),
    ]
};

/// The middle one: robust against a busy machine, unlike the mean.
pub fn median(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).copied().unwrap_or(0.0)
}

/// Prints all tables: over nodes that are empty but that propagation leaves open, until `roots` of them
/// are roots, with at most `below` others of one target; and over `targets` whole decisions.
///
/// Cost: a lifted program takes 0.3 to 100 ms, a hundred times the propagation of its node; 20 roots, 2
/// others and 100 targets of all kinds take about an hour on one core.
pub fn run(roots: u64, below: usize, targets: usize, kinds: &[&str]) {
    if roots > 0 {
        nodes::run(roots, below, kinds);
    }
    if targets > 0 {
        decisions::run(targets, kinds);
    }
}
