//! Many items over all cores, with only a few of them in memory.

use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::thread;

/// `work` of 0, 1, … `count - 1` in that order, on as many threads as the pool has; the results
/// in order, or the error of the first item that failed, after which no further item is begun.
///
/// Each thread has one item in flight. The pool's own parallel iterators promise no such thing:
/// a worker that waits inside one item may take up another, and hold both.
pub(super) fn in_flight<T: Send, E: Send>(
    count: usize,
    work: impl Fn(usize) -> Result<T, E> + Sync,
) -> Result<Vec<T>, E> {
    let next = AtomicUsize::new(0);
    let failed = AtomicBool::new(false);
    let one_thread = || {
        let mut done = Vec::new();
        while !failed.load(Ordering::Relaxed) {
            let index = next.fetch_add(1, Ordering::Relaxed);
            if index >= count {
                break;
            }
            let result = work(index);
            if result.is_err() {
                failed.store(true, Ordering::Relaxed);
            }
            done.push((index, result));
        }
        done
    };
    let mut results: Vec<(usize, Result<T, E>)> = thread::scope(|scope| {
        let threads: Vec<_> = (0..rayon::current_num_threads().min(count))
            .map(|_| scope.spawn(one_thread))
            .collect();
        threads
            .into_iter()
            .flat_map(|thread| match thread.join() {
                Ok(done) => done,
                Err(panic) => std::panic::resume_unwind(panic),
            })
            .collect()
    });
    // Items are begun in order, so all before the first failure are there.
    results.sort_by_key(|(index, _)| *index);
    results.into_iter().map(|(_, result)| result).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn results_come_in_order_and_none_is_missing() {
        let squares = in_flight(1000, |i| Ok::<_, ()>(i * i)).unwrap();
        assert_eq!(squares, (0..1000).map(|i| i * i).collect::<Vec<_>>());
        assert_eq!(in_flight(0, Ok::<_, ()>), Ok(Vec::new()));
    }

    #[test]
    fn the_first_failure_is_reported_and_nothing_begun_after_it() {
        let begun = AtomicUsize::new(0);
        let result = in_flight(1_000_000, |i| {
            begun.fetch_add(1, Ordering::Relaxed);
            if i >= 10 { Err(i) } else { Ok(()) }
        });
        assert_eq!(result, Err(10));
        assert!(begun.into_inner() < 10_000);
    }

    #[test]
    fn no_more_items_are_in_flight_than_there_are_threads() {
        let (now, most) = (AtomicUsize::new(0), AtomicUsize::new(0));
        in_flight(500, |_| {
            most.fetch_max(now.fetch_add(1, Ordering::SeqCst) + 1, Ordering::SeqCst);
            rayon::join(thread::yield_now, thread::yield_now);
            now.fetch_sub(1, Ordering::SeqCst);
            Ok::<_, ()>(())
        })
        .unwrap();
        assert!(most.into_inner() <= rayon::current_num_threads());
    }
}
