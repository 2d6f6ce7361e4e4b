//! One picture: a thing on a bench under one lamp and the light of the room, seen by a small camera.
//!
//! Everything becomes a height field and a field of surfaces at twice the picture's size; slopes give the shading, a
//! walk towards the lamp gives the shadows, and a comparison with the blurred heights gives the darkness of corners.

use core::f32::consts::TAU;

use super::{
    bench::Bench,
    camera::Camera,
    dice::Dice,
    field::Field,
    material::{Material, Spot, Surface},
    math::{Colour, angle, length, mix, smooth, times, turn},
    noise::Noise,
    solid::Solid,
};

/// Side of a picture in pixels.
pub const SIDE: usize = 288;
/// The drawing is this many times finer than the picture.
const FINER: usize = 2;
const DRAWN: usize = SIDE * FINER;

/// So little shine that it does not show.
const MATT: f32 = 0.02;

/// Where the thing lies and how it fared.
struct Pose {
    centre: (f32, f32),
    scale: f32,
    turn: (f32, f32),
    /// The camera looks a little from the side: this squeezes one direction.
    squeeze: f32,
    wear: f32,
    chips: Vec<(f32, f32, f32)>,
    /// A break: direction and distance from the centre.
    snap: Option<(f32, f32, f32)>,
    at: (f32, f32),
}

impl Pose {
    fn new(dice: &mut Dice, tally: bool) -> Self {
        let chips = (0..dice.below(if tally { 4 } else { 2 }))
            .map(|_| {
                let (cos, sin) = angle(dice.range(0.0, TAU));
                // A flat bite: a large circle that only reaches in a little.
                let radius = dice.range(0.3, 0.7);
                let out = radius + dice.range(0.74, 0.92);
                (cos * out, sin * out, radius)
            })
            .collect();
        let snap = (tally && dice.chance(0.12)).then(|| {
            let (cos, sin) = angle(dice.range(0.0, TAU));
            (cos, sin, dice.range(0.3, 0.65))
        });
        Self {
            centre: (dice.range(-0.11, 0.11), dice.range(-0.11, 0.11)),
            scale: dice.range(0.64, 0.82),
            // Most finds are laid the right way up, more or less.
            turn: angle(if dice.chance(0.06) { dice.range(0.0, TAU) } else { 0.17 * dice.normal() }),
            squeeze: dice.range(0.88, 1.0),
            wear: 0.9 * dice.unit() * dice.unit(),
            chips,
            snap,
            at: (dice.range(0.0, 9.0), dice.range(0.0, 9.0)),
        }
    }
}

/// The lamp and the room.
struct Light {
    towards: (f32, f32, f32),
    lamp: Colour,
    room: Colour,
    softness: f32,
}

impl Light {
    fn new(dice: &mut Dice) -> Self {
        // Most benches have the lamp at the upper left; nothing forces it.
        let around = -0.75 * core::f32::consts::PI + 0.75 * dice.normal();
        let high = dice.range(0.5, 0.95);
        let (cos, sin) = angle(around);
        let (flat, up) = angle(high);
        let warm = dice.range(-0.1, 0.16);
        let lamp = times([1.0 + warm, 1.0, 1.0 - 1.25 * warm], dice.range(2.1, 2.7));
        let cool = dice.range(0.0, 0.14);
        let room = times([1.0 - cool, 1.0, 1.0 + cool], dice.range(0.34, 0.62));
        Self { towards: (cos * flat, sin * flat, up), lamp, room, softness: dice.range(0.18, 0.5) }
    }
}

