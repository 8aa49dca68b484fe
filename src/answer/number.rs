//! How figures are rounded for people: the one place where digits are dropped.
//!
//! Two rules. A figure never shows a digit that the simulation could not hold: its simulation error
//! is at most one and a half units of its last place. And the three figures of an interval share
//! that place, about a tenth of the interval's width, so that they can be compared at a glance;
//! only where the ends are a factor of three or more apart does each figure have its own two digits.
//! Files for machines (CSV, JSON, Parquet) are not rounded at all.

/// An interval whose ends are this factor apart has no last place that suits both of them.
const WIDE: f64 = 3.0;
/// Simulation error, in units of the last place shown, that a figure may have.
const UNITS_OF_ERROR: f64 = 1.5;
/// From here on a rounded figure stands in the exponent form; nobody reads twenty digits.
const LARGEST_PLAIN: f64 = 1e7;
/// From here on a whole number does: counts up to here are told exactly.
const LARGEST_WHOLE: f64 = 1e9;
/// Below this too.
const SMALLEST_PLAIN: f64 = 1e-4;
/// Most decimals of the exponent form.
const DECIMALS_OF_A_POWER: i32 = 3;
/// No figure is told finer than this place.
const FINEST_SHOWN: Place = -6;

/// The last place shown, as a power of ten: -2 is hundredths, 0 ones, 3 thousands.
type Place = i32;

/// An estimate and its interval, as told to people.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Told {
    /// The estimate.
    pub estimate: String,
    /// Lower end of the interval.
    pub lower: String,
    /// Upper end of the interval.
    pub upper: String,
}

/// An estimate, its interval, and the simulation error of each.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Measured {
    /// The estimate.
    pub estimate: f64,
    /// Lower end of the interval.
    pub lower: f64,
    /// Upper end of the interval.
    pub upper: f64,
    /// Monte Carlo standard error of the lower end.
    pub error_of_lower: f64,
    /// Monte Carlo standard error of the upper end.
    pub error_of_upper: f64,
}

impl Measured {
    /// The same on the scale of the exponential, times `factor`; errors by the delta method.
    pub fn exp_times(self, factor: f64) -> Measured {
        let lower = crate::numeric::exp(self.lower) * factor;
        let upper = crate::numeric::exp(self.upper) * factor;
        Measured {
            estimate: crate::numeric::exp(self.estimate) * factor,
            lower,
            upper,
            error_of_lower: self.error_of_lower * lower,
            error_of_upper: self.error_of_upper * upper,
        }
    }

    /// In figures for people.
    pub fn told(self) -> Told {
        self.told_from(None)
    }

    /// In figures for people, with as many digits more as it takes (and the simulation supports)
    /// for an end of the interval not to round to 1 where it is not 1.
    pub fn told_apart_from_one(self) -> Told {
        self.told_from(Some(1.0))
    }

    fn told_from(self, landmark: Option<f64>) -> Told {
        let shares_places = self.lower <= 0.0 || self.upper < WIDE * self.lower;
        let width = place_at_or_below((self.upper - self.lower) / 10.0);
        let error = self.error_of_lower.max(self.error_of_upper);
        let common = width.unwrap_or_else(|| two_digits(self.estimate));
        let place = |value: f64, own_error: f64| {
            if shares_places {
                common.max(finest(error))
            } else {
                two_digits(value).max(finest(own_error))
            }
        };
        let mut places = [
            place(self.estimate, self.error_of_lower),
            place(self.lower, self.error_of_lower),
            place(self.upper, self.error_of_upper),
        ];
        if let Some(landmark) = landmark {
            let hits = |value: f64, place: Place| value != landmark && figure(value, place) == figure(landmark, place);
            let ends = [(self.lower, self.error_of_lower), (self.upper, self.error_of_upper)];
            for (end, (value, own_error)) in ends.into_iter().enumerate() {
                let last = finest(if shares_places { error } else { own_error }).max(FINEST_SHOWN);
                while hits(value, places[end + 1]) && places[end + 1] > last {
                    places[end + 1] -= 1;
                }
            }
            if shares_places {
                places = [places[1].min(places[2]); 3];
            }
        }
        Told {
            estimate: figure(self.estimate, places[0]),
            lower: figure(self.lower, places[1]),
            upper: figure(self.upper, places[2]),
        }
    }
}

