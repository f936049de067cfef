//! Plain fields of an archive: numbers in as many bytes as they need, little end first.

use crate::error::{Error, Result};

/// Appends seven bits a byte, the low ones first; the top bit says that more follow.
pub fn put_count(out: &mut Vec<u8>, mut value: u64) {
    while value >= 128 {
        out.push(value as u8 | 128);
        value >>= 7;
    }
    out.push(value as u8);
}

/// Appends a signed number: 0, -1, 1, -2 ... as the counts 0, 1, 2, 3 ...
pub fn put_signed(out: &mut Vec<u8>, value: i64) {
    put_count(out, (value << 1 ^ value >> 63) as u64);
}

/// Reads fields from the front of a slice.
#[derive(Debug, Clone, Copy)]
pub struct Fields<'a> {
    rest: &'a [u8],
}

impl<'a> Fields<'a> {
    /// From the first byte.
    pub fn new(bytes: &'a [u8]) -> Fields<'a> {
        Fields { rest: bytes }
    }

    /// What is left.
    pub fn rest(&self) -> &'a [u8] {
        self.rest
    }

    /// The next bytes.
    ///
    /// # Errors
    /// `Malformed` where fewer are left.
    pub fn take(&mut self, count: usize) -> Result<&'a [u8]> {
        if count > self.rest.len() {
            return Err(Error::malformed("a field runs past the end of its block"));
        }
        let (head, rest) = self.rest.split_at(count);
        self.rest = rest;
        Ok(head)
    }

    /// The next byte.
    ///
    /// # Errors
    /// As `take`.
    pub fn byte(&mut self) -> Result<u8> {
        Ok(self.take(1)?[0])
    }

    /// A count as `put_count` writes it, in the fewest bytes.
    ///
    /// # Errors
    /// As `take`, and `Malformed` for more than 64 bits or a needless last byte.
    pub fn count(&mut self) -> Result<u64> {
        let mut value = 0_u64;
        for at in 0..10 {
            let byte = self.byte()?;
            if at == 9 && byte > 1 || at > 0 && byte == 0 {
                break;
            }
            value |= u64::from(byte & 127) << (7 * at);
            if byte < 128 {
                return Ok(value);
            }
        }
        Err(Error::malformed("a count that is no count"))
    }

    /// A count that a length may take: at most `most`.
    ///
    /// # Errors
    /// As `count`, and `Malformed` where it is larger.
    pub fn length(&mut self, most: usize) -> Result<usize> {
        let value = self.count()?;
        usize::try_from(value)
            .ok()
            .filter(|value| *value <= most)
            .ok_or_else(|| Error::malformed(format!("a length of {value} where at most {most} can be")))
    }

    /// A number as `put_signed` writes it.
    ///
    /// # Errors
    /// As `count`.
    pub fn signed(&mut self) -> Result<i64> {
        let value = self.count()?;
        Ok((value >> 1) as i64 ^ -((value & 1) as i64))
    }

    /// A finite double.
    ///
    /// # Errors
    /// As `take`, and `Malformed` where it is not finite.
    pub fn double(&mut self) -> Result<f64> {
        let mut bytes = [0; 8];
        bytes.copy_from_slice(self.take(8)?);
        finite(f64::from_le_bytes(bytes))
    }

    /// A finite single-precision number.
    ///
    /// # Errors
    /// As `double`.
    pub fn single(&mut self) -> Result<f32> {
        let mut bytes = [0; 4];
        bytes.copy_from_slice(self.take(4)?);
        let value = f32::from_le_bytes(bytes);
        finite(f64::from(value)).map(|_| value)
    }
}

fn finite(value: f64) -> Result<f64> {
    if value.is_finite() { Ok(value) } else { Err(Error::malformed("a number that is not finite")) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn counts_and_signed_numbers_come_back() {
        for value in [0, 1, 127, 128, 300, u64::from(u32::MAX), u64::MAX] {
            let mut out = Vec::new();
            put_count(&mut out, value);
            put_signed(&mut out, value as i64);
            let mut fields = Fields::new(&out);
            assert_eq!((fields.count(), fields.signed()), (Ok(value), Ok(value as i64)));
            assert!(fields.rest().is_empty());
        }
        assert!(Fields::new(&[128, 0]).count().is_err());
        assert!(Fields::new(&[255; 10]).count().is_err());
    }
}
