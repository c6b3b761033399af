/** Recipes by the names people give them. */
import type { Recipe } from './types.ts';

const folded = (name: string): string =>
  name
    .normalize('NFC')
    .trim()
    .toLowerCase()
    .replace(/[\s_-]+/g, ' ');

/**
 * The recipe that a `bath` or `pipette` fact means: by id, else by alias, else by its full name; spelling of case,
 * spaces, hyphens and underscores aside.
 */
export function recipeFor(recipes: readonly Recipe[], named: string): Recipe | undefined {
  const wanted = folded(named);
  return (
    recipes.find((recipe) => recipe.id === named) ??
    recipes.find((recipe) => folded(recipe.id) === wanted) ??
    recipes.find((recipe) => recipe.aliases?.some((alias) => folded(alias) === wanted)) ??
    recipes.find((recipe) => folded(recipe.name) === wanted)
  );
}

/** Names that two recipes answer to, with both ids. */
export function sharedNames(recipes: readonly Recipe[]): { name: string; ids: [string, string] }[] {
  const owner = new Map<string, string>();
  const shared: { name: string; ids: [string, string] }[] = [];
  for (const recipe of recipes)
    for (const name of new Set([recipe.id, ...(recipe.aliases ?? [])].map(folded))) {
      const other = owner.get(name);
      if (other !== undefined && other !== recipe.id) shared.push({ name, ids: [other, recipe.id] });
      else owner.set(name, recipe.id);
    }
  return shared;
}
