//! Finding origin, X direction and handedness from the three larger dots.

use std::collections::{BTreeMap, BTreeSet};

use super::{MARKS, error::TargetError};

/// A place on the grid whose origin and axes are arbitrary.
type Place = (i32, i32);

/// How the print lies on the arbitrary grid: its origin and its X step; Y follows with the hand of the print.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Orientation {
    origin: Place,
    x: Place,
    y: Place,
}

/// A dot this much larger than its neighbours is a mark (nominal 1.75).
const MARK_FROM: f64 = 1.35;

/// Below this it is an ordinary dot; in between it is neither.
const ORDINARY_TO: f64 = 1.2;

/// The four steps along the grid.
const STEPS: [Place; 4] = [(1, 0), (0, 1), (-1, 0), (0, -1)];

impl Orientation {
    /// Index on the print of a place on the arbitrary grid.
    pub(super) fn index(&self, place: Place) -> (i32, i32) {
        let d = (place.0 - self.origin.0, place.1 - self.origin.1);
        (d.0 * self.x.0 + d.1 * self.x.1, d.0 * self.y.0 + d.1 * self.y.1)
    }

    /// Without marks: the origin is `origin`, X runs along the step that points most to the right in the
    /// photo, Y so that the print is not mirrored.
    ///
    /// - `right`: share of each of the two grid steps that points to the right, px
    /// - `turned`: the second grid step lies clockwise (as displayed) from the first
    pub(super) fn without_marks(origin: Place, right: [f64; 2], hand: Hand) -> Self {
        let x = if right[0].abs() >= right[1].abs() { (sign(right[0]), 0) } else { (0, sign(right[1])) };
        Self { origin, x, y: hand.quarter_turn(x) }
    }
}

fn sign(v: f64) -> i32 {
    if v < 0.0 { -1 } else { 1 }
}

/// Which way the arbitrary grid turns in the photo.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Hand {
    /// From the first to the second grid step it goes counter-clockwise as displayed.
    CounterClockwise,
    /// Clockwise as displayed.
    Clockwise,
}

impl Hand {
    /// The step that lies a quarter turn counter-clockwise (as displayed) from `step`.
    fn quarter_turn(self, step: Place) -> Place {
        match self {
            Self::CounterClockwise => (-step.1, step.0),
            Self::Clockwise => (step.1, -step.0),
        }
    }

    fn other(self) -> Self {
        match self {
            Self::CounterClockwise => Self::Clockwise,
            Self::Clockwise => Self::CounterClockwise,
        }
    }
}

/// Finds the print's orientation from the sizes of the dots.
///
/// Two of the three marks suffice where the third place is hidden and no other reading fits.
///
/// - `radius`: radius of each dot, in pitches, from any threshold (only ratios to neighbours count)
pub(super) fn orientation(radius: &BTreeMap<Place, f64>, hand: Hand) -> Result<Orientation, TargetError> {
    let relative: BTreeMap<Place, f64> = radius.iter().map(|(place, r)| (*place, r / neighbours_radius(*place, radius))).collect();
    let larger: Vec<Place> = relative.iter().filter(|(_, r)| **r > MARK_FROM).map(|(place, _)| *place).collect();
    let (matched, best) = best_readings(&relative, &larger, hand);
    let (mirrored, mirrored_best) = best_readings(&relative, &larger, hand.other());
    if mirrored > matched && !mirrored_best.is_empty() {
        return Err(TargetError::Mirrored);
    }
    match best.as_slice() {
        [] => Err(TargetError::MarksNotFound { dots: radius.len(), larger: larger.len() }),
        [one] => Ok(*one),
        several => Err(TargetError::MarksAmbiguous { larger: larger.len(), readings: several.len() }),
    }
}

/// Median radius of the dots within two steps (without the dot itself).
fn neighbours_radius(place: Place, radius: &BTreeMap<Place, f64>) -> f64 {
    let mut around: Vec<f64> = (-2..=2)
        .flat_map(|i| (-2..=2).map(move |j| (i, j)))
        .filter(|d| *d != (0, 0))
        .filter_map(|(i, j)| radius.get(&(place.0 + i, place.1 + j)).copied())
        .collect();
    if around.len() < 5 {
        around = radius.values().copied().collect();
    }
    super::median(&mut around).unwrap_or(1.0)
}

