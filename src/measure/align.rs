//! One basis per sample: photos of the same sample are indexed on their own, so each may have chosen other vectors for the same lattice.

use super::{assemble::assignment, orders::Ordered};
use crate::{bench::Bench, lattice::Shape};

/// Re-expresses the orders of every photo in the basis of the first photo of its sample.
pub(super) fn to_common_bases(ordered: &mut [Ordered], bench: &Bench) {
    for photo in 1..ordered.len() {
        let sample = assignment(bench, photo).sample;
        let Some(first) = (0..photo).find(|&earlier| assignment(bench, earlier).sample == sample) else { continue };
        let ratio = bench.lasers[assignment(bench, first).laser].wavelength_m.value
            / bench.lasers[assignment(bench, photo).laser].wavelength_m.value;
        let target = ordered[first]
            .indexed
            .g
            .map(|g| turned(g, assignment(bench, photo).sample_turn_rad - assignment(bench, first).sample_turn_rad));
        let shape = ordered[first].indexed.shape;
        let indexed = &mut ordered[photo].indexed;
        let own = indexed.g.map(|g| g.map(|component| component * ratio));
        let Some(change) = whole_change(shape, target, own) else { continue };
        let renamed = |(h, k): (i32, i32)| (change[0][0] * h + change[0][1] * k, change[1][0] * h + change[1][1] * k);
        for order in indexed.order.iter_mut().flatten() {
            *order = renamed(*order);
        }
        indexed.g = target.map(|g| g.map(|component| component / ratio));
    }
}

fn turned([x, y]: [f64; 2], turn_rad: f64) -> [f64; 2] {
    let (sine, cosine) = turn_rad.sin_cos();
    [cosine * x - sine * y, sine * x + cosine * y]
}

/// Whole-number matrix M with `own_j = Σ_i target_i M_ij`; `None` when the two do not describe one lattice.
#[expect(clippy::cast_possible_truncation, reason = "checked to be within ±0.2 of small whole numbers")]
fn whole_change(shape: Shape, target: [[f64; 2]; 2], own: [[f64; 2]; 2]) -> Option<[[i32; 2]; 2]> {
    let dot = |a: [f64; 2], b: [f64; 2]| a[0] * b[0] + a[1] * b[1];
    if shape == Shape::Line {
        let ratio = dot(own[0], target[0]) / dot(target[0], target[0]);
        return (ratio.abs() < 50.0 && (ratio - ratio.round()).abs() < 0.2).then(|| [[ratio.round() as i32, 0], [0, 1]]);
    }
    let area = target[0][0] * target[1][1] - target[0][1] * target[1][0];
    let along = |g: [f64; 2]| [(g[0] * target[1][1] - g[1] * target[1][0]) / area, (target[0][0] * g[1] - target[0][1] * g[0]) / area];
    let columns = own.map(along);
    let whole = |value: f64| (value.abs() < 50.0 && (value - value.round()).abs() < 0.2).then(|| value.round() as i32);
    Some([[whole(columns[0][0])?, whole(columns[1][0])?], [whole(columns[0][1])?, whole(columns[1][1])?]])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn swapped_and_combined_vectors_are_recognised() {
        let target = [[0.10, 0.01], [-0.02, 0.12]];
        let own = [target[1], [target[0][0] + target[1][0], target[0][1] + target[1][1]]];
        assert_eq!(whole_change(Shape::Plane, target, own), Some([[0, 1], [1, 1]]));
    }

    #[test]
    fn another_lattice_is_not_forced() {
        assert_eq!(whole_change(Shape::Plane, [[0.1, 0.0], [0.0, 0.1]], [[0.15, 0.0], [0.0, 0.1]]), None);
    }

    #[test]
    fn a_line_may_be_numbered_backwards() {
        assert_eq!(whole_change(Shape::Line, [[0.1, 0.0], [0.0; 2]], [[-0.101, 0.001], [0.0; 2]]), Some([[-1, 0], [0, 1]]));
    }
}
