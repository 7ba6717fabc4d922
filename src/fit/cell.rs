//! Values that follow from the parameters, each with its gradient: pitches, lattice angle, orientation, distances, leans.

use super::{
    model::Shape,
    observation::Knowledge,
    parameter::{Layout, Parameter},
};
use crate::{frames::Side, lattice, math::rotation::rotation_from_vector};
use nalgebra::{Const, Matrix3, U1};
use num_dual::{DualNum, DualSVec64};

/// A derived value and its slope against each parameter that it depends on (by place in the layout).
#[derive(Debug, Clone, PartialEq)]
pub struct Derived {
    /// Value, SI.
    pub value: f64,
    /// Place of a parameter and the derivative.
    pub slopes: Vec<(usize, f64)>,
}

/// The reduced cell of a sample.
#[derive(Debug, Clone, PartialEq)]
pub struct Cell {
    /// Pitch of a line grating, or the lengths of the two shortest lattice vectors, shortest first, m.
    pub pitch_m: Vec<Derived>,
    /// Angle between the two vectors, folded to 90°..120°, rad; `None` for a line grating.
    pub angle_rad: Option<Derived>,
    /// Direction of the first vector (of the grating vector for a line grating) against the print's X, counter-clockwise for the viewer, in (-90°, 90°], rad.
    pub orientation_rad: Derived,
    /// Distance of neighbouring rows, 1/|g|, of the rows that run along the second and along the first vector, m; for a line grating the pitch.
    pub row_spacing_m: Vec<Derived>,
    /// Area of the primitive cell, m²; `None` for a line grating.
    pub area_m2: Option<Derived>,
    /// The two vectors along x_s, y_s, m; one for a line grating (along its grating vector).
    pub vectors_m: Vec<[f64; 2]>,
    /// The two vectors in terms of the direct basis of the lattice parameters.
    pub(super) combinations: [[i64; 2]; 2],
}

type D5 = DualSVec64<5>;

/// Reduced cell of a sample at the given parameter values; `None` for a degenerate lattice.
#[must_use]
pub fn cell(layout: &Layout, shape: &Shape, values: &[f64], sample: usize) -> Option<Cell> {
    cell_along(layout, shape, values, sample, None)
}

/// [`cell`] with given combinations of the basis in place of the reduced ones: near a hexagonal or square lattice the shortest vectors
/// swap at the slightest change of the parameters, and a distribution must follow one pair.
pub(super) fn cell_along(
    layout: &Layout,
    shape: &Shape,
    values: &[f64],
    sample: usize,
    combinations: Option<[[i64; 2]; 2]>,
) -> Option<Cell> {
    let lattice = |vector, axis| layout.place(Parameter::Lattice { sample, vector, axis });
    let places = [lattice(0, 0), lattice(0, 1), lattice(1, 0), lattice(1, 1), layout.place(Parameter::PrintTurn)];
    let v: [D5; 5] = std::array::from_fn(|i| {
        let number = D5::from_re(places[i].map_or(0.0, |place| values[place]));
        if places[i].is_some() { number.derivative(i) } else { number }
    });
    let derived = |number: D5| gather(number, &places);
    let orientation = |vector: [D5; 2]| {
        let r = match shape.seen_from {
            Side::Front => -vector[0],
            Side::Behind => vector[0],
        };
        let angle = vector[1].atan2(r) - v[4];
        let mut gathered = derived(angle);
        gathered.value = folded_to_half_turn(gathered.value);
        gathered
    };
    if places[2].is_none() {
        let g = [v[0], v[1]];
        let density_squared = g[0] * g[0] + g[1] * g[1];
        let pitch = density_squared.sqrt().recip();
        let vector = g.map(|component| (component / density_squared).re);
        return Some(Cell {
            pitch_m: vec![derived(pitch)],
            angle_rad: None,
            orientation_rad: orientation(g),
            row_spacing_m: vec![derived(pitch)],
            area_m2: None,
            vectors_m: vec![vector],
            combinations: [[1, 0], [0, 1]],
        });
    }
    let basis = direct([v[0], v[1]], [v[2], v[3]])?;
    let combinations = combinations.or_else(|| reduced(basis))?;
    #[expect(clippy::cast_precision_loss, reason = "reduction integers are far below 2^53")]
    let [a, b]: [[D5; 2]; 2] = combinations.map(|[m, n]| std::array::from_fn(|axis| basis[0][axis] * m as f64 + basis[1][axis] * n as f64));
    let length = |vector: [D5; 2]| (vector[0] * vector[0] + vector[1] * vector[1]).sqrt();
    let signed_area = a[0] * b[1] - a[1] * b[0];
    let area = if signed_area.re < 0.0 { -signed_area } else { signed_area };
    let angle = area.atan2(a[0] * b[0] + a[1] * b[1]);
    Some(Cell {
        row_spacing_m: vec![derived(area / length(b)), derived(area / length(a))],
        area_m2: Some(derived(area)),
        pitch_m: vec![derived(length(a)), derived(length(b))],
        angle_rad: Some(derived(angle)),
        orientation_rad: orientation(a),
        vectors_m: vec![a.map(|c| c.re), b.map(|c| c.re)],
        combinations,
    })
}