/// Draws a thing: the picture's pixels, red, green and blue, row by row.
pub fn draw(noise: &Noise, dice: &mut Dice, thing: &dyn Solid, material: &Material, tally: bool) -> Vec<u8> {
    let bench = Bench::new(dice);
    let pose = Pose::new(dice, tally);
    let light = Light::new(dice);
    let camera = Camera::new(dice);

    let mut heights = Field::new(DRAWN);
    let mut surfaces = Vec::with_capacity(DRAWN * DRAWN);
    let place = |i: usize| (i as f32 + 0.5) * 2.0 / DRAWN as f32 - 1.0;
    for row in 0..DRAWN {
        let y = place(row);
        for column in 0..DRAWN {
            let x = place(column);
            let (height, surface) = match thing_at(noise, thing, material, &pose, x, y) {
                Some(found) => found,
                None => {
                    let (height, colour) = bench.at(noise, x, y);
                    (height, Surface { colour, roughness: 0.9, shine: MATT, metal: 0.0 })
                }
            };
            heights.set(column, row, height);
            surfaces.push(surface);
        }
    }

    let coarse = heights.halved();
    let shadow = shadows(&coarse.halved(), &light);
    let corners = corners(&coarse);
    let mut linear = vec![[0.0f32; 3]; SIDE * SIDE];
    for row in 0..DRAWN {
        for column in 0..DRAWN {
            let (sx, sy) = (heights.slope_x(column, row), heights.slope_y(column, row));
            let per_unit = DRAWN as f32 / 2.0;
            let (nx, ny) = (-sx * per_unit, -sy * per_unit);
            let norm = 1.0 / (nx * nx + ny * ny + 1.0).sqrt();
            let at = (column as f32 * 0.5 - 0.25, row as f32 * 0.5 - 0.25);
            let seen = shade(
                &surfaces[row * DRAWN + column],
                (nx * norm, ny * norm, norm),
                shadow.at(at.0 * 0.5 - 0.25, at.1 * 0.5 - 0.25),
                corners.at(at.0, at.1),
                &light,
            );
            let pixel = &mut linear[row / FINER * SIDE + column / FINER];
            for (sum, part) in pixel.iter_mut().zip(seen) {
                *sum += part / (FINER * FINER) as f32;
            }
        }
    }
    camera.develop(linear, SIDE, dice)
}

/// Height and surface of the thing at (x, y) of the picture, or nothing beside it.
fn thing_at(
    noise: &Noise,
    thing: &dyn Solid,
    material: &Material,
    pose: &Pose,
    x: f32,
    y: f32,
) -> Option<(f32, Surface)> {
    let (u, v) = ((x - pose.centre.0) / pose.scale, (y - pose.centre.1) / (pose.scale * pose.squeeze));
    if u * u + v * v > 1.7 {
        return None;
    }
    let (u, v) = turn(u, v, pose.turn);
    let (nu, nv) = (u + pose.at.0, v + pose.at.1);
    let ragged = noise.cloud.at(nu * 0.25, nv * 0.25);
    let found = thing.at(u, v);
    let edge = found.edge + 0.018 * ragged;
    if edge > 0.0 {
        return None;
    }
    let rough = noise.fine.at(nu * 0.14, nv * 0.14);
    let mut broken = -1.0f32;
    for &(cx, cy, radius) in &pose.chips {
        broken = broken.max(radius - length(u - cx, v - cy) + 0.035 * rough + 0.04 * ragged);
    }
    if let Some((cos, sin, reach)) = pose.snap {
        broken = broken.max(u * cos + v * sin - reach + 0.07 * ragged + 0.025 * rough);
    }
    if broken > 0.0 {
        return None;
    }

    let rounding = thing.rounding();
    let t = (1.0 + edge / rounding).clamp(0.0, 1.0);
    let mut face = (1.0 - t * t).sqrt();
    // A break falls off steeply and shows the body.
    face *= 0.25 + 0.75 * smooth(0.0, 0.07, -broken + 0.02 * rough);
    let fresh = smooth(0.075, 0.03, -broken + 0.02 * rough);

    let patch = smooth(-0.5, 0.6, noise.cloud.at(nu * 0.11 + 0.4, nv * 0.11));
    let kept = 1.0 - pose.wear * (0.35 + 0.65 * patch);
    // Wear takes the tops first and rounds what is left.
    let relief = found.relief * kept * mix(1.0, found.relief, pose.wear * 0.6);
    let depth = thing.relief_height();
    let height = thing.thickness() * face
        + depth * relief * (1.0 - fresh) * smooth(0.0, 0.5, face)
        + material.rough_height * material.unevenness(noise, u, v) * smooth(0.1, 0.6, face);
    let low = if depth == 0.0 {
        0.3
    } else if depth > 0.0 {
        1.0 - relief
    } else {
        relief
    };
    let spot = Spot { x: u, y: v, low: low * smooth(0.0, 0.1, -edge), inside: -edge, fresh, paint: found.paint };
    Some((height * pose.scale, material.surface(noise, &spot)))
}

