//! The command line: every flag, and the help that teaches by examples.
//!
//! A flag left out is `None`, so that what a run file says stays.

use crate::value::{self, Calibration};
use clap::builder::{PossibleValuesParser, TypedValueParser};
use clap::{Args, ColorChoice, Parser, Subcommand, ValueEnum};
use shaftwise_run::{
    Averaging, AxisChoice, ChannelPick, Detector, EdgeChoice, Exclusion, ShownAs, WindowChoice,
};
use std::path::PathBuf;

/// A parser of the words of a settings' type, spelt as in the run file.
macro_rules! words {
    ($kind:ty: $($word:literal),+) => {
        PossibleValuesParser::new([$($word),+])
            .try_map(|word| serde_json::from_value::<$kind>(word.into()))
    };
}

const CAUTION: &str = "\
Caution: rotating machinery injures. Guards, lock-out, a safe distance and the maker's speed limits
come before any measurement. What is printed here informs a qualified person's judgement; it
replaces neither that nor local codes, and it never clears a machine to run.";

const EXAMPLES: &str = "\
Examples (pump P-3 of the Lindmoor water works, on a frequency converter):
  shaftwise demo hunting --out p3          write its recording and a run file to try things on
  shaftwise speed p3/run.json              how fast did it turn, how sure is that?
  shaftwise compare p3/run.json            what did the hunting speed hide?
  shaftwise spectrum p3/recording.wav --tach 4 --max-order 40
  shaftwise report p3/run.json             everything the run file asks for, into p3/report

`shaftwise COMMAND --help` has more of each.";

const EXAMPLES_SPEED: &str = "\
Examples:
  shaftwise speed p3/run.json
  shaftwise speed p3/recording.wav --tach 4
  shaftwise speed p3/run.json --tach tach --edge falling --threshold 2.5
  shaftwise speed p3/recording.wav --tach 4 --from 5 --to 30 --json
  shaftwise speed p3/recording.wav --tach 4 --step 0.1 --out p3/speed";

const EXAMPLES_SPECTRUM: &str = "\
Examples:
  shaftwise spectrum p3/run.json
  shaftwise spectrum p3/recording.wav --tach 4 --channel 1,3 --max-order 40
  shaftwise spectrum p3/recording.wav --tach 4 --order-step 1/32 --window kaiser --overlap 75
  shaftwise spectrum p3/run.json --as velocity --repeatability 0.5
  shaftwise spectrum p3/run.json --exclude 12:14=\"valve moved\" --out p3/spectrum --format png,svg
  shaftwise spectrum p3/run.json --axis hz --json";

const EXAMPLES_SYNCHRONOUS: &str = "\
Examples:
  shaftwise synchronous p3/run.json
  shaftwise synchronous p3/recording.wav --tach 4 --channel 1 --max-order 30
  shaftwise synchronous p3/run.json --averages 256 --out p3/synchronous
  shaftwise synchronous p3/run.json --ratio 23/57       a shaft that turns 23 times per 57";

const EXAMPLES_COMPARE: &str = "\
Examples:
  shaftwise compare p3/run.json
  shaftwise compare p3/recording.wav --tach 4 --channel 1 --max-order 40
  shaftwise compare p3/run.json --order-step 1/8 --out p3/compare --no-figures";

const EXAMPLES_REPORT: &str = "\
Examples:
  shaftwise report p3/run.json                       into p3/report
  shaftwise report p3/run.json --out handover --format png,svg --dpi 150

A run file in short; paths are relative to it, run-file.schema.json describes all of it:
  {\"recordings\": [{\"file\": \"recording.wav\",
     \"channels\": [{\"number\": 1, \"name\": \"drive end\", \"unit\": \"m/s2\", \"factor\": 98.1}]}],
   \"tach\": {\"channel\": 4, \"pulses_per_rev\": 1},
   \"analyses\": [{\"command\": \"spectrum\", \"max_order\": 40}, {\"command\": \"compare\"}],
   \"machine\": {\"name\": \"pump P-3\"}, \"conditions\": {\"flow\": \"410 m3/h\"}}";

const EXAMPLES_DEMO: &str = "\
Examples:
  shaftwise demo --list
  shaftwise demo hunting --out p3           p3/recording.wav and p3/run.json
  shaftwise demo --out demos                each into a folder of its own";

/// Order spectra and synchronous averages that stay sharp when the shaft speed does not hold still.
///
/// A recording of a rotating machine and its tach go in; spectra by order, synchronous averages and
/// the speed itself come out, with bounds, as words, JSON and figures.
#[derive(Debug, Parser)]
#[command(
    name = "shaftwise",
    version,
    color = ColorChoice::Never,
    disable_help_subcommand = true,
    max_term_width = 100,
    after_help = EXAMPLES,
    after_long_help = format!("{EXAMPLES}\n\n{CAUTION}"),
)]
pub(crate) struct Flags {
    #[command(subcommand)]
    pub(crate) command: Command,
}

