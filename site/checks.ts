/** Checks in force and their names, from the registries alone. */
import { checks, check as registered } from '../pipeline/judge/checks.ts';
import type { CheckEntry } from '../pipeline/judge/types.ts';
import type { ArchiveRow } from '../pipeline/ledger/types.ts';
import { isQuantity, quantity } from '../pipeline/measure/quantities.ts';

/** The registry's checks, and one for each limit of the archive's own. */
export function checksInForce(archive: ArchiveRow): CheckEntry[] {
  const limited = new Set(archive.settings.limits.map((limit) => limit.quantity).filter(isQuantity));
  return [...checks, ...[...limited].map((id) => registered(`policy-${id.replaceAll('_', '-')}`))];
}

/** The registry's entry; null for an id that it does not hold, as from a ledger of another version. */
export function checkOf(id: string): CheckEntry | null {
  try {
    return registered(id);
  } catch {
    return null;
  }
}

const plain = (check: CheckEntry): string | null =>
  isQuantity(check.quantity) ? `${quantity(check.quantity).label}, ${check.ground}` : null;

const timesUsed = new Map<string | null, number>();
for (const check of checks) timesUsed.set(plain(check), (timesUsed.get(plain(check)) ?? 0) + 1);

/** A short name: 'Peak, physics' where quantity and ground say which check it is, else the words of its id. */
export function checkName(id: string): string {
  const check = checkOf(id);
  const name = check && plain(check);
  if (name && (timesUsed.get(name) ?? 0) <= 1) return name;
  const words = id.replaceAll('-', ' ');
  return words.charAt(0).toUpperCase() + words.slice(1);
}
