//! What things are made of: colour, shine and small-scale roughness. No material belongs to a category.

use super::{
    dice::Dice,
    math::{Colour, blend, mix, smooth, times},
    noise::Noise,
};

/// How a point of a surface answers light.
#[derive(Clone, Copy)]
pub struct Surface {
    /// Diffuse colour; for a metal the colour of its reflection.
    pub colour: Colour,
    /// 0.05 (mirror-like) … 1 (matt).
    pub roughness: f32,
    /// Reflectance at right angles, 0 … 1.
    pub shine: f32,
    /// 1 for bare metal, 0 for everything else.
    pub metal: f32,
}

/// What is known about the place where a material is asked for.
pub struct Spot {
    /// In the thing's own frame.
    pub x: f32,
    /// In the thing's own frame.
    pub y: f32,
    /// Depth below the highest relief nearby, 0 (high) … 1 (low).
    pub low: f32,
    /// Distance in from the outline.
    pub inside: f32,
    /// How close to a fresh break, 0 … 1.
    pub fresh: f32,
    /// How much paint, 0 … 1.
    pub paint: f32,
}

/// One material as it came out on one thing.
pub struct Material {
    base: Colour,
    /// Seen where the surface is worn through, and on breaks.
    body: Colour,
    /// Collects in what lies low: soil, patina, pooled glaze.
    low: Colour,
    low_amount: f32,
    paint: Colour,
    roughness: f32,
    shine: f32,
    metal: f32,
    mottle: f32,
    speckle: f32,
    streak: f32,
    crackle: f32,
    /// How much of the surface is worn through on edges and heights.
    rubbed: f32,
    /// The depth of pits and unevenness.
    pub rough_height: f32,
    soil: f32,
    soil_colour: Colour,
    at: (f32, f32),
}

/// The families of materials.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Family {
    /// Fired clay, from buff through red to black.
    Clay,
    /// Glaze over clay.
    Glaze,
    /// Bone, antler, shell.
    Bone,
    /// Slate, soapstone, limestone.
    Stone,
    /// Copper alloy with patina.
    Bronze,
    /// Waterlogged wood.
    Wood,
    /// Rusted iron.
    Iron,
}

impl Material {
    /// A material of this family, everything else left to chance.
    pub fn new(family: Family, dice: &mut Dice) -> Self {
        let soil_colour = dice.pick(&[[0.16, 0.105, 0.06], [0.24, 0.18, 0.11], [0.1, 0.085, 0.065], [0.3, 0.25, 0.18]]);
        let plain = Self {
            base: [0.5; 3],
            body: [0.5; 3],
            low: soil_colour,
            low_amount: dice.range(0.15, 0.75),
            paint: [0.1, 0.05, 0.03],
            roughness: 0.8,
            shine: 0.03,
            metal: 0.0,
            mottle: 0.15,
            speckle: 0.05,
            streak: 0.0,
            crackle: 0.0,
            rubbed: 0.0,
            rough_height: 0.008,
            soil: if dice.chance(0.45) { dice.range(0.25, 0.9) } else { 0.0 },
            soil_colour,
            at: (dice.unit(), dice.unit()),
        };
        match family {
            Family::Clay => {
                let base = dice.pick(&[
                    [0.44, 0.185, 0.1],
                    [0.36, 0.13, 0.07],
                    [0.56, 0.41, 0.26],
                    [0.5, 0.3, 0.17],
                    [0.075, 0.068, 0.062],
                    [0.2, 0.17, 0.145],
                    [0.62, 0.54, 0.43],
                ]);
                let polished = dice.chance(0.3);
                Self {
                    base,
                    body: blend(base, [0.42, 0.3, 0.2], 0.5),
                    paint: dice.pick(&[[0.09, 0.05, 0.035], [0.6, 0.55, 0.45], [0.3, 0.07, 0.04]]),
                    roughness: if polished { 0.42 } else { 0.85 },
                    shine: 0.04,
                    mottle: 0.3,
                    speckle: 0.22,
                    rubbed: 0.25,
                    rough_height: dice.range(0.008, 0.018),
                    ..plain
                }
            }
            Family::Glaze => {
                let base = dice.pick(&[
                    [0.05, 0.2, 0.12],
                    [0.03, 0.09, 0.27],
                    [0.42, 0.2, 0.035],
                    [0.22, 0.035, 0.025],
                    [0.62, 0.6, 0.53],
                    [0.06, 0.27, 0.29],
                    [0.19, 0.23, 0.06],
                    [0.34, 0.42, 0.42],
                ]);
                Self {
                    base,
                    body: dice.pick(&[[0.46, 0.24, 0.14], [0.6, 0.48, 0.34], [0.34, 0.26, 0.2]]),
                    low: times(base, 0.35),
                    low_amount: 0.9,
                    roughness: dice.range(0.1, 0.24),
                    shine: 0.055,
                    mottle: 0.28,
                    speckle: 0.08,
                    crackle: if dice.chance(0.5) { dice.range(0.3, 0.8) } else { 0.0 },
                    rubbed: dice.range(0.3, 0.8),
                    rough_height: 0.005,
                    ..plain
                }
            }
            Family::Bone => {
                let base = dice.pick(&[[0.66, 0.57, 0.42], [0.55, 0.42, 0.26], [0.72, 0.68, 0.58], [0.34, 0.23, 0.13]]);
                Self {
                    base,
                    body: times(base, 0.85),
                    paint: times(base, 0.6),
                    roughness: 0.38,
                    shine: 0.045,
                    mottle: 0.16,
                    speckle: 0.05,
                    streak: 0.13,
                    rough_height: 0.006,
                    ..plain
                }
            }
            Family::Stone => {
                let base = dice.pick(&[
                    [0.13, 0.15, 0.18],
                    [0.24, 0.29, 0.24],
                    [0.5, 0.47, 0.4],
                    [0.3, 0.28, 0.27],
                    [0.36, 0.24, 0.21],
                    [0.21, 0.2, 0.26],
                ]);
                Self {
                    base,
                    body: times(base, 1.5),
                    paint: [0.66, 0.63, 0.58],
                    roughness: dice.range(0.45, 0.8),
                    mottle: 0.3,
                    speckle: 0.3,
                    streak: 0.12,
                    rubbed: 0.15,
                    rough_height: dice.range(0.006, 0.016),
                    ..plain
                }
            }
            Family::Bronze => Self {
                base: dice.pick(&[[0.5, 0.32, 0.13], [0.42, 0.22, 0.11], [0.55, 0.43, 0.2]]),
                body: [0.6, 0.45, 0.2],
                low: dice.pick(&[[0.1, 0.3, 0.22], [0.16, 0.33, 0.29], [0.07, 0.12, 0.08]]),
                low_amount: dice.range(0.75, 1.0),
                roughness: dice.range(0.28, 0.42),
                shine: 0.6,
                metal: 1.0,
                mottle: 0.2,
                speckle: 0.1,
                rough_height: 0.01,
                soil: dice.range(0.3, 0.9),
                soil_colour: dice.pick(&[[0.12, 0.32, 0.24], [0.2, 0.36, 0.32], [0.16, 0.13, 0.08]]),
                ..plain
            },
            Family::Wood => {
                let base = dice.pick(&[[0.2, 0.11, 0.055], [0.34, 0.2, 0.1], [0.1, 0.065, 0.045], [0.42, 0.32, 0.22]]);
                Self {
                    base,
                    body: times(base, 1.4),
                    roughness: 0.62,
                    mottle: 0.22,
                    streak: 0.38,
                    rough_height: 0.006,
                    ..plain
                }
            }
            Family::Iron => Self {
                base: dice.pick(&[[0.2, 0.09, 0.045], [0.12, 0.075, 0.055], [0.26, 0.13, 0.06]]),
                body: [0.3, 0.16, 0.07],
                low: [0.07, 0.04, 0.03],
                roughness: 0.8,
                shine: 0.05,
                mottle: 0.5,
                speckle: 0.4,
                rough_height: 0.028,
                ..plain
            },
        }
    }

