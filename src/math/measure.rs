//! Gauss quadrature for a measure of many weighted points: a few points that stand for all of them.
//!
//! Given points (x, weight >= 0), gives n nodes inside their range with positive weights that sum to the same total
//! and integrate every polynomial up to degree 2n - 1 as the full sum does.
//!
//! Model: the Stieltjes procedure on the points scaled to [-1, 1] gives the recurrence of their orthogonal polynomials
//! p_(k+1) = (x - a_k) p_k - b_k p_(k-1); the nodes are the eigenvalues of the symmetric tridiagonal matrix with
//! diagonal a_k and off-diagonal sqrt(b_k), bisected with Sturm's count of sign changes; the weights are the
//! Christoffel numbers 1 / sum_k p_k(x)^2 / norm_k.
//!
//! Source: W. Gautschi, Orthogonal Polynomials: Computation and Approximation, 2004, sections 1.3 and 2.2 (from
//! memory); G. Golub and J. Welsch, Mathematics of Computation 23, 1969 (from memory).
//!
//! Checked by: the tests below, on moments of random points and against Gauss-Legendre nodes.

/// Below this part of the largest possible value a squared norm is rounding: the points are used up.
const EXHAUSTED: f64 = 1e-28;

/// At most `count` nodes with weights that stand for `points`, in rising order.
pub fn gauss_rule(points: &[(f64, f64)], count: usize) -> Vec<(f64, f64)> {
    let live = || points.iter().filter(|point| point.1 > 0.0);
    let low = live().fold(f64::INFINITY, |low, point| low.min(point.0));
    let high = live().fold(f64::NEG_INFINITY, |high, point| high.max(point.0));
    let total: f64 = live().map(|point| point.1).sum();
    if count == 0 || total <= 0.0 {
        return Vec::new();
    }
    let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
    if half <= 0.0 {
        return vec![(middle, total)];
    }
    let scaled: Vec<(f64, f64)> = live().map(|&(x, w)| ((x - middle) / half, w / total)).collect();
    let rule = recurrence(&scaled, count);
    let mut nodes: Vec<(f64, f64)> = (0..rule.diagonal.len())
        .map(|index| {
            let x = rule.root(index);
            (x, rule.christoffel(x))
        })
        .collect();
    // The weights sum to 1 but for rounding; the power must not depend on it.
    let sum: f64 = nodes.iter().map(|node| node.1).sum();
    for node in &mut nodes {
        *node = ((middle + half * node.0).clamp(low, high), node.1 * (total / sum));
    }
    nodes
}

/// Recurrence of the orthonormal polynomials of a measure with unit mass on [-1, 1].
struct Recurrence {
    diagonal: Vec<f64>,
    /// b_k for k >= 1; the first entry belongs to row 1.
    squares: Vec<f64>,
}

fn recurrence(points: &[(f64, f64)], count: usize) -> Recurrence {
    let mut before = vec![0.0; points.len()];
    let mut here = vec![1.0; points.len()];
    let (mut diagonal, mut squares) = (Vec::new(), Vec::new());
    for _ in 0..count.min(points.len()) {
        // `here` is orthonormal, so its mean of x is the diagonal entry.
        let a: f64 = points.iter().zip(&here).map(|(&(x, w), p)| w * x * p * p).sum();
        diagonal.push(a);
        let b_root = squares.last().map_or(0.0, |b: &f64| b.sqrt());
        let mut norm = 0.0;
        for ((&(x, w), p), q) in points.iter().zip(&mut here).zip(&mut before) {
            let next = (x - a) * *p - b_root * *q;
            *q = *p;
            *p = next;
            norm += w * next * next;
        }
        if norm < EXHAUSTED {
            break;
        }
        squares.push(norm);
        let scale = 1.0 / norm.sqrt();
        here.iter_mut().for_each(|p| *p *= scale);
    }
    squares.truncate(diagonal.len().saturating_sub(1));
    Recurrence { diagonal, squares }
}

impl Recurrence {
    /// Number of eigenvalues below `x`.
    fn below(&self, x: f64) -> usize {
        let mut pivot = 1.0;
        let mut count = 0;
        for (k, a) in self.diagonal.iter().enumerate() {
            let b = if k == 0 { 0.0 } else { self.squares[k - 1] };
            pivot = a - x - b / pivot;
            if pivot == 0.0 {
                pivot = f64::MIN_POSITIVE;
            }
            count += usize::from(pivot < 0.0);
        }
        count
    }

    /// The eigenvalue with `index` others below it.
    fn root(&self, index: usize) -> f64 {
        let (mut low, mut high) = (-1.0 - 1e-12, 1.0 + 1e-12);
        for _ in 0..80 {
            let middle = 0.5 * (low + high);
            if middle <= low || middle >= high {
                break;
            }
            if self.below(middle) > index { high = middle } else { low = middle }
        }
        0.5 * (low + high)
    }

    fn christoffel(&self, x: f64) -> f64 {
        let (mut before, mut here, mut sum) = (0.0, 1.0, 0.0);
        for k in 0..self.diagonal.len() {
            sum += here * here;
            let back = if k == 0 { 0.0 } else { self.squares[k - 1].sqrt() };
            if let Some(forward) = self.squares.get(k) {
                (before, here) = (here, ((x - self.diagonal[k]) * here - back * before) / forward.sqrt());
            }
        }
        1.0 / sum
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::quadrature::legendre;
    use proptest::prelude::*;

    #[test]
    fn a_fine_uniform_measure_gives_legendre_nodes() {
        // The midpoint rule with 20000 points has moments within 1e-9 of the continuous ones.
        let n = 20_000;
        let points: Vec<_> = (0..n).map(|i| (-1.0 + (2 * i + 1) as f64 / n as f64, 2.0 / n as f64)).collect();
        for count in [1, 2, 5, 9] {
            for (got, want) in gauss_rule(&points, count).iter().zip(legendre(count)) {
                assert!((got.0 - want.0).abs() < 1e-7, "{count}: node {} against {}", got.0, want.0);
                assert!((got.1 - want.1).abs() < 1e-7, "{count}: weight {} against {}", got.1, want.1);
            }
        }
    }

    #[test]
    fn few_points_come_back_as_they_are() {
        let points = [(3.0, 0.5), (1.0, 2.0), (2.0, 0.0), (7.0, 0.25)];
        let got = gauss_rule(&points, 8);
        assert_eq!(got.len(), 3);
        for (got, want) in got.iter().zip([(1.0, 2.0), (3.0, 0.5), (7.0, 0.25)]) {
            assert!((got.0 - want.0).abs() < 1e-12 && (got.1 - want.1).abs() < 1e-12, "{got:?} {want:?}");
        }
        assert!(gauss_rule(&[], 4).is_empty());
        assert!(gauss_rule(&[(1.0, 0.0)], 4).is_empty());
    }

    proptest! {
        #[test]
        fn moments_match(points in prop::collection::vec((-5.0..9.0f64, 1e-9..1.0f64), 12..200), count in 1usize..8) {
            let rule = gauss_rule(&points, count);
            let total: f64 = points.iter().map(|p| p.1).sum();
            for degree in 0..2 * count {
                let power = |x: f64| ((x - 2.0) / 7.0).powi(degree as i32);
                let want: f64 = points.iter().map(|p| p.1 * power(p.0)).sum();
                let got: f64 = rule.iter().map(|p| p.1 * power(p.0)).sum();
                prop_assert!((got - want).abs() < 1e-11 * total, "degree {degree}: {got} against {want}");
            }
            prop_assert!(rule.iter().all(|p| p.1 > 0.0));
        }
    }
}
