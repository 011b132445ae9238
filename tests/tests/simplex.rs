//! The simplex.

#[path = "../src/measure/simplex.rs"]
mod measure;

#[test]
#[ignore]
fn table() {
    measure::run(200, 1);
}
