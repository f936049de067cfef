//! CBOR (RFC 8949) maps with small whole keys, in deterministic form: keys ascend, lengths are definite.

use minicbor::data::Type;
use minicbor::decode::Error as Fault;
use minicbor::{Decoder, Encoder};

use crate::error::{Error, Result};

/// Builds one map.
#[derive(Default)]
pub struct Map {
    entries: Vec<(u64, Vec<u8>)>,
}

impl Map {
    pub fn count(&mut self, key: u64, value: u64) {
        self.put(key, |e| drop(e.u64(value)));
    }

    pub fn signed(&mut self, key: u64, value: i64) {
        self.put(key, |e| drop(e.i64(value)));
    }

    pub fn double(&mut self, key: u64, value: f64) {
        self.put(key, |e| drop(e.f64(value)));
    }

    pub fn text(&mut self, key: u64, value: &str) {
        self.put(key, |e| drop(e.str(value)));
    }

    pub fn map(&mut self, key: u64, value: Map) {
        self.entries.push((key, value.finish()));
    }

    /// An array of ready items.
    pub fn array(&mut self, key: u64, items: impl ExactSizeIterator<Item = Vec<u8>>) {
        let mut out = Vec::new();
        // Writing into a vector cannot fail.
        let _ = Encoder::new(&mut out).array(items.len() as u64);
        items.for_each(|item| out.extend(item));
        self.entries.push((key, out));
    }

    pub fn finish(mut self) -> Vec<u8> {
        self.entries.sort_by_key(|(key, _)| *key);
        let mut out = Vec::new();
        let _ = Encoder::new(&mut out).map(self.entries.len() as u64);
        for (key, value) in self.entries {
            let _ = Encoder::new(&mut out).u64(key);
            out.extend(value);
        }
        out
    }

    fn put(&mut self, key: u64, write: impl FnOnce(&mut Encoder<&mut Vec<u8>>)) {
        let mut out = Vec::new();
        write(&mut Encoder::new(&mut out));
        self.entries.push((key, out));
    }
}

/// One item by itself.
pub fn count_item(value: u64) -> Vec<u8> {
    let mut out = Vec::new();
    let _ = Encoder::new(&mut out).u64(value);
    out
}

/// Two texts as an array.
pub fn pair_item(a: &str, b: &str) -> Vec<u8> {
    let mut out = Vec::new();
    let _ = Encoder::new(&mut out).array(2).and_then(|e| e.str(a)).and_then(|e| e.str(b)).map(drop);
    out
}

/// Goes through a map of a header: `each` reads the value of a key and says whether it knew it. Unknown keys below 64 are
/// refused, since they may change what the samples mean; others are passed over.
///
/// # Errors
/// `Malformed` for what is no such map.
pub fn read_map(decoder: &mut Decoder<'_>, mut each: impl FnMut(u64, &mut Decoder<'_>) -> Result<bool>) -> Result<()> {
    let entries = decoder.map().map_err(fault)?.ok_or_else(|| Error::malformed("a map without a length"))?;
    let mut before = None;
    for _ in 0..entries {
        let key = decoder.u64().map_err(fault)?;
        if before.is_some_and(|before| key <= before) {
            return Err(Error::malformed("keys of a map out of order"));
        }
        before = Some(key);
        if !each(key, decoder)? {
            if key < 64 {
                return Err(Error::malformed(format!("a header key {key} that this version does not know"))
                    .remedy("restore it with a newer version"));
            }
            decoder.skip().map_err(fault)?;
        }
    }
    Ok(())
}

/// Reads an array item by item. Nothing is allocated for its length: each item must stand in the bytes.
///
/// # Errors
/// `Malformed` for what is no array of such items.
pub fn read_array<T>(decoder: &mut Decoder<'_>, mut each: impl FnMut(&mut Decoder<'_>) -> Result<T>) -> Result<Vec<T>> {
    let count = decoder.array().map_err(fault)?.ok_or_else(|| Error::malformed("an array without a length"))?;
    let mut out = Vec::new();
    for _ in 0..count {
        out.push(each(decoder)?);
    }
    Ok(out)
}

/// A text.
///
/// # Errors
/// `Malformed` for what is none.
pub fn text(decoder: &mut Decoder<'_>) -> Result<String> {
    decoder.str().map(str::to_owned).map_err(fault)
}

/// A finite double.
///
/// # Errors
/// `Malformed` for what is none.
pub fn double(decoder: &mut Decoder<'_>) -> Result<f64> {
    let value = match decoder.datatype().map_err(fault)? {
        Type::F64 => decoder.f64().map_err(fault)?,
        _ => return Err(Error::malformed("not a double")),
    };
    if value.is_finite() { Ok(value) } else { Err(Error::malformed("a number that is not finite")) }
}

/// A count.
///
/// # Errors
/// `Malformed` for what is none.
pub fn count(decoder: &mut Decoder<'_>) -> Result<u64> {
    decoder.u64().map_err(fault)
}

/// A signed number.
///
/// # Errors
/// `Malformed` for what is none.
pub fn signed(decoder: &mut Decoder<'_>) -> Result<i64> {
    decoder.i64().map_err(fault)
}

fn fault(fault: Fault) -> Error {
    Error::malformed(format!("the header is no CBOR of this kind: {fault}"))
}
