//! Colours of the page's scales.
//!
//! Six colours taken at equal steps of "viridis" (S. van der Walt and N. Smith,
//! 2015, published under CC0): perceptually uniform, told apart by readers with
//! any common colour blindness, and falling evenly in lightness, so that a print
//! in black and white keeps the order. Every coloured thing bears its step as a
//! figure too.

/// Steps of the scale; 1 buys least.
pub const STEPS: usize = 6;

/// Light to dark.
pub const VIRIDIS: [&str; STEPS] = [
    "#fde725", "#7ad151", "#22a884", "#2a788e", "#414487", "#440154",
];

/// How a member shows what a cubic metre of it buys.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Step {
    /// Locked, or nothing is known.
    None,
    /// A cubic metre there makes the result worse.
    Worse,
    /// 1 (least) to [`STEPS`].
    Buys(usize),
}

impl Step {
    /// Of a gain against the largest one.
    pub fn of(gain: Option<f64>, largest: f64) -> Self {
        match gain {
            None => Step::None,
            Some(gain) if gain < 0.0 => Step::Worse,
            Some(_) if largest <= 0.0 => Step::Buys(1),
            Some(gain) => {
                let step = (gain / largest * STEPS as f64).ceil() as usize;
                Step::Buys(step.clamp(1, STEPS))
            }
        }
    }

    /// End of a class name.
    pub fn class(self) -> String {
        match self {
            Step::None => "n".to_owned(),
            Step::Worse => "w".to_owned(),
            Step::Buys(step) => step.to_string(),
        }
    }

    /// The mark beside a thickness.
    pub fn mark(self) -> String {
        match self {
            Step::None => String::new(),
            Step::Worse => "✕".to_owned(),
            Step::Buys(step) => step.to_string(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Relative luminance of sRGB by IEC 61966-2-1, as WCAG 2.2 states it.
    fn luminance(colour: &str) -> f64 {
        let part = |at: usize| {
            let value = f64::from(u8::from_str_radix(&colour[at..at + 2], 16).unwrap()) / 255.0;
            if value <= 0.040_45 {
                value / 12.92
            } else {
                ((value + 0.055) / 1.055).powf(2.4)
            }
        };
        0.2126 * part(1) + 0.7152 * part(3) + 0.0722 * part(5)
    }

    /// Lightness L* of CIE 1976 (ISO/CIE 11664-4) from luminance.
    fn lightness(colour: &str) -> f64 {
        116.0 * luminance(colour).cbrt() - 16.0
    }

    #[test]
    fn lightness_falls_by_even_steps() {
        let steps: Vec<f64> = VIRIDIS
            .windows(2)
            .map(|pair| lightness(pair[0]) - lightness(pair[1]))
            .collect();
        for step in &steps {
            assert!(*step > 10.0 && *step < 20.0, "{steps:?}");
        }
    }

    #[test]
    fn steps_follow_gains() {
        assert_eq!(Step::of(None, 1.0), Step::None);
        assert_eq!(Step::of(Some(-0.1), 1.0), Step::Worse);
        assert_eq!(Step::of(Some(1.0), 1.0), Step::Buys(STEPS));
        assert_eq!(Step::of(Some(0.0), 1.0), Step::Buys(1));
        assert_eq!(Step::of(Some(0.5), 1.0), Step::Buys(3));
    }
}
