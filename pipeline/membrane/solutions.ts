/** From a recipe as a laboratory writes it to the ions in the bottle. */
import { ionicStrengthMolar } from './activity.ts';
import { type Surroundings, speciate } from './binding.ts';
import { buffers, fixedIons } from './buffers.ts';
import { carbogenPh } from './carbonate.ts';
import { requireAmount, requireCelsius } from './guards.ts';
import type { DissolvedIon, Variant } from './junction.ts';
import { readSubstance, readTitrant } from './names.ts';

export interface SolutionRecipe {
  /** Substance as written → mmol/L. */
  millimolar: Record<string, number>;
  ph: number | null;
  /** Base or acid that brought it to pH: 'KOH'. */
  titrant: string | null;
  /** 'carbogen', 'none'. */
  gas: string;
}

export interface Dissolved {
  /** Charged species above a nanomolar, free concentrations, sorted by name. Their charges cancel. */
  ions: DissolvedIon[];
  /** Solutions that the recipe may as well mean; each is electroneutral, and the causes are independent. */
  variants: Variant[];
  /** pH that was counted with, stated or not. */
  ph: number;
  /** Ionic strength, mol/L. */
  strength: number;
  /** Null where no calcium was added: what is left as contamination nobody knows. */
  free_calcium_mm: number | null;
  /** Everything assumed or approximated, in sentences. */
  notes: string[];
  /** Names that could not be read; counted as uncharged. */
  unknown: string[];
}

/** 95 % half-width of a weighed amount, as a share. Common practice, no source. */
const weighing = 0.02;
/**
 * The same for chelators, nucleotides and phosphocreatine, which hold water and are less pure (EGTA: Miller & Smith
 * 1984, Am J Physiol 246:C160–C166; from memory).
 */
const chelatorPurity = 0.05;
/** 95 % half-width of pH meter and acid constants together, and of a pH that is assumed. */
const statedPhHalfWidth = 0.1;
const assumedPhHalfWidth = 0.3;
/** 95 % half-width of log₁₀ of an association constant: what published ones for EGTA differ by (from memory). */
const bindingHalfWidth = 0.2;
/** Stands for the ion of a titrant that is not stated: neither sodium nor potassium, of middling mobility. */
const otherTitrant = { base: 'Tris', acid: 'methanesulfonate' } as const;

export interface Composition {
  /** Fixed ions and buffers in total, mmol/L, before anything was added to reach the pH. */
  totals: Map<string, number>;
  /** What an ion may have beyond the total, from names that leave its count open, mmol/L. */
  open: Map<string, number>;
  /** What each substance brings, and by what share its amount may be off. */
  substances: { name: string; parts: ReadonlyMap<string, number>; halfWidth: number }[];
  /** Ions named as titrants inside names ('HEPES-NaOH'). */
  titrants: string[];
  notes: string[];
  unknown: string[];
}

const add = (map: Map<string, number>, key: string, amount: number): void => {
  map.set(key, (map.get(key) ?? 0) + amount);
};
const shown = (millimolar: number): string => String(Number(millimolar.toPrecision(3)));

/**
 * What the substances of a recipe bring in, before the pH is set.
 * @param millimolar substance as written → mmol/L, 0 or more
 * @throws RangeError naming the substance whose amount is impossible
 */
export function compose(millimolar: Readonly<Record<string, number>>): Composition {
  const composition: Composition = {
    totals: new Map(),
    open: new Map(),
    substances: [],
    titrants: [],
    notes: [],
    unknown: [],
  };
  for (const [name, amount] of Object.entries(millimolar)) {
    requireAmount(`millimolar["${name}"]`, amount);
    const substance = readSubstance(name);
    if (!substance) {
      composition.unknown.push(name);
      composition.notes.push(
        amount < 0.5
          ? `"${name}" (${shown(amount)} mM) is no salt or buffer known here and is counted as uncharged; at this amount it changes nothing.`
          : `"${name}" (${shown(amount)} mM) is no salt or buffer known here and is counted as uncharged. If it is a salt, write it as cation-anion: K-gluconate.`,
      );
      continue;
    }
    for (const [part, count] of substance.parts) add(composition.totals, part, count * amount);
    if (substance.titratedWith) composition.titrants.push(substance.titratedWith);
    if (amount === 0) continue;
    if (substance.parts.size > 0)
      composition.substances.push({
        name,
        parts: new Map([...substance.parts].map(([part, count]) => [part, count * amount])),
        halfWidth: [...substance.parts.keys()].some((part) => buffers[part]?.binds) ? chelatorPurity : weighing,
      });
    if (substance.openCation) {
      const { ion, most } = substance.openCation;
      add(composition.open, ion, (most - 1) * amount);
      composition.notes.push(
        `"${name}" does not say how many ${ion} it holds: ${(most + 1) / 2} ± ${(most - 1) / 2} are counted. Write ${ion}2-…${most === 3 ? ` or ${ion}3-…` : ''} as on the bottle.`,
      );
    }
    if (substance.lonely)
      composition.notes.push(
        `"${name}" stands without its counter-ion, which is left to what sets the pH. Write the salt as on the bottle.`,
      );
    if (substance.completed && !/[A-Za-z]{6}/.test(name))
      composition.notes.push(`"${name}" is read with the counts that make it neutral.`);
  }
  return composition;
}

