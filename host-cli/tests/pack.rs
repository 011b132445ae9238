//! Packing for the controller: table and image hold the same machine, and the summary is true.

mod common;

use balk::firmware::{Preset, firmware};
use balk::pack::pack;
use balk::read;
use balk_core::image::{image, load};
use balk_core::propagate::MOST_JOINTS;
use balk_core::record::fingerprint;

/// The table of this machine as it was written before.
#[path = "../../boards/programs/src/spherical.rs"]
mod spherical;

const SPHERICAL: &str = include_str!("../../tests/machines/spherical.toml");
const TABLE: &str = include_str!("../../boards/programs/src/spherical.rs");
const ORCHARD: &str = include_str!("../demo/orchard.toml");

fn packed(text: &str) -> (balk::model::Machine, balk::firmware::Firmware) {
    let machine = read::machine(text.as_bytes(), "machine.toml").unwrap();
    let firmware = firmware(&machine, 0).unwrap();
    (machine, firmware)
}

#[test]
fn the_table_compiles_to_the_packed_machine() {
    let (_, firmware) = packed(SPHERICAL);
    // What is compiled here is what is written now ...
    assert_eq!(firmware.source, TABLE);
    // ... and holds the numbers of the image.
    assert_eq!(image(&spherical::MACHINE).to_vec(), firmware.image);
    assert_eq!(spherical::FINGERPRINT, firmware.summary.fingerprint);
    assert_eq!(spherical::FINGERPRINT, fingerprint(&spherical::MACHINE));
}

#[test]
fn the_image_loads_as_the_packed_machine() {
    for text in [SPHERICAL, ORCHARD] {
        let (machine, firmware) = packed(text);
        let whole = pack(&machine, 0).unwrap().machine;
        let loaded = load::<MOST_JOINTS>(&firmware.image).unwrap();
        assert_eq!(format!("{loaded:?}"), format!("{whole:?}"));
        assert_eq!(firmware.summary.image_bytes, firmware.image.len());
        assert_eq!(firmware.summary.joints, whole.joints.len());
        assert_eq!(firmware.summary.fingerprint, fingerprint(&whole));
    }
}

#[test]
fn tolerances_of_the_file_are_inside() {
    let (_, exact) = packed(SPHERICAL);
    assert!(exact.summary.widest < 1e-8 && exact.summary.widest_turn < 1e-8);
    let loose = SPHERICAL.replacen(
        "kind = \"revolute\"",
        "kind = \"revolute\"\ntolerance = { xyz = 0.001, angle_deg = 0.1 }",
        1,
    );
    let (_, loose) = packed(&loose);
    // A box of 1 mm about a point reaches as far as its corners.
    assert!(loose.summary.widest >= 0.001 * 3f64.sqrt());
    assert!(loose.summary.widest_turn >= 0.1f64.to_radians() * (1.0 - 1e-6));
}

#[test]
fn the_summary_says_what_was_done() {
    let (_, firmware) = packed(SPHERICAL);
    let text = firmware.summary.to_string();
    let identity = format!("fingerprint  {:016x}", firmware.summary.fingerprint);
    for line in [
        "machine      bench arm, spherical wrist, tip gripper",
        "chain        6 moving joints on 6 variables, 0 fixed joints folded in",
        &identity,
        "image        1072 bytes",
    ] {
        assert!(text.lines().any(|own| own == line), "{line:?} in\n{text}");
    }
    assert!(text.contains("needs        Workspace6: at most "), "{text}");
}

#[test]
fn the_preset_is_the_smallest_that_holds() {
    let names: Vec<&str> = (1..=8).map(|n| Preset::for_joints(n).name).collect();
    let wanted = [
        "Workspace4",
        "Workspace4",
        "Workspace4",
        "Workspace4",
        "Workspace6",
        "Workspace6",
        "Workspace7",
        "Workspace8",
    ];
    assert_eq!(names, wanted);
}

#[test]
fn the_command_writes_both_forms_and_says_what_it_did() {
    let folder = common::Folder::new("pack_command").with("m.toml", ORCHARD);
    let run = folder.run(&["pack", "m.toml", "--source", "m.rs", "--image", "m.bin"]);
    assert_eq!((run.status, run.err.as_str()), (0, ""));
    for part in [
        "machine      orchard picker, tip gripper",
        "needs        Workspace6",
        "wrote        image m.bin",
    ] {
        assert!(run.out.contains(part), "{part}: {}", run.out);
    }
    let written = std::path::Path::new(env!("CARGO_TARGET_TMPDIR")).join("pack_command");
    let image = std::fs::read(written.join("m.bin")).unwrap();
    assert!(balk_core::image::load::<6>(&image).is_ok());
    assert!(
        std::fs::read_to_string(written.join("m.rs"))
            .unwrap()
            .contains("MACHINE")
    );
    let run = folder.run(&["pack", "m.toml", "--tip", "camera"]);
    assert_eq!(run.status, 4);
    assert_eq!(
        run.err,
        "m.toml: tip: there is no \"camera\" (tips: gripper)\n"
    );
}
