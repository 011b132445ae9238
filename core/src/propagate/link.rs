//! The rules of rigid links: between two joints, and from the tip back to the base.

use super::cell::{Cell, Vector};
use super::start::{GoalCone, spread_product};
use crate::fixed::{Empty, Interval, Product};
use crate::machine::Placement;

/// `transposed rotation * (vector - origin)`: into the frame of the placement.
#[inline]
fn into(placement: &Placement, vector: &Vector, point: bool) -> Vector {
    let mut sum = [Product::ZERO; 3];
    for k in 0..3 {
        let (mut lo, mut hi) = (vector[k].lo as i64, vector[k].hi as i64);
        if point {
            lo -= placement.origin[k].hi as i64;
            hi -= placement.origin[k].lo as i64;
        }
        for j in 0..3 {
            let factor = placement.rotation[k][j] as i64;
            if factor > 0 {
                sum[j].lo += factor * lo;
                sum[j].hi += factor * hi;
            } else if factor < 0 {
                sum[j].lo += factor * hi;
                sum[j].hi += factor * lo;
            }
        }
    }
    sum.map(|s| s.round(placement.turn_slack))
}

/// `origin + rotation * vector`: out of the frame of the placement.
#[inline]
fn out_of(placement: &Placement, vector: &Vector, point: bool) -> Vector {
    let mut result = [Interval::ZERO; 3];
    for k in 0..3 {
        let mut sum = Product::ZERO;
        for j in 0..3 {
            let factor = placement.rotation[k][j];
            if factor != 0 {
                sum = sum.plus(vector[j].scale(factor));
            }
        }
        if point {
            sum = sum.plus(placement.origin[k].widen());
        }
        result[k] = sum.round(placement.turn_slack);
    }
    result
}

/// Tightens the components of `own` by `fixed . own = sum`, first and third only: frames are
/// chosen so that the second component of `fixed` is almost zero.
#[inline]
fn meet_along(own: &mut Vector, fixed: &Vector, sum: Product) -> Result<bool, Empty> {
    let mut changed = false;
    let across = fixed[1].times(own[1]);
    for (k, other) in [(0, 2), (2, 0)] {
        let rest = sum.minus(across).minus(fixed[other].times(own[other]));
        if let Some(value) = rest.over_interval(fixed[k]) {
            changed |= own[k].meet(value)?;
        }
    }
    Ok(changed)
}

/// The rule of a link between two joints: `previous.after = t + R next.before`.
///
/// Also the law of cosines: the squared distances seen from the two origins differ by a linear
/// function of either vector. Returns whether (previous, next) changed.
pub fn link(
    previous: &mut Cell,
    next: &mut Cell,
    placement: &Placement,
    point: bool,
) -> Result<(bool, bool), Empty> {
    let mut back = false;
    let mut forward = false;
    for (own, value) in next
        .before
        .iter_mut()
        .zip(into(placement, &previous.after, point))
    {
        forward |= own.meet(value)?;
    }
    for (own, value) in previous
        .after
        .iter_mut()
        .zip(out_of(placement, &next.before, point))
    {
        back |= own.meet(value)?;
    }
    if !point {
        return Ok((back, forward));
    }
    let along_next = dot(&placement.back, &next.before).double();
    let along_previous = dot(&placement.origin, &previous.after).double();
    let square = placement.square;
    back |= previous
        .square_after
        .meet(square.plus(next.square_before).plus(along_next))?;
    forward |= next
        .square_before
        .meet(square.plus(previous.square_after).minus(along_previous))?;
    let difference = previous.square_after.minus(next.square_before);
    forward |= meet_along(
        &mut next.before,
        &placement.back,
        difference.minus(square).halve(),
    )?;
    back |= meet_along(
        &mut previous.after,
        &placement.origin,
        difference.plus(square).halve(),
    )?;
    Ok((back, forward))
}

/// Bounds of the inner product.
#[inline]
pub fn dot(a: &Vector, b: &Vector) -> Product {
    a[0].times(b[0])
        .plus(a[1].times(b[1]))
        .plus(a[2].times(b[2]))
}

