//! The letters of the overlay: a small bitmap face drawn for this room, so that no font file is needed.

use std::collections::BTreeMap;

/// Width of a letter, pixels of the drawing.
pub(super) const LETTER_WIDTH: usize = 5;
/// Height of a letter: seven rows on the base line, two below it.
pub(super) const LETTER_HEIGHT: usize = 9;
/// From one letter to the next.
pub(super) const ADVANCE: usize = LETTER_WIDTH + 1;

/// One line with the letter, then its rows from the top; rows that are left out are blank.
const DRAWINGS: &str = include_str!("letters.txt");

/// Rows of a letter; bit 4 is the leftmost pixel.
type Rows = [u8; LETTER_HEIGHT];

/// Shown in the place of a letter that is not drawn: an empty box.
const UNKNOWN: Rows = [0x1F, 0x11, 0x11, 0x11, 0x11, 0x11, 0x1F, 0, 0];

/// All letters.
#[derive(Debug)]
pub(super) struct Face {
    letters: BTreeMap<char, Rows>,
}

impl Face {
    pub(super) fn new() -> Self {
        let mut letters = BTreeMap::new();
        let (mut letter, mut row) = (' ', 0);
        for line in DRAWINGS.lines() {
            let mut signs = line.chars();
            match (signs.next(), signs.next()) {
                (Some(only), None) => {
                    (letter, row) = (only, 0);
                    letters.insert(letter, [0; LETTER_HEIGHT]);
                }
                _ => {
                    if let Some(bits) = letters.get_mut(&letter).and_then(|rows: &mut Rows| rows.get_mut(row)) {
                        *bits = line.bytes().take(LETTER_WIDTH).fold(0, |bits, sign| bits << 1 | u8::from(sign == b'#'));
                    }
                    row += 1;
                }
            }
        }
        Self { letters }
    }

    /// Columns and rows of the inked pixels of a letter.
    pub(super) fn ink(&self, letter: char) -> impl Iterator<Item = (usize, usize)> + use<> {
        let rows = self.letters.get(&letter).copied().unwrap_or(UNKNOWN);
        (0..LETTER_HEIGHT)
            .flat_map(|row| (0..LETTER_WIDTH).map(move |column| (column, row)))
            .filter(move |&(column, row)| rows[row] >> (LETTER_WIDTH - 1 - column) & 1 == 1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_printable_ascii_letter_and_the_signs_of_the_trade_are_drawn_once() {
        let face = Face::new();
        let drawn: Vec<&str> = DRAWINGS.lines().filter(|line| line.chars().count() == 1).collect();
        for letter in (' '..='~').chain("µ±°×²λ".chars()) {
            assert!(face.letters.contains_key(&letter), "{letter:?}");
        }
        assert_eq!(drawn.len(), face.letters.len(), "a letter is drawn twice");
    }

    #[test]
    fn every_row_is_as_wide_as_a_letter_and_no_letter_is_too_tall() {
        let mut rows = 0;
        for line in DRAWINGS.lines() {
            rows = if line.chars().count() == 1 { 0 } else { rows + 1 };
            assert!(rows == 0 || line.len() == LETTER_WIDTH && line.bytes().all(|sign| b".#".contains(&sign)), "{line:?}");
            assert!(rows <= LETTER_HEIGHT);
        }
    }

    #[test]
    fn no_two_letters_look_alike() {
        let face = Face::new();
        let mut seen = BTreeMap::new();
        for (letter, rows) in &face.letters {
            assert_eq!(seen.insert(rows, letter), None, "{letter}");
        }
    }

    #[test]
    fn an_undrawn_letter_is_a_box() {
        assert_eq!(Face::new().ink('\u{4e00}').count(), 20);
    }
}
