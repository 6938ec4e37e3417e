//! The coefficient tables of IAU 2000A nutation (IERS Conventions (2003), tables 5.3a and 5.3b: the later
//! edition prints the series with the IAU 2006 adjustments worked in), of the CIO locator s and of the
//! complementary terms of the equation of the equinoxes (IERS Conventions (2010), tables 5.2d and 5.2e).
//!
//! The numbers (and nothing but the numbers) are read from the C sources of ERFA 2.0.1 as carried by the
//! source distribution of pyerfa 2.0.1.5:
//!
//! ```sh
//! pip download --no-binary pyerfa --no-deps pyerfa==2.0.1.5 && tar xzf pyerfa-2.0.1.5.tar.gz
//! cargo run -p hourarc-tables -- iau --source pyerfa-2.0.1.5
//! ```
//!
//! The terms are written smallest first, the order in which they are summed.

use std::fmt::Write as _;
use std::fs;
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

/// The sources, below the root of the distribution, and their SHA-256.
const NUTATION: (&str, &str) =
    ("liberfa/erfa/src/nut00a.c", "a1538ec0277745db974ab76ca4b678a7602249bccecf9474e2b0268f9c2032ef");
const LOCATOR: (&str, &str) =
    ("liberfa/erfa/src/s06.c", "6ad19dd59c3150d9f065b3f76d254c1cf3adb0cb6bacd6422c1dc6b6f14122ea");
const EQUINOXES: (&str, &str) =
    ("liberfa/erfa/src/eect00.c", "771d6e118a12b8fdc80894ea0a6c55f63ce2c9a407c75fd176aafb80b43ed4a2");

const COMMAND: &str =
    "// Written by `cargo run -p hourarc-tables -- iau --source pyerfa-2.0.1.5`; do not edit.\n";

/// Write the tables into `rust/core/src/earth/tables`, or with `check` compare them with what stands
/// there. `source` is the unpacked source distribution of pyerfa 2.0.1.5.
pub fn run(check: bool, source: &Path) -> Result<(), String> {
    let nutation = read(source, NUTATION)?;
    let locator = read(source, LOCATOR)?;
    let equinoxes = read(source, EQUINOXES)?;
    let files = [
        ("luni_solar.rs", luni_solar(&rows(&nutation, "xls[]", 11)?)?),
        ("planetary.rs", planetary(&rows(&nutation, "xpl[]", 17)?)?),
        ("locator.rs", cio_locator(&locator)?),
        ("complementary.rs", complementary(&equinoxes)?),
    ];
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../core/src/earth/tables");
    for (name, text) in files {
        let path = folder.join(name);
        if check {
            let stands = fs::read_to_string(&path).map_err(|e| format!("{}: {e}", path.display()))?;
            if stands != text {
                return Err(format!("{} is not what its source gives: regenerate it", path.display()));
            }
        } else {
            fs::write(&path, text).map_err(|e| format!("{}: {e}", path.display()))?;
        }
    }
    Ok(())
}

/// A source file with the checksum it must have.
fn read(root: &Path, (name, wanted): (&str, &str)) -> Result<String, String> {
    let path = root.join(name);
    let bytes = fs::read(&path).map_err(|e| format!("{}: {e}", path.display()))?;
    let found = Sha256::digest(&bytes).iter().map(|b| format!("{b:02x}")).collect::<String>();
    if found != wanted {
        return Err(format!("{}: SHA-256 is {found}, not {wanted}", path.display()));
    }
    String::from_utf8(bytes).map_err(|e| format!("{}: {e}", path.display()))
}

/// The numbers of a brace-enclosed initialiser `name = { … };`, as they are written, in rows of `width`.
fn rows<'a>(source: &'a str, name: &str, width: usize) -> Result<Vec<Vec<&'a str>>, String> {
    let missing = |what: &str| format!("{what} of the array {name} not found");
    let start = source.find(&format!("{name} = {{")).ok_or_else(|| missing("the start"))? + name.len() + 3;
    let end = start + source[start..].find("};").ok_or_else(|| missing("the end"))?;
    let mut numbers = Vec::new();
    let mut rest = &source[start..end];
    while !rest.is_empty() {
        // Comments carry numbers too, and are not of the table.
        let comment = rest.find("/*").unwrap_or(rest.len());
        let separator = |c: char| c.is_whitespace() || matches!(c, '{' | '}' | ',');
        numbers.extend(rest[..comment].split(separator).filter(|token| !token.is_empty()));
        let close = rest[comment..].find("*/").map_or(rest.len(), |n| comment + n + 2);
        rest = &rest[close..];
    }
    if let Some(odd) = numbers.iter().find(|n| n.parse::<f64>().is_err()) {
        return Err(format!("{odd:?} in the array {name} is not a number"));
    }
    if numbers.is_empty() || numbers.len() % width != 0 {
        return Err(format!("{} numbers in the array {name}, not rows of {width}", numbers.len()));
    }
    Ok(numbers.chunks(width).map(<[&str]>::to_vec).collect())
}

