//! In: a photo of the printed dot target, of a sheet or of ruled paper. Out: its dots, edges or lines, each with its place. Also draws the print.
//! Must never know: the pattern, the sample, the bench.
//! Start reading at [`read`] and [`Reading`], [`read_outline`], [`read_ruling`]; for the print at [`Sheet`].
//!
//! ```text
//!   o  o  o  o  o      dots at (i, j) pitches, X to the right, Y up as printed
//!   o  O  o  o  o      three larger ones: origin (0,0), X direction (2,0), handedness (0,1)
//!   o  O  o  O  o
//!   o  o  o  o  o
//! ```

mod blobs;
mod centroid;
mod error;
mod grid;
mod homography;
mod marks;
mod outline;
mod paper;
mod pdf;
mod reading;
mod refine;
mod residuals;
mod rim;
mod ruling;
mod sheet;
mod svg;
mod view;

#[cfg(test)]
mod corpus_check;
#[cfg(test)]
#[expect(clippy::cast_possible_truncation, reason = "test scenes are small")]
mod painted_check;
#[cfg(test)]
#[expect(clippy::cast_possible_truncation, reason = "test scenes are small")]
mod painter;

pub use error::TargetError;
pub use homography::homography;
pub use outline::{EdgePoint, Outline, read_outline};
pub use pdf::pdf;
pub use reading::{Dot, Marks, ReadOptions, Reading, read};
pub use ruling::{Families, RuledPoint, Ruling, read_ruling};
pub use sheet::{DOT_DIAMETER_PITCHES, MARK_DIAMETER_PITCHES, Paper, Sheet};
pub use svg::svg;

/// Places of the three larger dots: origin, X direction, handedness.
const MARKS: [(i32, i32); 3] = [(0, 0), (2, 0), (0, 1)];

fn is_mark(index: (i32, i32)) -> bool {
    MARKS.contains(&index)
}

/// Median; the values are put in order. `None` for no values.
fn median(values: &mut [f64]) -> Option<f64> {
    let middle = values.len() / 2;
    let (_, at, _) = (!values.is_empty()).then(|| values.select_nth_unstable_by(middle, f64::total_cmp))?;
    Some(*at)
}
