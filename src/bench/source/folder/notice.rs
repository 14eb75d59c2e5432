//! Notifications of the file system, reduced to what matters here.

use notify::event::{AccessKind, AccessMode, ModifyKind, RenameMode};
use notify::{EventKind, RecommendedWatcher, RecursiveMode, Watcher};
use std::ffi::OsString;
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::Duration;

/// Whether the platform tells when a writer closes a file.
pub const TELLS_CLOSING: bool = cfg!(target_os = "linux");

/// What happened to a file of the folder.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Notice {
    /// It was made.
    Made(OsString),
    /// Something was written to it.
    Written(OsString),
    /// Its writer closed it, or it got this name.
    Finished(OsString),
    /// It may be gone, or have another stamp.
    Look(OsString),
    /// Notices were lost, or the folder itself changed: look at everything.
    Everything,
}

/// The watch on a folder; without one (too many watches, no such service) `next` only waits.
pub struct Notices {
    watcher: Option<RecommendedWatcher>,
    channel: Receiver<Notice>,
    // Keeps the channel open where there is no watcher.
    _sender: Sender<Notice>,
}

impl Notices {
    /// Watches a folder.
    pub fn of(folder: &Path) -> Notices {
        let (sender, channel) = channel();
        // Paths come as the watch was given them; a relative one would change with the current folder.
        let root = std::path::absolute(folder).unwrap_or_else(|_| folder.to_owned());
        let tell = sender.clone();
        let inside = root.clone();
        let handler = move |event: notify::Result<notify::Event>| {
            for notice in notices(event, &inside) {
                // Nobody listens once the run has ended.
                let _ = tell.send(notice);
            }
        };
        let watcher = notify::recommended_watcher(handler).ok().and_then(|mut w| {
            w.watch(&root, RecursiveMode::NonRecursive).ok()?;
            Some(w)
        });
        Notices {
            watcher,
            channel,
            _sender: sender,
        }
    }

    /// No watch: as on a network share, where changes made elsewhere are not told.
    pub fn none() -> Notices {
        let (sender, channel) = channel();
        Notices {
            watcher: None,
            channel,
            _sender: sender,
        }
    }

    /// Whether there is a watch.
    pub fn are_there(&self) -> bool {
        self.watcher.is_some()
    }

    /// Waits for a notice.
    pub fn next(&self, wait: Duration) -> Option<Notice> {
        self.channel.recv_timeout(wait).ok()
    }

    /// A notice that is there already.
    pub fn at_hand(&self) -> Option<Notice> {
        self.channel.try_recv().ok()
    }
}

fn notices(event: notify::Result<notify::Event>, root: &Path) -> Vec<Notice> {
    let Ok(event) = event else {
        return vec![Notice::Everything];
    };
    if event.need_rescan() {
        return vec![Notice::Everything];
    }
    let each = |notice: fn(OsString) -> Notice| -> Vec<Notice> {
        let of = |path: &PathBuf| match path.file_name() {
            Some(name) if path.parent() == Some(root) => notice(name.to_owned()),
            _ => Notice::Everything,
        };
        event.paths.iter().map(of).collect()
    };
    match event.kind {
        EventKind::Access(AccessKind::Close(AccessMode::Write)) => each(Notice::Finished),
        // Our own reading is an access too.
        EventKind::Access(_) => Vec::new(),
        EventKind::Create(_) => each(Notice::Made),
        EventKind::Modify(ModifyKind::Name(RenameMode::To)) => each(Notice::Finished),
        EventKind::Modify(ModifyKind::Name(RenameMode::From)) => each(Notice::Look),
        // Both ends of a rename that was told already, one by one.
        EventKind::Modify(ModifyKind::Name(RenameMode::Both)) if cfg!(target_os = "linux") => {
            Vec::new()
        }
        EventKind::Modify(ModifyKind::Name(_)) => vec![Notice::Everything],
        // Times and rights: whether the contents changed shows in the stamp.
        EventKind::Modify(ModifyKind::Metadata(_)) => each(Notice::Look),
        EventKind::Modify(_) => each(Notice::Written),
        EventKind::Remove(_) => each(Notice::Look),
        EventKind::Any | EventKind::Other => vec![Notice::Everything],
    }
}
