//! Do the bounds hold the truth as often as they say?
//!
//! Planted truth: the expected power of each line of a Hann spectrum of white noise and tones, worked
//! out from the recipe (noise density × noise bandwidth, plus the window's response to every tone).
#![allow(clippy::unwrap_used, missing_docs)]

use shaftwise_findings::{SpectrumReading, WindowLobe, read_spectrum};
use shaftwise_orders::{Average, SpectrumAccumulator, SpectrumConfig, SpectrumPlan};
use shaftwise_signal::Window;
use shaftwise_synth::Generator;
use std::f64::consts::PI;
use std::sync::Arc;

const BLOCK: usize = 1024;
const HOP: usize = 512;
const READING: SpectrumReading = SpectrumReading {
    confidence: 0.9,
    false_alarm: 0.05,
    repeatability_db: 1.0,
    angle_sigma_rev: 0.0,
    line_order: 0.0,
    usable_lines: 513,
    first_line: 1,
    floor_exponent: 0.0,
};

fn plan() -> Arc<SpectrumPlan> {
    let config = SpectrumConfig {
        window: Window::Hann,
        block: BLOCK,
        hop: HOP,
        lines: 513,
        average: Average::Power,
    };
    Arc::new(SpectrumPlan::new(config).unwrap())
}

/// Lines at least 4 apart, spread at random.
fn lines(random: &Generator) -> Vec<usize> {
    let mut places = Vec::new();
    let mut place = 10;
    let mut draw = 0;
    while place < 500 {
        places.push(place);
        draw += 1;
        place += 4 + (random.uniform_at(draw) * 12.0) as usize;
    }
    places
}

/// A class of lines and how often the truth was inside.
#[derive(Default, Clone, Copy)]
struct Count {
    drawn: usize,
    inside: usize,
}

impl Count {
    fn add(&mut self, inside: bool) {
        self.drawn += 1;
        self.inside += usize::from(inside);
    }

    fn per_cent(self) -> f64 {
        100.0 * self.inside as f64 / self.drawn as f64
    }
}

/// Coverage of noise lines and of tones at the given levels over their noise, and the widest
/// bounds of a tone in dB.
fn coverage(
    averages: usize,
    levels_db: &[f64],
    machines: u64,
    seed: u64,
) -> (Count, Vec<Count>, f64) {
    let plan = plan();
    let lobe = WindowLobe::new(plan.window());
    let mut scratch = plan.scratch();
    let (mut noise_lines, mut tones, mut widest) = (
        Count::default(),
        vec![Count::default(); levels_db.len()],
        0.0f64,
    );
    for machine in 0..machines {
        let random = Generator::new(seed + machine * 1000 + averages as u64);
        let choice = random.fork(1);
        let places = lines(&choice);
        // Noise of variance 1 has 2·ENBW/N in a line.
        let line_noise = 2.0 * plan.window().noise_bandwidth_lines() / BLOCK as f64;
        let mut components = Vec::new();
        for (i, place) in places.iter().enumerate() {
            // Every other line is left to the noise.
            if i % 2 == 0 {
                let class = (choice.uniform_at(1000 + i as u64) * levels_db.len() as f64) as usize;
                let power = line_noise * 10f64.powf(levels_db[class] / 10.0);
                components.push((
                    *place,
                    class,
                    (2.0 * power).sqrt(),
                    choice.uniform_at(2000 + i as u64),
                ));
            }
        }
        let length = BLOCK + (averages - 1) * HOP;
        let mut x = vec![0.0; length];
        random.fork(2).fill_gaussian(0, &mut x);
        for (n, x) in x.iter_mut().enumerate() {
            for (place, _, amplitude, phase) in &components {
                let turns = (*place as u64 * n as u64 % BLOCK as u64) as f64 / BLOCK as f64 + phase;
                *x += amplitude * (2.0 * PI * turns).cos();
            }
        }
        let mut sums = SpectrumAccumulator::new(plan.clone(), 1);
        for block in 0..averages {
            sums.push(
                block * 12 / averages,
                [(&x[block * HOP..block * HOP + BLOCK], 0.0)],
                &mut scratch,
            );
        }
        let spectrum = sums.finish().remove(0);
        let found = read_spectrum(&spectrum, &plan, &lobe, &READING);
        let expected = |line: usize| {
            let leaked: f64 = components
                .iter()
                .filter(|(place, ..)| place.abs_diff(line) < 7)
                .map(|(place, _, a, _)| 0.5 * a * a * lobe.power(place.abs_diff(line) as f64))
                .sum();
            line_noise + leaked
        };
        for (i, place) in places.iter().enumerate() {
            let truth = expected(*place);
            let inside = (found.lower[*place]..=found.upper[*place]).contains(&truth);
            if i % 2 == 0 {
                let (_, class, ..) = components.iter().find(|c| c.0 == *place).unwrap();
                tones[*class].add(inside);
                widest = widest.max(10.0 * (found.upper[*place] / found.lower[*place]).log10());
            } else {
                noise_lines.add(inside);
            }
        }
    }
    (noise_lines, tones, widest)
}

