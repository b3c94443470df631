//! Notations of numbers and matrices, rewritten in place into those that the readers
//! know. Every character keeps its position; what says nothing becomes [`NOTHING`].

use super::source::{NOTHING, is_blank};

/// Whether a line is of a typeset matrix: `\begin{…}`, or cells between `&` with `\\`
/// at the end.
pub(super) fn is_typeset(line: &[char]) -> bool {
    starts_somewhere(line, "\\begin{") || (line.contains(&'&') && starts_somewhere(line, "\\\\"))
}

/// Takes a line of TeX apart: environments become brackets, `\\` a semicolon, `&` stays,
/// spacing and fonts vanish. What is not known keeps its backslash and is refused later.
pub(super) fn untypeset(line: &mut [char]) {
    let mut at = 0;
    while at < line.len() {
        at += match line[at] {
            '\\' => command(&mut line[at..]),
            '{' if at > 0 && line[at - 1] == '^' => {
                // An exponent.
                line[at..]
                    .iter()
                    .take(12)
                    .position(|&c| c == '}')
                    .map_or(1, |length| length + 1)
            }
            '{' | '}' | '$' => {
                line[at] = NOTHING;
                1
            }
            '~' => {
                line[at] = ' ';
                1
            }
            _ => 1,
        };
    }
}

/// The command at the start of `rest`, rewritten; how many characters are done.
fn command(rest: &mut [char]) -> usize {
    let name: String = rest[1..]
        .iter()
        .take_while(|c| c.is_ascii_alphabetic())
        .take(24)
        .collect();
    let length = name.len() + 1;
    match name.as_str() {
        "" => mark(rest),
        "begin" | "end" => environment(rest, &name),
        "times" | "cdot" | "pm" => {
            blank(&mut rest[..length]);
            rest[0] = match name.as_str() {
                "pm" => '\u{b1}',
                _ => '\u{d7}',
            };
            length
        }
        "left" | "right" | "big" | "Big" | "bigl" | "bigr" | "Bigl" | "Bigr" => {
            let escaped = usize::from(rest.get(length) == Some(&'\\'));
            let end = (length + escaped + 1).min(rest.len());
            blank(&mut rest[..end]);
            end
        }
        "phantom" | "hphantom" | "vphantom" | "label" | "caption" | "text" | "hspace"
        | "vspace" | "renewcommand" | "setlength" => {
            let end = length + group(&rest[length..]);
            blank(&mut rest[..end]);
            end
        }
        "num" | "mathbf" | "mathrm" | "mathsf" | "mathcal" | "bm" | "boldsymbol" | "ensuremath"
        | "quad" | "qquad" | "hfill" | "hline" | "toprule" | "midrule" | "bottomrule"
        | "displaystyle" | "centering" | "small" | "footnotesize" => {
            blank(&mut rest[..length]);
            length
        }
        _ => length,
    }
}

/// `\\`, perhaps with a distance, `\,` and other spaces, the borders of formulas.
fn mark(rest: &mut [char]) -> usize {
    match rest.get(1) {
        Some('\\') => {
            let mut end = 2;
            if rest.get(2) == Some(&'[')
                && let Some(close) = rest.iter().position(|&c| c == ']')
            {
                end = close + 1;
            }
            blank(&mut rest[..end]);
            rest[0] = ';';
            end
        }
        Some(',' | ';' | ':' | ' ' | '[' | ']' | '(' | ')') => {
            rest[0] = ' ';
            rest[1] = ' ';
            2
        }
        Some('!') => {
            blank(&mut rest[..2]);
            2
        }
        _ => 1,
    }
}

/// `\begin{pmatrix}` opens a bracket, `\begin{array}{cccc}` too.
fn environment(rest: &mut [char], name: &str) -> usize {
    let start = name.len() + 1;
    let mut end = start + group(&rest[start..]);
    let environment: String = rest[start..end]
        .iter()
        .filter(|c| c.is_ascii_alphabetic())
        .collect();
    let has_columns = matches!(environment.as_str(), "array" | "tabular");
    let is_matrix = has_columns || environment.ends_with("matrix");
    if has_columns && name == "begin" {
        end += group(&rest[end..]);
    }
    blank(&mut rest[..end]);
    if is_matrix {
        rest[0] = if name == "begin" { '[' } else { ']' };
    }
    end
}

/// The length of `{…}` at the start, zero where there is none.
fn group(rest: &[char]) -> usize {
    let mut depth = 0_usize;
    for (k, &c) in rest.iter().enumerate() {
        match c {
            '{' => depth += 1,
            '}' => depth = depth.saturating_sub(1),
            _ => {}
        }
        if depth == 0 {
            return if k == 0 { 0 } else { k + 1 };
        }
    }
    rest.len()
}

/// Brings what belongs to one number together: `1.3 × 10^-4` is written `1.3e-4`,
/// `0.123 +/- 0.004` as `0.123±0.004`.
pub(super) fn join_numbers(line: &mut [char]) {
    let mut at = 0;
    while at < line.len() {
        let ends_number = line[at].is_ascii_digit()
            || (at > 0 && matches!(line[at], ')' | '.' | ',') && line[at - 1].is_ascii_digit());
        if ends_number {
            let next = skip_blanks(line, at + 1);
            if let Some(end) = plus_minus(line, at + 1, next).or_else(|| power(line, at + 1, next))
            {
                at = end;
                continue;
            }
        }
        at += 1;
    }
    bare_powers(line);
}

