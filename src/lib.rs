//! spotrule: the pitch of a periodic sample, from photos of the laser pattern it throws on a screen.
//!
//! One measurement is one weighted least-squares problem: spot centroids, target dots and everything
//! that the operator knows are residuals; the posterior covariance is the uncertainty.
//!
//! Rooms, in the order in which a photo passes through them:
//! [`mod@photo`] -> [`mod@spots`] -> [`mod@lattice`] -> [`mod@fit`] -> [`mod@budget`] -> [`mod@measure`] -> [`mod@report`];
//! [`mod@bench`] carries what the operator knows, [`mod@target`] the printed dots, [`mod@optics`] the physics.

pub mod bench;
pub mod budget;
pub mod calibration;
pub mod cli;
pub mod control;
pub mod digest;
pub mod error;
pub mod fit;
pub mod frames;
pub mod lattice;
pub mod limits;
pub mod log;
pub mod math;
pub mod measure;
pub mod note;
pub mod optics;
pub mod photo;
pub mod quantity;
pub mod report;
pub mod spots;
pub mod synth;
pub mod target;

pub use error::Error;
pub use note::Note;
