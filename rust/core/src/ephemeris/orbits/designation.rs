//! Packed designations of minor planets and comets, as the Minor Planet Center writes them in fixed columns.
//!
//! Rules from the Minor Planet Center's page *Packed Provisional and Permanent Designations* [from memory].

/// The value of a character in base 62: digits, capitals, small letters.
fn digit(c: u8) -> Option<u32> {
    match c {
        b'0'..=b'9' => Some(u32::from(c - b'0')),
        b'A'..=b'Z' => Some(u32::from(c - b'A') + 10),
        b'a'..=b'z' => Some(u32::from(c - b'a') + 36),
        _ => None,
    }
}

fn base62(digits: &[u8]) -> Option<u32> {
    digits.iter().try_fold(0, |sum, &c| Some(sum * 62 + digit(c)?))
}

fn decimal(digits: &[u8]) -> Option<u32> {
    digits.iter().try_fold(0, |sum, &c| c.is_ascii_digit().then(|| sum * 10 + u32::from(c - b'0')))
}

/// The letters that count half-months or places in one: I is left out.
fn half_month(c: u8) -> Option<char> {
    (c.is_ascii_uppercase() && c != b'I').then_some(c as char)
}

/// Year from a century letter (I is 18) and two digits.
fn year(packed: &[u8]) -> Option<u32> {
    let century = match packed[0] {
        c @ b'I'..=b'K' => u32::from(c - b'I') + 18,
        _ => return None,
    };
    Some(century * 100 + decimal(&packed[1..3])?)
}

/// A minor planet's designation from its packed form of five (a number) or seven characters (a provisional one, or one of
/// the Palomar–Leiden surveys); `None` if it is not one.
///
/// `00433` is `433`, `A0345` is `100345`, `~000z` is `620061`, `J95X01L` is `1995 XL1`, `K07Tf8A` is `2007 TA418`,
/// `_QC000P` is `2026 CA621`, `PLS2040` is `2040 P-L`, `T1S3138` is `3138 T-1`.
pub fn minor_planet(packed: &str) -> Option<String> {
    let c = packed.trim().as_bytes();
    match c.len() {
        5 if c[0] == b'~' => Some((620_000 + base62(&c[1..])?).to_string()),
        5 => Some((digit(c[0])? * 10_000 + decimal(&c[1..])?).to_string()),
        7 => match &c[..3] {
            b"PLS" => Some(format!("{} P-L", decimal(&c[3..])?)),
            [b'T', n @ b'1'..=b'3', b'S'] => Some(format!("{} T-{}", decimal(&c[3..])?, *n as char)),
            [b'_', ..] => {
                let year = 2000 + digit(c[1])?;
                let half = half_month(c[2])?;
                let order = base62(&c[3..])?;
                // 25 letters a cycle: A to Z without I.
                let letter = b"ABCDEFGHJKLMNOPQRSTUVWXYZ"[(order % 25) as usize] as char;
                Some(format!("{year} {half}{letter}{}", 620 + order / 25))
            }
            _ => {
                let (year, half, letter) = (year(&c[..3])?, half_month(c[3])?, half_month(c[6])?);
                let cycle = digit(c[4])? * 10 + decimal(&c[5..6])?;
                let cycle = if cycle == 0 { String::new() } else { cycle.to_string() };
                Some(format!("{year} {half}{letter}{cycle}"))
            }
        },
        _ => None,
    }
}

/// A comet's designation from the twelve columns of number (4), kind (1) and provisional designation (7); `None` if they
/// hold none.
///
/// `0001P` is `1P`, `0073P      b` is `73P-B`, `    CJ95O010` is `C/1995 O1`, `    PJ94P01b` is `P/1994 P1-B`,
/// `    PK15TK0P` is `P/2015 TP200`.
pub fn comet(packed: &str) -> Option<String> {
    let c = packed.as_bytes();
    let kind = *c.get(4)?;
    if !b"CPDXIA".contains(&kind) {
        return None;
    }
    let kind = kind as char;
    let number = packed.get(..4)?.trim();
    let rest = packed.get(5..)?.trim();
    if !number.is_empty() {
        let number = decimal(number.as_bytes())?;
        let fragment =
            if rest.len() <= 2 { rest } else { rest.get(6..).filter(|last| *last != "0").unwrap_or("") };
        if !fragment.bytes().all(|c| c.is_ascii_lowercase()) || number == 0 {
            return None;
        }
        let dash = if fragment.is_empty() { "" } else { "-" };
        return Some(format!("{number}{kind}{dash}{}", fragment.to_ascii_uppercase()));
    }
    let c = rest.as_bytes();
    if c.len() != 7 {
        return None;
    }
    if half_month(c[6]).is_some() {
        return Some(format!("{kind}/{}", minor_planet(rest)?));
    }
    let (year, half) = (year(&c[..3])?, half_month(c[3])?);
    let order = digit(c[4])? * 10 + decimal(&c[5..6])?;
    let fragment = match c[6] {
        b'0' => String::new(),
        c @ b'a'..=b'z' => format!("-{}", c.to_ascii_uppercase() as char),
        _ => return None,
    };
    Some(format!("{kind}/{year} {half}{order}{fragment}"))
}

