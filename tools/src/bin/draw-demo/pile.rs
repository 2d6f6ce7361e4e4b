//! The scenario: which things lie in the pile, and what the house calls them.

use super::{
    dice::Dice,
    material::{Family, Material},
    noise::Noise,
    scene,
    solid::Solid,
    stray::{Kind, Stray},
    tally::{Mark, Tally},
};

/// The pile's title.
pub const TITLE: &str = "The tallies of Ostrel Quay";

/// What the pile is, for someone who sees it for the first time.
pub const ABOUT: &str = "Tally tokens from the mud under an invented harbour toll-house, photographed on whatever lay \
on the bench: clay, glaze, bone, stone, wood and bronze, worn, chipped and snapped. The dig's house manual sorts them \
by the mark on their face and never by colour or material, and a few other things from the same mud lie among them.";

/// The categories of the house manual: name, mark, how many.
pub const TRAYS: [(&str, Mark, usize); 8] = [
    ("Daystar", Mark::Daystar, 43),
    ("Snail", Mark::Snail, 37),
    ("Tideline", Mark::Tideline, 33),
    ("Fishbone", Mark::Fishbone, 30),
    ("Hailstones", Mark::Hailstones, 27),
    ("Ladder", Mark::Ladder, 25),
    ("Netting", Mark::Netting, 23),
    ("Two Moons", Mark::TwoMoons, 22),
];

/// The things that belong nowhere: kind, how many.
pub const STRAYS: [(Kind, usize); 8] = [
    (Kind::Pebble, 3),
    (Kind::Nail, 3),
    (Kind::Shell, 3),
    (Kind::Key, 2),
    (Kind::Ring, 2),
    (Kind::Sherd, 3),
    (Kind::Button, 2),
    (Kind::Twig, 2),
];

/// A thing in the pile, before it is drawn.
#[derive(Clone, Copy)]
pub enum Find {
    /// A tally: an index into [`TRAYS`].
    Tally(usize),
    /// A stray.
    Stray(Kind),
}

impl Find {
    /// The name of the tray it belongs in; none for a stray.
    pub fn tray(self) -> Option<&'static str> {
        match self {
            Self::Tally(tray) => Some(TRAYS[tray].0),
            Self::Stray(_) => None,
        }
    }

    /// Draws it: red, green and blue, row by row, [`scene::SIDE`] pixels a side.
    pub fn draw(self, noise: &Noise, dice: &mut Dice) -> Vec<u8> {
        let (thing, family): (Box<dyn Solid>, Family) = match self {
            Self::Tally(tray) => {
                let families = [
                    Family::Clay,
                    Family::Clay,
                    Family::Glaze,
                    Family::Glaze,
                    Family::Bone,
                    Family::Stone,
                    Family::Bronze,
                    Family::Wood,
                ];
                let family = dice.pick(&families);
                (Box::new(Tally::new(TRAYS[tray].1, dice)), family)
            }
            Self::Stray(kind) => {
                let family = match kind {
                    Kind::Pebble => Family::Stone,
                    Kind::Nail | Kind::Key => Family::Iron,
                    Kind::Shell => Family::Bone,
                    Kind::Ring => dice.pick(&[Family::Bronze, Family::Iron]),
                    Kind::Sherd => Family::Clay,
                    Kind::Button => dice.pick(&[Family::Bone, Family::Wood, Family::Bronze]),
                    Kind::Twig => Family::Wood,
                };
                (Box::new(Stray::new(kind, dice)), family)
            }
        };
        let material = Material::new(family, dice);
        scene::draw(noise, dice, thing.as_ref(), &material, matches!(self, Self::Tally(_)))
    }
}

/// The whole pile in the order it lies, shuffled so that an item's number says nothing about it.
pub fn finds(seed: u64) -> Vec<Find> {
    let tallies = (0..TRAYS.len()).flat_map(|tray| core::iter::repeat_n(Find::Tally(tray), TRAYS[tray].2));
    let strays = STRAYS.iter().flat_map(|&(kind, count)| core::iter::repeat_n(Find::Stray(kind), count));
    let mut finds: Vec<Find> = tallies.chain(strays).collect();
    Dice::new(seed, 0).shuffle(&mut finds);
    finds
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_same_seed_draws_the_same_bytes_and_another_does_not() {
        let draw = |seed: u64| {
            let find = finds(seed)[0];
            find.draw(&Noise::new(seed), &mut Dice::new(seed, 1))
        };
        let first = draw(5);
        assert_eq!(first.len(), scene::SIDE * scene::SIDE * 3);
        assert!(first == draw(5));
        assert!(first != draw(6));
    }

    #[test]
    fn every_tray_and_some_strays_lie_in_the_pile_in_no_order() {
        let finds = finds(9);
        let trays: Vec<_> = finds.iter().map(|find| find.tray()).collect();
        for (name, _, count) in TRAYS {
            assert_eq!(trays.iter().filter(|&&tray| tray == Some(name)).count(), count);
        }
        let strays = STRAYS.iter().map(|&(_, count)| count).sum::<usize>();
        assert_eq!(trays.iter().filter(|tray| tray.is_none()).count(), strays);
        // Shuffled, neighbours share a tray about one time in nine; laid out by tray nearly always.
        let alike = trays.windows(2).filter(|pair| pair[0] == pair[1]).count();
        assert!(alike * 4 < trays.len(), "{alike} neighbours of {} share a tray", trays.len());
    }
}
