//! what are the undecided?
use balk::model::*;
use balk::search::*;
use nalgebra::*;
use rand::{Rng, SeedableRng};
fn rotation(rng: &mut impl Rng) -> Rotation3<f64> {
    let u: [f64; 3] = [rng.random(), rng.random(), rng.random()];
    let (a, b) = ((1.0 - u[0]).sqrt(), u[0].sqrt());
    let t = std::f64::consts::TAU;
    let q = Quaternion::new(b * (t * u[2]).cos(), a * (t * u[1]).sin(), a * (t * u[1]).cos(), b * (t * u[2]).sin());
    UnitQuaternion::from_quaternion(q).to_rotation_matrix()
}
fn main() {
    let args: Vec<String> = std::env::args().collect();
    let n: usize = args[1].parse().unwrap();
    let kind = &args[2];
    for name in ["spherical", "offset", "seven"] {
        let file = format!("tests/machines/{name}.toml");
        let machine = balk::read::machine(&std::fs::read(&file).unwrap(), &file).unwrap();
        let solver = Solver::new(&machine, 0).unwrap();
        let linkage = balk::posture::Linkage::new(&machine, 0, &solver.pack.drives);
        let reach: f64 = machine.joints.iter().skip(1).map(|j| j.placement.translation.vector.norm()).sum::<f64>() + machine.tips[0].placement.translation.vector.norm();
        let centre = machine.joints[0].placement.translation.vector;
        let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(7);
        let mut rng2 = rand_chacha::ChaCha8Rng::seed_from_u64(8);
        for id in 0..n {
            let p = loop { let p = Vector3::new(rng.random_range(-1.0..1.0), rng.random_range(-1.0..1.0), rng.random_range(-1.0..1.0f64)); if p.norm() < 1.0 { break p; } };
            let r = rotation(&mut rng);
            let (within, orientation) = match kind.as_str() {
                "pose" => (0.001, Orientation::Near { rotation: r, within: 0.01 }),
                "box" => (0.05, Orientation::Near { rotation: r, within: 20f64.to_radians() }),
                "point" => (0.001, Orientation::Free),
                _ => (0.001, Orientation::Axes(vec![Cone { tip: Vector3::z_axis(), base: Unit::new_normalize(r * Vector3::z()), within: 0.01 }])),
            };
            let target = Target { id: id.to_string(), tip: 0, xyz: centre + p * reach, xyz_within: Vector3::repeat(within), orientation };
            let d = solver.decide(&target, 3000);
            if let Verdict::Undecided { .. } = d.verdict {
                let mut best = f64::MAX; let mut hits = 0; let mut bv = vec![];
                for _ in 0..1000 {
                    let mut v: Vec<f64> = linkage.limits.iter().map(|&[lo, hi]| rng2.random_range(lo..hi)).collect();
                    let s = linkage.seek(&target, &mut v);
                    if s < 1e-18 { hits += 1 }
                    if s < best { best = s; bv = v; }
                }
                let q: Vec<String> = bv.iter().zip(&linkage.limits).map(|(v, l)| format!("{v:.2}{}", if *v <= l[0] + 1e-9 || *v >= l[1] - 1e-9 { "!" } else { "" })).collect();
                println!("{name} {id} nodes {} hits {hits} best {:.3e} {}", d.nodes, best.sqrt(), q.join(" "));
            }
        }
    }
}
