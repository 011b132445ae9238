//! A tiny machine, a target beyond its reach and a hand-written proof.

use balk_checker::proof::Proof;
use balk_checker::{Checker, text};

/// Two links of 0.4 m and 0.3 m in a plane.
pub const MACHINE: &str = r#"
name = "two links"
[[joint]]
name = "shoulder"
kind = "revolute"
xyz = [0.0, 0.0, 0.3]
limits_deg = [-150, 150]
[[joint]]
name = "elbow"
kind = "revolute"
xyz = [0.4, 0.0, 0.0]
limits_deg = [-140, 140]
[[tip]]
name = "cup"
xyz = [0.3, 0.0, 0.0]
"#;

/// 0.8 m away.
pub const TARGET: &str = r#"{"id":"far","xyz":[0.8,0.0,0.3],"xyz_within":0.001}"#;

/// What comes before the items.
pub const HEADER: &str = r#"frame 1 1 0 0 0 0
frame 2 1 0 0 0 0
root 1 -2.617993877992 2.617993877992
root 2 -2.443460952793 2.443460952793
"#;

/// The tip is 0.3 m from the elbow, so at most 0.7 m from the shoulder, but 0.799 m are asked.
pub const STEPS: &str = "step t@2+.x in [0.3, 0.3] by out.x 2 t
step t@2+.y in [0, 0] by out.y 2 t
step t@2+.z in [0, 0] by out.z 2 t
step t@2.r in [0.09, 0.09] by plane+ 2 t
step t@2+.s in [0.09, 0.09] by length 2+ t
step t@2-.s in [0.09, 0.09] by turn.s 2 t
step t@2-.x <= 0.3 by plane- 2 t
step t@1+.s <= 0.49 by far 1 t
step t@1-.s <= 0.49 by turn.s 1 t
step t@1-.x >= 0.799 by in.x 0 t
step t@1-.s none by length 1- t
";

/// A checker of [`MACHINE`].
pub fn checker() -> Checker {
    Checker::new(MACHINE, "cup").expect("the machine is well written")
}

/// The text of a proof for [`MACHINE`].
pub fn text_of(target: &str, header: &str, items: &str) -> String {
    let digest: String = checker()
        .digest()
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect();
    let search = "0".repeat(64);
    format!(
        "balk-proof 1\nmachine {digest}\ntip \"cup\"\ntarget {target}\nsearch {search}\n\
         {header}{items}end\n"
    )
}

/// The proof of `items` for [`MACHINE`] and [`TARGET`].
pub fn proof(header: &str, items: &str) -> Proof {
    text::read(&text_of(TARGET, header, items)).expect("the proof is well written")
}
