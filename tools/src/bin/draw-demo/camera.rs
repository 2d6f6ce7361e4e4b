//! What a small camera makes of the light: exposure, darker corners, softness, noise, and the way to 8 bits.

use super::{
    dice::Dice,
    math::{Colour, length, smooth},
};

/// Entries of the table of the transfer function: enough for 8 bits in the darks.
const TABLE: usize = 8192;

/// One camera setting.
pub struct Camera {
    exposure: Colour,
    vignette: f32,
    /// Blur, standard deviation in pixels.
    blur: f32,
    noise: f32,
}

impl Camera {
    /// A setting, left to chance.
    pub fn new(dice: &mut Dice) -> Self {
        let exposure = dice.range(0.34, 0.48);
        let balance = dice.range(-0.05, 0.05);
        let soft = dice.chance(0.2);
        Self {
            exposure: [exposure * (1.0 + balance), exposure, exposure * (1.0 - balance)],
            vignette: dice.range(0.1, 0.36),
            blur: if soft { dice.range(0.8, 1.4) } else { dice.range(0.25, 0.6) },
            noise: dice.range(0.003, 0.011),
        }
    }

    /// From linear light to 8-bit sRGB, row by row.
    pub fn develop(&self, linear: Vec<Colour>, side: usize, dice: &mut Dice) -> Vec<u8> {
        let weights = gaussian(self.blur);
        let once = blur_turned(&linear, side, &weights);
        let soft = blur_turned(&once, side, &weights);
        let middle = side as f32 / 2.0;
        let table: Vec<f32> = (0..TABLE).map(|i| encode(i as f32 / (TABLE - 1) as f32)).collect();
        let mut bytes = Vec::with_capacity(side * side * 3);
        for (i, pixel) in soft.iter().enumerate() {
            let (x, y) = ((i % side) as f32 / middle - 1.0, (i / side) as f32 / middle - 1.0);
            let fall = 1.0 - self.vignette * smooth(0.35, 1.5, length(x, y));
            let grain = self.noise * dice.normal();
            for (value, exposure) in pixel.iter().zip(self.exposure) {
                let light = value * exposure * fall;
                let noisy = table[(film(light) * (TABLE - 1) as f32 + 0.5) as usize] + grain;
                bytes.push((noisy * 255.0 + 0.5).clamp(0.0, 255.0) as u8);
            }
        }
        bytes
    }
}

/// Lets bright light roll off instead of clipping (the rational curve of Narkowicz, 2015).
fn film(x: f32) -> f32 {
    ((x * (2.51 * x + 0.03)) / (x * (2.43 * x + 0.59) + 0.14)).clamp(0.0, 1.0)
}

/// The sRGB transfer function (IEC 61966-2-1).
fn encode(x: f32) -> f32 {
    if x <= 0.003_130_8 { 12.92 * x } else { 1.055 * libm::powf(x, 1.0 / 2.4) - 0.055 }
}

fn gaussian(deviation: f32) -> Vec<f32> {
    let reach = libm::ceilf(deviation * 2.5) as i32;
    let raw: Vec<f32> = (-reach..=reach).map(|i| libm::expf(-(i * i) as f32 / (2.0 * deviation * deviation))).collect();
    let sum: f32 = raw.iter().sum();
    raw.iter().map(|w| w / sum).collect()
}

/// Rows blurred, and the result transposed: two calls blur both directions.
fn blur_turned(pixels: &[Colour], side: usize, weights: &[f32]) -> Vec<Colour> {
    let reach = weights.len() / 2;
    let mut out = vec![[0.0; 3]; pixels.len()];
    for row in 0..side {
        for column in 0..side {
            let mut sum = [0.0; 3];
            for (k, weight) in weights.iter().enumerate() {
                let from = (column + k).saturating_sub(reach).min(side - 1);
                for (s, value) in sum.iter_mut().zip(pixels[row * side + from]) {
                    *s += weight * value;
                }
            }
            out[column * side + row] = sum;
        }
    }
    out
}
