import { describe, expect, test } from 'vitest';
import { compare } from '../../pipeline/judge/compare.ts';
import {
  amount,
  amountWithin,
  celsius,
  count,
  difference,
  listed,
  span,
  tell,
  tellMissing,
} from '../../pipeline/judge/sentences.ts';
import { finding, read } from './made.ts';

describe('numbers in words', () => {
  test.each([
    ['a potential above the bath', amount('peak_mv', 72.4), '+72.4 mV'],
    ['a potential below it', amount('peak_mv', -0.04), '−0.04 mV'],
    ['zero has no sign', amount('peak_mv', 0), '0.0 mV'],
    ['a width', amount('half_width_ms', 0.84), '0.840 ms'],
    ['a potential with its half-width', amountWithin('peak_mv', 61.53, 0.42), '+61.5 ± 0.4 mV'],
    ['two digits of a half-width at most', amountWithin('input_resistance_mohm', -346, 123), '−350 ± 120 MΩ'],
    ['a half-width that would round away is rounded up', amountWithin('peak_mv', -61.53, 0.01), '−61.5 ± 0.1 mV'],
    ['a share with its half-width', amountWithin('sag_fraction', 0.124, 0.031), '12 ± 3 %'],
    ['no half-width', amountWithin('peak_mv', 61.53, null), '+61.5 mV'],
    ['a count', amount('rise_samples', 4), '4'],
    ['a share', amount('clipped_fraction', 0.0003), '0.03 %'],
    ['a tiny share is not shown as none', amount('missing_fraction', 0.0000012), '0.00012 %'],
    ['a difference has no sign', difference('peak_mv', -11.93), '11.9 mV'],
    ['a difference that would round away', difference('peak_mv', 0.012), '0.012 mV'],
    ['a span says its unit once', span('half_width_ms', 0.3, 1.6), '0.300 to 1.600 ms'],
    ['a span without a lower end', span('sag_fraction', null, 0.35), 'at most 35 %'],
    ['a span without an upper end', span('peak_mv', 10, null), 'at least +10.0 mV'],
    ['a whole temperature', celsius(33), '33 °C'],
    ['a temperature with a tenth', celsius(32.54), '32.5 °C'],
    ['one', count(1, 'sweep'), '1 sweep'],
    ['several', count(0, 'sweep'), '0 sweeps'],
    ['a list', listed(['a', 'b', 'c']), 'a, b and c'],
  ])('%s', (_name, text, expected) => expect(text).toBe(expected));
  test('an unknown quantity is our own bug and says so', () => expect(() => amount('nonsense', 1)).toThrow(/nonsense/));
});