/// A value rounded to a place, thousands set apart by commas.
///
/// A positive value that would round to nothing is told as `below` one unit of that place.
pub fn figure(value: f64, place: i32) -> String {
    let unit = power_of_ten(place);
    if value > 0.0 && value < unit / 2.0 {
        return format!("below {}", sized(unit, place));
    }
    sized(value, place)
}

/// Rounded to a place: plain, or in the exponent form where that would be a row of zeros.
fn sized(value: f64, place: Place) -> String {
    let size = value.abs();
    if size >= LARGEST_PLAIN || (size > 0.0 && size < SMALLEST_PLAIN) {
        in_powers(value, place)
    } else {
        grouped(value, place)
    }
}

/// The exponent form, rounded to a place: `3.9 × 10^46`.
fn in_powers(value: f64, place: Place) -> String {
    let Some(first) = place_at_or_below(value.abs()) else {
        return grouped(value, place);
    };
    let decimals = (first - place).clamp(0, DECIMALS_OF_A_POWER) as usize;
    let text = format!("{value:.decimals$e}");
    match text.split_once('e') {
        Some((digits, exponent)) => format!("{digits} × 10^{exponent}"),
        None => text,
    }
}

/// A whole number (or one that is rounded to it), thousands set apart by commas; in the exponent
/// form from 10^9 on.
pub fn whole(value: f64) -> String {
    if value.abs() >= LARGEST_WHOLE {
        return in_powers(value, 0);
    }
    grouped(value, 0)
}

/// A plain number as a person would write it: all its digits, thousands set apart by commas.
pub fn as_written(value: f64) -> String {
    if value != 0.0 && !(1e-7..1e15).contains(&value.abs()) {
        let text = format!("{value:e}");
        return match text.split_once('e') {
            Some((digits, exponent)) => format!("{digits} × 10^{exponent}"),
            None => text,
        };
    }
    let text = format!("{value}");
    let (head, tail) = text.split_once('.').unwrap_or((&text, ""));
    // Four digits stand as they are: they may be a year.
    let head = if head.trim_start_matches('-').len() > 4 {
        with_commas(head)
    } else {
        head.to_owned()
    };
    if tail.is_empty() {
        head
    } else {
        format!("{head}.{tail}")
    }
}

/// The level of an interval: `95 %`.
pub fn level(interval: f64) -> String {
    let text = format!("{:.6}", interval * 100.0);
    format!("{} %", text.trim_end_matches('0').trim_end_matches('.'))
}

/// How much lower or higher than 1 a ratio is, in words, from the ratio as it is shown.
///
/// From the text and not from the value behind it: rounded on its own, a percentage contradicts the
/// ratio beside it (0.78 shown as 0.8, and 22 % lower).
pub fn change_in_words(shown: &str) -> String {
    let (bound, digits) = match shown.strip_prefix("below ") {
        Some(digits) => ("more than ", digits),
        None => ("", shown),
    };
    let plain = digits.replace(',', "").replace(" × 10^", "e");
    let Ok(ratio) = plain.parse::<f64>() else {
        return format!("{shown} times as high");
    };
    if ratio >= 2.0 {
        return format!("{digits} times as high");
    }
    if ratio < 0.001 {
        return "more than 99.9 % lower".to_owned();
    }
    let decimals = plain.split_once('.').map_or(0, |(_, tail)| tail.len());
    let percent = grouped((ratio - 1.0).abs() * 100.0, 2 - decimals.clamp(2, 8) as Place);
    if percent.chars().all(|c| c == '0' || c == '.') {
        // "below 1" says on which side, and no more.
        if bound.is_empty() { "about the same" } else { "lower" }.to_owned()
    } else if ratio < 1.0 {
        format!("{bound}{percent} % lower")
    } else {
        format!("{percent} % higher")
    }
}

/// A probability that was counted from draws, in percent: never 0 % and never 100 %, which no
/// count of draws can show, and to tens only where so few draws support no more.
pub fn probability(probability: f64, effective_draws: f64) -> String {
    let error = (probability * (1.0 - probability) / effective_draws.max(1.0)).sqrt();
    if probability > 0.99 {
        return "above 99 %".to_owned();
    }
    if probability < 0.01 {
        return "below 1 %".to_owned();
    }
    if error > 0.01 {
        let tens = grouped(probability * 100.0, 1);
        return match tens.as_str() {
            "0" => "below 10 %".to_owned(),
            "100" => "above 90 %".to_owned(),
            _ => format!("about {tens} %"),
        };
    }
    format!("{} %", grouped(probability * 100.0, 0))
}

