//! The printed target: paper, pitch, and where every dot, line and word goes.

use super::error::TargetError;

/// Sheets that printers take, used landscape.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Paper {
    /// ISO 216 A4, 297 mm × 210 mm.
    A4,
    /// ISO 216 A3, 420 mm × 297 mm.
    A3,
    /// US letter, 11 in × 8.5 in.
    Letter,
}

/// A dot target that fits its paper.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Sheet {
    paper: Paper,
    pitch_m: f64,
    half_columns: i32,
    half_rows: i32,
}

/// Diameter of an ordinary dot, pitches.
pub const DOT_DIAMETER_PITCHES: f64 = 0.4;

/// Diameter of the three marks, pitches.
pub const MARK_DIAMETER_PITCHES: f64 = 0.7;

/// Below this the dots (0.8 mm) come near the ragged rim that an office printer gives them (about 0.05 mm).
const LEAST_PITCH_M: f64 = 2e-3;

/// Columns and rows on either side of the origin that a target must have.
const LEAST_HALF: i32 = 2;

/// Space for dots: margins left, right (with the upright scale bar), above and below (with bar and text), mm.
const MARGINS_MM: [f64; 4] = [10.0, 20.0, 10.0, 28.0];

impl Paper {
    /// Width and height as used (landscape), mm.
    #[must_use]
    pub fn size_mm(self) -> [f64; 2] {
        match self {
            Self::A4 => [297.0, 210.0],
            Self::A3 => [420.0, 297.0],
            Self::Letter => [279.4, 215.9],
        }
    }

    /// Name on the command line.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::A4 => "a4",
            Self::A3 => "a3",
            Self::Letter => "letter",
        }
    }

    /// Width and height of the space for dots, mm.
    fn dots_mm(self) -> [f64; 2] {
        let [width, height] = self.size_mm();
        let [left, right, above, below] = MARGINS_MM;
        [width - left - right, height - above - below]
    }
}

impl Sheet {
    /// As many dots at `pitch_m` as fit, the origin mark in the middle.
    ///
    /// # Errors
    /// The pitch is no positive number, below 2 mm, or so large that fewer than 5 × 5 dots fit.
    pub fn new(paper: Paper, pitch_m: f64) -> Result<Self, TargetError> {
        if !pitch_m.is_finite() || pitch_m <= 0.0 {
            return Err(TargetError::PitchNotPositive { pitch_mm: pitch_m * 1e3 });
        }
        if pitch_m < LEAST_PITCH_M {
            return Err(TargetError::PitchTooSmall { pitch_mm: pitch_m * 1e3, least_mm: LEAST_PITCH_M * 1e3 });
        }
        let [half_columns, half_rows] = paper.dots_mm().map(|side_mm| half_count(side_mm, pitch_m * 1e3));
        if half_columns.min(half_rows) < LEAST_HALF {
            let side_mm = paper.dots_mm().into_iter().fold(f64::INFINITY, f64::min);
            let most_mm = side_mm / (2.0 * f64::from(LEAST_HALF) + DOT_DIAMETER_PITCHES);
            return Err(TargetError::PitchTooLarge { pitch_mm: pitch_m * 1e3, paper: paper.name(), most_mm });
        }
        Ok(Self { paper, pitch_m, half_columns, half_rows })
    }

    /// Columns and rows of dots.
    #[must_use]
    pub fn columns_and_rows(&self) -> (i32, i32) {
        (2 * self.half_columns + 1, 2 * self.half_rows + 1)
    }

    /// Everything that is printed, in mm from the lower left corner.
    pub(super) fn drawing(&self) -> Drawing {
        let size_mm = self.paper.size_mm();
        let mut drawing = Drawing { size_mm, discs: self.discs(), strokes: Vec::new(), words: Vec::new() };
        self.add_scale_bars(&mut drawing);
        self.add_words(&mut drawing);
        drawing
    }

