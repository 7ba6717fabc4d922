//! `spotrule calibrate camera`: views of the dot target in, the lens with its covariance out.

use super::{Failure, arguments::CalibrateCameraArguments};
use std::process::ExitCode;

pub(super) fn run(_arguments: &CalibrateCameraArguments) -> Result<ExitCode, Failure> {
    Err(Failure::Usage("soon".to_owned()))
}