#[test]
fn bounds_hold_the_expected_level_nine_times_in_ten() {
    let levels = [6.0, 10.0, 20.0, 30.0];
    println!("averages | noise | 6 dB | 10 dB | 20 dB | 30 dB | tones together");
    for averages in [16, 32, 64] {
        let (noise, tones, _) = coverage(averages, &levels, 340, 20);
        let together = Count {
            drawn: tones.iter().map(|t| t.drawn).sum(),
            inside: tones.iter().map(|t| t.inside).sum(),
        };
        println!(
            "{averages} | {:.1} % of {} | {} | {:.1} % of {}",
            noise.per_cent(),
            noise.drawn,
            tones
                .iter()
                .map(|t| format!("{:.1} % of {}", t.per_cent(), t.drawn))
                .collect::<Vec<_>>()
                .join(" | "),
            together.per_cent(),
            together.drawn
        );
        assert!(noise.drawn >= 2000 && tones.iter().all(|t| t.drawn >= 2000));
        assert!((88.0..=92.0).contains(&noise.per_cent()));
        assert!((88.0..=92.0).contains(&together.per_cent()));
        assert!(tones.iter().all(|t| (86.0..=94.0).contains(&t.per_cent())));
    }
}

#[test]
fn strong_tones_have_narrow_bounds_that_hold() {
    for averages in [16, 32, 64] {
        let (_, tones, widest) = coverage(averages, &[60.0], 60, 77);
        println!(
            "{averages} averages, 60 dB: {:.1} % of {}, at most {widest:.4} dB wide",
            tones[0].per_cent(),
            tones[0].drawn
        );
        assert!(tones[0].per_cent() >= 88.0);
        assert!(widest <= 0.05);
    }
}

#[test]
fn a_tilted_floor_is_no_peak() {
    // White noise, integrated twice: the floor falls by 12 dB an octave in amplitude.
    let plan = plan();
    let lobe = WindowLobe::new(plan.window());
    let mut peaks = 0;
    for machine in 0..100u64 {
        let mut x = vec![0.0; BLOCK + 31 * HOP];
        Generator::new(500 + machine).fill_gaussian(0, &mut x);
        let mut scratch = plan.scratch();
        let mut sums = SpectrumAccumulator::new(plan.clone(), 1);
        for block in 0..32 {
            sums.push(
                block * 12 / 32,
                [(&x[block * HOP..block * HOP + BLOCK], 0.0)],
                &mut scratch,
            );
        }
        let mut spectrum = sums.finish().remove(0);
        let tilt = |line: usize| (line.max(1) as f64).powi(-4);
        for (line, power) in spectrum.mean.iter_mut().enumerate() {
            *power *= tilt(line);
        }
        for (_, epoch) in &mut spectrum.epoch_means {
            epoch
                .iter_mut()
                .enumerate()
                .for_each(|(line, power)| *power *= tilt(line));
        }
        let known = SpectrumReading {
            floor_exponent: -4.0,
            ..READING
        };
        peaks += read_spectrum(&spectrum, &plan, &lobe, &known).peaks.len();
        // Where nobody says so, the sides tell it, but for the first lines.
        let told = SpectrumReading {
            first_line: 40,
            ..READING
        };
        peaks += read_spectrum(&spectrum, &plan, &lobe, &told).peaks.len();
    }
    println!("tilted floors: {peaks} peaks in 200 spectra");
    // 5 % of spectra, binomial scatter of 3 %, and the noise level's own.
    assert!(peaks <= 20, "{peaks}");
}

#[test]
fn noise_alone_gives_a_peak_in_one_spectrum_of_twenty() {
    let plan = plan();
    let lobe = WindowLobe::new(plan.window());
    let mut scratch = plan.scratch();
    for averages in [1, 4, 32] {
        let (spectra, mut with_peak) = (600, 0);
        for machine in 0..spectra {
            let mut x = vec![0.0; BLOCK + (averages - 1) * HOP];
            Generator::new(9000 + machine).fill_gaussian(0, &mut x);
            let mut sums = SpectrumAccumulator::new(plan.clone(), 1);
            for block in 0..averages {
                let part = [(&x[block * HOP..block * HOP + BLOCK], 0.0)];
                sums.push(block * 12 / averages, part, &mut scratch);
            }
            let found = read_spectrum(&sums.finish()[0], &plan, &lobe, &READING);
            with_peak += u32::from(!found.peaks.is_empty());
        }
        let share = f64::from(with_peak) / spectra as f64;
        println!(
            "noise alone, {averages} averages: a peak in {:.1} % of {spectra} spectra",
            100.0 * share
        );
        // Binomial: 5 % of 600 scatters by 0.9 %; four of that.
        assert!(share < 0.086, "{averages} averages: {share}");
    }
}

#[test]
fn the_skirt_of_a_strong_tone_is_no_peak() {
    // Hann's skirt meets the noise some thirty lines from a tone of 70 or 80 dB over it.
    let plan = plan();
    let lobe = WindowLobe::new(plan.window());
    let mut scratch = plan.scratch();
    let mut false_peaks = 0;
    for machine in 0..100u64 {
        let mut x = vec![0.0; BLOCK + 31 * HOP];
        let random = Generator::new(3000 + machine);
        random.fill_gaussian(0, &mut x);
        let place = 200.0 + random.uniform_at(1);
        let amplitude = [180.0, 570.0][machine as usize % 2];
        for (n, x) in x.iter_mut().enumerate() {
            *x += amplitude * (2.0 * PI * place * n as f64 / BLOCK as f64).cos();
        }
        let mut sums = SpectrumAccumulator::new(plan.clone(), 1);
        for block in 0..32 {
            let part = [(&x[block * HOP..block * HOP + BLOCK], 0.0)];
            sums.push(block * 12 / 32, part, &mut scratch);
        }
        let found = read_spectrum(&sums.finish()[0], &plan, &lobe, &READING);
        false_peaks += found.peaks.len() - 1;
    }
    println!("beside strong tones: {false_peaks} false peaks in 100 spectra");
    // 5 in 100 by noise alone, with four times its scatter.
    assert!(false_peaks <= 14, "{false_peaks}");
}