/// Year, month and day from a packed date of five characters: `K134I` is 2013 April 18. `None` if it is not one; whether
/// the day exists is the calendar's affair.
pub fn date(packed: &str) -> Option<(i32, u32, u32)> {
    let c = packed.as_bytes();
    if c.len() != 5 {
        return None;
    }
    // Months to C, days to V.
    let (month, day) = (digit(c[3])?, digit(c[4])?);
    let real = (1..=12).contains(&month) && (1..=31).contains(&day);
    real.then_some((year(&c[..3])? as i32, month, day))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Examples of the Minor Planet Center's page [M].
    #[test]
    fn published_minor_planets() {
        for (packed, name) in [
            ("00433", "433"),
            ("03202", "3202"),
            ("A0345", "100345"),
            ("a0017", "360017"),
            ("K3289", "203289"),
            ("~0000", "620000"),
            ("~000z", "620061"),
            ("~AZaz", "3140113"),
            ("~zzzz", "15396335"),
            ("J95X00A", "1995 XA"),
            ("J95X01L", "1995 XL1"),
            ("J95F13B", "1995 FB13"),
            ("J98SA8Q", "1998 SQ108"),
            ("J98SC7V", "1998 SV127"),
            ("J98SG2S", "1998 SS162"),
            ("K99AJ3Z", "2099 AZ193"),
            ("K08Aa0A", "2008 AA360"),
            ("K07Tf8A", "2007 TA418"),
            ("PLS2040", "2040 P-L"),
            ("T1S3138", "3138 T-1"),
            ("T2S1010", "1010 T-2"),
            ("T3S4101", "4101 T-3"),
            ("_QC0000", "2026 CA620"),
            ("_QC000O", "2026 CZ620"),
            ("_QC000P", "2026 CA621"),
            (" 00001 ", "1"),
        ] {
            assert_eq!(minor_planet(packed).as_deref(), Some(name), "{packed}");
        }
    }

    #[test]
    fn published_comets_and_dates() {
        for (packed, name) in [
            ("0001P       ", "1P"),
            ("0073P      b", "73P-B"),
            ("0073P     bt", "73P-BT"),
            ("0003D       ", "3D"),
            ("    CJ95O010", "C/1995 O1"),
            ("    PJ94P01b", "P/1994 P1-B"),
            ("    CJ94P010", "C/1994 P1"),
            ("    CK48X130", "C/2048 X13"),
            ("    PK15TK0P", "P/2015 TP200"),
            ("    IK19Q040", "I/2019 Q4"),
            ("0002I       ", "2I"),
        ] {
            assert_eq!(comet(packed).as_deref(), Some(name), "{packed}");
        }
        for (packed, civil) in [
            ("J9611", (1996, 1, 1)),
            ("J961A", (1996, 1, 10)),
            ("J969U", (1996, 9, 30)),
            ("J96A1", (1996, 10, 1)),
            ("K01AM", (2001, 10, 22)),
            ("K134I", (2013, 4, 18)),
        ] {
            assert_eq!(date(packed), Some(civil), "{packed}");
        }
    }

    #[test]
    fn what_is_none_is_none() {
        for wrong in [
            "", "433", "0043é", "0043", "J95X0", "J95I01L", "L95X01L", "J9AX01L", "J95X0AL", "T4S3138",
            "~00é",
        ] {
            assert_eq!(minor_planet(wrong), None, "{wrong}");
        }
        for wrong in
            ["", "0001", "0001Q", "000AP", "    CJ95O01", "    CJ95O01#", "    PJ94I01b", "0000P", "    é"]
        {
            assert_eq!(comet(wrong), None, "{wrong}");
        }
        for wrong in ["", "K13", "K13D1", "K130I", "K134W", "Q134I", "K1é"] {
            assert_eq!(date(wrong), None, "{wrong}");
        }
    }
}
