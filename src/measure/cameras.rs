//! Cameras before the pattern is looked at: every view's pose from its dots or marks, or from "square-on" where there are none.

use super::{
    MeasureError,
    calibrated::{self, Prepared},
    look::{Print, Seen},
    ruling::{self, RulingView, ruling_view},
    sheet::{SheetView, sheet_view, slide},
    view::{disc_centroid_offset, lens_knowledge, pose_from_homography, square_on_pose},
};
use crate::{
    Error,
    bench::{Bench, FocalLength, SheetFormat, Target, TargetKind},
    fit::{
        CorrelatedPrior, FitError, Joint, Layout, Outliers, Parameter, PrintObservation, PrintPlace, Shape, Sharpness, Source, approach,
        setup::{self, LensKnowledge, ViewStart},
    },
    frames::{PixelCovariance, PixelPoint},
    optics::Camera,
    photo::Exif,
    quantity::Quantity,
    target::{self, Families, Reading},
};
use nalgebra::{Matrix3, Vector3};

/// Views with what was seen of the print in them, solved on their own.
#[derive(Debug, Clone)]
pub(super) struct Cameras {
    /// Lens and poses, with start values moved to the solution where there is a print.
    pub(super) layout: Layout,
    pub(super) lens: LensKnowledge,
    pub(super) references: Vec<Matrix3<f64>>,
    pub(super) prints: Vec<PrintObservation>,
    pub(super) view_of_photo: Vec<usize>,
    /// Saved posteriors of bench or lens.
    pub(super) correlated: Vec<CorrelatedPrior>,
    /// Whether a print or marks fix the plane of the screen.
    pub(super) screen_known: bool,
    /// Width and height of the sheet as the format tells; where there is none, nothing.
    pub(super) sheet_sides_m: Option<[Quantity; 2]>,
}

/// Marks and target dots that make up one view.
struct View {
    start: ViewStart,
    prints: Vec<PrintObservation>,
    reading: Option<Reading>,
    /// Width and height of the sheet that it shows.
    sheet_sides_m: Option<[Quantity; 2]>,
    /// Families of ruled lines that it shows.
    families: Option<Families>,
}

/// Sets up all views.
pub(super) fn cameras(seen: &Seen, bench: &Bench, targets: &[&str]) -> Result<Cameras, Error> {
    check_sizes(seen)?;
    if let Some(calibration) = &bench.calibration {
        return calibrated::cameras(calibration, seen, bench);
    }
    let (mut layout, mut correlated, mut lens) = (Layout::default(), vec![], lens(seen, bench));
    if let Some(calibration) = &bench.camera.lens {
        let Prepared { entries, prior } =
            calibrated::prepared(&calibration.posterior, bench, &calibrated::LENS, Source::CameraCalibration)?;
        entries.into_iter().for_each(|entry| {
            layout.add(entry);
        });
        correlated.extend(prior);
        lens = calibrated::lens_of(&layout, calibration.taken_with.size_px);
    }
    let view_of_photo = views_of_photos(bench, seen.patterns.len(), targets);
    let views = match bench.target.as_ref() {
        Some(Target { kind: TargetKind::Dots { pitch_m, .. }, .. }) => dot_views(seen, *pitch_m, &lens)?,
        Some(Target { kind: TargetKind::Marks { marks, u_px }, .. }) => vec![mark_view(marks, *u_px, &lens)?],
        Some(Target { kind: TargetKind::Sheet { format, .. }, .. }) => sheet_views(seen, *format, &lens)?,
        Some(Target { kind: TargetKind::Ruling { pitch_m, .. }, .. }) => ruling_views(seen, *pitch_m, &lens)?,
        None => vec![bare_view(seen, bench, &lens)],
    };
    let screen_known = bench.target.is_some();
    let mut cameras = Cameras {
        layout,
        lens,
        references: views.iter().map(|view| view.start.reference).collect(),
        prints: views.iter().flat_map(|view| view.prints.iter().copied()).collect(),
        view_of_photo,
        correlated,
        screen_known,
        sheet_sides_m: views.first().and_then(|view| view.sheet_sides_m),
    };
    setup::add_camera(&mut cameras.layout, &lens, &views.iter().map(|view| view.start).collect::<Vec<_>>());
    if screen_known {
        settle(&mut cameras, bench, &views)?;
    }
    Ok(cameras)
}