const valenceOf = (name: string): number => fixedIons[name]!;

interface Settled {
  ions: Map<string, { valence: number; millimolar: number }>;
  freeCalcium: number;
  /** Net charge before anything was added to cancel it, mmol/L. */
  charge: number;
}

/** All ions at one pH before titration. */
function settle(totals: ReadonlyMap<string, number>, around: Surroundings): Settled {
  const ions = new Map<string, { valence: number; millimolar: number }>();
  const put = (ion: string, valence: number, millimolar: number): void => {
    const before = ions.get(ion);
    ions.set(ion, { valence, millimolar: (before?.millimolar ?? 0) + millimolar });
  };
  const weak = new Map<string, number>();
  for (const [name, total] of totals) {
    if (Object.hasOwn(buffers, name)) weak.set(name, total);
    else if (name !== 'Ca' && name !== 'Mg') put(name, valenceOf(name), total);
  }
  const { species, freeCalcium, freeMagnesium } = speciate(weak, totals.get('Ca') ?? 0, totals.get('Mg') ?? 0, around);
  if (totals.has('Ca')) put('Ca', 2, freeCalcium);
  if (totals.has('Mg')) put('Mg', 2, freeMagnesium);
  for (const one of species) if (one.valence !== 0) put(one.ion, one.valence, one.millimolar);
  let charge = 0;
  for (const { valence, millimolar } of ions.values()) charge += valence * millimolar;
  return { ions, freeCalcium, charge };
}

interface Closing {
  /** What cancels a lack and an excess of positive charge: a fixed ion or 'Tris'. */
  base: string;
  acid: string;
}

/** Adds the ion that cancels the charge; bicarbonate may lose what it has, since it leaves with the gas. */
function close(settled: Settled, closing: Closing | 'bicarbonate'): { ion: string; added: number } {
  const ion = closing === 'bicarbonate' ? 'HCO3' : settled.charge < 0 ? closing.base : closing.acid;
  const valence = ion === 'HCO3' ? -1 : Object.hasOwn(buffers, ion) ? 1 : valenceOf(ion);
  const added = -settled.charge / valence;
  const before = settled.ions.get(ion)?.millimolar ?? 0;
  settled.ions.set(ion, { valence, millimolar: before + added });
  return { ion, added };
}

function mostAbundant(totals: ReadonlyMap<string, number>, valence: 1 | -1): string | null {
  let best: string | null = null;
  for (const [name, total] of totals)
    if (fixedIons[name] === valence && name !== 'HCO3' && total > (best === null ? 0 : totals.get(best)!)) best = name;
  return best;
}

const strengthOf = ({ ions }: Settled): number =>
  ionicStrengthMolar([...ions.values()].map((one) => ({ ...one, millimolar: Math.max(one.millimolar, 0) })));

const listed = ({ ions }: Settled): { ion: string; valence: number; millimolar: number }[] =>
  [...ions]
    .flatMap(([ion, one]) => (one.millimolar > 1e-6 ? [{ ion, ...one }] : []))
    .sort((a, b) => (a.ion < b.ion ? -1 : a.ion > b.ion ? 1 : 0));

