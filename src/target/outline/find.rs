//! Where the sheet is, to about a pixel of a reduced photo: the bright region whose boundary best makes a quadrilateral.

use super::{
    super::{error::TargetError, paper::small_f64},
    lines::{Line, dominant_lines},
};
use crate::{
    math::count,
    photo::{Light, Plane},
};
use image::{GrayImage, Luma};
use imageproc::{
    contrast::otsu_level,
    filter::gaussian_blur_f32,
    region_labelling::{Connectivity, connected_components},
};

/// Longer side up to which a photo is reduced, px.
const REDUCED_PX: usize = 1000;
/// Least share of the photo that a sheet takes.
const LEAST_AREA: f64 = 0.05;
/// Share of the pixels that may be brighter than white paper (lamps, spots of the laser).
const GLARE: f64 = 0.01;
/// How far boundary points may lie off a straight side, as a share of the longer side: an ordinary lens bends lines by less.
const STRAIGHT: f64 = 0.003;
/// Least share of a side that a side must show to count as seen.
const SEEN_SHARE: f64 = 0.4;
/// Least agreement (intersection over union) of a region with its quadrilateral.
const LEAST_OVERLAP: f64 = 0.6;
/// Boundary lines that are looked at.
const MOST_LINES: usize = 9;

/// The sheet, roughly.
pub(super) struct Found {
    /// Corners in the photo, clockwise as displayed, px.
    pub(super) corners: [[f64; 2]; 4],
    /// How far from the straight sides its edges may lie, px.
    pub(super) within_px: f64,
}

/// A quadrilateral with how well it agrees with a region.
struct Candidate {
    corners: [[f64; 2]; 4],
    score: f64,
}

/// A bright region of the reduced photo.
struct Region<'a> {
    labels: &'a [u32],
    label: u32,
    size: [usize; 2],
}

pub(super) fn sheet(light: &Light) -> Result<Found, TargetError> {
    let mut plane = Plane { width: light.width, height: light.height, value: light.value.clone() };
    let mut scale = 1.0;
    while plane.width.max(plane.height) > REDUCED_PX {
        plane = plane.halved();
        scale *= 2.0;
    }
    let size = [plane.width, plane.height];
    let picture = gaussian_blur_f32(&as_codes(&plane), 1.0);
    let mut largest = 0.0_f64;
    let mut best: Option<Candidate> = None;
    for level in levels(&picture) {
        let mask = GrayImage::from_fn(picture.width(), picture.height(), |x, y| Luma([u8::from(picture.get_pixel(x, y).0[0] > level)]));
        let labels = connected_components(&mask, Connectivity::Four, Luma([0])).into_raw();
        for (label, area) in large_regions(&labels) {
            largest = largest.max(area);
            let candidate = Region { labels: &labels, label, size }.quadrilateral();
            best = [best, candidate].into_iter().flatten().max_by(|a, b| a.score.total_cmp(&b.score));
        }
    }
    let best = best.ok_or(TargetError::NoSheet { largest_percent: 100.0 * largest })?;
    let full = |c: f64| scale * c + (scale - 1.0) / 2.0;
    Ok(Found { corners: best.corners.map(|corner| corner.map(full)), within_px: scale * (tolerance(size) + 1.0) + 3.0 })
}

fn tolerance(size: [usize; 2]) -> f64 {
    (STRAIGHT * small_f64(size[0].max(size[1]))).max(1.0)
}

/// Square root of the light against that of the brightest paper: noise is about even then, and shade takes few codes.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to a code of eight bits")]
fn as_codes(plane: &Plane) -> GrayImage {
    let mut sorted: Vec<f32> = plane.value.iter().map(|v| if v.is_finite() { v.max(0.0) } else { 0.0 }).collect();
    sorted.sort_by(f32::total_cmp);
    let glare = (GLARE * count(sorted.len())) as usize;
    let white = sorted.get(sorted.len() - 1 - glare).copied().unwrap_or(1.0).max(1e-6);
    let code = |x: u32, y: u32| {
        let value = plane.value[y as usize * plane.width + x as usize] / white;
        Luma([(value.max(0.0).sqrt().min(1.0) * 255.0) as u8])
    };
    GrayImage::from_fn(size_u32(plane.width), size_u32(plane.height), code)
}

