//! The container of SPK kernels: a double precision array file, its byte order and its summaries.
//!
//! # Reference
//! NAIF, *Double Precision Array Files (DAF) Required Reading*: the file record, the summary record.

/// Bytes of a record, and of a word.
const RECORD_BYTES: usize = 1024;
pub(super) const WORD_BYTES: usize = 8;
/// A summary record holds three control words and summaries of five words each.
const SUMMARY_WORDS: usize = 5;
const SUMMARIES_PER_RECORD: usize = (RECORD_BYTES / WORD_BYTES - 3) / SUMMARY_WORDS;
/// Line-end bytes that a transfer in text mode would have changed.
const TRANSFER_CHECK: &[u8] = b"FTPSTR:\r:\n:\r\n:\r\x00:\x81:\x10\xce:ENDFTP";

/// The numbers of a file in its own byte order.
#[derive(Clone, Copy)]
pub(super) struct Reader<'a> {
    pub(super) bytes: &'a [u8],
    pub(super) big_endian: bool,
}

impl Reader<'_> {
    pub(super) fn integer(self, at: usize) -> Option<i32> {
        let four: [u8; 4] = self.bytes.get(at..at + 4)?.try_into().ok()?;
        Some(if self.big_endian { i32::from_be_bytes(four) } else { i32::from_le_bytes(four) })
    }

    pub(super) fn number(self, at: usize) -> Option<f64> {
        let eight: [u8; 8] = self.bytes.get(at..at + 8)?.try_into().ok()?;
        Some(if self.big_endian { f64::from_be_bytes(eight) } else { f64::from_le_bytes(eight) })
    }
}

/// A segment's summary as it stands in the file.
pub(super) struct Summary {
    pub(super) start_s: f64,
    pub(super) stop_s: f64,
    pub(super) target: i32,
    pub(super) centre: i32,
    pub(super) frame: i32,
    pub(super) kind: i32,
    pub(super) first_word: i32,
    pub(super) last_word: i32,
}

/// Whether the file is big-endian, from its file record; a message if it is no SPK file.
pub(super) fn byte_order(data: &[u8]) -> std::result::Result<bool, String> {
    if data.starts_with(b"DAFETF") {
        return Err("is in NAIF's transfer format; convert it to binary first".into());
    }
    // Files from before 1997 say NAIF/DAF and do not tell their kind or byte order.
    let old = data.starts_with(b"NAIF/DAF");
    if !old && !data.starts_with(b"DAF/SPK ") {
        let start = String::from_utf8_lossy(&data[..data.len().min(8)]).into_owned();
        return Err(if data.starts_with(b"DAF/") {
            format!("is a DAF of kind {start:?}, not DAF/SPK")
        } else {
            format!("is not an SPK file: it starts with {start:?}, not \"DAF/SPK \"")
        });
    }
    if data.len() < RECORD_BYTES {
        return Err(format!(
            "truncated: {} bytes, and the file record alone takes {RECORD_BYTES}",
            data.len()
        ));
    }
    // ND and NI, the numbers of doubles and integers in a summary, are 2 and 6 in every SPK file.
    let reads = |big_endian: bool| {
        let reader = Reader { bytes: data, big_endian };
        reader.integer(8) == Some(2) && reader.integer(12) == Some(6)
    };
    let said = match &data[88..96] {
        b"LTL-IEEE" => Some(false),
        b"BIG-IEEE" => Some(true),
        _ if old => None,
        other => {
            return Err(format!(
                "numbers are in the format {:?}; LTL-IEEE and BIG-IEEE are read",
                String::from_utf8_lossy(other)
            ));
        }
    };
    let name = |big_endian: bool| if big_endian { "big-endian" } else { "little-endian" };
    let big_endian = match said {
        Some(big_endian) if reads(big_endian) => big_endian,
        Some(big_endian) if reads(!big_endian) => {
            return Err(format!(
                "wrong byte order: says it is {}, but its numbers are {}",
                name(big_endian),
                name(!big_endian)
            ));
        }
        None if reads(false) => false,
        None if reads(true) => true,
        _ => {
            return Err(
                "damaged file record: summaries must hold 2 numbers and 6 integers in an SPK file".into()
            );
        }
    };
    let transfer = &data[699..699 + TRANSFER_CHECK.len()];
    if transfer.starts_with(b"FTPSTR") && transfer != TRANSFER_CHECK {
        return Err("damaged by a transfer in text mode: its line-end bytes were changed".into());
    }
    Ok(big_endian)
}

/// All summaries of a file, in its order, along the chain of summary records.
pub(super) fn summaries(reader: Reader) -> std::result::Result<Vec<Summary>, String> {
    let records = reader.bytes.len() / RECORD_BYTES;
    let mut found = Vec::new();
    let mut number = f64::from(reader.integer(76).unwrap_or(0));
    let mut visited = 0;
    while number != 0.0 {
        if !(number >= 2.0 && number <= records as f64 && number.fract() == 0.0) {
            return Err(format!(
                "truncated or damaged: the chain of summaries leads to record {number}, the file has {records}"
            ));
        }
        visited += 1;
        if visited > records {
            return Err("damaged: the chain of summaries runs in a circle".into());
        }
        let base = (number as usize - 1) * RECORD_BYTES;
        let word = |index: usize| reader.number(base + index * WORD_BYTES).unwrap_or(f64::NAN);
        let count = word(2);
        if !(count >= 0.0 && count <= SUMMARIES_PER_RECORD as f64 && count.fract() == 0.0) {
            return Err(format!(
                "damaged: record {number} claims {count} summaries, it has room for {SUMMARIES_PER_RECORD}"
            ));
        }
        for index in 0..count as usize {
            let at = base + (3 + index * SUMMARY_WORDS) * WORD_BYTES;
            let time = |which: usize| reader.number(at + which * WORD_BYTES).unwrap_or(f64::NAN);
            let integer = |which: usize| reader.integer(at + 2 * WORD_BYTES + 4 * which).unwrap_or(0);
            found.push(Summary {
                start_s: time(0),
                stop_s: time(1),
                target: integer(0),
                centre: integer(1),
                frame: integer(2),
                kind: integer(3),
                first_word: integer(4),
                last_word: integer(5),
            });
        }
        number = word(0);
    }
    Ok(found)
}