#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// How fast did the shaft turn, and how sure is that?
    ///
    /// Times every pulse of the tach, clears doubled, stray and missing ones with an entry in the
    /// ledger, and says up to which order the angle can be trusted.
    #[command(after_help = EXAMPLES_SPEED, after_long_help = format!("{EXAMPLES_SPEED}\n\n{CAUTION}"))]
    Speed(SpeedCommand),
    /// Which orders are there, how big, within what bounds?
    ///
    /// Blocks of equal angle instead of equal time, averaged: peaks stay sharp while the speed
    /// drifts. Every line and peak has bounds at 90 %, every peak a verdict: repeatable, needs more
    /// averages, or wanders by itself. Bounds cover the scatter of this recording; calibration and
    /// mounting are not included.
    #[command(after_help = EXAMPLES_SPECTRUM, after_long_help = format!("{EXAMPLES_SPECTRUM}\n\n{CAUTION}"))]
    Spectrum(SpectrumCommand),
    /// What does one revolution look like once all else is averaged away?
    ///
    /// The mean revolution with its scatter, its orders with amplitude and phase, and how much of
    /// the vibration repeats with the shaft. What is locked to turning may be mechanical, hydraulic
    /// or synchronous electrical.
    #[command(after_help = EXAMPLES_SYNCHRONOUS, after_long_help = format!("{EXAMPLES_SYNCHRONOUS}\n\n{CAUTION}"))]
    Synchronous(SynchronousCommand),
    /// What did the drifting speed hide: smeared against tracked?
    ///
    /// A plain averaged spectrum and an order spectrum of the same stretch, the same number of
    /// blocks, the same resolution. Says plainly when plain averaging is good enough.
    #[command(after_help = EXAMPLES_COMPARE, after_long_help = format!("{EXAMPLES_COMPARE}\n\n{CAUTION}"))]
    Compare(CompareCommand),
    /// Everything a run file asks for, in one folder ready to hand over.
    ///
    /// Figures, results.json, CSV of every curve and findings.md. Files of these names already in
    /// the folder are replaced; each is written whole or not at all.
    #[command(after_help = EXAMPLES_REPORT, after_long_help = format!("{EXAMPLES_REPORT}\n\n{CAUTION}"))]
    Report(ReportCommand),
    /// Write the demo recordings, or any recipe with known content.
    ///
    /// The recordings are made up, their content is known exactly: what the analysis finds can be
    /// held against what the recipe says.
    #[command(after_help = EXAMPLES_DEMO)]
    Demo(DemoCommand),
}

#[derive(Debug, Args)]
pub(crate) struct SpeedCommand {
    #[command(flatten)]
    pub(crate) common: CommonFlags,
    /// Step of the curve in seconds [default: 0.02]
    #[arg(long, value_name = "S", value_parser = value::number, allow_negative_numbers = true, help_heading = "Analysis")]
    pub(crate) step: Option<f64>,
    #[command(flatten)]
    pub(crate) output: OutputFlags,
}

#[derive(Debug, Args)]
pub(crate) struct SpectrumCommand {
    #[command(flatten)]
    pub(crate) common: CommonFlags,
    #[command(flatten)]
    pub(crate) band: BandFlags,
    #[command(flatten)]
    pub(crate) lines: LineFlags,
    /// How blocks become one curve [default: power]
    ///
    /// Power is unbiased; amplitude is the mean of magnitudes, called linear averaging in the
    /// trade; exponential fades with α = 2/(N+1), N from --averages or 16.
    #[arg(long, value_name = "HOW", value_parser = words!(Averaging: "power", "amplitude", "exponential", "peak-hold"), help_heading = "Analysis")]
    pub(crate) averaging: Option<Averaging>,
    /// Orders, or hertz for the plain spectrum [default: orders]
    #[arg(long, value_name = "AXIS", value_parser = words!(AxisChoice: "orders", "hz"), help_heading = "Analysis")]
    pub(crate) axis: Option<AxisChoice>,
    /// Show a density, per order or per Hz, instead of the level in each line
    #[arg(long, help_heading = "Analysis")]
    pub(crate) density: bool,
    /// Repeatability wished, ± dB at 90 % [default: 1]
    #[arg(long, value_name = "DB", value_parser = value::number, allow_negative_numbers = true, help_heading = "Analysis")]
    pub(crate) repeatability: Option<f64>,
    #[command(flatten)]
    pub(crate) output: OutputFlags,
}

