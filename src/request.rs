//! From the command line to a ready job: the run file or the bare recording, then the flags.

use crate::failure::{Failure, Status};
use crate::flags::{
    BandFlags, CommonFlags, CompareCommand, LineFlags, SpectrumCommand, SpeedCommand,
    SynchronousCommand,
};
use crate::value::Calibration;
use shaftwise_run::{
    Analysis, ChannelPick, ChannelSettings, CompareSettings, Fault, Job, RecordingSettings,
    RunFile, SpectrumSettings, SpeedSettings, SynchronousSettings,
};
use std::io::Read;
use std::path::{Path, PathBuf};

/// What is asked for, as one run file whose first recording and analyses are the job.
#[derive(Debug)]
pub(crate) struct Request {
    pub(crate) run: RunFile,
    /// Folder that file names in it start from.
    pub(crate) base: PathBuf,
    /// It was read from a run file.
    pub(crate) from_run_file: bool,
    /// Its name, without the folder.
    name: String,
}

impl Request {
    /// Reads the input and lays the flags that every command has over it.
    pub(crate) fn new(flags: &CommonFlags) -> Result<Self, Failure> {
        let mut request = Self::read(&flags.input)?;
        request.apply(flags)?;
        Ok(request)
    }

    fn read(input: &Path) -> Result<Self, Failure> {
        if is_run_file(input) {
            let base = input.parent().unwrap_or(Path::new(""));
            return Ok(Self {
                run: RunFile::read(input)?,
                base: base.to_path_buf(),
                from_run_file: true,
                name: name(input),
            });
        }
        let recording = RecordingSettings {
            file: utf8(input)?,
            ..RecordingSettings::default()
        };
        Ok(Self {
            run: RunFile {
                recordings: vec![recording],
                ..RunFile::default()
            },
            base: PathBuf::new(),
            from_run_file: false,
            name: name(input),
        })
    }

    fn apply(&mut self, flags: &CommonFlags) -> Result<(), Failure> {
        let tach = &mut self.run.tach;
        if let Some(channel) = &flags.tach {
            tach.channel = Some(channel.clone());
            tach.times = None;
        }
        if let Some(times) = &flags.tach_times {
            // the flag counts from here, the run file's names from its own folder
            let from_here = match self.from_run_file {
                true => std::path::absolute(times).unwrap_or_else(|_| times.clone()),
                false => times.clone(),
            };
            tach.times = Some(utf8(&from_here)?);
            tach.channel = None;
        }
        set(&mut tach.pulses_per_rev, flags.pulses_per_rev);
        set(&mut tach.edge, flags.edge);
        set_some(&mut tach.threshold, flags.threshold);
        set(&mut tach.tach_delay_s, flags.tach_delay);
        let select = &mut self.run.select;
        set_some(&mut select.from_s, flags.from);
        set_some(&mut select.to_s, flags.to);
        if !flags.exclude.is_empty() {
            select.exclude.clone_from(&flags.exclude);
        }
        if let Some(recording) = self.run.recordings.first_mut() {
            set_some(&mut recording.sample_rate_hz, flags.sample_rate);
            for calibration in &flags.calibration {
                calibrate(&mut recording.channels, calibration);
            }
        }
        Ok(())
    }

    /// A warning where the run file names recordings that are not looked at.
    pub(crate) fn unused_recordings(&self) -> Option<String> {
        let [first, _, ..] = self.run.recordings.as_slice() else {
            return None;
        };
        let (name, count) = (&self.name, self.run.recordings.len());
        let file = &first.file;
        Some(format!(
            "{name} names {count} recordings; only the first, {file}, is analysed"
        ))
    }

    /// The settings of the first analysis of a kind in the run file, else the defaults.
    fn base_of<T: Clone + Default>(&self, kind: impl Fn(&Analysis) -> Option<&T>) -> T {
        self.run
            .analyses
            .iter()
            .find_map(kind)
            .cloned()
            .unwrap_or_default()
    }

