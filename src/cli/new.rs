//! `spotrule new`: a commented bench file to fill in; asks for what it needs when run on a terminal.

use super::{
    Failure,
    arguments::NewArguments,
    files::{self, Existing},
};
use crate::bench::{Bench, Overrides, template, template_with};
use std::{
    io::{BufRead, IsTerminal, Write},
    process::ExitCode,
};

pub(super) fn run(arguments: &NewArguments) -> Result<ExitCode, Failure> {
    let existing = if arguments.force { Existing::Replaced } else { Existing::Kept };
    if existing == Existing::Kept && arguments.file.exists() {
        return Err(Failure::Exists { path: arguments.file.clone() });
    }
    let asks = !arguments.no_questions && std::io::stdin().is_terminal() && std::io::stderr().is_terminal();
    let text = if asks { template_with(&answers(&mut std::io::stdin().lock(), &mut std::io::stderr())?) } else { template() };
    files::write(&arguments.file, text.as_bytes(), existing)?;
    files::print(&format!("{} written; fill in what you know, leave out what you do not.\n", arguments.file.display()))?;
    Ok(ExitCode::SUCCESS)
}

/// One question: what is asked, and where the answer goes.
type Question = (&'static str, fn(&mut Overrides, String));

const QUESTIONS: [Question; 7] = [
    ("Wavelength of the laser, e.g. 632.82(1) nm or 650(5) nm for a pointer", |o, a| o.wavelength = Some(a)),
    ("Sample lit from behind (transmission) or mirror-like (reflection)", |o, a| o.mode = Some(a)),
    ("Throw, sample to the brightest spot on the screen along the beam, e.g. 812(1) mm", |o, a| o.throw = Some(a)),
    ("Turn of the sample's normal against the beam about x and y, e.g. 0(1) deg, 0(1) deg", |o, a| o.incidence = Some(a)),
    ("Tilt of the screen about x and y, e.g. 0(1) deg, 0(1) deg", |o, a| o.tilt = Some(a)),
    ("Photo of the dot target from the same camera position, e.g. target.jpg", |o, a| o.target_photo = Some(a)),
    ("Pitch of the dot target, measured on the print, e.g. 10.00(1) mm", |o, a| o.target_pitch = Some(a)),
];

/// Asks every question until its answer can be read; an empty answer leaves the key out.
fn answers(input: &mut impl BufRead, output: &mut impl Write) -> Result<Overrides, Failure> {
    let mut answers = Overrides::default();
    writeln!(output, "An empty answer means: not known. How sure you are belongs to every number: 812(1) mm means u = 1 mm.")
        .map_err(Failure::Output)?;
    for (question, put) in QUESTIONS {
        loop {
            write!(output, "{question}: ").and_then(|()| output.flush()).map_err(Failure::Output)?;
            let mut line = String::new();
            if input.read_line(&mut line).map_err(Failure::Output)? == 0 {
                return Ok(answers);
            }
            let answer = line.trim();
            if answer.is_empty() {
                break;
            }
            let mut tried = answers.clone();
            put(&mut tried, answer.to_owned());
            match Bench::parse(&template_with(&tried)) {
                Ok(_) => {
                    answers = tried;
                    break;
                }
                Err(error) => writeln!(output, "  {error}").map_err(Failure::Output)?,
            }
        }
    }
    Ok(answers)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_bad_answer_is_asked_again_and_an_empty_one_left_out() {
        let mut said = Vec::new();
        let given = answers(&mut "650 nm\n650(5) nm\n\n1.2(1) m\n".as_bytes(), &mut said).unwrap();
        assert_eq!(given.wavelength.as_deref(), Some("650(5) nm"));
        assert_eq!((given.mode, given.throw.as_deref()), (None, Some("1.2(1) m")));
        assert!(String::from_utf8(said).unwrap().contains("650"));
    }
}