/// Solves the views from their prints alone.
fn settle(cameras: &mut Cameras, bench: &Bench, views: &[View]) -> Result<(), Error> {
    let read = |view: &View| view.reading.is_some() || view.sheet_sides_m.is_some() || view.families.is_some();
    let outliers = if views.iter().all(read) { Outliers::Rejected } else { Outliers::Kept };
    let mut pitch_m = None;
    if let Some(Target { kind: TargetKind::Dots { pitch_m: pitch, .. } | TargetKind::Ruling { pitch_m: pitch, .. }, .. }) = &bench.target {
        pitch_m = Some(pitch.value);
        // Alone, a print cannot tell its own pitch from the distance of the camera.
        setup::add_target_pitch(&mut cameras.layout, Quantity { u: 0.0, ..*pitch });
    }
    if let Some([width, height]) = cameras.sheet_sides_m {
        // Nor its own size; the shape is known as well as both sides together.
        let u = (height.value / width.value * width.u).hypot(height.u);
        setup::add_sheet(&mut cameras.layout, [Quantity { u: 0.0, ..width }, Quantity { u, ..height }]);
    }
    let joint = Joint {
        layout: cameras.layout.clone(),
        shape: Shape { photos: vec![], references: cameras.references.clone(), seen_from: bench.screen.seen_from },
        spots: vec![],
        prints: cameras.prints.clone(),
        knowledge: vec![],
        correlated: cameras.correlated.clone(),
        spot_scale: 1.0,
        print_scale: 1.0,
    };
    let readings: Vec<&Reading> = views.iter().filter_map(|view| view.reading.as_ref()).collect();
    let joint = match pitch_m {
        Some(pitch_m) if !readings.is_empty() => approached(joint, Some(&Discs { pitch_m, readings }), outliers)?,
        _ => slid(joint, cameras.sheet_sides_m, pitch_m, views, outliers)?,
    };
    (cameras.layout, cameras.prints) = (joint.layout, joint.prints);
    Ok(())
}

/// Moves views near the solution from edges, lines or marks; twice where points of edges and lines have to be brought to their places along
/// them, because that asks for a camera.
fn slid(
    mut joint: Joint,
    sheet_sides_m: Option<[Quantity; 2]>,
    pitch_m: Option<f64>,
    views: &[View],
    outliers: Outliers,
) -> Result<Joint, FitError> {
    for _ in 0..2 {
        joint = approach(joint, outliers)?;
        let values = joint.values();
        for (number, view) in views.iter().enumerate() {
            let camera = joint.camera(&values, number);
            match (sheet_sides_m, view.families, pitch_m) {
                (Some(sides_m), ..) => slide(&mut joint.prints, number, &camera, sides_m.map(|side| side.value)),
                (None, Some(families), Some(pitch_m)) => ruling::slide(&mut joint.prints, number, &camera, families, pitch_m),
                _ => return Ok(joint),
            }
        }
    }
    Ok(joint)
}

/// The discs of a printed target: one reading per view.
pub(super) struct Discs<'a> {
    pub(super) pitch_m: f64,
    pub(super) readings: Vec<&'a Reading>,
}

/// Moves views near the solution from their prints; twice where dots have to be corrected for perspective, because the correction asks for
/// a camera.
pub(super) fn approached(joint: Joint, discs: Option<&Discs<'_>>, outliers: Outliers) -> Result<Joint, FitError> {
    let seen: Vec<PixelPoint> = joint.prints.iter().map(|print| print.at).collect();
    let mut joint = approach(joint, outliers)?;
    let Some(Discs { pitch_m, readings }) = discs else { return Ok(joint) };
    let values = joint.values();
    let cameras: Vec<Camera<f64>> = (0..readings.len()).map(|view| joint.camera(&values, view)).collect();
    for (print, seen) in joint.prints.iter_mut().zip(&seen) {
        let (PrintPlace::Pitches(place), Some(reading)) = (print.place, readings.get(print.view)) else { continue };
        let radius = if is_mark(place) { reading.mark_radius_pitches } else { reading.dot_radius_pitches };
        if let Some([dx, dy]) = disc_centroid_offset(&cameras[print.view], place.map(|p| p * pitch_m), radius * pitch_m) {
            print.at = PixelPoint { x_px: seen.x_px - dx, y_px: seen.y_px - dy };
        }
    }
    joint.print_scale = 1.0;
    approach(joint, outliers)
}

