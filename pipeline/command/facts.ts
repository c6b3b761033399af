/** Small readers for facts in force. A fact that is absent is null; the archive has checked kinds and ranges. */
import type { Facts } from '../archive/types.ts';

export type FactValues = Record<string, string | number>;

export const valuesOf = (facts: Facts): FactValues =>
  Object.fromEntries(Object.entries(facts).map(([key, fact]) => [key, fact.value]));

export const numberFact = (facts: FactValues, key: string): number | null => {
  const value = facts[key];
  return typeof value === 'number' ? value : null;
};

export const textFact = (facts: FactValues, key: string): string | null => {
  const value = facts[key];
  return value === undefined || value === '' ? null : String(value);
};

/** Seconds since midnight of a clock time HH:MM or HH:MM:SS, null for anything else. */
export function clockSeconds(text: string | null): number | null {
  const match = text?.match(/^(\d{1,2}):(\d{2})(?::(\d{2}(?:\.\d+)?))?/);
  return match ? Number(match[1]) * 3600 + Number(match[2]) * 60 + Number(match[3] ?? 0) : null;
}
