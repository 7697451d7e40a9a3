//! Pictures of a script: written below the folder of its archive, whatever links may lie there.

use std::path::{Path, PathBuf};

use crate::archive::export::write_whole;
use crate::language::PictureRefused;

/// Writes a picture of that name, whose parts are plain, below a folder.
///
/// # Errors
/// A link that leads out of the folder, a folder that is not there, what the file system refuses.
pub fn write_below(folder: &Path, name: &str, bytes: &[u8]) -> Result<PathBuf, PictureRefused> {
    let refused = |error: std::io::Error| PictureRefused::Unwritable(error.to_string().to_lowercase());
    let root = folder.canonicalize().map_err(refused)?;
    let path = root.join(name);
    let parent = path.parent().unwrap_or(&root).canonicalize().map_err(refused)?;
    let (true, Some(file)) = (parent.starts_with(&root), path.file_name()) else {
        return Err(PictureRefused::Outside);
    };
    let path = parent.join(file);
    // a link is replaced by the rename; only a regular file or nothing may stand there
    match path.symlink_metadata() {
        Ok(about) if !about.is_file() && !about.is_symlink() => {
            return Err(PictureRefused::Unwritable("something else than a file has that name".to_string()));
        }
        _ => {}
    }
    if path.is_symlink() {
        std::fs::remove_file(&path).map_err(refused)?;
    }
    write_whole(&path, bytes).map_err(|error| PictureRefused::Unwritable(error.to_string()))?;
    Ok(path)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the bytes that were there before, and the folder that a link leads to.
    #[cfg(unix)]
    #[test]
    fn links_lead_no_picture_out_of_the_folder() {
        let outside = tempfile::tempdir().unwrap();
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(outside.path().join("kept.svg"), "kept").unwrap();
        std::os::unix::fs::symlink(outside.path(), folder.path().join("away")).unwrap();
        std::os::unix::fs::symlink(outside.path().join("kept.svg"), folder.path().join("link.svg")).unwrap();
        assert_eq!(write_below(folder.path(), "away/new.svg", b"x"), Err(PictureRefused::Outside));
        assert!(!outside.path().join("new.svg").exists());
        write_below(folder.path(), "link.svg", b"mine").unwrap();
        assert_eq!(std::fs::read(outside.path().join("kept.svg")).unwrap(), b"kept");
        assert_eq!(std::fs::read(folder.path().join("link.svg")).unwrap(), b"mine");
        std::fs::create_dir(folder.path().join("below")).unwrap();
        assert!(write_below(folder.path(), "below/new.svg", b"y").unwrap().ends_with("below/new.svg"));
        let missing = write_below(folder.path(), "nowhere/new.svg", b"z");
        assert!(matches!(missing, Err(PictureRefused::Unwritable(_))), "{missing:?}");
        assert!(matches!(write_below(folder.path(), "below", b"z"), Err(PictureRefused::Unwritable(_))));
    }
}
