//! The tests for assignable causes, on deviations in standard deviations.

/// A test of a control chart. Source: ISO 7870-2 (from memory; the eight tests in common use).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Test {
    /// One reading beyond three sigma.
    Beyond,
    /// Nine in a row on one side of the centre line.
    OneSide,
    /// Six in a row steadily rising or falling.
    Trend,
    /// Fourteen in a row alternating up and down.
    Alternating,
    /// Two of three in a row beyond two sigma on the same side.
    TwoOfThree,
    /// Four of five in a row beyond one sigma on the same side.
    FourOfFive,
    /// Fifteen in a row within one sigma.
    Hugging,
    /// Eight in a row beyond one sigma, on both sides.
    Avoiding,
    /// A moving range above its limit.
    Range,
}

impl Test {
    /// The test in words.
    #[must_use]
    pub fn sentence(self) -> &'static str {
        match self {
            Self::Beyond => "one reading beyond 3 sigma",
            Self::OneSide => "nine readings in a row on one side of the centre line",
            Self::Trend => "six readings in a row steadily rising or falling",
            Self::Alternating => "fourteen readings in a row alternating up and down",
            Self::TwoOfThree => "two of three readings in a row beyond 2 sigma on the same side",
            Self::FourOfFive => "four of five readings in a row beyond 1 sigma on the same side",
            Self::Hugging => "fifteen readings in a row within 1 sigma",
            Self::Avoiding => "eight readings in a row beyond 1 sigma, on both sides",
            Self::Range => "a moving range above its limit",
        }
    }
}

/// A test that was failed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Violation {
    /// Which.
    pub test: Test,
    /// Index of the reading that completes it.
    pub last: usize,
}

/// Whether the readings of a window fail a test.
type Fails = fn(&[f64]) -> bool;

/// Every reading that completes one of the tests of the individuals.
pub(super) fn violations(z: &[f64]) -> Vec<Violation> {
    let tests: [(Test, usize, Fails); 8] = [
        (Test::Beyond, 1, |w| w[0].abs() > 3.0),
        (Test::OneSide, 9, |w| on_one_side(w, |z| z > 0.0, w.len())),
        (Test::Trend, 6, |w| w.windows(2).all(|p| p[1] > p[0]) || w.windows(2).all(|p| p[1] < p[0])),
        (Test::Alternating, 14, |w| w.windows(3).all(|p| (p[1] - p[0]) * (p[2] - p[1]) < 0.0)),
        (Test::TwoOfThree, 3, |w| on_one_side(w, |z| z > 2.0, 2)),
        (Test::FourOfFive, 5, |w| on_one_side(w, |z| z > 1.0, 4)),
        (Test::Hugging, 15, |w| w.iter().all(|z| z.abs() < 1.0)),
        (Test::Avoiding, 8, |w| w.iter().all(|z| z.abs() > 1.0) && w.iter().any(|z| *z > 0.0) && w.iter().any(|z| *z < 0.0)),
    ];
    let found = tests.into_iter().flat_map(|(test, length, fails)| {
        z.windows(length)
            .enumerate()
            .filter(move |(_, window)| fails(window))
            .map(move |(first, _)| Violation { test, last: first + length - 1 })
    });
    found.collect()
}

/// Whether at least `count` of the deviations, or of the deviations with their signs turned, pass; the last one among them.
fn on_one_side(window: &[f64], passes: fn(f64) -> bool, count: usize) -> bool {
    [1.0, -1.0].into_iter().any(|sign| {
        let passing = window.iter().filter(|z| passes(sign * **z)).count();
        passing >= count && window.last().is_some_and(|z| passes(sign * z))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn tests_failed(z: &[f64]) -> Vec<Test> {
        let mut tests: Vec<Test> = violations(z).iter().map(|violation| violation.test).collect();
        tests.dedup();
        tests
    }

    /// Each test just failed, and just not.
    #[test]
    fn each_test_at_its_edge() {
        assert_eq!(tests_failed(&[3.1]), [Test::Beyond]);
        assert_eq!(tests_failed(&[3.0]), []);
        let side = [0.5, 0.2, 0.6, 0.1, 0.5, 0.2, 0.4, 0.3, 0.9];
        assert_eq!(tests_failed(&side), [Test::OneSide]);
        assert_eq!(tests_failed(&side[..8]), []);
        assert_eq!(tests_failed(&[-0.5, -0.3, 0.0, 0.2, 0.4, 0.6]), [Test::Trend]);
        assert_eq!(tests_failed(&[-0.5, -0.3, 0.0, 0.2, 0.2, 0.6]), []);
        let saw: Vec<f64> = (0..14).map(|i| if i % 2 == 0 { 1.2 } else { -0.5 }).collect();
        assert_eq!(tests_failed(&saw), [Test::Alternating]);
        assert_eq!(tests_failed(&saw[1..]), []);
        assert_eq!(tests_failed(&[2.1, 0.0, 2.1]), [Test::TwoOfThree]);
        assert_eq!(tests_failed(&[2.1, 0.0, -2.1]), []);
        assert_eq!(tests_failed(&[-1.1, -1.2, 0.3, -1.5, -1.1]), [Test::FourOfFive]);
        assert_eq!(tests_failed(&[-1.1, -1.2, 0.3, 0.3, -1.1]), []);
        let near: Vec<f64> = (0..15).map(|i| [0.5, -0.5, -0.4][i % 3]).collect();
        assert_eq!(tests_failed(&near), [Test::Hugging]);
        assert_eq!(tests_failed(&near[..14]), []);
        let far: Vec<f64> = (0..8).map(|i| if i % 2 == 0 { 1.5 } else { -1.5 }).collect();
        assert_eq!(tests_failed(&far), [Test::Avoiding]);
        assert_eq!(tests_failed(&far[1..]), []);
    }
}
