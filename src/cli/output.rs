//! Files, standard output and standard error.

use std::io::{self, ErrorKind, Write};
use std::path::{Path, PathBuf};

use super::{Failure, interrupt};
use crate::problems::Problem;

/// Prints an answer. A reader who has gone, as in `| head`, is no error.
pub(super) fn print(text: &str) -> io::Result<()> {
    let mut out = io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(e) if e.kind() == ErrorKind::BrokenPipe => Ok(()),
        other => other,
    }
}

/// Says something beside the answer, on standard error. There is nowhere to say that this failed.
pub(super) fn tell(text: &str) {
    let _ = io::stderr().lock().write_all(text.as_bytes());
}

/// A directory that files can be written to.
pub(super) struct Destination(PathBuf);

impl Destination {
    /// Makes the directory where it is missing and tries it, before any long work.
    pub fn open(directory: PathBuf) -> Result<Self, Failure> {
        std::fs::create_dir_all(&directory)
            .and_then(|()| tempfile::tempfile_in(&directory))
            .map_err(|e| fault(&directory, &e))?;
        Ok(Destination(directory))
    }

    /// Writes every file under a temporary name first, so that each is whole or absent.
    pub fn write(&self, files: &[(String, Vec<u8>)]) -> Result<Vec<PathBuf>, Failure> {
        let _whole = interrupt::hold();
        let mut ready = Vec::with_capacity(files.len());
        for (name, content) in files {
            let path = self.0.join(name);
            let written = || -> io::Result<_> {
                let mut file = temporary(&self.0)?;
                file.write_all(content)?;
                file.as_file().sync_all()?;
                Ok(file)
            };
            ready.push((written().map_err(|e| fault(&path, &e))?, path));
        }
        let mut paths = Vec::with_capacity(ready.len());
        for (file, path) in ready {
            file.persist(&path).map_err(|e| fault(&path, &e.error))?;
            paths.push(path);
        }
        Ok(paths)
    }
}

/// A temporary file with the permissions of any new file; by default others may not read it.
fn temporary(directory: &Path) -> io::Result<tempfile::NamedTempFile> {
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        let any = std::fs::Permissions::from_mode(0o666);
        tempfile::Builder::new()
            .permissions(any)
            .tempfile_in(directory)
    }
    #[cfg(not(unix))]
    tempfile::NamedTempFile::new_in(directory)
}

fn fault(path: &Path, e: &io::Error) -> Failure {
    let what = format!("`{}` cannot be written: {e}", path.display());
    Failure::input([
        Problem::error("--out", what).hint("name a directory that may be made and written to")
    ])
}
