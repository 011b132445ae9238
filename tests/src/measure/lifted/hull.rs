//! Cuts of the convex hull of the rotations.
//!
//! `R` lies in the hull of the rotation group exactly when `trace(Q^T R) >= -1` for every rotation
//! `Q`, that is when a symmetric 4x4 matrix linear in `R` is positive semidefinite; the worst `Q` is
//! the unit quaternion of its least eigenvalue (Saunderson, Parrilo and Willsky, *Semidefinite
//! descriptions of the convex hull of rotation matrices*, SIAM Journal on Optimization 25(3), 2015,
//! 1314-1343). The eigenvector is only proposed; the cut of any quaternion is exact.

/// Squared length and rotation matrix times it, of an integer quaternion (w, x, y, z).
///
/// Components at most 2^14 in size keep every entry within 2^30.
pub fn rotation([w, x, y, z]: [i32; 4]) -> (i32, [[i32; 3]; 3]) {
    let norm = w * w + x * x + y * y + z * z;
    let matrix = [
        [
            w * w + x * x - y * y - z * z,
            2 * (x * y - w * z),
            2 * (x * z + w * y),
        ],
        [
            2 * (x * y + w * z),
            w * w - x * x + y * y - z * z,
            2 * (y * z - w * x),
        ],
        [
            2 * (x * z - w * y),
            2 * (y * z + w * x),
            w * w - x * x - y * y + z * z,
        ],
    ];
    (norm, matrix)
}

/// `|q|^2 (1 + trace(Q^T R))` for a matrix in units of one.
fn measure(q: [i32; 4], matrix: &[[f32; 3]; 3]) -> f32 {
    let (norm, rotation) = rotation(q);
    let trace: f32 = rotation
        .iter()
        .flatten()
        .zip(matrix.iter().flatten())
        .map(|(&a, &b)| a as f32 * b)
        .sum();
    norm as f32 + trace
}

/// The quaternion, components at most 2^14 in size, whose cut the matrix violates most, roughly.
pub fn worst(matrix: &[[f32; 3]; 3]) -> [i32; 4] {
    let unit = |i: usize, j: usize| {
        let mut q = [0; 4];
        q[i] = 1;
        q[j] = 1;
        q
    };
    // The shift exceeds every eigenvalue, so powers of the difference single out the least one.
    let mut power = [[0f32; 4]; 4];
    for i in 0..4 {
        for j in 0..4 {
            let own = measure(unit(i, j), matrix);
            power[i][j] = if i == j {
                8.0 - own
            } else {
                -0.5 * (own - measure(unit(i, i), matrix) - measure(unit(j, j), matrix))
            };
        }
    }
    for _ in 0..9 {
        let mut next = [[0f32; 4]; 4];
        let mut largest = f32::MIN_POSITIVE;
        for (i, row) in next.iter_mut().enumerate() {
            for (j, entry) in row.iter_mut().enumerate() {
                *entry = (0..4).map(|k| power[i][k] * power[k][j]).sum();
                largest = largest.max(entry.abs());
            }
        }
        power = next.map(|row| row.map(|entry| entry / largest));
    }
    // Every column is nearly a multiple of the eigenvector; the one with the largest diagonal is
    // the longest.
    let longest = (0..4)
        .max_by(|&a, &b| power[a][a].total_cmp(&power[b][b]))
        .unwrap_or(0);
    let column = [0, 1, 2, 3].map(|i| power[i][longest]);
    let largest = column.iter().fold(f32::MIN_POSITIVE, |m, c| m.max(c.abs()));
    column.map(|c| (c / largest * 8191.0) as i32)
}
