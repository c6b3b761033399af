import { describe, expect, it, test } from 'vitest';
import type { SolutionIons } from '../../pipeline/judge/types.ts';
import { junctionPotential } from '../../pipeline/membrane/junction.ts';
import { nernstPotential, thermalVoltageMv } from '../../pipeline/membrane/nernst.ts';
import { dissolve } from '../../pipeline/membrane/solutions.ts';
import { hendersonLine, ionLabel, nernstLine, partsText, sumsOf } from '../../site/solutions/working.ts';

test.each([
  ['K', 1, 'K⁺'],
  ['gluconate', -1, 'gluconate⁻'],
  ['Ca', 2, 'Ca²⁺'],
  ['EGTA2-', -2, 'EGTA²⁻'],
  ['ATP4-', -4, 'ATP⁴⁻'],
  ['phosphocreatine-', -1, 'phosphocreatine⁻'],
  ['H2PO4', -1, 'H2PO4⁻'],
])('ionLabel(%s, %d) is %s', (ion, valence, label) => expect(ionLabel(ion, valence)).toBe(label));

const celsius = 33;
const pipette = dissolve(
  {
    millimolar: { 'K-gluconate': 130, KCl: 4, NaCl: 4, HEPES: 10, EGTA: 0.3, 'Mg-ATP': 4, 'Na3-GTP': 0.3 },
    ph: 7.3,
    titrant: 'KOH',
    gas: 'none',
  },
  22,
);
const bath = dissolve(
  {
    millimolar: { NaCl: 125, KCl: 2.5, NaH2PO4: 1.25, NaHCO3: 25, CaCl2: 2, MgCl2: 1 },
    ph: 7.4,
    titrant: null,
    gas: 'carbogen',
  },
  celsius,
);
const junction = junctionPotential(pipette, bath, celsius);
const solution: SolutionIons = {
  celsius,
  thermal_mv: thermalVoltageMv(celsius),
  pipette_ph: pipette.ph,
  bath_ph: bath.ph,
  ions: junction.terms.filter((term) => term.pipette_mm + term.bath_mm >= 1e-3),
  ljp_mv: junction.mv,
  ljp_uncertainty_mv: junction.uncertainty_mv,
  ljp_parts: junction.parts,
  notes: [],
};

/** What a person gets who types the printed formula into a calculator. */
const worked = (line: string): number => {
  const formula = line
    .slice(0, line.indexOf(' ='))
    .replaceAll('−', '-')
    .replaceAll('·', '*')
    .replaceAll('ln', 'Math.log')
    .replaceAll('[', '(')
    .replaceAll(']', ')');
  if (!/^[-+*/().\d\sMathlog]+$/.test(formula)) throw new Error(`not a formula: ${formula}`);
  return Number(new Function(`return ${formula}`)());
};

describe('a person with a calculator', () => {
  it('gets the junction potential from the printed sums', () => {
    expect(Math.abs(worked(hendersonLine(solution)) - junction.mv)).toBeLessThan(0.02);
    expect(hendersonLine(solution)).toMatch(/ = \d\d\.\d ± 3\.\d mV$/);
  });
  it('gets the sums from the table’s own columns', () => {
    // Second way: from concentrations as printed, three decimals at most.
    const sums = sumsOf(solution.ions.map((ion) => ({ ...ion, mobility: Number(ion.mobility.toFixed(4)) })));
    expect(sums.drive).toBeCloseTo(sumsOf(solution.ions).drive, 1);
    expect(sums.pipette).toBeCloseTo(sumsOf(solution.ions).pipette, 1);
  });
  it('gets E_K and E_Ca', () => {
    const e_k = { mv: nernstPotential(1, 2.5, 146.8, celsius), uncertainty_mv: 0.8, inside_mm: 146.8, outside_mm: 2.5 };
    expect(nernstLine(e_k, solution.thermal_mv)).toBe('26.382·ln(2.500/146.8) = −107.4 ± 0.8 mV');
    expect(worked(nernstLine(e_k, solution.thermal_mv))).toBeCloseTo(e_k.mv, 2);
    const e_ca = { ...e_k, valence: 2, mv: nernstPotential(2, 2, 0.01, celsius), inside_mm: 0.01, outside_mm: 2 };
    expect(worked(nernstLine(e_ca, solution.thermal_mv))).toBeCloseTo(e_ca.mv, 2);
  });
  it('gets the limit where both sides conduct alike', () => {
    const alike = {
      ...solution,
      ions: [
        { ...solution.ions[0]!, valence: 1, mobility: 2, pipette_mm: 100, bath_mm: 0 },
        { ...solution.ions[0]!, valence: 1, mobility: 1, pipette_mm: 0, bath_mm: 100 },
        { ...solution.ions[0]!, valence: -1, mobility: 3, pipette_mm: 100, bath_mm: 0 },
        { ...solution.ions[0]!, valence: -1, mobility: 4, pipette_mm: 0, bath_mm: 100 },
      ],
    };
    expect(worked(hendersonLine(alike))).toBeCloseTo((26.38196578 * 200) / 500, 3);
  });
  it('reads what the half-width is made of', () =>
    expect(
      partsText([
        { cause: 'temperature', mv: 0.44 },
        { cause: 'mobility of K', mv: 0.061 },
      ]),
    ).toBe('temperature 0.4, mobility of K 0.06'));
});
