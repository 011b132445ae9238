//! soundness experiment
use balk::model::*;
use balk::search::*;
use nalgebra::*;
use rand::{Rng, SeedableRng};

fn main() {
    let args: Vec<String> = std::env::args().collect();
    let n: usize = args[1].parse().unwrap();
    for name in ["spherical", "offset", "seven"] {
        let file = format!("tests/machines/{name}.toml");
        let machine = balk::read::machine(&std::fs::read(&file).unwrap(), &file).unwrap();
        let solver = Solver::new(&machine, 0).unwrap();
        let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(9);
        let (mut bad, mut un) = (0, 0);
        let mut ms = 0.0;
        for id in 0..n {
            let q: Vec<f64> = machine.joints.iter().map(|j| { let [lo, hi] = j.limits.unwrap_or([-3.1, 3.1]); match rng.random_range(0..6) { 0 => lo, 1 => hi, 2 => 0.0f64.clamp(lo, hi), _ => rng.random_range(lo..hi) } }).collect();
            let pose = balk::kinematics::tip_pose(&machine, &q, 0);
            let w = [0.0, 1e-6, 1e-3, 0.05][id % 4];
            let a = [0.0, 1e-6, 1e-2, 0.35][(id / 4) % 4];
            let off = Vector3::new(rng.random_range(-1.0..1.0), rng.random_range(-1.0..1.0), rng.random_range(-1.0..1.0f64)) * w * 0.999999;
            let turn = Rotation3::new(off.normalize() * a * 0.999 );
            let turn = if w == 0.0 { Rotation3::identity() } else { turn };
            let orientation = match (id / 16) % 3 { 0 => Orientation::Near { rotation: turn * pose.rotation.to_rotation_matrix(), within: a }, 1 => Orientation::Free, _ => Orientation::Axes(vec![Cone { tip: Vector3::z_axis(), base: Unit::new_normalize(turn * (pose.rotation * Vector3::z())), within: a + 1e-12 }]) };
            let target = Target { id: id.to_string(), tip: 0, xyz: pose.translation.vector + off, xyz_within: Vector3::repeat(w), orientation };
            let d = solver.decide(&target, 60);
            ms += d.seconds * 1e3;
            match d.verdict { Verdict::Unreachable { .. } => { bad += 1; if bad < 5 { println!("FALSE {name} {id} {q:?} w {w} a {a}"); } } Verdict::Undecided { .. } => un += 1, _ => {} }
        }
        println!("{name} false {bad} undecided {un} of {n}, ms {:.3}", ms / n as f64);
    }
}
