//! Pictures that commands write.

use std::path::{Path, PathBuf};

use crate::store::StoreError;

use super::CommandError;

/// A picture to be written at the end.
pub(super) struct FigureFile {
    path: PathBuf,
    file: tempfile::NamedTempFile,
}

/// Opens a file beside the picture, so that a path that cannot be written fails
/// before any work and a failure leaves an older picture alone.
pub(super) fn figure_file(
    path: Option<&Path>,
    force: bool,
) -> Result<Option<FigureFile>, CommandError> {
    let Some(path) = path else { return Ok(None) };
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    if path.extension().is_none_or(|extension| extension != "svg") {
        return Err(CommandError::Usage(format!(
            "--figure {}: pictures are SVG files, expected a name that ends with .svg",
            path.display()
        )));
    }
    if path.exists() && !force {
        return Err(CommandError::Output(StoreError::Exists {
            path: path.to_owned(),
        }));
    }
    let file = tempfile::Builder::new()
        .prefix(".figure")
        .tempfile_in(folder)
        .map_err(|error| {
            CommandError::Usage(format!("cannot write --figure {}: {error}", path.display()))
        })?;
    Ok(Some(FigureFile {
        path: path.to_owned(),
        file,
    }))
}

impl FigureFile {
    /// Writes the picture and gives it its name.
    pub(super) fn write(mut self, svg: &str) -> Result<(), CommandError> {
        use std::io::Write;
        let failed = |error: std::io::Error| CommandError::Picture {
            path: self.path.clone(),
            error,
        };
        self.file.write_all(svg.as_bytes()).map_err(failed)?;
        #[cfg(unix)]
        {
            // As a file made by any other program: readable by others.
            use std::os::unix::fs::PermissionsExt;
            let mode = std::fs::Permissions::from_mode(0o644);
            self.file.as_file().set_permissions(mode).map_err(failed)?;
        }
        let path = self.path.clone();
        self.file
            .persist(&path)
            .map(|_| ())
            .map_err(|error| CommandError::Picture {
                path,
                error: error.error,
            })
    }
}
