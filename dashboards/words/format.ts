/**
 * Values for people, short enough to be written hundreds of times a second: currents come in mA and
 * read in A with the digits asked for; what is not known reads "not known", never 0.
 */
const NO_BREAK = "\u00a0";
const MINUS = "\u2212";
const NOT_KNOWN = "not known";

export const isKnown = (value: number | null | undefined): value is number =>
  value !== null && value !== undefined && Number.isFinite(value);

const withUnit = (value: number, digits: number, unit: string): string => {
  const text = value.toFixed(digits);
  const shown = Number(text) === 0 ? text.replace("-", "") : text.replace("-", MINUS);
  return `${shown}${NO_BREAK}${unit}`;
};

/** "1.64 A" from 1640 mA. Two digits, which is what the drive resolves. */
export const amps = (current_mA: number | null): string =>
  isKnown(current_mA) ? withUnit(current_mA / 1000, 2, "A") : NOT_KNOWN;

/** "1.645 A": a typed current is repeated with every digit that was meant. */
export const ampsAsMeant = (current_mA: number): string =>
  withUnit(current_mA / 1000, current_mA % 10 === 0 ? 2 : 3, "A");

/** "322 mW", "1.42 W". */
export function power(power_mW: number | null): string {
  if (!isKnown(power_mW)) return NOT_KNOWN;
  return power_mW >= 1000 ? withUnit(power_mW / 1000, 2, "W") : withUnit(power_mW, 0, "mW");
}

/** "37.8 °C". */
export const degrees = (case_degC: number | null): string =>
  isKnown(case_degC) ? withUnit(case_degC, 1, "°C") : NOT_KNOWN;

/** "34 s", "12 min", "3 h": an age, rounded down, so that it never claims more than passed. */
export function age(age_ms: number): string {
  const s = Math.max(0, Math.floor(age_ms / 1000));
  if (s < 120) return withUnit(s, 0, "s");
  return s < 7200 ? withUnit(Math.floor(s / 60), 0, "min") : withUnit(Math.floor(s / 3600), 0, "h");
}

const two = (n: number): string => `${n}`.padStart(2, "0");

/** "23:46", in the zone of whoever looks. */
export function clock(at: number): string {
  const date = new Date(at);
  return `${two(date.getHours())}:${two(date.getMinutes())}`;
}

/** "23:46:08". */
export const clockWithSeconds = (at: number): string =>
  `${clock(at)}:${two(new Date(at).getSeconds())}`;

const DAYS = ["Sun", "Mon", "Tue", "Wed", "Thu", "Fri", "Sat"] as const;
const MONTHS = "Jan Feb Mar Apr May Jun Jul Aug Sep Oct Nov Dec".split(" ");

/** "Tue 1 Dec, UTC+1": every time on the page is in this zone. */
export function dayAndZone(at: number): string {
  const date = new Date(at);
  const offset_min = -date.getTimezoneOffset();
  const size = Math.abs(offset_min);
  const minutes = size % 60 === 0 ? "" : `:${two(size % 60)}`;
  const zone =
    offset_min === 0
      ? "UTC"
      : `UTC${offset_min < 0 ? MINUS : "+"}${Math.floor(size / 60)}${minutes}`;
  return `${DAYS[date.getDay()]} ${date.getDate()} ${MONTHS[date.getMonth()]}, ${zone}`;
}

/** Puts no-break spaces between numbers and their units, in sentences that came from elsewhere. */
export const keepUnits = (text: string): string =>
  text.replace(/(\d) (?=(?:A|mW|W|mA|V|°C|K|nm|min|h|s|ms|%)(?![A-Za-z0-9]))/g, `$1${NO_BREAK}`);