/// What a reading says of the print in a view.
pub(super) fn print_observations(view: usize, reading: &Reading) -> impl Iterator<Item = PrintObservation> + '_ {
    reading.dots.iter().map(move |dot| PrintObservation {
        view,
        at: dot.at,
        sharpness: Sharpness::Point(dot.covariance),
        place: PrintPlace::Pitches([f64::from(dot.index.0), f64::from(dot.index.1)]),
        weight: 1.0,
    })
}

/// Homography from metres on the print to pixels, as the reading found it.
pub(super) fn pixel_from_metres(reading: &Reading, pitch_m: f64) -> Matrix3<f64> {
    let h = reading.pixel_from_pitches;
    Matrix3::from_fn(|row, column| h[row][column]) * Matrix3::from_diagonal(&Vector3::new(1.0 / pitch_m, 1.0 / pitch_m, 1.0))
}

fn is_mark(place: [f64; 2]) -> bool {
    [[0.0, 0.0], [2.0, 0.0], [0.0, 1.0]].contains(&place)
}

fn check_sizes(seen: &Seen) -> Result<(), MeasureError> {
    let sizes = seen.patterns.iter().map(|p| p.size_px).chain(seen.targets.iter().map(|t| t.size_px));
    let first = seen.patterns.first().map_or([0, 0], |pattern| pattern.size_px);
    match sizes.into_iter().find(|&size| size != first) {
        Some(other) => Err(MeasureError::SizesDiffer { first, other }),
        None => Ok(()),
    }
}

fn lens(seen: &Seen, bench: &Bench) -> LensKnowledge {
    let none = Exif::default();
    let exif = seen.targets.first().map(|t| &t.exif).or_else(|| seen.patterns.first().map(|p| &p.exif)).unwrap_or(&none);
    let size = seen.patterns.first().map_or([1, 1], |pattern| pattern.size_px);
    #[expect(clippy::cast_precision_loss, reason = "picture sizes are far below 2^53")]
    let mut lens = lens_knowledge(exif, size.map(|side| side as f64));
    match bench.camera.focal_length {
        Some(FocalLength::Pixels(focal)) => (lens.focal_px, lens.u_focal_px) = (focal.value, focal.u),
        Some(FocalLength::Metres { focal_length_m: focal, pixel_size_m: pixel }) => {
            lens.focal_px = focal.value / pixel.value;
            lens.u_focal_px = lens.focal_px * (focal.u / focal.value).hypot(pixel.u / pixel.value);
        }
        None => {}
    }
    lens
}

/// Photos share the view of the bench file's one target photo unless they name their own, or carry their dots themselves.
fn views_of_photos(bench: &Bench, photos: usize, targets: &[&str]) -> Vec<usize> {
    let target_in_pattern = matches!(
        bench.target.as_ref().map(|target| &target.kind),
        Some(TargetKind::Dots { photo: None, .. } | TargetKind::Sheet { photo: None, .. } | TargetKind::Ruling { photo: None, .. })
    );
    let own =
        |photo: usize| bench.photos.get(photo).and_then(|p| p.target.as_deref()).and_then(|name| targets.iter().position(|t| *t == name));
    (0..photos).map(|photo| if target_in_pattern { photo } else { own(photo).unwrap_or(0) }).collect()
}

fn dot_views(seen: &Seen, pitch_m: Quantity, lens: &LensKnowledge) -> Result<Vec<View>, Error> {
    let readings: Vec<&Reading> =
        prints(seen).into_iter().filter_map(|print| if let Print::Dots(dots) = print { Some(dots) } else { None }).collect();
    let view = |(number, reading): (usize, &&Reading)| {
        let start = pose_from_homography(&pixel_from_metres(reading, pitch_m.value), lens).ok_or(MeasureError::NoPose)?;
        let prints = print_observations(number, reading).collect();
        Ok(View { start, prints, reading: Some((*reading).clone()), sheet_sides_m: None, families: None })
    };
    readings.iter().enumerate().map(view).collect()
}

