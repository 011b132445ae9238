//! How long one step of each kind takes, on a machine of two joints with oblique axes.
//!
//! `cargo run --release -p balk-checker --example speed`

use std::time::Instant;

use balk_checker::proof::Proof;
use balk_checker::{Checker, Rejection, text};

const MACHINE: &str = r#"
[[joint]]
name = "shoulder"
kind = "revolute"
xyz = [0.01, 0.02, 0.3]
rpy_deg = [1, 2, 3]
limits_deg = [-150, 150]
tolerance = { xyz = 0.0001, angle_deg = 0.01 }
[[joint]]
name = "elbow"
kind = "revolute"
xyz = [0.4, 0.01, 0.02]
rpy_deg = [10, 20, 30]
limits_deg = [-140, 140]
[[tip]]
name = "cup"
xyz = [0.3, 0.0, 0.0]
"#;

const TARGET: &str =
    r#"{"xyz":[0.8,0.0,0.3],"xyz_within":0.001,"rpy_deg":[3,5,7],"turn_within_deg":2}"#;

/// What the steps below need.
const START: &str = "step t@1-.x in [0.75, 0.85] by in.x 0 t
step t@2+.x in [0.3, 0.3] by out.x 2 t
step t@2+.y in [0, 0] by out.y 2 t
step t@2+.z in [0, 0] by out.z 2 t
step t@2.r in [0.09, 0.09] by plane+ 2 t
step t@2-.x in [-0.3, 0.3] by plane- 2 t
step t@2-.y in [-0.3, 0.3] by plane- 2 t
step t@2-.z in [0, 0] by turn.z 2 t
step t@1+.x in [0.01, 0.79] by out.x 1 t
";

const STEPS: [&str; 15] = [
    "step t@1+.x >= -9 by out.x 1 t",
    "step t@1-.x >= -9 by turn.x 1 t",
    "step t@1.r >= -9 by plane- 1 t",
    "step t@1-.x >= -9 by plane- 1 t",
    "step o1@d.x >= -9 by spread o1",
    "step t@1+.s >= -9 by far 1 t",
    "step t@1-.x >= -9 by sum 3 in.x 0 t -1 turn.x 1 t 2 out.x 1 t",
    "step t@1-.x >= -9 by sum 3 in.x 0 t -1 turn.x 1 t 2 out.x 1 t 1 out.y 1 t 5 turn.y 1 t -4 far 1 t",
    "step c1 >= -9 by cosine 1",
    "step q1 >= -9 by angle 1 t",
    "step t@1-.y >= -9 by sector 1 t",
    "step o1@e.x >= -9 by spread o1",
    "step c1 >= -9 by circle 1",
    "step x@b.x >= -9 by trace",
    "step x@b.x >= -9 by close.x x",
];

fn main() {
    let checker = Checker::new(MACHINE, "cup").expect("well written");
    let digest: String = checker
        .digest()
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect();
    let search = "0".repeat(64);
    let repeats = 100;
    for step in STEPS {
        let items = format!("{START}{}", format!("{step}\n").repeat(repeats));
        let written = format!(
            "balk-proof 1\nmachine {digest}\ntip \"cup\"\ntarget {TARGET}\nsearch {search}\n\
             frame 1 1 0 0 0 0\nframe 2 1 0 0 0 0\nroot 1 -2.7 2.7\nroot 2 -2.5 2.5\n{items}end\n"
        );
        let mut proof = text::read(&written).expect("well written");
        let all = least(&checker, &proof);
        proof.items.truncate(START.lines().count());
        let rest = least(&checker, &proof);
        let each = (all - rest) / repeats as f64;
        println!(
            "{:8.2} us  {step}   (start {:.1} us)",
            each * 1e6,
            rest * 1e6
        );
    }
}

/// Seconds of the fastest of many checks of a proof that is right but has no end.
fn least(checker: &Checker, proof: &Proof) -> f64 {
    let once = |_| {
        let start = Instant::now();
        let result = checker.check(proof, TARGET);
        let time = start.elapsed().as_secs_f64();
        assert_eq!(result, Err(Rejection::Unclosed(1)));
        time
    };
    (0..50).map(once).fold(f64::INFINITY, f64::min)
}
