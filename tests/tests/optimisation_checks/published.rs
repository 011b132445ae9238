//! The programs of `tests/data/lp` and ways to a certificate for each.

use balk_core::certificate::{Range, Refuted, Unproved};
use balk_core::simplex::{Outcome, Real, Simplex};
use serde::Deserialize;

use crate::double::Double;
use balk_tests::measure::simplex::{OwnedRow, System};

#[derive(Deserialize)]
struct Matrix {
    rows: usize,
    entries: Vec<(usize, usize, f64)>,
}

#[derive(Deserialize)]
struct Program {
    c: Vec<f64>,
    #[serde(rename = "A_ub")]
    upper_matrix: Matrix,
    #[serde(rename = "b_ub")]
    upper_sides: Vec<f64>,
    #[serde(rename = "A_eq")]
    equal_matrix: Matrix,
    #[serde(rename = "b_eq")]
    equal_sides: Vec<f64>,
    bounds: Vec<(f64, Option<f64>)>,
}

/// Reads a program, each row times the least number that makes it integer.
pub fn read(name: &str) -> System {
    let path = format!("{}/data/lp/{name}.json", env!("CARGO_MANIFEST_DIR"));
    let program: Program = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let boxes = if program.bounds.is_empty() {
        vec![Range::at_least(0); program.c.len()]
    } else {
        let whole = |end: f64| hundredths(end) / 100;
        let range = |&(lower, upper): &(f64, Option<f64>)| Range {
            lower: Some(whole(lower)),
            upper: upper.map(whole),
        };
        program.bounds.iter().map(range).collect()
    };
    let upper = rows(&program.upper_matrix, &program.upper_sides, Range::at_most);
    let equal = rows(&program.equal_matrix, &program.equal_sides, Range::exactly);
    System {
        boxes,
        rows: upper.into_iter().chain(equal).collect(),
    }
}

fn rows(matrix: &Matrix, sides: &[f64], range: impl Fn(i64) -> Range) -> Vec<OwnedRow> {
    assert_eq!(matrix.rows, sides.len());
    let row = |(row, &side): (usize, &f64)| {
        let entries = matrix.entries.iter().filter(|entry| entry.0 == row);
        let terms: Vec<_> = entries
            .map(|&(_, column, value)| (column, hundredths(value)))
            .collect();
        let side = hundredths(side);
        let divisor = terms
            .iter()
            .map(|term| term.1)
            .chain([side, 100])
            .fold(0, greatest_common_divisor);
        let terms = terms
            .iter()
            .map(|&(column, value)| (column, i32::try_from(value / divisor).unwrap()));
        OwnedRow::new(terms, range(side / divisor))
    };
    sides.iter().enumerate().map(row).collect()
}

/// A decimal of at most two places times 100, exactly.
fn hundredths(value: f64) -> i64 {
    let hundredths = (value * 100.0).round();
    assert_eq!(hundredths / 100.0, value, "more than two places");
    hundredths as i64
}

fn greatest_common_divisor(a: i64, b: i64) -> i64 {
    if b == 0 {
        a.abs()
    } else {
        greatest_common_divisor(b, a % b)
    }
}

/// What the simplex proposes, put straight to the kernel.
pub fn direct<F: Real>(system: &System) -> Result<Refuted, Unproved> {
    let simplex = solved::<F>(system);
    let mut multipliers = vec![0; system.rows.len()];
    simplex.multipliers(&mut multipliers);
    system.prove(&multipliers)
}

/// The double-precision conflict times the number that brings all multipliers closest to integers.
///
/// With unbounded unknowns every left-over must have the right sign, which rounding spoils. A conflict
/// belongs to a basis, so its multipliers are rational, often with a small common denominator.
pub fn common_denominator(system: &System) -> Result<Refuted, Unproved> {
    let simplex = solved::<f64>(system);
    let least = simplex
        .conflict()
        .map(|(_, value)| value.abs())
        .filter(|&value| value > 1e-9)
        .fold(f64::MAX, f64::min);
    let distance = |factor: f64| {
        simplex
            .conflict()
            .map(|(_, value)| value / least * factor)
            .map(|value| (value - value.round()).abs())
            .fold(0.0, f64::max)
    };
    let factor = (1..=1000)
        .map(f64::from)
        .min_by(|&a, &b| distance(a).total_cmp(&distance(b)))
        .unwrap();
    let mut multipliers = vec![0; system.rows.len()];
    for (row, value) in simplex.conflict() {
        multipliers[row] = (value / least * factor).round() as i32;
    }
    system.prove(&multipliers)
}