/// Two leading digits of a value, rounded: for figures whose precision does not matter much.
pub fn roughly(value: f64) -> String {
    figure(value, two_digits(value))
}

/// The place of the second leading digit.
fn two_digits(value: f64) -> Place {
    place_at_or_below(value.abs()).unwrap_or(0) - 1
}

/// The largest power of ten at or below a value above 0.
fn place_at_or_below(value: f64) -> Option<Place> {
    // The shortest decimal form knows its exponent exactly; a logarithm would miss it beside
    // powers of ten.
    (value > 0.0 && value.is_finite())
        .then(|| format!("{value:e}"))
        .and_then(|text| text.split_once('e').and_then(|(_, exponent)| exponent.parse().ok()))
}

/// The last place that a simulation error supports: the error is at most [`UNITS_OF_ERROR`] units
/// of it. Far below everything shown where the error is 0.
fn finest(error: f64) -> Place {
    const FAR_BELOW: Place = -300;
    match place_at_or_below(error) {
        None => FAR_BELOW,
        Some(place) if error <= UNITS_OF_ERROR * power_of_ten(place) => place,
        Some(place) => place + 1,
    }
}

/// A power of ten, correctly rounded.
fn power_of_ten(place: Place) -> f64 {
    format!("1e{place}").parse().unwrap_or(1.0)
}

/// Rounds to a place and sets thousands apart.
fn grouped(value: f64, place: Place) -> String {
    let (rounded, decimals) = if place > 0 {
        let unit = power_of_ten(place);
        ((value / unit).round() * unit, 0)
    } else {
        (value, place.unsigned_abs() as usize)
    };
    let text = format!("{rounded:.decimals$}");
    let (head, tail) = text.split_once('.').unwrap_or((&text, ""));
    let digits = if tail.is_empty() {
        with_commas(head)
    } else {
        format!("{}.{tail}", with_commas(head))
    };
    // Minus nothing is nothing.
    match digits.strip_prefix('-') {
        Some(rest) if rest.chars().all(|c| matches!(c, '0' | '.' | ',')) => rest.to_owned(),
        _ => digits,
    }
}

