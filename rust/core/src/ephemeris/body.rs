//! The Sun, the Moon and the planets by name.

use crate::error::{Error, Result};

/// A body of the solar system that has a name here.
///
/// For Mars to Pluto "the body" means the barycentre of the planet with its satellites, as the DE
/// series of ephemerides give it, unless a kernel brings the planet itself (see
/// [`Spk::code`](super::Spk::code)). Seen from the Earth the planet stands off its barycentre by at most
/// 0.08″ (Jupiter), 0.05″ (Saturn), 0.004″ (Uranus, Neptune), 0.1″ (Pluto, by Charon), and nothing to
/// speak of for Mars (0.2 m): the sums of satellite mass ratio times orbit, at the nearest approach.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[repr(u8)]
pub enum Body {
    /// The Sun.
    Sun = 0,
    /// The Earth's Moon.
    Moon = 1,
    /// Mercury.
    Mercury = 2,
    /// Venus.
    Venus = 3,
    /// The Earth itself, not the barycentre of Earth and Moon.
    Earth = 4,
    /// The Mars system's barycentre.
    Mars = 5,
    /// The Jupiter system's barycentre.
    Jupiter = 6,
    /// The Saturn system's barycentre.
    Saturn = 7,
    /// The Uranus system's barycentre.
    Uranus = 8,
    /// The Neptune system's barycentre.
    Neptune = 9,
    /// The Pluto system's barycentre.
    Pluto = 10,
}

impl Body {
    /// Every body, in the order of the codes.
    pub const ALL: [Body; 11] = [
        Body::Sun,
        Body::Moon,
        Body::Mercury,
        Body::Venus,
        Body::Earth,
        Body::Mars,
        Body::Jupiter,
        Body::Saturn,
        Body::Uranus,
        Body::Neptune,
        Body::Pluto,
    ];

    /// The word for this body, as it stands in calls and files.
    pub fn word(self) -> &'static str {
        match self {
            Body::Sun => "sun",
            Body::Moon => "moon",
            Body::Mercury => "mercury",
            Body::Venus => "venus",
            Body::Earth => "earth",
            Body::Mars => "mars",
            Body::Jupiter => "jupiter",
            Body::Saturn => "saturn",
            Body::Uranus => "uranus",
            Body::Neptune => "neptune",
            Body::Pluto => "pluto",
        }
    }

    /// The body a word names, upper or lower case; an unknown word is an [`Error`] that lists the known.
    pub fn from_word(word: &str) -> Result<Body> {
        Body::ALL.into_iter().find(|body| body.word().eq_ignore_ascii_case(word)).ok_or_else(|| {
            let known: Vec<&str> = Body::ALL.iter().map(|body| body.word()).collect();
            Error::invalid("body", format_args!("{word:?}"), known.join(", "))
        })
    }

    /// The integer codes under which a kernel may hold the body, the preferred one first: the planet
    /// itself, then the barycentre of its system (NAIF Integer ID codes, *NAIF IDs required reading*).
    pub(super) fn kernel_codes(self) -> &'static [i32] {
        match self {
            Body::Sun => &[10],
            Body::Moon => &[301],
            Body::Mercury => &[199, 1],
            Body::Venus => &[299, 2],
            Body::Earth => &[399],
            Body::Mars => &[499, 4],
            Body::Jupiter => &[599, 5],
            Body::Saturn => &[699, 6],
            Body::Uranus => &[799, 7],
            Body::Neptune => &[899, 8],
            Body::Pluto => &[999, 9],
        }
    }

    /// Equatorial radius, km.
    ///
    /// Sun: the nominal radius of IAU 2015 resolution B3. Others: Archinal et al. 2018, *Celest. Mech.
    /// Dyn. Astron.* 130:22 (IAU working group on cartographic coordinates, report of 2015), tables 4
    /// to 6; the Moon's is its mean radius, the giants' are at 1 bar.
    pub fn equatorial_radius_km(self) -> f64 {
        match self {
            Body::Sun => 695700.0,
            Body::Moon => 1737.4,
            Body::Mercury => 2440.53,
            Body::Venus => 6051.8,
            Body::Earth => 6378.1366,
            Body::Mars => 3396.19,
            Body::Jupiter => 71492.0,
            Body::Saturn => 60268.0,
            Body::Uranus => 25559.0,
            Body::Neptune => 24764.0,
            Body::Pluto => 1188.3,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_go_there_and_back() {
        for (code, body) in Body::ALL.into_iter().enumerate() {
            assert_eq!(body as usize, code);
            assert_eq!(Body::from_word(body.word()), Ok(body));
            assert_eq!(Body::from_word(&body.word().to_uppercase()), Ok(body));
        }
    }

    #[test]
    fn an_unknown_word_is_answered_with_the_known_ones() {
        let error = Body::from_word("vulcan").unwrap_err();
        assert!(error.is_invalid());
        let message = error.to_string();
        assert!(message.contains("\"vulcan\"") && message.contains("mercury, venus"), "{message}");
    }
}
