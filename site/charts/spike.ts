/** One spike at full resolution with its four phases, and the same spike in the phase plane. */
import type { Excerpt, Phase, Spike } from '../../pipeline/measure/types.ts';
import { inFull, number, withHalfWidth } from '../format.ts';
import {
  type Chart,
  domainOf,
  element,
  type Frame,
  label,
  level,
  line,
  path,
  picture,
  type Scale,
  xAxis,
  xScale,
  yAxis,
  yScale,
} from './frame.ts';
import { simplified } from './reduce.ts';

export interface SpikeChartInput {
  excerpt: Excerpt;
  spike: Spike;
  e_na_mv: number | null;
  e_k_mv: number | null;
}

const phaseWords: Record<Phase['name'], string> = {
  depolarization: 'depolarization',
  repolarization: 'repolarization',
  afterhyperpolarization: 'after-hyperpolarization',
  recovery: 'recovery',
};

const signWords: Record<string, string> = { '-1': 'inward', '0': 'not resolved', '1': 'outward' };

/** Current signs are said with a word, since a plus and a minus would be read as a charge. */
export const signWord = (sign: number): string => signWords[String(sign)] ?? 'not resolved';

const value = (spike: Spike, id: string): number | null => spike.values[id] ?? null;

/** '−45.2 ± 0.3', with the unit where it is wanted. */
const told = (spike: Spike, id: string, unit = false): string =>
  (unit ? inFull : withHalfWidth)(id, spike.values[id]!, spike.u95?.[id]);

function thinned(points: [number, number][], x: Scale, y: Scale): string {
  const same = ((one: number) => one) as unknown as Scale;
  const plotted = points.map(([a, b]) => [x(a), y(b)] as [number, number]);
  const runs: [number, number][][] = [[]];
  for (const point of plotted) {
    if (Number.isFinite(point[0]) && Number.isFinite(point[1])) runs.at(-1)!.push(point);
    else runs.push([]);
  }
  return runs
    .filter((run) => run.length > 1)
    .map((run) => path(simplified(run, 0.15), same, same))
    .join('');
}

/** How much of the excerpt is worth drawing: to a little past the afterhyperpolarization, or the whole. */
function windowMs(input: SpikeChartInput, zeroS: number): [number, number] {
  const { excerpt, spike } = input;
  const endS = excerpt.start_s + (excerpt.mv.length - 1) / excerpt.rate_hz;
  const startMs = (excerpt.start_s - zeroS) * 1000;
  const endMs = (endS - zeroS) * 1000;
  const half = value(spike, 'half_width_ms') ?? value(spike, 'apd50_ms');
  if (half === null) return [startMs, endMs];
  const ahp = spike.phases.find((phase) => phase.name === 'afterhyperpolarization');
  const toAhp = ahp ? (ahp.to_s - zeroS) * 1000 : 0;
  const peak = value(spike, 'peak_at_s');
  const toPeak = peak === null ? 0 : (peak - zeroS) * 1000;
  const apd90 = value(spike, 'apd90_ms') ?? 0;
  const wanted = Math.max(toPeak + 9 * half, Math.min(toAhp * 1.15, toPeak + 22 * half), apd90 * 1.3);
  return [Math.max(startMs, -Math.max(3 * half, 1)), Math.min(endMs, wanted)];
}

/**
 * @returns null when the excerpt is too short to draw
 */