#[derive(Debug, Args)]
pub(crate) struct SynchronousCommand {
    #[command(flatten)]
    pub(crate) common: CommonFlags,
    #[command(flatten)]
    pub(crate) band: BandFlags,
    /// Revolutions averaged [default: all]
    #[arg(
        long,
        value_name = "N",
        value_parser = value::whole::<u64>("2 or more"),
        allow_negative_numbers = true,
        help_heading = "Analysis"
    )]
    pub(crate) averages: Option<u64>,
    #[command(flatten)]
    pub(crate) output: OutputFlags,
}

#[derive(Debug, Args)]
pub(crate) struct CompareCommand {
    #[command(flatten)]
    pub(crate) common: CommonFlags,
    #[command(flatten)]
    pub(crate) band: BandFlags,
    #[command(flatten)]
    pub(crate) lines: LineFlags,
    #[command(flatten)]
    pub(crate) output: OutputFlags,
}

#[derive(Debug, Args)]
#[command(
    mut_arg("input", |input| input
        .value_name("RUN.json")
        .help("A run file; `shaftwise spectrum` and the like take a bare recording")
        .long_help(
            "A run file; `shaftwise spectrum` and the like take a bare recording\n\n\
             Flags win over what the run file says."
        )),
    mut_arg("sample_rate", |flag| flag.help_heading("Recording")),
    mut_arg("calibration", |flag| flag.help_heading("Recording")),
)]
pub(crate) struct ReportCommand {
    #[command(flatten)]
    pub(crate) common: CommonFlags,
    #[command(flatten)]
    pub(crate) output: OutputFlags,
}

#[derive(Debug, Args)]
pub(crate) struct DemoCommand {
    /// Name of a demo, or a recipe's file; all demos when left out
    #[arg(value_name = "NAME|RECIPE.json")]
    pub(crate) what: Option<String>,
    /// List the demos and stop
    #[arg(long)]
    pub(crate) list: bool,
    /// Folder to write to; made where it is missing
    #[arg(long, value_name = "DIR", required_unless_present = "list")]
    pub(crate) out: Option<PathBuf>,
    /// Print what was written as JSON
    #[arg(long)]
    pub(crate) json: bool,
    /// No progress and no summary; warnings and errors stay
    #[arg(long)]
    pub(crate) quiet: bool,
}

/// What every analysis needs to know.
#[derive(Debug, Args)]
pub(crate) struct CommonFlags {
    /// A run file, or a recording (WAV or delimited text; `-` for standard input)
    ///
    /// Flags win over what the run file says. A bare recording needs --tach or --tach-times: which
    /// channel holds the tach is never guessed.
    #[arg(value_name = "RUN.json|RECORDING")]
    pub(crate) input: PathBuf,
    /// The tach's channel, by number from 1 or by name
    #[arg(long, value_name = "CH", value_parser = value::channel, conflicts_with = "tach_times", help_heading = "Tach")]
    pub(crate) tach: Option<ChannelPick>,
    /// File of pulse times: seconds from the first sample, one a line
    #[arg(long, value_name = "FILE", help_heading = "Tach")]
    pub(crate) tach_times: Option<PathBuf>,
    /// Pulses per revolution [default: 1]
    #[arg(
        long,
        value_name = "N",
        value_parser = value::whole::<u32>("1 to 4096"),
        allow_negative_numbers = true,
        help_heading = "Tach"
    )]
    pub(crate) pulses_per_rev: Option<u32>,
    /// Edge that sets angle zero [default: rising]
    #[arg(long, value_name = "EDGE", value_parser = words!(EdgeChoice: "rising", "falling"), help_heading = "Tach")]
    pub(crate) edge: Option<EdgeChoice>,
    /// Level the edge must cross, in the channel's unit [default: automatic]
    #[arg(long, value_name = "V", value_parser = value::number, allow_negative_numbers = true, help_heading = "Tach")]
    pub(crate) threshold: Option<f64>,
    /// Delay of the tach's own filters in seconds [default: 0]
    #[arg(long, value_name = "S", value_parser = value::number, allow_negative_numbers = true, help_heading = "Tach")]
    pub(crate) tach_delay: Option<f64>,
    /// Start of the part that counts, seconds [default: the first pulse]
    #[arg(long, value_name = "S", value_parser = value::number, allow_negative_numbers = true, help_heading = "Part of the recording")]
    pub(crate) from: Option<f64>,
    /// End of the part that counts, seconds [default: the last pulse]
    #[arg(long, value_name = "S", value_parser = value::number, allow_negative_numbers = true, help_heading = "Part of the recording")]
    pub(crate) to: Option<f64>,
    /// Leave a stretch out, with a reason for the report; may be repeated
    #[arg(long, value_name = "S:S[=REASON]", value_parser = value::exclusion, allow_hyphen_values = true, help_heading = "Part of the recording")]
    pub(crate) exclude: Vec<Exclusion>,
    /// Sample rate of text without a time column, Hz
    #[arg(long, value_name = "HZ", value_parser = value::number, allow_negative_numbers = true, help_heading = "Bare recordings")]
    pub(crate) sample_rate: Option<f64>,
    /// Units per sample value of a channel; may be repeated
    ///
    /// Samples of integer files count as −1 to 1 of full scale. A unit may follow, so that the
    /// level can be shown as another quantity: --calibration "1=98.1 m/s2".
    #[arg(long, value_name = "CH=FACTOR", value_parser = value::calibration, value_delimiter = ',', help_heading = "Bare recordings")]
    pub(crate) calibration: Vec<Calibration>,
}

