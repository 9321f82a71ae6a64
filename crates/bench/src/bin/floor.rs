//! The floor: streams a recording, turns its samples into f64 and takes FFTs of blocks as many and as
//! long (in time) as the order spectrum's, on as many threads, and nothing else.
//!
//! floor FILE CHANNELS BLOCK BLOCKS THREADS

use realfft::RealFftPlanner;
use std::fs::File;
use std::os::unix::fs::FileExt;

fn main() {
    let args: Vec<String> = std::env::args().collect();
    let number = |i: usize| args[i].parse::<usize>().expect("a whole number");
    let (channels, block, blocks, threads) = (number(2), number(3), number(4), number(5));
    let file = File::open(&args[1]).expect("the recording opens");
    let length = file.metadata().expect("its length is known").len();
    let fft = RealFftPlanner::<f64>::new().plan_fft_forward(block);
    let share = length.div_ceil(threads as u64);
    let sum: f64 = std::thread::scope(|scope| {
        let work: Vec<_> = (0..threads as u64)
            .map(|thread| {
                let (file, fft) = (&file, &fft);
                scope.spawn(move || {
                    let mut bytes = vec![0; 2 << 20];
                    let mut samples: Vec<f64> = Vec::new();
                    let (mut time, mut lines, mut scratch) = (
                        fft.make_input_vec(),
                        fft.make_output_vec(),
                        fft.make_scratch_vec(),
                    );
                    let mut place = thread * share / 4 * 4;
                    let end = length.min((thread + 1) * share / 4 * 4);
                    let mut left = channels * blocks / threads;
                    let mut sum = 0.0;
                    while place < end {
                        let wanted = bytes.len().min((end - place) as usize);
                        let read = file
                            .read_at(&mut bytes[..wanted], place)
                            .expect("the file can be read");
                        if read < 4 {
                            break;
                        }
                        samples.clear();
                        samples.extend(
                            bytes[..read]
                                .chunks_exact(4)
                                .map(|b| f64::from(f32::from_le_bytes([b[0], b[1], b[2], b[3]]))),
                        );
                        place += read as u64;
                        // Blocks spread over the whole file, as many as the order spectrum takes.
                        let due = left as u64 * read as u64 / (end - place + read as u64);
                        for block in 0..due as usize {
                            let start = block * (samples.len() - time.len()) / due as usize;
                            let part = start..start + time.len();
                            time.copy_from_slice(&samples[part]);
                            fft.process_with_scratch(&mut time, &mut lines, &mut scratch)
                                .expect("planned lengths");
                            sum += lines[1].re;
                        }
                        left -= due as usize;
                    }
                    sum
                })
            })
            .collect();
        work.into_iter()
            .map(|w| w.join().expect("no thread panics"))
            .sum()
    });
    println!("{sum}");
}