    fn discs(&self) -> Vec<Disc> {
        let pitch_mm = self.pitch_m * 1e3;
        let [width, height] = self.paper.dots_mm();
        let [left, _, _, below] = MARGINS_MM;
        let origin = [left + width / 2.0, below + height / 2.0];
        let mut discs = Vec::new();
        for j in -self.half_rows..=self.half_rows {
            for i in -self.half_columns..=self.half_columns {
                let diameter = if super::is_mark((i, j)) { MARK_DIAMETER_PITCHES } else { DOT_DIAMETER_PITCHES };
                discs.push(Disc {
                    at_mm: [origin[0] + f64::from(i) * pitch_mm, origin[1] + f64::from(j) * pitch_mm],
                    radius_mm: diameter / 2.0 * pitch_mm,
                });
            }
        }
        discs
    }

    /// One bar along each direction: printers scale the two differently.
    fn add_scale_bars(&self, drawing: &mut Drawing) {
        let [width, height] = self.paper.size_mm();
        let [left, _, above, below] = MARGINS_MM;
        let along = bar_length_mm(width - 2.0 * left);
        let y = 22.0;
        drawing.strokes.push(Stroke { from_mm: [left, y], to_mm: [left + along, y], width_mm: 0.2 });
        for x in [left, left + along] {
            drawing.strokes.push(Stroke { from_mm: [x, y - 2.0], to_mm: [x, y + 2.0], width_mm: 0.2 });
        }
        drawing.words.push(Words { at_mm: [left + 2.0, y + 1.4], turned: Turned::No, text: bar_text("X", along) });
        let up = bar_length_mm(height - above - below);
        let x = width - 11.0;
        drawing.strokes.push(Stroke { from_mm: [x, below], to_mm: [x, below + up], width_mm: 0.2 });
        for y in [below, below + up] {
            drawing.strokes.push(Stroke { from_mm: [x - 2.0, y], to_mm: [x + 2.0, y], width_mm: 0.2 });
        }
        drawing.words.push(Words { at_mm: [x - 1.4, below + 2.0], turned: Turned::Upwards, text: bar_text("Y", up) });
    }

    fn add_words(&self, drawing: &mut Drawing) {
        let pitch_mm = self.pitch_m * 1e3;
        let lines = [
            format!(
                "spotrule dot target, nominal pitch {} mm. X to the right, Y up. The three larger dots mark (0,0), (2,0) and (0,1).",
                plain(pitch_mm)
            ),
            "Measure this print with a steel rule in both directions and put the result with its uncertainty into the bench file."
                .to_owned(),
            "Print at 100 % (no scaling) on matt paper, ink side out, flat in the plane of the screen. Set it up with the laser off."
                .to_owned(),
        ];
        for (text, y) in lines.into_iter().zip([15.6, 11.4, 7.2]) {
            drawing.words.push(Words { at_mm: [MARGINS_MM[0], y], turned: Turned::No, text });
        }
    }
}

fn bar_text(axis: &str, length_mm: f64) -> String {
    format!("{axis}: nominal {} mm, measured ____________________ mm", plain(length_mm))
}

/// Dots on one side of the middle that fit in half of `side_mm`.
#[expect(clippy::cast_possible_truncation, reason = "side and pitch are checked: the quotient lies between 0 and 250")]
fn half_count(side_mm: f64, pitch_mm: f64) -> i32 {
    // A trace of slack, so that a pitch stated as the most that fits does fit.
    ((side_mm / pitch_mm - DOT_DIAMETER_PITCHES) / 2.0 + 1e-9).floor() as i32
}

/// Longest multiple of 50 mm that fits.
fn bar_length_mm(space_mm: f64) -> f64 {
    (space_mm / 50.0).floor() * 50.0
}

