import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import {
  type DissolvedIon,
  hendersonErrorMv,
  hendersonPotential,
  type JunctionIon,
  junctionPotential,
} from '../../pipeline/membrane/junction.ts';
import { mobilityOf, tabulatedIons } from '../../pipeline/membrane/mobilities.ts';
import { dissolve } from '../../pipeline/membrane/solutions.ts';

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
  junctionPotential({ ions: ions(pipette) }, { ions: ions(bath) }, celsius).mv;

describe('junctionPotential(pipette, bath, celsius) refuses what has no answer', () => {
  it('no ions on a side', () => {
    expect(() => junctionPotential({ ions: [] }, { ions: ions({ Na: 150, Cl: 150 }) }, 22)).toThrow(
      /pipette must hold .* got none/,
    );
    expect(() => junctionPotential({ ions: ions({ Na: 150, Cl: 150 }) }, { ions: [] }, 22)).toThrow(
      /bath must hold .* got none/,
    );
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
  const { mv, uncertainty_mv } = junctionPotential({ ions: ions(pipette) }, { ions: ions(bath) }, celsius);
  expect(Math.abs(mv - recomputed)).toBeLessThan(6e-4);
  expect(uncertainty_mv).toBeGreaterThanOrEqual(3.5);
  // 3 M KCl lies beyond what the Davies equation says of activities, which alone adds 3 mV.
  expect(uncertainty_mv).toBeLessThan(_label.startsWith('3 M') ? 4.5 : 3.7);
  // K-aspartate: the stated 13 mV is for caesium aspartate in another bath, 3.51 mV lower.
  if (stated !== null) expect(Math.abs(mv - stated)).toBeLessThanOrEqual(uncertainty_mv + 0.02);
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
  const { mv, uncertainty_mv, parts, notes } = junctionPotential(
    { ions: ions(pipette) },
    { ions: ions(bath) },
    celsius,
  );
  expect(Math.abs(mv - stated)).toBeLessThan(uncertainty_mv);
  expect(Math.abs(mv - recomputed)).toBeLessThan(0.15);
  // Nobody has measured that mobility: with the best-known part of the rest it is among the larger ones.
  expect(parts.find((part) => part.cause === 'mobility of nucleotide2-')!.mv).toBeGreaterThan(0.3);
  expect(notes.join(' ')).toMatch(/nucleotide2- is assumed/);
});

describe('the half-width of a junction potential', () => {
  const pipette = dissolve(
    {
      millimolar: { 'K-gluconate': 130, KCl: 4, HEPES: 10, EGTA: 1, 'Mg-ATP': 4, 'Na-GTP': 0.3 },
      ph: 7.3,
      titrant: null,
      gas: 'none',
    },
    22,
  );
  const bath = dissolve(
    { millimolar: { NaCl: 140, KCl: 4, CaCl2: 2, MgCl2: 1, HEPES: 10 }, ph: 7.4, titrant: 'NaOH', gas: 'none' },
    22,
  );
  const junction = junctionPotential(pipette, bath, 22);
  it('takes Henderson’s own error from the measured junctions above', () => {
    const residuals = [26.78 - 28.52, 33.09 - 33.38, 34.86 - 36.14, 6.42 - 4.86, 8.76 - 7.62, 2.62 - 2.76];
    const rms = Math.sqrt(residuals.reduce((sum, one) => sum + one * one, 0) / 6);
    // Student's t for 95 % and six degrees of freedom: 2.447 (tables).
    expect(Math.abs(2.447 * rms - hendersonErrorMv)).toBeLessThan(0.05);
  });
  it('is its parts in quadrature, never below 3.5 mV', () => {
    const sum = Math.hypot(...junction.parts.map((part) => part.mv));
    expect(junction.uncertainty_mv).toBe(Math.max(3.5, sum));
    for (const cause of ['mobility of gluconate', 'mobility of Na', 'mobility of MgATP2-', 'temperature'])
      expect(junction.parts.map((part) => part.cause)).toContain(cause);
  });
  it('knows what activities would change for a diluted salt', () => {
    // 145 against 75 mM NaCl, the geometry in which Barry, Lewis & Moorhouse 2013 (Eur Biophys J 42:631; found) meet the
    // equation within 0.1 mV with activities. By hand with mean activity coefficients 0.757 and 0.797 (Robinson & Stokes
    // 1959, interpolated, from memory): 25.434·0.2076·ln(145·0.757/(75·0.797)) = 3.21 mV, 0.27 below concentrations.
    const { mv, parts } = junctionPotential(
      { ions: ions({ Na: 145, Cl: 145 }) },
      { ions: ions({ Na: 75, Cl: 75 }) },
      22,
    );
    const change = parts.find((part) => part.cause === 'concentrations for activities')!.mv;
    expect(Math.abs(-mv - change - 3.21)).toBeLessThan(0.1);
  });
  it('moves with each mobility as the equation says', () => {
    // Second implementation: the closed derivative of the equation by ln u, times the share, for gluconate.
    const share = mobilityOf('gluconate', -1).uncertainty;
    let [drive, inside, outside] = [0, 0, 0];
    for (const { valence: z, mobility: u, pipette_mm: p, bath_mm: b } of junction.terms) {
      drive += z * u * (b - p);
      inside += z * z * u * p;
      outside += z * z * u * b;
    }
    const own = junction.terms.find((term) => term.ion === 'gluconate')!;
    const [z, u, p, b] = [own.valence, own.mobility, own.pipette_mm, own.bath_mm];
    const step = 1e-6;
    const at = (d: number): number => {
      const n = drive + d * z * u * (b - p);
      const [i, o] = [inside + d * z * z * u * p, outside + d * z * z * u * b];
      return 25.43405912 * (n / (o - i)) * Math.log(i / o);
    };
    expect(at(0)).toBeCloseTo(junction.mv, 6);
    const slope = (at(step) - at(-step)) / (2 * step);
    expect(Math.abs(own.mobility_mv - Math.abs(slope) * share)).toBeLessThan(0.1 * own.mobility_mv);
  });
  it('is wider where mobilities are guessed and titrants unknown', () => {
    const guessed = junctionPotential({ ions: ions({ K: 150, novelate: 150 }) }, { ions: ions(saline) }, 22);
    expect(guessed.uncertainty_mv).toBeGreaterThan(4.5);
    expect(guessed.parts.slice(0, 2).map((part) => part.cause)).toContain('mobility of novelate');
    expect(junction.parts.map((part) => part.cause)).toContain('pipette: titrant, which is not stated');
  });
  it('is the same from either side', () => {
    const turned = junctionPotential(bath, pipette, 22);
    expect(turned.mv).toBeCloseTo(-junction.mv, 9);
    expect(turned.uncertainty_mv).toBeCloseTo(junction.uncertainty_mv, 9);
  });
  it('refuses a negative half-width of the temperature', () =>
    expect(() => junctionPotential(pipette, bath, 22, -1)).toThrow(/celsiusUncertainty .* got -1/));
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
    expect(junctionPotential({ ions: split }, { ions: ions(saline) }, 22).mv).toBeCloseTo(
      ljp({ K: 140, Cl: 140 }, saline, 22),
      10,
    );
  });
});

