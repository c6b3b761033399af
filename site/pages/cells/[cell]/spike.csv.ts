import { almanac } from '../../../almanac.ts';
import { spikeCsv } from '../../../cell/downloads.ts';
import { shownSpike } from '../../../cell/view.ts';

const shownOf = (id: string) => {
  const { cell, sweeps } = almanac();
  return shownSpike(cell(id).measure.conditions[0], sweeps(id));
};

/** Only cells that show a spike have this file. */
export function getStaticPaths() {
  return [...almanac().cellNames]
    .filter(([id]) => shownOf(id) !== null)
    .map(([id, name]) => ({ params: { cell: name }, props: { id } }));
}

export const GET = ({ props }: { props: { id: string } }): Response =>
  new Response(spikeCsv(shownOf(props.id)!.excerpt));
