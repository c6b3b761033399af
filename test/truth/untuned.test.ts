/** Spikes of models that nothing was tuned on: found, and their half-widths worth their name. */
import { expect, test } from 'vitest';
import { cleanSweeps, conditions, trialsOf } from './current-clamp.ts';
import { score, type Trial } from './score.ts';
import { untunedCells } from './untuned.ts';

const wanted = ['20 kHz, filter 8 kHz', '10 kHz, filter 4 kHz'];
const trials: Trial[] = untunedCells().flatMap((cell) => {
  const own = { ...cell, steps: cell.steps.slice(1), end_s: 0.3, seconds: 0.36 };
  const clean = cleanSweeps(own);
  return conditions
    .filter(({ name }) => wanted.includes(name))
    .flatMap((under) => [...trialsOf(own, clean, under, 1)].filter(({ family }) => family === 'spikes'));
});

test('no spike is missed or invented', () =>
  expect(
    trials.filter(
      ({ quantity, value, truth }) => (quantity === 'spikes' || quantity === 'spike found') && value !== truth,
    ),
  ).toEqual([]));

test.each([
  'threshold_mv',
  'peak_mv',
  'spike_height_mv',
  'half_width_ms',
  'max_rise_v_per_s',
  'max_fall_v_per_s',
  'ahp_minimum_mv',
  'peak_at_s',
])('half-widths of %s hold the truth', (quantity) => {
  const { held, withWidth } = score(trials.filter((trial) => trial.quantity === quantity));
  expect(withWidth).toBeGreaterThan(40);
  // 95 % of some hundred numbers that are not independent: spikes of one cell err alike.
  expect(held!).toBeGreaterThan(0.86);
});
