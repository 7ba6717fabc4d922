//! From candidates to measured spots.

use rayon::prelude::*;

use super::Spot;
use super::colour::Colour;
use super::detect::{Detection, Grid};
use super::profile::{self, Fitted, PixelNoise, Profile};
use super::scale::Peak;
use super::scatter::{self, Shape};
use super::window::{Mix, Window};
use crate::frames::{PixelCovariance, PixelPoint};
use crate::photo::{LinearPhoto, Noise};

/// Half the window in standard deviations of the spot, and the margin beyond it that pins the background, px.
const REACH_SIGMAS: f64 = 3.2;
const REACH_MARGIN_PX: f64 = 2.5;
/// Standard deviation of a spot in cells, above which its window is binned, in the first and in the last fit: finer sampling costs
/// time and adds nothing.
const ROUGH_CELLS: f64 = 1.5;
const FINE_CELLS: f64 = 1.7;
const FINE_CELLS_CLIPPED: f64 = 2.2;
/// How still the centre must stand in the first and in the last fit, px.
const ROUGH_PX: f64 = 0.05;
const FINE_PX: f64 = 2e-3;
/// No optic forms a sharper spot; a hot pixel is one, px.
const MIN_SIGMA_PX: f64 = 0.5;
/// Sharper than most lenses draw: only a hot pixel, where the other spots are wider, px.
const SHARP_PX: f64 = 1.0;
/// Strong spots that make the beam's picture known.
const BEAM_SPOTS: usize = 6;
/// Widest spot that is fitted, px.
const MAX_SIGMA_PX: f64 = 40.0;
/// A streak longer than this times its width is no spot.
const MAX_ELONGATION: f64 = 5.0;
/// Speckle strength (variance relative to the light squared, times the correlated area, px²) of the first fits, and the one that is
/// usual for card seen by a camera; and its limits.
const FIRST_SPECKLE: f64 = 0.2;
const USUAL_SPECKLE: f64 = 0.3;
const MIN_SPECKLE: f64 = 0.003;
const MAX_SPECKLE: f64 = 4.0;
/// Share of the laser's light that a channel must carry to be asked about a clipped spot.
const LEAST_SHARE: f64 = 0.01;
/// Height over the noise of one pixel above which speckle rules the fit.
const STRONG: f64 = 12.0;
/// Height over the noise of one pixel, times the width in px, below which a fit has found nothing.
const LEAST_STRENGTH: f64 = 2.0;
/// Limits of what the scatter of the shapes may do to a covariance.
const MIN_EXCESS: f64 = 0.5;
const MAX_EXCESS: f64 = 9.0;
/// What no fit gets below: pixel response, JPEG and demosaicing, px.
const U_FLOOR_PX: f64 = 0.01;

/// A candidate with its profile in the frame of the photo.
#[derive(Debug, Clone, Copy)]
struct Found {
    peak: Peak,
    /// Centre of the window of the fit, px.
    middle_px: [f64; 2],
    fitted: Fitted,
    clipped_px: usize,
    missing_px: usize,
}

impl Found {
    fn at_px(&self) -> [f64; 2] {
        [self.middle_px[0] + self.fitted.profile.x_px, self.middle_px[1] + self.fitted.profile.y_px]
    }

    fn sigma_px(&self) -> f64 {
        let [long, short] = self.fitted.profile.axes_px();
        (long * short).sqrt()
    }

    fn light_at(&self, x_px: f64, y_px: f64) -> f64 {
        self.fitted.profile.spot(x_px - self.middle_px[0], y_px - self.middle_px[1])
    }

    fn is_spot(&self) -> bool {
        let [long, short] = self.fitted.profile.axes_px();
        short >= MIN_SIGMA_PX
            && long <= MAX_SIGMA_PX
            && long <= MAX_ELONGATION * short
            && self.strength() * (long * short).sqrt() > LEAST_STRENGTH
    }

    /// Height over the noise of one pixel.
    fn strength(&self) -> f64 {
        self.fitted.profile.height / self.peak.pixel_variance.max(1e-12).sqrt()
    }
}

/// Fits every candidate twice: alone, then with its neighbours taken off and the speckle of the photo known.
pub(super) fn measure(linear: &LinearPhoto, colour: &Colour, noise: Noise, found: &Detection) -> Vec<Spot> {
    let mix = Mix { linear, weights: colour.weights };
    let room = (colour.marks > super::MANY_MARKS && linear.channels() == 3).then_some(Mix { linear, weights: colour.paper_weights });
    let alone = |peak: &Peak| fit_alone(&mix, room.as_ref(), peak, noise);
    let first: Vec<Found> = found.peaks.par_iter().filter_map(alone).filter(Found::is_spot).collect();
    let first = one_per_place(first, linear);
    let speckle = speckle_of(&first, linear);
    let scene = Scene { linear, colour, all: &first, grid: grid_of(&first, linear), noise, speckle, room };
    let second: Vec<Found> = (0..first.len()).into_par_iter().filter_map(|index| scene.fit(index)).filter(Found::is_spot).collect();
    let second = like_the_beam(one_per_place(second, linear));
    let excess = Excess::of(&second, linear);
    second.iter().map(|found| spot_of(found, &excess)).collect()
}

