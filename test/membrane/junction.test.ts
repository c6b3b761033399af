import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import {
  type DissolvedIon,
  hendersonPotential,
  type JunctionIon,
  junctionPotential,
} from '../../pipeline/membrane/junction.ts';
import { mobilityOf, tabulatedIons } from '../../pipeline/membrane/mobilities.ts';

const positive = new Set(['K', 'Na', 'Cs', 'Li', 'H']);
const divalent: Record<string, number> = { Mg: 2, Ca: 2, SO4: -2, HPO4: -2, 'EGTA2-': -2, 'nucleotide2-': -2 };
const ions = (millimolar: Record<string, number>): DissolvedIon[] =>
  Object.entries(millimolar).map(([ion, mm]) => ({
    ion,
    valence: divalent[ion] ?? (positive.has(ion) ? 1 : -1),
    millimolar: mm,
    uncertainty_mm: 0,
  }));
const ljp = (pipette: Record<string, number>, bath: Record<string, number>, celsius: number): number =>
  junctionPotential(ions(pipette), ions(bath), celsius).mv;

describe('junctionPotential(pipette, bath, celsius) refuses what has no answer', () => {
  it('no ions on a side', () => {
    expect(() => junctionPotential([], ions({ Na: 150, Cl: 150 }), 22)).toThrow(/pipette must hold .* got none/);
    expect(() => junctionPotential(ions({ Na: 150, Cl: 150 }), [], 22)).toThrow(/bath must hold .* got none/);
  });
  it('amounts and temperatures that cannot be', () => {
    expect(() => ljp({ K: -1, Cl: 1 }, { Na: 1, Cl: 1 }, 22)).toThrow(/pipette\[0\]\.millimolar .* got -1/);
    expect(() => ljp({ K: 1, Cl: 1 }, { Na: 1, Cl: 1 }, -274)).toThrow(/celsius .* got -274/);
  });
});

/**
 * Junctions of two 0.1 M chlorides with the chloride in common at 25 °C, where the equation is RT/F·ln(Λa/Λb):
 * equivalent conductances of Robinson & Stokes and MacInnes and the calculated and measured values of MacInnes 1939
 * and Bard & Faulkner (all from memory). Calculated and measured differ by up to 1.8 mV: that is the method's own
 * error, not ours, and stands here so that nobody tunes it away.
 */
test.each([
  ['HCl : KCl', 391.32, 128.96, 28.52, 26.78],
  ['HCl : NaCl', 391.32, 106.74, 33.38, 33.09],
  ['HCl : LiCl', 391.32, 95.86, 36.14, 34.86],
  ['KCl : NaCl', 128.96, 106.74, 4.86, 6.42],
  ['KCl : LiCl', 128.96, 95.86, 7.62, 8.76],
  ['NaCl : LiCl', 106.74, 95.86, 2.76, 2.62],
])('Lewis–Sargent: %s', (_name, first, second, calculated, measured) => {
  const chloride = 65; // any share of the conductance gives the same: it cancels
  const junction: JunctionIon[] = [
    { valence: 1, mobility: first - chloride, pipetteMm: 100, bathMm: 0 },
    { valence: 1, mobility: second - chloride, pipetteMm: 0, bathMm: 100 },
    { valence: -1, mobility: chloride, pipetteMm: 100, bathMm: 100 },
  ];
  const mv = hendersonPotential(junction, 25);
  expect(Math.abs(mv - calculated)).toBeLessThan(0.01);
  expect(Math.abs(mv - measured)).toBeLessThan(1.8);
});

/**
 * Label, pipette, bath, °C, stated in the paper (bath minus pipette), recomputed independently with the same
 * mobilities. Recipes and stated values found in papers for the first four (an article on preoptic neurons in eLife;
 * Surmeli et al. 2015, Neuron; Astori et al. 2010, J Physiol); the other stated values are from memory (Barry & Lynch
 * 1991; Neher 1992) or common practice. Henderson with concentrations lies 1–3 mV above what papers state for
 * gluconate: hence ±3.5 mV. Nucleotides stand as an ion of charge −2.
 */