fn ruling_views(seen: &Seen, pitch_m: Quantity, lens: &LensKnowledge) -> Result<Vec<View>, Error> {
    let rulings = prints(seen).into_iter().filter_map(|print| if let Print::Ruling(ruling) = print { Some(ruling) } else { None });
    let view = |(number, ruling): (usize, &target::Ruling)| {
        let RulingView { start, prints } = ruling_view(number, ruling, pitch_m, lens)?;
        Ok(View { start, prints, reading: None, sheet_sides_m: None, families: Some(ruling.families) })
    };
    rulings.enumerate().map(view).collect()
}

/// What was read of the target, view by view.
fn prints(seen: &Seen) -> Vec<&Print> {
    let in_pattern = seen.patterns.iter().filter_map(|pattern| pattern.print.as_ref());
    if seen.targets.is_empty() { in_pattern.collect() } else { seen.targets.iter().map(|target| &target.print).collect() }
}

fn sheet_views(seen: &Seen, format: SheetFormat, lens: &LensKnowledge) -> Result<Vec<View>, Error> {
    let outlines = prints(seen).into_iter().filter_map(|print| if let Print::Sheet(outline) = print { Some(outline) } else { None });
    let view = |(number, outline)| {
        let SheetView { start, prints, sides_m } = sheet_view(number, outline, format, lens)?;
        Ok(View { start, prints, reading: None, sheet_sides_m: Some(sides_m), families: None })
    };
    outlines.enumerate().map(view).collect()
}

fn mark_view(marks: &[(PixelPoint, crate::frames::TargetPoint)], u_px: f64, lens: &LensKnowledge) -> Result<View, Error> {
    let pairs: Vec<([f64; 2], [f64; 2])> = marks.iter().map(|(px, mm)| ([mm.x_m, mm.y_m], [px.x_px, px.y_px])).collect();
    let homography = target::homography(&pairs).ok_or(MeasureError::NoPose)?;
    let homography = Matrix3::from_fn(|row, column| homography[row][column]);
    let start = pose_from_homography(&homography, lens).ok_or(MeasureError::NoPose)?;
    let print = |(px, mm): &(PixelPoint, crate::frames::TargetPoint)| PrintObservation {
        view: 0,
        at: *px,
        sharpness: Sharpness::Point(PixelCovariance::isotropic(u_px)),
        place: PrintPlace::Metres([mm.x_m, mm.y_m]),
        weight: 1.0,
    };
    Ok(View { start, prints: marks.iter().map(print).collect(), reading: None, sheet_sides_m: None, families: None })
}

/// Without print: a camera square-on before the brightest spot, at a distance that the scale or the throw suggests.
fn bare_view(seen: &Seen, bench: &Bench, lens: &LensKnowledge) -> View {
    let centre = lens.size_px.map(|side| side / 2.0);
    let origin = seen.patterns.first().and_then(|p| p.spots.spots.first()).map_or(centre, |spot| [spot.at.x_px, spot.at.y_px]);
    let distance_m = match bench.camera.scale {
        Some(scale) => lens.focal_px * scale.distance_m.value / scale.points[0].distance_px(scale.points[1]),
        None => 3.0 * bench.screen.throw_m.map_or(super::GAUGE_THROW_M, |throw| throw.value),
    };
    View { start: square_on_pose(lens, origin, distance_m), prints: vec![], reading: None, sheet_sides_m: None, families: None }
}

impl Cameras {
    /// Moves every bare camera to another distance, keeping the zero order where it is seen.
    pub(super) fn at_distance(&self, distance_m: f64) -> Self {
        let mut moved = self.clone();
        for view in 0..self.references.len() {
            let place = |axis| Parameter::CameraPlace { view, axis };
            let now = self.layout.value(place(2)).unwrap_or(1.0);
            for axis in 0..3 {
                moved.layout.set(place(axis), self.layout.value(place(axis)).unwrap_or(0.0) * distance_m / now);
            }
        }
        moved
    }
}
