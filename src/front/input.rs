//! Reads files, and says plainly why one cannot be read.

use std::fs::File;
use std::io::Read;
use std::path::{Path, PathBuf};

use ringfield::board::{Reading, TableText, read_board_and_tables};
use ringfield::limit::{Limit, read_limit};

use super::Refusal;

/// Larger files are no board and no limit line.
const LARGEST_BYTES: u64 = 16 << 20;

/// Reads a text file of at most [`LARGEST_BYTES`].
pub fn read_text(path: &Path) -> Result<String, Refusal> {
    let name = path.display();
    let cannot_read = |error| Refusal::new(format!("cannot read `{name}`: {error}"));
    let too_large = || {
        Refusal::new(format!(
            "`{name}` is larger than 16 MB; a text file was expected"
        ))
    };

    let file = File::open(path).map_err(|error| match error.kind() {
        std::io::ErrorKind::NotFound => Refusal::new(format!("there is no file `{name}`")),
        _ => cannot_read(error),
    })?;
    let metadata = file.metadata().map_err(cannot_read)?;
    if metadata.is_dir() {
        return Err(Refusal::new(format!(
            "`{name}` is a folder; a file was expected"
        )));
    }
    if metadata.len() > LARGEST_BYTES {
        return Err(too_large());
    }
    // A pipe does not tell its size beforehand.
    let mut bytes = Vec::new();
    file.take(LARGEST_BYTES + 1)
        .read_to_end(&mut bytes)
        .map_err(cannot_read)?;
    if bytes.len() as u64 > LARGEST_BYTES {
        return Err(too_large());
    }
    String::from_utf8(bytes).map_err(|error| {
        let sound = &error.as_bytes()[..error.utf8_error().valid_up_to()];
        let line = sound.iter().filter(|byte| **byte == b'\n').count() + 1;
        Refusal::new(format!("`{name}` is not UTF-8 text: see line {line}"))
    })
}

/// A board file and the tables it names, which lie beside it.
pub fn board(path: &Path) -> Result<Reading, Refusal> {
    let text = read_text(path)?;
    let table = |name: &str| {
        let path = path.with_file_name(name);
        match read_text(&path) {
            Ok(text) => Ok(TableText {
                name: path.display().to_string(),
                text,
            }),
            Err(Refusal(messages)) => {
                let reason = messages.first().map_or("", String::as_str);
                Err(reason.trim_start_matches("error: ").to_owned())
            }
        }
    };
    Ok(read_board_and_tables(
        &text,
        &path.display().to_string(),
        &table,
    ))
}

/// The limits of the files given.
pub fn limits(files: &[PathBuf]) -> Result<Vec<Limit>, Refusal> {
    files
        .iter()
        .map(|path| {
            let text = read_text(path)?;
            read_limit(&text, &path.display().to_string())
                .map_err(|diagnostics| Refusal(diagnostics.iter().map(|d| d.render()).collect()))
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refusal_of(bytes: &[u8]) -> String {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("board.yaml");
        std::fs::write(&path, bytes).unwrap();
        read_text(&path).unwrap_err().0.remove(0)
    }

    #[test]
    fn what_cannot_be_read_is_told_apart() {
        let folder = tempfile::tempdir().unwrap();
        let Refusal(messages) = read_text(folder.path()).unwrap_err();
        assert!(messages[0].contains("is a folder"));
        let Refusal(messages) = read_text(&folder.path().join("no.yaml")).unwrap_err();
        assert!(messages[0].contains("there is no file"));
        assert!(refusal_of(b"title: x\nnets: \xff\n").contains("line 2"));
        assert!(refusal_of(&vec![b'#'; (16 << 20) + 1]).contains("larger than 16 MB"));
    }
}
