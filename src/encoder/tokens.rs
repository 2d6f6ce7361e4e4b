//! Text in, rows of the encoder's token table out: the tokenizer that the text encoder was trained with.
//!
//! WordPiece (Schuster & Nakajima 2012) as BERT uses it (Devlin et al. 2019), lower-cased and without accents. The rules and
//! their order are those of the `tokenizers` library's `BertNormalizer`, `BertPreTokenizer` and `WordPiece`, which
//! `pkg-scripts/reference/check_text.py` compares with.

use std::collections::HashMap;

use unicode_categories::UnicodeCategories;
use unicode_normalization::UnicodeNormalization;

use super::EncoderError;

const UNKNOWN: &str = "[UNK]";
const START: &str = "[CLS]";
const END: &str = "[SEP]";
/// Written out in a text they stand for the token, as in the reference.
const SPECIAL: [&str; 5] = ["[PAD]", UNKNOWN, START, END, "[MASK]"];
/// What every piece but a word's first begins with in the vocabulary.
const CONTINUED: &str = "##";
/// A word of more letters is not looked up.
const LONGEST_WORD: usize = 100;

/// Cuts texts into tokens.
pub(super) struct Tokenizer {
    /// Row of each piece that begins a word.
    first: HashMap<Box<str>, i32>,
    /// Row of each piece that goes on, without the mark.
    continued: HashMap<Box<str>, i32>,
    /// For each row, whether it goes on with a word.
    continuing: Vec<bool>,
    special: [i32; SPECIAL.len()],
    /// Letters of the longest piece.
    longest: usize,
}

impl Tokenizer {
    /// From the tokens in order of their rows, one a line.
    pub(super) fn new(vocabulary: &str) -> Result<Self, EncoderError> {
        let mut first = HashMap::new();
        let mut continued = HashMap::new();
        let mut continuing = Vec::new();
        let mut longest = 0;
        for (row, token) in (0..).zip(vocabulary.split('\n')) {
            let (piece, pieces) = match token.strip_prefix(CONTINUED) {
                Some(piece) if !piece.is_empty() => (piece, &mut continued),
                _ => (token, &mut first),
            };
            continuing.push(piece.len() < token.len());
            longest = longest.max(piece.chars().count());
            pieces.insert(piece.into(), row);
        }
        let mut special = [0; SPECIAL.len()];
        for (row, token) in special.iter_mut().zip(SPECIAL) {
            *row = *first
                .get(token)
                .ok_or_else(|| EncoderError::EncoderFile(format!("its vocabulary has no token {token}")))?;
        }
        Ok(Self { first, continued, continuing, special, longest })
    }

    /// The text's tokens, without one that marks its start or end.
    pub(super) fn tokens(&self, text: &str) -> Vec<i32> {
        let mut tokens = Vec::new();
        let mut rest = text;
        // Only a bracket can begin a special token.
        let mut from = 0;
        while let Some(bracket) = rest[from..].find('[').map(|found| from + found) {
            match SPECIAL.iter().position(|token| rest[bracket..].starts_with(token)) {
                Some(found) => {
                    self.plain_tokens(&rest[..bracket], &mut tokens);
                    tokens.push(self.special[found]);
                    rest = &rest[bracket + SPECIAL[found].len()..];
                    from = 0;
                }
                None => from = bracket + 1,
            }
        }
        self.plain_tokens(rest, &mut tokens);
        tokens
    }

    /// The tokens with those that mark a text's start and end around them.
    pub(super) fn framed(&self, tokens: &[i32]) -> Vec<i32> {
        let [_, _, start, end, _] = self.special;
        [&[start], tokens, &[end]].concat()
    }

    /// Whether the token goes on with the word of the one before.
    pub(super) fn continues(&self, token: i32) -> bool {
        self.continuing.get(token as usize).copied().unwrap_or(false)
    }

    fn plain_tokens(&self, text: &str, tokens: &mut Vec<i32>) {
        let text = normalised(text);
        for word in text.split_whitespace() {
            let mut start = 0;
            for (at, mark) in word.char_indices().filter(|&(_, c)| is_mark(c)) {
                self.word(&word[start..at], tokens);
                start = at + mark.len_utf8();
                self.word(&word[at..start], tokens);
            }
            self.word(&word[start..], tokens);
        }
    }