/// The readings that explain most of the larger dots (at least two), and how many that is.
fn best_readings(relative: &BTreeMap<Place, f64>, larger: &[Place], hand: Hand) -> (usize, Vec<Orientation>) {
    let mut candidates: BTreeSet<Orientation> = BTreeSet::new();
    for mark in larger {
        for x in STEPS {
            let y = hand.quarter_turn(x);
            for role in MARKS {
                let origin = (mark.0 - role.0 * x.0 - role.1 * y.0, mark.1 - role.0 * x.1 - role.1 * y.1);
                candidates.insert(Orientation { origin, x, y });
            }
        }
    }
    let scored: Vec<(usize, Orientation)> =
        candidates.into_iter().filter_map(|reading| Some((reading.marks_seen(relative)?, reading))).filter(|(n, _)| *n >= 2).collect();
    let most = scored.iter().map(|(n, _)| *n).max().unwrap_or(0);
    (most, scored.into_iter().filter(|(n, _)| *n == most).map(|(_, reading)| reading).collect())
}

impl Orientation {
    /// How many of the three marks are seen in this reading; `None` when an ordinary dot sits in the place of one.
    fn marks_seen(&self, relative: &BTreeMap<Place, f64>) -> Option<usize> {
        let mut seen = 0;
        for (i, j) in MARKS {
            let place = (self.origin.0 + i * self.x.0 + j * self.y.0, self.origin.1 + i * self.x.1 + j * self.y.1);
            match relative.get(&place) {
                Some(r) if *r > MARK_FROM => seen += 1,
                Some(r) if *r < ORDINARY_TO => return None,
                _ => {}
            }
        }
        Some(seen)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A grid whose marks lie at origin, +2 X, +1 Y with X = (0, 1) of the arbitrary grid and this Y.
    fn grid(y: Place, hidden: &[Place]) -> BTreeMap<Place, f64> {
        let mut radius: BTreeMap<Place, f64> = (-5..6).flat_map(|i| (-5..6).map(move |j| ((i, j), 0.2))).collect();
        for mark in [(1, -1), (1, 1), (1 + y.0, -1 + y.1)] {
            radius.insert(mark, 0.35);
        }
        for place in hidden {
            radius.remove(place);
        }
        radius
    }

    #[test]
    fn three_marks_give_origin_and_axes() {
        // With a counter-clockwise grid a quarter turn from X = (0, 1) is (-1, 0).
        let found = orientation(&grid((-1, 0), &[]), Hand::CounterClockwise).unwrap();
        assert_eq!(found.index((1, -1)), (0, 0));
        assert_eq!(found.index((1, 1)), (2, 0));
        assert_eq!(found.index((0, -1)), (0, 1));
        assert_eq!(found.index((-3, 2)), (3, 4));
    }

    #[test]
    fn any_one_mark_may_be_hidden() {
        for hidden in [(1, -1), (1, 1), (0, -1)] {
            let found = orientation(&grid((-1, 0), &[hidden]), Hand::CounterClockwise).unwrap();
            assert_eq!(found.index((1, -1)), (0, 0), "hidden {hidden:?}");
            assert_eq!(found.index((1, 1)), (2, 0), "hidden {hidden:?}");
        }
    }

    #[test]
    fn a_mirrored_print_is_named() {
        assert_eq!(orientation(&grid((1, 0), &[]), Hand::CounterClockwise), Err(TargetError::Mirrored));
        assert!(orientation(&grid((1, 0), &[]), Hand::Clockwise).is_ok());
    }

    #[test]
    fn one_mark_is_not_enough() {
        let got = orientation(&grid((-1, 0), &[(1, 1), (0, -1)]), Hand::CounterClockwise);
        assert_eq!(got, Err(TargetError::MarksNotFound { dots: 119, larger: 1 }));
    }

    #[test]
    fn two_places_hidden_beside_two_marks_are_ambiguous() {
        // Origin and Y mark seen; both places where the X mark could be are hidden.
        let got = orientation(&grid((-1, 0), &[(1, 1), (0, -3)]), Hand::CounterClockwise);
        assert_eq!(got, Err(TargetError::MarksAmbiguous { larger: 2, readings: 2 }));
    }
}