/** The pH counted with, how well it is known, and what is to be said of it. */
function phOf(
  recipe: SolutionRecipe,
  totals: ReadonlyMap<string, number>,
  celsius: number,
): { ph: number; halfWidth: number; notes: string[] } {
  const total = (name: string): number => totals.get(name) ?? 0;
  // Below 1 mM it is no bicarbonate buffer.
  const gassed = /carbogen|co2/i.test(recipe.gas) && total('HCO3') >= 1 ? carbogenPh(total('HCO3'), celsius) : null;
  if (recipe.ph !== null) {
    const off = gassed !== null && Math.abs(gassed - recipe.ph) > 0.25;
    const notes = off
      ? [
          `${shown(total('HCO3'))} mM bicarbonate in 5 % carbon dioxide gives pH ${gassed.toFixed(2)}, not ${recipe.ph}.`,
        ]
      : [];
    return { ph: recipe.ph, halfWidth: statedPhHalfWidth, notes };
  }
  if (gassed !== null) {
    const ph = Number(gassed.toFixed(2));
    const notes = [
      `The pH is not stated: ${ph} is what 5 % carbon dioxide gives ${shown(total('HCO3'))} mM bicarbonate.`,
    ];
    return { ph, halfWidth: statedPhHalfWidth, notes };
  }
  const ph = total('Na') > total('K') + total('Cs') ? 7.4 : 7.3;
  const weak = [...totals].some(([name, amount]) => Object.hasOwn(buffers, name) && amount > 0);
  const notes = weak ? [`The pH is not stated: ${ph} ± ${assumedPhHalfWidth} is assumed. State "ph".`] : [];
  return { ph, halfWidth: assumedPhHalfWidth, notes };
}

/**
 * The ions of a solution at its pH: salts dissociated, buffers in their forms at the solution's own temperature and
 * ionic strength, calcium and magnesium shared out between chelators and nucleotides with published constants, and the
 * ion of the titrant in the amount that cancels the charge. A solution in carbogen with bicarbonate and no stated
 * titrant cancels it with bicarbonate, which the gas supplies. Left out: ion pairs of sulfate, phosphate and
 * bicarbonate; gluconate, which holds calcium with 53 mM (Anal Biochem 2014, abstract) and so matters only where
 * nothing stronger binds; other metals on chelators.
 *
 * Half-widths follow from `variants`: the whole solution worked out again with one thing off by its own half-width
 * (each weighed amount, the pH, counts a name leaves open, a titrant that is not stated, the association constants).
 * @param recipe amounts in mmol/L; pH 0 to 14 or null
 * @param celsius temperature at which it was brought to pH, °C, above absolute zero
 * @returns free ions with 95 % half-widths, notes on everything assumed
 * @throws RangeError naming an impossible amount, pH or temperature; never for a name it does not know
 */
