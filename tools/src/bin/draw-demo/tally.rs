//! The tally tokens: the categories of the house manual as marks and the outlines they come on.

use core::f32::consts::{PI, TAU};

use super::{
    dice::Dice,
    math::{angle, length, mix, ridge, smooth, to_box},
    solid::{Place, Solid},
};

/// The mark on a tally: what the house manual sorts by.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Mark {
    /// Rays about a boss.
    Daystar,
    /// One line winding outwards.
    Snail,
    /// Waves one above the other.
    Tideline,
    /// A spine with slanted ribs.
    Fishbone,
    /// Two rails with rungs.
    Ladder,
    /// Round pellets in a ring.
    Hailstones,
    /// Two crossing families of lines.
    Netting,
    /// Two crescents with a bar between them.
    TwoMoons,
}

#[derive(Clone, Copy)]
enum Outline {
    Disc,
    /// A squashed disc: its width for a height of 1.
    Oval(f32),
    /// A box with rounded corners: half width, half height, corner radius.
    Tablet(f32, f32, f32),
    /// Pointed left and right, above and below.
    Lozenge,
    Hexagon,
    /// A disc with this many lobes.
    Scallop(f32),
}

impl Outline {
    fn edge(self, x: f32, y: f32) -> f32 {
        match self {
            Self::Disc => length(x, y) - 0.94,
            Self::Oval(width) => {
                let k = length(x / width, y);
                let slope = length(x / (width * width), y).max(1e-4);
                (k * (k - 1.0) / slope).max(-0.5)
            }
            Self::Tablet(w, h, round) => to_box(x, y, (w, h), round),
            Self::Lozenge => {
                let (a, b) = (x.abs() * 1.12, y.abs() * 0.92);
                ((a + b - 0.96) * 0.69).max(length(x, y) - 0.99)
            }
            Self::Hexagon => {
                let (a, b) = (x.abs(), y.abs());
                let flat = b.max(a * 0.866_025_4 + b * 0.5);
                mix(flat - 0.84, length(x, y) - 0.9, 0.22)
            }
            Self::Scallop(lobes) => {
                let lobe = libm::cosf(libm::atan2f(y, x) * lobes).abs();
                length(x, y) - 0.86 - 0.09 * lobe.sqrt()
            }
        }
    }
}

/// One tally: a mark on an outline, each made by another hand.
pub struct Tally {
    mark: Mark,
    outline: Outline,
    /// The mark's free choices: a count, a size, a phase, a turn direction.
    count: f32,
    size: f32,
    phase: f32,
    hand: f32,
    line: f32,
    wobble: (f32, f32, f32),
    rim: Option<f32>,
    hole: Option<(f32, f32, f32)>,
    rounding: f32,
    thickness: f32,
    relief_height: f32,
}

impl Tally {
    /// A tally with this mark, everything else left to chance.
    pub fn new(mark: Mark, dice: &mut Dice) -> Self {
        let oval = Outline::Oval(dice.range(0.68, 0.82));
        let slim = Outline::Oval(dice.range(0.46, 0.56));
        let square = {
            let half = dice.range(0.74, 0.82);
            Outline::Tablet(half, half * dice.range(0.94, 1.0), dice.range(0.08, 0.3))
        };
        let tablet = Outline::Tablet(dice.range(0.5, 0.6), dice.range(0.9, 0.98), dice.range(0.06, 0.26));
        let disc = Outline::Disc;
        let choices = match mark {
            Mark::Daystar => [disc, disc, disc, Outline::Scallop(dice.whole(4, 6) as f32)],
            Mark::Snail => [disc, disc, oval, oval],
            Mark::Tideline => [square, square, square, disc],
            Mark::Fishbone => [slim, slim, slim, Outline::Lozenge],
            Mark::Hailstones => [Outline::Hexagon, Outline::Hexagon, disc, square],
            Mark::Ladder => [tablet, tablet, tablet, square],
            Mark::Netting => [Outline::Lozenge, Outline::Lozenge, square, disc],
            Mark::TwoMoons => [oval, oval, disc, Outline::Hexagon],
        };
        let outline = dice.pick(&choices);
        let count = match mark {
            Mark::Daystar => dice.whole(7, 10),
            Mark::Snail => dice.whole(2, 3),
            Mark::Tideline => dice.whole(4, 5),
            Mark::Fishbone => dice.whole(5, 7),
            Mark::Ladder => dice.whole(4, 5),
            Mark::Hailstones => dice.whole(6, 9),
            Mark::Netting => dice.whole(4, 6),
            Mark::TwoMoons => 2,
        };
        let hole = match mark {
            Mark::Hailstones if dice.chance(0.5) => Some((0.0, 0.0, dice.range(0.13, 0.19))),
            Mark::Ladder | Mark::Fishbone | Mark::Daystar | Mark::Hailstones => None,
            _ if dice.chance(0.22) => Some((dice.range(-0.05, 0.05), -0.74, dice.range(0.08, 0.11))),
            _ => None,
        };
        let sunk = dice.chance(0.28);
        let height = dice.range(0.07, 0.11);
        Self {
            mark,
            outline,
            count: count as f32,
            size: dice.range(0.9, 1.1),
            phase: dice.unit(),
            hand: if dice.chance(0.5) { 1.0 } else { -1.0 },
            line: dice.range(0.8, 1.2),
            wobble: (dice.range(0.0, TAU), dice.range(0.0, TAU), dice.range(0.01, 0.03)),
            rim: dice.chance(0.35).then(|| dice.range(0.055, 0.085)),
            hole,
            rounding: dice.range(0.08, 0.22),
            thickness: dice.range(0.2, 0.34),
            relief_height: if sunk { -height } else { height },
        }
    }

