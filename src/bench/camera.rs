//! `[camera]`: what is known of the camera.

use super::{
    BenchError, Camera, FocalLength, Scale,
    screen::tilt_pair,
    section::{Section, Sense, point},
    tree::{Content, Table},
};
use crate::{
    frames::PixelPoint,
    quantity::{Dimension, Quantity, QuantityError},
};

const SCALE_TABLE: &str = "a table such as { points = [[412.0, 880.0], [1630.0, 902.0]], distance = \"100.0(2) mm\" }";
const LEAST_DISTANCE_PX: f64 = 10.0;

/// The camera; what is not stated is not known.
pub(super) fn read_camera(root: &Table) -> Result<Camera, BenchError> {
    let section = Section::at(root, "camera")?;
    section.allow_only(&["square_on", "focal_length", "scale", "calibration"])?;
    let calibration = section.text("calibration", "a file name in quotes, such as \"camera.toml\"")?.map(str::to_owned);
    if calibration.is_some() && section.node("focal_length").is_some() {
        let conflict = "the camera's calibration holds the focal length; take focal_length out";
        return Err(BenchError::Conflict { place: section.place("focal_length"), conflict });
    }
    let square_on_rad = section
        .pair("square_on", Dimension::Angle)?
        .map(|pair| tilt_pair(pair, "lean of the camera from the screen's normal"))
        .transpose()?;
    let scale = section.table("scale", SCALE_TABLE)?.map(|scale| read_scale(&scale)).transpose()?;
    Ok(Camera { square_on_rad, focal_length: focal_length(&section)?, scale, calibration, lens: None })
}

/// `"3400(50) px"` or `{ focal = "4.20(5) mm", pixel = "1.40(1) um" }`.
fn focal_length(section: &Section<'_>) -> Result<Option<FocalLength>, BenchError> {
    const PIXELS: Sense = Sense { what: "focal length", range: 10.0..=1e6, range_in_words: "10 px to 1000000 px" };
    let Some(node) = section.node("focal_length") else { return Ok(None) };
    if let Content::Table(_) = node.content {
        return section.table("focal_length", "a table")?.map(|table| in_metres(&table)).transpose();
    }
    let stated = section.quantity("focal_length", Dimension::Pixel).map_err(ask_for_pixel_size)?;
    Ok(stated.map(|stated| stated.sensible_and_known(&PIXELS)).transpose()?.map(FocalLength::Pixels))
}

/// A focal length in millimetres is half of what is needed, not a unit gone wrong.
fn ask_for_pixel_size(error: BenchError) -> BenchError {
    match error {
        BenchError::Quantity { place, reason } => match *reason {
            QuantityError::WrongDimension { seen, unit, found: "length", .. } => BenchError::PixelSizeNeeded { place, seen, unit },
            other => BenchError::Quantity { place, reason: Box::new(other) },
        },
        other => other,
    }
}

fn in_metres(table: &Section<'_>) -> Result<FocalLength, BenchError> {
    const FOCAL: Sense = Sense { what: "focal length of a lens", range: 0.5e-3..=5.0, range_in_words: "0.5 mm to 5 m" };
    const PIXEL: Sense = Sense { what: "pixel size", range: 0.1e-6..=0.1e-3, range_in_words: "0.1 um to 100 um" };
    table.allow_only(&["focal", "pixel"])?;
    let read = |key, example: &str, sense: &Sense| -> Result<Quantity, BenchError> {
        match table.quantity(key, Dimension::Length)? {
            Some(stated) => stated.sensible_and_known(sense),
            None => Err(BenchError::Missing { key: table.path_of(key), advice: format!("write {key} = \"{example}\"") }),
        }
    };
    Ok(FocalLength::Metres { focal_length_m: read("focal", "4.20(5) mm", &FOCAL)?, pixel_size_m: read("pixel", "1.40(1) um", &PIXEL)? })
}

fn read_scale(scale: &Section<'_>) -> Result<Scale, BenchError> {
    const DISTANCE: Sense = Sense { what: "distance of two points on a screen", range: 0.5e-3..=100.0, range_in_words: "0.5 mm to 100 m" };
    scale.allow_only(&["points", "distance"])?;
    let missing = |key, example| BenchError::Missing { key: scale.path_of(key), advice: format!("write {key} = {example}") };
    let path = scale.path_of("points");
    const POINTS: &str = "a list of two points in px, such as [[412.0, 880.0], [1630.0, 902.0]]";
    let items = scale.list("points", POINTS)?.ok_or_else(|| missing("points", "[[412.0, 880.0], [1630.0, 902.0]]"))?;
    let [a, b] = items else {
        return Err(BenchError::WrongKind { place: scale.place("points"), seen: format!("a list of {}", items.len()), needed: POINTS });
    };
    let pixel = |[x_px, y_px]: [f64; 2]| PixelPoint { x_px, y_px };
    let points = [pixel(point(a, &path)?), pixel(point(b, &path)?)];
    let distance_px = points[0].distance_px(points[1]);
    if distance_px < LEAST_DISTANCE_PX {
        return Err(BenchError::ScalePointsCoincide { place: scale.place("points"), distance_px, least_px: LEAST_DISTANCE_PX });
    }
    let stated = scale.quantity("distance", Dimension::Length)?.ok_or_else(|| missing("distance", "\"100.0(2) mm\""))?;
    Ok(Scale { points, distance_m: stated.sensible_and_known(&DISTANCE)? })
}
