//! In: the text of a calibrated bench or of a camera's calibration. Out: [`Calibration`]: mean and full covariance of what stays the same
//! between samples, with what it was made from; and back to text.
//! Must never know: the fit, photos as pixels, files (a photo is a name and a hash here).
//! Start reading at [`Calibration`], then [`text()`] and [`read()`].

mod error;
mod form;
mod read;
mod record;
mod write;

pub use error::CalibrationError;
pub use read::read;
pub use record::{Calibration, Certificate, Kind, MadeFrom, MadePhoto, Posterior, Shows, TakenWith, UncertainValue};
pub use write::text;
