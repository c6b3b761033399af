/** Units of potential, current and time as people write them. */

export type Dimension = 'voltage' | 'current' | 'current per capacitance' | 'time';

export interface Unit {
  dimension: Dimension;
  /** Multiply by this for mV, pA, pA/pF or s. */
  factor: number;
  /** As it is written here. */
  name: string;
}

const prefixes: [RegExp, number][] = [
  [/^(?:milli|m)$/, 1e-3],
  [/^(?:micro|u|µ|μ)$/, 1e-6],
  [/^(?:nano|n)$/, 1e-9],
  [/^(?:pico|p)$/, 1e-12],
  [/^(?:femto|f)$/, 1e-15],
  [/^$/, 1],
];

const prefixSigns: Record<number, string> = { 1: '', 1e-3: 'm', 1e-6: 'µ', 1e-9: 'n', 1e-12: 'p', 1e-15: 'f' };

/** Multiplying by a power of ten as division where that is exact: 0.07 V must be 70 mV and not 70.00000000000001. */
const ratio = (numerator: number, denominator: number): number => Number((numerator / denominator).toPrecision(15));

function prefixed(text: string, stem: RegExp): number | null {
  const match = stem.exec(text);
  if (!match) return null;
  const written = text.slice(0, match.index);
  // Prefixes differ by case (mV, MV): only a prefix of one letter may not be folded.
  const prefix = written.length > 1 ? written.toLowerCase() : written;
  return prefixes.find(([pattern]) => pattern.test(prefix))?.[1] ?? null;
}

/**
 * Reads a unit such as 'V', 'mV', 'millivolts', 'pA', 'amperes', 'pA/pF', 'A/F', 'ms', 'seconds'.
 *
 * @returns null where the text names no unit of potential, current or time ('a.u.', 'unknown', '')
 */
export function parseUnit(text: string): Unit | null {
  const written = text.trim().replace(/^[([{]\s*|\s*[)\]}]$/g, '');
  const perCapacitance = /^(.*?)\s*(?:\/|\bper\b)\s*(.*)$/.exec(written);
  if (perCapacitance) {
    const current = prefixed(perCapacitance[1]!.trim(), /(?:A|amp|amps|ampere|amperes)$/);
    const capacitance = prefixed(perCapacitance[2]!.trim(), /(?:F|farad|farads)$/);
    if (current === null || capacitance === null) return null;
    return {
      dimension: 'current per capacitance',
      factor: ratio(current, capacitance),
      name: `${prefixSigns[current]}A/${prefixSigns[capacitance]}F`,
    };
  }
  const volt = prefixed(written, /(?:V|[vV]olts?)$/);
  if (volt !== null) return { dimension: 'voltage', factor: ratio(volt, 1e-3), name: `${prefixSigns[volt]}V` };
  const ampere = prefixed(written, /(?:A|[aA]mps?|[aA]mp[eè]res?)$/);
  if (ampere !== null) return { dimension: 'current', factor: ratio(ampere, 1e-12), name: `${prefixSigns[ampere]}A` };
  const second = prefixed(written, /(?:s|[sS]ecs?|[sS]econds?)$/);
  if (second !== null && second >= 1e-9) return { dimension: 'time', factor: second, name: `${prefixSigns[second]}s` };
  if (/^(?:mv|uv)$/.test(written)) return parseUnit(`${written[0]}V`);
  if (/^(?:pa|na|ua|ma)$/.test(written)) return parseUnit(`${written[0]}A`);
  if (/^(?:msec|usec)s?$/i.test(written)) return parseUnit(`${written[0]!.toLowerCase()}s`);
  return null;
}

/**
 * The one unit in which numbers of this size can be a membrane potential, or null where none or several fit. A cell's
 * potential reaches 10 to 300 mV in size somewhere in a recording.
 *
 * @param largest largest absolute value
 */
export function potentialUnitBySize(largest: number): 'V' | 'mV' | 'uV' | null {
  if (largest >= 0.01 && largest <= 0.3) return 'V';
  if (largest >= 10 && largest <= 300) return 'mV';
  if (largest >= 1e4 && largest <= 3e5) return 'uV';
  return null;
}

/** The one unit of time that makes this step a sampling interval between 200 Hz and 500 kHz, or null. */
export function timeUnitByStep(step: number): 's' | 'ms' | 'us' | null {
  const fits = (
    [
      ['s', 1],
      ['ms', 1e-3],
      ['us', 1e-6],
    ] as const
  ).filter(([, seconds]) => {
    const rate = 1 / (step * seconds);
    return rate >= 200 && rate <= 500_000;
  });
  return fits.length === 1 ? fits[0]![0] : null;
}
