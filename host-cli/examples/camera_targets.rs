//! Writes the invented camera targets of `demo/camera.jsonl`: what a camera on an orchard cart
//! might propose to pick. `cargo run -p balk --example camera_targets > host-cli/demo/camera.jsonl`

use std::f64::consts::TAU;

/// Lines of the file.
pub const COUNT: u64 = 200;

fn main() {
    (0..COUNT).for_each(|k| println!("{}", line(k)));
}

/// Target `k`: a fruit somewhere around the arm, to be gripped from the side with some slack.
/// Every fourth may be gripped with any roll about the approach, every tenth from anywhere.
pub fn line(k: u64) -> String {
    let mut random = Random(k);
    let side = TAU * random.next();
    let distance = 0.3 + 1.5 * random.next();
    let [x, y, z] = [
        distance * side.cos(),
        distance * side.sin(),
        0.1 + 1.9 * random.next(),
    ];
    let place = format!(
        r#""id":"fruit-{:03}","xyz":[{x:.4},{y:.4},{z:.4}],"xyz_within":0.004"#,
        k + 1
    );
    // Outwards from the cart, up to 0.6 radians to the left or right and up or down.
    let bearing = side + 1.2 * (random.next() - 0.5);
    let rise = 1.2 * (random.next() - 0.5);
    if k % 10 == 9 {
        return format!("{{{place}}}");
    }
    if k % 4 == 3 {
        let flat = rise.cos();
        let [x, y, z] = [flat * bearing.cos(), flat * bearing.sin(), rise.sin()];
        return format!(
            r#"{{{place},"axis":{{"tip":[0,0,1],"base":[{x:.4},{y:.4},{z:.4}],"within_deg":8}}}}"#
        );
    }
    // Rz(bearing) Ry(90 degrees - rise) takes the gripper's z axis to the approach direction.
    let (sin_yaw, cos_yaw) = (bearing / 2.0).sin_cos();
    let (sin_pitch, cos_pitch) = (TAU / 8.0 - rise / 2.0).sin_cos();
    let [w, x, y, z] = [
        cos_yaw * cos_pitch,
        -sin_yaw * sin_pitch,
        cos_yaw * sin_pitch,
        sin_yaw * cos_pitch,
    ];
    format!(r#"{{{place},"quat":[{w:.6},{x:.6},{y:.6},{z:.6}],"turn_within_deg":5}}"#)
}

/// Numbers from 0 to 1, the same on every machine (SplitMix64: Steele, Lea & Flood, *Fast
/// splittable pseudorandom number generators*, OOPSLA 2014).
struct Random(u64);

impl Random {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut x = self.0;
        x = (x ^ (x >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        x = (x ^ (x >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        x ^= x >> 31;
        (x >> 11) as f64 / (1u64 << 53) as f64
    }
}
