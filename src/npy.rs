//! NPY arrays in memory: the parts of archives. Format 1.0 of NumPy's NEP 1, little-endian, C order.

/// An array of float32.
pub(crate) fn write_f32(shape: &[usize], numbers: &[f32]) -> Vec<u8> {
    let mut file = header("<f4", shape);
    numbers.iter().for_each(|x| file.extend(x.to_le_bytes()));
    file
}

/// An array of float64.
pub(crate) fn write_f64(shape: &[usize], numbers: &[f64]) -> Vec<u8> {
    let mut file = header("<f8", shape);
    numbers.iter().for_each(|x| file.extend(x.to_le_bytes()));
    file
}

/// An array of int8.
pub(crate) fn write_i8(shape: &[usize], numbers: &[i8]) -> Vec<u8> {
    let mut file = header("|i1", shape);
    file.extend(numbers.iter().map(|&x| x as u8));
    file
}

/// Shape and numbers of a float32 array, or `None` where the file is anything else.
pub(crate) fn read_f32(file: &[u8]) -> Option<(Vec<usize>, Vec<f32>)> {
    let (shape, data) = read(file, "<f4", 4)?;
    let (numbers, _) = data.as_chunks::<4>();
    Some((shape, numbers.iter().map(|&bytes| f32::from_le_bytes(bytes)).collect()))
}

/// Shape and numbers of a float64 array, or `None` where the file is anything else.
pub(crate) fn read_f64(file: &[u8]) -> Option<(Vec<usize>, Vec<f64>)> {
    let (shape, data) = read(file, "<f8", 8)?;
    let (numbers, _) = data.as_chunks::<8>();
    Some((shape, numbers.iter().map(|&bytes| f64::from_le_bytes(bytes)).collect()))
}

/// Shape and numbers of an int8 array, or `None` where the file is anything else.
pub(crate) fn read_i8(file: &[u8]) -> Option<(Vec<usize>, Vec<i8>)> {
    let (shape, data) = read(file, "|i1", 1)?;
    Some((shape, data.iter().map(|&byte| byte as i8).collect()))
}

fn header(kind: &str, shape: &[usize]) -> Vec<u8> {
    let sizes: String = shape.iter().map(|size| format!("{size}, ")).collect();
    let dictionary = format!("{{'descr': '{kind}', 'fortran_order': False, 'shape': ({}), }}", sizes.trim_end());
    // The data starts at a multiple of 64, and the header ends with a line feed.
    let length = (10 + dictionary.len() + 1).next_multiple_of(64) - 10;
    let mut file = b"\x93NUMPY\x01\x00".to_vec();
    file.extend((length as u16).to_le_bytes());
    file.extend(format!("{dictionary:<width$}\n", width = length - 1).as_bytes());
    file
}

fn read<'a>(file: &'a [u8], kind: &str, width: usize) -> Option<(Vec<usize>, &'a [u8])> {
    let rest = file.strip_prefix(b"\x93NUMPY\x01\x00")?;
    let (length, rest) = rest.split_first_chunk::<2>()?;
    let (text, data) = rest.split_at_checked(usize::from(u16::from_le_bytes(*length)))?;
    let text = std::str::from_utf8(text).ok()?;
    if !text.contains(&format!("'descr': '{kind}'")) || !text.contains("'fortran_order': False") {
        return None;
    }
    let sizes = text.split_once("'shape': (")?.1.split_once(')')?.0;
    let shape: Vec<usize> =
        sizes.split(',').map(str::trim).filter(|s| !s.is_empty()).map(|s| s.parse().ok()).collect::<Option<_>>()?;
    let cells = shape.iter().try_fold(width, |product, &size| product.checked_mul(size))?;
    (cells == data.len()).then_some((shape, data))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_written_is_read() {
        assert_eq!(read_f32(&write_f32(&[3], &[1.5, -2.0, 0.0])), Some((vec![3], vec![1.5, -2.0, 0.0])));
        assert_eq!(read_i8(&write_i8(&[2, 2], &[1, -127, 0, 9])), Some((vec![2, 2], vec![1, -127, 0, 9])));
        assert_eq!(write_f32(&[3], &[0.0; 3]).len(), 64 + 12 + 64);
    }

    #[test]
    fn anything_else_is_none() {
        let file = write_f32(&[2, 2], &[1.0; 4]);
        assert_eq!(read_f32(&file[..file.len() - 1]), None);
        assert_eq!(read_i8(&file), None);
        for cut in 0..file.len() {
            assert_eq!(read_f32(&file[..cut]), None);
        }
    }
}