fn size_u32(side: usize) -> u32 {
    u32::try_from(side).unwrap_or(u32::MAX)
}

/// Levels that may part the sheet from its ground: Otsu's of the whole photo, and of what lies above and below it, since a photo may show
/// a bright sheet, a grey wall and a black stand.
fn levels(picture: &GrayImage) -> Vec<u8> {
    let part = |keep: &dyn Fn(u8) -> bool| {
        let codes: Vec<u8> = picture.as_raw().iter().copied().filter(|code| keep(*code)).collect();
        GrayImage::from_raw(size_u32(codes.len()), 1, codes).filter(|part| part.width() > 1).map(|part| otsu_level(&part))
    };
    let middle = otsu_level(picture);
    let mut levels: Vec<u8> = [Some(middle), part(&|code| code > middle), part(&|code| code <= middle)].into_iter().flatten().collect();
    levels.dedup();
    levels
}

/// Labels of the regions that are large enough, with their share of the photo.
fn large_regions(labels: &[u32]) -> Vec<(u32, f64)> {
    let most = labels.iter().copied().max().unwrap_or(0) as usize;
    let mut areas = vec![0_usize; most + 1];
    labels.iter().for_each(|label| areas[*label as usize] += 1);
    let share = |area: usize| count(area) / count(labels.len());
    let large = areas.iter().enumerate().skip(1).filter(|(_, area)| share(**area) >= LEAST_AREA);
    large.map(|(label, area)| (size_u32(label), share(*area))).collect()
}

impl Region<'_> {
    fn holds(&self, x: usize, y: usize) -> bool {
        self.labels[y * self.size[0] + x] == self.label
    }

    /// Places half-way between a pixel of the region and one beside it that is not; the rim of the photo is no boundary.
    fn boundary(&self) -> Vec<[f64; 2]> {
        let [width, height] = self.size;
        let mut points = Vec::new();
        for y in 1..height - 1 {
            for x in 1..width - 1 {
                let here = self.holds(x, y);
                let (px, py) = (small_f64(x), small_f64(y));
                if here != self.holds(x + 1, y) {
                    points.push([px + 0.5, py]);
                }
                if here != self.holds(x, y + 1) {
                    points.push([px, py + 0.5]);
                }
            }
        }
        points
    }

    fn centre(&self) -> [f64; 2] {
        let (mut sum, mut n) = ([0.0; 2], 0.0);
        for (place, _) in self.labels.iter().enumerate().filter(|(_, label)| **label == self.label) {
            sum = [sum[0] + small_f64(place % self.size[0]), sum[1] + small_f64(place / self.size[0])];
            n += 1.0;
        }
        sum.map(|s| s / n)
    }

    /// The four lines of the boundary that agree best with the region.
    fn quadrilateral(&self) -> Option<Candidate> {
        let boundary = self.boundary();
        let within = tolerance(self.size);
        let least = self.size[0].max(self.size[1]) / 25;
        let centre = self.centre();
        let lines: Vec<Line> = dominant_lines(&boundary, within, least, MOST_LINES).into_iter().map(|line| line.facing(centre)).collect();
        let mut best: Option<Candidate> = None;
        for a in 0..lines.len() {
            for b in a + 1..lines.len() {
                for c in b + 1..lines.len() {
                    for d in c + 1..lines.len() {
                        let candidate =
                            corners([lines[a], lines[b], lines[c], lines[d]]).and_then(|corners| self.judged(corners, &boundary));
                        best = [best, candidate].into_iter().flatten().max_by(|a, b| a.score.total_cmp(&b.score));
                    }
                }
            }
        }
        best
    }

    /// Agreement of a quadrilateral with the region: share of its rim with boundary on it, times intersection over union.
    fn judged(&self, corners: [[f64; 2]; 4], boundary: &[[f64; 2]]) -> Option<Candidate> {
        let [width, height] = self.size.map(small_f64);
        let reach = |c: f64, side: f64| (-0.5 * side..=1.5 * side).contains(&c);
        if !corners.iter().all(|corner| reach(corner[0], width) && reach(corner[1], height)) {
            return None;
        }
        let sides: Vec<Shown> = (0..4).map(|side| self.shown(corners[side], corners[(side + 1) % 4], boundary)).collect();
        if sides.iter().filter(|side| side.boundary >= SEEN_SHARE * side.length).count() < super::LEAST_EDGES {
            return None;
        }
        let total = |of: fn(&Shown) -> f64| sides.iter().map(of).sum::<f64>();
        let overlap = self.overlap(&corners);
        let score = overlap * total(|side| side.boundary) / total(|side| side.in_photo).max(1.0);
        (overlap >= LEAST_OVERLAP).then_some(Candidate { corners, score })
    }

    /// What a side shows, in steps of two pixels.
    fn shown(&self, from: [f64; 2], to: [f64; 2], boundary: &[[f64; 2]]) -> Shown {
        const STEP: f64 = 2.0;
        let length = (to[0] - from[0]).hypot(to[1] - from[1]);
        let along = [(to[0] - from[0]) / length, (to[1] - from[1]) / length];
        let within = tolerance(self.size);
        let [width, height] = self.size.map(small_f64);
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "a place along a side that is some thousand pixels long"
        )]
        let step = |distance: f64| (distance / STEP) as usize;
        let mut covered = vec![false; step(length) + 1];
        for p in boundary {
            let (dx, dy) = (p[0] - from[0], p[1] - from[1]);
            let (t, off) = (dx * along[0] + dy * along[1], dy * along[0] - dx * along[1]);
            if off.abs() <= within && (0.0..=length).contains(&t) {
                covered[step(t)] = true;
            }
        }
        let inside = |n: &usize| {
            let t = STEP * (small_f64(*n) + 0.5);
            let (x, y) = (from[0] + t * along[0], from[1] + t * along[1]);
            x > 2.0 && y > 2.0 && x < width - 3.0 && y < height - 3.0
        };
        let in_photo = STEP * count((0..covered.len()).filter(inside).count());
        Shown { length, in_photo, boundary: STEP * count(covered.iter().filter(|c| **c).count()) }
    }

    fn overlap(&self, corners: &[[f64; 2]; 4]) -> f64 {
        const EVERY: usize = 3;
        let (mut both, mut either) = (0_usize, 0_usize);
        for y in (0..self.size[1]).step_by(EVERY) {
            for x in (0..self.size[0]).step_by(EVERY) {
                let (a, b) = (self.holds(x, y), inside(corners, [small_f64(x), small_f64(y)]));
                both += usize::from(a && b);
                either += usize::from(a || b);
            }
        }
        count(both) / count(either.max(1))
    }
}