describe('sentences', () => {
  const peak = (value: number, cell = {}) =>
    finding('peak-below-sodium', { readings: { peak_mv: read(value, { u95: 0 }) }, ...cell }).sentence;
  test('outside', () =>
    expect(peak(72.4)).toBe(
      'The peak of the first spike (sweep 0), +72.4 mV, lies 11.9 mV above E_Na (+60.5 mV at 33 °C); no sodium spike can do that.',
    ));
  test('near the limit', () =>
    expect(peak(61.5)).toBe(
      'The peak of the first spike (sweep 0), +61.5 mV, lies 1.0 mV above E_Na (+60.5 mV at 33 °C): number and limit together are known to ±3.0 mV, and the 95 % interval, +58.5 to +64.5 mV, straddles the limit.',
    ));
  test('near the limit, with the number’s own half-width beside it', () =>
    expect(finding('peak-below-sodium', { readings: { peak_mv: read(61.5, { u95: 0.42 }) } }).sentence).toMatch(
      /^The peak of the first spike \(sweep 0\), \+61\.5 ± 0\.4 mV, lies 1\.0 mV above E_Na .* straddles the limit\.$/,
    ));
  test('where nothing but the number is uncertain, the interval is its own', () =>
    expect(finding('noise', { readings: { noise_rms_mv: read(0.48, { u95: 0.05 }) } }).sentence).toBe(
      'The noise, 0.480 ± 0.050 mV, lies 0.020 mV below 0.5 mV: its 95 % interval, 0.430 to 0.530 mV, straddles the limit.',
    ));
  test('ends that would look like the limit get more decimals', () =>
    expect(
      finding('access-resistance', { readings: { access_resistance_mohm: read(35, { u95: 0.02 }) } }).sentence,
    ).toBe(
      'The access resistance, 35.0 ± 0.1 MΩ, lies exactly at the 35 MΩ up to which published work accepts whole-cell recordings: its 95 % interval, 34.98 to 35.02 MΩ, straddles the limit.',
    ));
  test.each([
    [120, 50, 'lies 39 pF inside the range (81 to 500 pF): its 95 % interval, 70 to 170 pF, straddles the lower end.'],
    [480, 50, 'lies 20 pF inside the range (81 to 500 pF): its 95 % interval, 430 to 530 pF, straddles the upper end.'],
    [70, 50, 'lies 11 pF below the range (81 to 500 pF): its 95 % interval, 20 to 120 pF, straddles the lower end.'],
    [510, 50, 'lies 10 pF above the range (81 to 500 pF): its 95 % interval, 460 to 560 pF, straddles the upper end.'],
    [
      81,
      50,
      'lies exactly at an end of the range (81 to 500 pF): its 95 % interval, 31 to 131 pF, straddles the lower end.',
    ],
    [300, 400, 'lies 200 pF inside the range (81 to 500 pF): its 95 % interval, −100 to 700 pF, straddles both ends.'],
    [200, 50, 'lies within the range (81 to 500 pF).'],
  ])('near either end of a range, %d ± %d pF is told on the side where it is', (value, u95, expected) => {
    const name = 'the range (81 to 500 pF)';
    const telling = { quantity: 'membrane_capacitance_pf', subject: 'the membrane capacitance', value, u95, n: 1 };
    const limits = { low: 81, high: 500, lowName: name, highName: name, uncertainty: u95 };
    const rest = { comparison: compare(value, 81, 500, u95), meaning: '', condition: null, remark: '' };
    expect(tell({ ...telling, ...limits, ...rest })).toBe(
      `The membrane capacitance, ${value} ± ${u95} pF, ${expected}`,
    );
  });
  test('within', () =>
    expect(peak(40)).toBe(
      'The peak of the first spike (sweep 0), +40.0 mV, stays 20.5 mV below E_Na (+60.5 mV at 33 °C).',
    ));
  test('outside under both readings says which one it speaks of', () =>
    expect(peak(90, { circumstances: { reading: 'recorded', junction: 'unstated', ljp_applied_mv: 0 } })).toBe(
      'The peak of the first spike (sweep 0), +90.0 mV, read as +75.8 mV with the junction potential removed, lies 15.3 mV above E_Na (+60.5 mV at 33 °C); no sodium spike can do that.',
    ));
  test('undecided without the junction state', () =>
    expect(peak(70, { circumstances: { reading: 'recorded', junction: 'unstated', ljp_applied_mv: 0 } })).toBe(
      'The peak of the first spike (sweep 0), +70.0 mV, comes out differently against E_Na (+60.5 mV at 33 °C) with and without the junction potential; state “junction” to settle it.',
    ));
  test('a missing fact is named', () =>
    expect(tellMissing('the peak of the first spike', 'E_Na is not known', ['bath', 'pipette'], null)).toBe(
      'The peak of the first spike was not judged: E_Na is not known. State “bath” and “pipette” to have it judged.',
    ));
  test('a later condition is named first', () =>
    expect(tellMissing('the noise', 'it was not measured', [], 'TTX')).toBe(
      'In the condition “TTX”, the noise was not judged: it was not measured.',
    ));
  test('n stands beside a median', () =>
    expect(finding('rest-above-potassium').sentence).toBe(
      'The resting potential, −79.0 ± 0.4 mV (n = 12), stays 25.0 mV above E_K (−104.0 mV at 33 °C).',
    ));
});
