//! Tells the linker which board's memory to use.

fn main() {
    println!("cargo::rerun-if-env-changed=BOARD");
    let here = env!("CARGO_MANIFEST_DIR");
    if let Ok(board) = std::env::var("BOARD") {
        println!("cargo::rerun-if-changed={here}/../{board}");
        println!("cargo::rustc-link-search={here}/../{board}");
        println!("cargo::rustc-link-arg-bins=-Tlink.x");
    }
}