    /// The unevenness of the surface at (x, y) of the thing's frame, about ±1.
    pub fn unevenness(&self, noise: &Noise, x: f32, y: f32) -> f32 {
        let (u, v) = (x + self.at.0 * 7.0, y + self.at.1 * 7.0);
        let grain =
            if self.streak > 0.2 { noise.fine.at(u * 0.9, v * 0.06) } else { noise.fine.at(u * 0.22, v * 0.22) };
        grain + 0.5 * noise.cloud.at(u * 0.3, v * 0.3)
    }

    /// How the surface answers light at a spot.
    pub fn surface(&self, noise: &Noise, spot: &Spot) -> Surface {
        let (u, v) = (spot.x + self.at.0 * 7.0, spot.y + self.at.1 * 7.0);
        let cloud = noise.cloud.at(u * 0.21, v * 0.21);
        let fine = noise.fine.at(v * 0.31, u * 0.31);
        let mut colour = times(self.base, 1.0 + self.mottle * cloud + self.speckle * fine);
        if self.streak > 0.0 {
            let streak = noise.fine.at(u * 0.7 + 0.06 * cloud, v * 0.035);
            colour = times(colour, 1.0 + self.streak * streak);
        }
        colour = blend(colour, self.paint, spot.paint * smooth(-0.9, 0.0, fine + 0.4));
        let mut roughness = self.roughness;
        let mut shine = self.shine;
        let mut metal = self.metal;
        if self.crackle > 0.0 {
            let crack = smooth(0.07, 0.0, noise.cells.at(u * 0.4 + 0.012 * fine, v * 0.4));
            colour = times(colour, 1.0 - self.crackle * crack * 0.6);
        }
        let low = self.low_amount * smooth(0.15, 0.9, spot.low + 0.18 * fine);
        colour = blend(colour, self.low, low);
        metal *= 1.0 - low;

        let height = 1.0 - spot.low;
        let rim = smooth(0.12, 0.0, spot.inside);
        let worn = smooth(0.95, 1.25, self.rubbed * (0.75 * height + 0.8 * rim + 0.55 * cloud + 0.2 * fine) + 0.35)
            .max(spot.fresh);
        colour = blend(colour, times(self.body, 1.0 + 0.15 * fine), worn);
        if self.metal == 0.0 {
            roughness = mix(roughness, 0.85, worn);
            shine = mix(shine, 0.03, worn);
        }
        if self.soil > 0.0 {
            let patch = noise.cloud.at(v * 0.16 + 0.37, u * 0.16);
            let cover = smooth(0.55, 0.95, self.soil * (0.55 + 0.75 * patch + 0.25 * spot.low + 0.12 * fine));
            colour = blend(colour, times(self.soil_colour, 1.0 + 0.35 * fine), cover);
            roughness = mix(roughness, 0.95, cover);
            shine = mix(shine, 0.02, cover);
            metal *= 1.0 - cover;
        }
        if self.metal > 0.0 {
            shine = mix(0.04, shine, metal);
            roughness = mix(0.8, roughness, metal);
        }
        Surface { colour: colour.map(|c| c.max(0.004)), roughness, shine, metal }
    }
}
