/** Words of quantities as they stand inside a sentence. */
import { quantity } from '../measure/quantities.ts';

/** Label for the middle of a sentence: lower case except for abbreviations and symbols. */
export function labelOf(quantityId: string): string {
  const { label } = quantity(quantityId);
  return /^[A-Z][a-z]/.test(label) ? label.charAt(0).toLowerCase() + label.slice(1) : label;
}

export const isAbsolutePotential = (quantityId: string): boolean => quantity(quantityId).absolute_potential;
