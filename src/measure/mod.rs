//! The whole measurement on one screen: photos and bench in, [`Measurement`] out.

mod measurement;

pub use measurement::{
    BudgetLine, FitSummary, KindStatement, LatticeKind, Measurement, OrderRow, ParameterRow, ParameterUnit, PhotoSummary, RejectedSpot,
    SampleResult, Value, ZeroOrder,
};
