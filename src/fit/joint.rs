//! The joint problem: every spot, dot, mark and prior as one vector of whitened residuals with its Jacobian.

use super::{
    cell::knowledge_residual,
    correlated::CorrelatedPrior,
    model::{self, Bench, PRINT_LOCALS, Places, Shape},
    observation::{Knowledge, PrintObservation, PrintPlace, Sharpness, SheetEdge, SpotObservation, Whitening, whitening},
    parameter::{Layout, Parameter, Prior},
    source::Source,
};
use crate::{math::Problem, optics::Camera};
use nalgebra::{DMatrix, DVector};
use num_dual::DualSVec64;
use rayon::prelude::*;

/// One weighted least-squares problem over the unknowns of a [`Layout`].
#[derive(Debug, Clone)]
pub struct Joint {
    /// The unknowns.
    pub layout: Layout,
    /// What never changes during the fit.
    pub shape: Shape,
    /// Spots with their orders.
    pub spots: Vec<SpotObservation>,
    /// Dots, marks and scale ends.
    pub prints: Vec<PrintObservation>,
    /// Measured values that follow from the parameters.
    pub knowledge: Vec<Knowledge>,
    /// What is known of several parameters together: saved posteriors.
    pub correlated: Vec<CorrelatedPrior>,
    /// Factor on the standard uncertainty of every spot (Birge).
    pub spot_scale: f64,
    /// The same for dots and marks.
    pub print_scale: f64,
}

/// Observations that one task predicts; fewer are not worth the handing over.
const TASK: usize = 32;

/// Rows as they are filled.
struct Rows {
    residuals: DVector<f64>,
    jacobian: DMatrix<f64>,
    next: usize,
}

impl Rows {
    fn whitened_pixel<const N: usize>(&mut self, joint: &Joint, places: &Places<N>, seen: Seen, predicted: [DualSVec64<N>; 2]) {
        let Seen { at, white, factor } = seen;
        let difference = [at[0] - predicted[0].re, at[1] - predicted[1].re];
        let [first, second] = white.apply(difference);
        self.residuals[self.next] = factor * first;
        self.residuals[self.next + 1] = factor * second;
        let slopes = predicted.map(|p| p.eps.unwrap_generic(nalgebra::Const::<N>, nalgebra::U1));
        for (i, place) in places.iter().enumerate() {
            let Some((column, scale)) = joint.column(*place) else { continue };
            let [first, second] = white.apply([-slopes[0][i] * scale, -slopes[1][i] * scale]);
            self.jacobian[(self.next, column)] += factor * first;
            self.jacobian[(self.next + 1, column)] += factor * second;
        }
        self.next += 2;
    }
}

/// A measured pixel with its whitening factor and weight.
#[derive(Clone, Copy)]
struct Seen {
    at: [f64; 2],
    white: Whitening,
    factor: f64,
}

impl Joint {
    /// Who owns each row, in row order.
    #[must_use]
    pub fn row_sources(&self) -> Vec<Source> {
        let mut sources = vec![Source::Spots; 2 * self.spots.len()];
        for print in &self.prints {
            let source = match print.place {
                PrintPlace::Pitches(_) => Source::Dots,
                PrintPlace::Lines(_) => Source::Ruling,
                PrintPlace::Sheet { .. } => Source::SheetEdges,
                PrintPlace::Metres(_) => Source::Marks,
                PrintPlace::ScaleEnd(_) => Source::Scale,
            };
            sources.extend([source; 2]);
        }
        sources.extend(self.knowledge.iter().map(|known| match *known {
            Knowledge::Pitch { sample, .. } | Knowledge::LatticeAngle { sample, .. } => Source::ReferencePitch { sample },
            Knowledge::Distance { .. } => Source::Scale,
            Knowledge::SquareOn { .. } => Source::SquareOn,
        }));
        sources.extend(self.correlated.iter().flat_map(|prior| std::iter::repeat_n(prior.source, prior.len())));
        sources.extend(self.prior_rows().map(|(place, _, _)| self.layout.entries()[place].source));
        sources
    }

    /// Predicted pixel of an order in a photo at the given parameter values.
    #[must_use]
    pub fn predict(&self, values: &[f64], photo: usize, orders: &[(i32, i32)]) -> Vec<Option<[f64; 2]>> {
        let places = model::spot_places(&self.layout, &self.shape, photo);
        let bench = Bench::new(&model::plain(values, &places), &self.shape, photo);
        let project = bench.camera.print_projector();
        orders.iter().map(|&order| bench.pixel(&project, order)).collect()
    }