fn skip_blanks(line: &[char], from: usize) -> usize {
    from + line[from..].iter().take_while(|&&c| is_blank(c)).count()
}

/// `±` or `+/-` at `at`, with its gaps from `gap` on; where it ends.
fn plus_minus(line: &mut [char], gap: usize, at: usize) -> Option<usize> {
    let length = match line[at..] {
        ['\u{b1}', ..] => 1,
        ['+', '/', '-', ..] => 3,
        _ => return None,
    };
    let end = skip_blanks(line, at + length);
    line.get(end)
        .filter(|c| c.is_ascii_digit() || matches!(c, '.' | ','))?;
    blank(&mut line[gap..end]);
    line[at] = '\u{b1}';
    Some(end)
}

/// `× 10^-4` at `at`, behind a number, with its gaps from `gap` on.
fn power(line: &mut [char], gap: usize, at: usize) -> Option<usize> {
    let times = matches!(
        line.get(at)?,
        '\u{d7}' | '\u{b7}' | '\u{22c5}' | '\u{2219}' | '*' | 'x' | 'X'
    );
    let ten = skip_blanks(line, at + 1);
    let end = exponent(line, ten).filter(|_| times)?;
    blank(&mut line[gap..ten]);
    line[ten] = 'e';
    line[ten + 1] = NOTHING;
    Some(end)
}

/// `10^-5` alone is `1e-5`.
fn bare_powers(line: &mut [char]) {
    for at in 0..line.len() {
        let begins = at == 0
            || !(line[at - 1].is_alphanumeric() || matches!(line[at - 1], '.' | ',' | NOTHING));
        if begins && exponent(line, at).is_some() {
            line[at + 1] = 'e';
        }
    }
}

/// `10^-4`, `10^{-4}`, `10**-4` or `10⁻⁴` at `ten`: makes the exponent plain and says
/// where it ends.
fn exponent(line: &mut [char], ten: usize) -> Option<usize> {
    let rest = line
        .get_mut(ten..)
        .filter(|rest| rest.starts_with(&['1', '0']))?;
    let raised = rest[2..]
        .iter()
        .take_while(|&&c| superscript(c).is_some())
        .count();
    if raised > 0 {
        for c in &mut rest[2..2 + raised] {
            *c = superscript(*c)?;
        }
        return Some(ten + 2 + raised);
    }
    let mark = match rest[2..] {
        ['^', ..] => 1,
        ['*', '*', ..] => 2,
        _ => return None,
    };
    let mut start = 2 + mark;
    let open = match rest.get(start)? {
        '{' => Some('}'),
        '(' => Some(')'),
        _ => None,
    };
    start += usize::from(open.is_some());
    let sign = usize::from(matches!(rest.get(start)?, '-' | '+'));
    let digits = rest[start + sign..]
        .iter()
        .take_while(|c| c.is_ascii_digit())
        .count();
    let mut end = start + sign + digits;
    if digits == 0 || open.is_some() && rest.get(end).copied() != open {
        return None;
    }
    if open.is_some() {
        rest[end] = NOTHING;
        end += 1;
    }
    blank(&mut rest[2..start]);
    Some(ten + end)
}

fn superscript(c: char) -> Option<char> {
    Some(match c {
        '\u{2070}' => '0',
        '\u{b9}' => '1',
        '\u{b2}' => '2',
        '\u{b3}' => '3',
        '\u{2074}'..='\u{2079}' => char::from_digit(c as u32 - 0x2070, 10)?,
        '\u{207a}' => '+',
        '\u{207b}' => '-',
        _ => return None,
    })
}

/// `Columns 1 through 4`, `Column 5`, with or without a colon: first and last.
pub(super) fn columns_heading(line: &[char]) -> Option<(usize, usize)> {
    let start = line.iter().position(|&c| !is_blank(c))?;
    if !matches!(line[start], 'C' | 'c') || line.len() > start + 200 {
        return None;
    }
    let text: String = line[start..]
        .iter()
        .collect::<String>()
        .to_ascii_lowercase();
    let mut words = text.trim_end_matches([' ', ':', '\0']).split_whitespace();
    let number = |word: Option<&str>| {
        word?
            .parse()
            .ok()
            .filter(|&n: &usize| (1..=64).contains(&n))
    };
    let several = match words.next()? {
        "columns" => true,
        "column" => false,
        _ => return None,
    };
    let first = number(words.next())?;
    let last = match words.next() {
        Some("through" | "to" | "and" | "-") if several => number(words.next())?,
        None => first,
        _ => return None,
    };
    (words.next().is_none() && first <= last).then_some((first, last))
}

/// `1.0e-03 *` alone in a line: the power of ten.
pub(super) fn common_factor(line: &[char]) -> Option<i32> {
    let text: String = line.iter().filter(|&&c| !is_blank(c)).take(24).collect();
    let (mantissa, exponent) = text.strip_suffix('*')?.split_once(['e', 'E'])?;
    let one = mantissa.strip_prefix('1')?;
    let exact = one.is_empty() || one.strip_prefix('.')?.bytes().all(|byte| byte == b'0');
    exponent.parse().ok().filter(|_| exact)
}

fn blank(characters: &mut [char]) {
    characters.fill(NOTHING);
}

fn starts_somewhere(line: &[char], what: &str) -> bool {
    let what: Vec<char> = what.chars().collect();
    line.windows(what.len()).any(|window| window == what)
}
