/**
 * The amplitude that a label such as 'Long step -110 pA' claims, pA (current clamp) or mV (voltage clamp).
 *
 * @returns null where the label names no amplitude, several, or a series of steps
 */
export function labelledAmplitude(label: string, clamp: 'current' | 'voltage'): number | null {
  if (/\b(?:steps? of|from|to|increments?|until|between)\b|\.\.|…/i.test(label)) return null;
  const unit = clamp === 'current' ? '([pn])A' : '(m)V';
  const found = [...label.matchAll(new RegExp(`([+\\-−]?)(\\d+(?:\\.\\d+)?)[\\s_]*${unit}(?![A-Za-z/])`, 'g'))].map(
    ([, sign, digits, prefix]) =>
      (sign === '-' || sign === '−' ? -1 : 1) * Number(digits) * (prefix === 'n' ? 1000 : 1),
  );
  const amplitudes = [...new Set(found)];
  return amplitudes.length === 1 ? amplitudes[0]! : null;
}
