//! Enclosures of pi, sine, cosine and the direction of a vector.
//!
//! Inside, numbers are whole multiples of 2^-112 ("ulps" below), every division rounds down, and
//! the error of the whole computation is bounded by a count of ulps that is derived at each
//! function. 512 ulps are less than 10^-31, so an enclosure is at most two grains (10^-24) wider
//! than the exact range.
//!
//! Series: Abramowitz and Stegun, *Handbook of Mathematical Functions*, 1964, 4.3.65 (sine), 4.3.66
//! (cosine), 4.4.42 (arctangent); Machin's formula for pi.

use core::cmp::{max, min};
use std::sync::LazyLock;

use dashu_int::ops::{Abs, SquareRoot};
use dashu_int::{IBig, Sign, UBig};

use super::interval::{Interval, ONE, ceil, floor};

/// An ulp is 2^-BITS.
const BITS: usize = 112;
/// Pi is kept to BITS + FINER bits.
const FINER: usize = 48;

/// Pi rounded down to 2^-160.
static PI_FINE: LazyLock<IBig> = LazyLock::new(|| {
    // Every quotient is rounded down: fewer than 200 of them, each off by less than one, times 16.
    let guard = 20;
    let one = IBig::ONE << (BITS + FINER + guard);
    let inverse_tangent = |of: u32| {
        let square = IBig::from(of) * IBig::from(of);
        let mut power = &one / IBig::from(of);
        let (mut sum, mut odd) = (IBig::ZERO, 1u32);
        while !power.is_zero() {
            let term = &power / IBig::from(odd);
            sum = if odd % 4 == 1 { sum + term } else { sum - term };
            power /= &square;
            odd += 2;
        }
        sum
    };
    let pi = inverse_tangent(5) * IBig::from(16) - inverse_tangent(239) * IBig::from(4);
    (pi >> guard) - IBig::ONE
});

/// Pi.
static PI: LazyLock<Interval> = LazyLock::new(|| {
    let fine = IBig::ONE << (BITS + FINER);
    Interval::new(&*PI_FINE * &ONE, (&*PI_FINE + IBig::from(3)) * &ONE).shrink(&fine)
});

/// Twice pi.
static TURN: LazyLock<Interval> = LazyLock::new(|| PI.scale(&IBig::from(2)));
/// Half of pi.
static QUARTER: LazyLock<Interval> = LazyLock::new(|| PI.shrink(&IBig::from(2)));

/// Pi, at most two grains wide.
pub fn pi() -> &'static Interval {
    &PI
}

/// Two pi.
pub fn turn() -> &'static Interval {
    &TURN
}

/// Half of pi.
pub fn quarter() -> &'static Interval {
    &QUARTER
}

/// `value` ulps, off by at most `error`, in grains.
fn to_grains(value: &IBig, error: u32) -> Interval {
    let one = IBig::ONE << BITS;
    Interval::new(
        (value - IBig::from(error)) * &ONE,
        (value + IBig::from(error)) * &ONE,
    )
    .shrink(&one)
}

/// Sine and cosine of `r` ulps with `0 <= r < 0.8`, each off by at most 64 ulps.
///
/// With `r^2` off by one ulp and below 0.64, a term off by `E` makes the next one, divided by at
/// least two and rounded down, off by `(0.64 E + 1) / 2 + 1`, so none is off by more than 2.3; there
/// are at most 16. The first term left out is below 0.8^32 / 32!, less than an ulp.
fn small(r: &IBig) -> (IBig, IBig) {
    let square = (r * r) >> BITS;
    let series = |first: IBig, mut place: u32| {
        let (mut term, mut sum) = (first, IBig::ZERO);
        for n in 0..16 {
            if term.is_zero() {
                break;
            }
            if n % 2 == 0 {
                sum += &term;
            } else {
                sum -= &term;
            }
            term = ((term * &square) >> BITS) / IBig::from((place + 1) * (place + 2));
            place += 2;
        }
        sum
    };
    (series(r.clone(), 1), series(IBig::ONE << BITS, 0))
}

/// Sine and cosine of `angle` grains.
pub fn sine_cosine(angle: &IBig) -> (Interval, Interval) {
    if angle.is_zero() {
        return (Interval::zero(), Interval::one());
    }
    let fine = floor(&(angle << (BITS + FINER)), &ONE);
    let half_pi = &*PI_FINE >> 1;
    // The nearest multiple of half of pi.
    let k = floor(&(&fine + (&half_pi >> 1)), &half_pi);
    if (&k).abs() >= IBig::ONE << 40 {
        let all = Interval::around_zero(ONE.clone());
        return (all.clone(), all);
    }
    // Off by 1 + 3 |k| < 2^42 units of 2^-160, less than an ulp, and one ulp of the shift.
    let rest = (fine - &k * half_pi) >> FINER;
    let (sine, cosine) = small(&(&rest).abs());
    let sine = if rest.sign() == Sign::Negative {
        -sine
    } else {
        sine
    };
    let (sine, cosine) = match floor_mod_4(&k) {
        0 => (sine, cosine),
        1 => (cosine, -sine),
        2 => (-sine, -cosine),
        _ => (-cosine, sine),
    };
    let all = Interval::around_zero(ONE.clone());
    (
        to_grains(&sine, 128).meet(&all),
        to_grains(&cosine, 128).meet(&all),
    )
}

