//! Threads: chunks are worked on in any order and folded in ascending order.

use std::collections::BTreeMap;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Condvar, Mutex, mpsc};

/// Works on chunks 0…`count` − 1 with `threads` threads and hands every outcome to `fold` on the
/// calling thread, in ascending order, whatever order they were finished in.
///
/// `scratch` is called once for each thread. Work runs at most two chunks a thread ahead of the
/// fold, so memory does not grow with the recording. Ends at the first error, or when `fold` returns
/// false.
pub(crate) fn for_each_in_order<S, T: Send, E: Send>(
    count: usize,
    threads: usize,
    scratch: impl Fn() -> S + Sync,
    work: impl Fn(usize, &mut S) -> Result<T, E> + Sync,
    mut fold: impl FnMut(usize, T) -> bool,
) -> Result<(), E> {
    if threads <= 1 {
        let mut space = scratch();
        for chunk in 0..count {
            if !fold(chunk, work(chunk, &mut space)?) {
                break;
            }
        }
        return Ok(());
    }
    let next = AtomicUsize::new(0);
    let stop = AtomicBool::new(false);
    let folded = (Mutex::new(0usize), Condvar::new());
    let (sender, receiver) = mpsc::channel();
    let mut outcome = Ok(());
    std::thread::scope(|scope| {
        for _ in 0..threads.min(count) {
            let sender = sender.clone();
            scope.spawn(|| {
                let sender = sender;
                let mut space = scratch();
                loop {
                    let chunk = next.fetch_add(1, Ordering::Relaxed);
                    if chunk >= count {
                        return;
                    }
                    let mut done = folded
                        .0
                        .lock()
                        .unwrap_or_else(std::sync::PoisonError::into_inner);
                    while chunk >= *done + 2 * threads && !stop.load(Ordering::Relaxed) {
                        done = folded
                            .1
                            .wait(done)
                            .unwrap_or_else(std::sync::PoisonError::into_inner);
                    }
                    drop(done);
                    if stop.load(Ordering::Relaxed)
                        || sender.send((chunk, work(chunk, &mut space))).is_err()
                    {
                        return;
                    }
                }
            });
        }
        drop(sender);
        let mut waiting = BTreeMap::new();
        let mut expected = 0;
        let mut go_on = true;
        for (chunk, result) in receiver {
            waiting.insert(chunk, result);
            while let Some(result) = waiting.remove(&expected).filter(|_| go_on) {
                match result {
                    Ok(value) => go_on = fold(expected, value),
                    Err(error) => {
                        outcome = Err(error);
                        go_on = false;
                    }
                }
                expected += 1;
            }
            if !go_on {
                stop.store(true, Ordering::Relaxed);
            }
            *folded
                .0
                .lock()
                .unwrap_or_else(std::sync::PoisonError::into_inner) = expected;
            folded.1.notify_all();
        }
    });
    outcome
}

#[cfg(test)]
mod tests {
    use super::*;

    fn collect(threads: usize, stop_after: usize) -> Vec<usize> {
        let mut seen = Vec::new();
        for_each_in_order(
            50,
            threads,
            || (),
            |chunk, ()| {
                // Later chunks finish first.
                std::thread::sleep(std::time::Duration::from_micros(
                    ((50 - chunk) % 7) as u64 * 100,
                ));
                Ok::<_, ()>(chunk * chunk)
            },
            |chunk, value| {
                assert_eq!(value, chunk * chunk);
                seen.push(chunk);
                seen.len() < stop_after
            },
        )
        .expect("no chunk fails");
        seen
    }

    #[test]
    fn outcomes_come_in_order_whatever_the_threads() {
        for threads in [1, 2, 3, 7] {
            assert_eq!(collect(threads, 1000), (0..50).collect::<Vec<_>>());
            assert_eq!(collect(threads, 9), (0..9).collect::<Vec<_>>());
        }
    }

    #[test]
    fn the_first_error_in_order_ends_it() {
        for threads in [1, 2, 5] {
            let result = for_each_in_order(
                100,
                threads,
                || (),
                |chunk, ()| if chunk >= 13 { Err(chunk) } else { Ok(()) },
                |_, ()| true,
            );
            assert_eq!(result, Err(13));
        }
    }
}
