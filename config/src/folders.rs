//! Paths in the configuration: relative ones start at the configuration's own folder.

use std::path::{Component, Path, PathBuf};

use crate::Disk;
use crate::walk::Node;

/// The disk as it is asked, and where relative paths start.
pub(crate) struct Folders<'a> {
    pub(crate) start: &'a Path,
    pub(crate) disk: &'a dyn Disk,
}

impl Folders<'_> {
    pub(crate) fn exists(&self, path: &Path) -> bool {
        self.disk.is_folder(path)
    }

    /// The path at a node, without `.` and `..` steps.
    pub(crate) fn path(&self, node: &Node<'_>) -> Option<PathBuf> {
        let text = node.text()?;
        if text.trim().is_empty() || text.contains('\0') {
            node.fault("a path");
            return None;
        }
        Some(straight(&self.start.join(text)))
    }
}

/// True when one path is the other or lies inside it.
pub(crate) fn nested(a: &Path, b: &Path) -> bool {
    a.starts_with(b) || b.starts_with(a)
}

fn straight(path: &Path) -> PathBuf {
    let mut straight = PathBuf::new();
    for step in path.components() {
        match step {
            Component::CurDir => {}
            Component::ParentDir
                if matches!(
                    straight.components().next_back(),
                    Some(Component::Normal(_))
                ) =>
            {
                straight.pop();
            }
            Component::ParentDir if straight.has_root() => {}
            _ => straight.push(step),
        }
    }
    straight
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paths_are_straightened() {
        for (written, expected) in [
            ("/a/./b/../c", "/a/c"),
            ("/../a", "/a"),
            ("a/..", ""),
            ("../a", "../a"),
            ("../../a/b/..", "../../a"),
            ("/a//b/", "/a/b"),
        ] {
            assert_eq!(
                straight(Path::new(written)),
                Path::new(expected),
                "{written}"
            );
        }
    }

    #[test]
    fn nested_goes_by_whole_steps() {
        assert!(nested(Path::new("/a/b"), Path::new("/a")));
        assert!(nested(Path::new("/a"), Path::new("/a")));
        assert!(!nested(Path::new("/a/bc"), Path::new("/a/b")));
    }
}
