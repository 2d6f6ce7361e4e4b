//! Items read side by side, one thread a core.

use std::{
    sync::atomic::{AtomicUsize, Ordering},
    thread,
};

use crate::console::{self, Failure};

/// What `work` makes of each number below `count`, in order. `worker` makes what a thread keeps for itself.
///
/// Plain threads: a pool's worker that waits for an encoder's own pool would pick up another item meanwhile.
pub fn each<W, T: Send>(
    count: usize,
    what: &str,
    worker: impl Fn() -> W + Sync,
    work: impl Fn(&W, usize) -> T + Sync,
) -> Result<Vec<T>, Failure> {
    let bar = console::progress(count, what);
    let next = AtomicUsize::new(0);
    let workers = thread::available_parallelism().map_or(1, |cores| cores.get()).min(count);
    let mut done: Vec<(usize, T)> = thread::scope(|scope| {
        let run = || {
            let worker = worker();
            let mut done = Vec::new();
            while !console::stopped() {
                let index = next.fetch_add(1, Ordering::Relaxed);
                if index >= count {
                    break;
                }
                done.push((index, work(&worker, index)));
                bar.inc(1);
            }
            done
        };
        let workers: Vec<_> = (0..workers).map(|_| scope.spawn(run)).collect();
        workers
            .into_iter()
            .flat_map(|worker| worker.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic)))
            .collect()
    });
    bar.finish_and_clear();
    console::go_on()?;
    done.sort_by_key(|&(index, _)| index);
    Ok(done.into_iter().map(|(_, outcome)| outcome).collect())
}
