//! The demonstration files are what their sources make.

#[expect(dead_code, reason = "its main is what the example runs")]
#[path = "../examples/camera_targets.rs"]
mod camera_targets;

#[test]
fn camera_targets_come_from_their_generator() {
    let lines: Vec<String> = (0..camera_targets::COUNT)
        .map(camera_targets::line)
        .collect();
    assert_eq!(
        lines.join("\n") + "\n",
        include_str!("../demo/camera.jsonl")
    );
}
