/** From facts and recipes to what judging and measuring must know. Pure; opens nothing. */
import type { Recipe, Settings } from '../archive/types.ts';
import { classRanges } from '../judge/class-ranges.ts';
import type { Circumstances, IonPotential, SolutionIons } from '../judge/types.ts';
import { spikeCriteria } from '../measure/spike-criteria.ts';
import type { CellContext, MeasureContext } from '../measure/types.ts';
import { junctionPotential, usualCelsiusUncertainty } from '../membrane/junction.ts';
import { thermalVoltageMv } from '../membrane/nernst.ts';
import { dissolve, equilibria } from '../membrane/solutions.ts';
import { clockSeconds, type FactValues, numberFact, textFact } from './facts.ts';

/**
 * Temperature at which a solution is brought to its pH, °C: a recipe states the pH as read on the bench, and the titrant
 * it took stays in the bottle when it is warmed. A bath in carbogen gets its pH at the cell. Common practice, no source.
 */
const benchCelsius = 22;

/** The shipped class whose ranges and criteria hold for a class fact: itself, or what the lab says it is like. */
export function shippedClass(settings: Settings, classId: string | null): string {
  if (!classId) return 'any';
  const like = settings.classes[classId]?.like ?? classId;
  return like in classRanges ? like : 'any';
}

export function measureContext(facts: FactValues, settings: Settings, filterKhz: number | null): MeasureContext {
  return {
    ...spikeCriteria(
      shippedClass(settings, textFact(facts, 'class')),
      textFact(facts, 'spike_ion') as Circumstances['spike_ion'],
    ),
    filter_khz: numberFact(facts, 'filter_khz') ?? filterKhz,
    mains_hz: numberFact(facts, 'mains_hz') ?? settings.mains_hz,
    capacitance_pf: numberFact(facts, 'capacitance_pf'),
  };
}

interface Ions {
  e_na: IonPotential | null;
  e_k: IonPotential | null;
  ljp_mv: number | null;
  ljp_uncertainty_mv: number | null;
  pipette_sodium_mm: number | null;
  solution: SolutionIons | null;
}

const noIons: Ions = {
  e_na: null,
  e_k: null,
  ljp_mv: null,
  ljp_uncertainty_mv: null,
  pipette_sodium_mm: null,
  solution: null,
};

/** Ions below this are left out of what is shown, mmol/L in both solutions together. */
const shownFromMm = 1e-3;

/** Dissolving takes milliseconds and an archive has few recipes and temperatures: each pair is worked out once. */
const worked = new WeakMap<Recipe, WeakMap<Recipe, Map<number, Ions>>>();

function ionsOf(pipette: Recipe | undefined, bath: Recipe | undefined, celsius: number | null): Ions {
  if (!pipette || !bath || celsius === null) return noIons;
  const ofPipette = worked.get(pipette) ?? new WeakMap<Recipe, Map<number, Ions>>();
  worked.set(pipette, ofPipette);
  const ofPair = ofPipette.get(bath) ?? new Map<number, Ions>();
  ofPipette.set(bath, ofPair);
  const had = ofPair.get(celsius);
  if (had) return had;
  const made = workOutIons(pipette, bath, celsius);
  ofPair.set(celsius, made);
  return made;
}

/** Nothing where a recipe is impossible: `recipeProblems` says what is wrong with it, once for the archive. */
function workOutIons(pipette: Recipe, bath: Recipe, celsius: number): Ions {
  try {
    return dissolvedIons(pipette, bath, celsius);
  } catch (error) {
    if (error instanceof RangeError) return noIons;
    throw error;
  }
}

function dissolvedIons(pipette: Recipe, bath: Recipe, celsius: number): Ions {
  const settledAt = (recipe: Recipe): number => (/carbogen|co2/i.test(recipe.gas) ? celsius : benchCelsius);
  const inside = dissolve(pipette, settledAt(pipette));
  const outside = dissolve(bath, settledAt(bath));
  const potentials = equilibria({
    pipette: inside,
    bath: outside,
    celsius,
    celsiusUncertainty: usualCelsiusUncertainty,
  });
  const sodium = inside.ions.find((ion) => ion.ion === 'Na')?.millimolar ?? null;
  const junction = junctionPotential(inside, outside, celsius);
  return {
    e_na: potentials.e_na,
    e_k: potentials.e_k,
    ljp_mv: junction.mv,
    ljp_uncertainty_mv: junction.uncertainty_mv,
    pipette_sodium_mm: sodium !== null && sodium > 0 ? sodium : null,
    solution: {
      celsius,
      thermal_mv: thermalVoltageMv(celsius),
      pipette_ph: inside.ph,
      bath_ph: outside.ph,
      // A thousandth of a millimole moves no potential by a tenth of a millivolt.
      ions: junction.terms.filter((term) => term.pipette_mm + term.bath_mm >= shownFromMm),
      ljp_mv: junction.mv,
      ljp_uncertainty_mv: junction.uncertainty_mv,
      ljp_parts: junction.parts,
      notes: [
        ...inside.notes.map((note) => `Pipette: ${note}`),
        ...outside.notes.map((note) => `Bath: ${note}`),
        ...junction.notes,
      ],
    },
  };
}