    pub(crate) fn speed(&self, flags: &SpeedCommand) -> Analysis {
        let mut settings: SpeedSettings = self.base_of(|analysis| match analysis {
            Analysis::Speed(settings) => Some(settings),
            _ => None,
        });
        set(&mut settings.step, flags.step);
        Analysis::Speed(settings)
    }

    pub(crate) fn spectrum(&self, flags: &SpectrumCommand) -> Analysis {
        let mut settings: SpectrumSettings = self.base_of(|analysis| match analysis {
            Analysis::Spectrum(settings) => Some(settings),
            _ => None,
        });
        let BandFlags {
            channel,
            max_order,
            shown_as,
            ratio,
        } = &flags.band;
        set_some(&mut settings.channel, distinct(channel));
        set_some(&mut settings.max_order, *max_order);
        set_some(&mut settings.shown_as, *shown_as);
        set_some(&mut settings.ratio, ratio.clone());
        let LineFlags {
            order_step,
            window,
            overlap,
            averages,
            detector,
        } = flags.lines;
        set(&mut settings.order_step, order_step);
        set(&mut settings.window, window);
        set(&mut settings.overlap, overlap);
        set_some(&mut settings.averages, averages);
        set_some(&mut settings.detector, detector);
        set(&mut settings.averaging, flags.averaging);
        set(&mut settings.axis, flags.axis);
        settings.density |= flags.density;
        set(&mut settings.repeatability, flags.repeatability);
        Analysis::Spectrum(settings)
    }

    pub(crate) fn synchronous(&self, flags: &SynchronousCommand) -> Analysis {
        let mut settings: SynchronousSettings = self.base_of(|analysis| match analysis {
            Analysis::Synchronous(settings) => Some(settings),
            _ => None,
        });
        let BandFlags {
            channel,
            max_order,
            shown_as,
            ratio,
        } = &flags.band;
        set_some(&mut settings.channel, distinct(channel));
        set_some(&mut settings.max_order, *max_order);
        set_some(&mut settings.shown_as, *shown_as);
        set_some(&mut settings.ratio, ratio.clone());
        set_some(&mut settings.averages, flags.averages);
        Analysis::Synchronous(settings)
    }

    pub(crate) fn compare(&self, flags: &CompareCommand) -> Analysis {
        let mut settings: CompareSettings = self.base_of(|analysis| match analysis {
            Analysis::Compare(settings) => Some(settings),
            _ => None,
        });
        let BandFlags {
            channel,
            max_order,
            shown_as,
            ratio,
        } = &flags.band;
        set_some(&mut settings.channel, distinct(channel));
        set_some(&mut settings.max_order, *max_order);
        set_some(&mut settings.shown_as, *shown_as);
        set_some(&mut settings.ratio, ratio.clone());
        let LineFlags {
            order_step,
            window,
            overlap,
            averages,
            detector,
        } = flags.lines;
        set(&mut settings.order_step, order_step);
        set(&mut settings.window, window);
        set(&mut settings.overlap, overlap);
        set_some(&mut settings.averages, averages);
        set_some(&mut settings.detector, detector);
        Analysis::Compare(settings)
    }

    /// The job, once everything in it is in range. What is not came from a flag: the run file by
    /// itself was in range when it was read.
    pub(crate) fn job(&self, threads: Option<u16>) -> Result<Job, Failure> {
        self.run.check().map_err(|fault| usage(&fault))?;
        let tach = &self.run.tach;
        if tach.channel.is_none() && tach.times.is_none() {
            let hint = match self.from_run_file {
                true => {
                    "add \"tach\": {\"channel\": N} to the run file, or give --tach CH or --tach-times FILE"
                }
                false => {
                    "name the tach's channel with --tach CH, or a file of pulse times with --tach-times FILE"
                }
            };
            let message = "no tach is named; which channel holds it is not guessed";
            return Err(Failure::new(Status::Failed, message).hint(hint));
        }
        let all = std::thread::available_parallelism().map_or(1, usize::from);
        Ok(Job {
            recording: self.run.recordings.first().cloned().unwrap_or_default(),
            tach: tach.clone(),
            select: self.run.select.clone(),
            analyses: self.run.analyses.clone(),
            base: self.base.clone(),
            threads: threads.map_or(all, usize::from),
        })
    }
}

