//! Watching folders: a file event or a timer only says "look"; what is there, the look itself finds.
//!
//! Model: [`Watch`] turns whatever the system reports about the folders into one flag. Events may be lost,
//! merged or late; the rescan makes up for it, so nothing here carries data.

pub mod walk;

use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, RecvTimeoutError, SyncSender, TrySendError, sync_channel};
use std::time::Duration;

use notify::event::{AccessKind, AccessMode};
use notify::{EventKind, RecommendedWatcher, RecursiveMode, Watcher as _};

/// Says "look" to one waiting thread; saying it twice is saying it once.
#[derive(Clone)]
pub struct Wake(SyncSender<()>);

/// The waiting end of a [`Wake`].
pub struct Waiting(Receiver<()>);

/// A flag and the end that waits for it.
#[must_use]
pub fn wake() -> (Wake, Waiting) {
    let (sender, receiver) = sync_channel(1);
    (Wake(sender), Waiting(receiver))
}

impl Wake {
    /// Sets the flag.
    pub fn now(&self) {
        match self.0.try_send(()) {
            Ok(()) | Err(TrySendError::Full(()) | TrySendError::Disconnected(())) => {}
        }
    }
}

impl Waiting {
    /// Waits for the flag, at most so long; false when nobody can set it any more.
    pub fn at_most(&self, timeout: Duration) -> bool {
        !matches!(
            self.0.recv_timeout(timeout),
            Err(RecvTimeoutError::Disconnected)
        )
    }
}

/// The system's events about some folders.
pub struct Watch {
    watcher: Option<RecommendedWatcher>,
    folders: Vec<(PathBuf, bool)>,
}

impl Watch {
    /// Has `wake` told of everything that happens in the folders. Without events (a network share, a full
    /// table of watches) the rescan is all there is, and this says so once.
    #[must_use]
    pub fn new(folders: &[PathBuf], wake: Wake) -> Self {
        let watcher = notify::recommended_watcher(move |event: notify::Result<notify::Event>| {
            if event.map_or(true, |e| says_something(&e.kind)) {
                wake.now();
            }
        });
        let watcher = watcher
            .inspect_err(
                |e| tracing::warn!(error = %e, "no file events here; rescans find new exports"),
            )
            .ok();
        let folders = folders.iter().map(|f| (f.clone(), false)).collect();
        let mut watch = Self { watcher, folders };
        watch.again();
        watch
    }

    /// Tries the folders that could not be watched so far.
    pub fn again(&mut self) {
        let Some(watcher) = &mut self.watcher else {
            return;
        };
        for (folder, watched) in &mut self.folders {
            if !*watched {
                match watcher.watch(folder, RecursiveMode::Recursive) {
                    Ok(()) => *watched = true,
                    Err(e) => {
                        tracing::debug!(folder = %folder.display(), error = %e, "not watched")
                    }
                }
            }
        }
    }

    /// A folder could not be read: its watch went with it and must be set again.
    pub fn lost(&mut self, folder: &Path) {
        for (known, watched) in &mut self.folders {
            if folder.starts_with(&*known) {
                *watched = false;
            }
        }
    }
}

/// Our own looks open folders and files; being told of that would have us look for ever.
fn says_something(kind: &EventKind) -> bool {
    match kind {
        EventKind::Access(AccessKind::Close(AccessMode::Write)) => true,
        EventKind::Access(_) => false,
        _ => true,
    }
}