const acsf = { Na: 154, K: 3.5, Cl: 133.5, HCO3: 24 };
const saline = { Na: 140, K: 4, Cl: 150, Ca: 2, Mg: 1 };
const simpleAcsf = { Na: 150, K: 2.5, Cl: 128.5, HCO3: 25 };
const pairs: [string, Record<string, number>, Record<string, number>, number, number | null, number][] = [
  [
    'K-gluconate, ACSF, 36.5 °C',
    { K: 140, gluconate: 130, Cl: 9, Mg: 2, HEPES: 4, 'EGTA2-': 0.5 },
    { Na: 155.25, K: 3.5, Cl: 137.5, HCO3: 24, H2PO4: 0.25, HPO4: 0.5, Ca: 2, Mg: 1, SO4: 1 },
    36.5,
    13,
    15.433,
  ],
  ['the same, main salts', { K: 135, gluconate: 130, Cl: 5 }, acsf, 36.5, 13, 15.962],
  ['150 K-gluconate, 10 NaCl', { K: 153, Na: 10, gluconate: 150, Cl: 10, HEPES: 3 }, saline, 22, 13, 16.24],
  ['KCl', { K: 140, Cl: 140 }, saline, 22, 3.5, 4.54],
  ['CsCl', { Cs: 140, Cl: 140 }, saline, 22, 4.5, 5.137],
  ['Cs-gluconate', { Cs: 140, gluconate: 140 }, saline, 22, 15, 17.516],
  ['Cs-methanesulfonate', { Cs: 130, methanesulfonate: 125, Cl: 5 }, simpleAcsf, 32, 9.5, 10.157],
  ['K-methanesulfonate', { K: 135, methanesulfonate: 130, Cl: 5 }, simpleAcsf, 32, 9, 9.581],
  ['K-aspartate', { K: 140, aspartate: 130, Cl: 10 }, saline, 22, 13, 16.513],
  ['3 M KCl in 150 NaCl', { K: 3000, Cl: 3000 }, { Na: 150, Cl: 150 }, 25, null, -0.861],
  ['0.15 KCl in 0.15 NaCl', { K: 150, Cl: 150 }, { Na: 150, Cl: 150 }, 25, null, 4.364],
  ['dilution of NaCl', { Na: 145, Cl: 145 }, { Na: 75, Cl: 75 }, 22, null, -3.48],
];
test.each(pairs)('%s', (_label, pipette, bath, celsius, stated, recomputed) => {
  const { mv, uncertainty_mv } = junctionPotential(ions(pipette), ions(bath), celsius);
  expect(Math.abs(mv - recomputed)).toBeLessThan(6e-4);
  expect(uncertainty_mv).toBeCloseTo(3.5, 9);
  if (stated !== null) expect(Math.abs(mv - stated)).toBeLessThanOrEqual(3.52);
});

// Two pairs whose nucleotides the references give a guessed mobility of their own, so they are held to the stated
// value and, loosely, to the recomputed one.
test.each([
  [
    'Surmeli et al. 2015',
    { K: 144, Na: 24.6, gluconate: 130, Cl: 14, Mg: 2, HEPES: 4, 'EGTA2-': 0.1, 'nucleotide2-': 12.2 },
    { Na: 150.2, K: 2.5, Cl: 132.5, HCO3: 25, HPO4: 0.6, Ca: 2, Mg: 1 },
    32,
    12.5,
    15.376,
  ],
  [
    'Astori et al. 2010',
    { K: 134, Na: 34.6, gluconate: 140, Cl: 4, HEPES: 4, Mg: 1, 'nucleotide2-': 11.3 },
    { Na: 151.25, K: 2.5, Cl: 133.5, HCO3: 25, HPO4: 0.6, Ca: 2, Mg: 1, H2PO4: 0.05 },
    31,
    15.2,
    16.118,
  ],
])('with nucleotides: %s', (_label, pipette, bath, celsius, stated, recomputed) => {
  const { mv, uncertainty_mv, notes } = junctionPotential(ions(pipette), ions(bath), celsius);
  expect(Math.abs(mv - stated)).toBeLessThan(3.5);
  expect(Math.abs(mv - recomputed)).toBeLessThan(0.15);
  expect(uncertainty_mv).toBeGreaterThan(3.5);
  expect(notes.join(' ')).toMatch(/nucleotide2- is assumed/);
});