/// Speckle strength at which the shapes of the strong spots scatter as the fits expect.
fn speckle_of(first: &[Found], linear: &LinearPhoto) -> f64 {
    let excess = scatter::excess(&shapes(first, linear, STRONG..f64::INFINITY), USUAL_SPECKLE / FIRST_SPECKLE);
    // Sensor noise has its share in what was expected, so that a deficit is the speckle's more than in proportion.
    let excess = if excess < 1.0 { excess * excess } else { excess };
    (FIRST_SPECKLE * excess).clamp(MIN_SPECKLE, MAX_SPECKLE)
}

/// Shapes of the whole, unclipped spots whose height over the noise of one pixel lies in a range.
fn shapes(all: &[Found], linear: &LinearPhoto, strength: std::ops::Range<f64>) -> Vec<Shape> {
    let usual = usual_sigma_px(all);
    let is_open = |found: &Found| found.clipped_px == 0;
    // Clipped spots tell less of the beam, but where nearly all clip they must do.
    let takes_clipped = all.iter().filter(|found| is_open(found)).count() < BEAM_SPOTS;
    let is_fit = |found: &&Found| {
        let is_whole = found.missing_px == 0 && (takes_clipped || is_open(found));
        is_whole && strength.contains(&found.strength()) && usual.is_none_or(|usual| (0.6..1.7).contains(&(found.sigma_px() / usual)))
    };
    let shape = |found: &Found| {
        let ([x, y], [xx, xy, yy]) = (found.at_px(), found.fitted.profile.inverse_shape);
        let size = linear.width().max(linear.height()) as f64;
        Shape { x: x / size, y: y / size, departure: [xx - yy, 2.0 * xy], u: found.fitted.u_departure }
    };
    all.iter().filter(is_fit).map(shape).collect()
}

/// What remains of the scatter of the shapes after the speckle is known, for strong and for weak spots.
#[derive(Debug)]
struct Excess {
    strong: f64,
    weak: f64,
}

impl Excess {
    fn of(all: &[Found], linear: &LinearPhoto) -> Self {
        let strong = scatter::excess(&shapes(all, linear, STRONG..f64::INFINITY), 1.0).clamp(MIN_EXCESS, MAX_EXCESS);
        let weak = scatter::excess(&shapes(all, linear, 0.0..STRONG), strong).clamp(MIN_EXCESS, MAX_EXCESS);
        Self { strong, weak }
    }

    /// Factor of the covariance of a spot.
    fn at(&self, strength: f64) -> f64 {
        if strength < STRONG { self.weak } else { self.strong }
    }
}

/// Leaves out what cannot be a picture of the beam that made the strong spots: hot pixels (much sharper), and weak things of
/// another size or shape, as JPEG blocks are. With few strong spots all stay.
fn like_the_beam(all: Vec<Found>) -> Vec<Found> {
    let Some(usual) = usual_sigma_px(&all) else { return all };
    let is_alike = |found: &Found| {
        let (width, [long, short]) = (found.sigma_px(), found.fitted.profile.axes_px());
        if found.clipped_px > 0 {
            return true;
        }
        if found.strength() > STRONG {
            return width > SHARP_PX || width > 0.6 * usual;
        }
        (0.5..2.0).contains(&(width / usual)) && long < 2.5 * short
    };
    all.into_iter().filter(is_alike).collect()
}

/// Median width of the strong spots; `None` where they are few.
fn usual_sigma_px(all: &[Found]) -> Option<f64> {
    let is_model = |found: &&Found| found.missing_px == 0 && found.strength() > STRONG && found.sigma_px() > SHARP_PX;
    let mut widths: Vec<f64> = all.iter().filter(is_model).map(Found::sigma_px).collect();
    let middle = widths.len() / 2;
    (widths.len() >= BEAM_SPOTS).then(|| *widths.select_nth_unstable_by(middle, f64::total_cmp).1)
}

fn pixel_noise(peak: &Peak, noise: Noise, speckle: f64) -> PixelNoise {
    PixelNoise { background: peak.pixel_variance.max(1e-12), per_light: noise.b, speckle }
}

