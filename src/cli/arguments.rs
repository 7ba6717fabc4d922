//! The command line: every command and flag with its help text.

use super::log::LogArguments;
use clap::{Args, CommandFactory, Parser, Subcommand, ValueEnum};
use std::path::PathBuf;

const LASER_CAUTION: &str = "Lasers can blind. Never look into the beam or its reflections, keep the beam below eye level and end it on a matt \
screen; follow your local laser-safety rules and your laser safety officer; class and eyewear per IEC 60825-1.";

/// Pitch and lattice angle of a periodic sample, from photos of the laser pattern that it throws on a screen.
#[derive(Debug, Parser)]
#[command(name = "spotrule", version, about, after_help = LASER_CAUTION, max_term_width = 100)]
pub(super) struct Spotrule {
    #[command(subcommand)]
    pub(super) command: Command,
}

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Measure the pitch from a photo of the pattern
    #[command(after_help = MEASURE_EXAMPLES)]
    Measure(Box<MeasureArguments>),
    /// Save what a photo of a reference tells of the bench, or calibrate a camera, for later measurements
    #[command(after_help = CALIBRATE_EXAMPLES, args_conflicts_with_subcommands = true, subcommand_negates_reqs = true)]
    Calibrate(CalibrateArguments),
    /// Write a commented bench file to fill in (asks when run on a terminal)
    #[command(after_help = "Example:\n  spotrule new bench.toml\n\nThe file explains every key. Leave out what you do not know.")]
    New(NewArguments),
    /// Draw the printable dot target
    #[command(
        after_help = "Example:\n  spotrule target --paper a4 --pitch 10 --out target.pdf\n\nPrint at 100 %, then measure the print with a steel rule in both directions: printers scale by 0.1 to 0.5 %."
    )]
    Target(TargetArguments),
    /// Look into a log of measurements, check it, add to it
    #[command(
        after_help = "Examples:\n  spotrule measure pattern.jpg --log book.db --operator \"A. Person\"\n  spotrule log list book.db\n  spotrule log verify book.db"
    )]
    Log(LogArguments),
    /// Draw the photos of an invented bench, with the truth behind them
    #[command(after_help = "Example:\n  spotrule render --demo embossed-film --out my-demo")]
    Render(super::render::RenderArgs),
    /// Print the completion script for a shell
    #[command(after_help = "Example:\n  spotrule completions bash > ~/.local/share/bash-completion/completions/spotrule")]
    Completions(CompletionArguments),
    /// Print the manual page (roff)
    #[command(after_help = "Example:\n  spotrule manual > spotrule.1 && man ./spotrule.1")]
    Manual(ManualArguments),
}

const MEASURE_EXAMPLES: &str = "Examples:
  spotrule measure pattern.jpg
      with bench.toml beside the photo
  spotrule measure pattern.jpg --bench lab.toml --overlay seen.png --json result.json
  spotrule measure pattern.jpg --trials 10000
      with the uncertainty checked by Monte Carlo (JCGM 101)
  spotrule measure pattern.jpg --wavelength \"650(5) nm\" --throw \"1.200(2) m\" --target-photo target.jpg --target-pitch \"10.00(1) mm\"

Quantities carry a unit and say how sure they are: 812.0(8) mm means a standard uncertainty of 0.8 mm;
also \"812.0 ± 1.6 mm (k=2)\", \"812 ± 2 mm (limits)\", \"632.8 nm (exact)\".

Limits: \"20.00 ± 0.05 um\", \"19.95 .. 20.05 um\", \"<= 20.05 um\", \"pitch 1: ...; pitch 2: ...; angle: 90.0 ± 0.2 deg\".
Rules: guarded (guard band U: sure verdicts or undecided), simple (the value alone decides), shared (as simple, if T/(4u) >= 4).

Exit code: 0 measured (and inside the limits, where limits were given); 1 refused (nothing can honestly be said);
2 wrong use or unreadable input; 3 measured, outside the limits; 4 measured, undecided (a limit lies within the uncertainty).";

