//! The unknowns of the joint problem: what each is, what is known of it beforehand, and where it stands in the solver's vector.

use super::{observation::SheetEdge, source::Source};

/// One scalar unknown. Blocks that several photos share simply name the same parameter.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Parameter {
    /// Component of a reciprocal-lattice vector of a sample, 1/m: `vector` 0 or 1, `axis` 0 (x_s) or 1 (y_s).
    Lattice {
        /// Which sample.
        sample: usize,
        /// g1 or g2.
        vector: usize,
        /// Along x_s or y_s.
        axis: usize,
    },
    /// Turn of a sample's normal against the zero order, rad.
    Incidence {
        /// Which sample.
        sample: usize,
        /// About x or y.
        axis: usize,
    },
    /// Wavelength of a laser at the sample, m.
    Wavelength {
        /// Which laser.
        laser: usize,
    },
    /// Sample to zero-order spot, m.
    Throw,
    /// Travel of the screen added to the throw for one photo, m.
    Step {
        /// Which photo of the pattern.
        photo: usize,
    },
    /// Turn of the screen, rad.
    ScreenTilt {
        /// About x or y.
        axis: usize,
    },
    /// Where on the print the zero order falls, m.
    ZeroOrderOnPrint {
        /// X or Y.
        axis: usize,
    },
    /// Turn of the print against the bench's horizontal, rad.
    PrintTurn,
    /// Distance of neighbouring dots or lines of the target, m.
    TargetPitch,
    /// Width (`axis` 0, along X) or height (1, along Y) of a sheet of paper, m.
    SheetSide {
        /// X or Y.
        axis: usize,
    },
    /// How far the middle of a sheet's edge stands out of the straight line between its ends, m.
    SheetBow {
        /// Which edge.
        edge: SheetEdge,
    },
    /// Natural logarithm of the focal length in px: a factor is what is known of it, and it can never reach zero.
    LogFocalLength,
    /// Principal point, px.
    PrincipalPoint {
        /// x or y.
        axis: usize,
    },
    /// k1, k2.
    RadialDistortion {
        /// 0 for k1, 1 for k2.
        term: usize,
    },
    /// p1, p2.
    TangentialDistortion {
        /// 0 for p1, 1 for p2.
        term: usize,
    },
    /// Turn of the camera on top of its reference, rad.
    CameraTurn {
        /// Which view.
        view: usize,
        /// About camera x, y or z.
        axis: usize,
    },
    /// Origin of the print in camera axes, m.
    CameraPlace {
        /// Which view.
        view: usize,
        /// Along camera x, y or z.
        axis: usize,
    },
    /// Place on the screen of one end of a known distance, m.
    ScaleEnd {
        /// Which end.
        end: usize,
        /// X or Y.
        axis: usize,
    },
}

/// What is known of a parameter before the photos are looked at.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Prior {
    /// Nothing.
    Free,
    /// Normal with this mean and standard uncertainty.
    Normal {
        /// Mean.
        mean: f64,
        /// Standard uncertainty.
        u: f64,
    },
    /// Normal with this mean and standard uncertainty, together with others: its rows are those of a
    /// [`CorrelatedPrior`](super::CorrelatedPrior).
    Correlated {
        /// Mean.
        mean: f64,
        /// Standard uncertainty.
        u: f64,
    },
    /// Known exactly; not an unknown at all.
    Exact,
}

/// One row of the [`Layout`].
#[derive(Debug, Clone, PartialEq)]
pub struct Entry {
    /// Which unknown.
    pub parameter: Parameter,
    /// Current value, SI.
    pub value: f64,
    /// What is known beforehand.
    pub prior: Prior,
    /// Who owns the prior's share of the budget.
    pub source: Source,
    /// Size of a typical change; conditions the solver, does not enter the result.
    pub scale: f64,
}

/// All unknowns in a fixed order. The solver's vector holds `(value − origin) / scale` of every entry that is not exact.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Layout {
    entries: Vec<Entry>,
    free: Vec<usize>,
    column: Vec<Option<usize>>,
}

impl Layout {
    /// Adds an unknown and gives its place among the entries; an unknown that is already there is left as it is.
    pub fn add(&mut self, entry: Entry) -> usize {
        if let Some(place) = self.place(entry.parameter) {
            return place;
        }
        let place = self.entries.len();
        if entry.prior == Prior::Exact {
            self.column.push(None);
        } else {
            self.column.push(Some(self.free.len()));
            self.free.push(place);
        }
        self.entries.push(entry);
        place
    }

    /// The same layout without one of its unknowns.
    #[must_use]
    pub fn without(&self, parameter: Parameter) -> Self {
        let mut rest = Self::default();
        for entry in self.entries.iter().filter(|entry| entry.parameter != parameter) {
            rest.add(entry.clone());
        }
        rest
    }

    /// Place of an unknown among the entries.
    #[must_use]
    pub fn place(&self, parameter: Parameter) -> Option<usize> {
        self.entries.iter().position(|entry| entry.parameter == parameter)
    }

    /// All entries.
    #[must_use]
    pub fn entries(&self) -> &[Entry] {
        &self.entries
    }

    /// Column of an entry in the solver's vector; `None` when it is exact.
    #[must_use]
    pub fn column(&self, place: usize) -> Option<usize> {
        self.column[place]
    }

    /// The entries that are unknown, in the order of the solver's vector.
    #[must_use]
    pub fn free(&self) -> &[usize] {
        &self.free
    }

    /// Value of a parameter, if it is part of the problem.
    #[must_use]
    pub fn value(&self, parameter: Parameter) -> Option<f64> {
        self.place(parameter).map(|place| self.entries[place].value)
    }

    /// Overwrites the current value, for a better start.
    pub fn set(&mut self, parameter: Parameter, value: f64) {
        if let Some(place) = self.place(parameter) {
            self.entries[place].value = value;
        }
    }

    /// Values of all entries when the solver's vector is `step`.
    #[must_use]
    pub fn values_at(&self, step: &nalgebra::DVector<f64>) -> Vec<f64> {
        let mut values: Vec<f64> = self.entries.iter().map(|entry| entry.value).collect();
        for (column, &place) in self.free.iter().enumerate() {
            values[place] += step[column] * self.entries[place].scale;
        }
        values
    }

    /// Makes `step` the new origin.
    pub fn advance(&mut self, step: &nalgebra::DVector<f64>) {
        let values = self.values_at(step);
        for (entry, value) in self.entries.iter_mut().zip(values) {
            entry.value = value;
        }
    }
}
