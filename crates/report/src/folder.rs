use std::fs;
use std::path::{Path, PathBuf};
use std::sync::atomic::AtomicBool;

use shaftwise_figures::{RenderOptions, render, render_svg};
use shaftwise_run::{AnalysisResult, RunResult};

use crate::batch::{Batch, remove_stale, temporary};
use crate::figure::{Drawing, Scene, analysis_figures, speed_figure};
use crate::name::{FileNames, Stems};
use crate::{Context, Error, command_json, curves, findings, json_text, report_json};

/// Where results go and which pictures are drawn.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct OutputOptions {
    /// The folder; made if it is missing.
    pub dir: PathBuf,
    /// Write figures as PNG.
    pub png: bool,
    /// Write figures as SVG.
    pub svg: bool,
    /// Resolution of PNG figures, 50 to 1200 dpi.
    pub dpi: u32,
    /// Draw figures at all.
    pub figures: bool,
}

/// An output folder that takes files.
///
/// A folder made by [`prepare`] that is still empty when this is dropped is taken away again, so
/// that a run that fails leaves no trace.
#[derive(Debug)]
pub struct Prepared {
    options: OutputOptions,
    /// Folders made by this run, the outermost first.
    made: Vec<PathBuf>,
    cancel: Option<&'static AtomicBool>,
}

/// Makes the folder if it is missing, with its parents, and tries that it takes a file. To be
/// called before the long work. Temporary files that a killed run left there are removed.
///
/// # Errors
///
/// [`Error::NotAFolder`] if the path or one of its parents is a file; [`Error::Folder`] if the
/// folder cannot be made or takes no file; [`Error::Setting`] if the resolution is out of range.
pub fn prepare(options: &OutputOptions) -> Result<Prepared, Error> {
    if !(50..=1200).contains(&options.dpi) {
        return Err(Error::Setting {
            what: "resolution of the figures",
            found: format!("{} dpi", options.dpi),
            expected: "50 to 1200 dpi",
        });
    }
    let dir = if options.dir.as_os_str().is_empty() {
        Path::new(".")
    } else {
        &options.dir
    };
    let missing: Vec<&Path> = dir
        .ancestors()
        .take_while(|path| !path.as_os_str().is_empty() && !path.exists())
        .collect();
    let first = dir.ancestors().nth(missing.len());
    if let Some(file) = first.filter(|path| path.is_file()) {
        return Err(Error::NotAFolder {
            path: file.to_owned(),
        });
    }
    let mut prepared = Prepared {
        options: OutputOptions {
            dir: dir.to_owned(),
            ..options.clone()
        },
        made: Vec::new(),
        cancel: None,
    };
    let failed = |action, source| Error::Folder {
        path: dir.to_owned(),
        action,
        source,
    };
    for path in missing.into_iter().rev() {
        match fs::create_dir(path) {
            Ok(()) => prepared.made.push(path.to_owned()),
            Err(error) if error.kind() == std::io::ErrorKind::AlreadyExists => {}
            Err(error) => return Err(failed("make the folder", error)),
        }
    }
    remove_stale(dir);
    temporary(dir)
        .and_then(tempfile::NamedTempFile::close)
        .map_err(|e| failed("write into the folder", e))?;
    Ok(prepared)
}

impl Drop for Prepared {
    fn drop(&mut self) {
        for path in self.made.iter().rev() {
            // Refused where something is in it, and that is as it should be.
            let _ = fs::remove_dir(path);
        }
    }
}

impl Prepared {
    /// Gives up with [`Error::Cancelled`] once this is set: between files, and before the first of
    /// a call gets its name, so that nothing of the call is left.
    #[must_use]
    pub fn cancelled_by(mut self, cancel: &'static AtomicBool) -> Self {
        self.cancel = Some(cancel);
        self
    }

    /// The folder.
    #[must_use]
    pub fn dir(&self) -> &Path {
        &self.options.dir
    }

    /// Writes a text of its own, such as a run file; returns the file.
    ///
    /// # Errors
    ///
    /// If the file cannot be written; then one of that name from before is untouched.
    pub fn write_text(&self, name: &str, text: &str) -> Result<PathBuf, Error> {
        let mut batch = Batch::new(&self.options.dir).cancelled_by(self.cancel);
        batch.stage(name, |sink| Ok(sink.write_all(text.as_bytes())?))?;
        batch.commit()?;
        Ok(self.options.dir.join(name))
    }