/** Which fact keys would have to be stated for equilibrium potentials. */
function missingForIons(facts: FactValues, recipes: ReadonlyMap<string, Recipe>): string[] {
  const missing: string[] = [];
  for (const key of ['pipette', 'bath']) if (!recipes.has(textFact(facts, key) ?? '')) missing.push(key);
  if (numberFact(facts, 'temperature_c') === null) missing.push('temperature_c');
  if (textFact(facts, 'configuration') === null) missing.push('configuration');
  return missing;
}

/**
 * What is known of the conditions of one stretch. The junction state and the potential that was removed belong to
 * the whole recording (the pipette is zeroed once, in the bath of the first condition); solutions and temperature
 * belong to the stretch.
 *
 * @param facts facts in force for the stretch
 * @param first facts in force for the cell's first condition
 */
export function circumstancesOf(
  condition: string,
  facts: FactValues,
  first: FactValues,
  settings: Settings,
  recipes: ReadonlyMap<string, Recipe>,
  recorded: { rate_hz: number | null; filter_khz: number | null },
): Circumstances {
  const recipe = (values: FactValues, key: string): Recipe | undefined => recipes.get(textFact(values, key) ?? '');
  const celsius = numberFact(facts, 'temperature_c');
  // Only a whole-cell pipette fills the cell with its solution; elsewhere the cell's own ions are not known.
  const wholeCell = textFact(facts, 'configuration') === 'whole-cell';
  const ions = ionsOf(recipe(facts, 'pipette'), recipe(facts, 'bath'), celsius);
  const atZeroing = ionsOf(recipe(first, 'pipette'), recipe(first, 'bath'), numberFact(first, 'temperature_c'));
  const stated = numberFact(first, 'ljp_mv');
  const junction = (textFact(first, 'junction') ?? 'unstated') as Circumstances['junction'];
  const ljp = stated ?? atZeroing.ljp_mv;
  const applied = junction === 'uncorrected' && ljp !== null ? ljp : 0;
  const missing = missingForIons(facts, recipes);
  const classId = textFact(facts, 'class');
  return {
    condition,
    class_id: classId,
    class_label: classId ? (settings.classes[classId]?.label ?? classId) : null,
    like: shippedClass(settings, classId),
    temperature_c: celsius,
    configuration: textFact(facts, 'configuration') as Circumstances['configuration'],
    spike_ion: textFact(facts, 'spike_ion') as Circumstances['spike_ion'],
    junction,
    ljp_mv: ljp,
    ljp_from: stated !== null ? 'stated' : ljp !== null ? 'computed' : null,
    ljp_uncertainty_mv: stated !== null ? 1 : atZeroing.ljp_uncertainty_mv,
    ljp_computed_mv: atZeroing.ljp_mv,
    solution: ions.solution,
    ljp_applied_mv: applied,
    reading: junction === 'corrected' || (junction === 'uncorrected' && ljp !== null) ? 'corrected' : 'recorded',
    e_na: wholeCell ? ions.e_na : null,
    e_k: wholeCell ? ions.e_k : null,
    missing_e_na: missing,
    missing_e_k: missing,
    pipette_sodium_mm: ions.pipette_sodium_mm,
    filter_khz: numberFact(facts, 'filter_khz') ?? recorded.filter_khz,
    mains_hz: numberFact(facts, 'mains_hz') ?? settings.mains_hz,
    rate_hz: recorded.rate_hz,
    bridge_mohm: numberFact(facts, 'bridge_mohm'),
    bias_pa: numberFact(facts, 'bias_pa'),
  };
}

/** What the cell-level quantities need besides the sweeps. */
export function cellContext(circumstances: Circumstances, facts: FactValues, settings: Settings): CellContext {
  const start = clockSeconds(textFact(facts, 'time'));
  const breakIn = clockSeconds(textFact(facts, 'break_in'));
  return {
    ...measureContext(facts, settings, circumstances.filter_khz),
    e_na_mv: circumstances.e_na?.mv ?? null,
    e_k_mv: circumstances.e_k?.mv ?? null,
    bias_pa: circumstances.bias_pa,
    stated_capacitance_pf: numberFact(facts, 'capacitance_pf'),
    stated_bridge_mohm: circumstances.bridge_mohm,
    stated_access_mohm: numberFact(facts, 'access_mohm'),
    break_in_to_start_s: start !== null && breakIn !== null && start >= breakIn ? start - breakIn : null,
    missing_for_e_na: circumstances.missing_e_na,
    missing_for_e_k: circumstances.missing_e_k,
    gradients: {
      volume_pl: numberFact(facts, 'volume_pl'),
      celsius: circumstances.temperature_c,
      sodium: circumstances.e_na,
      potassium: circumstances.e_k,
      pipette:
        circumstances.configuration === 'whole-cell' && circumstances.solution
          ? circumstances.solution.ions.map(({ ion, valence, pipette_mm }) => ({
              ion,
              valence,
              millimolar: pipette_mm,
            }))
          : null,
    },
  };
}