/// The rule that closes the loop: `base = tip + sum_k axes[k] * local[k]`.
///
/// `axes` are the tip's axes in the base frame, `tip` its position there (`None` for a
/// direction), `local` the feature in the tip's frame. Returns whether (base, local) changed.
pub fn close(
    base: &mut Cell,
    local: &mut Cell,
    axes: &[Vector; 3],
    tip: Option<&Vector>,
) -> Result<(bool, bool), Empty> {
    let mut at_base = false;
    let mut at_tip = false;
    for j in 0..3 {
        let mut sum = Product::ZERO;
        for k in 0..3 {
            sum = sum.plus(axes[k][j].times(local.before[k]));
        }
        if let Some(tip) = tip {
            sum = sum.plus(tip[j].widen());
        }
        at_base |= base.after[j].meet(sum.round(0))?;
    }
    let relative = match tip {
        Some(tip) => [0, 1, 2].map(|k| base.after[k].less(tip[k])),
        None => base.after,
    };
    for k in 0..3 {
        at_tip |= local.before[k].meet(dot(&axes[k], &relative).round(0))?;
    }
    Ok((at_base, at_tip))
}

/// The same by the angle between wanted and actual orientation instead of the axes' boxes.
///
/// Each coordinate is the inner product of a vector with a direction known to within the angle.
pub fn close_within(
    base: &mut Cell,
    local: &mut Cell,
    wanted: &[Vector; 3],
    (cosine, sine): (Interval, Interval),
    tip: Option<&Vector>,
) -> Result<(bool, bool), Empty> {
    let mut at_base = false;
    let mut at_tip = false;
    let relative = match tip {
        Some(tip) => [0, 1, 2].map(|k| base.after[k].less(tip[k])),
        None => base.after,
    };
    let square = if tip.is_some() {
        local.square_before.meet(
            relative[0]
                .square()
                .plus(relative[1].square())
                .plus(relative[2].square()),
        )?;
        local.square_before
    } else {
        base.square_after
    };
    for k in 0..3 {
        let nominal = dot(&wanted[k], &relative);
        at_tip |= local.before[k].meet(spread_product(nominal, square, cosine, sine))?;
    }
    for j in 0..3 {
        let row = [wanted[0][j], wanted[1][j], wanted[2][j]];
        let nominal = dot(&row, &local.before);
        let own = spread_product(nominal, square, cosine, sine);
        at_base |= match tip {
            Some(tip) => base.after[j].meet(Interval::clamped(
                own.lo as i64 + tip[j].lo as i64,
                own.hi as i64 + tip[j].hi as i64,
            ))?,
            None => base.after[j].meet(own)?,
        };
    }
    Ok((at_base, at_tip))
}

/// The rule that closes the loop when the tip's orientation is free: the distance to the tip.
pub fn close_at_distance(
    base: &mut Cell,
    local: &mut Cell,
    tip: &Vector,
) -> Result<(bool, bool), Empty> {
    let mut at_base = false;
    let reach = crate::fixed::root_up(local.square_before.hi);
    for k in 0..3 {
        at_base |= base.after[k].meet(Interval::clamped(
            tip[k].lo as i64 - reach,
            tip[k].hi as i64 + reach,
        ))?;
    }
    let relative = [0, 1, 2].map(|k| base.after[k].less(tip[k]));
    let square = relative[0]
        .square()
        .plus(relative[1].square())
        .plus(relative[2].square());
    let at_tip = local.square_before.meet(square)?;
    Ok((at_base, at_tip))
}

/// The same when one tip axis is known: split into the part along the axis and the rest.
pub fn close_about_axis(
    base: &mut Cell,
    local: &mut Cell,
    tip: &Vector,
    axis_in_tip: &Vector,
    axis_in_base: &Vector,
) -> Result<(bool, bool), Empty> {
    let mut at_base = false;
    let along = dot(axis_in_tip, &local.before).round(0);
    let across = local.square_before.minus(along.square());
    let reach = crate::fixed::root_up(across.hi);
    for k in 0..3 {
        let shift = along.times(axis_in_base[k]).round(0);
        at_base |= base.after[k].meet(Interval::clamped(
            tip[k].lo as i64 + shift.lo as i64 - reach,
            tip[k].hi as i64 + shift.hi as i64 + reach,
        ))?;
    }
    let (near, far) = close_at_distance(base, local, tip)?;
    Ok((at_base | near, far))
}