/// Lengths in px of the reduced photo.
struct Shown {
    /// The whole side.
    length: f64,
    /// Its part within the photo.
    in_photo: f64,
    /// Its part with boundary on it.
    boundary: f64,
}

fn inside(corners: &[[f64; 2]; 4], p: [f64; 2]) -> bool {
    (0..4).all(|n| {
        let (a, b) = (corners[n], corners[(n + 1) % 4]);
        (b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0]) >= 0.0
    })
}

/// Corners of the convex quadrilateral that four lines bound, clockwise as displayed; the lines face inwards.
fn corners(mut lines: [Line; 4]) -> Option<[[f64; 2]; 4]> {
    /// Sine of the least angle between neighbouring sides: 20°.
    const LEAST_SINE: f64 = 0.342;
    // The normals of a convex figure turn once around; with y down, rising angles go clockwise as displayed.
    lines.sort_by(|a, b| a.normal[1].atan2(a.normal[0]).total_cmp(&b.normal[1].atan2(b.normal[0])));
    let mut corners = [[0.0; 2]; 4];
    for n in 0..4 {
        let (a, b) = (lines[n], lines[(n + 1) % 4]);
        if a.normal[0] * b.normal[1] - a.normal[1] * b.normal[0] < LEAST_SINE {
            return None;
        }
        corners[n] = a.crossing(&b)?;
    }
    let margin = |corner: [f64; 2]| lines.iter().map(|line| line.distance(corner)).fold(f64::INFINITY, f64::min);
    corners.iter().all(|corner| margin(*corner) > -1e-6).then_some(corners)
}