/// A number that is written as a float and means an integer.
fn integer(text: &str) -> Result<i32, String> {
    match text.parse::<f64>() {
        Ok(value) if value.fract() == 0.0 && value.abs() < 2e9 => Ok(value as i32),
        _ => Err(format!("{text:?} is not an integer")),
    }
}

fn integers(texts: &[&str]) -> Result<Vec<i32>, String> {
    texts.iter().map(|t| integer(t)).collect()
}

/// The digits of a number written in units of 1e-6 (arcseconds: microarcseconds).
fn micro(text: &str) -> Result<&str, String> {
    text.strip_suffix("e-6").ok_or_else(|| format!("{text:?} is not in units of 1e-6"))
}

/// The length of a term's coefficients, by which the terms are ordered.
fn amplitude(coefficients: &[f64]) -> f64 {
    coefficients.iter().map(|c| c * c).sum::<f64>().sqrt()
}

fn count(rows: &[Vec<&str>], wanted: usize, what: &str) -> Result<(), String> {
    if rows.len() == wanted { Ok(()) } else { Err(format!("{} terms of {what}, not {wanted}", rows.len())) }
}

/// One table of integer terms: `multipliers` of the arguments, the rest coefficients.
fn integer_table(
    rows: &[Vec<&str>],
    multipliers: usize,
    name: &str,
    documentation: &str,
) -> Result<String, String> {
    let mut terms: Vec<Vec<i32>> = rows.iter().map(|r| integers(r)).collect::<Result<_, _>>()?;
    let size =
        |term: &Vec<i32>| amplitude(&term[multipliers..].iter().map(|&c| c.into()).collect::<Vec<_>>());
    terms.sort_by(|a, b| size(a).total_cmp(&size(b)));
    let coefficients = rows[0].len() - multipliers;
    let mut text = format!(
        "{COMMAND}\nuse super::Term;\n\n{documentation}#[rustfmt::skip]\npub(in crate::earth) static {name}: \
         [Term<{multipliers}, [i32; {coefficients}]>; {}] = [\n",
        terms.len()
    );
    for term in &terms {
        let (arguments, values) = term.split_at(multipliers);
        writeln!(text, "    ({arguments:?}, {values:?}),").expect("a string takes all");
    }
    text.push_str("];\n");
    Ok(text)
}

fn luni_solar(rows: &[Vec<&str>]) -> Result<String, String> {
    count(rows, 678, "luni-solar nutation")?;
    integer_table(
        rows,
        5,
        "LUNI_SOLAR",
        "/// Luni-solar nutation, IAU 2000A (IERS Conventions (2003) tables 5.3a and 5.3b): multipliers of l, l′, F, D, Ω;\n\
         /// for the longitude sin, t sin, cos; for the obliquity cos, t cos, sin; in 0.1 µas and 0.1 µas a century.\n",
    )
}

fn planetary(rows: &[Vec<&str>]) -> Result<String, String> {
    count(rows, 687, "planetary nutation")?;
    integer_table(
        rows,
        13,
        "PLANETARY",
        "/// Planetary nutation, IAU 2000A (IERS Conventions (2003) tables 5.3a and 5.3b): multipliers of l, F, D, Ω, the\n\
         /// longitudes of Mercury to Neptune, and the precession; for the longitude sin, cos; for the obliquity sin,\n\
         /// cos; in 0.1 µas.\n",
    )
}

