import { describe, expect, it } from 'vitest';
import type { Recipe, Settings } from '../../pipeline/archive/types.ts';
import { cellContext, circumstancesOf } from '../../pipeline/command/circumstances.ts';
import { junctionReadings } from '../../pipeline/judge/compare.ts';
import type { Circumstances } from '../../pipeline/judge/types.ts';

const recipe = (id: string, role: Recipe['role'], more: Partial<Recipe>): Recipe => ({
  id,
  path: `solutions/${id}.yaml`,
  name: id,
  role,
  ph: role === 'pipette' ? 7.3 : 7.4,
  titrant: role === 'pipette' ? 'KOH' : null,
  gas: role === 'bath' ? 'carbogen' : 'none',
  osmolality_mosm: null,
  millimolar: {},
  ...more,
});
const gluconate = { 'K-gluconate': 130, KCl: 4, NaCl: 4, HEPES: 10, EGTA: 0.3, 'Mg-ATP': 4, 'Na3-GTP': 0.3 };
const recipes = new Map(
  [
    recipe('acsf', 'bath', {
      millimolar: { NaCl: 125, KCl: 2.5, NaH2PO4: 1.25, NaHCO3: 25, CaCl2: 2, MgCl2: 1, glucose: 10 },
    }),
    recipe('pipette', 'pipette', { millimolar: gluconate }),
    recipe('untitrated', 'pipette', { millimolar: { ...gluconate, EGTA: 10 }, titrant: null }),
    recipe('titrated', 'pipette', { millimolar: { ...gluconate, EGTA: 10 } }),
    recipe('novel', 'pipette', { millimolar: { 'K-lactate': 5, 'K4-BAPTA': 30, KCl: 20, NaCl: 4 } }),
  ].map((one) => [one.id, one]),
);
const settings: Settings = {
  title: 't',
  lab: '',
  timezone: null,
  mains_hz: null,
  rigs: {},
  people: {},
  classes: {},
  limits: [],
  audiences: {},
};
const of = (facts: Record<string, string | number>): Circumstances => {
  const all = {
    pipette: 'pipette',
    bath: 'acsf',
    temperature_c: 33,
    configuration: 'whole-cell',
    junction: 'uncorrected',
    ...facts,
  };
  return circumstancesOf('baseline', all, all, settings, recipes, { rate_hz: 20000, filter_khz: 8 });
};

describe('circumstancesOf(facts, recipes): what judging is told of its own doubt', () => {
  it('the junction potential’s, by its mobilities: at least 3.5 mV computed, 1 mV stated', () => {
    const computed = of({});
    expect(computed.ljp_from).toBe('computed');
    expect(junctionReadings(computed).uncertainty_mv).toBe(computed.ljp_uncertainty_mv);
    expect(computed.ljp_uncertainty_mv).toBeGreaterThanOrEqual(3.5);
    expect(computed.ljp_uncertainty_mv).toBeLessThan(3.8);
    const stated = of({ ljp_mv: 14 });
    expect(junctionReadings(stated).uncertainty_mv).toBe(1);
    // A pipette of ions that nobody has measured.
    expect(of({ pipette: 'novel' }).ljp_uncertainty_mv).toBeGreaterThan(computed.ljp_uncertainty_mv! + 0.5);
  });
  it('the equilibrium potentials’, by what the recipe leaves open', () => {
    const [open, closed] = [of({ pipette: 'untitrated' }), of({ pipette: 'titrated' })];
    expect(open.e_k!.mv).toBeCloseTo(closed.e_k!.mv, 9);
    expect(open.e_k!.uncertainty_mv).toBeGreaterThan(2 * closed.e_k!.uncertainty_mv);
    expect(open.e_k!.parts![0]!.cause).toBe('pipette: titrant, which is not stated');
  });
  it('counts the titrant at the bench’s temperature: warming the cell adds no potassium to the bottle', () => {
    expect(of({ temperature_c: 22 }).e_k!.inside_mm).toBe(of({ temperature_c: 36 }).e_k!.inside_mm);
  });
  it('hands on every ion, so that the potentials can be worked out by hand', () => {
    const { solution, e_k, ljp_mv } = of({});
    const potassium = solution!.ions.find((ion) => ion.ion === 'K')!;
    expect(potassium.pipette_mm).toBe(e_k!.inside_mm);
    expect(solution!.ljp_mv).toBe(ljp_mv);
    // Electroneutral to what is left out as too little to show.
    for (const side of ['pipette_mm', 'bath_mm'] as const)
      expect(Math.abs(solution!.ions.reduce((sum, ion) => sum + ion.valence * ion[side], 0))).toBeLessThan(0.01);
    expect(of({ bath: 'unheard-of' }).solution).toBeNull();
  });
  it('gives the loss of gradients its volume and its ions, in whole-cell recordings only', () => {
    const facts = { volume_pl: 3 };
    const { gradients } = cellContext(of(facts), facts, settings);
    expect(gradients).toMatchObject({ volume_pl: 3, celsius: 33 });
    expect(gradients!.sodium!.inside_mm).toBeCloseTo(4.9, 1);
    expect(gradients!.pipette!.length).toBeGreaterThan(5);
    const sharp = cellContext(of({ configuration: 'sharp' }), facts, settings).gradients!;
    expect(sharp).toMatchObject({ sodium: null, potassium: null, pipette: null });
  });
});
