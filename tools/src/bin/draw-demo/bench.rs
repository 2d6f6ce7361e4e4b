//! What things lie on, and what lies beside them: cloth, paper, board, foam; a scale bar, a paper tag. All of it varies
//! independently of the category.

use core::f32::consts::TAU;

use super::{
    dice::Dice,
    math::{Colour, angle, blend, mix, ridge, smooth, times, to_box, to_segment, turn},
    noise::Noise,
};

#[derive(Clone, Copy)]
enum Cover {
    /// Woven cloth, threads for each picture unit.
    Cloth(f32),
    Felt,
    Paper,
    /// Paper with printed squares, squares for each picture unit.
    Squared(f32),
    Board,
    Foam,
}

/// A bench and what lies on it beside the thing.
pub struct Bench {
    cover: Cover,
    colour: Colour,
    second: Colour,
    turn: (f32, f32),
    shift: (f32, f32),
    crumbs: f32,
    props: Vec<Prop>,
}

impl Bench {
    /// A bench, everything left to chance.
    pub fn new(dice: &mut Dice) -> Self {
        let linen = [[0.5, 0.43, 0.33], [0.36, 0.35, 0.33], [0.1, 0.13, 0.2], [0.22, 0.24, 0.17], [0.6, 0.57, 0.5]];
        let felt =
            [[0.035, 0.075, 0.055], [0.06, 0.06, 0.065], [0.14, 0.035, 0.045], [0.05, 0.07, 0.13], [0.33, 0.31, 0.28]];
        let paper = [[0.68, 0.65, 0.58], [0.42, 0.3, 0.18], [0.33, 0.34, 0.34], [0.5, 0.52, 0.5], [0.62, 0.54, 0.4]];
        let board = [[0.36, 0.22, 0.11], [0.14, 0.08, 0.045], [0.48, 0.38, 0.26], [0.25, 0.18, 0.13]];
        let foam = [[0.04, 0.042, 0.045], [0.16, 0.17, 0.185], [0.45, 0.5, 0.55]];
        let (cover, colour) = match dice.below(10) {
            0..3 => (Cover::Cloth(dice.range(20.0, 30.0)), dice.pick(&linen)),
            3..5 => (Cover::Felt, dice.pick(&felt)),
            5..6 => (Cover::Paper, dice.pick(&paper)),
            6..7 => (Cover::Squared(dice.range(5.0, 8.0)), dice.pick(&[paper[0], paper[3], paper[4]])),
            7..9 => (Cover::Board, dice.pick(&board)),
            _ => (Cover::Foam, dice.pick(&foam)),
        };
        let jitter = |dice: &mut Dice| dice.range(0.86, 1.14);
        let colour = [colour[0] * jitter(dice), colour[1] * jitter(dice), colour[2] * jitter(dice)];
        let mut props = Vec::new();
        if dice.chance(0.24) {
            props.push(Prop::scale_bar(dice));
        }
        if dice.chance(0.2) {
            props.push(Prop::tag(dice));
        }
        Self {
            cover,
            colour,
            second: times(colour, dice.range(0.55, 0.8)),
            turn: angle(dice.range(0.0, TAU)),
            shift: (dice.range(0.0, 9.0), dice.range(0.0, 9.0)),
            crumbs: if dice.chance(0.4) { dice.range(0.3, 1.0) } else { 0.0 },
            props,
        }
    }

