//! What is known of several parameters together: a joint normal prior, whose rows are whitened by the Cholesky factor of its covariance.

use super::{
    model::{self, PRINT_LOCALS},
    parameter::{Entry, Layout, Parameter, Prior},
    source::Source,
};
use nalgebra::{Cholesky, Const, DMatrix, DVector, Matrix3, U1};
use num_dual::DualSVec64;

/// A joint normal prior.
///
/// Its rows are `r = L⁻¹ (p − m)` with `C = L Lᵀ`: `rᵀr = (p − m)ᵀ C⁻¹ (p − m)`, one row per parameter, together owned by one source.
///
/// A view adds a second order, see [`Self::along_view`].
#[derive(Debug, Clone, PartialEq)]
pub struct CorrelatedPrior {
    /// Owner of its share of the budget.
    pub source: Source,
    parameters: Vec<Parameter>,
    mean: DVector<f64>,
    u: DVector<f64>,
    whitening: DMatrix<f64>,
    view: Option<View>,
}

/// The camera that a joint prior holds: where it sees some points of the print.
#[derive(Debug, Clone, PartialEq)]
struct View {
    reference: Matrix3<f64>,
    points_m: Vec<[f64; 2]>,
    /// At the mean: pixels, and their slopes against the parameters.
    pixels: DVector<f64>,
    slopes: DMatrix<f64>,
    gain: DMatrix<f64>,
}

/// Pixels move along a view by less than this without any meaning; far below any centroid.
const STILL_PX: f64 = 1e-4;

/// One parameter of a joint prior.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Marginal {
    /// Which.
    pub parameter: Parameter,
    /// Mean, SI.
    pub mean: f64,
    /// Standard uncertainty, above zero.
    pub u: f64,
}

impl CorrelatedPrior {
    /// A joint prior from its marginals and their correlation.
    ///
    /// `None` when sizes differ, a u is not above zero, or the correlation is not positive definite.
    #[must_use]
    pub fn new(marginals: &[Marginal], correlation: &DMatrix<f64>, source: Source) -> Option<Self> {
        let count = marginals.len();
        if count == 0 || correlation.shape() != (count, count) || marginals.iter().any(|m| !(m.u > 0.0 && m.u.is_finite())) {
            return None;
        }
        let u = DVector::from_iterator(count, marginals.iter().map(|m| m.u));
        // C = D R D: the correlation is factored alone, so that units as far apart as nm and m cost no digits.
        let factor = Cholesky::new(correlation.clone())?.unpack();
        let mut whitening = factor.solve_lower_triangular(&DMatrix::identity(count, count))?;
        for (mut column, u) in whitening.column_iter_mut().zip(&u) {
            column /= *u;
        }
        let parameters = marginals.iter().map(|m| m.parameter).collect();
        let mean = DVector::from_iterator(count, marginals.iter().map(|m| m.mean));
        whitening.iter().all(|w| w.is_finite()).then_some(Self { source, parameters, mean, u, whitening, view: None })
    }

