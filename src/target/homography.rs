//! A homography between two planes from point pairs.

use nalgebra::{Matrix3, SMatrix, SymmetricEigen};

/// Homography with `to ~ H (from, 1)` by the normalised direct linear transformation.
///
/// Minimises the algebraic error after both point sets have been moved to their centroid and scaled to a
/// mean distance of √2 (Hartley & Zisserman, Multiple View Geometry, 2nd ed., algorithm 4.2). The last
/// element of the result is 1.
///
/// `None` for fewer than four pairs, for points on one line, and when the origin of `from` maps to infinity.
pub fn homography(pairs: &[([f64; 2], [f64; 2])]) -> Option<[[f64; 3]; 3]> {
    if pairs.len() < 4 {
        return None;
    }
    let from = Normalisation::of(pairs.iter().map(|pair| pair.0))?;
    let to = Normalisation::of(pairs.iter().map(|pair| pair.1))?;
    let mut normal = SMatrix::<f64, 9, 9>::zeros();
    for (source, image) in pairs {
        let ([x, y], [u, v]) = (from.apply(*source), to.apply(*image));
        for row in [
            SMatrix::<f64, 1, 9>::from([[x], [y], [1.0], [0.0], [0.0], [0.0], [-u * x], [-u * y], [-u]]),
            SMatrix::<f64, 1, 9>::from([[0.0], [0.0], [0.0], [x], [y], [1.0], [-v * x], [-v * y], [-v]]),
        ] {
            normal += row.transpose() * row;
        }
    }
    let eigen = SymmetricEigen::new(normal);
    let mut order: Vec<usize> = (0..9).collect();
    order.sort_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
    // A second vanishing eigenvalue: the points do not fix the map.
    if eigen.eigenvalues[order[1]] < 1e-9 * eigen.eigenvalues[order[8]] {
        return None;
    }
    let h = eigen.eigenvectors.column(order[0]);
    let inner = Matrix3::new(h[0], h[1], h[2], h[3], h[4], h[5], h[6], h[7], h[8]);
    let map = to.matrix().try_inverse()? * inner * from.matrix();
    let last = map[(2, 2)];
    if last.abs() < 1e-12 * map.amax() {
        return None;
    }
    let map = map / last;
    map.iter().all(|v| v.is_finite()).then(|| [0, 1, 2].map(|r| [0, 1, 2].map(|c| map[(r, c)])))
}

/// Moves points to their centroid and scales them to a mean distance of √2.
struct Normalisation {
    centre: [f64; 2],
    scale: f64,
}

impl Normalisation {
    fn of(points: impl Iterator<Item = [f64; 2]> + Clone) -> Option<Self> {
        let (n, x, y) = points.clone().fold((0.0, 0.0, 0.0), |(n, x, y), p| (n + 1.0, x + p[0], y + p[1]));
        let centre = [x / n, y / n];
        let distance = points.map(|p| (p[0] - centre[0]).hypot(p[1] - centre[1])).sum::<f64>() / n;
        (distance > 0.0 && distance.is_finite()).then(|| Self { centre, scale: std::f64::consts::SQRT_2 / distance })
    }

    fn apply(&self, p: [f64; 2]) -> [f64; 2] {
        [(p[0] - self.centre[0]) * self.scale, (p[1] - self.centre[1]) * self.scale]
    }

    fn matrix(&self) -> Matrix3<f64> {
        let s = self.scale;
        Matrix3::new(s, 0.0, -s * self.centre[0], 0.0, s, -s * self.centre[1], 0.0, 0.0, 1.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const MAP: [[f64; 3]; 3] = [[61.0, 4.0, 930.0], [-3.0, -58.0, 740.0], [0.012, -0.02, 1.0]];

    fn image(p: [f64; 2]) -> [f64; 2] {
        let [x, y, w] = MAP.map(|row| row[0] * p[0] + row[1] * p[1] + row[2]);
        [x / w, y / w]
    }

    #[test]
    fn a_planted_map_is_found() {
        let pairs: Vec<_> = (-4..5).flat_map(|i| (-3..4).map(move |j| [f64::from(i), f64::from(j)])).map(|p| (p, image(p))).collect();
        let found = homography(&pairs).unwrap();
        for (row, want) in found.iter().zip(MAP) {
            for (got, want) in row.iter().zip(want) {
                assert!((got - want).abs() < 1e-8 * (1.0 + want.abs()), "got {got}, want {want}");
            }
        }
    }

    #[test]
    fn points_on_a_line_fix_nothing() {
        let pairs: Vec<_> = (0..6).map(|i| [f64::from(i), f64::from(i)]).map(|p| (p, image(p))).collect();
        assert!(homography(&pairs).is_none());
        assert!(homography(&pairs[..3]).is_none());
    }
}
