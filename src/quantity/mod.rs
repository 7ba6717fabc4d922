//! In: text such as `812.0(8) mm`. Out: a value in SI units with its standard uncertainty, and back.
//! Must never know: what the quantity is used for.
//! Start reading at [`Quantity`].

mod error;
mod number;
mod parse;
mod print;
mod reader;
mod spelling;
mod unit;

pub use error::QuantityError;
pub use print::{
    format_angle_deg, format_angle_deg_interval, format_concise, format_concise_digits, format_length, format_length_interval,
    format_ratio_percent,
};
pub(crate) use spelling::nearest;
pub use unit::{LengthUnit, Unit, units_of};

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
///
/// ```
/// use spotrule::quantity::{Dimension, Quantity};
/// let throw = Quantity::parse("812.0(8) mm", Dimension::Length)?;
/// assert!((throw.value - 0.812).abs() < 1e-15 && (throw.u - 0.0008).abs() < 1e-15);
/// assert!(Quantity::parse("812.0 ± 0.8 mm", Dimension::Length).is_err()); // ± of what? (k=1), (k=2) or (limits)
/// # Ok::<(), spotrule::quantity::QuantityError>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Quantity {
    /// Best estimate.
    pub value: f64,
    /// Standard uncertainty; 0 only when [`Distribution::Exact`].
    pub u: f64,
    /// The law behind `u`.
    pub distribution: Distribution,
}

impl Quantity {
    /// A value without uncertainty.
    #[must_use]
    pub fn exact(value: f64) -> Self {
        Self { value, u: 0.0, distribution: Distribution::Exact }
    }

    /// A value with a normal law of standard uncertainty `u`, which must be positive.
    #[must_use]
    pub fn normal(value: f64, u: f64) -> Self {
        debug_assert!(u > 0.0, "a normal law needs u > 0; use Quantity::exact");
        Self { value, u, distribution: Distribution::Normal }
    }

    /// The quantity as text in `unit`, readable again by [`Quantity::parse`] within the rounding of u to two digits.
    ///
    /// A rectangular law is written with its standard uncertainty, as a normal one.
    #[must_use]
    pub fn text_in(&self, unit: &Unit) -> String {
        format_concise(unit.value_from_si(self.value), unit.difference_from_si(self.u), unit.symbol)
    }
}

impl Dimension {
    /// What the trade calls it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Length => "length",
            Self::Angle => "angle",
            Self::Pixel => "number of pixels",
            Self::Temperature => "temperature",
            Self::Pressure => "pressure",
            Self::Ratio => "ratio",
        }
    }

    fn name_with_article(self) -> &'static str {
        match self {
            Self::Length => "a length",
            Self::Angle => "an angle",
            Self::Pixel => "a number of pixels",
            Self::Temperature => "a temperature",
            Self::Pressure => "a pressure",
            Self::Ratio => "a ratio",
        }
    }
}
