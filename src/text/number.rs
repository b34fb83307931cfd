//! Numbers as they are written: decimals, IEC 60062 marks, imaginary numbers, and units.

use crate::diag::did_you_mean;
use crate::quantity::{Conversion, Decimal, Dimension, Unit};
use crate::text::ast::{Expr, ExprKind};
use crate::text::cursor::{Cursor, Read, failure, other};
use crate::text::error::TextError;
use crate::text::lexis::{is_name_char, shortened, spaces, unexpected, word_here};
use crate::text::words::{FUNCTIONS, JOINTS};
use nom::Parser;
use nom::branch::alt;
use nom::bytes::complete::tag;
use nom::character::complete::{digit1, one_of};
use nom::combinator::{opt, recognize};
use nom::sequence::{pair, preceded};

/// Significant digits that are kept: the most that always fit 128 bits.
const MOST_DIGITS: usize = 38;

/// Highest power in a compound unit.
const HIGHEST_POWER: i32 = 99;

/// A number's characters, taken apart.
struct Written<'a> {
    whole: &'a str,
    fraction: Option<&'a str>,
    /// The exponent's characters, with their sign.
    exponent: Option<&'a str>,
}

/// `number`: a decimal with its unit, a marked number, or an imaginary number.
pub fn number(start: Cursor<'_>) -> Read<'_, Expr> {
    if start.rest.starts_with('.') {
        return bare_point(start);
    }
    let (rest, written) = decimal(start)?;
    let after = word_here(rest);
    if after == "j" {
        let (rest, span) = (rest.advance(1), start.span_to(rest.advance(1)));
        let value = kept(&written, 0, start.span_to(rest))?;
        return Ok((rest, Expr { kind: ExprKind::Imaginary(value), span }));
    }
    if written.fraction.is_none()
        && written.exponent.is_none()
        && let Some(mark) = marked(start, rest, written.whole)
    {
        return mark;
    }
    let (rest, unit) = match unit(spaces(rest))? {
        (after, Some(unit)) => (after, Some(unit)),
        (_, None) => (rest, None),
    };
    let span = start.span_to(rest);
    let value = kept(&written, unit.map_or(0, |u| u.power_of_ten), span)?;
    Ok((rest, Expr { kind: ExprKind::Number { value, unit }, span }))
}

/// `decimal`: digits, a point between digits, and an exponent.
fn decimal(start: Cursor<'_>) -> Read<'_, Written<'_>> {
    let fraction = opt(preceded(tag("."), digit1));
    let exponent = preceded(one_of("eE"), recognize(pair(opt(one_of("+-")), digit1)));
    let (rest, (whole, fraction, exponent)) = (digit1, fraction, opt(exponent)).parse(start)?;
    if fraction.is_none() && rest.rest.starts_with('.') && exponent.is_none() {
        let fixed = format!("{}.0", shortened(whole.rest));
        let span = start.span_to(rest.advance(1));
        return Err(failure(TextError::BarePoint { fixed, span }));
    }
    let text = |part: Cursor<'_>| part.rest.len();
    let (from_whole, from_fraction) = (text(whole), fraction.map(text));
    let digits = &start.rest[..from_whole];
    let fraction = from_fraction.map(|length| &start.rest[from_whole + 1..][..length]);
    let exponent = exponent.map(|e| &start.rest[e.at - start.at..][..e.rest.len()]);
    Ok((rest, Written { whole: digits, fraction, exponent }))
}

/// `.5`: refused, with the right spelling.
fn bare_point(start: Cursor<'_>) -> Read<'_, Expr> {
    let digits = start.rest[1..].bytes().take_while(u8::is_ascii_digit).count();
    if digits == 0 {
        return Err(other());
    }
    let fixed = format!("0{}", shortened(&start.rest[..=digits]));
    Err(failure(TextError::BarePoint { fixed, span: start.span(digits + 1) }))
}

/// The exact decimal, if it is within the range of a double with its unit's power of ten.
fn kept(
    written: &Written<'_>,
    unit_power: i32,
    span: crate::source::Span,
) -> Result<Decimal, nom::Err<crate::text::cursor::Fault>> {
    let fraction = written.fraction.unwrap_or("");
    let digits = || written.whole.bytes().chain(fraction.bytes()).skip_while(|&b| b == b'0');
    let significant = digits().count();
    if significant == 0 {
        return Ok(Decimal { mantissa: 0, exponent: 0 });
    }
    if significant > MOST_DIGITS {
        return Err(failure(TextError::TooManyDigits { span }));
    }
    let mantissa = digits().fold(0u128, |sum, b| sum * 10 + u128::from(b - b'0'));
    // Fractions are shorter than a text, which is shorter than 4 GiB; exponents are clamped.
    let exponent = written.exponent.map_or(0, clamped) - fraction.len() as i64;
    let too_large = || failure(TextError::TooLarge { span });
    let too_small = || failure(TextError::TooSmall { span });
    if exponent > 400 {
        return Err(too_large());
    }
    if exponent < -800 {
        return Err(too_small());
    }
    let value = Decimal { mantissa, exponent: exponent as i32 };
    // Far from both ends of the range nothing needs to be computed.
    if (-150..150).contains(&exponent) && unit_power.abs() < 100 {
        return Ok(value);
    }
    for power in [0, unit_power] {
        let size = Decimal { exponent: value.exponent.saturating_add(power), ..value }.to_f64();
        if size.is_infinite() {
            return Err(too_large());
        }
        if size == 0.0 {
            return Err(too_small());
        }
    }
    Ok(value)
}

/// An exponent as a number; beyond what any text can bring back into range it is cut.
fn clamped(exponent: &str) -> i64 {
    const BEYOND: i64 = 1 << 40;
    let (sign, digits) = match exponent.as_bytes() {
        [b'-', ..] => (-1, &exponent[1..]),
        [b'+', ..] => (1, &exponent[1..]),
        _ => (1, exponent),
    };
    let size = digits.bytes().fold(0i64, |sum, b| (sum * 10 + i64::from(b - b'0')).min(BEYOND));
    sign * size
}

/// IEC 60062: a letter in the place of the decimal point (`4k7`). `None` where none stands here.
fn marked<'a>(
    start: Cursor<'a>,
    rest: Cursor<'a>,
    whole: &'a str,
) -> Option<Result<(Cursor<'a>, Expr), nom::Err<crate::text::cursor::Fault>>> {
    let letter = rest.peek().filter(|c| "RkKMGTmunpµμ".contains(*c))?;
    let after_letter = rest.advance(letter.len_utf8());
    let length = after_letter.rest.bytes().take_while(u8::is_ascii_digit).count();
    if length == 0 {
        return None;
    }
    let fraction = &after_letter.rest[..length];
    let rest = after_letter.advance(length);
    // `4k7x` is a mistyped word, told as one.
    let glued = unit_word(rest);
    if !glued.is_empty() && Unit::from_symbol(glued).is_none() {
        return None;
    }
    Some(mark_value(
        start,
        rest,
        letter,
        Written { whole, fraction: Some(fraction), exponent: None },
    ))
}

/// The value of a marked number; a unit after it decides over the letter.
fn mark_value<'a>(
    start: Cursor<'a>,
    rest: Cursor<'a>,
    letter: char,
    written: Written<'a>,
) -> Read<'a, Expr> {
    let text = || shortened(&start.rest[..rest.at - start.at]);
    let span = start.span_to(rest);
    let mut buffer = [0; 4];
    let power = match letter {
        'R' => 0,
        'K' => 3,
        _ => Unit::prefix(letter.encode_utf8(&mut buffer)).unwrap_or(0),
    };
    let (rest, unit) = match unit(spaces(rest))? {
        (after, Some(unit)) => {
            let word = unit_word(spaces(rest));
            let bare = unit.conversion != Conversion::Degrees && is_bare(word);
            if !bare || letter == 'R' && unit.dimension != Dimension::RESISTANCE {
                let span = start.span_to(after);
                let written = shortened(&start.rest[..rest.at - start.at]);
                return Err(failure(TextError::MarkDisagrees { written, span }));
            }
            (after, unit)
        }
        (_, None) => match letter {
            'R' | 'k' | 'K' | 'M' | 'G' | 'T' => (rest, Unit::plain(Dimension::RESISTANCE)),
            'm' => {
                let fraction = shortened(written.fraction.unwrap_or(""));
                let number = format!("{}.{fraction}", shortened(written.whole));
                return Err(failure(TextError::AmbiguousMark { written: text(), number, span }));
            }
            _ => (rest, Unit::plain(Dimension::CAPACITANCE)),
        },
    };
    let unit = Unit { power_of_ten: unit.power_of_ten + power, ..unit };
    let span = start.span_to(rest);
    let value = kept(&written, unit.power_of_ten, span)?;
    Ok((rest, Expr { kind: ExprKind::Number { value, unit: Some(unit) }, span }))
}

