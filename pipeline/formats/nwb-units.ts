/** Which unit the samples of a series are in, where its label, its class and its numbers may contradict one another. */
import { glance } from './nwb-samples.ts';
import type { Series } from './nwb-series.ts';
import { blocker, plain, warning } from './problems.ts';
import type { Problem, ReadingHints } from './types.ts';
import { parseUnit, potentialUnitBySize, type Unit } from './units.ts';

export interface Scaling {
  dimension: 'voltage' | 'current';
  /** Multiply the stored number by this, then add `shift`, for mV or pA. */
  scale: number;
  shift: number;
  /** For people: 'volts × 0.001 (file says volts)'. */
  text: string;
}

export interface Settled {
  /** Null where the unit could not be settled: a blocking problem says why. */
  scaling: Scaling | null;
  problems: Problem[];
}

const expected: Record<string, 'voltage' | 'current' | undefined> = {
  CurrentClampSeries: 'voltage',
  IZeroClampSeries: 'voltage',
  VoltageClampSeries: 'current',
  CurrentClampStimulusSeries: 'current',
  VoltageClampStimulusSeries: 'voltage',
};

/** Currents between 0.1 pA and 1 µA can flow through a pipette. */
const canBeCurrent = (pa: number): boolean => pa >= 0.1 && pa <= 1e6;
/** Somewhere in a recording a cell's potential reaches 10 to 300 mV in size. */
const canBePotential = (mv: number): boolean => mv >= 10 && mv <= 300;

/** Unit of a series as the sidecar states it: `table: { voltage: { columns: [NAME OR PATH], unit: … } }`. */
export function statedUnit(series: Series, hints: ReadingHints): Unit | null {
  const names = [series.name, series.path, series.data.path];
  const listed = (columns: (string | number)[] | undefined): boolean =>
    columns?.some((column) => names.includes(String(column))) ?? false;
  const { voltage, current } = hints.table ?? {};
  if (voltage && listed(voltage.columns)) return parseUnit(voltage.unit);
  if (current && current.unit !== 'pA/pF' && listed(current.columns)) return parseUnit(current.unit);
  return null;
}

const product = (a: number, b: number): number => Number((a * b).toPrecision(15));

function scalingWith(series: Series, unit: Unit, why: string): Scaling {
  const offset = series.offset === 0 ? '' : ` + ${plain(series.offset)}`;
  const gain = series.gain === null ? '' : `; amplifier gain ${plain(series.gain)} noted, not applied`;
  return {
    dimension: unit.dimension === 'voltage' ? 'voltage' : 'current',
    scale: product(series.conversion, unit.factor),
    shift: product(series.offset, unit.factor),
    text: `${unit.name} × ${plain(series.conversion)}${offset} (${why}${gain})`,
  };
}

const asked = (series: Series, kind: 'voltage' | 'current', unit: string): string =>
  `table:\n  ${kind}: { columns: ["${series.name}"], unit: ${unit} }`;

/**
 * A stated unit is taken as stated. Where the unit contradicts the class of the series, or says nothing, a few samples
 * decide if they can decide alone; that is a finding. Otherwise the series is refused with the question to answer.
 */
export function settleUnit(series: Series, hints: ReadingHints): Settled {
  const stated = statedUnit(series, hints);
  if (stated) return { scaling: scalingWith(series, stated, 'sidecar'), problems: [] };
  const { unit, unitText, type } = series;
  const wanted = expected[type];
  const electric = unit?.dimension === 'voltage' || unit?.dimension === 'current';
  if (unit && electric && (wanted === undefined || wanted === unit.dimension))
    return { scaling: scalingWith(series, unit, `file says ${unitText}`), problems: [] };
  return unit && electric ? settleContradiction(series, unit) : settleUnknown(series, wanted);
}