/// A length without needless digits.
pub(super) fn plain(value: f64) -> String {
    let text = format!("{value:.4}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

/// A print in mm from the lower left corner, x to the right, y up.
#[derive(Debug)]
pub(super) struct Drawing {
    pub(super) size_mm: [f64; 2],
    pub(super) discs: Vec<Disc>,
    pub(super) strokes: Vec<Stroke>,
    pub(super) words: Vec<Words>,
}

/// A black disc.
#[derive(Debug, Clone, Copy)]
pub(super) struct Disc {
    pub(super) at_mm: [f64; 2],
    pub(super) radius_mm: f64,
}

/// A straight black line.
#[derive(Debug, Clone, Copy)]
pub(super) struct Stroke {
    pub(super) from_mm: [f64; 2],
    pub(super) to_mm: [f64; 2],
    pub(super) width_mm: f64,
}

/// A line of text that starts at a place on its base line. ASCII only, without angle brackets or `&`.
#[derive(Debug)]
pub(super) struct Words {
    pub(super) at_mm: [f64; 2],
    pub(super) turned: Turned,
    pub(super) text: String,
}

/// Direction of a line of text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Turned {
    /// To the right.
    No,
    /// Upwards, a quarter turn counter-clockwise.
    Upwards,
}

/// Height of the letters' body, mm.
pub(super) const TEXT_MM: f64 = 3.2;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_dot_lies_in_its_space_and_clears_bars_and_words() {
        for paper in [Paper::A4, Paper::A3, Paper::Letter] {
            for pitch_mm in [2.0, 5.0, 7.3, 10.0, 20.0, 39.0] {
                let Ok(sheet) = Sheet::new(paper, pitch_mm * 1e-3) else {
                    panic!("{paper:?} {pitch_mm}");
                };
                let [width, height] = paper.size_mm();
                let (columns, rows) = sheet.columns_and_rows();
                let discs = sheet.drawing().discs;
                assert_eq!(discs.len(), usize::try_from(columns * rows).unwrap());
                for disc in discs {
                    let ([x, y], r) = (disc.at_mm, disc.radius_mm);
                    assert!(x - r > 9.9 && x + r < width - 19.9 && y - r > 27.9 && y + r < height - 9.9, "{paper:?} {pitch_mm}: {disc:?}");
                }
            }
        }
    }

    #[test]
    fn bars_are_as_long_as_they_say_and_lie_on_the_sheet() {
        for paper in [Paper::A4, Paper::A3, Paper::Letter] {
            let drawing = Sheet::new(paper, 0.01).unwrap().drawing();
            for (stroke, words) in [(&drawing.strokes[0], &drawing.words[0]), (&drawing.strokes[3], &drawing.words[1])] {
                let length = (stroke.to_mm[0] - stroke.from_mm[0]).hypot(stroke.to_mm[1] - stroke.from_mm[1]);
                assert!(words.text.contains(&format!("nominal {} mm", plain(length))), "{}", words.text);
                assert!(stroke.to_mm[0] < drawing.size_mm[0] - 5.0 && stroke.to_mm[1] < drawing.size_mm[1] - 5.0);
            }
        }
    }

    #[test]
    fn unfit_pitches_are_refused_with_their_value() {
        for bad in [f64::NAN, f64::INFINITY, 0.0, -0.01] {
            assert!(matches!(Sheet::new(Paper::A4, bad), Err(TargetError::PitchNotPositive { .. })), "{bad}");
        }
        assert_eq!(Sheet::new(Paper::A4, 1e-3), Err(TargetError::PitchTooSmall { pitch_mm: 1.0, least_mm: 2.0 }));
        let Err(TargetError::PitchTooLarge { most_mm, .. }) = Sheet::new(Paper::A4, 0.05) else { panic!() };
        // 210 - 10 - 28 = 172 mm hold 4.4 pitches.
        assert!((most_mm - 172.0 / 4.4).abs() < 1e-9, "{most_mm}");
        assert!(Sheet::new(Paper::A4, most_mm * 1e-3).is_ok());
        assert!(Sheet::new(Paper::A4, most_mm * 1.001e-3).is_err());
    }
}