describe('sign and limit', () => {
  it('is bath minus pipette: positive for a slow anion inside, so that V_membrane = V_recorded − it is lower', () => {
    const mv = ljp({ K: 135, gluconate: 130, Cl: 5 }, acsf, 32);
    expect(mv).toBeGreaterThan(12);
    expect(mv).toBeLessThan(16.5);
  });
  it('has a limit where both sides conduct alike', () => {
    // By hand: K and Cl against K and Br with a mobility chosen so that Σz²ua agree: RT/F·(−Σzu(aB − aP))/Σ.
    const alike = (bathMobility: number): number =>
      hendersonPotential(
        [
          { valence: 1, mobility: 2, pipetteMm: 100, bathMm: 0 },
          { valence: 1, mobility: bathMobility, pipetteMm: 0, bathMm: 100 },
          { valence: -1, mobility: 3, pipetteMm: 100, bathMm: 0 },
          { valence: -1, mobility: 5 - bathMobility, pipetteMm: 0, bathMm: 100 },
        ],
        25,
      );
    // drive = 1·100 − 2·100 − (4·100 − 3·100) = −200; conductance 500: 25.69258·0.4
    expect(alike(1)).toBeCloseTo(10.277, 3);
    for (const near of [1e-12, 1e-9, 1e-6]) {
      const mv = hendersonPotential(
        [
          { valence: 1, mobility: 2, pipetteMm: 100 * (1 + near), bathMm: 0 },
          { valence: 1, mobility: 1, pipetteMm: 0, bathMm: 100 },
          { valence: -1, mobility: 3, pipetteMm: 100, bathMm: 0 },
          { valence: -1, mobility: 4, pipetteMm: 0, bathMm: 100 },
        ],
        25,
      );
      expect(mv).toBeCloseTo(alike(1), 4);
    }
  });
});

describe('laws', () => {
  const solution = fc.record({
    K: fc.double({ min: 0.1, max: 300, noNaN: true }),
    Na: fc.double({ min: 0.1, max: 300, noNaN: true }),
    Cl: fc.double({ min: 0.1, max: 300, noNaN: true }),
    gluconate: fc.double({ min: 0.1, max: 300, noNaN: true }),
    Mg: fc.double({ min: 0.1, max: 10, noNaN: true }),
  });
  it('swapping the sides flips the sign', () =>
    fc.assert(
      fc.property(solution, solution, (a, b) => {
        expect(ljp(a, b, 22) + ljp(b, a, 22)).toBeCloseTo(0, 8);
      }),
      { seed: 21 },
    ));
  it('equal solutions give exactly 0', () =>
    fc.assert(
      fc.property(solution, (a) => {
        expect(ljp(a, a, 22)).toBe(0);
      }),
      { seed: 22 },
    ));
  it('scaling all concentrations or all mobilities changes nothing', () =>
    fc.assert(
      fc.property(solution, solution, fc.double({ min: 0.01, max: 50, noNaN: true }), (a, b, k) => {
        const scaled = (side: Record<string, number>): Record<string, number> =>
          Object.fromEntries(Object.entries(side).map(([ion, mm]) => [ion, mm * k]));
        expect(ljp(scaled(a), scaled(b), 22)).toBeCloseTo(ljp(a, b, 22), 8);
      }),
      { seed: 23 },
    ));
  it('an ion listed twice is one ion of the sum', () => {
    const split = [...ions({ K: 100, Cl: 140 }), ...ions({ K: 40 })];
    expect(junctionPotential(split, ions(saline), 22).mv).toBeCloseTo(ljp({ K: 140, Cl: 140 }, saline, 22), 10);
  });
});

describe('mobilities', () => {
  // Equivalent conductivities, CRC Handbook (found): u = λ/(|z|·73.48); Ng & Barry 1995 (from memory).
  test.each([
    ['K', 1, 1],
    ['Cs', 1, 1.0506],
    ['Li', 1, 0.5261],
    ['H', 1, 4.7584],
    ['Ca', 2, 0.4047],
    ['Mg', 2, 0.3606],
    ['Na', 1, 0.6815],
    ['Cl', -1, 1.0385],
    ['HCO3', -1, 0.6056],
    ['SO4', -2, 0.5444],
    ['gluconate', -1, 0.33],
    ['aspartate', -1, 0.3],
    ['EGTA2-', -2, 0.24],
    ['Tris', 1, 0.4],
  ])('%s', (ion, valence, relative) => expect(mobilityOf(ion, valence).relative).toBeCloseTo(relative, 4));
  it('found values are closer than remembered ones, and those closer than assumptions', () => {
    expect(mobilityOf('K', 1).uncertainty).toBeLessThan(mobilityOf('Na', 1).uncertainty);
    expect(mobilityOf('Na', 1).uncertainty).toBeLessThan(mobilityOf('gluconate', -1).uncertainty);
    expect(mobilityOf('gluconate', -1).uncertainty).toBeLessThan(mobilityOf('ATP4-', -4).uncertainty);
    expect(mobilityOf('something new', -1)).toMatchObject({ assumed: true, uncertainty: 0.5 });
    expect(tabulatedIons).toContain('gluconate');
    expect(tabulatedIons).not.toContain('ATP4-');
  });
});
