//! Writes files whole or not at all, and prints.

use std::collections::HashSet;
use std::fs;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

use super::Refusal;

/// A file to be written.
pub struct Output {
    /// Where.
    pub path: PathBuf,
    /// All of it.
    pub contents: Vec<u8>,
}

/// Finds out before the work whether every answer could be written. `-` stands for standard output.
pub fn check_places(files: &[Option<&Path>], folder: Option<&Path>) -> Result<(), Refusal> {
    let files: Vec<&Path> = files
        .iter()
        .flatten()
        .copied()
        .filter(|path| *path != Path::new("-"))
        .collect();
    for (index, path) in files.iter().enumerate() {
        if files[..index].contains(path) {
            return Err(Refusal::new(format!(
                "two answers would be written to `{}`",
                path.display()
            )));
        }
        check_file(path)?;
    }
    folder.map_or(Ok(()), check_new_folder)
}

/// Finds out before the work whether a file could be written.
pub fn check_file(path: &Path) -> Result<(), Refusal> {
    if path.is_dir() {
        return Err(Refusal::new(format!(
            "cannot write `{}`: it is a folder",
            path.display()
        )));
    }
    if is_special(path) {
        return Ok(());
    }
    check_folder(folder_of(path), path)
}

/// Finds out before the work whether files could be written to a folder, which need not exist yet.
pub fn check_new_folder(folder: &Path) -> Result<(), Refusal> {
    let existing = folder
        .ancestors()
        .map(|ancestor| match ancestor {
            empty if empty.as_os_str().is_empty() => Path::new("."),
            other => other,
        })
        .find(|ancestor| ancestor.exists());
    check_folder(existing.unwrap_or(Path::new(".")), folder)
}

fn check_folder(folder: &Path, wanted: &Path) -> Result<(), Refusal> {
    if !folder.is_dir() {
        return Err(Refusal::new(format!(
            "cannot write `{}`: there is no folder `{}`",
            wanted.display(),
            folder.display()
        )));
    }
    match NamedTempFile::new_in(folder) {
        Ok(_) => Ok(()),
        Err(error) => Err(cannot_write(wanted, &error)),
    }
}

/// Writes every file under a temporary name first, so that a failure leaves none of them half-written.
pub fn write(outputs: Vec<Output>) -> Result<(), Refusal> {
    let mut waiting = Vec::new();
    for output in outputs {
        let path = output.path;
        let temporary = write_beside(&path, &output.contents);
        waiting.extend(
            temporary
                .map_err(|error| cannot_write(&path, &error))?
                .map(|temporary| (path, temporary)),
        );
    }
    for (path, temporary) in waiting {
        // A link keeps pointing where it did.
        let target = fs::canonicalize(&path).unwrap_or_else(|_| path.clone());
        temporary
            .persist(target)
            .map_err(|failure| cannot_write(&path, &failure.error))?;
    }
    Ok(())
}

/// Prints to standard output. A reader that has seen enough is no error.
pub fn print(text: &str) -> Result<(), Refusal> {
    let mut stdout = anstream::stdout().lock();
    match stdout
        .write_all(text.as_bytes())
        .and_then(|()| stdout.flush())
    {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => {
            Err(Refusal::new(format!("cannot write the answer: {error}")))
        }
        _ => Ok(()),
    }
}

/// Says something on standard error, where a failure cannot be told to anyone.
pub fn tell(message: &str) {
    let _ = writeln!(anstream::stderr().lock(), "{}", message.trim_end());
}

/// A file name for each net, safe anywhere, and none twice even where case does not count.
pub fn file_names<'a>(nets: impl Iterator<Item = &'a str>) -> Vec<String> {
    let mut taken = HashSet::new();
    nets.map(|net| {
        let safe = |c: char| c.is_alphanumeric() || matches!(c, '-' | '_' | '+');
        let plain: String = net
            .chars()
            .take(80)
            .map(|c| if safe(c) { c } else { '_' })
            .collect();
        let mut name = plain.clone();
        let mut count = 1;
        while !taken.insert(name.to_lowercase()) {
            count += 1;
            name = format!("{plain}-{count}");
        }
        name
    })
    .collect()
}

/// A path with a net's name put before its extension.
pub fn with_net(path: &Path, net: &str) -> PathBuf {
    let mut name = path.file_stem().unwrap_or_default().to_os_string();
    name.push(format!("-{net}"));
    if let Some(extension) = path.extension() {
        name.push(".");
        name.push(extension);
    }
    path.with_file_name(name)
}

/// Writes beside the place a file is meant for; straight into it where that is no plain file.
fn write_beside(path: &Path, contents: &[u8]) -> io::Result<Option<NamedTempFile>> {
    if is_special(path) {
        match fs::OpenOptions::new()
            .write(true)
            .open(path)?
            .write_all(contents)
        {
            Err(error) if error.kind() != io::ErrorKind::BrokenPipe => return Err(error),
            _ => return Ok(None),
        }
    }
    let target = fs::canonicalize(path).unwrap_or_else(|_| path.to_path_buf());
    let folder = folder_of(&target);
    fs::create_dir_all(folder)?;
    let mut builder = tempfile::Builder::new();
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // Temporary files are private by habit; these become the user's own.
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    let mut temporary = builder.prefix(".ringfield-").tempfile_in(folder)?;
    temporary.write_all(contents)?;
    Ok(Some(temporary))
}

/// Whether a path is a device or a pipe, which a rename would replace.
fn is_special(path: &Path) -> bool {
    fs::metadata(path).is_ok_and(|metadata| !metadata.is_file() && !metadata.is_dir())
}

fn folder_of(path: &Path) -> &Path {
    match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    }
}

fn cannot_write(path: &Path, error: &io::Error) -> Refusal {
    // The kind alone: the whole error may name a temporary file.
    Refusal::new(format!(
        "cannot write `{}`: {}",
        path.display(),
        error.kind()
    ))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn file_names_are_safe_and_never_meet() {
        let nets = ["A/B", "A_B", "a_b", "../x", "CLK+"];
        assert_eq!(
            file_names(nets.into_iter()),
            ["A_B", "A_B-2", "a_b-3", "___x", "CLK+"]
        );
    }

    #[test]
    fn the_net_comes_before_the_extension() {
        let path = |text: &str| PathBuf::from(text);
        assert_eq!(
            with_net(&path("out/wave.csv"), "CLK"),
            path("out/wave-CLK.csv")
        );
        assert_eq!(with_net(&path("wave"), "CLK"), path("wave-CLK"));
    }

    #[test]
    fn one_failure_leaves_the_old_files_as_they_were() {
        let folder = tempfile::tempdir().unwrap();
        let good = folder.path().join("good.json");
        fs::write(&good, "old").unwrap();
        let outputs = [good.clone(), good.join("below-a-file.csv")]
            .map(|path| Output {
                path,
                contents: b"new".to_vec(),
            })
            .into();
        assert!(write(outputs).is_err());
        assert_eq!(fs::read_to_string(&good).unwrap(), "old");
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 1);
    }

    #[test]
    fn a_place_that_cannot_be_written_is_found_beforehand() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("file");
        fs::write(&file, "").unwrap();
        assert!(check_file(folder.path()).is_err());
        assert!(check_file(&folder.path().join("missing/x.csv")).is_err());
        assert!(check_file(&folder.path().join("x.csv")).is_ok());
        assert!(check_new_folder(&file.join("plots")).is_err());
        assert!(check_new_folder(&folder.path().join("a/b")).is_ok());
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 1);
    }
}