    fn relief(&self, x: f32, y: f32) -> f32 {
        let r = length(x, y);
        match self.mark {
            Mark::Daystar => {
                let sector = TAU / self.count;
                let turned = libm::atan2f(y, x) / sector + self.phase;
                let off = (turned - (turned + 0.5).floor()) * sector;
                let start = 0.27;
                let end = 0.74 * self.size;
                let t = ((r - start) / (end - start)).clamp(0.0, 1.0);
                let across = r * libm::sinf(off.abs());
                let ray = ridge(across, mix(0.1, 0.03, t) * self.line)
                    * smooth(start - 0.05, start + 0.03, r)
                    * smooth(end + 0.04, end - 0.05, r);
                ray.max(ridge(r, 0.2 * self.line).sqrt())
            }
            Mark::Snail => {
                let turns = self.count + 0.3;
                let pitch = 0.76 * self.size.min(1.03) / turns;
                let around = (libm::atan2f(y * self.hand, x) / TAU + self.phase).rem_euclid(1.0);
                let lap = (r / pitch - around).round().clamp(0.0, self.count);
                let along = lap + around;
                let distance = (r - along * pitch).abs();
                let width = pitch * 0.34 * self.line.min(1.1);
                ridge(distance, width) * smooth(turns, turns - 0.12, along)
            }
            Mark::Tideline => {
                let spacing = 1.5 / self.count;
                let waves = 4.2 + 2.4 * self.phase;
                let amplitude = 0.1 * self.size;
                let (cos, sin) = angle(x * waves + self.phase * 17.0);
                let v = (y + amplitude * sin) / spacing + 0.5 * self.count;
                let row = v.floor().clamp(0.0, self.count - 1.0);
                let slope = amplitude * waves * cos;
                let distance = (v - row - 0.5) * spacing / (1.0 + slope * slope).sqrt();
                ridge(distance, 0.072 * self.line)
            }
            Mark::Fishbone => {
                let lean = 0.65 + 0.35 * self.phase;
                let spacing = 1.7 / self.count;
                let v = (y * self.hand - x.abs() * lean) / spacing + 0.25;
                let distance = (v - (v + 0.5).floor()) * spacing / (1.0 + lean * lean).sqrt();
                let rib = ridge(distance, 0.062 * self.line);
                let spine = ridge(x, 0.065 * self.line) * smooth(0.88, 0.8, y.abs());
                rib.max(spine)
            }
            Mark::Ladder => {
                let half = 0.29 * self.size;
                let length = 0.74;
                let ends = smooth(length + 0.03, length - 0.03, y.abs());
                let rail = ridge(x.abs() - half, 0.08 * self.line) * ends;
                let spacing = 1.42 / self.count;
                let v = y / spacing + 0.5 * self.count;
                let rung = ridge((v - v.floor() - 0.5) * spacing, 0.072 * self.line)
                    * smooth(half + 0.01, half - 0.02, x.abs())
                    * ends;
                rail.max(rung)
            }
            Mark::Hailstones => {
                let sector = TAU / self.count;
                let turned = libm::atan2f(y, x) / sector + self.phase;
                let off = (turned - (turned + 0.5).floor()) * sector;
                let (cos, sin) = angle(off);
                let radius = (0.8 * PI * 0.5 / self.count * 1.05).min(0.17) * self.line.min(1.05);
                let pellet = ridge(length(r * cos - 0.56 * self.size.min(1.02), r * sin), radius).sqrt();
                let middle = if self.hole.is_some() { ridge(r - 0.27, 0.05) } else { ridge(r, 0.19).sqrt() };
                pellet.max(middle)
            }
            Mark::Netting => {
                let spacing = 1.55 / self.count;
                let line = |v: f32| {
                    let v = v / spacing + self.phase;
                    (v - (v + 0.5).floor()) * spacing
                };
                let lean = 0.6 + 0.22 * self.size;
                let norm = (1.0 + lean * lean).sqrt();
                let width = 0.058 * self.line;
                ridge(line((x + y * lean) / norm), width).max(ridge(line((x - y * lean) / norm), width))
            }
            Mark::TwoMoons => {
                let radius = 0.33 * self.size;
                let across = x.abs() - 0.15;
                let outer = length(across - radius, y) - radius;
                let inner = radius * 0.86 - length(across - radius * 1.5, y);
                let moon = (-outer.max(inner) / (0.05 * self.line)).clamp(0.0, 1.0);
                let bar = ridge(x, 0.06 * self.line) * smooth(0.52, 0.46, y.abs());
                (moon * (2.0 - moon)).max(bar)
            }
        }
    }
}

impl Solid for Tally {
    fn at(&self, x: f32, y: f32) -> Place {
        let mut edge = self.outline.edge(x, y);
        if let Some((hx, hy, radius)) = self.hole {
            edge = edge.max(radius - length(x - hx, y - hy));
        }
        if edge > 0.3 {
            return Place::plain(edge);
        }
        let (a, b, strength) = self.wobble;
        let (wx, wy) = (x + strength * libm::sinf(3.1 * y + a), y + strength * libm::sinf(2.7 * x + b));
        let border = self.rim.map_or(0.09, |width| width * 2.0 + 0.07);
        let mut relief = self.relief(wx, wy) * smooth(0.02, 0.09, -edge - border + 0.05);
        if let Some(width) = self.rim {
            relief = relief.max(ridge(edge + width + 0.06, width));
        }
        Place { edge, relief, paint: 0.0 }
    }

    fn rounding(&self) -> f32 {
        self.rounding
    }

    fn thickness(&self) -> f32 {
        self.thickness
    }

    fn relief_height(&self) -> f32 {
        self.relief_height
    }
}