#[derive(Debug, Args)]
pub(super) struct MeasureArguments {
    /// Photo of the pattern (JPEG, PNG, TIFF); the bench file can name it instead
    pub(super) photo: Option<PathBuf>,
    /// Bench file [default: bench.toml beside the photo, if there is one]
    #[arg(long, value_name = "FILE")]
    pub(super) bench: Option<PathBuf>,
    /// Write the result as JSON; `-` prints JSON alone on standard output
    #[arg(long, value_name = "FILE|-")]
    pub(super) json: Option<PathBuf>,
    /// Write the photo with every spot and its order marked
    #[arg(long, value_name = "FILE.png")]
    pub(super) overlay: Option<PathBuf>,
    /// Check the uncertainty by Monte Carlo: every input redrawn and the fit repeated, at most this often
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(1000..=10_000_000))]
    pub(super) trials: Option<u32>,
    /// Seed of the Monte Carlo
    #[arg(long, value_name = "N", default_value_t = 1, requires = "trials")]
    pub(super) seed: u64,
    /// Write a report to hand on: one HTML file with the overlay, charts and everything that is needed to repeat the measurement
    #[arg(long, value_name = "FILE.html")]
    pub(super) report: Option<PathBuf>,
    /// Write the table of orders
    #[arg(long, value_name = "FILE.csv")]
    pub(super) orders: Option<PathBuf>,
    /// Limits to judge the result by, e.g. "20.00 ± 0.05 um"
    #[arg(long, value_name = "LIMITS", allow_hyphen_values = true)]
    pub(super) limits: Option<String>,
    /// Decision rule: guarded, simple or shared
    #[arg(long, value_name = "RULE", default_value = "guarded")]
    pub(super) rule: String,
    /// Print nothing but errors
    #[arg(long)]
    pub(super) quiet: bool,
    #[command(flatten, next_help_heading = "Record")]
    pub(super) record: RecordFlags,
    #[command(flatten, next_help_heading = "Bench, instead of or over the bench file")]
    pub(super) bench_flags: BenchFlags,
}

const CALIBRATE_EXAMPLES: &str = "Examples:
  spotrule calibrate --bench bench.toml --out bench-calibrated.toml
      with the photo of a reference grating, whose pitch the bench file gives, as [[photo]] in it
  spotrule measure sample.jpg --bench bench-calibrated.toml
      the next sample on the same bench, camera untouched: no photo of the target is needed
  spotrule calibrate camera view1.jpg view2.jpg view3.jpg --target-pitch \"10.00(1) mm\" --out camera.toml

The result is not a calibration certificate of an accredited laboratory.";

#[derive(Debug, Args)]
pub(super) struct CalibrateArguments {
    #[command(subcommand)]
    pub(super) of: Option<CalibrateCommand>,
    #[command(flatten)]
    pub(super) bench: Option<CalibrateBenchArguments>,
}

#[derive(Debug, Args)]
pub(super) struct CalibrateBenchArguments {
    /// Photo of the pattern, usually of a reference grating; the bench file can name it instead
    pub(super) photo: Option<PathBuf>,
    /// Bench file to calibrate
    #[arg(long, value_name = "FILE")]
    pub(super) bench: PathBuf,
    /// File to write: the bench file with its calibration at the end
    #[arg(long, value_name = "FILE")]
    pub(super) out: PathBuf,
    /// Replace an existing file
    #[arg(long)]
    pub(super) force: bool,
    /// Print nothing but errors
    #[arg(long)]
    pub(super) quiet: bool,
}

#[derive(Debug, Subcommand)]
pub(super) enum CalibrateCommand {
    /// Focal length, principal point and distortion from three or more views of the printed dot target
    #[command(after_help = CALIBRATE_CAMERA_EXAMPLE)]
    Camera(CalibrateCameraArguments),
}