/// `k` modulo 4, from 0 to 3.
fn floor_mod_4(k: &IBig) -> u8 {
    let four = IBig::from(4);
    u8::try_from(k - floor(k, &four) * four).unwrap_or(0)
}

/// Whole numbers `n` for which `offset + n * turn` may lie in `range`, from the first to the last;
/// the first is above the last if there is none.
pub fn turns(range: &Interval, offset: &Interval) -> (IBig, IBig) {
    let (lo, hi) = (&range.lo - &offset.hi, &range.hi - &offset.lo);
    let turn = turn();
    let first = if lo >= IBig::ZERO { &turn.hi } else { &turn.lo };
    let last = if hi >= IBig::ZERO { &turn.lo } else { &turn.hi };
    (ceil(&lo, first), floor(&hi, last))
}

/// Whether `offset` plus whole turns may lie in `range`.
fn hits(range: &Interval, offset: &Interval) -> bool {
    let (first, last) = turns(range, offset);
    first <= last
}

/// Hull of what a wave takes at both ends, with 1 if `range` may reach `top` and -1 if it may reach
/// `bottom` (up to whole turns).
fn wave(range: &Interval, ends: [Interval; 2], top: &Interval, bottom: &Interval) -> Interval {
    let mut all = ends[0].hull(&ends[1]);
    if hits(range, top) {
        all.hi = ONE.clone();
    }
    if hits(range, bottom) {
        all.lo = -&ONE;
    }
    all
}

/// Cosines of the angles in `range`.
pub fn cosine(range: &Interval) -> Interval {
    let ends = [sine_cosine(&range.lo).1, sine_cosine(&range.hi).1];
    wave(range, ends, &Interval::zero(), pi())
}

/// Sines of the angles in `range`.
pub fn sine(range: &Interval) -> Interval {
    let ends = [sine_cosine(&range.lo).0, sine_cosine(&range.hi).0];
    wave(range, ends, quarter(), &-quarter())
}

/// Inverse tangent of `small / large` for `0 <= small <= large`, `large > 0`, in ulps, off by at
/// most 400.
///
/// Three times the angle is halved by `tan(a / 2) = tan a / (1 + sqrt(1 + tan^2 a))`: an error `E` of
/// the tangent becomes at most `E / 2`, plus 0.3 for the root and 1 for the quotient, so 2.6 at the
/// end. The tangent is then below 0.0985, 18 terms reach below an ulp, each is off by less than 2.2:
/// 38, and both eightfold.
fn inverse_tangent(small: &IBig, large: &IBig) -> IBig {
    let one = UBig::ONE << BITS;
    let (small, large) = (small.clone() << BITS, large);
    let mut tangent = UBig::try_from(floor(&small, large)).unwrap_or(UBig::ZERO);
    for _ in 0..3 {
        let secant = ((&one << BITS) + &tangent * &tangent).sqrt();
        tangent = (tangent << BITS) / (&one + secant);
    }
    let tangent = IBig::from(tangent);
    let square = (&tangent * &tangent) >> BITS;
    let (mut power, mut sum) = (tangent, IBig::ZERO);
    for n in 0..18u32 {
        let term = &power / IBig::from(2 * n + 1);
        sum = if n % 2 == 0 { sum + term } else { sum - term };
        power = (power * &square) >> BITS;
    }
    sum << 3
}

/// Angle from the first axis of the vector `(x, y)`, which must not be zero, between -pi and pi.
pub fn direction(x: &IBig, y: &IBig) -> Interval {
    let (across, up) = (x.abs(), y.abs());
    let first = if up.is_zero() {
        Interval::zero()
    } else if up <= across {
        to_grains(&inverse_tangent(&up, &across), 512)
    } else {
        quarter() - &to_grains(&inverse_tangent(&across, &up), 512)
    };
    let half = if x.sign() == Sign::Negative {
        pi() - &first
    } else {
        first
    };
    if y.sign() == Sign::Negative {
        -half
    } else {
        half
    }
}

/// Angle over which the vectors of a box spread, as one interval of less than pi; `None` if the box
/// has the zero vector.
pub fn arc(x: &Interval, y: &Interval) -> Option<Interval> {
    let (x, y, offset) = if x.lo > IBig::ZERO {
        (x.clone(), y.clone(), Interval::zero())
    } else if y.lo > IBig::ZERO {
        (y.clone(), -x, quarter().clone())
    } else if x.hi < IBig::ZERO {
        (-x, -y, pi().clone())
    } else if y.hi < IBig::ZERO {
        (-y, x.clone(), -quarter())
    } else {
        return None;
    };
    // Now x is positive. The lowest direction is that of the lowest y, at the near side if below
    // the axis and at the far side if above; the highest likewise.
    let lowest = if y.lo < IBig::ZERO { &x.lo } else { &x.hi };
    let highest = if y.hi > IBig::ZERO { &x.lo } else { &x.hi };
    let (low, high) = (direction(lowest, &y.lo), direction(highest, &y.hi));
    Some(&offset + &Interval::new(min(low.lo, high.lo.clone()), max(low.hi, high.hi)))
}