/// What is analysed.
#[derive(Debug, Args)]
#[command(next_help_heading = "Analysis")]
pub(crate) struct BandFlags {
    /// Channels by number or name, separated by commas [default: all but the tach and the time]
    #[arg(long, value_name = "LIST", value_parser = value::channel, value_delimiter = ',')]
    pub(crate) channel: Option<Vec<ChannelPick>>,
    /// Highest order [default: 50, less where the sample rate forbids]
    #[arg(long, value_name = "X", value_parser = value::number, allow_negative_numbers = true)]
    pub(crate) max_order: Option<f64>,
    /// Show another quantity, by integration or differentiation [default: as recorded]
    #[arg(long = "as", value_name = "QUANTITY", value_parser = words!(ShownAs: "acceleration", "velocity", "displacement"))]
    pub(crate) shown_as: Option<ShownAs>,
    /// The shaft analysed turns A per B revolutions of the tach's shaft [default: the tach's shaft]
    #[arg(long, value_name = "A/B")]
    pub(crate) ratio: Option<String>,
}

/// How blocks become lines.
#[derive(Debug, Args)]
#[command(next_help_heading = "Analysis")]
pub(crate) struct LineFlags {
    /// Spacing of the lines in orders; a block is 1/step revolutions [default: 1/16]
    #[arg(long, value_name = "X", value_parser = value::number, allow_negative_numbers = true)]
    pub(crate) order_step: Option<f64>,
    /// Weighting of each block [default: hann]
    #[arg(long, value_name = "WINDOW", value_parser = words!(WindowChoice: "rectangular", "hann", "hamming", "blackman-harris", "flat-top", "kaiser"))]
    pub(crate) window: Option<WindowChoice>,
    /// Overlap of the blocks in per cent [default: 50]
    #[arg(long, value_name = "PCT", value_parser = value::number, allow_negative_numbers = true)]
    pub(crate) overlap: Option<f64>,
    /// Blocks averaged [default: all]
    #[arg(long, value_name = "N", value_parser = value::whole::<u64>("1 or more"), allow_negative_numbers = true)]
    pub(crate) averages: Option<u64>,
    /// How levels are shown [default: rms, displacement peak-to-peak]
    ///
    /// Levels called rms in JSON are always rms.
    #[arg(long, value_name = "DETECTOR", value_parser = words!(Detector: "rms", "peak", "peak-to-peak"))]
    pub(crate) detector: Option<Detector>,
}

/// How results are handed over.
#[derive(Debug, Args)]
#[command(next_help_heading = "Output")]
pub(crate) struct OutputFlags {
    /// Folder for figures, CSV and JSON; made where it is missing
    ///
    /// `report` writes to the folder `report` beside the run file when this is left out; the other
    /// commands write no files then.
    #[arg(long, value_name = "DIR")]
    pub(crate) out: Option<PathBuf>,
    /// Formats of the figures, separated by commas
    #[arg(
        long,
        value_name = "LIST",
        value_delimiter = ',',
        default_value = "png"
    )]
    pub(crate) format: Vec<FigureFormat>,
    /// Resolution of PNG figures, dots per inch
    #[arg(long, value_name = "N", default_value_t = 300, value_parser = clap::value_parser!(u32).range(50..=1200))]
    pub(crate) dpi: u32,
    /// Write no figures
    #[arg(long)]
    pub(crate) no_figures: bool,
    /// Print the result as JSON
    #[arg(long)]
    pub(crate) json: bool,
    /// No progress and no summary; warnings and errors stay
    #[arg(long)]
    pub(crate) quiet: bool,
    /// Worker threads; results do not depend on them [default: all]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(crate) threads: Option<u16>,
}

/// A format of figures.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum FigureFormat {
    /// Pixels.
    Png,
    /// Lines, for print at any size.
    Svg,
}