fn solved<F: Real>(system: &System) -> Box<Simplex<66, 95, F>> {
    let mut simplex = Box::new(Simplex::new());
    system.load(&mut simplex);
    let _ = simplex.solve(5000);
    simplex
}

/// Multipliers that lie inside the cone of certificates, so that rounding keeps every left-over on the
/// right side: a solution of "every left-over is at least the sum of its column, and the combined right
/// side is negative by as much". Needs all unknowns `>= 0`.
pub fn interior(system: &System) -> Result<Refuted, Unproved> {
    const SIZE: i64 = 1 << 44;
    let system = bounds_as_rows(system);
    let mut columns = vec![Vec::new(); system.boxes.len() + 1];
    let last = system.boxes.len();
    for (index, row) in system.rows.iter().enumerate() {
        for term in &row.terms {
            columns[usize::from(term.unknown)].push((index, term.coefficient));
        }
        columns[last].push((index, i32::try_from(-row.range.upper.unwrap()).unwrap()));
    }
    let boxes = system.rows.iter().map(|row| match row.range.lower {
        Some(_) => Range::between(-SIZE, SIZE),
        None => Range::between(0, SIZE),
    });
    let rows = columns.iter().map(|column| {
        let sum = column
            .iter()
            .map(|&(_, coefficient)| i64::from(coefficient.abs()))
            .sum();
        OwnedRow::new(column.iter().copied(), Range::at_least(sum))
    });
    let dual = System {
        boxes: boxes.collect(),
        rows: rows.collect(),
    };
    let mut simplex = Box::new(Simplex::<96, 128, Double>::new());
    dual.load(&mut simplex);
    assert_eq!(
        simplex.solve(20_000),
        Outcome::Feasible,
        "no certificate has room for rounding"
    );
    let value = |index| simplex.value(index).unwrap().to_i64();
    prove_wide(
        &system,
        &(0..system.rows.len()).map(value).collect::<Vec<_>>(),
    )
}

/// Upper ends of boxes stated as rows, so that every unknown is only `>= 0`.
fn bounds_as_rows(system: &System) -> System {
    let upper = system
        .boxes
        .iter()
        .enumerate()
        .filter_map(|(unknown, range)| {
            assert_eq!(range.lower, Some(0));
            range
                .upper
                .map(|upper| OwnedRow::new([(unknown, 1)], Range::at_most(upper)))
        });
    let rows = system.rows.iter().cloned().chain(upper).collect();
    System {
        boxes: vec![Range::at_least(0); system.boxes.len()],
        rows,
    }
}

/// Multipliers beyond 32 bits, as two digits: of a row, and of the same row times 2^15.
fn prove_wide(system: &System, multipliers: &[i64]) -> Result<Refuted, Unproved> {
    const RADIX: i64 = 1 << 15;
    let times = |side: Option<i64>| side.map(|side| side * RADIX);
    let scaled = system.rows.iter().map(|row| {
        let terms = row.terms.iter().map(|term| {
            (
                usize::from(term.unknown),
                i32::try_from(i64::from(term.coefficient) * RADIX).unwrap(),
            )
        });
        OwnedRow::new(
            terms,
            Range {
                lower: times(row.range.lower),
                upper: times(row.range.upper),
            },
        )
    });
    let wide = System {
        boxes: system.boxes.clone(),
        rows: system.rows.iter().cloned().chain(scaled).collect(),
    };
    let low = multipliers.iter().map(|multiplier| multiplier % RADIX);
    let high = multipliers.iter().map(|multiplier| multiplier / RADIX);
    let digits: Vec<i32> = low
        .chain(high)
        .map(|digit| i32::try_from(digit).unwrap())
        .collect();
    wide.prove(&digits)
}
