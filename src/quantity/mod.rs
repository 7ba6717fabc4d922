//! In: text such as `812.0(8) mm`. Out: a value in SI units with its standard uncertainty, and back.
//! Must never know: what the quantity is used for.
//! Start reading at [`Quantity`].

/// What a quantity measures; decides which units are accepted and the SI unit of the value.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Dimension {
    /// metres
    Length,
    /// radians
    Angle,
    /// pixels
    Pixel,
    /// kelvin as degrees Celsius
    Temperature,
    /// pascal
    Pressure,
    /// a plain fraction (1 = 100 %)
    Ratio,
}

/// The law behind a stated uncertainty.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Distribution {
    /// Known without uncertainty: `(exact)`.
    Exact,
    /// Normal, from `( )`, `(k=1)`, `(k=2)`.
    Normal,
    /// Rectangular, from `(limits)`: u = half-width / √3.
    Rectangular,
}

/// A value with its standard uncertainty, both in the SI unit of its dimension.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Quantity {
    /// Best estimate.
    pub value: f64,
    /// Standard uncertainty; 0 only when [`Distribution::Exact`].
    pub u: f64,
    /// The law behind `u`.
    pub distribution: Distribution,
}

/// Why a text is no quantity.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum QuantityError {}
