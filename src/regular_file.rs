//! Opens the files that a person names.

use std::fs::File;
use std::io;
use std::path::Path;

/// Opens a regular file, or a link to one. A device such as `/dev/zero` never ends and a pipe may
/// never begin, so they are refused before they are opened.
///
/// # Errors
/// There is no such file, it may not be read, or it is something else than a file.
pub(crate) fn open(path: &Path) -> io::Result<File> {
    let kind = std::fs::metadata(path)?;
    if kind.is_dir() {
        return Err(io::Error::other("it is a folder"));
    }
    if !kind.is_file() {
        return Err(io::Error::other("it is a device or a pipe, and no regular file"));
    }
    File::open(path)
}

#[cfg(test)]
mod tests {
    use super::open;
    use std::path::Path;

    #[test]
    fn only_regular_files_and_links_to_them_are_opened() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("pools.csv");
        std::fs::write(&file, "pool,slips\n").unwrap();
        assert!(open(&file).is_ok());
        assert_eq!(open(folder.path()).unwrap_err().to_string(), "it is a folder");
        #[cfg(unix)]
        {
            let link = folder.path().join("link.csv");
            std::os::unix::fs::symlink(&file, &link).unwrap();
            assert!(open(&link).is_ok());
            let refused = open(Path::new("/dev/zero")).unwrap_err();
            assert_eq!(refused.to_string(), "it is a device or a pipe, and no regular file");
            // A socket: opening it would fail in other words, reading a pipe would wait.
            let socket = folder.path().join("socket");
            let _listener = std::os::unix::net::UnixListener::bind(&socket).unwrap();
            assert!(open(&socket).unwrap_err().to_string().contains("no regular file"));
        }
    }
}
