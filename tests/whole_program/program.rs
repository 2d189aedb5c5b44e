//! Runs the binary and reads its result files.

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// A directory of its own, removed at the end.
pub struct Folder {
    directory: tempfile::TempDir,
}

impl Folder {
    /// An empty directory.
    pub fn new() -> Self {
        Folder {
            directory: tempfile::tempdir().expect("a temporary directory"),
        }
    }

    /// Path of a file in it.
    pub fn path(&self, name: &str) -> PathBuf {
        self.directory.path().join(name)
    }

    /// Writes a file and returns its path as text.
    pub fn write(&self, name: &str, content: &str) -> String {
        std::fs::write(self.path(name), content).expect("a written file");
        self.text(name)
    }

    /// Names of all files in it, in order.
    pub fn names(&self) -> Vec<String> {
        let entries = std::fs::read_dir(self.directory.path()).expect("the directory");
        let name = |entry: std::io::Result<std::fs::DirEntry>| {
            entry
                .expect("an entry")
                .file_name()
                .to_string_lossy()
                .into_owned()
        };
        let mut names: Vec<String> = entries.map(name).collect();
        names.sort();
        names
    }

    /// Path of a file in it as text.
    pub fn text(&self, name: &str) -> String {
        self.path(name)
            .to_str()
            .expect("a path in UTF-8")
            .to_owned()
    }
}

/// The command with its first arguments.
pub fn command(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_shottower"));
    command.args(arguments);
    command
}

/// One call, whatever its end.
pub fn call(arguments: &[&str]) -> Output {
    command(arguments).output().expect("the binary starts")
}

/// One call that must exit with 0; returns its standard output.
pub fn succeed(arguments: &[&str]) -> String {
    let output = call(arguments);
    assert!(
        output.status.success(),
        "{arguments:?}\n{}\n{}",
        String::from_utf8_lossy(&output.stdout),
        stderr(&output)
    );
    String::from_utf8(output.stdout).expect("UTF-8 on standard output")
}

/// One call that must fail with that exit status; returns its standard error.
pub fn fail(status: i32, arguments: &[&str]) -> String {
    let output = call(arguments);
    let message = stderr(&output);
    assert_eq!(
        output.status.code(),
        Some(status),
        "{arguments:?}\n{message}"
    );
    assert!(!message.contains("panicked"), "{message}");
    message
}

/// Standard error as text.
pub fn stderr(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

/// The datasets of a group, by name: number of rows and the rows in order.
pub fn tables(file: &Path, group: &str) -> Vec<(String, usize, Vec<bool>)> {
    let file = hdf5::File::open(file).expect("an HDF5 file");
    let Ok(group) = file.group(group) else {
        return Vec::new();
    };
    let mut names = group.member_names().expect("members");
    names.sort();
    let read = |name: String| {
        let dataset = group.dataset(&name).expect("a dataset");
        let rows = dataset.shape()[0];
        let values = dataset.read_2d::<bool>().expect("bits");
        (name, rows, values.into_iter().collect())
    };
    names.into_iter().map(read).collect()
}

/// How often every value of the register came, bit 0 least significant.
pub fn counts(file: &Path, register: &str, width: usize) -> Vec<u64> {
    let tables = tables(file, "shots");
    let (_, rows, bits) = tables
        .iter()
        .find(|(name, ..)| name == register)
        .expect("the register is recorded");
    assert_eq!(bits.len(), rows * width);
    let mut counts = vec![0; 1 << width];
    for row in bits.chunks(width) {
        let value = row
            .iter()
            .rev()
            .fold(0, |sum, &bit| sum << 1 | usize::from(bit));
        counts[value] += 1;
    }
    counts
}

/// A number among the attributes of the file.
pub fn attribute(file: &Path, name: &str) -> f64 {
    let file = hdf5::File::open(file).expect("an HDF5 file");
    let attribute = file.attr(name).expect("the attribute");
    attribute.read_scalar::<f64>().expect("a number")
}
