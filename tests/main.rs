//! One test binary; one comment line per file.

// the house rules that a machine can check: who may use whom, sources that exist
mod layering;
// runs a reference library (Python) beside our own code, where one is available
mod live;
// NIST Statistical Reference Datasets against the least-squares solver
mod nist;
// worked examples and tables from the GUM, its supplement and textbooks
mod published;
