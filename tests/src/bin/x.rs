//! experiment
use balk::model::*;
use balk::search::*;
use balk_core::propagate::Rules;
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
    let nodes: u64 = args[3].parse().unwrap();
    let cand: usize = args[4].parse().unwrap();
    let rules: u32 = args.get(5).map_or(u32::MAX, |s| s.parse().unwrap());
    let only = args.get(6).cloned();
    for name in ["spherical", "offset", "seven"] {
        if only.as_ref().is_some_and(|o| o != name) { continue; }
        let file = format!("tests/machines/{name}.toml");
        let machine = balk::read::machine(&std::fs::read(&file).unwrap(), &file).unwrap();
        let mut solver = Solver::new(&machine, 0).unwrap();
        solver.options.rules = Rules(rules);
        solver.options.candidates = cand as u8;
        if let Ok(p) = std::env::var("PIVOTS") { solver.options.pivots = p.parse().unwrap(); }
        let reach: f64 = machine.joints.iter().skip(1).map(|j| j.placement.translation.vector.norm()).sum::<f64>()
            + machine.tips[0].placement.translation.vector.norm();
        let centre = machine.joints[0].placement.translation.vector;
        let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(7);
        let mut times = [vec![], vec![], vec![]];
        let mut counts = [vec![], vec![], vec![]];
        let splits = [1, 4, 8, 16];
        let mut caught = [0; 4];
        let mut rounds = [0u64; 4];
        let mut rtime = [0f64; 4];
        for id in 0..n {
            let p = loop {
                let p = Vector3::new(rng.random_range(-1.0..1.0), rng.random_range(-1.0..1.0), rng.random_range(-1.0..1.0f64));
                if p.norm() < 1.0 { break p; }
            };
            let r = rotation(&mut rng);
            let (within, orientation) = match kind.as_str() {
                "pose" => (0.001, Orientation::Near { rotation: r, within: 0.01 }),
                "box" => (0.05, Orientation::Near { rotation: r, within: 20f64.to_radians() }),
                "point" => (0.001, Orientation::Free),
                _ => (0.001, Orientation::Axes(vec![Cone { tip: Vector3::z_axis(), base: Unit::new_normalize(r * Vector3::z()), within: 0.01 }])),
            };
            let target = Target { id: id.to_string(), tip: 0, xyz: centre + p * reach, xyz_within: Vector3::repeat(within), orientation };
            let d = solver.decide(&target, nodes);
            let k = match d.verdict { Verdict::Reachable { .. } => 0, Verdict::Unreachable { .. } => 1, Verdict::Undecided { reason } => { if std::env::var("SHOW").is_ok() { println!("{id} {reason} {:?}", target.xyz); } 2 } };
            times[k].push(d.seconds * 1e3);
            counts[k].push(d.nodes);
            if k == 1 {
                for (i, s) in splits.iter().enumerate() {
                    let clock = std::time::Instant::now();
                    let r = matches!(solver.screen(&target, *s), Screening::Refused { .. });
                    rtime[i] += clock.elapsed().as_secs_f64() * 1e3;
                    caught[i] += r as usize;
                }
            }
        }
        println!("{name}: reach {reach:.3}");
        for k in 0..3 {
            let (t, c) = (&mut times[k], &mut counts[k]);
            t.sort_by(f64::total_cmp);
            c.sort();
            if t.is_empty() { continue; }
            let q = |f: f64| ((t.len() as f64 * f) as usize).min(t.len() - 1);
            println!("  {} {:5.2}%  ms median {:.4} p90 {:.3} p99 {:.3} max {:.2} | nodes median {} p90 {} p99 {} max {}", ["reach", "unreach", "undecided"][k], t.len() as f64 / n as f64 * 100.0, t[q(0.5)], t[q(0.9)], t[q(0.99)], t[t.len()-1], c[q(0.5)], c[q(0.9)], c[q(0.99)], c[c.len()-1]);
        }
        let total = times[1].len() as f64;
        for i in 0..4 {
            println!("  splits {:2}: {:6.2}%  rounds {:.1} ms {:.4}", splits[i], caught[i] as f64 / total * 100.0, rounds[i] as f64 / total, rtime[i] / total);
        }
    }
}
