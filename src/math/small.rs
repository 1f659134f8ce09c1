//! Small dense complex systems by Gaussian elimination with partial pivoting.
//!
//! Given a square matrix row by row and a right-hand side, gives the solution; for a few dozen unknowns.
//!
//! Source: textbook (Golub and Van Loan, Matrix Computations, section 3.4, from memory).

use num_complex::Complex64;

/// Solves `matrix x = rhs`; none if a pivot vanishes. `matrix` holds rhs.len() rows.
pub fn solve(mut matrix: Vec<Complex64>, mut rhs: Vec<Complex64>) -> Option<Vec<Complex64>> {
    let n = rhs.len();
    for pivot in 0..n {
        let size = |row: &usize| matrix[row * n + pivot].norm_sqr();
        let best = (pivot..n).max_by(|a, b| size(a).total_cmp(&size(b)))?;
        if matrix[best * n + pivot] == Complex64::default() {
            return None;
        }
        if best != pivot {
            (0..n).for_each(|column| matrix.swap(best * n + column, pivot * n + column));
            rhs.swap(best, pivot);
        }
        for row in pivot + 1..n {
            let factor = matrix[row * n + pivot] / matrix[pivot * n + pivot];
            for column in pivot..n {
                let change = factor * matrix[pivot * n + column];
                matrix[row * n + column] -= change;
            }
            let change = factor * rhs[pivot];
            rhs[row] -= change;
        }
    }
    for row in (0..n).rev() {
        let known: Complex64 = (row + 1..n).map(|column| matrix[row * n + column] * rhs[column]).sum();
        rhs[row] = (rhs[row] - known) / matrix[row * n + row];
    }
    Some(rhs)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn solution_satisfies_the_system() {
        let n = 7;
        let entry = |i: usize| Complex64::new(((i * i) as f64).sin(), (3.0 * i as f64).cos());
        let matrix: Vec<Complex64> = (0..n * n).map(entry).collect();
        let rhs: Vec<Complex64> = (0..n).map(|i| entry(100 + i)).collect();
        let x = solve(matrix.clone(), rhs.clone()).unwrap();
        for row in 0..n {
            let sum: Complex64 = (0..n).map(|column| matrix[row * n + column] * x[column]).sum();
            assert!((sum - rhs[row]).norm() < 1e-12);
        }
        assert!(solve(vec![Complex64::default(); 4], rhs[..2].to_vec()).is_none());
    }
}