/// One table of terms in eight arguments with a sine and a cosine coefficient in microarcseconds.
fn two_coefficient_table(source: &str, array: &str, terms: usize, name: &str) -> Result<String, String> {
    let rows = rows(source, array, 10)?;
    count(&rows, terms, name)?;
    let mut written = Vec::new();
    for row in &rows {
        let multipliers = integers(&row[..8])?;
        let (sine, cosine) = (micro(row[8])?, micro(row[9])?);
        let size = amplitude(&[sine.parse().expect("checked"), cosine.parse().expect("checked")]);
        written.push((size, format!("    ({multipliers:?}, [{sine}, {cosine}]),\n")));
    }
    written.sort_by(|a, b| a.0.total_cmp(&b.0));
    let body: String = written.into_iter().map(|(_, line)| line).collect();
    Ok(format!(
        "#[rustfmt::skip]\npub(in crate::earth) static {name}: [Term<8, [f64; 2]>; {terms}] = [\n{body}];\n"
    ))
}

const EIGHT_ARGUMENTS: &str = "multipliers of l, l′, F, D, Ω, the longitudes of Venus and the Earth, and the\n\
     /// precession; sine and cosine coefficients in µas.\n";

fn cio_locator(source: &str) -> Result<String, String> {
    let polynomial = rows(source, "sp[]", 6)?.remove(0);
    let polynomial = polynomial.iter().map(|c| micro(c)).collect::<Result<Vec<_>, _>>()?.join(", ");
    let mut text = format!(
        "{COMMAND}\nuse super::Term;\n\n/// The polynomial part of s + XY/2 (IERS Conventions (2010) table 5.2d), µas, by rising power of t.\n\
         #[rustfmt::skip]\npub(in crate::earth) static POLYNOMIAL: [f64; 6] = [{polynomial}];\n"
    );
    for (array, terms, name, power) in [
        ("s0[]", 33, "ORDER_0", "without t"),
        ("s1[]", 3, "ORDER_1", "with t"),
        ("s2[]", 25, "ORDER_2", "with t²"),
        ("s3[]", 4, "ORDER_3", "with t³"),
        ("s4[]", 1, "ORDER_4", "with t⁴"),
    ] {
        let table = two_coefficient_table(source, array, terms, name)?;
        write!(text, "\n/// The terms of s + XY/2 {power} (table 5.2d): {EIGHT_ARGUMENTS}{table}")
            .expect("a string takes all");
    }
    Ok(text)
}

fn complementary(source: &str) -> Result<String, String> {
    let mut text = format!("{COMMAND}\nuse super::Term;\n");
    for (array, terms, name, power) in
        [("e0[]", 33, "ORDER_0", "without t"), ("e1[]", 1, "ORDER_1", "with t")]
    {
        let table = two_coefficient_table(source, array, terms, name)?;
        write!(
            text,
            "\n/// The complementary terms of the equation of the equinoxes {power} (IERS Conventions (2010) table 5.2e):\n\
             /// {EIGHT_ARGUMENTS}{table}"
        )
        .expect("a string takes all");
    }
    Ok(text)
}

#[cfg(test)]
mod tests {
    use super::*;

    const ARRAY: &str =
        "static const T x[] = {\n /* 1- 2 */\n {{ 1, -2}, -3.5e-6 },\n {{0,4}, 0.25e-6 } /* 9 */ };";

    #[test]
    fn numbers_are_taken_and_comments_are_not() {
        let rows = rows(ARRAY, "x[]", 3).unwrap();
        assert_eq!(rows, [["1", "-2", "-3.5e-6"], ["0", "4", "0.25e-6"]]);
        assert_eq!(micro(rows[0][2]), Ok("-3.5"));
    }

    #[test]
    fn what_does_not_fit_is_said() {
        assert!(rows(ARRAY, "y[]", 3).unwrap_err().contains("y[] not found"));
        assert!(rows(ARRAY, "x[]", 4).unwrap_err().contains("6 numbers"));
        assert!(rows("x[] = { a };", "x[]", 1).unwrap_err().contains("\"a\""));
        assert!(integer("1.5").unwrap_err().contains("1.5"));
        assert!(micro("1.5e-7").is_err());
    }

    #[test]
    fn a_wrong_source_is_refused() {
        let folder = std::env::temp_dir().join(format!("hourarc-tables-{}", std::process::id()));
        fs::create_dir_all(folder.join("liberfa/erfa/src")).unwrap();
        let missing = run(true, &folder).unwrap_err();
        assert!(missing.contains("nut00a.c"), "{missing}");
        fs::write(folder.join(NUTATION.0), "changed").unwrap();
        let changed = run(true, &folder).unwrap_err();
        assert!(changed.contains("SHA-256"), "{changed}");
        fs::remove_dir_all(&folder).unwrap();
    }
}
