use std::io::Write;

use crate::Error;

/// Writes columns of equal length as CSV: comma, decimal point, one header row.
/// Units belong into the headers (`velocity [mm/s]`).
///
/// Numbers are written in the shortest form that reads back to the same bits;
/// what is not finite leaves its field empty.
///
/// # Errors
///
/// [`Error::Encode`] if the columns differ in length; [`Error::Io`] if the sink
/// fails.
pub fn write_csv(sink: impl Write, columns: &[(&str, &[f64])]) -> Result<(), Error> {
    let rows = columns.first().map_or(0, |(_, values)| values.len());
    if let Some((header, values)) = columns.iter().find(|(_, values)| values.len() != rows) {
        return Err(Error::Encode {
            what: "CSV",
            found: format!("{} rows in column {header}", values.len()),
            expected: format!("{rows} as in the first column"),
        });
    }
    let failed = |error: csv::Error| Error::writing(error.into());
    let mut writer = csv::Writer::from_writer(sink);
    writer
        .write_record(columns.iter().map(|(header, _)| header))
        .map_err(failed)?;
    for row in 0..rows {
        writer
            .write_record(columns.iter().map(|(_, values)| field(values[row])))
            .map_err(failed)?;
    }
    writer.flush().map_err(Error::writing)
}

fn field(value: f64) -> String {
    let size = value.abs();
    if !value.is_finite() {
        String::new()
    } else if size == 0.0 || (1e-5..1e16).contains(&size) {
        value.to_string()
    } else {
        format!("{value:e}")
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn numbers_read_back_to_the_same_bits() {
        let values = [
            0.1,
            -0.0,
            1.0 / 3.0,
            1e-300,
            -f64::MAX,
            f64::MIN_POSITIVE,
            5e-324,
            51_200.0,
            1e16,
        ];
        let mut bytes = Vec::new();
        write_csv(&mut bytes, &[("t [s]", &values), ("a, b [m/s²]", &values)]).unwrap();
        let text = String::from_utf8(bytes).unwrap();
        let mut lines = text.lines();
        assert_eq!(lines.next(), Some("t [s],\"a, b [m/s²]\""));
        for value in values {
            for field in lines.next().unwrap().split(',') {
                assert_eq!(field.parse::<f64>().unwrap().to_bits(), value.to_bits());
                assert!(field.len() < 25, "{field}");
            }
        }
    }

    #[test]
    fn what_could_not_be_worked_out_is_an_empty_field() {
        let mut bytes = Vec::new();
        write_csv(
            &mut bytes,
            &[("a", &[f64::NAN, 1.5]), ("b", &[2.0, f64::INFINITY])],
        )
        .unwrap();
        assert_eq!(bytes, b"a,b\n,2\n1.5,\n");
    }

    #[test]
    fn columns_of_unequal_length_are_refused() {
        let error = write_csv(Vec::new(), &[("a", &[1.0]), ("b", &[])]).unwrap_err();
        assert_eq!(
            error.to_string(),
            "CSV: found 0 rows in column b, expected 1 as in the first column"
        );
    }
}
