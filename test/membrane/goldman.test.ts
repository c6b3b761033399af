import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import { goldmanPotential, type PermeantIon } from '../../pipeline/membrane/goldman.ts';
import { nernstPotential } from '../../pipeline/membrane/nernst.ts';

/** Potassium, sodium, chloride in that order, as the examples are printed. */
const threeIons = (permeability: number[], inside: number[], outside: number[]): PermeantIon[] =>
  ([1, 1, -1] as const).map((valence, at) => ({
    valence,
    permeability: permeability[at]!,
    insideMm: inside[at]!,
    outsideMm: outside[at]!,
  }));

describe('goldmanPotential(ions, celsius) refuses what has no answer', () => {
  it('no ions', () => expect(() => goldmanPotential([], 20)).toThrow(/Σ P·c of 0 against 0/));
  it('nothing permeant', () =>
    expect(() => goldmanPotential(threeIons([0, 0, 0], [1, 1, 1], [1, 1, 1]), 20)).toThrow(RangeError));
  it('one side empty', () =>
    expect(() => goldmanPotential([{ valence: 1, permeability: 1, insideMm: 140, outsideMm: 0 }], 20)).toThrow(
      /both sides/,
    ));
  it('a divalent ion, by its place', () =>
    expect(() => goldmanPotential([{ valence: 2 as 1, permeability: 1, insideMm: 1e-4, outsideMm: 2 }], 20)).toThrow(
      /ions\[0\]\.valence must be 1 or -1, got 2/,
    ));
  it('a negative permeability, by its place', () =>
    expect(() => goldmanPotential(threeIons([1, -1, 0], [1, 1, 1], [1, 1, 1]), 20)).toThrow(
      /ions\[1\]\.permeability .* got -1/,
    ));
  it('an impossible temperature', () =>
    expect(() => goldmanPotential(threeIons([1, 1, 1], [1, 1, 1], [1, 1, 1]), -300)).toThrow(/celsius .* got -300/));
});

/**
 * Name, P of K, Na, Cl, inside, outside, °C, stated, recomputed. Sources: Hodgkin & Katz 1949, J Physiol 108:37–77
 * (ratios and concentrations from memory); concentrations of Kandel et al., Principles of Neural Science (found
 * quoted; ratios and stated values from memory); a teaching page with RT/F = 26 mV (found).
 */
const examples: [string, number[], number[], number[], number, number | null, number][] = [
  ['squid rest', [1, 0.04, 0.45], [345, 72, 61], [10, 455, 540], 20, -59, -59.6816],
  ['squid peak', [1, 20, 0.45], [345, 72, 61], [10, 455, 540], 20, 38, 38.0272],
  ['squid undershoot', [1.8, 0, 0.45], [345, 72, 61], [10, 455, 540], 20, null, -74.3947],
  ['squid rest, other concentrations', [1, 0.04, 0.45], [400, 50, 52], [20, 440, 560], 20, -60, -59.9267],
  ['squid peak, other concentrations', [1, 20, 0.45], [400, 50, 52], [20, 440, 560], 20, 42, 42.3812],
  ['mammalian, potassium and sodium', [1, 0.04, 0], [140, 10, 0], [5, 145, 0], 28.56, -70, -66.687],
];
test.each(examples)('%s', (name, permeability, inside, outside, celsius, stated, recomputed) => {
  const mv = goldmanPotential(threeIons(permeability, inside, outside), celsius);
  expect(Math.abs(mv - recomputed)).toBeLessThan(6e-5);
  // The teaching page rounds −66.7 to "about −70"; the others are printed to 1 mV.
  if (stated !== null) expect(Math.abs(mv - stated)).toBeLessThan(name.startsWith('mammalian') ? 3.4 : 0.7);
});

const mm = fc.double({ min: 0.1, max: 600, noNaN: true });
const weight = fc.double({ min: 0.01, max: 20, noNaN: true });
const three = fc.tuple(
  fc.tuple(weight, weight, weight),
  fc.tuple(mm, mm, mm),
  fc.tuple(mm, mm, mm),
  fc.double({ min: 0, max: 40, noNaN: true }),
);
describe('laws', () => {
  it('one ion alone sits at its Nernst potential', () =>
    fc.assert(
      fc.property(fc.constantFrom(1 as const, -1 as const), mm, mm, (valence, inside, outside) => {
        const mv = goldmanPotential([{ valence, permeability: 3, insideMm: inside, outsideMm: outside }], 22);
        expect(mv).toBeCloseTo(nernstPotential(valence, outside, inside, 22), 8);
      }),
      { seed: 11 },
    ));
  it('swapping the sides flips the sign', () =>
    fc.assert(
      fc.property(three, ([p, a, b, t]) => {
        expect(goldmanPotential(threeIons(p, a, b), t) + goldmanPotential(threeIons(p, b, a), t)).toBeCloseTo(0, 8);
      }),
      { seed: 12 },
    ));
  it('only ratios of permeabilities and of concentrations matter', () =>
    fc.assert(
      fc.property(three, weight, ([p, a, b, t], k) => {
        const scaled = (values: number[]): number[] => values.map((value) => value * k);
        const mv = goldmanPotential(threeIons(p, a, b), t);
        expect(goldmanPotential(threeIons(scaled(p), a, b), t)).toBeCloseTo(mv, 8);
        expect(goldmanPotential(threeIons(p, scaled(a), scaled(b)), t)).toBeCloseTo(mv, 8);
      }),
      { seed: 13 },
    ));
  it('lies between the lowest and the highest Nernst potential', () =>
    fc.assert(
      fc.property(three, ([p, a, b, t]) => {
        const single = ([1, 1, -1] as const).map((z, at) => nernstPotential(z, b[at]!, a[at]!, t));
        const mv = goldmanPotential(threeIons(p, a, b), t);
        expect(mv).toBeGreaterThanOrEqual(Math.min(...single) - 1e-9);
        expect(mv).toBeLessThanOrEqual(Math.max(...single) + 1e-9);
      }),
      { seed: 14 },
    ));
  it('the number of ions is free: a copy of half the weight twice is the same', () => {
    const [k, na, cl] = threeIons([1, 0.04, 0.45], [345, 72, 61], [10, 455, 540]) as [
      PermeantIon,
      PermeantIon,
      PermeantIon,
    ];
    const half = { ...k, permeability: 0.5 };
    expect(goldmanPotential([half, half, na, cl], 20)).toBeCloseTo(goldmanPotential([k, na, cl], 20), 10);
  });
});