fn reach_px(sigma_px: f64) -> f64 {
    REACH_SIGMAS * sigma_px + REACH_MARGIN_PX
}

fn fit_alone(mix: &Mix, room: Option<&Mix>, peak: &Peak, noise: Noise) -> Option<Found> {
    let sigma_px = 1.2 * peak.cell_px;
    let window = Window::cut(mix, room, [peak.x_px, peak.y_px], sigma_px / ROUGH_CELLS, 2.6 * sigma_px + 2.0);
    let start = Profile::round(3.0 * peak.response, sigma_px, peak.surround - peak.response.min(peak.surround));
    let fitted = profile::fit(&window, start, &pixel_noise(peak, noise, FIRST_SPECKLE), ROUGH_PX)?;
    Some(Found { peak: *peak, middle_px: window.middle_px, fitted, clipped_px: window.clipped_px, missing_px: window.missing_px })
}

/// What the second fit of a spot needs besides the spot.
struct Scene<'a> {
    linear: &'a LinearPhoto<'a>,
    colour: &'a Colour,
    all: &'a [Found],
    grid: Grid,
    noise: Noise,
    speckle: f64,
    room: Option<Mix<'a>>,
}

impl Scene<'_> {
    fn fit(&self, index: usize) -> Option<Found> {
        let found = &self.all[index];
        let laser = Mix { linear: self.linear, weights: self.colour.weights };
        let whole = self.fit_through(&laser, index, found, 1.0, pixel_noise(&found.peak, self.noise, self.speckle))?;
        if whole.clipped_px == 0 || self.linear.channels() < 3 {
            return Some(whole);
        }
        // A weaker channel still sees the core of a spot that clips in the main one.
        let weaker = (0..3).filter(|&c| c != self.colour.main && self.colour.share[c] > LEAST_SHARE);
        let views = weaker.filter_map(|channel| self.fit_in_channel(index, channel, &whole));
        let spread = |found: &Found| found.fitted.covariance[0] + found.fitted.covariance[2];
        Some(views.chain([whole]).min_by(|a, b| spread(a).total_cmp(&spread(b))).unwrap_or(whole))
    }

    fn fit_in_channel(&self, index: usize, channel: usize, whole: &Found) -> Option<Found> {
        let mut weights = [0.0; 3];
        weights[channel] = 1.0;
        let ratio = self.colour.share[channel] / self.colour.share[self.colour.main];
        let noise =
            PixelNoise { background: self.colour.pixel_variance[channel].max(1e-12), per_light: self.noise.b, speckle: self.speckle };
        let mut seen = self.fit_through(&Mix { linear: self.linear, weights }, index, whole, ratio, noise).filter(Found::is_spot)?;
        if distance_px(&seen, whole) > 2.0 * whole.sigma_px() {
            return None;
        }
        seen.fitted.profile.height /= ratio;
        seen.clipped_px = whole.clipped_px;
        Some(seen)
    }

    /// Fits in a view of the photo in which the spot is `ratio` times as high as in the laser's own, from `start`.
    fn fit_through(&self, mix: &Mix, index: usize, start: &Found, ratio: f64, noise: PixelNoise) -> Option<Found> {
        let sigma_px = start.sigma_px();
        let at = start.at_px();
        // A bin loses all its pixels to one that clips.
        let fine_cells = if start.clipped_px > 0 { FINE_CELLS_CLIPPED } else { FINE_CELLS };
        let mut window = Window::cut(mix, self.room.as_ref(), at, sigma_px / fine_cells, reach_px(sigma_px));
        take_off_neighbours(&mut window, self.all, index, &self.grid, self.speckle, ratio);
        let profile = start.fitted.profile;
        let from = Profile {
            x_px: at[0] - window.middle_px[0],
            y_px: at[1] - window.middle_px[1],
            height: profile.height * ratio,
            slope: [0.0; 2],
            ..profile
        };
        let fitted = profile::fit(&window, from, &noise, FINE_PX)?;
        Some(Found { peak: start.peak, middle_px: window.middle_px, fitted, clipped_px: window.clipped_px, missing_px: window.missing_px })
    }
}

fn distance_px(a: &Found, b: &Found) -> f64 {
    let ([ax, ay], [bx, by]) = (a.at_px(), b.at_px());
    (ax - bx).hypot(ay - by)
}