/// Direct basis of a reciprocal one: `a_i · g_j = δ_ij`.
fn direct<D: DualNum<f64> + Copy>(g1: [D; 2], g2: [D; 2]) -> Option<[[D; 2]; 2]> {
    let area = g1[0] * g2[1] - g1[1] * g2[0];
    if area.re().abs() < 1e-300 {
        return None;
    }
    Some([[g2[1] / area, -g2[0] / area], [-g1[1] / area, g1[0] / area]])
}

/// Lagrange-Gauss reduction: the combinations that give the two shortest vectors, shortest first, 90° or more apart.
fn reduced(basis: [[D5; 2]; 2]) -> Option<[[i64; 2]; 2]> {
    let [a, b] = basis.map(|vector| vector.map(|component| component.re));
    Some(lattice::reduce(&lattice::Cell { a, b }).ok()?.transform.rows)
}

fn gather<const N: usize>(number: DualSVec64<N>, places: &[Option<usize>; N]) -> Derived {
    let slopes = number.eps.unwrap_generic(Const::<N>, U1);
    Derived { value: number.re, slopes: places.iter().enumerate().filter_map(|(i, place)| place.map(|place| (place, slopes[i]))).collect() }
}

fn folded_to_half_turn(angle_rad: f64) -> f64 {
    use std::f64::consts::PI;
    let folded = angle_rad.rem_euclid(PI);
    if folded > PI / 2.0 { folded - PI } else { folded }
}

/// Whitened residual `(predicted − known) / u` and its slopes.
pub(super) fn knowledge_residual(layout: &Layout, shape: &Shape, values: &[f64], known: &Knowledge) -> Option<(f64, Vec<(usize, f64)>)> {
    let (derived, mean, u) = match *known {
        Knowledge::Pitch { sample, which, mean_m, u_m } => (cell(layout, shape, values, sample)?.pitch_m.get(which)?.clone(), mean_m, u_m),
        Knowledge::LatticeAngle { sample, mean_rad, u_rad } => (cell(layout, shape, values, sample)?.angle_rad?, mean_rad, u_rad),
        Knowledge::Distance { mean_m, u_m } => (distance(layout, values)?, mean_m, u_m),
        Knowledge::SquareOn { view, axis, mean_rad, u_rad } => (lean(layout, shape, values, view, axis)?, mean_rad, u_rad),
    };
    Some(((derived.value - mean) / u, derived.slopes.into_iter().map(|(place, slope)| (place, slope / u)).collect()))
}

fn distance(layout: &Layout, values: &[f64]) -> Option<Derived> {
    let end = |end, axis| layout.place(Parameter::ScaleEnd { end, axis });
    let places = [end(0, 0), end(0, 1), end(1, 0), end(1, 1)];
    let v: [DualSVec64<4>; 4] = seeded(values, &places)?;
    let (dx, dy) = (v[2] - v[0], v[3] - v[1]);
    Some(gather((dx * dx + dy * dy).sqrt(), &places))
}

/// How far the camera's optical axis, reversed, leans from the screen's normal: to the right (`axis` 0) or up (1), rad.
fn lean(layout: &Layout, shape: &Shape, values: &[f64], view: usize, axis: usize) -> Option<Derived> {
    let turn = |axis| layout.place(Parameter::CameraTurn { view, axis });
    let places = [turn(0), turn(1), turn(2), layout.place(Parameter::PrintTurn)];
    let v: [DualSVec64<4>; 4] = seeded(values, &places)?;
    let rotation: Matrix3<DualSVec64<4>> = rotation_from_vector([v[0], v[1], v[2]]) * shape.references[view].map(DualSVec64::from_re);
    let (x, y, out) = (-rotation[(2, 0)], -rotation[(2, 1)], -rotation[(2, 2)]);
    let (sine, cosine) = (v[3].sin(), v[3].cos());
    let (right, up) = (cosine * x - sine * y, sine * x + cosine * y);
    Some(gather(if axis == 0 { right.atan2(out) } else { up.atan2(out) }, &places))
}

fn seeded<const N: usize>(values: &[f64], places: &[Option<usize>; N]) -> Option<[DualSVec64<N>; N]> {
    places.iter().all(Option::is_some).then(|| std::array::from_fn(|i| DualSVec64::from_re(values[places[i].unwrap_or(0)]).derivative(i)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn half_turns_are_folded() {
        assert!((folded_to_half_turn(-168.0_f64.to_radians()) - 12.0_f64.to_radians()).abs() < 1e-12);
        assert!((folded_to_half_turn(90.0_f64.to_radians()) - 90.0_f64.to_radians()).abs() < 1e-12);
    }
}