/// How much of the lamp each place sees, 0 … 1.
fn shadows(heights: &Field, light: &Light) -> Field {
    let side = heights.side();
    let (lx, ly, lz) = light.towards;
    let flat = length(lx, ly);
    let (dx, dy, climb) = (lx / flat, ly / flat, lz / flat);
    let unit = 2.0 / side as f32;
    let highest = heights.highest();
    // Only near the thing, as far as its shadow can reach: the unevenness of the bench throws none worth the time.
    let reach = (highest / climb / unit) as usize + 2;
    let (first, last) = heights.rows_above(0.3 * highest);
    let rows = first.saturating_sub(reach)..last + reach;
    Field::from(side, |column, row| {
        if !rows.contains(&row) {
            return 1.0;
        }
        let here = heights.get(column, row);
        let mut hidden = 0.0f32;
        let mut step = 0.8f32;
        while step < 60.0 {
            let ray = here + step * unit * climb;
            if ray > highest {
                break;
            }
            let over = heights.at(column as f32 + dx * step, row as f32 + dy * step) - ray;
            hidden = hidden.max(over / (step * unit * light.softness) + 0.5);
            step += 0.7 + 0.06 * step;
        }
        1.0 - smooth(0.0, 1.0, hidden - 0.1)
    })
}

/// How open each place is to the room, 0 … 1.
fn corners(heights: &Field) -> Field {
    let near = heights.blurred(3);
    let wide = heights.blurred(13);
    Field::from(heights.side(), |column, row| {
        let here = heights.get(column, row);
        let below = (near.get(column, row) - here).max(0.0) * 13.0 + (wide.get(column, row) - here).max(0.0) * 6.5;
        1.0 / (1.0 + below)
    })
}

fn shade(surface: &Surface, normal: (f32, f32, f32), lit: f32, open: f32, light: &Light) -> Colour {
    let (nx, ny, nz) = normal;
    let (lx, ly, lz) = light.towards;
    let facing = (nx * lx + ny * ly + nz * lz).max(0.0);

    let upward = 0.62 + 0.38 * nz;
    if surface.shine <= MATT {
        return core::array::from_fn(|i| {
            surface.colour[i] * (light.lamp[i] * facing * lit + light.room[i] * open * upward)
        });
    }

    // The half-way direction between the lamp and the camera straight above.
    let half = 1.0 / (2.0 + 2.0 * lz).sqrt();
    let toward_half = ((nx * lx + ny * ly + nz * (lz + 1.0)) * half).clamp(0.0, 1.0);
    let a = surface.roughness * surface.roughness;
    let spread = toward_half * toward_half * (a * a - 1.0) + 1.0;
    let highlight = (a * a / (core::f32::consts::PI * spread * spread)).min(6.0) * facing * lit * 0.8;

    // What a shiny surface mirrors: a bright window on the lamp's side, a dim room elsewhere.
    let (rx, ry) = (2.0 * nz * nx, 2.0 * nz * ny);
    let flat = 1.0 / length(lx, ly);
    let side = (rx * lx + ry * ly) * flat;
    let across = (ry * lx - rx * ly) * flat;
    let blur = 0.08 + surface.roughness * 0.8;
    let window = smooth(0.3 - blur, 0.3 + blur, side)
        * smooth(0.8 + blur, 0.8 - blur, side)
        * smooth(0.42 + blur, 0.42 - blur, across.abs());
    let mirrored = 0.22 + 0.3 * smooth(-0.9, 0.9, side) + 2.2 * window * (1.0 - 0.7 * surface.roughness);
    let grazing = 1.0 - nz;
    let fresnel = surface.shine
        + (1.0 - surface.shine) * grazing * grazing * grazing * grazing * 0.35 * (1.0 - surface.roughness);

    core::array::from_fn(|i| {
        let colour = surface.colour[i];
        let diffuse = colour * (1.0 - 0.75 * surface.metal);
        let tint = mix(1.0, colour * 1.7, surface.metal);
        let from_lamp = light.lamp[i] * (diffuse * facing * lit + highlight * surface.shine * tint);
        let from_room = light.room[i] * open * (diffuse * upward + fresnel * mirrored * tint * 1.5);
        from_lamp + from_room
    })
}
