/**
 * Vertex of the parabola through a sample and its two neighbours. A level top of several equal samples counts as one:
 * its middle, with the neighbours just outside it, so that a coarse digitizer does not pull the peak to one side.
 * @param samples any unit. @param index of a local extremum
 * @returns fractional sample index and value; the sample itself where a neighbour is missing or the three lie on a line
 */
export function vertex(samples: Float64Array, index: number): { position: number; value: number } {
  const top = samples[index]!;
  let first = index;
  let last = index;
  while (first > 0 && samples[first - 1] === top) first--;
  while (last < samples.length - 1 && samples[last + 1] === top) last++;
  if (last - first >= 2) return { position: (first + last) / 2, value: top };
  const left = samples[index - 1];
  const right = samples[index + 1];
  if (left === undefined || right === undefined || !Number.isFinite(left + right))
    return { position: index, value: top };
  const curvature = left - 2 * top + right;
  if (curvature === 0) return { position: index, value: top };
  const shift = (0.5 * (left - right)) / curvature;
  if (Math.abs(shift) > 1) return { position: index, value: top };
  return { position: index + shift, value: top - 0.25 * (left - right) * shift };
}