    /// The parameters as entries of a layout, at their means.
    pub fn entries(&self) -> impl Iterator<Item = Entry> + '_ {
        self.parameters.iter().zip(self.mean.iter().zip(&self.u)).map(|(&parameter, (&mean, &u))| Entry {
            parameter,
            value: mean,
            prior: Prior::Correlated { mean, u },
            source: self.source,
            scale: u,
        })
    }

    /// Number of rows.
    #[must_use]
    #[expect(clippy::len_without_is_empty, reason = "never empty")]
    pub fn len(&self) -> usize {
        self.parameters.len()
    }

    /// The parameters.
    #[must_use]
    pub fn parameters(&self) -> &[Parameter] {
        &self.parameters
    }

    /// The same prior, bent along what the camera sees.
    ///
    /// Seen nearly square-on, focal length, distance and aim of a camera are known only together: along that valley each is uncertain by
    /// several per cent, across it the picture is fixed to hundredths of a pixel. The valley is curved, and over its length a straight one
    /// would leave the picture by much more than that. So the camera's parameters are measured by where they put fixed points of the print:
    /// with `q` the pixels of these points and `J` their slopes at the mean, the rows become `r = L⁻¹ (p − m + e)` where
    /// `e = K (KᵀJᵀJK + s²)⁻¹ KᵀJᵀ (q(p) − q(m) − J (p − m))` moves the camera alone and `K Kᵀ` is its own covariance. To first order nothing
    /// changes; to second order these are the residuals that the dots themselves would give.
    ///
    /// - `reference`: rotation of the view before its small turn
    /// - `points_m`: points of the print, spread over the picture
    ///
    /// `None` when a point is not seen.
    #[must_use]
    pub fn along_view(mut self, reference: Matrix3<f64>, points_m: Vec<[f64; 2]>) -> Option<Self> {
        let (pixels, slopes) = self.seen(reference, &points_m, &self.mean)?;
        let camera: Vec<usize> = (0..self.len()).filter(|&i| model::camera_parameters(0).contains(&self.parameters[i])).collect();
        let whole = self.whitening.solve_lower_triangular(&DMatrix::identity(self.len(), self.len()))?;
        let own = whole.select_rows(&camera);
        // In units of u, so that the covariance of the camera is factored without loss of digits.
        let u = DMatrix::from_diagonal(&self.u.select_rows(&camera));
        let scaled = DMatrix::from_diagonal(&self.u.select_rows(&camera).map(f64::recip)) * own;
        let factor = u * Cholesky::new(&scaled * scaled.transpose())?.unpack();
        let moved = slopes.select_columns(&camera) * &factor;
        let normal = moved.tr_mul(&moved) + DMatrix::identity(camera.len(), camera.len()) * STILL_PX.powi(2);
        let gain = self.whitening.select_columns(&camera) * factor * Cholesky::new(normal)?.solve(&moved.transpose());
        self.view = Some(View { reference, points_m, pixels, slopes, gain });
        Some(self)
    }

    /// Pixels of points of the print (x and y in turn), and their slopes against the parameters of this prior.
    fn seen(&self, reference: Matrix3<f64>, points_m: &[[f64; 2]], values: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let camera = model::camera_parameters(0);
        let place = |parameter: Parameter| self.parameters.iter().position(|own| *own == parameter);
        let places: [Option<usize>; PRINT_LOCALS] = std::array::from_fn(|i| camera.get(i).copied().and_then(place));
        // A parameter that is known exactly is not part of the prior: only the turn of a camera that defines the horizontal, which is 0.
        let v: [DualSVec64<PRINT_LOCALS>; PRINT_LOCALS] =
            std::array::from_fn(|i| places[i].map_or(DualSVec64::from_re(0.0), |place| DualSVec64::from_re(values[place]).derivative(i)));
        let camera = model::camera(&v[..camera.len()], reference);
        let project = camera.print_projector();
        let mut pixels = DVector::zeros(2 * points_m.len());
        let mut slopes = DMatrix::zeros(2 * points_m.len(), self.len());
        for (point, at) in points_m.iter().enumerate() {
            for (axis, pixel) in project(at.map(DualSVec64::from_re))?.into_iter().enumerate() {
                let row = 2 * point + axis;
                pixels[row] = pixel.re;
                let slope = pixel.eps.unwrap_generic(Const::<PRINT_LOCALS>, U1);
                for (i, place) in places.iter().enumerate() {
                    if let Some(place) = place {
                        slopes[(row, *place)] = slope[i];
                    }
                }
            }
        }
        Some((pixels, slopes))
    }

    /// Residuals, and their slopes against the parameters in the order of [`Self::parameters`]; `None` when the layout lacks one of them.
    #[must_use]
    pub fn rows(&self, layout: &Layout, values: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let places: Option<Vec<usize>> = self.parameters.iter().map(|parameter| layout.place(*parameter)).collect();
        let values = DVector::from_iterator(self.len(), places?.into_iter().map(|place| values[place]));
        let difference = &values - &self.mean;
        let (mut residuals, mut jacobian) = (&self.whitening * &difference, self.whitening.clone());
        if let Some(view) = &self.view {
            let (pixels, slopes) = self.seen(view.reference, &view.points_m, &values)?;
            residuals += &view.gain * (pixels - &view.pixels - &view.slopes * difference);
            jacobian += &view.gain * (slopes - &view.slopes);
        }
        Some((residuals, jacobian))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::dmatrix;

    fn prior(correlation: f64) -> Option<CorrelatedPrior> {
        let marginal = |parameter, mean, u| Marginal { parameter, mean, u };
        let marginals = [marginal(Parameter::Throw, 0.8, 1e-3), marginal(Parameter::Wavelength { laser: 0 }, 650e-9, 1e-9)];
        CorrelatedPrior::new(&marginals, &dmatrix![1.0, correlation; correlation, 1.0], Source::Calibration)
    }

    /// By hand: for two parameters χ² = (a² − 2 ρ a b + b²) / (1 − ρ²) with a, b in units of u.
    #[test]
    fn the_sum_of_squares_is_that_of_the_joint_density() {
        for correlation in [0.0, 0.6, -0.999] {
            let prior = prior(correlation).unwrap();
            let mut layout = Layout::default();
            prior.entries().for_each(|entry| {
                layout.add(entry);
            });
            let (a, b): (f64, f64) = (1.5, -0.4);
            let chi2 = prior.rows(&layout, &[0.8 + a * 1e-3, 650e-9 + b * 1e-9]).unwrap().0.norm_squared();
            let want = (a * a - 2.0 * correlation * a * b + b * b) / (1.0 - correlation * correlation);
            assert!((chi2 / want - 1.0).abs() < 1e-9, "{chi2} {want}");
        }
    }

    #[test]
    fn what_is_no_covariance_is_refused() {
        assert!(prior(1.0).is_none() && prior(f64::NAN).is_none() && prior(-1.2).is_none());
        assert!(prior(0.5).unwrap().rows(&Layout::default(), &[]).is_none());
    }
}
