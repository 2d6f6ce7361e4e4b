//! Noise that repeats: square tiles made once, then read at any place, turn and scale. Reading a tile costs a few
//! nanoseconds, which is what lets the whole pile be drawn in seconds.

use super::{
    dice::Dice,
    math::{below, length, smooth},
};

const SIDE: usize = 512;

/// One tile of values, repeating with period 1 in both directions.
pub struct Tile(Vec<f32>);

impl Tile {
    /// The value at (x, y), between the four nearest entries.
    pub fn at(&self, x: f32, y: f32) -> f32 {
        let (fx, fy) = (x * SIDE as f32, y * SIDE as f32);
        let (ix, iy) = (below(fx), below(fy));
        let (tx, ty) = (fx - ix as f32, fy - iy as f32);
        let (x0, y0) = (ix as usize & (SIDE - 1), iy as usize & (SIDE - 1));
        let (x1, y1) = ((x0 + 1) & (SIDE - 1), (y0 + 1) & (SIDE - 1));
        let top = self.0[y0 * SIDE + x0] * (1.0 - tx) + self.0[y0 * SIDE + x1] * tx;
        let bottom = self.0[y1 * SIDE + x0] * (1.0 - tx) + self.0[y1 * SIDE + x1] * tx;
        top * (1.0 - ty) + bottom * ty
    }
}

/// The tiles the drawing uses.
pub struct Noise {
    /// Cloud-like, four waves a tile and finer; mean about 0, mostly within ±1.
    pub cloud: Tile,
    /// Like `cloud` but from 24 waves a tile: surface roughness.
    pub fine: Tile,
    /// The distance to the nearest border of a cell pattern (18 cells a tile): 0 on a border, about 1 inside. Cracks.
    pub cells: Tile,
}

impl Noise {
    /// The tiles for a seed.
    pub fn new(seed: u64) -> Self {
        let mut dice = Dice::new(seed, u64::MAX);
        Self { cloud: fractal(&mut dice, 4, 6), fine: fractal(&mut dice, 24, 4), cells: cells(&mut dice, 18) }
    }
}

/// Gradient noise summed over octaves, each twice as fine and about half as strong as the one before.
fn fractal(dice: &mut Dice, first: usize, octaves: usize) -> Tile {
    let mut sum = vec![0.0; SIDE * SIDE];
    let mut strength = 1.0;
    let mut waves = first;
    for _ in 0..octaves {
        let gradients: Vec<(f32, f32)> =
            (0..waves * waves).map(|_| super::math::angle(dice.range(0.0, core::f32::consts::TAU))).collect();
        for row in 0..SIDE {
            let y = row as f32 * waves as f32 / SIDE as f32;
            let (iy, ty) = (y as usize, y - y.floor());
            for column in 0..SIDE {
                let x = column as f32 * waves as f32 / SIDE as f32;
                let (ix, tx) = (x as usize, x - x.floor());
                let corner = |dx: usize, dy: usize| {
                    let g = gradients[((iy + dy) % waves) * waves + (ix + dx) % waves];
                    g.0 * (tx - dx as f32) + g.1 * (ty - dy as f32)
                };
                let (sx, sy) = (smooth(0.0, 1.0, tx), smooth(0.0, 1.0, ty));
                let top = corner(0, 0) + (corner(1, 0) - corner(0, 0)) * sx;
                let bottom = corner(0, 1) + (corner(1, 1) - corner(0, 1)) * sx;
                sum[row * SIDE + column] += 1.5 * strength * (top + (bottom - top) * sy);
            }
        }
        strength *= 0.52;
        waves *= 2;
    }
    Tile(sum)
}

fn cells(dice: &mut Dice, across: usize) -> Tile {
    let points: Vec<(f32, f32)> = (0..across * across).map(|_| (dice.unit(), dice.unit())).collect();
    let mut values = Vec::with_capacity(SIDE * SIDE);
    for row in 0..SIDE {
        for column in 0..SIDE {
            let x = column as f32 * across as f32 / SIDE as f32;
            let y = row as f32 * across as f32 / SIDE as f32;
            let (mut nearest, mut second) = (9.0f32, 9.0f32);
            for dy in 0..3 {
                for dx in 0..3 {
                    let (cx, cy) = (x as usize + across + dx - 1, y as usize + across + dy - 1);
                    let p = points[(cy % across) * across + cx % across];
                    let d = length(cx as f32 - across as f32 + p.0 - x, cy as f32 - across as f32 + p.1 - y);
                    if d < nearest {
                        (nearest, second) = (d, nearest);
                    } else {
                        second = second.min(d);
                    }
                }
            }
            values.push(second - nearest);
        }
    }
    Tile(values)
}
