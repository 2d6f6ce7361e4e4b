//! A square field of numbers.

/// A square field, row by row.
pub struct Field {
    side: usize,
    values: Vec<f32>,
}

impl Field {
    /// A field of zeros.
    pub fn new(side: usize) -> Self {
        Self { side, values: vec![0.0; side * side] }
    }

    /// A field with the value of `f(column, row)` everywhere.
    pub fn from(side: usize, mut f: impl FnMut(usize, usize) -> f32) -> Self {
        let values = (0..side * side).map(|i| f(i % side, i / side)).collect();
        Self { side, values }
    }

    /// Columns, and rows.
    pub fn side(&self) -> usize {
        self.side
    }

    /// The value at a column and row.
    pub fn get(&self, column: usize, row: usize) -> f32 {
        self.values[row * self.side + column]
    }

    /// Sets the value at a column and row.
    pub fn set(&mut self, column: usize, row: usize, value: f32) {
        self.values[row * self.side + column] = value;
    }

    /// The value between columns and rows; outside the field its border goes on.
    pub fn at(&self, x: f32, y: f32) -> f32 {
        let last = (self.side - 1) as f32;
        let (x, y) = (x.clamp(0.0, last), y.clamp(0.0, last));
        let (x0, y0) = (x as usize, y as usize);
        let (x1, y1) = ((x0 + 1).min(self.side - 1), (y0 + 1).min(self.side - 1));
        let (tx, ty) = (x - x0 as f32, y - y0 as f32);
        let top = self.get(x0, y0) * (1.0 - tx) + self.get(x1, y0) * tx;
        let bottom = self.get(x0, y1) * (1.0 - tx) + self.get(x1, y1) * tx;
        top * (1.0 - ty) + bottom * ty
    }

    /// The largest value.
    pub fn highest(&self) -> f32 {
        self.values.iter().copied().fold(f32::MIN, f32::max)
    }

    /// The first and last row with a value above this; (0, 0) if there is none.
    pub fn rows_above(&self, bound: f32) -> (usize, usize) {
        let row = |i: usize| i / self.side;
        let first = self.values.iter().position(|&v| v > bound).map_or(0, row);
        let last = self.values.iter().rposition(|&v| v > bound).map_or(0, row);
        (first, last)
    }

    /// The change from column to column.
    pub fn slope_x(&self, column: usize, row: usize) -> f32 {
        let (before, after) = (column.saturating_sub(1), (column + 1).min(self.side - 1));
        (self.get(after, row) - self.get(before, row)) / (after - before) as f32
    }

    /// The change from row to row.
    pub fn slope_y(&self, column: usize, row: usize) -> f32 {
        let (before, after) = (row.saturating_sub(1), (row + 1).min(self.side - 1));
        (self.get(column, after) - self.get(column, before)) / (after - before) as f32
    }

    /// The field at half the size, each value the mean of four.
    pub fn halved(&self) -> Self {
        Self::from(self.side / 2, |column, row| {
            let (x, y) = (2 * column, 2 * row);
            (self.get(x, y) + self.get(x + 1, y) + self.get(x, y + 1) + self.get(x + 1, y + 1)) / 4.0
        })
    }

    /// The field blurred by two boxes reaching `radius` to every side.
    pub fn blurred(&self, radius: usize) -> Self {
        let once = self.boxed(radius).boxed(radius);
        once.boxed(radius).boxed(radius)
    }

    /// Rows blurred by a box, and the result transposed: two calls blur both directions.
    fn boxed(&self, radius: usize) -> Self {
        let side = self.side;
        let mut out = Self::new(side);
        let width = (2 * radius + 1) as f32;
        for row in 0..side {
            let line = &self.values[row * side..(row + 1) * side];
            let value = |i: isize| line[i.clamp(0, side as isize - 1) as usize];
            let reach = radius as isize;
            let mut sum: f32 = (-reach..=reach).map(value).sum();
            for column in 0..side {
                out.set(row, column, sum / width);
                let i = column as isize;
                sum += value(i + reach + 1) - value(i - reach);
            }
        }
        out
    }
}
