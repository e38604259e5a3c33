//! Splitting one line at its separators, eight bytes at a time.

/// One step of the search for a row.
pub(super) enum Found {
    /// The row ends before this byte; the next begins at the second.
    Row { end: usize, next: usize },
    /// A quoted cell begins: the careful way is needed.
    Quoted,
    /// More bytes are needed.
    More,
}

/// A word with 0x80 in each byte of `word` that equals the byte repeated in `wanted`; exact for every byte.
fn equal_bytes(word: u64, wanted: u64) -> u64 {
    const LOW: u64 = 0x7f7f_7f7f_7f7f_7f7f;
    let differing = word ^ wanted;
    !(((differing & LOW) + LOW) | differing | LOW)
}

/// Splits the first line of `have` at a separator; `ended` says that no more bytes follow.
pub(super) fn split_bytes(have: &[u8], separator: u8, ended: bool, cells: &mut Vec<(u32, u32)>) -> Found {
    const ONES: u64 = 0x0101_0101_0101_0101;
    cells.clear();
    let (separators, feeds, quotes) = (ONES * u64::from(separator), ONES * u64::from(b'\n'), ONES * u64::from(b'"'));
    let mut begin = 0_usize;
    let mut words = have.chunks_exact(8);
    let mut base = 0_usize;
    for chunk in words.by_ref() {
        let word = u64::from_le_bytes(chunk.try_into().expect("chunks of eight bytes"));
        let mut hits = equal_bytes(word, separators) | equal_bytes(word, feeds) | equal_bytes(word, quotes);
        while hits != 0 {
            let at = base + (hits.trailing_zeros() / 8) as usize;
            hits &= hits - 1;
            if let Some(found) = one_hit(have, at, separator, &mut begin, cells) {
                return found;
            }
        }
        base += 8;
    }
    for (offset, &byte) in words.remainder().iter().enumerate() {
        if (byte == separator || byte == b'\n' || byte == b'"')
            && let Some(found) = one_hit(have, base + offset, separator, &mut begin, cells)
        {
            return found;
        }
    }
    if !ended {
        return Found::More;
    }
    let end = without_return(have, begin, have.len());
    cells.push((begin as u32, end as u32));
    Found::Row { end, next: have.len() }
}

/// Acts on a separator, line feed or quote at `at`.
fn one_hit(have: &[u8], at: usize, separator: u8, begin: &mut usize, cells: &mut Vec<(u32, u32)>) -> Option<Found> {
    let byte = have[at];
    if byte == separator {
        cells.push((*begin as u32, at as u32));
        *begin = at + 1;
        None
    } else if byte == b'\n' {
        let end = without_return(have, *begin, at);
        cells.push((*begin as u32, end as u32));
        Some(Found::Row { end, next: at + 1 })
    } else if have[*begin..at].iter().all(u8::is_ascii_whitespace) {
        Some(Found::Quoted)
    } else {
        // A quote inside a cell is a character like others.
        None
    }
}

/// The end of a line without its carriage return.
fn without_return(have: &[u8], begin: usize, end: usize) -> usize {
    if end > begin && have[end - 1] == b'\r' { end - 1 } else { end }
}

/// Splits the first line of `have` at runs of blanks.
pub(super) fn split_blanks(have: &[u8], ended: bool, cells: &mut Vec<(u32, u32)>) -> Found {
    cells.clear();
    let (end, next) = match have.iter().position(|byte| *byte == b'\n') {
        Some(at) => (at, at + 1),
        None if ended => (have.len(), have.len()),
        None => return Found::More,
    };
    let mut begin = None;
    for (at, byte) in have[..end].iter().enumerate() {
        match (byte.is_ascii_whitespace(), begin) {
            (false, None) => begin = Some(at),
            (true, Some(start)) => {
                cells.push((start as u32, at as u32));
                begin = None;
            }
            _ => {}
        }
    }
    if let Some(start) = begin {
        cells.push((start as u32, end as u32));
    }
    Found::Row { end, next }
}