export function dissolve(recipe: SolutionRecipe, celsius: number): Dissolved {
  requireCelsius('celsius', celsius);
  if (recipe.ph !== null && !(recipe.ph >= 0 && recipe.ph <= 14))
    throw new RangeError(`ph must be between 0 and 14 or null, got ${recipe.ph}`);
  const { totals, open, substances, titrants, notes, unknown } = compose(recipe.millimolar);
  // The middle of what an open count allows, so that the half-width covers both ends.
  for (const [name, more] of open) add(totals, name, more / 2);
  const total = (name: string): number => totals.get(name) ?? 0;
  const weak = [...totals.keys()].filter((name) => Object.hasOwn(buffers, name) && total(name) > 0);
  const { ph, halfWidth, notes: ofPh } = phOf(recipe, totals, celsius);
  notes.push(...ofPh);

  const stated = recipe.titrant?.trim() ? recipe.titrant.trim() : null;
  let titrant = stated ? readTitrant(stated) : null;
  if (stated && titrant === null && !/^none$/i.test(stated))
    notes.push(`The titrant "${stated}" is not known here and is set aside. Write KOH, NaOH, CsOH, HCl or the like.`);
  titrant ??= titrants[0] ?? null;
  const known = titrant !== null;
  const charged = titrant === null ? 0 : Object.hasOwn(buffers, titrant) ? 1 : valenceOf(titrant);
  const closing: Closing = {
    base: charged > 0 ? titrant! : (mostAbundant(totals, 1) ?? 'Na'),
    acid: charged < 0 ? titrant! : 'Cl',
  };

  const around: Surroundings = { ph, celsius, strength: 0.15 };
  const uncancelled = settle(totals, around).charge;
  const byBicarbonate = !known && total('HCO3') > 0 && total('HCO3') + uncancelled > 0.5 * total('HCO3');
  const way = byBicarbonate ? 'bicarbonate' : closing;
  const solve = (amounts: ReadonlyMap<string, number>, change: Partial<Surroundings> = {}) => {
    const solution = settle(amounts, { ...around, ...change });
    return { solution, ...close(solution, way) };
  };
  // The constants depend on the ionic strength and it, weakly, on them: three rounds settle it to 1e-6.
  for (let round = 0; round < 3; round++) around.strength = strengthOf(solve(totals).solution);
  const { solution: settled, ion, added } = solve(totals);

  const significant = Math.abs(added) > Math.max(0.1, 0.002 * total(closing.base));
  if (way === 'bicarbonate') {
    const carbogen = /carbogen|co2/i.test(recipe.gas);
    if (significant)
      notes.push(
        `Bicarbonate is ${shown(settled.ions.get('HCO3')!.millimolar)} mM after the other buffers took their share at pH ${ph}${carbogen ? '' : '; the gas is not stated as carbogen'}.`,
      );
  } else if (significant && known) {
    const other = (ion === closing.base) !== charged > 0;
    notes.push(
      other
        ? `At pH ${ph} the stated salts need ${shown(added)} mM ${ion} rather than ${titrant}: a salt may be written otherwise than weighed.`
        : `Bringing it to pH ${ph} takes ${shown(added)} mM ${ion}.`,
    );
  } else if (significant) {
    notes.push(
      `The titrant is not stated: ${shown(added)} mM ${ion} is assumed to cancel the charge at pH ${ph}, and may be another ion. State "titrant".`,
    );
  }
  const chelators = weak.filter((name) => buffers[name]!.binds);
  const metals = (['Ca', 'Mg'] as const).filter((metal) => total(metal) > 0);
  if (chelators.length > 0 && metals.length > 0)
    notes.push(
      `Calcium and magnesium bound by ${chelators.join(', ')} are approximate, from apparent constants: ${[...new Set(chelators.map((name) => buffers[name]!.source))].join('; ')}.`,
    );

  const others = ['Ba', 'Sr', 'Co', 'Cd', 'Mn', 'Ni', 'Zn', 'Gd', 'La'].filter((name) => total(name) > 0);
  if (chelators.length > 0 && others.length > 0)
    notes.push(`${others.join(', ')} held by ${chelators.join(', ')} is not computed: all of it is counted as free.`);

  const variants: Variant[] = [];
  const vary = (cause: string, solution: Settled): number => variants.push({ cause, ions: listed(solution) });
  const changed = (parts: ReadonlyMap<string, number>, share: number): Map<string, number> => {
    const amounts = new Map(totals);
    for (const [part, amount] of parts) add(amounts, part, share * amount);
    return amounts;
  };
  for (const { name, parts, halfWidth: share } of substances)
    vary(`amount of ${name}`, solve(changed(parts, share)).solution);
  if (weak.length > 0)
    for (const side of [-1, 1]) vary('pH and acid constants', solve(totals, { ph: ph + side * halfWidth }).solution);
  for (const [name, more] of open)
    for (const side of [-1, 1])
      vary(`count of ${name} that a name leaves open`, solve(changed(new Map([[name, more]]), side / 2)).solution);
  if (chelators.length > 0)
    for (const metal of metals)
      for (const side of [-1, 1])
        vary(
          `constants that bind ${metal}`,
          solve(totals, { shifted: { metal, by: side * bindingHalfWidth } }).solution,
        );
  if (way !== 'bicarbonate' && !known && added > 1e-6) {
    const { solution } = solve(totals);
    const stands = ion === closing.base ? otherTitrant.base : otherTitrant.acid;
    const place = stands === ion ? 'NMDG' : stands;
    const valence = ion === closing.base ? 1 : -1;
    solution.ions.get(ion)!.millimolar -= added;
    solution.ions.set(place, { valence, millimolar: (solution.ions.get(place)?.millimolar ?? 0) + added });
    vary('titrant, which is not stated', solution);
  }

  const ions = listed(settled).map((one) => ({ ...one, uncertainty_mm: halfWidthOf(one, variants) }));
  return {
    ions,
    variants,
    ph,
    strength: around.strength,
    free_calcium_mm: total('Ca') > 0 ? settled.freeCalcium : null,
    notes,
    unknown,
  };
}

/** The larger of a cause's two directions; causes in quadrature. */
function halfWidthOf(one: { ion: string; millimolar: number }, variants: readonly Variant[]): number {
  const causes = new Map<string, number>();
  for (const { cause, ions } of variants) {
    const off = Math.abs((ions.find((other) => other.ion === one.ion)?.millimolar ?? 0) - one.millimolar);
    causes.set(cause, Math.max(causes.get(cause) ?? 0, off));
  }
  return Math.hypot(...causes.values());
}

export { type Equilibria, type Equilibrium, equilibria } from './equilibria.ts';