    /// Longest piece first, from left to right; a word with a rest that no piece fits is unknown as a whole.
    fn word(&self, word: &str, tokens: &mut Vec<i32>) {
        if word.is_empty() {
            return;
        }
        let before = tokens.len();
        let [_, unknown, ..] = self.special;
        let ends: Vec<usize> = word.char_indices().map(|(at, c)| at + c.len_utf8()).collect();
        if ends.len() > LONGEST_WORD {
            tokens.push(unknown);
            return;
        }
        let mut done = 0;
        while done < ends.len() {
            let start = if done == 0 { 0 } else { ends[done - 1] };
            let pieces = if done == 0 { &self.first } else { &self.continued };
            let most = ends.len().min(done + self.longest);
            let found = (done..most).rev().find_map(|last| Some((last, *pieces.get(&word[start..ends[last]])?)));
            let Some((last, row)) = found else {
                tokens.truncate(before);
                tokens.push(unknown);
                return;
            };
            tokens.push(row);
            done = last + 1;
        }
    }
}

/// Without control characters and accents, in lower case, every kind of space a plain one, and each Chinese, Japanese or
/// Korean ideograph a word of its own.
fn normalised(text: &str) -> String {
    let mut spaced = String::with_capacity(text.len());
    for c in text.chars() {
        if matches!(c, '\0' | '\u{fffd}') || is_control(c) {
            continue;
        }
        if c.is_whitespace() {
            spaced.push(' ');
        } else if is_ideograph(c) {
            spaced.extend([' ', c, ' ']);
        } else {
            spaced.push(c);
        }
    }
    spaced.nfd().filter(|&c| !c.is_mark_nonspacing()).flat_map(char::to_lowercase).collect()
}

fn is_control(c: char) -> bool {
    !matches!(c, '\t' | '\n' | '\r') && c.is_other()
}

fn is_mark(c: char) -> bool {
    c.is_ascii_punctuation() || c.is_punctuation()
}

/// The ranges of the reference, with its gap between 2B81F and 2B920.
fn is_ideograph(c: char) -> bool {
    matches!(
        u32::from(c),
        0x3400..=0x4dbf | 0x4e00..=0x9fff | 0xf900..=0xfaff | 0x20000..=0x2a6df | 0x2a700..=0x2b81f | 0x2b920..=0x2ceaf
            | 0x2f800..=0x2fa1f
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    fn tokenizer() -> Tokenizer {
        Tokenizer::new("[PAD]\n[UNK]\n[CLS]\n[SEP]\n[MASK]\n!\n##s\nno\n##te\n##tes\nnob\ncafe\n水").unwrap()
    }

    #[test]
    fn the_longest_piece_comes_first_and_a_rest_makes_the_word_unknown() {
        let tokenizer = tokenizer();
        assert_eq!(tokenizer.tokens("notes! nobs note notx"), [7, 9, 5, 10, 6, 7, 8, 1]);
        assert_eq!(tokenizer.tokens("Cafés 水水 no\u{200b}b"), [11, 6, 12, 12, 10]);
    }

    #[test]
    fn a_word_longer_than_the_limit_is_unknown() {
        let tokenizer = tokenizer();
        let word = |letters: usize| format!("no{}", "s".repeat(letters - 2));
        assert_eq!(tokenizer.tokens(&word(LONGEST_WORD)).len(), LONGEST_WORD - 1);
        assert_eq!(tokenizer.tokens(&word(LONGEST_WORD + 1)), [1]);
    }

    #[test]
    fn special_tokens_written_out_are_taken_for_themselves() {
        let tokenizer = tokenizer();
        assert_eq!(tokenizer.tokens("no[MASK]note"), [7, 4, 7, 8]);
        assert_eq!(tokenizer.tokens("[["), [1, 1]);
    }

    #[test]
    fn a_vocabulary_without_a_special_token_is_refused() {
        let error = Tokenizer::new("[PAD]\n[UNK]\n[CLS]\nno").map(|_| ()).unwrap_err();
        assert_eq!(error.code(), "encoder-file");
    }
}