    /// Height and colour at (x, y) of the picture, which spans −1 … 1.
    pub fn at(&self, noise: &Noise, x: f32, y: f32) -> (f32, Colour) {
        for prop in &self.props {
            if let Some(found) = prop.at(noise, x, y) {
                return found;
            }
        }
        let (u, v) = turn(x, y, self.turn);
        let (u, v) = (u + self.shift.0, v + self.shift.1);
        let cloud = noise.cloud.at(u * 0.13, v * 0.13);
        let (height, colour) = match self.cover {
            Cover::Cloth(threads) => {
                let slack = 0.012 * cloud;
                let (a, b) = ((u + slack) * threads, (v - slack) * threads);
                let thread = noise.fine.at(a.floor() * 0.137, v * 0.09) + noise.fine.at(u * 0.09, b.floor() * 0.171);
                let over = (a.floor() as i32 + b.floor() as i32) & 1 == 0;
                let (across, along) = if over { (a, b) } else { (b, a) };
                let round = ridge(across - across.floor() - 0.5, 0.56);
                let bulge = ridge(along - along.floor() - 0.5, 0.8);
                let h = round * bulge;
                let tone = if over { self.colour } else { blend(self.colour, self.second, 0.2) };
                (0.006 * h + 0.02 * cloud, times(tone, (0.68 + 0.36 * h) * (1.0 + 0.16 * thread)))
            }
            Cover::Felt => {
                let fibre = noise.fine.at(u * 0.35, v * 0.2) + noise.fine.at(v * 0.3, u * 0.41);
                (0.004 * fibre + 0.01 * cloud, times(self.colour, 1.0 + 0.16 * fibre + 0.1 * cloud))
            }
            Cover::Paper | Cover::Squared(_) => {
                let fibre = noise.fine.at(u * 0.2, v * 0.2);
                let mut colour = times(self.colour, 1.0 + 0.03 * fibre + 0.035 * cloud);
                if let Cover::Squared(squares) = self.cover {
                    let line = |w: f32| {
                        let w = w * squares;
                        ((w - w.floor() - 0.5).abs() - 0.5) / squares
                    };
                    let ink = ridge(line(u), 0.009).max(ridge(line(v), 0.009));
                    colour = blend(colour, [0.25, 0.36, 0.42], 0.5 * ink);
                }
                (0.0012 * fibre, colour)
            }
            Cover::Board => {
                let bend = 0.1 * noise.cloud.at(u * 0.05, v * 0.11);
                let grain = noise.fine.at(u * 0.025, (v + bend) * 0.28);
                let rings = libm::sinf((v + bend * 2.4) * 21.0 + 1.5 * cloud);
                let pore = smooth(0.35, 0.8, noise.fine.at(u * 0.03 + 0.5, v * 0.7));
                let colour = blend(self.colour, self.second, (0.35 + 0.25 * rings + 0.4 * grain).clamp(0.0, 1.0));
                (0.002 * grain - 0.004 * pore, times(colour, 1.0 - 0.35 * pore))
            }
            Cover::Foam => {
                let pit = smooth(0.16, 0.0, noise.cells.at(u * 1.3, v * 1.3));
                let fibre = noise.fine.at(u * 0.5, v * 0.5);
                (0.004 * fibre - 0.0035 * pit, times(self.colour, 1.0 + 0.12 * fibre - 0.15 * pit))
            }
        };
        if self.crumbs > 0.0 {
            let crumb = smooth(0.93, 1.02, noise.fine.at(v * 0.27 + 0.3, u * 0.27) + 0.35 * cloud * self.crumbs);
            return (height + 0.012 * crumb, blend(colour, [0.17, 0.12, 0.075], crumb));
        }
        (height, colour)
    }
}

/// Something flat beside the thing.
struct Prop {
    centre: (f32, f32),
    turn: (f32, f32),
    half: (f32, f32),
    kind: PropKind,
}

enum PropKind {
    ScaleBar { blocks: f32, flip: bool },
    Tag { paper: Colour, ink: Colour, strokes: Vec<Stroke> },
}

type Stroke = ((f32, f32), (f32, f32));

impl Prop {
    fn scale_bar(dice: &mut Dice) -> Self {
        let (edge, along) = (dice.range(0.84, 0.93), dice.range(-0.4, 0.4));
        let upright = dice.chance(0.3);
        let centre = match (upright, dice.chance(0.8)) {
            (true, right) => (if right { edge } else { -edge }, along),
            (false, below) => (along, if below { edge } else { -edge }),
        };
        let tilt = dice.range(-0.06, 0.06) + if upright { TAU / 4.0 } else { 0.0 };
        let kind = PropKind::ScaleBar { blocks: dice.whole(4, 6) as f32, flip: dice.chance(0.5) };
        Self { centre, turn: angle(tilt), half: (dice.range(0.4, 0.6), 0.05), kind }
    }

