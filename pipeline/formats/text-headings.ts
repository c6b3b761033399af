/** What a column's heading says about it. */
import { parseUnit, type Unit } from './units.ts';

export type ColumnKind = 'time' | 'voltage' | 'current' | 'number of row or sweep' | 'unknown';

export interface Heading {
  text: string;
  kind: ColumnKind;
  /** As stated in the heading; null where it states none. */
  unit: Unit | null;
  /** True where name and unit say different things; the unit decides. */
  contradictory: boolean;
}

const timeNames = /^(?:time|times|t|zeit|temps|tiempo|tempo|tijd|tid|sec|secs|seconds|msec)$/;
const voltageNames =
  /^(?:.*(?:voltage|potential|spannung|potenti[ea]l|tension|voltaje|membran).*|v|vm|u|um|em|e|vmem|v_?m|v_?soma|v_?cmd|volts?)$/;
const currentNames =
  /^(?:.*(?:current|strom|courant|corriente|stimul|stim|inject).*|i|im|iinj|i_?m|i_?inj|istim|i_?stim|amps?)$/;
const countNames = /^(?:|index|idx|sample|samples|row|line|no|nr|n|#|point|points|sweep|trial|episode|unnamed.*)$/;

/** Unit at the end of a heading: 'Voltage (mV)', 'I [pA/pF]', 'time/ms', 'Vm_mV', 'Time, s', 'current in nA'. */
function unitIn(text: string): { name: string; unit: Unit } | null {
  const forms = [
    /^(.*?)\s*[([{]\s*([^()[\]{}]+?)\s*[)\]}]\s*(.*)$/,
    /^(.+?)\s+in\s+(\S+)()$/i,
    /^(.+?)\s*[,:]\s*(\S+)()$/,
    /^(.+?)\s*\/\s*([^\s/]+)()$/,
    /^(.+?)[_\s]+([A-Za-zµμ]+(?:\/[A-Za-z]+)?)()$/,
  ];
  for (const form of forms) {
    const match = form.exec(text);
    const unit = match && parseUnit(match[2]!);
    // A lone A or V behind a name with a blank is as likely a channel's letter as a unit.
    if (match && unit && !(form === forms[4] && /^[AVsS]$/.test(match[2]!)))
      return { name: `${match[1]} ${match[3]}`.trim(), unit };
  }
  return null;
}

/** 'mV' or 'pA' alone is a unit; 'V' and 'A' alone may be names. */
function unitAlone(text: string): Unit | null {
  return /^(?:[mµμun]V|[mµμunpf]A|[mµμun]?s|m?sec|p?A\/p?F)$/i.test(text) ? parseUnit(text) : null;
}

const kindByUnit: Record<Unit['dimension'], ColumnKind> = {
  voltage: 'voltage',
  current: 'current',
  'current per capacitance': 'current',
  time: 'time',
};

function kindByName(name: string): ColumnKind {
  const plainName = name
    .toLowerCase()
    .replace(/["']/g, '')
    .replace(/[\s_-]*\d+$/, '')
    .trim();
  if (timeNames.test(plainName) || /^time\b/.test(plainName)) return 'time';
  if (currentNames.test(plainName)) return 'current';
  if (voltageNames.test(plainName)) return 'voltage';
  return countNames.test(plainName) ? 'number of row or sweep' : 'unknown';
}

export function parseHeading(text: string): Heading {
  const trimmed = text.trim();
  const alone = unitAlone(trimmed);
  if (alone) return { text: trimmed, kind: kindByUnit[alone.dimension], unit: alone, contradictory: false };
  const stated = unitIn(trimmed);
  if (!stated) return { text: trimmed, kind: kindByName(trimmed), unit: null, contradictory: false };
  // '-50 pA' over a column says under which stimulus it was recorded, not what it holds.
  if (/^[+\-−]?\d+(?:[.,]\d+)?$/.test(stated.name))
    return { text: trimmed, kind: 'unknown', unit: null, contradictory: false };
  const kind = kindByUnit[stated.unit.dimension];
  const byName = kindByName(stated.name);
  const contradictory =
    ['time', 'voltage', 'current'].includes(byName) && byName !== kind && !/stim/i.test(stated.name);
  return { text: trimmed, kind, unit: stated.unit, contradictory };
}
