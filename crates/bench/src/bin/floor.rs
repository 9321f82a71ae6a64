//! The floor: streams a recording and takes f64 FFTs of blocks as many and as long as the order
//! spectrum's, on as many threads, and nothing else.
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
                    let mut place = thread * share;
                    let end = length.min(place + share);
                    let mut sum = 0.0;
                    while place < end {
                        let wanted = bytes.len().min((end - place) as usize);
                        let read = file.read_at(&mut bytes[..wanted], place).expect("the file can be read");
                        if read == 0 {
                            break;
                        }
                        sum += f64::from(bytes[read - 1]);
                        place += read as u64;
                    }
                    let (mut time, mut lines, mut scratch) =
                        (fft.make_input_vec(), fft.make_output_vec(), fft.make_scratch_vec());
                    for i in 0..channels * blocks / threads {
                        time.iter_mut().enumerate().for_each(|(n, x)| *x = ((n * 7 + i) % 64) as f64);
                        fft.process_with_scratch(&mut time, &mut lines, &mut scratch).expect("planned lengths");
                        sum += lines[1].re;
                    }
                    sum
                })
            })
            .collect();
        work.into_iter().map(|w| w.join().expect("no thread panics")).sum()
    });
    println!("{sum}");
}
