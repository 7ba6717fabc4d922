//! `spotrule render`: photos with known truth from a scene file or a built-in demo.

use crate::synth::{DEMO_NAMES, Dots, Scene, SynthError, demo_scene, encode, render_marked, render_pattern, render_target};
use std::{
    io::Write,
    path::{Path, PathBuf},
};

/// Draw the photos of an invented bench, with the truth behind them.
///
/// Writes pattern.jpg, target.jpg (where the scene has a target photo), bench.toml and truth.json into a folder.
/// The scene file is TOML in SI units, turns in radians; `sample-images/*/scene.toml` are complete, commented examples,
/// and the keys are documented at `spotrule::synth::Scene`. Unknown keys are refused.
///
/// Example: spotrule render --demo embossed-film --out my-demo
#[derive(Debug, clap::Args)]
pub struct RenderArgs {
    /// Scene file (TOML).
    #[arg(required_unless_present = "demo", conflicts_with = "demo")]
    pub scene: Option<PathBuf>,
    /// A built-in scene instead of a file.
    #[arg(long, value_name = "NAME", value_parser = clap::builder::PossibleValuesParser::new(DEMO_NAMES))]
    pub demo: Option<String>,
    /// Folder to write into; made if it does not exist.
    #[arg(long, value_name = "DIR")]
    pub out: PathBuf,
    /// Replace files that exist.
    #[arg(long)]
    pub force: bool,
}

/// Why nothing, or not everything, was written.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum RenderError {
    /// The scene cannot be read or drawn.
    #[error(transparent)]
    Scene(#[from] SynthError),
    /// A file exists and `--force` was not given. Nothing was written.
    #[error("{} exists; choose another folder or add --force to replace it", .0.display())]
    Exists(PathBuf),
    /// A file or folder cannot be read or written.
    #[error("{}: {error}", path.display())]
    File {
        /// Which one.
        path: PathBuf,
        /// What the system says.
        error: std::io::Error,
    },
    /// The truth holds a number that JSON cannot carry.
    #[error("the truth cannot be written as JSON: {0}")]
    Truth(#[from] serde_json::Error),
    /// Neither a scene file nor a demo was named.
    #[error("name a scene file or a demo: --demo {}", DEMO_NAMES.join(" | --demo "))]
    NoScene,
}

/// Runs the command; names each file written on stdout.
///
/// # Errors
/// See [`RenderError`]. All files are checked for existence before the first one is written.
pub fn run(args: RenderArgs) -> Result<(), RenderError> {
    let scene = scene(&args)?;
    let names = file_names(&scene);
    if !args.force
        && let Some(existing) = names.iter().map(|name| args.out.join(name)).find(|path| path.exists())
    {
        return Err(RenderError::Exists(existing));
    }
    std::fs::create_dir_all(&args.out).map_err(at(&args.out))?;
    for (name, bytes) in files(&scene)? {
        let path = args.out.join(name);
        write_whole(&args.out, &path, &bytes)?;
        writeln!(std::io::stdout().lock(), "{}", path.display()).map_err(at(&path))?;
    }
    Ok(())
}

fn scene(args: &RenderArgs) -> Result<Scene, RenderError> {
    match (&args.demo, &args.scene) {
        (Some(name), _) => Ok(demo_scene(name)?),
        (None, Some(path)) => Ok(Scene::from_toml(&std::fs::read_to_string(path).map_err(at(path))?)?),
        (None, None) => Err(RenderError::NoScene),
    }
}

fn file_names(scene: &Scene) -> Vec<&'static str> {
    let mut names = vec![scene.pattern_file(), "bench.toml", "truth.json"];
    if scene.print.dots == Dots::OwnPhoto {
        names.push(scene.target_file());
    }
    names
}

fn files(scene: &Scene) -> Result<Vec<(&'static str, Vec<u8>)>, RenderError> {
    let pattern = if scene.print.dots == Dots::InPattern { render_marked(scene)? } else { render_pattern(scene)? };
    let mut files = vec![
        (scene.pattern_file(), encode(scene, &pattern)?),
        ("bench.toml", scene.bench_text().into_bytes()),
        ("truth.json", pattern.truth.to_json(scene)?.into_bytes()),
    ];
    if scene.print.dots == Dots::OwnPhoto {
        files.push((scene.target_file(), encode(scene, &render_target(scene)?)?));
    }
    Ok(files)
}

/// Writes beside the place and renames, so that no half-written file is ever seen.
fn write_whole(folder: &Path, path: &Path, bytes: &[u8]) -> Result<(), RenderError> {
    let mut draft = tempfile::NamedTempFile::new_in(folder).map_err(at(folder))?;
    draft.write_all(bytes).map_err(at(path))?;
    draft.persist(path).map_err(|refused| at(path)(refused.error))?;
    Ok(())
}

fn at(path: &Path) -> impl Fn(std::io::Error) -> RenderError + '_ {
    move |error| RenderError::File { path: path.to_owned(), error }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn small_scene(folder: &Path) -> PathBuf {
        let mut scene = demo_scene("no-target").unwrap();
        (scene.file.width_px, scene.file.height_px) = (200, 150);
        scene.camera.lens.focal_px = 315.0;
        scene.camera.lens.principal_px = [100.0, 75.0];
        let path = folder.join("scene.toml");
        std::fs::write(&path, toml::to_string(&scene).unwrap()).unwrap();
        path
    }

    fn args(scene: PathBuf, out: PathBuf) -> RenderArgs {
        RenderArgs { scene: Some(scene), demo: None, out, force: false }
    }

    #[test]
    fn writes_the_files_once_and_again_only_by_force() {
        let folder = tempfile::tempdir().unwrap();
        let scene = small_scene(folder.path());
        let out = folder.path().join("made");
        run(args(scene.clone(), out.clone())).unwrap();
        let mut written: Vec<String> =
            std::fs::read_dir(&out).unwrap().map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
        written.sort();
        assert_eq!(written, ["bench.toml", "pattern.jpg", "truth.json"]);
        let truth: serde_json::Value = serde_json::from_slice(&std::fs::read(out.join("truth.json")).unwrap()).unwrap();
        assert!(truth["orders"].as_array().unwrap().len() > 5);
        assert!(matches!(run(args(scene.clone(), out.clone())), Err(RenderError::Exists(_))));
        assert!(run(RenderArgs { force: true, ..args(scene, out) }).is_ok());
    }

    #[test]
    fn a_missing_scene_file_is_named() {
        let message = run(args("nowhere/scene.toml".into(), "nowhere-else".into())).unwrap_err().to_string();
        assert!(message.contains("nowhere"), "{message}");
    }
}
