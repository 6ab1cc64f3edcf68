//! The one way to end the service.

use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

use tokio::sync::watch;

use crate::watch::Wake;

/// Set once; every stage looks at it, waits for it, or is woken by it.
#[derive(Clone)]
pub struct Stop(Arc<Inner>);

struct Inner {
    since: watch::Sender<Option<Instant>>,
    wakes: Mutex<Vec<Wake>>,
}

impl Default for Stop {
    fn default() -> Self {
        Self::new()
    }
}

impl Stop {
    /// Not set.
    #[must_use]
    pub fn new() -> Self {
        Self(Arc::new(Inner {
            since: watch::Sender::new(None),
            wakes: Mutex::new(Vec::new()),
        }))
    }

    /// Has the stop wake this thread too.
    pub fn wakes(&self, wake: Wake) {
        self.0
            .wakes
            .lock()
            .unwrap_or_else(PoisonError::into_inner)
            .push(wake);
    }

    /// Sets it.
    pub fn now(&self) {
        self.0.since.send_if_modified(|since| {
            let first = since.is_none();
            since.get_or_insert_with(Instant::now);
            first
        });
        for wake in self
            .0
            .wakes
            .lock()
            .unwrap_or_else(PoisonError::into_inner)
            .iter()
        {
            wake.now();
        }
    }

    /// True once it is set.
    #[must_use]
    pub fn is_set(&self) -> bool {
        self.0.since.borrow().is_some()
    }

    /// How long ago it was set; zero when it is not.
    #[must_use]
    pub fn since(&self) -> Duration {
        self.0
            .since
            .borrow()
            .map(|at| at.elapsed())
            .unwrap_or_default()
    }

    /// Waits until it is set.
    pub async fn wait(&self) {
        let mut receiver = self.0.since.subscribe();
        // The sender lives as long as we do.
        let _ = receiver.wait_for(Option::is_some).await;
    }
}