describe('mobilities', () => {
  // Equivalent conductivities, CRC Handbook (found): u = λ/(|z|·73.48); Ng & Barry 1995 (from memory).
  test.each([
    ['K', 1, 1.0],
    ['Na', 1, 0.6815],
    ['Cs', 1, 1.0506],
    ['Li', 1, 0.5261],
    ['NH4', 1, 1.0003],
    ['H', 1, 4.7584],
    ['Ca', 2, 0.4047],
    ['Mg', 2, 0.3606],
    ['Ba', 2, 0.4328],
    ['Co', 2, 0.3743],
    ['Cl', -1, 1.0385],
    ['Br', -1, 1.0629],
    ['F', -1, 0.7539],
    ['I', -1, 1.0452],
    ['NO3', -1, 0.972],
    ['HCO3', -1, 0.6056],
    ['SO4', -2, 0.5444],
    ['H2PO4', -1, 0.4491],
    ['HPO4', -2, 0.3879],
    ['OH', -1, 2.6946],
    ['acetate', -1, 0.5566],
    ['ClO4', -1, 0.9159],
    ['TEA', 1, 0.4437],
    ['TMA', 1, 0.6111],
    ['methanesulfonate', -1, 0.6641],
    ['choline', 1, 0.51],
    ['NMDG', 1, 0.33],
    ['Tris', 1, 0.4],
    ['gluconate', -1, 0.33],
    ['aspartate', -1, 0.3],
    ['glutamate', -1, 0.26],
    ['HEPES', -1, 0.3],
    ['isethionate', -1, 0.52],
    ['MES', -1, 0.37],
    ['MOPS', -1, 0.35],
    ['EGTA2-', -2, 0.24],
    ['EGTA3-', -3, 0.25],
    ['SCN', -1, 0.9],
    ['propionate', -1, 0.487],
    ['butyrate', -1, 0.44],
    ['benzoate', -1, 0.441],
  ])('%s', (ion, valence, relative) => expect(mobilityOf(ion, valence).relative).toBeCloseTo(relative, 4));
  // Where both a conductivity and a value of Ng & Barry 1995 (from memory) are known they differ by up to 1.2 %: less
  // than the half-width given to either.
  test.each([
    ['K', 1, 1.0],
    ['Na', 1, 0.682],
    ['Cs', 1, 1.05],
    ['Li', 1, 0.525],
    ['NH4', 1, 1.0],
    ['H', 1, 4.757],
    ['Ca', 2, 0.4048],
    ['Mg', 2, 0.361],
    ['Ba', 2, 0.433],
    ['Co', 2, 0.37],
    ['Cl', -1, 1.0388],
    ['Br', -1, 1.063],
    ['F', -1, 0.753],
    ['I', -1, 1.045],
    ['NO3', -1, 0.972],
    ['HCO3', -1, 0.605],
    ['SO4', -2, 0.544],
    ['H2PO4', -1, 0.45],
    ['HPO4', -2, 0.39],
    ['acetate', -1, 0.556],
    ['ClO4', -1, 0.916],
    ['TEA', 1, 0.444],
    ['TMA', 1, 0.611],
  ])('%s as tabulated for junctions', (ion, valence, relative) => {
    const { relative: ours, uncertainty } = mobilityOf(ion, valence);
    expect(Math.abs(ours / relative - 1)).toBeLessThan(0.013);
    expect(uncertainty).toBeGreaterThan(0.013);
  });
  it('found values are closer than remembered ones, and those closer than assumptions', () => {
    expect(mobilityOf('K', 1).uncertainty).toBeLessThan(mobilityOf('Na', 1).uncertainty);
    expect(mobilityOf('Na', 1).uncertainty).toBeLessThan(mobilityOf('gluconate', -1).uncertainty);
    expect(mobilityOf('gluconate', -1).uncertainty).toBeLessThan(mobilityOf('ATP4-', -4).uncertainty);
    expect(mobilityOf('something new', -1)).toMatchObject({ assumed: true, uncertainty: 0.5 });
    expect(tabulatedIons).toContain('gluconate');
    expect(tabulatedIons).not.toContain('ATP4-');
  });
});