    /// Distance of every spot from its prediction in units of its stated uncertainty (Birge factor not applied); `None` where the model has no such order.
    #[must_use]
    pub fn spot_lengths(&self) -> Vec<Option<f64>> {
        self.spots.iter().zip(self.spot_residuals_px()).map(|(spot, residual)| spot.length(residual?)).collect()
    }

    /// Seen minus predicted, px, of every spot.
    #[must_use]
    pub fn spot_residuals_px(&self) -> Vec<Option<[f64; 2]>> {
        self.spot_residuals_at(&self.values())
    }

    fn spot_residuals_at(&self, values: &[f64]) -> Vec<Option<[f64; 2]>> {
        let mut residuals = vec![None; self.spots.len()];
        for photo in 0..self.shape.photos.len() {
            let of_photo: Vec<usize> = (0..self.spots.len()).filter(|&i| self.spots[i].photo == photo).collect();
            let orders: Vec<(i32, i32)> = of_photo.iter().map(|&i| self.spots[i].order).collect();
            for (&i, predicted) in of_photo.iter().zip(self.predict(values, photo, &orders)) {
                residuals[i] = predicted.map(|[x, y]| [self.spots[i].at.x_px - x, self.spots[i].at.y_px - y]);
            }
        }
        residuals
    }

    /// The same as [`Self::spot_lengths`] for dots, marks and scale ends.
    #[must_use]
    pub fn print_lengths(&self) -> Vec<Option<f64>> {
        let residuals = self.print_residuals_at(&self.values());
        self.prints.iter().zip(residuals).map(|(print, residual)| print.sharpness.length(residual?)).collect()
    }

    /// Seen minus predicted, px, of every dot, mark and scale end.
    #[must_use]
    pub fn print_residuals_px(&self) -> Vec<Option<[f64; 2]>> {
        self.print_residuals_at(&self.values())
    }

    fn print_residuals_at(&self, values: &[f64]) -> Vec<Option<[f64; 2]>> {
        let value = |parameter| self.layout.place(parameter).map(|place| values[place]);
        let pitch_m = value(Parameter::TargetPitch).unwrap_or(1.0);
        let end_m = |end, axis| value(Parameter::ScaleEnd { end, axis });
        let side_m = |axis| value(Parameter::SheetSide { axis });
        let cameras: Vec<Camera<f64>> = (0..self.shape.references.len()).map(|view| self.camera(values, view)).collect();
        let project: Vec<_> = cameras.iter().map(Camera::print_projector).collect();
        let residual = |print: &PrintObservation| {
            let place = match print.place {
                PrintPlace::Pitches([i, j]) | PrintPlace::Lines([i, j]) => [i * pitch_m, j * pitch_m],
                PrintPlace::Sheet { edge, along } => {
                    let bow_m = value(Parameter::SheetBow { edge }).unwrap_or(0.0);
                    edge.place(along, bow_m, [side_m(0)?, side_m(1)?])
                }
                PrintPlace::Metres(metres) => metres,
                PrintPlace::ScaleEnd(end) => [end_m(end, 0)?, end_m(end, 1)?],
            };
            let [x, y] = project[print.view](place)?;
            Some([print.at.x_px - x, print.at.y_px - y])
        };
        self.prints.iter().map(residual).collect()
    }

    /// Current values of all entries.
    #[must_use]
    pub fn values(&self) -> Vec<f64> {
        self.layout.entries().iter().map(|entry| entry.value).collect()
    }

    /// The camera of a view at the given parameter values.
    #[must_use]
    pub fn camera(&self, values: &[f64], view: usize) -> Camera<f64> {
        let places = model::print_places(&self.layout, view, [None; 3]);
        model::camera(&model::plain(values, &places)[3..], self.shape.references[view])
    }

    fn column(&self, place: Option<usize>) -> Option<(usize, f64)> {
        let place = place?;
        Some((self.layout.column(place)?, self.layout.entries()[place].scale))
    }