    fn tag(dice: &mut Dice) -> Self {
        let side = |dice: &mut Dice| if dice.chance(0.5) { 1.0 } else { -1.0 };
        let centre = (side(dice) * dice.range(0.66, 0.86), side(dice) * dice.range(0.74, 0.9));
        let paper = dice.pick(&[[0.72, 0.69, 0.6], [0.66, 0.56, 0.36], [0.74, 0.74, 0.72]]);
        let ink = dice.pick(&[[0.03, 0.04, 0.1], [0.05, 0.045, 0.045], [0.16, 0.16, 0.17]]);
        let digits = dice.whole(2, 3);
        let mut strokes = Vec::new();
        for place in 0..digits {
            let shape = DIGITS[dice.below(10) as usize];
            let left = 0.13 * (place as f32 - 0.5 * digits as f32) + 0.02;
            let drop = dice.range(-0.012, 0.012);
            let mut shaky = |(x, y): (i8, i8)| {
                (
                    left + 0.04 * f32::from(x) + dice.range(-0.008, 0.008),
                    drop + 0.042 * (f32::from(y) - 2.0) + dice.range(-0.008, 0.008),
                )
            };
            let points: Vec<_> = shape.iter().map(|&p| shaky(p)).collect();
            strokes.extend(points.windows(2).map(|pair| (pair[0], pair[1])));
        }
        let kind = PropKind::Tag { paper, ink, strokes };
        Self { centre, turn: angle(dice.range(-0.25, 0.25)), half: (0.25, 0.135), kind }
    }

    fn at(&self, noise: &Noise, x: f32, y: f32) -> Option<(f32, Colour)> {
        let (u, v) = turn(x - self.centre.0, y - self.centre.1, self.turn);
        if to_box(u, v, self.half, 0.012) > 0.0 {
            return None;
        }
        let fibre = noise.fine.at(u * 0.3, v * 0.3);
        Some(match &self.kind {
            PropKind::ScaleBar { blocks, flip } => {
                let block = ((u / self.half.0 * 0.48 + 0.5) * blocks).floor() as i32;
                let margin = u.abs() > self.half.0 * 0.96 || v.abs() > self.half.1 - 0.012;
                let dark = !margin && ((block & 1 == 0) != ((v > 0.0) == *flip));
                (0.012, times([0.72, 0.72, 0.7], if dark { 0.04 } else { 1.0 + 0.02 * fibre }))
            }
            PropKind::Tag { paper, ink, strokes } => {
                let nearest = strokes.iter().map(|&(a, b)| to_segment(u, v, a, b)).fold(1.0, f32::min);
                let line = smooth(0.012, 0.006, nearest + 0.002 * fibre);
                let worn = mix(0.75, 1.0, smooth(-0.5, 0.3, fibre));
                (0.014, blend(times(*paper, 1.0 + 0.04 * fibre), *ink, line * worn))
            }
        })
    }
}

/// The digits as a hand writes them: points on a grid 3 wide and 5 high.
const DIGITS: [&[(i8, i8)]; 10] = [
    &[(1, 0), (0, 1), (0, 3), (1, 4), (2, 3), (2, 1), (1, 0)],
    &[(0, 1), (1, 0), (1, 4)],
    &[(0, 1), (1, 0), (2, 1), (0, 4), (2, 4)],
    &[(0, 0), (2, 0), (1, 2), (2, 3), (1, 4), (0, 4)],
    &[(1, 0), (0, 3), (2, 3), (2, 1), (2, 4)],
    &[(2, 0), (0, 0), (0, 2), (2, 2), (2, 4), (0, 4)],
    &[(2, 0), (0, 2), (0, 4), (2, 4), (2, 2), (0, 2)],
    &[(0, 0), (2, 0), (1, 4)],
    &[(1, 2), (0, 1), (1, 0), (2, 1), (1, 2), (0, 3), (1, 4), (2, 3), (1, 2)],
    &[(2, 1), (1, 0), (0, 1), (1, 2), (2, 1), (2, 4)],
];
