//! The outline of a bright sheet of paper on a darker ground: its four edges as many points, each known across the edge.
//! Start reading at [`read_outline`].

mod edges;
mod find;
mod lines;
#[cfg(test)]
#[expect(clippy::cast_possible_truncation, reason = "test scenes are small")]
mod painted_check;

use super::error::TargetError;
use crate::{frames::PixelPoint, photo::Light};

/// A point of an edge.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct EdgePoint {
    /// Where the light falls to the middle between paper and ground.
    pub at: PixelPoint,
    /// Unit vector across the edge, out of the sheet (x, y).
    pub across: [f64; 2],
    /// Standard uncertainty of the place across the edge, px. Holds the scatter of this edge and how far it reaches along it.
    pub u_px: f64,
}

/// A sheet as seen in a photo.
#[derive(Debug, Clone, PartialEq)]
pub struct Outline {
    /// Corners, clockwise as displayed; a start value only. Corners cut off by the photo's rim lie outside of it.
    pub corners: [PixelPoint; 4],
    /// Points of the edge from each corner to the next; none where clutter or the photo's rim hide the edge.
    pub edges: [Vec<EdgePoint>; 4],
}

/// Edges that must be seen; with three, the fourth is hidden somewhere along its length.
const LEAST_EDGES: usize = 3;

/// Least side of a photo that can show a sheet, px.
const LEAST_SIDE_PX: usize = 48;

/// Reads the outline of the sheet from a plane of linear light.
///
/// Give the plane with the least laser light where the pattern is in the same photo. Bright things beside the sheet and things that
/// cover parts of its edges may be there, and the photo's rim may cut it, as long as it shows all four edges in part and three of them well.
///
/// # Errors
/// [`TargetError`] says what was seen and what was needed.
pub fn read_outline(grey: &Light) -> Result<Outline, TargetError> {
    let (width, height) = (grey.width, grey.height);
    if width.min(height) < LEAST_SIDE_PX || Some(grey.value.len()) != width.checked_mul(height) {
        return Err(TargetError::PhotoTooSmall { width, height, samples: grey.value.len(), needed_px: LEAST_SIDE_PX });
    }
    let found = find::sheet(grey)?;
    let edges = std::array::from_fn(|side| edges::points(grey, found.corners[side], found.corners[(side + 1) % 4], found.within_px));
    let seen = edges.iter().filter(|points: &&Vec<EdgePoint>| !points.is_empty()).count();
    if seen < LEAST_EDGES {
        return Err(TargetError::SheetEdgesHidden { seen, needed: LEAST_EDGES });
    }
    let corners = found.corners.map(|[x_px, y_px]| PixelPoint { x_px, y_px });
    Ok(Outline { corners, edges })
}