export function spikeChart(input: SpikeChartInput): Chart | null {
  const { excerpt, spike } = input;
  if (excerpt.mv.length < 3) return null;
  const zeroS = value(spike, 'threshold_at_s') ?? value(spike, 'peak_at_s') ?? excerpt.start_s;
  const [fromMs, toMs] = windowMs(input, zeroS);
  const points = excerpt.mv
    .map((mv, i) => [(excerpt.start_s + i / excerpt.rate_hz - zeroS) * 1000, mv ?? Number.NaN] as [number, number])
    .filter(([t]) => t >= fromMs && t <= toMs);
  const frame: Frame = { width: 540, height: 400, margins: { top: 26, right: 16, bottom: 56, left: 54 } };
  const equilibria = [input.e_na_mv, input.e_k_mv].filter((one): one is number => one !== null);
  const domain = domainOf(
    points.map(([, mv]) => mv),
    equilibria,
  );
  if (!domain || points.length < 3) return null;
  const x = xScale(frame, [fromMs, toMs]);
  const y = yScale(frame, domain);
  const left = frame.margins.left;
  const right = frame.width - frame.margins.right;
  const bottom = frame.height - frame.margins.bottom;
  const parts = [
    ...phaseBands(spike.phases, zeroS, x, frame),
    yAxis(y, left, 'Membrane potential', 'mV', right),
    ...(input.e_na_mv === null
      ? []
      : [level(y, input.e_na_mv, left, right, `E_Na ${number(input.e_na_mv, 0)} mV`, 'above')]),
    ...(input.e_k_mv === null
      ? []
      : [level(y, input.e_k_mv, left, right, `E_K ${number(input.e_k_mv, 0)} mV`, 'below')]),
    element('path', { d: thinned(points, x, y), class: 'trace' }),
    ...landmarks(spike, zeroS, x, y),
    xAxis(x, bottom + 18, 'Time from threshold', 'ms', 6),
  ];
  return picture(frame, spikeAlt(spike, input), parts.join(''));
}

/** A band for each phase along the foot of the chart, its number in it; the legend beside the chart spells it out. */
function phaseBands(phases: readonly Phase[], zeroS: number, x: Scale, frame: Frame): string[] {
  const bottom = frame.height - frame.margins.bottom;
  const [low, high] = x.domain() as [number, number];
  return phases.flatMap((phase, index) => {
    const from = Math.max(low, (phase.from_s - zeroS) * 1000);
    const to = Math.min(high, (phase.to_s - zeroS) * 1000);
    if (!(to > from)) return [];
    const at = x(from);
    const width = Math.max(0.5, x(to) - at);
    return [
      element('rect', {
        x: at,
        y: frame.margins.top,
        width,
        height: bottom - frame.margins.top,
        class: `phase phase-${index + 1}`,
      }),
      element('rect', { x: at, y: bottom + 3, width, height: 11, class: `phase-foot phase-${index + 1}` }),
      width > 9 ? label(at + width / 2, bottom + 12.5, String(index + 1), 'phase-number', 'middle') : '',
    ];
  });
}

function landmarks(spike: Spike, zeroS: number, x: Scale, y: Scale): string[] {
  const threshold = value(spike, 'threshold_mv');
  const peak = value(spike, 'peak_mv');
  const peakAt = value(spike, 'peak_at_s');
  const parts: string[] = [];
  const [low, high] = x.domain() as [number, number];
  if (threshold !== null && low <= 0 && high >= 0) {
    parts.push(element('circle', { cx: x(0), cy: y(threshold), r: 3.5, class: 'landmark' }));
    const text = `threshold ${told(spike, 'threshold_mv')}`;
    // Beside the rise where the rise stands too near the axis for a name on its left.
    if (x(0) - x(low) > 100) parts.push(label(x(0) - 8, y(threshold) - 6, text, 'landmark-name', 'end'));
    else parts.push(label(x(0) + 12, y(threshold) + 4, text, 'landmark-name'));
  }
  if (peak !== null && peakAt !== null) {
    const at = x((peakAt - zeroS) * 1000);
    parts.push(element('circle', { cx: at, cy: y(peak), r: 3.5, class: 'landmark' }));
    parts.push(label(at + 8, y(peak) + 4, `peak ${told(spike, 'peak_mv')}`, 'landmark-name'));
  }
  const width = value(spike, 'half_width_ms');
  const height = value(spike, 'spike_height_mv');
  if (threshold !== null && width !== null && height !== null && peakAt !== null) {
    const mv = threshold + height / 2;
    const middle = (peakAt - zeroS) * 1000;
    // The width is not centred on the peak: it is drawn where it lies only as far as the numbers say, beside the fall.
    parts.push(
      label(x(middle + width) + 6, y(mv) + 4, `half-width ${told(spike, 'half_width_ms', true)}`, 'landmark-name'),
    );
  }
  return parts;
}