/// Whether a unit symbol has no prefix, so that a mark can be its prefix.
fn is_bare(word: &str) -> bool {
    Unit::from_symbol(word).is_some_and(|unit| unit.power_of_ten == 0)
}

/// The characters that could be a unit symbol here.
pub fn unit_word(input: Cursor<'_>) -> &str {
    let end = input.rest.find(|c| !is_name_char(c) && c != '°' && c != '%');
    &input.rest[..end.unwrap_or(input.rest.len())]
}

/// `unit`: a unit symbol and what is glued to it by `*`, `/` and `^`; nothing where no word
/// stands here, or one that goes on with the sentence.
pub fn unit(start: Cursor<'_>) -> Read<'_, Option<Unit>> {
    let word = unit_word(start);
    let starts_like_one = word.starts_with(|c: char| !c.is_numeric() || c == '°');
    if !starts_like_one || JOINTS.contains(&word) {
        return Ok((start, None));
    }
    let Some(first) = Unit::from_symbol(word) else {
        let span = start.span(word.len());
        let suggestion = Unit::likely(word).or_else(|| misspelt(word));
        if word == "j" || word == "f" || FUNCTIONS.contains(&word) {
            let hint = "write `*` to multiply";
            return Err(failure(unexpected(start, "a unit or an operator", hint)));
        }
        return Err(failure(TextError::UnknownUnit { word: shortened(word), suggestion, span }));
    };
    let unfit =
        |end: Cursor<'_>| failure(TextError::UnfitUnit { span: start.span(end.at - start.at) });
    let (mut rest, power) = unit_power(start.advance(word.len()))?;
    let mut unit = power.map_or(Some(first), |p| first.power(p)).ok_or_else(|| unfit(rest))?;
    while let (after, Some((over, factor))) = opt(unit_factor).parse(rest)? {
        let (after, power) = unit_power(after)?;
        let factor = power.map_or(Some(factor), |p| factor.power(p));
        let joined = factor.and_then(|f| if over { unit.over(f) } else { unit.times(f) });
        unit = joined.ok_or_else(|| unfit(after))?;
        rest = after;
    }
    Ok((rest, Some(unit)))
}

/// A unit that an unknown word is a misspelling of; short words are more likely other units.
fn misspelt(word: &str) -> Option<String> {
    const LONG: [&str; 9] = ["ohm", "kohm", "Mohm", "kHz", "MHz", "GHz", "deg", "rad", "var"];
    let found = (3..=12).contains(&word.len()).then(|| did_you_mean(&word.to_lowercase(), LONG));
    found.flatten().map(str::to_owned)
}

/// `unit_factor`: `*` or `/` with a unit symbol glued to it; true for `/`.
fn unit_factor(start: Cursor<'_>) -> Read<'_, (bool, Unit)> {
    let (rest, joint) = alt((tag("*"), tag("/"))).parse(start)?;
    let word = unit_word(rest);
    let unit = Unit::from_symbol(word).ok_or_else(other)?;
    Ok((rest.advance(word.len()), (joint.rest == "/", unit)))
}

/// `unit_power`: `^` with a whole number glued to it.
fn unit_power(start: Cursor<'_>) -> Read<'_, Option<i32>> {
    let sign_and_digits = recognize(pair(opt(tag("-")), digit1));
    let (rest, digits) = opt(preceded(tag("^"), sign_and_digits)).parse(start)?;
    let Some(digits) = digits else {
        return Ok((start, None));
    };
    // `mm^2.5` and `V^2k` are powers of the whole quantity, which the expression grammar reads.
    if rest.rest.starts_with(|c| is_name_char(c) || c == '.') {
        return Ok((start, None));
    }
    match digits.rest.parse::<i32>() {
        Ok(power) if power.abs() <= HIGHEST_POWER => Ok((rest, Some(power))),
        _ => Err(failure(TextError::UnfitUnit { span: start.span_to(rest) })),
    }
}
