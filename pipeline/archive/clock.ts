/** Times as they stood on the wall where the recording was made; the machine's own time zone plays no part. */

export interface WallClock {
  /** YYYY-MM-DD. */
  date: string;
  /** HH:MM:SS, with decimals where the file has them; null for a date alone. */
  time: string | null;
}

const iso = /^(\d{4})-(\d{2})-(\d{2})(?:[T ](\d{2}):(\d{2})(?::(\d{2})([.,]\d+)?)?\s*(Z|[+-]\d{2}(?::?\d{2})?)?)?$/i;

/**
 * The wall clock of an ISO 8601 date-time. One with an offset is brought to `timezone` where that is known; otherwise
 * it is taken as written. Null for anything else.
 */
export function clockOf(written: string | null, timezone: string | null): WallClock | null {
  const match = iso.exec(written?.trim() ?? '');
  if (!match) return null;
  const [, year, month, day, hour, minute, second = '00', fraction = '', offset] = match;
  const date = `${year}-${month}-${day}`;
  if (hour === undefined) return { date, time: null };
  const decimals = fraction.replace(',', '.').replace(/0+$/, '').replace(/^\.$/, '');
  if (offset === undefined || timezone === null) return { date, time: `${hour}:${minute}:${second}${decimals}` };
  const [, sign, hours, minutes = '00'] = /^([+-])(\d{2}):?(\d{2})?$/.exec(offset) ?? [null, '+', '00', '00'];
  const shift = (sign === '-' ? -1 : 1) * (Number(hours) * 60 + Number(minutes)) * 60_000;
  const instant =
    Date.UTC(Number(year), Number(month) - 1, Number(day), Number(hour), Number(minute), Number(second)) - shift;
  if (!Number.isFinite(instant)) return null;
  const parts = new Intl.DateTimeFormat('en-u-ca-iso8601-nu-latn', {
    timeZone: timezone,
    year: 'numeric',
    month: '2-digit',
    day: '2-digit',
    hour: '2-digit',
    minute: '2-digit',
    second: '2-digit',
    hourCycle: 'h23',
  }).formatToParts(instant);
  const part = (type: string): string => parts.find((one) => one.type === type)!.value.padStart(2, '0');
  return {
    date: `${part('year').padStart(4, '0')}-${part('month')}-${part('day')}`,
    time: `${part('hour')}:${part('minute')}:${part('second')}${decimals}`,
  };
}

/** Days since 1970-01-01 of a YYYY-MM-DD, in s. */
export function daySeconds(date: string): number {
  const [year, month, day] = date.split('-').map(Number) as [number, number, number];
  return Date.UTC(year, month - 1, day) / 1000;
}

/** Seconds since midnight of an HH:MM:SS. */
export function clockSeconds(time: string): number {
  const [hour, minute, second = 0] = time.split(':').map(Number) as [number, number, number?];
  return hour * 3600 + minute * 60 + second;
}