/// The same by the cone's angle: the feature's part along the tip axis equals its part along a
/// direction that is known to within the angle.
pub fn close_within_cone(
    base: &mut Cell,
    local: &mut Cell,
    cone: &GoalCone,
    tip: &Vector,
) -> Result<(bool, bool), Empty> {
    let square = local.square_before;
    let mut relative = [0, 1, 2].map(|k| base.after[k].less(tip[k]));
    let mut along = dot(&cone.in_tip, &local.before).round(0);
    let nominal = dot(&cone.wanted, &relative);
    along.meet(spread_product(nominal, square, cone.cosine, cone.sine))?;
    let mut fixed = cone.in_tip;
    let (at_tip, ..) = meet_dot(&mut local.before, &mut fixed, &mut along)?;
    let mut nominal = spread_product(along.widen(), square, cone.cosine, cone.sine);
    let mut fixed = cone.wanted;
    let mut at_base = false;
    if meet_dot(&mut relative, &mut fixed, &mut nominal)?.0 {
        for k in 0..3 {
            at_base |= base.after[k].meet(Interval::clamped(
                tip[k].lo as i64 + relative[k].lo as i64,
                tip[k].hi as i64 + relative[k].hi as i64,
            ))?;
        }
    }
    Ok((at_base, at_tip))
}

/// Tightens `own` by `sum_k fixed[k] . own[k] >= least`.
pub fn meet_least<const N: usize>(
    own: &mut [Vector; N],
    fixed: &[Vector; N],
    least: Product,
) -> Result<bool, Empty> {
    let mut most = 0;
    for (own, fixed) in own.iter().zip(fixed) {
        most += dot(fixed, own).hi;
    }
    let mut changed = false;
    for (own, fixed) in own.iter_mut().zip(fixed) {
        for (own, fixed) in own.iter_mut().zip(fixed) {
            // What the others leave for this product.
            let rest = least.lo - (most - own.times(*fixed).hi);
            let own_least = Product {
                lo: rest,
                hi: i64::MAX >> 1,
            };
            if let Some(value) = own_least.over_interval(*fixed) {
                let bound = if fixed.lo > 0 {
                    Interval {
                        lo: value.lo,
                        ..Interval::UNIT
                    }
                } else {
                    Interval {
                        hi: value.hi,
                        ..Interval::UNIT
                    }
                };
                changed |= own.meet(bound)?;
            }
        }
    }
    if most < least.lo {
        // The sum cannot be reached: the meets above have emptied a component unless every factor
        // is too small to divide by.
        let mut none = Product {
            lo: least.lo,
            hi: least.hi.max(least.lo),
        };
        none.meet(Product { lo: most, hi: most })?;
    }
    Ok(changed)
}

/// Tightens two vectors and their inner product by each other.
///
/// Returns whether (first, second, product) changed.
pub fn meet_dot(
    a: &mut Vector,
    b: &mut Vector,
    inner: &mut Interval,
) -> Result<(bool, bool, bool), Empty> {
    let parts = [0, 1, 2].map(|k| a[k].times(b[k]));
    let sum = parts[0].plus(parts[1]).plus(parts[2]);
    let inner_changed = inner.meet(sum.round(0))?;
    let wanted = inner.widen();
    let mut changed = (false, false, inner_changed);
    // Nothing to gain unless the product is known better than the vectors tell.
    if wanted.lo - sum.lo <= (sum.hi - sum.lo) >> 4 && sum.hi - wanted.hi <= (sum.hi - sum.lo) >> 4
    {
        return Ok(changed);
    }
    for k in 0..3 {
        let others = parts[(k + 1) % 3].plus(parts[(k + 2) % 3]);
        let part = wanted.minus(others);
        if part.lo <= parts[k].lo && part.hi >= parts[k].hi {
            continue;
        }
        if let Some(value) = part.over_interval(b[k]) {
            changed.0 |= a[k].meet(value)?;
        }
        if let Some(value) = part.over_interval(a[k]) {
            changed.1 |= b[k].meet(value)?;
        }
    }
    Ok(changed)
}
