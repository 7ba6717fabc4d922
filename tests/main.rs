//! One test binary; one comment line per file.
#![allow(
    clippy::unwrap_used,
    clippy::print_stdout,
    clippy::cast_possible_truncation,
    reason = "a test says what it measured, and fails where it stands"
)]

// text and JSON of one fixed measurement, word for word
mod golden;
// the house rules that a machine can check: who may use whom, sources that exist
mod layering;
// runs a reference library (Python) beside our own code, where one is available
mod live;
// NIST Statistical Reference Datasets against the least-squares solver
mod nist;
// OpenCV beside our rotations, camera and solver
mod opencv;
mod paper;
// worked examples and tables from the GUM, its supplement and textbooks
mod published;
// photos drawn from known truth, for the tests above and below
mod scenes;
// spots of photos with known truth, where those photos are at hand
mod spots_on_known_photos;
// a planted truth comes back, as often inside its uncertainty as stated
mod truth;
// a bench or a camera calibrated, saved, read back and used
mod calibration;
// the log under killed writers, full disks and closed folders
mod log;
// the published schemas against the types and against what is written
mod schema;
// the program as a user and a script meet it
mod cli;
// what must not matter: turned photos, units of length
mod invariance;
// the examples of GUM Supplement 1 by our Monte Carlo
mod jcgm101;
// photographs of real benches, where they are at hand
mod real_photos;
// what README.md shows is what the program prints
mod readme;
// made spots against the Cramér-Rao bound
mod spot_accuracy;
