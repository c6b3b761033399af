/** What is promised of the numbers of fast spikes, on a few recordings of known truth; the whole grid is the bench. */
import { expect, test } from 'vitest';
import { cells, cleanSweeps, conditions, trialsOf } from './current-clamp.ts';
import { broken, errorOf, type Limit, score, type Trial } from './score.ts';

/** One firing step each: a few spikes of every model. */
const steps: Record<string, number> = {
  'regular spiking': 1200,
  'fast spiking': 100,
  'fast spiking, 36 °C': 500,
  'axon, 18.5 °C': 1200,
};
const usual = '20 kHz, filter 8 kHz';
const fast = '50 kHz, filter 20 kHz, 0.02 mV';
const wanted = [usual, '20 kHz, filter 10 kHz', fast, '10 kHz, filter 4 kHz', '20 kHz, filter 8 kHz unstated'];

const trials: Trial[] = cells().flatMap((cell) => {
  const pa = steps[cell.name];
  if (pa === undefined) return [];
  const own = { ...cell, steps: [pa], end_s: 0.3, seconds: 0.35 };
  const clean = cleanSweeps(own);
  return conditions
    .filter(({ name }) => wanted.includes(name))
    .flatMap((under) => [...trialsOf(own, clean, under, 1)].filter(({ family }) => family === 'spikes'));
});

const at20 = /^20 kHz, filter (8|10) kHz/;
const at50 = /^50 kHz/;
const every = /./;
/** The figures that the project set itself before it measured any of them. */
const limits: Limit[] = [
  { quantity: 'spikes', condition: every, within: 0, measure: 'absolute' },
  { quantity: 'spike found', condition: every, within: 0, measure: 'absolute' },
  { quantity: 'threshold_mv', condition: at20, subject: /spiking/, within: 1, measure: 'absolute' },
  // The stimulus alone drives this axon at 15 V/s, so that dV/dt creeps through 20 V/s: it grows by 76 V/s a millisecond
  // there (94 to 108 in the others), and noise moves the crossing by as much more. The half-width follows the level.
  { quantity: 'threshold_mv', condition: at20, subject: /axon/, within: 1.5, measure: 'absolute' },
  // Filter and electrode take 0.5 to 0.8 mV off the sharpest tops here (curvature of 2000 to 4000 mV/ms² times half the
  // variance of their impulse responses, 2.5·10⁻⁴ and 10⁻⁴ ms²): no reading of the recorded trace has them back, so that
  // the recorded peak of axon and fast-spiking cell is left out and the peak without the filter is held instead.
  { quantity: 'peak_mv', condition: at20, subject: /regular|36/, within: 0.6, measure: 'absolute' },
  { quantity: 'peak_corrected_mv', condition: at20, within: 0.5, measure: 'absolute', found: 0.6 },
  { quantity: 'spike_height_corrected_mv', condition: at20, within: 1, measure: 'absolute', found: 0.6 },
  { quantity: 'half_width_ms', condition: at20, subject: /spiking/, within: 0.02, measure: 'relative' },
  { quantity: 'half_width_ms', condition: at20, subject: /axon/, within: 0.025, measure: 'relative' },
  { quantity: 'ahp_minimum_mv', condition: at20, within: 0.3, measure: 'absolute' },
  { quantity: 'peak_at_s', condition: at20, within: 20e-6, measure: 'absolute' },
  { quantity: 'max_rise_corrected_v_per_s', condition: at20, within: 0.1, measure: 'relative', found: 0.6 },
  { quantity: 'threshold_mv', condition: at50, within: 0.4, measure: 'absolute' },
  { quantity: 'peak_mv', condition: at50, within: 0.2, measure: 'absolute' },
  { quantity: 'half_width_ms', condition: at50, within: 0.007, measure: 'relative' },
  { quantity: 'peak_at_s', condition: at50, within: 8e-6, measure: 'absolute' },
  { quantity: 'max_rise_corrected_v_per_s', condition: at50, within: 0.06, measure: 'relative' },
];

test.each(limits)('$quantity under $condition, $subject', (limit) => {
  expect(broken(limit, trials)).toEqual([]);
});

/** Half-widths of all those conditions together, 10 kHz included. */
test.each([
  'threshold_mv',
  'peak_mv',
  'spike_height_mv',
  'half_width_ms',
  'ahp_minimum_mv',
  'depolarization_ms',
  'repolarization_ms',
  'max_rise_v_per_s',
  'max_fall_v_per_s',
  'max_rise_corrected_v_per_s',
  'spike_height_corrected_mv',
  'half_width_corrected_ms',
])('half-widths of %s hold the truth', (quantity) => {
  const own = trials.filter((trial) => trial.quantity === quantity);
  const { held, withWidth, measured } = score(own);
  expect(withWidth).toBe(measured);
  // 95 % of some 200 spikes, which share their models' errors.
  expect(held).toBeGreaterThan(0.88);
});

test('the filter takes from rise and height, and undoing it brings both nearer to the truth', () => {
  for (const [recorded, corrected] of [
    ['max_rise_v_per_s', 'max_rise_corrected_v_per_s'],
    ['peak_mv', 'peak_corrected_mv'],
    ['half_width_ms', 'half_width_corrected_ms'],
  ] as const) {
    const size = (quantity: string): number => {
      const own = trials.filter((trial) => trial.quantity === quantity && at20.test(trial.condition));
      const errors = own.filter(({ value }) => value !== null).map((trial) => errorOf(trial));
      return Math.abs(errors.reduce((sum, error) => sum + error, 0) / errors.length);
    };
    expect(size(corrected), corrected).toBeLessThan(0.6 * size(recorded));
  }
});
