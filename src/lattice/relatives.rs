//! Relatives of a lattice: the nets of index 2 and 3 that are denser or coarser. The silent factor-two error is a step between them.

use super::{
    cell::{Cell, norm, reduce},
    grow::{Growth, Scene, Start, grow},
    warp::Warp,
};

/// Integer rows (Hermite normal form) of every sublattice of index 2 and 3 of a plane lattice.
const PLANE: [[[f64; 2]; 2]; 7] = [
    [[2.0, 0.0], [0.0, 1.0]],
    [[1.0, 0.0], [0.0, 2.0]],
    [[1.0, 1.0], [0.0, 2.0]],
    [[3.0, 0.0], [0.0, 1.0]],
    [[1.0, 0.0], [0.0, 3.0]],
    [[1.0, 1.0], [0.0, 3.0]],
    [[1.0, 2.0], [0.0, 3.0]],
];

/// Starts for every relative of index 2 and 3, denser and coarser, from the given node.
pub(super) fn relative_starts(warp: &Warp, node: (i32, i32), line: bool, sd: f64) -> Vec<Start> {
    let (h, k) = (f64::from(node.0), f64::from(node.1));
    let (origin, g) = (warp.place(h, k), warp.steps(h, k));
    if line {
        let step = |n: f64| [[g[0][0] * n, g[0][1] * n], [0.0; 2]];
        return [2.0, 3.0, 0.5, 1.0 / 3.0].map(|n| Start { origin, steps: step(n), sd, line }).to_vec();
    }
    let coarser = PLANE.iter().map(|m| times(m, g));
    let denser = PLANE.iter().map(|m| times(&transposed_inverse(m), g));
    coarser.chain(denser).filter_map(|steps| reduced_start(origin, steps, sd)).collect()
}

/// The reduced start for a plane basis.
pub(super) fn reduced_start(origin: [f64; 2], steps: [[f64; 2]; 2], sd: f64) -> Option<Start> {
    let cell = reduce(&Cell { a: steps[0], b: steps[1] }).ok()?.cell;
    Some(Start { origin, steps: [cell.a, cell.b], sd, line: false })
}

/// Grows from the node nearest to the middle again, on the reduced basis of the map there.
pub(super) fn regrow(scene: &Scene<'_>, growth: &Growth, among: &[usize], node: (i32, i32)) -> Option<Growth> {
    let warp = &growth.fit.warp;
    let steps = super::seed::steps_of(warp, node);
    let origin = warp.place(f64::from(node.0), f64::from(node.1));
    let sd = warp.variance(f64::from(node.0) + 1.0, f64::from(node.1)).sqrt().max(0.01 * norm(steps[0]));
    let start = if growth.line { Start { origin, steps, sd, line: true } } else { reduced_start(origin, steps, sd)? };
    grow(scene, among, &start)
}

fn times(m: &[[f64; 2]; 2], g: [[f64; 2]; 2]) -> [[f64; 2]; 2] {
    let row = |r: [f64; 2]| [r[0] * g[0][0] + r[1] * g[1][0], r[0] * g[0][1] + r[1] * g[1][1]];
    [row(m[0]), row(m[1])]
}

/// Inverse transpose: runs over all superlattices as m runs over all sublattices.
fn transposed_inverse(m: &[[f64; 2]; 2]) -> [[f64; 2]; 2] {
    let det = m[0][0] * m[1][1] - m[0][1] * m[1][0];
    [[m[1][1] / det, -m[1][0] / det], [-m[0][1] / det, m[0][0] / det]]
}
