//! What is written into a folder: which files, whole or not at all, the same bytes each time.
#![allow(clippy::unwrap_used, missing_docs)]

#[allow(dead_code, unreachable_pub)]
mod fixture;

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use shaftwise_recording::{OpenOptions, Recording};
use shaftwise_report::{Error, OutputOptions, prepare, write_wav};
use shaftwise_run::{AnalysisResult, RunResult};

/// Small pictures: these tests look at files, not at pixels.
fn options(dir: &Path) -> OutputOptions {
    OutputOptions {
        dir: dir.to_owned(),
        png: true,
        svg: false,
        dpi: 50,
        figures: true,
    }
}

fn contents(dir: &Path) -> BTreeMap<String, Vec<u8>> {
    fs::read_dir(dir)
        .unwrap()
        .map(|entry| entry.unwrap())
        .map(|entry| {
            let bytes = fs::read(entry.path()).unwrap_or_default();
            (entry.file_name().into_string().unwrap(), bytes)
        })
        .collect()
}

/// One channel, so that a report takes a moment.
fn small_run() -> RunResult {
    let mut run = fixture::full_run();
    for outcome in &mut run.analyses {
        match &mut outcome.result {
            AnalysisResult::Speed(_) => {}
            AnalysisResult::Spectrum(r) => r.channels.truncate(1),
            AnalysisResult::Synchronous(r) => r.channels.truncate(1),
            AnalysisResult::Compare(r) => r.channels.truncate(1),
        }
    }
    run
}

#[test]
fn a_report_holds_figures_tables_results_and_findings() {
    let dir = tempfile::tempdir().unwrap();
    let prepared = prepare(&options(dir.path())).unwrap();
    let written = prepared
        .write_report(&fixture::full_run(), &fixture::context())
        .unwrap();
    let files = contents(dir.path());
    let names: Vec<&str> = files.keys().map(String::as_str).collect();
    assert_eq!(names.len(), written.len());
    for name in [
        "speed.png",
        "speed.csv",
        "spectrum-pump-bearing-drive-end-horizontal.png",
        "spectrum-lager-1-de-u.png",
        "spectrum-lager-1-de-u.csv",
        "synchronous-lager-1-de-u.png",
        "synchronous-lager-1-de-u-convergence.png",
        "synchronous-lager-1-de-u-convergence.csv",
        "synchronous-lager-1-de-u-orders.csv",
        "compare-lager-1-de-u.png",
        "results.json",
        "findings.md",
    ] {
        assert!(names.contains(&name), "{name} of {names:?}");
    }
    let page = String::from_utf8(files["findings.md"].clone()).unwrap();
    for (name, bytes) in &files {
        assert!(!bytes.is_empty() && !name.starts_with('.'), "{name}");
        assert!(page.contains(name.as_str()), "{name} is not in findings.md");
    }
    let table = String::from_utf8(files["spectrum-lager-1-de-u.csv"].clone()).unwrap();
    let head = "order,level rms [m/s²],lower bound rms [m/s²],upper bound rms [m/s²]";
    assert_eq!(table.lines().next(), Some(head));
    assert_eq!(table.lines().count(), 802);
}

#[test]
fn one_analysis_brings_its_own_files_alone() {
    let dir = tempfile::tempdir().unwrap();
    let prepared = prepare(&options(dir.path())).unwrap();
    prepared
        .write_command(&small_run(), 3, &fixture::context())
        .unwrap();
    let files = contents(dir.path());
    assert_eq!(
        files.keys().collect::<Vec<_>>(),
        [
            "compare-pump-bearing-drive-end-horizontal.csv",
            "compare-pump-bearing-drive-end-horizontal.png",
            "compare.json"
        ]
    );
    let png = png::Decoder::new(std::io::Cursor::new(
        &files["compare-pump-bearing-drive-end-horizontal.png"],
    ));
    let info = png.read_info().unwrap().info().clone();
    assert_eq!((info.width, info.height), (400, 267));
}

#[test]
fn without_figures_there_are_none_and_svg_comes_when_asked() {
    let dir = tempfile::tempdir().unwrap();
    let no_figures = OutputOptions {
        figures: false,
        ..options(dir.path())
    };
    let prepared = prepare(&no_figures).unwrap();
    prepared
        .write_report(&small_run(), &fixture::context())
        .unwrap();
    assert!(
        contents(dir.path())
            .keys()
            .all(|name| !name.ends_with("png"))
    );

    let dir = tempfile::tempdir().unwrap();
    let svg = OutputOptions {
        png: false,
        svg: true,
        ..options(dir.path())
    };
    let prepared = prepare(&svg).unwrap();
    prepared
        .write_report(&small_run(), &fixture::context())
        .unwrap();
    let files = contents(dir.path());
    let pictures = files.keys().filter(|name| name.ends_with("svg")).count();
    assert_eq!(pictures, 5);
    let page = String::from_utf8(files["findings.md"].clone()).unwrap();
    assert!(page.contains("](speed.svg)"), "{page}");
}

#[test]
fn the_same_run_gives_the_same_bytes_and_replaces_its_own_files_only() {
    let dir = tempfile::tempdir().unwrap();
    let out = dir.path().join("deep/report");
    let write = || {
        let prepared = prepare(&options(&out)).unwrap();
        prepared
            .write_report(&small_run(), &fixture::context())
            .unwrap();
    };
    write();
    let first = contents(&out);
    fs::write(out.join("notes.txt"), "mine").unwrap();
    fs::write(out.join("speed.csv"), "damaged").unwrap();
    write();
    let mut second = contents(&out);
    assert_eq!(second.remove("notes.txt").as_deref(), Some(&b"mine"[..]));
    assert!(first == second);
}