function spikeAlt(spike: Spike, input: SpikeChartInput): string {
  const peak = value(spike, 'peak_mv');
  const threshold = value(spike, 'threshold_mv');
  const parts = [
    'One spike at full resolution',
    threshold === null ? '' : `threshold ${told(spike, 'threshold_mv', true)}`,
    peak === null ? '' : `peak ${told(spike, 'peak_mv', true)}`,
    input.e_na_mv === null ? '' : `E_Na ${number(input.e_na_mv, 0)} mV`,
    input.e_k_mv === null ? '' : `E_K ${number(input.e_k_mv, 0)} mV`,
  ].filter((part) => part !== '');
  const phases = spike.phases
    .map(
      (phase, index) => `${index + 1} ${phaseWords[phase.name]}, net ionic current ${signWord(phase.net_ionic_sign)}`,
    )
    .join('; ');
  return `${parts.join(', ')}.${phases === '' ? '' : ` Phases: ${phases}.`}`;
}

/** Samples to each side over which a slope is taken: one, or an eightieth of a broad spike's width. */
function reachOf(excerpt: Excerpt, spike: Spike): number {
  const width = value(spike, 'half_width_ms') ?? value(spike, 'apd50_ms') ?? 0;
  return Math.max(1, Math.round((width * excerpt.rate_hz) / 1000 / 80));
}

/**
 * dV/dt against V: central differences over the excerpt. From sample to sample a slow spike's slope is all noise, so
 * there it is taken over a longer stretch, which the axis names.
 */
export function phasePlane(excerpt: Excerpt, spike: Spike): Chart | null {
  const { mv, rate_hz } = excerpt;
  const reach = reachOf(excerpt, spike);
  if (mv.length < 2 * reach + 3) return null;
  const points: [number, number][] = [];
  for (let i = reach; i < mv.length - reach; i++) {
    const before = mv[i - reach] ?? Number.NaN;
    const after = mv[i + reach] ?? Number.NaN;
    points.push([
      reach === 1 ? (mv[i] ?? Number.NaN) : (before + after) / 2,
      ((after - before) * rate_hz) / (2000 * reach),
    ]);
  }
  const over = reach === 1 ? '' : ` over ${number((2000 * reach) / rate_hz, 1)} ms`;
  const frame: Frame = { width: 540, height: 400, margins: { top: 26, right: 16, bottom: 56, left: 54 } };
  const xDomain = domainOf(points.map(([v]) => v));
  const yDomain = domainOf(
    points.map(([, rate]) => rate),
    [0],
  );
  if (!xDomain || !yDomain) return null;
  const x = xScale(frame, xDomain);
  const y = yScale(frame, yDomain);
  const bottom = frame.height - frame.margins.bottom;
  const threshold = value(spike, 'threshold_mv');
  const parts = [
    yAxis(y, frame.margins.left, `Rate of change${over}`, 'V/s', frame.width - frame.margins.right),
    threshold === null
      ? ''
      : line(x(threshold), frame.margins.top, x(threshold), bottom, 'level') +
        label(x(threshold) + 4, frame.margins.top + 10, `threshold ${told(spike, 'threshold_mv')}`, 'level-name'),
    element('path', { d: thinned(points, x, y), class: 'trace' }),
    xAxis(x, bottom + 18, 'Membrane potential', 'mV', 6),
  ];
  const rise = value(spike, 'max_rise_v_per_s');
  const fall = value(spike, 'max_fall_v_per_s');
  const alt = `Phase plane of the same spike${rise === null ? '' : `: rises at up to ${told(spike, 'max_rise_v_per_s', true)}`}${fall === null ? '' : `, falls at up to ${told(spike, 'max_fall_v_per_s', true)}`}.`;
  return picture(frame, alt, parts.join(''));
}
