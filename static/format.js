// Numbers and times as people read them. Times are those of the device unless the name says UTC.

const MINUTE = 60e3;
const locale = "en-GB";
const clock = new Intl.DateTimeFormat(locale, { hour: "2-digit", minute: "2-digit", hourCycle: "h23" });
const clockUtc = new Intl.DateTimeFormat(locale, { hour: "2-digit", minute: "2-digit", hourCycle: "h23", timeZone: "UTC" });
const weekday = new Intl.DateTimeFormat(locale, { weekday: "short" });
const dayMonth = new Intl.DateTimeFormat(locale, { weekday: "short", day: "numeric", month: "short" });

const minus = (text) => text.replace("-", "−");

export const hhmm = (ms) => clock.format(ms);
export const hhmmUtc = (ms) => clockUtc.format(ms);
export const dayName = (ms) => weekday.format(ms);
export const longDay = (ms) => dayMonth.format(ms);

const dayStart = (ms) => new Date(ms).setHours(0, 0, 0, 0);
/** Whole calendar days of the device from `now` to `ms`. */
export const daysAhead = (ms, now) => Math.round((dayStart(ms) - dayStart(now)) / (24 * 60 * MINUTE));

/** A length of time as fine as it matters: "35 min", "3 h 20 min", "20 h", "2 days". */
export function span(ms) {
  const minutes = Math.round(Math.abs(ms) / MINUTE);
  if (minutes < 60) return `${minutes} min`;
  if (minutes >= 600 && minutes < 2880) return `${Math.round(minutes / 60)} h`;
  if (minutes < 600) return minutes % 60 ? `${Math.floor(minutes / 60)} h ${minutes % 60} min` : `${minutes / 60} h`;
  return `${Math.floor(minutes / 1440)} days`;
}

export const degrees = (value) => minus(`${Math.round(value)}°`);
/** With a decimal below 10°, where it matters. */
export const fine = (value) => minus(Math.abs(value) < 9.95 ? `${value.toFixed(1)}°` : `${Math.round(value)}°`);
export const bearing = (azimuth_deg) => `${Math.round(azimuth_deg) % 360}°`;
export const chance = (value) => (value > 0 && value < 0.05 ? "<0.1" : value.toFixed(1));
export const percent = (share) => `${Math.round(share * 100)}\u00a0%`;
export const coordinate = (value) => minus(value.toFixed(3).replace(/\.?0+$/, ""));

const WINDS = ["N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW"];
/** Point of the compass out of `points` (16, 8 or 4). */
export const wind = (azimuth_deg, points = 16) => WINDS[(Math.round((azimuth_deg * points) / 360) % points) * (16 / points)];

/** Fists at arm's length, about 10° each (common practice), to the half. */
export function fists(elevation_deg) {
  const halves = Math.round(elevation_deg / 5);
  const whole = Math.floor(halves / 2);
  return halves % 2 ? `${whole || ""}½` : `${whole}`;
}

const NUMBER = /^\s*([+\-−]?)\s*(\d+(?:[.,]\d+)?)\s*°?\s*([NSEW]?)\s*$/i;
/** A coordinate as people type it ("60,2", "4.1 W") as a plain number text; what is no number stays as it is, for the service to refuse. */
export function plainNumber(text) {
  const found = NUMBER.exec(text);
  if (!found) return text.trim();
  const [, sign, digits, letter] = found;
  const negative = ["-", "−"].includes(sign) !== /[SW]/i.test(letter);
  return (negative ? "-" : "") + digits.replace(",", ".");
}