function settleContradiction(series: Series, unit: Unit): Settled {
  const { type, unitText, data } = series;
  const largest = glance(series);
  const place = data.path;
  const base = { place, code: 'UNIT_CONTRADICTS_TYPE' };
  const size = largest === null ? 'they cannot be judged' : `they reach ${plain(largest)}`;
  const byPotential = largest === null ? null : potentialUnitBySize(largest);
  if (unit.dimension === 'current') {
    // A series whose class makes it a potential, in amperes.
    const asCurrent = largest !== null && canBeCurrent(largest * unit.factor);
    if (byPotential && !asCurrent) {
      const meant = parseUnit(byPotential)!;
      return {
        scaling: scalingWith(series, meant, `file says ${unitText}, numbers fit ${meant.name}`),
        problems: [
          warning({
            ...base,
            message: `The unit says "${unitText}", the class ${type} makes it a potential. The samples were looked at: ${size}, which is a membrane potential in ${meant.name} and no current, and are read so.`,
            remedy: `Correct the unit in the file, or state it in the sidecar.`,
            sidecar: asked(series, 'voltage', byPotential),
          }),
        ],
      };
    }
    if (asCurrent && !byPotential) return { scaling: trust(series, unit), problems: [otherClamp(series, size)] };
  } else {
    const mv = largest === null ? 0 : largest * unit.factor;
    if (canBePotential(mv)) return { scaling: trust(series, unit), problems: [otherClamp(series, size)] };
    if (largest !== null && canBeCurrent(largest * 1e12)) {
      const meant = parseUnit('A')!;
      return {
        scaling: scalingWith(series, meant, `file says ${unitText}, numbers fit A`),
        problems: [
          warning({
            ...base,
            message: `The unit says "${unitText}", the class ${type} makes it a current. The samples were looked at: ${size}, which is a current in amperes and no potential, and are read so.`,
            remedy: 'Correct the unit in the file, or state it in the sidecar.',
            sidecar: asked(series, 'current', 'A'),
          }),
        ],
      };
    }
  }
  const kind = unit.dimension === 'current' ? 'voltage' : 'current';
  return {
    scaling: null,
    problems: [
      blocker({
        ...base,
        message: `The unit says "${unitText}", the class ${type} makes it a ${kind === 'voltage' ? 'potential' : 'current'}, and the samples do not decide it (${size}).`,
        remedy: 'State what the samples are in the sidecar: voltage or current, with its unit.',
        sidecar: asked(series, kind, kind === 'voltage' ? 'mV' : 'pA'),
        sweep_key: series.path,
      }),
    ],
  };
}

const trust = (series: Series, unit: Unit): Scaling => scalingWith(series, unit, `file says ${series.unitText}`);

const otherClamp = (series: Series, size: string): Problem =>
  warning({
    code: 'CLAMP_CONTRADICTS_DATA',
    place: series.path,
    message: `The class is ${series.type}, but the unit says "${series.unitText}" and the samples agree with the unit (${size}). The samples are trusted.`,
    remedy: 'Check the clamp mode; write the series with the class that fits.',
  });

function settleUnknown(series: Series, wanted: 'voltage' | 'current' | undefined): Settled {
  const largest = glance(series);
  const place = series.data.path;
  const said = series.unitText === '' ? 'No unit is given' : `The unit says "${series.unitText}", which names none`;
  const potential = largest === null ? null : potentialUnitBySize(largest);
  const guess = wanted === 'current' ? (largest !== null && canBeCurrent(largest * 1e12) ? 'A' : null) : potential;
  if (guess !== null && wanted !== undefined) {
    const meant = parseUnit(guess)!;
    return {
      scaling: scalingWith(series, meant, `file says "${series.unitText}", ${meant.name} guessed from the numbers`),
      problems: [
        warning({
          code: 'UNIT_GUESSED',
          place,
          message: `${said}. The class makes it a ${wanted === 'voltage' ? 'potential' : 'current'}, the samples reach ${plain(largest!)}, and only ${meant.name} fits, so ${meant.name} is taken.`,
          remedy: 'State the unit in the sidecar, or correct it in the file.',
          sidecar: asked(series, wanted, guess),
        }),
      ],
    };
  }
  const kind = wanted ?? 'voltage';
  return {
    scaling: null,
    problems: [
      blocker({
        code: 'UNIT_UNKNOWN',
        place,
        message: `${said}, and the samples do not tell (${largest === null ? 'only zeros were seen' : `they reach ${plain(largest)}`}).`,
        remedy: `State the unit in the sidecar${wanted === undefined ? ', and whether this is the voltage or the current' : ''}.`,
        sidecar: asked(series, kind, kind === 'voltage' ? 'mV' : 'pA'),
        sweep_key: series.path,
      }),
    ],
  };
}
