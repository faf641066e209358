//! Work on many files at once, results in the order of the files.

use std::num::NonZeroUsize;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::mpsc;
use std::thread;

/// Bytes of stack for each thread: twice what a main thread usually has, since the default of other threads is too
/// little for deep circuits.
const STACK: usize = 16 << 20;

/// Does `work` on every job, on as many threads as the machine has; `done` hears how many are finished.
pub fn map<J: Sync, T: Send>(
    jobs: &[J],
    work: impl Fn(&J) -> T + Sync,
    mut done: impl FnMut(usize),
) -> Vec<T> {
    let threads = thread::available_parallelism().map_or(1, NonZeroUsize::get).min(jobs.len());
    let next = AtomicUsize::new(0);
    let mut results: Vec<Option<T>> = jobs.iter().map(|_| None).collect();
    thread::scope(|scope| {
        let (sender, receiver) = mpsc::channel();
        let mut started = 0;
        for _ in 0..threads {
            let (sender, next, work) = (sender.clone(), &next, &work);
            let run = move || {
                while let Some((at, job)) = take(jobs, next) {
                    // nobody listens only where the run is over
                    let _ = sender.send((at, work(job)));
                }
            };
            started += usize::from(thread::Builder::new().stack_size(STACK).spawn_scoped(scope, run).is_ok());
        }
        if started == 0 {
            while let Some((at, job)) = take(jobs, &next) {
                let _ = sender.send((at, work(job)));
            }
        }
        drop(sender);
        for (count, (at, result)) in receiver.iter().enumerate() {
            results[at] = Some(result);
            done(count + 1);
        }
    });
    results.into_iter().flatten().collect()
}

fn take<'j, J>(jobs: &'j [J], next: &AtomicUsize) -> Option<(usize, &'j J)> {
    let at = next.fetch_add(1, Ordering::Relaxed);
    jobs.get(at).map(|job| (at, job))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn results_stand_in_the_order_of_the_jobs() {
        let jobs: Vec<u64> = (0..200).collect();
        let mut heard = 0;
        let squares = map(&jobs, |n| n * n, |count| heard = count);
        assert_eq!(squares, jobs.iter().map(|n| n * n).collect::<Vec<_>>());
        assert_eq!(heard, 200);
        assert!(map(&[] as &[u64], |n| *n, |_| {}).is_empty());
    }
}