    /// Places, means and uncertainties of the normal priors.
    fn prior_rows(&self) -> impl Iterator<Item = (usize, f64, f64)> + '_ {
        self.layout.entries().iter().enumerate().filter_map(|(place, entry)| match entry.prior {
            Prior::Normal { mean, u } => Some((place, mean, u)),
            Prior::Free | Prior::Correlated { .. } | Prior::Exact => None,
        })
    }

    fn spot_rows(&self, values: &[f64], rows: &mut Rows) -> Option<()> {
        for photo in 0..self.shape.photos.len() {
            let places = model::spot_places(&self.layout, &self.shape, photo);
            let bench = Bench::new(&model::seeded(&self.layout, values, &places), &self.shape, photo);
            let project = bench.camera.print_projector();
            let of_photo: Vec<(usize, &SpotObservation)> = self.spots.iter().enumerate().filter(|(_, spot)| spot.photo == photo).collect();
            let predicted = of_photo.par_iter().with_min_len(TASK).map(|(_, spot)| bench.pixel(&project, spot.order));
            let predicted: Vec<_> = predicted.collect();
            for ((i, spot), predicted) in of_photo.into_iter().zip(predicted) {
                rows.next = 2 * i;
                let seen = Seen {
                    at: [spot.at.x_px, spot.at.y_px],
                    white: whitening(spot.covariance)?,
                    factor: spot.weight.sqrt() / self.spot_scale,
                };
                rows.whitened_pixel(self, &places, seen, predicted?);
            }
        }
        rows.next = 2 * self.spots.len();
        Some(())
    }

    fn print_rows(&self, values: &[f64], rows: &mut Rows) -> Option<()> {
        let first = rows.next;
        for view in 0..self.shape.references.len() {
            self.print_rows_of_view(values, view, first, rows)?;
        }
        rows.next = first + 2 * self.prints.len();
        Some(())
    }

    fn print_rows_of_view(&self, values: &[f64], view: usize, first: usize, rows: &mut Rows) -> Option<()> {
        let ends = |end: usize| [None, Some(Parameter::ScaleEnd { end, axis: 0 }), Some(Parameter::ScaleEnd { end, axis: 1 })];
        let sheet =
            |edge| [Some(Parameter::SheetBow { edge }), Some(Parameter::SheetSide { axis: 0 }), Some(Parameter::SheetSide { axis: 1 })];
        let sheets = SheetEdge::ALL.map(|edge| (Leading::Sheet(edge), sheet(edge)));
        let pitch = (Leading::Pitch, [Some(Parameter::TargetPitch), None, None]);
        let sets = [pitch, (Leading::ScaleEnd(0), ends(0)), (Leading::ScaleEnd(1), ends(1))].into_iter().chain(sheets);
        for (set, leading) in sets {
            if !self.prints.iter().any(|print| print.view == view && Leading::of(print.place) == set) {
                continue;
            }
            let places = model::print_places(&self.layout, view, leading);
            let v = model::seeded(&self.layout, values, &places);
            let camera = model::camera(&v[3..], self.shape.references[view]);
            let project = camera.print_projector();
            let own = |print: &PrintObservation| print.view == view && Leading::of(print.place) == set;
            let of_set: Vec<(usize, &PrintObservation)> = self.prints.iter().enumerate().filter(|(_, print)| own(print)).collect();
            let predicted = of_set.par_iter().with_min_len(TASK).map(|(_, print)| project(place_of::<PRINT_LOCALS>(print.place, &v)));
            let predicted: Vec<_> = predicted.collect();
            for ((i, print), predicted) in of_set.into_iter().zip(predicted) {
                rows.next = first + 2 * i;
                let seen = Seen {
                    at: [print.at.x_px, print.at.y_px],
                    white: print.sharpness.whitening()?,
                    factor: print.weight.sqrt() / self.print_scale,
                };
                rows.whitened_pixel(self, &places, seen, predicted?);
            }
        }
        Some(())
    }

    fn knowledge_rows(&self, values: &[f64], rows: &mut Rows) -> Option<()> {
        for known in &self.knowledge {
            let (residual, slopes) = knowledge_residual(&self.layout, &self.shape, values, known)?;
            rows.residuals[rows.next] = residual;
            for (place, slope) in slopes {
                if let Some((column, scale)) = self.column(Some(place)) {
                    rows.jacobian[(rows.next, column)] += slope * scale;
                }
            }
            rows.next += 1;
        }
        Some(())
    }

    fn correlated_rows(&self, values: &[f64], rows: &mut Rows) -> Option<()> {
        for prior in &self.correlated {
            let (residuals, slopes) = prior.rows(&self.layout, values)?;
            rows.residuals.rows_mut(rows.next, prior.len()).copy_from(&residuals);
            for (i, parameter) in prior.parameters().iter().enumerate() {
                let Some((column, scale)) = self.column(self.layout.place(*parameter)) else { continue };
                rows.jacobian.column_mut(column).rows_mut(rows.next, prior.len()).axpy(scale, &slopes.column(i), 0.0);
            }
            rows.next += prior.len();
        }
        Some(())
    }

    fn prior_residuals(&self, values: &[f64], rows: &mut Rows) {
        for (place, mean, u) in self.prior_rows() {
            rows.residuals[rows.next] = (values[place] - mean) / u;
            if let Some((column, scale)) = self.column(Some(place)) {
                rows.jacobian[(rows.next, column)] = scale / u;
            }
            rows.next += 1;
        }
    }
}

