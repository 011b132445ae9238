//! Enclosures against published values and identities.
//!
//! Abramowitz and Stegun, *Handbook of Mathematical Functions*, 1964, table 1.1 (constants), quoted
//! from memory: pi, the square root of 2, and sine and cosine of 1 radian.

use dashu_int::IBig;

use crate::exact::decimal;
use crate::exact::function::{self, arc, direction, sine_cosine};
use crate::exact::interval::{Interval, ONE, grains};

/// The grain below `digits`, a decimal with 24 places or more.
fn grain(digits: &str) -> IBig {
    let number = decimal::parse(digits).expect("a decimal");
    Interval::of_fraction(&number).lo
}

/// The decimal continues, so the number lies between this grain and the next.
fn holds(range: &Interval, digits: &str) {
    let at = grain(digits);
    assert!(range.lo <= at && range.hi > at, "{range:?} {digits}");
    assert!(range.width() <= IBig::from(4), "{range:?}");
}

#[test]
fn published_values() {
    holds(function::pi(), "3.141592653589793238462643383279");
    holds(function::turn(), "6.283185307179586476925286766559");
    holds(function::quarter(), "1.570796326794896619231321691639");
    let two = decimal::parse("2").expect("a decimal");
    holds(
        &Interval::root_of_fraction(&two),
        "1.414213562373095048801688724209",
    );
    let (sine, cosine) = sine_cosine(&ONE);
    holds(&sine, "0.841470984807896506652502321630");
    holds(&cosine, "0.540302305868139717400936607442");
    let (sine, cosine) = sine_cosine(&grains(500_000_000_000));
    holds(&sine, "0.479425538604203000273287935215");
    holds(&cosine, "0.877582561890372716116281582603");
    holds(&direction(&ONE, &ONE), "0.785398163397448309615660845819");
    holds(
        &direction(&(&ONE * IBig::from(2)), &ONE),
        "0.463647609000806116214256231461",
    );
}

#[test]
fn quarter_turns() {
    let (zero, one) = (Interval::zero(), Interval::one());
    assert_eq!(sine_cosine(&IBig::ZERO), (zero, one));
    for k in -9i8..=9 {
        let angle = function::quarter().scale(&IBig::from(k));
        let (sine, cosine) = (function::sine(&angle), function::cosine(&angle));
        let expected = [(0, 1), (1, 0), (0, -1), (-1, 0)][usize::from(k.rem_euclid(4) as u8)];
        for (range, value) in [(sine, expected.0), (cosine, expected.1)] {
            let value = IBig::from(value) * &ONE;
            assert!(range.lo <= value && range.hi >= value);
            assert!(range.width() < IBig::from(100));
        }
    }
}

#[test]
fn directions_and_angles_agree() {
    for k in -3_100..3_100i64 {
        let angle = grains(k * 1_000_000_007);
        let (sine, cosine) = sine_cosine(&angle);
        let back = direction(&cosine.lo, &sine.lo);
        assert!(back.width() < IBig::from(10), "{k}");
        assert!(
            (&back.lo - &angle).max(&angle - &back.hi) < IBig::from(10),
            "{k}"
        );
    }
    assert_eq!(direction(&ONE, &IBig::ZERO), Interval::zero());
    assert_eq!(direction(&-&ONE, &IBig::ZERO), function::pi().clone());
}

#[test]
fn waves_reach_their_tops() {
    let range = |lo: i64, hi: i64| Interval::new(grains(lo), grains(hi));
    // From 1 to 2: the sine reaches its top at 1.57.
    let sine = function::sine(&range(1_000_000_000_000, 2_000_000_000_000));
    assert_eq!(sine.hi, ONE);
    assert!(sine.lo <= grain("0.841470984807896506652502"));
    // From 3 to 4: the cosine reaches its bottom at 3.14.
    let cosine = function::cosine(&range(3_000_000_000_000, 4_000_000_000_000));
    assert_eq!(cosine.lo, -&ONE);
    assert!(cosine.hi < IBig::ZERO);
    // From -20 to -19.9 neither has an extreme; both fall short of one.
    let cosine = function::cosine(&range(-20_000_000_000_000, -19_900_000_000_000));
    assert!(cosine.hi < ONE && cosine.lo > IBig::ZERO);
}

#[test]
fn arcs_of_boxes() {
    let range = |lo: i64, hi: i64| Interval::new(grains(lo), grains(hi));
    for (x, y) in [
        ((-1, 1), (-1, 1)),
        ((0, 1), (-1, 1)),
        ((-1, 0), (0, 1)),
        ((0, 0), (0, 0)),
    ] {
        assert_eq!(arc(&range(x.0, x.1), &range(y.0, y.1)), None);
    }
    // Corners in every direction: the arc has all of them and ends in two of them.
    for (x, y) in [
        ((1, 2), (-1, 1)),
        ((1, 2), (1, 3)),
        ((-1, 2), (1, 3)),
        ((-3, -1), (-1, 2)),
        ((-3, -1), (-3, -1)),
        ((-1, 1), (-3, -2)),
        ((0, 1), (1, 2)),
    ] {
        let found = arc(&range(x.0, x.1), &range(y.0, y.1)).expect("no zero");
        assert!(found.width() < function::pi().lo);
        let mut ends = [false; 2];
        for (x, y) in [(x.0, y.0), (x.0, y.1), (x.1, y.0), (x.1, y.1)] {
            let corner = direction(&grains(x), &grains(y));
            let turned = [-1, 0, 1].map(|k| &corner + &function::turn().scale(&IBig::from(k)));
            assert!(
                turned
                    .iter()
                    .any(|at| at.lo >= &found.lo - IBig::from(9)
                        && at.hi <= &found.hi + IBig::from(9))
            );
            let near = |a: &IBig, b: &IBig| (a - b).max(b - a) < IBig::from(9);
            ends[0] |= turned.iter().any(|at| near(&at.lo, &found.lo));
            ends[1] |= turned.iter().any(|at| near(&at.hi, &found.hi));
        }
        assert_eq!(ends, [true; 2]);
    }
}