/// Commas between thousands.
fn with_commas(whole: &str) -> String {
    let (sign, digits) = whole.strip_prefix('-').map_or(("", whole), |rest| ("-", rest));
    if !digits.bytes().all(|b| b.is_ascii_digit()) {
        return whole.to_owned();
    }
    let mut out = String::from(sign);
    for (k, digit) in digits.chars().enumerate() {
        if k > 0 && (digits.len() - k) % 3 == 0 {
            out.push(',');
        }
        out.push(digit);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn told(estimate: f64, lower: f64, upper: f64, error: f64) -> String {
        let told = Measured {
            estimate,
            lower,
            upper,
            error_of_lower: error,
            error_of_upper: error,
        }
        .told_apart_from_one();
        format!("{} ({} to {})", told.estimate, told.lower, told.upper)
    }

    #[test]
    fn an_interval_shares_its_last_place() {
        assert_eq!(told(0.7612, 0.6117, 0.9389, 1e-3), "0.76 (0.61 to 0.94)");
        assert_eq!(told(2.4671, 1.9302, 3.2811, 1e-3), "2.5 (1.9 to 3.3)");
        assert_eq!(told(16.3419, 13.1888, 20.1203, 0.05), "16.3 (13.2 to 20.1)");
        assert_eq!(told(16_341.9, 13_188.8, 20_120.3, 5.0), "16,300 (13,200 to 20,100)");
        assert_eq!(told(0.99812, 0.9697, 1.0302, 1e-4), "0.998 (0.970 to 1.030)");
    }

    #[test]
    fn no_digit_is_finer_than_the_simulation_error() {
        assert_eq!(told(0.7612, 0.6117, 0.9389, 0.014), "0.76 (0.61 to 0.94)");
        assert_eq!(told(0.7612, 0.6117, 0.9389, 0.016), "0.8 (0.6 to 0.9)");
        assert_eq!(told(16.3419, 13.1888, 20.1203, 0.4), "16 (13 to 20)");
    }

    #[test]
    fn a_very_wide_interval_gives_each_figure_two_digits() {
        assert_eq!(told(12.41, 0.9012, 171.3, 1e-3), "12 (0.90 to 170)");
        assert_eq!(told(0.931, 0.524, 1.701, 1e-2), "0.93 (0.52 to 1.7)");
        assert_eq!(told(1.94, 1.02, 6.13, 1e-2), "1.9 (1.02 to 6.1)");
    }

    #[test]
    fn an_end_beside_one_gets_the_digits_that_set_it_apart() {
        assert_eq!(told(0.8477, 0.7204, 0.9981, 1e-4), "0.848 (0.720 to 0.998)");
        // Not where the simulation does not hold that digit.
        assert_eq!(told(0.8477, 0.7204, 0.9981, 2e-3), "0.85 (0.72 to 1.00)");
    }

    #[test]
    fn changes_read_as_words() {
        assert_eq!(change_in_words("0.76"), "24 % lower");
        assert_eq!(change_in_words("1.08"), "8 % higher");
        assert_eq!(change_in_words("0.998"), "0.2 % lower");
        assert_eq!(change_in_words("1.00"), "about the same");
        assert_eq!(change_in_words("2.5"), "2.5 times as high");
        assert_eq!(change_in_words("1,900"), "1,900 times as high");
        assert_eq!(change_in_words("0.8"), "20 % lower");
        assert_eq!(change_in_words("1.9"), "90 % higher");
        assert_eq!(change_in_words("below 0.01"), "more than 99 % lower");
        assert_eq!(change_in_words("below 1"), "lower");
    }

    #[test]
    fn no_percentage_says_more_than_can_be_said() {
        assert_eq!(change_in_words("5.2 × 10^-13"), "more than 99.9 % lower");
        assert_eq!(change_in_words("0.0002"), "more than 99.9 % lower");
        assert_eq!(change_in_words("0.0010"), "99.90 % lower");
        assert_eq!(change_in_words("3.9 × 10^46"), "3.9 × 10^46 times as high");
    }

    #[test]
    fn an_extreme_figure_is_told_by_its_power_of_ten() {
        assert_eq!(figure(3.9e46, 45), "3.9 × 10^46");
        assert_eq!(figure(12_345_678.0, 5), "1.23 × 10^7");
        assert_eq!(figure(9_345_678.0, 5), "9,300,000");
        assert_eq!(figure(5.177e-13, -14), "5.2 × 10^-13");
        assert_eq!(figure(1e-30, -6), "below 1 × 10^-6");
        assert_eq!(figure(0.00012, -5), "0.00012");
        assert_eq!(roughly(5.177e-13), "5.2 × 10^-13");
        assert_eq!(whole(38_999_999.0), "38,999,999");
        assert_eq!(whole(39_000_000_000_000_000_000.0), "3.900 × 10^19");
        assert_eq!(as_written(1e300), "1 × 10^300");
        assert_eq!(
            told(1e-12, 1e-13, 3e46, 0.0),
            "1.0 × 10^-12 (1.0 × 10^-13 to 3.0 × 10^46)"
        );
    }

    #[test]
    fn no_probability_is_told_as_certain() {
        assert_eq!(probability(1.0, 1e4), "above 99 %");
        assert_eq!(probability(0.0, 1e4), "below 1 %");
        assert_eq!(probability(0.987, 1e4), "99 %");
        assert_eq!(probability(0.005, 1e5), "below 1 %");
        assert_eq!(probability(0.0099, 1e5), "below 1 %");
        assert_eq!(probability(0.01, 1e5), "1 %");
        assert_eq!(probability(0.99, 1e5), "99 %");
        assert_eq!(probability(0.9901, 1e5), "above 99 %");
        assert_eq!(probability(0.5, 400.0), "about 50 %");
        assert_eq!(probability(0.98, 100.0), "above 90 %");
    }

    #[test]
    fn small_and_large_figures_keep_their_size() {
        assert_eq!(figure(0.0004, -2), "below 0.01");
        assert_eq!(figure(-0.0004, -2), "0.00");
        assert_eq!(figure(1_234_567.0, 0), "1,234,567");
        assert_eq!(figure(9_812.4, 0), "9,812");
        assert_eq!(as_written(10_000.0), "10,000");
        assert_eq!(as_written(2_019.0), "2019");
        assert_eq!(as_written(0.5), "0.5");
        assert_eq!(level(0.95), "95 %");
        assert_eq!(level(0.57), "57 %");
        assert_eq!(level(0.995), "99.5 %");
        assert_eq!(roughly(0.012_345), "0.012");
    }
}
