//! Other things from the same mud: they belong in no category of the house manual.

use core::f32::consts::{PI, TAU};

use super::{
    dice::Dice,
    math::{angle, length, mix, ridge, smooth, to_box, to_segment, turn},
    solid::{Place, Solid},
};

/// A kind of stray.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// A water-worn stone with a vein.
    Pebble,
    /// A forged nail.
    Nail,
    /// Half a cockle.
    Shell,
    /// A key with a round bow.
    Key,
    /// A plain finger or harness ring.
    Ring,
    /// A piece of a painted pot.
    Sherd,
    /// A sewn-through button.
    Button,
    /// A piece of twig.
    Twig,
}

/// One stray.
pub struct Stray {
    kind: Kind,
    a: f32,
    b: f32,
    c: f32,
    bend: f32,
    corners: Vec<(f32, f32, f32)>,
}

impl Stray {
    /// A stray of this kind, everything else left to chance.
    pub fn new(kind: Kind, dice: &mut Dice) -> Self {
        let mut at = dice.range(0.0, TAU);
        let corners = (0..dice.whole(4, 6))
            .map(|_| {
                at += dice.range(0.9, 1.6);
                let (cos, sin) = angle(at);
                (cos, sin, dice.range(0.5, 0.8))
            })
            .collect();
        Self { kind, a: dice.unit(), b: dice.unit(), c: dice.unit(), bend: dice.range(-0.3, 0.3), corners }
    }
}

impl Solid for Stray {
    fn at(&self, x: f32, y: f32) -> Place {
        match self.kind {
            Kind::Pebble => {
                let (u, v) = (x / mix(0.6, 0.9, self.a), y / mix(0.75, 0.95, self.b));
                let around = libm::atan2f(v, u);
                let lump =
                    1.0 + 0.07 * libm::sinf(2.0 * around + 6.0 * self.c) + 0.05 * libm::sinf(3.0 * around + self.a);
                let edge = (length(u, v) - lump) * 0.75;
                let vein = ridge(
                    x * 0.8 + y * self.bend + 0.15 * libm::sinf(3.0 * y) - 0.3 * (self.b - 0.5),
                    0.03 + 0.06 * self.c,
                );
                Place { edge, relief: 0.0, paint: vein }
            }
            Kind::Nail => {
                let u = x + self.bend * (y * y - 0.4);
                let shaft = u.abs() - mix(0.1, 0.025, smooth(-0.8, 0.95, y));
                let shaft = shaft.max(y - 0.95).max(-y - 0.9);
                let head = to_box(u, y + 0.88, (mix(0.2, 0.3, self.a), 0.09), 0.05);
                Place::plain(shaft.min(head))
            }
            Kind::Shell => {
                let (u, v) = (x, y + 0.66);
                let around = libm::atan2f(u, v);
                let r = length(u, v * 0.98);
                let ribs = mix(15.0, 21.0, self.a);
                let rib = libm::cosf(around * ribs);
                let fan = r - 1.42 * libm::sqrtf(libm::cosf(around * 0.88).max(0.0)) - 0.02 * rib;
                let edge = fan.max(around.abs() * r.max(0.1) - 1.25 * r.max(0.1)).max(-0.62 - y);
                let growth = ridge((r * 5.0 + self.b).fract() - 0.5, 0.25);
                Place { edge: edge * 0.8, relief: (0.5 + 0.5 * rib) * smooth(0.1, 0.5, r), paint: growth * 0.7 }
            }
            Kind::Key => {
                let bow = (length(x * 1.05, y + 0.58) - 0.26).abs() - 0.075;
                let shaft = to_segment(x, y, (0.0, -0.3), (0.0, 0.9)) - 0.07;
                let collar = to_box(x, y + 0.22, (0.13, 0.05), 0.03);
                let mut bit = to_box(x - 0.22, y - 0.7, (0.2, 0.17), 0.02);
                let notch = to_box(x - mix(0.22, 0.34, self.a), y - mix(0.6, 0.8, self.b), (0.05, 0.1), 0.0);
                bit = bit.max(-notch);
                Place::plain(bow.min(shaft).min(collar).min(bit))
            }
            Kind::Ring => {
                let radius = mix(0.55, 0.74, self.a);
                let r = length(x, y * mix(1.0, 1.12, self.b));
                Place::plain((r - radius).abs() - mix(0.09, 0.17, self.c))
            }
            Kind::Sherd => {
                let mut edge = -9.0f32;
                for &(cos, sin, reach) in &self.corners {
                    edge = edge.max(x * cos + y * sin - reach);
                }
                let (u, v) = turn(x, y, angle(self.a * PI));
                let curve = v + 0.25 * u * u;
                let stripe = ridge(curve - 0.1, 0.12).max(ridge(curve + 0.22, 0.05)).max(ridge(curve - 0.5, 0.06));
                Place { edge: edge.max(length(x, y) - 1.05), relief: 0.0, paint: smooth(0.05, 0.3, stripe) }
            }
            Kind::Button => {
                let r = length(x, y);
                let gap = mix(0.13, 0.17, self.a);
                let hole = length(x.abs() - gap, y.abs() - gap) - 0.075;
                let edge = (r - 0.78).max(-hole);
                Place { edge, relief: smooth(0.5, 0.58, r) * smooth(0.8, 0.7, r), paint: 0.0 }
            }
            Kind::Twig => {
                let u = x + self.bend * 1.2 * y * y + 0.05 * libm::sinf(5.0 * y + 6.0 * self.a);
                let width = mix(0.16, 0.1, smooth(-1.0, 1.0, y)) + 0.02 * libm::sinf(9.0 * y + 6.0 * self.b);
                let stem = (u.abs() - width).max(y.abs() - 0.96);
                let spur = to_segment(u, y, (0.0, 0.1), (0.42, -0.3 - 0.2 * self.c)) - 0.06;
                Place::plain(stem.min(spur))
            }
        }
    }

    fn rounding(&self) -> f32 {
        match self.kind {
            Kind::Pebble => 0.75,
            Kind::Shell => 0.8,
            Kind::Nail | Kind::Key => 0.08,
            Kind::Ring => 0.14,
            Kind::Sherd => 0.05,
            Kind::Button => 0.12,
            Kind::Twig => 0.15,
        }
    }

    fn thickness(&self) -> f32 {
        match self.kind {
            Kind::Pebble => 0.5,
            Kind::Shell => 0.42,
            Kind::Nail | Kind::Key => 0.16,
            Kind::Ring => 0.24,
            Kind::Sherd | Kind::Button => 0.2,
            Kind::Twig => 0.26,
        }
    }

    fn relief_height(&self) -> f32 {
        match self.kind {
            Kind::Shell => 0.05,
            Kind::Button => 0.07,
            _ => 0.0,
        }
    }
}
