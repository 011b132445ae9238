//! The kernel against plain reasoning on every small system.

use balk_core::certificate::{Combination, Range, Refuted, Row, Term, Unproved};

/// Prints the comparison of every system of up to two rows in two unknowns with small numbers.
///
/// # Panics
/// When the kernel and plain reasoning differ.
pub fn run() {
    let (compared, proofs) = exhaust(-2..=2, &[-1, 0, 2], &[-1, 1], 2);
    println!("| combinations compared | proofs | differences |\n|---|---|---|");
    println!("| {compared} | {proofs} | 0 |");
}

/// What the kernel says of two unknowns.
pub fn kernel(
    rows: &[([i32; 2], Range)],
    multipliers: &[i32],
    boxes: [Range; 2],
) -> Result<Refuted, Unproved> {
    let mut left_overs = [0; 2];
    rows.iter()
        .zip(multipliers)
        .try_fold(
            Combination::new(&mut left_overs),
            |sum, (&([x, y], range), &multiplier)| {
                sum.add(
                    multiplier,
                    Row {
                        terms: &[term(0, x), term(1, y)],
                        range,
                    },
                )
            },
        )?
        .refute(boxes)
}

/// A coefficient of an unknown.
pub fn term(unknown: u16, coefficient: i32) -> Term {
    Term {
        unknown,
        coefficient,
    }
}

/// An inequality `a x + b y <= c`.
type Inequality = [i64; 3];

/// Whether some rational point meets all inequalities, by eliminating x and then y (Fourier, *Analyse des
/// travaux de l'Académie royale des sciences pendant l'année 1824*; Motzkin 1936). Knows nothing of
/// multipliers, boxes or left-overs.
fn has_solution(inequalities: &[Inequality]) -> bool {
    let signs = |position: usize, sign: i64| {
        inequalities
            .iter()
            .filter(move |row| row[position].signum() == sign)
    };
    // Of `b y <= c` keep the tightest on each side as fractions c / |b|.
    let mut upper: Option<(i64, i64)> = None;
    let mut lower: Option<(i64, i64)> = None;
    let mut consistent = true;
    let mut note = |b: i64, c: i64| {
        let tighter = |kept: Option<(i64, i64)>| match kept {
            Some((c0, b0)) if c0 * b.abs() <= c * b0 => kept,
            _ => Some((c, b.abs())),
        };
        match b.signum() {
            0 => consistent &= 0 <= c,
            1 => upper = tighter(upper),
            _ => lower = tighter(lower),
        }
    };
    for &[_, b, c] in signs(0, 0) {
        note(b, c);
    }
    for &[a1, b1, c1] in signs(0, 1) {
        for &[a2, b2, c2] in signs(0, -1) {
            note(b1 * -a2 + b2 * a1, c1 * -a2 + c2 * a1);
        }
    }
    // y <= c1 / b1 and -y <= c2 / b2.
    consistent
        && !matches!((upper, lower), (Some((c1, b1)), Some((c2, b2))) if c1 * b2 + c2 * b1 < 0)
}

fn inequalities([a, b]: [i32; 2], range: Range) -> impl Iterator<Item = Inequality> {
    let (a, b) = (i64::from(a), i64::from(b));
    range
        .upper
        .map(|upper| [a, b, upper])
        .into_iter()
        .chain(range.lower.map(|lower| [-a, -b, -lower]))
}

/// All ranges with ends among `ends` or open.
fn ranges(ends: &[i64]) -> Vec<Range> {
    let sides = || core::iter::once(None).chain(ends.iter().copied().map(Some));
    sides()
        .flat_map(|lower| sides().map(move |upper| Range { lower, upper }))
        .collect()
}

/// Compares the kernel with plain reasoning on all systems of up to two rows in two unknowns with these
/// numbers. Returns how many combinations were compared and how many were proofs.
pub fn exhaust(
    coefficients: core::ops::RangeInclusive<i32>,
    sides: &[i64],
    ends: &[i64],
    largest: i32,
) -> (u64, u64) {
    let linear: Vec<[i32; 2]> = coefficients
        .clone()
        .flat_map(|x| coefficients.clone().map(move |y| [x, y]))
        .collect();
    let rows: Vec<([i32; 2], Range)> = linear
        .iter()
        .flat_map(|&linear| ranges(sides).into_iter().map(move |range| (linear, range)))
        .collect();
    let boxes: Vec<[Range; 2]> = ranges(ends)
        .into_iter()
        .flat_map(|x| ranges(ends).into_iter().map(move |y| [x, y]))
        .collect();
    let (mut compared, mut proofs) = (0, 0);
    // The order of the rows does not matter, and a row with multiplier 0 is a system of one row.
    for (index, &first) in rows.iter().enumerate() {
        for &second in &rows[..=index] {
            for &boxes in &boxes {
                let in_box: Vec<Inequality> = inequalities([1, 0], boxes[0])
                    .chain(inequalities([0, 1], boxes[1]))
                    .collect();
                let mut all = in_box.clone();
                all.extend(inequalities(first.0, first.1).chain(inequalities(second.0, second.1)));
                let (solvable, box_solvable) = (has_solution(&all), has_solution(&in_box));
                for multipliers in
                    (-largest..=largest).flat_map(|u| (-largest..=largest).map(move |v| [u, v]))
                {
                    let answer = kernel(&[first, second], &multipliers, boxes);
                    compared += 1;
                    proofs += u64::from(answer.is_ok());
                    assert!(
                        answer.is_err() || !solvable,
                        "{first:?} {second:?} {boxes:?} {multipliers:?}"
                    );
                    let Some(combined) = combine([first, second], multipliers) else {
                        assert_eq!(answer.unwrap_err(), Unproved::MissingSide);
                        continue;
                    };
                    let mut with_box = in_box.clone();
                    with_box.push(combined);
                    let impossible = !has_solution(&with_box);
                    // In an empty box everything is impossible, and the kernel need not notice.
                    assert!(
                        !box_solvable || answer.is_ok() == impossible,
                        "{first:?} {second:?} {boxes:?} {multipliers:?}"
                    );
                }
            }
        }
    }
    (compared, proofs)
}

/// The sum of the rows times the multipliers, if they have the sides.
fn combine(rows: [([i32; 2], Range); 2], multipliers: [i32; 2]) -> Option<Inequality> {
    let mut sum = [0; 3];
    for (([a, b], range), multiplier) in rows.into_iter().zip(multipliers) {
        if multiplier != 0 {
            let side = if multiplier > 0 {
                range.upper?
            } else {
                range.lower?
            };
            for (sum, value) in sum.iter_mut().zip([i64::from(a), i64::from(b), side]) {
                *sum += i64::from(multiplier) * value;
            }
        }
    }
    Some(sum)
}
