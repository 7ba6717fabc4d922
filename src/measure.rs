//! The whole measurement on one screen: photos and bench in, Measurement out.
