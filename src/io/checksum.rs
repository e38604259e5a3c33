//! Size and SHA-256 of an input, for provenance.

use sha2::{Digest, Sha256};
use std::fs::File;
use std::io::Read;
use std::path::{Path, PathBuf};

/// What identifies the bytes of a file.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct Checksum {
    /// Bytes.
    pub size: u64,
    /// SHA-256 (FIPS 180-4) in lower-case hexadecimal.
    pub sha256: String,
}

/// A file that cannot be read for its checksum.
#[derive(Debug, thiserror::Error)]
#[error("{}: cannot be read for its checksum", path.display())]
pub struct ChecksumError {
    /// The file.
    pub path: PathBuf,
    /// What the system says.
    #[source]
    pub source: std::io::Error,
}

/// Reads a file once, in pieces.
///
/// # Errors
/// When the file cannot be read.
pub fn checksum(path: &Path) -> Result<Checksum, ChecksumError> {
    let failed = |source| ChecksumError { path: path.to_owned(), source };
    let mut file = File::open(path).map_err(failed)?;
    let mut digest = Sha256::new();
    let mut block = vec![0_u8; 1 << 18];
    let mut size = 0_u64;
    loop {
        let count = match file.read(&mut block) {
            Err(error) if error.kind() == std::io::ErrorKind::Interrupted => continue,
            Err(error) => return Err(failed(error)),
            Ok(0) => break,
            Ok(count) => count,
        };
        size += count as u64;
        digest.update(block.get(..count).unwrap_or_default());
    }
    let mut sha256 = String::with_capacity(64);
    for byte in digest.finalize() {
        for half in [byte >> 4, byte & 15] {
            sha256.push(char::from(b"0123456789abcdef"[usize::from(half)]));
        }
    }
    Ok(Checksum { size, sha256 })
}

#[cfg(test)]
mod tests {
    use super::*;

    // FIPS 180-4 example: SHA-256 of "abc" (published test vector).
    #[test]
    fn the_published_vector() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("abc");
        std::fs::write(&path, "abc").unwrap();
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(checksum(&path).unwrap(), Checksum { size: 3, sha256: expected.to_owned() });
        let error = checksum(&folder.path().join("none")).unwrap_err();
        assert!(error.to_string().ends_with("none: cannot be read for its checksum"), "{error}");
    }
}