/// A run file is told by its name or by how it begins.
fn is_run_file(input: &Path) -> bool {
    if input
        .extension()
        .is_some_and(|extension| extension.eq_ignore_ascii_case("json"))
    {
        return true;
    }
    // a pipe can be read only once, and `-` is one
    if !std::fs::metadata(input).is_ok_and(|metadata| metadata.is_file()) {
        return false;
    }
    let mut head = Vec::new();
    let file = std::fs::File::open(input);
    if file
        .and_then(|file| file.take(256).read_to_end(&mut head))
        .is_err()
    {
        return false;
    }
    let head = head.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(&head);
    head.trim_ascii_start().first() == Some(&b'{')
}

fn name(input: &Path) -> String {
    let name = input.file_name().unwrap_or(input.as_os_str());
    name.to_string_lossy().into_owned()
}

fn utf8(path: &Path) -> Result<String, Failure> {
    path.to_str().map(str::to_owned).ok_or_else(|| {
        let message = format!("{}: a file name must be UTF-8", path.display());
        Failure::new(Status::Usage, message)
    })
}

fn calibrate(channels: &mut Vec<ChannelSettings>, calibration: &Calibration) {
    let number = |place: usize, channel: &ChannelSettings| {
        channel.number.map_or(place + 1, |number| number as usize)
    };
    let wanted = calibration.channel as usize;
    let held = (0..channels.len()).find(|&place| number(place, &channels[place]) == wanted);
    let channel = match held {
        Some(place) => &mut channels[place],
        None => {
            channels.push(ChannelSettings {
                number: Some(calibration.channel),
                ..ChannelSettings::default()
            });
            let last = channels.len() - 1;
            &mut channels[last]
        }
    };
    channel.factor = Some(calibration.factor);
    channel.mv_per_unit = None;
    channel.range_v = None;
    if calibration.unit.is_some() {
        channel.unit.clone_from(&calibration.unit);
        channel.quantity = None;
    }
}

/// Each channel once, in the order first named.
fn distinct(channels: &Option<Vec<ChannelPick>>) -> Option<Vec<ChannelPick>> {
    channels.as_ref().map(|channels| {
        let mut once = Vec::new();
        for channel in channels {
            if !once.contains(channel) {
                once.push(channel.clone());
            }
        }
        once
    })
}

fn set<T>(setting: &mut T, flag: Option<T>) {
    if let Some(value) = flag {
        *setting = value;
    }
}

fn set_some<T>(setting: &mut Option<T>, flag: Option<T>) {
    if flag.is_some() {
        *setting = flag;
    }
}

/// A fault in the settings under its flag's name.
fn usage(fault: &Fault) -> Failure {
    let message = fault.message_about(&flag_of(&fault.pointer));
    Failure::new(Status::Usage, message).hint(fault.hint.clone())
}

fn flag_of(pointer: &str) -> String {
    let tokens: Vec<&str> = pointer.split('/').skip(1).collect();
    match tokens.as_slice() {
        ["tach", "channel", ..] => "--tach".to_owned(),
        ["tach", "times"] => "--tach-times".to_owned(),
        ["tach", "tach_delay_s"] => "--tach-delay".to_owned(),
        ["select", "from_s"] => "--from".to_owned(),
        ["select", "to_s"] => "--to".to_owned(),
        ["select", "exclude", _, "from_s"] => "the start of --exclude".to_owned(),
        ["select", "exclude", _, "to_s"] => "the end of --exclude".to_owned(),
        ["recordings", _, "sample_rate_hz"] => "--sample-rate".to_owned(),
        ["recordings", _, "channels", ..] => "--calibration".to_owned(),
        ["recordings", ..] => "the recording's name".to_owned(),
        ["tach", name, ..] | ["analyses", _, name, ..] => format!("--{}", name.replace('_', "-")),
        _ => pointer.to_owned(),
    }
}
