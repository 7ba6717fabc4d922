//! OpenCV beside our rotations, our camera and our solver (on homographies).
//!
//! Source: `tests/reference/opencv_project.py` (OpenCV 5.0.0), kept output in `tests/data/opencv_project.json`.

use crate::live::{close, kept_and_live, list, number, row, rows};
use nalgebra::{DMatrix, DVector, Matrix3, Vector3};
use serde_json::Value;
use spotrule::{
    math::{Options, Problem, least_squares, rotation::rotation_from_vector},
    optics::{Camera, Distortion},
};

fn triple(value: &Value) -> [f64; 3] {
    row(value).try_into().unwrap()
}

fn camera(case: &Value) -> Camera<f64> {
    Camera {
        focal_px: number(case, "focal_px"),
        principal_px: row(&case["principal_px"]).try_into().unwrap(),
        distortion: Distortion { radial: [number(case, "k1"), number(case, "k2")], tangential: [number(case, "p1"), number(case, "p2")] },
        turn_rad: triple(&case["turn_rad"]),
        place_m: triple(&case["place_m"]),
        reference: Matrix3::identity(),
    }
}

/// `Rodrigues`: 1e-12 because OpenCV switches to a first-order form for tiny angles.
#[test]
fn rotation_vectors() {
    kept_and_live("opencv_project", |reference| {
        for case in list(reference, "cameras") {
            let got = rotation_from_vector(triple(&case["turn_rad"]));
            for (i, line) in rows(&case["rotation"]).iter().enumerate() {
                for (j, &want) in line.iter().enumerate() {
                    close(&format!("{} R[{i}][{j}]", case["name"]), got[(i, j)], want, 1e-12);
                }
            }
        }
    });
}

/// `projectPoints`: both sides are double precision throughout, pixels of order 1e3.
#[test]
fn projected_points() {
    kept_and_live("opencv_project", |reference| {
        assert!(list(reference, "cameras").len() >= 9);
        for case in list(reference, "cameras") {
            let camera = camera(case);
            let rotation = camera.rotation();
            for (point, want) in rows(&case["points_m"]).iter().zip(rows(&case["pixels_px"])) {
                let seen = rotation * Vector3::from_row_slice(point) + Vector3::from(camera.place_m);
                let got = camera.project(&seen).unwrap();
                close(&format!("{} x_px", case["name"]), got[0], want[0], 1e-8);
                close(&format!("{} y_px", case["name"]), got[1], want[1], 1e-8);
            }
        }
    });
}

/// Distances in the photo between mapped and seen points; eight parameters, h33 = 1.
struct Homography {
    plane: Vec<Vec<f64>>,
    pixels: Vec<Vec<f64>>,
}

impl Homography {
    fn at(h: &DVector<f64>, x: f64, y: f64) -> [f64; 3] {
        [h[0] * x + h[1] * y + h[2], h[3] * x + h[4] * y + h[5], h[6] * x + h[7] * y + 1.0]
    }
}

impl Problem for Homography {
    fn residuals_and_jacobian(&self, h: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let mut residuals = DVector::zeros(2 * self.plane.len());
        let mut jacobian = DMatrix::zeros(2 * self.plane.len(), 8);
        for (i, (plane, pixel)) in self.plane.iter().zip(&self.pixels).enumerate() {
            let (x, y) = (plane[0], plane[1]);
            let [u, v, w] = Self::at(h, x, y);
            if w <= 0.0 {
                return None;
            }
            for (k, seen) in [u / w, v / w].into_iter().enumerate() {
                residuals[2 * i + k] = seen - pixel[k];
                for (j, slope) in [x, y, 1.0].into_iter().enumerate() {
                    jacobian[(2 * i + k, 3 * k + j)] = slope / w;
                }
                jacobian[(2 * i + k, 6)] = -seen * x / w;
                jacobian[(2 * i + k, 7)] = -seen * y / w;
            }
        }
        Some((residuals, jacobian))
    }
}

/// `findHomography`: its last refinement stops early and its start is single precision, so mapped points agree to 1e-3 px
/// and our sum of squares must not be the larger one.
#[test]
fn homographies() {
    kept_and_live("opencv_project", |reference| {
        for case in list(reference, "homographies") {
            let name = case["name"].to_string();
            let problem = Homography { plane: rows(&case["plane_m"]), pixels: rows(&case["pixels_px"]) };
            let count = problem.plane.len() as f64;
            let centre: Vec<f64> = (0..2).map(|k| problem.pixels.iter().map(|p| p[k]).sum::<f64>() / count).collect();
            let start = DVector::from_vec(vec![1e3, 0.0, centre[0], 0.0, 1e3, centre[1], 0.0, 0.0]);
            let got = least_squares(&problem, start, &Options::default()).unwrap();
            assert!(got.ending.was_successful(), "{name}: {}", got.ending);
            let theirs = DVector::from_vec(rows(&case["homography"]).concat()[..8].to_vec());
            for plane in &problem.plane {
                let [u, v, w] = Homography::at(&got.parameters, plane[0], plane[1]);
                let [a, b, c] = Homography::at(&theirs, plane[0], plane[1]);
                close(&format!("{name} x_px"), u / w, a / c, 1e-3);
                close(&format!("{name} y_px"), v / w, b / c, 1e-3);
            }
            let rms_px = (got.chi_square() / count).sqrt();
            assert!(rms_px <= number(case, "rms_px") * (1.0 + 1e-9) + 1e-9, "{name}: rms {rms_px} px against {}", case["rms_px"]);
        }
    });
}
