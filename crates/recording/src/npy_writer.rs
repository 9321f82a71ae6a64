use std::io::Write;

use ndarray::{ArrayView, Dimension};
use ndarray_npy::{WriteNpyError, WriteNpyExt};

use crate::Error;

/// Writes an array of any shape as NPY: 64-bit floats, little-endian on the
/// machines we build for, row by row (C order; Fortran order is kept).
///
/// # Errors
///
/// [`Error::Io`] if the sink fails; [`Error::Encode`] if the array cannot be
/// written.
pub fn write_npy<D: Dimension>(
    sink: impl Write,
    array: ArrayView<'_, f64, D>,
) -> Result<(), Error> {
    array.write_npy(sink).map_err(|error| match error {
        WriteNpyError::Io(source) => Error::writing(source),
        other => Error::Encode {
            what: "NPY",
            found: other.to_string(),
            expected: "an array of 64-bit floats".into(),
        },
    })
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use ndarray::{Array2, array};
    use ndarray_npy::ReadNpyExt;

    #[test]
    fn a_map_reads_back_and_its_header_is_as_numpy_writes_it() {
        let map = array![[1.0, 2.5, -3.0], [f64::MIN_POSITIVE, 0.1, 6.0]];
        let mut bytes = Vec::new();
        write_npy(&mut bytes, map.view()).unwrap();
        assert_eq!(Array2::<f64>::read_npy(&bytes[..]).unwrap(), map);
        // Magic, version 1.0, header padded to a multiple of 64 (format
        // description of numpy.lib.format, from memory).
        assert_eq!(&bytes[..8], b"\x93NUMPY\x01\x00");
        let header = usize::from(u16::from_le_bytes([bytes[8], bytes[9]]));
        assert_eq!((10 + header) % 64, 0);
        let text = std::str::from_utf8(&bytes[10..10 + header]).unwrap();
        assert!(text.contains("'<f8'") && text.contains("(2, 3)"), "{text}");
        assert_eq!(bytes.len(), 10 + header + 6 * 8);
    }

    #[test]
    fn a_curve_reads_back() {
        let curve = array![0.0, -1.0, 1e300];
        let mut bytes = Vec::new();
        write_npy(&mut bytes, curve.view()).unwrap();
        assert_eq!(ndarray::Array1::<f64>::read_npy(&bytes[..]).unwrap(), curve);
    }
}
