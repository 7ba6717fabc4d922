//! A calibrated camera for a terminal.

use super::{
    calibration_text::parameter_lines,
    columns::{Align, WIDTH, columns, paragraph},
    rounding::significant,
    words::NO_CERTIFICATE,
};
use crate::measure::{CameraCalibration, ViewSummary};

/// The calibration as text for a terminal, ending with a line break.
#[must_use]
pub fn camera_text(found: &CameraCalibration) -> String {
    let [width, height] = found.calibration.taken_with.size_px;
    let title = format!("Camera, from {} views of the dot target ({width} x {height} px); u in the last places:", found.views.len());
    let sections = [
        paragraph("", &title, WIDTH) + &parameter_lines(&found.calibration),
        paragraph("Fit: ", &fit_words(found), WIDTH),
        views(&found.views),
        notes(found),
        format!("{NO_CERTIFICATE}\n"),
    ];
    sections.into_iter().filter(|section| !section.is_empty()).collect::<Vec<_>>().join("\n")
}

fn fit_words(found: &CameraCalibration) -> String {
    let mut words = format!(
        "{} dots lie {} px (rms) from where the camera puts them; reduced chi-square {} with {} degrees of freedom",
        found.dots_used,
        significant(found.calibration.made_from.rms_px, 2),
        significant(found.chi2_reduced, 3),
        significant(found.degrees_of_freedom, 4),
    );
    words += &if found.birge_factor > 1.0 {
        format!(": more scatter than the dots' own uncertainties, which were therefore raised by {}", significant(found.birge_factor, 3))
    } else {
        ": no more than the dots' own uncertainties".to_owned()
    };
    words + ". Uncertainties hold for a flat print; a bulge of it is not in them."
}

fn views(views: &[ViewSummary]) -> String {
    let mut rows = vec![["view", "dots used", "rms", "oblique", "distance"].map(str::to_owned).to_vec()];
    rows.extend(views.iter().map(|view| {
        vec![
            view.file.clone(),
            format!("{} of {}", view.dots[0], view.dots[1]),
            format!("{} px", significant(view.rms_px, 2)),
            format!("{:.1}°", view.oblique_rad.to_degrees()),
            format!("{:.0} mm", view.distance_m * 1e3),
        ]
    }));
    columns(&rows, &[Align::Left, Align::Right, Align::Right, Align::Right, Align::Right])
}

fn notes(found: &CameraCalibration) -> String {
    if found.notes.is_empty() {
        return String::new();
    }
    let lines: String = found.notes.iter().map(|note| paragraph("  - ", &note.to_string(), WIDTH)).collect();
    format!("Please note:\n{lines}")
}
