import { LapwingError } from '../errors/codes.js';

/** A calendar day, `2026-12-01`. */
export type Day = string;

const formats = new Map<string, Intl.DateTimeFormat>();

/** The zone of this computer, as the IANA zone database names it. */
export function ownZone(): string {
  return new Intl.DateTimeFormat().resolvedOptions().timeZone;
}

export function isZone(zone: string): boolean {
  try {
    formatOf(zone);
    return true;
  } catch {
    return false;
  }
}

/** The calendar day that it is in a zone at an instant. */
export function dayOf(instant: Date, zone: string): Day {
  return wallTime(instant, zone).slice(0, 10);
}

/** The next calendar day, or the one so many further on: 23, 24 or 25 hours long. */
export function dayAfter(day: Day, days = 1): Day {
  return new Date(Date.parse(`${day}T00:00:00Z`) + days * 86_400_000).toISOString().slice(0, 10);
}

/** An instant as RFC 3339 writes it, in a zone, with the offset that the zone had then. */
export function inZone(instant: Date, zone: string): string {
  const wall = wallTime(instant, zone);
  const offsetMin = Math.round((Date.parse(`${wall}Z`) - instant.getTime()) / 60_000);
  const two = (n: number) => String(Math.floor(n)).padStart(2, '0');
  const size = Math.abs(offsetMin);
  return `${wall}${offsetMin < 0 ? '-' : '+'}${two(size / 60)}:${two(size % 60)}`;
}

/**
 * The instant that a person means by `2026-12-01 18:30`, `18:30` (of `today`) or RFC 3339. Of two
 * instants with that wall time, when clocks go back, the first; one that the clocks skipped is refused.
 * @throws LapwingError ANIMALS_ENTRY_BAD
 */
export function instantOf(text: string, zone: string, today: Day): Date {
  const found = /^(?:(\d{4}-\d\d-\d\d)[T ])?(\d\d?):(\d\d)(?::(\d\d))?$/.exec(text.trim());
  if (found === null) {
    const exact = /^\d{4}-\d\d-\d\dT\S+(Z|[+-]\d\d:\d\d)$/.test(text)
      ? Date.parse(text)
      : Number.NaN;
    if (!Number.isNaN(exact)) return new Date(exact);
    throw bad(`${JSON.stringify(text)} is no time: expected 18:30, or 2026-12-01 18:30`);
  }
  const [, day = today, hour, minute, second = '00'] = found;
  const wall = `${day}T${hour!.padStart(2, '0')}:${minute}:${second}.000`;
  const asUtc = Date.parse(`${wall}Z`);
  if (Number.isNaN(asUtc)) throw bad(`${JSON.stringify(text)} is no time of any day`);
  // No zone is further from UTC than a day, so the offset is one of those on either side.
  const offsets = [asUtc - 86_400_000, asUtc + 86_400_000].map((ms) => offsetMs(ms, zone));
  for (const offset of offsets.sort((a, b) => b - a)) {
    const instant = new Date(asUtc - offset);
    if (wallTime(instant, zone) === wall) return instant;
  }
  throw bad(`${JSON.stringify(text)} does not exist in ${zone}: clocks went forward over it`);
}

/** @throws LapwingError ANIMALS_ENTRY_BAD unless it is a day of the calendar */
export function checkDay(text: string, what: string): Day {
  const day = /^\d{4}-\d\d-\d\d$/.test(text) ? Date.parse(`${text}T00:00:00Z`) : Number.NaN;
  if (!Number.isNaN(day) && new Date(day).toISOString().startsWith(text)) return text;
  throw bad(`${what} ${JSON.stringify(text)} is no day: expected 2026-12-01`);
}

function offsetMs(ms: number, zone: string): number {
  return Date.parse(`${wallTime(new Date(ms), zone)}Z`) - ms;
}

/** `2026-12-01T18:30:00.000` as clocks in the zone show it. */
function wallTime(instant: Date, zone: string): string {
  const part: Record<string, string> = {};
  for (const { type, value } of formatOf(zone).formatToParts(instant)) part[type] = value;
  const { year, month, day, hour, minute, second } = part;
  const ms = String(instant.getMilliseconds()).padStart(3, '0');
  return `${year}-${month}-${day}T${hour}:${minute}:${second}.${ms}`;
}

function formatOf(zone: string): Intl.DateTimeFormat {
  let format = formats.get(zone);
  if (format === undefined) {
    format = new Intl.DateTimeFormat('en-GB', {
      ...{ timeZone: zone, calendar: 'iso8601', hourCycle: 'h23' },
      ...{ year: 'numeric', month: '2-digit', day: '2-digit' },
      ...{ hour: '2-digit', minute: '2-digit', second: '2-digit' },
    });
    formats.set(zone, format);
  }
  return format;
}

function bad(what: string): LapwingError {
  return new LapwingError('animalsEntryBad', `${what}.`);
}