/// A difference in px as two whitened residuals.
fn whitened(sharpness: Sharpness, factor: f64, difference: [f64; 2]) -> Option<[f64; 2]> {
    Some(sharpness.whitening()?.apply(difference).map(|white| factor * white))
}

/// The parameters that a place on the print depends on, which lead those of the camera.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Leading {
    Pitch,
    ScaleEnd(usize),
    Sheet(SheetEdge),
}

impl Leading {
    /// A place that depends on none of them counts with the pitch.
    fn of(place: PrintPlace) -> Self {
        match place {
            PrintPlace::Pitches(_) | PrintPlace::Lines(_) | PrintPlace::Metres(_) => Self::Pitch,
            PrintPlace::ScaleEnd(end) => Self::ScaleEnd(end),
            PrintPlace::Sheet { edge, .. } => Self::Sheet(edge),
        }
    }
}

/// The place on the print as dual numbers, from its leading parameters.
fn place_of<const N: usize>(place: PrintPlace, v: &[DualSVec64<N>; N]) -> [DualSVec64<N>; 2] {
    match place {
        PrintPlace::Pitches([i, j]) | PrintPlace::Lines([i, j]) => [v[0] * i, v[0] * j],
        PrintPlace::Metres(metres) => metres.map(DualSVec64::from_re),
        PrintPlace::ScaleEnd(_) => [v[1], v[2]],
        PrintPlace::Sheet { edge, along } => edge.place(along, v[0], [v[1], v[2]]),
    }
}

impl Problem for Joint {
    /// Without derivatives: a trial step costs a tenth of [`Self::residuals_and_jacobian`].
    fn residuals(&self, step: &DVector<f64>) -> Option<DVector<f64>> {
        let values = self.layout.values_at(step);
        let mut rows = Vec::new();
        for (spot, residual) in self.spots.iter().zip(self.spot_residuals_at(&values)) {
            rows.extend(whitened(Sharpness::Point(spot.covariance), spot.weight.sqrt() / self.spot_scale, residual?)?);
        }
        for (print, residual) in self.prints.iter().zip(self.print_residuals_at(&values)) {
            rows.extend(whitened(print.sharpness, print.weight.sqrt() / self.print_scale, residual?)?);
        }
        for known in &self.knowledge {
            rows.push(knowledge_residual(&self.layout, &self.shape, &values, known)?.0);
        }
        for prior in &self.correlated {
            rows.extend(prior.rows(&self.layout, &values)?.0.iter());
        }
        rows.extend(self.prior_rows().map(|(place, mean, u)| (values[place] - mean) / u));
        rows.iter().all(|r| r.is_finite()).then(|| DVector::from_vec(rows))
    }

    fn residuals_and_jacobian(&self, step: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let values = self.layout.values_at(step);
        let correlated: usize = self.correlated.iter().map(CorrelatedPrior::len).sum();
        let count = 2 * self.spots.len() + 2 * self.prints.len() + self.knowledge.len() + correlated + self.prior_rows().count();
        let mut rows = Rows { residuals: DVector::zeros(count), jacobian: DMatrix::zeros(count, self.layout.free().len()), next: 0 };
        self.spot_rows(&values, &mut rows)?;
        self.print_rows(&values, &mut rows)?;
        self.knowledge_rows(&values, &mut rows)?;
        self.correlated_rows(&values, &mut rows)?;
        self.prior_residuals(&values, &mut rows);
        let finite = rows.residuals.iter().all(|r| r.is_finite()) && rows.jacobian.iter().all(|j| j.is_finite());
        finite.then_some((rows.residuals, rows.jacobian))
    }
}