const CALIBRATE_CAMERA_EXAMPLE: &str = "Example:
  spotrule calibrate camera views/*.jpg --target-pitch \"10.00(1) mm\" --out camera.toml

Lay the print on a flat plate. Take 6 to 15 photos with one zoom and focus setting, the dots filling the frame, most of them 20 to 40 degrees
oblique from different sides. Then write calibration = \"camera.toml\" under [camera] in the bench file.";

#[derive(Debug, Args)]
pub(super) struct CalibrateCameraArguments {
    /// Photos of the dot target from different directions
    #[arg(required = true)]
    pub(super) photos: Vec<PathBuf>,
    /// Pitch of the dot target, measured on the print, e.g. "10.00(1) mm"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) target_pitch: String,
    /// File to write, for the key calibration of a bench file's camera section
    #[arg(long, value_name = "FILE")]
    pub(super) out: PathBuf,
    /// Write the result as JSON; `-` prints JSON alone on standard output
    #[arg(long, value_name = "FILE|-")]
    pub(super) json: Option<PathBuf>,
    /// Replace an existing file
    #[arg(long)]
    pub(super) force: bool,
    /// Print nothing but errors
    #[arg(long)]
    pub(super) quiet: bool,
}

/// What the record of a measurement says beside the result.
#[derive(Debug, Args)]
pub(super) struct RecordFlags {
    /// Name of this sample in result, report and log, instead of the one in the bench file
    #[arg(long, value_name = "TEXT")]
    pub(super) sample_name: Option<String>,
    /// Who measures
    #[arg(long, value_name = "TEXT")]
    pub(super) operator: Option<String>,
    /// The operator's words, for result, report and log
    #[arg(long, value_name = "TEXT")]
    pub(super) remark: Option<String>,
    /// Append the result, or the refusal, to this log; made where there is none
    #[arg(long, value_name = "FILE.db")]
    pub(super) log: Option<PathBuf>,
    /// Keep the photos in this folder, named by their SHA-256
    #[arg(long, value_name = "DIR", requires = "log")]
    pub(super) keep_photos: Option<PathBuf>,
}

/// Everything that a quick look needs, each written as in the bench file.
#[derive(Debug, Args)]
pub(super) struct BenchFlags {
    /// Wavelength, e.g. "650(5) nm"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) wavelength: Option<String>,
    /// Where the wavelength is stated: air or vacuum
    #[arg(long, value_name = "MEDIUM")]
    pub(super) medium: Option<String>,
    /// Temperature of the air, for vacuum wavelengths, e.g. "20.0(5) degC"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) temperature: Option<String>,
    /// Pressure of the air, e.g. "1013(2) hPa"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) pressure: Option<String>,
    /// Relative humidity of the air, e.g. "50(10) %"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) humidity: Option<String>,
    /// transmission or reflection
    #[arg(long, value_name = "MODE")]
    pub(super) mode: Option<String>,
    /// line, plane or auto
    #[arg(long, value_name = "PATTERN")]
    pub(super) pattern: Option<String>,
    /// Turn of the sample's normal against the zero order about x and y, e.g. "0(1) deg, 0(1) deg"
    #[arg(long, value_name = "PAIR")]
    pub(super) incidence: Option<String>,
    /// Sample to zero-order spot along the beam, e.g. "1.200(2) m"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) throw: Option<String>,
    /// Tilt of the screen about x and y, e.g. "0(1) deg, 0(1) deg"
    #[arg(long, value_name = "PAIR")]
    pub(super) tilt: Option<String>,
    /// front or behind (translucent screen)
    #[arg(long, value_name = "SIDE")]
    pub(super) seen_from: Option<String>,
    /// Photo of the dot target from the same camera position
    #[arg(long, value_name = "FILE")]
    pub(super) target_photo: Option<String>,
    /// Pitch of the dot target, measured on the print, e.g. "10.00(1) mm"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) target_pitch: Option<String>,
    /// Turn of the print against the bench's horizontal, e.g. "0(1) deg"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) target_turn: Option<String>,
    /// Lean of the line from screen to camera to the right and up, e.g. "0(2) deg, 0(2) deg"
    #[arg(long, value_name = "PAIR")]
    pub(super) square_on: Option<String>,
    /// Focal length in px, or focal length and pixel size: "4.20(5) mm, 1.40(1) um"
    #[arg(long, value_name = "QUANTITY")]
    pub(super) focal_length: Option<String>,
    /// Two points and their distance on the screen: "412,880 1630,902 = 100.0(2) mm"
    #[arg(long, value_name = "SCALE")]
    pub(super) scale: Option<String>,
}

#[derive(Debug, Args)]
pub(super) struct NewArguments {
    /// File to write
    #[arg(default_value = "bench.toml")]
    pub(super) file: PathBuf,
    /// Replace an existing file
    #[arg(long)]
    pub(super) force: bool,
    /// Do not ask, even on a terminal
    #[arg(long)]
    pub(super) no_questions: bool,
}

/// Paper formats of the printed target.
#[derive(Debug, Clone, Copy, ValueEnum)]
pub(super) enum PaperFormat {
    /// 210 mm × 297 mm
    A4,
    /// 297 mm × 420 mm
    A3,
    /// 8.5 in × 11 in
    Letter,
}

#[derive(Debug, Args)]
pub(super) struct TargetArguments {
    /// Paper
    #[arg(long, value_enum, default_value = "a4")]
    pub(super) paper: PaperFormat,
    /// Distance of neighbouring dots, mm
    #[arg(long, value_name = "MM", default_value_t = 10.0, allow_negative_numbers = true)]
    pub(super) pitch: f64,
    /// File to write; .svg or .pdf
    #[arg(long, value_name = "FILE")]
    pub(super) out: PathBuf,
    /// Replace an existing file
    #[arg(long)]
    pub(super) force: bool,
}

#[derive(Debug, Args)]
pub(super) struct CompletionArguments {
    /// Shell
    #[arg(value_enum)]
    pub(super) shell: clap_complete::Shell,
}

#[derive(Debug, Args)]
pub(super) struct ManualArguments {}

/// The command line as clap knows it, for completions, the manual and tests.
#[must_use]
pub fn command() -> clap::Command {
    Spotrule::command()
}