#[test]
fn a_figure_that_cannot_be_drawn_leaves_no_file_at_all() {
    let dir = tempfile::tempdir().unwrap();
    let out = dir.path().join("report");
    let mut run = small_run();
    let AnalysisResult::Compare(compare) = &mut run.analyses[3].result else {
        panic!("compare is the fourth");
    };
    compare.channels[0].smeared_rms.pop();
    let prepared = prepare(&options(&out)).unwrap();
    let error = prepared
        .write_report(&run, &fixture::context())
        .unwrap_err();
    assert!(matches!(error, Error::Figure { .. }), "{error}");
    assert!(contents(&out).is_empty());
    // Nor the folder that was made for it.
    drop(prepared);
    assert!(!out.exists());
}

#[test]
fn a_place_taken_by_a_folder_leaves_whole_files_and_no_temporary_ones() {
    let dir = tempfile::tempdir().unwrap();
    fs::create_dir(dir.path().join("results.json")).unwrap();
    let prepared = prepare(&options(dir.path())).unwrap();
    let error = prepared
        .write_report(&small_run(), &fixture::context())
        .unwrap_err();
    assert!(matches!(error, Error::File { .. }), "{error}");
    assert!(error.hint().is_some());
    let names: Vec<String> = contents(dir.path()).into_keys().collect();
    assert!(
        names.iter().all(|name| !name.ends_with(".tmp")),
        "{names:?}"
    );
    assert!(names.contains(&"speed.png".to_owned()));
    assert!(!names.contains(&"findings.md".to_owned()));
}

#[test]
fn a_folder_that_cannot_be_is_refused_before_the_long_work() {
    let dir = tempfile::tempdir().unwrap();
    let file = dir.path().join("file");
    fs::write(&file, "").unwrap();
    for path in [file.clone(), file.join("below")] {
        let error = prepare(&options(&path)).unwrap_err();
        assert!(matches!(error, Error::NotAFolder { .. }), "{error}");
        assert!(error.to_string().contains("found a file"), "{error}");
    }
    let coarse = OutputOptions {
        dpi: 5,
        ..options(dir.path())
    };
    let error = prepare(&coarse).unwrap_err().to_string();
    assert!(
        error.contains("5 dpi") && error.contains("50 to 1200"),
        "{error}"
    );
    // Takes no files from anybody.
    #[cfg(target_os = "linux")]
    {
        let error = prepare(&options(Path::new("/proc/self/report"))).unwrap_err();
        assert!(matches!(error, Error::Folder { .. }), "{error}");
        let error = prepare(&options(Path::new("/proc/self"))).unwrap_err();
        assert!(matches!(error, Error::Folder { .. }), "{error}");
    }
    // An unused folder is taken away again, one that was there is not.
    let made = dir.path().join("a/b");
    drop(prepare(&options(&made)).unwrap());
    assert!(!dir.path().join("a").exists());
    drop(prepare(&options(dir.path())).unwrap());
    assert_eq!(contents(dir.path()).len(), 1);
}

#[test]
fn two_analyses_of_one_command_carry_their_numbers() {
    let dir = tempfile::tempdir().unwrap();
    let mut run = small_run();
    let again = run.analyses[1].clone();
    run.analyses.push(again);
    let prepared = prepare(&OutputOptions {
        figures: false,
        ..options(dir.path())
    })
    .unwrap();
    prepared.write_report(&run, &fixture::context()).unwrap();
    let files = contents(dir.path());
    for name in ["2-spectrum-", "5-spectrum-", "compare-"] {
        assert!(files.keys().any(|file| file.starts_with(name)), "{name}");
    }
}

#[test]
fn a_wav_is_written_whole() {
    let dir = tempfile::tempdir().unwrap();
    let path = dir.path().join("residual.wav");
    let names = ["DE".to_owned(), "NDE".to_owned()];
    let mut at = 0;
    let mut next = |count: usize, channels: &mut [Vec<f64>]| {
        for (c, channel) in channels.iter_mut().enumerate() {
            channel.clear();
            channel.extend((at..at + count).map(|i| (c + 1) as f64 * i as f64));
        }
        at += count;
    };
    write_wav(&path, 1000.0, &names, 100_000, &mut next).unwrap();
    let wav = Recording::open(&path, &OpenOptions::default()).unwrap();
    assert_eq!((wav.sample_rate_hz(), wav.channels().len()), (1000.0, 2));
    let (mut scratch, mut values) = (Vec::new(), vec![Vec::new(); 2]);
    wav.read(70_000, 2, &[0, 1], &mut scratch, &mut values)
        .unwrap();
    // Whole numbers below 2^24 are exact in 32 bits.
    assert_eq!(values, [[70_000.0, 70_001.0], [140_000.0, 140_002.0]]);
    assert_eq!(contents(dir.path()).len(), 1);
}

#[test]
fn a_wav_that_goes_wrong_leaves_nothing() {
    let dir = tempfile::tempdir().unwrap();
    let path = dir.path().join("residual.wav");
    let name = ["DE".to_owned()];
    let mut short = |_: usize, channels: &mut [Vec<f64>]| channels[0].resize(3, 0.0);
    let error = write_wav(&path, 1000.0, &name, 10, &mut short).unwrap_err();
    assert!(error.to_string().contains("a block of 3"), "{error}");
    let mut whole = |n: usize, channels: &mut [Vec<f64>]| channels[0].resize(n, 0.0);
    let error = write_wav(&path, 1000.5, &name, 10, &mut whole).unwrap_err();
    assert!(error.to_string().contains("whole number of Hz"), "{error}");
    assert!(contents(dir.path()).is_empty());
}