    /// Writes one analysis: its figures, a CSV of every curve and `<command>.json`. Returns the
    /// files in the order they got their names.
    ///
    /// # Errors
    ///
    /// If a figure cannot be drawn or a file not be written; then no file of this call is left
    /// half-written, and before the first rename none at all.
    ///
    /// # Panics
    ///
    /// If there is no analysis of that index.
    pub fn write_command(
        &self,
        result: &RunResult,
        index: usize,
        context: &Context,
    ) -> Result<Vec<PathBuf>, Error> {
        let mut batch = Batch::new(&self.options.dir).cancelled_by(self.cancel);
        let mut names = FileNames::default();
        let stems = Stems::new(result, index);
        self.stage_analysis(&mut batch, &mut names, result, index, &stems, context)?;
        let json = json_text(&command_json(result, index, context.version));
        let name = names.claim(&stems.command, "json");
        batch.stage(&name, |sink| Ok(sink.write_all(json.as_bytes())?))?;
        batch.commit()
    }

    /// Writes everything: the figures, a CSV of every curve, `results.json` and `findings.md`.
    /// Returns the files in the order they got their names.
    ///
    /// # Errors
    ///
    /// If a figure cannot be drawn or a file not be written; then no file of this call is left
    /// half-written, and before the first rename none at all.
    pub fn write_report(
        &self,
        result: &RunResult,
        context: &Context,
    ) -> Result<Vec<PathBuf>, Error> {
        let mut batch = Batch::new(&self.options.dir).cancelled_by(self.cancel);
        let mut names = FileNames::default();
        let mut pictures = vec![Vec::new(); result.analyses.len()];
        let asked = |o: &shaftwise_run::Outcome| matches!(o.result, AnalysisResult::Speed(_));
        let mut speed_pictures = Vec::new();
        if !result.analyses.iter().any(asked) {
            let scene = Scene {
                result,
                settings: &serde_json::Value::Null,
                context,
            };
            let drawing = speed_figure(&result.speed, scene);
            speed_pictures = self.stage_figures(&mut batch, &mut names, "speed", vec![drawing])?;
            let tables = curves::speed_tables(&result.speed);
            stage_tables(&mut batch, &mut names, "speed", tables)?;
        }
        for (index, pictures) in pictures.iter_mut().enumerate() {
            let stems = Stems::new(result, index);
            *pictures =
                self.stage_analysis(&mut batch, &mut names, result, index, &stems, context)?;
        }
        let json = json_text(&report_json(result, context));
        batch.stage("results.json", |sink| Ok(sink.write_all(json.as_bytes())?))?;
        let mut files = batch.names();
        files.push("findings.md".to_owned());
        let page = findings::page(&findings::Page {
            result,
            context,
            speed_pictures,
            pictures,
            files,
        });
        batch.stage("findings.md", |sink| Ok(sink.write_all(page.as_bytes())?))?;
        batch.commit()
    }

    /// Figures and tables of one analysis; returns the pictures a page can show.
    fn stage_analysis(
        &self,
        batch: &mut Batch,
        names: &mut FileNames,
        result: &RunResult,
        index: usize,
        stems: &Stems,
        context: &Context,
    ) -> Result<Vec<String>, Error> {
        let mut pictures = Vec::new();
        for (channel, stem) in stems.channels.iter().enumerate() {
            if self.options.figures {
                let drawings = analysis_figures(result, index, channel, context);
                pictures.extend(self.stage_figures(batch, names, stem, drawings)?);
            }
            let tables = curves::analysis_tables(&result.analyses[index].result, channel);
            stage_tables(batch, names, stem, tables)?;
        }
        Ok(pictures)
    }

    fn stage_figures(
        &self,
        batch: &mut Batch,
        names: &mut FileNames,
        stem: &str,
        drawings: Vec<Drawing>,
    ) -> Result<Vec<String>, Error> {
        let mut pictures = Vec::new();
        if !self.options.figures {
            return Ok(pictures);
        }
        for Drawing { suffix, figure } in drawings {
            let stem = format!("{stem}{suffix}");
            if self.options.png {
                let name = names.claim(&stem, "png");
                let options = RenderOptions {
                    dpi: f64::from(self.options.dpi),
                };
                batch.stage(&name, |sink| {
                    Ok(sink.write_all(&render(&figure, &options)?)?)
                })?;
                pictures.push(name);
            }
            if self.options.svg {
                let name = names.claim(&stem, "svg");
                batch.stage(&name, |sink| {
                    Ok(sink.write_all(render_svg(&figure)?.as_ref())?)
                })?;
                if !self.options.png {
                    pictures.push(name);
                }
            }
        }
        Ok(pictures)
    }
}

fn stage_tables(
    batch: &mut Batch,
    names: &mut FileNames,
    stem: &str,
    tables: Vec<curves::Curves<'_>>,
) -> Result<(), Error> {
    for table in tables {
        let name = names.claim(&format!("{stem}{}", table.suffix), "csv");
        let columns: Vec<(&str, &[f64])> = table
            .columns
            .iter()
            .map(|(head, values)| (head.as_str(), values.as_ref()))
            .collect();
        batch.stage(&name, |sink| {
            Ok(shaftwise_recording::write_csv(sink, &columns)?)
        })?;
    }
    Ok(())
}
