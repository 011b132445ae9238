//! Machines and targets as the files that say the same.

use crate::model::{Kind, Machine, Orientation, Target};
use nalgebra::{Isometry3, UnitQuaternion};
use serde_json::json;
use std::fmt::Write;

/// The line of a targets file that says what `target` says, for the tip of that name.
pub fn target_line(target: &Target, tip: &str) -> String {
    let mut fields = json!({
        "id": target.id,
        "tip": tip,
        "xyz": target.xyz.as_slice(),
        "xyz_within": target.xyz_within.as_slice(),
    });
    match &target.orientation {
        Orientation::Free => {}
        Orientation::Near { rotation, within } => {
            let q = UnitQuaternion::from_rotation_matrix(rotation);
            fields["quat"] = json!([q.w, q.i, q.j, q.k]);
            fields["turn_within"] = json!(within);
        }
        Orientation::Axes(cones) => {
            let cones: Vec<_> = cones
                .iter()
                .map(|cone| {
                    json!({
                        "tip": cone.tip.as_slice(),
                        "base": cone.base.as_slice(),
                        "within": cone.within,
                    })
                })
                .collect();
            fields["axis"] = json!(cones);
        }
    }
    fields.to_string()
}

/// The machine file that says what `machine` says, up to the last digit of a rotation's angles.
pub fn machine_file(machine: &Machine) -> String {
    let mut text = format!("name = {:?}\n", machine.name);
    let parent =
        |index: Option<usize>| index.map_or("base", |index| machine.joints[index].name.as_str());
    let placement = |text: &mut String, placement: &Isometry3<f64>| {
        let _ = writeln!(text, "xyz = {:?}", placement.translation.vector.as_slice());
        let (roll, pitch, yaw) = placement.rotation.euler_angles();
        let _ = writeln!(text, "rpy = [{roll:?}, {pitch:?}, {yaw:?}]");
    };
    for joint in &machine.joints {
        let kind = match joint.kind {
            Kind::Revolute => "revolute",
            Kind::Prismatic => "prismatic",
            Kind::Fixed => "fixed",
        };
        let _ = write!(
            text,
            "[[joint]]\nname = {:?}\nkind = \"{kind}\"\nparent = {:?}\n",
            joint.name,
            parent(joint.parent)
        );
        placement(&mut text, &joint.placement);
        if joint.kind != Kind::Fixed {
            let _ = writeln!(text, "axis = {:?}", joint.axis.as_slice());
        }
        if let Some(limits) = joint.limits {
            let _ = writeln!(text, "limits = {limits:?}");
        }
        let tolerance = joint.tolerance;
        if tolerance.xyz != 0.0 || tolerance.angle != 0.0 {
            let _ = writeln!(
                text,
                "tolerance = {{ xyz = {:?}, angle = {:?} }}",
                tolerance.xyz, tolerance.angle
            );
        }
        if let Some(follows) = joint.follows {
            let _ = writeln!(
                text,
                "follows = {{ joint = {:?}, ratio = {:?}, offset = {:?} }}",
                machine.joints[follows.joint].name, follows.ratio, follows.offset
            );
        }
    }
    for tip in &machine.tips {
        let _ = write!(
            text,
            "[[tip]]\nname = {:?}\nparent = {:?}\n",
            tip.name,
            parent(tip.parent)
        );
        placement(&mut text, &tip.placement);
    }
    text
}