fn take_off_neighbours(window: &mut Window, all: &[Found], index: usize, grid: &Grid, speckle: f64, ratio: f64) {
    let [x, y] = window.middle_px;
    let own_sigma = all[index].sigma_px();
    for other in grid.near(x, y, window.reach_px + 4.0 * MAX_SIGMA_PX).filter(|&other| other != index).map(|other| &all[other]) {
        let [ox, oy] = other.at_px();
        let sigma = other.fitted.profile.axes_px()[0];
        if (ox - x).hypot(oy - y) > window.reach_px * 1.5 + 4.0 * sigma || sigma > 4.0 * own_sigma {
            continue;
        }
        for cell in &mut window.cells {
            let light = ratio * other.light_at(cell.x_px + x, cell.y_px + y);
            cell.value -= light;
            cell.neighbours += light;
            cell.neighbours_variance += (speckle / window.pixels_per_cell + 0.01) * light * light;
        }
    }
}

fn grid_of(all: &[Found], linear: &LinearPhoto) -> Grid {
    let mut grid = Grid::new(linear.width(), linear.height());
    for (index, found) in all.iter().enumerate() {
        let [x, y] = found.at_px();
        grid.insert(x, y, index);
    }
    grid
}

/// Two candidates whose fits met in one place are one spot; the stronger stays.
fn one_per_place(mut all: Vec<Found>, linear: &LinearPhoto) -> Vec<Found> {
    all.sort_by(|a, b| b.peak.signal_to_noise.total_cmp(&a.peak.signal_to_noise));
    let mut grid = Grid::new(linear.width(), linear.height());
    let mut kept: Vec<Found> = Vec::new();
    for found in all {
        let [x, y] = found.at_px();
        let is_taken = grid.near(x, y, 2.0 * MAX_SIGMA_PX).any(|other| {
            let other = &kept[other];
            let [ox, oy] = other.at_px();
            (ox - x).hypot(oy - y) < (1.2 * other.sigma_px().max(found.sigma_px())).max(1.5)
        });
        if !is_taken {
            grid.insert(x, y, kept.len());
            kept.push(found);
        }
    }
    kept
}

fn spot_of(found: &Found, excess: &Excess) -> Spot {
    let [x_px, y_px] = found.at_px();
    let [xx, xy, yy] = found.fitted.profile.shape();
    let scale = found.fitted.chi2.max(1.0) * excess.at(found.strength());
    let fitted = found.fitted.covariance.map(|c| c * scale);
    // Wherever the fit would put it, the centre lies inside what is seen: the spot and its clipped core.
    let core = found.clipped_px as f64 / std::f64::consts::PI;
    let [cxx, cxy, cyy] = both_known(fitted, [xx + core, xy, yy + core]);
    let floor = U_FLOOR_PX * U_FLOOR_PX;
    let profile = &found.fitted.profile;
    Spot {
        at: PixelPoint { x_px, y_px },
        covariance: PixelCovariance { xx: cxx + floor, xy: cxy, yy: cyy + floor },
        shape: PixelCovariance { xx, xy, yy },
        peak: profile.height,
        background: profile.background + profile.slope[0] * profile.x_px + profile.slope[1] * profile.y_px,
        signal_to_noise: found.peak.signal_to_noise,
        clipped_px: found.clipped_px,
        cut_by_frame: found.missing_px > 0,
        profile_chi2: found.fitted.chi2,
    }
}

/// Covariance of a place that two independent statements tell: the inverse of the sum of their inverses.
fn both_known([axx, axy, ayy]: [f64; 3], [bxx, bxy, byy]: [f64; 3]) -> [f64; 3] {
    // A (A + B)⁻¹ B, which needs no inverse of either.
    let (xx, xy, yy) = (axx + bxx, axy + bxy, ayy + byy);
    let determinant = xx * yy - xy * xy;
    let (ixx, ixy, iyy) = (yy / determinant, -xy / determinant, xx / determinant);
    let (pxx, pxy) = (axx * ixx + axy * ixy, axx * ixy + axy * iyy);
    let (pyx, pyy) = (axy * ixx + ayy * ixy, axy * ixy + ayy * iyy);
    [pxx * bxx + pxy * bxy, pxx * bxy + pxy * byy, pyx * bxy + pyy * byy]
}

#[cfg(test)]
mod tests {
    use super::both_known;

    #[test]
    fn two_statements_are_joined_by_their_inverses() {
        // Along the axes: 1 / (1/4 + 1/1) = 0.8 and 1 / (1/9 + 1/1) = 0.9.
        let [xx, xy, yy] = both_known([4.0, 0.0, 9.0], [1.0, 0.0, 1.0]);
        assert!((xx - 0.8).abs() < 1e-12 && xy.abs() < 1e-12 && (yy - 0.9).abs() < 1e-12);
        // Two equal statements halve the covariance, whatever its shape.
        let [xx, xy, yy] = both_known([2.0, 0.5, 3.0], [2.0, 0.5, 3.0]);
        assert!((xx - 1.0).abs() < 1e-12 && (xy - 0.25).abs() < 1e-12 && (yy - 1.5).abs() < 1e-12);
    }
}
