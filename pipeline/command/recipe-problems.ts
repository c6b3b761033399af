/** What is wrong or assumed in the archive's solution recipes, said once for the archive. */
import type { Recipe } from '../archive/types.ts';
import type { ArchiveProblem } from '../ledger/types.ts';
import { dissolve } from '../membrane/solutions.ts';

/** Recipes are looked at near room temperature; none of the remarks depends on it. */
const lookedAtC = 25;

/** Substances that are not known matter from here on, mM; common practice, no source. */
const mattersFromMm = 0.5;

/** Notes of how a recipe was read that are no remark on it: they follow from what it says. */
const followsFrom = /^Bringing it to|^Bicarbonate is|are approximate|changes nothing/;

const remark = (recipe: Recipe, code: string, message: string, remedy: string): ArchiveProblem => ({
  code,
  weight: 'warns',
  place: recipe.name,
  message,
  remedy,
  path: recipe.path,
  line: null,
});

export function recipeProblems(recipes: readonly Recipe[]): ArchiveProblem[] {
  return recipes.flatMap((recipe) => {
    try {
      const { notes, unknown } = dissolve(recipe, lookedAtC);
      const unknownMatter = unknown.filter((name) => (recipe.millimolar[name] ?? 0) >= mattersFromMm);
      return [
        ...unknownMatter.map((name) =>
          remark(
            recipe,
            'SUBSTANCE_UNKNOWN',
            `“${name}” (${recipe.millimolar[name]} mM) is no salt or buffer known here and counts as uncharged in E_K, E_Na and the junction potential.`,
            'If it is a salt, write it as cation-anion, for example K-gluconate.',
          ),
        ),
        ...notes
          .filter((note) => !followsFrom.test(note) && !unknownMatter.some((name) => note.startsWith(`"${name}"`)))
          .map((note) => remark(recipe, 'RECIPE_ASSUMED', note, 'State it in the recipe to narrow the potentials.')),
      ];
    } catch (error) {
      if (!(error instanceof RangeError)) throw error;
      return [
        remark(
          recipe,
          'RECIPE_IMPOSSIBLE',
          `The recipe cannot be worked out: ${error.message}.`,
          'Correct the amounts; cells that use it have no E_K, E_Na and junction potential until then.',
        ),
      ];
    }
  });
}
